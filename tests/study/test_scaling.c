/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Finite sizes: synthetic curves with a known transition, and curves without one. */
#include <stdlib.h>

#include "selvedge/study.h"
#include "testing.h"

static const double critical = 2.5, nu = 1.5;

/* One-parameter scaling; with a correction; and what is no transition of finite sizes. */
static double collapsing(double p, double size)
{
    return 0.5 + 0.5 * tanh((p - critical) * pow(size, 1.0 / nu));
}

static double corrected(double p, double size)
{
    double x = (p - critical) * pow(size, 1.0 / nu);
    return collapsing(p, size) + 0.8 / size * (1.0 + 0.3 * x);
}

static double flat(double p, double size)
{
    (void)p, (void)size;
    return 0.5;
}

static double apart(double p, double size)
{
    return 0.5 + 0.3 * tanh(p - critical) - 0.5 * exp(-size / 20.0);
}

static double same(double p, double size)
{
    (void)size;
    return 0.5 + 0.5 * tanh(2.0 * (p - critical));
}

static double beyond(double p, double size)
{
    return 0.5 + 0.5 * tanh((p - critical) * pow(size, 1.0 / nu) - 4.0);
}

enum { PARAMETERS = 9, MOST_SIZES = 6 };

typedef struct curves {
    sv_scaling_data data;
    sv_scaling_point points[PARAMETERS * MOST_SIZES];
    double *values;
} curves;

/* Half of the variance is common to all parameters of a size, as with common random numbers. */
static void make_curves(curves *c, double (*mean)(double, double), int n_sizes, double span,
                        int realisations, double deviation, int set)
{
    static const double sizes[MOST_SIZES] = {8, 12, 16, 24, 32, 48};
    const int n = PARAMETERS * n_sizes;
    c->values = calloc((size_t)n * (size_t)realisations, sizeof *c->values);
    c->data = (sv_scaling_data){.points = c->points, .n_points = n, .realisations = realisations};
    for (int i = 0; i < n; i++) {
        double size = sizes[i / PARAMETERS];
        double p = critical + span * (2.0 * (i % PARAMETERS) / (PARAMETERS - 1) - 1.0);
        double *values = c->values + (size_t)i * (size_t)realisations;
        c->points[i] = (sv_scaling_point){size, p, values};
        for (int k = 0; k < realisations; k++) {
            sv_stream stream = sv_stream_make((uint64_t)(1000 + set), "synthetic", k);
            double common = sv_stream_normal(&stream, -1, i / PARAMETERS, 0);
            double own = sv_stream_normal(&stream, i, 0, 0);
            values[k] = mean(p, size) + deviation * (common + own) / sqrt(2.0);
        }
    }
}

static sv_scaling_options quick(void)
{
    sv_scaling_options options = sv_scaling_options_default();
    options.resamples = 100;
    return options;
}

static bool holds(const sv_scaling_estimate *e, double value)
{
    return e->interval[0] <= value && value <= e->interval[1];
}

SV_TEST(intervals_cover_p_c_and_nu)
{
    sv_context *context = test_context();
    int decided = 0, right_p = 0, right_nu = 0, right_crossing = 0, poor = 0;
    const int sets = 200;
    sv_scaling_options options = quick();
    for (int set = 0; set < sets; set++) {
        curves c;
        sv_scaling s;
        make_curves(&c, collapsing, 3, 0.2, 150, 0.1, set);
        CHECK_OK(sv_scaling_study(context, &c.data, &options, &s));
        decided += s.collapse.decided;
        right_p += holds(&s.collapse.critical, critical);
        right_nu += holds(&s.collapse.nu, nu);
        right_crossing += holds(&s.crossing, critical);
        poor += s.collapse.p_value < 0.05;
        sv_scaling_free(context, &s);
        free(c.values);
    }
    test_check(decided >= 0.95 * sets, __FILE__, __LINE__, "only %d decided", decided);
    /* 90 to 98 % of the intervals hold the truth. */
    test_check(right_p >= 180 && right_p <= 196, __FILE__, __LINE__, "p_c held by %d", right_p);
    test_check(right_nu >= 180 && right_nu <= 196, __FILE__, __LINE__, "nu held by %d", right_nu);
    test_check(right_crossing >= 180, __FILE__, __LINE__, "crossing held by %d", right_crossing);
    /* The search for a range hides p-values between 0.001 and 0.05. */
    test_check(poor <= 10, __FILE__, __LINE__, "%d p-values below 0.05", poor);
}

