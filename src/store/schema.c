/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Tables of the ledger. STRICT tables, append-only by triggers; NaN is stored as NULL. What two
 * runs of one sheet must agree on bit for bit stands in `realisation` and `outcome`; what differs
 * from run to run in `event` and `cost`. */
#include <string.h>

#include "store_internal.h"

/* "Slvg" */
#define APPLICATION_ID 1399617127
#define STRINGIFY(x)   #x
#define EXPAND(x)      STRINGIFY(x)
/* 1: seconds among the checksummed fields, eight markers, no costs. */
#define LAYOUT 2
enum { SCHEMA_VERSION = LAYOUT };

/* Each text is kept by SQLite word for word, so a foreign schema is seen by comparing. */
static const char *const statements[] = {
    "CREATE TABLE meta (\n"
    "  key TEXT NOT NULL PRIMARY KEY,\n"
    "  value TEXT NOT NULL,\n"
    "  checksum TEXT NOT NULL\n"
    ") STRICT, WITHOUT ROWID",

    "CREATE TABLE event (\n"
    "  number INTEGER NOT NULL PRIMARY KEY,\n"
    "  time TEXT NOT NULL,\n"
    "  what TEXT NOT NULL,\n"
    "  note TEXT NOT NULL,\n"
    "  session INTEGER NOT NULL,\n"
    "  command_line TEXT NOT NULL,\n"
    "  program_version TEXT NOT NULL,\n"
    "  kernel TEXT NOT NULL,\n"
    "  libraries TEXT NOT NULL,\n"
    "  host TEXT NOT NULL,\n"
    "  process INTEGER NOT NULL,\n"
    "  threads INTEGER NOT NULL,\n"
    "  ranks INTEGER NOT NULL,\n"
    "  checksum TEXT NOT NULL\n"
    ") STRICT",

    "CREATE TABLE site_sum (\n"
    "  point INTEGER NOT NULL CHECK (point >= 0),\n"
    "  level INTEGER NOT NULL CHECK (level BETWEEN 0 AND 5),\n"
    "  block INTEGER NOT NULL CHECK (block >= 0),\n"
    "  data BLOB NOT NULL,\n"
    "  checksum TEXT NOT NULL,\n"
    "  PRIMARY KEY (point, level, block)\n"
    ") STRICT",

    "CREATE TABLE realisation (\n"
    "  point INTEGER NOT NULL CHECK (point >= 0),\n"
    "  realisation INTEGER NOT NULL CHECK (realisation >= 0),\n"
    "  status INTEGER NOT NULL,\n"
    "  sites INTEGER NOT NULL,\n"
    "  vacancies INTEGER NOT NULL,\n"
    "  outcomes INTEGER NOT NULL CHECK (outcomes BETWEEN 0 AND 16),\n"
    "  checksum TEXT NOT NULL,\n"
    "  PRIMARY KEY (point, realisation)\n"
    ") STRICT, WITHOUT ROWID",

    "CREATE TABLE outcome (\n"
    "  point INTEGER NOT NULL,\n"
    "  realisation INTEGER NOT NULL,\n"
    "  position INTEGER NOT NULL CHECK (position BETWEEN 0 AND 15),\n"
    "  marker TEXT NOT NULL,\n"
    "  verdict INTEGER NOT NULL,\n"
    "  reason TEXT NOT NULL,\n"
    "  engine TEXT NOT NULL,\n"
    "  value REAL,\n"
    "  idx INTEGER NOT NULL,\n"
    "  numerical_error REAL,\n"
    "  estimator_error REAL,\n"
    "  margin REAL,\n"
    "  weakest REAL,\n"
    "  sum_over_sites REAL,\n"
    "  window_cells INTEGER NOT NULL,\n"
    "  highest_occupied REAL,\n"
    "  lowest_empty REAL,\n"
    "  electrons INTEGER NOT NULL,\n"
    "  kappa REAL,\n"
    "  degree INTEGER NOT NULL,\n"
    "  PRIMARY KEY (point, realisation, position),\n"
    "  FOREIGN KEY (point, realisation) REFERENCES realisation (point, realisation)\n"
    ") STRICT, WITHOUT ROWID",

    "CREATE TABLE cost (\n"
    "  point INTEGER NOT NULL,\n"
    "  realisation INTEGER NOT NULL,\n"
    "  event INTEGER NOT NULL REFERENCES event (number),\n"
    "  host TEXT NOT NULL,\n"
    "  rank INTEGER NOT NULL,\n"
    "  thread INTEGER NOT NULL,\n"
    "  seconds REAL,\n"
    "  processor_seconds REAL,\n"
    "  peak_bytes INTEGER NOT NULL,\n"
    "  checksum TEXT NOT NULL,\n"
    "  PRIMARY KEY (point, realisation),\n"
    "  FOREIGN KEY (point, realisation) REFERENCES realisation (point, realisation)\n"
    ") STRICT, WITHOUT ROWID",

    "CREATE TRIGGER event_no_update BEFORE UPDATE ON event\n"
    "BEGIN SELECT RAISE(ABORT, 'the ledger is append-only'); END",
    "CREATE TRIGGER event_no_delete BEFORE DELETE ON event\n"
    "BEGIN SELECT RAISE(ABORT, 'the ledger is append-only'); END",
    "CREATE TRIGGER realisation_no_update BEFORE UPDATE ON realisation\n"
    "BEGIN SELECT RAISE(ABORT, 'the ledger is append-only'); END",
    "CREATE TRIGGER realisation_no_delete BEFORE DELETE ON realisation\n"
    "BEGIN SELECT RAISE(ABORT, 'the ledger is append-only'); END",
    "CREATE TRIGGER outcome_no_update BEFORE UPDATE ON outcome\n"
    "BEGIN SELECT RAISE(ABORT, 'the ledger is append-only'); END",
    "CREATE TRIGGER outcome_no_delete BEFORE DELETE ON outcome\n"
    "BEGIN SELECT RAISE(ABORT, 'the ledger is append-only'); END",
    "CREATE TRIGGER cost_no_update BEFORE UPDATE ON cost\n"
    "BEGIN SELECT RAISE(ABORT, 'the ledger is append-only'); END",
    "CREATE TRIGGER cost_no_delete BEFORE DELETE ON cost\n"
    "BEGIN SELECT RAISE(ABORT, 'the ledger is append-only'); END",
    "CREATE TRIGGER site_sum_no_update BEFORE UPDATE ON site_sum\n"
    "BEGIN SELECT RAISE(ABORT, 'the ledger is append-only'); END",
    "CREATE TRIGGER site_sum_no_loss BEFORE DELETE ON site_sum\n"
    "WHEN NOT EXISTS (SELECT 1 FROM site_sum WHERE point = OLD.point AND level = OLD.level + 1 AND "
    "block = OLD.block / 64)\n"
    "BEGIN SELECT RAISE(ABORT, 'sums over sites go only into a sum that holds them'); END",
    "CREATE TRIGGER meta_no_delete BEFORE DELETE ON meta\n"
    "BEGIN SELECT RAISE(ABORT, 'what a run is cannot be removed'); END",
};
enum { N_STATEMENTS = sizeof statements / sizeof *statements };

