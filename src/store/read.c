/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Reading realisations back, with their checksums. */
#include <math.h>
#include <string.h>

#include "store_internal.h"

static const char row_sql[] =
    "SELECT r.status, r.sites, r.vacancies, r.outcomes, r.checksum, c.event, c.host, c.rank, "
    "c.thread, c.seconds, c.processor_seconds, c.peak_bytes, c.checksum FROM realisation r "
    "LEFT JOIN cost c ON c.point = r.point AND c.realisation = r.realisation "
    "WHERE r.point = ?1 AND r.realisation = ?2";
static const char outcome_sql[] =
    "SELECT position, marker, verdict, reason, engine, value, idx, numerical_error, "
    "estimator_error, margin, weakest, sum_over_sites, window_cells, highest_occupied, "
    "lowest_empty, electrons, kappa, degree FROM outcome WHERE point = ?1 AND realisation = ?2 "
    "ORDER BY "
    "position";

static double real_at(sqlite3_stmt *row, int column)
{
    if (sqlite3_column_type(row, column) == SQLITE_NULL)
        return (double)NAN;
    return sqlite3_column_double(row, column);
}

/* A bounded copy; false when the text is missing, too long, or not fit to be shown. */
static bool text_at(sqlite3_stmt *row, int column, char *text, size_t size)
{
    const char *value = (const char *)sqlite3_column_text(row, column);
    const int bytes = sqlite3_column_bytes(row, column);
    if (value == NULL || bytes < 0 || (size_t)bytes >= size ||
        !sv_text_is_plain(value, (size_t)bytes, false))
        return false;
    memcpy(text, value, (size_t)bytes + 1);
    return true;
}

static sv_status damaged(sv_context *context, const sv_run *run, int32_t point, int64_t realisation,
                         const char *what)
{
    return SV_FAIL(context, SV_STORAGE, "%s/%s: realisation %lld of point %ld is damaged: %s",
                   run->folder, SV_LEDGER_NAME, (long long)realisation, (long)point, what);
}

static bool read_outcome(sqlite3_stmt *row, sv_outcome *outcome)
{
    *outcome = (sv_outcome){.unresolved_within = (double)NAN, .nearest_level = (double)NAN};
    const sqlite3_int64 verdict = sqlite3_column_int64(row, 2);
    const sqlite3_int64 degree = sqlite3_column_int64(row, 17);
    if (verdict < SV_RESOLVED || verdict > SV_FAILED || degree < 0 || degree > INT32_MAX ||
        !text_at(row, 3, outcome->reason, sizeof outcome->reason) ||
        !text_at(row, 4, outcome->engine, sizeof outcome->engine))
        return false;
    outcome->verdict = (sv_verdict)verdict;
    outcome->value = real_at(row, 5);
    outcome->index = sqlite3_column_int64(row, 6);
    outcome->numerical_error = real_at(row, 7);
    outcome->estimator_error = real_at(row, 8);
    outcome->margin = real_at(row, 9);
    outcome->weakest = real_at(row, 10);
    outcome->sum_over_sites = real_at(row, 11);
    outcome->window_cells = sqlite3_column_int64(row, 12);
    outcome->highest_occupied = real_at(row, 13);
    outcome->lowest_empty = real_at(row, 14);
    outcome->electrons = sqlite3_column_int64(row, 15);
    outcome->kappa = real_at(row, 16);
    outcome->degree = (int32_t)degree;
    return true;
}

/* What the realisation cost; false when it is not there or not as it was written. */
static bool read_cost(sqlite3_stmt *row, sv_record *record)
{
    char digest[17], expected[17];
    const sqlite3_int64 rank = sqlite3_column_int64(row, 7), thread = sqlite3_column_int64(row, 8);
    if (!text_at(row, 6, record->host, sizeof record->host) ||
        !text_at(row, 12, digest, sizeof digest) || rank < 0 || rank > INT32_MAX || thread < 0 ||
        thread > INT32_MAX)
        return false;
    record->rank = (int32_t)rank;
    record->thread = (int32_t)thread;
    record->seconds = real_at(row, 9);
    record->processor_seconds = real_at(row, 10);
    record->peak_bytes = sqlite3_column_int64(row, 11);
    sv_cost_checksum(record, sqlite3_column_int64(row, 5), expected);
    return strcmp(digest, expected) == 0;
}

