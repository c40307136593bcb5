/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Matrix and vectors packed for polynomials: rows of [re…][im…] of a fixed number of columns. */
#include "linalg_internal.h"

#include <math.h>
#include <string.h>

/* Eight steps: measured best from 1,800 to 10^6 rows; more of them spill from the cache again. */
enum { STEPS_PER_WALK = 8, LEAST_STRIDE = 64 };
_Static_assert(STEPS_PER_WALK % 2 == 0, "the vectors of a walk come back to their places");

/* Which loop suits this processor. A pure function of the machine: no state is kept. */
static panel_step choose_step(sv_panel_kernel kernel)
{
    if (kernel == SV_PANEL_AVX512)
        return sv_panel_step_avx512;
    if (kernel == SV_PANEL_AVX2)
        return sv_panel_step_avx2;
    return sv_panel_step_plain;
}

sv_panel_kernel sv_panel_best_kernel(void)
{
    if (__builtin_cpu_supports("avx512f") && __builtin_cpu_supports("fma"))
        return SV_PANEL_AVX512;
    if (__builtin_cpu_supports("avx2") && __builtin_cpu_supports("fma"))
        return SV_PANEL_AVX2;
    return SV_PANEL_PLAIN;
}

const char *sv_panel_kernel_name(sv_panel_kernel kernel)
{
    return kernel == SV_PANEL_AVX512 ? "avx512" : kernel == SV_PANEL_AVX2 ? "avx2" : "plain";
}

void sv_packed_free(sv_context *context, sv_packed *packed)
{
    sv_give(context, packed->start);
    sv_give(context, packed->column);
    sv_give(context, packed->re);
    sv_give(context, packed->im);
    *packed = (sv_packed){0};
}

/* A part below rounding (cos of a right angle is 6e-17) does not make an element a general one. */
static int element_class(sv_complex value)
{
    double re = fabs(creal(value)), im = fabs(cimag(value));
    return im <= 2e-16 * re ? 0 : re <= 2e-16 * im ? 1 : 2;
}

/* (H − shift)/scale, row by row, elements sorted by class. */
static void pack_row(const sv_sparse *h, const int32_t *place, sv_index row, sv_index to,
                     double shift, double scale, sv_packed *p, sv_index *used)
{
    for (int class = 0; class < 3; class ++) {
        p->start[3 * to + class] = *used;
        for (sv_index k = h->row_start[row]; k < h->row_start[row + 1]; k++) {
            int32_t column = place == NULL ? h->column[k] : place[h->column[k]];
            sv_complex value = h->value[k];
            if (h->column[k] == row)
                value -= shift;
            if (column < 0 || element_class(value) != class)
                continue;
            p->column[*used] = column;
            p->re[*used] = creal(value) / scale;
            p->im[*used] = cimag(value) / scale;
            sv_index distance = column < to ? to - column : column - to;
            p->span = distance > p->span ? distance : p->span;
            (*used)++;
        }
    }
}

sv_status sv_packed_make(sv_context *context, const sv_sparse *h, const sv_index *rows, sv_index n,
                         const int32_t *place, double shift, double scale, sv_packed *ret_packed)
{
    sv_packed p = {.n = n};
    sv_index room = 0, used = 0;
    for (sv_index k = 0; k < n; k++) {
        sv_index row = rows == NULL ? k : rows[k];
        room += h->row_start[row + 1] - h->row_start[row];
    }
    sv_status status;
    if ((status = sv_take_raw(context, 3 * n + 1, sizeof *p.start, &p.start)) != SV_OK ||
        (status = sv_take_raw(context, room, sizeof *p.column, &p.column)) != SV_OK ||
        (status = sv_take_raw(context, room, sizeof *p.re, &p.re)) != SV_OK ||
        (status = sv_take_raw(context, room, sizeof *p.im, &p.im)) != SV_OK) {
        sv_packed_free(context, &p);
        return status;
    }
    for (sv_index k = 0; k < n; k++)
        pack_row(h, place, rows == NULL ? k : rows[k], k, shift, scale, &p, &used);
    p.start[3 * n] = used;
    *ret_packed = p;
    return SV_OK;
}

/*
 * Several steps in one walk over the rows: step s follows s·span rows behind the first, where all
 * rows it reads are done and none it overwrites is still wanted. Vectors far larger than the cache
 * then come from memory once per walk, not once per step.
 */
static void walk(const sv_packed *a, panel_step step, const double *weights, int steps,
                 double *before, double *now, double *y)
{
    sv_index stride = a->span > LEAST_STRIDE ? a->span : LEAST_STRIDE;
    for (sv_index base = 0; base < a->n + (steps - 1) * a->span; base += stride)
        for (int s = 0; s < steps; s++) {
            sv_index first = base - s * a->span, last = first + stride;
            first = first < 0 ? 0 : first;
            last = last > a->n ? a->n : last;
            if (first < last)
                step(a, first, last, s % 2 == 0 ? now : before, s % 2 == 0 ? before : now, y, 2.0,
                     weights[s]);
        }
}

void sv_panel_polynomial(const sv_packed *a, const double *coefficients, int degree,
                         sv_panel_kernel kernel, const double *x, double *work, double *y)
{
    panel_step step = choose_step(kernel);
    size_t size = (size_t)a->n * SV_PANEL_ROW;
    double *before = work, *now = work + size;
    /* T_0 = 1 and T_1 = A: the same loop with factor 1 and nothing to take off. */
    for (size_t k = 0; k < size; k++) {
        y[k] = coefficients[0] * x[k];
        now[k] = 0.0;
    }
    memcpy(before, x, size * sizeof *x);
    if (degree < 1)
        return;
    step(a, 0, a->n, before, now, y, 1.0, coefficients[1]);
    for (int k = 2; k <= degree; k += STEPS_PER_WALK) {
        int left = degree - k + 1, steps = left < STEPS_PER_WALK ? left : STEPS_PER_WALK;
        walk(a, step, coefficients + k, steps, before, now, y);
        /* STEPS_PER_WALK is even: after a full walk `now` is the newest again. */
    }
}
