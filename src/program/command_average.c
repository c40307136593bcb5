/* SPDX-License-Identifier: GPL-3.0-or-later */
/* selvedge average: the ensemble and its sweep, into a run folder that can be continued. */
#include "program_internal.h"

#include <stdlib.h>
#include <string.h>
#include <time.h>
#include <unistd.h>

static double seconds_now(void)
{
    struct timespec now;
    clock_gettime(CLOCK_MONOTONIC, &now);
    return (double)now.tv_sec + 1e-9 * (double)now.tv_nsec;
}

static sv_status cases_make(session *s, sv_case **ret_cases)
{
    sv_status status = sv_take(s->context, s->n_points, sizeof **ret_cases, ret_cases);
    for (int32_t k = 0; k < s->n_points && status == SV_OK; k++)
        (*ret_cases)[k] = s->points[k].problem;
    return status;
}

static sv_status compute(session *s, sv_run *run, sv_ensemble *ensemble)
{
    sv_context *context = s->context;
    const options *o = s->options;
    sv_progress_bar bar;
    sv_case *cases = NULL;
    sv_status status = cases_make(s, &cases);
    if (status != SV_OK)
        return status;
    sv_ensemble_options work = {.size = sizeof work,
                                .realisations = ensemble->realisations,
                                .threads = s->threads,
                                .stop = session_stop_rule(s),
                                .sink = {sv_run_put, run, sv_run_put_many},
                                .time_limit = o->time_limit,
                                .team = launch_team(),
                                .task = (int32_t)o->task,
                                .tasks = (int32_t)o->tasks};
    sv_progress_bar_init(&bar, stderr, isatty(fileno(stderr)));
    if (wants_progress(o)) {
        context->progress = sv_progress_bar_show;
        context->progress_user = &bar;
    }
    status = sv_ensemble_run(context, cases, &work, ensemble);
    context->progress = NULL;
    /* These may have struck before the other ranks could be told. */
    if (status == SV_NO_MEMORY || status == SV_REFUSED || status == SV_INTERNAL) {
        if (launch_team() != NULL)
            fail_exit(context, status);
        launch_abort(status);
    }
    sv_progress_bar_end(&bar);
    sv_give(context, cases);
    return status;
}

/* A task says how far its part is; means wait for the merge. */
static void report_task(const session *s, const sv_ensemble *ensemble)
{
    const options *o = s->options;
    int64_t owned = 0, done = 0;
    for (int32_t p = 0; p < ensemble->n_points; p++)
        for (int64_t k = 0; k < ensemble->realisations; k++)
            if (sv_task_owns((int32_t)o->task, (int32_t)o->tasks, p, k)) {
                owned++;
                done += ensemble->done[p * ensemble->realisations + k];
            }
    if (o->json)
        printf("{\"selvedge\": 1, \"command\": \"average\", \"task\": {\"number\": %lld, \"of\": "
               "%lld, \"realisations\": %lld, \"done\": %lld, \"complete\": %s}}\n",
               (long long)o->task, (long long)o->tasks, (long long)owned, (long long)done,
               owned == done ? "true" : "false");
    else
        printf(
            "task %lld of %lld: %lld of %lld realisations done; selvedge merge joins the parts\n",
            (long long)o->task, (long long)o->tasks, (long long)done, (long long)owned);
}

/* Results of everything that is there, in the folder and on standard output. */
static sv_status show_results(session *s, sv_run *run, const sv_ensemble *ensemble, double seconds)
{
    sv_result result = {0};
    sv_stop_rule stop = session_stop_rule(s);
    char *json = NULL;
    if (s->conclude != NULL)
        return s->conclude(s, run, ensemble, seconds);
    sv_status status = result_make(s, ensemble, &stop, &result);
    result.seconds = seconds;
    if (status == SV_OK)
        status = site_maps_add(s, run, true, &result);
    if (status == SV_OK)
        status = split_advise(s, ensemble, &result);
    if (status == SV_OK)
        run_folder_warn(s, &result);
    if (status == SV_OK)
        split_tell(s, &result);
    if (status == SV_OK)
        status = run_folder_write(s, run, &result, &json);
    if (status == SV_OK && s->options->json)
        fputs(json, stdout);
    else if (status == SV_OK)
        sv_result_print(&result, wants_colour(s->options, stdout), stdout);
    if (status == SV_OK)
        status = run_folder_judge(s, &result);
    sv_give(s->context, json);
    result_free(s->context, &result);
    return status;
}

