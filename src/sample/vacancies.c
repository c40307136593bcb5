/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Vacancies: independent, an exact number, clustered, or with a minimum distance. Every position of
 * the plane has one number u; the rules differ in what they compare it with. */
#include "sample_internal.h"

#include <math.h>
#include <stdlib.h>

#include <gsl/gsl_sf_expint.h>

enum { BINS = 1 << 16 };
static const double REACH = 6.0; /* of a cluster, in radii */

/* A candidate and its number. */
typedef struct candidate {
    double u;
    sv_index site; /* first site at the position */
} candidate;

/* Vacancies have a number per position, adatoms per orbital. */
static double number_of(const sv_drawing *d, const sv_stream *stream, sv_index site)
{
    const sv_cell *cell = &d->flake->cells[d->flake->sites[site].cell];
    bool by_orbital = d->disorder[d->entry].type == SV_DISORDER_ADATOMS;
    return sv_position_uniform(stream, cell->i, cell->j,
                               by_orbital ? d->flake->sites[site].orbital
                                          : sv_position_of(d->flake, site));
}

static void draw_share(sv_drawing *d, const sv_disorder *disorder, const sv_stream *stream)
{
    for (sv_index s = 0; s < d->flake->n_sites; s++)
        if (sv_is_candidate(d, disorder, s) && number_of(d, stream, s) < disorder->share)
            sv_vacate(d, s);
}

static int compare_candidates(const void *a, const void *b)
{
    const candidate *x = a, *y = b;
    if (x->u != y->u)
        return x->u < y->u ? -1 : 1;
    return x->site < y->site ? -1 : x->site > y->site;
}

static bool may_take(const sv_drawing *d, const sv_disorder *disorder, const bool *kept, sv_index s)
{
    if (disorder->type == SV_DISORDER_ADATOMS)
        return !d->gone[s] && (disorder->on < 0 || disorder->on == d->flake->sites[s].orbital);
    return sv_is_candidate(d, disorder, s) && (kept == NULL || kept[s]);
}

/* Counts numbers by bin; the bin in which the wanted number of them is reached is sorted alone. */
static sv_index count_bins(const sv_drawing *d, const sv_disorder *disorder,
                           const sv_stream *stream, const bool *kept, sv_index *bins)
{
    sv_index n = 0;
    for (sv_index s = 0; s < d->flake->n_sites; s++) {
        if (!may_take(d, disorder, kept, s))
            continue;
        bins[(int)(number_of(d, stream, s) * BINS)]++;
        n++;
    }
    return n;
}

static sv_status take_smallest(sv_context *context, sv_drawing *d, const sv_disorder *disorder,
                               const sv_stream *stream, const bool *kept, const sv_index *bins,
                               void (*take)(sv_drawing *, sv_index))
{
    int last = 0;
    sv_index below = 0, n = 0;
    candidate *list = NULL;
    while (last < BINS - 1 && below + bins[last] < disorder->count)
        below += bins[last++];
    sv_status status = sv_take_raw(context, bins[last] + 1, sizeof *list, &list);
    if (status != SV_OK)
        return status;
    for (sv_index s = 0; s < d->flake->n_sites; s++) {
        if (!may_take(d, disorder, kept, s))
            continue;
        double u = number_of(d, stream, s);
        if ((int)(u * BINS) < last)
            take(d, s);
        else if ((int)(u * BINS) == last)
            list[n++] = (candidate){u, s};
    }
    qsort(list, (size_t)n, sizeof *list, compare_candidates);
    for (sv_index k = 0; k < disorder->count - below; k++)
        take(d, list[k].site);
    sv_give(context, list);
    return SV_OK;
}

sv_status sv_draw_count(sv_context *context, sv_drawing *d, const sv_disorder *disorder,
                        const sv_stream *stream, const bool *kept,
                        void (*take)(sv_drawing *, sv_index))
{
    sv_index *bins = NULL;
    sv_status status = sv_take(context, BINS, sizeof *bins, &bins);
    if (status != SV_OK || disorder->count == 0) {
        sv_give(context, bins);
        return status;
    }
    sv_index n = count_bins(d, disorder, stream, kept, bins);
    if (disorder->count > n)
        status = SV_FAIL(context, SV_INVALID_INPUT,
                         "disorder \"%s\" asks for %lld defects; %lld positions are there%s",
                         disorder->name, (long long)disorder->count, (long long)n,
                         kept != NULL ? " at its minimum distance" : "");
    else
        status = take_smallest(context, d, disorder, stream, kept, bins, take);
    sv_give(context, bins);
    return status;
}

