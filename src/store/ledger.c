/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Opening and closing the SQLite ledger: rollback journal, full synchronisation, one writer. */
#include <errno.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <sys/stat.h>
#include <unistd.h>

#include "store_internal.h"

enum { WRITER_PATIENCE_MS = 60000, READER_PATIENCE_MS = 10000 };

/* An error of SQLite as a sentence; the reason of the system is added where there is one. */
sv_status sv_ledger_fail(sv_context *context, const sv_run *run, const char *what)
{
    int code = sqlite3_extended_errcode(run->ledger);
    int reason = (code & 0xff) == SQLITE_IOERR || (code & 0xff) == SQLITE_CANTOPEN
                     ? sqlite3_system_errno(run->ledger)
                     : 0;
    if ((code & 0xff) == SQLITE_NOMEM)
        return SV_FAIL(context, SV_NO_MEMORY, "out of memory at %s/%s", run->folder,
                       SV_LEDGER_NAME);
    /* A write that is cut short leaves no reason. */
    const char *why = reason != 0                  ? strerror(reason)
                      : code == SQLITE_IOERR_WRITE ? "disk full, or a limit on the size of files"
                                                   : "";
    return SV_FAIL(context, SV_STORAGE, "cannot %s %s/%s: %s%s%s", what, run->folder,
                   SV_LEDGER_NAME, sqlite3_errmsg(run->ledger), *why != '\0' ? ": " : "", why);
}

sv_status sv_ledger_execute(sv_context *context, sv_run *run, const char *sql)
{
    if (sqlite3_exec(run->ledger, sql, NULL, NULL, NULL) != SQLITE_OK)
        return sv_ledger_fail(context, run, run->writing ? "write" : "read");
    return SV_OK;
}

sv_status sv_ledger_prepare(sv_context *context, sv_run *run, const char *sql,
                            sqlite3_stmt **ret_statement)
{
    sqlite3_stmt *statement = NULL;
    if (sqlite3_prepare_v2(run->ledger, sql, -1, &statement, NULL) != SQLITE_OK)
        return sv_ledger_fail(context, run, run->writing ? "use" : "read");
    *ret_statement = statement;
    return SV_OK;
}

/* Path of a ledger file; "./" keeps SQLite from taking a name like "file:x" for a URI. */
static sv_status ledger_path(sv_context *context, const char *folder, const char *name, char *path,
                             size_t size)
{
    char plain[SV_PATH_SIZE];
    sv_status status = sv_join_path(context, folder, name, plain, sizeof plain);
    if (status != SV_OK)
        return status;
    int length = snprintf(path, size, "%s%s", plain[0] == '/' ? "" : "./", plain);
    if (length < 0 || (size_t)length >= size)
        return SV_FAIL(context, SV_STORAGE, "the path %.200s… is too long", plain);
    return SV_OK;
}

/* A file from elsewhere: no code from it, no surprises in its size. */
static void harden(sqlite3 *ledger)
{
    sqlite3_db_config(ledger, SQLITE_DBCONFIG_DEFENSIVE, 1, NULL);
    sqlite3_db_config(ledger, SQLITE_DBCONFIG_TRUSTED_SCHEMA, 0, NULL);
    sqlite3_db_config(ledger, SQLITE_DBCONFIG_ENABLE_VIEW, 0, NULL);
    sqlite3_limit(ledger, SQLITE_LIMIT_LENGTH, SV_MAX_TEXT_BYTES);
    sqlite3_limit(ledger, SQLITE_LIMIT_SQL_LENGTH, 1 << 14);
    sqlite3_limit(ledger, SQLITE_LIMIT_COLUMN, 64);
    sqlite3_limit(ledger, SQLITE_LIMIT_EXPR_DEPTH, 32);
    sqlite3_limit(ledger, SQLITE_LIMIT_ATTACHED, 0);
}

static sv_status connect(sv_context *context, sv_run *run, const char *path, int flags)
{
    if (sqlite3_open_v2(path, &run->ledger, flags, NULL) != SQLITE_OK)
        return sv_ledger_fail(context, run, "open");
    sqlite3_extended_result_codes(run->ledger, 1);
    harden(run->ledger);
    sqlite3_busy_timeout(run->ledger, run->writing ? WRITER_PATIENCE_MS : READER_PATIENCE_MS);
    return SV_OK;
}

/*
 * A journal can name a further journal that SQLite would delete after a roll-back. Ours never
 * do (nothing is attached), so one that does comes from elsewhere and is refused. The name ends
 * with this mark (SQLite file format, section 3).
 */
