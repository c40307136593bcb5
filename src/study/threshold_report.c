/* SPDX-License-Identifier: GPL-3.0-or-later */
/* After the search: the points asked, monotony, re-entry. */
#include <math.h>

#include <gsl/gsl_cdf.h>

#include "threshold_internal.h"

enum { FEWEST = 12 }; /* responses a comparison needs */

static void describe(const search *s, const response_point *p, sv_threshold_point *ret)
{
    response_moments m = sv_responses_moments(p, 0);
    *ret = (sv_threshold_point){.parameter = p->parameter,
                                .responses = p->n,
                                .unresolved = p->unresolved,
                                .measure = m.mean,
                                .standard_error = NAN,
                                .verdict = sv_search_judge(s, p, 0.01)};
    if (m.n > 1)
        ret->standard_error = sqrt(m.squares / (double)(m.n - 1) / (double)m.n);
}

/* Standard error that does not vanish where a few responses agree: a share of k out of n as
 * (k + 1)/(n + 2). */
static double cautious_error(const search *s, const sv_threshold_point *p)
{
    double n = (double)(p->responses - p->unresolved);
    if (s->question->kind == SV_CRITERION_MEAN)
        return p->standard_error;
    double share = (p->measure * (double)p->responses + 1.0) / ((double)p->responses + 2.0);
    return sqrt(share * (1.0 - share) / fmax(n, 1.0));
}

/* Smallest p-value over all pairs for "the later one is not lower", times their number
 * (Bonferroni). Normal approximation: points with fewer than twelve responses are left out. */
static double monotone_p(const search *s, const sv_threshold_answer *answer)
{
    double smallest = 1.0;
    int pairs = 0;
    for (int i = 0; i < answer->n_points; i++)
        for (int j = i + 1; j < answer->n_points; j++) {
            const sv_threshold_point *a = &answer->points[i], *b = &answer->points[j];
            double error = hypot(cautious_error(s, a), cautious_error(s, b));
            if (a->responses - a->unresolved < FEWEST || b->responses - b->unresolved < FEWEST ||
                !(error > 0.0))
                continue;
            pairs++;
            smallest = fmin(smallest, gsl_cdf_ugaussian_P((b->measure - a->measure) / error));
        }
    return pairs > 0 ? fmin(1.0, smallest * pairs) : (double)NAN;
}

static double edge_of(const search *s, const sv_threshold_answer *answer)
{
    return answer->state == SV_THRESHOLD_NEVER    ? s->question->low
           : answer->state == SV_THRESHOLD_ALWAYS ? (double)INFINITY
                                                  : answer->interval[1];
}

/* Beyond the threshold a value at which the criterion surely holds: tested at 1 % over all values
 * looked at. */
static void find_re_entry(const search *s, sv_threshold_answer *answer)
{
    int beyond = 0;
    double edge = edge_of(s, answer);
    for (int k = 0; k < s->table.n; k++)
        beyond += s->table.points[k].parameter > edge;
    for (int k = 0; k < s->table.n && !answer->re_enters; k++)
        if (s->table.points[k].parameter > edge &&
            sv_search_judge(s, &s->table.points[k], 0.01 / beyond) < 0) {
            answer->re_enters = true;
            answer->re_entry = s->table.points[k].parameter;
        }
}

/* Six responses are enough to see where to search, not to say that the criterion stays failed. */
static sv_status look_beyond(search *s, const sv_threshold_answer *answer)
{
    sv_status status = SV_OK;
    for (int k = 0; k < s->table.n && status == SV_OK; k++) {
        const response_point *p = &s->table.points[k];
        if (p->parameter > edge_of(s, answer) && p->n < FEWEST)
            status = sv_search_ask(s, k, FEWEST - p->n);
    }
    return status;
}

sv_status sv_search_conclude(search *s, sv_threshold_answer *answer)
{
    sv_status status = look_beyond(s, answer);
    if (status == SV_OK)
        status = sv_take(s->context, s->table.n, sizeof *answer->points, &answer->points);
    if (status != SV_OK)
        return status;
    answer->n_points = s->table.n;
    answer->responses = sv_search_responses(s);
    for (int k = 0; k < s->table.n; k++)
        describe(s, &s->table.points[k], &answer->points[k]);
    answer->monotone_p = monotone_p(s, answer);
    find_re_entry(s, answer);
    return SV_OK;
}