/* Call inside a transaction. */
sv_status sv_schema_create(sv_context *context, sv_run *run)
{
    sv_status status = SV_OK;
    for (int i = 0; i < N_STATEMENTS && status == SV_OK; i++)
        status = sv_ledger_execute(context, run, statements[i]);
    if (status == SV_OK)
        status = sv_ledger_execute(context, run,
                                   "PRAGMA application_id = " EXPAND(
                                       APPLICATION_ID) ";"
                                                       "PRAGMA user_version = " EXPAND(LAYOUT));
    return status;
}

static sv_status read_number(sv_context *context, sv_run *run, const char *sql, int64_t *ret_number)
{
    sqlite3_stmt *statement = NULL;
    sv_status status = sv_ledger_prepare(context, run, sql, &statement);
    if (status == SV_OK && sqlite3_step(statement) != SQLITE_ROW)
        status = sv_ledger_fail(context, run, "read");
    if (status == SV_OK)
        *ret_number = sqlite3_column_int64(statement, 0);
    sqlite3_finalize(statement);
    return status;
}

/* Views, further triggers or other columns would run or feed code we did not write. */
static sv_status compare_statements(sv_context *context, sv_run *run)
{
    sqlite3_stmt *statement = NULL;
    sv_status status = sv_ledger_prepare(
        context, run, "SELECT sql FROM sqlite_schema WHERE sql IS NOT NULL ORDER BY rowid",
        &statement);
    int i = 0, code = SQLITE_DONE;
    while (status == SV_OK && (code = sqlite3_step(statement)) == SQLITE_ROW) {
        const char *sql = (const char *)sqlite3_column_text(statement, 0);
        if (i >= N_STATEMENTS || sql == NULL || strcmp(sql, statements[i]) != 0)
            status = SV_FAIL(context, SV_STORAGE, "%s/%s has other tables than a ledger has",
                             run->folder, SV_LEDGER_NAME);
        i++;
    }
    if (status == SV_OK && code != SQLITE_DONE)
        status = sv_ledger_fail(context, run, "read");
    if (status == SV_OK && i != N_STATEMENTS)
        status = SV_FAIL(context, SV_STORAGE, "%s/%s lacks tables of a ledger", run->folder,
                         SV_LEDGER_NAME);
    sqlite3_finalize(statement);
    return status;
}

static sv_status quick_check(sv_context *context, sv_run *run)
{
    sqlite3_stmt *statement = NULL;
    sv_status status = sv_ledger_prepare(context, run, "PRAGMA quick_check(1)", &statement);
    if (status == SV_OK && sqlite3_step(statement) != SQLITE_ROW)
        status = sv_ledger_fail(context, run, "check");
    if (status == SV_OK) {
        const char *word = (const char *)sqlite3_column_text(statement, 0);
        if (word == NULL || strcmp(word, "ok") != 0)
            status = SV_FAIL(context, SV_STORAGE, "%s/%s is damaged: %.200s", run->folder,
                             SV_LEDGER_NAME, word == NULL ? "no answer" : word);
    }
    sqlite3_finalize(statement);
    return status;
}

sv_status sv_schema_check(sv_context *context, sv_run *run)
{
    int64_t id = 0, version = 0;
    sv_status status = read_number(context, run, "PRAGMA application_id", &id);
    if (status == SV_OK && id != APPLICATION_ID)
        status = SV_FAIL(context, SV_STORAGE, "%s/%s is not a ledger of Selvedge", run->folder,
                         SV_LEDGER_NAME);
    if (status == SV_OK)
        status = read_number(context, run, "PRAGMA user_version", &version);
    if (status == SV_OK && version != SCHEMA_VERSION)
        status =
            SV_FAIL(context, SV_STORAGE,
                    "%s/%s has layout %lld; this program reads layout %d: use the version that "
                    "wrote it, or start a new run",
                    run->folder, SV_LEDGER_NAME, (long long)version, SCHEMA_VERSION);
    if (status == SV_OK)
        status = compare_statements(context, run);
    if (status == SV_OK)
        status = quick_check(context, run);
    return status;
}
