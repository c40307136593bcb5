/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The pristine flake: which cells and sites a shape has. */
#include "sample_internal.h"

#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

static const double EDGE = 1e-9; /* positions this near an edge count as on it */
static const sv_index MOST_SITES = 2000000000;

/* A shape while it is being filled: a range of cells and a test of what lies inside. */
typedef struct outline {
    const sv_model *model;
    const sv_flake_spec *spec;
    int64_t low[2], high[2];
    double origin[2]; /* centre of cell (0, 0) or of the central hexagon */
    bool by_site;     /* sites are tested one by one (zigzag hexagon) */
} outline;

static void cell_offset(const sv_model *model, double ret_offset[2])
{
    ret_offset[0] = ret_offset[1] = 0.0;
    for (int p = 0; p < model->n_positions; p++) {
        int k = 0;
        while (model->orbitals[k].position != p)
            k++;
        ret_offset[0] += model->orbitals[k].at[0] / model->n_positions;
        ret_offset[1] += model->orbitals[k].at[1] / model->n_positions;
    }
}

static void lattice_point(const sv_model *model, double i, double j, double ret_at[2])
{
    ret_at[0] = i * model->vectors[0][0] + j * model->vectors[1][0];
    ret_at[1] = i * model->vectors[0][1] + j * model->vectors[1][1];
}

bool sv_model_is_honeycomb(const sv_model *model, double ret_centre[2])
{
    const double *a1 = model->vectors[0], *a2 = model->vectors[1];
    double square = a1[0] * a1[0] + a1[1] * a1[1];
    double other = a2[0] * a2[0] + a2[1] * a2[1];
    double dot = a1[0] * a2[0] + a1[1] * a2[1];
    if (fabs(other - square) > 1e-6 * square || fabs(dot - square / 2) > 1e-6 * square ||
        model->n_positions != 2)
        return false;
    const double *first = model->orbitals[0].at, *second = first;
    for (int k = 0; k < model->n_orbitals; k++)
        if (model->orbitals[k].position == 1)
            second = model->orbitals[k].at;
    double uv[2];
    sv_model_reduce(model, (const double[2]){second[0] - first[0], second[1] - first[1]}, uv);
    /* The other position is a third of the long diagonal ahead (+) or behind (−). */
    for (int sign = 1; sign >= -1; sign -= 2) {
        double u = uv[0] - sign / 3.0, v = uv[1] - sign / 3.0;
        if (fabs(u - round(u)) < 1e-6 && fabs(v - round(v)) < 1e-6) {
            lattice_point(model, -sign / 3.0, -sign / 3.0, ret_centre);
            ret_centre[0] += first[0];
            ret_centre[1] += first[1];
            return true;
        }
    }
    return false;
}

/* Distance of a hexagon from the central one, in steps between neighbours (vectors at 60°). */
static long hexagon_steps(long p, long q)
{
    long a = labs(p), b = labs(q), c = labs(p + q);
    long most = a > b ? a : b;
    return most > c ? most : c;
}

/* A vertex belongs to three hexagons; it is in if one of them is within n − 1 steps. */
static bool vertex_in_hexagon(const outline *o, const double at[2])
{
    double uv[2];
    sv_model_reduce(o->model, (const double[2]){at[0] - o->origin[0], at[1] - o->origin[1]}, uv);
    long p = lround(uv[0] - 1.0 / 3.0), q = lround(uv[1] - 1.0 / 3.0);
    bool upward = fabs(uv[0] - 1.0 / 3.0 - (double)p) < 1e-6;
    if (!upward) {
        p = lround(uv[0] - 2.0 / 3.0);
        q = lround(uv[1] - 2.0 / 3.0);
    }
    long nearest = hexagon_steps(p + 1, q);
    long second = hexagon_steps(p, q + 1);
    long third = upward ? hexagon_steps(p, q) : hexagon_steps(p + 1, q + 1);
    nearest = second < nearest ? second : nearest;
    nearest = third < nearest ? third : nearest;
    return nearest <= o->spec->cells[0] - 1;
}

