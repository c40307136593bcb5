/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The localizer at many probe points and over κ: one plan and one matrix per thread. */
#include "localizer_internal.h"

#include <math.h>
#include <pthread.h>
#include <string.h>

/* κ of a range when their number is not given. */
enum { USUAL_KAPPAS = 9, MOST_THREADS = 256 };
/* Above this many sites a factor is too large for several at a time. */
static const sv_index MOST_SHARED_SITES = 50000;

/* What the threads share. */
typedef struct survey_job {
    const localizer_work *first; /* settings; its plan and matrix serve the calling thread */
    sv_probe *probes;
    sv_index n_probes, next, done;
    const char *phase;
    bool certify; /* lower bounds close to the gap are wanted */
    sv_context *context;
    sv_status status;
    pthread_mutex_t mutex;
} survey_job;

bool sv_localizer_wants_survey(const sv_value *values)
{
    return values[POINTS].present || values[KAPPA_RANGE].present;
}

static sv_status one_probe(sv_context *context, localizer_work *w, bool certify, sv_probe *probe)
{
    sv_outcome outcome = sv_outcome_blank();
    memcpy(w->at, probe->at, sizeof w->at);
    w->kappa = probe->kappa;
    w->lowest = 0.0;
    sv_localizer_move(w->sample, w->kappa, w->at, &w->matrix);
    sv_status status = sv_localizer_judge(context, w, &outcome);
    if (status == SV_OK && certify)
        status = sv_localizer_certify_gap(context, w);
    if (status != SV_OK)
        return status;
    probe->resolved = outcome.verdict == SV_RESOLVED;
    probe->index = outcome.index;
    probe->gap = outcome.margin > 0.0 ? outcome.margin : (double)NAN;
    probe->certain = w->certain;
    snprintf(probe->reason, sizeof probe->reason, "%.119s", outcome.reason);
    return SV_OK;
}

/* Takes probes until none is left. The job is locked on entry and on return. */
static sv_status take_probes(sv_context *context, survey_job *job, localizer_work *w)
{
    sv_status status = SV_OK;
    while (status == SV_OK && job->status == SV_OK && job->next < job->n_probes) {
        sv_probe *probe = &job->probes[job->next++];
        pthread_mutex_unlock(&job->mutex);
        status = sv_cancelled(context)
                     ? SV_FAIL(context, SV_INTERRUPTED, "stopped at probe %lld of %lld",
                               (long long)(probe - job->probes), (long long)job->n_probes)
                     : one_probe(context, w, job->certify, probe);
        pthread_mutex_lock(&job->mutex);
        job->done += status == SV_OK;
        if (status == SV_OK)
            sv_progress(job->context, job->phase, job->done, job->n_probes);
    }
    if (status != SV_OK && job->status == SV_OK) {
        job->status = status;
        sv_context_take_error(job->context, context);
    }
    return status;
}

/* A further thread makes a matrix and a plan of its own. */
static void *probe_thread(void *argument)
{
    survey_job *job = argument;
    sv_context context = sv_context_fork(job->context);
    localizer_work w = *job->first;
    w.plan = NULL;
    w.matrix = (sv_sparse){0};
    sv_status status = sv_localizer_matrix(&context, w.sample, w.energy, w.kappa, w.at, &w.matrix);
    if (status == SV_OK)
        status = sv_inertia_plan_make(&context, &w.matrix, 2, &w.plan);
    pthread_mutex_lock(&job->mutex);
    if (status == SV_OK)
        status = take_probes(&context, job, &w);
    /* Without memory for this thread the others do its work. */
    pthread_mutex_unlock(&job->mutex);
    sv_localizer_end(&context, &w);
    return NULL;
}

static sv_status run_probes(sv_context *context, localizer_work *w, int threads, survey_job *job)
{
    pthread_t started[MOST_THREADS];
    int count = 0;
    localizer_work first = *w;
    job->first = w;
    job->context = context;
    if (pthread_mutex_init(&job->mutex, NULL) != 0)
        return SV_FAIL(context, SV_INTERNAL, "no mutex");
    if (w->sample->n > MOST_SHARED_SITES)
        threads = 1;
    sv_progress(context, job->phase, 0, job->n_probes);
    for (int k = 1; k < threads && k < MOST_THREADS && k < job->n_probes; k++)
        count += pthread_create(&started[count], NULL, probe_thread, job) == 0;
    sv_context mine = sv_context_fork(context);
    pthread_mutex_lock(&job->mutex);
    (void)take_probes(&mine, job, &first);
    pthread_mutex_unlock(&job->mutex);
    for (int k = 0; k < count; k++)
        pthread_join(started[k], NULL);
    pthread_mutex_destroy(&job->mutex);
    return job->status;
}

/* Corners of the grid: those written, else the outermost sites of the pristine flake. */
static void choose_ends(const sv_marker_input *input, sv_survey *s)
{
    const sv_flake *flake = input->sample->flake;
    double low[2] = {INFINITY, INFINITY}, high[2] = {-INFINITY, -INFINITY};
    for (sv_index k = 0; k < flake->n_sites; k++)
        for (int d = 0; d < 2; d++) {
            low[d] = fmin(low[d], flake->sites[k].at[d]);
            high[d] = fmax(high[d], flake->sites[k].at[d]);
        }
    const sv_value *from = &input->values[FROM], *to = &input->values[TO];
    memcpy(s->from, from->present ? from->real : low, sizeof s->from);
    memcpy(s->to, to->present ? to->real : high, sizeof s->to);
}

