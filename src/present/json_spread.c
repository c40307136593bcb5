/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The part of a JSON result that tells how a marker is spread over realisations. */
#include <math.h>
#include <stdio.h>

#include "present_internal.h"

static json_t *make_quantile_intervals(sv_json *json, const sv_summary *summary)
{
    json_t *object = json_object();
    for (int i = 0; i < SV_N_QUANTILES; i++) {
        char key[32];
        snprintf(key, sizeof key, "%.2f", sv_quantile_levels()[i]);
        sv_json_put(json, object, key, sv_json_pair(json, summary->quantile_intervals[i]));
    }
    return object;
}

static json_t *make_histogram(sv_json *json, const sv_histogram *histogram)
{
    json_t *object = json_object(), *counts = json_array();
    sv_json_put_real(json, object, "low", histogram->low);
    sv_json_put_real(json, object, "width", histogram->width);
    for (int i = 0; i < histogram->n_bins; i++)
        sv_json_push(json, counts, json_integer((json_int_t)histogram->counts[i]));
    sv_json_put(json, object, "counts", counts);
    return object;
}

static json_t *make_peaks(sv_json *json, const sv_summary *summary)
{
    const sv_peaks *peaks = &summary->peaks;
    if (isnan(peaks->explained))
        return json_null();
    json_t *object = json_object(), *means = json_array(), *counts = json_array();
    sv_json_put(json, object, "apart", json_boolean(peaks->apart));
    sv_json_put_real(json, object, "explained", peaks->explained);
    sv_json_push(json, means, sv_json_real(peaks->low));
    sv_json_push(json, means, sv_json_real(peaks->high));
    sv_json_put(json, object, "means", means);
    sv_json_push(json, counts, json_integer((json_int_t)peaks->n_low));
    sv_json_push(json, counts, json_integer((json_int_t)(summary->resolved - peaks->n_low)));
    sv_json_put(json, object, "counts", counts);
    return object;
}

/* Parts of the standard error: their squares add up to its square. */
static json_t *make_error_parts(sv_json *json, const sv_summary *summary)
{
    const double root = sqrt((double)summary->resolved);
    json_t *object = json_object();
    sv_json_put_real(json, object, "disorder", summary->disorder_deviation / root);
    sv_json_put_real(json, object, "estimator", summary->estimator_error / root);
    return object;
}

void sv_spread_put(sv_json *json, json_t *object, const sv_summary *summary)
{
    sv_json_put_real(json, object, "skewness", summary->skewness);
    if (summary->is_index)
        return;
    sv_json_put_real(json, object, "kurtosis", summary->kurtosis);
    sv_json_put_range(json, object, "interval_corrected", summary->interval_corrected);
    sv_json_put_range(json, object, "interval_bca", summary->interval_bca);
    sv_json_put_integer(json, object, "resamples", summary->resamples);
    if (summary->warning[0] != '\0')
        sv_json_put_text(json, object, "warning", summary->warning);
    sv_json_put(json, object, "quantile_intervals", make_quantile_intervals(json, summary));
    sv_json_put(json, object, "histogram", make_histogram(json, &summary->histogram));
    sv_json_put(json, object, "two_peaks", make_peaks(json, summary));
    if (isfinite(summary->disorder_deviation))
        sv_json_put(json, object, "error_parts", make_error_parts(json, summary));
}
