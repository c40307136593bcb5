/* SPDX-License-Identifier: GPL-3.0-or-later */
/* What happened to a run: table event. A writing begins with `start` or `continue`, which say what
 * process it is; its number is the session of all that follows up to `end`. */
#include <stdio.h>
#include <string.h>
#include <time.h>
#include <unistd.h>

#include "store_internal.h"

enum { N_TEXTS = 8, N_NUMBERS = 5, MOST_EVENTS = 1 << 18 };

/* One row, in the order of its columns: texts, and numbers. */
typedef struct row {
    char texts[N_TEXTS]
              [SV_NOTE_BYTES];  /* time what note command_line version kernel libraries host */
    int64_t numbers[N_NUMBERS]; /* number session process threads ranks */
} row;

static const char insert_sql[] =
    "INSERT INTO event (time, what, note, command_line, program_version, kernel, libraries, host, "
    "number, session, process, threads, ranks, checksum) "
    "VALUES (?1, ?2, ?3, ?4, ?5, ?6, ?7, ?8, ?9, ?10, ?11, ?12, ?13, ?14)";
static const char select_sql[] =
    "SELECT time, what, note, command_line, program_version, kernel, libraries, host, number, "
    "session, process, threads, ranks, checksum FROM event ORDER BY number";

static void set_text(row *r, int place, const char *text)
{
    sv_text_plain(text == NULL ? "" : text, r->texts[place], sizeof r->texts[place]);
}

static void set_time(row *r)
{
    char now[32];
    const time_t seconds = time(NULL);
    struct tm parts;
    if (gmtime_r(&seconds, &parts) == NULL ||
        strftime(now, sizeof now, "%Y-%m-%dT%H:%M:%SZ", &parts) == 0)
        snprintf(now, sizeof now, "unknown");
    set_text(r, 0, now);
}

static void set_session(row *r, const sv_run_identity *session)
{
    char host[SV_PLAIN_BYTES] = "", libraries[500];
    if (gethostname(host, sizeof host - 1) != 0)
        host[0] = '\0';
    set_text(r, 3, session->command_line);
    set_text(r, 4, session->program_version);
    set_text(r, 5, session->kernel);
    snprintf(libraries, sizeof libraries, "%.400s%ssqlite %s",
             session->libraries == NULL ? "" : session->libraries,
             session->libraries == NULL ? "" : ", ", sqlite3_libversion());
    set_text(r, 6, libraries);
    set_text(r, 7, host);
    r->numbers[1] = r->numbers[0];
    r->numbers[2] = (int64_t)getpid();
    r->numbers[3] = session->threads;
    r->numbers[4] = session->ranks;
}

static void row_checksum(const row *r, char digest[17])
{
    const char *texts[N_TEXTS];
    for (int i = 0; i < N_TEXTS; i++)
        texts[i] = r->texts[i];
    sv_texts_checksum(texts, N_TEXTS, r->numbers, N_NUMBERS, digest);
}

static sv_status insert(sv_context *context, sv_run *run, const row *r)
{
    sqlite3_stmt *statement = NULL;
    char digest[17];
    row_checksum(r, digest);
    sv_status status = sv_ledger_prepare(context, run, insert_sql, &statement);
    if (status != SV_OK)
        return status;
    bool bound = sqlite3_bind_text(statement, N_TEXTS + N_NUMBERS + 1, digest, -1, SQLITE_STATIC) ==
                 SQLITE_OK;
    for (int i = 0; i < N_TEXTS; i++)
        bound &= sqlite3_bind_text(statement, i + 1, r->texts[i], -1, SQLITE_STATIC) == SQLITE_OK;
    for (int i = 0; i < N_NUMBERS; i++)
        bound &= sqlite3_bind_int64(statement, N_TEXTS + i + 1, r->numbers[i]) == SQLITE_OK;
    if (!bound || sqlite3_step(statement) != SQLITE_DONE)
        status = sv_ledger_fail(context, run, "write");
    sqlite3_finalize(statement);
    return status;
}

/* One number from one row; `fallback` when there is no row. */
static sv_status read_number(sv_context *context, sv_run *run, const char *sql, int64_t fallback,
                             int64_t *ret_number)
{
    sqlite3_stmt *statement = NULL;
    sv_status status = sv_ledger_prepare(context, run, sql, &statement);
    if (status != SV_OK)
        return status;
    const int code = sqlite3_step(statement);
    if (code == SQLITE_ROW)
        *ret_number = sqlite3_column_int64(statement, 0);
    else if (code == SQLITE_DONE)
        *ret_number = fallback;
    else
        status = sv_ledger_fail(context, run, "read");
    sqlite3_finalize(statement);
    return status;
}

sv_status sv_event_add(sv_context *context, sv_run *run, const char *what, const char *note,
                       const sv_run_identity *session, int64_t *ret_number)
{
    row *r = NULL;
    int64_t last = 0;
    sv_status status = read_number(context, run, "SELECT max(number) FROM event", 0, &last);
    if (status == SV_OK && (last < 0 || last >= MOST_EVENTS))
        status = SV_FAIL(context, SV_STORAGE, "%s/%s counts %lld events, more than %d", run->folder,
                         SV_LEDGER_NAME, (long long)last, MOST_EVENTS);
    if (status == SV_OK)
        status = sv_take(context, 1, sizeof *r, &r);
    if (status != SV_OK)
        return status;
    r->numbers[0] = last + 1;
    r->numbers[1] = run->session;
    set_time(r);
    set_text(r, 1, what);
    set_text(r, 2, note);
    if (session != NULL)
        set_session(r, session);
    status = insert(context, run, r);
    if (status == SV_OK && ret_number != NULL)
        *ret_number = r->numbers[0];
    sv_give(context, r);
    return status;
}

