/* SPDX-License-Identifier: GPL-3.0-or-later */
/* How good the rows of a run are and what they cost, over all of them. */
#include <math.h>
#include <stdio.h>
#include <string.h>

#include "store_internal.h"

enum { MOST_WORKERS = 4096 };

/* What is being added up; `room` is of the workers. */
typedef struct tally {
    sv_run_health health;
    sv_index room, last; /* last: the worker of the row before */
} tally;

static bool is_worker(const sv_worker_cost *worker, const char *host, int32_t rank)
{
    return worker->rank == rank && strcmp(worker->host, host) == 0;
}

/* The line of a worker; those beyond a limit share one without a host. */
static sv_status find_worker(sv_context *context, tally *t, const char *host, int32_t rank,
                             sv_worker_cost **ret_worker)
{
    sv_run_health *h = &t->health;
    if (h->n_workers >= MOST_WORKERS - 1) {
        host = "";
        rank = 0;
    }
    sv_index k =
        t->last < h->n_workers && is_worker(&h->workers[t->last], host, rank) ? t->last : 0;
    while (k < h->n_workers && !is_worker(&h->workers[k], host, rank))
        k++;
    if (k == h->n_workers) {
        sv_status status =
            sv_reserve(context, &h->workers, &t->room, h->n_workers + 1, sizeof *h->workers);
        if (status != SV_OK)
            return status;
        snprintf(h->workers[k].host, sizeof h->workers[k].host, "%s", host);
        h->workers[k].rank = rank;
        h->n_workers++;
    }
    t->last = k;
    *ret_worker = &h->workers[k];
    return SV_OK;
}

static double positive(double seconds)
{
    return seconds > 0.0 ? seconds : 0.0; /* NaN too */
}

static sv_status add_cost(sv_context *context, tally *t, const sv_record *record)
{
    sv_run_health *h = &t->health;
    sv_worker_cost *worker = NULL;
    sv_status status = find_worker(context, t, record->host, record->rank, &worker);
    if (status != SV_OK)
        return status;
    worker->realisations++;
    worker->seconds += positive(record->seconds);
    worker->processor_seconds += positive(record->processor_seconds);
    if (record->peak_bytes > worker->peak_bytes)
        worker->peak_bytes = record->peak_bytes;
    if (record->seconds > h->longest) {
        h->longest = record->seconds;
        h->longest_point = record->point;
        h->longest_realisation = record->realisation;
    }
    h->seconds += positive(record->seconds);
    h->processor_seconds += positive(record->processor_seconds);
    if (record->peak_bytes > h->peak_bytes)
        h->peak_bytes = record->peak_bytes;
    return SV_OK;
}

static void add_engine(sv_marker_health *m, const sv_outcome *o)
{
    int k = 0;
    if (o->engine[0] == '\0')
        return;
    while (k < m->n_engines && strcmp(m->engines[k].name, o->engine) != 0)
        k++;
    if (k == SV_HEALTH_ENGINES)
        return;
    sv_engine_use *use = &m->engines[k];
    if (k == m->n_engines) {
        snprintf(use->name, sizeof use->name, "%s", o->engine);
        use->degrees[0] = use->degrees[1] = o->degree;
        m->n_engines++;
    }
    use->count++;
    if (o->degree < use->degrees[0])
        use->degrees[0] = o->degree;
    if (o->degree > use->degrees[1])
        use->degrees[1] = o->degree;
}

static void add_outcome(sv_marker_health *m, const sv_record *record, const sv_outcome *o)
{
    m->verdicts[o->verdict]++;
    add_engine(m, o);
    if (o->verdict != SV_RESOLVED || isnan(o->numerical_error) ||
        !(isnan(m->numerical_error) || o->numerical_error > m->numerical_error))
        return;
    m->numerical_error = o->numerical_error;
    m->worst_point = record->point;
    m->worst_realisation = record->realisation;
}

static sv_status add_record(sv_context *context, const sv_run *run, tally *t,
                            const sv_record *record)
{
    sv_run_health *h = &t->health;
    h->realisations++;
    h->failed += record->status != SV_OK;
    for (int k = 0; k < record->n_outcomes; k++) {
        if (k == h->n_markers) {
            h->markers[k].numerical_error = (double)NAN;
            if (run->n_markers > k)
                snprintf(h->markers[k].marker, sizeof h->markers[k].marker, "%s", run->markers[k]);
            h->n_markers++;
        }
        add_outcome(&h->markers[k], record, &record->outcomes[k]);
    }
    return add_cost(context, t, record);
}

static sv_status add_rows(sv_context *context, sv_run *run, sqlite3_stmt *keys, tally *t)
{
    int code;
    while ((code = sqlite3_step(keys)) == SQLITE_ROW) {
        const sqlite3_int64 point = sqlite3_column_int64(keys, 0);
        sv_record record;
        bool found = false;
        if (sv_cancelled(context))
            return SV_FAIL(context, SV_INTERRUPTED, "stopped while reading %s", run->folder);
        if (point < 0 || point >= SV_MAX_POINTS)
            return SV_FAIL(context, SV_STORAGE, "%s/%s holds a row of point %lld", run->folder,
                           SV_LEDGER_NAME, (long long)point);
        sv_status status = sv_record_read(context, run, (int32_t)point,
                                          sqlite3_column_int64(keys, 1), &record, &found);
        if (status == SV_OK && found)
            status = add_record(context, run, t, &record);
        if (status != SV_OK)
            return status;
    }
    return code == SQLITE_DONE ? SV_OK : sv_ledger_fail(context, run, "read");
}

sv_status sv_run_health_read(sv_context *context, sv_run *run, sv_run_health *ret_health)
{
    tally t = {.last = 0};
    sqlite3_stmt *keys = NULL;
    sv_status status = sv_ledger_execute(context, run, "BEGIN");
    if (status != SV_OK)
        return status;
    status = sv_ledger_prepare(context, run,
                               "SELECT point, realisation FROM realisation "
                               "ORDER BY point, realisation",
                               &keys);
    if (status == SV_OK)
        status = add_rows(context, run, keys, &t);
    sqlite3_finalize(keys);
    sqlite3_exec(run->ledger, "COMMIT", NULL, NULL, NULL);
    if (status == SV_OK)
        *ret_health = t.health;
    else
        sv_run_health_free(context, &t.health);
    return status;
}

void sv_run_health_free(sv_context *context, sv_run_health *health)
{
    sv_give(context, health->workers);
    *health = (sv_run_health){0};
}
