/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Bootstrap interval of a mean, bias-corrected and accelerated: Efron 1987. */
#include "selvedge/ensemble.h"

#include <math.h>
#include <stdlib.h>

#include <gsl/gsl_cdf.h>

static int compare_doubles(const void *a, const void *b)
{
    double x = *(const double *)a, y = *(const double *)b;
    return x < y ? -1 : x > y;
}

/* Mean of one resample: index k of resample b is word k mod 4 of block k/4 of the stream. */
static double resample(const sv_stream *stream, const double *deviations, int64_t n, int64_t b)
{
    const uint32_t key[2] = {stream->seed, stream->purpose};
    uint32_t word[4];
    double sum = 0.0;
    for (int64_t k = 0; k < n; k++) {
        if (k % 4 == 0) {
            const uint32_t counter[4] = {(uint32_t)(k / 4), 0, (uint32_t)b, 0};
            sv_philox(counter, key, word);
        }
        sum += deviations[((uint64_t)word[k % 4] * (uint64_t)n) >> 32];
    }
    return sum / (double)n;
}

/* Σd³/(6 (Σd²)^{3/2}): the jackknife acceleration, whose pseudo-values of a mean are the values. */
static double acceleration(const double *deviations, int64_t n)
{
    double squares = 0.0, cubes = 0.0;
    for (int64_t k = 0; k < n; k++) {
        squares += deviations[k] * deviations[k];
        cubes += deviations[k] * deviations[k] * deviations[k];
    }
    return cubes / (6.0 * pow(squares, 1.5));
}

/* Share of the resampled means below that of the data; ties (to rounding) count half. */
static double share_below(const double *means, int64_t resamples, double deviation)
{
    int64_t below = 0, equal = 0;
    for (int64_t b = 0; b < resamples; b++) {
        bool tie = fabs(means[b]) <= 1e-12 * deviation;
        below += means[b] < 0.0 && !tie;
        equal += tie;
    }
    return ((double)below + 0.5 * (double)equal) / (double)resamples;
}

sv_status sv_bootstrap_interval(sv_context *context, const double *values, int64_t n,
                                int64_t resamples, uint64_t seed, double confidence,
                                double ret_interval[2])
{
    sv_moments m = sv_moments_of(values, n);
    sv_stream stream = sv_stream_make(seed, "bootstrap", 0);
    double *deviations = NULL, *means = NULL;
    sv_status status = SV_UNDEFINED;
    if (n < 3 || isnan(m.skewness))
        return SV_UNDEFINED;
    if (resamples < 100 || n > SV_BOOTSTRAP_LARGEST)
        return SV_FAIL(context, SV_INVALID_INPUT, "%lld resamples of %lld values",
                       (long long)resamples, (long long)n);
    if ((status = sv_take(context, n, sizeof *deviations, &deviations)) != SV_OK ||
        (status = sv_take(context, resamples, sizeof *means, &means)) != SV_OK)
        goto out;
    for (int64_t k = 0; k < n; k++)
        deviations[k] = values[k] - m.mean;
    for (int64_t b = 0; b < resamples; b++)
        means[b] = resample(&stream, deviations, n, b);
    double z0 = gsl_cdf_ugaussian_Pinv(share_below(means, resamples, m.deviation));
    double a = acceleration(deviations, n);
    if (!isfinite(z0)) { /* every resample on one side: too few of them to say */
        status = SV_UNDEFINED;
        goto out;
    }
    qsort(means, (size_t)resamples, sizeof *means, compare_doubles);
    for (int side = 0; side < 2; side++) {
        double z = z0 + gsl_cdf_ugaussian_Pinv(side == 0 ? 0.5 - 0.5 * confidence
                                                         : 0.5 + 0.5 * confidence);
        double level = gsl_cdf_ugaussian_P(z0 + z / (1.0 - a * z));
        ret_interval[side] = m.mean + sv_quantile_sorted(means, resamples, level);
    }
out:
    sv_give(context, deviations);
    sv_give(context, means);
    return status;
}
