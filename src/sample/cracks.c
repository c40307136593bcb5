/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Cracks and slits: straight lines that cut the hops across them. Given by their ends, or Poisson
 * points with random directions and lengths. A site on a line counts as on its left. */
#include "sample_internal.h"

#include <math.h>

static const double LONGEST = 20.0; /* mean lengths; exp(−20) of them are cut to that */

static sv_status add_cut(sv_context *context, sv_drawing *d, const double from[2],
                         const double to[2])
{
    sv_bonds *bonds = &d->bonds;
    sv_status status = sv_reserve(context, &bonds->cuts, &bonds->cut_capacity, bonds->n_cuts + 1,
                                  sizeof *bonds->cuts);
    if (status != SV_OK)
        return status;
    bonds->cuts[bonds->n_cuts++] = (sv_cut){{from[0], from[1]}, {to[0], to[1]}};
    return SV_OK;
}

static double uniform(const sv_stream *stream, const sv_point *point, uint32_t which)
{
    return sv_stream_uniform(stream, point->cell[0], point->cell[1], point->slot + which);
}

sv_status sv_draw_cracks(sv_context *context, sv_drawing *d, const sv_disorder *disorder,
                         const sv_stream *stream)
{
    sv_point *points = NULL;
    sv_index n = 0;
    if (disorder->has_line) {
        d->inventory.placed[d->entry]++;
        return add_cut(context, d, disorder->from, disorder->to);
    }
    double longest = disorder->length * (disorder->exponential ? LONGEST : 1.0);
    sv_status status =
        sv_points_draw(context, d->flake, stream, disorder->density, 0.5 * longest, &points, &n);
    for (sv_index k = 0; k < n && status == SV_OK; k++) {
        double angle =
            disorder->has_angle ? disorder->angle : M_PI * uniform(stream, &points[k], 0);
        double length = disorder->length;
        if (disorder->exponential)
            length *= fmin(LONGEST, -log(uniform(stream, &points[k], 1)));
        double x = 0.5 * length * cos(angle), y = 0.5 * length * sin(angle);
        const double *at = points[k].at;
        status = add_cut(context, d, (const double[2]){at[0] - x, at[1] - y},
                         (const double[2]){at[0] + x, at[1] + y});
        d->inventory.placed[d->entry] += sv_point_on_flake(d->flake, at);
    }
    sv_give(context, points);
    return status;
}
