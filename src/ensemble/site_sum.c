/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The marker of each site over an ensemble: fixed-point values and their exact sums. */
#include "ensemble_internal.h"

#include <math.h>
#include <string.h>

static const double SCALE = 68719476736.0; /* 2^SV_SITE_BITS */
/* Squares then stay below 2^96, and 2^31 of them below 2^127. */
static const double LARGEST = 4096.0;

sv_index sv_site_entries(const sv_flake *flake)
{
    return flake->n_sites + (flake->n_sites > flake->n_cells ? flake->n_cells : 0);
}

sv_index sv_site_first_cell(const sv_flake *flake)
{
    return flake->n_sites > flake->n_cells ? flake->n_sites : -1;
}

static int64_t fixed_point(double value)
{
    return fabs(value) < LARGEST ? (int64_t)llrint(value * SCALE) : SV_SITE_ABSENT;
}

/* A site without a value takes that of its cell away; one that is vacant does not. */
static void add_to_cell(int64_t *cell, bool *spoilt, int64_t value)
{
    if (value == SV_SITE_ABSENT)
        *spoilt = true;
    else
        *cell = *cell == SV_SITE_ABSENT ? value : *cell + value;
}

static sv_status fill_cells(sv_context *context, const sv_sample *sample, const double *markers,
                            int64_t *values)
{
    const sv_flake *flake = sample->flake;
    int64_t *cells = values + sv_site_first_cell(flake);
    bool *spoilt = NULL;
    sv_status status = sv_take(context, flake->n_cells, sizeof *spoilt, &spoilt);
    if (status != SV_OK)
        return status;
    for (sv_index k = 0; k < sample->n; k++) {
        const int32_t cell = flake->sites[sample->pristine[k]].cell;
        add_to_cell(&cells[cell], &spoilt[cell], fixed_point(markers[k]));
    }
    const double largest = LARGEST * SCALE;
    for (sv_index c = 0; c < flake->n_cells; c++)
        if (spoilt[c] || fabs((double)cells[c]) >= largest)
            cells[c] = SV_SITE_ABSENT;
    sv_give(context, spoilt);
    return SV_OK;
}

sv_status sv_site_record_make(sv_context *context, const sv_sample *sample, const double *values,
                              sv_site_record **ret_record)
{
    sv_site_record *record = NULL;
    const sv_index n = sv_site_entries(sample->flake);
    sv_status status = sv_take(context, 1, sizeof *record, &record);
    if (status == SV_OK)
        status = sv_take_raw(context, n, sizeof *record->values, &record->values);
    if (status == SV_OK) {
        record->n = n;
        for (sv_index k = 0; k < n; k++)
            record->values[k] = SV_SITE_ABSENT;
        for (sv_index k = 0; k < sample->n; k++)
            if (sample->adatom == NULL || sample->adatom[k] < 0)
                record->values[sample->pristine[k]] = fixed_point(values[k]);
        if (sv_site_first_cell(sample->flake) >= 0)
            status = fill_cells(context, sample, values, record->values);
    }
    if (status != SV_OK) {
        sv_site_record_free(context, record);
        return status;
    }
    *ret_record = record;
    return SV_OK;
}

void sv_site_record_free(sv_context *context, sv_site_record *record)
{
    if (record != NULL)
        sv_give(context, record->values);
    sv_give(context, record);
}

sv_status sv_site_sum_init(sv_context *context, sv_index n, sv_site_sum *ret_sum)
{
    sv_site_sum sum = {.n = n};
    sv_status status = sv_take(context, n, sizeof *sum.count, &sum.count);
    if (status == SV_OK)
        status = sv_take(context, n, sizeof *sum.sum, &sum.sum);
    if (status == SV_OK)
        status = sv_take(context, n, sizeof *sum.square, &sum.square);
    if (status != SV_OK) {
        sv_site_sum_free(context, &sum);
        return status;
    }
    *ret_sum = sum;
    return SV_OK;
}

void sv_site_sum_free(sv_context *context, sv_site_sum *sum)
{
    sv_give(context, sum->count);
    sv_give(context, sum->sum);
    sv_give(context, sum->square);
    *sum = (sv_site_sum){0};
}

static sv_status other_size(sv_context *context, const sv_site_sum *sum, sv_index n)
{
    return SV_FAIL(context, SV_INVALID_INPUT, "a map of %lld entries cannot take in one of %lld",
                   (long long)sum->n, (long long)n);
}

sv_status sv_site_sum_add(sv_context *context, sv_site_sum *sum, const sv_site_record *record)
{
    if (record->n != 0 && record->n != sum->n)
        return other_size(context, sum, record->n);
    sum->realisations++;
    for (sv_index k = 0; k < record->n; k++) {
        const sv_wide value = record->values[k];
        if (value == SV_SITE_ABSENT)
            continue;
        sum->count[k]++;
        sum->sum[k] += value;
        sum->square[k] += value * value;
    }
    return SV_OK;
}

/* Unsigned, so that sums of a ledger from elsewhere can be wrong but not undefined. */
static sv_wide add_wide(sv_wide a, sv_wide b)
{
    return (sv_wide)((sv_wide_bits)a + (sv_wide_bits)b);
}

sv_status sv_site_sum_join(sv_context *context, sv_site_sum *sum, const sv_site_sum *other)
{
    if (other->n != sum->n)
        return other_size(context, sum, other->n);
    sum->realisations += other->realisations;
    for (sv_index k = 0; k < sum->n; k++) {
        sum->count[k] += other->count[k];
        sum->sum[k] = add_wide(sum->sum[k], other->sum[k]);
        sum->square[k] = add_wide(sum->square[k], other->square[k]);
    }
    return SV_OK;
}

/*
 * With sum = q n + r: Σ(v − sum/n)² = Σ(v − q)² − r²/n. The first term is an integer found exactly
 * (modulo 2^128, and it lies below), so nothing cancels; r < n is small.
 */
sv_moments sv_site_moments(const sv_site_sum *sum, sv_index entry)
{
    const int64_t n = sum->count[entry];
    sv_moments m = {.n = n, .mean = (double)NAN, .standard_error = (double)NAN};
    if (n < 1)
        return m;
    const sv_wide q = sum->sum[entry] / n, r = sum->sum[entry] % n;
    m.mean = ((double)q + (double)r / (double)n) / SCALE;
    if (n < 2)
        return m;
    const sv_wide_bits about_q = (sv_wide_bits)sum->square[entry] -
                                 2 * (sv_wide_bits)q * (sv_wide_bits)sum->sum[entry] +
                                 (sv_wide_bits)n * (sv_wide_bits)q * (sv_wide_bits)q;
    const double squares = (double)(sv_wide)about_q - (double)r * (double)r / (double)n;
    m.deviation = sqrt(fmax(0.0, squares) / (double)(n - 1)) / SCALE;
    m.standard_error = m.deviation / sqrt((double)n);
    return m;
}
