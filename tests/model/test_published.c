/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Kagome, Kane–Mele and the magnetic film: Bloch matrices against formulas, phases against the
 * literature. */
#include "fixtures.h"
#include "selvedge/model.h"

#define lapack_complex_double double _Complex
#define lapack_complex_float  float _Complex
#include <lapacke.h>

enum { MOST = 4 };

/* Ascending eigenvalues of H(k). */
static void bands(const sv_model *model, double k1, double k2, double *energy)
{
    sv_complex h[MOST * MOST];
    int n = model->n_orbitals;
    sv_model_bloch(model, (const double[2]){k1, k2}, h);
    CHECK(LAPACKE_zheev(LAPACK_COL_MAJOR, 'N', 'L', n, h, n, energy) == 0);
}

static double gap_at_half_filling(const sv_model *model)
{
    double edges[2] = {0.0, 0.0};
    CHECK_OK(sv_model_filling_gap(test_context(), model, 0.5, 1e-9, edges));
    return edges[1] - edges[0];
}

/* ------------------------------------------------------------------ kagome */

/* At φ = 0 the line graph of the honeycomb lattice: a flat band at −2t, and t (1 ± |1 + e^{ik1} +
 * e^{ik2}|). Elementary; the flat band at −2 for H = +A is in every text on line graphs. */
SV_TEST(kagome_has_a_flat_band)
{
    for (int sign = -1; sign <= 1; sign += 2) {
        sv_model model = fixture_model("kagome", (const double[]){sign * 0.7, 0.0});
        for (int k = 0; k < 9; k++) {
            double k1 = 0.37 * k + 0.1, k2 = -0.81 * k + 0.4, energy[3];
            bands(&model, k1, k2, energy);
            double dirac = cabs(1.0 + CMPLX(cos(k1), sin(k1)) + CMPLX(cos(k2), sin(k2)));
            CHECK_CLOSE(sign > 0 ? energy[0] : energy[2], -2.0 * 0.7 * sign, 1e-13);
            CHECK_CLOSE(sign > 0 ? energy[2] : energy[0], 0.7 * sign * (1.0 + dirac), 1e-13);
            CHECK_CLOSE(energy[1], 0.7 * sign * (1.0 - dirac), 1e-13);
        }
        sv_model_free(test_context(), &model);
    }
}

SV_TEST(kagome_bloch_matrix)
{
    const double phi = 0.4, k[2] = {0.3, -1.1};
    sv_model model = fixture_model("kagome", (const double[]){1.3, phi});
    sv_complex h[9], e = 1.3 * CMPLX(cos(phi), sin(phi));
    sv_model_bloch(&model, k, h);
    CHECK(cabs(h[1] - e * (1.0 + CMPLX(cos(0.3), sin(0.3)))) < 1e-14);
    CHECK(cabs(h[5] - e * (1.0 + CMPLX(cos(1.4), -sin(1.4)))) < 1e-14);
    CHECK(cabs(h[6] - e * (1.0 + CMPLX(cos(1.1), sin(1.1)))) < 1e-14);
    CHECK(cabs(h[0]) + cabs(h[4]) + cabs(h[8]) < 1e-14);
    sv_model_free(test_context(), &model);
}

/* The doc line of the model: +1 at fillings 1/3 and 2/3 for 0 < φ < π/3, minus that for −φ. The
 * bands touch at φ = π/3, where all fluxes are multiples of π. */
SV_TEST(kagome_chern_numbers)
{
    for (int bands_filled = 1; bands_filled <= 2; bands_filled++)
        for (int sign = -1; sign <= 1; sign += 2)
            for (double phi = 0.2; phi < 1.0; phi += 0.35) {
                sv_model model = fixture_model("kagome", (const double[]){1.0, sign * phi});
                CHECK_INT(fixture_link_chern(&model, bands_filled, 24), sign);
                sv_model_free(test_context(), &model);
            }
}

/* --------------------------------------------------------------- Kane, Mele */

/* C. L. Kane, E. J. Mele, PRL 95, 226801 (2005): without Rashba term two Haldane models, gap
 * |6√3 so − 2 mass|, closing at |mass| = 3√3 so (value recalled from memory). */
SV_TEST(kane_mele_boundary_without_rashba)
{
    const double so = 0.06, edge = 3.0 * sqrt(3.0) * so;
    for (double mass = -1.5 * edge; mass < 1.6 * edge; mass += 0.25 * edge) {
        sv_model model = fixture_model("kane_mele", (const double[]){1.0, so, 0.0, mass});
        double wanted = 2.0 * fabs(edge - fabs(mass));
        CHECK_CLOSE(gap_at_half_filling(&model), wanted, 1e-8);
        sv_model_free(test_context(), &model);
    }
}

/* C. L. Kane, E. J. Mele, PRL 95, 146802 (2005): at mass 0 the gap stays open up to rashba =
 * 2√3 so (value recalled from memory). */
