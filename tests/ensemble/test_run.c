/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "fixtures.h"
#include "selvedge/ensemble.h"

#include <stdlib.h>
#include <unistd.h>

/* A small disordered problem with both markers. */
typedef struct problem {
    sv_model model;
    sv_flake open, closed;
    sv_disorder disorder;
    sv_case point;
} problem;

static void make(problem *p, int side, double width)
{
    *p = (problem){.model = fixture_qi_wu_zhang(-1.0)};
    sv_flake_spec open = fixture_cells(&p->model, side, side, false);
    sv_flake_spec closed = fixture_cells(&p->model, side, side, true);
    p->open = fixture_flake(&p->model, &open);
    p->closed = fixture_flake(&p->model, &closed);
    p->disorder = (sv_disorder){
        .name = "pot", .type = SV_DISORDER_ONSITE, .on = -1, .width = width, .per_cell = true};
    p->point = (sv_case){.open_flake = &p->open,
                         .closed_flake = &p->closed,
                         .disorder = &p->disorder,
                         .n_disorder = 1,
                         .occupation = fixture_below_zero,
                         .solve = sv_projector_options_default(),
                         .seed = 7,
                         .n_markers = 2};
    p->point.markers[0] = (sv_marker_request){.marker = sv_marker_find("local_chern"),
                                              .values = {{.present = true, .real = {0.5}}}};
    p->point.markers[1] = (sv_marker_request){.marker = sv_marker_find("bott")};
}

static void release(problem *p)
{
    sv_flake_free(test_context(), &p->open);
    sv_flake_free(test_context(), &p->closed);
    sv_model_free(test_context(), &p->model);
}

typedef struct sink {
    int64_t calls, fail_after;
} sink;

static sv_status put(sv_context *context, const sv_record *record, void *user)
{
    sink *s = user;
    (void)record;
    if (s->fail_after > 0 && s->calls >= s->fail_after)
        return SV_FAIL(context, SV_STORAGE, "full");
    s->calls++;
    return SV_OK;
}

static sv_status run(const problem *p, int64_t n, int threads, sv_stop_rule stop, sink *out,
                     sv_ensemble *e)
{
    sv_ensemble_options o = {
        .size = sizeof o, .realisations = n, .threads = threads, .stop = stop, .sink = {put, out}};
    return sv_ensemble_run(test_context(), &p->point, &o, e);
}

static bool same_outcome(const sv_kept_outcome *a, const sv_kept_outcome *b)
{
    return a->verdict == b->verdict && memcmp(&a->value, &b->value, sizeof a->value) == 0 &&
           a->index == b->index && memcmp(&a->margin, &b->margin, sizeof a->margin) == 0 &&
           a->electrons == b->electrons;
}

static void set(sv_ensemble *e, int k, sv_verdict verdict, int64_t index)
{
    sv_record record = {.realisation = k, .n_outcomes = 1};
    record.outcomes[0] = sv_outcome_blank();
    record.outcomes[0].verdict = verdict;
    record.outcomes[0].index = index;
    record.outcomes[0].value = (double)index;
    snprintf(record.outcomes[0].reason, 100, "because");
    CHECK_OK(sv_ensemble_put(test_context(), e, &record));
}

SV_TEST(threads_change_no_bit)
{
    problem p;
    make(&p, 6, 4.0);
    sv_ensemble e[3] = {{0}};
    for (int t = 0; t < 3; t++) {
        sink out = {0};
        CHECK_OK(sv_ensemble_init(test_context(), 1, 12, 2, &e[t]));
        CHECK_OK(run(&p, 12, t + 1, (sv_stop_rule){0}, &out, &e[t]));
        CHECK_INT(out.calls, 12);
    }
    for (int t = 1; t < 3; t++)
        for (int k = 0; k < 12; k++)
            for (int m = 0; m < 2; m++)
                CHECK(same_outcome(sv_ensemble_outcome(&e[0], 0, k, m),
                                   sv_ensemble_outcome(&e[t], 0, k, m)));
    for (int t = 0; t < 3; t++)
        sv_ensemble_free(test_context(), &e[t]);
    release(&p);
}

