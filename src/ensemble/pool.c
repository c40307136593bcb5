/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Threads that compute realisations from a queue. One thread, the owner, fills the queue and takes
 * the results; it is free to wait for a disk or for other processes meanwhile. */
#include "ensemble_internal.h"

#include <pthread.h>
#include <string.h>
#include <time.h>

enum { QUEUE = 1024 };

typedef struct finished {
    struct finished *next;
    sv_record record;
} finished;

struct pool {
    sv_context context; /* of the workers: a fork of the owner's with a cancel of its own */
    const sv_context *owner;
    const sv_case *points;
    pthread_mutex_t mutex; /* guards everything below */
    pthread_cond_t work, news;
    pthread_t *threads;
    int n_threads, n_begun;
    pool_job queue[QUEUE]; /* a ring */
    int first, waiting, running;
    bool closing, aborting;
    finished *results, **last;
    sv_status status; /* first failure, its error in `context` */
    double seconds;   /* of all realisations that came out */
    int64_t count;
};

static bool is_aborted(void *user)
{
    const pool *p = user;
    return __atomic_load_n(&p->aborting, __ATOMIC_RELAXED) || sv_cancelled(p->owner);
}

static void compute(pool *p, sv_context *worker, pool_job job, int32_t thread)
{
    finished *f = NULL;
    sv_status status = sv_take(worker, 1, sizeof *f, &f);
    pthread_mutex_unlock(&p->mutex);
    if (status == SV_OK)
        status = sv_realise(worker, &p->points[job.point], job.realisation, NULL, NULL, &f->record);
    pthread_mutex_lock(&p->mutex);
    if (status != SV_OK) {
        sv_give(worker, f);
        if (p->status == SV_OK) {
            p->status = status;
            sv_context_take_error(&p->context, worker);
        }
        p->waiting = 0;
        return;
    }
    f->record.point = job.point;
    f->record.thread = thread;
    p->seconds += f->record.seconds;
    p->count++;
    *p->last = f;
    p->last = &f->next;
}

static void *work(void *argument)
{
    pool *p = argument;
    sv_context worker = sv_context_fork(&p->context);
    pthread_mutex_lock(&p->mutex);
    const int32_t thread = p->n_begun++;
    for (;;) {
        while (p->waiting == 0 && !p->closing)
            pthread_cond_wait(&p->work, &p->mutex);
        if (p->waiting == 0)
            break;
        pool_job job = p->queue[p->first];
        p->first = (p->first + 1) % QUEUE;
        p->waiting--;
        p->running++;
        compute(p, &worker, job, thread);
        p->running--;
        pthread_cond_signal(&p->news);
    }
    pthread_mutex_unlock(&p->mutex);
    return NULL;
}

sv_status pool_start(sv_context *context, const sv_case *points, int threads, pool **ret_pool)
{
    pool *p = NULL;
    pthread_condattr_t monotonic;
    sv_status status = sv_take(context, 1, sizeof *p, &p);
    if (status != SV_OK)
        return status;
    p->context = sv_context_fork(context);
    p->context.cancel = is_aborted;
    p->context.cancel_user = p;
    p->owner = context;
    p->points = points;
    p->last = &p->results;
    status = sv_take(context, threads, sizeof *p->threads, &p->threads);
    if (status != SV_OK) {
        sv_give(context, p);
        return status;
    }
    pthread_mutex_init(&p->mutex, NULL);
    pthread_cond_init(&p->work, NULL);
    pthread_condattr_init(&monotonic);
    pthread_condattr_setclock(&monotonic, CLOCK_MONOTONIC);
    pthread_cond_init(&p->news, &monotonic);
    pthread_condattr_destroy(&monotonic);
    for (int k = 0; k < threads; k++) {
        if (pthread_create(&p->threads[p->n_threads], NULL, work, p) != 0)
            break; /* fewer threads, same result */
        p->n_threads++;
    }
    if (p->n_threads == 0) {
        pool_end(context, p);
        return SV_FAIL(context, SV_REFUSED, "the system starts no thread");
    }
    *ret_pool = p;
    return SV_OK;
}

