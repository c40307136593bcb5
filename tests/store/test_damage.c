/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Ledgers from elsewhere: flipped bytes, forged rows, foreign tables, links. */
#include <unistd.h>

#include "fixture.h"

/* Opens and loads; must end in SV_OK or SV_STORAGE with a message, never in a crash. */
static sv_status read_all(void)
{
    sv_context *context = test_context();
    sv_run *run = NULL;
    sv_ensemble ensemble = fixture_ensemble(3, 4);
    sv_index loaded = 0;
    int64_t realisations = 0;
    int32_t points = 0;
    sv_status status = sv_run_open_read(context, fixture_folder, &run);
    if (status == SV_OK)
        status = sv_run_extent(context, run, &realisations, &points);
    if (status == SV_OK)
        status = sv_run_load(context, run, &ensemble, &loaded);
    if (status == SV_OK) { /* then every number must be right */
        CHECK_INT(loaded, 3 * realisations);
        for (int64_t i = 0; i < 3 * realisations; i++) {
            const int64_t k = i % realisations, point = i / realisations;
            const sv_record expected = fixture_record((int32_t)point, k);
            CHECK(fixture_holds(&ensemble, &expected));
        }
    }
    sv_run_close(context, run);
    sv_ensemble_free(test_context(), &ensemble);
    return status;
}

/* SV_OK with wrong numbers would be the worst answer. */
static void check_reading_is_safe(const char *what, long offset)
{
    const sv_status status = read_all();
    test_check(status == SV_OK || status == SV_STORAGE, __FILE__, __LINE__, "%s at %ld gave %d: %s",
               what, offset, (int)status, test_context()->error.message);
}

static unsigned char *slurp(const char *path, long *ret_size)
{
    FILE *stream = fopen(path, "rb");
    if (stream == NULL || fseek(stream, 0, SEEK_END) != 0)
        abort();
    const long size = ftell(stream);
    unsigned char *bytes = malloc((size_t)size);
    rewind(stream);
    if (bytes == NULL || fread(bytes, 1, (size_t)size, stream) != (size_t)size)
        abort();
    fclose(stream);
    *ret_size = size;
    return bytes;
}

static void spill(const char *path, const unsigned char *bytes, long size)
{
    FILE *stream = fopen(path, "wb");
    if (stream == NULL || fwrite(bytes, 1, (size_t)size, stream) != (size_t)size)
        abort();
    fclose(stream);
}

SV_TEST(flipped_bytes_never_crash_and_never_give_wrong_numbers)
{
    fixture_fresh_run("flip", 4);
    char path[1200];
    snprintf(path, sizeof path, "%s", fixture_path("ledger.sqlite"));
    long size;
    unsigned char *bytes = slurp(path, &size);
    int refused = 0;
    for (long at = 0; at < size; at += at < 2000 ? 37 : 211) {
        const unsigned char old_byte = bytes[at];
        bytes[at] ^= 0x5a;
        spill(path, bytes, size);
        check_reading_is_safe("a flipped byte", at);
        bytes[at] = old_byte;
        refused += test_context()->error.status == SV_STORAGE;
        test_context()->error.status = SV_OK;
    }
    CHECK(refused > 30);
    spill(path, bytes, size);
    CHECK_OK(read_all());
    free(bytes);
}

SV_TEST(a_truncated_ledger_is_refused)
{
    fixture_fresh_run("short", 4);
    char path[1200];
    snprintf(path, sizeof path, "%s", fixture_path("ledger.sqlite"));
    long size;
    unsigned char *bytes = slurp(path, &size);
    for (long keep = 0; keep < size; keep += 1111) {
        spill(path, bytes, keep);
        CHECK_STATUS(SV_STORAGE, read_all());
    }
    spill(path, bytes, size);
    CHECK_OK(read_all());
    free(bytes);
}

/* Texts of the triggers, in order; n of them. */
static int read_triggers(sqlite3 *ledger, char texts[16][300])
{
    sqlite3_stmt *statement = NULL;
    int n = 0;
    CHECK_INT(sqlite3_prepare_v2(ledger,
                                 "SELECT sql FROM sqlite_schema WHERE type = 'trigger' "
                                 "ORDER BY rowid",
                                 -1, &statement, NULL),
              SQLITE_OK);
    while (n < 16 && sqlite3_step(statement) == SQLITE_ROW)
        snprintf(texts[n++], 300, "%s", (const char *)sqlite3_column_text(statement, 0));
    sqlite3_finalize(statement);
    return n;
}

/* Changes rows in spite of the triggers: takes them off and puts them back word for word. */
static void forge(const char *name, const char *sql)
{
    char texts[16][300];
    sqlite3 *ledger = NULL;
    fixture_fresh_run(name, 4);
    CHECK_INT(sqlite3_open(fixture_path("ledger.sqlite"), &ledger), SQLITE_OK);
    const int n = read_triggers(ledger, texts);
    CHECK_INT(n, 11);
    for (int i = 0; i < n; i++) {
        char drop[100], trigger[64];
        CHECK_INT(sscanf(texts[i], "CREATE TRIGGER %63s", trigger), 1);
        snprintf(drop, sizeof drop, "DROP TRIGGER %s", trigger);
        CHECK_INT(sqlite3_exec(ledger, drop, NULL, NULL, NULL), SQLITE_OK);
    }
    CHECK_INT(sqlite3_exec(ledger, "PRAGMA ignore_check_constraints = ON", NULL, NULL, NULL), 0);
    CHECK_INT(sqlite3_exec(ledger, sql, NULL, NULL, NULL), SQLITE_OK);
    for (int i = 0; i < n; i++)
        CHECK_INT(sqlite3_exec(ledger, texts[i], NULL, NULL, NULL), SQLITE_OK);
    sqlite3_close(ledger);
}

