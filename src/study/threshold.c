/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The first failure of a criterion along a parameter: scouting, bisection, local fit. */
#include <math.h>
#include <stdio.h>
#include <string.h>

#include <gsl/gsl_cdf.h>

#include "threshold_internal.h"

enum {
    N_SCOUTS = 9,
    SCOUT_RESPONSES = 6,
    MEAN_LOOKS_END = 32, /* responses after which a value counts as undecided */
    SHARE_LOOKS_MOST = 160,
    CENTRE_FIRST = 40, /* fresh responses a fit starts with */
    SIDE_FIRST = 16,
    MOST_ROUNDS = 40
};
static const int64_t DEFAULT_MOST = 200000;
static const double CENTRE_PART = 0.6, SIDE_PART = 0.2;
/* Sides of the local fit in units of the precision; nearer they would not tell the slope. */
static const double SIDES = 3.0;
/* Points nearer to a wanted place than this part of the side distance serve for it. */
static const double SNAP = 0.3;
/* Looking again and again until the interval is narrow costs coverage: the fit's own interval is
 * made for this part of the error allowed (measured in tests/study/test_threshold.c). */
static const double LOOK_AGAIN = 0.7;

static double place_of(const search *s, double parameter)
{
    double p = fmin(fmax(parameter, s->question->low), s->question->high);
    return s->question->integer ? round(p) : p;
}

int64_t sv_search_responses(const search *s)
{
    int64_t n = 0;
    for (int k = 0; k < s->table.n; k++)
        n += s->table.points[k].n;
    return n;
}

static sv_status room(sv_context *context, response_point *p, int64_t n)
{
    double *values = NULL;
    if (n <= p->capacity)
        return SV_OK;
    int64_t capacity = n > 2 * p->capacity ? n : 2 * p->capacity;
    sv_status status = sv_take(context, capacity, sizeof *values, &values);
    if (status != SV_OK)
        return status;
    if (p->n > 0)
        memcpy(values, p->values, (size_t)p->n * sizeof *values);
    sv_give(context, p->values);
    p->values = values;
    p->capacity = capacity;
    return SV_OK;
}

sv_status sv_search_ask(search *s, int number, int64_t more)
{
    response_point *p = &s->table.points[number];
    sv_status status = room(s->context, p, p->n + more);
    if (status == SV_OK)
        status = s->responder(s->context, p->parameter, p->n, more, &p->values[p->n], s->user);
    if (status != SV_OK)
        return status;
    for (int64_t k = p->n; k < p->n + more; k++) {
        double v = p->values[k];
        p->unresolved += isnan(v);
        p->values[k] =
            s->question->kind == SV_CRITERION_MEAN ? s->side * (s->question->clean - v) : 1.0 - v;
    }
    p->n += more;
    return SV_OK;
}

static sv_status ask_at(search *s, double parameter, int64_t more)
{
    int number;
    sv_status status = sv_responses_place(s->context, &s->table, parameter, &number);
    return status == SV_OK ? sv_search_ask(s, number, more) : status;
}

/* One-sided tests of a mean against the target (t) or of a share (exact binomial). */
int sv_search_judge(const search *s, const response_point *p, double level)
{
    response_moments m = sv_responses_moments(p, 0);
    if (m.n < 2)
        return 0;
    if (s->question->kind == SV_CRITERION_SHARE) {
        unsigned int hits = (unsigned int)lround(m.mean * (double)m.n);
        double up = gsl_cdf_binomial_P(hits, s->target, (unsigned int)m.n);
        double down = hits == 0 ? 1.0 : gsl_cdf_binomial_Q(hits - 1, s->target, (unsigned int)m.n);
        return up < level ? -1 : down < level ? 1 : 0;
    }
    double degrees = (double)(m.n - 1), variance = m.squares / degrees;
    if (s->question->discrete) { /* one of the next n + 2 values may differ by one */
        double n = (double)(m.n + 2);
        variance = fmax(variance, (n - 1.0) / (n * n));
    }
    double error = sqrt(variance / (double)m.n) + 1e-12 * fabs(s->target) + 1e-300;
    double t = (m.mean - s->target) / error;
    return fabs(t) < gsl_cdf_tdist_Pinv(1.0 - level, degrees) ? 0 : t < 0.0 ? -1 : 1;
}

