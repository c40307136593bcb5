/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The averaging window of a flake: the rule is a convention users rely on, see sample.h. */
#include "selvedge/sample.h"

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
        int64_t i = flake->cells[c].i - first[0], j = flake->cells[c].j - first[1];
        inside[c] = i >= 0 && i < count[0] && j >= 0 && j < count[1];
        cells += inside[c];
    }
    return cells;
}

/* Hexagon of the flake: a corner along a lattice vector for the zigzag one, along x by radius. */
static bool in_hexagon(const sv_flake *flake, const double d[2], double share)
{
    const double half = sqrt(3.0) / 2.0;
    double r = flake->spec.radius, x = d[0], y = d[1];
    if (flake->spec.has_cells) {
        const double *a1 = flake->model->vectors[0];
        double length = hypot(a1[0], a1[1]);
        r = (double)flake->spec.cells[0] * length;
        x = (d[0] * a1[0] + d[1] * a1[1]) / length;
        y = (d[1] * a1[0] - d[0] * a1[1]) / length;
    }
    r = share * r + 1e-9;
    return fabs(y) <= half * r && half * fabs(x) + 0.5 * fabs(y) <= half * r;
}

static bool in_scaled_shape(const sv_flake *flake, const double d[2], double share)
{
    const sv_flake_spec *spec = &flake->spec;
    switch (spec->shape) {
    case SV_SHAPE_DISC:
        return hypot(d[0], d[1]) <= share * spec->radius + 1e-9;
    case SV_SHAPE_HEXAGON:
        return in_hexagon(flake, d, share);
    default:
        return fabs(d[0]) <= 0.5 * share * spec->size[0] + 1e-9 &&
               fabs(d[1]) <= 0.5 * share * spec->size[1] + 1e-9;
    }
}

static bool is_box_of_cells(const sv_flake *flake)
{
    return flake->spec.shape == SV_SHAPE_PARALLELOGRAM ||
           (flake->spec.shape == SV_SHAPE_RECTANGLE && flake->spec.has_cells);
}

sv_status sv_flake_window(sv_context *context, const sv_flake *flake, double share,
                          bool **ret_inside, sv_index *ret_cells)
{
    bool *inside = NULL;
    sv_index cells = 0;
    sv_status status = sv_take(context, flake->n_cells, sizeof *inside, &inside);
    if (status != SV_OK)
        return status;
    if (is_box_of_cells(flake)) {
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
        return SV_FAIL(context, SV_INVALID_INPUT, "no cell lies in the window of share %g", share);
    }
    *ret_inside = inside;
    *ret_cells = cells;
    return SV_OK;
}
