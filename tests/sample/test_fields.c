/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Energies of the potential and of local operators: correlations, charges, point defects. */
#include "fixtures.h"

#include <gsl/gsl_sf_expint.h>

static sv_sample drawn(const sv_flake *flake, const sv_disorder *d, int n, sv_index k)
{
    sv_sample s = {0};
    CHECK_OK(sv_sample_draw(test_context(), flake, d, n, 7, k, &s));
    CHECK_OK(sv_sparse_check(test_context(), &s.hamiltonian));
    return s;
}

/* Covariances at chosen pairs of sites over many realisations against the law. The error of a
 * product of unit gaussians with correlation c is √((1 + c²)/n). */
SV_TEST(correlated_fields_have_their_covariance)
{
    enum { RUNS = 500, PAIRS = 7 };
    sv_model model = fixture_haldane(0.2, 1.0, 0.0);
    sv_flake_spec spec = fixture_cells(&model, 5, 5, false);
    sv_flake flake = fixture_flake(&model, &spec);
    const sv_index others[PAIRS] = {0, 1, 2, 3, 10, 23, 49};
    for (int law = 0; law < 2; law++) {
        for (int which = 0; which < 2; which++) {
            double length = which == 0 ? 0.6 : 2.5, sums[PAIRS] = {0};
            sv_disorder d = {.name = "pot",
                             .type = SV_DISORDER_ONSITE,
                             .on = -1,
                             .distribution = SV_CORRELATED,
                             .width = 2.0,
                             .length = length,
                             .covariance = (sv_covariance)law};
            for (int k = 0; k < RUNS; k++) {
                sv_sample s = drawn(&flake, &d, 1, k);
                for (int p = 0; p < PAIRS; p++)
                    sums[p] += s.potential[0] * s.potential[others[p]] / 4.0;
                sv_sample_free(test_context(), &s);
            }
            for (int p = 0; p < PAIRS; p++) {
                const double *a = flake.sites[0].at, *b = flake.sites[others[p]].at;
                double r = hypot(a[0] - b[0], a[1] - b[1]);
                double c = law == 0 ? exp(-r * r / (2.0 * length * length)) : exp(-r / length);
                CHECK_CLOSE(sums[p] / RUNS, c, 4.0 * sqrt((1.0 + c * c) / RUNS));
            }
        }
    }
    sv_flake_free(test_context(), &flake);
    sv_model_free(test_context(), &model);
}

/* The same field whatever the flake, the boundary, the width, and other entries; bit by bit. */
SV_TEST(correlated_fields_are_shared)
{
    sv_model model = fixture_qi_wu_zhang(-1.0);
    sv_flake_spec small_spec = fixture_cells(&model, 6, 6, false);
    sv_flake_spec large_spec = fixture_cells(&model, 9, 11, true);
    sv_flake small = fixture_flake(&model, &small_spec), large = fixture_flake(&model, &large_spec);
    for (int law = 0; law < 2; law++)
        for (int per_cell = 0; per_cell < 2; per_cell++) {
            sv_disorder d = {.name = "pot",
                             .type = SV_DISORDER_ONSITE,
                             .on = -1,
                             .distribution = SV_CORRELATED,
                             .width = 1.0,
                             .length = 1.7,
                             .per_cell = per_cell == 1,
                             .covariance = (sv_covariance)law};
            sv_sample one = drawn(&small, &d, 1, 5);
            d.width = 2.0;
            sv_sample two = drawn(&large, &d, 1, 5);
            for (int i = 0; i < 6; i++)
                for (int j = 0; j < 6; j++) {
                    CHECK(two.potential[2 * (11 * i + j)] == 2.0 * one.potential[2 * (6 * i + j)]);
                    CHECK(one.potential[2 * (6 * i + j)] == one.potential[2 * (6 * i + j) + 1]);
                }
            sv_sample_free(test_context(), &one);
            sv_sample_free(test_context(), &two);
        }
    sv_flake_free(test_context(), &small);
    sv_flake_free(test_context(), &large);
    sv_model_free(test_context(), &model);
}