static bool point_in_shape(const outline *o, const double d[2])
{
    const sv_flake_spec *spec = o->spec;
    double r = spec->radius, half = sqrt(3.0) / 2.0;
    switch (spec->shape) {
    case SV_SHAPE_RECTANGLE:
        return spec->has_cells || (d[0] > -EDGE && d[0] < spec->size[0] - EDGE && d[1] > -EDGE &&
                                   d[1] < spec->size[1] - EDGE);
    case SV_SHAPE_PARALLELOGRAM:
        return true;
    case SV_SHAPE_HEXAGON:
        return fabs(d[1]) <= half * r + EDGE &&
               half * fabs(d[0]) + 0.5 * fabs(d[1]) <= half * r + EDGE;
    case SV_SHAPE_DISC:
        return hypot(d[0], d[1]) <= r + EDGE;
    }
    return false;
}

/* Cell range that covers the Cartesian box [−x0, x1]×[−y0, y1] about the origin. */
static void cover_box(outline *o, double x0, double x1, double y0, double y1)
{
    o->low[0] = o->low[1] = INT32_MAX;
    o->high[0] = o->high[1] = INT32_MIN;
    for (int corner = 0; corner < 4; corner++) {
        double uv[2];
        sv_model_reduce(o->model, (const double[2]){corner & 1 ? x1 : x0, corner & 2 ? y1 : y0},
                        uv);
        for (int k = 0; k < 2; k++) {
            int64_t low = (int64_t)floor(uv[k]) - 1, high = (int64_t)ceil(uv[k]) + 1;
            o->low[k] = low < o->low[k] ? low : o->low[k];
            o->high[k] = high > o->high[k] ? high : o->high[k];
        }
    }
}

static bool orthogonal(const sv_model *model)
{
    const double *a1 = model->vectors[0], *a2 = model->vectors[1];
    return fabs(a1[0] * a2[0] + a1[1] * a2[1]) <= 1e-9 * hypot(a1[0], a1[1]) * hypot(a2[0], a2[1]);
}

static sv_status outline_cells(sv_context *context, outline *o)
{
    const sv_flake_spec *spec = o->spec;
    if (spec->cells[0] < 1 || spec->cells[1] < 1)
        return SV_FAIL(context, SV_INVALID_INPUT, "a flake of %lld×%lld cells is empty",
                       (long long)spec->cells[0], (long long)spec->cells[1]);
    o->low[0] = o->low[1] = 0;
    o->high[0] = spec->cells[0] - 1;
    o->high[1] = spec->cells[1] - 1;
    return SV_OK;
}

static sv_status outline_hexagon(sv_context *context, outline *o)
{
    const sv_flake_spec *spec = o->spec;
    double r = spec->radius;
    if (spec->has_cells == spec->has_radius)
        return SV_FAIL(context, SV_INVALID_INPUT, "a hexagon needs either cells or radius");
    if (spec->has_cells) {
        if (!sv_model_is_honeycomb(o->model, o->origin))
            return SV_FAIL(context, SV_INVALID_INPUT,
                           "a hexagon by cells needs a honeycomb lattice; give radius");
        o->by_site = true;
        int64_t n = spec->cells[0] + 1;
        o->low[0] = o->low[1] = -n;
        o->high[0] = o->high[1] = n;
        return SV_OK;
    }
    cover_box(o, -r, r, -r, r);
    return SV_OK;
}

static sv_status outline_make(sv_context *context, const sv_model *model, const sv_flake_spec *spec,
                              outline *ret)
{
    outline o = {.model = model, .spec = spec};
    sv_status status = SV_OK;
    cell_offset(model, o.origin);
    switch (spec->shape) {
    case SV_SHAPE_RECTANGLE:
        if (spec->has_cells == spec->has_size)
            return SV_FAIL(context, SV_INVALID_INPUT, "a rectangle needs either cells or size");
        if (spec->has_cells && !orthogonal(model))
            return SV_FAIL(context, SV_INVALID_INPUT,
                           "a rectangle by cells needs orthogonal lattice vectors; give size, or "
                           "use the shape parallelogram");
        if (spec->has_cells)
            status = outline_cells(context, &o);
        else
            cover_box(&o, 0.0, spec->size[0], 0.0, spec->size[1]);
        break;
    case SV_SHAPE_PARALLELOGRAM:
        status = outline_cells(context, &o);
        break;
    case SV_SHAPE_HEXAGON:
        status = outline_hexagon(context, &o);
        break;
    case SV_SHAPE_DISC:
        cover_box(&o, -spec->radius, spec->radius, -spec->radius, spec->radius);
        break;
    }
    if (status == SV_OK)
        *ret = o;
    return status;
}

