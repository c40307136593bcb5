/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The run folder of an ensemble: what it is made from, what is written beside its ledger. */
#include "program_internal.h"

#include <string.h>

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

/* Only plain characters reach a file name. A copy of a copy gets no second number. */
static void plain_name(const char *path, int number, bool inside_run, char *name, size_t size)
{
    const char *base = strrchr(path, '/');
    base = base ? base + 1 : path;
    if (strspn(base, "0123456789") >= 2 && base[strspn(base, "0123456789")] == '-' && inside_run)
        base += strspn(base, "0123456789") + 1;
    int used = snprintf(name, size, "%02d-", number + 1);
    for (; *base != '\0' && (size_t)used + 1 < size && used < 60; base++) {
        bool plain = strchr("abcdefghijklmnopqrstuvwxyzABCDEFGHIJKLMNOPQRSTUVWXYZ0123456789-_.",
                            *base) != NULL;
        name[used++] = plain ? *base : '_';
    }
    name[used] = '\0';
}

static sv_status copies_make(sv_context *context, const sv_setup *setup, bool inside_run, copies *c)
{
    sv_status status;
    int n = setup->n_files;
    if ((status = sv_take(context, n, sizeof *c->inputs, &c->inputs)) != SV_OK ||
        (status = sv_take(context, n, sizeof *c->names, &c->names)) != SV_OK ||
        (status = sv_take(context, n, sizeof *c->relocated, &c->relocated)) != SV_OK ||
        (status = sv_take(context, n, sizeof *c->paths, &c->paths)) != SV_OK)
        return status;
    for (int k = 0; k < n; k++) {
        plain_name(setup->files[k].path, k, inside_run, c->names[k], sizeof c->names[k]);
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
    if (status == SV_OK && s->plan_lines != NULL)
        status = sv_take_text(s->context, s->plan_lines, &plans);
    else if (status == SV_OK)
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

sv_status run_folder_open(session *s, sv_run **ret_run)
{
    copies c = {0};
    const sv_team *team = launch_team();
    char *resolved = NULL;
    const char *markers[SV_MAX_MARKERS];
    const sv_case *problem = &s->points[0].problem;
    for (int k = 0; k < problem->n_markers; k++)
        markers[k] = sv_marker_table(&(int){0})[problem->markers[k].marker].kind.name;
    sv_status status = copies_make(s->context, &s->base, s->inside_run, &c);
    if (status == SV_OK)
        status = resolved_text(s, &c, &resolved);
    if (status == SV_OK) {
        sv_run_identity identity = {.identity = s->base.identity,
                                    .resolved_sheet = resolved,
                                    .program_version = s->version,
                                    .kernel = s->kernel,
                                    .markers = markers,
                                    .n_markers = problem->n_markers,
                                    .n_points = s->open_ended ? 0 : s->n_points,
                                    .realisations = s->base.realisations,
                                    .task = (int32_t)s->options->task,
                                    .tasks = (int32_t)s->options->tasks,
                                    .inputs = c.inputs,
                                    .n_inputs = s->base.n_files,
                                    .command_line = s->options->command_line,
                                    .threads = s->threads,
                                    .ranks = team != NULL ? team->size : 1};
        status = sv_run_open(s->context, s->options->output, &identity, s->options->force, ret_run);
    }
    sv_give(s->context, resolved);
    copies_free(s->context, &c);
    return status;
}

sv_status run_folder_put_text(session *s, sv_run *run, const char *name, const char *text)
{
    char path[1024];
    sv_status status = sv_run_path(s->context, run, name, path, sizeof path);
    return status == SV_OK ? sv_write_file(s->context, path, text, strlen(text)) : status;
}

void run_folder_note_end(session *s, sv_run *run, sv_status computed)
{
    char note[1100];
    const sv_error error = s->context->error;
    const char *name = signals_name();
    if (run == NULL || computed == SV_OK)
        return;
    if (computed != SV_INTERRUPTED)
        snprintf(note, sizeof note, "%s", error.message);
    else if (name != NULL)
        snprintf(note, sizeof note, "%s: %s", name, error.message);
    else
        snprintf(note, sizeof note, "time limit of %g s: %s", s->options->time_limit,
                 error.message);
    const char *what = computed == SV_INTERRUPTED ? "stop" : "failure";
    if (sv_run_event(s->context, run, what, note) != SV_OK)
        sv_log(s->context, SV_LOG_WARNING, "%s", s->context->error.message);
    s->context->error = error; /* of the computation: the one to tell */
}

sv_status run_folder_write(session *s, sv_run *run, const sv_result *result, char **ret_json)
{
    char *json = NULL, *csv = NULL, *comparisons = NULL;
    sv_status status = sv_result_json(s->context, result, &json);
    if (status == SV_OK)
        status = sv_result_csv(s->context, result, &csv);
    if (status == SV_OK && result->n_comparisons > 0)
        status = sv_comparisons_csv(s->context, result, &comparisons);
    if (status == SV_OK)
        status = run_folder_put_text(s, run, "points.csv", csv);
    if (status == SV_OK && comparisons != NULL)
        status = run_folder_put_text(s, run, "comparisons.csv", comparisons);
    if (status == SV_OK)
        status = run_folder_put_text(s, run, "summary.json", json);
    if (status == SV_OK) {
        *ret_json = json;
        json = NULL;
    }
    sv_give(s->context, json);
    sv_give(s->context, csv);
    sv_give(s->context, comparisons);
    return status;
}

/* More than half of the realisations of a marker undecided: its mean says nothing. */
sv_status run_folder_judge(session *s, const sv_result *result)
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
void run_folder_warn(session *s, const sv_result *result)
{
    for (int32_t k = 0; k < result->n_points; k++)
        for (int m = 0; m < result->points[k].n_summaries; m++) {
            const sv_summary *summary = &result->points[k].summaries[m];
            if (summary->exists && summary->numerical_error > s->points[k].setup.accuracy)
                sv_log(s->context, SV_LOG_NOTE,
                       "point %d: numerical error of %s up to %.1e, solve.accuracy asks for %.1e",
                       k, summary->marker, summary->numerical_error, s->points[k].setup.accuracy);
        }
}

sv_status run_folder_check_identity(session *s, const sv_run *run)
{
    const char *identity = sv_run_meta(run, "identity");
    if (identity == NULL || strcmp(identity, s->base.identity) == 0)
        return SV_OK;
    return SV_FAIL(s->context, SV_STORAGE,
                   "the resolved sheet in the folder is not the one its ledger was made from");
}

sv_status run_folder_plan_lines(sv_context *context, const char *sheet, char **ret_lines)
{
    static const char mark[] = "# engine from point ";
    char *lines = NULL;
    size_t used = 0;
    sv_status status = sv_take(context, (sv_index)strlen(sheet) + 2, 1, &lines);
    if (status != SV_OK)
        return status;
    for (const char *line = sheet; *line != '\0';) {
        size_t length = strcspn(line, "\n");
        if (strncmp(line, mark, strlen(mark)) == 0) {
            memcpy(lines + used, line, length);
            used += length;
            lines[used++] = '\n';
        }
        line += length + (line[length] == '\n');
    }
    *ret_lines = lines;
    return SV_OK;
}
