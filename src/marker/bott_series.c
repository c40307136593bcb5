/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Bott index from traces of powers, certified.
 *
 * With K = V U V† U† − 1 and all eigenvalues of K inside the unit circle,
 *     Im Tr log(1 + K) = Im Σ_j (−1)^{j+1} Tr K^j / j,
 * the principal branch. The determinant of V U V† U† is |det U|² |det V|² > 0, so the sum is an
 * exact multiple of 2π, and knowing it to 1 rad is knowing it. By Schur's inequality
 * Σ|λ|^{2k} ≤ ‖K^k‖², so the terms beyond j = 2k add up to at most ρ ‖K^k‖²/((2k+1)(1−ρ)), with
 * ρ ≥ |λ| from norms of powers (all norms Frobenius if not said otherwise).
 *
 * Single precision gives K to ε (below); every bound is widened so that it holds on the whole
 * segment from the computed K to the exact one: no eigenvalue crosses the negative real axis on
 * the way, and both have the same index. */
#include "bott_internal.h"
#include "selvedge/linalg.h"

#include <float.h>
#include <math.h>

static const double MOST_RADIUS = 0.95;
static const double MOST_DOUBT = 1.0; /* rad, of the 2π between two integers */

/* Real and imaginary parts apart. */
typedef struct split {
    float *re, *im;
} split;

typedef struct series_work {
    sv_context *context;
    sv_panel_kernel kernel;
    sv_index n, m;
    split psi;            /* n × m, row after row; afterwards the room of vu and uv */
    split u, v;           /* m × m; afterwards K and K² */
    split vu, uv, k, l;   /* borrowed names */
    float *cosine, *sine; /* n */
    float *rows;          /* m */
    sv_index *order;      /* n: rows of Ψ as they stand in psi; n more of work space */
    sv_index *depth;      /* m + 1: from row depth[c] on columns c and after are zero */
    double error;         /* ε ≥ ‖K computed − K exact‖ */
    double radius;        /* ρ */
    double sum;           /* of the logarithm so far: its imaginary part */
} series_work;

static void free_split(sv_context *context, split *s)
{
    sv_give(context, s->re);
    sv_give(context, s->im);
}

static void free_work(sv_context *context, series_work *w)
{
    split *all[] = {&w->psi, &w->u, &w->v};
    for (int k = 0; k < 3; k++)
        free_split(context, all[k]);
    sv_give(context, w->rows);
    sv_give(context, w->cosine);
    sv_give(context, w->sine);
    sv_give(context, w->order);
    sv_give(context, w->depth);
}

static sv_status take_split(sv_context *context, sv_index count, split *s)
{
    sv_status status = sv_take_raw(context, count, sizeof *s->re, &s->re);
    return status == SV_OK ? sv_take_raw(context, count, sizeof *s->im, &s->im) : status;
}

static sv_status take_work(sv_context *context, const sv_basis *basis, series_work *w)
{
    sv_index n = basis->n, m = basis->columns;
    sv_status status;
    *w = (series_work){.context = context, .kernel = sv_panel_best_kernel(), .n = n, .m = m};
    sv_index room = n > 2 * m ? n : 2 * m;
    /* Seven products of matrices of norm ≤ 1: rounding errors of random sign give a few u √m, u
     * the unit roundoff; a factor of about thirty lies between that and this. */
    w->error = 64.0 * (double)FLT_EPSILON * sqrt((double)m);
    if ((status = take_split(context, room * m, &w->psi)) != SV_OK ||
        (status = take_split(context, m * m, &w->u)) != SV_OK ||
        (status = take_split(context, m * m, &w->v)) != SV_OK ||
        (status = sv_take_raw(context, m, sizeof(float), &w->rows)) != SV_OK ||
        (status = sv_take_raw(context, n, sizeof(float), &w->cosine)) != SV_OK ||
        (status = sv_take_raw(context, 2 * n, sizeof(sv_index), &w->order)) != SV_OK ||
        (status = sv_take(context, m + 1, sizeof(sv_index), &w->depth)) != SV_OK)
        return status;
    return sv_take_raw(context, n, sizeof(float), &w->sine);
}

/*
 * A basis orthonormalised by a triangular factor has rows that end in zeros. With such rows last,
 * the products over rows may stop early: the fewer terms, the further right a column is.
 */
static void order_rows(series_work *w, const sv_basis *basis)
{
    sv_index n = w->n, m = w->m, *last = w->order + n;
    for (sv_index r = 0; r < n; r++)
        last[r] = 0;
    for (sv_index c = 0; c < m; c++)
        for (sv_index r = 0; r < n; r++)
            if (basis->vectors[r + c * n] != 0.0)
                last[r] = c;
    for (sv_index r = 0; r < n; r++)
        w->depth[last[r]]++;
    for (sv_index c = m - 1; c >= 0; c--)
        w->depth[c] += w->depth[c + 1];
    /* depth[c] rows reach column c or further; those that end there fill up to it from below. */
    for (sv_index r = n - 1; r >= 0; r--)
        w->order[--w->depth[last[r]]] = r;
    for (sv_index c = m; c > 0; c--) /* filled: each stands where the next did */
        w->depth[c] = w->depth[c - 1];
    w->depth[0] = n;
}

