/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The bootstrap: realisation numbers are drawn once for all points, since these share random
 * numbers, and everything is estimated anew. */
#include "scaling_internal.h"

#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

/* All resamples. */
typedef struct sample {
    int n;
    double *crossings;  /* n_crossings × n, NaN: failed */
    double *parameters; /* 3 × n: p_c, a, y; NaN: failed */
    double *pooled;     /* n */
    double *scratch;    /* n */
} sample;

static int compare_reals(const void *a, const void *b)
{
    const double *x = a, *y = b;
    return (*x > *y) - (*x < *y);
}

/* Sorted finite values into scratch; how many. */
static int sort_finite(const double *values, int n, double *scratch)
{
    int kept = 0;
    for (int i = 0; i < n; i++)
        if (!isnan(values[i]))
            scratch[kept++] = values[i];
    qsort(scratch, (size_t)kept, sizeof *scratch, compare_reals);
    return kept;
}

static void set_estimate(const double *values, int n, double confidence, double *scratch,
                         sv_scaling_estimate *estimate)
{
    const int kept = sort_finite(values, n, scratch);
    const double half = 0.5 * confidence;
    if (kept < 20)
        return;
    estimate->standard_error = 0.5 * (sv_quantile_sorted(scratch, kept, 0.841344746) -
                                      sv_quantile_sorted(scratch, kept, 0.158655254));
    estimate->interval[0] = sv_quantile_sorted(scratch, kept, 0.5 - half);
    estimate->interval[1] = sv_quantile_sorted(scratch, kept, 0.5 + half);
}

/* ν from 1/ν: where that is not above 0, no ν is large enough. */
static void invert(const sv_scaling_estimate *a, sv_scaling_estimate *nu)
{
    nu->value = 1.0 / a->value;
    for (int i = 0; i < 2; i++) {
        double end = a->interval[1 - i];
        nu->interval[i] = isnan(end) ? (double)NAN : end > 0.0 ? 1.0 / end : (double)INFINITY;
    }
    double low = a->value - a->standard_error, high = a->value + a->standard_error;
    nu->standard_error = low > 0.0 ? 0.5 * (1.0 / low - 1.0 / high) : (double)INFINITY;
}

static void refit(scaling_work *w, const scaling_fit *fit, const sv_scaling_collapse *collapse,
                  sample *s, int b)
{
    scaling_fit next = *fit;
    double *out = &s->parameters[b];
    out[0] = out[s->n] = out[2 * s->n] = NAN;
    if (!fit->converged)
        return;
    sv_scaling_descend(w, w->table->draw, &next);
    if (!next.converged || !(next.parameters[0] >= collapse->range[0]) ||
        !(next.parameters[0] <= collapse->range[1]))
        return;
    out[0] = next.parameters[0];
    out[s->n] = next.parameters[1];
    if (next.model.free_exponent)
        out[2 * s->n] = next.parameters[2];
}

static void summarise_collapse(const sample *s, const scaling_fit *fit, sv_scaling *scaling)
{
    sv_scaling_collapse *c = &scaling->collapse;
    sv_scaling_estimate a = c->nu;
    a.value = fit->parameters[1];
    c->resamples = s->n;
    for (int b = 0; b < s->n; b++)
        c->failed += isnan(s->parameters[b]);
    set_estimate(s->parameters, s->n, scaling->confidence, s->scratch, &c->critical);
    set_estimate(s->parameters + s->n, s->n, scaling->confidence, s->scratch, &a);
    invert(&a, &c->nu);
    if (fit->model.free_exponent)
        set_estimate(s->parameters + 2 * s->n, s->n, scaling->confidence, s->scratch, &c->exponent);
}