SV_TEST(forged_rows_are_refused)
{
    static const char *const forgeries[] = {
        "UPDATE outcome SET value = value + 1e-12 WHERE point = 1 AND realisation = 2",
        "UPDATE outcome SET value = NULL WHERE point = 1 AND realisation = 2",
        "UPDATE outcome SET reason = 'because' WHERE point = 0 AND realisation = 0",
        "UPDATE outcome SET reason = printf('%.*c', 100000, 'x') WHERE position = 1",
        "UPDATE outcome SET verdict = 77 WHERE point = 2 AND realisation = 3",
        "UPDATE outcome SET marker = 'another' WHERE position = 0",
        "UPDATE outcome SET position = 5 WHERE position = 1",
        "UPDATE outcome SET electrons = 9223372036854775807 WHERE point = 0",
        "DELETE FROM outcome WHERE position = 1 AND realisation = 0",
        "UPDATE realisation SET outcomes = 2000000000 WHERE point = 0",
        "UPDATE realisation SET outcomes = -1 WHERE point = 0",
        "UPDATE realisation SET status = 1000 WHERE point = 0",
        "UPDATE realisation SET realisation = 9223372036854775807 WHERE point=2 AND realisation=3",
        "UPDATE realisation SET point = -5 WHERE point = 2 AND realisation = 3",
        "UPDATE realisation SET checksum = '' WHERE point = 2 AND realisation = 3",
        "UPDATE meta SET value = printf('%.*c', 1000, 'x') WHERE key = 'markers'",
        "UPDATE meta SET value = '99999999999' WHERE key = 'points'",
    };
    for (size_t i = 0; i < sizeof forgeries / sizeof *forgeries; i++) {
        char name[32];
        snprintf(name, sizeof name, "forged%zu", i);
        forge(name, forgeries[i]);
        const sv_status status = read_all();
        test_check(status == SV_STORAGE, __FILE__, __LINE__, "\"%s\" gave %d", forgeries[i],
                   (int)status);
    }
    /* The forging itself is not what is refused. */
    forge("unforged", "SELECT 1");
    CHECK_OK(read_all());
}

SV_TEST(other_tables_and_other_files_are_refused)
{
    fixture_fresh_run("tables", 1);
    CHECK_INT(fixture_sql("CREATE VIEW v AS SELECT * FROM realisation"), SQLITE_OK);
    CHECK_STATUS(SV_STORAGE, read_all());
    fixture_fresh_run("application", 1);
    CHECK_INT(fixture_sql("PRAGMA application_id = 7"), SQLITE_OK);
    CHECK_STATUS(SV_STORAGE, read_all());
    fixture_fresh_run("layout", 1);
    CHECK_INT(fixture_sql("PRAGMA user_version = 1"), SQLITE_OK);
    CHECK_STATUS(SV_STORAGE, read_all());
    CHECK(strstr(test_context()->error.message, "layout 1") != NULL);
    fixture_fresh_run("crowd", 1);
    CHECK_INT(
        fixture_sql("WITH RECURSIVE n(i) AS (SELECT 1 UNION ALL SELECT i + 1 FROM n WHERE i < "
                    "5000) INSERT INTO meta SELECT 'key' || i, 'x', '' FROM n"),
        SQLITE_OK);
    CHECK_STATUS(SV_STORAGE, read_all());
}

/* A write-ahead log would be read from, and made in, a folder that is only looked at. */
SV_TEST(a_write_ahead_log_is_refused_before_it_is_used)
{
    fixture_fresh_run("wal", 2);
    CHECK_INT(fixture_sql("PRAGMA journal_mode = WAL"), SQLITE_OK);
    CHECK(symlink("/dev/zero", fixture_path("ledger.sqlite-wal")) == 0);
    CHECK_STATUS(SV_STORAGE, read_all());
    CHECK(strstr(test_context()->error.message, "write-ahead") != NULL);
    CHECK(access(fixture_path("ledger.sqlite-shm"), F_OK) != 0);
    const sv_run_identity identity = fixture_identity();
    sv_run *run = NULL;
    CHECK_STATUS(SV_STORAGE, sv_run_open(test_context(), fixture_folder, &identity, false, &run));
}

SV_TEST(links_are_not_followed)
{
    static const char *const names[] = {"ledger.sqlite", "sheet.resolved.yaml"};
    const sv_run_identity identity = fixture_identity();
    for (int i = 0; i < 2; i++) {
        char path[1200], moved[1200];
        fixture_fresh_run(i == 0 ? "link0" : "link1", 1);
        snprintf(path, sizeof path, "%s", fixture_path(names[i]));
        snprintf(moved, sizeof moved, "%s", test_scratch(i == 0 ? "moved0" : "moved1"));
        CHECK(rename(path, moved) == 0 && symlink(moved, path) == 0);
        CHECK_STATUS(SV_STORAGE, read_all());
        sv_run *run = NULL;
        CHECK_STATUS(SV_STORAGE,
                     sv_run_open(test_context(), fixture_folder, &identity, false, &run));
    }
}

SV_TEST(a_journal_that_names_another_file_is_refused)
{
    static const unsigned char mark[8] = {0xd9, 0xd5, 0x05, 0xf9, 0x20, 0xa1, 0x63, 0xd7};
    unsigned char journal[1024] = {0};
    fixture_fresh_run("journal", 1);
    memcpy(journal + sizeof journal - 8, mark, 8);
    spill(fixture_path("ledger.sqlite-journal"), journal, sizeof journal);
    CHECK_STATUS(SV_STORAGE, read_all());
    CHECK(strstr(test_context()->error.message, "journal") != NULL);
}
