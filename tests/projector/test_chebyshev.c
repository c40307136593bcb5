/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The Chebyshev engine against the dense one: columns, parts, stated errors, the plan. */
#include "fixtures.h"
#include "selvedge/ensemble.h"

#include <stdlib.h>

typedef struct bench {
    sv_model model;
    sv_flake flake;
    sv_sample sample;
} bench;

static void make(bench *b, int which, int side, double width, sv_index realisation)
{
    *b = (bench){.model = which == 0 ? fixture_haldane(0.2, 1.2, 0.1) : fixture_qi_wu_zhang(-1.0)};
    sv_flake_spec spec = fixture_cells(&b->model, side, side, false);
    sv_disorder d = {.name = "pot", .type = SV_DISORDER_ONSITE, .on = -1, .width = width};
    b->flake = fixture_flake(&b->model, &spec);
    CHECK_OK(sv_sample_draw(test_context(), &b->flake, &d, 1, 5, realisation, &b->sample));
}

static void release(bench *b)
{
    sv_sample_free(test_context(), &b->sample);
    sv_flake_free(test_context(), &b->flake);
    sv_model_free(test_context(), &b->model);
}

static sv_projector_options options_of(sv_engine engine, int degree, double half_gap)
{
    sv_projector_options o = sv_projector_options_default();
    o.engine = engine;
    o.degree = degree;
    o.half_gap = half_gap;
    return o;
}

static sv_outcome window_mean(const bench *b, const sv_projector_options *o, double fermi)
{
    sv_projector *p = NULL;
    sv_outcome outcome = sv_outcome_blank();
    sv_occupation below = {.by = SV_BY_ENERGY, .fermi_energy = fermi};
    sv_value window[16] = {{.present = true, .real = {0.5}}};
    CHECK_OK(sv_projector_make(test_context(), &b->sample, &below, o, &p));
    sv_marker_input input = {
        .sample = &b->sample, .occupation = &below, .projector = p, .values = window};
    CHECK_OK(sv_local_chern(test_context(), &input, &outcome));
    sv_projector_free(test_context(), p);
    return outcome;
}

SV_TEST(columns_agree_with_the_dense_engine)
{
    bench b;
    make(&b, 0, 8, 0.3, 0);
    sv_index n = b.sample.n;
    sv_projector *dense = NULL, *fast = NULL;
    sv_complex *block = NULL;
    sv_projector_options o = options_of(SV_ENGINE_DENSE, 0, 0);
    CHECK_OK(sv_projector_make(test_context(), &b.sample, &fixture_below_zero, &o, &dense));
    const sv_levels *levels = sv_projector_levels(dense);
    double gap = fmin(levels->lowest_empty, -levels->highest_occupied);
    o = options_of(SV_ENGINE_CHEBYSHEV, 0, gap);
    o.accuracy = 1e-7;
    CHECK_OK(sv_projector_make(test_context(), &b.sample, &fixture_below_zero, &o, &fast));
    CHECK_TEXT(sv_projector_engine(fast), "chebyshev");
    CHECK(!sv_projector_basis(fast).available);
    CHECK_OK(sv_take(test_context(), 3 * 19 * n, sizeof *block, &block));
    sv_complex *x = block, *y = x + 19 * n, *z = y + 19 * n;
    for (sv_index k = 0; k < 19 * n; k++)
        x[k] = CMPLX(sin(0.3 * (double)k), cos(1.7 * (double)k));
    CHECK_OK(sv_projector_apply(test_context(), dense, 19, x, y));
    CHECK_OK(sv_projector_apply(test_context(), fast, 19, x, z));
    double worst = 0.0;
    for (sv_index k = 0; k < 19 * n; k++)
        worst = fmax(worst, cabs(y[k] - z[k]));
    CHECK(worst < 1e-8 * sqrt((double)n));
    sv_give(test_context(), block);
    /* A filling is turned into an energy in the gap: the same projector. */
    sv_occupation half = {.by = SV_BY_ELECTRONS, .electrons = levels->occupied};
    sv_projector *filled = NULL;
    CHECK_OK(sv_projector_make(test_context(), &b.sample, &half, &o, &filled));
    const sv_levels *by_count = sv_projector_levels(filled);
    CHECK_INT(by_count->occupied, levels->occupied);
    CHECK_CLOSE(by_count->highest_occupied, levels->highest_occupied, 1e-8);
    CHECK_CLOSE(by_count->lowest_empty, levels->lowest_empty, 1e-8);
    CHECK(!by_count->on_level);
    sv_projector_free(test_context(), filled);
    sv_projector_free(test_context(), dense);
    sv_projector_free(test_context(), fast);
    o.half_gap = 0.0;
    CHECK_STATUS(SV_INVALID_INPUT,
                 sv_projector_make(test_context(), &b.sample, &fixture_below_zero, &o, &fast));
    release(&b);
}

