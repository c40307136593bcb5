/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Two points of a sweep whose realisations share their random numbers, and two that would not. */
#include "selvedge/ensemble.h"

#include <math.h>
#include <stdlib.h>

#include <gsl/gsl_cdf.h>

static const double CONFIDENCE = 0.95;

/* Two-sided probability of |t|; a difference without any spread is certain, and none is none. */
static double two_sided(double difference, double error, double freedom)
{
    if (!(error > 0.0))
        return difference == 0.0 ? 1.0 : 0.0;
    return 2.0 * gsl_cdf_tdist_Q(fabs(difference) / error, freedom);
}

/* As if the two had been drawn apart: Welch, Biometrika 34, 28 (1947). */
static void compare_unpaired(const sv_moments *a, const sv_moments *b, sv_comparison *c)
{
    double n = (double)a->n, va = a->deviation * a->deviation / n,
           vb = b->deviation * b->deviation / n;
    double freedom = (va + vb) * (va + vb) / ((va * va + vb * vb) / (n - 1.0));
    c->unpaired_error = sqrt(va + vb);
    c->unpaired_p_value =
        two_sided(c->difference, c->unpaired_error, isfinite(freedom) ? freedom : n);
}

sv_status sv_compare_pairs(sv_context *context, const double *other, const double *values,
                           int64_t n, sv_comparison *ret)
{
    sv_comparison c = *ret;
    double *differences = NULL;
    c.pairs = n;
    c.difference = c.standard_error = c.interval[0] = c.interval[1] = c.p_value = NAN;
    c.correlation = c.unpaired_error = c.unpaired_p_value = NAN;
    if (n < 1) {
        *ret = c;
        return SV_OK;
    }
    sv_status status = sv_take(context, n, sizeof *differences, &differences);
    if (status != SV_OK)
        return status;
    for (int64_t k = 0; k < n; k++)
        differences[k] = values[k] - other[k];
    sv_moments m = sv_moments_of(differences, n), a = sv_moments_of(other, n),
               b = sv_moments_of(values, n);
    sv_give(context, differences);
    c.difference = m.mean;
    c.standard_error = m.standard_error;
    if (sv_student_interval(&m, CONFIDENCE, c.interval) == SV_OK) {
        c.p_value = two_sided(m.mean, m.standard_error, (double)(n - 1));
        compare_unpaired(&a, &b, &c);
        /* var(b − a) = var a + var b − 2 cov */
        if (a.deviation > 0.0 && b.deviation > 0.0)
            c.correlation = (a.deviation * a.deviation + b.deviation * b.deviation -
                             m.deviation * m.deviation) /
                            (2.0 * a.deviation * b.deviation);
    }
    *ret = c;
    return SV_OK;
}

void sv_compare_indices(const double *other, const double *values, int64_t n, int64_t index,
                        sv_comparison *ret)
{
    ret->index = index;
    ret->lost = ret->gained = 0;
    for (int64_t k = 0; k < n; k++) {
        bool had = other[k] == (double)index, has = values[k] == (double)index;
        ret->lost += had && !has;
        ret->gained += has && !had;
    }
    ret->p_value = n > 0 ? sv_binomial_test(ret->gained, ret->lost + ret->gained) : (double)NAN;
}

/* The resolved value of a realisation, if it has one. */
static bool value_of(const sv_ensemble *ensemble, int32_t point, int64_t k, int marker, double *ret)
{
    const sv_kept_outcome *o = sv_ensemble_outcome(ensemble, point, k, marker);
    if (o == NULL || o->verdict != SV_RESOLVED)
        return false;
    *ret = o->value;
    return true;
}

/* The index most of the values have; of equals the one that comes first. */
static int64_t most_frequent(const double *values, int64_t n)
{
    int64_t best = 0, at = 0;
    for (int64_t k = 0; k < n; k++) {
        int64_t count = 0;
        bool seen = false;
        for (int64_t i = 0; i < k && !seen; i++)
            seen = values[i] == values[k];
        for (int64_t i = k; i < n && !seen; i++)
            count += values[i] == values[k];
        if (count > best) {
            best = count;
            at = k;
        }
        if (2 * best > n) /* no other can have more */
            break;
    }
    return n > 0 ? (int64_t)values[at] : 0;
}

sv_status sv_compare_points(sv_context *context, const sv_ensemble *ensemble, const sv_case *point,
                            int marker, const int64_t *counted, int32_t other, int32_t number,
                            sv_comparison *ret)
{
    int count;
    const sv_marker *row = &sv_marker_table(&count)[point->markers[marker].marker];
    sv_comparison c = {
        .other = other, .point = number, .marker = row->kind.name, .is_index = row->is_index};
    int64_t n = counted[other] < counted[number] ? counted[other] : counted[number], pairs = 0;
    double *x = NULL, *y = NULL;
    sv_status status = sv_take(context, n, sizeof *x, &x);
    if (status == SV_OK)
        status = sv_take(context, n, sizeof *y, &y);
    for (int64_t k = 0; status == SV_OK && k < n; k++)
        pairs += value_of(ensemble, other, k, marker, &x[pairs]) &&
                 value_of(ensemble, number, k, marker, &y[pairs]);
    if (status == SV_OK)
        status = sv_compare_pairs(context, x, y, pairs, &c);
    if (status == SV_OK && c.is_index)
        sv_compare_indices(x, y, pairs, most_frequent(x, pairs), &c);
    sv_give(context, x);
    sv_give(context, y);
    if (status == SV_OK)
        *ret = c;
    return status;
}

typedef struct ranked {
    double p;
    int64_t at;
} ranked;

static int compare_ranked(const void *a, const void *b)
{
    const ranked *x = a, *y = b;
    if (x->p != y->p)
        return x->p < y->p ? -1 : 1;
    return x->at < y->at ? -1 : x->at > y->at;
}

sv_status sv_adjust_p_values(sv_context *context, const double *p, int64_t n, double *ret_adjusted)
{
    ranked *order = NULL;
    int64_t known = 0;
    double largest = 0.0;
    sv_status status = sv_take(context, n, sizeof *order, &order);
    if (status != SV_OK)
        return status;
    for (int64_t k = 0; k < n; k++) {
        ret_adjusted[k] = NAN;
        if (!isnan(p[k]))
            order[known++] = (ranked){p[k], k};
    }
    qsort(order, (size_t)known, sizeof *order, compare_ranked);
    for (int64_t k = 0; k < known; k++) {
        largest = fmax(largest, fmin(1.0, (double)(known - k) * order[k].p));
        ret_adjusted[order[k].at] = largest;
    }
    sv_give(context, order);
    return SV_OK;
}
