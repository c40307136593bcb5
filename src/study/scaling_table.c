/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The table of means by size and parameter, what each realisation adds to them, and resamples. */
#include "scaling_internal.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

void sv_scaling_table_free(sv_context *context, scaling_table *table)
{
    sv_give(context, table->size);
    sv_give(context, table->values);
    sv_give(context, table->covariance);
    sv_give(context, table->counts);
    *table = (scaling_table){0};
}

static int compare_points(const void *a, const void *b)
{
    const sv_scaling_point *x = a, *y = b;
    if (x->size != y->size)
        return x->size < y->size ? -1 : 1;
    return (x->parameter > y->parameter) - (x->parameter < y->parameter);
}

static sv_status check_points(sv_context *context, const sv_scaling_point *points, sv_index n)
{
    for (sv_index i = 0; i < n; i++) {
        if (!(points[i].size > 0.0) || !isfinite(points[i].size) || !isfinite(points[i].parameter))
            return SV_FAIL(context, SV_INVALID_INPUT,
                           "a size of %g at the parameter %g: sizes are positive and both finite",
                           points[i].size, points[i].parameter);
        if (i > 0 && compare_points(&points[i - 1], &points[i]) == 0)
            return SV_FAIL(context, SV_INVALID_INPUT, "size %g at the parameter %g stands twice",
                           points[i].size, points[i].parameter);
    }
    return SV_OK;
}

static void take_mean(const sv_scaling_data *data, scaling_table *t, sv_index i)
{
    double sum = 0.0;
    int64_t count = 0;
    for (int64_t k = 0; k < t->realisations; k++)
        if (isfinite(t->values[i][k])) {
            sum += t->values[i][k];
            count++;
        }
    t->mean[i] = count > 0 ? sum / (double)count : (double)NAN;
    t->scale[i] = count > 1 ? 1.0 / sqrt((double)count * (double)(count - 1)) : 0.0;
    t->error[i] = count > 1 ? fmax(data->floor, data->quantum / (double)count) : (double)NAN;
    t->least = i == 0 || count < t->least ? count : t->least;
    t->most = i == 0 || count > t->most ? count : t->most;
}

/* Σ_k of the products of what realisation k adds to the means; the same numbers at all points. */
static void take_covariance(scaling_table *t)
{
    for (int64_t k = 0; k < t->realisations; k++) {
        for (sv_index i = 0; i < t->n; i++) {
            double value = t->values[i][k];
            t->draw[i] = isfinite(value) ? (value - t->mean[i]) * t->scale[i] : 0.0;
        }
        for (sv_index i = 0; i < t->n; i++)
            for (sv_index j = 0; j <= i; j++)
                t->covariance[i * t->n + j] += t->draw[i] * t->draw[j];
    }
    for (sv_index i = 0; i < t->n; i++) {
        for (sv_index j = 0; j < i; j++)
            t->covariance[j * t->n + i] = t->covariance[i * t->n + j];
        double own = sqrt(t->covariance[i * t->n + i]);
        if (own <= 1e-13 * fabs(t->mean[i])) /* rounding of equal values */
            own = 0.0;
        t->error[i] = isnan(t->error[i]) ? t->error[i] : fmax(own, t->error[i]);
    }
}

static sv_status take_memory(sv_context *context, scaling_table *t)
{
    sv_status status = sv_take(context, 6 * t->n, sizeof *t->size, &t->size);
    if (status == SV_OK)
        status = sv_take(context, t->n, sizeof *t->values, &t->values);
    if (status == SV_OK)
        status = sv_take(context, t->n * t->n, sizeof *t->covariance, &t->covariance);
    if (status == SV_OK)
        status = sv_take(context, t->realisations, sizeof *t->counts, &t->counts);
    if (status != SV_OK)
        return status;
    t->parameter = t->size + t->n;
    t->mean = t->parameter + t->n;
    t->error = t->mean + t->n;
    t->draw = t->error + t->n;
    t->scale = t->draw + t->n;
    return SV_OK;
}

