/* SPDX-License-Identifier: GPL-3.0-or-later */
/* selvedge merge: the parts that tasks have computed, joined in one run. The parts may come from
 * elsewhere: everything is read and compared before the run is touched. */
#include "program_internal.h"

#include <string.h>
#include <sys/stat.h>
#include <time.h>
#include <unistd.h>

enum { MOST_CLAIMED = 10000000 };

/* What a merge knows before it writes. */
typedef struct merge {
    const options *o;
    const char *const *shards;
    int n_shards;
    bool exists;           /* RUN holds a run already */
    const char *reference; /* the folder whose sheet is taken: RUN, or the first part */
    sv_merge_survey survey;
    char *plan_lines;
    int64_t added, present;
} merge;

static bool same_folder(const char *a, const char *b)
{
    struct stat x, y;
    return stat(a, &x) == 0 && stat(b, &y) == 0 && x.st_dev == y.st_dev && x.st_ino == y.st_ino;
}

static sv_status look(sv_context *context, merge *m)
{
    char path[1024];
    const char *run = m->o->files[0];
    if ((size_t)snprintf(path, sizeof path, "%s/sheet.resolved.yaml", run) >= sizeof path)
        return SV_FAIL(context, SV_USAGE, "the path %.100s… is too long", run);
    m->exists = access(path, F_OK) == 0;
    m->shards = m->o->files + 1;
    m->n_shards = m->o->n_files - 1;
    m->reference = m->exists ? run : m->shards[0];
    for (int k = 0; k < m->n_shards; k++)
        if (same_folder(run, m->shards[k]))
            return SV_FAIL(context, SV_USAGE, "%s cannot be merged into itself", m->shards[k]);
    /* RUN and the parts follow each other on the command line. */
    return m->exists ? sv_run_survey(context, m->o->files, m->o->n_files, &m->survey)
                     : sv_run_survey(context, m->shards, m->n_shards, &m->survey);
}

/* The session of the reference's sheet, for as many realisations as any part was asked for. */
static sv_status open_reference(sv_context *context, merge *m, options *o, char *number,
                                size_t size, session *s)
{
    char sheet[1024];
    sv_run *run = NULL;
    const int64_t n = m->survey.realisations > 0 ? m->survey.realisations : m->survey.extent;
    *o = *m->o;
    if (n > 0) {
        snprintf(number, size, "ensemble.realisations=%lld", (long long)n);
        o->overrides[o->n_overrides++] = number;
    }
    sv_status status = sv_run_open_read(context, m->reference, &run);
    if (status == SV_OK)
        status = sv_run_path(context, run, "sheet.resolved.yaml", sheet, sizeof sheet);
    if (status == SV_OK)
        status = session_open(context, o, sheet, true, true, s);
    if (status == SV_OK)
        status = run_folder_check_identity(s, run);
    if (status == SV_OK)
        status = run_folder_plan_lines(context, sv_run_meta(run, "sheet"), &m->plan_lines);
    if (status == SV_OK) {
        /* The rows were made there, whatever this machine is. */
        snprintf(s->kernel, sizeof s->kernel, "%s", sv_run_meta(run, "kernel"));
        snprintf(s->version, sizeof s->version, "%s", sv_run_meta(run, "program_version"));
        s->plan_lines = m->plan_lines;
    }
    /* A folder from elsewhere may claim any number; a table of that size is taken on trust up to a
     * point only. */
    if (status == SV_OK && n > (MOST_CLAIMED + 100 * m->survey.distinct) / s->n_points)
        status = SV_FAIL(context, SV_REFUSED,
                         "the folders speak of %lld realisations at %d points and hold %lld",
                         (long long)n, s->n_points, (long long)m->survey.distinct);
    sv_run_close(context, run);
    return status;
}

