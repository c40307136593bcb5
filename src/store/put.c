/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Appending realisations: one transaction each, on disk when the call returns. */
#include <stdio.h>
#include <string.h>

#include "store_internal.h"

static const char row_sql[] =
    "INSERT INTO realisation (point, realisation, status, sites, vacancies, outcomes, checksum) "
    "VALUES (?1, ?2, ?3, ?4, ?5, ?6, ?7)";
static const char cost_sql[] =
    "INSERT INTO cost (point, realisation, event, host, rank, thread, seconds, processor_seconds, "
    "peak_bytes, checksum) VALUES (?1, ?2, ?3, ?4, ?5, ?6, ?7, ?8, ?9, ?10)";
static const char outcome_sql[] =
    "INSERT INTO outcome (point, realisation, position, marker, verdict, reason, engine, value, "
    "idx, numerical_error, estimator_error, margin, weakest, sum_over_sites, window_cells, "
    "highest_occupied, lowest_empty, electrons, kappa, degree) VALUES (?1, ?2, ?3, ?4, ?5, ?6, ?7, "
    "?8, ?9, ?10, ?11, ?12, ?13, ?14, ?15, ?16, ?17, ?18, ?19, ?20)";

/* SQLite stores NaN as NULL by itself. */
static bool bind_reals(sqlite3_stmt *statement, int first, const double *values, int count)
{
    bool good = true;
    for (int i = 0; i < count; i++)
        good &= sqlite3_bind_double(statement, first + i, values[i]) == SQLITE_OK;
    return good;
}

static bool bind_integer(sqlite3_stmt *statement, int column, int64_t value)
{
    return sqlite3_bind_int64(statement, column, value) == SQLITE_OK;
}

static bool bind_text(sqlite3_stmt *statement, int column, const char *text)
{
    char plain[SV_PLAIN_BYTES];
    const size_t length = sv_text_plain(text, plain, sizeof plain);
    return sqlite3_bind_text(statement, column, plain, (int)length, SQLITE_TRANSIENT) == SQLITE_OK;
}

static sv_status step(sv_context *context, sv_run *run, sqlite3_stmt *statement, bool bound)
{
    sv_status status = SV_OK;
    if (!bound || sqlite3_step(statement) != SQLITE_DONE)
        status = sv_ledger_fail(context, run, "write");
    sqlite3_reset(statement);
    return status;
}

static sv_status insert_cost(sv_context *context, sv_run *run, const sv_record *record)
{
    const double seconds[2] = {record->seconds, record->processor_seconds};
    sqlite3_stmt *statement = run->put_cost;
    char digest[17];
    sv_cost_checksum(record, run->session, digest);
    return step(
        context, run, statement,
        bind_integer(statement, 1, record->point) &&
            bind_integer(statement, 2, record->realisation) &&
            bind_integer(statement, 3, run->session) && bind_text(statement, 4, record->host) &&
            bind_integer(statement, 5, record->rank) &&
            bind_integer(statement, 6, record->thread) && bind_reals(statement, 7, seconds, 2) &&
            bind_integer(statement, 9, record->peak_bytes) && bind_text(statement, 10, digest));
}

static sv_status insert_row(sv_context *context, sv_run *run, const sv_record *record)
{
    sqlite3_stmt *statement = run->put_row;
    char digest[65];
    sv_record_checksum(record, digest);
    const bool bound = bind_integer(statement, 1, record->point) &&
                       bind_integer(statement, 2, record->realisation) &&
                       bind_integer(statement, 3, (int64_t)record->status) &&
                       bind_integer(statement, 4, record->sites) &&
                       bind_integer(statement, 5, record->vacancies) &&
                       bind_integer(statement, 6, record->n_outcomes) &&
                       bind_text(statement, 7, digest);
    sv_status status = step(context, run, statement, bound);
    return status == SV_OK ? insert_cost(context, run, record) : status;
}

static sv_status insert_outcome(sv_context *context, sv_run *run, const sv_record *record,
                                int position)
{
    const sv_outcome *outcome = &record->outcomes[position];
    const double reals[] = {outcome->numerical_error, outcome->estimator_error, outcome->margin,
                            outcome->weakest, outcome->sum_over_sites};
    const double levels[] = {outcome->highest_occupied, outcome->lowest_empty};
    sqlite3_stmt *statement = run->put_outcome;
    const bool bound =
        bind_integer(statement, 1, record->point) &&
        bind_integer(statement, 2, record->realisation) && bind_integer(statement, 3, position) &&
        bind_text(statement, 4, run->n_markers >= 0 ? run->markers[position] : "") &&
        bind_integer(statement, 5, (int64_t)outcome->verdict) &&
        bind_text(statement, 6, outcome->reason) && bind_text(statement, 7, outcome->engine) &&
        bind_reals(statement, 8, &outcome->value, 1) &&
        bind_integer(statement, 9, outcome->index) && bind_reals(statement, 10, reals, 5) &&
        bind_integer(statement, 15, outcome->window_cells) &&
        bind_reals(statement, 16, levels, 2) && bind_integer(statement, 18, outcome->electrons) &&
        bind_reals(statement, 19, &outcome->kappa, 1) &&
        bind_integer(statement, 20, outcome->degree);
    return step(context, run, statement, bound);
}

