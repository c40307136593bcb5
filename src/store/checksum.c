/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Checksums of rows: SHA-256 over their fields in a fixed little-endian layout. */
#include <math.h>
#include <string.h>

#include "store_internal.h"

enum {
    TEXT_BYTES = 8 + SV_PLAIN_BYTES,
    OUTCOME_BYTES = 2 * TEXT_BYTES + 14 * 8,
    RECORD_BYTES = 6 * 8 + SV_MAX_MARKERS * OUTCOME_BYTES
};

typedef struct pack {
    unsigned char *bytes;
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

/* Length and bytes, as the ledger keeps it. */
static void add_text(pack *out, const char *text)
{
    char plain[SV_PLAIN_BYTES];
    const size_t length = sv_text_plain(text, plain, sizeof plain);
    add_integer(out, (int64_t)length);
    memcpy(out->bytes + out->size, plain, length);
    out->size += length;
}

static void add_outcome(pack *out, const sv_outcome *outcome)
{
    add_integer(out, (int64_t)outcome->verdict);
    add_text(out, outcome->reason);
    add_text(out, outcome->engine);
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
    add_integer(out, outcome->degree);
}

void sv_record_checksum(const sv_record *record, char digest[65])
{
    unsigned char bytes[RECORD_BYTES];
    pack out = {.bytes = bytes};
    add_integer(&out, record->point);
    add_integer(&out, record->realisation);
    add_integer(&out, (int64_t)record->status);
    add_integer(&out, record->sites);
    add_integer(&out, record->vacancies);
    add_integer(&out, record->n_outcomes);
    for (int i = 0; i < record->n_outcomes && i < SV_MAX_MARKERS; i++)
        add_outcome(&out, &record->outcomes[i]);
    sv_digest(out.bytes, out.size, digest);
}

/* Sixteen digits are enough against accidents, which is all a checksum in the file can do. */
static void shorten(pack *out, char digest[17])
{
    char whole[65];
    sv_digest(out->bytes, out->size, whole);
    memcpy(digest, whole, 16);
    digest[16] = '\0';
}

void sv_cost_checksum(const sv_record *record, int64_t event, char digest[17])
{
    unsigned char bytes[8 * 8 + TEXT_BYTES];
    pack out = {.bytes = bytes};
    add_integer(&out, record->point);
    add_integer(&out, record->realisation);
    add_integer(&out, event);
    add_text(&out, record->host);
    add_integer(&out, record->rank);
    add_integer(&out, record->thread);
    add_real(&out, record->seconds);
    add_real(&out, record->processor_seconds);
    add_integer(&out, record->peak_bytes);
    shorten(&out, digest);
}

void sv_texts_checksum(const char *const *texts, int count, const int64_t *numbers, int n_numbers,
                       char digest[17])
{
    char parts[65 * SV_MAX_FIELDS + 1] = "", line[65];
    for (int i = 0; i < count; i++) {
        sv_digest(texts[i], strlen(texts[i]), line);
        memcpy(parts + 64 * (size_t)i, line, 65);
    }
    unsigned char bytes[64 * SV_MAX_FIELDS + 8 * SV_MAX_FIELDS];
    pack out = {.bytes = bytes, .size = 64 * (size_t)count};
    memcpy(bytes, parts, out.size);
    for (int i = 0; i < n_numbers; i++)
        add_integer(&out, numbers[i]);
    shorten(&out, digest);
}
