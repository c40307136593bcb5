/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Density of states by Chebyshev moments and Jackson's kernel (A. Weiße, G. Wellein, A. Alvermann,
 * H. Fehske, Rev. Mod. Phys. 78, 275 (2006)). */
#include "linalg_internal.h"

#include <math.h>
#include <string.h>

/* Moments are at most 1; the excess that rounding may add. */
static const double EXCESS = 1e-9;

static panel_step choose_step(void)
{
    switch (sv_panel_best_kernel()) {
    case SV_PANEL_AVX512:
        return sv_panel_step_avx512;
    case SV_PANEL_AVX2:
        return sv_panel_step_avx2;
    default:
        return sv_panel_step_plain;
    }
}

static void fill_phases(double *x, sv_index n, int panel, const sv_stream *stream)
{
    for (sv_index r = 0; r < n; r++)
        for (int c = 0; c < SV_PANEL_COLUMNS; c++) {
            double angle = 2.0 * M_PI * sv_stream_uniform(stream, (int32_t)r, panel, (uint32_t)c);
            x[r * SV_PANEL_ROW + c] = cos(angle);
            x[r * SV_PANEL_ROW + SV_PANEL_COLUMNS + c] = sin(angle);
        }
}

static void fill_units(double *x, sv_index n, sv_index first)
{
    memset(x, 0, (size_t)(n * SV_PANEL_ROW) * sizeof *x);
    for (int c = 0; c < SV_PANEL_COLUMNS && first + c < n; c++)
        x[(first + c) * SV_PANEL_ROW + c] = 1.0;
}

/* Real parts of the products of two panels, column by column. */
static void overlaps(const double *x, const double *y, sv_index n, double *sums)
{
    memset(sums, 0, SV_PANEL_COLUMNS * sizeof *sums);
    for (sv_index r = 0; r < n; r++, x += SV_PANEL_ROW, y += SV_PANEL_ROW)
        for (int c = 0; c < SV_PANEL_COLUMNS; c++)
            sums[c] += x[c] * y[c] + x[SV_PANEL_COLUMNS + c] * y[SV_PANEL_COLUMNS + c];
}

/* moments[k] += 2⟨u|v⟩ − ⟨x|T_(0 or 1) x⟩ for every column. */
static void add_moment(const double *u, const double *v, sv_index n, const double *first, int k,
                       double *moments)
{
    double sums[SV_PANEL_COLUMNS];
    overlaps(u, v, n, sums);
    for (int c = 0; c < SV_PANEL_COLUMNS; c++)
        moments[k * SV_PANEL_COLUMNS + c] += 2.0 * sums[c] - first[c];
}

/* Adds ⟨x|T_k(A)|x⟩ of one panel. The panel x is overwritten. */
static void add_panel(const sv_packed *a, panel_step step, int count, double *x, double *other,
                      double *moments)
{
    double zeroth[SV_PANEL_COLUMNS], first[SV_PANEL_COLUMNS];
    double *before = x, *now = other;
    memset(now, 0, (size_t)(a->n * SV_PANEL_ROW) * sizeof *now);
    /* Nothing is summed up: with weight 0 the sum may be the vector itself. */
    step(a, 0, a->n, before, now, now, 1.0, 0.0);
    overlaps(before, before, a->n, zeroth);
    overlaps(before, now, a->n, first);
    for (int c = 0; c < SV_PANEL_COLUMNS; c++) {
        moments[c] += zeroth[c];
        if (count > 1)
            moments[SV_PANEL_COLUMNS + c] += first[c];
    }
    for (int k = 1; 2 * k < count; k++) { /* before = T_{k−1} x, now = T_k x */
        add_moment(now, now, a->n, zeroth, 2 * k, moments);
        if (2 * k + 1 >= count)
            break;
        step(a, 0, a->n, now, before, before, 2.0, 0.0);
        add_moment(before, now, a->n, first, 2 * k + 1, moments);
        double *swap = before;
        before = now;
        now = swap;
    }
}

/* Divides by the weight of the start vectors; the exact trace is the same in all columns. */
static void normalise(sv_index n, int count, int panels, double *moments)
{
    for (int k = 0; k < count; k++) {
        double *row = moments + k * SV_PANEL_COLUMNS, sum = 0.0;
        for (int c = 0; c < SV_PANEL_COLUMNS; c++) {
            sum += row[c];
            row[c] /= (double)n * panels;
        }
        for (int c = 0; c < SV_PANEL_COLUMNS && panels == 0; c++)
            row[c] = sum / (double)n;
    }
}

sv_status sv_chebyshev_moments(sv_context *context, const sv_packed *a, int count, int panels,
                               const sv_stream *stream, double *ret_moments)
{
    sv_index n = a->n, rounds = panels > 0 ? panels : (n + SV_PANEL_COLUMNS - 1) / SV_PANEL_COLUMNS;
    double *block = NULL;
    panel_step step = choose_step();
    if (count < 1 || panels < 0 || n < 1)
        return SV_FAIL(context, SV_INVALID_INPUT, "%d moments of a matrix of order %lld", count,
                       (long long)n);
    sv_status status = sv_take_raw(context, 2 * n * SV_PANEL_ROW, sizeof *block, &block);
    if (status != SV_OK)
        return status;
    memset(ret_moments, 0, (size_t)count * SV_PANEL_COLUMNS * sizeof *ret_moments);
    for (sv_index p = 0; p < rounds && status == SV_OK; p++) {
        if (panels > 0)
            fill_phases(block, n, (int)p, stream);
        else
            fill_units(block, n, p * SV_PANEL_COLUMNS);
        add_panel(a, step, count, block, block + n * SV_PANEL_ROW, ret_moments);
        sv_progress(context, "density of states", p + 1, rounds);
        if (sv_cancelled(context))
            status = SV_FAIL(context, SV_INTERRUPTED, "stopped during a density of states");
    }
    normalise(n, count, panels, ret_moments);
    for (int k = 0; k < count * SV_PANEL_COLUMNS && status == SV_OK; k++)
        if (!(fabs(ret_moments[k]) <= 1.0 + EXCESS))
            status = SV_FAIL(context, SV_NUMERICAL,
                             "the moments grow: levels lie outside the bounds of the spectrum");
    sv_give(context, block);
    return status;
}

void sv_jackson_kernel(int count, double *ret_kernel)
{
    double step = M_PI / (count + 1.0);
    for (int k = 0; k < count; k++)
        ret_kernel[k] =
            ((count - k + 1) * cos(step * k) + sin(step * k) / tan(step)) / (count + 1.0);
}

sv_status sv_chebyshev_density(sv_context *context, const double *moments, int count, int stride,
                               double centre, double half_width, const double *energies,
                               sv_index n_energies, double *ret_density)
{
    double *series = NULL;
    sv_status status = sv_take(context, count, sizeof *series, &series);
    if (status != SV_OK)
        return status;
    sv_jackson_kernel(count, series);
    for (int k = 0; k < count; k++)
        series[k] *= (k == 0 ? 1.0 : 2.0) * moments[k * stride];
    for (sv_index e = 0; e < n_energies; e++) {
        double x = (energies[e] - centre) / half_width, b1 = 0.0, b2 = 0.0;
        for (int k = count - 1; k >= 1; k--) { /* Clenshaw */
            double b0 = 2.0 * x * b1 - b2 + series[k];
            b2 = b1;
            b1 = b0;
        }
        double sum = x * b1 - b2 + series[0];
        ret_density[e] = fabs(x) < 1.0 ? sum / (M_PI * half_width * sqrt(1.0 - x * x)) : 0.0;
    }
    sv_give(context, series);
    return SV_OK;
}