sv_status sv_put_prepare(sv_context *context, sv_run *run)
{
    sv_status status = SV_OK;
    if (run->put_row == NULL)
        status = sv_ledger_prepare(context, run, row_sql, &run->put_row);
    if (status == SV_OK && run->put_cost == NULL)
        status = sv_ledger_prepare(context, run, cost_sql, &run->put_cost);
    if (status == SV_OK && run->put_outcome == NULL)
        status = sv_ledger_prepare(context, run, outcome_sql, &run->put_outcome);
    return status;
}

static sv_status check_record(sv_context *context, const sv_run *run, const sv_record *record)
{
    if (!run->writing)
        return SV_FAIL(context, SV_STORAGE, "the run %s is open for reading only", run->folder);
    if (!sv_record_is_sane(record))
        return SV_FAIL(context, SV_INTERNAL,
                       "point %ld, realisation %lld, %ld outcomes: a number out of range",
                       (long)record->point, (long long)record->realisation,
                       (long)record->n_outcomes);
    if (run->n_markers >= 0 && record->n_outcomes > run->n_markers)
        return SV_FAIL(context, SV_STORAGE, "%s keeps %d markers, the record has %ld", run->folder,
                       run->n_markers, (long)record->n_outcomes);
    return SV_OK;
}

void sv_record_difference(const sv_record *was, const sv_record *is, char *text, size_t size)
{
    for (int i = 0; i < is->n_outcomes && i < was->n_outcomes; i++) {
        const sv_outcome *a = &was->outcomes[i], *b = &is->outcomes[i];
        if (a->value < b->value || a->value > b->value) {
            snprintf(text, size, "the value of marker number %d is %.17g there, %.17g here", i,
                     a->value, b->value);
            return;
        }
    }
    if (was->sites != is->sites)
        snprintf(text, size, "it has %lld sites there, %lld here", (long long)was->sites,
                 (long long)is->sites);
    else
        snprintf(text, size, "an error, a margin or a verdict differs");
}

/* A realisation that is there already must have the same numbers, its cost apart. */
static sv_status compare(sv_context *context, const sv_run *run, const sv_record *old_record,
                         const sv_record *record)
{
    char was[65], is[65], difference[400];
    sv_record_checksum(old_record, was);
    sv_record_checksum(record, is);
    if (strcmp(was, is) == 0)
        return SV_OK;
    sv_record_difference(old_record, record, difference, sizeof difference);
    return SV_FAIL(context, SV_STORAGE,
                   "realisation %lld of point %ld is kept in %s with another outcome: %s",
                   (long long)record->realisation, (long)record->point, run->folder, difference);
}

sv_status sv_record_insert(sv_context *context, sv_run *run, const sv_record *record, bool *ret_new)
{
    sv_record old_record;
    bool found = false;
    sv_status status = check_record(context, run, record);
    if (status == SV_OK)
        status =
            sv_record_read(context, run, record->point, record->realisation, &old_record, &found);
    if (status != SV_OK)
        return status;
    *ret_new = !found;
    if (found)
        return compare(context, run, &old_record, record);
    status = insert_row(context, run, record);
    for (int i = 0; i < record->n_outcomes && status == SV_OK; i++)
        status = insert_outcome(context, run, record, i);
    if (status == SV_OK && record->maps != NULL)
        status = sv_site_put(context, run, record->point, record->realisation, record->maps);
    return status;
}

sv_status sv_run_put_many(sv_context *context, const sv_record *records, int n, void *user)
{
    sv_run *run = user;
    bool is_new;
    sv_status status = SV_OK;
    for (int k = 0; k < n && status == SV_OK; k++)
        status = check_record(context, run, &records[k]);
    if (status == SV_OK)
        status = sv_put_prepare(context, run);
    if (status == SV_OK)
        status = sv_ledger_execute(context, run, "BEGIN IMMEDIATE");
    if (status != SV_OK)
        return status;
    for (int k = 0; k < n && status == SV_OK; k++)
        status = sv_record_insert(context, run, &records[k], &is_new);
    if (status == SV_OK)
        status = sv_ledger_execute(context, run, "COMMIT");
    if (status != SV_OK && sqlite3_get_autocommit(run->ledger) == 0)
        sqlite3_exec(run->ledger, "ROLLBACK", NULL, NULL, NULL);
    return status;
}

sv_status sv_run_put(sv_context *context, const sv_record *record, void *user)
{
    return sv_run_put_many(context, record, 1, user);
}
