/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Joining the folders of tasks. Shards come from elsewhere: everything is looked at before the
 * first row is written, and all rows are written in one transaction. */
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "store_internal.h"

/* A row of one of the folders, by its key and the hash of its numbers. */
typedef struct row_mark {
    int64_t realisation;
    int32_t point, folder;
    char digest[33]; /* 128 bits of the SHA-256 */
} row_mark;

typedef struct row_list {
    row_mark *rows;
    sv_index n, room;
} row_list;

static sv_status add_mark(sv_context *context, row_list *list, const row_mark *mark)
{
    if (list->n == list->room) {
        row_mark *larger = NULL;
        const sv_index room = list->room < 1024 ? 1024 : 2 * list->room;
        sv_status status = sv_take(context, room, sizeof *larger, &larger);
        if (status != SV_OK)
            return status;
        if (list->n > 0)
            memcpy(larger, list->rows, (size_t)list->n * sizeof *larger);
        sv_give(context, list->rows);
        list->rows = larger;
        list->room = room;
    }
    list->rows[list->n++] = *mark;
    return SV_OK;
}

void sv_run_task(const sv_run *run, int32_t *ret_task, int32_t *ret_tasks)
{
    const char *text = sv_run_meta(run, "task"), *slash = text ? strchr(text, '/') : NULL;
    int64_t task = 0, tasks = 0;
    char head[16] = "";
    if (slash != NULL)
        snprintf(head, sizeof head, "%.*s", (int)(slash - text), text);
    if (slash == NULL || sv_parse_integer(head, &task) != SV_PARSE_OK ||
        sv_parse_integer(slash + 1, &tasks) != SV_PARSE_OK || task < 1 || task > tasks ||
        tasks > SV_MAX_TASKS)
        task = tasks = 0;
    *ret_task = (int32_t)task;
    *ret_tasks = (int32_t)tasks;
}

/* Realisations per point the run was last asked for; 0 when it does not say. */
static int64_t realisations_asked(const sv_run *run)
{
    const char *text = sv_run_meta(run, "realisations");
    int64_t number = 0;
    if (text == NULL || sv_parse_integer(text, &number) != SV_PARSE_OK || number < 0 ||
        number > SV_MAX_REALISATIONS)
        return 0;
    return number;
}

/* The rows of a run in the order of their keys, each with its checksum looked at. */
static sv_status
each_row(sv_context *context, sv_run *run,
         sv_status (*visit)(sv_context *context, const sv_record *record, void *user), void *user)
{
    sqlite3_stmt *keys = NULL;
    int code = SQLITE_DONE;
    sv_status status = sv_ledger_execute(context, run, "BEGIN");
    if (status != SV_OK)
        return status;
    status = sv_ledger_prepare(
        context, run, "SELECT point, realisation FROM realisation ORDER BY point, realisation",
        &keys);
    while (status == SV_OK && (code = sqlite3_step(keys)) == SQLITE_ROW) {
        const sqlite3_int64 point = sqlite3_column_int64(keys, 0);
        const sqlite3_int64 realisation = sqlite3_column_int64(keys, 1);
        sv_record record;
        bool found = false;
        if (sv_cancelled(context))
            status = SV_FAIL(context, SV_INTERRUPTED, "stopped while reading %s", run->folder);
        else if (point < 0 || (run->n_points > 0 && point >= run->n_points) || realisation < 0 ||
                 realisation >= SV_MAX_REALISATIONS)
            status = SV_FAIL(context, SV_STORAGE,
                             "%s/%s holds realisation %lld of point %lld; the run has %ld points",
                             run->folder, SV_LEDGER_NAME, (long long)realisation, (long long)point,
                             (long)run->n_points);
        if (status == SV_OK)
            status = sv_record_read(context, run, (int32_t)point, realisation, &record, &found);
        if (status == SV_OK && !found)
            status = SV_FAIL(context, SV_STORAGE,
                             "%s/%s: realisation %lld of point %lld cannot be found", run->folder,
                             SV_LEDGER_NAME, (long long)realisation, (long long)point);
        if (status == SV_OK)
            status = visit(context, &record, user);
    }
    if (status == SV_OK && code != SQLITE_DONE)
        status = sv_ledger_fail(context, run, "read");
    sqlite3_finalize(keys);
    sqlite3_exec(run->ledger, "COMMIT", NULL, NULL, NULL);
    return status;
}

