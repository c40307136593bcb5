/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Polygons with holes: validity, point test, area and centroid. */
#include "sample_internal.h"

#include <math.h>
#include <stdio.h>

/* Points this near an edge count as on it, as for the other shapes. */
static const double EDGE = 1e-9;

static int loop_size(const sv_polygon *p, int loop)
{
    return p->loop_start[loop + 1] - p->loop_start[loop];
}

/* Corner k of a loop, counted round and round. */
static const double *corner(const sv_polygon *p, int loop, int k)
{
    return &p->corners[2 * (p->loop_start[loop] + k % loop_size(p, loop))];
}

/* Twice the area of the triangle a, b, c; positive counter-clockwise. */
static double turn(const double a[2], const double b[2], const double c[2])
{
    return (b[0] - a[0]) * (c[1] - a[1]) - (b[1] - a[1]) * (c[0] - a[0]);
}

static double distance_to_segment(const double a[2], const double b[2], const double at[2])
{
    double d[2] = {b[0] - a[0], b[1] - a[1]};
    double square = d[0] * d[0] + d[1] * d[1];
    double t = square > 0.0 ? ((at[0] - a[0]) * d[0] + (at[1] - a[1]) * d[1]) / square : 0.0;
    t = fmin(fmax(t, 0.0), 1.0);
    return hypot(at[0] - a[0] - t * d[0], at[1] - a[1] - t * d[1]);
}

/* Do segments ab and cd cross or come nearer than EDGE? */
static bool segments_meet(const double a[2], const double b[2], const double c[2],
                          const double d[2])
{
    bool apart = (turn(a, b, c) > 0.0) == (turn(a, b, d) > 0.0) ||
                 (turn(c, d, a) > 0.0) == (turn(c, d, b) > 0.0);
    return !apart || distance_to_segment(a, b, c) <= EDGE || distance_to_segment(a, b, d) <= EDGE ||
           distance_to_segment(c, d, a) <= EDGE || distance_to_segment(c, d, b) <= EDGE;
}

bool sv_loop_holds(const sv_polygon *p, int loop, const double at[2], bool *ret_on_edge)
{
    bool inside = false;
    int n = loop_size(p, loop);
    *ret_on_edge = false;
    for (int k = 0; k < n; k++) {
        const double *a = corner(p, loop, k), *b = corner(p, loop, k + 1);
        double low = fmin(a[1], b[1]), high = fmax(a[1], b[1]);
        if (at[1] < low - EDGE || at[1] > high + EDGE)
            continue;
        if (distance_to_segment(a, b, at) <= EDGE) {
            *ret_on_edge = true;
            return true;
        }
        /* A ray along +x; half-open in y so that a corner counts once. */
        if ((a[1] > at[1]) != (b[1] > at[1]) &&
            at[0] < a[0] + (at[1] - a[1]) / (b[1] - a[1]) * (b[0] - a[0]))
            inside = !inside;
    }
    return inside;
}

bool sv_polygon_holds(const sv_polygon *p, const double at[2])
{
    bool on_edge;
    if (!sv_loop_holds(p, 0, at, &on_edge))
        return false;
    for (int loop = 1; loop < p->n_loops; loop++)
        if (sv_loop_holds(p, loop, at, &on_edge) && !on_edge)
            return false;
    return true;
}

/* Area of a loop and its first moments, relative to the first corner; positive area. */
static double loop_moments(const sv_polygon *p, int loop, double ret_moment[2])
{
    const double *first = corner(p, loop, 0);
    double area = 0.0;
    ret_moment[0] = ret_moment[1] = 0.0;
    for (int k = 1; k + 1 < loop_size(p, loop); k++) {
        const double *b = corner(p, loop, k), *c = corner(p, loop, k + 1);
        double part = 0.5 * turn(first, b, c);
        area += part;
        for (int d = 0; d < 2; d++)
            ret_moment[d] += part * (first[d] + b[d] + c[d]) / 3.0;
    }
    for (int d = 0; d < 2; d++)
        ret_moment[d] = area < 0.0 ? -ret_moment[d] : ret_moment[d];
    return fabs(area);
}