/* The tasks whose realisations are missing, "3, 7, 12 …", when all parts agree on their number. */
static void missing_tasks(const merge *m, const sv_ensemble *e, char *text, size_t size)
{
    size_t used = 0;
    text[0] = '\0';
    for (int32_t task = 1; task <= m->survey.tasks && used + 30 < size; task++) {
        bool found = false;
        for (int32_t p = 0; p < e->n_points && !found; p++)
            for (int64_t k = 0; k < e->realisations && !found; k++)
                found =
                    !e->done[p * e->realisations + k] && sv_task_owns(task, m->survey.tasks, p, k);
        if (found)
            used +=
                (size_t)snprintf(text + used, size - used, "%s%ld", used ? ", " : "", (long)task);
    }
    if (used + 30 >= size)
        snprintf(text + used, size - used, " …");
}

static int64_t warn_of_missing(session *s, const merge *m, const sv_ensemble *e)
{
    int64_t missing = 0;
    char tasks[200];
    const int64_t total = e->n_points * e->realisations;
    for (int64_t k = 0; k < total; k++)
        missing += !e->done[k];
    if (missing == 0)
        return 0;
    missing_tasks(m, e, tasks, sizeof tasks);
    sv_log(s->context, SV_LOG_WARNING,
           "%lld of %lld realisations are missing%s%s%s; means cover each point up to its first "
           "gap",
           (long long)missing, (long long)total, tasks[0] ? "; of " : "",
           tasks[0] ? "the tasks " : "", tasks);
    return missing;
}

/* The document of the summary, with what the merge did. */
static sv_status print_json(session *s, const merge *m, int64_t missing, const char *text)
{
    json_t *document = json_loads(text, 0, NULL);
    char *out = NULL;
    if (document != NULL) {
        json_object_set_new(document, "command", json_string("merge"));
        json_object_set_new(document, "merged",
                            json_pack("{s:I, s:I, s:I, s:I}", "folders", (json_int_t)m->n_shards,
                                      "added", (json_int_t)m->added, "present",
                                      (json_int_t)m->present, "missing", (json_int_t)missing));
        out = json_dumps(document, JSON_INDENT(1) | JSON_REAL_PRECISION(17) | JSON_ENSURE_ASCII);
    }
    if (out != NULL)
        puts(out);
    free(out);
    json_decref(document);
    return out != NULL ? SV_OK : SV_FAIL(s->context, SV_NO_MEMORY, "out of memory");
}

static sv_status join(session *s, merge *m)
{
    sv_context *context = s->context;
    sv_run *run = NULL;
    sv_ensemble ensemble = {0};
    sv_result result = {0};
    sv_index loaded = 0;
    sv_stop_rule stop = session_stop_rule(s);
    char *json = NULL;
    sv_status status = run_folder_open(s, &run);
    if (status == SV_OK)
        status = sv_run_merge(context, run, m->shards, m->n_shards, &m->added, &m->present);
    if (status == SV_OK)
        status = sv_ensemble_init(context, s->n_points, s->base.realisations,
                                  s->points[0].problem.n_markers, &ensemble);
    if (status == SV_OK)
        status = sv_run_load(context, run, &ensemble, &loaded);
    if (status == SV_OK)
        status = result_make(s, &ensemble, &stop, &result);
    if (status == SV_OK)
        status = site_maps_add(s, run, true, &result);
    if (status == SV_OK)
        status = run_folder_write(s, run, &result, &json);
    if (status == SV_OK) {
        const int64_t missing = warn_of_missing(s, m, &ensemble);
        sv_log(context, SV_LOG_NOTE, "%lld realisations added, %lld were there",
               (long long)m->added, (long long)m->present);
        if (s->options->json)
            status = print_json(s, m, missing, json);
        else
            sv_result_print(&result, wants_colour(s->options, stdout), stdout);
    }
    if (status == SV_OK)
        status = run_folder_judge(s, &result);
    sv_give(context, json);
    result_free(context, &result);
    sv_ensemble_free(context, &ensemble);
    sv_run_close(context, run);
    return status;
}

int run_merge(sv_context *context, const options *o)
{
    session s = {0};
    merge m = {.o = o};
    options own;
    char number[64];
    sv_status status = look(context, &m);
    if (status == SV_OK)
        status = open_reference(context, &m, &own, number, sizeof number, &s);
    if (status == SV_OK) {
        own.output = o->files[0];
        status = join(&s, &m);
    }
    sv_give(context, m.plan_lines);
    session_close(&s);
    return status == SV_OK ? 0 : fail_exit(context, status);
}