/*
 * Clusters: parents are Poisson, and one at p adds the intensity (μ/2πσ²) exp(−|r − p|²/(2σ²)) of
 * its μ daughters (M. Thomas 1949; Neyman and Scott 1958; names and years recalled from memory). A
 * position of area a is vacant when at least one daughter falls on it, with probability 1 − exp(−a
 * Λ(r)). The density of parents is the one that makes the mean of that the share asked for: 1 −
 * share = exp(−κ 2πσ² Ein(b)),  b = a μ/(2πσ²),  Ein(b) = γ + ln b + E1(b).
 */
static double parent_density(const sv_disorder *disorder, double b)
{
    const double euler = 0.57721566490153286;
    double radius = disorder->cluster_radius;
    /* E1(700) = 1e-307: GSL ends the program on an underflow. */
    double rest = b >= 1e-4 && b < 700.0 ? gsl_sf_expint_E1(b) : 0.0;
    double ein = b < 1e-4 ? b * (1.0 - b / 4.0) : euler + log(b) + rest;
    return -log1p(-fmin(disorder->share, 1.0 - 1e-15)) / (2.0 * M_PI * radius * radius * ein);
}

static void add_parent(const sv_drawing *d, const sv_disorder *disorder, const sv_point *parent,
                       double b, double *intensity)
{
    const sv_flake *flake = d->flake;
    double radius = disorder->cluster_radius, reach = REACH * radius;
    sv_patch patch = sv_flake_patch(flake, parent->at, reach);
    for (int32_t i = patch.low[0]; i <= patch.high[0]; i++) {
        for (int32_t j = patch.low[1]; j <= patch.high[1]; j++) {
            int32_t number = sv_flake_look_up(flake, i, j);
            if (number < 0)
                continue;
            const sv_cell *cell = &flake->cells[number];
            for (sv_index s = cell->first_site; s < cell->first_site + cell->n_sites; s++) {
                double x = flake->sites[s].at[0] - parent->at[0];
                double y = flake->sites[s].at[1] - parent->at[1];
                double r2 = x * x + y * y;
                if (r2 < reach * reach)
                    intensity[s] += b * exp(-r2 / (2.0 * radius * radius));
            }
        }
    }
}

sv_status sv_draw_clustered(sv_context *context, sv_drawing *d, const sv_disorder *disorder,
                            const sv_stream *stream)
{
    const sv_model *model = d->flake->model;
    int matching = 0;
    for (int p = 0; p < model->n_positions; p++)
        matching += sv_position_matches(model, p, disorder->on);
    double radius = disorder->cluster_radius, area = sv_model_cell_area(model) / matching;
    double b = area * disorder->cluster_size / (2.0 * M_PI * radius * radius);
    double *intensity = NULL;
    sv_point *parents = NULL;
    sv_index n = 0;
    sv_status status = sv_take(context, d->flake->n_sites, sizeof *intensity, &intensity);
    if (status == SV_OK)
        status = sv_points_draw(context, d->flake, stream, parent_density(disorder, b),
                                REACH * radius, &parents, &n);
    for (sv_index k = 0; k < n; k++)
        add_parent(d, disorder, &parents[k], b, intensity);
    for (sv_index s = 0; status == SV_OK && s < d->flake->n_sites; s++)
        if (sv_is_candidate(d, disorder, s) && number_of(d, stream, s) < -expm1(-intensity[s]))
            sv_vacate(d, s);
    sv_give(context, parents);
    sv_give(context, intensity);
    return status;
}

sv_status sv_draw_vacancies(sv_context *context, sv_drawing *d, const sv_disorder *disorder,
                            const sv_stream *stream)
{
    if (disorder->has_marks)
        sv_vacate_marks(d, disorder);
    if (disorder->has_grid)
        sv_vacate_grid(d, disorder);
    if (disorder->distance > 0.0)
        return sv_draw_spaced(context, d, disorder, stream);
    if (disorder->cluster_size > 0.0)
        return sv_draw_clustered(context, d, disorder, stream);
    if (disorder->has_share)
        draw_share(d, disorder, stream);
    if (disorder->has_count)
        return sv_draw_count(context, d, disorder, stream, NULL, sv_vacate);
    return SV_OK;
}
