/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Limits of what a row may say, wider than any physics: what is written keeps to them, and what is
 * read outside of them comes from elsewhere, however well its checksum fits. */
#include <math.h>

#include "store_internal.h"

static bool is_count(int64_t number)
{
    return number >= 0 && number < INT64_C(1) << 48;
}

static bool is_error(double value)
{
    return isnan(value) || value >= 0.0;
}

/* A value that counts must be a number that sums and can be an index. */
static bool outcome_is_sane(const sv_outcome *o)
{
    const double largest = 1e15;
    const bool value = o->verdict != SV_RESOLVED || (o->value > -largest && o->value < largest);
    return o->verdict >= SV_RESOLVED && o->verdict <= SV_FAILED && value &&
           o->index > -(int64_t)largest && o->index < (int64_t)largest &&
           is_error(o->numerical_error) && is_error(o->estimator_error) &&
           is_count(o->window_cells) && (o->electrons == -1 || is_count(o->electrons)) &&
           o->degree >= 0; /* −1 electrons: not counted */
}

bool sv_record_is_sane(const sv_record *record)
{
    bool sane = record->point >= 0 && record->point < SV_MAX_POINTS && record->realisation >= 0 &&
                record->realisation < SV_MAX_REALISATIONS && record->status >= SV_OK &&
                record->status < SV_STATUS_COUNT && is_count(record->sites) &&
                is_count(record->vacancies) && record->n_outcomes >= 0 &&
                record->n_outcomes <= SV_MAX_MARKERS && record->rank >= 0 && record->thread >= 0 &&
                is_error(record->seconds) && is_error(record->processor_seconds) &&
                is_count(record->peak_bytes);
    for (int k = 0; sane && k < record->n_outcomes; k++)
        sane = outcome_is_sane(&record->outcomes[k]);
    return sane;
}
