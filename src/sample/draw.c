/* SPDX-License-Identifier: GPL-3.0-or-later */
/* One realisation: which sites are gone, which energies are added. Random numbers depend on the
 * cell and the name of the disorder only, so boundaries, sizes and sweeps share them. */
#include "sample_internal.h"

#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include <gsl/gsl_cdf.h>

static const uint32_t SLOT_OF_CELL = UINT32_MAX; /* one number for all orbitals of a cell */

/* The realisation while it is being drawn, by pristine site. */
typedef struct drawing {
    const sv_flake *flake;
    bool *gone;
    double *potential;
    sv_inventory inventory;
} drawing;

/* A candidate for a vacancy and its random number. */
typedef struct candidate {
    double u;
    sv_index site; /* first site at the position */
} candidate;

static int position_of(const sv_flake *flake, sv_index site)
{
    return flake->model->orbitals[flake->sites[site].orbital].position;
}

/* Does any orbital at this position match `on`? */
static bool position_matches(const sv_flake *flake, int position, int on)
{
    return on < 0 || flake->model->orbitals[on].position == position;
}

/* The first site of each position stands for the position. */
static bool is_first_at_position(const sv_flake *flake, sv_index site)
{
    const sv_cell *cell = &flake->cells[flake->sites[site].cell];
    for (sv_index s = cell->first_site; s < site; s++)
        if (position_of(flake, s) == position_of(flake, site))
            return false;
    return true;
}

static void vacate(drawing *d, sv_index site)
{
    const sv_cell *cell = &d->flake->cells[d->flake->sites[site].cell];
    int position = position_of(d->flake, site);
    for (sv_index s = cell->first_site; s < cell->first_site + cell->n_sites; s++) {
        if (position_of(d->flake, s) == position && !d->gone[s]) {
            d->gone[s] = true;
            d->inventory.vacant_sites++;
        }
    }
    d->inventory.vacancies++;
}

static double position_uniform(const sv_flake *flake, const sv_stream *stream, sv_index site)
{
    const sv_cell *cell = &flake->cells[flake->sites[site].cell];
    return sv_stream_uniform(stream, cell->i, cell->j, (uint32_t)position_of(flake, site));
}

static bool is_candidate(const drawing *d, const sv_disorder *disorder, sv_index site)
{
    return !d->gone[site] &&
           position_matches(d->flake, position_of(d->flake, site), disorder->on) &&
           is_first_at_position(d->flake, site);
}

static void draw_share(drawing *d, const sv_disorder *disorder, const sv_stream *stream)
{
    for (sv_index s = 0; s < d->flake->n_sites; s++)
        if (is_candidate(d, disorder, s) && position_uniform(d->flake, stream, s) < disorder->share)
            vacate(d, s);
}

static int compare_candidates(const void *a, const void *b)
{
    const candidate *x = a, *y = b;
    if (x->u != y->u)
        return x->u < y->u ? -1 : 1;
    return x->site < y->site ? -1 : x->site > y->site;
}

static sv_status draw_count(sv_context *context, drawing *d, const sv_disorder *disorder,
                            const sv_stream *stream)
{
    candidate *list = NULL;
    sv_index n = 0;
    sv_status status = sv_take_raw(context, d->flake->n_sites, sizeof *list, &list);
    if (status != SV_OK)
        return status;
    for (sv_index s = 0; s < d->flake->n_sites; s++)
        if (is_candidate(d, disorder, s))
            list[n++] = (candidate){position_uniform(d->flake, stream, s), s};
    if (disorder->count > n) {
        status = SV_FAIL(context, SV_INVALID_INPUT,
                         "disorder \"%s\" asks for %lld vacancies; %lld positions are there",
                         disorder->name, (long long)disorder->count, (long long)n);
    } else {
        qsort(list, (size_t)n, sizeof *list, compare_candidates);
        for (int64_t k = 0; k < disorder->count; k++)
            vacate(d, list[k].site);
    }
    sv_give(context, list);
    return status;
}

/* Orbital a mark means: its own, else the disorder's `on`; −1: any, −2: the two contradict. */
static int orbital_of_mark(const sv_mark *mark, int on)
{
    if (mark->orbital >= 0 && on >= 0 && mark->orbital != on)
        return -2;
    return mark->orbital >= 0 ? mark->orbital : on;
}

/* Site a measured mark falls on, or −1. Marks by cell need an exact cell. */
static sv_index site_of_mark(const sv_flake *flake, const sv_disorder *disorder,
                             const sv_mark *mark, double *ret_distance)
{
    int orbital = orbital_of_mark(mark, disorder->on);
    *ret_distance = 0.0;
    if (orbital == -2)
        return -1;
    if (!mark->by_cell) {
        sv_index site = sv_flake_nearest(flake, mark->at, orbital, ret_distance);
        return *ret_distance <= disorder->tolerance + 1e-9 ? site : -1;
    }
    landing place = sv_flake_land(flake, mark->cell[0], mark->cell[1]);
    if (place.cell < 0 || place.torus[0] != 0 || place.torus[1] != 0)
        return -1;
    return orbital < 0 ? flake->cells[place.cell].first_site
                       : sv_flake_site_of(flake, place.cell, orbital);
}

