/* SPDX-License-Identifier: GPL-3.0-or-later */
/*
 * Run folders as strangers leave them. An input is a list of edits of a good ledger, so that kept
 * inputs stay good when the layout of the ledger changes:
 *   'b' AAAA N BYTES   overwrite N bytes at A        's' SQL '\n'   run a statement on it
 *   't' AAAA           cut off at A                  'a' N BYTES    append
 *   'j' N N BYTES      a journal beside it           'x' N BYTES    the sheet of the folder
 *   'r' RECORD         put a record by the library   'w'            open it for writing, too
 */
#ifndef SELVEDGE_FUZZ_LEDGERS_H
#define SELVEDGE_FUZZ_LEDGERS_H

#include "fuzz.h"

#include "selvedge/store.h"

enum { FUZZ_POINTS = 2, FUZZ_ROWS = 2 };

/* A run folder and the bytes its ledger should have. */
typedef struct fuzz_ledger {
    char folder[220], ledger[256], journal[256], sheet[256];
    unsigned char *bytes;
    size_t size;
} fuzz_ledger;

/* What a list of edits asks for or may have done. */
typedef struct fuzz_edits {
    bool others; /* there may be rows that are not those of the good ledger */
    bool write;
} fuzz_edits;

/* Call before SQLite is used. */
void fuzz_ledger_begin(void);
sv_run_identity fuzz_identity(void);
/* The good run with rows first … end − 1 of every point; does nothing the second time. */
void fuzz_ledger_make(sv_context *context, fuzz_ledger *l, const char *name, int64_t first,
                      int64_t end);
/* The good run again, and no other ledger or journal in the folder. */
void fuzz_ledger_restore(const fuzz_ledger *l);
fuzz_edits fuzz_ledger_edit(sv_context *context, const fuzz_ledger *l, const uint8_t *data,
                            size_t size);
/* Ends the process unless the record is the one that was written. */
void fuzz_check_record(const sv_record *read);

#endif
