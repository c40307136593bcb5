/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Realisations at values of parameters that are chosen as the work goes on. */
#include "program_internal.h"

#include <math.h>
#include <string.h>
#include <time.h>

enum { REALISATIONS_PER_POINT = 1 << 20, MOST_ASKED = 4000 };

static double seconds_now(void)
{
    struct timespec now;
    clock_gettime(CLOCK_MONOTONIC, &now);
    return (double)now.tv_sec + 1e-9 * (double)now.tv_nsec;
}

sv_status inquiry_open(session *s, sv_run *run, inquiry *ret)
{
    inquiry q = {.s = s, .run = run};
    int64_t realisations;
    int32_t points;
    sv_index loaded;
    sv_status status = sv_run_extent(s->context, run, &realisations, &points);
    if (status == SV_OK && (realisations > REALISATIONS_PER_POINT || points > MOST_ASKED))
        status = SV_FAIL(s->context, SV_STORAGE, "the ledger claims %lld realisations at %d points",
                         (long long)realisations, points);
    if (status == SV_OK && realisations > 0)
        status = sv_ensemble_init(s->context, points, realisations, s->points[0].problem.n_markers,
                                  &q.there);
    if (status == SV_OK && realisations > 0)
        status = sv_run_load(s->context, run, &q.there, &loaded);
    if (status == SV_OK && s->options->time_limit > 0.0)
        q.deadline = seconds_now() + s->options->time_limit;
    if (status == SV_OK)
        *ret = q;
    else
        sv_ensemble_free(s->context, &q.there);
    return status;
}

static void point_free(sv_context *context, asked_point *p)
{
    if (p == NULL)
        return;
    sv_flake_free(context, &p->at.open);
    sv_flake_free(context, &p->at.closed);
    sv_setup_free(context, &p->at.setup);
    sv_give(context, p->values);
    sv_give(context, p);
}

void inquiry_close(inquiry *q)
{
    if (q->s == NULL)
        return;
    for (int k = 0; k < q->n_asked; k++)
        point_free(q->s->context, q->asked[k]);
    sv_give(q->s->context, q->asked);
    sv_ensemble_free(q->s->context, &q->there);
    *q = (inquiry){0};
}

static sv_status make_point(session *s, const sv_assignment *assignments, int n, asked_point *p)
{
    sv_diagnostics diagnostics = {0};
    sv_plan plan;
    sv_status status =
        sv_sheet_setup(s->context, s->sheet, assignments, n, &diagnostics, &p->at.setup);
    sv_diagnostics_print(&diagnostics, wants_colour(s->options, stderr), stderr);
    sv_diagnostics_free(s->context, &diagnostics);
    if (status == SV_OK)
        status = session_make_point(s, &p->at);
    if (status == SV_OK)
        status = sv_case_plan(s->context, &p->at.problem, false, s->base.sampling_error, &plan);
    if (status == SV_OK)
        sv_log(s->context, SV_LOG_DETAIL, "%s = %.6g: engine %s", assignments[0].path,
               assignments[0].value, plan.reason);
    return status;
}

static sv_status room_for_point(inquiry *q)
{
    asked_point **asked = NULL;
    if (q->n_asked < q->capacity)
        return SV_OK;
    int capacity = q->capacity == 0 ? 64 : 2 * q->capacity;
    sv_status status = sv_take(q->s->context, capacity, sizeof *asked, &asked);
    if (status != SV_OK)
        return status;
    if (q->n_asked > 0)
        memcpy(asked, q->asked, (size_t)q->n_asked * sizeof *asked);
    sv_give(q->s->context, q->asked);
    q->asked = asked;
    q->capacity = capacity;
    return SV_OK;
}

static sv_status room_for_values(inquiry *q, asked_point *p, int64_t wanted)
{
    const int m = p->at.problem.n_markers;
    double *values = NULL;
    if (wanted <= p->capacity)
        return SV_OK;
    int64_t capacity = wanted > 2 * p->capacity ? wanted : 2 * p->capacity;
    sv_status status = sv_take(q->s->context, capacity * m, sizeof *values, &values);
    if (status != SV_OK)
        return status;
    if (p->n > 0)
        memcpy(values, p->values, (size_t)(p->n * m) * sizeof *values);
    sv_give(q->s->context, p->values);
    p->values = values;
    p->capacity = capacity;
    return SV_OK;
}

