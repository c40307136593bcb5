/* SPDX-License-Identifier: GPL-3.0-or-later */
/*
 * Rough edges: each missing cell next to the flake carries a depth h = A Φ(g), uniform on [0, A]
 * with a correlation length along the edge: g is a correlated gaussian field, Φ its distribution
 * function, so that depths have correlation (6/π) asin(C/2) where g has C. A cell goes when its
 * distance from the nearest missing cell is below h and half a cell: on a straight edge round(h)
 * rows are gone.
 */
#include "sample_internal.h"

#include <math.h>

#include <gsl/gsl_cdf.h>

/* What an erosion knows of each cell: the nearest missing cell, and how deep it bites. */
typedef struct erosion {
    const sv_flake *flake;
    double offset[2]; /* from a cell's corner to its centre */
    double half;      /* half a cell */
    double *nearest, *depth;
} erosion;

static void centre_of(const erosion *e, int64_t i, int64_t j, double ret[2])
{
    const double(*a)[2] = e->flake->model->vectors;
    for (int k = 0; k < 2; k++)
        ret[k] = (double)i * a[0][k] + (double)j * a[1][k] + e->offset[k];
}

/* A missing cell counts when one of its eight neighbours by number is there. */
static bool is_rim(const sv_flake *flake, int64_t i, int64_t j)
{
    if (sv_flake_land(flake, i, j).cell >= 0)
        return false;
    for (int a = -1; a <= 1; a++)
        for (int b = -1; b <= 1; b++)
            if (sv_flake_look_up(flake, i + a, j + b) >= 0)
                return true;
    return false;
}

static void erode_from(erosion *e, const double at[2], double depth, double reach)
{
    const sv_flake *flake = e->flake;
    sv_patch patch = sv_flake_patch(flake, at, reach);
    for (int32_t i = patch.low[0]; i <= patch.high[0]; i++) {
        for (int32_t j = patch.low[1]; j <= patch.high[1]; j++) {
            int32_t c = sv_flake_look_up(flake, i, j);
            double centre[2];
            if (c < 0)
                continue;
            centre_of(e, i, j, centre);
            double r = hypot(centre[0] - at[0], centre[1] - at[1]);
            if (r < e->nearest[c] - 1e-9) {
                e->nearest[c] = r;
                e->depth[c] = depth;
            }
        }
    }
}

static void remove_cell(sv_drawing *d, int32_t c)
{
    const sv_cell *cell = &d->flake->cells[c];
    bool counted = false;
    for (sv_index s = cell->first_site; s < cell->first_site + cell->n_sites; s++) {
        if (d->gone[s])
            continue;
        d->gone[s] = true;
        d->taken_by[s] = (int16_t)d->entry;
        d->inventory.vacant_sites++;
        counted = true;
    }
    d->inventory.placed[d->entry] += counted;
}

static sv_status find_rim(sv_context *context, erosion *e, const sv_disorder *disorder,
                          const sv_stream *stream)
{
    const sv_flake *flake = e->flake;
    double low[2], high[2], at[2], reach = disorder->amplitude + e->half;
    sv_smooth smooth = {0};
    sv_flake_box(flake, low, high);
    for (int k = 0; k < 2; k++) {
        double margin = 3.0 * (hypot(flake->model->vectors[0][0], flake->model->vectors[0][1]) +
                               hypot(flake->model->vectors[1][0], flake->model->vectors[1][1]));
        low[k] -= margin;
        high[k] += margin;
    }
    sv_status status = sv_smooth_make(context, flake->model, stream, disorder->length,
                                      disorder->covariance, low, high, &smooth);
    for (int64_t i = flake->low[0] - 1; status == SV_OK && i <= flake->high[0] + 1; i++)
        for (int64_t j = flake->low[1] - 1; j <= flake->high[1] + 1; j++) {
            if (!is_rim(flake, i, j))
                continue;
            centre_of(e, i, j, at);
            double g = sv_smooth_at(&smooth, at, (int32_t)i, (int32_t)j, 0);
            erode_from(e, at, disorder->amplitude * gsl_cdf_ugaussian_P(g), reach);
        }
    sv_smooth_free(context, &smooth);
    return status;
}

sv_status sv_draw_roughness(sv_context *context, sv_drawing *d, const sv_disorder *disorder,
                            const sv_stream *stream)
{
    const sv_flake *flake = d->flake;
    erosion e = {.flake = flake, .half = 0.5 * sqrt(sv_model_cell_area(flake->model))};
    double corner[2];
    sv_status status;
    centre_of(&e, flake->cells[0].i, flake->cells[0].j, corner);
    sv_flake_cell_centre(flake, 0, e.offset);
    for (int k = 0; k < 2; k++)
        e.offset[k] -= corner[k];
    if ((status = sv_take_raw(context, flake->n_cells, sizeof *e.nearest, &e.nearest)) != SV_OK ||
        (status = sv_take(context, flake->n_cells, sizeof *e.depth, &e.depth)) != SV_OK)
        goto out;
    for (sv_index c = 0; c < flake->n_cells; c++)
        e.nearest[c] = INFINITY;
    if ((status = find_rim(context, &e, disorder, stream)) != SV_OK)
        goto out;
    for (sv_index c = 0; c < flake->n_cells; c++)
        if (e.nearest[c] < e.depth[c] + e.half)
            remove_cell(d, (int32_t)c);
out:
    sv_give(context, e.nearest);
    sv_give(context, e.depth);
    return status;
}

/*
 * Step edges of a film: a straight line, or a staircase of them, across which a local operator or
 * the potential changes by a jump; all lines may meander alike. On the left of the first line the
 * first jump has been made.
 */
sv_status sv_draw_steps(sv_context *context, sv_drawing *d, const sv_disorder *disorder,
                        const sv_stream *stream)
{
    const sv_flake *flake = d->flake;
    const double along[2] = {cos(disorder->angle), sin(disorder->angle)}, *from = disorder->from;
    double low[2], high[2], size = 0.0;
    sv_smooth smooth = {0};
    sv_status status = SV_OK;
    sv_flake_box(flake, low, high);
    /* The meander is a function of the place on the first line, which may lie far outside. */
    for (int k = 0; k < 2; k++)
        size += fabs(high[k]) + fabs(low[k]) + 2.0 * fabs(from[k]);
    for (int k = 0; k < 2; k++) {
        low[k] = fmin(low[k], from[k] - size * fabs(along[k]));
        high[k] = fmax(high[k], from[k] + size * fabs(along[k]));
    }
    if (disorder->amplitude > 0.0)
        status = sv_smooth_make(context, flake->model, stream, disorder->length,
                                SV_COVARIANCE_GAUSSIAN, low, high, &smooth);
    for (sv_index s = 0; status == SV_OK && s < flake->n_sites; s++) {
        double x = flake->sites[s].at[0] - from[0], y = flake->sites[s].at[1] - from[1];
        double t = along[0] * x + along[1] * y, left = along[0] * y - along[1] * x;
        const double on_line[2] = {from[0] + t * along[0], from[1] + t * along[1]};
        if (disorder->amplitude > 0.0)
            left += disorder->amplitude * sv_smooth_at(&smooth, on_line, 0, 0, 0);
        double steps = disorder->spacing > 0.0 ? floor(left / disorder->spacing) + 1.0
                       : left >= 0.0           ? 1.0
                                               : 0.0;
        if (steps != 0.0)
            status = sv_add_term(context, d, disorder->term, s, steps * disorder->jump);
    }
    sv_smooth_free(context, &smooth);
    return status;
}
