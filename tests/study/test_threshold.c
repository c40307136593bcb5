/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The search for a threshold on synthetic response curves whose threshold is known. */
#include "selvedge/study.h"
#include "testing.h"

#include <stdlib.h>

/* A film that does not exist: distance from the clean value, or failing share, against x =
 * p/threshold. */
typedef struct film {
    bool share, skewed;
    double target;    /* of the measure */
    double width;     /* of the rise in x */
    double spread;    /* factor of the standard deviation */
    double threshold; /* 0: 0.1 */
    double returns;   /* beyond this value the criterion holds again; 0: never */
    bool upwards;     /* the mean leaves the band upwards */
    uint32_t number;
    int64_t asked;
} film;

static double uniform(const film *f, double parameter, int64_t k, uint32_t what)
{
    uint64_t bits;
    memcpy(&bits, &parameter, sizeof bits);
    uint32_t counter[4] = {(uint32_t)k, (uint32_t)bits, (uint32_t)(bits >> 32), what};
    uint32_t key[2] = {f->number, 77}, out[4];
    sv_philox(counter, key, out);
    return ((double)out[0] + 0.5) / 4294967296.0;
}

static double threshold_of(const film *f)
{
    return f->threshold > 0.0 ? f->threshold : 0.1;
}

static double measure(const film *f, double parameter)
{
    double rise = (parameter / threshold_of(f) - 1.0) / f->width;
    if (f->returns > 0.0 && parameter > f->returns)
        return 0.2 * f->target;
    if (f->share)
        return 1.0 / (1.0 + (1.0 - f->target) / f->target * exp(-rise));
    double d = f->target * exp(rise);
    return d / (1.0 + d) * (1.0 + f->target);
}

static double noise(const film *f, double parameter, int64_t k)
{
    double u = uniform(f, parameter, k, 0);
    if (f->skewed)
        return -log(u) - 1.0;
    return sqrt(-2.0 * log(u)) * cos(2.0 * M_PI * uniform(f, parameter, k, 1));
}

static sv_status respond(sv_context *context, double parameter, int64_t have, int64_t more,
                         double *ret_values, void *user)
{
    film *f = user;
    (void)context;
    double m = measure(f, parameter), sign = f->upwards ? -1.0 : 1.0;
    for (int64_t k = 0; k < more; k++)
        ret_values[k] = f->share ? (uniform(f, parameter, have + k, 0) < m ? 0.0 : 1.0)
                                 : 1.0 - sign * m -
                                       f->spread * (0.02 + 0.5 * m) * noise(f, parameter, have + k);
    f->asked += more;
    return SV_OK;
}

static sv_threshold_question ask_about(const film *f, double precision)
{
    return (sv_threshold_question){.size = sizeof(sv_threshold_question),
                                   .kind = f->share ? SV_CRITERION_SHARE : SV_CRITERION_MEAN,
                                   .low = 0.0,
                                   .high = 0.3,
                                   .clean = 1.0,
                                   .within = f->target,
                                   .share = 1.0 - f->target,
                                   .precision = precision,
                                   .confidence = 0.95};
}

/* Coverage, precision and cost over many films. */
static void measure_coverage(film f, double precision, int films, double *ret_coverage,
                             double *ret_cost)
{
    int covered = 0;
    double cost = 0.0, bias = 0.0;
    for (int k = 0; k < films; k++) {
        sv_threshold_answer answer = {0};
        f.number = (uint32_t)k;
        f.asked = 0;
        sv_threshold_question question = ask_about(&f, precision);
        CHECK_OK(sv_threshold_search(test_context(), &question, respond, &f, &answer));
        CHECK(answer.state == SV_THRESHOLD_FOUND);
        CHECK(0.5 * (answer.interval[1] - answer.interval[0]) <= precision * (1.0 + 1e-9));
        CHECK_INT(answer.responses, f.asked);
        covered += answer.interval[0] <= threshold_of(&f) && threshold_of(&f) <= answer.interval[1];
        cost += (double)answer.responses / films;
        bias += (answer.value - threshold_of(&f)) / films;
        sv_threshold_free(test_context(), &answer);
    }
    *ret_coverage = (double)covered / films;
    *ret_cost = cost;
    printf("# %s %g width %g%s, precision %g: coverage %.3f, bias %.2f, cost %.0f\n",
           f.share ? "share" : "mean", f.target, f.width, f.skewed ? " skewed" : "", precision,
           *ret_coverage, bias / precision, cost);
}

/* 300 films each: a true coverage of 95 % gives less than 91.4 % with a probability of 0.3 %
 * (binomial). */