typedef struct collector {
    row_list *list;
    int folder;
} collector;

static sv_status collect(sv_context *context, const sv_record *record, void *user)
{
    collector *c = user;
    char digest[65];
    row_mark mark = {
        .realisation = record->realisation, .point = record->point, .folder = c->folder};
    sv_record_checksum(record, digest);
    snprintf(mark.digest, sizeof mark.digest, "%.32s", digest);
    return add_mark(context, c->list, &mark);
}

static int compare_marks(const void *a, const void *b)
{
    const row_mark *x = a, *y = b;
    if (x->point != y->point)
        return x->point < y->point ? -1 : 1;
    if (x->realisation != y->realisation)
        return x->realisation < y->realisation ? -1 : 1;
    return x->folder < y->folder ? -1 : x->folder > y->folder;
}

/* The same realisation with two answers: says both, where the records still can be read. */
static sv_status differ(sv_context *context, const char *const *folders, const row_mark *a,
                        const row_mark *b)
{
    char text[400] = "their numbers differ";
    sv_record records[2];
    bool found[2] = {false, false};
    const row_mark *marks[2] = {a, b};
    for (int i = 0; i < 2; i++) {
        sv_run *run = NULL;
        if (sv_run_open_read(context, folders[marks[i]->folder], &run) != SV_OK)
            continue;
        if (sv_record_read(context, run, marks[i]->point, marks[i]->realisation, &records[i],
                           &found[i]) != SV_OK)
            found[i] = false;
        sv_run_close(context, run);
    }
    if (found[0] && found[1])
        sv_record_difference(&records[0], &records[1], text, sizeof text);
    return SV_FAIL(context, SV_UNDECIDED,
                   "realisation %lld of point %ld is not the same in %s and in %s: %s; nothing was "
                   "merged",
                   (long long)a->realisation, (long)a->point, folders[a->folder],
                   folders[b->folder], text);
}

/* Sheet, version and kernel of a folder against those of the first one. */
static sv_status check_same_run(sv_context *context, const sv_run *run, const sv_run *first)
{
    static const char *const keys[] = {"identity", "program_version", "kernel"};
    char difference[500];
    for (int i = 0; i < 3; i++)
        if (sv_run_meta(run, keys[i]) == NULL || sv_run_meta(first, keys[i]) == NULL)
            return SV_FAIL(context, SV_STORAGE, "%s does not say what run it is of", run->folder);
    const sv_run_identity wanted = {.identity = sv_run_meta(first, "identity"),
                                    .program_version = sv_run_meta(first, "program_version"),
                                    .kernel = sv_run_meta(first, "kernel")};
    bool same = run->n_markers == first->n_markers && run->n_points == first->n_points;
    for (int i = 0; i < 3; i++)
        same = same && strcmp(sv_run_meta(run, keys[i]), sv_run_meta(first, keys[i])) == 0;
    if (same)
        return SV_OK;
    sv_identity_difference(run, &wanted, difference, sizeof difference);
    return SV_FAIL(context, SV_OTHER_RUN, "%s is not of the same run as %s: %s", run->folder,
                   first->folder, difference);
}

static void note_task(const sv_run *run, sv_merge_survey *survey)
{
    int32_t task, tasks;
    sv_run_task(run, &task, &tasks);
    if (tasks == 0)
        return;
    survey->tasks = survey->tasks == 0 || survey->tasks == tasks ? tasks : -1;
}

