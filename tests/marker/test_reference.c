/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Markers against published integers and independent computations of clean and disordered flakes.
 * "Independent computation": values of a separate NumPy script, not of this library. */
#include "fixtures.h"

#include <stdlib.h>

SV_TEST(the_table_of_markers_is_consistent)
{
    int count;
    const sv_marker *table = sv_marker_table(&count);
    for (int k = 0; k < count; k++) {
        CHECK_INT(sv_marker_find(table[k].kind.name), k);
        CHECK(table[k].compute != NULL && strlen(table[k].kind.doc) > 10);
        CHECK(!table[k].needs_occupied_basis || table[k].needs_projector);
    }
    CHECK(table[sv_marker_find("local_chern")].compute == sv_local_chern);
    CHECK(table[sv_marker_find("bott")].compute == sv_bott_index);
    CHECK_INT(sv_marker_find("bot"), -1);
    /* A Bott index needs a torus: an open flake is a fault of the caller, said as such. */
    sv_model model = fixture_qi_wu_zhang(-1.0);
    sv_flake_spec open = fixture_cells(&model, 4, 4, false);
    sv_flake flake = fixture_flake(&model, &open);
    sv_sample sample = {0};
    sv_projector *p = NULL;
    sv_projector_options o = sv_projector_options_default();
    sv_outcome outcome;
    CHECK_OK(sv_sample_draw(test_context(), &flake, NULL, 0, 1, 0, &sample));
    CHECK_OK(sv_projector_make(test_context(), &sample, &fixture_below_zero, &o, &p));
    sv_marker_input input = {.sample = &sample, .projector = p};
    CHECK_STATUS(SV_UNDEFINED, sv_bott_index(test_context(), &input, &outcome));
    sv_projector_free(test_context(), p);
    sv_sample_free(test_context(), &sample);
    sv_flake_free(test_context(), &flake);
    sv_model_free(test_context(), &model);
}

/* F. D. M. Haldane, PRL 61, 2015 (1988); X.-L. Qi, Y.-S. Wu, S.-C. Zhang, PRB 74, 085308 (2006);
 * integers by link variables: Fukui, Hatsugai, Suzuki, J. Phys. Soc. Jpn. 74, 1674 (2005). */
SV_TEST(bott_equals_the_link_variable_chern_number)
{
    const double masses[] = {-3.0, -1.0, 1.0, 3.0};
    const int expected[] = {0, 1, -1, 0};
    for (int k = 0; k < 4; k++) {
        sv_model model = fixture_qi_wu_zhang(masses[k]);
        sv_flake_spec torus = fixture_cells(&model, 8, 8, true);
        sv_outcome o = fixture_marker("bott", &model, &torus, NULL, 0, 1, &fixture_below_zero, 0);
        CHECK(o.verdict == SV_RESOLVED);
        CHECK_INT(o.index, expected[k]);
        CHECK_INT(fixture_link_chern(&model, 1, 24), expected[k]);
        sv_model_free(test_context(), &model);
    }
}

/* Boundary |M| = 3√3 |t2 sin φ| = 5.196 t2 (Haldane 1988): C = ±1 below, 0 above, both signs. */
SV_TEST(haldane_phases_and_signs)
{
    const double ratios[] = {0.0, 4.0, 4.8, 5.6, 6.5};
    for (int sign = 1; sign >= -1; sign -= 2)
        for (int k = 0; k < 5; k++) {
            sv_model model = fixture_haldane(0.2, sign * M_PI / 2, ratios[k] * 0.2);
            sv_flake_spec torus = fixture_cells(&model, 12, 12, true);
            int expected = ratios[k] < 3.0 * sqrt(3.0) ? sign : 0;
            sv_outcome o =
                fixture_marker("bott", &model, &torus, NULL, 0, 1, &fixture_below_zero, 0);
            CHECK(o.verdict == SV_RESOLVED);
            CHECK_INT(o.index, expected);
            CHECK_INT(fixture_link_chern(&model, 1, 36), expected);
            sv_model_free(test_context(), &model);
        }
}

/* Independent computation: 1 − c of the central 2×2 cells, half-BHZ m = −1. */
SV_TEST(marker_converges_exponentially)
{
    const int sizes[] = {6, 8, 10, 12, 14, 16};
    const double deficit[] = {9.01e-3, 2.11e-3, 5.14e-4, 1.27e-4, 3.14e-5, 7.80e-6};
    sv_model model = fixture_qi_wu_zhang(-1.0);
    for (int k = 0; k < 6; k++) {
        sv_flake_spec spec = fixture_cells(&model, sizes[k], sizes[k], false);
        sv_outcome o = fixture_marker("local_chern", &model, &spec, NULL, 0, 1, &fixture_below_zero,
                                      2.0 / sizes[k]);
        CHECK(o.verdict == SV_RESOLVED);
        CHECK_INT(o.window_cells, 4);
        CHECK_CLOSE(1.0 - o.value, deficit[k], 0.006 * deficit[k]);
    }
    sv_model_free(test_context(), &model);
}

