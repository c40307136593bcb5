/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The points of a two-axis sweep as a grid: places, boundaries between indices, their numbers. */
#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "figure_internal.h"

static int ascending(const void *a, const void *b)
{
    const double x = *(const double *)a, y = *(const double *)b;
    return x < y ? -1 : x > y;
}

/* Values of an axis, each once, ascending. */
static sv_status distinct_values(sv_context *context, const sv_result *result, const sv_axis *axis,
                                 double **ret_values, int *ret_count)
{
    double *values = NULL;
    int count = 0;
    sv_status status = sv_take(context, result->n_points, sizeof *values, &values);
    if (status != SV_OK)
        return status;
    for (int32_t i = 0; i < result->n_points; i++)
        values[i] = sv_axis_value(axis, &result->points[i]);
    qsort(values, (size_t)result->n_points, sizeof *values, ascending);
    for (int32_t i = 0; i < result->n_points; i++)
        if (count == 0 || values[i] > values[count - 1])
            values[count++] = values[i];
    *ret_values = values;
    *ret_count = count;
    return SV_OK;
}

static int place_of(const double *values, int count, double value)
{
    const double *found = bsearch(&value, values, (size_t)count, sizeof *values, ascending);
    return (int)(found - values);
}

sv_status sv_phase_grid_make(sv_context *context, const sv_result *result, sv_phase_grid *ret_grid)
{
    sv_phase_grid g = {.result = result};
    sv_status status = SV_OK;
    for (int a = 0; a < 2 && status == SV_OK; a++) {
        sv_axis_make(result, a, &g.axes[a]);
        status = distinct_values(context, result, &g.axes[a], &g.values[a], &g.n[a]);
    }
    if (status == SV_OK)
        status = sv_take(context, (sv_index)g.n[0] * g.n[1], sizeof *g.point, &g.point);
    if (status != SV_OK) {
        sv_phase_grid_free(context, &g);
        return status;
    }
    for (sv_index k = 0; k < (sv_index)g.n[0] * g.n[1]; k++)
        g.point[k] = -1;
    for (int32_t i = 0; i < result->n_points; i++) {
        int at[2];
        for (int a = 0; a < 2; a++)
            at[a] = place_of(g.values[a], g.n[a], sv_axis_value(&g.axes[a], &result->points[i]));
        int32_t *point = &g.point[at[0] + (sv_index)at[1] * g.n[0]];
        g.twice = g.twice || *point >= 0;
        *point = i;
    }
    *ret_grid = g;
    return SV_OK;
}

void sv_phase_grid_free(sv_context *context, sv_phase_grid *grid)
{
    sv_give(context, grid->values[0]);
    sv_give(context, grid->values[1]);
    sv_give(context, grid->point);
    *grid = (sv_phase_grid){0};
}

const sv_summary *sv_phase_at(const sv_phase_grid *grid, int marker, int i, int j)
{
    const int32_t point = grid->point[i + (sv_index)j * grid->n[0]];
    return point < 0 ? NULL : &grid->result->points[point].summaries[marker];
}

double sv_phase_mean(const sv_phase_grid *grid, int marker, int i, int j)
{
    const sv_summary *s = sv_phase_at(grid, marker, i, j);
    return s != NULL && s->exists ? s->mean : (double)NAN;
}

/* Half way to the neighbour; as far beyond the ends as on their other side. */
double sv_phase_side(const sv_phase_grid *grid, int axis, int number, bool upper)
{
    const double *v = grid->values[axis];
    const int n = grid->n[axis], other = upper ? number + 1 : number - 1;
    if (n == 1)
        return v[0] + (upper ? 0.5 : -0.5);
    if (other < 0)
        return v[0] - 0.5 * (v[1] - v[0]);
    if (other == n)
        return v[n - 1] + 0.5 * (v[n - 1] - v[n - 2]);
    return 0.5 * (v[number] + v[other]);
}

/* Where the line between two corners crosses the level. */
static void crossing(const double from[3], const double to[3], double level, double at[2])
{
    const double t = (level - from[2]) / (to[2] - from[2]);
    for (int d = 0; d < 2; d++)
        at[d] = from[d] + t * (to[d] - from[d]);
}

/* Marching squares: the sides of one square that the level crosses, joined in pairs; a saddle goes
 * by its middle. */
static void add_square(sv_draft *text, double corner[4][3], double level)
{
    double at[4][2];
    int n = 0;
    double middle = 0.0;
    for (int k = 0; k < 4; k++) {
        const double *a = corner[k], *b = corner[(k + 1) % 4];
        middle += 0.25 * a[2];
        if ((a[2] < level) != (b[2] < level))
            crossing(a, b, level, at[n++]);
    }
    if (n < 2)
        return;
    /* Sides come in order around the square: joining 0-1, 2-3 cuts off corners 1 and 3. */
    const bool cut_odd = n == 2 || (middle < level) == (corner[0][2] < level);
    for (int k = 0; k < n; k += 2) {
        const int first = cut_odd ? k : k + 1, second = cut_odd ? k + 1 : (k + 2) % n;
        sv_draft_add(text, "%.9g %.9g\n%.9g %.9g\n\n", at[first][0], at[first][1], at[second][0],
                     at[second][1]);
    }
}

