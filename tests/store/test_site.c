/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The sums over sites of a ledger: exact in any order, of the right realisations, after a kill. */
#include <ftw.h>
#include <signal.h>
#include <sys/stat.h>
#include <sys/wait.h>
#include <unistd.h>

#include "fixture.h"

enum { ENTRIES = 5 };

static char memory_folder[64];

static int remove_one(const char *path, const struct stat *info, int type, struct FTW *where)
{
    (void)info, (void)type, (void)where;
    return remove(path);
}

static void remove_memory_folder(void)
{
    nftw(memory_folder, remove_one, 16, FTW_DEPTH | FTW_PHYS);
}

/* Thousands of transactions: in memory where there is such a place, since nothing here cuts the
 * power. */
static void fresh_run(const char *name)
{
    if (memory_folder[0] == '\0') {
        snprintf(memory_folder, sizeof memory_folder, "/dev/shm/selvedge-test-XXXXXX");
        if (mkdtemp(memory_folder) == NULL)
            snprintf(memory_folder, sizeof memory_folder, "%.60s", test_scratch("sums"));
        atexit(remove_memory_folder);
    }
    mkdir(memory_folder, 0777);
    snprintf(fixture_folder, sizeof fixture_folder, "%s/%s", memory_folder, name);
    fixture_make_run(fixture_folder, 0);
}

static int64_t value_of(int32_t point, int64_t realisation, int entry)
{
    sv_stream stream = sv_stream_make(9 + (uint64_t)point, "sites", (uint64_t)realisation);
    if (entry == 2 && realisation % 4 == 1)
        return SV_SITE_ABSENT;
    return llrint(ldexp(sv_stream_uniform(&stream, entry, 0, 0) - 0.5, SV_SITE_BITS + 10));
}

static sv_status put_one(sv_context *context, sv_run *run, int32_t point, int64_t k,
                         int64_t counted)
{
    int64_t values[ENTRIES];
    for (int e = 0; e < ENTRIES; e++)
        values[e] = value_of(point, k, e);
    sv_record record = fixture_record(point, k);
    record.sites = record.vacancies = k;
    /* Every tenth has no resolved marker. */
    sv_site_record sites = {.n = k % 10 == 7 ? 0 : ENTRIES, .values = values, .counted = counted};
    record.maps = &sites;
    return sv_run_put(context, &record, run);
}

static sv_run *open_run(void)
{
    const sv_run_identity identity = fixture_identity();
    sv_run *run = NULL;
    CHECK_OK(sv_run_open(test_context(), fixture_folder, &identity, false, &run));
    return run;
}

/* Do the sums of the leading realisations of a point equal those made here? */
static bool holds(sv_run *run, int32_t point, int64_t counted, int64_t expected)
{
    sv_site_sum sum = {0};
    CHECK_OK(sv_run_load_sites(test_context(), run, point, counted, ENTRIES, &sum));
    bool good = sum.realisations == expected;
    for (int e = 0; e < ENTRIES; e++) {
        sv_wide total = 0, square = 0;
        int64_t count = 0;
        for (int64_t k = 0; k < sum.realisations; k++) {
            const int64_t value = k % 10 == 7 ? SV_SITE_ABSENT : value_of(point, k, e);
            if (value == SV_SITE_ABSENT)
                continue;
            count++;
            total += value;
            square += (sv_wide)value * value;
        }
        good = good && sum.count[e] == count && sum.sum[e] == total && sum.square[e] == square;
    }
    sv_site_sum_free(test_context(), &sum);
    return good;
}

static int64_t rows_at(int level)
{
    char sql[100];
    int64_t rows = -1;
    sqlite3 *ledger = NULL;
    sqlite3_stmt *statement = NULL;
    snprintf(sql, sizeof sql, "SELECT count(*) FROM site_sum WHERE point = 0 AND level = %d",
             level);
    if (sqlite3_open(fixture_path("ledger.sqlite"), &ledger) == SQLITE_OK &&
        sqlite3_prepare_v2(ledger, sql, -1, &statement, NULL) == SQLITE_OK &&
        sqlite3_step(statement) == SQLITE_ROW)
        rows = sqlite3_column_int64(statement, 0);
    sqlite3_finalize(statement);
    sqlite3_close(ledger);
    return rows;
}

SV_TEST(sums_do_not_depend_on_the_order)
{
    fresh_run("order");
    sv_run *run = open_run();
    for (int64_t k = 0; k < 200; k++) {
        CHECK_OK(put_one(test_context(), run, 0, k, k < 150 ? k : 150));
        CHECK_OK(put_one(test_context(), run, 1, (k * 77) % 200, 0)); /* nothing joined yet */
    }
    CHECK_INT(rows_at(0), 200 - 128); /* the third block is full, but does not count as a whole */
    CHECK_INT(rows_at(1), 2);
    CHECK(holds(run, 0, 200, 200));
    CHECK(holds(run, 1, 200, 200));
    CHECK_OK(sv_run_fold_sites(test_context(), run, 0, 200));
    CHECK_OK(sv_run_fold_sites(test_context(), run, 1, 200));
    CHECK_INT(rows_at(0), 8);
    CHECK_INT(rows_at(1), 3);
    CHECK(holds(run, 0, 200, 200));
    CHECK(holds(run, 1, 200, 200));
    CHECK_OK(sv_run_check_sites(test_context(), run));
    sv_run_close(test_context(), run);
}

