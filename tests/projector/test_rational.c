/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The rational engine against the dense one: columns, levels, stated errors, memory faults. */
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

static sv_projector *project(const bench *b, const sv_occupation *occupation, sv_engine engine,
                             double accuracy, double half_gap)
{
    sv_projector *p = NULL;
    sv_projector_options o = sv_projector_options_default();
    o.engine = engine;
    o.accuracy = accuracy;
    o.half_gap = half_gap;
    CHECK_OK(sv_projector_make(test_context(), &b->sample, occupation, &o, &p));
    return p;
}

/* Largest ‖(P − P') x‖/‖x‖ over 19 columns. */
static double difference(sv_index n, sv_projector *p, sv_projector *other)
{
    enum { COLUMNS = 19 };
    sv_complex *x = NULL;
    double worst = 0.0;
    CHECK_OK(sv_take(test_context(), 3 * COLUMNS * n, sizeof *x, &x));
    sv_complex *y = x + COLUMNS * n, *z = y + COLUMNS * n;
    for (sv_index k = 0; k < COLUMNS * n; k++)
        x[k] = CMPLX(sin(0.3 * (double)k), cos(1.7 * (double)k));
    CHECK_OK(sv_projector_apply(test_context(), p, COLUMNS, x, y));
    CHECK_OK(sv_projector_apply(test_context(), other, COLUMNS, x, z));
    for (int c = 0; c < COLUMNS; c++) {
        double apart = 0.0, size = 0.0;
        for (sv_index k = c * n; k < (c + 1) * n; k++) {
            apart += pow(cabs(y[k] - z[k]), 2.0);
            size += pow(cabs(x[k]), 2.0);
        }
        worst = fmax(worst, sqrt(apart / size));
    }
    sv_give(test_context(), x);
    return worst;
}

static void compare_levels(sv_projector *p, sv_projector *dense)
{
    const sv_levels *a = sv_projector_levels(p), *b = sv_projector_levels(dense);
    CHECK_INT(a->occupied, b->occupied);
    CHECK(a->has_highest == b->has_highest && a->has_lowest == b->has_lowest);
    double gap = b->lowest_empty - b->highest_occupied;
    CHECK_CLOSE(a->highest_occupied, b->highest_occupied, 1e-4 * gap + 1e-12);
    CHECK_CLOSE(a->lowest_empty, b->lowest_empty, 1e-4 * gap + 1e-12);
    CHECK(!a->on_level && !b->on_level);
}

/* Gapped to gapless; by energy, at one 1e-6 above a level, and by filling. */
SV_TEST(columns_agree_with_the_dense_engine)
{
    for (int k = 0; k < 12; k++) {
        bench b;
        make(&b, k % 2, 7 + k % 3, 0.6 * k, k);
        sv_occupation o = fixture_below_zero;
        sv_projector *dense = project(&b, &o, SV_ENGINE_DENSE, 1e-6, 0.0);
        for (int how = 0; how < 3; how++) {
            const sv_levels *levels = sv_projector_levels(dense);
            if (how == 1)
                o.fermi_energy = levels->highest_occupied + 1e-6;
            if (how == 2)
                o = (sv_occupation){.by = SV_BY_ELECTRONS, .electrons = levels->occupied + k};
            sv_projector_free(test_context(), dense);
            dense = project(&b, &o, SV_ENGINE_DENSE, 1e-6, 0.0);
            sv_projector *fast = project(&b, &o, SV_ENGINE_RATIONAL, 1e-8, 0.0);
            CHECK_TEXT(sv_projector_engine(fast), "rational");
            CHECK(!sv_projector_basis(fast).available && sv_projector_reach(fast) == 0.0);
            compare_levels(fast, dense);
            double apart = difference(b.sample.n, fast, dense);
            test_check(apart < 1e-9, __FILE__, __LINE__, "sample %d, case %d: columns differ by %g",
                       k, how, apart);
            /* What the engine states includes rounding and is honest. */
            test_check(apart <= sv_projector_uniform_error(fast) + 1e-12, __FILE__, __LINE__,
                       "sample %d, case %d: %g, stated %g", k, how, apart,
                       sv_projector_uniform_error(fast));
            CHECK(sv_projector_uniform_error(fast) < 2e-9);
            CHECK(sv_projector_uniform_error(dense) == 0.0);
            sv_projector_free(test_context(), fast);
        }
        sv_projector_free(test_context(), dense);
        release(&b);
    }
}

