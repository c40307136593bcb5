/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Bounds of the spectrum, Chebyshev moments, Jackson's kernel. */
#include <stdlib.h>

#include "fixtures.h"

/* Twelve draws that differ in model, boundary, disorder and size. */
static sv_sample draw(sv_flake *flake, const sv_model *model, int number)
{
    int side = 3 + number % 6;
    sv_flake_spec spec = fixture_cells(model, side, 3 + number % 5, number % 3 == 0);
    *flake = fixture_flake(model, &spec);
    sv_disorder d[2] = {{.name = "pot",
                         .type = SV_DISORDER_ONSITE,
                         .on = -1,
                         .distribution = (sv_distribution)(number % 3),
                         .width = 0.5 * (number % 20)},
                        {.name = "vac",
                         .type = SV_DISORDER_VACANCIES,
                         .on = -1,
                         .has_share = true,
                         .share = 0.1 * (number % 4)}};
    sv_sample sample = {0};
    CHECK_OK(sv_sample_draw(test_context(), flake, d, 2, (uint64_t)number, 0, &sample));
    return sample;
}

SV_TEST(bounds_hold_the_spectrum_and_are_within_two_per_cent)
{
    for (int number = 0; number < 200; number++) {
        sv_model model = number % 2 ? fixture_haldane(0.3, 0.1 * number, 0.2)
                                    : fixture_qi_wu_zhang(0.05 * number - 4.0);
        sv_flake flake;
        sv_sample sample = draw(&flake, &model, number);
        double *levels = fixture_spectrum(&sample), bounds[2];
        CHECK_OK(sv_spectral_bounds(test_context(), &sample.hamiltonian, bounds));
        double low = levels[0], high = levels[sample.n - 1], width = high - low;
        test_check(bounds[0] <= low && bounds[1] >= high, __FILE__, __LINE__,
                   "sample %d: [%.15g, %.15g] does not hold [%.15g, %.15g]", number, bounds[0],
                   bounds[1], low, high);
        test_check(bounds[1] - bounds[0] <= 1.02 * width + 1e-9, __FILE__, __LINE__,
                   "sample %d: %g wide instead of %g", number, bounds[1] - bounds[0], width);
        sv_give(test_context(), levels);
        sv_sample_free(test_context(), &sample);
        sv_flake_free(test_context(), &flake);
        sv_model_free(test_context(), &model);
    }
}

static sv_index one_row[2] = {0, 1};

SV_TEST(bounds_of_a_single_level)
{
    int32_t column = 0;
    sv_complex value = -2.5;
    sv_sparse h = {.n = 1, .row_start = one_row, .column = &column, .value = &value};
    double bounds[2];
    CHECK_OK(sv_spectral_bounds(test_context(), &h, bounds));
    CHECK_CLOSE(bounds[0], -2.5, 1e-11);
    CHECK(bounds[0] <= -2.5 && bounds[1] >= -2.5 && bounds[1] - bounds[0] < 1e-10);
    h.n = 0;
    CHECK_STATUS(SV_INVALID_INPUT, sv_spectral_bounds(test_context(), &h, bounds));
}

