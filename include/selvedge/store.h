/* SPDX-License-Identifier: GPL-3.0-or-later */
/**
 * @file store.h
 * Layer 8: the run folder and its ledger. One writer per folder.
 *
 * Layout: sheet.resolved.yaml · ledger.sqlite · points.csv · summary.json · inputs/ (copies of
 * the files the sheet names) · figures/ (written by the report).
 */
#ifndef SELVEDGE_STORE_H
#define SELVEDGE_STORE_H

#include "ensemble.h"

#ifdef __cplusplus
extern "C" {
#endif

typedef struct sv_run sv_run;

/** A file to keep a copy of in the run folder. */
typedef struct sv_run_input {
    const char *path;   /**< to read */
    const char *name;   /**< name inside inputs/, no slashes */
    const char *digest; /**< SHA-256 it must have */
} sv_run_input;

/** What a run is. Texts are borrowed for the call. */
typedef struct sv_run_identity {
    const char *identity;       /**< canonical text; its SHA-256 names the run */
    const char *resolved_sheet; /**< written to sheet.resolved.yaml */
    const char *program_version;
    const char *kernel; /**< arithmetic kernel (BLAS kind, threading, core) */
    const sv_run_input *inputs;
    int n_inputs;
    /* Of this writing, for the event that begins it; no part of the identity. */
    const char *command_line;   /**< or NULL */
    const char *libraries;      /**< versions of those besides SQLite, one line, or NULL */
    int threads, ranks;         /**< at work; 0: not known */
    const char *const *markers; /**< names in the order of the outcomes of a record; NULL: not
                                     known, then rows carry positions only */
    int n_markers;
    int32_t n_points;     /**< of the sweep, 1 without one; 0: not known */
    int64_t realisations; /**< per point asked for; a note, no part of the identity; 0: not known */
    int32_t task, tasks;  /**< the part of task `task` (from 1) of `tasks`; 0 of 0: the whole run.
                               The folder of one task refuses another task */
} sv_run_identity;

/**
 * Opens a run folder for writing, making it if needed, and locks it.
 * A folder without a complete resolved sheet counts as new. A run of another identity is refused
 * with SV_OTHER_RUN, naming what differs, unless `force`: then the change is recorded as an event;
 * under another version or kernel the rows go on (their shape must match), under another sheet
 * the old ledger is kept aside and the run starts over.
 * @return SV_STORAGE for anything that cannot be written, is locked by another process, or is
 *         damaged
 */
SV_API SV_MUST_USE sv_status sv_run_open(sv_context *context, const char *folder,
                                         const sv_run_identity *identity, bool force,
                                         sv_run **ret_run);
/** Opens an existing run for reading only; takes no lock and writes nothing. */
SV_API SV_MUST_USE sv_status sv_run_open_read(sv_context *context, const char *folder,
                                              sv_run **ret_run);
/** Closes; records the event `end`. NULL is allowed. */
SV_API void sv_run_close(sv_context *context, sv_run *run);

/**
 * Appends one realisation, durable when it returns (sv_sink.put with user = sv_run). With
 * record->maps its values go into the sums of the maps in the same transaction: the sums hold
 * exactly the realisations the ledger has, after any interruption.
 */
SV_API SV_MUST_USE sv_status sv_run_put(sv_context *context, const sv_record *record, void *run);
/** Appends several in one transaction: all durable when it returns, or none (sv_sink.put_many). */
SV_API SV_MUST_USE sv_status sv_run_put_many(sv_context *context, const sv_record *records, int n,
                                             void *run);
/** Reads every realisation that fits the ensemble (point, realisation in range). */
SV_API SV_MUST_USE sv_status sv_run_load(sv_context *context, sv_run *run, sv_ensemble *ensemble,
                                         sv_index *ret_loaded);
/** Largest realisation number present plus one, over all points (0: none). */
SV_API SV_MUST_USE sv_status sv_run_extent(sv_context *context, sv_run *run,
                                           int64_t *ret_realisations, int32_t *ret_points);
/**
 * The maps of a point: exact sums over its realisations 0 … counted−1. Kept as one row per
 * realisation (8 bytes an entry) until 64 of them that follow each other count for good; then one
 * sum (36 bytes an entry) replaces them, 64 such sums become one, and so on: up to 10^6
 * realisations at most about 7.5 kB an entry.
 * @param entries  sv_site_entries() of the flake
 * @param[out] ret_sum  its `realisations` may be below `counted` by up to a block, when a stop rule
 * has been tightened since those were joined
 * @return SV_STORAGE when a row is damaged or of another flake
 */
SV_API SV_MUST_USE sv_status sv_run_load_sites(sv_context *context, sv_run *run, int32_t point,
                                               int64_t counted, sv_index entries,
                                               sv_site_sum *ret_sum);
/** Joins what counts for good, as sv_run_put() does by itself in an uninterrupted run. */
SV_API SV_MUST_USE sv_status sv_run_fold_sites(sv_context *context, sv_run *run, int32_t point,
                                               int64_t counted);
/** Do the sums of the maps hold as many realisations as there are? @return SV_STORAGE if not */
SV_API SV_MUST_USE sv_status sv_run_check_sites(sv_context *context, sv_run *run);
/**
 * Records an event with a note. The store itself records `start`, `continue`, `end`, `identity
 * change`, and `lost` for a writing that left no end (SIGKILL, power); the caller what else
 * happens, such as `stop` with its cause.
 */
SV_API SV_MUST_USE sv_status sv_run_event(sv_context *context, sv_run *run, const char *what,
                                          const char *note);

/** One event of a run. Texts are one line of UTF-8 without control characters. */
typedef struct sv_run_happening {
    int64_t number, session; /**< session: number of the start or continue it belongs to */
    char *time;              /**< UTC, 2026-11-30T12:00:00Z */
    char *what, *note;
    /* Of start and continue only, else empty and 0. */
    char *command_line, *version, *kernel, *libraries, *host;
    int64_t process, threads, ranks;
} sv_run_happening;

/** Provenance: all events in order. */
typedef struct sv_run_history {
    sv_run_happening *events;
    sv_index n;
} sv_run_history;

/** Reads all events. @return SV_STORAGE when one is not as it was written */
SV_API SV_MUST_USE sv_status sv_run_history_read(sv_context *context, sv_run *run,
                                                 sv_run_history *ret_history);
/** Gives it back; safe on a zeroed history and twice. */
SV_API void sv_run_history_free(sv_context *context, sv_run_history *history);

/** An engine that computed outcomes of a marker. */
typedef struct sv_engine_use {
    char name[16];
    int64_t count;
    int32_t degrees[2]; /**< lowest and highest; 0: none */
} sv_engine_use;

enum { SV_HEALTH_ENGINES = 4 };

/** Numerical health of one marker over all rows of a run. */
typedef struct sv_marker_health {
    char marker[64];        /**< name; empty: not known */
    int64_t verdicts[4];    /**< by sv_verdict */
    double numerical_error; /**< largest stated by a resolved outcome; NaN: none is */
    int32_t worst_point;    /**< where */
    int64_t worst_realisation;
    sv_engine_use engines[SV_HEALTH_ENGINES];
    int n_engines;
} sv_marker_health;

/** What one process computed. */
typedef struct sv_worker_cost {
    char host[64]; /**< empty: not known, or one of too many */
    int32_t rank;
    int64_t realisations, peak_bytes;
    double seconds, processor_seconds;
} sv_worker_cost;

/** Health and cost of a run. */
typedef struct sv_run_health {
    int64_t realisations; /**< rows, over all points */
    int64_t failed;       /**< of them as a whole */
    sv_marker_health markers[SV_MAX_MARKERS];
    int n_markers;
    double seconds, processor_seconds; /**< sums over realisations */
    double longest;                    /**< seconds of the longest one */
    int32_t longest_point;
    int64_t longest_realisation, peak_bytes;
    sv_worker_cost *workers; /**< in the order of their first row */
    sv_index n_workers;
} sv_run_health;

/** Reads every row with its checksums and adds up. @return SV_STORAGE for damage */
SV_API SV_MUST_USE sv_status sv_run_health_read(sv_context *context, sv_run *run,
                                                sv_run_health *ret_health);
/** Gives it back; safe on a zeroed health and twice. */
SV_API void sv_run_health_free(sv_context *context, sv_run_health *health);
/**
 * Value of a meta key, or NULL: "identity" (canonical text), "identity_digest", "program_version",
 * "kernel", "sheet" (resolved sheet), "sheet_digest", "markers", "points", "realisations", "task".
 */
SV_API const char *sv_run_meta(const sv_run *run, const char *key);

/* ------------------------------------------------------------------- merging */

/** Which part of a run a folder holds: task of tasks, from 1; 0 of 0 for a whole run. */
SV_API void sv_run_task(const sv_run *run, int32_t *ret_task, int32_t *ret_tasks);

/** What a number of run folders hold together. */
typedef struct sv_merge_survey {
    int64_t rows;         /**< realisations, counted in every folder */
    int64_t distinct;     /**< of them with different numbers */
    int64_t extent;       /**< largest realisation number plus one */
    int64_t realisations; /**< most that any folder was asked for, per point; 0: none says */
    int32_t tasks; /**< parts all folders agree on; 0: no folder is a part, −1: they differ */
} sv_merge_survey;

/**
 * Reads every row of every folder with its checksum, compares what is there twice (times apart),
 * and writes nothing. The folders may come from elsewhere: their ledgers are checked as
 * sv_run_open_read() does, and none is followed out of itself. They must be of one run: the same
 * sheet, inputs, version and arithmetic kernel.
 * Memory: 56 bytes a row.
 * @param folders  n ≥ 1 paths; the first one says which run it is
 * @return SV_OTHER_RUN naming what differs; SV_STORAGE for damage; SV_UNDECIDED when a realisation
 * has other numbers in another folder: something is not reproducible; SV_INTERRUPTED
 */
SV_API SV_MUST_USE sv_status sv_run_survey(sv_context *context, const char *const *folders, int n,
                                           sv_merge_survey *ret_survey);
/**
 * Puts the rows of the shards into a run of the same identity, in one transaction: all or none.
 * Rows that are there already must be the same bit for bit (times apart). Any order, any number of
 * times. An event notes each shard.
 * @return as sv_run_survey(); SV_STORAGE also for a row that differs from the run's
 */
SV_API SV_MUST_USE sv_status sv_run_merge(sv_context *context, sv_run *run,
                                          const char *const *shards, int n, int64_t *ret_added,
                                          int64_t *ret_present);

/** Writes a file of the run folder whole or not at all (temporary, fsync, rename). */
SV_API SV_MUST_USE sv_status sv_write_file(sv_context *context, const char *path, const char *text,
                                           size_t size);
/** Path of a file inside the run folder. @param[out] path at least `size` bytes */
SV_API SV_MUST_USE sv_status sv_run_path(sv_context *context, const sv_run *run, const char *name,
                                         char *path, size_t size);

#ifdef __cplusplus
}
#endif
#endif