/* No and all electrons, too many, and a Fermi energy right on a level. */
SV_TEST(extreme_fillings_and_levels)
{
    bench b;
    make(&b, 1, 5, 2.0, 3);
    for (int all = 0; all < 2; all++) {
        sv_occupation o = {.by = SV_BY_ELECTRONS, .electrons = all ? b.sample.n : 0};
        sv_projector *dense = project(&b, &o, SV_ENGINE_DENSE, 1e-6, 0.0);
        sv_projector *fast = project(&b, &o, SV_ENGINE_RATIONAL, 1e-8, 0.0);
        CHECK(difference(b.sample.n, fast, dense) < 1e-9);
        CHECK_INT(sv_projector_levels(fast)->occupied, o.electrons);
        sv_projector_free(test_context(), fast);
        sv_projector_free(test_context(), dense);
    }
    sv_projector *p = NULL;
    sv_projector_options options = sv_projector_options_default();
    sv_occupation many = {.by = SV_BY_ELECTRONS, .electrons = b.sample.n + 1};
    options.engine = SV_ENGINE_RATIONAL;
    CHECK_STATUS(SV_UNDEFINED, sv_projector_make(test_context(), &b.sample, &many, &options, &p));
    double *spectrum = fixture_spectrum(&b.sample);
    sv_occupation on = {.by = SV_BY_ENERGY, .fermi_energy = spectrum[b.sample.n / 2]};
    p = project(&b, &on, SV_ENGINE_RATIONAL, 1e-6, 0.0);
    CHECK(sv_projector_levels(p)->on_level);
    sv_projector_free(test_context(), p);
    sv_give(test_context(), spectrum);
    release(&b);
}

static sv_outcome window_mean(const bench *b, sv_engine engine, double share, double accuracy,
                              double half_gap, double fermi)
{
    sv_outcome outcome = sv_outcome_blank();
    sv_occupation below = {.by = SV_BY_ENERGY, .fermi_energy = fermi};
    sv_value window[16] = {{.present = true, .real = {share}}};
    sv_projector *p = project(b, &below, engine, accuracy, half_gap);
    sv_marker_input input = {
        .sample = &b->sample, .occupation = &below, .projector = p, .values = window};
    CHECK_OK(sv_local_chern(test_context(), &input, &outcome));
    sv_projector_free(test_context(), p);
    return outcome;
}

/*
 * Stated error of the window mean against the dense answer: 1,000 random samples, gapped and
 * gapless; accuracies from 1e-8 to 1e-1, where the approximation overshoots 0 … 1; in every fifth
 * the Fermi energy lies 1e-6 to 1e-8 above a level; in every third levels nearer than a given width
 * are left unresolved. The true error may exceed the stated one in 5 % of them and never by more
 * than FACTOR.
 */
SV_TEST(stated_errors_hold)
{
    enum { SAMPLES = 1000 };
    const double FACTOR = 3.0;
    int exceeded = 0;
    double worst = 0.0, tightest = INFINITY, largest = 0.0;
    sv_stream stream = sv_stream_make(9, "settings", 0);
    for (int k = 0; k < SAMPLES; k++) {
        bench b;
        double u = sv_stream_uniform(&stream, k, 0, 0), v = sv_stream_uniform(&stream, k, 1, 0);
        double w = sv_stream_uniform(&stream, k, 2, 0), fermi = 0.0;
        make(&b, k % 2, 5 + k % 4, 6.0 * u, k);
        sv_outcome exact = window_mean(&b, SV_ENGINE_DENSE, 0.5, 1e-6, 0.0, fermi);
        if (k % 5 == 0) {
            fermi = exact.highest_occupied + pow(10.0, -6.0 - 2.0 * w);
            exact = window_mean(&b, SV_ENGINE_DENSE, 0.5, 1e-6, 0.0, fermi);
        }
        sv_outcome fast = window_mean(&b, SV_ENGINE_RATIONAL, 0.5, pow(10.0, -8.0 + 7.0 * v),
                                      k % 3 == 1 ? pow(10.0, -4.0 + 4.0 * w) : 0.0, fermi);
        double error = fabs(fast.value - exact.value);
        double share = error / (fast.numerical_error + exact.numerical_error);
        exceeded += share > 1.0;
        worst = fmax(worst, share);
        largest = fmax(largest, error);
        tightest = fmin(tightest, fast.numerical_error);
        release(&b);
    }
    printf("# true error (at most %.1e) above the stated one in %d of %d samples, at most %.2f "
           "times; smallest stated error %.1e\n",
           largest, exceeded, SAMPLES, worst, tightest);
    CHECK(exceeded <= SAMPLES / 20);
    CHECK(worst <= FACTOR);
    CHECK(tightest < 1e-7);
    CHECK(largest > 1e-3); /* hard cases were among them */
}

/*
 * A few cells of gapped samples at coarse accuracies, where the error is that of the approximation
 * alone: its overshoots above 1 and below 0 can cancel in what the columns show of themselves, so
 * the engine's own statement has to cover them. Single sites exceed what is stated without it up to
 * ten times; over one cell the margin tells: measured, the true error is at most 0.25 times the
 * stated one, and 0.51 times without the engine's statement.
 */