static sv_status find_sizes(sv_context *context, scaling_table *t)
{
    for (sv_index i = 0; i < t->n; i++) {
        if (i > 0 && t->size[i] == t->size[i - 1])
            continue;
        if (t->n_sizes == SV_SCALING_SIZES)
            return SV_FAIL(context, SV_INVALID_INPUT, "more than %d sizes", SV_SCALING_SIZES);
        t->first[t->n_sizes] = i;
        t->sizes[t->n_sizes++] = t->size[i];
    }
    t->first[t->n_sizes] = t->n;
    return SV_OK;
}

bool sv_scaling_usable(const scaling_table *t, sv_index row)
{
    return isfinite(t->error[row]) && t->error[row] > 0.0 && t->parameter[row] >= t->range[0] &&
           t->parameter[row] <= t->range[1];
}

sv_status sv_scaling_table_make(sv_context *context, const sv_scaling_data *data,
                                const double range[2], scaling_table *ret_table)
{
    scaling_table t = {.n = data->n_points,
                       .realisations = data->realisations,
                       .range = {isfinite(range[0]) ? range[0] : -(double)INFINITY,
                                 isfinite(range[1]) ? range[1] : (double)INFINITY}};
    sv_scaling_point *sorted = NULL;
    if (t.n < 1 || t.realisations < 1)
        return SV_FAIL(context, SV_INVALID_INPUT, "%lld points of %lld realisations are no table",
                       (long long)t.n, (long long)t.realisations);
    if (t.n > MOST_POINTS)
        return SV_FAIL(context, SV_INVALID_INPUT, "%lld points; at most %d", (long long)t.n,
                       MOST_POINTS);
    sv_status status = sv_take(context, t.n, sizeof *sorted, &sorted);
    if (status == SV_OK) {
        memcpy(sorted, data->points, (size_t)t.n * sizeof *sorted);
        qsort(sorted, (size_t)t.n, sizeof *sorted, compare_points);
        status = check_points(context, sorted, t.n);
    }
    if (status == SV_OK)
        status = take_memory(context, &t);
    for (sv_index i = 0; status == SV_OK && i < t.n; i++) {
        t.size[i] = sorted[i].size;
        t.parameter[i] = sorted[i].parameter;
        t.values[i] = sorted[i].values;
        take_mean(data, &t, i);
    }
    if (status == SV_OK)
        take_covariance(&t);
    if (status == SV_OK)
        status = find_sizes(context, &t);
    sv_give(context, sorted);
    if (status == SV_OK)
        *ret_table = t;
    else
        sv_scaling_table_free(context, &t);
    return status;
}

/* Four realisation numbers per block of the generator; the bias of the product is below R/2^32. */
static void draw_counts(scaling_table *t, uint64_t seed, int resample)
{
    sv_stream stream = sv_stream_make(seed, "finite size bootstrap", resample);
    const uint32_t key[2] = {stream.seed, stream.purpose};
    const uint64_t n = (uint64_t)t->realisations;
    memset(t->counts, 0, (size_t)n * sizeof *t->counts);
    for (uint64_t k = 0; k < n; k += 4) {
        const uint32_t counter[4] = {(uint32_t)(k / 4), (uint32_t)(k / 4 >> 32), stream.realisation,
                                     0};
        uint32_t words[4];
        sv_philox(counter, key, words);
        for (uint64_t j = 0; j < 4 && k + j < n; j++)
            t->counts[words[j] * n >> 32]++;
    }
}

void sv_scaling_table_draw(scaling_table *t, uint64_t seed, int resample)
{
    draw_counts(t, seed, resample);
    for (sv_index i = 0; i < t->n; i++) {
        double sum = 0.0, count = 0.0;
        for (int64_t k = 0; k < t->realisations; k++) {
            if (t->counts[k] == 0 || !isfinite(t->values[i][k]))
                continue;
            sum += (double)t->counts[k] * t->values[i][k];
            count += (double)t->counts[k];
        }
        t->draw[i] = count > 0.0 ? sum / count : t->mean[i];
    }
}

double sv_scaling_variance(const scaling_table *t, const sv_index *rows, const double *weights,
                           sv_index n)
{
    double variance = 0.0;
    for (sv_index i = 0; i < n; i++)
        for (sv_index j = 0; j < n; j++)
            variance += weights[i] * weights[j] * t->covariance[rows[i] * t->n + rows[j]];
    return variance;
}
