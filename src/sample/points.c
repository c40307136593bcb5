/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Poisson points of the plane, cell by cell: a larger flake keeps those of the cells it shares, and
 * a larger density keeps those of a smaller one. */
#include "sample_internal.h"

#include <math.h>

static const double MOST_PER_CELL = 500.0;
/* Cells looked at, and points, that bound time and memory whatever the sheet says. */
static const double MOST_CELLS = 1e8, MOST_POINTS = 2e7;
enum { SLOTS_EACH = 16 };

int sv_poisson(double mean, double u)
{
    double term = exp(-mean), sum = term;
    int k = 0;
    while (u > sum && term > 0.0 && k < 4000) {
        k++;
        term *= mean / k;
        sum += term;
    }
    return k;
}

/* Point k of a cell: uniform in the parallelogram of its vectors. */
static sv_point point_of(const sv_model *model, const sv_stream *stream, int32_t i, int32_t j,
                         int k)
{
    sv_point point = {.cell = {i, j},
                      .slot = (uint32_t)SV_SLOT_POINTS + 1u + (uint32_t)SLOTS_EACH * (uint32_t)k};
    double u = i + sv_stream_uniform(stream, i, j, point.slot);
    double v = j + sv_stream_uniform(stream, i, j, point.slot + 1);
    for (int a = 0; a < 2; a++)
        point.at[a] = u * model->vectors[0][a] + v * model->vectors[1][a];
    point.slot += 2;
    return point;
}

bool sv_point_on_flake(const sv_flake *flake, const double at[2])
{
    double uv[2];
    sv_model_reduce(flake->model, at, uv);
    return sv_flake_look_up(flake, (int64_t)floor(uv[0]), (int64_t)floor(uv[1])) >= 0;
}

sv_status sv_points_draw(sv_context *context, const sv_flake *flake, const sv_stream *stream,
                         double density, double reach, sv_point **ret_points, sv_index *ret_count)
{
    const sv_model *model = flake->model;
    double mean = density * sv_model_vector_area(model), low[2], high[2];
    sv_point *points = NULL;
    sv_index n = 0, capacity = 0;
    sv_status status = SV_OK;
    if (mean > MOST_PER_CELL)
        return SV_FAIL(context, SV_INVALID_INPUT, "%.3g points per cell are more than %g", mean,
                       MOST_PER_CELL);
    sv_flake_box(flake, low, high);
    sv_patch patch = sv_patch_around(model, low, high, reach);
    const double cells =
        ((double)patch.high[0] - patch.low[0] + 1.0) * ((double)patch.high[1] - patch.low[1] + 1.0);
    if (cells > MOST_CELLS || cells * mean > MOST_POINTS)
        return SV_FAIL(context, SV_INVALID_INPUT,
                       "points as far as %.3g lattice constants from the flake count: %.3g cells "
                       "with %.3g points, at most %.3g with %.3g can be drawn",
                       reach, cells, cells * mean, MOST_CELLS, MOST_POINTS);
    for (int64_t i = patch.low[0]; i <= patch.high[0] && status == SV_OK; i++) {
        for (int64_t j = patch.low[1]; j <= patch.high[1] && status == SV_OK; j++) {
            double u = sv_stream_uniform(stream, (int32_t)i, (int32_t)j, SV_SLOT_POINTS);
            int k = sv_poisson(mean, u);
            status = sv_reserve(context, &points, &capacity, n + k, sizeof *points);
            for (int m = 0; m < k && status == SV_OK; m++)
                points[n++] = point_of(model, stream, (int32_t)i, (int32_t)j, m);
        }
    }
    if (status != SV_OK) {
        sv_give(context, points);
        return status;
    }
    *ret_points = points;
    *ret_count = n;
    return SV_OK;
}