SV_TEST(a_goodness_of_fit_means_what_it_says)
{
    sv_context *context = test_context();
    int poor = 0, good = 0;
    sv_scaling_options options = quick();
    options.range[0] = critical - 1.0; /* fixed: nothing is searched */
    options.range[1] = critical + 1.0;
    options.order = 7;
    options.resamples = 50;
    for (int set = 0; set < 200; set++) {
        curves c;
        sv_scaling s;
        make_curves(&c, collapsing, 4, 0.15, 100, 0.1, set);
        CHECK_OK(sv_scaling_study(context, &c.data, &options, &s));
        CHECK_INT(s.collapse.degrees_of_freedom, 4 * PARAMETERS - 10);
        poor += s.collapse.p_value < 0.1;
        good += s.collapse.p_value > 0.9;
        sv_scaling_free(context, &s);
        free(c.values);
    }
    /* 20 each expected, 4.2 the binomial deviation. */
    test_check(poor >= 7 && poor <= 33, __FILE__, __LINE__, "%d p-values below 0.1", poor);
    test_check(good >= 7 && good <= 33, __FILE__, __LINE__, "%d p-values above 0.9", good);
}

SV_TEST(a_correction_is_taken_out)
{
    sv_context *context = test_context();
    int without = 0, right_p = 0, right_nu = 0;
    const int sets = 50;
    sv_scaling_options options = quick(), plain = quick();
    options.correction = SV_CORRECTION_FIXED;
    options.exponent = 1.0;
    for (int set = 0; set < sets; set++) {
        curves c;
        sv_scaling s;
        make_curves(&c, corrected, 6, 0.12, 150, 0.06, set);
        CHECK_OK(sv_scaling_study(context, &c.data, &options, &s));
        right_p += holds(&s.collapse.critical, critical);
        right_nu += holds(&s.collapse.nu, nu);
        sv_scaling_free(context, &s);
        CHECK_OK(sv_scaling_study(context, &c.data, &plain, &s));
        without += s.collapse.decided;
        sv_scaling_free(context, &s);
        free(c.values);
    }
    test_check(right_p >= 45, __FILE__, __LINE__, "p_c held by %d of %d", right_p, sets);
    test_check(right_nu >= 44, __FILE__, __LINE__, "nu held by %d of %d", right_nu, sets);
    /* Without it the curves do not collapse, or hang on the smallest size, and that is seen. */
    test_check(without <= 5, __FILE__, __LINE__, "%d decided without the correction", without);
}

SV_TEST(a_free_exponent_is_found)
{
    sv_context *context = test_context();
    sv_scaling_options options = quick();
    curves c;
    sv_scaling s;
    options.correction = SV_CORRECTION_FREE;
    options.order = 7;
    make_curves(&c, corrected, 6, 0.12, 400, 0.02, 1);
    CHECK_OK(sv_scaling_study(context, &c.data, &options, &s));
    CHECK(s.collapse.fitted);
    CHECK_CLOSE(s.collapse.exponent.value, 1.0, 4.0 * s.collapse.exponent.standard_error);
    CHECK_CLOSE(s.collapse.critical.value, critical, 4.0 * s.collapse.critical.standard_error);
    CHECK_CLOSE(s.collapse.nu.value, nu, 4.0 * s.collapse.nu.standard_error);
    CHECK(s.collapse.exponent.standard_error < 0.5);
    sv_scaling_free(context, &s);
    free(c.values);
}

SV_TEST(data_without_a_transition_are_refused)
{
    static double (*const means[])(double, double) = {flat, apart, same, beyond};
    sv_context *context = test_context();
    sv_scaling_options options = quick();
    options.resamples = 50;
    for (int kind = 0; kind < 4; kind++) {
        int decided = 0, crossings = 0;
        for (int set = 0; set < 25; set++) {
            curves c;
            sv_scaling s;
            make_curves(&c, means[kind], 3, 0.3, 60, 0.1, set);
            CHECK_OK(sv_scaling_study(context, &c.data, &options, &s));
            CHECK(s.collapse.decided == (s.collapse.n_reasons == 0));
            CHECK(s.collapse.decided || s.collapse.reasons[0][0] != '\0');
            decided += s.collapse.decided;
            crossings += isfinite(s.crossing.value);
            sv_scaling_free(context, &s);
            free(c.values);
        }
        test_check(decided == 0 && crossings <= 1, __FILE__, __LINE__,
                   "kind %d: %d decided, %d crossings", kind, decided, crossings);
    }
}

