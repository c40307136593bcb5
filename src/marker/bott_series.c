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

typedef float _Complex narrow;

static const double MOST_RADIUS = 0.95;
static const double MOST_DOUBT = 1.0; /* rad, of the 2π between two integers */

typedef struct series_work {
    int n, m;
    narrow *psi, *turned;            /* n × m */
    narrow *u, *v, *vu, *uv, *k, *l; /* m × m; the pairs (u, v) and (vu, uv) are used again */
    double error;                    /* ε ≥ ‖K computed − K exact‖ */
    double radius;                   /* ρ */
    double sum;                      /* of the logarithm so far: its imaginary part */
} series_work;

static void free_work(sv_context *context, series_work *w)
{
    sv_give(context, w->psi);
    sv_give(context, w->turned);
    sv_give(context, w->u);
    sv_give(context, w->v);
    sv_give(context, w->vu);
    sv_give(context, w->uv);
}

static sv_status take_work(sv_context *context, const sv_basis *basis, series_work *w)
{
    sv_index n = basis->n, m = basis->columns;
    size_t size = sizeof(narrow);
    sv_status status;
    *w = (series_work){.n = (int)n, .m = (int)m};
    /* Seven products of matrices of norm ≤ 1: rounding errors of random sign give a few u √m, u
     * the unit roundoff; a factor of about thirty lies between that and this. */
    w->error = 64.0 * (double)FLT_EPSILON * sqrt((double)m);
    if ((status = sv_take_raw(context, n * m, size, &w->psi)) != SV_OK ||
        (status = sv_take_raw(context, n * m, size, &w->turned)) != SV_OK ||
        (status = sv_take_raw(context, m * m, size, &w->u)) != SV_OK ||
        (status = sv_take_raw(context, m * m, size, &w->v)) != SV_OK ||
        (status = sv_take_raw(context, m * m, size, &w->vu)) != SV_OK)
        return status;
    return sv_take_raw(context, m * m, size, &w->uv);
}

static void compress(series_work *w, const double (*uv)[2], int axis, narrow *result)
{
    const narrow one = 1.0F, zero = 0.0F;
    narrow *phase = w->vu; /* free until the products; n may exceed m², so in pieces */
    sv_index room = (sv_index)w->m * w->m;
    for (sv_index from = 0; from < w->n; from += room) {
        sv_index to = from + room < w->n ? from + room : w->n;
        for (sv_index r = from; r < to; r++) {
            double angle = 2.0 * M_PI * uv[r][axis];
            phase[r - from] = CMPLXF((float)cos(angle), (float)sin(angle));
        }
        for (sv_index c = 0; c < w->m; c++)
            for (sv_index r = from; r < to; r++)
                w->turned[r + c * w->n] = phase[r - from] * w->psi[r + c * w->n];
    }
    cblas_cgemm(CblasColMajor, CblasConjTrans, CblasNoTrans, w->m, w->m, w->n, &one, w->psi, w->n,
                w->turned, w->n, &zero, result, w->m);
}

static void multiply(const series_work *w, const narrow *a, const narrow *b, bool adjoint_b,
                     narrow *product)
{
    const narrow one = 1.0F, zero = 0.0F;
    cblas_cgemm(CblasColMajor, CblasNoTrans, adjoint_b ? CblasConjTrans : CblasNoTrans, w->m, w->m,
                w->m, &one, a, w->m, b, w->m, &zero, product, w->m);
}

/* K, in the place of u; u and v are not needed afterwards. */
static void make_k(series_work *w, const sv_basis *basis, const double (*uv)[2])
{
    for (sv_index e = 0; e < (sv_index)w->n * w->m; e++)
        w->psi[e] = (narrow)basis->vectors[e];
    compress(w, uv, 0, w->u);
    compress(w, uv, 1, w->v);
    multiply(w, w->v, w->u, false, w->vu);
    multiply(w, w->u, w->v, false, w->uv);
    multiply(w, w->vu, w->uv, true, w->u);
    for (sv_index c = 0; c < w->m; c++)
        w->u[c + c * w->m] -= 1.0F;
    w->k = w->u;
    w->l = w->v;
}

static double norm(const series_work *w, const narrow *a)
{
    double sum = 0.0;
    for (sv_index e = 0; e < (sv_index)w->m * w->m; e++) {
        double re = (double)crealf(a[e]), im = (double)cimagf(a[e]);
        sum += re * re + im * im;
    }
    return sqrt(sum);
}

/* Im Tr AB */
static double trace_of_product(const series_work *w, const narrow *a, const narrow *b)
{
    const int tile = 32; /* one of the two is read along rows: keep that in cache */
    int m = w->m;
    double sum = 0.0;
    for (int c0 = 0; c0 < m; c0 += tile)
        for (int r0 = 0; r0 < m; r0 += tile)
            for (int c = c0; c < m && c < c0 + tile; c++)
                for (int r = r0; r < m && r < r0 + tile; r++) {
                    narrow x = a[r + (sv_index)c * m], y = b[c + (sv_index)r * m];
                    sum += (double)crealf(x) * (double)cimagf(y) +
                           (double)cimagf(x) * (double)crealf(y);
                }
    return sum;
}

/* √(‖K‖₁ ‖K‖_∞) ≥ ‖K‖₂; `rows` has room for m numbers. */
static double mixed_norm(const series_work *w, double *rows)
{
    double one = 0.0, infinity = 0.0;
    for (int r = 0; r < w->m; r++)
        rows[r] = 0.0;
    for (int c = 0; c < w->m; c++) {
        double column = 0.0;
        for (int r = 0; r < w->m; r++) {
            double size = (double)cabsf(w->k[r + (sv_index)c * w->m]);
            column += size;
            rows[r] += size;
        }
        one = fmax(one, column);
    }
    for (int r = 0; r < w->m; r++)
        infinity = fmax(infinity, rows[r]);
    return sqrt(one * infinity);
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
    double trace = 0.0, size = norm(w, w->k);
    for (sv_index c = 0; c < w->m; c++)
        trace += (double)cimagf(w->k[c + c * w->m]);
    w->sum = trace - trace_of_product(w, w->k, w->k) / 2.0;
    w->radius = fmin(size, mixed_norm(w, (double *)(void *)w->vu)) + w->error;
    return settles(w, 1, size, w->error);
}

/* k = 2: L = K² adds K³ and K⁴. ‖K‖₂ ≤ 2 since ‖U‖₂, ‖V‖₂ ≤ 1. */
static bool second_powers(series_work *w)
{
    multiply(w, w->k, w->k, false, w->l);
    double size = norm(w, w->l), widening = 4.0 * w->error + w->error * w->error;
    w->sum += trace_of_product(w, w->k, w->l) / 3.0 - trace_of_product(w, w->l, w->l) / 4.0;
    w->radius = fmin(w->radius, sqrt(size + widening));
    return settles(w, 2, size, widening);
}

/* k = 4: Q = L² and K³ add K⁵ … K⁸. */
static bool fourth_powers(series_work *w)
{
    narrow *q = w->vu, *cube = w->uv;
    multiply(w, w->l, w->l, false, q);
    double size = norm(w, q), widening = 40.0 * w->error;
    w->radius = fmin(w->radius, sqrt(sqrt(size + widening)));
    if (!(w->radius <= MOST_RADIUS))
        return false;
    multiply(w, w->k, w->l, false, cube);
    w->sum += trace_of_product(w, w->k, q) / 5.0 - trace_of_product(w, w->l, q) / 6.0 +
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