double sv_polygon_area(const sv_polygon *p, double ret_centroid[2])
{
    double moment[2], area = loop_moments(p, 0, moment);
    for (int loop = 1; loop < p->n_loops; loop++) {
        double part[2];
        area -= loop_moments(p, loop, part);
        moment[0] -= part[0];
        moment[1] -= part[1];
    }
    for (int d = 0; d < 2; d++)
        ret_centroid[d] = area > 0.0 ? moment[d] / area : corner(p, 0, 0)[d];
    return area;
}

double sv_polygon_length(const sv_polygon *p)
{
    double length = 0.0;
    for (int loop = 0; loop < p->n_loops; loop++)
        for (int k = 0; k < loop_size(p, loop); k++) {
            const double *a = corner(p, loop, k), *b = corner(p, loop, k + 1);
            length += hypot(b[0] - a[0], b[1] - a[1]);
        }
    return length;
}

double sv_polygon_distance(const sv_polygon *p, int first, int last, const double at[2])
{
    double best = INFINITY;
    for (int loop = first; loop < last; loop++)
        for (int k = 0; k < loop_size(p, loop); k++)
            best = fmin(best, distance_to_segment(corner(p, loop, k), corner(p, loop, k + 1), at));
    return best;
}

/* The middle of the widest stretch of the line y = level inside a loop, in steps of the corners. */
static double stretch_at(const sv_polygon *p, int loop, double level, double *ret_middle)
{
    double widest = 0.0;
    int n = loop_size(p, loop);
    for (int j = 0; j < n; j++) {
        const double *a = corner(p, loop, j), *b = corner(p, loop, j + 1);
        if ((a[1] > level) == (b[1] > level))
            continue;
        double x = a[0] + (level - a[1]) / (b[1] - a[1]) * (b[0] - a[0]), next = INFINITY;
        int left = 0;
        for (int k = 0; k < n; k++) {
            const double *c = corner(p, loop, k), *d = corner(p, loop, k + 1);
            if ((c[1] > level) == (d[1] > level))
                continue;
            double other = c[0] + (level - c[1]) / (d[1] - c[1]) * (d[0] - c[0]);
            left += other < x;
            next = other > x ? fmin(next, other) : next;
        }
        /* Inside lies right of the first, third … crossing. */
        if (left % 2 == 0 && isfinite(next) && next - x > widest) {
            widest = next - x;
            *ret_middle = 0.5 * (x + next);
        }
    }
    return widest;
}

void sv_loop_inside(const sv_polygon *p, int loop, double ret_at[2])
{
    double best = 0.0;
    int n = loop_size(p, loop);
    for (int k = 0; k < n; k++) {
        double above = INFINITY, low = corner(p, loop, k)[1], middle = 0.0;
        for (int j = 0; j < n; j++)
            above = corner(p, loop, j)[1] > low ? fmin(above, corner(p, loop, j)[1]) : above;
        if (!isfinite(above))
            continue;
        double room = fmin(above - low, stretch_at(p, loop, 0.5 * (low + above), &middle));
        if (room > best) {
            best = room;
            ret_at[0] = middle;
            ret_at[1] = 0.5 * (low + above);
        }
    }
}

static const char *loop_name(int loop, char name[32])
{
    snprintf(name, 32, loop == 0 ? "the outline" : "hole %d", loop);
    return name;
}

#define FAULT(fault, loop_, corner_, hint_, ...)                                                   \
    do {                                                                                           \
        (fault)->loop = (loop_);                                                                   \
        (fault)->corner = (corner_);                                                               \
        snprintf((fault)->hint, sizeof(fault)->hint, "%s", hint_);                                 \
        snprintf((fault)->message, sizeof(fault)->message, __VA_ARGS__);                           \
    } while (0)

