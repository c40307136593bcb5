/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The pristine flake: which cells and sites a shape has. */
#include "sample_internal.h"

#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

static const sv_index MOST_SITES = 2000000000;

/* Cells looked at one by one, and four bytes each in the table: more only for the flakes that are
 * nearly as large themselves. A narrow ring or a thin slanted polygon spans far more than it has.
 */
static const double MOST_SPANNED = 1e8;

static int cell_sites(const outline *o, int64_t i, int64_t j)
{
    int n = 0;
    if (!o->by_site)
        return sv_outline_holds(o, i, j, 0) ? o->model->n_orbitals : 0;
    for (int k = 0; k < o->model->n_orbitals; k++)
        n += sv_outline_holds(o, i, j, k);
    return n;
}

sv_status sv_flake_count(sv_context *context, const sv_model *model, const sv_flake_spec *spec,
                         sv_index *ret_sites)
{
    outline o;
    sv_status status = sv_structure_check(context, model, spec);
    if (status == SV_OK && spec->structure != NULL) {
        *ret_sites = spec->structure->n;
        return SV_OK;
    }
    if (status != SV_OK || (status = sv_outline_make(context, model, spec, &o)) != SV_OK)
        return status;
    double sites = sv_outline_estimate(&o);
    if (sites > (double)MOST_SITES)
        return SV_FAIL(context, SV_REFUSED, "a flake of %.3g sites is above the limit of %.3g",
                       sites, (double)MOST_SITES);
    const double spanned =
        ((double)o.high[0] - (double)o.low[0] + 1.0) * ((double)o.high[1] - (double)o.low[1] + 1.0);
    if (spanned > MOST_SPANNED + 8.0 * sites)
        return SV_FAIL(context, SV_REFUSED,
                       "a flake of about %.3g sites that spans %.3g cells is too sparse to be laid "
                       "out: at most %.3g cells and 8 a site",
                       sites, spanned, MOST_SPANNED);
    *ret_sites = (sv_index)sites;
    return SV_OK;
}

static sv_status count_exactly(sv_context *context, const outline *o, sv_flake *flake)
{
    flake->low[0] = flake->low[1] = INT32_MAX;
    flake->high[0] = flake->high[1] = INT32_MIN;
    for (int64_t i = o->low[0]; i <= o->high[0]; i++) {
        for (int64_t j = o->low[1]; j <= o->high[1]; j++) {
            int n = cell_sites(o, i, j);
            if (n == 0)
                continue;
            flake->n_cells++;
            flake->n_sites += n;
            int32_t at[2] = {(int32_t)i, (int32_t)j};
            for (int k = 0; k < 2; k++) {
                flake->low[k] = at[k] < flake->low[k] ? at[k] : flake->low[k];
                flake->high[k] = at[k] > flake->high[k] ? at[k] : flake->high[k];
            }
        }
    }
    if (flake->n_sites == 0)
        return SV_FAIL(context, SV_INVALID_INPUT, "the flake is empty: no cell lies inside");
    return SV_OK;
}

static void fill_cell(const outline *o, sv_flake *flake, int64_t i, int64_t j, sv_index *sites)
{
    sv_cell *cell = &flake->cells[flake->n_cells];
    *cell = (sv_cell){.i = (int32_t)i, .j = (int32_t)j, .first_site = *sites};
    double corner[2];
    sv_lattice_point(o->model, (double)i, (double)j, corner);
    for (int k = 0; k < o->model->n_orbitals; k++) {
        if (!sv_outline_holds(o, i, j, k))
            continue;
        const double *at = o->model->orbitals[k].at;
        flake->sites[*sites] =
            (sv_site){(int32_t)flake->n_cells, k, {corner[0] + at[0], corner[1] + at[1]}};
        (*sites)++;
        cell->n_sites++;
    }
    if (cell->n_sites == 0)
        return;
    int64_t width = (int64_t)flake->high[1] - flake->low[1] + 1;
    flake->cell_at[(i - flake->low[0]) * width + (j - flake->low[1])] = (int32_t)flake->n_cells;
    flake->n_cells++;
}

static sv_status fill(sv_context *context, const outline *o, sv_flake *flake)
{
    sv_status status;
    sv_index box = ((sv_index)flake->high[0] - flake->low[0] + 1) *
                   ((sv_index)flake->high[1] - flake->low[1] + 1);
    /* One spare cell: fill_cell() prepares it before it knows whether it has sites. */
    if ((status = sv_take(context, flake->n_cells + 1, sizeof *flake->cells, &flake->cells)) !=
            SV_OK ||
        (status = sv_take_raw(context, flake->n_sites, sizeof *flake->sites, &flake->sites)) !=
            SV_OK ||
        (status = sv_take_raw(context, box, sizeof *flake->cell_at, &flake->cell_at)) != SV_OK)
        return status;
    for (sv_index k = 0; k < box; k++)
        flake->cell_at[k] = -1;
    flake->n_cells = 0;
    sv_index sites = 0;
    for (int64_t i = flake->low[0]; i <= flake->high[0]; i++)
        for (int64_t j = flake->low[1]; j <= flake->high[1]; j++)
            fill_cell(o, flake, i, j, &sites);
    return SV_OK;
}

