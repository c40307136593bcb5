/* SPDX-License-Identifier: GPL-3.0-or-later */
/* One marker at one point over the ensemble: the numbers a table, a figure or a file shows. */
#include "selvedge/ensemble.h"

#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

static const double CONFIDENCE = 0.95;

static int compare_doubles(const void *a, const void *b)
{
    double x = *(const double *)a, y = *(const double *)b;
    return x < y ? -1 : x > y;
}

static void blank(sv_summary *s)
{
    s->mean = s->deviation = s->standard_error = s->disorder_deviation = NAN;
    s->interval[0] = s->interval[1] = s->bounds[0] = s->bounds[1] = NAN;
    s->interval_corrected[0] = s->interval_corrected[1] = NAN;
    s->interval_bca[0] = s->interval_bca[1] = NAN;
    s->skewness = s->kurtosis = NAN;
    s->peaks = (sv_peaks){.explained = NAN, .low = NAN, .high = NAN};
    s->kappa = NAN;
    s->numerical_error = s->estimator_error = s->smallest_margin = s->mean_margin = NAN;
    s->confidence = CONFIDENCE;
    for (int k = 0; k < SV_N_QUANTILES; k++)
        s->quantiles[k] = s->quantile_intervals[k][0] = s->quantile_intervals[k][1] = NAN;
}

/* Counts verdicts, keeps resolved values in order, gathers errors and margins. */
static void gather(const sv_ensemble *ensemble, int32_t point, int marker, int64_t counted,
                   double *values, sv_summary *s)
{
    double estimator = 0.0, margins = 0.0;
    int64_t n_margins = 0;
    for (int64_t k = 0; k < counted; k++) {
        const sv_kept_outcome *o = sv_ensemble_outcome(ensemble, point, k, marker);
        if (o == NULL) { /* a record from elsewhere: never an index of 0 */
            if (s->unresolved++ == 0)
                snprintf(s->unresolved_reason, sizeof s->unresolved_reason,
                         "the record of realisation %lld has no such marker", (long long)k);
            continue;
        }
        if (o->verdict == SV_ABSENT) {
            snprintf(s->reason, sizeof s->reason, "%s", sv_ensemble_text(ensemble, o->reason));
            continue;
        }
        if (isnan(s->kappa))
            s->kappa = o->kappa;
        if (isfinite(o->margin)) {
            margins += o->margin;
            s->smallest_margin = n_margins++ == 0 ? o->margin : fmin(s->smallest_margin, o->margin);
        }
        if (o->verdict != SV_RESOLVED) {
            s->failed += o->verdict == SV_FAILED;
            if (s->unresolved++ == 0)
                snprintf(s->unresolved_reason, sizeof s->unresolved_reason, "%s",
                         sv_ensemble_text(ensemble, o->reason));
            continue;
        }
        if (s->engine[0] == '\0')
            snprintf(s->engine, sizeof s->engine, "%s", sv_ensemble_text(ensemble, o->engine));
        values[s->resolved++] = o->value;
        if (isfinite(o->numerical_error))
            s->numerical_error =
                fmax(isnan(s->numerical_error) ? 0.0 : s->numerical_error, o->numerical_error);
        estimator += o->estimator_error * o->estimator_error;
    }
    if (s->resolved > 0)
        s->estimator_error = sqrt(estimator / (double)s->resolved);
    if (n_margins > 0)
        s->mean_margin = margins / (double)n_margins;
}

/*
 * Mean if every unresolved realisation had the worst plausible value: an index of either sign as
 * large as the largest seen (at least 1).
 */
static void bound_mean(const double *values, sv_summary *s)
{
    double largest = 1.0, sum = 0.0;
    for (int64_t k = 0; k < s->resolved; k++) {
        largest = fmax(largest, fabs(values[k]));
        sum += values[k];
    }
    double all = (double)(s->resolved + s->unresolved);
    s->bounds[0] = (sum - largest * (double)s->unresolved) / all;
    s->bounds[1] = (sum + largest * (double)s->unresolved) / all;
}

static sv_status count_shares(sv_context *context, const double *sorted, sv_summary *s)
{
    int64_t all = s->resolved + s->unresolved;
    int n = 0;
    for (int64_t k = 0; k < s->resolved; k++)
        n += k == 0 || sorted[k] != sorted[k - 1];
    sv_status status = sv_take(context, n, sizeof *s->shares, &s->shares);
    if (status != SV_OK)
        return status;
    s->n_shares = n;
    n = -1;
    for (int64_t k = 0; k < s->resolved; k++) {
        if (k == 0 || sorted[k] != sorted[k - 1])
            s->shares[++n].index = (int64_t)sorted[k];
        s->shares[n].count++;
    }
    for (n = 0; n < s->n_shares; n++) {
        sv_index_share *share = &s->shares[n];
        share->share = (double)share->count / (double)all;
        sv_wilson_interval(share->count, all, s->confidence, share->interval);
        sv_exact_interval(share->count, all, s->confidence, share->exact_interval);
    }
    return SV_OK;
}