SV_TEST(two_sizes_cross_and_do_not_collapse)
{
    sv_context *context = test_context();
    sv_scaling_options options = quick();
    curves c;
    sv_scaling s;
    make_curves(&c, collapsing, 2, 0.2, 150, 0.1, 3);
    CHECK_OK(sv_scaling_study(context, &c.data, &options, &s));
    CHECK(!s.collapse.decided && strstr(s.collapse.reasons[0], "at least three") != NULL);
    CHECK_INT(s.n_crossings, 1);
    CHECK(s.crossings[0].found && isnan(s.drift));
    CHECK_CLOSE(s.crossing.value, critical, 4.0 * s.crossing.standard_error);
    CHECK_CLOSE(s.crossings[0].height, 0.5, 0.1);
    sv_scaling_free(context, &s);
    free(c.values);
}

/* An index is 0 or 1 in each realisation; far from the transition all agree and s = 0. */
SV_TEST(an_index_collapses_too)
{
    sv_context *context = test_context();
    sv_scaling_options options = quick();
    curves c;
    sv_scaling s;
    make_curves(&c, collapsing, 4, 0.25, 300, 0.1, 5);
    for (int i = 0; i < c.data.n_points; i++)
        for (int k = 0; k < 300; k++) {
            sv_stream stream = sv_stream_make(9, "index", k);
            bool one = sv_stream_uniform(&stream, i, 0, 0) <
                       collapsing(c.points[i].parameter, c.points[i].size);
            c.values[i * 300 + k] = one ? 1.0 : 0.0;
        }
    c.values[7] = NAN; /* unresolved */
    c.data.quantum = 1.0;
    CHECK_OK(sv_scaling_study(context, &c.data, &options, &s));
    test_check(s.collapse.decided, __FILE__, __LINE__, "%s", s.collapse.reasons[0]);
    CHECK_CLOSE(s.collapse.critical.value, critical, 4.0 * s.collapse.critical.standard_error);
    CHECK_CLOSE(s.collapse.nu.value, nu, 4.0 * s.collapse.nu.standard_error);
    CHECK_INT(s.least, 299);
    CHECK_INT(s.most, 300);
    for (sv_index i = 0; i < s.n_rows; i++)
        CHECK(s.rows[i].standard_error >= 1.0 / 300.0);
    sv_scaling_free(context, &s);
    free(c.values);
}

SV_TEST(rows_and_curve_are_of_the_fit)
{
    sv_context *context = test_context();
    sv_scaling_options options = quick();
    curves c;
    sv_scaling s;
    double chi_square = 0.0;
    make_curves(&c, collapsing, 4, 0.2, 150, 0.1, 8);
    CHECK_OK(sv_scaling_study(context, &c.data, &options, &s));
    CHECK_INT(s.n_rows, 4 * PARAMETERS);
    for (sv_index i = 0; i < s.n_rows; i++) {
        const sv_scaling_row *row = &s.rows[i];
        double x = (row->parameter - s.collapse.critical.value) *
                   pow(row->size, 1.0 / s.collapse.nu.value);
        CHECK_CLOSE(row->x, x, 1e-9);
        CHECK_CLOSE(row->residual, (row->collapsed - row->fitted) / row->standard_error, 1e-9);
        if (row->used)
            chi_square += row->residual * row->residual;
    }
    CHECK_CLOSE(chi_square, s.collapse.chi_square, 1e-6 * chi_square);
    CHECK_INT(s.collapse.n_without, 4);
    for (int i = 1; i < s.n_curve; i++)
        CHECK(s.curve[2 * i] > s.curve[2 * i - 2]);
    CHECK_CLOSE(s.curve[2 * (s.n_curve / 2) + 1], 0.5, 0.3);
    sv_scaling_free(context, &s);
    sv_scaling_free(context, &s);
    free(c.values);
}

