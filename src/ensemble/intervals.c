/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Intervals of a mean, and when Student's is not to be trusted. */
#include "selvedge/ensemble.h"

#include <math.h>
#include <stdio.h>

#include <gsl/gsl_cdf.h>

/* Below, a series cannot show how skewed it is. */
enum { FEW_VALUES = 10 };
/* Cochran's rule of thumb: n > 25 skewness² keeps a 95 % interval at 94 % and more. */
static const double COCHRAN = 25.0;

sv_status sv_student_interval(const sv_moments *moments, double confidence, double ret_interval[2])
{
    if (moments->n < 2)
        return SV_UNDEFINED;
    double t = gsl_cdf_tdist_Pinv(0.5 + 0.5 * confidence, (double)(moments->n - 1));
    ret_interval[0] = moments->mean - t * moments->standard_error;
    ret_interval[1] = moments->mean + t * moments->standard_error;
    return SV_OK;
}

/* Inverse of Hall's cubic at a quantile q; a = skewness/√n. */
static double inverse_cubic(double q, double a)
{
    if (fabs(a) < 1e-6)
        return q - a / 6.0;
    return 3.0 / a * (cbrt(1.0 + a * (q - a / 6.0)) - 1.0);
}

sv_status sv_corrected_interval(const sv_moments *moments, double confidence,
                                double ret_interval[2])
{
    if (moments->n < 3)
        return SV_UNDEFINED;
    double t = gsl_cdf_tdist_Pinv(0.5 + 0.5 * confidence, (double)(moments->n - 1));
    double skewness = isnan(moments->skewness) ? 0.0 : moments->skewness;
    double a = skewness / sqrt((double)moments->n);
    ret_interval[0] = moments->mean - moments->standard_error * inverse_cubic(t, a);
    ret_interval[1] = moments->mean - moments->standard_error * inverse_cubic(-t, a);
    return SV_OK;
}

sv_peaks sv_peaks_of(const double *sorted, int64_t n)
{
    sv_peaks peaks = {.low = NAN, .high = NAN, .explained = NAN};
    sv_moments m = sv_moments_of(sorted, n);
    if (n < 4 || !isfinite(m.skewness))
        return peaks;
    double below = 0.0, total = m.deviation * m.deviation * (double)(n - 1), best = -1.0;
    double at_best = 0.0;
    for (int64_t k = 1; k < n; k++) {
        below += sorted[k - 1] - m.mean;
        if (sorted[k] == sorted[k - 1])
            continue;
        /* Between-group sum of squares of the first k and the other n − k values. */
        double between = below * below * (double)n / ((double)k * (double)(n - k));
        if (between > best) {
            best = between;
            at_best = below;
            peaks.n_low = k;
        }
    }
    peaks.explained = fmin(best / total, 1.0);
    peaks.low = m.mean + at_best / (double)peaks.n_low;
    peaks.high = m.mean - at_best / (double)(n - peaks.n_low);
    peaks.apart = peaks.explained > SV_TWO_PEAKS;
    return peaks;
}

bool sv_interval_warning(const sv_moments *m, const sv_peaks *peaks, char *message, size_t size)
{
    int64_t smaller = peaks->n_low < m->n - peaks->n_low ? peaks->n_low : m->n - peaks->n_low;
    message[0] = '\0';
    if (m->n < 2)
        return false;
    if (m->n > 2 && isnan(m->skewness)) {
        double seen[2];
        sv_exact_interval(0, m->n, 0.90, seen); /* its upper end alone: one-sided 95 % */
        snprintf(message, size,
                 "all %lld values are the same: others in up to %.2g %% of the realisations "
                 "may be unseen",
                 (long long)m->n, 100.0 * seen[1]);
    } else if (m->n < FEW_VALUES) {
        snprintf(message, size,
                 "%lld values do not show whether they are skewed: the interval is for normal ones",
                 (long long)m->n);
    } else if ((double)m->n < COCHRAN * m->skewness * m->skewness) {
        if (peaks->apart)
            snprintf(message, size,
                     "two-peaked: %lld of %lld values about %.3g, the others about %.3g; the "
                     "interval covers less than it says",
                     (long long)smaller, (long long)m->n,
                     smaller == peaks->n_low ? peaks->low : peaks->high,
                     smaller == peaks->n_low ? peaks->high : peaks->low);
        else
            snprintf(message, size,
                     "skewed (%.2g) for %lld values: the interval covers less than it says",
                     m->skewness, (long long)m->n);
    }
    return message[0] != '\0';
}
