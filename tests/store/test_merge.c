/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Joining the parts of tasks: what is there twice, what differs, what is refused, all or nothing.
 */
#include <unistd.h>

#include "fixture.h"

enum { N_PARTS = 3, N_REALISATIONS = 5 };

/* Folder of part `task` of three, with its records; `twist` changes one value. */
static const char *make_part(int task, double twist, char *path, size_t size)
{
    sv_run_identity identity = fixture_identity();
    sv_run *run = NULL;
    char name[32];
    snprintf(name, sizeof name, "part-%d%s", task, twist > 0.0 ? "-twisted" : "");
    snprintf(path, size, "%s", test_scratch(name));
    identity.task = task;
    identity.tasks = N_PARTS;
    identity.realisations = N_REALISATIONS;
    CHECK_OK(sv_run_open(test_context(), path, &identity, false, &run));
    for (int32_t p = 0; run != NULL && p < 3; p++)
        for (int64_t k = 0; k < N_REALISATIONS; k++) {
            sv_record record = fixture_record(p, k);
            record.outcomes[0].value += k == 2 ? twist : 0.0;
            record.seconds += task; /* another machine: never compared */
            if (sv_task_owns(task, N_PARTS, p, k))
                CHECK_OK(sv_run_put(test_context(), &record, run));
        }
    sv_run_close(test_context(), run);
    return path;
}

SV_TEST(a_task_owns_its_share_and_all_own_everything_once)
{
    CHECK(sv_task_owns(0, 0, 7, 3));
    for (int32_t p = 0; p < 4; p++)
        for (int64_t k = 0; k < 30; k++) {
            int owners = 0;
            for (int32_t task = 1; task <= 7; task++)
                owners += sv_task_owns(task, 7, p, k);
            CHECK_INT(owners, 1);
        }
}

SV_TEST(a_folder_says_whose_part_it_is)
{
    char path[1024];
    int32_t task, tasks;
    sv_run *run = NULL;
    CHECK_OK(sv_run_open_read(test_context(), make_part(2, 0.0, path, sizeof path), &run));
    sv_run_task(run, &task, &tasks);
    CHECK_INT(task, 2);
    CHECK_INT(tasks, 3);
    sv_run_close(test_context(), run);
    fixture_fresh_run("whole", 1);
    CHECK_OK(sv_run_open_read(test_context(), fixture_folder, &run));
    sv_run_task(run, &task, &tasks);
    CHECK_INT(task, 0);
    CHECK_INT(tasks, 0);
    sv_run_close(test_context(), run);
}

SV_TEST(parts_join_in_any_order_and_again)
{
    char paths[N_PARTS][1024];
    const char *shards[N_PARTS];
    sv_merge_survey survey;
    sv_run *run = NULL;
    const sv_run_identity identity = fixture_identity();
    int64_t added = 0, present = 0;
    for (int t = 0; t < N_PARTS; t++)
        shards[t] = make_part(N_PARTS - t, 0.0, paths[t], sizeof paths[t]);
    CHECK_OK(sv_run_survey(test_context(), shards, N_PARTS, &survey));
    CHECK_INT(survey.rows, 15);
    CHECK_INT(survey.distinct, 15);
    CHECK_INT(survey.extent, N_REALISATIONS);
    CHECK_INT(survey.realisations, N_REALISATIONS);
    CHECK_INT(survey.tasks, N_PARTS);
    CHECK_OK(sv_run_open(test_context(), test_scratch("joined"), &identity, false, &run));
    CHECK_OK(sv_run_merge(test_context(), run, shards, N_PARTS, &added, &present));
    CHECK_INT(added, 15);
    CHECK_INT(present, 0);
    CHECK_OK(sv_run_merge(test_context(), run, shards + 1, 1, &added, &present));
    CHECK_INT(added, 0);
    CHECK_INT(present, 5);
    sv_ensemble e;
    sv_index loaded = 0;
    CHECK_OK(sv_ensemble_init(test_context(), 3, N_REALISATIONS, 2, &e));
    CHECK_OK(sv_run_load(test_context(), run, &e, &loaded));
    CHECK_INT(loaded, 15);
    sv_record record, expected = fixture_record(2, 4);
    CHECK(sv_ensemble_get(&e, 2, 4, &record));
    expected.seconds = record.seconds; /* of the machine of the part */
    CHECK(same_record(&record, &expected));
    sv_ensemble_free(test_context(), &e);
    sv_run_close(test_context(), run);
}