SV_TEST(kane_mele_boundary_of_rashba)
{
    const double so = 0.06, edge = 2.0 * sqrt(3.0) * so;
    const double share[] = {0.0, 0.5, 0.9, 1.0, 1.1};
    for (int k = 0; k < 5; k++) {
        sv_model model =
            fixture_model("kane_mele", (const double[]){1.0, so, share[k] * edge, 0.0});
        double gap = gap_at_half_filling(&model);
        if (share[k] < 1.0)
            CHECK(gap > 0.05 * so);
        else
            CHECK(gap < 1e-6);
        sv_model_free(test_context(), &model);
    }
}

/* Without Rashba term the two spins are Haldane models of opposite phase: C = 0 in all. */
SV_TEST(kane_mele_spins_are_haldane_models)
{
    const double so = 0.07, mass = 0.11, k[2] = {0.9, -0.4};
    sv_model model = fixture_model("kane_mele", (const double[]){1.0, so, 0.0, mass});
    sv_complex h[16], half[4];
    CHECK(sv_model_has_spin(&model));
    CHECK_INT(model.n_positions, 2);
    sv_model_bloch(&model, k, h);
    for (int spin = 0; spin < 2; spin++) {
        sv_model one = fixture_haldane(so, spin == 0 ? M_PI / 2 : -M_PI / 2, mass);
        sv_model_bloch(&one, k, half);
        for (int b = 0; b < 2; b++)
            for (int a = 0; a < 2; a++) {
                CHECK(cabs(h[2 * b + spin + 4 * (2 * a + spin)] - half[b + 2 * a]) < 1e-14);
                CHECK(cabs(h[2 * b + spin + 4 * (2 * a + 1 - spin)]) < 1e-14);
            }
        sv_model_free(test_context(), &one);
    }
    CHECK_INT(fixture_link_chern(&model, 2, 12), 0);
    sv_model_free(test_context(), &model);
}

/* Time reversal i sy K: every level of H(k) is a level of H(−k); at k = 0 levels are double. */
SV_TEST(kane_mele_keeps_time_reversal)
{
    sv_model model = fixture_model("kane_mele", (const double[]){1.0, 0.07, 0.2, 0.1});
    double here[4], there[4];
    bands(&model, 0.7, 1.9, here);
    bands(&model, -0.7, -1.9, there);
    for (int e = 0; e < 4; e++)
        CHECK_CLOSE(here[e], there[e], 1e-13);
    bands(&model, 0.0, M_PI, here);
    CHECK_CLOSE(here[0], here[1], 1e-13);
    CHECK_CLOSE(here[2], here[3], 1e-13);
    sv_model_free(test_context(), &model);
}

/* ------------------------------------------------------------- magnetic film */

/* R. Yu et al., Science 329, 61 (2010): C = sign(g) iff |g| > |m0|, whatever the sign of m0 m1
 * (value recalled from memory; independent computation with ħv = m1 = 1 on a unit grid). */
SV_TEST(magnetic_film_phases)
{
    const double exchange[] = {0.05, 0.0999, 0.1001, 0.15, -0.05, -0.15};
    const int chern[] = {0, 0, 1, 1, 0, -1};
    for (int sign = -1; sign <= 1; sign += 2)
        for (int k = 0; k < 6; k++) {
            sv_model model =
                fixture_model("magnetic_film", (const double[]){1, 1, sign * 0.1, 1, exchange[k]});
            CHECK_INT(fixture_link_chern(&model, 2, 40), chern[k]);
            CHECK_CLOSE(gap_at_half_filling(&model), 2.0 * fabs(fabs(exchange[k]) - 0.1), 1e-6);
            sv_model_free(test_context(), &model);
        }
}

/* Where m1 alone would let the corners of the zone come down (coarse grid, m1 = 0, either sign),
 * the k⁴ term keeps the phases and the low-energy bands. */
SV_TEST(magnetic_film_has_no_doublers)
{
    const double m1[] = {0.15, 0.0, -0.02};
    for (int k = 0; k < 3; k++) {
        const double grid = 3.0, v = 0.25, m0 = 0.004, g = 0.03;
        sv_model model = fixture_model("magnetic_film", (const double[]){grid, v, m0, m1[k], g});
        CHECK_INT(fixture_link_chern(&model, 2, 40), 1);
        CHECK_CLOSE(gap_at_half_filling(&model), 2.0 * (g - m0), 1e-8);
        CHECK_CLOSE(model.velocity, v / grid, 1e-15);
        /* E² = (ħv q)² + (m ± g)² up to order q⁴ */
        double energy[4], q = 0.01;
        bands(&model, q * grid, 0.0, energy);
        double mass = m0 + m1[k] * q * q;
        CHECK_CLOSE(energy[2], hypot(v * q, g - fabs(mass)), 1e-7);
        CHECK_CLOSE(energy[3], hypot(v * q, g + fabs(mass)), 1e-7);
        /* the corners of the zone stay beyond the cut-off */
        bands(&model, M_PI, 0.0, energy);
        CHECK(energy[2] >= v / grid - g - m0 - 1e-12);
        bands(&model, M_PI, M_PI, energy);
        CHECK(energy[2] >= v / grid - g - m0 - 1e-12);
        sv_model_free(test_context(), &model);
    }
}

