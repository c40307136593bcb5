/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Hamiltonians against exact facts: walks, Hückel energies, zero modes, symmetric spectra. */
#include "fixtures.h"

#include <stdlib.h>

/* Closed n-step walks from a site: (Hⁿ)_00 for unit hops on a torus too large to wrap. */
static void check_walks(const sv_model *model, int side, const double *expected, int steps)
{
    sv_flake_spec spec = fixture_cells(model, side, side, true);
    sv_flake flake = fixture_flake(model, &spec);
    sv_sample s = {0};
    CHECK_OK(sv_sample_draw(test_context(), &flake, NULL, 0, 1, 0, &s));
    sv_complex *x = NULL, *y = NULL;
    CHECK_OK(sv_take(test_context(), s.n, sizeof *x, &x));
    CHECK_OK(sv_take(test_context(), s.n, sizeof *y, &y));
    x[0] = 1.0;
    for (int n = 1; n <= steps; n++) {
        sv_sparse_apply(&s.hamiltonian, x, y);
        sv_complex *swap = x;
        x = y;
        y = swap;
        CHECK_CLOSE(creal(x[0]), expected[n], 1e-9);
    }
    sv_give(test_context(), x);
    sv_give(test_context(), y);
    sv_sample_free(test_context(), &s);
    sv_flake_free(test_context(), &flake);
}

/* OEIS A002893 (honeycomb, value recalled from memory), A002894 (square, recalled from memory),
 * A002898 (six neighbours, triangular). */
SV_TEST(closed_walks)
{
    sv_context *c = test_context();
    const double honeycomb[] = {1, 0, 3, 0, 15, 0, 93, 0, 639, 0, 4653};
    const double square[] = {1, 0, 4, 0, 36, 0, 400, 0, 4900, 0, 63504};
    const double triangular[] = {1, 0, 6, 12, 90, 360, 2040, 10080, 54810};
    sv_model model = fixture_haldane(0.0, 0.0, 0.0);
    check_walks(&model, 11, honeycomb, 10);
    sv_model_free(c, &model);
    CHECK_OK(sv_model_begin(c, "square", (const double[2]){1, 0}, (const double[2]){0, 1}, &model));
    CHECK_OK(sv_model_add_orbital(c, &model, "s", 0, 0, 0));
    CHECK_OK(sv_model_add_hop(c, &model, 0, 0, 1, 0, 1.0));
    CHECK_OK(sv_model_add_hop(c, &model, 0, 0, 0, 1, 1.0));
    CHECK_OK(sv_model_finish(c, &model));
    check_walks(&model, 11, square, 10);
    sv_model_free(c, &model);
    CHECK_OK(sv_model_begin(c, "triangular", (const double[2]){1, 0},
                            (const double[2]){0.5, sqrt(3.0) / 2.0}, &model));
    CHECK_OK(sv_model_add_orbital(c, &model, "s", 0, 0, 0));
    CHECK_OK(sv_model_add_hop(c, &model, 0, 0, 1, 0, 1.0));
    CHECK_OK(sv_model_add_hop(c, &model, 0, 0, 0, 1, 1.0));
    CHECK_OK(sv_model_add_hop(c, &model, 0, 0, 1, -1, 1.0));
    CHECK_OK(sv_model_finish(c, &model));
    check_walks(&model, 9, triangular, 8);
    sv_model_free(c, &model);
}

/* A molecule: one cell, one orbital per atom, unit hops along the bonds. */
static sv_model molecule(int atoms, const int (*pairs)[2], int bonds)
{
    sv_context *c = test_context();
    sv_model model = {0};
    CHECK_OK(
        sv_model_begin(c, "molecule", (const double[2]){1, 0}, (const double[2]){0, 1}, &model));
    for (int k = 0; k < atoms; k++) {
        char name[16];
        snprintf(name, sizeof name, "c%d", k);
        CHECK_OK(sv_model_add_orbital(c, &model, name, 0.01 * k, 0.0, 0.0));
    }
    for (int k = 0; k < bonds; k++)
        CHECK_OK(sv_model_add_hop(c, &model, pairs[k][0], pairs[k][1], 0, 0, 1.0));
    CHECK_OK(sv_model_finish(c, &model));
    return model;
}

static void check_pi_energy(const sv_model *model, const sv_flake_spec *spec, int atoms,
                            double energy, double homo, double top)
{
    sv_flake flake = fixture_flake(model, spec);
    sv_sample s = {0};
    CHECK_OK(sv_sample_draw(test_context(), &flake, NULL, 0, 1, 0, &s));
    double *levels = fixture_spectrum(&s);
    CHECK_INT(s.n, atoms);
    double sum = 0.0;
    for (int k = 0; k < atoms / 2; k++)
        sum += 2.0 * levels[atoms - 1 - k];
    CHECK_CLOSE(sum, energy, 6e-7);
    CHECK_CLOSE(levels[atoms / 2], homo, 6e-7);
    CHECK_CLOSE(levels[atoms - 1], top, 6e-7);
    sv_give(test_context(), levels);
    sv_sample_free(test_context(), &s);
    sv_flake_free(test_context(), &flake);
}

