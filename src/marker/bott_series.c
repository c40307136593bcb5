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

#include <cblas.h>
#include <float.h>
#include <math.h>

static const double MOST_RADIUS = 0.95;
/* Columns for which sums stop at the same row. */
static const int STRIPE = 128;
static const double MOST_DOUBT = 1.0; /* rad, of the 2π between two integers */

/* Real and imaginary parts apart: a complex product by three real ones instead of four. */
typedef struct split {
    float *re, *im, *both; /* both: scratch for the sum of the parts, or NULL */
} split;

typedef struct series_work {
    int n, m;
    split psi, turned;    /* n × m; afterwards the room of vu, uv and the scratch of products */
    split u, v;           /* m × m; afterwards K and K² */
    split vu, uv, k, l;   /* borrowed names */
    float *product;       /* m × m */
    float *cosine, *sine; /* n */
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
    sv_give(context, s->both);
}

static void free_work(sv_context *context, series_work *w)
{
    split *all[] = {&w->psi, &w->turned, &w->u, &w->v};
    for (int k = 0; k < 4; k++)
        free_split(context, all[k]);
    sv_give(context, w->product);
    sv_give(context, w->cosine);
    sv_give(context, w->sine);
    sv_give(context, w->order);
    sv_give(context, w->depth);
}

static sv_status take_split(sv_context *context, sv_index count, bool with_both, split *s)
{
    sv_status status;
    if ((status = sv_take_raw(context, count, sizeof *s->re, &s->re)) != SV_OK ||
        (status = sv_take_raw(context, count, sizeof *s->im, &s->im)) != SV_OK)
        return status;
    return with_both ? sv_take_raw(context, count, sizeof *s->both, &s->both) : SV_OK;
}

static sv_status take_work(sv_context *context, const sv_basis *basis, series_work *w)
{
    sv_index n = basis->n, m = basis->columns;
    sv_status status;
    *w = (series_work){.n = (int)n, .m = (int)m};
    /* Seven products of matrices of norm ≤ 1: rounding errors of random sign give a few u √m, u
     * the unit roundoff; a factor of about thirty lies between that and this. */
    w->error = 64.0 * (double)FLT_EPSILON * sqrt((double)m);
    if ((status = take_split(context, n * m, true, &w->psi)) != SV_OK ||
        (status = take_split(context, n * m, true, &w->turned)) != SV_OK ||
        (status = take_split(context, m * m, false, &w->u)) != SV_OK ||
        (status = take_split(context, m * m, false, &w->v)) != SV_OK ||
        (status = sv_take_raw(context, m * m, sizeof(float), &w->product)) != SV_OK ||
        (status = sv_take_raw(context, n, sizeof(float), &w->cosine)) != SV_OK ||
        (status = sv_take_raw(context, 2 * n, sizeof(sv_index), &w->order)) != SV_OK ||
        (status = sv_take(context, m + 1, sizeof(sv_index), &w->depth)) != SV_OK)
        return status;
    return sv_take_raw(context, n, sizeof(float), &w->sine);
}

/* both = re + sign·im */
static void add_parts(const split *a, float sign, sv_index count, float *both)
{
    for (sv_index e = 0; e < count; e++)
        both[e] = a->re[e] + sign * a->im[e];
}

/* Part of a product, and the number of terms of its sums. */
typedef struct part {
    int row, rows, column, columns, inner;
} part;

/* One factor: leading dimension, and re ± im beside its parts. */
typedef struct factor {
    CBLAS_TRANSPOSE turn;
    int lead;
    const split *parts;
    const float *sum;
} factor;

/* The part of c = op(a) op(b), m × m. At most one of them is an adjoint, for which the sign is −1
 * in `sign`. */
