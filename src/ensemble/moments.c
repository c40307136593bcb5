/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Moments of a series in its order. Compensated sums: NIST StRD NumAcc4 needs them. */
#include "selvedge/ensemble.h"

#include <math.h>

/* Neumaier's sum: total and the low-order part that rounding lost. */
typedef struct exact_sum {
    double total, lost;
} exact_sum;

static void add(exact_sum *sum, double value)
{
    double next = sum->total + value;
    if (fabs(sum->total) >= fabs(value))
        sum->lost += (sum->total - next) + value;
    else
        sum->lost += (value - next) + sum->total;
    sum->total = next;
}

static double value_of(const exact_sum *sum)
{
    return sum->total + sum->lost;
}

/* Third and fourth cumulants by their unbiased estimators (k-statistics) over the variance's. */
static void shape(const double *values, double deviation, sv_moments *m)
{
    exact_sum third = {0}, fourth = {0};
    double n = (double)m->n;
    for (int64_t k = 0; k < m->n; k++) {
        double z = (values[k] - m->mean) / deviation;
        add(&third, z * z * z);
        add(&fourth, z * z * z * z);
    }
    m->skewness = n / ((n - 1.0) * (n - 2.0)) * value_of(&third);
    if (m->n > 3)
        m->kurtosis = n * (n + 1.0) / ((n - 1.0) * (n - 2.0) * (n - 3.0)) * value_of(&fourth) -
                      3.0 * (n - 1.0) * (n - 1.0) / ((n - 2.0) * (n - 3.0));
}

sv_moments sv_moments_of(const double *values, int64_t n)
{
    sv_moments m = {.n = n,
                    .mean = NAN,
                    .deviation = 0.0,
                    .standard_error = NAN,
                    .skewness = NAN,
                    .kurtosis = NAN};
    if (n < 1)
        return m;
    exact_sum sum = {0}, squares = {0}, rest = {0};
    for (int64_t k = 0; k < n; k++)
        add(&sum, values[k]);
    m.mean = value_of(&sum) / (double)n;
    for (int64_t k = 0; k < n; k++) {
        double d = values[k] - m.mean;
        add(&squares, d * d);
        add(&rest, d);
    }
    if (n < 2)
        return m;
    /* The second term corrects for the rounding of the mean (Chan, Golub, LeVeque 1983). */
    double variance =
        (value_of(&squares) - value_of(&rest) * value_of(&rest) / (double)n) / (double)(n - 1);
    m.deviation = sqrt(fmax(variance, 0.0));
    m.standard_error = m.deviation / sqrt((double)n);
    if (n > 2 && m.deviation > 0.0)
        shape(values, m.deviation, &m);
    return m;
}

double sv_autocorrelation(const double *values, int64_t n)
{
    sv_moments m = sv_moments_of(values, n);
    exact_sum product = {0}, squares = {0};
    for (int64_t k = 0; k < n; k++) {
        double d = values[k] - m.mean;
        add(&squares, d * d);
        if (k + 1 < n)
            add(&product, d * (values[k + 1] - m.mean));
    }
    double below = value_of(&squares);
    return below > 0.0 ? value_of(&product) / below : (double)NAN;
}
