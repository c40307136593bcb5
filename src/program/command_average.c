/* SPDX-License-Identifier: GPL-3.0-or-later */
/* selvedge average: the ensemble and its sweep, into a run folder that can be continued. */
#include "program_internal.h"

#include <string.h>
#include <time.h>
#include <unistd.h>

static double seconds_now(void)
{
    struct timespec now;
    clock_gettime(CLOCK_MONOTONIC, &now);
    return (double)now.tv_sec + 1e-9 * (double)now.tv_nsec;
}

/* Copies of the sheet's files get short names of their own: 01-defects.csv. */
typedef struct copies {
    sv_run_input *inputs;
    char (*names)[80];
    const char **relocated; /* inputs/NAME */
    char (*paths)[100];
} copies;

static void copies_free(sv_context *context, copies *c)
{
    sv_give(context, c->inputs);
    sv_give(context, c->names);
    sv_give(context, c->relocated);
    sv_give(context, c->paths);
}

/* Only plain characters reach a file name. */
static void plain_name(const char *path, int number, char *name, size_t size)
{
    const char *base = strrchr(path, '/');
    base = base ? base + 1 : path;
    int used = snprintf(name, size, "%02d-", number + 1);
    for (; *base != '\0' && (size_t)used + 1 < size && used < 60; base++) {
        bool plain = strchr("abcdefghijklmnopqrstuvwxyzABCDEFGHIJKLMNOPQRSTUVWXYZ0123456789-_.",
                            *base) != NULL;
        name[used++] = plain ? *base : '_';
    }
    name[used] = '\0';
}

static sv_status copies_make(sv_context *context, const sv_setup *setup, copies *c)
{
    sv_status status;
    int n = setup->n_files;
    if ((status = sv_take(context, n, sizeof *c->inputs, &c->inputs)) != SV_OK ||
        (status = sv_take(context, n, sizeof *c->names, &c->names)) != SV_OK ||
        (status = sv_take(context, n, sizeof *c->relocated, &c->relocated)) != SV_OK ||
        (status = sv_take(context, n, sizeof *c->paths, &c->paths)) != SV_OK)
        return status;
    for (int k = 0; k < n; k++) {
        plain_name(setup->files[k].path, k, c->names[k], sizeof c->names[k]);
        snprintf(c->paths[k], sizeof c->paths[k], "inputs/%s", c->names[k]);
        c->relocated[k] = c->paths[k];
        c->inputs[k] = (sv_run_input){setup->files[k].path, c->names[k], setup->files[k].digest};
    }
    return SV_OK;
}

/* The resolved sheet for the run folder: files by the names of their copies, engines noted. */
static sv_status resolved_text(session *s, const copies *c, char **ret_text)
{
    char *resolved = NULL, *plans = NULL, *text = NULL;
    sv_status status =
        sv_sheet_resolved_relocated(s->context, s->sheet, c->relocated, s->base.n_files, &resolved);
    if (status == SV_OK)
        status = session_plan_text(s, &plans);
    size_t size = status == SV_OK ? strlen(resolved) + strlen(plans) + 1 : 0;
    if (status == SV_OK)
        status = sv_take(s->context, (sv_index)size, 1, &text);
    if (status == SV_OK) {
        snprintf(text, size, "%s%s", resolved, plans);
        *ret_text = text;
    }
    sv_give(s->context, resolved);
    sv_give(s->context, plans);
    return status;
}

static sv_status open_run(session *s, sv_run **ret_run)
{
    copies c = {0};
    char *resolved = NULL, kernel[160];
    const char *markers[SV_MAX_MARKERS];
    const sv_case *problem = &s->points[0].problem;
    for (int k = 0; k < problem->n_markers; k++)
        markers[k] = sv_marker_table(&(int){0})[problem->markers[k].marker].kind.name;
    kernel_text(&s->blas, kernel, sizeof kernel);
    sv_status status = copies_make(s->context, &s->base, &c);
    if (status == SV_OK)
        status = resolved_text(s, &c, &resolved);
    if (status == SV_OK) {
        sv_run_identity identity = {.identity = s->base.identity,
                                    .resolved_sheet = resolved,
                                    .program_version = sv_version(),
                                    .kernel = kernel,
                                    .markers = markers,
                                    .n_markers = problem->n_markers,
                                    .n_points = s->n_points,
                                    .inputs = c.inputs,
                                    .n_inputs = s->base.n_files,
                                    .command_line = s->options->command_line};
        status = sv_run_open(s->context, s->options->output, &identity, s->options->force, ret_run);
    }
    sv_give(s->context, resolved);
    copies_free(s->context, &c);
    return status;
}

static sv_status write_text(session *s, sv_run *run, const char *name, const char *text)
{
    char path[1024];
    sv_status status = sv_run_path(s->context, run, name, path, sizeof path);
    return status == SV_OK ? sv_write_file(s->context, path, text, strlen(text)) : status;
}