static bool journal_is_plain(const char *path)
{
    static const unsigned char mark[8] = {0xd9, 0xd5, 0x05, 0xf9, 0x20, 0xa1, 0x63, 0xd7};
    unsigned char tail[8] = {0};
    FILE *stream = fopen(path, "rb");
    if (stream == NULL)
        return errno == ENOENT;
    bool named = fseek(stream, -8, SEEK_END) == 0 && ftell(stream) > 512 &&
                 fread(tail, 1, sizeof tail, stream) == sizeof tail &&
                 memcmp(tail, mark, sizeof mark) == 0;
    fclose(stream);
    return !named;
}

/*
 * A ledger of ours has a rollback journal. One that asks for a write-ahead log (bytes 18 and 19 of
 * the header, SQLite file format, section 1.3) would make SQLite read and write further files.
 * Read through SQLite's own functions: closing a descriptor of the file would drop its locks.
 */
static sv_status check_header(sv_context *context, const sv_run *run, const char *path)
{
    sqlite3_vfs *vfs = sqlite3_vfs_find(NULL);
    unsigned char head[20] = {0};
    sqlite3_file *file = NULL;
    sv_status status = sv_take(context, 1, (size_t)vfs->szOsFile, &file);
    if (status != SV_OK)
        return status;
    int code = vfs->xOpen(vfs, path, file, SQLITE_OPEN_READONLY | SQLITE_OPEN_MAIN_DB, NULL);
    if (code == SQLITE_OK)
        code = file->pMethods->xRead(file, head, sizeof head, 0);
    if (code != SQLITE_OK && code != SQLITE_IOERR_SHORT_READ)
        status = SV_FAIL(context, SV_STORAGE, "cannot read %s/%s: %s", run->folder, SV_LEDGER_NAME,
                         sqlite3_errstr(code));
    else if (head[18] > 1 || head[19] > 1)
        status = SV_FAIL(context, SV_STORAGE,
                         "%s/%s is damaged or from elsewhere: it asks for a write-ahead log",
                         run->folder, SV_LEDGER_NAME);
    if (file->pMethods != NULL)
        file->pMethods->xClose(file);
    sv_give(context, file);
    return status;
}

/* Ledger and journal must be plain files, so that nothing outside the folder is touched. */
static sv_status check_files(sv_context *context, const sv_run *run)
{
    char path[SV_PATH_SIZE];
    struct stat info;
    sv_status status = sv_join_path(context, run->folder, SV_LEDGER_NAME, path, sizeof path);
    if (status != SV_OK)
        return status;
    if (lstat(path, &info) != 0)
        return SV_FAIL(context, SV_STORAGE, "cannot open %s: %s", path, strerror(errno));
    if (!S_ISREG(info.st_mode))
        return SV_FAIL(context, SV_STORAGE, "%s is a link or no regular file", path);
    status = ledger_path(context, run->folder, SV_LEDGER_NAME, path, sizeof path);
    if (status == SV_OK)
        status = check_header(context, run, path);
    if (status != SV_OK)
        return status;
    status = sv_join_path(context, run->folder, SV_JOURNAL_NAME, path, sizeof path);
    if (status != SV_OK)
        return status;
    if (lstat(path, &info) == 0 && (!S_ISREG(info.st_mode) || !journal_is_plain(path)))
        return SV_FAIL(context, SV_STORAGE, "%s was not written by this program", path);
    return SV_OK;
}

static sv_status set_writer_pragmas(sv_context *context, sv_run *run)
{
    return sv_ledger_execute(context, run,
                             "PRAGMA journal_mode = TRUNCATE; PRAGMA synchronous = FULL;"
                             "PRAGMA foreign_keys = ON; PRAGMA recursive_triggers = ON;"
                             "PRAGMA cell_size_check = ON; PRAGMA trusted_schema = OFF;"
                             "PRAGMA temp_store = MEMORY");
}

sv_status sv_ledger_create(sv_context *context, sv_run *run)
{
    char path[SV_PATH_SIZE];
    sv_status status = ledger_path(context, run->folder, SV_LEDGER_NAME, path, sizeof path);
    if (status == SV_OK)
        status = connect(context, run, path,
                         SQLITE_OPEN_READWRITE | SQLITE_OPEN_CREATE | SQLITE_OPEN_EXRESCODE);
    if (status == SV_OK)
        status = set_writer_pragmas(context, run);
    return status;
}

