/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Shares k/n: intervals and the exact test of one half. */
#include "selvedge/ensemble.h"

#include <math.h>

#include <gsl/gsl_cdf.h>
#include <gsl/gsl_sf_gamma.h>

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

/* P(X ≥ k) of k successes among n with probability p, as an incomplete beta function. */
static double upper_tail(double p, int64_t k, int64_t n)
{
    if (k <= 0)
        return 1.0;
    return k > n ? 0.0 : gsl_cdf_beta_P(p, (double)k, (double)(n - k + 1));
}

/*
 * The probability p at which P(X ≥ k) is `tail`, by halving: GSL's own quantile of the beta
 * distribution fails for some large n, its distribution function does not. 60 halvings are below
 * the spacing of doubles in (0, 1).
 */
static double solve_tail(int64_t k, int64_t n, double tail)
{
    double low = 0.0, high = 1.0;
    for (int step = 0; step < 60; step++) {
        double middle = 0.5 * (low + high);
        if (upper_tail(middle, k, n) < tail)
            low = middle;
        else
            high = middle;
    }
    return 0.5 * (low + high);
}

void sv_exact_interval(int64_t k, int64_t n, double confidence, double ret_interval[2])
{
    double tail = 0.5 * (1.0 - confidence);
    if (n > SV_EXACT_LARGEST) {
        sv_wilson_interval(k, n, confidence, ret_interval);
        return;
    }
    ret_interval[0] = k <= 0 ? 0.0 : solve_tail(k, n, tail);
    ret_interval[1] = k >= n ? 1.0 : solve_tail(k + 1, n, 1.0 - tail);
}

double sv_binomial_test(int64_t k, int64_t n)
{
    int64_t more = k > n - k ? k : n - k;
    if (n < 1 || 2 * more == n)
        return 1.0;
    return fmin(1.0, 2.0 * upper_tail(0.5, more, n));
}