/* Does site `orbital` of cell (i, j) belong to the flake? */
static bool site_inside(const outline *o, int64_t i, int64_t j, int orbital)
{
    double at[2];
    lattice_point(o->model, (double)i, (double)j, at);
    if (!o->by_site) {
        /* A rectangle lies between (0, 0) and its size; hexagon and disc about cell (0, 0). */
        bool fixed = o->spec->shape == SV_SHAPE_RECTANGLE;
        at[0] += fixed ? o->origin[0] : 0.0;
        at[1] += fixed ? o->origin[1] : 0.0;
        return point_in_shape(o, at);
    }
    at[0] += o->model->orbitals[orbital].at[0];
    at[1] += o->model->orbitals[orbital].at[1];
    return vertex_in_hexagon(o, at);
}

static int cell_sites(const outline *o, int64_t i, int64_t j)
{
    int n = 0;
    if (!o->by_site)
        return site_inside(o, i, j, 0) ? o->model->n_orbitals : 0;
    for (int k = 0; k < o->model->n_orbitals; k++)
        n += site_inside(o, i, j, k);
    return n;
}

/* Exact for shapes of n1×n2 cells, area divided by cell area (plus the rim) for the others. */
static double estimate_sites(const outline *o)
{
    const sv_flake_spec *spec = o->spec;
    double cells = 0.0, r = spec->radius + 1.0;
    if (o->by_site)
        return 3.0 * (double)spec->cells[0] * (double)spec->cells[0] * o->model->n_orbitals;
    if (spec->shape == SV_SHAPE_PARALLELOGRAM || spec->has_cells)
        return (double)spec->cells[0] * (double)spec->cells[1] * o->model->n_orbitals;
    if (spec->shape == SV_SHAPE_RECTANGLE)
        cells = (spec->size[0] + 1.0) * (spec->size[1] + 1.0);
    else
        cells = spec->shape == SV_SHAPE_DISC ? 3.1415926536 * r * r : 2.598076211 * r * r;
    return cells / sv_model_cell_area(o->model) * o->model->n_orbitals;
}

sv_status sv_flake_count(sv_context *context, const sv_model *model, const sv_flake_spec *spec,
                         sv_index *ret_sites)
{
    outline o;
    sv_status status = outline_make(context, model, spec, &o);
    if (status != SV_OK)
        return status;
    double sites = estimate_sites(&o);
    if (sites > (double)MOST_SITES)
        return SV_FAIL(context, SV_REFUSED, "a flake of %.3g sites is above the limit of %.3g",
                       sites, (double)MOST_SITES);
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
    lattice_point(o->model, (double)i, (double)j, corner);
    for (int k = 0; k < o->model->n_orbitals; k++) {
        if (!site_inside(o, i, j, k))
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
    if (o->spec->shape == SV_SHAPE_HEXAGON || o->spec->shape == SV_SHAPE_DISC) {
        memcpy(flake->centre, o->origin, sizeof flake->centre);
        return;
    }
    if (o->spec->shape == SV_SHAPE_RECTANGLE && o->spec->has_size) {
        flake->centre[0] = 0.5 * o->spec->size[0];
        flake->centre[1] = 0.5 * o->spec->size[1];
        return;
    }
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
    if (status != SV_OK || (status = outline_make(context, model, spec, &o)) != SV_OK)
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
    cell_offset(flake->model, offset);
    lattice_point(flake->model, flake->cells[cell].i, flake->cells[cell].j, corner);
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