SV_TEST(intervals_cover_known_thresholds)
{
    const film films[] = {
        {.target = 0.05, .width = 0.3, .spread = 1.0},
        {.target = 0.05, .width = 0.15, .spread = 1.0, .skewed = true},
        {.target = 0.05, .width = 0.6, .spread = 1.0},
        {.target = 0.05, .width = 0.05, .spread = 1.0},
        {.share = true, .target = 0.05, .width = 0.15},
        {.share = true, .target = 0.05, .width = 0.03},
        {.share = true, .target = 0.5, .width = 0.15},
        {.share = true, .target = 0.2, .width = 0.3},
    };
    for (size_t k = 0; k < sizeof films / sizeof films[0]; k++)
        for (int fine = 0; fine < 2; fine++) {
            double coverage, cost;
            measure_coverage(films[k], fine ? 0.004 : 0.01, 300, &coverage, &cost);
            CHECK(coverage >= 0.914);
        }
}

static sv_threshold_answer answer_of(film f, sv_threshold_question question)
{
    sv_threshold_answer answer = {0};
    CHECK_OK(sv_threshold_search(test_context(), &question, respond, &f, &answer));
    return answer;
}

SV_TEST(holds_everywhere_or_nowhere)
{
    film f = {.target = 0.05, .width = 0.2, .spread = 1.0, .threshold = 2.0};
    sv_threshold_question question = ask_about(&f, 0.01);
    sv_threshold_answer answer = answer_of(f, question);
    CHECK_INT(answer.state, SV_THRESHOLD_ALWAYS);
    CHECK(isnan(answer.value) && isnan(answer.interval[0]) && answer.reason[0] != '\0');
    CHECK(answer.n_points == 9 && answer.points[8].verdict == -1);
    sv_threshold_free(test_context(), &answer);
    question.low = 3.0;
    question.high = 5.0;
    answer = answer_of(f, question);
    CHECK_INT(answer.state, SV_THRESHOLD_NEVER);
    CHECK(answer.points[0].verdict == 1);
    sv_threshold_free(test_context(), &answer);
    sv_threshold_free(test_context(), &answer);
}

/* The measure at the end of the range is near the target: it takes responses to decide that the
 * threshold lies beyond. */
SV_TEST(a_threshold_just_beyond_the_range)
{
    film f = {.share = true, .target = 0.1, .width = 0.3, .threshold = 0.33};
    sv_threshold_question question = ask_about(&f, 0.01);
    sv_threshold_answer answer = answer_of(f, question);
    CHECK_INT(answer.state, SV_THRESHOLD_ALWAYS);
    CHECK(isnan(answer.value) && isnan(answer.interval[1]) && answer.reason[0] != '\0');
    sv_threshold_free(test_context(), &answer);
}

SV_TEST(re_entry_is_seen_and_the_first_failure_counts)
{
    film f = {.target = 0.05, .width = 0.2, .spread = 0.3, .returns = 0.22};
    sv_threshold_question question = ask_about(&f, 0.004);
    sv_threshold_answer answer = answer_of(f, question);
    CHECK_INT(answer.state, SV_THRESHOLD_FOUND);
    CHECK_CLOSE(answer.value, 0.1, 0.008);
    CHECK(answer.re_enters && answer.re_entry > 0.22 && answer.monotone_p < 1e-3);
    sv_threshold_free(test_context(), &answer);
    f.returns = 0.0;
    answer = answer_of(f, question);
    CHECK(!answer.re_enters && isnan(answer.re_entry) && answer.monotone_p > 0.01);
    sv_threshold_free(test_context(), &answer);
}

SV_TEST(the_band_may_be_left_upwards)
{
    film f = {.target = 0.05, .width = 0.2, .spread = 0.3, .upwards = true};
    sv_threshold_question question = ask_about(&f, 0.004);
    sv_threshold_answer answer = answer_of(f, question);
    CHECK_INT(answer.state, SV_THRESHOLD_FOUND);
    CHECK_CLOSE(answer.value, 0.1, 0.008);
    sv_threshold_free(test_context(), &answer);
}

SV_TEST(whole_numbers_are_asked_only)
{
    film f = {.share = true, .target = 0.05, .width = 0.2, .threshold = 41.0};
    sv_threshold_question question = ask_about(&f, 2.0);
    question.low = 0.0;
    question.high = 150.0;
    question.integer = true;
    sv_threshold_answer answer = answer_of(f, question);
    CHECK_INT(answer.state, SV_THRESHOLD_FOUND);
    CHECK_CLOSE(answer.value, 41.0, 4.0);
    for (int k = 0; k < answer.n_points; k++)
        CHECK(answer.points[k].parameter == round(answer.points[k].parameter));
    sv_threshold_free(test_context(), &answer);
}

/* A step is found by bisection alone: two decided values, no fit. */
SV_TEST(a_step_is_bracketed)
{
    film f = {.share = true, .target = 0.05, .width = 1e-4, .threshold = 0.1234};
    sv_threshold_question question = ask_about(&f, 0.001);
    sv_threshold_answer answer = answer_of(f, question);
    CHECK_INT(answer.state, SV_THRESHOLD_FOUND);
    CHECK(answer.bracketed && answer.interval[0] <= 0.1234 && answer.interval[1] >= 0.1234);
    CHECK(answer.interval[1] - answer.interval[0] <= 0.002);
    sv_threshold_free(test_context(), &answer);
}

