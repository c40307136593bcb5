/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The range of cells a shape may cover, and the shapes a lattice cannot have. */
#include "sample_internal.h"

#include <math.h>
#include <stdlib.h>

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

static sv_status range_of_cells(sv_context *context, outline *o)
{
    const sv_flake_spec *spec = o->spec;
    int64_t length = spec->cells[0], width = spec->cells[1];
    if (length < 1 || width < 1)
        return SV_FAIL(context, SV_INVALID_INPUT, "a flake of %lld×%lld cells is empty",
                       (long long)length, (long long)width);
    o->low[0] = o->low[1] = 0;
    o->high[0] = length - 1;
    o->high[1] = width - 1;
    if (spec->shape != SV_SHAPE_RIBBON || spec->edge != SV_EDGE_ARMCHAIR)
        return SV_OK;
    /* 0 ≤ j − i < width, 0 ≤ i + j < 2 length */
    o->low[0] = -width / 2 - 1;
    o->high[0] = length;
    o->high[1] = length + width / 2 + 1;
    return SV_OK;
}

/* Hexagon and triangle: by cells on a honeycomb, by length elsewhere. */
static sv_status range_of_regular(sv_context *context, outline *o)
{
    const sv_flake_spec *spec = o->spec;
    bool triangle = spec->shape == SV_SHAPE_TRIANGLE;
    bool by_length = triangle ? spec->has_side : spec->has_radius;
    const char *name = triangle ? "triangle" : "hexagon", *length = triangle ? "side" : "radius";
    if (spec->has_cells == by_length)
        return SV_FAIL(context, SV_INVALID_INPUT, "a %s needs either cells or %s", name, length);
    if (by_length) {
        /* Outside circles of the two. */
        double r = triangle ? spec->side / sqrt(3.0) : spec->radius;
        cover_box(o, -r, r, -r, r);
        return SV_OK;
    }
    if (!sv_model_is_honeycomb(o->model, o->origin))
        return SV_FAIL(context, SV_INVALID_INPUT,
                       "a %s by cells needs a honeycomb lattice; give %s", name, length);
    if (spec->cells[0] < 1)
        return SV_FAIL(context, SV_INVALID_INPUT, "a %s of %lld cells a side is empty", name,
                       (long long)spec->cells[0]);
    o->by_site = true;
    int64_t n = (spec->edge == SV_EDGE_ARMCHAIR ? 2 : 1) * spec->cells[0] + 1;
    o->low[0] = o->low[1] = -n;
    o->high[0] = o->high[1] = n;
    return SV_OK;
}

static sv_status range_of_rectangle(sv_context *context, outline *o)
{
    const sv_flake_spec *spec = o->spec;
    if (spec->has_cells == spec->has_size)
        return SV_FAIL(context, SV_INVALID_INPUT, "a rectangle needs either cells or size");
    if (spec->has_cells && !orthogonal(o->model))
        return SV_FAIL(context, SV_INVALID_INPUT,
                       "a rectangle by cells needs orthogonal lattice vectors; give size, or use "
                       "the shape parallelogram");
    if (spec->has_cells)
        return range_of_cells(context, o);
    cover_box(o, 0.0, spec->size[0], 0.0, spec->size[1]);
    return SV_OK;
}

static sv_status range_of_polygon(sv_context *context, outline *o)
{
    const sv_polygon *p = &o->spec->polygon;
    sv_polygon_fault fault;
    sv_status status = sv_polygon_check(context, p, &fault);
    if (status != SV_OK)
        return status;
    double low[2] = {INFINITY, INFINITY}, high[2] = {-INFINITY, -INFINITY};
    for (int k = 0; k < p->loop_start[1]; k++)
        for (int d = 0; d < 2; d++) {
            low[d] = fmin(low[d], p->corners[2 * k + d]);
            high[d] = fmax(high[d], p->corners[2 * k + d]);
        }
    /* Cells are listed by their corners, and tested at their centres. */
    cover_box(o, low[0] - o->origin[0], high[0] - o->origin[0], low[1] - o->origin[1],
              high[1] - o->origin[1]);
    return SV_OK;
}

/* Named edges belong to shapes by cells of a honeycomb lattice. */
static sv_status check_edge(sv_context *context, const outline *o)
{
    double centre[2];
    const sv_flake_spec *spec = o->spec;
    if (spec->edge == SV_EDGE_USUAL || o->by_site)
        return SV_OK;
    if (spec->shape != SV_SHAPE_RIBBON)
        return SV_FAIL(context, SV_INVALID_INPUT,
                       "edge goes with a size in cells; a shape by length has the edge its outline "
                       "cuts");
    if (!sv_model_is_honeycomb(o->model, centre))
        return SV_FAIL(
            context, SV_INVALID_INPUT,
            "the lattice is no honeycomb and has no zigzag or armchair edge; a ribbon of "
            "it is cut along its first vector");
    return SV_OK;
}

sv_status sv_outline_make(sv_context *context, const sv_model *model, const sv_flake_spec *spec,
                          outline *ret_outline)
{
    outline o = {.model = model, .spec = spec};
    sv_status status = SV_OK;
    sv_cell_offset(model, o.origin);
    switch (spec->shape) {
    case SV_SHAPE_RECTANGLE:
        status = range_of_rectangle(context, &o);
        break;
    case SV_SHAPE_PARALLELOGRAM:
    case SV_SHAPE_RIBBON:
        status = range_of_cells(context, &o);
        break;
    case SV_SHAPE_HEXAGON:
    case SV_SHAPE_TRIANGLE:
        status = range_of_regular(context, &o);
        break;
    case SV_SHAPE_DISC:
        cover_box(&o, -spec->radius, spec->radius, -spec->radius, spec->radius);
        break;
    case SV_SHAPE_ANNULUS:
        if (!(spec->inner < spec->outer))
            return SV_FAIL(context, SV_INVALID_INPUT,
                           "an annulus needs inner < outer, got %g and %g lattice constants",
                           spec->inner, spec->outer);
        cover_box(&o, -spec->outer, spec->outer, -spec->outer, spec->outer);
        break;
    case SV_SHAPE_POLYGON:
        status = range_of_polygon(context, &o);
        break;
    case SV_SHAPE_STRUCTURE:
        return SV_FAIL(context, SV_INTERNAL, "a structure has no outline by cells");
    }
    if (status == SV_OK)
        status = check_edge(context, &o);
    if (status == SV_OK)
        *ret_outline = o;
    return status;
}
