/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Measured maps on a regular raster, read at any place by bilinear interpolation. */
#include "sample_internal.h"

#include <math.h>
#include <stdio.h>
#include <stdlib.h>

void sv_grid_free(sv_context *context, sv_grid *grid)
{
    sv_give(context, grid->value);
    *grid = (sv_grid){0};
}

/* Place of a point in raster steps from value (0, 0). */
static void raster_place(const sv_grid *f, const double at[2], double ret[2])
{
    const double c = cos(f->rotation), s = sin(f->rotation);
    const double x = at[0] - f->origin[0], y = at[1] - f->origin[1];
    ret[0] = (c * x + s * y - f->first[0]) / f->step[0];
    ret[1] = (c * y - s * x - f->first[1]) / f->step[1];
}

static double value_at(const sv_grid *f, sv_index k)
{
    return f->value != NULL ? f->value[k] : f->black + (f->white - f->black) * (double)f->grey[k];
}

bool sv_grid_at(const sv_grid *f, const double at[2], double *ret_value)
{
    static const double rim = 0.5 + 1e-6; /* a value stands for the half step around it */
    const sv_index n[2] = {f->nx, f->ny};
    sv_index low[2];
    double place[2], part[2];
    raster_place(f, at, place);
    for (int k = 0; k < 2; k++) {
        if (!(place[k] >= -rim && place[k] <= (double)(n[k] - 1) + rim))
            return false;
        const double inside = fmin(fmax(place[k], 0.0), (double)(n[k] - 1));
        low[k] = (sv_index)floor(inside);
        low[k] = low[k] > n[k] - 2 ? n[k] - 2 : low[k];
        low[k] = low[k] < 0 ? 0 : low[k];
        part[k] = inside - (double)low[k];
    }
    const sv_index dx = f->nx > 1, dy = f->ny > 1 ? f->nx : 0;
    const sv_index k = low[1] * f->nx + low[0];
    *ret_value =
        (1 - part[1]) * ((1 - part[0]) * value_at(f, k) + part[0] * value_at(f, k + dx)) +
        part[1] * ((1 - part[0]) * value_at(f, k + dy) + part[0] * value_at(f, k + dy + dx));
    return true;
}

sv_grid sv_grid_of_grey(const sv_grey *grey, double pixel, double black, double white)
{
    return (sv_grid){.nx = grey->width,
                     .ny = grey->height,
                     .step = {pixel, pixel},
                     .first = {0.5 * pixel, 0.5 * pixel},
                     .grey = grey->value,
                     .black = black,
                     .white = white};
}

static int compare_reals(const void *a, const void *b)
{
    const double x = *(const double *)a, y = *(const double *)b;
    return (x > y) - (x < y);
}

/* The distinct values of a coordinate: how many, the first, and their even step. */
typedef struct axis {
    sv_index n;
    double first, step;
    bool even;
} axis;

static sv_status find_axis(sv_context *context, const sv_mark *marks, sv_index n, int k, axis *ret)
{
    double *x = NULL;
    axis a = {.even = true};
    sv_status status = sv_take_raw(context, n, sizeof *x, &x);
    if (status != SV_OK)
        return status;
    for (sv_index m = 0; m < n; m++)
        x[m] = marks[m].at[k];
    qsort(x, (size_t)n, sizeof *x, compare_reals);
    const double close = 1e-6 * fmax(x[n - 1] - x[0], 1e-9);
    a.n = 1;
    a.first = x[0];
    for (sv_index m = 1; m < n; m++)
        a.n += x[m] > x[m - 1] + close;
    a.step = a.n > 1 ? (x[n - 1] - x[0]) / (double)(a.n - 1) : 1.0;
    for (sv_index m = 0; m < n; m++) {
        const double u = (x[m] - a.first) / a.step;
        a.even = a.even && fabs(u - round(u)) < 1e-3;
    }
    sv_give(context, x);
    *ret = a;
    return SV_OK;
}

static sv_status grid_fault(sv_context *context, sv_table_fault *fault, int line,
                            const char *message)
{
    *fault = (sv_table_fault){.line = line, .column = 1};
    snprintf(fault->message, sizeof fault->message, "%s", message);
    snprintf(fault->hint, sizeof fault->hint,
             "between: bilinear needs every node of a regular raster once; between: nearest takes "
             "scattered rows");
    return SV_FAIL(context, SV_INVALID_INPUT, "line %d: %s", line, message);
}

static sv_status place_nodes(sv_context *context, const sv_mark *marks, sv_index n,
                             const axis axes[2], sv_grid *f, int32_t *line_of,
                             sv_table_fault *fault)
{
    char message[200];
    for (sv_index m = 0; m < n; m++) {
        const sv_index i = llround((marks[m].at[0] - axes[0].first) / axes[0].step);
        const sv_index j = llround((marks[m].at[1] - axes[1].first) / axes[1].step);
        const sv_index node = j * f->nx + i;
        if (line_of[node] > 0) {
            snprintf(message, sizeof message, "the raster node of line %d stands here again",
                     line_of[node]);
            return grid_fault(context, fault, marks[m].line, message);
        }
        line_of[node] = marks[m].line;
        f->value[node] = marks[m].energy;
    }
    return SV_OK;
}

sv_status sv_grid_from_marks(sv_context *context, const sv_mark *marks, sv_index n,
                             sv_grid *ret_grid, sv_table_fault *ret_fault)
{
    sv_grid f = {0};
    axis axes[2];
    int32_t *line_of = NULL;
    char message[200];
    sv_status status;
    if (n == 0 || marks[0].by_cell)
        return grid_fault(context, ret_fault, 1, "a raster needs rows with x, y and energy");
    if ((status = find_axis(context, marks, n, 0, &axes[0])) != SV_OK ||
        (status = find_axis(context, marks, n, 1, &axes[1])) != SV_OK)
        return status;
    const double nodes = (double)axes[0].n * (double)axes[1].n;
    if (!axes[0].even || !axes[1].even || nodes > (double)n) {
        snprintf(message, sizeof message,
                 "the rows are no regular raster: %lld different x, %lld different y, %lld rows",
                 (long long)axes[0].n, (long long)axes[1].n, (long long)n);
        return grid_fault(context, ret_fault, 1, message);
    }
    f = (sv_grid){.nx = axes[0].n,
                  .ny = axes[1].n,
                  .step = {axes[0].step, axes[1].step},
                  .first = {axes[0].first, axes[1].first}};
    if ((status = sv_take(context, f.nx * f.ny, sizeof *f.value, &f.value)) == SV_OK &&
        (status = sv_take(context, f.nx * f.ny, sizeof *line_of, &line_of)) == SV_OK)
        status = place_nodes(context, marks, n, axes, &f, line_of, ret_fault);
    sv_give(context, line_of);
    if (status == SV_OK)
        *ret_grid = f;
    else
        sv_grid_free(context, &f);
    return status;
}