/* Independent computation: the most negative cell of the edge, half-BHZ m = −1. */
SV_TEST(edge_compensates_the_bulk)
{
    const int sizes[] = {6, 8, 10, 12, 14, 16};
    const double lowest[] = {-1.84, -2.94, -4.08, -5.24, -6.43, -7.63};
    sv_model model = fixture_qi_wu_zhang(-1.0);
    for (int k = 0; k < 6; k++) {
        sv_flake_spec spec = fixture_cells(&model, sizes[k], sizes[k], false);
        sv_flake flake = fixture_flake(&model, &spec);
        sv_outcome o;
        double *c = fixture_site_markers(&flake, NULL, 0, &o);
        double least = 0.0;
        for (sv_index s = 0; s < flake.n_sites; s += 2)
            least = fmin(least, c[s] + c[s + 1]);
        CHECK_CLOSE(least, lowest[k], 0.005 + 1e-9);
        CHECK_CLOSE(o.sum_over_sites, 0.0, 1e-10);
        sv_give(test_context(), c);
        sv_flake_free(test_context(), &flake);
    }
    sv_model_free(test_context(), &model);
}

/* Independent computation (294- and 384-site flakes): mean of the central hexagon, two sites per
 * cell. Their convention has +φ on left-turning hops: the sign here is opposite. */
SV_TEST(haldane_hexagon_centre)
{
    const struct {
        int n;
        double t2, marker;
    } rows[] = {{3, 0.1, 0.811100}, {3, 0.2, 0.984052},       {5, 0.2, 0.999273},
                {7, 0.2, 0.999958}, {7, 1.0 / 3.0, 0.998718}, {8, 0.2, 0.999990}};
    for (size_t k = 0; k < sizeof rows / sizeof rows[0]; k++) {
        sv_model model = fixture_haldane(rows[k].t2, M_PI / 2, 0.0);
        sv_flake_spec spec = {.shape = SV_SHAPE_HEXAGON, .has_cells = true, .cells = {rows[k].n}};
        sv_flake flake = fixture_flake(&model, &spec);
        CHECK_INT(flake.n_sites, 6 * rows[k].n * rows[k].n);
        sv_outcome o;
        double *c = fixture_site_markers(&flake, NULL, 0, &o), sum = 0.0;
        for (sv_index s = 0; s < flake.n_sites; s++) {
            double d = hypot(flake.sites[s].at[0] - flake.centre[0],
                             flake.sites[s].at[1] - flake.centre[1]);
            sum += d < 0.6 ? c[s] : 0.0;
        }
        CHECK_CLOSE(sum / 3.0, rows[k].marker, 6e-7);
        CHECK_CLOSE(o.sum_over_sites, 0.0, 1e-10);
        sv_give(test_context(), c);
        sv_flake_free(test_context(), &flake);
        sv_model_free(test_context(), &model);
    }
}

/* Independent computation: smallest |eigenvalue| of V U V† U†, half-BHZ m = −1. */
SV_TEST(bott_smallest_modulus)
{
    const int sizes[] = {4, 6, 8, 10, 12, 16};
    const double modulus[] = {0.3943, 0.6046, 0.7394, 0.8214, 0.8717, 0.9255};
    sv_model model = fixture_qi_wu_zhang(-1.0);
    for (int k = 0; k < 6; k++) {
        sv_flake_spec torus = fixture_cells(&model, sizes[k], sizes[k], true);
        sv_outcome o = fixture_marker("bott", &model, &torus, NULL, 0, 1, &fixture_below_zero, 0);
        CHECK_INT(o.index, 1);
        CHECK(o.numerical_error < 1e-10);
        CHECK_CLOSE(o.weakest, modulus[k], 6e-5);
    }
    sv_model_free(test_context(), &model);
}

/* D. J. Thouless, M. Kohmoto, M. P. Nightingale, M. den Nijs, PRL 49, 405 (1982): gap r of flux
 * p/q holds C = t_r with r = q s + p t. */
