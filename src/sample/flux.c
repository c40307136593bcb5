/* SPDX-License-Identifier: GPL-3.0-or-later */
/*
 * Random magnetic flux, constant within each cell. The vector potential is given by its line
 * integrals a_u(i, j) and a_v(i, j) along the edges of the cells, and interpolated linearly between
 * opposite edges (H. Whitney's forms, name recalled from memory), so that
 *   flux(i, j) = a_u(i, j) + a_v(i + 1, j) − a_u(i, j + 1) − a_v(i, j)
 * goes through every part of the cell alike. Hops get the exact integral along their straight line.
 *
 * balanced: the edges are independent gaussians of standard deviation width/2. A flux then has
 * width; neighbours have correlation −1/4, and a torus has total flux 0. Nothing depends on the
 * flake. independent: the fluxes themselves are independent; a_u = 0, and a_v adds them up from i =
 * 0.
 */
#include "sample_internal.h"

#include <math.h>
#include <stdlib.h>

enum { MOST_PIECES = 64 };

/* How far a hop reaches beyond the cell where it starts, in cells. */
static int reach_of(const sv_model *model)
{
    double reach = 0.0;
    for (int h = 0; h < model->n_hops; h++) {
        const sv_hop *hop = &model->hops[h];
        double from[2], to[2];
        sv_model_reduce(model, model->orbitals[hop->from].at, from);
        sv_model_reduce(model, model->orbitals[hop->to].at, to);
        for (int k = 0; k < 2; k++)
            reach = fmax(reach, fmax(fabs(from[k]), fabs(to[k] + hop->shift[k])));
    }
    return (int)ceil(reach) + 1;
}

static sv_status take_edges(sv_context *context, sv_drawing *d)
{
    sv_bonds *bonds = &d->bonds;
    const sv_flake *flake = d->flake;
    sv_status status = sv_draw_hopping(context, d, NULL, NULL); /* classes of hops */
    int reach = reach_of(flake->model);
    if (status != SV_OK || bonds->edges[0] != NULL)
        return status;
    if (2 * reach + 2 > MOST_PIECES / 2)
        return SV_FAIL(context, SV_INVALID_INPUT, "random flux needs hops over fewer than %d cells",
                       MOST_PIECES / 4 - 2);
    for (int k = 0; k < 2; k++) {
        bonds->edge_low[k] = flake->low[k] - reach;
        bonds->edge_count[k] = flake->high[k] - flake->low[k] + 2 * reach + 2;
    }
    sv_index n = (sv_index)bonds->edge_count[0] * bonds->edge_count[1];
    if ((status = sv_take(context, n, sizeof *bonds->edges[0], &bonds->edges[0])) == SV_OK)
        status = sv_take(context, n, sizeof *bonds->edges[1], &bonds->edges[1]);
    return status;
}

/* On a torus an edge beyond the seam is the one where it comes back in. */
static void add_balanced(sv_drawing *d, const sv_disorder *disorder, const sv_stream *stream)
{
    sv_bonds *bonds = &d->bonds;
    for (int32_t i = 0; i < bonds->edge_count[0]; i++) {
        for (int32_t j = 0; j < bonds->edge_count[1]; j++) {
            int32_t at[2] = {i + bonds->edge_low[0], j + bonds->edge_low[1]};
            landing place = sv_flake_land(d->flake, at[0], at[1]);
            if (place.cell >= 0) {
                at[0] = d->flake->cells[place.cell].i;
                at[1] = d->flake->cells[place.cell].j;
            }
            for (uint32_t k = 0; k < 2; k++)
                bonds->edges[k][(sv_index)i * bonds->edge_count[1] + j] +=
                    0.5 * disorder->width * sv_stream_normal(stream, at[0], at[1], k);
        }
    }
}

static double flux_of(const sv_disorder *disorder, const sv_stream *stream, int32_t i, int32_t j)
{
    return disorder->width *
           sv_standard_value(disorder->distribution, sv_stream_uniform(stream, i, j, 0));
}

static void add_independent(sv_drawing *d, const sv_disorder *disorder, const sv_stream *stream)
{
    sv_bonds *bonds = &d->bonds;
    int32_t low = bonds->edge_low[0], high = low + bonds->edge_count[0] - 1;
    for (int32_t j = 0; j < bonds->edge_count[1]; j++) {
        int32_t row = j + bonds->edge_low[1];
        double sum = 0.0;
        for (int32_t i = 0; i <= high; i++) {
            if (i >= low)
                bonds->edges[1][(sv_index)(i - low) * bonds->edge_count[1] + j] += sum;
            sum += flux_of(disorder, stream, i, row);
        }
        sum = 0.0;
        for (int32_t i = -1; i >= low; i--) {
            sum -= flux_of(disorder, stream, i, row);
            if (i <= high)
                bonds->edges[1][(sv_index)(i - low) * bonds->edge_count[1] + j] += sum;
        }
    }
}

sv_status sv_draw_flux(sv_context *context, sv_drawing *d, const sv_disorder *disorder,
                       const sv_stream *stream)
{
    if (disorder->independent && (d->flake->periodic[0] || d->flake->periodic[1]))
        return SV_FAIL(context, SV_INVALID_INPUT,
                       "disorder \"%s\": independent fluxes do not fit a periodic flake",
                       disorder->name);
    sv_status status = take_edges(context, d);
    if (status != SV_OK)
        return status;
    if (disorder->independent)
        add_independent(d, disorder, stream);
    else
        add_balanced(d, disorder, stream);
    return SV_OK;
}

static int compare(const void *a, const void *b)
{
    double x = *(const double *)a, y = *(const double *)b;
    return x < y ? -1 : x > y;
}

/* Where a line crosses from cell to cell, as shares of it: 0, …, 1 in order. */
static int crossings(const double from[2], const double to[2], double ret[MOST_PIECES])
{
    int n = 0;
    ret[n++] = 0.0;
    for (int k = 0; k < 2; k++) {
        double low = fmin(from[k], to[k]), high = fmax(from[k], to[k]);
        for (double edge = floor(low) + 1.0; edge < high && n < MOST_PIECES - 1; edge += 1.0)
            ret[n++] = (edge - from[k]) / (to[k] - from[k]);
    }
    ret[n++] = 1.0;
    qsort(ret, (size_t)n, sizeof *ret, compare);
    return n;
}

/* A is linear along each piece, so its value in the middle gives the integral. */
double sv_flux_along(const sv_bonds *bonds, const double from[2], const double to[2])
{
    double t[MOST_PIECES], sum = 0.0;
    int n = crossings(from, to, t);
    for (int k = 0; k + 1 < n; k++) {
        double middle = 0.5 * (t[k] + t[k + 1]), length = t[k + 1] - t[k];
        double u = from[0] + middle * (to[0] - from[0]), v = from[1] + middle * (to[1] - from[1]);
        double i = floor(u), j = floor(v);
        sv_index at = (sv_index)(i - bonds->edge_low[0]) * bonds->edge_count[1] +
                      (sv_index)(j - bonds->edge_low[1]);
        const double *au = bonds->edges[0], *av = bonds->edges[1];
        double along_u = au[at] * (1.0 - (v - j)) + au[at + 1] * (v - j);
        double along_v = av[at] * (1.0 - (u - i)) + av[at + bonds->edge_count[1]] * (u - i);
        sum += length * (along_u * (to[0] - from[0]) + along_v * (to[1] - from[1]));
    }
    return sum;
}