/* Hückel π energies (α = 0, β = 1), HOMO, largest eigenvalue: Coulson & Streitwieser; Heilbronner
 * & Bock (values recalled from memory, recomputed independently). */
SV_TEST(huckel_energies_of_zigzag_hexagons)
{
    const double rows[][3] = {{8.0, 1.0, 2.0},
                              {34.571837, 0.539189, 2.675131},
                              {79.855988, 0.342041, 2.840146},
                              {143.916562, 0.229448, 2.905192},
                              {226.794025, 0.156691, 2.937326}};
    sv_model model = fixture_haldane(0.0, 0.0, 0.0);
    for (int n = 1; n <= 5; n++) {
        sv_flake_spec spec = {.shape = SV_SHAPE_HEXAGON, .has_cells = true, .cells = {n}};
        check_pi_energy(&model, &spec, 6 * n * n, rows[n - 1][0], rows[n - 1][1], rows[n - 1][2]);
    }
    sv_model_free(test_context(), &model);
}

SV_TEST(huckel_energies_of_custom_molecules)
{
    const int naphthalene[][2] = {{0, 1}, {1, 2}, {2, 3}, {3, 4}, {4, 5}, {5, 0},
                                  {4, 6}, {6, 7}, {7, 8}, {8, 9}, {9, 5}};
    const int anthracene[][2] = {{0, 1},   {1, 2},   {2, 3},   {3, 4}, {4, 5}, {5, 0},
                                 {4, 6},   {6, 7},   {7, 8},   {8, 9}, {9, 5}, {7, 10},
                                 {10, 11}, {11, 12}, {12, 13}, {13, 8}};
    const int pyrene[][2] = {/* perimeter of 14, then two inner atoms */
                             {0, 1},   {1, 2},  {2, 3},  {3, 4},   {4, 5},   {5, 6},   {6, 7},
                             {7, 8},   {8, 9},  {9, 10}, {10, 11}, {11, 12}, {12, 13}, {13, 0},
                             {14, 15}, {14, 0}, {14, 4}, {15, 7},  {15, 11}};
    sv_flake_spec one = {.shape = SV_SHAPE_PARALLELOGRAM, .has_cells = true, .cells = {1, 1}};
    sv_model m = molecule(10, naphthalene, 11);
    check_pi_energy(&m, &one, 10, 13.683239, 0.618034, 2.302776);
    sv_model_free(test_context(), &m);
    m = molecule(14, anthracene, 16);
    check_pi_energy(&m, &one, 14, 19.313708, 0.414214, 2.414214);
    sv_model_free(test_context(), &m);
    m = molecule(16, pyrene, 19);
    check_pi_energy(&m, &one, 16, 22.505459, 0.445042, 2.532089);
    sv_model_free(test_context(), &m);
}

/* Triangle of n hexagons a side: n² + 4n + 1 atoms; zigzag edges give n − 1 zero modes
 * (Fernández-Rossier, Palacios, PRL 99, 177204 (2007), value recalled from memory; counting
 * theorem: Sutherland, PRB 34, 5208 (1986)). */
static sv_model triangle(int n)
{
    sv_context *c = test_context();
    double at[128][2];
    int atoms = 0;
    for (int i = 0; i < n; i++)
        for (int j = 0; i + j < n; j++)
            for (int corner = 0; corner < 6; corner++) {
                double x = i + 0.5 * j + cos(M_PI / 6 + corner * M_PI / 3) / sqrt(3.0);
                double y = j * sqrt(3.0) / 2 + sin(M_PI / 6 + corner * M_PI / 3) / sqrt(3.0);
                int k = 0;
                while (k < atoms && hypot(at[k][0] - x, at[k][1] - y) > 1e-6)
                    k++;
                if (k == atoms) {
                    at[atoms][0] = x;
                    at[atoms++][1] = y;
                }
            }
    CHECK_INT(atoms, n * n + 4 * n + 1);
    int pairs[400][2], bonds = 0;
    for (int a = 0; a < atoms; a++)
        for (int b = 0; b < a; b++)
            if (hypot(at[a][0] - at[b][0], at[a][1] - at[b][1]) < 0.6) {
                pairs[bonds][0] = a;
                pairs[bonds++][1] = b;
            }
    (void)c;
    return molecule(atoms, (const int(*)[2])pairs, bonds);
}

