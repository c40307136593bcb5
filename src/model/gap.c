/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Gaps of the pristine torus, from the bands over the Brillouin zone. */
#include "selvedge/model.h"

#include <math.h>
#include <stdio.h>
#include <string.h>

#define lapack_complex_double double _Complex
#define lapack_complex_float  float _Complex
#include <lapacke.h>

/* Bands of a magnetic cell that are still worth their eigenvalues. */
enum { MOST_BANDS = 200, STARTS = 4 };

/* The model without flux on a cell enlarged along a1, and work space for its bands. */
typedef struct bands {
    sv_model wide;
    int n, grid[2];
    double range[2]; /* the bands repeat in k with these periods */
    sv_complex *matrix;
    double *energy; /* grid points × n */
    double *here;   /* n */
    sv_complex *work;
    double *real_work;
} bands;

static int64_t common_divisor(int64_t a, int64_t b)
{
    while (b != 0) {
        int64_t rest = a % b;
        a = b;
        b = rest;
    }
    return a < 0 ? -a : a;
}

/* One hop that starts in plain cell i of the enlarged cell, with its phase in the gauge of
 * conventions.h; leaving the enlarged cell by `turn` multiplies by exp(2πi p turn v). */
static sv_status add_wide_hop(sv_context *context, const sv_model *model, const sv_hop *hop, int i,
                              int p, int q, sv_model *wide)
{
    double from[2], to[2];
    sv_model_reduce(model, model->orbitals[hop->from].at, from);
    sv_model_reduce(model, model->orbitals[hop->to].at, to);
    int end = i + hop->shift[0], turn = end >= 0 ? end / q : -((q - 1 - end) / q);
    double u = i + 0.5 * (from[0] + to[0] + hop->shift[0]), v = to[1] + hop->shift[1];
    double turns = (double)p / q * -u * (v - from[1]) + (double)p * turn * v;
    double angle = 2.0 * M_PI * (turns - floor(turns));
    return sv_model_add_hop(context, wide, i * model->n_orbitals + hop->from,
                            (end - turn * q) * model->n_orbitals + hop->to, turn, hop->shift[1],
                            hop->amplitude * CMPLX(cos(angle), sin(angle)));
}

static sv_status enlarge(sv_context *context, const sv_model *model, int p, int q, sv_model *wide)
{
    const double *a1 = model->vectors[0];
    sv_status status = sv_model_begin(
        context, "magnetic cell", (const double[2]){q * a1[0], q * a1[1]}, model->vectors[1], wide);
    for (int i = 0; i < q && status == SV_OK; i++)
        for (int o = 0; o < model->n_orbitals && status == SV_OK; o++) {
            const sv_orbital *orbital = &model->orbitals[o];
            char name[32];
            snprintf(name, sizeof name, "%d.%d", i, o);
            status = sv_model_add_orbital(context, wide, name, orbital->at[0] + i * a1[0],
                                          orbital->at[1] + i * a1[1], orbital->onsite);
        }
    for (int i = 0; i < q && status == SV_OK; i++)
        for (int h = 0; h < model->n_hops && status == SV_OK; h++)
            status = add_wide_hop(context, model, &model->hops[h], i, p, q, wide);
    return status == SV_OK ? sv_model_finish(context, wide) : status;
}

static sv_status band_energies(sv_context *context, bands *b, const double k[2], double *energy)
{
    sv_model_bloch(&b->wide, k, b->matrix);
    lapack_int info = LAPACKE_zheev_work(LAPACK_COL_MAJOR, 'N', 'L', b->n, b->matrix, b->n, energy,
                                         b->work, 8 * b->n, b->real_work);
    if (info != 0)
        return SV_FAIL(context, SV_NUMERICAL, "zheev failed with code %d", (int)info);
    return SV_OK;
}

static void grid_point(const bands *b, int point, double k[2])
{
    k[0] = b->range[0] * (point / b->grid[1]) / b->grid[0];
    k[1] = b->range[1] * (point % b->grid[1]) / b->grid[1];
}

static void free_bands(sv_context *context, bands *b)
{
    sv_model_free(context, &b->wide);
    sv_give(context, b->matrix);
    sv_give(context, b->energy);
    sv_give(context, b->here);
    sv_give(context, b->work);
    sv_give(context, b->real_work);
}

static sv_status make_bands(sv_context *context, const sv_model *model, bands *b)
{
    int64_t divisor = common_divisor(model->flux[0], model->flux[1]);
    int p = (int)(model->flux[0] / divisor), q = (int)(model->flux[1] / divisor);
    sv_status status;
    if (model->n_rules > 0)
        return SV_FAIL(context, SV_UNDEFINED, "a model of hops by distance has no bands");
    if ((int64_t)q * model->n_orbitals > MOST_BANDS)
        return SV_FAIL(context, SV_UNDEFINED, "more than %d bands of the pristine torus",
                       MOST_BANDS);
    if ((status = enlarge(context, model, p, q, &b->wide)) != SV_OK)
        return status;
    sv_index n = b->n = b->wide.n_orbitals;
    /* A multiple of 12 holds the symmetric points; a magnetic cell has a q² times smaller zone. */
    b->grid[0] = b->grid[1] = q == 1 ? 36 : 12;
    b->range[0] = 2.0 * M_PI;
    b->range[1] = 2.0 * M_PI / q;
    if ((status = sv_take_raw(context, n * n, sizeof *b->matrix, &b->matrix)) != SV_OK ||
        (status = sv_take_raw(context, n * b->grid[0] * b->grid[1], sizeof *b->energy,
                              &b->energy)) != SV_OK ||
        (status = sv_take_raw(context, n, sizeof *b->here, &b->here)) != SV_OK ||
        (status = sv_take_raw(context, 8 * n, sizeof *b->work, &b->work)) != SV_OK ||
        (status = sv_take_raw(context, 3 * n, sizeof *b->real_work, &b->real_work)) != SV_OK)
        return status;
    for (int point = 0; point < b->grid[0] * b->grid[1] && status == SV_OK; point++) {
        double k[2];
        grid_point(b, point, k);
        status = band_energies(context, b, k, b->energy + point * n);
    }
    return status;
}