/*
 * Interval of the mean of an index: with two values the Wilson interval of their shares, with more
 * Student's, cut at the values seen. Student's alone would leave the range of the index.
 */
static void index_interval(sv_summary *s)
{
    double low = (double)s->shares[0].index, high = (double)s->shares[s->n_shares - 1].index;
    if (s->n_shares == 2 && s->unresolved == 0) {
        s->interval[0] = low + (high - low) * s->shares[1].interval[0];
        s->interval[1] = low + (high - low) * s->shares[1].interval[1];
    } else if (!isnan(s->interval[0])) {
        s->interval[0] = fmax(s->interval[0], low);
        s->interval[1] = fmin(s->interval[1], high);
    }
}

/* The distribution of a marker that is no index, from its sorted values. */
static void describe(const sv_moments *m, const double *sorted, sv_summary *s)
{
    if (sv_corrected_interval(m, s->confidence, s->interval_corrected) != SV_OK)
        s->interval_corrected[0] = s->interval_corrected[1] = NAN;
    s->peaks = sv_peaks_of(sorted, m->n);
    s->histogram = sv_histogram_of(sorted, m->n, m->deviation);
    (void)sv_interval_warning(m, &s->peaks, s->warning, sizeof s->warning);
}

static sv_status fill(sv_context *context, double *values, sv_summary *s)
{
    sv_moments m = sv_moments_of(values, s->resolved);
    s->exists = true;
    s->mean = m.mean;
    s->deviation = m.deviation;
    s->standard_error = m.standard_error;
    s->skewness = m.skewness;
    s->kurtosis = m.kurtosis;
    /* The spread over realisations holds that of the estimator, which is drawn anew in each. */
    if (!s->is_index && s->resolved > 1)
        s->disorder_deviation =
            sqrt(fmax(0.0, m.deviation * m.deviation - s->estimator_error * s->estimator_error));
    if (sv_student_interval(&m, s->confidence, s->interval) != SV_OK)
        s->interval[0] = s->interval[1] = NAN;
    if (s->is_index)
        bound_mean(values, s);
    qsort(values, (size_t)s->resolved, sizeof *values, compare_doubles);
    for (int k = 0; k < SV_N_QUANTILES; k++) {
        double level = sv_quantile_levels()[k];
        s->quantiles[k] = sv_quantile_sorted(values, s->resolved, level);
        sv_quantile_interval(values, s->resolved, level, s->confidence, s->quantile_intervals[k]);
    }
    if (!s->is_index) {
        describe(&m, values, s);
        return SV_OK;
    }
    sv_status status = count_shares(context, values, s);
    if (status == SV_OK)
        index_interval(s);
    return status;
}

sv_status sv_summarise(sv_context *context, const sv_ensemble *ensemble, const sv_case *point,
                       int32_t point_number, int marker, int64_t counted, sv_summary *ret_summary)
{
    int count;
    const sv_marker *row = &sv_marker_table(&count)[point->markers[marker].marker];
    sv_summary s = {.marker = row->kind.name, .is_index = row->is_index, .realisations = counted};
    double *values = NULL;
    blank(&s);
    sv_status status = sv_take(context, counted, sizeof *values, &values);
    if (status != SV_OK)
        return status;
    gather(ensemble, point_number, marker, counted, values, &s);
    if (s.resolved > 0)
        status = fill(context, values, &s);
    else if (s.reason[0] == '\0')
        snprintf(s.reason, sizeof s.reason, "%s",
                 s.unresolved > 0 ? s.unresolved_reason : "no realisation is done");
    sv_give(context, values);
    if (status != SV_OK) {
        sv_summary_free(context, &s);
        return status;
    }
    *ret_summary = s;
    return SV_OK;
}

sv_status sv_summary_bootstrap(sv_context *context, const sv_ensemble *ensemble,
                               const sv_case *point, int32_t point_number, int marker,
                               int64_t resamples, sv_summary *summary)
{
    double *values = NULL, interval[2];
    int64_t n = 0;
    if (!summary->exists || summary->is_index || summary->resolved > SV_BOOTSTRAP_LARGEST)
        return SV_OK;
    sv_status status = sv_take(context, summary->resolved, sizeof *values, &values);
    for (int64_t k = 0; status == SV_OK && k < summary->realisations; k++) {
        const sv_kept_outcome *o = sv_ensemble_outcome(ensemble, point_number, k, marker);
        if (o != NULL && o->verdict == SV_RESOLVED && n < summary->resolved)
            values[n++] = o->value;
    }
    if (status == SV_OK)
        status = sv_bootstrap_interval(context, values, n, resamples, point->seed,
                                       summary->confidence, interval);
    sv_give(context, values);
    if (status == SV_OK) {
        memcpy(summary->interval_bca, interval, sizeof interval);
        summary->resamples = resamples;
    }
    return status == SV_UNDEFINED ? SV_OK : status;
}

void sv_summary_free(sv_context *context, sv_summary *summary)
{
    sv_give(context, summary->shares);
    *summary = (sv_summary){0};
}