/* Ψ† e^{2πi·coordinate} Ψ */
static sv_status compress(series_work *w, const double (*uv)[2], int axis, split *result)
{
    for (sv_index r = 0; r < w->n; r++) {
        double angle = 2.0 * M_PI * uv[w->order[r]][axis];
        w->cosine[r] = (float)cos(angle);
        w->sine[r] = (float)sin(angle);
    }
    sv_product_single_job job = {.rows = w->m,
                                 .columns = w->m,
                                 .terms = w->n,
                                 .a = {w->psi.re, w->psi.im, 1, w->m, -1.0F},
                                 .b = {w->psi.re, w->psi.im, w->m, 1, 1.0F},
                                 .turn_re = w->cosine,
                                 .turn_im = w->sine,
                                 .depth = w->depth,
                                 .fresh = true,
                                 .weight = 1.0F,
                                 .c_re = result->re,
                                 .c_im = result->im,
                                 .c_row = 1,
                                 .c_column = w->m};
    return sv_product_single(w->context, w->kernel, &job);
}

/* c = a b, or a b† */
static sv_status multiply(const series_work *w, const split *a, const split *b, bool adjoint_b,
                          split *c)
{
    sv_index m = w->m;
    sv_product_single_job job = {
        .rows = m,
        .columns = m,
        .terms = m,
        .a = {a->re, a->im, 1, m, 1.0F},
        .b = {b->re, b->im, adjoint_b ? m : 1, adjoint_b ? 1 : m, adjoint_b ? -1.0F : 1.0F},
        .fresh = true,
        .weight = 1.0F,
        .c_re = c->re,
        .c_im = c->im,
        .c_row = 1,
        .c_column = m};
    return sv_product_single(w->context, w->kernel, &job);
}

/* Ψ in single precision, rows as ordered: in tiles, so that both sides stay in cache. */
static void round_basis(series_work *w, const sv_basis *basis)
{
    const sv_index tile = 16;
    for (sv_index r0 = 0; r0 < w->n; r0 += tile)
        for (sv_index c0 = 0; c0 < w->m; c0 += tile)
            for (sv_index r = r0; r < w->n && r < r0 + tile; r++)
                for (sv_index c = c0; c < w->m && c < c0 + tile; c++) {
                    sv_complex value = basis->vectors[w->order[r] + c * w->n];
                    w->psi.re[r * w->m + c] = (float)creal(value);
                    w->psi.im[r * w->m + c] = (float)cimag(value);
                }
}

/* K, in the place of u; u and v are not needed afterwards. */
static sv_status make_k(series_work *w, const sv_basis *basis, const double (*uv)[2])
{
    sv_index count = w->m * w->m;
    sv_status status;
    order_rows(w, basis);
    round_basis(w, basis);
    if ((status = compress(w, uv, 0, &w->u)) != SV_OK ||
        (status = compress(w, uv, 1, &w->v)) != SV_OK)
        return status;
    w->vu = w->psi;
    w->uv = (split){w->psi.re + count, w->psi.im + count};
    if ((status = multiply(w, &w->v, &w->u, false, &w->vu)) != SV_OK ||
        (status = multiply(w, &w->u, &w->v, false, &w->uv)) != SV_OK ||
        (status = multiply(w, &w->vu, &w->uv, true, &w->u)) != SV_OK)
        return status;
    for (sv_index c = 0; c < w->m; c++)
        w->u.re[c + c * w->m] -= 1.0F;
    w->k = w->u;
    w->l = w->v;
    return SV_OK;
}

static double norm(const series_work *w, const split *a)
{
    double sum = 0.0;
    for (sv_index e = 0; e < w->m * w->m; e++) {
        double re = (double)a->re[e], im = (double)a->im[e];
        sum += re * re + im * im;
    }
    return sqrt(sum);
}

/* Im Tr AB */
static double trace_of_product(const series_work *w, const split *a, const split *b)
{
    const sv_index tile = 32; /* one of the two is read along rows: keep that in cache */
    sv_index m = w->m;
    double sum = 0.0;
    for (sv_index c0 = 0; c0 < m; c0 += tile)
        for (sv_index r0 = 0; r0 < m; r0 += tile)
            for (sv_index c = c0; c < m && c < c0 + tile; c++)
                for (sv_index r = r0; r < m && r < r0 + tile; r++) {
                    sv_index x = r + c * m, y = c + r * m;
                    sum +=
                        (double)a->re[x] * (double)b->im[y] + (double)a->im[x] * (double)b->re[y];
                }
    return sum;
}