/* The head of the record and its cost; the checksum it should have goes to `digest`. */
static sv_status read_row(sv_context *context, sv_run *run, sv_record *record, char digest[65],
                          bool *ret_found)
{
    sqlite3_stmt *row = run->get_row;
    const int code = sqlite3_step(row);
    *ret_found = code == SQLITE_ROW;
    if (code == SQLITE_DONE)
        return SV_OK;
    if (code != SQLITE_ROW)
        return sv_ledger_fail(context, run, "read");
    const sqlite3_int64 state = sqlite3_column_int64(row, 0), count = sqlite3_column_int64(row, 3);
    record->sites = sqlite3_column_int64(row, 1);
    record->vacancies = sqlite3_column_int64(row, 2);
    if (state < 0 || state >= SV_STATUS_COUNT || count < 0 || count > SV_MAX_MARKERS ||
        !text_at(row, 4, digest, 65))
        return damaged(context, run, record->point, record->realisation, "a value out of range");
    if (!read_cost(row, record))
        return damaged(context, run, record->point, record->realisation,
                       "its cost is missing or has another checksum");
    record->status = (sv_status)state;
    record->n_outcomes = (int32_t)count;
    return SV_OK;
}

static sv_status read_outcomes(sv_context *context, sv_run *run, sv_record *record)
{
    sqlite3_stmt *row = run->get_outcome;
    int code, count = 0;
    while ((code = sqlite3_step(row)) == SQLITE_ROW) {
        char name[SV_MARKER_NAME_SIZE];
        if (count >= record->n_outcomes || sqlite3_column_int64(row, 0) != count ||
            !text_at(row, 1, name, sizeof name) ||
            (run->n_markers >= 0 &&
             (count >= run->n_markers || strcmp(name, run->markers[count]) != 0)) ||
            !read_outcome(row, &record->outcomes[count]))
            return damaged(context, run, record->point, record->realisation,
                           "an outcome is out of place or out of range");
        count++;
    }
    if (code != SQLITE_DONE)
        return sv_ledger_fail(context, run, "read");
    if (count != record->n_outcomes)
        return damaged(context, run, record->point, record->realisation, "outcomes are missing");
    return SV_OK;
}

static sv_status bind_key(sv_context *context, sv_run *run, sqlite3_stmt *statement, int32_t point,
                          int64_t realisation)
{
    if (sqlite3_bind_int64(statement, 1, point) != SQLITE_OK ||
        sqlite3_bind_int64(statement, 2, realisation) != SQLITE_OK)
        return sv_ledger_fail(context, run, "read");
    return SV_OK;
}

static sv_status prepare_reading(sv_context *context, sv_run *run)
{
    sv_status status = SV_OK;
    if (run->get_row == NULL)
        status = sv_ledger_prepare(context, run, row_sql, &run->get_row);
    if (status == SV_OK && run->get_outcome == NULL)
        status = sv_ledger_prepare(context, run, outcome_sql, &run->get_outcome);
    return status;
}

sv_status sv_record_read(sv_context *context, sv_run *run, int32_t point, int64_t realisation,
                         sv_record *ret_record, bool *ret_found)
{
    sv_record record;
    char digest[65] = "", expected[65];
    bool found = false;
    memset(&record, 0, sizeof record);
    record.point = point;
    record.realisation = realisation;
    sv_status status = prepare_reading(context, run);
    if (status == SV_OK)
        status = bind_key(context, run, run->get_row, point, realisation);
    if (status == SV_OK)
        status = bind_key(context, run, run->get_outcome, point, realisation);
    if (status == SV_OK)
        status = read_row(context, run, &record, digest, &found);
    if (status == SV_OK && found)
        status = read_outcomes(context, run, &record);
    if (run->get_row != NULL)
        sqlite3_reset(run->get_row);
    if (run->get_outcome != NULL)
        sqlite3_reset(run->get_outcome);
    if (status == SV_OK && found) {
        sv_record_checksum(&record, expected);
        if (strcmp(digest, expected) != 0)
            status = damaged(context, run, point, realisation, "its checksum does not fit");
        else if (!sv_record_is_sane(&record))
            status = damaged(context, run, point, realisation, "a value out of range");
    }
    if (status != SV_OK)
        return status;
    *ret_found = found;
    if (found)
        *ret_record = record;
    return SV_OK;
}