/* Exact trace against the eigenvalues, and the stochastic one against its own error. */
SV_TEST(moments_are_those_of_the_eigenvalues)
{
    enum { COUNT = 41, COLUMNS = SV_PANEL_COLUMNS };
    sv_context *context = test_context();
    sv_model model = fixture_haldane(0.2, 0.9, 0.1);
    sv_flake flake;
    sv_sample sample = draw(&flake, &model, 5);
    double *levels = fixture_spectrum(&sample), exact[COUNT], *moments = NULL;
    sv_packed packed;
    sv_stream stream = sv_stream_make(3, "test", 0);
    const double shift = 0.3, scale = 9.0;
    CHECK_OK(sv_take(context, 2 * COUNT * COLUMNS, sizeof *moments, &moments));
    CHECK_OK(
        sv_packed_make(context, &sample.hamiltonian, NULL, sample.n, NULL, shift, scale, &packed));
    CHECK_OK(sv_chebyshev_moments(context, &packed, COUNT, 0, NULL, moments));
    for (int k = 0; k < COUNT; k++) {
        exact[k] = 0.0;
        for (sv_index s = 0; s < sample.n; s++)
            exact[k] += cos(k * acos((levels[s] - shift) / scale)) / (double)sample.n;
        CHECK_CLOSE(moments[k * COLUMNS], exact[k], 1e-12);
        CHECK(moments[k * COLUMNS + 15] == moments[k * COLUMNS]);
    }
    /* One moment less leaves the others as they are, whether even or odd in number. */
    CHECK_OK(sv_chebyshev_moments(context, &packed, COUNT - 1, 0, NULL, moments + COUNT * COLUMNS));
    CHECK(memcmp(moments, moments + COUNT * COLUMNS, sizeof *moments * (COUNT - 1) * COLUMNS) == 0);
    CHECK_OK(sv_chebyshev_moments(context, &packed, COUNT, 20, &stream, moments));
    int far = 0;
    for (int k = 1; k < COUNT; k++) {
        double mean = 0.0, squares = 0.0;
        for (int c = 0; c < COLUMNS; c++)
            mean += moments[k * COLUMNS + c] / COLUMNS;
        for (int c = 0; c < COLUMNS; c++)
            squares += pow(moments[k * COLUMNS + c] - mean, 2.0);
        double error = sqrt(squares / COLUMNS / (COLUMNS - 1.0));
        CHECK(error > 0.0 && error < 0.02);
        far += fabs(mean - exact[k]) > 3.0 * error;
    }
    CHECK(far <= 2); /* of 40; Student with 15 degrees: 0.36 expected */
    sv_packed_free(context, &packed);
    /* Levels outside of [−1, 1] make the moments grow. */
    CHECK_OK(sv_packed_make(context, &sample.hamiltonian, NULL, sample.n, NULL, 0.0, 1.0, &packed));
    CHECK_STATUS(SV_NUMERICAL, sv_chebyshev_moments(context, &packed, COUNT, 1, &stream, moments));
    sv_packed_free(context, &packed);
    sv_give(context, levels);
    sv_give(context, moments);
    sv_sample_free(context, &sample);
    sv_flake_free(context, &flake);
    sv_model_free(context, &model);
}

/* A. Weiße, G. Wellein, A. Alvermann, H. Fehske, Rev. Mod. Phys. 78, 275 (2006), Eq. (71);
 * formula recalled from memory, its values for N = 8 worked out apart from this code. */
SV_TEST(jackson_coefficients)
{
    const double expected[8] = {1.0,          0.9396926208, 0.7920395050, 0.5977094713,
                                0.3971086614, 0.2234604837, 0.0977094713, 0.0259950619};
    double kernel[8];
    sv_jackson_kernel(8, kernel);
    for (int k = 0; k < 8; k++)
        CHECK_CLOSE(kernel[k], expected[k], 6e-11);
}

/* A level in the middle becomes a peak of standard deviation π/N, positive everywhere, of area 1
 * (the same review, section II.C.2: σ = π/N at x = 0; value recalled from memory). */
SV_TEST(a_level_is_broadened_by_the_stated_resolution)
{
    enum { COUNT = 128, POINTS = 4000 };
    static double moments[COUNT], energies[POINTS], density[POINTS];
    const double centre = 2.0, half = 5.0;
    for (int k = 0; k < COUNT; k++)
        moments[k] = cos(k * M_PI / 2.0); /* T_k(0) */
    for (int e = 0; e < POINTS; e++)
        energies[e] = centre + half * (2.0 * (e + 0.5) / POINTS - 1.0);
    CHECK_OK(sv_chebyshev_density(test_context(), moments, COUNT, 1, centre, half, energies, POINTS,
                                  density));
    double area = 0.0, mean = 0.0, square = 0.0, least = 0.0, step = 2.0 * half / POINTS;
    for (int e = 0; e < POINTS; e++) {
        area += density[e] * step;
        mean += density[e] * energies[e] * step;
        least = fmin(least, density[e]);
        if (fabs(energies[e] - centre) < 0.5 * half)
            square += density[e] * pow(energies[e] - centre, 2.0) * step;
    }
    CHECK_CLOSE(area, 1.0, 1e-3);
    CHECK_CLOSE(mean, centre, 1e-3);
    CHECK(least > -1e-12);
    CHECK_CLOSE(sqrt(square) / half, M_PI / COUNT, 0.03 * M_PI / COUNT);
    double outside[2] = {centre - half, centre + 1.5 * half};
    CHECK_OK(
        sv_chebyshev_density(test_context(), moments, COUNT, 1, centre, half, outside, 2, density));
    CHECK(density[0] == 0.0 && density[1] == 0.0);
}
