/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Round trip, identity, force, interrupted creation, reading only. */
#include <sqlite3.h>
#include <sys/stat.h>
#include <unistd.h>

#include "fixture.h"

static const char *fresh(const char *name)
{
    snprintf(fixture_folder, sizeof fixture_folder, "%s", test_scratch(name));
    return fixture_folder;
}

static void put_file(const char *path, const char *text)
{
    FILE *stream = fopen(path, "w");
    CHECK(stream != NULL);
    if (stream != NULL) {
        fputs(text, stream);
        fclose(stream);
    }
}

SV_TEST(what_was_put_comes_back_bit_for_bit)
{
    sv_context *context = test_context();
    fixture_make_run(fresh("round"), 7);
    sv_run *run = NULL;
    CHECK_OK(sv_run_open_read(context, fixture_folder, &run));
    sv_ensemble ensemble = fixture_ensemble(3, 5); /* smaller than the run: the rest is skipped */
    sv_index loaded = 0;
    CHECK_OK(sv_run_load(context, run, &ensemble, &loaded));
    CHECK_INT(loaded, 15);
    for (int32_t point = 0; point < 3; point++)
        for (int64_t k = 0; k < 5; k++) {
            const sv_record expected = fixture_record(point, k);
            CHECK(ensemble.done[point * 5 + k]);
            CHECK(fixture_holds(&ensemble, &expected));
        }
    int64_t realisations = 0;
    int32_t points = 0;
    CHECK_OK(sv_run_extent(context, run, &realisations, &points));
    CHECK_INT(realisations, 7);
    CHECK_INT(points, 3);
    CHECK_TEXT(sv_run_meta(run, "kernel"), "openblas pthread test");
    CHECK_TEXT(sv_run_meta(run, "markers"), "local_chern bott");
    CHECK_INT(strlen(sv_run_meta(run, "identity_digest")), 64);
    CHECK(sv_run_meta(run, "nothing of that name") == NULL);
    sv_ensemble_free(test_context(), &ensemble);
    sv_run_close(context, run);
}

SV_TEST(a_record_may_be_put_twice_but_not_changed)
{
    sv_context *context = test_context();
    const sv_run_identity identity = fixture_identity();
    sv_run *run = NULL;
    CHECK_OK(sv_run_open(context, fresh("twice"), &identity, false, &run));
    sv_record record = fixture_record(1, 4);
    CHECK_OK(sv_run_put(context, &record, run));
    record.seconds = 99; /* a time is no result */
    CHECK_OK(sv_run_put(context, &record, run));
    record.outcomes[0].value = nextafter(record.outcomes[0].value, 2.0);
    CHECK_STATUS(SV_STORAGE, sv_run_put(context, &record, run));
    CHECK(strstr(context->error.message, "realisation 4 of point 1") != NULL);
    record = fixture_record(1, 4);
    snprintf(record.outcomes[1].reason, sizeof record.outcomes[1].reason, "another reason");
    CHECK_STATUS(SV_STORAGE, sv_run_put(context, &record, run));
    /* The refusal leaves no open transaction behind. */
    record = fixture_record(1, 5);
    CHECK_OK(sv_run_put(context, &record, run));
    sv_run_close(context, run);
}

SV_TEST(a_failed_realisation_is_kept_as_such)
{
    sv_context *context = test_context();
    const sv_run_identity identity = fixture_identity();
    sv_run *run = NULL;
    CHECK_OK(sv_run_open(context, fresh("failed"), &identity, false, &run));
    sv_record record = {.point = 0, .realisation = 0, .status = SV_NUMERICAL};
    record.seconds = (double)NAN;
    CHECK_OK(sv_run_put(context, &record, run));
    sv_ensemble ensemble = fixture_ensemble(1, 1);
    sv_index loaded = 0;
    CHECK_OK(sv_run_load(context, run, &ensemble, &loaded));
    CHECK_INT(loaded, 1);
    CHECK(fixture_holds(&ensemble, &record));
    record.n_outcomes = 3; /* more than the run has markers */
    CHECK_STATUS(SV_STORAGE, sv_run_put(context, &record, run));
    record.n_outcomes = SV_MAX_MARKERS + 1;
    CHECK_STATUS(SV_INTERNAL, sv_run_put(context, &record, run));
    sv_ensemble_free(test_context(), &ensemble);
    sv_run_close(context, run);
}