/* Centroid of the shape; for shapes of n1×n2 cells the middle of their centres. */
static void set_centre(const outline *o, sv_flake *flake)
{
    if (sv_outline_centre(o, flake->centre))
        return;
    double low[2] = {INFINITY, INFINITY}, high[2] = {-INFINITY, -INFINITY};
    for (sv_index c = 0; c < flake->n_cells; c++) {
        double at[2];
        sv_flake_cell_centre(flake, c, at);
        for (int k = 0; k < 2; k++) {
            low[k] = fmin(low[k], at[k]);
            high[k] = fmax(high[k], at[k]);
        }
    }
    flake->centre[0] = 0.5 * (low[0] + high[0]);
    flake->centre[1] = 0.5 * (low[1] + high[1]);
}

sv_status sv_flake_make(sv_context *context, const sv_model *model, const sv_flake_spec *spec,
                        sv_flake *ret_flake)
{
    sv_flake flake = {.model = model, .spec = *spec};
    outline o;
    char reason[160];
    sv_index estimate;
    sv_status status = sv_flake_count(context, model, spec, &estimate);
    if (status == SV_OK && spec->structure != NULL)
        return sv_structure_flake(context, model, spec, ret_flake);
    if (status != SV_OK || (status = sv_outline_make(context, model, spec, &o)) != SV_OK)
        return status;
    memcpy(flake.periodic, spec->periodic, sizeof flake.periodic);
    if (!sv_flake_torus(model, spec, spec->periodic, flake.period, reason, sizeof reason))
        return SV_FAIL(context, SV_INVALID_INPUT, "%s", reason);
    status = count_exactly(context, &o, &flake);
    if (status == SV_OK)
        status = fill(context, &o, &flake);
    if (status != SV_OK) {
        sv_flake_free(context, &flake);
        return status;
    }
    set_centre(&o, &flake);
    *ret_flake = flake;
    return SV_OK;
}

void sv_flake_free(sv_context *context, sv_flake *flake)
{
    sv_give(context, flake->cells);
    sv_give(context, flake->sites);
    sv_give(context, flake->cell_at);
    *flake = (sv_flake){0};
}

void sv_flake_cell_centre(const sv_flake *flake, sv_index cell, double ret_at[2])
{
    double corner[2], offset[2];
    if (flake->spec.structure != NULL) {
        memcpy(ret_at, flake->sites[cell].at, 2 * sizeof *ret_at);
        return;
    }
    sv_cell_offset(flake->model, offset);
    sv_lattice_point(flake->model, flake->cells[cell].i, flake->cells[cell].j, corner);
    ret_at[0] = corner[0] + offset[0];
    ret_at[1] = corner[1] + offset[1];
}

sv_index sv_flake_site_of(const sv_flake *flake, int32_t cell, int32_t orbital)
{
    const sv_cell *c = &flake->cells[cell];
    for (sv_index s = c->first_site; s < c->first_site + c->n_sites; s++)
        if (flake->sites[s].orbital == orbital)
            return s;
    return -1;
}

sv_index sv_flake_nearest(const sv_flake *flake, const double at[2], int orbital,
                          double *ret_distance)
{
    double uv[2], best = INFINITY;
    sv_index nearest = -1;
    if (flake->spec.structure != NULL)
        return sv_structure_nearest(flake, at, orbital, ret_distance);
    sv_model_reduce(flake->model, at, uv);
    if (!(fabs(uv[0]) < 1e9 && fabs(uv[1]) < 1e9)) {
        *ret_distance = best;
        return -1;
    }
    int64_t i0 = (int64_t)floor(uv[0]), j0 = (int64_t)floor(uv[1]);
    for (int64_t i = i0 - 2; i <= i0 + 2; i++) {
        for (int64_t j = j0 - 2; j <= j0 + 2; j++) {
            landing place = sv_flake_land(flake, i, j);
            if (place.cell < 0 || place.torus[0] != 0 || place.torus[1] != 0)
                continue;
            const sv_cell *cell = &flake->cells[place.cell];
            for (sv_index s = cell->first_site; s < cell->first_site + cell->n_sites; s++) {
                double d = hypot(flake->sites[s].at[0] - at[0], flake->sites[s].at[1] - at[1]);
                if ((orbital < 0 || flake->sites[s].orbital == orbital) && d < best - 1e-9) {
                    best = d;
                    nearest = s;
                }
            }
        }
    }
    *ret_distance = best;
    return nearest;
}
