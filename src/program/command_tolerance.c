/* SPDX-License-Identifier: GPL-3.0-or-later */
/* selvedge tolerance: the largest disorder that still meets a stated criterion. */
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

static sv_status draw(session *s, sv_run *run, const sv_tolerance_result *result)
{
    sv_figure_files files;
    char folder[1024];
    sv_status status = sv_run_path(s->context, run, "figures", folder, sizeof folder);
    if (status == SV_OK)
        status = sv_figure_tolerance(s->context, folder, "tolerance", result, &files);
    if (status != SV_OK || s->options->json)
        return status;
    if (files.drawn)
        printf("\nfigure: %s (and .pdf, .png)\n", files.svg);
    else
        printf("\nfigure not drawn: %s\n", files.reason);
    return SV_OK;
}

static sv_status write_results(session *s, sv_run *run, const sv_tolerance_result *result)
{
    char *json = NULL, *csv = NULL;
    sv_status status = sv_tolerance_json(s->context, result, &json);
    if (status == SV_OK)
        status = sv_tolerance_csv(s->context, result, &csv);
    if (status == SV_OK)
        status = run_folder_put_text(s, run, "points.csv", csv);
    if (status == SV_OK)
        status = run_folder_put_text(s, run, "summary.json", json);
    if (status == SV_OK && s->options->json)
        fputs(json, stdout);
    else if (status == SV_OK)
        sv_tolerance_print(result, stdout);
    if (status == SV_OK)
        status = draw(s, run, result);
    sv_give(s->context, json);
    sv_give(s->context, csv);
    return status;
}

/* A threshold that could not be found was computed, but is no answer: exit code 1. */
static sv_status judge(session *s, const sv_tolerance_result *result)
{
    const sv_tolerance_row *row = sv_tolerance_main(result);
    if (row != NULL && row->answer.state == SV_THRESHOLD_FOUND)
        return SV_OK;
    return SV_FAIL(s->context, SV_UNDECIDED, "no threshold in the range: %s",
                   row != NULL ? row->answer.reason : "nothing was asked");
}

static sv_status search_with_progress(inquiry *q, sv_tolerance_result *result)
{
    sv_context *context = q->s->context;
    sv_progress_bar bar;
    sv_progress_bar_init(&bar, stderr, isatty(fileno(stderr)));
    if (wants_progress(q->s->options)) {
        context->progress = sv_progress_bar_show;
        context->progress_user = &bar;
    }
    sv_status status = tolerance_search(q, result);
    context->progress = NULL;
    sv_progress_bar_end(&bar);
    return status;
}

static sv_status tolerance(session *s)
{
    sv_run *run = NULL;
    inquiry q = {0};
    sv_tolerance_result result = {0};
    double start = seconds_now();
    s->open_ended = true;
    sv_status status = run_folder_open(s, &run);
    if (status == SV_OK)
        status = inquiry_open(s, run, &q);
    if (status == SV_OK)
        status = search_with_progress(&q, &result);
    run_folder_note_end(s, run, status);
    result.seconds = seconds_now() - start;
    if (status == SV_OK)
        status = write_results(s, run, &result);
    if (status == SV_OK)
        status = judge(s, &result);
    tolerance_free(s->context, &result);
    inquiry_close(&q);
    sv_run_close(s->context, run);
    return status;
}

int run_tolerance(sv_context *context, const options *o)
{
    session s = {0};
    if (o->output == NULL) {
        fprintf(stderr, "selvedge: error: tolerance needs a run folder\nhint: give -o RUN\n");
        return sv_status_exit_code(SV_USAGE);
    }
    sv_status status = session_open(context, o, o->files[0], false, false, &s);
    if (status == SV_OK && !s.base.has_question)
        status = session_blame(&s, "",
                               SV_FAIL(context, SV_INVALID_INPUT,
                                       "the sheet asks nothing: add a block `question` with "
                                       "parameter, range, precision and criterion"));
    if (status == SV_OK && s.base.n_axes > 0)
        sv_log(context, SV_LOG_NOTE, "the sweep of the sheet is not used here");
    if (status == SV_OK)
        status = tolerance(&s);
    session_close(&s);
    return status == SV_OK ? 0 : fail_exit(context, status);
}