SV_TEST(another_identity_is_refused_with_what_differs)
{
    sv_context *context = test_context();
    fixture_make_run(fresh("identity"), 2);
    sv_run *run = NULL;
    sv_run_identity identity = fixture_identity();
    identity.identity = "model: qi_wu_zhang\nseed: 2\nmarkers: local_chern bott\n";
    CHECK_STATUS(SV_OTHER_RUN, sv_run_open(context, fixture_folder, &identity, false, &run));
    CHECK(strstr(context->error.message, "\"seed: 1\"") != NULL);
    CHECK(strstr(context->error.message, "\"seed: 2\"") != NULL);
    identity = fixture_identity();
    identity.program_version = "0.2.0";
    CHECK_STATUS(SV_OTHER_RUN, sv_run_open(context, fixture_folder, &identity, false, &run));
    CHECK(strstr(context->error.message, "0.1.0") != NULL);
    CHECK(strstr(context->error.message, "0.2.0") != NULL);
    identity = fixture_identity();
    identity.kernel = "another kernel";
    CHECK_STATUS(SV_OTHER_RUN, sv_run_open(context, fixture_folder, &identity, false, &run));
    CHECK(strstr(context->error.message, "another kernel") != NULL);
    /* Refusals change nothing: the first identity still opens. */
    identity = fixture_identity();
    CHECK_OK(sv_run_open(context, fixture_folder, &identity, false, &run));
    sv_run_close(context, run);
}

static int64_t count_events(const char *what)
{
    sqlite3 *ledger = NULL;
    sqlite3_stmt *statement = NULL;
    int64_t count = -1;
    if (sqlite3_open_v2(fixture_path("ledger.sqlite"), &ledger, SQLITE_OPEN_READONLY, NULL) ==
            SQLITE_OK &&
        sqlite3_prepare_v2(ledger, "SELECT count(*) FROM event WHERE what = ?1", -1, &statement,
                           NULL) == SQLITE_OK) {
        sqlite3_bind_text(statement, 1, what, -1, SQLITE_STATIC);
        if (sqlite3_step(statement) == SQLITE_ROW)
            count = sqlite3_column_int64(statement, 0);
    }
    sqlite3_finalize(statement);
    sqlite3_close(ledger);
    return count;
}

SV_TEST(force_records_the_change_and_keeps_the_rows)
{
    sv_context *context = test_context();
    fixture_make_run(fresh("force"), 2);
    sv_run *run = NULL;
    sv_run_identity identity = fixture_identity();
    identity.kernel = "another kernel";
    CHECK_OK(sv_run_open(context, fixture_folder, &identity, true, &run));
    CHECK_OK(sv_run_event(context, run, "stop", "enough"));
    CHECK_TEXT(sv_run_meta(run, "kernel"), "another kernel");
    sv_ensemble ensemble = fixture_ensemble(3, 2);
    sv_index loaded = 0;
    CHECK_OK(sv_run_load(context, run, &ensemble, &loaded));
    CHECK_INT(loaded, 6);
    sv_ensemble_free(test_context(), &ensemble);
    sv_run_close(context, run);
    CHECK_INT(count_events("identity change"), 1);
    CHECK_INT(count_events("start"), 1);
    CHECK_INT(count_events("continue"), 1);
    CHECK_INT(count_events("stop"), 1);
    CHECK_INT(count_events("end"), 2);
    /* Rows of another shape cannot be continued at all. */
    static const char *const other[2] = {"bott", "local_chern"};
    identity.kernel = "a third kernel";
    identity.markers = other;
    CHECK_STATUS(SV_OTHER_RUN, sv_run_open(context, fixture_folder, &identity, true, &run));
    identity.markers = fixture_markers;
    identity.n_points = 4;
    CHECK_STATUS(SV_OTHER_RUN, sv_run_open(context, fixture_folder, &identity, true, &run));
    CHECK_INT(count_events("identity change"), 1);
}