SV_TEST(zigzag_triangles_have_zero_modes)
{
    sv_flake_spec one = {.shape = SV_SHAPE_PARALLELOGRAM, .has_cells = true, .cells = {1, 1}};
    for (int n = 2; n <= 7; n++) {
        sv_model model = triangle(n);
        sv_flake flake = fixture_flake(&model, &one);
        sv_sample s = {0};
        CHECK_OK(sv_sample_draw(test_context(), &flake, NULL, 0, 1, 0, &s));
        double *levels = fixture_spectrum(&s);
        int zeros = 0;
        for (sv_index k = 0; k < s.n; k++)
            zeros += fabs(levels[k]) < 1e-9;
        CHECK_INT(zeros, n - 1);
        sv_give(test_context(), levels);
        sv_sample_free(test_context(), &s);
        sv_flake_free(test_context(), &flake);
        sv_model_free(test_context(), &model);
    }
}

/* Haldane, M = 0, φ = π/2: σz H* σz = −H for every flake and every vacancy pattern, so the
 * spectrum is symmetric and an odd number of sites has a zero mode (compare arXiv:2401.11871). */
SV_TEST(symmetric_spectrum_with_vacancies)
{
    sv_model model = fixture_haldane(0.2, M_PI / 2, 0.0);
    sv_flake_spec spec = {.shape = SV_SHAPE_HEXAGON, .has_cells = true, .cells = {6}};
    sv_flake flake = fixture_flake(&model, &spec);
    for (int count = 1; count <= 9; count += 4)
        for (int k = 0; k < 3; k++) {
            sv_disorder d = {.name = "vac",
                             .type = SV_DISORDER_VACANCIES,
                             .on = -1,
                             .has_count = true,
                             .count = count};
            sv_sample s = {0};
            CHECK_OK(sv_sample_draw(test_context(), &flake, &d, 1, 4, k, &s));
            CHECK_INT(s.n, 216 - count);
            CHECK_INT(s.inventory.vacancies, count);
            double *levels = fixture_spectrum(&s), worst = 0.0, least = INFINITY;
            for (sv_index r = 0; r < s.n; r++) {
                worst = fmax(worst, fabs(levels[r] + levels[s.n - 1 - r]));
                least = fmin(least, fabs(levels[r]));
            }
            CHECK(worst < 1e-12);
            CHECK(least < 1e-12);
            sv_give(test_context(), levels);
            sv_sample_free(test_context(), &s);
        }
    sv_flake_free(test_context(), &flake);
    /* E_F = 0 is then ambiguous and must be said so; a number of electrons next to the zero mode
     * is not. */
    sv_disorder one = {
        .name = "vac", .type = SV_DISORDER_VACANCIES, .on = -1, .has_count = true, .count = 1};
    sv_outcome o =
        fixture_marker("local_chern", &model, &spec, &one, 1, 4, &fixture_below_zero, 0.5);
    CHECK(o.verdict == SV_UNRESOLVED && strstr(o.reason, "coincides") != NULL);
    sv_occupation electrons = {.by = SV_BY_ELECTRONS, .electrons = 107};
    o = fixture_marker("local_chern", &model, &spec, &one, 1, 4, &electrons, 0.3);
    CHECK(o.verdict == SV_RESOLVED);
    CHECK_INT(o.electrons, 107);
    sv_model_free(test_context(), &model);
}

/* Independent computation: one vacancy in the 216-site flake, t2 = 0.2: next levels ±0.0958. Any
 * bulk position gives a zero mode; the edge levels are those of the whole flake. */
SV_TEST(levels_next_to_the_vacancy_mode)
{
    sv_model model = fixture_haldane(0.2, M_PI / 2, 0.0);
    sv_flake_spec spec = {.shape = SV_SHAPE_HEXAGON, .has_cells = true, .cells = {6}};
    sv_flake flake = fixture_flake(&model, &spec);
    double distance;
    sv_index site = sv_flake_nearest(
        &flake, (const double[2]){flake.centre[0], flake.centre[1] + 0.5}, -1, &distance);
    sv_mark mark = {.at = {flake.sites[site].at[0], flake.sites[site].at[1]}, .orbital = -1};
    sv_disorder d = {.name = "vac",
                     .type = SV_DISORDER_VACANCIES,
                     .on = -1,
                     .has_marks = true,
                     .marks = &mark,
                     .n_marks = 1,
                     .tolerance = 0.1};
    sv_sample s = {0};
    CHECK_OK(sv_sample_draw(test_context(), &flake, &d, 1, 1, 0, &s));
    double *levels = fixture_spectrum(&s);
    CHECK_CLOSE(levels[107], 0.0, 1e-12);
    CHECK_CLOSE(levels[108], 0.0958, 6e-5);
    CHECK_CLOSE(levels[106], -0.0958, 6e-5);
    sv_give(test_context(), levels);
    sv_sample_free(test_context(), &s);
    sv_flake_free(test_context(), &flake);
    sv_model_free(test_context(), &model);
}