/* Looks after every six responses until the value is decided or the patience is over. */
static sv_status decide(search *s, double parameter, int *ret_verdict)
{
    int number;
    sv_status status = sv_responses_place(s->context, &s->table, parameter, &number);
    while (status == SV_OK) {
        const response_point *p = &s->table.points[number];
        double level = s->question->kind == SV_CRITERION_SHARE ? 0.01 : 0.005;
        *ret_verdict = sv_search_judge(s, p, level);
        if (*ret_verdict != 0 || p->n >= s->looks_end)
            return SV_OK;
        status = sv_search_ask(s, number, SCOUT_RESPONSES);
    }
    return status;
}

/* On which side of the clean value does the mean leave the band? Turns what is there. */
static void choose_side(search *s)
{
    for (int k = 0; k < s->table.n; k++) {
        double mean = sv_responses_moments(&s->table.points[k], 0).mean;
        if (fabs(mean) <= s->target || isnan(mean))
            continue;
        if (mean > 0.0)
            return;
        s->side = -1.0;
        for (int i = 0; i < s->table.n; i++)
            for (int64_t j = 0; j < s->table.points[i].n; j++)
                s->table.points[i].values[j] *= -1.0;
        return;
    }
}

static sv_status scout(search *s)
{
    sv_status status = SV_OK;
    for (int k = 0; k < N_SCOUTS && status == SV_OK; k++) {
        double part = (double)k / (N_SCOUTS - 1);
        double p = place_of(s, s->question->low + part * (s->question->high - s->question->low));
        if (s->table.n == 0 || s->table.points[s->table.n - 1].parameter < p)
            status = ask_at(s, p, SCOUT_RESPONSES);
    }
    if (status == SV_OK && s->question->kind == SV_CRITERION_MEAN)
        choose_side(s);
    return status;
}

/* The first scouted value that fails and the last before it that holds, as far as decided. */
static sv_status first_failure(search *s, int *ret_low, int *ret_high)
{
    int n = s->table.n, failing = -1, verdict = 0;
    sv_status status = SV_OK;
    for (int k = 0; k < n && failing < 0 && status == SV_OK; k++) {
        if (!(sv_responses_moments(&s->table.points[k], 0).mean > s->target))
            continue;
        status = decide(s, s->table.points[k].parameter, &verdict);
        if (status == SV_OK && verdict >= 0)
            failing = k;
    }
    for (; status == SV_OK && failing > 0; failing--) {
        status = decide(s, s->table.points[failing - 1].parameter, &verdict);
        if (verdict <= 0)
            break;
    }
    if (status == SV_OK && failing < 0) /* none seems to fail: is the last one sure? */
        status = decide(s, s->table.points[n - 1].parameter, &verdict);
    if (status == SV_OK && failing < 0 && verdict >= 0)
        failing = n - 1;
    *ret_high = failing;
    *ret_low = failing - 1;
    return status;
}

/* Halves the bracket while its middle is decided; true when it is narrow enough by itself. */
static sv_status bisect(search *s, double *low, double *high, bool *ret_narrow)
{
    int verdict = 0;
    sv_status status = SV_OK;
    *ret_narrow = false;
    for (;;) {
        double middle = place_of(s, 0.5 * (*low + *high));
        if (*high - *low <= 2.0 * s->question->precision || middle == *low || middle == *high)
            break;
        status = decide(s, middle, &verdict);
        if (status != SV_OK || verdict == 0)
            return status;
        *(verdict < 0 ? low : high) = middle;
    }
    int ends[2] = {0, 0};
    status = decide(s, *low, &ends[0]);
    if (status == SV_OK)
        status = decide(s, *high, &ends[1]);
    *ret_narrow = ends[0] < 0 && ends[1] > 0;
    return status;
}

static bool fit_around(const search *s, double centre, double width, int terms, local_fit *ret)
{
    return s->question->kind == SV_CRITERION_MEAN
               ? sv_local_fit_mean(&s->table, centre, width, terms, ret)
               : sv_local_fit_share(&s->table, centre, width, terms, ret);
}