SV_TEST(force_under_another_sheet_starts_over)
{
    sv_context *context = test_context();
    struct stat info;
    fixture_make_run(fresh("other-sheet"), 2);
    sv_run *run = NULL;
    sv_run_identity identity = fixture_identity();
    identity.identity = "something else\n";
    CHECK_STATUS(SV_OTHER_RUN, sv_run_open(context, fixture_folder, &identity, false, &run));
    CHECK_OK(sv_run_open(context, fixture_folder, &identity, true, &run));
    sv_ensemble ensemble = fixture_ensemble(3, 2);
    sv_index loaded = -1;
    CHECK_OK(sv_run_load(context, run, &ensemble, &loaded));
    CHECK_INT(loaded, 0);
    sv_ensemble_free(test_context(), &ensemble);
    sv_run_close(context, run);
    CHECK_INT(count_events("identity change"), 1);
    CHECK(stat(fixture_path("ledger.old-1.sqlite"), &info) == 0);
}

static int64_t loaded_from(const sv_run_identity *identity)
{
    sv_context *context = test_context();
    sv_run *run = NULL;
    sv_index loaded = -1;
    sv_ensemble ensemble = fixture_ensemble(3, 2);
    CHECK_OK(sv_run_open(context, fixture_folder, identity, false, &run));
    if (run != NULL)
        CHECK_OK(sv_run_load(context, run, &ensemble, &loaded));
    sv_run_close(context, run);
    sv_ensemble_free(test_context(), &ensemble);
    return loaded;
}

SV_TEST(a_folder_without_a_complete_sheet_counts_as_new)
{
    struct stat info;
    sv_run_identity identity = fixture_identity();
    fixture_make_run(fresh("torn"), 2);
    CHECK_INT(loaded_from(&identity), 6);
    identity.identity = "another sheet\n"; /* would be refused if the sheet were complete */
    CHECK(truncate(fixture_path("sheet.resolved.yaml"), 20) == 0);
    CHECK_INT(loaded_from(&identity), 0);
    CHECK(stat(fixture_path("ledger.old-1.sqlite"), &info) == 0); /* rows are never thrown away */
    CHECK(unlink(fixture_path("sheet.resolved.yaml")) == 0);
    CHECK_INT(loaded_from(&identity), 0);
    CHECK(stat(fixture_path("ledger.old-2.sqlite"), &info) != 0); /* there were none this time */
    CHECK(truncate(fixture_path("sheet.resolved.yaml"), 0) == 0);
    put_file(fixture_path("ledger.sqlite"), "garbage");
    CHECK_INT(loaded_from(&identity), 0);
    CHECK(stat(fixture_path("ledger.old-2.sqlite"), &info) == 0);
    CHECK(stat(fixture_path("sheet.resolved.yaml"), &info) == 0 &&
          info.st_size == (off_t)strlen(identity.resolved_sheet));
}

SV_TEST(a_folder_of_somebody_else_is_left_alone)
{
    sv_context *context = test_context();
    const sv_run_identity identity = fixture_identity();
    struct stat info;
    sv_run *run = NULL;
    CHECK(mkdir(fresh("foreign"), 0777) == 0);
    put_file(fixture_path("thesis.tex"), "do not touch");
    CHECK_STATUS(SV_STORAGE, sv_run_open(context, fixture_folder, &identity, true, &run));
    CHECK(strstr(context->error.message, "thesis.tex") != NULL);
    CHECK(stat(fixture_path(".lock"), &info) != 0 &&
          stat(fixture_path("ledger.sqlite"), &info) != 0);
    CHECK_STATUS(SV_STORAGE,
                 sv_run_open(context, fixture_path("thesis.tex"), &identity, false, &run));
    CHECK_STATUS(SV_STORAGE, sv_run_open(context, "", &identity, false, &run));
    CHECK_STATUS(SV_STORAGE, sv_run_open(context, "/proc/no such place", &identity, false, &run));
    CHECK(run == NULL);
}

SV_TEST(folders_above_are_made_and_odd_names_work)
{
    fresh("a/deep/er/folder with 'quotes' ?mode=memory");
    fixture_make_run(fixture_folder, 1);
    const sv_run_identity identity = fixture_identity();
    CHECK_INT(loaded_from(&identity), 3);
    char here[1024];
    CHECK(getcwd(here, sizeof here) != NULL);
    CHECK(chdir(test_scratch("a")) == 0);
    snprintf(fixture_folder, sizeof fixture_folder, "file:relative?mode=ro");
    fixture_make_run(fixture_folder, 1);
    struct stat info;
    CHECK(stat("file:relative?mode=ro/ledger.sqlite", &info) == 0);
    CHECK(chdir(here) == 0);
}

