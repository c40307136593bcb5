/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Parts of the store shared by its files. */
#ifndef SELVEDGE_STORE_INTERNAL_H
#define SELVEDGE_STORE_INTERNAL_H

#include <sqlite3.h>

#include "selvedge/store.h"

#define SV_SHEET_NAME   "sheet.resolved.yaml"
#define SV_LEDGER_NAME  "ledger.sqlite"
#define SV_JOURNAL_NAME "ledger.sqlite-journal"
#define SV_LOCK_NAME    ".lock"
#define SV_INPUTS_NAME  "inputs"
#define SV_ASIDE_PREFIX "ledger.old-"

enum {
    SV_PATH_SIZE = 4096,
    SV_MAX_META = 64,
    SV_MARKER_NAME_SIZE = 64,
    /* A ledger row never needs more; guards against huge values in a file from elsewhere. */
    SV_MAX_POINTS = 1 << 20,
    SV_MAX_TEXT_BYTES = 1 << 24,
    SV_MAX_TASKS = 1 << 20,
    SV_PLAIN_BYTES = 256, /* a reason, an engine, a host */
    SV_NOTE_BYTES = 4096, /* a text of an event */
    SV_MAX_FIELDS = 16    /* of one checksum */
};
#define SV_MAX_REALISATIONS (INT64_C(1) << 40)

typedef struct sv_meta {
    char *key, *value;
} sv_meta;

struct sv_run {
    char *folder;
    sqlite3 *ledger;
    int lock; /* descriptor that holds the lock, or -1 */
    bool writing;
    int64_t session; /* number of the event that began this writing */
    sv_meta meta[SV_MAX_META];
    int n_meta;
    int n_markers;    /* -1: unknown */
    int32_t n_points; /* 0: unknown */
    char markers[SV_MAX_MARKERS][SV_MARKER_NAME_SIZE];
    sqlite3_stmt *put_row, *put_cost, *put_outcome, *get_row, *get_outcome;
};

/* file.c */
sv_status sv_join_path(sv_context *context, const char *folder, const char *name, char *path,
                       size_t size);
sv_status sv_make_folder(sv_context *context, const char *path);
sv_status sv_copy_inputs(sv_context *context, const char *folder, const sv_run_input *inputs,
                         int n_inputs);

/* folder.c */
typedef enum sv_folder_kind { SV_FOLDER_EMPTY, SV_FOLDER_RUN, SV_FOLDER_FOREIGN } sv_folder_kind;
sv_status sv_folder_look(sv_context *context, const char *folder, sv_folder_kind *ret_kind,
                         char foreign[256]);
void sv_folder_sweep(const char *folder);
sv_status sv_folder_lock(sv_context *context, const char *folder, int *ret_lock);
void sv_folder_unlock(int lock);

/* schema.c */
sv_status sv_schema_create(sv_context *context, sv_run *run);
sv_status sv_schema_check(sv_context *context, sv_run *run);

/* ledger.c */
sv_status sv_ledger_fail(sv_context *context, const sv_run *run, const char *what);
sv_status sv_ledger_execute(sv_context *context, sv_run *run, const char *sql);
sv_status sv_ledger_prepare(sv_context *context, sv_run *run, const char *sql,
                            sqlite3_stmt **ret_statement);
sv_status sv_ledger_create(sv_context *context, sv_run *run);
sv_status sv_ledger_open(sv_context *context, sv_run *run);
sv_status sv_ledger_open_read(sv_context *context, sv_run *run);
void sv_ledger_close(sv_run *run);

/* meta.c */
sv_status sv_meta_load(sv_context *context, sv_run *run);
sv_status sv_meta_set(sv_context *context, sv_run *run, const char *key, const char *value);
void sv_meta_free(sv_context *context, sv_run *run);
sv_status sv_meta_set_shape(sv_context *context, sv_run *run, const sv_run_identity *identity);
sv_status sv_meta_read_shape(sv_context *context, sv_run *run);

/* event.c */
/* `session` describes the process when the event begins its writing; NULL for any other. */
sv_status sv_event_add(sv_context *context, sv_run *run, const char *what, const char *note,
                       const sv_run_identity *session, int64_t *ret_number);
/* A writing that left no end is noted before the next one begins. */
sv_status sv_event_close_lost(sv_context *context, sv_run *run);

