/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Bounds of a spectrum by Lanczos without reorthogonalisation: copies of extreme levels do no harm
 * here, and three vectors are enough for any size. */
#include "selvedge/linalg.h"

#include <cblas.h>
#include <float.h>
#include <math.h>
#include <string.h>

#define lapack_complex_double double _Complex
#define lapack_complex_float  float _Complex
#include <lapacke.h>

/* Margin in units of the width, and the probability that it is not enough. */
static const double MARGIN = 0.005, FAILURE = 1e-9;

/* Steps after which 1.648 √n e^{−√ε(2k−1)} is below FAILURE. */
static int steps_needed(sv_index n)
{
    double exponent = log(1.648 / FAILURE) + 0.5 * log((double)n);
    return (int)ceil(0.5 * (exponent / sqrt(MARGIN) + 1.0));
}

static void start_vector(sv_complex *x, sv_index n)
{
    sv_stream stream = sv_stream_make(1, "spectral bounds", 0);
    for (sv_index k = 0; k < n; k++)
        x[k] = CMPLX(sv_stream_normal(&stream, (int32_t)k, 0, 0),
                     sv_stream_normal(&stream, (int32_t)k, 0, 1));
    cblas_zdscal((int)n, 1.0 / cblas_dznrm2((int)n, x, 1), x, 1);
}

/* The tridiagonal matrix of at most `most` steps; fewer when the space is exhausted. */
static sv_status tridiagonalise(sv_context *context, const sv_sparse *h, int most,
                                sv_complex *vectors, double *diagonal, double *off, int *ret_steps)
{
    int n = (int)h->n, k = 0;
    sv_complex *before = vectors, *now = before + n, *next = now + n;
    double tiny = 8.0 * DBL_EPSILON * sv_sparse_norm_bound(h);
    memset(before, 0, (size_t)n * sizeof *before);
    start_vector(now, n);
    for (bool more = true; more; k++) {
        sv_complex overlap, factor;
        if (sv_cancelled(context))
            return SV_FAIL(context, SV_INTERRUPTED, "stopped while bounding the spectrum");
        sv_sparse_apply(h, now, next);
        cblas_zdotc_sub(n, now, 1, next, 1, &overlap);
        diagonal[k] = creal(overlap);
        factor = -diagonal[k];
        cblas_zaxpy(n, &factor, now, 1, next, 1);
        factor = k > 0 ? -off[k - 1] : 0.0;
        cblas_zaxpy(n, &factor, before, 1, next, 1);
        off[k] = cblas_dznrm2(n, next, 1);
        more = k + 1 < most && off[k] > tiny;
        if (more)
            cblas_zdscal(n, 1.0 / off[k], next, 1);
        sv_complex *oldest = before;
        before = now;
        now = next;
        next = oldest;
    }
    *ret_steps = k;
    return SV_OK;
}

/* Gershgorin: every eigenvalue lies in the disc of a row. */
static void gershgorin(const sv_sparse *h, double bounds[2])
{
    bounds[0] = INFINITY;
    bounds[1] = -INFINITY;
    for (sv_index row = 0; row < h->n; row++) {
        double middle = 0.0, radius = 0.0;
        for (sv_index k = h->row_start[row]; k < h->row_start[row + 1]; k++)
            if (h->column[k] == row)
                middle = creal(h->value[k]);
            else
                radius += cabs(h->value[k]);
        bounds[0] = fmin(bounds[0], middle - radius);
        bounds[1] = fmax(bounds[1], middle + radius);
    }
}

sv_status sv_spectral_bounds(sv_context *context, const sv_sparse *h, double ret_bounds[2])
{
    sv_complex *vectors = NULL;
    double *diagonal = NULL, *off = NULL, discs[2];
    int most, steps = 0;
    sv_status status;
    if (h->n < 1)
        return SV_FAIL(context, SV_INVALID_INPUT, "a matrix of order 0 has no spectrum");
    most = steps_needed(h->n);
    if ((status = sv_take_raw(context, 3 * h->n, sizeof *vectors, &vectors)) != SV_OK ||
        (status = sv_take(context, most, sizeof *diagonal, &diagonal)) != SV_OK ||
        (status = sv_take(context, most, sizeof *off, &off)) != SV_OK)
        goto out;
    status = tridiagonalise(context, h, most, vectors, diagonal, off, &steps);
    if (status != SV_OK)
        goto out;
    lapack_int info = LAPACKE_dsterf(steps, diagonal, off);
    if (info != 0 || !isfinite(diagonal[0]) || !isfinite(diagonal[steps - 1])) {
        status = SV_FAIL(context, SV_NUMERICAL, "dsterf failed with code %d", (int)info);
        goto out;
    }
    gershgorin(h, discs);
    double width = (diagonal[steps - 1] - diagonal[0]) / (1.0 - 2.0 * MARGIN);
    double rounding = 1e-12 * sv_sparse_norm_bound(h);
    ret_bounds[0] = fmax(diagonal[0] - MARGIN * width, discs[0]) - rounding;
    ret_bounds[1] = fmin(diagonal[steps - 1] + MARGIN * width, discs[1]) + rounding;
out:
    sv_give(context, vectors);
    sv_give(context, diagonal);
    sv_give(context, off);
    return status;
}