/* Random charges: mean 0 and Campbell's variance; of one sign, the mean is taken off. */
SV_TEST(puddles_have_campbells_variance)
{
    enum { RUNS = 2000 };
    sv_model model = fixture_qi_wu_zhang(-1.0);
    sv_flake_spec spec = fixture_cells(&model, 2, 2, false);
    sv_flake flake = fixture_flake(&model, &spec);
    for (int same = 0; same < 2; same++) {
        sv_disorder d = {.name = "pud",
                         .type = SV_DISORDER_ONSITE,
                         .on = -1,
                         .distribution = SV_PUDDLES,
                         .density = 0.05,
                         .strength = 0.8,
                         .depth = 1.2,
                         .screening = 3.0,
                         .same_sign = same == 1};
        double sum = 0.0, squares = 0.0, fourth = 0.0;
        for (int k = 0; k < RUNS; k++) {
            sv_sample s = drawn(&flake, &d, 1, k);
            double v = s.potential[0];
            sum += v;
            squares += v * v;
            fourth += v * v * v * v;
            sv_sample_free(test_context(), &s);
        }
        double variance = 2.0 * M_PI * 0.05 * 0.64 * 1.44 * exp(0.8) * gsl_sf_expint_E1(0.8);
        double found = squares / RUNS, spread = sqrt((fourth / RUNS - found * found) / RUNS);
        CHECK_CLOSE(sv_disorder_puddle_deviation(&d), sqrt(variance), 1e-12);
        CHECK_CLOSE(sum / RUNS, 0.0, 4.0 * sqrt(variance / RUNS));
        CHECK_CLOSE(found, variance, 4.0 * spread);
    }
    sv_flake_free(test_context(), &flake);
    sv_model_free(test_context(), &model);
}

/* Charged vacancies as sources: the potential is the sum of the formula over what is missing. */
SV_TEST(charged_vacancies_make_the_potential)
{
    sv_model model = fixture_qi_wu_zhang(-1.0);
    sv_flake_spec spec = fixture_cells(&model, 12, 12, false);
    sv_flake flake = fixture_flake(&model, &spec);
    sv_disorder d[3] = {
        {.name = "other", .type = SV_DISORDER_VACANCIES, .on = -1, .has_count = true, .count = 5},
        {.name = "te",
         .type = SV_DISORDER_VACANCIES,
         .on = -1,
         .has_count = true,
         .count = 7,
         .charge = 2.0},
        {.name = "pud",
         .type = SV_DISORDER_ONSITE,
         .on = -1,
         .distribution = SV_PUDDLES,
         .source = "te",
         .strength = 0.3,
         .depth = 0.7,
         .screening = 2.0}};
    sv_sample before = drawn(&flake, d, 1, 3), after = drawn(&flake, d, 3, 3);
    CHECK_INT(after.inventory.placed[0], 5);
    CHECK_INT(after.inventory.placed[1], 7);
    CHECK_INT(after.inventory.placed[2], 7);
    bool there[144] = {false}, was[144] = {false};
    for (sv_index r = 0; r < before.n; r++)
        was[before.pristine[r] / 2] = true;
    for (sv_index r = 0; r < after.n; r++)
        there[after.pristine[r] / 2] = true;
    for (sv_index r = 0; r < after.n; r++) {
        const double *at = flake.sites[after.pristine[r]].at;
        double wanted = 0.0;
        for (int c = 0; c < 144; c++) {
            if (there[c] || !was[c])
                continue;
            const double *from = flake.sites[2 * c].at;
            double rho = sqrt(pow(at[0] - from[0], 2) + pow(at[1] - from[1], 2) + 0.49);
            wanted -= 2.0 * 0.3 * 0.7 / rho * exp(-(rho - 0.7) / 2.0);
        }
        CHECK_CLOSE(after.potential[r], wanted, 1e-6);
    }
    sv_sample_free(test_context(), &before);
    sv_sample_free(test_context(), &after);
    d[2].source[0] = 'x';
    CHECK_STATUS(SV_INVALID_INPUT, sv_sample_draw(test_context(), &flake, d, 3, 7, 3, &after));
    sv_flake_free(test_context(), &flake);
    sv_model_free(test_context(), &model);
}

