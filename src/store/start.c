/* SPDX-License-Identifier: GPL-3.0-or-later */
/* A new run: ledger first, copies of the inputs, the sheet last. */
#include <errno.h>
#include <stdio.h>
#include <string.h>
#include <sys/stat.h>
#include <unistd.h>

#include "store_internal.h"

static sv_status set_identity(sv_context *context, sv_run *run, const sv_run_identity *identity)
{
    char digest[65], sheet_digest[65], number[64];
    sv_identity_digest(context, identity, digest);
    sv_digest(identity->resolved_sheet, strlen(identity->resolved_sheet), sheet_digest);
    const char *const pairs[][2] = {{"identity", identity->identity},
                                    {"identity_digest", digest},
                                    {"program_version", identity->program_version},
                                    {"kernel", identity->kernel},
                                    {"sheet", identity->resolved_sheet},
                                    {"sheet_digest", sheet_digest}};
    sv_status status = SV_OK;
    for (size_t i = 0; i < sizeof pairs / sizeof *pairs && status == SV_OK; i++)
        status = sv_meta_set(context, run, pairs[i][0], pairs[i][1]);
    if (status == SV_OK && identity->realisations > 0) {
        snprintf(number, sizeof number, "%lld", (long long)identity->realisations);
        status = sv_meta_set(context, run, "realisations", number);
    }
    if (status == SV_OK && identity->tasks > 0) {
        snprintf(number, sizeof number, "%ld/%ld", (long)identity->task, (long)identity->tasks);
        status = sv_meta_set(context, run, "task", number);
    }
    if (status == SV_OK)
        status = sv_meta_set_shape(context, run, identity);
    return status;
}

sv_status sv_session_write_sheet(sv_context *context, const sv_run *run,
                                 const sv_run_identity *identity)
{
    char path[SV_PATH_SIZE];
    sv_status status = sv_run_path(context, run, SV_SHEET_NAME, path, sizeof path);
    if (status == SV_OK)
        status = sv_write_file(context, path, identity->resolved_sheet,
                               strlen(identity->resolved_sheet));
    return status;
}

/* Rows in a ledger that is about to be replaced; -1 when it cannot be read. */
static int64_t count_rows(sv_context *context, const char *folder)
{
    sv_run *old_run = NULL;
    int64_t count = -1, realisations = 0;
    int32_t points = 0;
    const sv_error before = context->error;
    if (sv_run_new(context, folder, true, &old_run) != SV_OK)
        return -1;
    if (sv_ledger_open(context, old_run) == SV_OK &&
        sv_run_extent(context, old_run, &realisations, &points) == SV_OK)
        count = realisations;
    sv_run_free(context, old_run);
    context->error = before;
    return count;
}

/* Out of the way, never overwriting: ledger.old-1.sqlite, ledger.old-2.sqlite … */
static sv_status set_aside(sv_context *context, const char *folder, const char *ledger,
                           const char *journal)
{
    char name[64], path[SV_PATH_SIZE], beside[SV_PATH_SIZE];
    struct stat info;
    for (int k = 1; k < 10000; k++) {
        snprintf(name, sizeof name, SV_ASIDE_PREFIX "%d.sqlite", k);
        sv_status status = sv_join_path(context, folder, name, path, sizeof path);
        if (status != SV_OK)
            return status;
        if (lstat(path, &info) == 0)
            continue;
        if (rename(ledger, path) != 0)
            break;
        snprintf(name, sizeof name, SV_ASIDE_PREFIX "%d.sqlite-journal", k);
        if (sv_join_path(context, folder, name, beside, sizeof beside) == SV_OK)
            rename(journal, beside);
        sv_log(context, SV_LOG_WARNING,
               "the folder's ledger does not belong to this sheet; it is kept as %s", path);
        return SV_OK;
    }
    return SV_FAIL(context, SV_STORAGE, "cannot move %s away: %s", ledger, strerror(errno));
}

/* An interrupted creation leaves an empty ledger; one with rows or damage is kept aside. */
static sv_status clear_ledger(sv_context *context, const char *folder)
{
    char ledger[SV_PATH_SIZE], journal[SV_PATH_SIZE];
    struct stat info;
    sv_status status = sv_join_path(context, folder, SV_LEDGER_NAME, ledger, sizeof ledger);
    if (status == SV_OK)
        status = sv_join_path(context, folder, SV_JOURNAL_NAME, journal, sizeof journal);
    if (status != SV_OK)
        return status;
    /* Looking at the rows rolls a half-made ledger back to nothing, hence the second look. */
    if (lstat(ledger, &info) == 0 && info.st_size > 0 && count_rows(context, folder) != 0 &&
        lstat(ledger, &info) == 0 && info.st_size > 0)
        return set_aside(context, folder, ledger, journal);
    if ((unlink(ledger) != 0 && errno != ENOENT) || (unlink(journal) != 0 && errno != ENOENT))
        return SV_FAIL(context, SV_STORAGE, "cannot remove %s: %s", ledger, strerror(errno));
    return SV_OK;
}

/* Everything about the run in one transaction. */
sv_status sv_session_begin(sv_context *context, sv_run *run, const sv_run_identity *identity,
                           const char *what, bool create)
{
    int64_t session = 0;
    sv_status status = sv_ledger_execute(context, run, "BEGIN IMMEDIATE");
    if (status == SV_OK && create)
        status = sv_schema_create(context, run);
    if (status == SV_OK)
        status = set_identity(context, run, identity);
    if (status == SV_OK && !create)
        status = sv_event_close_lost(context, run);
    if (status == SV_OK)
        status = sv_event_add(context, run, what, "", identity, &session);
    if (status == SV_OK)
        status = sv_ledger_execute(context, run, "COMMIT");
    if (status == SV_OK)
        run->session = session;
    else if (run->ledger != NULL && sqlite3_get_autocommit(run->ledger) == 0)
        sqlite3_exec(run->ledger, "ROLLBACK", NULL, NULL, NULL);
    return status;
}

/* The sheet comes last: without it the folder counts as new, so a kill in between costs nothing. */
sv_status sv_session_start(sv_context *context, sv_run *run, const sv_run_identity *identity)
{
    sv_ledger_close(run);
    sv_meta_free(context, run);
    sv_status status = clear_ledger(context, run->folder);
    if (status == SV_OK)
        status = sv_ledger_create(context, run);
    if (status == SV_OK)
        status = sv_session_begin(context, run, identity, "start", true);
    if (status == SV_OK)
        status = sv_copy_inputs(context, run->folder, identity->inputs, identity->n_inputs);
    if (status == SV_OK)
        status = sv_session_write_sheet(context, run, identity);
    return status;
}
