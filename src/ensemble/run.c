/* SPDX-License-Identifier: GPL-3.0-or-later */
/* An ensemble over threads and processes. What is computed depends on the sheet alone; the workers
 * only decide when. One thread hands out, stores and reports; others compute. */
#include "ensemble_internal.h"

#include <math.h>
#include <string.h>
#include <time.h>

enum { MOST_AT_ONCE = 256 }; /* results stored in one step */

/* The desk where work is handed out and results come in: one thread's. */
typedef struct crew {
    const sv_case *points;
    const sv_ensemble_options *options;
    sv_ensemble *ensemble;
    sv_context *context;
    double deadline;      /* monotonic seconds, 0: none */
    sv_stop_state *stops; /* one per point */
    int64_t *next;        /* next realisation to hand out, one per point */
    int64_t done, total;  /* for progress */
    int64_t handed;       /* handed out, not back */
    double last_progress, last_store;
    pool *pool;
    team_desk *team;
    sv_record *fresh; /* results not stored yet, room for MOST_AT_ONCE */
    int n_fresh;
    bool sink_failed, winding_up;
    sv_status status; /* why nothing more is handed out */
} crew;

double sv_seconds_now(void)
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
static bool next_work(crew *c, pool_job *ret_job)
{
    const sv_ensemble *e = c->ensemble;
    for (int32_t p = 0; p < e->n_points; p++) {
        if (c->stops[p].settled)
            continue;
        while (c->next[p] < e->realisations && !is_wanted(c, p, c->next[p]))
            c->next[p]++;
        if (c->next[p] == e->realisations)
            continue;
        *ret_job = (pool_job){p, c->next[p]++};
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
    double now = sv_seconds_now();
    if (!force && now - c->last_progress < 0.1)
        return;
    c->last_progress = now;
    sv_progress(c->context, "realisations", c->done, c->total);
}

static void keep(crew *c, const sv_record *record)
{
    sv_status status = sv_ensemble_put(c->context, c->ensemble, record);
    if (status != SV_OK) {
        c->status = status;
        return;
    }
    c->done++;
    settle(c, record->point);
}

/* The values of the maps have no place in the ensemble. */
static void drop_maps(crew *c, int n)
{
    for (int k = 0; k < n; k++) {
        sv_site_record_free(c->context, c->fresh[k].maps);
        c->fresh[k].maps = NULL;
    }
}

/* Is it time to store what came in? A kill costs at most so much work; the stop rule waits for
 * nothing. */
static bool store_is_due(const crew *c)
{
    const double pause = 0.2;
    return c->n_fresh == MOST_AT_ONCE || c->winding_up || c->options->stop.active ||
           sv_seconds_now() - c->last_store >= pause;
}

/* Stores what came in: together where the sink can, so that a slow disk is waited for once. */
static void store(crew *c)
{
    const sv_sink *sink = &c->options->sink;
    const int n = c->n_fresh;
    if (n == 0 || !store_is_due(c))
        return;
    c->n_fresh = 0;
    if (c->sink_failed) {
        drop_maps(c, n);
        return;
    }
    sv_status status = SV_OK;
    if (sink->put_many != NULL)
        status = sink->put_many(c->context, c->fresh, n, sink->user);
    for (int k = 0; k < n && status == SV_OK; k++) {
        if (sink->put_many == NULL && sink->put != NULL)
            status = sink->put(c->context, &c->fresh[k], sink->user);
        if (status == SV_OK)
            keep(c, &c->fresh[k]);
    }
    if (status != SV_OK) {
        c->status = status;
        c->sink_failed = true;
    }
    drop_maps(c, n);
    c->last_store = sv_seconds_now();
    report(c, false);
}

static void take_result(void *user, const sv_record *record)
{
    crew *c = user;
    c->fresh[c->n_fresh++] = *record;
    if (record->maps != NULL)
        record->maps->counted = c->stops[record->point].counted;
    c->handed--;
    if (c->n_fresh == MOST_AT_ONCE)
        store(c);
}

/* The share of what is left that one of the processes may have waiting. */
static int64_t fair_share(const crew *c)
{
    const int64_t size = c->options->team != NULL ? c->options->team->size : 1;
    const int64_t left = c->total - c->done - c->handed;
    /* What is handed out ahead may turn out to lie beyond the end. */
    if (c->options->stop.active)
        return c->options->threads;
    return left > 2 * size ? left / (2 * size) : 1;
}

/* For another process: `ahead` jobs are waiting there already. */
static bool next_for_team(void *user, int64_t ahead, pool_job *ret_job)
{
    crew *c = user;
    if (c->status != SV_OK || (ahead > 0 && ahead >= fair_share(c)) || !next_work(c, ret_job))
        return false;
    c->handed++;
    return true;
}

static void fill_pool(crew *c)
{
    pool_job job;
    for (int wants = pool_wants(c->pool, fair_share(c)); wants > 0 && next_work(c, &job); wants--) {
        c->handed++;
        pool_give(c->pool, job);
    }
}

static void look_for_stop(crew *c)
{
    if (c->status != SV_OK)
        return;
    if (sv_cancelled(c->context) || (c->deadline > 0.0 && sv_seconds_now() >= c->deadline))
        c->status = SV_INTERRUPTED;
    else
        c->status = pool_status(c->context, c->pool);
}

static void pump(crew *c)
{
    sv_record record;
    while (pool_next(c->pool, &record))
        take_result(c, &record);
    if (c->team != NULL) {
        sv_status status = desk_poll(c->context, c->team);
        if (c->status == SV_OK)
            c->status = status;
    }
    store(c);
}

/* How long nothing need be looked at: results of threads wake the desk, messages do not. */
static double patience(const crew *c)
{
    double seconds = c->team != NULL ? 0.005 : 0.1;
    if (c->deadline > 0.0 && c->status == SV_OK)
        seconds = fmax(0.0, fmin(seconds, c->deadline - sv_seconds_now()));
    return seconds;
}

static bool is_busy(const crew *c)
{
    return pool_busy(c->pool) > 0 || (c->team != NULL && desk_busy(c->team) > 0);
}

/* What is running ends, or is given up when the caller wants so; nobody works after that. */
static void wind_up(crew *c)
{
    bool told = false;
    c->winding_up = true;
    for (;;) {
        bool abort_running = c->status != SV_OK && sv_cancelled(c->context);
        pool_stop(c->pool, abort_running);
        if (c->team != NULL && !told) {
            sv_status status = desk_stop(c->context, c->team, abort_running);
            if (c->status == SV_OK)
                c->status = status;
            told = true;
        }
        pump(c);
        if (pool_busy(c->pool) == 0 && (c->team == NULL || desk_empty(c->team)))
            break;
        pool_wait(c->pool, patience(c));
    }
    pump(c); /* what came out at the very end */
}

static sv_status work(crew *c)
{
    for (;;) {
        look_for_stop(c);
        if (c->status != SV_OK)
            break;
        fill_pool(c);
        pump(c);
        if (c->status == SV_OK && !is_busy(c)) {
            pump(c);
            fill_pool(c);
            /* What was handed out may be done already, with its result not yet taken in. */
            if (c->handed == 0)
                break;
        }
        pool_wait(c->pool, patience(c));
    }
    wind_up(c);
    if (c->status == SV_INTERRUPTED)
        return SV_FAIL(c->context, SV_INTERRUPTED, "stopped with %lld of %lld realisations done",
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

static sv_status check_options(sv_context *context, const sv_ensemble_options *options)
{
    if (options->tasks < 0 || options->task < 0 || options->task > options->tasks ||
        (options->tasks > 0 && (options->task == 0 || options->stop.active)))
        return SV_FAIL(context, SV_INVALID_INPUT, "task %ld of %ld%s", (long)options->task,
                       (long)options->tasks,
                       options->stop.active ? " with a stop rule, which needs all realisations"
                                            : "");
    if (options->threads < 1)
        return SV_FAIL(context, SV_INVALID_INPUT, "%d threads", options->threads);
    return SV_OK;
}

sv_status sv_ensemble_run(sv_context *context, const sv_case *points,
                          const sv_ensemble_options *options, sv_ensemble *ensemble)
{
    crew c = {.points = points, .options = options, .ensemble = ensemble, .context = context};
    sv_status status = check_options(context, options);
    if (status != SV_OK)
        return status;
    if ((status = sv_take(context, ensemble->n_points, sizeof *c.stops, &c.stops)) != SV_OK ||
        (status = sv_take(context, ensemble->n_points, sizeof *c.next, &c.next)) != SV_OK ||
        (status = sv_take(context, MOST_AT_ONCE, sizeof *c.fresh, &c.fresh)) != SV_OK)
        goto out;
    if (options->team != NULL && options->team->size > 1)
        status = desk_open(context, options->team, (desk_calls){next_for_team, take_result, &c},
                           &c.team);
    if (status == SV_OK)
        status = pool_start(context, points, options->threads, &c.pool);
    if (status != SV_OK)
        goto out;
    if (options->time_limit > 0.0)
        c.deadline = sv_seconds_now() + options->time_limit;
    count_what_is_there(&c);
    report(&c, true);
    status = work(&c);
    report(&c, true);
out:
    pool_end(context, c.pool);
    desk_close(context, c.team);
    sv_give(context, c.stops);
    sv_give(context, c.next);
    sv_give(context, c.fresh);
    return status;
}
