/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Statistics of a series in its order. Compensated sums: NIST StRD NumAcc4 needs them. */
#include "selvedge/ensemble.h"

#include <math.h>

#include <gsl/gsl_cdf.h>

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

sv_moments sv_moments_of(const double *values, int64_t n)
{
    sv_moments m = {.n = n, .mean = NAN, .deviation = 0.0, .standard_error = NAN};
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

sv_status sv_student_interval(const sv_moments *moments, double confidence, double ret_interval[2])
{
    if (moments->n < 2)
        return SV_UNDEFINED;
    double t = gsl_cdf_tdist_Pinv(0.5 + 0.5 * confidence, (double)(moments->n - 1));
    ret_interval[0] = moments->mean - t * moments->standard_error;
    ret_interval[1] = moments->mean + t * moments->standard_error;
    return SV_OK;
}

void sv_wilson_interval(int64_t k, int64_t n, double confidence, double ret_interval[2])
{
    double z = gsl_cdf_ugaussian_Pinv(0.5 + 0.5 * confidence);
    double count = (double)n, p = n > 0 ? (double)k / count : 0.5;
    if (n == 0) {
        ret_interval[0] = 0.0;
        ret_interval[1] = 1.0;
        return;
    }
    double centre = p + z * z / (2.0 * count);
    double half = z * sqrt(p * (1.0 - p) / count + z * z / (4.0 * count * count));
    double scale = 1.0 + z * z / count;
    ret_interval[0] = k == 0 ? 0.0 : fmax(0.0, (centre - half) / scale);
    ret_interval[1] = k == n ? 1.0 : fmin(1.0, (centre + half) / scale);
}

double sv_quantile_sorted(const double *sorted, int64_t n, double probability)
{
    if (n < 1)
        return NAN;
    double place = probability * (double)(n - 1);
    int64_t below = (int64_t)floor(place);
    if (below >= n - 1)
        return sorted[n - 1];
    double share = place - (double)below;
    return sorted[below] + share * (sorted[below + 1] - sorted[below]);
}

const double *sv_quantile_levels(void)
{
    static const double levels[SV_N_QUANTILES] = {0.05, 0.25, 0.5, 0.75, 0.95};
    return levels;
}