/* Do all ranks of a job compute the same thing? The first failure of any of them is everybody's. */
static sv_status agree(session *s, sv_status status)
{
    char *plans = NULL, *text = NULL, digest[65] = "";
    if (launch_team() == NULL)
        return status;
    if (status == SV_OK)
        status = session_plan_text(s, &plans);
    if (status == SV_OK && asprintf(&text, "%s\n%s\n%s\n%s\n%s", s->version, s->kernel,
                                    s->options->command_line, s->base.identity, plans) < 0) {
        text = NULL;
        status = SV_FAIL(s->context, SV_NO_MEMORY, "out of memory");
    }
    if (text != NULL)
        sv_digest(text, strlen(text), digest);
    free(text);
    sv_give(s->context, plans);
    return launch_agree(s->context, status, digest);
}

/* What the other ranks do: rank 0 keeps the run. */
static sv_status help_rank_0(session *s)
{
    sv_case *cases = NULL;
    sv_status status = cases_make(s, &cases);
    status = launch_agree(s->context, status, "");
    if (status == SV_OK) {
        status = sv_team_help(s->context, launch_team(), cases, s->n_points, s->threads);
        if (status != SV_OK)
            launch_abort(status);
    }
    sv_give(s->context, cases);
    return status;
}

static sv_status average(session *s)
{
    sv_context *context = s->context;
    double start = seconds_now();
    sv_run *run = NULL;
    sv_ensemble ensemble = {0};
    sv_index loaded = 0;
    sv_status computed = SV_OK;
    sv_status status = run_folder_open(s, &run);
    if (status == SV_OK)
        status = sv_ensemble_init(context, s->n_points, s->base.realisations,
                                  s->points[0].problem.n_markers, &ensemble);
    if (status == SV_OK)
        status = sv_run_load(context, run, &ensemble, &loaded);
    if (status == SV_OK && loaded > 0)
        sv_log(context, SV_LOG_NOTE, "continuing: %lld realisations are there", (long long)loaded);
    status = launch_agree(context, status, ""); /* the run is open: all may begin */
    if (status == SV_OK)
        status = computed = compute(s, run, &ensemble);
    run_folder_note_end(s, run, computed);
    sv_error error = context->error;
    if (status == SV_OK || computed == SV_INTERRUPTED) {
        status = SV_OK;
        if (s->options->tasks > 0)
            report_task(s, &ensemble);
        else
            status = show_results(s, run, &ensemble, seconds_now() - start);
        /* What is there may well be undecided yet: that it stopped early is what counts. */
        if (computed == SV_INTERRUPTED && (status == SV_OK || status == SV_UNDECIDED)) {
            context->error = error;
            status = computed;
        }
    }
    sv_ensemble_free(context, &ensemble);
    sv_run_close(context, run);
    return status;
}

/* Where a point stops depends on all its realisations, which no task has. */
static sv_status check_task(session *s)
{
    if (s->options->tasks == 0 || !s->base.has_stop)
        return SV_OK;
    return SV_FAIL(s->context, SV_USAGE,
                   "the sheet has a stop rule (ensemble.stop), which needs all realisations in one "
                   "process: leave out --task, or the rule");
}

int run_average(sv_context *context, const options *o)
{
    return average_and_conclude(context, o, NULL);
}

int average_and_conclude(sv_context *context, const options *o, ensemble_conclusion *conclude)
{
    session s = {.conclude = conclude};
    forecast f;
    if (o->output == NULL && !o->dry_run) {
        fprintf(stderr, "selvedge: error: average needs a run folder\nhint: give -o RUN\n");
        return sv_status_exit_code(SV_USAGE);
    }
    sv_status status = session_open(context, o, o->files[0], false, true, &s);
    if (status == SV_OK)
        status = session_try_windows(&s);
    if (status == SV_OK && o->dry_run) {
        status = session_plan(&s, false);
        if (status == SV_OK)
            status = session_forecast(&s, true, &f);
        if (status == SV_OK)
            print_forecast(&f, &s, "", stdout);
    } else if (status == SV_OK) {
        status = check_task(&s);
        if (status == SV_OK)
            status = session_plan(&s, false);
    }
    if (!o->dry_run) {
        status = agree(&s, status);
        if (status == SV_OK)
            status =
                launch_team() != NULL && launch_team()->rank > 0 ? help_rank_0(&s) : average(&s);
    }
    session_close(&s);
    return status == SV_OK ? 0 : fail_exit(context, status);
}
