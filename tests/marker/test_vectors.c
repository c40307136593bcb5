/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Window means from random-phase vectors against the sum over every site. */
#include "fixtures.h"
#include "selvedge/ensemble.h"

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

/* Window mean with a polynomial of this degree: of vectors, of cells, or (both 0) of every site. */
static sv_outcome mean_of(const bench *b, int degree, sv_index vectors, sv_index cells,
                          sv_index realisation)
{
    sv_projector *p = NULL;
    sv_outcome outcome = sv_outcome_blank();
    sv_value window[16] = {{.present = true, .real = {0.5}}};
    sv_projector_options o = sv_projector_options_default();
    o.engine = SV_ENGINE_CHEBYSHEV;
    o.degree = degree;
    o.half_gap = degree > 500 ? 0.08 : 0.4;
    CHECK_OK(sv_projector_make(test_context(), &b->sample, &fixture_below_zero, &o, &p));
    sv_marker_input input = {.sample = &b->sample,
                             .occupation = &fixture_below_zero,
                             .projector = p,
                             .values = window,
                             .sampled_vectors = vectors,
                             .sampled_cells = cells,
                             .seed = 3,
                             .realisation = realisation};
    CHECK_OK(sv_local_chern(test_context(), &input, &outcome));
    sv_projector_free(test_context(), p);
    return outcome;
}

/* Differences in units of the stated error: mean 0; variance that of Student's t with 31 degrees of
 * freedom, 31/29, within the scatter of 200 samples. */
SV_TEST(vectors_are_unbiased_and_state_their_error)
{
    enum { SAMPLES = 200, VECTORS = 32 };
    double sum = 0.0, squares = 0.0;
    for (int k = 0; k < SAMPLES; k++) {
        bench b;
        make(&b, k % 2, 8, 1.0 + 0.5 * (k % 3), k);
        sv_outcome all = mean_of(&b, 101, 0, 0, k), some = mean_of(&b, 101, VECTORS, 0, k);
        CHECK(all.estimator_error == 0.0 && some.estimator_error > 0.0);
        double z = (some.value - all.value) / some.estimator_error;
        sum += z;
        squares += z * z;
        release(&b);
    }
    double mean = sum / SAMPLES, variance = squares / SAMPLES - mean * mean;
    printf("# deviations over stated errors: mean %.3f, variance %.3f\n", mean, variance);
    CHECK(fabs(mean) < 4.0 * sqrt(variance / SAMPLES));
    CHECK(variance > 0.7 && variance < 1.4);
}

/* The same vectors with a far better polynomial show the numerical error by itself. */
SV_TEST(numerical_errors_of_vectors_hold)
{
    enum { SAMPLES = 60 };
    double worst = 0.0;
    for (int k = 0; k < SAMPLES; k++) {
        bench b;
        make(&b, k % 2, 14, 0.5 * (k % 5), k);
        sv_outcome good = mean_of(&b, 901, 16, 0, k),
                   poor = mean_of(&b, 41 + 10 * (k % 4), 16, 0, k);
        double error = fabs(poor.value - good.value);
        worst = fmax(worst, error / (poor.numerical_error + good.numerical_error));
        CHECK(poor.numerical_error > 0.0 && good.numerical_error < poor.numerical_error);
        release(&b);
    }
    printf("# true numerical error at most %.3f of the stated one\n", worst);
    CHECK(worst < 1.0 && worst > 1e-4);
}

SV_TEST(vectors_repeat_and_depend_on_the_realisation)
{
    bench b;
    make(&b, 0, 8, 1.0, 0);
    sv_outcome one = mean_of(&b, 61, 16, 0, 7), two = mean_of(&b, 61, 16, 0, 7);
    CHECK(one.value == two.value && one.estimator_error == two.estimator_error);
    CHECK(mean_of(&b, 61, 16, 0, 8).value != one.value);
    CHECK(mean_of(&b, 61, 48, 0, 7).value != one.value);
    release(&b);
}

/* Variance times projected columns of both estimators, for the sentence in the README. */
SV_TEST(vectors_against_cells_at_equal_cost)
{
    const int sides[] = {24, 48};
    for (int s = 0; s < 2; s++) {
        double of_vectors = 0.0, of_cells = 0.0;
        for (int k = 0; k < 6; k++) {
            bench b;
            make(&b, 1, sides[s], 2.0, k);
            sv_outcome v = mean_of(&b, 61, 16, 0, k), c = mean_of(&b, 61, 0, 24, k);
            of_vectors += v.estimator_error * v.estimator_error * 16.0 * 3.0 / 6.0;
            of_cells += c.estimator_error * c.estimator_error * 24.0 * 2.0 * 2.0 / 6.0;
            release(&b);
        }
        printf("# %d cells wide: variance at equal columns, vectors over cells: %.3f\n", sides[s],
               of_vectors / of_cells);
        CHECK(of_vectors > 0.0 && of_vectors < 10.0 * of_cells);
    }
}

SV_TEST(plans_settle_vectors_only_when_asked)
{
    bench b;
    sv_plan plan;
    make(&b, 1, 30, 1.0, 0);
    sv_disorder d = {.name = "pot", .type = SV_DISORDER_ONSITE, .on = -1, .width = 1.0};
    sv_case start = {.open_flake = &b.flake,
                     .disorder = &d,
                     .n_disorder = 1,
                     .occupation = fixture_below_zero,
                     .solve = sv_projector_options_default(),
                     .seed = 5,
                     .n_markers = 1};
    start.markers[0] = (sv_marker_request){.marker = sv_marker_find("local_chern"),
                                           .values = {{.present = true, .real = {0.5}}}};
    sv_case point = start;
    CHECK_OK(sv_case_plan(test_context(), &point, false, 0.005, &plan));
    CHECK(point.solve.sampled_vectors == 0 && point.solve.sampled_cells == 0);
    point = start;
    point.solve.estimator = SV_ESTIMATOR_RANDOM_PHASE;
    CHECK_OK(sv_case_plan(test_context(), &point, false, 0.005, &plan));
    CHECK(point.solve.sampled_vectors >= 16 && point.solve.sampled_vectors % 16 == 0);
    CHECK(strstr(plan.reason, "random-phase vectors") != NULL);
    sv_record record, again;
    CHECK_OK(sv_realise(test_context(), &point, 3, NULL, NULL, &record));
    CHECK_OK(sv_realise(test_context(), &point, 3, NULL, NULL, &again));
    CHECK(record.outcomes[0].value == again.outcomes[0].value);
    CHECK(record.outcomes[0].estimator_error > 0.0 && record.outcomes[0].estimator_error < 0.01);
    CHECK_CLOSE(record.outcomes[0].value, 1.0, 0.03);
    point = start;
    point.solve.estimator = SV_ESTIMATOR_CELLS;
    CHECK_OK(sv_case_plan(test_context(), &point, false, 0.005, &plan));
    CHECK(point.solve.sampled_cells > 0 && point.solve.sampled_vectors == 0);
    point = start;
    point.solve.estimator = SV_ESTIMATOR_RANDOM_PHASE;
    CHECK_OK(sv_case_plan(test_context(), &point, true, 0.005, &plan)); /* every site is wanted */
    CHECK(point.solve.sampled_vectors == 0);
    release(&b);
}