static void three_products(const series_work *w, part p, factor a, factor b, float sign, split *c)
{
    sv_index m = w->m, at_c = p.row + p.column * m;
    sv_index at_a = a.turn == CblasNoTrans ? p.row : (sv_index)p.row * a.lead;
    sv_index at_b = b.turn == CblasNoTrans ? (sv_index)p.column * b.lead : p.column;
    const float *factors[3][2] = {
        {a.parts->re, b.parts->re}, {a.parts->im, b.parts->im}, {a.sum, b.sum}};
    float *results[3] = {c->re, w->product, c->im};
    for (int k = 0; k < 3; k++)
        cblas_sgemm(CblasColMajor, a.turn, b.turn, p.rows, p.columns, p.inner, 1.0F,
                    factors[k][0] + at_a, a.lead, factors[k][1] + at_b, b.lead, 0.0F,
                    results[k] + at_c, w->m);
    for (sv_index column = 0; column < p.columns; column++)
        for (sv_index e = at_c + column * m; e < at_c + column * m + p.rows; e++) {
            float first = c->re[e], second = sign * w->product[e];
            c->re[e] = first - second;
            c->im[e] -= first + second;
        }
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
static void compress(series_work *w, const double (*uv)[2], int axis, split *result)
{
    for (sv_index r = 0; r < w->n; r++) {
        double angle = 2.0 * M_PI * uv[w->order[r]][axis];
        w->cosine[r] = (float)cos(angle);
        w->sine[r] = (float)sin(angle);
    }
    for (sv_index c = 0; c < w->m; c++)
        for (sv_index r = 0; r < w->n; r++) {
            float re = w->psi.re[r + c * w->n], im = w->psi.im[r + c * w->n];
            w->turned.re[r + c * w->n] = w->cosine[r] * re - w->sine[r] * im;
            w->turned.im[r + c * w->n] = w->cosine[r] * im + w->sine[r] * re;
        }
    add_parts(&w->turned, 1.0F, (sv_index)w->n * w->m, w->turned.both);
    factor a = {CblasTrans, w->n, &w->psi, w->psi.both};
    factor b = {CblasNoTrans, w->n, &w->turned, w->turned.both};
    for (int start = 0; start < w->m; start += STRIPE) {
        int width = w->m - start < STRIPE ? w->m - start : STRIPE, inner = (int)w->depth[start];
        three_products(w, (part){0, start + width, start, width, inner}, a, b, -1.0F, result);
        if (start > 0)
            three_products(w, (part){start, width, 0, start, inner}, a, b, -1.0F, result);
    }
}

/* c = a b, or a b† */
static void multiply(const series_work *w, const split *a, const split *b, bool adjoint_b, split *c)
{
    float sign = adjoint_b ? -1.0F : 1.0F;
    sv_index count = (sv_index)w->m * w->m;
    add_parts(a, 1.0F, count, w->psi.both);
    add_parts(b, sign, count, w->turned.both);
    three_products(w, (part){0, w->m, 0, w->m, w->m}, (factor){CblasNoTrans, w->m, a, w->psi.both},
                   (factor){adjoint_b ? CblasTrans : CblasNoTrans, w->m, b, w->turned.both}, sign,
                   c);
}

/* K, in the place of u; u and v are not needed afterwards. */
static void make_k(series_work *w, const sv_basis *basis, const double (*uv)[2])
{
    sv_index count = (sv_index)w->n * w->m;
    order_rows(w, basis);
    for (sv_index c = 0; c < w->m; c++)
        for (sv_index r = 0; r < w->n; r++) {
            sv_complex value = basis->vectors[w->order[r] + c * w->n];
            w->psi.re[r + c * w->n] = (float)creal(value);
            w->psi.im[r + c * w->n] = (float)cimag(value);
        }
    add_parts(&w->psi, -1.0F, count, w->psi.both);
    compress(w, uv, 0, &w->u);
    compress(w, uv, 1, &w->v);
    w->vu = (split){w->psi.re, w->psi.im, NULL};
    w->uv = (split){w->turned.re, w->turned.im, NULL};
    multiply(w, &w->v, &w->u, false, &w->vu);
    multiply(w, &w->u, &w->v, false, &w->uv);
    multiply(w, &w->vu, &w->uv, true, &w->u);
    for (sv_index c = 0; c < w->m; c++)
        w->u.re[c + c * w->m] -= 1.0F;
    w->k = w->u;
    w->l = w->v;
}

static double norm(const series_work *w, const split *a)
{
    double sum = 0.0;
    for (sv_index e = 0; e < (sv_index)w->m * w->m; e++) {
        double re = (double)a->re[e], im = (double)a->im[e];
        sum += re * re + im * im;
    }
    return sqrt(sum);
}

/* Im Tr AB */
static double trace_of_product(const series_work *w, const split *a, const split *b)
{
    const int tile = 32; /* one of the two is read along rows: keep that in cache */
    int m = w->m;
    double sum = 0.0;
    for (int c0 = 0; c0 < m; c0 += tile)
        for (int r0 = 0; r0 < m; r0 += tile)
            for (int c = c0; c < m && c < c0 + tile; c++)
                for (int r = r0; r < m && r < r0 + tile; r++) {
                    sv_index x = r + (sv_index)c * m, y = c + (sv_index)r * m;
                    sum +=
                        (double)a->re[x] * (double)b->im[y] + (double)a->im[x] * (double)b->re[y];
                }
    return sum;
}

/* √(‖K‖₁ ‖K‖_∞) ≥ ‖K‖₂ */
static double mixed_norm(const series_work *w)
{
    float *rows = w->psi.both; /* sums of m numbers, far more exact than the bound is sharp */
    double one = 0.0, infinity = 0.0;
    for (int r = 0; r < w->m; r++)
        rows[r] = 0.0F;
    for (int c = 0; c < w->m; c++) {
        float column = 0.0F;
        for (int r = 0; r < w->m; r++) {
            float re = w->k.re[r + (sv_index)c * w->m], im = w->k.im[r + (sv_index)c * w->m];
            float size = sqrtf(re * re + im * im);
            column += size;
            rows[r] += size;
        }
        one = fmax(one, (double)column);
    }
    for (int r = 0; r < w->m; r++)
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
static bool second_powers(series_work *w)
{
    multiply(w, &w->k, &w->k, false, &w->l);
    double size = norm(w, &w->l), widening = 4.0 * w->error + w->error * w->error;
    w->sum += trace_of_product(w, &w->k, &w->l) / 3.0 - trace_of_product(w, &w->l, &w->l) / 4.0;
    w->radius = fmin(w->radius, sqrt(size + widening));
    return settles(w, 2, size, widening);
}

/* k = 4: Q = L² and K³ add K⁵ … K⁸. */
static bool fourth_powers(series_work *w)
{
    split *q = &w->vu, *cube = &w->uv;
    multiply(w, &w->l, &w->l, false, q);
    double size = norm(w, q), widening = 40.0 * w->error;
    w->radius = fmin(w->radius, sqrt(sqrt(size + widening)));
    if (!(w->radius <= MOST_RADIUS))
        return false;
    multiply(w, &w->k, &w->l, false, cube);
    w->sum += trace_of_product(w, &w->k, q) / 5.0 - trace_of_product(w, &w->l, q) / 6.0 +
              trace_of_product(w, cube, q) / 7.0 - trace_of_product(w, q, q) / 8.0;
    return settles(w, 4, size, widening);
}

sv_status sv_bott_by_series(sv_context *context, const sv_basis *basis, const double (*uv)[2],
                            bool *ret_certified, sv_outcome *outcome)
{
    series_work w;
    sv_status status = take_work(context, basis, &w);
    if (status != SV_OK)
        goto out;
    make_k(&w, basis, uv);
    if (sv_cancelled(context)) {
        status = SV_FAIL(context, SV_INTERRUPTED, "stopped during a Bott index");
        goto out;
    }
    *ret_certified = first_powers(&w) || second_powers(&w) || fourth_powers(&w);
    if (!*ret_certified)
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
