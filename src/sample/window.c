/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The averaging window of a flake: the rule is a convention users rely on, see sample.h. */
#include "sample_internal.h"

#include <math.h>

/* Integer of the parity of `side` nearest to share·side, ties up, at least 1 or 2. */
static int64_t window_side(int64_t side, double share)
{
    double target = share * (double)side;
    int64_t parity = side % 2;
    /* Candidates parity + 2m; ⌊x + ½⌋ rounds ties up. The nudge keeps 0.4·15 = 6.000…01 at 6. */
    int64_t n = parity + 2 * (int64_t)floor((target - (double)parity) / 2.0 + 0.5 + 1e-12);
    int64_t least = parity == 1 ? 1 : 2;
    return n < least ? least : n > side ? side : n;
}

static sv_index mark_box(const sv_flake *flake, double share, bool *inside)
{
    int64_t first[2], count[2];
    sv_index cells = 0;
    for (int k = 0; k < 2; k++) {
        count[k] = window_side(flake->spec.cells[k], share);
        first[k] = (flake->spec.cells[k] - count[k]) / 2;
    }
    for (sv_index c = 0; c < flake->n_cells; c++) {
        int64_t place[2];
        sv_box_place(&flake->spec, flake->cells[c].i, flake->cells[c].j, place);
        int64_t i = place[0] - first[0], j = place[1] - first[1];
        inside[c] = i >= 0 && i < count[0] && j >= 0 && j < count[1];
        cells += inside[c];
    }
    return cells;
}

/* The middle band of the ring. */
static bool in_band(const sv_flake_spec *spec, const double d[2], double share)
{
    double middle = 0.5 * (spec->inner + spec->outer), half = 0.5 * (spec->outer - spec->inner);
    return fabs(hypot(d[0], d[1]) - middle) <= share * half + 1e-9;
}

/* Without holes: a point of the scaled outline is one of the outline, away from the centroid by
 * 1/share. With holes: the ring's rule, by distances from the outline and the nearest hole. */
static bool in_polygon(const sv_flake *flake, const double d[2], double share)
{
    bool on_edge;
    const sv_polygon *p = &flake->spec.polygon;
    const double *centre = flake->centre;
    double at[2] = {centre[0] + d[0], centre[1] + d[1]};
    if (p->n_loops == 1)
        return sv_loop_holds(
            p, 0, (const double[2]){centre[0] + d[0] / share, centre[1] + d[1] / share}, &on_edge);
    double outside = sv_polygon_distance(p, 0, 1, at);
    double inside = sv_polygon_distance(p, 1, p->n_loops, at);
    return fmin(outside, inside) >= 0.5 * (1.0 - share) * (outside + inside) - 1e-9;
}

static bool in_scaled_shape(const sv_flake *flake, const double d[2], double share)
{
    const sv_flake_spec *spec = &flake->spec;
    sv_regular regular;
    sv_polygon hull;
    switch (spec->shape) {
    case SV_SHAPE_DISC:
        return hypot(d[0], d[1]) <= share * spec->radius + 1e-9;
    case SV_SHAPE_ANNULUS:
        return in_band(spec, d, share);
    case SV_SHAPE_HEXAGON:
    case SV_SHAPE_TRIANGLE:
        regular = sv_outline_regular(flake->model, spec);
        return sv_regular_holds(&regular, d, share);
    case SV_SHAPE_POLYGON:
        return in_polygon(flake, d, share);
    case SV_SHAPE_STRUCTURE:
        hull = (sv_polygon){spec->structure->corners, spec->structure->loop_start, 1};
        return sv_polygon_holds(&hull, (const double[2]){flake->centre[0] + d[0] / share,
                                                         flake->centre[1] + d[1] / share});
    default:
        return fabs(d[0]) <= 0.5 * share * spec->size[0] + 1e-9 &&
               fabs(d[1]) <= 0.5 * share * spec->size[1] + 1e-9;
    }
}

sv_status sv_flake_window(sv_context *context, const sv_flake *flake, double share,
                          bool **ret_inside, sv_index *ret_cells)
{
    bool *inside = NULL;
    sv_index cells = 0;
    sv_status status = sv_take(context, flake->n_cells, sizeof *inside, &inside);
    if (status != SV_OK)
        return status;
    int64_t place[2];
    if (sv_box_place(&flake->spec, 0, 0, place)) {
        cells = mark_box(flake, share, inside);
    } else {
        for (sv_index c = 0; c < flake->n_cells; c++) {
            double at[2];
            sv_flake_cell_centre(flake, c, at);
            at[0] -= flake->centre[0];
            at[1] -= flake->centre[1];
            inside[c] = in_scaled_shape(flake, at, share);
            cells += inside[c];
        }
    }
    if (cells == 0) {
        sv_give(context, inside);
        return SV_FAIL(context, SV_INVALID_INPUT,
                       "no cell of the flake lies in the window of share %g: take a larger window",
                       share);
    }
    *ret_inside = inside;
    *ret_cells = cells;
    return SV_OK;
}

double sv_flake_window_factor(const sv_flake *flake, double share, sv_index cells)
{
    const sv_structure *s = flake->spec.structure;
    if (s == NULL)
        return 1.0;
    return (double)cells * sv_model_cell_area(flake->model) / (share * share * s->area);
}

bool sv_flake_hole(const sv_flake *flake, double ret_at[2])
{
    const sv_flake_spec *spec = &flake->spec;
    if (spec->shape == SV_SHAPE_POLYGON && spec->polygon.n_loops == 2) {
        sv_loop_inside(&spec->polygon, 1, ret_at);
        return true;
    }
    if (spec->shape != SV_SHAPE_ANNULUS)
        return false;
    /* Cells lie about the centre of cell (0, 0), which has a hole once that cell is left out. */
    ret_at[0] = flake->centre[0];
    ret_at[1] = flake->centre[1];
    return spec->inner > 0.0;
}

bool sv_flake_by_hole(const sv_flake *flake, const double at[2])
{
    const sv_flake_spec *spec = &flake->spec;
    if (spec->shape == SV_SHAPE_ANNULUS)
        return hypot(at[0] - flake->centre[0], at[1] - flake->centre[1]) <
               0.5 * (spec->inner + spec->outer);
    if (spec->shape != SV_SHAPE_POLYGON || spec->polygon.n_loops < 2)
        return false;
    return sv_polygon_distance(&spec->polygon, 1, spec->polygon.n_loops, at) <
           sv_polygon_distance(&spec->polygon, 0, 1, at);
}