SV_TEST(hofstadter_gap_integers)
{
    const struct {
        int p, q, r, chern;
    } gaps[] = {{1, 3, 1, 1},  {1, 3, 2, -1}, {1, 5, 1, 1},  {1, 5, 2, 2},  {1, 5, 3, -2},
                {1, 5, 4, -1}, {2, 7, 1, -3}, {2, 7, 2, 1},  {2, 7, 3, -2}, {2, 7, 4, 2},
                {2, 7, 5, -1}, {2, 7, 6, 3},  {1, 4, 1, 1},  {1, 4, 3, -1}, {3, 8, 1, 3},
                {3, 8, 2, -2}, {3, 8, 3, 1},  {3, 8, 5, -1}, {3, 8, 6, 2},  {3, 8, 7, -3}};
    for (size_t k = 0; k < sizeof gaps / sizeof gaps[0]; k++) {
        int p = gaps[k].p, q = gaps[k].q, side = q < 5 ? 4 * q : q < 8 ? 3 * q : 2 * q;
        sv_model model = fixture_hofstadter(p, q);
        sv_flake_spec torus = fixture_cells(&model, side, side, true);
        sv_occupation filled = {.by = SV_BY_FILLING, .filling = (double)gaps[k].r / q};
        sv_outcome o = fixture_marker("bott", &model, &torus, NULL, 0, 1, &filled, 0);
        CHECK(o.verdict == SV_RESOLVED);
        CHECK_INT(o.index, gaps[k].chern);
        CHECK_INT(fixture_link_chern(&model, gaps[k].r, 24), gaps[k].chern);
        sv_model_free(test_context(), &model);
    }
}

/* Exact band edges of flux 1/3: E³ − 6E in [−4, 4], gaps 3 − √3 (elementary). */
SV_TEST(hofstadter_band_edges)
{
    sv_model model = fixture_hofstadter(1, 3);
    sv_flake_spec torus = fixture_cells(&model, 24, 24, true);
    sv_occupation third = {.by = SV_BY_FILLING, .filling = 1.0 / 3.0};
    sv_outcome o = fixture_marker("bott", &model, &torus, NULL, 0, 1, &third, 0);
    CHECK_CLOSE(o.highest_occupied, -2.0, 1e-10);
    CHECK_CLOSE(o.lowest_empty, 1.0 - sqrt(3.0), 1e-10);
    sv_model_free(test_context(), &model);
}

/* The disordered sample of the reference table: V_i = W((word0 + ½)/2³² − ½), Philox counter
 * (i, 0, 0, 0), key (1, 0), i = 8x + y, the same V on both orbitals, W = 2, half-BHZ m = −1. */
static sv_disorder golden_potential(void)
{
    sv_disorder disorder = {
        .name = "golden", .type = SV_DISORDER_ONSITE, .on = -1, .has_marks = true, .n_marks = 64};
    CHECK_OK(sv_take(test_context(), 64, sizeof *disorder.marks, &disorder.marks));
    for (int i = 0; i < 64; i++) {
        uint32_t word[4];
        sv_philox((const uint32_t[4]){(uint32_t)i, 0, 0, 0}, (const uint32_t[2]){1, 0}, word);
        disorder.marks[i] = (sv_mark){.by_cell = true,
                                      .cell = {i / 8, i % 8},
                                      .orbital = -1,
                                      .energy = 2.0 * ((word[0] + 0.5) / 4294967296.0 - 0.5)};
    }
    return disorder;
}

SV_TEST(golden_disordered_sample)
{
    sv_model model = fixture_qi_wu_zhang(-1.0);
    sv_disorder disorder = golden_potential();
    CHECK_CLOSE(disorder.marks[0].energy, 0.78051835, 5e-9);
    CHECK_CLOSE(disorder.marks[2].energy, -0.50519706, 5e-9);
    sv_flake_spec torus = fixture_cells(&model, 8, 8, true);
    sv_outcome b = fixture_marker("bott", &model, &torus, &disorder, 1, 1, &fixture_below_zero, 0);
    CHECK_INT(b.index, 1);
    CHECK_INT(b.electrons, 64);
    CHECK_CLOSE(b.highest_occupied, -0.5014724210, 5e-11);
    CHECK_CLOSE(b.lowest_empty, 0.5922946057, 5e-11);
    sv_flake_spec open = fixture_cells(&model, 8, 8, false);
    sv_flake flake = fixture_flake(&model, &open);
    sv_outcome o;
    double *c = fixture_site_markers(&flake, &disorder, 1, &o);
    CHECK_INT(o.electrons, 63);
    int at = 2 * (4 * 8 + 4);
    CHECK_CLOSE(c[at] + c[at + 1], 0.9885463050, 5e-11);
    double four = 0.0;
    for (int x = 3; x <= 4; x++)
        for (int y = 3; y <= 4; y++)
            four += c[2 * (8 * x + y)] + c[2 * (8 * x + y) + 1];
    CHECK_CLOSE(four / 4.0, 0.9920444793, 5e-11);
    sv_give(test_context(), c);
    sv_flake_free(test_context(), &flake);
    sv_disorder_free(test_context(), &disorder);
    sv_model_free(test_context(), &model);
}
