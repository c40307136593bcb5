/* SPDX-License-Identifier: GPL-3.0-or-later */
/* A straight line through points with known errors. */
#include <math.h>

#include <gsl/gsl_cdf.h>

#include "study_internal.h"

double sv_threshold_error(const sv_threshold_answer *answer)
{
    double half = 0.5 * (answer->interval[1] - answer->interval[0]);
    return half / gsl_cdf_ugaussian_Pinv(0.5 + 0.5 * answer->confidence);
}

sv_line sv_line_fit(const double *x, const double *y, const double *error, int n)
{
    sv_line line = {.value = NAN,
                    .value_error = NAN,
                    .slope = NAN,
                    .slope_error = NAN,
                    .chi_square = NAN,
                    .p_value = NAN};
    double w = 0.0, wx = 0.0, wy = 0.0, sxx = 0.0, sxy = 0.0;
    for (int k = 0; k < n; k++) {
        double weight = 1.0 / (error[k] * error[k]);
        if (!(error[k] > 0.0) || !isfinite(weight))
            return line;
        w += weight;
        wx += weight * x[k];
        wy += weight * y[k];
    }
    for (int k = 0; k < n; k++) {
        double weight = 1.0 / (error[k] * error[k]), d = x[k] - wx / w;
        sxx += weight * d * d;
        sxy += weight * d * (y[k] - wy / w);
    }
    if (n < 2 || !(sxx > 0.0))
        return line;
    line.exists = true;
    line.slope = sxy / sxx;
    line.slope_error = sqrt(1.0 / sxx);
    line.value = wy / w - line.slope * wx / w;
    line.value_error = sqrt(1.0 / w + wx / w * wx / w / sxx);
    line.chi_square = 0.0;
    for (int k = 0; k < n; k++) {
        double rest = (y[k] - line.value - line.slope * x[k]) / error[k];
        line.chi_square += rest * rest;
    }
    if (n > 2)
        line.p_value = gsl_cdf_chisq_Q(line.chi_square, n - 2);
    return line;
}