sv_status sv_run_survey(sv_context *context, const char *const *folders, int n,
                        sv_merge_survey *ret_survey)
{
    sv_merge_survey survey = {0};
    row_list list = {0};
    sv_run *first = NULL;
    sv_status status = SV_OK;
    for (int f = 0; f < n && status == SV_OK; f++) {
        sv_run *run = NULL;
        collector c = {&list, f};
        status = sv_run_open_read(context, folders[f], &run);
        if (status == SV_OK && f > 0)
            status = check_same_run(context, run, first);
        if (status == SV_OK)
            status = each_row(context, run, collect, &c);
        if (status == SV_OK) {
            const int64_t asked = realisations_asked(run);
            survey.realisations = asked > survey.realisations ? asked : survey.realisations;
            note_task(run, &survey);
        }
        if (f == 0)
            first = run;
        else
            sv_run_close(context, run);
    }
    if (status == SV_OK && list.n > 0)
        qsort(list.rows, (size_t)list.n, sizeof *list.rows, compare_marks);
    for (sv_index i = 0; i < list.n && status == SV_OK; i++) {
        const row_mark *a = &list.rows[i > 0 ? i - 1 : 0], *b = &list.rows[i];
        const bool repeated = i > 0 && a->point == b->point && a->realisation == b->realisation;
        survey.distinct += !repeated;
        if (b->realisation >= survey.extent)
            survey.extent = b->realisation + 1;
        if (repeated && strcmp(a->digest, b->digest) != 0)
            status = differ(context, folders, a, b);
    }
    survey.rows = list.n;
    sv_give(context, list.rows);
    sv_run_close(context, first);
    if (status == SV_OK)
        *ret_survey = survey;
    return status;
}

typedef struct joiner {
    sv_run *run;
    int64_t added, present;
} joiner;

static sv_status join_row(sv_context *context, const sv_record *record, void *user)
{
    joiner *j = user;
    bool is_new = false;
    sv_status status = sv_record_insert(context, j->run, record, &is_new);
    j->added += status == SV_OK && is_new;
    j->present += status == SV_OK && !is_new;
    return status;
}

static sv_status join_shard(sv_context *context, sv_run *run, const char *shard, joiner *total)
{
    sv_run *from = NULL;
    joiner j = {.run = run};
    char note[700];
    int32_t task, tasks;
    int64_t number;
    sv_status status = sv_run_open_read(context, shard, &from);
    if (status == SV_OK)
        status = check_same_run(context, from, run);
    if (status == SV_OK)
        status = each_row(context, from, join_row, &j);
    if (status == SV_OK)
        status = sv_site_merge(context, from, run);
    if (status == SV_OK) {
        sv_run_task(from, &task, &tasks);
        snprintf(note, sizeof note, "%.500s (task %ld of %ld): %lld added, %lld were there", shard,
                 (long)task, (long)tasks, (long long)j.added, (long long)j.present);
        status = sv_event_add(context, run, "merge", note, NULL, &number);
    }
    sv_run_close(context, from);
    total->added += j.added;
    total->present += j.present;
    return status;
}

sv_status sv_run_merge(sv_context *context, sv_run *run, const char *const *shards, int n,
                       int64_t *ret_added, int64_t *ret_present)
{
    joiner total = {.run = run};
    sv_status status = sv_put_prepare(context, run);
    if (status == SV_OK)
        status = sv_ledger_execute(context, run, "BEGIN IMMEDIATE");
    if (status != SV_OK)
        return status;
    for (int k = 0; k < n && status == SV_OK; k++)
        status = join_shard(context, run, shards[k], &total);
    if (status == SV_OK)
        status = sv_site_check_joined(context, run);
    if (status == SV_OK)
        status = sv_ledger_execute(context, run, "COMMIT");
    if (status != SV_OK) {
        if (sqlite3_get_autocommit(run->ledger) == 0)
            sqlite3_exec(run->ledger, "ROLLBACK", NULL, NULL, NULL);
        return status;
    }
    *ret_added = total.added;
    *ret_present = total.present;
    return SV_OK;
}