static double fit_target(const search *s)
{
    return s->question->kind == SV_CRITERION_MEAN ? s->target : log(s->target / (1.0 - s->target));
}

/* Where the scouts' line crosses the target: the first centre. */
static double first_centre(const search *s, double low, double high)
{
    double middle = place_of(s, 0.5 * (low + high));
    double width = fmax(high - low, SIDES * s->question->precision);
    local_fit fit;
    if (!fit_around(s, middle, width, 2, &fit)) /* a parabola of so few would bend at random */
        return middle;
    local_root root = sv_local_fit_root(&fit, fit_target(s), 0.0, low, high);
    return root.exists ? place_of(s, root.value) : middle;
}

/* Where the local fit stands. */
typedef struct stance {
    double centre, side;
    double snap; /* a point this close serves as the centre */
} stance;

/* From here on only fresh responses count: the scouts chose where to look. */
static void close_scouting(search *s)
{
    for (int k = 0; k < s->table.n; k++)
        s->table.points[k].fresh_from = s->table.points[k].n;
}

/* The centre or a side of the fit gets `more` responses, but at least `least` fresh ones in all;
 * a point close by serves. */
static sv_status feed(search *s, double parameter, double snap, int64_t more, int64_t least)
{
    int number = -1;
    double p = place_of(s, parameter);
    for (int k = 0; k < s->table.n; k++) {
        const response_point *q = &s->table.points[k];
        if (q->n > q->fresh_from && fabs(q->parameter - p) <= snap &&
            (number < 0 || fabs(q->parameter - p) < fabs(s->table.points[number].parameter - p)))
            number = k;
    }
    if (number < 0) {
        sv_status status = sv_responses_place(s->context, &s->table, p, &number);
        if (status != SV_OK)
            return status;
        /* A point of the scouts starts anew; a new one has nothing to forget. */
        s->table.points[number].fresh_from = s->table.points[number].n;
    }
    int64_t fresh = s->table.points[number].n - s->table.points[number].fresh_from;
    int64_t wanted = fresh + more < least ? least - fresh : more;
    return wanted > 0 ? sv_search_ask(s, number, wanted) : SV_OK;
}

/* `more` responses, shared out over the centre and its sides; each has a least number. */
static sv_status feed_all(search *s, const stance *at, double more, int64_t centre_least,
                          int64_t side_least)
{
    double snap = SNAP * at->side;
    int64_t side_more = (int64_t)ceil(SIDE_PART * more);
    sv_status status =
        feed(s, at->centre, at->snap, (int64_t)ceil(CENTRE_PART * more), centre_least);
    if (status == SV_OK)
        status = feed(s, at->centre - at->side, snap, side_more, side_least);
    return status == SV_OK ? feed(s, at->centre + at->side, snap, side_more, side_least) : status;
}

static int64_t fresh_responses(const search *s)
{
    int64_t n = 0;
    for (int k = 0; k < s->table.n; k++)
        n += s->table.points[k].n - s->table.points[k].fresh_from;
    return n;
}

/* Does the parabola bend so much over the sides that the third order must matter as well? */
static bool bends(const local_fit *fit, double side)
{
    if (fit->terms < 3)
        return false;
    double x = side / fit->width;
    double excess = fabs(fit->b[2]) * x - 0.4 * fabs(fit->b[1]);
    double error = sqrt(fit->covariance[2][2] * x * x + 0.16 * fit->covariance[1][1]);
    return excess > 2.8 * error;
}

static double interval_quantile(const search *s, const local_fit *fit)
{
    double p = 1.0 - 0.5 * LOOK_AGAIN * (1.0 - s->question->confidence);
    return isinf(fit->degrees) ? gsl_cdf_ugaussian_Pinv(p)
                               : gsl_cdf_tdist_Pinv(p, fmax(fit->degrees, 3.0));
}

/* How the search goes on after a look at the fit. */
typedef enum next_step { DONE, MOVE, NARROW, MORE } next_step;