/* Work for about a quarter of a second beyond what runs, so that nobody waits for the owner. */
int pool_wants(pool *p, int64_t most)
{
    const double reserve = 0.25;
    pthread_mutex_lock(&p->mutex);
    double each = p->count > 0 ? p->seconds / (double)p->count : 1.0;
    double depth = reserve / (each > 1e-4 ? each : 1e-4);
    int64_t level = p->n_threads * (depth < 1.0 ? 1 : depth > 100.0 ? 100 : (int64_t)depth);
    int64_t idle = p->n_threads - p->running;
    if (level > QUEUE)
        level = QUEUE;
    if (level > most)
        level = most > idle ? most : idle;
    /* The first results tell how long one takes. */
    int64_t wants = p->count == 0 ? 2 * p->n_threads - p->running - p->waiting
                                  : level - p->waiting + (idle > 0 ? idle : 0);
    if (wants > QUEUE - p->waiting)
        wants = QUEUE - p->waiting;
    if (p->status != SV_OK || p->closing || wants < 0)
        wants = 0;
    pthread_mutex_unlock(&p->mutex);
    return (int)wants;
}

void pool_give(pool *p, pool_job job)
{
    pthread_mutex_lock(&p->mutex);
    if (p->waiting < QUEUE && p->status == SV_OK) {
        p->queue[(p->first + p->waiting) % QUEUE] = job;
        p->waiting++;
        pthread_cond_signal(&p->work);
    }
    pthread_mutex_unlock(&p->mutex);
}

int pool_busy(pool *p)
{
    pthread_mutex_lock(&p->mutex);
    int busy = p->waiting + p->running;
    pthread_mutex_unlock(&p->mutex);
    return busy;
}

bool pool_next(pool *p, sv_record *ret_record)
{
    pthread_mutex_lock(&p->mutex);
    finished *f = p->results;
    if (f != NULL) {
        p->results = f->next;
        if (p->results == NULL)
            p->last = &p->results;
    }
    pthread_mutex_unlock(&p->mutex);
    if (f == NULL)
        return false;
    *ret_record = f->record;
    sv_give(&p->context, f);
    return true;
}

sv_status pool_status(sv_context *context, pool *p)
{
    pthread_mutex_lock(&p->mutex);
    sv_status status = p->status;
    if (status != SV_OK)
        sv_context_take_error(context, &p->context);
    pthread_mutex_unlock(&p->mutex);
    return status;
}

void pool_wait(pool *p, double seconds)
{
    struct timespec until;
    clock_gettime(CLOCK_MONOTONIC, &until);
    int64_t nanoseconds = until.tv_nsec + (int64_t)(1e9 * seconds);
    until.tv_sec += nanoseconds / 1000000000;
    until.tv_nsec = nanoseconds % 1000000000;
    pthread_mutex_lock(&p->mutex);
    if (p->results == NULL && p->status == SV_OK)
        pthread_cond_timedwait(&p->news, &p->mutex, &until);
    pthread_mutex_unlock(&p->mutex);
}

void pool_stop(pool *p, bool abort_running)
{
    pthread_mutex_lock(&p->mutex);
    p->waiting = 0;
    p->closing = true;
    if (abort_running)
        __atomic_store_n(&p->aborting, true, __ATOMIC_RELAXED);
    pthread_cond_broadcast(&p->work);
    pthread_mutex_unlock(&p->mutex);
}

void pool_end(sv_context *context, pool *p)
{
    sv_record record;
    if (p == NULL)
        return;
    pool_stop(p, true);
    for (int k = 0; k < p->n_threads; k++)
        pthread_join(p->threads[k], NULL);
    while (p->results != NULL)
        if (pool_next(p, &record))
            sv_site_record_free(context, record.maps);
    pthread_mutex_destroy(&p->mutex);
    pthread_cond_destroy(&p->work);
    pthread_cond_destroy(&p->news);
    sv_give(context, p->threads);
    sv_give(context, p);
}