SV_TEST(the_order_of_points_changes_nothing)
{
    sv_context *context = test_context();
    sv_scaling_options options = quick();
    curves c;
    sv_scaling a, b;
    make_curves(&c, collapsing, 3, 0.2, 100, 0.1, 2);
    CHECK_OK(sv_scaling_study(context, &c.data, &options, &a));
    for (int i = 0; i < c.data.n_points / 2; i++) {
        sv_scaling_point other = c.points[i];
        c.points[i] = c.points[c.data.n_points - 1 - i];
        c.points[c.data.n_points - 1 - i] = other;
    }
    CHECK_OK(sv_scaling_study(context, &c.data, &options, &b));
    CHECK(memcmp(&a.collapse, &b.collapse, sizeof a.collapse) == 0);
    CHECK(memcmp(&a.crossing, &b.crossing, sizeof a.crossing) == 0);
    sv_scaling_free(context, &a);
    sv_scaling_free(context, &b);
    free(c.values);
}

SV_TEST(tables_that_are_none_are_refused)
{
    sv_context *context = test_context();
    sv_scaling_options options = quick();
    curves c;
    sv_scaling s;
    make_curves(&c, collapsing, 3, 0.2, 20, 0.1, 2);
    c.points[1].parameter = c.points[0].parameter;
    CHECK_STATUS(SV_INVALID_INPUT, sv_scaling_study(context, &c.data, &options, &s));
    CHECK(strstr(context->error.message, "stands twice") != NULL);
    c.points[1].parameter = NAN;
    CHECK_STATUS(SV_INVALID_INPUT, sv_scaling_study(context, &c.data, &options, &s));
    c.points[1].parameter = 0.0;
    c.points[1].size = -1.0;
    CHECK_STATUS(SV_INVALID_INPUT, sv_scaling_study(context, &c.data, &options, &s));
    c.points[1].size = 8.0;
    options.resamples = 10;
    CHECK_STATUS(SV_INVALID_INPUT, sv_scaling_study(context, &c.data, &options, &s));
    options = quick();
    options.order = 10;
    CHECK_STATUS(SV_INVALID_INPUT, sv_scaling_study(context, &c.data, &options, &s));
    options = quick();
    options.range[0] = options.range[1] = 1.0;
    CHECK_STATUS(SV_INVALID_INPUT, sv_scaling_study(context, &c.data, &options, &s));
    free(c.values);
}

/* Single points, one size, no spread, nothing resolved: no numbers, but words. */
SV_TEST(poor_tables_get_reasons)
{
    sv_context *context = test_context();
    sv_scaling_options options = quick();
    for (int kind = 0; kind < 4; kind++) {
        curves c;
        sv_scaling s;
        make_curves(&c, collapsing, 3, 0.2, 20, kind == 2 ? 0.0 : 0.1, 2);
        if (kind == 0)
            c.data.n_points = 1;
        if (kind == 1)
            c.data.n_points = PARAMETERS;
        for (int i = 0; kind == 3 && i < 20 * (int)c.data.n_points; i++)
            c.values[i] = NAN;
        CHECK_OK(sv_scaling_study(context, &c.data, &options, &s));
        CHECK(!s.collapse.decided && s.collapse.n_reasons > 0);
        CHECK(isnan(s.crossing.value));
        sv_scaling_free(context, &s);
        free(c.values);
    }
}

typedef struct failing {
    sv_allocator inner;
    long left;
} failing;

static void *failing_take(size_t bytes, void *user)
{
    failing *f = user;
    return f->left-- > 0 ? f->inner.take(bytes, f->inner.user) : NULL;
}

static void failing_give(void *memory, void *user)
{
    failing *f = user;
    f->inner.give(memory, f->inner.user);
}

SV_TEST(missing_memory_is_a_status)
{
    sv_context *context = test_context();
    sv_scaling_options options = quick();
    failing f = {.inner = context->allocator};
    curves c;
    sv_scaling s = {0};
    sv_status status = SV_NO_MEMORY;
    options.resamples = 50;
    options.order = 3;
    make_curves(&c, collapsing, 3, 0.2, 20, 0.1, 2);
    context->allocator = (sv_allocator){failing_take, failing_give, &f};
    for (long k = 0; status != SV_OK && k < 200; k++) {
        f.left = k;
        status = sv_scaling_study(context, &c.data, &options, &s);
        CHECK(status == SV_OK || (status == SV_NO_MEMORY && s.rows == NULL));
    }
    CHECK_OK(status);
    sv_scaling_free(context, &s);
    context->allocator = f.inner;
    free(c.values);
}