/* Walks downhill on sign·E_band from k, halving the step whenever none of eight points is lower. */
static sv_status descend(sv_context *context, bands *b, int band, double sign, double k[2],
                         double *ret_least)
{
    double least = INFINITY, step = b->range[1] / b->grid[1], ratio = b->range[0] / b->range[1];
    sv_status status = band_energies(context, b, k, b->here);
    if (status == SV_OK)
        least = sign * b->here[band];
    while (status == SV_OK && step > 1e-5) {
        double best[2] = {k[0], k[1]}, lower = least;
        for (int d = 0; d < 9 && status == SV_OK; d++) {
            double trial[2] = {k[0] + (d / 3 - 1) * step * ratio, k[1] + (d % 3 - 1) * step};
            if (d == 4 || (status = band_energies(context, b, trial, b->here)) != SV_OK)
                continue;
            if (sign * b->here[band] < lower) {
                lower = sign * b->here[band];
                memcpy(best, trial, sizeof best);
            }
        }
        if (lower >= least)
            step *= 0.5;
        memcpy(k, best, sizeof best);
        least = lower;
    }
    *ret_least = least;
    return status;
}

/* Least value of sign·E_band: descends from the lowest points of the grid. */
static sv_status band_edge(sv_context *context, bands *b, int band, double sign, double *ret_edge)
{
    int points = b->grid[0] * b->grid[1], start[STARTS];
    double least = INFINITY;
    for (int s = 0; s < STARTS; s++) {
        start[s] = -1;
        for (int p = 0; p < points; p++) {
            bool used = false;
            for (int t = 0; t < s; t++)
                used = used || start[t] == p;
            if (!used && (start[s] < 0 || sign * b->energy[p * b->n + band] <
                                              sign * b->energy[start[s] * b->n + band]))
                start[s] = p;
        }
        double k[2], found;
        grid_point(b, start[s], k);
        sv_status status = descend(context, b, band, sign, k, &found);
        if (status != SV_OK)
            return status;
        least = fmin(least, found);
    }
    *ret_edge = sign * least;
    return SV_OK;
}

/* Edges of the gap above the lowest `filled` bands. */
static sv_status gap_edges(sv_context *context, bands *b, int filled, double edge[2])
{
    sv_status status = SV_OK;
    edge[0] = -INFINITY;
    edge[1] = INFINITY;
    if (filled > 0)
        status = band_edge(context, b, filled - 1, -1.0, &edge[0]);
    if (status == SV_OK && filled < b->n)
        status = band_edge(context, b, filled, 1.0, &edge[1]);
    return status;
}

static int bands_below(const double *energy, int n, double level)
{
    int below = 0;
    while (below < n && energy[below] < level)
        below++;
    return below;
}

sv_status sv_model_spectral_distance(sv_context *context, const sv_model *model, double energy,
                                     double *ret_distance)
{
    bands b = {0};
    double edge[2], distance = 0.0;
    sv_status status = make_bands(context, model, &b);
    if (status != SV_OK)
        goto out;
    int filled = bands_below(b.energy, b.n, energy);
    for (int p = 1; p < b.grid[0] * b.grid[1]; p++)
        if (bands_below(b.energy + p * b.n, b.n, energy) != filled)
            goto done; /* a band crosses the energy */
    if ((status = gap_edges(context, &b, filled, edge)) != SV_OK)
        goto out;
    distance = fmax(0.0, fmin(energy - edge[0], edge[1] - energy));
done:
    *ret_distance = distance;
out:
    free_bands(context, &b);
    return status;
}

sv_status sv_model_filling_gap(sv_context *context, const sv_model *model, double filling,
                               double tolerance, double ret_edges[2])
{
    bands b = {0};
    double edge[2];
    sv_status status = make_bands(context, model, &b);
    if (status != SV_OK)
        goto out;
    double filled = round(filling * b.n);
    if (fabs(filled - filling * b.n) > tolerance * b.n || filled < 0 || filled > b.n) {
        status = SV_FAIL(context, SV_UNDEFINED, "a filling of %.6g leaves a band partly filled",
                         filling);
        goto out;
    }
    if ((status = gap_edges(context, &b, (int)filled, edge)) != SV_OK)
        goto out;
    memcpy(ret_edges, edge, sizeof edge);
out:
    free_bands(context, &b);
    return status;
}
