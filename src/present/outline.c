/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Borders of pixel regions as lines: traced along pixel edges, then straightened. */
#include <math.h>
#include <string.h>

#include "present_internal.h"

/* Corners of pixels: corner (x, y) is the lower left one of pixel (x, y). */
typedef struct corner {
    int x, y;
} corner;

typedef struct tracer {
    sv_context *context;
    const sv_raster *raster;
    uint8_t mask;
    uint8_t *visited; /* lower edge of a pixel already walked */
    corner *line;
    sv_index count, capacity;
    bool *keep;
    sv_index keep_capacity;
} tracer;

static const int step_x[4] = {1, 0, -1, 0}, step_y[4] = {0, 1, 0, -1}; /* east, north, … */

static bool is_in(const tracer *t, int x, int y)
{
    return x >= 0 && y >= 0 && x < t->raster->nx && y < t->raster->ny &&
           (t->raster->inside[(sv_index)y * t->raster->nx + x] & t->mask) != 0;
}

/* The pixel ahead on one side of a corner, walking in direction d. */
static bool ahead(const tracer *t, corner at, int d, bool left)
{
    static const int left_x[4] = {0, -1, -1, 0}, left_y[4] = {0, 0, -1, -1};
    const int side = left ? d : (d + 3) % 4;
    return is_in(t, at.x + left_x[side], at.y + left_y[side]);
}

static sv_status push(tracer *t, corner at)
{
    sv_status status =
        sv_reserve(t->context, &t->line, &t->capacity, t->count + 1, sizeof *t->line);
    if (status == SV_OK)
        t->line[t->count++] = at;
    return status;
}

/* Walks once around, the region to the left; keeps the corners where the direction changes. */
static sv_status walk(tracer *t, int x, int y)
{
    const corner start = {x, y};
    corner at = start;
    int d = 0;
    t->count = 0;
    sv_status status = push(t, start);
    do {
        if (d == 0)
            t->visited[(sv_index)at.y * t->raster->nx + at.x] = 1;
        at.x += step_x[d];
        at.y += step_y[d];
        const int turn = !ahead(t, at, d, true) ? 1 : ahead(t, at, d, false) ? 3 : 0;
        d = (d + turn) % 4;
        if (turn != 0 && status == SV_OK)
            status = push(t, at);
    } while (status == SV_OK && (at.x != start.x || at.y != start.y || d != 0));
    if (status == SV_OK && (t->line[t->count - 1].x != x || t->line[t->count - 1].y != y))
        status = push(t, start);
    return status;
}

/* Distance of a corner from the segment a–b. */
static double distance_to(corner p, corner a, corner b)
{
    const double dx = b.x - a.x, dy = b.y - a.y, px = p.x - a.x, py = p.y - a.y;
    const double length = dx * dx + dy * dy;
    if (length <= 0)
        return hypot(px, py);
    const double s = fmin(fmax((px * dx + py * dy) / length, 0), 1);
    return hypot(px - s * dx, py - s * dy);
}

/* Farthest point between two kept ones. */
static sv_index farthest(const tracer *t, sv_index first, sv_index last, double *ret_distance)
{
    sv_index best = first;
    *ret_distance = -1;
    for (sv_index k = first + 1; k < last; k++) {
        const double distance = distance_to(t->line[k], t->line[first], t->line[last]);
        if (distance > *ret_distance) {
            *ret_distance = distance;
            best = k;
        }
    }
    return best;
}

/*
 * Drops corners that lie close to the straight line (D. H. Douglas, T. K. Peucker,
 * Cartographica 10, 112 (1973)): the steps of slanted edges go, real corners stay.
 */
static sv_status straighten(tracer *t)
{
    static const double tolerance = 1.6; /* pixels; less than a cell is wide */
    sv_index first = 0, last, depth = 0, capacity = 0;
    sv_index *stack = NULL;
    double distance;
    sv_status status = sv_reserve(t->context, &t->keep, &t->keep_capacity, t->count, 1);
    if (status == SV_OK)
        status = sv_reserve(t->context, &stack, &capacity, t->count + 1, sizeof *stack);
    if (status != SV_OK)
        return status;
    memset(t->keep, 0, (size_t)t->count);
    t->keep[0] = t->keep[t->count - 1] = true;
    stack[depth++] = t->count - 1;
    while (depth > 0) {
        last = stack[depth - 1];
        const sv_index middle = farthest(t, first, last, &distance);
        if (distance > tolerance) {
            t->keep[middle] = true;
            stack[depth++] = middle;
        } else {
            first = last;
            depth--;
        }
    }
    sv_give(t->context, stack);
    return SV_OK;
}

static void write_line(const tracer *t, sv_draft *text)
{
    const sv_raster *raster = t->raster;
    for (sv_index k = 0; k < t->count; k++)
        if (t->keep[k])
            sv_draft_add(text, "%.7g %.7g\n", raster->low[0] + (t->line[k].x - 0.5) * raster->step,
                         raster->low[1] + (t->line[k].y - 0.5) * raster->step);
    sv_draft_add(text, "\n");
}

sv_status sv_outline_write(sv_draft *text, const sv_raster *raster, uint8_t mask)
{
    tracer t = {.context = text->context, .raster = raster, .mask = mask};
    sv_status status = sv_take(text->context, (sv_index)raster->nx * raster->ny, 1, &t.visited);
    for (int y = 0; y < raster->ny && status == SV_OK; y++)
        for (int x = 0; x < raster->nx && status == SV_OK; x++) {
            if (!is_in(&t, x, y) || is_in(&t, x, y - 1) || t.visited[(sv_index)y * raster->nx + x])
                continue;
            status = walk(&t, x, y);
            if (status == SV_OK)
                status = straighten(&t);
            if (status == SV_OK)
                write_line(&t, text);
        }
    sv_give(text->context, t.visited);
    sv_give(text->context, t.line);
    sv_give(text->context, t.keep);
    return status != SV_OK ? status : text->status;
}