void sv_phase_add_boundary(sv_draft *text, const sv_phase_grid *g, int marker)
{
    static const int di[4] = {0, 1, 1, 0}, dj[4] = {0, 0, 1, 1};
    for (int j = 0; j + 1 < g->n[1]; j++)
        for (int i = 0; i + 1 < g->n[0]; i++) {
            double corner[4][3], low = INFINITY, high = -INFINITY;
            bool whole = true;
            for (int k = 0; k < 4; k++) {
                corner[k][0] = g->values[0][i + di[k]];
                corner[k][1] = g->values[1][j + dj[k]];
                corner[k][2] = sv_phase_mean(g, marker, i + di[k], j + dj[k]);
                whole = whole && fabs(corner[k][2]) < 1e6;
                low = fmin(low, corner[k][2]);
                high = fmax(high, corner[k][2]);
            }
            for (double level = floor(low) + 0.5; whole && level <= high; level += 1.0)
                add_square(text, corner, level);
        }
}

/* The rounded mean, of which equal neighbours make a region. */
static bool same_region(const sv_phase_grid *g, int marker, sv_index a, sv_index b)
{
    const double x = sv_phase_mean(g, marker, (int)(a % g->n[0]), (int)(a / g->n[0]));
    const double y = sv_phase_mean(g, marker, (int)(b % g->n[0]), (int)(b / g->n[0]));
    return isfinite(x) && isfinite(y) && lround(x) == lround(y);
}

/* Marks a region and returns its members at the front of the queue. */
static sv_index flood(const sv_phase_grid *g, int marker, sv_index start, uint8_t *seen,
                      sv_index *queue)
{
    const int nx = g->n[0], ny = g->n[1];
    sv_index head = 0, tail = 0;
    seen[start] = 1;
    queue[tail++] = start;
    while (head < tail) {
        const sv_index k = queue[head++], i = k % nx, j = k / nx;
        const sv_index next[4] = {i > 0 ? k - 1 : -1, i + 1 < nx ? k + 1 : -1, j > 0 ? k - nx : -1,
                                  j + 1 < ny ? k + nx : -1};
        for (int d = 0; d < 4; d++)
            if (next[d] >= 0 && !seen[next[d]] && same_region(g, marker, start, next[d])) {
                seen[next[d]] = 1;
                queue[tail++] = next[d];
            }
    }
    return tail;
}

/* How far a mean is from an integer: small inside a region, large by its border. */
static double off_integer(const sv_phase_grid *g, int marker, sv_index k)
{
    const double mean = sv_phase_mean(g, marker, (int)(k % g->n[0]), (int)(k / g->n[0]));
    return fabs(mean - nearbyint(mean));
}

/* Of the members well inside the region the one nearest to its middle, in steps of the axes. */
static sv_index middle_of(const sv_phase_grid *g, int marker, const sv_index *members, sv_index n)
{
    double x = 0.0, y = 0.0, least = INFINITY, inside = INFINITY;
    sv_index best = members[0];
    for (sv_index k = 0; k < n; k++) {
        x += (double)(members[k] % g->n[0]) / (double)n;
        y += (double)(members[k] / g->n[0]) / (double)n;
        inside = fmin(inside, off_integer(g, marker, members[k]));
    }
    for (sv_index k = 0; k < n; k++) {
        const double away =
            hypot((double)(members[k] % g->n[0]) - x, (double)(members[k] / g->n[0]) - y);
        if (away < least - 1e-9 && off_integer(g, marker, members[k]) < inside + 0.1) {
            least = away;
            best = members[k];
        }
    }
    return best;
}

sv_status sv_phase_add_labels(sv_context *context, sv_draft *text, const sv_phase_grid *g,
                              int marker)
{
    const sv_index count = (sv_index)g->n[0] * g->n[1];
    uint8_t *seen = NULL;
    sv_index *queue = NULL;
    sv_status status = sv_take(context, count, 1, &seen);
    if (status == SV_OK)
        status = sv_take(context, count, sizeof *queue, &queue);
    for (sv_index k = 0; status == SV_OK && k < count; k++) {
        const double mean = sv_phase_mean(g, marker, (int)(k % g->n[0]), (int)(k / g->n[0]));
        if (seen[k] || !isfinite(mean))
            continue;
        const sv_index n = flood(g, marker, k, seen, queue), at = middle_of(g, marker, queue, n);
        sv_draft_add(text, "%.9g %.9g %ld\n", g->values[0][at % g->n[0]],
                     g->values[1][at / g->n[0]], lround(mean));
    }
    sv_give(context, seen);
    sv_give(context, queue);
    return status;
}