/* Window mean on parts of the flake equals the whole within what is stated. */
SV_TEST(parts_of_a_flake_suffice)
{
    bench b;
    make(&b, 1, 40, 1.0, 0);
    sv_projector_options o = options_of(SV_ENGINE_CHEBYSHEV, 91, 0.5);
    sv_outcome whole = window_mean(&b, &o, 0.0);
    o.reach = 12.0;
    sv_projector *p = NULL;
    CHECK_OK(sv_projector_make(test_context(), &b.sample, &fixture_below_zero, &o, &p));
    CHECK_CLOSE(sv_projector_reach(p), 12.0, 0.0);
    CHECK_INT(sv_projector_degree(p), 91);
    sv_complex *one = NULL;
    CHECK_OK(sv_take(test_context(), b.sample.n, sizeof *one, &one));
    CHECK_STATUS(SV_INTERNAL, sv_projector_apply(test_context(), p, 1, one, one));
    sv_give(test_context(), one);
    sv_projector_free(test_context(), p);
    sv_outcome part = window_mean(&b, &o, 0.0);
    printf("# part %.3e whole %.3e, stated %.1e\n", part.value, part.value - whole.value,
           part.numerical_error);
    CHECK(part.numerical_error < 1e-3);
    CHECK_CLOSE(part.value, whole.value, part.numerical_error);
    CHECK(fabs(part.value - whole.value) > 1e-12); /* the parts were really used */
    CHECK_INT(part.degree, 91);
    sv_projector_options dense = options_of(SV_ENGINE_DENSE, 0, 0);
    CHECK_OK(sv_projector_make(test_context(), &b.sample, &fixture_below_zero, &o, &p));
    const sv_index rows[2] = {3, 7};
    int32_t *place = NULL;
    CHECK_OK(sv_take_raw(test_context(), b.sample.n, sizeof *place, &place));
    memset(place, 0xff, (size_t)b.sample.n * sizeof *place);
    sv_projector *small = NULL;
    CHECK_OK(sv_projector_restrict(test_context(), p, rows, 2, place, &small));
    CHECK(place[3] == -1 && place[7] == -1);
    sv_projector_free(test_context(), small);
    sv_projector_free(test_context(), p);
    release(&b);
    make(&b, 1, 4, 1.0, 0);
    CHECK_OK(sv_projector_make(test_context(), &b.sample, &fixture_below_zero, &dense, &p));
    CHECK_STATUS(SV_UNDEFINED, sv_projector_restrict(test_context(), p, rows, 2, place, &small));
    sv_projector_free(test_context(), p);
    sv_give(test_context(), place);
    release(&b);
}

/*
 * Stated error of the window mean against the dense answer: 1,000 random samples, gapped and
 * gapless, polynomials from too coarse to sharp, with and without near levels one by one; in every
 * fifth the Fermi energy lies 5e-7 above a
 * level. The true error may exceed the stated one in 5 % of them and never by more than FACTOR.
 */