SV_TEST(what_is_there_twice_must_be_the_same)
{
    char good[1024], bad[1024];
    sv_merge_survey survey = {.rows = -1};
    sv_run *run = NULL;
    const sv_run_identity identity = fixture_identity();
    int64_t added = -1, present = -1, realisations = -1;
    int32_t points;
    make_part(1, 0.0, good, sizeof good);
    const char *const twice[] = {good, good};
    CHECK_OK(sv_run_survey(test_context(), twice, 2, &survey));
    CHECK_INT(survey.rows, 2 * survey.distinct);
    make_part(1, 1e-15, bad, sizeof bad);
    const char *const both[] = {good, bad};
    survey.rows = -1;
    CHECK_STATUS(SV_UNDECIDED, sv_run_survey(test_context(), both, 2, &survey));
    CHECK_INT(survey.rows, -1);
    CHECK(strstr(test_context()->error.message, "realisation 2 of point 1") != NULL);
    /* Without the survey before it: the transaction is taken back whole. */
    CHECK_OK(sv_run_open(test_context(), test_scratch("torn"), &identity, false, &run));
    CHECK_STATUS(SV_STORAGE, sv_run_merge(test_context(), run, both, 2, &added, &present));
    CHECK_INT(added, -1);
    CHECK_OK(sv_run_extent(test_context(), run, &realisations, &points));
    CHECK_INT(realisations, 0);
    sv_run_close(test_context(), run);
}

SV_TEST(other_runs_and_other_tasks_are_refused)
{
    char part[1024];
    sv_merge_survey survey;
    sv_run *run = NULL;
    sv_run_identity identity = fixture_identity();
    make_part(1, 0.0, part, sizeof part);
    identity.kernel = "another machine";
    snprintf(fixture_folder, sizeof fixture_folder, "%s", test_scratch("kernel"));
    CHECK_OK(sv_run_open(test_context(), fixture_folder, &identity, false, &run));
    int64_t added, present;
    const char *const shards[] = {part};
    CHECK_STATUS(SV_OTHER_RUN, sv_run_merge(test_context(), run, shards, 1, &added, &present));
    sv_run_close(test_context(), run);
    const char *const both[] = {part, fixture_folder};
    CHECK_STATUS(SV_OTHER_RUN, sv_run_survey(test_context(), both, 2, &survey));
    identity = fixture_identity();
    identity.task = 2;
    identity.tasks = N_PARTS;
    CHECK_STATUS(SV_OTHER_RUN, sv_run_open(test_context(), part, &identity, false, &run));
    identity.task = identity.tasks = 0;
    CHECK_STATUS(SV_OTHER_RUN, sv_run_open(test_context(), part, &identity, true, &run));
}

/* A file from elsewhere may claim anything. */
SV_TEST(numbers_out_of_range_are_refused)
{
    sv_merge_survey survey;
    fixture_fresh_run("range", 1);
    const char *const folders[] = {fixture_folder};
    CHECK_OK(sv_run_survey(test_context(), folders, 1, &survey));
    CHECK_INT(survey.tasks, 0);
    CHECK_INT(survey.realisations, 0);
    CHECK_INT(0, fixture_sql("INSERT INTO realisation VALUES (3, 0, 0, 1, 0, 0, 'x')"));
    CHECK_STATUS(SV_STORAGE, sv_run_survey(test_context(), folders, 1, &survey));
    fixture_fresh_run("far", 1);
    CHECK_INT(0, fixture_sql("INSERT INTO realisation VALUES (0, 1099511627776, 0, 1, 0, 0, 'x')"));
    CHECK_STATUS(SV_STORAGE, sv_run_survey(test_context(), folders, 1, &survey));
    static const char *const words[] = {"0/3", "4/3", "x", "1/", "99999999999/99999999999", "/"};
    for (size_t i = 0; i < sizeof words / sizeof *words; i++) {
        int32_t task, tasks;
        sv_run *run = NULL;
        fixture_fresh_run("task", 1);
        CHECK_INT(fixture_meta("task", words[i]), SQLITE_OK);
        CHECK_OK(sv_run_open_read(test_context(), fixture_folder, &run));
        sv_run_task(run, &task, &tasks);
        CHECK_INT(tasks, 0);
        sv_run_close(test_context(), run);
    }
}

SV_TEST(several_records_are_stored_together_or_not_at_all)
{
    sv_run *run = NULL;
    const sv_run_identity identity = fixture_identity();
    int64_t realisations = -1;
    int32_t points = -1;
    sv_record records[3] = {fixture_record(0, 0), fixture_record(0, 1), fixture_record(0, 1)};
    CHECK_OK(sv_run_open(test_context(), test_scratch("many"), &identity, false, &run));
    records[2].sites++; /* the second one again, with another answer */
    CHECK_STATUS(SV_STORAGE, sv_run_put_many(test_context(), records, 3, run));
    CHECK_OK(sv_run_extent(test_context(), run, &realisations, &points));
    CHECK_INT(realisations, 0);
    CHECK_OK(sv_run_put_many(test_context(), records, 2, run));
    CHECK_OK(sv_run_extent(test_context(), run, &realisations, &points));
    CHECK_INT(realisations, 2);
    sv_run_close(test_context(), run);
}