static sv_status write_results(session *s, sv_run *run, const sv_result *result)
{
    char *json = NULL, *csv = NULL;
    sv_status status = sv_result_json(s->context, result, &json);
    if (status == SV_OK)
        status = sv_result_csv(s->context, result, &csv);
    if (status == SV_OK)
        status = write_text(s, run, "points.csv", csv);
    if (status == SV_OK)
        status = write_text(s, run, "summary.json", json);
    if (status == SV_OK && s->options->json)
        fputs(json, stdout);
    else if (status == SV_OK)
        sv_result_print(result, wants_colour(s->options, stdout), stdout);
    sv_give(s->context, json);
    sv_give(s->context, csv);
    return status;
}

/* More than half of the realisations of a marker undecided: its mean says nothing. */
static sv_status judge(session *s, const sv_result *result)
{
    for (int32_t k = 0; k < result->n_points; k++)
        for (int m = 0; m < result->points[k].n_summaries; m++) {
            const sv_summary *summary = &result->points[k].summaries[m];
            if (summary->unresolved > 0 && 2 * summary->unresolved > summary->realisations)
                return SV_FAIL(s->context, SV_UNDECIDED,
                               "point %d: %lld of %lld realisations of %s are unresolved: %s", k,
                               (long long)summary->unresolved, (long long)summary->realisations,
                               summary->marker, summary->unresolved_reason);
        }
    return SV_OK;
}

/* The engine was chosen on realisation 0; others may need more than it gives. */
static void warn_of_errors(session *s, const sv_result *result)
{
    for (int32_t k = 0; k < result->n_points; k++)
        for (int m = 0; m < result->points[k].n_summaries; m++) {
            const sv_summary *summary = &result->points[k].summaries[m];
            if (summary->exists && summary->numerical_error > s->base.accuracy)
                sv_log(s->context, SV_LOG_NOTE,
                       "point %d: numerical error of %s up to %.1e, solve.accuracy asks for %.1e",
                       k, summary->marker, summary->numerical_error, s->base.accuracy);
        }
}

static sv_status compute(session *s, sv_run *run, sv_ensemble *ensemble)
{
    sv_context *context = s->context;
    const options *o = s->options;
    sv_progress_bar bar;
    sv_case *cases = NULL;
    sv_status status = sv_take(context, s->n_points, sizeof *cases, &cases);
    if (status != SV_OK)
        return status;
    for (int32_t k = 0; k < s->n_points; k++)
        cases[k] = s->points[k].problem;
    sv_ensemble_options work = {.size = sizeof work,
                                .realisations = ensemble->realisations,
                                .threads = s->threads,
                                .stop = session_stop_rule(s),
                                .sink = {sv_run_put, run},
                                .time_limit = o->time_limit};
    sv_progress_bar_init(&bar, stderr, isatty(fileno(stderr)));
    if (wants_progress(o)) {
        context->progress = sv_progress_bar_show;
        context->progress_user = &bar;
    }
    status = sv_ensemble_run(context, cases, &work, ensemble);
    context->progress = NULL;
    sv_progress_bar_end(&bar);
    sv_give(context, cases);
    return status;
}

static sv_status average(session *s)
{
    sv_context *context = s->context;
    double start = seconds_now();
    sv_run *run = NULL;
    sv_ensemble ensemble = {0};
    sv_result result = {0};
    sv_index loaded = 0;
    sv_stop_rule stop = session_stop_rule(s);
    sv_status computed = SV_OK;
    sv_status status = open_run(s, &run);
    if (status == SV_OK)
        status = sv_ensemble_init(context, s->n_points, s->base.realisations,
                                  s->points[0].problem.n_markers, &ensemble);
    if (status == SV_OK)
        status = sv_run_load(context, run, &ensemble, &loaded);
    if (status != SV_OK)
        goto out;
    if (loaded > 0)
        sv_log(context, SV_LOG_NOTE, "continuing: %lld realisations are there", (long long)loaded);
    computed = compute(s, run, &ensemble);
    sv_error error = context->error;
    if (computed != SV_OK && computed != SV_INTERRUPTED) {
        status = computed;
        goto out;
    }
    status = result_make(s, &ensemble, &stop, &result);
    result.seconds = seconds_now() - start;
    if (status == SV_OK)
        warn_of_errors(s, &result);
    if (status == SV_OK)
        status = write_results(s, run, &result);
    if (status == SV_OK && computed == SV_INTERRUPTED) {
        context->error = error;
        status = computed;
    } else if (status == SV_OK) {
        status = judge(s, &result);
    }
out:
    result_free(context, &result);
    sv_ensemble_free(context, &ensemble);
    sv_run_close(context, run);
    return status;
}

int run_average(sv_context *context, const options *o)
{
    session s = {0};
    forecast f;
    if (o->output == NULL && !o->dry_run) {
        fprintf(stderr, "selvedge: error: average needs a run folder\nhint: give -o RUN\n");
        return sv_status_exit_code(SV_USAGE);
    }
    sv_status status = session_open(context, o, o->files[0], false, true, &s);
    if (status == SV_OK && o->dry_run) {
        status = session_plan(&s, false);
        if (status == SV_OK)
            status = session_forecast(&s, true, &f);
        if (status == SV_OK)
            print_forecast(&f, &s, "", stdout);
    } else if (status == SV_OK) {
        status = session_plan(&s, false);
        if (status == SV_OK)
            status = average(&s);
    }
    session_close(&s);
    return status == SV_OK ? 0 : fail_exit(context, status);
}