SV_TEST(stated_errors_hold)
{
    enum { SAMPLES = 1000 };
    const double FACTOR = 3.0;
    int exceeded = 0;
    double worst = 0.0, tightest = INFINITY;
    sv_stream stream = sv_stream_make(8, "settings", 0);
    for (int k = 0; k < SAMPLES; k++) {
        bench b;
        double u = sv_stream_uniform(&stream, k, 0, 0), v = sv_stream_uniform(&stream, k, 1, 0);
        make(&b, k % 2, 8 + k % 4, 6.0 * u, k);
        sv_projector_options dense = options_of(SV_ENGINE_DENSE, 0, 0);
        sv_outcome exact = window_mean(&b, &dense, 0.0);
        double fermi = 0.0;
        if (k % 5 == 0) {
            fermi = exact.highest_occupied + 5e-7;
            exact = window_mean(&b, &dense, fermi);
        }
        int degree = 31 + 2 * (int)(100.0 * v);
        double scale = sv_sparse_norm_bound(&b.sample.hamiltonian);
        double ratio = pow(1e-6, -2.0 / (degree + 1));
        sv_projector_options o =
            options_of(SV_ENGINE_CHEBYSHEV, degree, scale * (ratio - 1.0) / (ratio + 1.0));
        if (k % 3 == 1) { /* near levels one by one: sharp whatever the disorder */
            o.half_gap = 0.4;
            o.near_states = 150;
            o.degree = sv_step_degree(0.4 / (1.001 * (scale + fabs(fermi))), 1e-4 * (1.0 + v));
        }
        o.single = k % 4 >= 2;
        sv_outcome fast = window_mean(&b, &o, fermi);
        double error = fabs(fast.value - exact.value);
        double share = error / (fast.numerical_error + exact.numerical_error);
        exceeded += share > 1.0;
        worst = fmax(worst, share);
        tightest = fmin(tightest, fast.numerical_error);
        release(&b);
    }
    printf("# true error above the stated one in %d of %d samples, at most %.2f times; smallest "
           "stated error %.1e\n",
           exceeded, SAMPLES, worst, tightest);
    CHECK(exceeded <= SAMPLES / 20);
    CHECK(worst <= FACTOR);
    CHECK(tightest < 1e-4);
}

/* Sampled window means scatter about the full mean as their stated error says. */
SV_TEST(sampling_errors_hold)
{
    bench b;
    make(&b, 1, 40, 2.0, 0);
    sv_projector *p = NULL;
    sv_projector_options o = options_of(SV_ENGINE_CHEBYSHEV, 61, 0.8);
    o.reach = 9.0;
    sv_value window[16] = {{.present = true, .real = {0.5}}};
    sv_outcome full = window_mean(&b, &o, 0.0);
    CHECK(full.estimator_error == 0.0);
    CHECK_OK(sv_projector_make(test_context(), &b.sample, &fixture_below_zero, &o, &p));
    double squares = 0.0, stated = 0.0;
    enum { DRAWS = 120 };
    for (int k = 0; k < DRAWS; k++) {
        sv_outcome part;
        sv_marker_input input = {.sample = &b.sample,
                                 .projector = p,
                                 .values = window,
                                 .sampled_cells = 64,
                                 .seed = 3,
                                 .realisation = k,
                                 .threads = 2};
        CHECK_OK(sv_local_chern(test_context(), &input, &part));
        CHECK(part.window_cells >= 32 && part.window_cells <= 64 && part.estimator_error > 0.0);
        squares += (part.value - full.value) * (part.value - full.value);
        stated += part.estimator_error * part.estimator_error;
    }
    /* Variance ratio of 120 draws with 8 strata each: within 35 % at five standard deviations is
     * not to be had; 0.6 to 1.6 is three of them. */
    double ratio = stated / squares;
    printf("# stated variance over true variance of sampled means: %.2f\n", ratio);
    CHECK(ratio > 0.6 && ratio < 1.8);
    sv_projector_free(test_context(), p);
    release(&b);
}

static sv_case case_of(const bench *b, const sv_disorder *d, sv_engine engine)
{
    sv_case point = {.open_flake = &b->flake,
                     .disorder = d,
                     .n_disorder = 1,
                     .occupation = fixture_below_zero,
                     .solve = sv_projector_options_default(),
                     .seed = 5,
                     .n_markers = 1};
    point.solve.engine = engine;
    point.markers[0] = (sv_marker_request){.marker = sv_marker_find("local_chern"),
                                           .values = {{.present = true, .real = {0.5}}}};
    return point;
}