/* Off its centre the parabola interpolates, and its third order enters: the root may be no farther
 * from there than the interval itself is wide. */
static double leash(const stance *at, const local_root *root)
{
    double half = 0.5 * (root->interval[1] - root->interval[0]);
    return fmin(SNAP * at->side, fmax(2.0 * half, 0.1 * at->side));
}

static bool is_closed(const local_root *root)
{
    return !root->open[0] && !root->open[1];
}

static next_step look(const search *s, const local_fit *fit, const local_root *root,
                      const stance *at)
{
    if (bends(fit, at->side))
        return NARROW;
    if (!root->exists)
        return MOVE;
    double away = fabs(root->value - at->centre);
    if (away > 0.6 * at->side || (is_closed(root) && away > 2.0 * leash(at, root)))
        return MOVE;
    double half = 0.5 * (root->interval[1] - root->interval[0]);
    return is_closed(root) && half <= s->question->precision ? DONE : MORE;
}

static sv_status add_more(search *s, const local_root *root, const stance *at)
{
    double half = 0.5 * (root->interval[1] - root->interval[0]);
    double ratio = half / s->question->precision, n = (double)fresh_responses(s);
    return feed_all(s, at, is_closed(root) ? fmin(fmax(1.05 * n * ratio * ratio - n, 10.0), n) : n,
                    0, 0);
}

/* A centre to go on from: the root, or where the measure goes. */
static void move(const search *s, const local_fit *fit, const local_root *root, stance *at)
{
    double unused;
    bool beyond = sv_local_fit_value(fit, at->centre, &unused) > fit_target(s);
    at->snap = root->exists ? leash(at, root) : SNAP * at->side;
    at->centre = place_of(s, root->exists ? root->value
                             : beyond     ? at->centre - at->side
                                          : at->centre + at->side);
}

static void say_end(const search *s, bool always, sv_threshold_answer *answer)
{
    answer->state = always ? SV_THRESHOLD_ALWAYS : SV_THRESHOLD_NEVER;
    answer->value = answer->interval[0] = answer->interval[1] = NAN;
    if (always)
        snprintf(answer->reason, sizeof answer->reason, "the criterion holds up to %.6g",
                 s->question->high);
    else
        snprintf(answer->reason, sizeof answer->reason, "the criterion fails already at %.6g",
                 s->question->low);
}

/* The search ran into an end of the range, and the end itself is decided. */
static bool ends_there(const search *s, const local_root *root, sv_threshold_answer *answer)
{
    const response_point *first = &s->table.points[0], *last = &s->table.points[s->table.n - 1];
    bool always = sv_search_judge(s, last, 0.005)<0, never = sv_search_judge(s, first, 0.005)> 0;
    if (root->exists || (!always && !never))
        return false;
    say_end(s, always, answer);
    return true;
}

static void give_up(const search *s, sv_threshold_answer *answer)
{
    answer->state = SV_THRESHOLD_UNDECIDED;
    snprintf(answer->reason, sizeof answer->reason,
             "after %lld realisations the interval is still wider than asked for",
             (long long)sv_search_responses(s));
}

static sv_status refine(search *s, double low, double high, sv_threshold_answer *answer)
{
    stance at = {.centre = first_centre(s, low, high), .side = SIDES * s->question->precision};
    at.snap = SNAP * at.side;
    close_scouting(s);
    sv_status status = feed_all(s, &at, 0.0, CENTRE_FIRST, SIDE_FIRST);
    for (int round = 0; status == SV_OK; round++) {
        local_fit fit;
        if (!fit_around(s, at.centre, 1.6 * at.side, MOST_TERMS, &fit))
            return SV_FAIL(s->context, SV_UNDEFINED, "no responses are resolved around %.6g",
                           at.centre);
        local_root root = sv_local_fit_root(&fit, fit_target(s), interval_quantile(s, &fit),
                                            s->question->low, s->question->high);
        next_step step = look(s, &fit, &root, &at);
        answer->value = root.value;
        memcpy(answer->interval, root.interval, sizeof answer->interval);
        if (step == DONE || ends_there(s, &root, answer))
            return SV_OK;
        if (round >= MOST_ROUNDS || sv_search_responses(s) >= s->most) {
            give_up(s, answer);
            return SV_OK;
        }
        if (step == MORE) {
            status = add_more(s, &root, &at);
            continue;
        }
        move(s, &fit, &root, &at);
        if (step == NARROW) {
            at.side *= 0.5;
            at.snap = fmin(at.snap, SNAP * at.side);
        }
        status = feed_all(s, &at, 10.0, CENTRE_FIRST, SIDE_FIRST);
    }
    return status;
}