/* What a realisation cost is noted, and by whom it was computed. */
static sv_status look_at_cost(sv_context *context, const sv_record *record, void *user)
{
    int *threads = user;
    (void)context;
    char host[64] = "";
    (void)gethostname(host, sizeof host - 1);
    CHECK(record->seconds > 0.0 && record->seconds < 100.0);
    CHECK(record->processor_seconds > 0.0 && record->processor_seconds < record->seconds + 0.01);
    CHECK(record->peak_bytes > 1000000 && record->peak_bytes % 1024 == 0);
    CHECK(record->rank == 0 && record->thread >= 0 && record->thread < 2);
    CHECK_TEXT(record->host, host);
    threads[record->thread]++;
    return SV_OK;
}

SV_TEST(every_realisation_says_what_it_cost)
{
    problem p;
    make(&p, 6, 2.0);
    sv_ensemble e = {0};
    int threads[2] = {0, 0};
    sv_ensemble_options o = {
        .size = sizeof o, .realisations = 30, .threads = 2, .sink = {look_at_cost, threads}};
    CHECK_OK(sv_ensemble_init(test_context(), 1, 30, 2, &e));
    CHECK_OK(sv_ensemble_run(test_context(), &p.point, &o, &e));
    CHECK(threads[0] > 0 && threads[1] > 0 && threads[0] + threads[1] == 30);
    sv_ensemble_free(test_context(), &e);
    release(&p);
}

SV_TEST(finished_work_is_not_repeated)
{
    problem p;
    make(&p, 5, 2.0);
    sv_ensemble e = {0};
    sink out = {0};
    CHECK_OK(sv_ensemble_init(test_context(), 1, 6, 2, &e));
    set(&e, 1, SV_RESOLVED, 1);
    set(&e, 4, SV_RESOLVED, 1);
    CHECK_OK(run(&p, 6, 2, (sv_stop_rule){0}, &out, &e));
    CHECK_INT(out.calls, 4);
    sv_ensemble_free(test_context(), &e);
    release(&p);
}

SV_TEST(a_failing_sink_ends_the_run)
{
    problem p;
    make(&p, 4, 2.0);
    sv_ensemble e = {0};
    sink out = {.fail_after = 2};
    CHECK_OK(sv_ensemble_init(test_context(), 1, 8, 2, &e));
    CHECK_STATUS(SV_STORAGE, run(&p, 8, 2, (sv_stop_rule){0}, &out, &e));
    int done = 0;
    for (int k = 0; k < 8; k++)
        done += e.done[k];
    CHECK_INT(done, 2);
    sv_ensemble_free(test_context(), &e);
    release(&p);
}

static bool always(void *user)
{
    (void)user;
    return true;
}

SV_TEST(cancel_and_time_limit_stop_cleanly)
{
    problem p;
    make(&p, 4, 2.0);
    sv_ensemble e = {0};
    sink out = {0};
    CHECK_OK(sv_ensemble_init(test_context(), 1, 1000, 2, &e));
    test_context()->cancel = always;
    CHECK_STATUS(SV_INTERRUPTED, run(&p, 1000, 2, (sv_stop_rule){0}, &out, &e));
    test_context()->cancel = NULL;
    CHECK_INT(out.calls, 0);
    sv_ensemble_options o = {.size = sizeof o,
                             .realisations = 1000,
                             .threads = 1,
                             .sink = {put, &out},
                             .time_limit = 0.02};
    CHECK_STATUS(SV_INTERRUPTED, sv_ensemble_run(test_context(), &p.point, &o, &e));
    CHECK(out.calls > 0 && out.calls < 1000);
    sv_ensemble_free(test_context(), &e);
    release(&p);
}

/* Standard error of the rule: skewness by its plain moments. */
static double believed_error(const double *values, int64_t n)
{
    sv_moments m = sv_moments_of(values, n);
    double size = (double)n, plain = m.skewness * (size - 2.0) / sqrt(size * (size - 1.0));
    return m.standard_error * sqrt(1.0 + 5.0 * plain * plain / size);
}