sv_status sv_ledger_open(sv_context *context, sv_run *run)
{
    char path[SV_PATH_SIZE];
    sv_status status = check_files(context, run);
    if (status == SV_OK)
        status = ledger_path(context, run->folder, SV_LEDGER_NAME, path, sizeof path);
    if (status == SV_OK)
        status = connect(context, run, path, SQLITE_OPEN_READWRITE | SQLITE_OPEN_EXRESCODE);
    if (status == SV_OK)
        status = set_writer_pragmas(context, run);
    if (status == SV_OK)
        status = sv_schema_check(context, run);
    return status;
}

static sv_status copy_file(sv_context *context, const char *from, const char *to)
{
    char *data = NULL;
    size_t size = 0;
    sv_status status = sv_read_file(context, from, (size_t)1 << 36, &data, &size);
    if (status == SV_OK)
        status = sv_write_file(context, to, data, size);
    sv_give(context, data);
    return status;
}

/* Copies ledger and journal, opens the copy, rolls it back, and forgets the names. */
static sv_status open_rolled_back_copy(sv_context *context, sv_run *run, const char *folder)
{
    static const char *const names[2] = {SV_LEDGER_NAME, SV_JOURNAL_NAME};
    char from[SV_PATH_SIZE], to[2][SV_PATH_SIZE];
    sv_status status = SV_OK;
    for (int i = 0; i < 2 && status == SV_OK; i++) {
        status = sv_join_path(context, run->folder, names[i], from, sizeof from);
        if (status == SV_OK)
            status = ledger_path(context, folder, names[i], to[i], sizeof to[i]);
        if (status == SV_OK)
            status = copy_file(context, from, to[i]);
    }
    if (status == SV_OK)
        status = connect(context, run, to[0], SQLITE_OPEN_READWRITE | SQLITE_OPEN_EXRESCODE);
    if (status == SV_OK)
        status = sv_ledger_execute(context, run,
                                   "SELECT count(*) FROM sqlite_schema;"
                                   "PRAGMA query_only = ON");
    if (status == SV_OK) {
        unlink(to[0]);
        unlink(to[1]);
    }
    return status;
}

/*
 * A writer that was killed leaves a journal to be rolled back. A reader changes nothing in the
 * folder, so it rolls back a copy.
 */
static sv_status read_from_copy(sv_context *context, sv_run *run)
{
    const char *place = getenv("TMPDIR");
    char folder[SV_PATH_SIZE], path[SV_PATH_SIZE];
    sqlite3_close(run->ledger);
    run->ledger = NULL;
    sv_status status = sv_join_path(context, place != NULL && *place != '\0' ? place : "/tmp",
                                    "selvedge-read-XXXXXX", folder, sizeof folder);
    if (status != SV_OK)
        return status;
    if (mkdtemp(folder) == NULL)
        return SV_FAIL(context, SV_STORAGE, "cannot make the folder %s: %s", folder,
                       strerror(errno));
    status = open_rolled_back_copy(context, run, folder);
    static const char *const names[2] = {SV_LEDGER_NAME, SV_JOURNAL_NAME};
    for (int i = 0; i < 2; i++)
        if (snprintf(path, sizeof path, "%s/%s", folder, names[i]) < (int)sizeof path)
            unlink(path);
    rmdir(folder);
    return status;
}

sv_status sv_ledger_open_read(sv_context *context, sv_run *run)
{
    char path[SV_PATH_SIZE];
    sv_status status = check_files(context, run);
    if (status == SV_OK)
        status = ledger_path(context, run->folder, SV_LEDGER_NAME, path, sizeof path);
    if (status == SV_OK)
        status = connect(context, run, path, SQLITE_OPEN_READONLY | SQLITE_OPEN_EXRESCODE);
    if (status != SV_OK)
        return status;
    int code = sqlite3_exec(run->ledger, "SELECT count(*) FROM sqlite_schema", NULL, NULL, NULL);
    if (code == SQLITE_READONLY_ROLLBACK)
        status = read_from_copy(context, run);
    else if (code != SQLITE_OK)
        status = sv_ledger_fail(context, run, "read");
    if (status == SV_OK)
        status = sv_ledger_execute(context, run,
                                   "PRAGMA cell_size_check = ON; PRAGMA trusted_schema = OFF");
    if (status == SV_OK)
        status = sv_schema_check(context, run);
    return status;
}

void sv_ledger_close(sv_run *run)
{
    sqlite3_finalize(run->put_row);
    sqlite3_finalize(run->put_cost);
    sqlite3_finalize(run->put_outcome);
    sqlite3_finalize(run->get_row);
    sqlite3_finalize(run->get_outcome);
    run->put_row = run->put_cost = run->put_outcome = run->get_row = run->get_outcome = NULL;
    sqlite3_close(run->ledger);
    run->ledger = NULL;
}
