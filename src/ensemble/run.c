/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Realisations over worker threads. What is computed depends on the sheet alone; the threads only
 * decide when. */
#include "ensemble_internal.h"

#include <math.h>
#include <pthread.h>
#include <string.h>
#include <time.h>

/* Shared by the workers; everything below `mutex` is guarded by it. */
typedef struct crew {
    const sv_case *points;
    const sv_ensemble_options *options;
    sv_ensemble *ensemble;
    sv_context *context; /* of the caller: progress, log, sink */
    double deadline;     /* monotonic seconds, 0: none */
    pthread_mutex_t mutex;
    sv_stop_state *stops;   /* one per point */
    int64_t *next;       /* next realisation to hand out, one per point */
    int64_t done, total; /* for progress */
    int32_t n_workers;   /* that have begun */
    double last_progress;
    sv_status status; /* first failure */
} crew;

static double seconds_now(void)
{
    struct timespec now;
    clock_gettime(CLOCK_MONOTONIC, &now);
    return (double)now.tv_sec + 1e-9 * (double)now.tv_nsec;
}

bool sv_task_owns(int32_t task, int32_t tasks, int32_t point, int64_t realisation)
{
    return tasks == 0 || (point + realisation) % tasks == task - 1;
}

/* Is there anything left to do for a realisation here? */
static bool is_wanted(const crew *c, int32_t point, int64_t realisation)
{
    const sv_ensemble *e = c->ensemble;
    return !e->done[point * e->realisations + realisation] &&
           sv_task_owns(c->options->task, c->options->tasks, point, realisation);
}

/* Hands out the next missing realisation of the first point that still needs one. */
static bool next_work(crew *c, int32_t *ret_point, int64_t *ret_realisation)
{
    const sv_ensemble *e = c->ensemble;
    for (int32_t p = 0; p < e->n_points; p++) {
        if (c->stops[p].settled)
            continue;
        while (c->next[p] < e->realisations && !is_wanted(c, p, c->next[p]))
            c->next[p]++;
        if (c->next[p] == e->realisations)
            continue;
        *ret_point = p;
        *ret_realisation = c->next[p]++;
        return true;
    }
    return false;
}

/* Takes in what a point has gained; a settled point gives up the rest of its share. */
static void settle(crew *c, int32_t point)
{
    bool before = c->stops[point].settled;
    sv_stop_advance(&c->stops[point], c->ensemble, point, &c->options->stop);
    if (!before && c->stops[point].settled)
        c->total -= c->ensemble->realisations - c->next[point];
}

static void report(crew *c, bool force)
{
    double now = seconds_now();
    if (!force && now - c->last_progress < 0.1)
        return;
    c->last_progress = now;
    sv_progress(c->context, "realisations", c->done, c->total);
}

static void fail_crew(crew *c, const sv_context *worker, sv_status status)
{
    if (c->status != SV_OK)
        return;
    c->status = status;
    sv_context_take_error(c->context, worker);
}

static void store(crew *c, sv_context *worker, const sv_record *record)
{
    sv_status status = SV_OK;
    if (c->options->sink.put != NULL)
        status = c->options->sink.put(worker, record, c->options->sink.user);
    if (status == SV_OK)
        status = sv_ensemble_put(worker, c->ensemble, record);
    if (status != SV_OK) {
        fail_crew(c, worker, status);
        return;
    }
    c->done++;
    settle(c, record->point);
    report(c, false);
}

static bool out_of_time(const crew *c)
{
    return c->deadline > 0.0 && seconds_now() >= c->deadline;
}

static void *work(void *argument)
{
    crew *c = argument;
    sv_context worker = sv_context_fork(c->context);
    pthread_mutex_lock(&c->mutex);
    const int32_t thread = c->n_workers++;
    for (;;) {
        int32_t point;
        int64_t realisation;
        if (c->status != SV_OK || !next_work(c, &point, &realisation))
            break;
        if (sv_cancelled(&worker) || out_of_time(c)) {
            (void)SV_FAIL(&worker, SV_INTERRUPTED, "stopped with %lld of %lld realisations done",
                          (long long)c->done, (long long)c->total);
            fail_crew(c, &worker, SV_INTERRUPTED);
            break;
        }
        pthread_mutex_unlock(&c->mutex);
        sv_record record;
        sv_status status = sv_realise(&worker, &c->points[point], realisation, NULL, NULL, &record);
        pthread_mutex_lock(&c->mutex);
        if (status != SV_OK) {
            fail_crew(c, &worker, status);
            break;
        }
        record.point = point;
        record.thread = thread;
        store(c, &worker, &record);
    }
    pthread_mutex_unlock(&c->mutex);
    return NULL;
}

static sv_status start_threads(sv_context *context, crew *c)
{
    pthread_t *threads = NULL;
    int started = 0;
    sv_status status = sv_take(context, c->options->threads, sizeof *threads, &threads);
    if (status != SV_OK)
        return status;
    /* The calling thread is one of the crew: with one thread no other is started. */
    for (int k = 1; k < c->options->threads; k++) {
        if (pthread_create(&threads[started], NULL, work, c) != 0)
            break; /* fewer threads, same result */
        started++;
    }
    work(c);
    for (int k = 0; k < started; k++)
        pthread_join(threads[k], NULL);
    sv_give(context, threads);
    /* Said at the end: others may have finished theirs after the first one noticed. */
    if (c->status == SV_INTERRUPTED)
        return SV_FAIL(context, SV_INTERRUPTED, "stopped with %lld of %lld realisations done",
                       (long long)c->done, (long long)c->total);
    return c->status;
}

static void count_what_is_there(crew *c)
{
    const sv_ensemble *e = c->ensemble;
    for (int32_t p = 0; p < e->n_points; p++) {
        int64_t there = 0, wanted = 0;
        for (int64_t k = 0; k < e->realisations; k++) {
            there += e->done[p * e->realisations + k];
            wanted += is_wanted(c, p, k);
        }
        c->done += there;
        sv_stop_advance(&c->stops[p], e, p, &c->options->stop);
        c->total += c->stops[p].settled ? there : there + wanted;
    }
}

sv_status sv_ensemble_run(sv_context *context, const sv_case *points,
                          const sv_ensemble_options *options, sv_ensemble *ensemble)
{
    crew c = {.points = points, .options = options, .ensemble = ensemble, .context = context};
    sv_status status;
    if (options->tasks < 0 || options->task < 0 || options->task > options->tasks ||
        (options->tasks > 0 && (options->task == 0 || options->stop.active)))
        return SV_FAIL(context, SV_INVALID_INPUT, "task %ld of %ld%s", (long)options->task,
                       (long)options->tasks,
                       options->stop.active ? " with a stop rule, which needs all realisations"
                                            : "");
    if (options->threads < 1)
        return SV_FAIL(context, SV_INVALID_INPUT, "%d threads", options->threads);
    if ((status = sv_take(context, ensemble->n_points, sizeof *c.stops, &c.stops)) != SV_OK ||
        (status = sv_take(context, ensemble->n_points, sizeof *c.next, &c.next)) != SV_OK)
        goto out;
    if (pthread_mutex_init(&c.mutex, NULL) != 0) {
        status = SV_FAIL(context, SV_INTERNAL, "no mutex");
        goto out;
    }
    if (options->time_limit > 0.0)
        c.deadline = seconds_now() + options->time_limit;
    count_what_is_there(&c);
    report(&c, true);
    status = start_threads(context, &c);
    report(&c, true);
    pthread_mutex_destroy(&c.mutex);
out:
    sv_give(context, c.stops);
    sv_give(context, c.next);
    return status;
}
