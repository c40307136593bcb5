/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Marker against Fermi energy: thermal means, and how wide the quantised window is. */
#include <math.h>
#include <stdlib.h>
#include <string.h>

#include "study_internal.h"

enum { N_RESAMPLES = 1000 };
static const char PURPOSE[] = "plateau bootstrap";
/* Beyond this many kT the thermal window holds 3e-7 of its weight. */
static const double WINDOW_REACH = 15.0;

/* Fermi function and ∫ f du from u to infinity, both without overflow. */
static double fermi(double u)
{
    return u > 0.0 ? exp(-u) / (1.0 + exp(-u)) : 1.0 / (1.0 + exp(u));
}

static double fermi_tail(double u)
{
    return u > 0.0 ? log1p(exp(-u)) : log1p(exp(u)) - u;
}

/* ∫ (−f′) and ∫ (u − a)(−f′)/(b − a) over a … b: the weights of both ends of a straight piece. */
static void piece_weights(double a, double b, double ret[2])
{
    double whole = fermi(a) - fermi(b);
    /* by parts: ∫ (u − a)(−f′) = −(b − a) f(b) + ∫ f */
    double rising = (fermi_tail(a) - fermi_tail(b) - (b - a) * fermi(b)) / (b - a);
    ret[1] = rising;
    ret[0] = whole - rising;
}

bool sv_thermal_weights(const double *energies, int64_t n, double thermal_energy, int64_t at,
                        double *ret_weights)
{
    memset(ret_weights, 0, (size_t)n * sizeof *ret_weights);
    if (!(thermal_energy > 0.0)) {
        ret_weights[at] = 1.0;
        return true;
    }
    double reach = WINDOW_REACH * thermal_energy;
    if (energies[at] - reach < energies[0] || energies[at] + reach > energies[n - 1])
        return false;
    for (int64_t k = 0; k + 1 < n; k++) {
        double a = (energies[k] - energies[at]) / thermal_energy;
        double b = (energies[k + 1] - energies[at]) / thermal_energy, piece[2];
        piece_weights(a, b, piece);
        ret_weights[k] += piece[0];
        ret_weights[k + 1] += piece[1];
    }
    return true;
}

/* Where the piecewise straight curve leaves the band, going from `at` in direction `step`. */
static double edge_from(const double *energies, const double *curve, int64_t n, int64_t at,
                        int step, double centre, double within, bool *ret_open)
{
    int64_t k = at;
    while (k + step >= 0 && k + step < n && fabs(curve[k + step] - centre) <= within)
        k += step;
    *ret_open = k + step < 0 || k + step >= n || isnan(curve[k + step]);
    if (*ret_open)
        return energies[k];
    double limit = curve[k + step] > centre ? centre + within : centre - within;
    double part = (limit - curve[k]) / (curve[k + step] - curve[k]);
    return energies[k] + part * (energies[k + step] - energies[k]);
}

/* The window about the grid point nearest to `about`; false when that one is outside the band. */
static bool window_about(const double *energies, const double *curve, int64_t n, double about,
                         double centre, double within, double ret[2], bool ret_open[2])
{
    int64_t at = 0;
    for (int64_t k = 1; k < n; k++)
        if (fabs(energies[k] - about) < fabs(energies[at] - about))
            at = k;
    if (!(fabs(curve[at] - centre) <= within))
        return false;
    ret[0] = edge_from(energies, curve, n, at, -1, centre, within, &ret_open[0]);
    ret[1] = edge_from(energies, curve, n, at, 1, centre, within, &ret_open[1]);
    return true;
}

static void mean_curve(const double *values, int64_t n, int64_t realisations, const int64_t *picks,
                       double *ret_curve)
{
    for (int64_t k = 0; k < n; k++) {
        double sum = 0.0;
        int64_t count = 0;
        for (int64_t r = 0; r < realisations; r++) {
            double v = values[(picks != NULL ? picks[r] : r) * n + k];
            if (isnan(v))
                continue;
            sum += v;
            count++;
        }
        ret_curve[k] = count > 0 ? sum / (double)count : (double)NAN;
    }
}

static int by_size(const void *a, const void *b)
{
    double x = *(const double *)a, y = *(const double *)b;
    return (x > y) - (x < y);
}

/* Widths of resampled means: realisations are drawn whole, since the same sample serves all
 * energies. A resample without a window counts as width 0. */
static void resample(const sv_plateau_input *in, double *curve, int64_t *picks, double *widths)
{
    for (int b = 0; b < N_RESAMPLES; b++) {
        sv_stream stream = sv_stream_make(in->seed, PURPOSE, b);
        double edges[2];
        bool open[2];
        for (int64_t r = 0; r < in->realisations; r++)
            picks[r] =
                (int64_t)(sv_stream_uniform(&stream, (int32_t)r, 0, 0) * (double)in->realisations);
        mean_curve(in->values, in->n, in->realisations, picks, curve);
        widths[b] =
            window_about(in->energies, curve, in->n, in->about, in->clean, in->within, edges, open)
                ? edges[1] - edges[0]
                : 0.0;
    }
    qsort(widths, N_RESAMPLES, sizeof *widths, by_size);
}

static sv_status check(sv_context *context, const sv_plateau_input *in)
{
    if (in->n < 2 || in->realisations < 1)
        return SV_FAIL(context, SV_INVALID_INPUT, "%lld energies of %lld realisations",
                       (long long)in->n, (long long)in->realisations);
    for (int64_t k = 0; k + 1 < in->n; k++)
        if (!(in->energies[k] < in->energies[k + 1]))
            return SV_FAIL(context, SV_INVALID_INPUT, "energies must ascend");
    if (!(in->within > 0.0) || !isfinite(in->clean))
        return SV_FAIL(context, SV_INVALID_INPUT, "a band of %g about %g", in->within, in->clean);
    return SV_OK;
}

sv_status sv_plateau_measure(sv_context *context, const sv_plateau_input *in,
                             sv_plateau *ret_plateau)
{
    sv_plateau plateau = {.width = NAN, .centre = NAN, .interval = {NAN, NAN}, .edges = {NAN, NAN}};
    double *curve = NULL, *widths = NULL;
    int64_t *picks = NULL;
    sv_status status = check(context, in);
    if (status == SV_OK)
        status = sv_take(context, in->n, sizeof *curve, &curve);
    if (status == SV_OK)
        status = sv_take(context, N_RESAMPLES, sizeof *widths, &widths);
    if (status == SV_OK)
        status = sv_take(context, in->realisations, sizeof *picks, &picks);
    if (status != SV_OK)
        goto out;
    mean_curve(in->values, in->n, in->realisations, NULL, curve);
    plateau.exists = window_about(in->energies, curve, in->n, in->about, in->clean, in->within,
                                  plateau.edges, plateau.open);
    if (plateau.exists) {
        plateau.width = plateau.edges[1] - plateau.edges[0];
        plateau.centre = 0.5 * (plateau.edges[0] + plateau.edges[1]);
    }
    if (plateau.exists && in->realisations > 1) {
        double tail = 0.5 * (1.0 - in->confidence);
        resample(in, curve, picks, widths);
        plateau.interval[0] = sv_quantile_sorted(widths, N_RESAMPLES, tail);
        plateau.interval[1] = sv_quantile_sorted(widths, N_RESAMPLES, 1.0 - tail);
    }
    *ret_plateau = plateau;
out:
    sv_give(context, curve);
    sv_give(context, widths);
    sv_give(context, picks);
    return status;
}
