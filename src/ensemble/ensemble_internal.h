/* SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef SELVEDGE_ENSEMBLE_INTERNAL_H
#define SELVEDGE_ENSEMBLE_INTERNAL_H

#include "selvedge/ensemble.h"

__extension__ typedef unsigned __int128 sv_wide_bits; /* sums modulo 2^128 */

/* Takes in the realisations that follow without a gap, up to the one where the rule holds. */
void sv_stop_advance(sv_stop_state *state, const sv_ensemble *ensemble, int32_t point,
                     const sv_stop_rule *rule);

/* ---- pool.c: threads that compute from a queue; all functions but these threads' are the owner's
 */

typedef struct pool_job {
    int32_t point;
    int64_t realisation;
} pool_job;

typedef struct pool pool;
sv_status pool_start(sv_context *context, const sv_case *points, int threads, pool **ret_pool);
/* Jobs to give now so that no thread has to wait; not more than `most` beyond what is idle. */
int pool_wants(pool *p, int64_t most);
void pool_give(pool *p, pool_job job);
/* Jobs queued and running. */
int pool_busy(pool *p);
/* Takes one result; false when there is none. */
bool pool_next(pool *p, sv_record *ret_record);
/* First failure of a worker, with its error. */
sv_status pool_status(sv_context *context, pool *p);
/* Until something is finished, at most so long. */
void pool_wait(pool *p, double seconds);
/* Drops the queue; running realisations end, or are given up with SV_INTERRUPTED. */
void pool_stop(pool *p, bool abort_running);
/* Ends the threads and gives everything back; NULL is allowed. */
void pool_end(sv_context *context, pool *p);

/* ---- team.c: the same over processes */

double sv_seconds_now(void);

typedef struct team_desk team_desk;
/* What rank 0 asks of its caller: the next job, and what to do with a result. */
typedef struct desk_calls {
    bool (*next)(void *user, int64_t ahead, pool_job *ret_job);
    void (*take)(void *user, const sv_record *record);
    void *user;
} desk_calls;
sv_status desk_open(sv_context *context, const sv_team *team, desk_calls calls,
                    team_desk **ret_desk);
/* Takes all waiting messages and answers them; a failure of a rank is returned with its error. */
sv_status desk_poll(sv_context *context, team_desk *desk);
/* Jobs other ranks have not answered yet. */
int64_t desk_busy(const team_desk *desk);
/* Tells all ranks to stop; then desk_poll() until none is left. */
sv_status desk_stop(sv_context *context, team_desk *desk, bool abort_running);
bool desk_empty(const team_desk *desk);
void desk_close(sv_context *context, team_desk *desk);

#endif