static bool loop_is_sound(const sv_polygon *p, int loop, sv_polygon_fault *fault)
{
    char name[32];
    int n = loop_size(p, loop);
    if (n < 3) {
        FAULT(fault, loop, 0, "give the corners in order; the last one joins the first",
              "%s has %d corners; an area needs three", loop_name(loop, name), n);
        return false;
    }
    for (int k = 0; k < n; k++) {
        const double *a = corner(p, loop, k), *b = corner(p, loop, k + 1);
        const double *c = corner(p, loop, k + 2);
        bool twice =
            hypot(b[0] - a[0], b[1] - a[1]) <= EDGE || hypot(c[0] - b[0], c[1] - b[1]) <= EDGE;
        if (twice || distance_to_segment(a, b, c) <= EDGE || distance_to_segment(b, c, a) <= EDGE) {
            FAULT(fault, loop, (k + 1) % n, "write each corner once; the last one joins the first",
                  twice ? "%s has the corner (%g, %g) twice in a row"
                        : "%s folds back on itself at (%g, %g)",
                  loop_name(loop, name), b[0], b[1]);
            return false;
        }
    }
    return true;
}

/* First pair of edges of two loops (or of one) that meet. */
static bool loops_are_apart(const sv_polygon *p, int first, int second, sv_polygon_fault *fault)
{
    char name[32], other[32];
    int n = loop_size(p, first), m = loop_size(p, second);
    for (int j = 0; j < n; j++) {
        for (int k = 0; k < m; k++) {
            bool neighbours = first == second && (k <= j + 1 || (j == 0 && k == m - 1));
            if (neighbours || !segments_meet(corner(p, first, j), corner(p, first, j + 1),
                                             corner(p, second, k), corner(p, second, k + 1)))
                continue;
            const double *a = corner(p, second, k), *b = corner(p, second, k + 1);
            FAULT(fault, second, k,
                  "give the corners in order around the shape; loops may not touch",
                  "%s meets %s on the way from (%g, %g) to (%g, %g)", loop_name(second, name),
                  first == second ? "itself" : loop_name(first, other), a[0], a[1], b[0], b[1]);
            return false;
        }
    }
    return true;
}

static bool hole_is_placed(const sv_polygon *p, int hole, sv_polygon_fault *fault)
{
    bool on_edge;
    const double *at = corner(p, hole, 0);
    if (!sv_loop_holds(p, 0, at, &on_edge)) {
        FAULT(fault, hole, 0, "a hole lies inside the outline", "hole %d lies outside the outline",
              hole);
        return false;
    }
    for (int other = 1; other < p->n_loops; other++) {
        if (other == hole || !sv_loop_holds(p, other, at, &on_edge))
            continue;
        FAULT(fault, hole, 0, "leave it out", "hole %d lies inside hole %d", hole, other);
        return false;
    }
    return true;
}

static bool is_sound(const sv_polygon *p, sv_polygon_fault *fault)
{
    if (p->n_loops < 1 || p->loop_start[p->n_loops] > SV_POLYGON_MOST) {
        FAULT(fault, 0, 0, "leave out corners the lattice cannot show",
              "a polygon needs 3 to %d corners, got %d", SV_POLYGON_MOST,
              p->n_loops < 1 ? 0 : p->loop_start[p->n_loops]);
        return false;
    }
    for (int loop = 0; loop < p->n_loops; loop++)
        if (!loop_is_sound(p, loop, fault))
            return false;
    for (int loop = 0; loop < p->n_loops; loop++)
        for (int other = 0; other <= loop; other++)
            if (!loops_are_apart(p, other, loop, fault))
                return false;
    for (int hole = 1; hole < p->n_loops; hole++)
        if (!hole_is_placed(p, hole, fault))
            return false;
    return true;
}

sv_status sv_polygon_check(sv_context *context, const sv_polygon *polygon,
                           sv_polygon_fault *ret_fault)
{
    sv_polygon_fault fault = {0};
    if (is_sound(polygon, &fault))
        return SV_OK;
    *ret_fault = fault;
    return SV_FAIL(context, SV_INVALID_INPUT, "%s", fault.message);
}
