/* SPDX-License-Identifier: GPL-3.0-or-later */
/* What the ledger withstands: changes, second processes, kills, a full disk. */
#include <fcntl.h>
#include <signal.h>
#include <sqlite3.h>
#include <sys/resource.h>
#include <sys/stat.h>
#include <sys/wait.h>
#include <unistd.h>

#include "fixture.h"

SV_TEST(rows_cannot_be_changed_or_removed)
{
    fixture_fresh_run("triggers", 2);
    CHECK_INT(fixture_sql("UPDATE realisation SET sites = 1"), SQLITE_CONSTRAINT);
    CHECK_INT(fixture_sql("DELETE FROM realisation"), SQLITE_CONSTRAINT);
    CHECK_INT(fixture_sql("UPDATE outcome SET value = 1"), SQLITE_CONSTRAINT);
    CHECK_INT(fixture_sql("DELETE FROM outcome"), SQLITE_CONSTRAINT);
    CHECK_INT(fixture_sql("UPDATE event SET note = ''"), SQLITE_CONSTRAINT);
    CHECK_INT(fixture_sql("DELETE FROM event"), SQLITE_CONSTRAINT);
    CHECK_INT(fixture_sql("DELETE FROM meta"), SQLITE_CONSTRAINT);
    CHECK_INT(fixture_sql("UPDATE cost SET seconds = 0"), SQLITE_CONSTRAINT);
    CHECK_INT(fixture_sql("DELETE FROM cost"), SQLITE_CONSTRAINT);
    CHECK_INT(
        fixture_sql("PRAGMA recursive_triggers = ON; INSERT OR REPLACE INTO realisation "
                    "SELECT point, realisation, status, 1, vacancies, outcomes, checksum FROM "
                    "realisation"),
        SQLITE_CONSTRAINT);
}

static int read_pragma(const char *name)
{
    sqlite3 *ledger = NULL;
    sqlite3_stmt *statement = NULL;
    int value = -1;
    if (sqlite3_open(fixture_path("ledger.sqlite"), &ledger) == SQLITE_OK &&
        sqlite3_prepare_v2(ledger, name, -1, &statement, NULL) == SQLITE_OK &&
        sqlite3_step(statement) == SQLITE_ROW)
        value = sqlite3_column_int(statement, 0);
    sqlite3_finalize(statement);
    sqlite3_close(ledger);
    return value;
}

SV_TEST(the_file_says_what_it_is_and_has_no_write_ahead_log)
{
    struct stat info;
    fixture_fresh_run("format", 1);
    CHECK_INT(read_pragma("PRAGMA application_id"), 0x536c7667);
    CHECK_INT(read_pragma("PRAGMA user_version"), 2);
    unsigned char head[20] = {0};
    int file = open(fixture_path("ledger.sqlite"), O_RDONLY);
    CHECK_INT(read(file, head, sizeof head), sizeof head);
    close(file);
    CHECK_INT(head[18], 1); /* 2 would be WAL (SQLite file format, section 1.3.3) */
    CHECK(stat(fixture_path("ledger.sqlite-wal"), &info) != 0);
}

/* Exit code of a child that tries to open the run for writing. */
static int open_in_child(void)
{
    fflush(NULL);
    const pid_t child = fork();
    if (child == 0) {
        const sv_run_identity identity = fixture_identity();
        sv_context context;
        sv_run *run = NULL;
        sv_context_init(&context);
        sv_status status = sv_run_open(&context, fixture_folder, &identity, false, &run);
        if (status == SV_STORAGE && strstr(context.error.message, "locked") == NULL)
            _exit(99);
        if (status == SV_OK)
            sv_run_close(&context, run);
        _exit((int)status);
    }
    int state = 0;
    CHECK(waitpid(child, &state, 0) == child && WIFEXITED(state));
    return WEXITSTATUS(state);
}

SV_TEST(one_writer_per_folder)
{
    sv_context *context = test_context();
    const sv_run_identity identity = fixture_identity();
    sv_run *run = NULL, *second = NULL, *reader = NULL;
    fixture_fresh_run("lock", 1);
    CHECK_OK(sv_run_open(context, fixture_folder, &identity, false, &run));
    CHECK_INT(open_in_child(), SV_STORAGE);
    CHECK_STATUS(SV_STORAGE, sv_run_open(context, fixture_folder, &identity, false, &second));
    char number[32];
    snprintf(number, sizeof number, "%ld", (long)getpid());
    CHECK(strstr(context->error.message, number) != NULL);
    CHECK_OK(sv_run_open_read(context, fixture_folder, &reader)); /* looking is allowed */
    sv_run_close(context, reader);
    const sv_record record = fixture_record(2, 1);
    CHECK_OK(sv_run_put(context, &record, run)); /* the reader took no lock away */
    CHECK_INT(open_in_child(), SV_STORAGE);
    sv_run_close(context, run);
    CHECK_INT(open_in_child(), SV_OK);
}

