/* SPDX-License-Identifier: GPL-3.0-or-later */
/* What the gap can be between the probes, the localizer being κ-Lipschitz in the probe point. */
#include "localizer_internal.h"

#include <math.h>

/* Room for the error of a gap found by Lanczos, relative. */
static const double GAP_ROOM = 1e-6;
enum { PARTS = 16 };

static double upper(const sv_probe *p)
{
    return p->gap * (1.0 + GAP_ROOM);
}

/* Least of max(c0 − κt, c1 − κ(d − t)) over the segment: a V, lowest where both are equal. */
static double lowest_on_segment(double c0, double c1, double kappa, double d)
{
    double t = fmin(fmax(0.5 * (c0 - c1 + kappa * d) / kappa, 0.0), d);
    return fmax(c0 - kappa * t, c1 - kappa * (d - t));
}

static double highest_on_segment(double u0, double u1, double kappa, double d)
{
    return -lowest_on_segment(-u0, -u1, kappa, d);
}

static bool agree(const sv_probe *const *corner, int count)
{
    for (int k = 0; k < count; k++)
        if (!corner[k]->resolved || corner[k]->index != corner[0]->index)
            return false;
    return true;
}

static sv_between along_segment(const sv_probe *const ends[2], double kappa)
{
    double d = hypot(ends[1]->at[0] - ends[0]->at[0], ends[1]->at[1] - ends[0]->at[1]);
    sv_between b = {.low = lowest_on_segment(ends[0]->certain, ends[1]->certain, kappa, d),
                    .high = highest_on_segment(upper(ends[0]), upper(ends[1]), kappa, d)};
    b.constant = b.low > 0.0 && agree(ends, 2);
    b.low = fmax(b.low, 0.0);
    if (!isfinite(ends[0]->gap) || !isfinite(ends[1]->gap))
        b.high = NAN;
    return b;
}

/* Bounds on the (i, j)th part of a cell from its corners and their largest distance. */
static sv_between on_part(const sv_probe *const corner[4], double kappa, int i, int j)
{
    const double *low = corner[0]->at, *high = corner[3]->at;
    sv_between b = {.low = -INFINITY, .high = INFINITY};
    double step[2] = {(high[0] - low[0]) / PARTS, (high[1] - low[1]) / PARTS};
    double from[2] = {low[0] + i * step[0], low[1] + j * step[1]};
    for (int k = 0; k < 4; k++) {
        double far[2];
        for (int a = 0; a < 2; a++)
            far[a] =
                fmax(fabs(from[a] - corner[k]->at[a]), fabs(from[a] + step[a] - corner[k]->at[a]));
        double reach = kappa * hypot(far[0], far[1]);
        b.low = fmax(b.low, corner[k]->certain - reach);
        if (isfinite(corner[k]->gap))
            b.high = fmin(b.high, upper(corner[k]) + reach);
    }
    return b;
}

/* Corners in the order of the probes: x fastest. */
static sv_between over_cell(const sv_probe *const corner[4], double kappa)
{
    sv_between b = {.low = INFINITY, .high = -INFINITY};
    for (int i = 0; i < PARTS; i++)
        for (int j = 0; j < PARTS; j++) {
            sv_between part = on_part(corner, kappa, i, j);
            b.low = fmin(b.low, part.low);
            b.high = fmax(b.high, part.high);
        }
    b.constant = b.low > 0.0 && agree(corner, 4);
    b.low = fmax(b.low, 0.0);
    b.high = isfinite(b.high) ? b.high : (double)NAN;
    return b;
}

sv_status sv_localizer_bracket(sv_context *context, bool bounds_only, sv_survey *s)
{
    const sv_index nx = s->points[0], ny = s->points[1];
    if (nx * ny == 0)
        return SV_OK;
    s->n_between = s->line ? nx - 1 : (nx - 1) * (ny - 1);
    sv_status status = sv_take(context, s->n_between, sizeof *s->between, &s->between);
    for (sv_index k = 0; status == SV_OK && k < s->n_between; k++) {
        sv_index at = s->line ? k : k % (nx - 1) + k / (nx - 1) * nx;
        const sv_probe *p = &s->probes[at];
        const sv_probe *const corner[4] = {p, p + 1, p + (s->line ? 0 : nx),
                                           p + (s->line ? 0 : nx + 1)};
        s->between[k] = s->line ? along_segment(corner, s->kappa) : over_cell(corner, s->kappa);
        if (bounds_only) /* τ is no gap */
            s->between[k].high = NAN;
    }
    return status;
}