/* The last point is `to` itself, not a sum of steps. */
static double place_between(double from, double to, sv_index k, sv_index count)
{
    return k == count - 1 ? to : from + (to - from) * (double)k / (double)(count - 1);
}

static sv_status lay_probes(sv_context *context, const sv_marker_input *input, sv_survey *s)
{
    const sv_value *points = &input->values[POINTS];
    if (!points->present)
        return SV_OK;
    s->line = points->count == 1;
    s->points[0] = points->integer[0];
    s->points[1] = s->line ? 1 : points->integer[1];
    choose_ends(input, s);
    sv_status status = sv_take(context, s->points[0] * s->points[1], sizeof *s->probes, &s->probes);
    for (sv_index k = 0; status == SV_OK && k < s->points[0] * s->points[1]; k++) {
        sv_index i = k % s->points[0], j = s->line ? i : k / s->points[0];
        sv_index ny = s->line ? s->points[0] : s->points[1];
        s->probes[k] = (sv_probe){.kappa = s->kappa,
                                  .gap = NAN,
                                  .at = {place_between(s->from[0], s->to[0], i, s->points[0]),
                                         place_between(s->from[1], s->to[1], j, ny)}};
    }
    return status;
}

static sv_status lay_kappas(sv_context *context, const sv_marker_input *input, const double at[2],
                            sv_survey *s)
{
    const sv_value *range = &input->values[KAPPA_RANGE], *number = &input->values[KAPPA_POINTS];
    if (!range->present)
        return SV_OK;
    s->n_kappas = number->present ? number->integer[0] : USUAL_KAPPAS;
    sv_status status = sv_take(context, s->n_kappas, sizeof *s->kappas, &s->kappas);
    for (sv_index k = 0; status == SV_OK && k < s->n_kappas; k++) {
        double share = (double)k / (double)(s->n_kappas - 1);
        double kappa = k == s->n_kappas - 1
                           ? range->real[1]
                           : range->real[0] * pow(range->real[1] / range->real[0], share);
        s->kappas[k] = (sv_probe){.at = {at[0], at[1]}, .kappa = kappa, .gap = NAN};
    }
    return status;
}

/* The longest run of equal resolved indices; of equal ones that which holds κ of the sheet. */
static void find_steady(sv_survey *s)
{
    sv_index longest = 0;
    s->steady[0] = s->steady[1] = -1;
    for (sv_index low = 0, high; low < s->n_kappas; low = high) {
        high = low + 1;
        if (!s->kappas[low].resolved)
            continue;
        while (high < s->n_kappas && s->kappas[high].resolved &&
               s->kappas[high].index == s->kappas[low].index)
            high++;
        bool holds = s->kappas[low].kappa <= s->kappa && s->kappa <= s->kappas[high - 1].kappa;
        if (high - low < longest || (high - low == longest && !holds))
            continue;
        longest = high - low;
        s->steady[0] = low;
        s->steady[1] = high - 1;
    }
}

static void mark_all(sv_survey *s)
{
    for (sv_index k = 0; k < s->points[0] * s->points[1]; k++)
        snprintf(s->probes[k].reason, sizeof s->probes[k].reason, "%.119s", s->reason);
    for (sv_index k = 0; k < s->n_kappas; k++)
        snprintf(s->kappas[k].reason, sizeof s->kappas[k].reason, "%.119s", s->reason);
}

static sv_status fill(sv_context *context, const sv_marker_input *input, localizer_work *w,
                      sv_survey *s)
{
    survey_job points = {.probes = s->probes,
                         .n_probes = s->points[0] * s->points[1],
                         .phase = "probe points",
                         .certify = true},
               kappas = {.probes = s->kappas, .n_probes = s->n_kappas, .phase = "kappa"};
    sv_status status = SV_OK;
    if (points.n_probes > 0)
        status = run_probes(context, w, input->threads, &points);
    if (status == SV_OK && kappas.n_probes > 0)
        status = run_probes(context, w, input->threads, &kappas);
    return status;
}

sv_status sv_localizer_survey(sv_context *context, const sv_marker_input *input,
                              sv_survey *ret_survey)
{
    sv_survey s = {.steady = {-1, -1}};
    localizer_work w = {0};
    sv_outcome outcome;
    bool ready = false;
    if (!sv_localizer_wants_survey(input->values))
        return SV_FAIL(context, SV_INVALID_INPUT, "neither points nor kappa_range is asked for");
    sv_status status = sv_localizer_begin(context, input, &w, &outcome, &ready);
    if (status != SV_OK)
        return status;
    s.energy = w.energy;
    s.kappa = w.kappa;
    s.threshold = w.threshold;
    if ((status = lay_probes(context, input, &s)) != SV_OK ||
        (status = lay_kappas(context, input, w.at, &s)) != SV_OK ||
        (ready && (status = fill(context, input, &w, &s)) != SV_OK) ||
        (status = sv_localizer_bracket(context, !w.want_value, &s)) != SV_OK)
        goto out;
    if (!ready) {
        snprintf(s.reason, sizeof s.reason, "%s", outcome.reason);
        mark_all(&s);
    }
    find_steady(&s);
out:
    sv_localizer_end(context, &w);
    if (status == SV_OK)
        *ret_survey = s;
    else
        sv_survey_free(context, &s);
    return status;
}

void sv_survey_free(sv_context *context, sv_survey *survey)
{
    sv_give(context, survey->probes);
    sv_give(context, survey->between);
    sv_give(context, survey->kappas);
    *survey = (sv_survey){0};
}
