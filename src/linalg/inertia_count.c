/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Counting eigenvalues below a shift, with the doubts that a factorisation without full pivoting
 * leaves: a count stands alone when the nearest eigenvalue is far beyond the backward error;
 * otherwise counts on both sides of the shift must agree; small matrices go to a dense solver. */
#include "inertia_internal.h"

#include <float.h>
#include <math.h>

static const sv_index SMALL_ORDER = 300;
/* The estimated distance of the nearest eigenvalue must exceed the backward error this often: the
 * estimate is an upper bound, too large by a small factor at times. */
static const double SAFE_DISTANCE = 1e3;

static double normalise(sv_complex *x, sv_index n)
{
    double sum = 0.0;
    for (sv_index k = 0; k < n; k++)
        sum += creal(x[k]) * creal(x[k]) + cimag(x[k]) * cimag(x[k]);
    double norm = sqrt(sum), scale = norm > 0.0 ? 1.0 / norm : 0.0;
    for (sv_index k = 0; k < n; k++)
        x[k] *= scale;
    return norm;
}

sv_status sv_inertia_distance(sv_context *context, sv_inertia_plan *plan, int steps,
                              double *ret_distance)
{
    sv_index n = plan->order;
    sv_complex *x = NULL;
    double grown = 0.0;
    sv_status status = sv_take_raw(context, n, sizeof *x, &x);
    if (status != SV_OK)
        return status;
    sv_stream stream = sv_stream_make(1, "inverse iteration", 0);
    for (sv_index k = 0; k < n; k++)
        x[k] = CMPLX(sv_stream_normal(&stream, (int32_t)k, 0, 0),
                     sv_stream_normal(&stream, (int32_t)k, 0, 1));
    normalise(x, n);
    for (int step = 0; step < steps && status == SV_OK; step++) {
        status = sv_inertia_solve(context, plan, x);
        grown = normalise(x, n);
    }
    if (status == SV_OK)
        *ret_distance = grown > 0.0 && isfinite(grown) ? 1.0 / grown : 0.0;
    sv_give(context, x);
    return status;
}

static void choose_none(const double *values, sv_index n, sv_index *first, sv_index *last,
                        void *user)
{
    (void)values, (void)n, (void)user;
    *first = *last = 0;
}

static sv_status dense_count(sv_context *context, const sv_sparse *h, double shift, double norm,
                             sv_inertia_count *count)
{
    sv_index n = h->n, first, last;
    sv_complex *a = NULL, *vectors = NULL;
    double *values = NULL;
    sv_status status;
    if ((status = sv_take_raw(context, n * n, sizeof *a, &a)) != SV_OK ||
        (status = sv_take_raw(context, n, sizeof *values, &values)) != SV_OK)
        goto out;
    sv_sparse_to_dense(h, a);
    if ((status = sv_dense_eigen(context, n, a, values, choose_none, NULL, &first, &last,
                                 &vectors)) != SV_OK)
        goto out;
    count->how = SV_COUNTED_DENSE;
    count->width = fmax(1e-13, 4.0 * DBL_EPSILON * (double)n) * norm;
    count->low = count->high = 0;
    count->distance = INFINITY;
    for (sv_index k = 0; k < n; k++) {
        count->low += values[k] < shift - count->width;
        count->high += values[k] < shift + count->width;
        count->distance = fmin(count->distance, fabs(values[k] - shift));
    }
out:
    sv_give(context, a);
    sv_give(context, values);
    sv_give(context, vectors);
    return status;
}

/* Counts at shift ± width, wider as long as the backward error is not well below the width: clean
 * flakes have shifts at which many leading blocks are singular, and growth there falls with the
 * distance from the shift. */
static sv_status bracket_count(sv_context *context, sv_inertia_plan *plan, const sv_sparse *h,
                               double shift, double error, sv_inertia_count *count)
{
    const double widest = 1e-2 * plan->norm;
    double width = fmin(fmax(16.0 * error, 1e-12 * plan->norm), 1e-7 * plan->norm);
    count->how = SV_COUNTED_TWICE;
    for (;;) {
        sv_inertia below, above;
        sv_status status;
        if ((status = sv_inertia_factor(context, plan, h, shift - width, &below)) != SV_OK ||
            (status = sv_inertia_factor(context, plan, h, shift + width, &above)) != SV_OK)
            return status;
        bool trusted = fmax(below.error, above.error) < 0.25 * width;
        count->width = width;
        count->low = trusted ? below.negative : 0;
        count->high = trusted ? above.negative : plan->order;
        if (trusted || width >= widest)
            return SV_OK;
        width = fmin(30.0 * width, widest);
    }
}

sv_status sv_inertia_count_below(sv_context *context, sv_inertia_plan *plan, const sv_sparse *h,
                                 double shift, sv_inertia_count *ret_count)
{
    sv_inertia_count count = {.how = SV_COUNTED_ONCE};
    sv_status status = sv_inertia_factor(context, plan, h, shift, &count.factor);
    if (status != SV_OK ||
        (status = sv_inertia_distance(context, plan, 3, &count.distance)) != SV_OK)
        return status;
    count.low = count.high = count.factor.negative;
    count.width = count.factor.error;
    bool doubtful =
        count.factor.replaced > 0 || !(count.distance > SAFE_DISTANCE * count.factor.error);
    if (doubtful && plan->order <= SMALL_ORDER)
        status = dense_count(context, h, shift, plan->norm, &count);
    else if (doubtful)
        status = bracket_count(context, plan, h, shift, count.factor.error, &count);
    if (status != SV_OK)
        return status;
    count.decided = count.low == count.high;
    count.below = count.low;
    *ret_count = count;
    return SV_OK;
}