static sv_status find(search *s, sv_threshold_answer *answer)
{
    int low = -1, high = -1;
    bool narrow = false;
    sv_status status = scout(s);
    if (status == SV_OK)
        status = first_failure(s, &low, &high);
    if (status != SV_OK)
        return status;
    if (high < 0 || low < 0) {
        say_end(s, high < 0, answer);
        return SV_OK;
    }
    double ends[2] = {s->table.points[low].parameter, s->table.points[high].parameter};
    status = bisect(s, &ends[0], &ends[1], &narrow);
    if (status != SV_OK)
        return status;
    answer->state = SV_THRESHOLD_FOUND;
    if (!narrow)
        return refine(s, ends[0], ends[1], answer);
    answer->bracketed = true;
    answer->value = 0.5 * (ends[0] + ends[1]);
    memcpy(answer->interval, ends, sizeof answer->interval);
    return SV_OK;
}

static sv_status check_question(sv_context *context, const sv_threshold_question *q)
{
    bool share = q->kind == SV_CRITERION_SHARE;
    if (!(q->low < q->high) || !isfinite(q->low) || !isfinite(q->high))
        return SV_FAIL(context, SV_INVALID_INPUT, "a range from %g to %g", q->low, q->high);
    if (!(q->precision > 0.0) || !isfinite(q->precision))
        return SV_FAIL(context, SV_INVALID_INPUT, "a precision of %g", q->precision);
    if (!(q->confidence > 0.0 && q->confidence < 1.0))
        return SV_FAIL(context, SV_INVALID_INPUT, "a confidence of %g", q->confidence);
    if (share && !(q->share > 0.0 && q->share < 1.0))
        return SV_FAIL(context, SV_INVALID_INPUT, "a share of %g", q->share);
    if (!share && !(q->within > 0.0 && isfinite(q->within) && isfinite(q->clean)))
        return SV_FAIL(context, SV_INVALID_INPUT, "a band of %g about %g", q->within, q->clean);
    return SV_OK;
}

sv_status sv_threshold_search(sv_context *context, const sv_threshold_question *question,
                              sv_responder responder, void *user, sv_threshold_answer *ret_answer)
{
    search s = {.context = context,
                .question = question,
                .responder = responder,
                .user = user,
                .side = 1.0,
                .most = question->most > 0 ? question->most : DEFAULT_MOST};
    sv_threshold_answer answer = {.value = NAN,
                                  .interval = {NAN, NAN},
                                  .re_entry = NAN,
                                  .confidence = question->confidence,
                                  .monotone_p = NAN};
    sv_status status = check_question(context, question);
    if (status != SV_OK)
        return status;
    s.target = question->kind == SV_CRITERION_MEAN ? question->within : 1.0 - question->share;
    double rare = s.target < 1.0 ? fmin(s.target, 1.0 - s.target) : 0.5;
    s.looks_end = question->kind == SV_CRITERION_MEAN && !question->discrete
                      ? MEAN_LOOKS_END
                      : (int64_t)fmin(fmax(8.0 / rare, MEAN_LOOKS_END), SHARE_LOOKS_MOST);
    status = find(&s, &answer);
    if (status == SV_OK)
        status = sv_search_conclude(&s, &answer);
    sv_responses_free(context, &s.table);
    if (status != SV_OK) {
        sv_threshold_free(context, &answer);
        return status;
    }
    *ret_answer = answer;
    return SV_OK;
}

void sv_threshold_free(sv_context *context, sv_threshold_answer *answer)
{
    sv_give(context, answer->points);
    *answer = (sv_threshold_answer){0};
}