/* √(‖K‖₁ ‖K‖_∞) ≥ ‖K‖₂ */
static double mixed_norm(const series_work *w)
{
    float *rows = w->rows; /* sums of m numbers, far more exact than the bound is sharp */
    double one = 0.0, infinity = 0.0;
    for (sv_index r = 0; r < w->m; r++)
        rows[r] = 0.0F;
    for (sv_index c = 0; c < w->m; c++) {
        float column = 0.0F;
        for (sv_index r = 0; r < w->m; r++) {
            float re = w->k.re[r + c * w->m], im = w->k.im[r + c * w->m];
            float size = sqrtf(re * re + im * im);
            column += size;
            rows[r] += size;
        }
        one = fmax(one, (double)column);
    }
    for (sv_index r = 0; r < w->m; r++)
        infinity = fmax(infinity, (double)rows[r]);
    return 1.001 * sqrt(one * infinity);
}

/* Whether the sum up to j = 2k, with ‖K^k‖ given, leaves one integer. `widening` bounds the change
 * of ‖K^k‖ between the computed and the exact K. */
static bool settles(const series_work *w, int k, double norm_of_power, double widening)
{
    double wide = norm_of_power + widening, turns = w->sum / (2.0 * M_PI);
    if (!(w->radius <= MOST_RADIUS))
        return false;
    double doubt = w->radius * wide * wide / ((2.0 * k + 1.0) * (1.0 - w->radius));
    /* Traces of K, …, K^{2k}, each off by √m ε at most since ‖K‖₂ is below 1 or so. */
    doubt += 4.0 * k * sqrt((double)w->m) * w->error;
    return doubt <= MOST_DOUBT && fabs(turns - round(turns)) * 2.0 * M_PI <= doubt;
}

/* k = 1: the terms K and K². */
static bool first_powers(series_work *w)
{
    double trace = 0.0, size = norm(w, &w->k);
    for (sv_index c = 0; c < w->m; c++)
        trace += (double)w->k.im[c + c * w->m];
    w->sum = trace - trace_of_product(w, &w->k, &w->k) / 2.0;
    w->radius = fmin(size, mixed_norm(w)) + w->error;
    return settles(w, 1, size, w->error);
}

/* k = 2: L = K² adds K³ and K⁴. ‖K‖₂ ≤ 2 since ‖U‖₂, ‖V‖₂ ≤ 1. */
static sv_status second_powers(series_work *w, bool *ret_settled)
{
    sv_status status = multiply(w, &w->k, &w->k, false, &w->l);
    if (status != SV_OK)
        return status;
    double size = norm(w, &w->l), widening = 4.0 * w->error + w->error * w->error;
    w->sum += trace_of_product(w, &w->k, &w->l) / 3.0 - trace_of_product(w, &w->l, &w->l) / 4.0;
    w->radius = fmin(w->radius, sqrt(size + widening));
    *ret_settled = settles(w, 2, size, widening);
    return SV_OK;
}

/* k = 4: Q = L² and K³ add K⁵ … K⁸. */
static sv_status fourth_powers(series_work *w, bool *ret_settled)
{
    split *q = &w->vu, *cube = &w->uv;
    sv_status status = multiply(w, &w->l, &w->l, false, q);
    if (status != SV_OK)
        return status;
    double size = norm(w, q), widening = 40.0 * w->error;
    w->radius = fmin(w->radius, sqrt(sqrt(size + widening)));
    if (!(w->radius <= MOST_RADIUS))
        return SV_OK; /* not settled */
    if ((status = multiply(w, &w->k, &w->l, false, cube)) != SV_OK)
        return status;
    w->sum += trace_of_product(w, &w->k, q) / 5.0 - trace_of_product(w, &w->l, q) / 6.0 +
              trace_of_product(w, cube, q) / 7.0 - trace_of_product(w, q, q) / 8.0;
    *ret_settled = settles(w, 4, size, widening);
    return SV_OK;
}

sv_status sv_bott_by_series(sv_context *context, const sv_basis *basis, const double (*uv)[2],
                            bool *ret_certified, sv_outcome *outcome)
{
    series_work w;
    sv_status status = take_work(context, basis, &w);
    bool settled = false;
    if (status != SV_OK || (status = make_k(&w, basis, uv)) != SV_OK)
        goto out;
    if (sv_cancelled(context)) {
        status = SV_FAIL(context, SV_INTERRUPTED, "stopped during a Bott index");
        goto out;
    }
    settled = first_powers(&w);
    if (!settled)
        status = second_powers(&w, &settled);
    if (status == SV_OK && !settled)
        status = fourth_powers(&w, &settled);
    if (status != SV_OK)
        goto out;
    *ret_certified = settled;
    if (!settled)
        goto out;
    outcome->verdict = SV_RESOLVED;
    outcome->value = round(w.sum / (2.0 * M_PI)) + 0.0;
    outcome->index = (int64_t)outcome->value;
    outcome->numerical_error = 0.0;
    /* All eigenvalues lie within ρ of 1. */
    outcome->margin = M_PI - asin(w.radius);
    outcome->weakest = 1.0 - w.radius;
out:
    free_work(context, &w);
    return status;
}