sv_status sv_event_close_lost(sv_context *context, sv_run *run)
{
    int64_t open = 0;
    char note[160];
    sv_status status = read_number(
        context, run,
        "SELECT number FROM event b WHERE what IN ('start', 'continue') AND NOT EXISTS (SELECT 1 "
        "FROM event e WHERE e.session = b.number AND e.what IN ('end', 'lost')) "
        "ORDER BY number DESC LIMIT 1",
        0, &open);
    if (status != SV_OK || open == 0)
        return status;
    snprintf(note, sizeof note,
             "the writing begun by event %lld has no end: it was killed or the machine stopped",
             (long long)open);
    run->session = open;
    status = sv_event_add(context, run, "lost", note, NULL, NULL);
    run->session = 0;
    return status;
}

sv_status sv_run_event(sv_context *context, sv_run *run, const char *what, const char *note)
{
    if (!run->writing)
        return SV_FAIL(context, SV_STORAGE, "the run %s is open for reading only", run->folder);
    return sv_event_add(context, run, what, note, NULL, NULL);
}

/* ------------------------------------------------------------------ reading */

static bool read_row(sqlite3_stmt *statement, row *r)
{
    char digest[17];
    for (int i = 0; i < N_TEXTS; i++) {
        const char *text = (const char *)sqlite3_column_text(statement, i);
        const int bytes = sqlite3_column_bytes(statement, i);
        if (text == NULL || bytes < 0 || bytes >= SV_NOTE_BYTES ||
            !sv_text_is_plain(text, (size_t)bytes, false))
            return false;
        memcpy(r->texts[i], text, (size_t)bytes + 1);
    }
    for (int i = 0; i < N_NUMBERS; i++)
        r->numbers[i] = sqlite3_column_int64(statement, N_TEXTS + i);
    row_checksum(r, digest);
    const char *text = (const char *)sqlite3_column_text(statement, N_TEXTS + N_NUMBERS);
    return text != NULL && strcmp(text, digest) == 0;
}

static sv_status copy_row(sv_context *context, const row *r, sv_run_happening *h)
{
    char **const texts[N_TEXTS] = {&h->time,    &h->what,   &h->note,      &h->command_line,
                                   &h->version, &h->kernel, &h->libraries, &h->host};
    sv_status status = SV_OK;
    for (int i = 0; i < N_TEXTS && status == SV_OK; i++)
        status = sv_take_text(context, r->texts[i], texts[i]);
    h->number = r->numbers[0];
    h->session = r->numbers[1];
    h->process = r->numbers[2];
    h->threads = r->numbers[3];
    h->ranks = r->numbers[4];
    return status;
}

static sv_status read_rows(sv_context *context, sv_run *run, sqlite3_stmt *statement,
                           sv_run_history *history)
{
    row *r = NULL;
    sv_index room = 0;
    int code = SQLITE_DONE;
    sv_status status = sv_take(context, 1, sizeof *r, &r);
    while (status == SV_OK && (code = sqlite3_step(statement)) == SQLITE_ROW) {
        if (history->n == MOST_EVENTS)
            status = SV_FAIL(context, SV_STORAGE, "%s/%s has more than %d events", run->folder,
                             SV_LEDGER_NAME, MOST_EVENTS);
        else if (!read_row(statement, r))
            status = SV_FAIL(context, SV_STORAGE, "%s/%s is damaged: event %lld is not as written",
                             run->folder, SV_LEDGER_NAME, (long long)history->n + 1);
        if (status == SV_OK)
            status = sv_reserve(context, &history->events, &room, history->n + 1,
                                sizeof *history->events);
        if (status == SV_OK)
            status = copy_row(context, r, &history->events[history->n++]);
    }
    if (status == SV_OK && code != SQLITE_DONE)
        status = sv_ledger_fail(context, run, "read");
    sv_give(context, r);
    return status;
}

sv_status sv_run_history_read(sv_context *context, sv_run *run, sv_run_history *ret_history)
{
    sv_run_history history = {0};
    sqlite3_stmt *statement = NULL;
    sv_status status = sv_ledger_prepare(context, run, select_sql, &statement);
    if (status == SV_OK)
        status = read_rows(context, run, statement, &history);
    sqlite3_finalize(statement);
    if (status == SV_OK)
        *ret_history = history;
    else
        sv_run_history_free(context, &history);
    return status;
}

void sv_run_history_free(sv_context *context, sv_run_history *history)
{
    for (sv_index k = 0; k < history->n; k++) {
        sv_run_happening *h = &history->events[k];
        char *const texts[N_TEXTS] = {h->time,    h->what,   h->note,      h->command_line,
                                      h->version, h->kernel, h->libraries, h->host};
        for (int i = 0; i < N_TEXTS; i++)
            sv_give(context, texts[i]);
    }
    sv_give(context, history->events);
    *history = (sv_run_history){0};
}