/* Takes over realisations of a shelf, one after the other from `from`, up to the first gap. */
static sv_status take_over(inquiry *q, asked_point *p, const sv_ensemble *ensemble, int32_t number,
                           int64_t from, int64_t most)
{
    const int m = p->at.problem.n_markers;
    sv_status status = SV_OK;
    for (int64_t k = from; k < ensemble->realisations && p->n < most && status == SV_OK; k++) {
        if (sv_ensemble_head(ensemble, number, k) == NULL)
            break;
        status = room_for_values(q, p, p->n + 1);
        for (int i = 0; i < m && status == SV_OK; i++) {
            const sv_kept_outcome *o = sv_ensemble_outcome(ensemble, number, k, i);
            p->values[p->n * m + i] =
                o != NULL && o->verdict == SV_RESOLVED ? o->value : (double)NAN;
        }
        p->n += status == SV_OK;
        q->computed += status == SV_OK;
    }
    return status;
}

sv_status inquiry_point(inquiry *q, const sv_assignment *assignments, int n, int *ret_number)
{
    session *s = q->s;
    asked_point *p = NULL;
    if (q->n_asked == MOST_ASKED)
        return SV_FAIL(s->context, SV_REFUSED, "more than %d values asked about", MOST_ASKED);
    sv_status status = room_for_point(q);
    if (status == SV_OK)
        status = sv_take(s->context, 1, sizeof *p, &p);
    if (status == SV_OK)
        status = make_point(s, assignments, n, p);
    if (status != SV_OK) {
        point_free(s->context, p);
        return status;
    }
    p->at.problem.first_realisation = (int64_t)q->n_asked * REALISATIONS_PER_POINT;
    q->asked[q->n_asked] = p;
    *ret_number = q->n_asked++;
    return SV_OK;
}

/* Records of a batch are numbered from 0 at point 0: the ledger gets their numbers in the run. */
typedef struct renumber {
    sv_run *run;
    int32_t point;
    int64_t first;
} renumber;

static sv_status put_renumbered(sv_context *context, const sv_record *record, void *user)
{
    const renumber *r = user;
    sv_record moved = *record;
    moved.point = r->point;
    moved.realisation = r->first + record->realisation;
    return sv_run_put(context, &moved, r->run);
}

static sv_status compute(inquiry *q, int number, int64_t more)
{
    session *s = q->s;
    asked_point *p = q->asked[number];
    renumber sink = {q->run, number, p->n};
    sv_case problem = p->at.problem;
    sv_ensemble batch = {0};
    sv_progress_function progress = s->context->progress;
    double left = q->deadline > 0.0 ? q->deadline - seconds_now() : 0.0;
    if (q->deadline > 0.0 && left <= 0.0)
        return SV_FAIL(s->context, SV_INTERRUPTED, "stopped after %lld realisations",
                       (long long)q->computed);
    problem.first_realisation += p->n;
    problem.solve.threads = more < s->threads ? s->threads : 1;
    sv_ensemble_options work = {.size = sizeof work,
                                .realisations = more,
                                .threads = s->threads,
                                .sink = {put_renumbered, &sink},
                                .time_limit = left};
    sv_status status = sv_ensemble_init(s->context, 1, more, problem.n_markers, &batch);
    s->context->progress = NULL; /* a batch is no measure of the whole */
    if (status == SV_OK)
        status = sv_ensemble_run(s->context, &problem, &work, &batch);
    s->context->progress = progress;
    if (status == SV_OK)
        status = take_over(q, p, &batch, 0, 0, p->n + more);
    sv_ensemble_free(s->context, &batch);
    return status;
}

sv_status inquiry_more(inquiry *q, int number, int64_t wanted)
{
    asked_point *p = q->asked[number];
    sv_status status = SV_OK;
    if (wanted > REALISATIONS_PER_POINT)
        return SV_FAIL(q->s->context, SV_REFUSED, "more than %d realisations at one point",
                       REALISATIONS_PER_POINT);
    if (p->n < wanted && number < q->there.n_points)
        status = take_over(q, p, &q->there, number, p->n, wanted);
    if (status == SV_OK && p->n < wanted)
        status = compute(q, number, wanted - p->n);
    sv_progress(q->s->context, "realisations", q->computed, q->s->base.question.most);
    return status;
}