/* Writes records until killed; tells each one that is acknowledged through the pipe. */
static void write_until_killed(int pipe_end, int64_t from)
{
    const sv_run_identity identity = fixture_identity();
    sv_context context;
    sv_run *run = NULL;
    sv_context_init(&context);
    if (sv_run_open(&context, fixture_folder, &identity, false, &run) != SV_OK)
        _exit(1);
    for (int64_t k = from;; k++) {
        const sv_record record = fixture_record((int32_t)(k % 3), k / 3);
        if (sv_run_put(&context, &record, run) != SV_OK ||
            write(pipe_end, &k, sizeof k) != sizeof k)
            _exit(1);
    }
}

/*
 * Kills a child that writes: after it acknowledged `wanted` records and `pause` microseconds, or
 * with none wanted at any stage of making the folder. Returns the last acknowledged; -1: none.
 */
static int64_t kill_a_writer(int wanted, useconds_t pause, int64_t from)
{
    int ends[2];
    int64_t last = -1, number;
    CHECK(pipe(ends) == 0);
    fflush(NULL);
    const pid_t child = fork();
    if (child == 0) {
        close(ends[0]);
        write_until_killed(ends[1], from);
    }
    close(ends[1]);
    for (int k = 0; k < wanted && read(ends[0], &number, sizeof number) == sizeof number; k++)
        last = number;
    usleep(pause);
    kill(child, SIGKILL);
    while (read(ends[0], &number, sizeof number) == sizeof number)
        last = number;
    close(ends[0]);
    int state = 0;
    CHECK(waitpid(child, &state, 0) == child && WIFSIGNALED(state));
    return last;
}

/* Everything up to `last` must be there, with its right numbers. */
static void check_all_there(sv_run *run, int64_t last)
{
    const int64_t realisations = last / 3 + 2;
    sv_ensemble ensemble = fixture_ensemble(3, realisations);
    sv_index loaded = 0;
    CHECK_OK(sv_run_load(test_context(), run, &ensemble, &loaded));
    CHECK(loaded >= last + 1);
    for (int64_t k = 0; k <= last; k++) {
        const sv_record expected = fixture_record((int32_t)(k % 3), k / 3);
        CHECK(fixture_holds(&ensemble, &expected));
    }
    sv_ensemble_free(test_context(), &ensemble);
}

SV_TEST(a_killed_writer_loses_nothing_it_acknowledged)
{
    sv_context *context = test_context();
    const sv_run_identity identity = fixture_identity();
    snprintf(fixture_folder, sizeof fixture_folder, "%s", test_scratch("killed"));
    int64_t last = -1;
    for (int round = 0; round < 25; round++) {
        const int wanted = round < 6 ? 0 : round % 5 + 1;
        const useconds_t pause = (useconds_t)(round < 6 ? 900 * round : 83 * (round % 11));
        const int64_t reached = kill_a_writer(wanted, pause, last + 1);
        last = reached > last ? reached : last;
        sv_run *run = NULL;
        if (last >= 0) { /* a reader copes with what the kill left */
            CHECK_OK(sv_run_open_read(context, fixture_folder, &run));
            if (run != NULL)
                check_all_there(run, last);
            sv_run_close(context, run);
        }
        run = NULL;
        CHECK_OK(sv_run_open(context, fixture_folder, &identity, false, &run));
        if (run != NULL)
            check_all_there(run, last);
        sv_run_close(context, run);
    }
    CHECK(last > 20); /* the children did work */
}

SV_TEST(a_full_disk_is_reported_and_keeps_the_rows)
{
    sv_context *context = test_context();
    const sv_run_identity identity = fixture_identity();
    struct rlimit before, tight;
    sv_run *run = NULL;
    fixture_fresh_run("full", 2);
    CHECK_OK(sv_run_open(context, fixture_folder, &identity, false, &run));
    struct stat info;
    CHECK(stat(fixture_path("ledger.sqlite"), &info) == 0);
    void (*old_action)(int) = signal(SIGXFSZ, SIG_IGN);
    CHECK(getrlimit(RLIMIT_FSIZE, &before) == 0);
    tight = before;
    tight.rlim_cur = (rlim_t)info.st_size + 4096;
    CHECK(setrlimit(RLIMIT_FSIZE, &tight) == 0);
    sv_status status = SV_OK;
    int64_t written = 2;
    for (; written < 200 && status == SV_OK; written++) {
        const sv_record record = fixture_record(0, written);
        status = sv_run_put(context, &record, run);
    }
    const sv_error error = context->error;
    CHECK(setrlimit(RLIMIT_FSIZE, &before) == 0);
    signal(SIGXFSZ, old_action);
    CHECK_INT(status, SV_STORAGE);
    CHECK(strstr(error.message, "File too large") != NULL || strstr(error.message, "full") != NULL);
    sv_run_close(context, run);
    run = NULL;
    CHECK_OK(sv_run_open(context, fixture_folder, &identity, false, &run));
    sv_ensemble ensemble = fixture_ensemble(3, 200);
    sv_index loaded = 0;
    CHECK_OK(sv_run_load(context, run, &ensemble, &loaded));
    CHECK_INT(loaded, 4 + written - 1);
    sv_ensemble_free(test_context(), &ensemble);
    sv_run_close(context, run);
}
