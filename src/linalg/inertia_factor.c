/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Factorisations H − shift = L D L† in double or single precision, and solves with them. */
#include "inertia_internal.h"

#include <float.h>
#include <math.h>

/* Pivots below this share of the norm are replaced. */
static const double TINY_PIVOT = 1e-11, TINY_PIVOT_SINGLE = 1e-6;

/* Largest row sum of |re| + |im|; NaN or infinite when an element is. */
static double row_sum_norm(const sv_sparse *h)
{
    double norm = 0.0, total = 0.0;
    for (sv_index row = 0; row < h->n; row++) {
        double sum = 0.0;
        for (sv_index k = h->row_start[row]; k < h->row_start[row + 1]; k++)
            sum += fabs(creal(h->value[k])) + fabs(cimag(h->value[k]));
        norm = fmax(norm, sum);
        total += sum;
    }
    return isfinite(total) ? norm : total;
}

static sv_status factor(sv_context *context, sv_inertia_plan *plan, const sv_sparse *h,
                        double shift, bool single, sv_inertia *ret_inertia)
{
    sv_pivot_tally tally = {.smallest = INFINITY};
    if (h->n != plan->order)
        return SV_FAIL(context, SV_INVALID_INPUT, "a matrix of order %lld for a plan of order %lld",
                       (long long)h->n, (long long)plan->order);
    plan->factored = false;
    plan->single = single;
    plan->norm = row_sum_norm(h) + fabs(shift);
    if (!isfinite(plan->norm))
        return SV_FAIL(context, SV_NUMERICAL, "the matrix is not finite");
    plan->norm = fmax(plan->norm, DBL_MIN / DBL_EPSILON); /* a matrix of zeros */
    double tiny = (single ? TINY_PIVOT_SINGLE : TINY_PIVOT) * plan->norm;
    for (sv_index k = 0; k < plan->groups; k++)
        plan->slot[k] = -1;
    sv_status status = single ? sv_inertia_fronts_single(context, plan, h, shift, tiny, &tally)
                              : sv_inertia_fronts(context, plan, h, shift, tiny, &tally);
    if (status != SV_OK)
        return status;
    plan->factored = true;
    double epsilon = single ? (double)FLT_EPSILON : DBL_EPSILON;
    *ret_inertia =
        (sv_inertia){.negative = tally.negative,
                     .positive = tally.positive,
                     .replaced = tally.replaced,
                     .smallest_pivot = tally.smallest,
                     .growth = tally.grown / plan->norm,
                     .error = 4.0 * epsilon * tally.grown + (double)tally.replaced * tiny};
    return SV_OK;
}

sv_status sv_inertia_factor(sv_context *context, sv_inertia_plan *plan, const sv_sparse *h,
                            double shift, sv_inertia *ret_inertia)
{
    return factor(context, plan, h, shift, false, ret_inertia);
}

sv_status sv_inertia_factor_single(sv_context *context, sv_inertia_plan *plan, const sv_sparse *h,
                                   double shift, sv_inertia *ret_inertia)
{
    return factor(context, plan, h, shift, true, ret_inertia);
}

sv_status sv_inertia_solve(sv_context *context, sv_inertia_plan *plan, sv_complex *x)
{
    if (!plan->factored)
        return SV_FAIL(context, SV_INTERNAL, "there is no factorisation to solve with");
    if (plan->single)
        sv_inertia_sweep_single(plan, x);
    else
        sv_inertia_sweep(plan, x);
    return SV_OK;
}