/* Loads the rows the key statement names; it yields (point, realisation). */
static sv_status load_rows(sv_context *context, sv_run *run, sqlite3_stmt *keys,
                           sv_ensemble *ensemble, sv_index *loaded)
{
    int code;
    while ((code = sqlite3_step(keys)) == SQLITE_ROW) {
        const sqlite3_int64 point = sqlite3_column_int64(keys, 0);
        const sqlite3_int64 realisation = sqlite3_column_int64(keys, 1);
        if (point < 0 || realisation < 0)
            return SV_FAIL(context, SV_STORAGE, "%s/%s holds a row with a negative number",
                           run->folder, SV_LEDGER_NAME);
        if (point >= ensemble->n_points || realisation >= ensemble->realisations)
            continue;
        sv_record record;
        bool found = false;
        sv_status status =
            sv_record_read(context, run, (int32_t)point, realisation, &record, &found);
        if (status == SV_OK && !found)
            status = damaged(context, run, (int32_t)point, realisation, "it cannot be found");
        else if (status == SV_OK && record.n_outcomes > ensemble->n_markers)
            status = damaged(context, run, (int32_t)point, realisation,
                             "it has more markers than the run");
        if (status == SV_OK)
            status = sv_ensemble_put(context, ensemble, &record);
        if (status != SV_OK)
            return status;
        (*loaded)++;
    }
    return code == SQLITE_DONE ? SV_OK : sv_ledger_fail(context, run, "read");
}

sv_status sv_run_load(sv_context *context, sv_run *run, sv_ensemble *ensemble, sv_index *ret_loaded)
{
    sqlite3_stmt *keys = NULL;
    sv_index loaded = 0;
    /* One transaction: a ledger that is being written looks frozen meanwhile. */
    sv_status status = sv_ledger_execute(context, run, "BEGIN");
    if (status != SV_OK)
        return status;
    status = sv_ledger_prepare(context, run,
                               "SELECT point, realisation FROM realisation "
                               "ORDER BY point, realisation",
                               &keys);
    if (status == SV_OK)
        status = load_rows(context, run, keys, ensemble, &loaded);
    sqlite3_finalize(keys);
    sqlite3_exec(run->ledger, "COMMIT", NULL, NULL, NULL);
    if (status == SV_OK)
        *ret_loaded = loaded;
    return status;
}

sv_status sv_run_extent(sv_context *context, sv_run *run, int64_t *ret_realisations,
                        int32_t *ret_points)
{
    sqlite3_stmt *statement = NULL;
    sv_status status = sv_ledger_prepare(
        context, run, "SELECT max(realisation), max(point) FROM realisation", &statement);
    if (status == SV_OK && sqlite3_step(statement) != SQLITE_ROW)
        status = sv_ledger_fail(context, run, "read");
    if (status == SV_OK && sqlite3_column_type(statement, 0) == SQLITE_NULL) {
        *ret_realisations = 0;
        *ret_points = 0;
    } else if (status == SV_OK) {
        const sqlite3_int64 realisation = sqlite3_column_int64(statement, 0);
        const sqlite3_int64 point = sqlite3_column_int64(statement, 1);
        if (realisation < 0 || realisation >= SV_MAX_REALISATIONS || point < 0 ||
            point >= SV_MAX_POINTS) {
            status =
                SV_FAIL(context, SV_STORAGE, "%s/%s counts realisations to %lld, points to %lld",
                        run->folder, SV_LEDGER_NAME, (long long)realisation, (long long)point);
        } else {
            *ret_realisations = realisation + 1;
            *ret_points = (int32_t)point + 1;
        }
    }
    sqlite3_finalize(statement);
    return status;
}