SV_TEST(inputs_are_copied_and_checked)
{
    sv_context *context = test_context();
    char source[1024], digest[65];
    snprintf(source, sizeof source, "%s", test_scratch("defects.csv"));
    put_file(source, "x,y\n1,2\n");
    sv_digest("x,y\n1,2\n", 8, digest);
    sv_run_input input = {.path = source, .name = "defects.csv", .digest = digest};
    sv_run_identity identity = fixture_identity();
    identity.inputs = &input;
    identity.n_inputs = 1;
    sv_run *run = NULL;
    char path[1200];
    CHECK_OK(sv_run_open(context, fresh("inputs"), &identity, false, &run));
    CHECK_OK(sv_run_path(context, run, "inputs/defects.csv", path, sizeof path));
    char *text = NULL;
    size_t size = 0;
    CHECK_OK(sv_read_file(context, path, 1000, &text, &size));
    CHECK(text != NULL && strcmp(text, "x,y\n1,2\n") == 0);
    sv_give(context, text);
    CHECK_STATUS(SV_STORAGE, sv_run_path(context, run, "x", path, 5));
    sv_run_close(context, run);
    put_file(source, "x,y\n1,3\n");
    run = NULL;
    CHECK_STATUS(SV_INVALID_INPUT, sv_run_open(context, fresh("inputs2"), &identity, false, &run));
    input.name = "../escape.csv";
    CHECK_STATUS(SV_INTERNAL, sv_run_open(context, fresh("inputs3"), &identity, false, &run));
    CHECK(run == NULL);
}

SV_TEST(reading_only_writes_nothing)
{
    sv_context *context = test_context();
    fixture_make_run(fresh("read"), 1);
    sv_run *run = NULL;
    CHECK_OK(sv_run_open_read(context, fixture_folder, &run));
    const sv_record record = fixture_record(0, 1);
    CHECK_STATUS(SV_STORAGE, sv_run_put(context, &record, run));
    CHECK_STATUS(SV_STORAGE, sv_run_event(context, run, "x", ""));
    sv_run_close(context, run);
    CHECK_INT(count_events("end"), 1);
    run = NULL;
    CHECK_STATUS(SV_STORAGE, sv_run_open_read(context, test_scratch("not there"), &run));
    put_file(fixture_path("sheet.resolved.yaml"), "selvedge: 1\nmodel: {name: haldane}\n");
    CHECK_STATUS(SV_STORAGE, sv_run_open_read(context, fixture_folder, &run));
    CHECK(strstr(context->error.message, "changed") != NULL);
    CHECK(run == NULL);
}

/* Fails the k-th allocation of a whole use of a run, k = 0, 1, 2 … */
static long allowed;
static sv_allocator plenty;

static void *scarce_take(size_t bytes, void *user)
{
    return allowed-- > 0 ? plenty.take(bytes, user) : NULL;
}

static sv_status use_run(sv_context *context, const sv_run_identity *identity)
{
    sv_run *run = NULL;
    sv_ensemble ensemble = {0};
    sv_index loaded = 0;
    const sv_record record = fixture_record(0, 0);
    sv_status status = sv_run_open(context, fixture_folder, identity, false, &run);
    if (status == SV_OK)
        status = sv_run_put(context, &record, run);
    sv_run_close(context, run);
    run = NULL;
    if (status == SV_OK)
        status = sv_run_open_read(context, fixture_folder, &run);
    if (status == SV_OK)
        status = sv_ensemble_init(context, 1, 1, 2, &ensemble);
    if (status == SV_OK)
        status = sv_run_load(context, run, &ensemble, &loaded);
    sv_run_close(context, run);
    sv_ensemble_free(test_context(), &ensemble);
    return status;
}

SV_TEST(every_allocation_may_fail)
{
    sv_context *context = test_context();
    const sv_run_identity identity = fixture_identity();
    sv_status status = SV_NO_MEMORY;
    long k = 0;
    fresh("scarce");
    plenty = context->allocator;
    context->allocator.take = scarce_take;
    for (; status != SV_OK && k < 1000; k++) {
        allowed = k;
        status = use_run(context, &identity);
        CHECK(status == SV_OK || status == SV_NO_MEMORY);
    }
    context->allocator = plenty;
    CHECK(status == SV_OK && k > 20);
}