static void summarise_crossing(const sample *s, int k, sv_scaling *scaling)
{
    sv_scaling_crossing *c = &scaling->crossings[k];
    int failed = 0;
    for (int b = 0; b < s->n; b++)
        failed += isnan(s->crossings[k * s->n + b]);
    set_estimate(s->crossings + k * s->n, s->n, scaling->confidence, s->scratch, &c->at);
    if (10 * failed <= s->n)
        return;
    c->found = false;
    snprintf(c->reason, sizeof c->reason,
             "%d of %d resamples of the realisations do not cross there", failed, s->n);
}

/* Last crossing − first in each resample, and its spread. */
static void measure_drift(sample *s, int first, int last, sv_scaling *scaling)
{
    double sum = 0.0, squares = 0.0;
    int n = 0;
    scaling->drift = scaling->crossings[last].at.value - scaling->crossings[first].at.value;
    for (int b = 0; b < s->n; b++) {
        double d = s->crossings[last * s->n + b] - s->crossings[first * s->n + b] - scaling->drift;
        if (isnan(d))
            continue;
        sum += d;
        squares += d * d;
        n++;
    }
    if (n > 2)
        scaling->drift_z = scaling->drift / sqrt((squares - sum * sum / n) / (n - 1));
}

/* Weighted mean of the crossings, or the last one when they drift. */
static void pool_crossings(sample *s, sv_scaling *scaling)
{
    int first = -1, last = -1;
    for (int k = 0; k < scaling->n_crossings; k++) {
        if (!scaling->crossings[k].found)
            continue;
        first = first < 0 ? k : first;
        last = k;
    }
    if (last < 0)
        return;
    if (first < last)
        measure_drift(s, first, last, scaling);
    if (fabs(scaling->drift_z) > 2.0)
        first = last;
    double weight = 0.0, value = 0.0;
    for (int b = 0; b < s->n; b++)
        s->pooled[b] = 0.0;
    for (int k = first; k <= last; k++) {
        const sv_scaling_crossing *c = &scaling->crossings[k];
        if (!c->found)
            continue;
        double w = 1.0 / fmax(c->at.standard_error * c->at.standard_error, 1e-300);
        weight += w;
        value += w * c->at.value;
        for (int b = 0; b < s->n; b++)
            s->pooled[b] += w * s->crossings[k * s->n + b];
    }
    scaling->crossing.value = value / weight;
    for (int b = 0; b < s->n; b++)
        s->pooled[b] /= weight;
    set_estimate(s->pooled, s->n, scaling->confidence, s->scratch, &scaling->crossing);
}

sv_status sv_scaling_resample(sv_context *context, scaling_table *table, scaling_work *w,
                              const sv_scaling_options *options, const scaling_pair *pairs,
                              const scaling_fit *fit, sv_scaling *scaling)
{
    sample s = {.n = options->resamples};
    const int n_crossings = scaling->n_crossings;
    sv_status status =
        sv_take(context, (n_crossings + 5) * (sv_index)s.n, sizeof *s.parameters, &s.parameters);
    if (status != SV_OK)
        return status;
    s.pooled = s.parameters + 3 * s.n;
    s.scratch = s.pooled + s.n;
    s.crossings = s.scratch + s.n;
    for (int b = 0; status == SV_OK && b < s.n; b++) {
        sv_scaling_table_draw(table, options->seed, b);
        for (int k = 0; k < n_crossings; k++)
            s.crossings[k * s.n + b] = scaling->crossings[k].found
                                           ? sv_scaling_root(table, &pairs[k], table->draw, NULL)
                                           : (double)NAN;
        refit(w, fit, &scaling->collapse, &s, b);
        if (b % 16 == 0 && sv_cancelled(context))
            status = SV_FAIL(context, SV_INTERRUPTED, "stopped in the bootstrap of the collapse");
    }
    for (int k = 0; k < n_crossings && status == SV_OK; k++)
        if (scaling->crossings[k].found)
            summarise_crossing(&s, k, scaling);
    if (status == SV_OK)
        pool_crossings(&s, scaling);
    if (status == SV_OK && fit->converged)
        summarise_collapse(&s, fit, scaling);
    sv_give(context, s.parameters);
    return status;
}