/* run.c */
sv_status sv_run_new(sv_context *context, const char *folder, bool writing, sv_run **ret_run);
void sv_run_free(sv_context *context, sv_run *run);

/* start.c */
sv_status sv_session_write_sheet(sv_context *context, const sv_run *run,
                                 const sv_run_identity *identity);
sv_status sv_session_begin(sv_context *context, sv_run *run, const sv_run_identity *identity,
                           const char *what, bool create);
sv_status sv_session_start(sv_context *context, sv_run *run, const sv_run_identity *identity);

/* resume.c */
sv_status sv_session_start_or_resume(sv_context *context, sv_run *run,
                                     const sv_run_identity *identity, bool force);
sv_status sv_session_check_sheet(sv_context *context, const sv_run *run);

/* identity.c */
void sv_identity_digest(sv_context *context, const sv_run_identity *identity, char digest[65]);
void sv_identity_difference(const sv_run *run, const sv_run_identity *identity, char *text,
                            size_t size);

/* read.c */
sv_status sv_record_read(sv_context *context, sv_run *run, int32_t point, int64_t realisation,
                         sv_record *ret_record, bool *ret_found);

/* put.c */
sv_status sv_put_prepare(sv_context *context, sv_run *run);
/* Inserts inside a transaction; a realisation that is there must have the same numbers. */
sv_status sv_record_insert(sv_context *context, sv_run *run, const sv_record *record,
                           bool *ret_new);
void sv_record_difference(const sv_record *was, const sv_record *is, char *text, size_t size);

/* range.c */
bool sv_record_is_sane(const sv_record *record);

/* site_pack.c: the maps as bytes. The unpackers add to a sum; false: no such bytes can be. */
enum { SV_SITE_SUM_BYTES = 36 };
void sv_site_pack_values(const sv_site_record *record, unsigned char *bytes);
void sv_site_pack_sums(const sv_site_sum *sum, unsigned char *bytes);
bool sv_site_unpack_values(const unsigned char *bytes, size_t size, sv_site_sum *sum);
bool sv_site_unpack_sums(const unsigned char *bytes, size_t size, int64_t most, sv_site_sum *sum);

/* site.c: both inside a transaction of the caller */
typedef struct sv_site_place {
    int32_t point;
    int level;
    int64_t block;
} sv_site_place;
sv_status sv_site_put(sv_context *context, sv_run *run, int32_t point, int64_t realisation,
                      const sv_site_record *record);
sv_status sv_site_fold(sv_context *context, sv_run *run, int32_t point, int64_t counted);
enum { SV_SITE_HEAD_BYTES = 24 };
/* The data of a row behind SV_SITE_HEAD_BYTES of room, its checksum looked at; *ret_bytes stays
 * NULL when there is no such row. */
sv_status sv_site_get_row(sv_context *context, sv_run *run, const sv_site_place *at,
                          unsigned char **ret_bytes, size_t *ret_size);
/* Writes a row; fills the room before its data. */
sv_status sv_site_put_row(sv_context *context, sv_run *run, const sv_site_place *at,
                          unsigned char *bytes, size_t size);
/* Takes off the 64 rows that a row above them holds. @param first of the lower level */
sv_status sv_site_drop_rows(sv_context *context, sv_run *run, const sv_site_place *first);
/* site_merge.c: the sums of a shard into those of a run, in a transaction of the caller */
sv_status sv_site_merge(sv_context *context, sv_run *from, sv_run *run);
/* sv_run_check_sites() where a run has sums at all. */
sv_status sv_site_check_joined(sv_context *context, sv_run *run);

/* checksum.c */
void sv_record_checksum(const sv_record *record, char digest[65]);
void sv_cost_checksum(const sv_record *record, int64_t event, char digest[17]);
void sv_texts_checksum(const char *const *texts, int count, const int64_t *numbers, int n_numbers,
                       char digest[17]);

/* text.c */
/* One line of well-formed UTF-8: '?' for what is neither. Cut where it does not fit; returns its
 * length. */
size_t sv_text_plain(const char *text, char *plain, size_t size);
/* Is it that already? With `lines` new lines, tabs and marks of direction may stand in it. */
bool sv_text_is_plain(const char *text, size_t length, bool lines);

#endif
