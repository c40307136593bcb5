/* SPDX-License-Identifier: GPL-3.0-or-later */
/* What the tests of the sheet share: stand-in markers, reading text, looking for a message. */
#ifndef SELVEDGE_SHEET_TESTING_H
#define SELVEDGE_SHEET_TESTING_H

#include "selvedge/sheet.h"
#include "testing.h"

#include <stdlib.h>

/* Marker kinds as the marker layer would announce them. */
static const sv_key local_chern_keys[] = {
    {.name = "window",
     .type = SV_KEY_REAL,
     .low = 0,
     .low_open = true,
     .high = 1,
     .fallback = "0.5",
     .doc = "share of the linear size"},
};
static const sv_key probe_keys[] = {
    {.name = "at",
     .type = SV_KEY_PLACE,
     .dimension = SV_DIM_LENGTH,
     .low = -1e6,
     .high = 1e6,
     .fallback = "centre",
     .doc = "where"},
    {.name = "kappa",
     .type = SV_KEY_AUTO_OR_REAL,
     .low = 0,
     .low_open = true,
     .high = 1e3,
     .fallback = "auto",
     .doc = "scale"},
    {.name = "levels",
     .type = SV_KEY_REAL_LIST,
     .dimension = SV_DIM_ENERGY,
     .low = -9,
     .high = 9,
     .doc = "energies"},
    {.name = "fine", .type = SV_KEY_FLAG, .fallback = "false", .doc = "a switch"},
    {.name = "label", .type = SV_KEY_TEXT, .doc = "a word"},
};
static const sv_kind marker_kinds[] = {
    {"local_chern", "local Chern marker", local_chern_keys, 1},
    {"bott", "Bott index", NULL, 0},
    {"probe", "has a key of every remaining type", probe_keys, 5},
};

/* A sheet, its plain setup and what was said. */
typedef struct reading {
    sv_status status;
    sv_diagnostics said;
    sv_sheet *sheet;
    sv_setup setup;
} reading;

static inline bool is_index_kind(int kind)
{
    return strcmp(marker_kinds[kind].name, "bott") == 0;
}

static inline sv_sheet_options reading_options(const char *const *overrides, int n)
{
    return (sv_sheet_options){.size = sizeof(sv_sheet_options),
                              .overrides = overrides,
                              .n_overrides = n,
                              .markers = marker_kinds,
                              .n_markers = 3,
                              .is_index = is_index_kind};
}

static inline reading read_named(const char *name, const char *text, size_t size,
                                 const sv_sheet_options *options)
{
    reading r = {0};
    sv_context *context = test_context();
    r.status = sv_sheet_parse(context, name, text, size, options, &r.said, &r.sheet);
    if (r.status == SV_OK)
        r.status = sv_sheet_setup(context, r.sheet, NULL, 0, &r.said, &r.setup);
    return r;
}

static inline reading read_with(const char *text, const char *const *overrides, int n)
{
    sv_sheet_options options = reading_options(overrides, n);
    return read_named("sheet.yaml", text, strlen(text), &options);
}

static inline reading read_text(const char *text)
{
    return read_with(text, NULL, 0);
}

static inline void reading_free(reading *r)
{
    sv_setup_free(test_context(), &r->setup);
    sv_sheet_free(test_context(), r->sheet);
    sv_diagnostics_free(test_context(), &r->said);
}

/* The item at a place whose message begins with `message`, or NULL. */
static inline const sv_diagnostic *find_said(const sv_diagnostics *said, int line, int column,
                                             const char *message)
{
    for (sv_index i = 0; i < said->count; i++) {
        const sv_diagnostic *item = &said->items[i];
        if (item->line == line && item->column == column &&
            strncmp(item->message, message, strlen(message)) == 0)
            return item;
    }
    return NULL;
}

static inline void show_said(const sv_diagnostics *said)
{
    for (sv_index i = 0; i < said->count; i++)
        printf("# said %s:%d:%d: %s (%s)\n", said->items[i].file, said->items[i].line,
               said->items[i].column, said->items[i].message,
               said->items[i].hint != NULL ? said->items[i].hint : "");
}

/* Fails the running test unless the sheet was read. */
static inline bool is_read(const reading *r)
{
    bool good = CHECK(r->status == SV_OK);
    if (!good)
        show_said(&r->said);
    return good;
}

/* Fails the running test unless the sheet was refused with this message. */
static inline bool is_refused(const reading *r, int line, int column, const char *message)
{
    bool good = CHECK(r->status == SV_INVALID_INPUT) &&
                test_check(find_said(&r->said, line, column, message) != NULL, __FILE__, __LINE__,
                           "not said: %d:%d: %s", line, column, message);
    if (!good)
        show_said(&r->said);
    return good;
}

#define MODEL "selvedge: 1\nmodel: {name: qi_wu_zhang, m: -1}\n"
#define FILM  "selvedge: 1\nmodel: {name: qi_wu_zhang, m: -1, lattice_constant: 0.5 nm}\n"
#define FLAKE "flake: {shape: rectangle, cells: [6, 4]}\n"

#endif