sv_status sv_marks_check(sv_context *context, const sv_flake *flake, const sv_disorder *disorder,
                         sv_table_fault *ret_fault)
{
    for (sv_index m = 0; m < disorder->n_marks; m++) {
        const sv_mark *mark = &disorder->marks[m];
        double distance;
        if (site_of_mark(flake, disorder, mark, &distance) >= 0)
            continue;
        sv_table_fault fault = {.line = mark->line, .column = 1};
        if (orbital_of_mark(mark, disorder->on) == -2)
            snprintf(fault.message, sizeof fault.message,
                     "the row names an orbital that `on` leaves out");
        else if (mark->by_cell)
            snprintf(fault.message, sizeof fault.message, "cell (%d, %d) is outside the film",
                     mark->cell[0], mark->cell[1]);
        else if (isfinite(distance))
            snprintf(fault.message, sizeof fault.message,
                     "position (%g, %g) lattice constants is outside the film: the nearest site is "
                     "%g away, the tolerance is %g",
                     mark->at[0], mark->at[1], distance, disorder->tolerance);
        else
            snprintf(fault.message, sizeof fault.message,
                     "position (%g, %g) lattice constants is outside the film", mark->at[0],
                     mark->at[1]);
        snprintf(fault.hint, sizeof fault.hint,
                 "the film's cell (0, 0) lies at (0, 0); `origin` moves the file, `tolerance` "
                 "widens the match");
        *ret_fault = fault;
        return SV_FAIL(context, SV_INVALID_INPUT, "%s:%d: %s", disorder->file, mark->line,
                       fault.message);
    }
    return SV_OK;
}

static void vacate_or_count(drawing *d, sv_index site)
{
    if (d->gone[site])
        d->inventory.marks_merged++;
    else
        vacate(d, site);
}

/* A row by cell without an orbital empties the cell; every other row names one position. */
static void vacate_marks(drawing *d, const sv_disorder *disorder)
{
    for (sv_index m = 0; m < disorder->n_marks; m++) {
        const sv_mark *mark = &disorder->marks[m];
        double distance;
        sv_index site = site_of_mark(d->flake, disorder, mark, &distance);
        if (site < 0)
            continue;
        if (!mark->by_cell || orbital_of_mark(mark, disorder->on) >= 0) {
            vacate_or_count(d, site);
            continue;
        }
        const sv_cell *cell = &d->flake->cells[d->flake->sites[site].cell];
        for (sv_index s = cell->first_site; s < cell->first_site + cell->n_sites; s++)
            if (is_first_at_position(d->flake, s))
                vacate_or_count(d, s);
    }
}

/* Does a mark that fell on `site` give its energy to site s of the same cell? */
static bool mark_covers(const drawing *d, const sv_disorder *disorder, const sv_mark *mark,
                        sv_index site, sv_index s)
{
    int orbital = orbital_of_mark(mark, disorder->on);
    if (orbital >= 0)
        return d->flake->sites[s].orbital == orbital;
    return mark->by_cell || position_of(d->flake, s) == position_of(d->flake, site);
}

/* Measured energies: a site takes the mean of the rows that fall on it, so that a map sampled
 * finer than the lattice is not multiplied by its sampling. */
static sv_status add_marks(sv_context *context, drawing *d, const sv_disorder *disorder)
{
    double *sum = NULL;
    int32_t *rows = NULL;
    sv_index sites = d->flake->n_sites;
    sv_status status;
    if ((status = sv_take(context, sites, sizeof *sum, &sum)) != SV_OK ||
        (status = sv_take(context, sites, sizeof *rows, &rows)) != SV_OK)
        goto out;
    for (sv_index m = 0; m < disorder->n_marks; m++) {
        const sv_mark *mark = &disorder->marks[m];
        double distance;
        sv_index site = site_of_mark(d->flake, disorder, mark, &distance);
        if (site < 0)
            continue;
        const sv_cell *cell = &d->flake->cells[d->flake->sites[site].cell];
        for (sv_index s = cell->first_site; s < cell->first_site + cell->n_sites; s++) {
            if (!mark_covers(d, disorder, mark, site, s))
                continue;
            sum[s] += mark->energy;
            d->inventory.marks_merged += rows[s]++ > 0;
        }
    }
    for (sv_index s = 0; s < sites; s++)
        if (rows[s] > 0)
            d->potential[s] += sum[s] / rows[s];
out:
    sv_give(context, sum);
    sv_give(context, rows);
    return status;
}

