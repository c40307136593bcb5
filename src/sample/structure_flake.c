/* SPDX-License-Identifier: GPL-3.0-or-later */
/* A structure as a flake: every site is a cell of its own. */
#include "sample_internal.h"

#include <math.h>
#include <string.h>

/* Beyond this many cells no site is near a point. */
enum { FARTHEST_RING = 200 };

sv_status sv_structure_check(sv_context *context, const sv_model *model, const sv_flake_spec *spec)
{
    bool by_shape = spec->shape == SV_SHAPE_STRUCTURE, by_model = model->n_rules > 0;
    if (by_shape != by_model)
        return SV_FAIL(context, SV_INVALID_INPUT, "%s",
                       by_shape ? "a structure needs the model by_distance"
                                : "the model by_distance needs a flake of shape structure");
    if (by_shape && (spec->structure == NULL || model->site_area <= 0.0))
        return SV_FAIL(context, SV_INVALID_INPUT, "the structure of the flake is not read");
    if (by_shape && (spec->periodic[0] || spec->periodic[1]))
        return SV_FAIL(context, SV_INVALID_INPUT, "a structure has no torus");
    return SV_OK;
}

sv_status sv_structure_flake(sv_context *context, const sv_model *model, const sv_flake_spec *spec,
                             sv_flake *ret_flake)
{
    const sv_structure *s = spec->structure;
    sv_flake flake = {.model = model, .spec = *spec, .n_cells = s->n, .n_sites = s->n};
    sv_index box = ((sv_index)s->high[0] - s->low[0] + 1) * ((sv_index)s->high[1] - s->low[1] + 1);
    sv_status status;
    if ((status = sv_take_raw(context, s->n, sizeof *flake.cells, &flake.cells)) != SV_OK ||
        (status = sv_take_raw(context, s->n, sizeof *flake.sites, &flake.sites)) != SV_OK ||
        (status = sv_take_raw(context, box, sizeof *flake.cell_at, &flake.cell_at)) != SV_OK) {
        sv_flake_free(context, &flake);
        return status;
    }
    memcpy(flake.cell_at, s->cell_at, (size_t)box * sizeof *flake.cell_at);
    memcpy(flake.low, s->low, sizeof flake.low);
    memcpy(flake.high, s->high, sizeof flake.high);
    memcpy(flake.centre, s->centre, sizeof flake.centre);
    for (sv_index k = 0; k < s->n; k++) {
        flake.cells[k] = (sv_cell){s->cell[k][0], s->cell[k][1], k, 1};
        flake.sites[k] = (sv_site){(int32_t)k, s->species[k], {s->at[k][0], s->at[k][1]}};
    }
    *ret_flake = flake;
    return SV_OK;
}

/* Squares of cells around that of the point, until no farther one can be nearer. */
sv_index sv_structure_nearest(const sv_flake *flake, const double at[2], int orbital,
                              double *ret_distance)
{
    const double side = flake->model->vectors[0][0];
    double best = INFINITY;
    sv_index nearest = -1;
    *ret_distance = best;
    if (!(fabs(at[0]) < 1e9 * side && fabs(at[1]) < 1e9 * side))
        return -1;
    int64_t i0 = (int64_t)floor(at[0] / side), j0 = (int64_t)floor(at[1] / side);
    for (int64_t ring = 0; ring <= FARTHEST_RING && best > (double)(ring - 1) * side; ring++)
        for (int64_t i = i0 - ring; i <= i0 + ring; i++) {
            int64_t step = i == i0 - ring || i == i0 + ring || ring == 0 ? 1 : 2 * ring;
            for (int64_t j = j0 - ring; j <= j0 + ring; j += step) {
                int32_t s = sv_flake_look_up(flake, i, j);
                if (s < 0 || (orbital >= 0 && flake->sites[s].orbital != orbital))
                    continue;
                double d = hypot(flake->sites[s].at[0] - at[0], flake->sites[s].at[1] - at[1]);
                if (d < best - 1e-9) {
                    best = d;
                    nearest = s;
                }
            }
        }
    *ret_distance = best;
    return nearest;
}
