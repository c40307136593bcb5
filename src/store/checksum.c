/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Checksum of a record: SHA-256 over its fields in a fixed little-endian layout. */
#include <math.h>
#include <string.h>

#include "store_internal.h"

enum {
    OUTCOME_BYTES = 8 + 200 + 16 + 12 * 8, /* verdict, two texts, twelve numbers */
    RECORD_BYTES = 7 * 8 + SV_MAX_MARKERS * OUTCOME_BYTES
};

typedef struct pack {
    unsigned char bytes[RECORD_BYTES];
    size_t size;
} pack;

static void add_integer(pack *out, int64_t value)
{
    const uint64_t bits = (uint64_t)value;
    for (int i = 0; i < 8; i++)
        out->bytes[out->size++] = (unsigned char)(bits >> (8 * i));
}

/* All NaN count as one, and -0 as 0: SQLite keeps neither apart. */
static void add_real(pack *out, double value)
{
    uint64_t bits = 0;
    if (isnan(value))
        bits = UINT64_C(0x7ff8000000000000);
    else if (value < 0 || value > 0)
        memcpy(&bits, &value, sizeof bits);
    add_integer(out, (int64_t)bits);
}

/* A text in a field of fixed width, zero-filled. */
static void add_text(pack *out, const char *text, size_t width)
{
    size_t length = strnlen(text, width - 1);
    memset(out->bytes + out->size, 0, width);
    memcpy(out->bytes + out->size, text, length);
    out->size += width;
}

static void add_outcome(pack *out, const sv_outcome *outcome)
{
    add_integer(out, (int64_t)outcome->verdict);
    add_text(out, outcome->reason, sizeof outcome->reason);
    add_text(out, outcome->engine, sizeof outcome->engine);
    add_real(out, outcome->value);
    add_integer(out, outcome->index);
    add_real(out, outcome->numerical_error);
    add_real(out, outcome->estimator_error);
    add_real(out, outcome->margin);
    add_real(out, outcome->weakest);
    add_real(out, outcome->sum_over_sites);
    add_integer(out, outcome->window_cells);
    add_real(out, outcome->highest_occupied);
    add_real(out, outcome->lowest_empty);
    add_integer(out, outcome->electrons);
    add_real(out, outcome->kappa);
}

void sv_record_checksum(const sv_record *record, bool with_seconds, char digest[65])
{
    pack out = {.size = 0};
    add_integer(&out, record->point);
    add_integer(&out, record->realisation);
    add_integer(&out, (int64_t)record->status);
    add_integer(&out, record->sites);
    add_integer(&out, record->vacancies);
    add_real(&out, with_seconds ? record->seconds : 0.0);
    add_integer(&out, record->n_outcomes);
    for (int i = 0; i < record->n_outcomes && i < SV_MAX_MARKERS; i++)
        add_outcome(&out, &record->outcomes[i]);
    sv_digest(out.bytes, out.size, digest);
}
