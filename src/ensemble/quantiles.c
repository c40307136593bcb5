/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Quantiles of sorted values with intervals by order statistics, and the histogram. */
#include "selvedge/ensemble.h"

#include <math.h>

#include <gsl/gsl_cdf.h>

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

/* P(B ≤ k), B binomial with n trials. */
static double binomial_cdf(int64_t k, int64_t n, double probability)
{
    if (k < 0)
        return 0.0;
    return k >= n ? 1.0 : gsl_cdf_beta_Q(probability, (double)(k + 1), (double)(n - k));
}

/* Smallest k with P(B ≤ k) ≥ level (above: > level). */
static int64_t binomial_quantile(double level, int64_t n, double probability, bool above)
{
    int64_t low = -1, high = n;
    while (high - low > 1) {
        int64_t middle = low + (high - low) / 2;
        double p = binomial_cdf(middle, n, probability);
        if (above ? p > level : p >= level)
            high = middle;
        else
            low = middle;
    }
    return high;
}

void sv_quantile_interval(const double *sorted, int64_t n, double probability, double confidence,
                          double ret_interval[2])
{
    double tail = 0.5 * (1.0 - confidence);
    ret_interval[0] = ret_interval[1] = NAN;
    if (n < 1)
        return;
    /* The quantile is below the r-th smallest value with P(B ≤ r − 1), above it with P(B ≥ r). */
    int64_t low = binomial_quantile(tail, n, probability, true); /* P(B ≤ low − 1) ≤ tail */
    int64_t high =
        binomial_quantile(1.0 - tail, n, probability, false) + 1; /* P(B ≥ high) ≤ tail */
    if (low >= 1)
        ret_interval[0] = sorted[low - 1];
    if (high <= n)
        ret_interval[1] = sorted[high - 1];
}

/* The smallest of 1, 2, 5 times a power of ten that is not below x. */
static double round_up(double x)
{
    double power = pow(10.0, floor(log10(x)));
    for (int k = 0; k < 4; k++) {
        double step = power * (const double[]){1.0, 2.0, 5.0, 10.0}[k];
        if (step >= x * (1.0 - 1e-12))
            return step;
    }
    return 10.0 * power;
}

static int64_t bin_number(double value, double width)
{
    return (int64_t)floor(value / width + 1e-9);
}

sv_histogram sv_histogram_of(const double *sorted, int64_t n, double deviation)
{
    sv_histogram h = {.low = NAN};
    if (n < 1)
        return h;
    double lowest = sorted[0], highest = sorted[n - 1];
    double spread = sv_quantile_sorted(sorted, n, 0.75) - sv_quantile_sorted(sorted, n, 0.25);
    double width = 2.0 * spread / cbrt((double)n); /* Freedman and Diaconis */
    if (!(width > 0.0))
        width = 3.49 * deviation / cbrt((double)n); /* Scott */
    h.n_bins = 1;
    /* A spread within rounding of the values is none. */
    if (!(width > 0.0) || highest - lowest <= 1e-13 * fmax(fabs(lowest), fabs(highest))) {
        h.low = lowest;
        h.counts[0] = n;
        return h;
    }
    width = round_up(fmax(width, 1e-12 * fmax(fabs(lowest), fabs(highest))));
    while (bin_number(highest, width) - bin_number(lowest, width) >= SV_MOST_BINS)
        width = round_up(1.5 * width);
    int64_t first = bin_number(lowest, width);
    h.width = width;
    h.low = (double)first * width;
    h.n_bins = (int)(bin_number(highest, width) - first) + 1;
    for (int64_t k = 0; k < n; k++)
        h.counts[bin_number(sorted[k], width) - first]++;
    return h;
}
