/* SPDX-License-Identifier: GPL-3.0-or-later */
/* What the targets that read sheets share. FUZZ_FILES is a folder of files a sheet may name. */
#ifndef SELVEDGE_FUZZ_SHEETS_H
#define SELVEDGE_FUZZ_SHEETS_H

#include "fuzz.h"

#include "selvedge/marker.h"
#include "selvedge/sheet.h"

enum { FUZZ_MOST_MARKERS = 32 };

/* A sheet, its plain setup and what was said. */
typedef struct fuzz_reading {
    sv_status status;
    sv_diagnostics said;
    sv_sheet *sheet;
    sv_setup setup;
} fuzz_reading;

/* Reads as the program would, in a folder that is not trusted. */
static inline fuzz_reading fuzz_read_sheet(sv_context *context, const char *text, size_t size,
                                           const char *const *overrides, int n_overrides)
{
    static sv_kind kinds[FUZZ_MOST_MARKERS]; /* a sheet borrows them */
    int n = 0;
    const sv_marker *table = sv_marker_table(&n);
    fuzz_require(n <= FUZZ_MOST_MARKERS, "%d markers", n);
    for (int k = 0; k < n; k++)
        kinds[k] = table[k].kind;
    const sv_sheet_options options = {.size = sizeof options,
                                      .overrides = overrides,
                                      .n_overrides = n_overrides,
                                      .markers = kinds,
                                      .n_markers = n,
                                      .confined = true,
                                      .check_marker = sv_marker_check};
    fuzz_reading r = {0};
    r.status =
        sv_sheet_parse(context, FUZZ_FILES "/sheet.yaml", text, size, &options, &r.said, &r.sheet);
    if (r.status == SV_OK)
        r.status = sv_sheet_setup(context, r.sheet, NULL, 0, &r.said, &r.setup);
    fuzz_require(r.status == SV_OK || r.status == SV_NO_MEMORY ||
                     (r.status == SV_INVALID_INPUT && r.said.errors > 0),
                 "refused without a diagnostic: %s", sv_status_text(r.status));
    return r;
}

static inline void fuzz_reading_free(sv_context *context, fuzz_reading *r)
{
    sv_setup_free(context, &r->setup);
    sv_sheet_free(context, r->sheet);
    sv_diagnostics_free(context, &r->said);
}

/* Messages go to a terminal, whatever the sheet says. */
static inline void fuzz_check_words(const sv_diagnostics *said)
{
    char *text = NULL;
    size_t size = 0;
    FILE *stream = open_memstream(&text, &size);
    fuzz_require(stream != NULL, "no memory stream");
    sv_diagnostics_print(said, false, stream);
    fclose(stream);
    for (size_t i = 0; i < size; i++) {
        const unsigned char c = (unsigned char)text[i];
        fuzz_require(c == '\n' || (c >= 0x20 && c != 0x7f), "a message holds the byte %02x:\n%s", c,
                     text);
    }
    free(text);
}

#endif