SV_TEST(magnetic_film_on_too_coarse_a_grid_is_refused)
{
    int count, row = 0;
    const sv_kind *kinds = sv_model_kinds(&count);
    while (strcmp(kinds[row].name, "magnetic_film") != 0)
        row++;
    const double numbers[] = {4.0, 0.25, 0.0, 0.15, 0.07};
    sv_value values[5] = {{0}};
    for (int v = 0; v < 5; v++)
        values[v] = (sv_value){.present = true, .real = {numbers[v]}};
    sv_model model = {0};
    CHECK_STATUS(SV_INVALID_INPUT, sv_model_make(test_context(), &kinds[row], values, &model));
    CHECK(strstr(test_context()->error.message, "too coarse") != NULL);
    values[4].real[0] = 0.05;
    CHECK_OK(sv_model_make(test_context(), &kinds[row], values, &model));
    sv_model_free(test_context(), &model);
}

/* ---------------------------------------------------------- local operators */

/* A field of strength δ everywhere is the model with its parameter larger by δ. */
static void field_is_parameter(const char *name, const double *values, int parameter,
                               const char *field)
{
    enum { KEYS = 5 };
    const double delta = 0.013, k[2] = {0.6, -0.9};
    double more[KEYS];
    sv_complex before[MOST * MOST], after[MOST * MOST];
    memcpy(more, values, sizeof more);
    more[parameter] += delta;
    sv_model model = fixture_model(name, values), changed = fixture_model(name, more);
    sv_model_bloch(&model, k, before);
    sv_model_bloch(&changed, k, after);
    int row = sv_model_find_field(&model, field);
    CHECK(row >= 0);
    const sv_model_field *f = &model.fields[row];
    CHECK_CLOSE(f->value, values[parameter], 1e-15);
    for (int t = 0; t < f->n_terms; t++) {
        const sv_field_term *term = &f->terms[t];
        before[term->to + MOST * term->from] += delta * term->amplitude;
        if (term->to != term->from)
            before[term->from + MOST * term->to] += delta * conj(term->amplitude);
    }
    for (int e = 0; e < MOST * MOST; e++)
        CHECK(cabs(before[e] - after[e]) < 1e-14);
    sv_model_free(test_context(), &model);
    sv_model_free(test_context(), &changed);
}

SV_TEST(local_operators_are_the_parameters)
{
    field_is_parameter("kane_mele", (const double[]){1.0, 0.1, 0.05, 0.2, 0.0}, 3, "mass");
    const double film[] = {2.0, 0.25, 0.004, 0.15, 0.05};
    field_is_parameter("magnetic_film", film, 2, "mass");
    field_is_parameter("magnetic_film", film, 4, "exchange");
}

/* -------------------------------------------------------------- many hops */

/* Hops are found again in both directions among many, and spin is all or nothing. */
SV_TEST(many_hops_are_found)
{
    sv_context *c = test_context();
    sv_model model = {0};
    enum { N = 40, REACH = 6 };
    CHECK_OK(sv_model_begin(c, "own", (const double[2]){1, 0}, (const double[2]){0, 1}, &model));
    for (int o = 0; o < N; o++) {
        char name[8];
        snprintf(name, sizeof name, "o%d", o);
        CHECK_OK(sv_model_add_orbital(c, &model, name, 0.01 * o, 0.0, 0.0));
    }
    CHECK(!sv_model_has_spin(&model));
    CHECK_INT(sv_model_find_hop(&model, 0, 1, 0, 0), -1);
    for (int from = 0; from < N; from++)
        for (int to = from; to < N; to++)
            for (int i = 1; i <= REACH; i++)
                CHECK_OK(sv_model_add_hop(c, &model, from, to, i, -i, 1e-3 * i));
    CHECK_INT(model.n_hops, N * (N + 1) / 2 * REACH);
    for (int h = 0; h < model.n_hops; h += 7) {
        const sv_hop *hop = &model.hops[h];
        CHECK_INT(sv_model_find_hop(&model, hop->from, hop->to, hop->shift[0], hop->shift[1]), h);
        CHECK_INT(sv_model_find_hop(&model, hop->to, hop->from, -hop->shift[0], -hop->shift[1]), h);
    }
    CHECK_INT(sv_model_find_hop(&model, 3, 4, 1, 1), -1);
    CHECK_STATUS(SV_INVALID_INPUT, sv_model_add_hop(c, &model, 9, 7, -2, 2, 1.0));
    /* every orbital meets N − 1 others once and itself in both directions, per shift */
    CHECK_CLOSE(sv_model_norm_bound(&model), (N + 1) * 1e-3 * (1 + 2 + 3 + 4 + 5 + 6), 1e-12);
    CHECK_STATUS(SV_INVALID_INPUT, sv_model_set_spin(c, &model, 0, 2));
    CHECK_STATUS(SV_INVALID_INPUT, sv_model_set_spin(c, &model, N, 1));
    for (int o = 0; o < N; o++)
        CHECK_OK(sv_model_set_spin(c, &model, o, o % 2 == 0 ? 1 : -1));
    CHECK(sv_model_has_spin(&model));
    sv_model_free(c, &model);
}