/* The rule holds at the first n ≥ at_least in realisation order, whoever finished first. */
SV_TEST(stop_rule_holds_at_one_place)
{
    sv_ensemble e = {0};
    CHECK_OK(sv_ensemble_init(test_context(), 1, 400, 2, &e));
    sv_stop_rule rule = {.active = true, .marker = 0, .standard_error = 0.06, .at_least = 20};
    sv_stream stream = sv_stream_make(3, "values", 0);
    static double values[400];
    for (int k = 0; k < 400; k++) {
        sv_record record = {.realisation = k, .n_outcomes = 1};
        record.outcomes[0].verdict = SV_RESOLVED;
        values[k] = record.outcomes[0].value = sv_stream_normal(&stream, k, 0, 0);
        CHECK_OK(sv_ensemble_put(test_context(), &e, &record));
    }
    int64_t expected = 20;
    while (believed_error(values, expected) > 0.06)
        expected++;
    bool settled;
    CHECK_INT(sv_ensemble_counted(&e, 0, &rule, &settled), expected);
    CHECK(settled && expected > 100 && expected < 400);
    /* A gap hides what lies behind it. */
    e.done[50] = false;
    CHECK_INT(sv_ensemble_counted(&e, 0, &rule, &settled), 50);
    CHECK(!settled);
    e.done[50] = true;
    rule.active = false;
    CHECK_INT(sv_ensemble_counted(&e, 0, &rule, &settled), 400);
    CHECK(settled);
    sv_ensemble_free(test_context(), &e);
}

SV_TEST(a_settled_point_computes_no_more)
{
    problem p;
    make(&p, 4, 0.0); /* no disorder: the error is 0 at once, believed at 4·at_least */
    sv_ensemble e = {0};
    sink out = {0};
    sv_stop_rule rule = {.active = true, .marker = 0, .standard_error = 0.01, .at_least = 5};
    CHECK_OK(sv_ensemble_init(test_context(), 1, 50, 2, &e));
    CHECK_OK(run(&p, 50, 1, rule, &out, &e));
    /* One that runs and one that waits may be beyond the end when the rule comes to hold. */
    CHECK(out.calls >= 20 && out.calls <= 23);
    sv_ensemble_free(test_context(), &e);
    release(&p);
}

/* 200 realisations, 3 of them unresolved, the rest +1: mean 1, bounds 0.97 and 1, Wilson interval
 * of 197/200 (Newcombe's method, as above). */
SV_TEST(unresolved_realisations_bound_the_mean)
{
    problem p;
    make(&p, 4, 0.0);
    p.point.markers[0] = p.point.markers[1];
    p.point.n_markers = 1;
    sv_ensemble e = {0};
    sv_summary s = {0};
    CHECK_OK(sv_ensemble_init(test_context(), 1, 200, 2, &e));
    for (int k = 0; k < 200; k++)
        set(&e, k, k % 70 == 5 ? SV_UNRESOLVED : SV_RESOLVED, 1);
    CHECK_OK(sv_summarise(test_context(), &e, &p.point, 0, 0, 200, &s));
    CHECK(s.exists && s.is_index && s.unresolved == 3 && s.resolved == 197);
    CHECK_CLOSE(s.mean, 1.0, 0.0);
    CHECK_CLOSE(s.bounds[0], 0.97, 1e-14);
    CHECK_CLOSE(s.bounds[1], 1.0, 1e-14);
    CHECK_INT(s.n_shares, 1);
    CHECK_CLOSE(s.shares[0].share, 0.985, 1e-14);
    CHECK_CLOSE(s.shares[0].interval[0], 0.957, 5e-4);
    CHECK_CLOSE(s.shares[0].interval[1], 0.995, 5e-4);
    CHECK_TEXT(s.unresolved_reason, "because");
    sv_summary_free(test_context(), &s);
    for (int k = 0; k < 200; k++)
        set(&e, k, SV_UNRESOLVED, 0);
    CHECK_OK(sv_summarise(test_context(), &e, &p.point, 0, 0, 200, &s));
    CHECK(!s.exists && s.unresolved == 200 && isnan(s.mean));
    CHECK_TEXT(s.reason, "because");
    sv_summary_free(test_context(), &s);
    sv_ensemble_free(test_context(), &e);
    release(&p);
}