SV_TEST(plans_are_reasoned_and_repeat)
{
    bench b;
    sv_plan plan, again;
    sv_disorder d = {.name = "pot", .type = SV_DISORDER_ONSITE, .on = -1, .width = 0.5};
    make(&b, 1, 20, 0.5, 0);
    sv_case point = case_of(&b, &d, SV_ENGINE_AUTO);
    CHECK_OK(sv_case_plan(test_context(), &point, false, 0.005, &plan));
    CHECK_INT(point.solve.engine, SV_ENGINE_CHEBYSHEV);
    CHECK(point.solve.degree > 20 && strstr(plan.reason, "degree") != NULL);
    sv_case twin = case_of(&b, &d, SV_ENGINE_AUTO);
    CHECK_OK(sv_case_plan(test_context(), &twin, false, 0.005, &again));
    CHECK_TEXT(again.reason, plan.reason);
    CHECK_INT(twin.solve.degree, point.solve.degree);
    point = case_of(&b, &d, SV_ENGINE_AUTO);
    CHECK_OK(sv_case_plan(test_context(), &point, true, 0.005, &plan));
    CHECK_INT(point.solve.engine, SV_ENGINE_DENSE);
    point = case_of(&b, &d, SV_ENGINE_CHEBYSHEV);
    point.markers[0].marker = sv_marker_find("bott"); /* needs a basis */
    CHECK_STATUS(SV_INVALID_INPUT, sv_case_plan(test_context(), &point, false, 0.005, &plan));
    /* Strong disorder: no gap that a polynomial could use; levels next to E_F one by one. */
    d.width = 9.0;
    point = case_of(&b, &d, SV_ENGINE_AUTO);
    CHECK_OK(sv_case_plan(test_context(), &point, false, 0.005, &plan));
    CHECK(point.solve.engine == SV_ENGINE_CHEBYSHEV && point.solve.near_states > 0);
    CHECK(strstr(plan.reason, "one by one") != NULL);
    release(&b);
}

/* The interval holds the spectrum and is hardly wider. */
SV_TEST(scales_hold_the_spectrum)
{
    for (int which = 0; which < 2; which++) {
        bench b;
        make(&b, which, 9, 2.0, 3);
        double *levels = fixture_spectrum(&b.sample), scale = 0.0;
        for (double energy = -0.7; energy < 1.0; energy += 0.7) {
            double need = fmax(fabs(levels[0] - energy), fabs(levels[b.sample.n - 1] - energy));
            CHECK_OK(sv_projector_scale(test_context(), &b.sample.hamiltonian, energy, &scale));
            CHECK(scale > need && scale < 1.02 * need);
        }
        sv_give(test_context(), levels);
        release(&b);
    }
}

/* Window means in single precision, where columns done again in double vouch for the others; and
 * columns of P themselves. */
SV_TEST(single_precision_keeps_its_word)
{
    enum { SAMPLES = 16, COLUMNS = 40 };
    double worst = 0.0, largest = 0.0, rounding = 0.0;
    for (int k = 0; k < SAMPLES; k++) {
        bench b;
        make(&b, k % 2, 15 + k % 3, 0.25 * (1 + k), k);
        sv_projector_options dense = options_of(SV_ENGINE_DENSE, 0, 0);
        sv_outcome exact = window_mean(&b, &dense, 0.0);
        double scale = sv_sparse_norm_bound(&b.sample.hamiltonian);
        sv_projector_options o = options_of(SV_ENGINE_CHEBYSHEV, 0, 0.4);
        o.near_states = 150;
        o.degree = sv_step_degree(0.4 / (1.001 * scale), 1e-7);
        o.single = true;
        sv_outcome fast = window_mean(&b, &o, 0.0);
        worst = fmax(worst, fabs(fast.value - exact.value) /
                                (fast.numerical_error + exact.numerical_error));
        largest = fmax(largest, fast.numerical_error);
        sv_projector *p = NULL;
        sv_complex *x = NULL;
        sv_index n = b.sample.n;
        CHECK_OK(sv_projector_make(test_context(), &b.sample, &fixture_below_zero, &o, &p));
        CHECK_OK(sv_take(test_context(), 3 * COLUMNS * n, sizeof *x, &x));
        sv_complex *single = x + COLUMNS * n, *twice = single + COLUMNS * n;
        for (int c = 0; c < COLUMNS; c++)
            x[c * n + (7 * c) % n] = 1.0;
        CHECK(sv_projector_single(p));
        CHECK_OK(sv_projector_apply(test_context(), p, COLUMNS, x, single));
        CHECK(sv_projector_set_single(p, false) && !sv_projector_single(p));
        CHECK_OK(sv_projector_apply(test_context(), p, COLUMNS, x, twice));
        for (sv_index r = 0; r < COLUMNS * n; r++)
            rounding = fmax(rounding, cabs(single[r] - twice[r]));
        sv_projector_free(test_context(), p);
        sv_give(test_context(), x);
        release(&b);
    }
    printf("# true error at most %.2f times the stated one, which is at most %.1e; rounding of a "
           "column at most %.1e\n",
           worst, largest, rounding);
    CHECK(worst <= 1.0);
    CHECK(largest < 2e-5);
    CHECK(rounding > 1e-9 && rounding < 1e-6);
}