/* The standardised field: width 1 of each law. */
static double standard_value(sv_distribution law, double u)
{
    switch (law) {
    case SV_BOX:
        return u - 0.5;
    case SV_GAUSSIAN:
        return gsl_cdf_ugaussian_Pinv(u);
    case SV_BINARY:
        return u < 0.5 ? -0.5 : 0.5;
    }
    return 0.0;
}

static void draw_onsite(drawing *d, const sv_disorder *disorder, const sv_stream *stream)
{
    for (sv_index s = 0; s < d->flake->n_sites; s++) {
        const sv_site *site = &d->flake->sites[s];
        if (d->gone[s] || (disorder->on >= 0 && disorder->on != site->orbital))
            continue;
        const sv_cell *cell = &d->flake->cells[site->cell];
        uint32_t slot = disorder->per_cell ? SLOT_OF_CELL : (uint32_t)site->orbital;
        double u = sv_stream_uniform(stream, cell->i, cell->j, slot);
        d->potential[s] += disorder->width * standard_value(disorder->distribution, u);
    }
}

static sv_status apply(sv_context *context, drawing *d, const sv_disorder *disorder, uint64_t seed,
                       sv_index index)
{
    sv_stream stream = sv_stream_make(seed, disorder->name, index);
    if (disorder->type == SV_DISORDER_ONSITE) {
        if (disorder->has_marks)
            return add_marks(context, d, disorder);
        draw_onsite(d, disorder, &stream);
        return SV_OK;
    }
    if (disorder->has_marks)
        vacate_marks(d, disorder);
    if (disorder->has_share)
        draw_share(d, disorder, &stream);
    if (disorder->has_count)
        return draw_count(context, d, disorder, &stream);
    return SV_OK;
}

static sv_status keep_sites(sv_context *context, const drawing *d, sv_sample *sample,
                            int32_t **ret_row_of_site)
{
    const sv_flake *flake = d->flake;
    sv_index n = flake->n_sites - d->inventory.vacant_sites;
    int32_t *row = NULL;
    sv_status status;
    if (n <= 0)
        return SV_FAIL(context, SV_UNDEFINED, "no site is left: all %lld are vacant",
                       (long long)flake->n_sites);
    if ((status = sv_take_raw(context, flake->n_sites, sizeof *row, &row)) != SV_OK)
        return status;
    *ret_row_of_site = row;
    if ((status = sv_take_raw(context, n, sizeof *sample->pristine, &sample->pristine)) != SV_OK ||
        (status = sv_take_raw(context, n, sizeof *sample->potential, &sample->potential)) != SV_OK)
        return status;
    sample->n = 0;
    for (sv_index s = 0; s < flake->n_sites; s++) {
        row[s] = d->gone[s] ? -1 : (int32_t)sample->n;
        if (d->gone[s])
            continue;
        sample->pristine[sample->n] = s;
        sample->potential[sample->n++] = d->potential[s];
    }
    return SV_OK;
}

sv_status sv_sample_draw(sv_context *context, const sv_flake *flake, const sv_disorder *disorder,
                         int n_disorder, uint64_t seed, sv_index index, sv_sample *ret_sample)
{
    drawing d = {.flake = flake};
    sv_sample sample = {.flake = flake};
    int32_t *row_of_site = NULL;
    sv_status status;
    if ((status = sv_take(context, flake->n_sites, sizeof *d.gone, &d.gone)) != SV_OK ||
        (status = sv_take(context, flake->n_sites, sizeof *d.potential, &d.potential)) != SV_OK)
        goto out;
    d.inventory.pristine_sites = flake->n_sites;
    for (int k = 0; k < n_disorder && status == SV_OK; k++)
        status = apply(context, &d, &disorder[k], seed, index);
    if (status != SV_OK || (status = keep_sites(context, &d, &sample, &row_of_site)) != SV_OK)
        goto out;
    d.inventory.sites = sample.n;
    sample.inventory = d.inventory;
    if ((status = sv_sample_build_hamiltonian(context, &sample, row_of_site)) != SV_OK)
        goto out;
    *ret_sample = sample;
    sample = (sv_sample){0};
out:
    sv_give(context, d.gone);
    sv_give(context, d.potential);
    sv_give(context, row_of_site);
    sv_sample_free(context, &sample);
    return status;
}

void sv_sample_free(sv_context *context, sv_sample *sample)
{
    sv_give(context, sample->pristine);
    sv_give(context, sample->potential);
    sv_sparse_free(context, &sample->hamiltonian);
    *sample = (sv_sample){0};
}

void sv_disorder_free(sv_context *context, sv_disorder *disorder)
{
    sv_give(context, disorder->marks);
    *disorder = (sv_disorder){0};
}