SV_TEST(overshoots_are_covered)
{
    enum { SAMPLES = 300 };
    int exceeded = 0;
    double worst = 0.0;
    for (int k = 0; k < SAMPLES; k++) {
        bench b;
        make(&b, 1, 8, 0.5, k);
        sv_outcome exact = window_mean(&b, SV_ENGINE_DENSE, 0.1, 1e-6, 0.0, 0.0);
        sv_outcome fast =
            window_mean(&b, SV_ENGINE_RATIONAL, 0.1, pow(10.0, 0.5 - 0.015 * k), 0.0, 0.0);
        double share = fabs(fast.value - exact.value) / (fast.numerical_error + 1e-12);
        exceeded += share > 1.0;
        worst = fmax(worst, share);
        release(&b);
    }
    printf("# true error above the stated one in %d of %d, at most %.2f times\n", exceeded, SAMPLES,
           worst);
    CHECK_INT(exceeded, 0);
    CHECK(worst < 0.4);
}

static sv_case case_of(const bench *b, const sv_disorder *d)
{
    sv_case point = {.open_flake = &b->flake,
                     .disorder = d,
                     .n_disorder = 1,
                     .occupation = fixture_below_zero,
                     .solve = sv_projector_options_default(),
                     .seed = 5,
                     .n_markers = 1};
    point.solve.engine = SV_ENGINE_RATIONAL;
    point.markers[0] = (sv_marker_request){.marker = sv_marker_find("local_chern"),
                                           .values = {{.present = true, .real = {0.5}}}};
    return point;
}

SV_TEST(it_is_used_when_asked_for)
{
    bench b;
    sv_plan plan;
    sv_record record;
    sv_disorder d = {.name = "pot", .type = SV_DISORDER_ONSITE, .on = -1, .width = 5.0};
    make(&b, 1, 8, 5.0, 0);
    sv_case point = case_of(&b, &d);
    CHECK_OK(sv_case_plan(test_context(), &point, false, 0.005, &plan));
    CHECK_INT(point.solve.engine, SV_ENGINE_RATIONAL);
    CHECK(strncmp(plan.reason, "rational", 8) == 0);
    CHECK_OK(sv_realise(test_context(), &point, 0, NULL, NULL, &record));
    CHECK_TEXT(record.outcomes[0].engine, "rational");
    sv_outcome exact = window_mean(&b, SV_ENGINE_DENSE, 0.5, 1e-6, 0.0, 0.0);
    CHECK_CLOSE(record.outcomes[0].value, exact.value, 1e-6);
    point = case_of(&b, &d);
    point.markers[0].marker = sv_marker_find("bott"); /* needs a basis */
    CHECK_STATUS(SV_INVALID_INPUT, sv_case_plan(test_context(), &point, false, 0.005, &plan));
    release(&b);
}

/* The forecast knows the size of the factors. */
SV_TEST(forecast_knows_the_factors)
{
    bench b;
    sv_sparse square = {0};
    sv_definite *d = NULL;
    double bytes, operations;
    make(&b, 0, 30, 1.0, 0);
    CHECK_OK(sv_sparse_square(test_context(), &b.sample.hamiltonian, 0.0, 1.0, &square));
    CHECK_OK(sv_definite_make(test_context(), &square, 1, &d));
    sv_projector_forecast(SV_ENGINE_RATIONAL, b.sample.n, &bytes, &operations);
    CHECK_CLOSE(25.0 * sv_definite_bytes(d) / bytes, 1.0, 0.3);
    CHECK(operations > 1e8);
    sv_definite_free(test_context(), d);
    sv_sparse_free(test_context(), &square);
    release(&b);
}

static long allowed;
static sv_allocator inner;

static void *scarce_take(size_t bytes, void *user)
{
    return allowed-- > 0 ? inner.take(bytes, user) : NULL;
}

static sv_status everything(sv_context *c, const bench *b, const sv_occupation *occupation,
                            sv_complex *block)
{
    sv_projector *p = NULL;
    sv_projector_options o = sv_projector_options_default();
    o.engine = SV_ENGINE_RATIONAL;
    sv_status status = sv_projector_make(c, &b->sample, occupation, &o, &p);
    if (status != SV_OK)
        return status;
    status = sv_projector_apply(c, p, 3, block, block + 3 * b->sample.n);
    sv_projector_free(c, p);
    return status;
}

/* The k-th allocation fails, k = 0, 1, 2, …: a status, no leak (the harness counts). */
SV_TEST(every_allocation_may_fail)
{
    bench b;
    make(&b, 0, 4, 1.0, 1);
    sv_context *c = test_context();
    sv_complex *block = NULL;
    CHECK_OK(sv_take(c, 6 * b.sample.n, sizeof *block, &block));
    inner = c->allocator;
    c->allocator.take = scarce_take;
    for (int filling = 0; filling < 2; filling++) {
        sv_occupation o = {.by = filling ? SV_BY_ELECTRONS : SV_BY_ENERGY, .electrons = 13};
        sv_status status = SV_NO_MEMORY;
        long k = 0;
        for (; status != SV_OK && k < 1000; k++) {
            allowed = k;
            status = everything(c, &b, &o, block);
            CHECK(status == SV_OK || status == SV_NO_MEMORY);
        }
        CHECK(status == SV_OK && k > 20);
    }
    c->allocator = inner;
    sv_give(c, block);
    release(&b);
}