/* A field of binary values ±w/2 over a 1×1 flake is the model with its parameter moved. */
static void check_term(const char *name, const double *numbers, int n, int parameter,
                       const char *term)
{
    sv_model model = fixture_model(name, numbers);
    sv_flake_spec spec = fixture_cells(&model, 3, 3, true);
    sv_flake flake = fixture_flake(&model, &spec);
    sv_disorder d = {.name = "m",
                     .type = SV_DISORDER_MASS,
                     .on = -1,
                     .distribution = SV_BINARY,
                     .width = 0.5,
                     .per_cell = true,
                     .term = sv_model_find_field(&model, term)};
    sv_sample s = drawn(&flake, &d, 1, 0), clean[2] = {{0}};
    sv_stream stream = sv_stream_make(7, "m", 0);
    double moved[8];
    for (int sign = 0; sign < 2; sign++) {
        for (int i = 0; i < n; i++)
            moved[i] = numbers[i] + (i == parameter ? (sign == 0 ? -0.25 : 0.25) : 0.0);
        sv_model other = fixture_model(name, moved);
        sv_flake copy = fixture_flake(&other, &spec);
        clean[sign] = drawn(&copy, NULL, 0, 0);
        sv_flake_free(test_context(), &copy);
        sv_model_free(test_context(), &other);
    }
    sv_index size = s.n * s.n;
    sv_complex *a = NULL, *b = NULL;
    CHECK_OK(sv_take(test_context(), size, sizeof *a, &a));
    CHECK_OK(sv_take(test_context(), size, sizeof *b, &b));
    sv_sparse_to_dense(&s.hamiltonian, a);
    /* Elements within a cell are those of the clean film with that cell's parameter. */
    for (int sign = 0; sign < 2; sign++) {
        sv_sparse_to_dense(&clean[sign].hamiltonian, b);
        for (sv_index r = 0; r < s.n; r++)
            for (sv_index c = 0; c < s.n; c++) {
                const sv_cell *cell = &flake.cells[flake.sites[r].cell];
                bool high = sv_stream_uniform(&stream, cell->i, cell->j, UINT32_MAX) >= 0.5;
                if (flake.sites[r].cell != flake.sites[c].cell || high == (sign == 1))
                    CHECK(cabs(a[r + c * s.n] - b[r + c * s.n]) < 1e-14);
            }
        sv_sample_free(test_context(), &clean[sign]);
    }
    sv_give(test_context(), a);
    sv_give(test_context(), b);
    sv_sample_free(test_context(), &s);
    sv_flake_free(test_context(), &flake);
    sv_model_free(test_context(), &model);
}

SV_TEST(local_operators_move_their_parameter)
{
    check_term("haldane", (const double[]){1.0, 0.2, 0.9, 0.3}, 4, 3, "mass");
    check_term("qi_wu_zhang", (const double[]){-0.8}, 1, 0, "mass");
    check_term("kane_mele", (const double[]){1.0, 0.2, 0.1, 0.3}, 4, 3, "mass");
    check_term("magnetic_film", (const double[]){1.0, 0.25, -0.1, 0.3, 0.2}, 5, 2, "mass");
    check_term("magnetic_film", (const double[]){1.0, 0.25, -0.1, 0.3, 0.2}, 5, 4, "exchange");
}

/* Poisson numbers of defects per cell, several in a cell at real densities; strength/area each. */
SV_TEST(point_defects_are_poisson)
{
    sv_model model = fixture_qi_wu_zhang(-1.0);
    sv_flake_spec spec = fixture_cells(&model, 100, 100, false);
    sv_flake flake = fixture_flake(&model, &spec);
    sv_disorder d = {.name = "cr",
                     .type = SV_DISORDER_MASS,
                     .on = -1,
                     .strength = 0.25,
                     .density = 1.6,
                     .term = sv_model_find_field(&model, "mass")};
    sv_sample s = drawn(&flake, &d, 1, 0);
    double counts[4] = {0}, total = 0.0, p = exp(-1.6);
    for (sv_index c = 0; c < flake.n_cells; c++) {
        double k = s.potential[2 * c] / 0.25;
        CHECK_CLOSE(k, round(k), 1e-12);
        CHECK_CLOSE(s.potential[2 * c + 1], -s.potential[2 * c], 0.0);
        total += k;
        if (k < 3.5)
            counts[(int)lround(k)]++;
    }
    CHECK_INT(s.inventory.placed[0], lround(total));
    CHECK_CLOSE(total, 16000.0, 5.0 * sqrt(16000.0));
    for (int k = 0; k < 4; k++, p *= 1.6 / k)
        CHECK_CLOSE(counts[k], 1e4 * p, 5.0 * sqrt(1e4 * p * (1 - p)));
    sv_sample_free(test_context(), &s);
    sv_flake_free(test_context(), &flake);
    sv_model_free(test_context(), &model);
}

SV_TEST(some_disorder_has_no_torus)
{
    sv_disorder d[2] = {{.name = "vac", .type = SV_DISORDER_VACANCIES},
                        {.name = "rim", .type = SV_DISORDER_ROUGHNESS}};
    CHECK(sv_disorder_can_close(d, 1).possible);
    CHECK(!sv_disorder_can_close(d, 2).possible);
    CHECK(strstr(sv_disorder_can_close(d, 2).reason, "rim") != NULL);
    d[0].type = SV_DISORDER_FLUX;
    CHECK(sv_disorder_can_close(d, 1).possible);
    d[0].independent = true;
    CHECK(!sv_disorder_can_close(d, 1).possible);
}