/* What a stop rule does not count stays apart; a rule tightened later costs less than a block. */
SV_TEST(only_the_counted_ones_are_in)
{
    fresh_run("counted");
    sv_run *run = open_run();
    for (int64_t k = 0; k < 192; k++)
        CHECK_OK(put_one(test_context(), run, 0, k, k < 150 ? k : 150));
    CHECK_OK(sv_run_fold_sites(test_context(), run, 0, 150));
    CHECK(holds(run, 0, 150, 150));
    CHECK(holds(run, 0, 141, 141));
    CHECK(holds(run, 0, 128, 128));
    CHECK(holds(run, 0, 100, 64));
    CHECK(holds(run, 0, 0, 0));
    sv_run_close(test_context(), run);
}

/* 64² realisations are one row, whatever came before. */
SV_TEST(long_runs_stay_small)
{
    fresh_run("long");
    sv_run *run = open_run();
    for (int64_t k = 0; k < 4100; k++)
        if (k != 70)
            CHECK_OK(put_one(test_context(), run, 0, k, k < 70 ? k : 70));
    CHECK_INT(rows_at(0), 4100 - 1 - 64);
    CHECK_OK(put_one(test_context(), run, 0, 70, 4099));
    CHECK_INT(rows_at(0), 4);
    CHECK_INT(rows_at(1), 0);
    CHECK_INT(rows_at(2), 1);
    CHECK(holds(run, 0, 4100, 4100));
    CHECK_OK(sv_run_check_sites(test_context(), run));
    sv_run_close(test_context(), run);
}

SV_TEST(a_kill_loses_and_repeats_nothing)
{
    for (int turn = 0; turn < 5; turn++) {
        char name[20];
        snprintf(name, sizeof name, "kill%d", turn);
        fresh_run(name);
        fflush(NULL);
        const pid_t child = fork();
        if (child == 0) {
            const sv_run_identity identity = fixture_identity();
            sv_context context;
            sv_run *run = NULL;
            sv_context_init(&context);
            if (sv_run_open(&context, fixture_folder, &identity, false, &run) != SV_OK)
                _exit(1);
            for (int64_t k = 0; k < 100000; k++)
                if (put_one(&context, run, 0, k, k) != SV_OK)
                    _exit(1);
            _exit(0);
        }
        usleep((useconds_t)(30000 + 17000 * turn));
        kill(child, SIGKILL);
        waitpid(child, NULL, 0);
        sv_run *run = open_run();
        int64_t extent = 0;
        int32_t points = 0;
        CHECK_OK(sv_run_extent(test_context(), run, &extent, &points));
        CHECK_OK(sv_run_check_sites(test_context(), run));
        CHECK(holds(run, 0, extent, extent));
        for (int64_t k = extent; k < extent + 70; k++)
            CHECK_OK(put_one(test_context(), run, 0, k, k));
        CHECK(holds(run, 0, extent + 70, extent + 70));
        sv_run_close(test_context(), run);
    }
}

SV_TEST(sums_are_guarded)
{
    fresh_run("guard");
    sv_run *run = open_run();
    sv_site_sum sum = {0};
    for (int64_t k = 0; k < 3; k++)
        CHECK_OK(put_one(test_context(), run, 0, k, k));
    CHECK_STATUS(SV_STORAGE, sv_run_load_sites(test_context(), run, 0, 3, ENTRIES + 1, &sum));
    sv_run_close(test_context(), run);
    CHECK_INT(fixture_sql("UPDATE site_sum SET data = x'00'"), SQLITE_CONSTRAINT);
    CHECK_INT(fixture_sql("DELETE FROM site_sum WHERE block = 1"), SQLITE_CONSTRAINT);
    CHECK_INT(fixture_sql("INSERT INTO site_sum VALUES (0, 0, 3, x'', 'made up')"), SQLITE_OK);
    run = open_run();
    CHECK_STATUS(SV_STORAGE, sv_run_check_sites(test_context(), run));
    CHECK(strstr(test_context()->error.message, "3 realisations") != NULL);
    CHECK_STATUS(SV_STORAGE, sv_run_load_sites(test_context(), run, 0, 4, ENTRIES, &sum));
    CHECK(strstr(test_context()->error.message, "checksum") != NULL);
    sv_run_close(test_context(), run);
}

/* Parts of tasks in another order, twice, over a whole run, and a whole run over parts. */
SV_TEST(merged_sums_are_those_of_one_run)
{
    char parts[4][1200];
    const char *order[2][3] = {{parts[2], parts[0], parts[1]}, {parts[3], parts[0], parts[3]}};
    for (int p = 0; p < 4; p++) {
        char name[20];
        snprintf(name, sizeof name, "part%d", p);
        fresh_run(name);
        snprintf(parts[p], sizeof parts[p], "%s", fixture_folder);
        sv_run *run = open_run();
        for (int64_t k = 0; k < 150; k++)
            if (p == 3 || k % 3 == p)
                CHECK_OK(put_one(test_context(), run, 0, k, p == 3 ? k : 0));
        sv_run_close(test_context(), run);
    }
    for (int t = 0; t < 2; t++) {
        int64_t added = 0, present = 0;
        fresh_run(t == 0 ? "joined0" : "joined1");
        sv_run *run = open_run();
        if (t == 1)
            for (int64_t k = 70; k < 80; k++)
                CHECK_OK(put_one(test_context(), run, 0, k, 0));
        CHECK_OK(sv_run_merge(test_context(), run, order[t], 3, &added, &present));
        CHECK_INT(added, t == 0 ? 150 : 140);
        CHECK(holds(run, 0, 150, 150));
        CHECK_OK(sv_run_fold_sites(test_context(), run, 0, 150));
        CHECK_OK(sv_run_merge(test_context(), run, order[1 - t], 3, &added, &present));
        CHECK_INT(added, 0);
        CHECK(holds(run, 0, 150, 150));
        CHECK_INT(rows_at(1), 2);
        CHECK_INT(rows_at(0), 22);
        CHECK_OK(sv_run_check_sites(test_context(), run));
        sv_run_close(test_context(), run);
    }
}
