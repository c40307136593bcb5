/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Matrix and vectors packed for polynomials: rows of [re…][im…] of a fixed number of columns. */
#include "linalg_internal.h"

#include <math.h>
#include <string.h>

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
    sv_give(context, packed->re_single);
    sv_give(context, packed->im_single);
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

sv_status sv_packed_add_single(sv_context *context, sv_packed *packed)
{
    sv_index count = packed->start[3 * packed->n];
    float *re = NULL, *im = NULL;
    sv_status status = sv_take_raw(context, count, sizeof *re, &re);
    if (status == SV_OK)
        status = sv_take_raw(context, count, sizeof *im, &im);
    if (status != SV_OK) {
        sv_give(context, re);
        return status;
    }
    for (sv_index k = 0; k < count; k++) {
        re[k] = (float)packed->re[k];
        im[k] = (float)packed->im[k];
    }
    sv_give(context, packed->re_single);
    sv_give(context, packed->im_single);
    packed->re_single = re;
    packed->im_single = im;
    return SV_OK;
}

void sv_panel_polynomial(const sv_packed *a, const double *coefficients, int degree,
                         sv_panel_kernel kernel, const double *x, double *work, double *y)
{
    if (kernel == SV_PANEL_AVX512)
        sv_panel_polynomial_avx512(a, coefficients, degree, x, work, y);
    else if (kernel == SV_PANEL_AVX2)
        sv_panel_polynomial_avx2(a, coefficients, degree, x, work, y);
    else
        sv_panel_polynomial_plain(a, coefficients, degree, x, work, y);
}

void sv_panel_polynomial_single(const sv_packed *a, const double *coefficients, int degree,
                                sv_panel_kernel kernel, const float *x, float *work, float *y)
{
    if (kernel == SV_PANEL_AVX512)
        sv_panel_single_avx512(a, coefficients, degree, x, work, y);
    else if (kernel == SV_PANEL_AVX2)
        sv_panel_single_avx2(a, coefficients, degree, x, work, y);
    else
        sv_panel_single_plain(a, coefficients, degree, x, work, y);
}