SV_TEST(too_few_responses_are_said)
{
    film f = {.share = true, .target = 0.05, .width = 0.3};
    sv_threshold_question question = ask_about(&f, 1e-4);
    question.most = 1000;
    sv_threshold_answer answer = answer_of(f, question);
    CHECK_INT(answer.state, SV_THRESHOLD_UNDECIDED);
    CHECK(answer.responses < 4000 && answer.reason[0] != '\0');
    sv_threshold_free(test_context(), &answer);
}

static sv_status stop_at_once(sv_context *context, double parameter, int64_t have, int64_t more,
                              double *ret_values, void *user)
{
    (void)parameter, (void)have, (void)more, (void)ret_values, (void)user;
    return SV_FAIL(context, SV_INTERRUPTED, "stopped");
}

SV_TEST(bad_questions_and_a_responder_that_stops)
{
    film f = {.target = 0.05, .width = 0.2};
    sv_threshold_answer answer = {.n_points = 7};
    const sv_threshold_question good = ask_about(&f, 0.01);
    sv_threshold_question bad[7] = {good, good, good, good, good, good, good};
    bad[0].high = bad[0].low;
    bad[1].precision = 0.0;
    bad[2].confidence = 1.0;
    bad[3].within = -1.0;
    bad[4].clean = NAN;
    bad[5].high = INFINITY;
    bad[6].kind = SV_CRITERION_SHARE;
    bad[6].share = 1.0;
    for (int k = 0; k < 7; k++)
        CHECK_STATUS(SV_INVALID_INPUT,
                     sv_threshold_search(test_context(), &bad[k], respond, &f, &answer));
    CHECK_STATUS(SV_INTERRUPTED,
                 sv_threshold_search(test_context(), &good, stop_at_once, NULL, &answer));
    CHECK_INT(answer.n_points, 7);
}

/* ---- the cost beside a sweep of evenly spaced points ---- */

enum { N_SWEEP = 11, N_RESAMPLES = 200, MOST_EACH = 400 };

/* Where the running maximum of the measures first crosses the target, by interpolation. */
static double crossing(const double *measures, double spacing, double target)
{
    double before = 0.0;
    for (int k = 0; k < N_SWEEP; k++) {
        double now = fmax(before, measures[k]);
        if (now >= target)
            return k == 0 ? 0.0 : spacing * (k - (now - target) / (now - before));
        before = now;
    }
    return spacing * (N_SWEEP - 1);
}

static int by_size(const void *a, const void *b)
{
    double x = *(const double *)a, y = *(const double *)b;
    return (x > y) - (x < y);
}

/* Half width of the percentile-bootstrap interval of a sweep with n responses at each point. */
static double sweep_half_width(film *f, int n)
{
    static double values[N_SWEEP][MOST_EACH], roots[N_RESAMPLES];
    double spacing = 2.0 * threshold_of(f) / (N_SWEEP - 1);
    for (int k = 0; k < N_SWEEP; k++)
        CHECK_OK(respond(test_context(), spacing * k, 0, n, values[k], f));
    for (int b = 0; b < N_RESAMPLES; b++) {
        double measures[N_SWEEP] = {0};
        for (int k = 0; k < N_SWEEP; k++)
            for (int i = 0; i < n; i++) {
                int pick = (int)(uniform(f, (double)k + 100.0 * b, i, 5) * n);
                measures[k] += (1.0 - values[k][pick]) / n;
            }
        roots[b] = crossing(measures, spacing, f->target);
    }
    qsort(roots, N_RESAMPLES, sizeof roots[0], by_size);
    return 0.5 * (roots[(int)(0.975 * N_RESAMPLES)] - roots[(int)(0.025 * N_RESAMPLES)]);
}

/* At equal width of the interval the search needs at most half the realisations of a sweep of
 * eleven points from 0 to twice the threshold, over fifty thresholds. */
SV_TEST(half_the_realisations_of_a_sweep)
{
    double searched = 0.0, swept = 0.0;
    for (int k = 0; k < 50; k++) {
        film f = {.share = k % 2 == 1,
                  .target = k % 4 == 3 ? 0.2 : 0.05,
                  .width = 0.1 + 0.02 * (k % 11),
                  .spread = 1.0,
                  .threshold = 0.04 + 0.0032 * k,
                  .number = (uint32_t)(1000 + k)};
        sv_threshold_question question = ask_about(&f, 0.04 * f.threshold);
        sv_threshold_answer answer = answer_of(f, question);
        CHECK_INT(answer.state, SV_THRESHOLD_FOUND);
        double half = 0.5 * (answer.interval[1] - answer.interval[0]);
        /* The width falls as 1/√n: one sweep tells how many responses the same width takes. */
        double trial = sweep_half_width(&f, 400) / half;
        searched += (double)answer.responses;
        swept += N_SWEEP * 400.0 * trial * trial;
        sv_threshold_free(test_context(), &answer);
    }
    printf("# search %.0f, sweep %.0f realisations: ratio %.2f\n", searched, swept,
           swept / searched);
    CHECK(swept >= 2.0 * searched);
}
