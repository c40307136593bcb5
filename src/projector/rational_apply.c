/* SPDX-License-Identifier: GPL-3.0-or-later */
/*
 * Sum over the poles of the rational engine. A² + s² has the condition number 1/s², the square of
 * what the problem has: for poles close to the axis a Cholesky solution has lost twice the digits
 * it needs to. It is refined with the residual of the problem before squaring,
 *     A q + s t = b,  A t − s q = 0,  so that  q = A (A² + s²)⁻¹ b,
 * whose matrix is normal with singular values √(λ² + s²): the residual bounds the error, and
 * rounding is amplified by 1/s only.
 */
#include "rational_internal.h"

#include <cblas.h>
#include <float.h>
#include <math.h>
#include <string.h>

enum { MOST_ROUNDS = 8 };

/* The blocks of one panel. */
typedef struct panel {
    int width;
    const sv_complex *b;
    sv_complex *sum, *refined; /* sums over gentle poles (before A) and refined ones */
    sv_complex *q, *t, *r1, *r2, *u;
} panel;

double sv_rational_refined_below(double tolerance)
{
    return sqrt(16.0 * DBL_EPSILON / tolerance);
}

/* y = A x: a polynomial of degree one. */
static void multiply(const rational_state *s, int width, const sv_complex *x, sv_complex *y)
{
    const double coefficients[2] = {0.0, 1.0};
    sv_index n = s->h->n, size = 2 * SV_PANEL_COLUMNS * n;
    double *in = s->panels, *work = in + size, *out = work + 2 * size;
    sv_columns_to_panel(in, n, x, width);
    sv_panel_polynomial(&s->packed, coefficients, 1, s->kernel, in, work, out);
    sv_panel_to_columns(out, n, y, width);
}

/* y += factor x */
static void add(const rational_state *s, int width, double factor, const sv_complex *x,
                sv_complex *y)
{
    for (sv_index e = 0; e < width * s->h->n; e++)
        y[e] += factor * x[e];
}

/* Residuals; returns the bound of the error of the term relative to its column, the largest. */
static double residual(const rational_state *s, int j, const panel *p)
{
    sv_index n = s->h->n;
    double pole = s->sign.pole[j], worst = 0.0;
    multiply(s, p->width, p->q, p->r1);
    multiply(s, p->width, p->t, p->r2);
    for (sv_index e = 0; e < p->width * n; e++) {
        p->r1[e] = p->b[e] - p->r1[e] - pole * p->t[e];
        p->r2[e] = pole * p->q[e] - p->r2[e];
    }
    for (int c = 0; c < p->width; c++) {
        double size = cblas_dznrm2((int)n, p->b + c * n, 1);
        double rest =
            hypot(cblas_dznrm2((int)n, p->r1 + c * n, 1), cblas_dznrm2((int)n, p->r2 + c * n, 1));
        if (size > 0.0)
            worst = fmax(worst, rest / size);
    }
    return s->sign.residue[j] * worst / hypot(pole, s->nearest);
}

/* (q, t) += (A² + s²)⁻¹ (A r1 − s r2, s r1 + A r2) */
static sv_status correct(sv_context *context, const rational_state *s, int j, const panel *p)
{
    double pole = s->sign.pole[j];
    multiply(s, p->width, p->r1, p->u);
    add(s, p->width, -pole, p->r2, p->u);
    sv_status status = sv_definite_solve(context, s->factors, j, p->width, p->u);
    if (status != SV_OK)
        return status;
    add(s, p->width, 1.0, p->u, p->q);
    multiply(s, p->width, p->r2, p->u);
    add(s, p->width, pole, p->r1, p->u);
    status = sv_definite_solve(context, s->factors, j, p->width, p->u);
    if (status == SV_OK)
        add(s, p->width, 1.0, p->u, p->t);
    return status;
}

/* q = A (A² + s²)⁻¹ b, refined until the tolerance or the floor of rounding is reached. */
static sv_status refined_term(sv_context *context, const rational_state *s, int j, const panel *p,
                              double *ret_error)
{
    double pole = s->sign.pole[j], before = INFINITY;
    size_t bytes = (size_t)(p->width * s->h->n) * sizeof *p->t;
    memcpy(p->t, p->b, bytes);
    sv_status status = sv_definite_solve(context, s->factors, j, p->width, p->t);
    if (status != SV_OK)
        return status;
    multiply(s, p->width, p->t, p->q);
    for (sv_index e = 0; e < p->width * s->h->n; e++)
        p->t[e] *= pole;
    for (int round = 0;; round++) {
        *ret_error = residual(s, j, p);
        if (*ret_error <= s->tolerance || *ret_error > 0.3 * before || round == MOST_ROUNDS)
            break;
        before = *ret_error;
        if ((status = correct(context, s, j, p)) != SV_OK)
            return status;
    }
    add(s, p->width, s->sign.residue[j], p->q, p->refined);
    return SV_OK;
}

/* One that a plain solution serves well enough; A is applied to the sum of them. */
static sv_status gentle_term(sv_context *context, const rational_state *s, int j, const panel *p,
                             double *ret_error)
{
    double pole = s->sign.pole[j];
    memcpy(p->t, p->b, (size_t)(p->width * s->h->n) * sizeof *p->t);
    sv_status status = sv_definite_solve(context, s->factors, j, p->width, p->t);
    if (status != SV_OK)
        return status;
    add(s, p->width, s->sign.residue[j], p->t, p->sum);
    *ret_error = 4.0 * DBL_EPSILON * s->sign.residue[j] / (pole * pole * pole);
    return SV_OK;
}

/* y = (b − sign(A) b)/2 */
static sv_status project_panel(sv_context *context, rational_state *s, const panel *p,
                               sv_complex *y)
{
    double total = 0.0;
    sv_index count = p->width * s->h->n;
    memset(p->refined, 0, (size_t)count * sizeof *p->refined);
    for (sv_index e = 0; e < count; e++)
        p->sum[e] = s->sign.constant * p->b[e];
    for (int j = 0; j < s->sign.terms; j++) {
        double error = 0.0;
        if (sv_cancelled(context))
            return SV_FAIL(context, SV_INTERRUPTED, "stopped during a projection");
        sv_status status = j < s->refined ? refined_term(context, s, j, p, &error)
                                          : gentle_term(context, s, j, p, &error);
        if (status != SV_OK)
            return status;
        total += error;
    }
    multiply(s, p->width, p->sum, p->q);
    for (sv_index e = 0; e < count; e++)
        y[e] = 0.5 * (p->b[e] - (p->q[e] + p->refined[e]));
    s->rounding = fmax(s->rounding, 0.5 * total);
    return SV_OK;
}

sv_status sv_rational_apply(sv_context *context, void *state, sv_index columns, const sv_complex *x,
                            sv_complex *y)
{
    rational_state *s = state;
    sv_index n = s->h->n, block = SV_RATIONAL_WIDTH * n;
    for (sv_index first = 0; first < columns; first += SV_RATIONAL_WIDTH) {
        sv_index left = columns - first;
        panel p = {.width = (int)(left < SV_RATIONAL_WIDTH ? left : SV_RATIONAL_WIDTH),
                   .b = x + first * n,
                   .sum = s->work,
                   .refined = s->work + block,
                   .q = s->work + 2 * block,
                   .t = s->work + 3 * block,
                   .r1 = s->work + 4 * block,
                   .r2 = s->work + 5 * block,
                   .u = s->work + 6 * block};
        sv_status status = project_panel(context, s, &p, y + first * n);
        if (status != SV_OK)
            return status;
    }
    return SV_OK;
}