SV_TEST(several_indices_are_counted_apart)
{
    problem p;
    make(&p, 4, 0.0);
    p.point.markers[0] = p.point.markers[1];
    p.point.n_markers = 1;
    sv_ensemble e = {0};
    sv_summary s = {0};
    CHECK_OK(sv_ensemble_init(test_context(), 1, 10, 2, &e));
    const int64_t indices[10] = {0, 2, -1, 0, 2, 2, 0, 0, 2, 2};
    for (int k = 0; k < 10; k++)
        set(&e, k, k == 7 ? SV_FAILED : SV_RESOLVED, indices[k]);
    CHECK_OK(sv_summarise(test_context(), &e, &p.point, 0, 0, 10, &s));
    CHECK_INT(s.n_shares, 3);
    CHECK(s.shares[0].index == -1 && s.shares[0].count == 1);
    CHECK(s.shares[1].index == 0 && s.shares[1].count == 3);
    CHECK(s.shares[2].index == 2 && s.shares[2].count == 5);
    CHECK_INT(s.failed, 1);
    CHECK_INT(s.unresolved, 1);
    CHECK_CLOSE(s.bounds[0], (9.0 - 2.0) / 10.0, 1e-14);
    CHECK_CLOSE(s.bounds[1], (9.0 + 2.0) / 10.0, 1e-14);
    sv_summary_free(test_context(), &s);
    sv_ensemble_free(test_context(), &e);
    release(&p);
}

SV_TEST(a_marker_without_a_torus_is_absent)
{
    problem p;
    make(&p, 4, 1.0);
    p.point.closed_flake = NULL;
    snprintf(p.point.no_torus, sizeof p.point.no_torus, "a disc has no torus");
    sv_record record;
    double *values = NULL;
    sv_sample sample = {0};
    CHECK_OK(sv_realise(test_context(), &p.point, 3, &values, &sample, &record));
    CHECK(record.outcomes[0].verdict == SV_RESOLVED && record.outcomes[1].verdict == SV_ABSENT);
    CHECK_TEXT(record.outcomes[1].reason, "a disc has no torus");
    CHECK_INT(record.sites, 32);
    double sum = 0.0;
    for (sv_index r = 0; r < sample.n; r++)
        sum += values[r];
    CHECK_CLOSE(sum, 0.0, 1e-11);
    CHECK_CLOSE(record.outcomes[0].sum_over_sites, sum, 1e-12);
    sv_give(test_context(), values);
    sv_sample_free(test_context(), &sample);
    release(&p);
}

/* A record that lacks a marker must never be read as an index of 0. */
SV_TEST(records_with_too_few_outcomes_are_unresolved)
{
    problem p;
    make(&p, 4, 0.0);
    sv_ensemble e = {0};
    sv_summary s = {0};
    CHECK_OK(sv_ensemble_init(test_context(), 1, 3, 2, &e));
    for (int k = 0; k < 3; k++)
        set(&e, k, SV_RESOLVED, 1);
    CHECK_OK(sv_summarise(test_context(), &e, &p.point, 0, 1, 3, &s));
    CHECK(!s.exists && s.unresolved == 3);
    sv_summary_free(test_context(), &s);
    sv_ensemble_free(test_context(), &e);
    release(&p);
}

/* A window whose sites are all vacant: a mean of 0, no call of BLAS with nothing in it. */
SV_TEST(an_empty_window_counts_as_zero)
{
    problem p;
    make(&p, 4, 0.0);
    sv_mark marks[4];
    for (int k = 0; k < 4; k++)
        marks[k] = (sv_mark){.by_cell = true, .cell = {1 + k / 2, 1 + k % 2}, .orbital = -1};
    sv_disorder hole = {.name = "hole",
                        .type = SV_DISORDER_VACANCIES,
                        .on = -1,
                        .has_marks = true,
                        .marks = marks,
                        .n_marks = 4,
                        .tolerance = 0.1};
    p.point.disorder = &hole;
    p.point.n_markers = 1;
    p.point.occupation = (sv_occupation){.by = SV_BY_ENERGY, .fermi_energy = 0.1};
    sv_record record;
    CHECK_OK(sv_realise(test_context(), &p.point, 0, NULL, NULL, &record));
    CHECK(record.outcomes[0].verdict == SV_RESOLVED && record.outcomes[0].value == 0.0);
    CHECK_INT(record.outcomes[0].window_cells, 4);
    release(&p);
}

/* A realisation without sites, or with fewer sites than electrons, is recorded as unresolved. */
SV_TEST(empty_realisations_are_recorded)
{
    problem p;
    make(&p, 2, 1.0);
    sv_disorder vacancies = {
        .name = "vac", .type = SV_DISORDER_VACANCIES, .on = -1, .has_share = true, .share = 0.8};
    p.point.disorder = &vacancies;
    sv_ensemble e = {0};
    sink out = {0};
    sv_summary s = {0};
    CHECK_OK(sv_ensemble_init(test_context(), 1, 60, 2, &e));
    CHECK_OK(run(&p, 60, 2, (sv_stop_rule){0}, &out, &e));
    CHECK_INT(out.calls, 60);
    for (int m = 0; m < 2; m++) {
        CHECK_OK(sv_summarise(test_context(), &e, &p.point, 0, m, 60, &s));
        CHECK(s.unresolved > 5 && strstr(s.unresolved_reason, "no site is left") != NULL);
        sv_summary_free(test_context(), &s);
    }
    sv_ensemble_free(test_context(), &e);
    p.point.occupation = (sv_occupation){.by = SV_BY_ELECTRONS, .electrons = 6};
    vacancies.share = 0.3;
    CHECK_OK(sv_ensemble_init(test_context(), 1, 40, 2, &e));
    CHECK_OK(run(&p, 40, 1, (sv_stop_rule){0}, &out, &e));
    CHECK_OK(sv_summarise(test_context(), &e, &p.point, 0, 0, 40, &s));
    CHECK(s.unresolved > 3 && s.resolved > 3);
    sv_summary_free(test_context(), &s);
    sv_ensemble_free(test_context(), &e);
    release(&p);
}

/* Fails the k-th allocation, k = 0, 1, 2, …: a status every time, nothing leaked (the harness
 * counts), no crash. */
static long allowed;
static sv_allocator inner;

static void *scarce_take(size_t bytes, void *user)
{
    return allowed-- > 0 ? inner.take(bytes, user) : NULL;
}

SV_TEST(every_allocation_may_fail)
{
    problem p;
    make(&p, 4, 1.0);
    sv_context *c = test_context();
    inner = c->allocator;
    c->allocator.take = scarce_take;
    sv_status status = SV_NO_MEMORY;
    long k = 0;
    for (; status != SV_OK && k < 1000; k++) {
        sv_record record;
        double *values = NULL;
        sv_sample sample = {0};
        allowed = k;
        status = sv_realise(c, &p.point, 0, &values, &sample, &record);
        CHECK(status == SV_OK || status == SV_NO_MEMORY);
        sv_give(c, values);
        sv_sample_free(c, &sample);
    }
    c->allocator = inner;
    CHECK(status == SV_OK && k > 20);
    release(&p);
}

/* Independent computation (30 samples, another random sequence): half-BHZ m = −1, 12×12, box of
 * full width 4 per cell: marker 0.909(21), Bott 1 for all. Agreement within 4 combined errors. */
SV_TEST(ensemble_agrees_with_an_independent_run)
{
    problem p;
    make(&p, 12, 4.0);
    p.point.markers[0].values[0].real[0] = 1.0 / 3.0; /* central 4×4 cells */
    sv_ensemble e = {0};
    sink out = {0};
    sv_summary s = {0};
    CHECK_OK(sv_ensemble_init(test_context(), 1, 40, 2, &e));
    CHECK_OK(run(&p, 40, 2, (sv_stop_rule){0}, &out, &e));
    CHECK_OK(sv_summarise(test_context(), &e, &p.point, 0, 0, 40, &s));
    CHECK_CLOSE(s.mean, 0.909, 4.0 * hypot(0.021, s.standard_error));
    CHECK(s.standard_error < 0.04 && s.numerical_error < 1e-8);
    sv_summary_free(test_context(), &s);
    CHECK_OK(sv_summarise(test_context(), &e, &p.point, 0, 1, 40, &s));
    CHECK(s.shares[s.n_shares - 1].index == 1 && s.shares[s.n_shares - 1].share > 0.85);
    sv_summary_free(test_context(), &s);
    sv_ensemble_free(test_context(), &e);
    release(&p);
}
