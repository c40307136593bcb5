/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Markers of the spin: split by P sz P, signs and phases, what cannot be told. */
#include "fixtures.h"

static const double THRESHOLD = 0.25;

/* One marker of one sample; `electrons` −1: below E = 0. */
static sv_outcome spin_marker(const sv_model *model, int side, bool bott, double width,
                              int64_t electrons)
{
    sv_flake_spec spec = fixture_cells(model, side, side, bott);
    sv_flake flake = fixture_flake(model, &spec);
    sv_disorder disorder = {
        .name = "pot", .type = SV_DISORDER_ONSITE, .on = -1, .width = width, .per_cell = true};
    sv_occupation occupation = fixture_below_zero;
    sv_sample sample = {0};
    sv_projector *p = NULL;
    sv_projector_options o = sv_projector_options_default();
    sv_outcome outcome = sv_outcome_blank();
    if (electrons >= 0)
        occupation = (sv_occupation){.by = SV_BY_ELECTRONS, .electrons = electrons};
    o.occupied_basis = true;
    CHECK_OK(sv_sample_draw(test_context(), &flake, &disorder, 1, 5, 0, &sample));
    CHECK_OK(sv_projector_make(test_context(), &sample, &occupation, &o, &p));
    sv_value values[2] = {{.present = true, .real = {bott ? THRESHOLD : 0.34}},
                          {.present = true, .real = {THRESHOLD}}};
    sv_marker_input input = {
        .sample = &sample, .occupation = &occupation, .projector = p, .values = values};
    CHECK_OK(bott ? sv_spin_bott(test_context(), &input, &outcome)
                  : sv_spin_chern(test_context(), &input, &outcome));
    sv_projector_free(test_context(), p);
    sv_sample_free(test_context(), &sample);
    sv_flake_free(test_context(), &flake);
    return outcome;
}

static sv_model kane_mele(double so, double rashba, double mass)
{
    return fixture_model("kane_mele", (const double[]){1.0, so, rashba, mass});
}

/* Spin Chern number so/|so| inside |mass| < 3√3 |so|, 0 outside (C. L. Kane, E. J. Mele, PRL 95,
 * 226801 (2005); D. N. Sheng et al., PRL 97, 036808 (2006); values recalled from memory), also with
 * a Rashba term and disorder that leave the gap open. */
SV_TEST(kane_mele_phases)
{
    const double edge = 3.0 * sqrt(3.0) * 0.15;
    const struct {
        double so, rashba, mass, width;
        int expected;
    } cases[] = {{0.15, 0.0, 0.0, 0.0, 1},          {-0.15, 0.0, 0.0, 0.0, -1},
                 {0.15, 0.1, 0.4 * edge, 0.0, 1},   {0.15, 0.1, 0.0, 1.0, 1},
                 {-0.15, 0.1, 0.2 * edge, 1.0, -1}, {0.15, 0.05, 1.8 * edge, 0.0, 0}};
    for (int k = 0; k < 6; k++) {
        sv_model model = kane_mele(cases[k].so, cases[k].rashba, cases[k].mass);
        sv_outcome bott = spin_marker(&model, 6, true, cases[k].width, 6 * 6 * 2);
        CHECK_INT(bott.verdict, SV_RESOLVED);
        CHECK_INT(bott.index, cases[k].expected);
        sv_outcome chern = spin_marker(&model, 9, false, cases[k].width, 9 * 9 * 2);
        CHECK_INT(chern.verdict, SV_RESOLVED);
        /* nine cells are few decay lengths: measured within 0.08 of the integer */
        CHECK_CLOSE(chern.value, cases[k].expected, 0.12);
        CHECK(chern.margin > 1.5 && chern.margin <= 2.0 + 1e-12);
        CHECK(chern.numerical_error < 1e-7);
        if (cases[k].rashba == 0.0)
            CHECK_CLOSE(bott.margin, 2.0, 1e-12); /* conserved spin */
        sv_model_free(test_context(), &model);
    }
}

/* With conserved spin the marker is that of a Haldane model by itself. */
SV_TEST(conserved_spin_gives_the_haldane_marker)
{
    sv_model model = kane_mele(0.15, 0.0, 0.3);
    sv_model half = fixture_haldane(0.15, M_PI / 2, 0.3);
    sv_flake_spec spec = fixture_cells(&half, 8, 8, false);
    const sv_occupation filled = {.by = SV_BY_ELECTRONS, .electrons = 64};
    sv_outcome wanted = fixture_marker("local_chern", &half, &spec, NULL, 0, 1, &filled, 0.34);
    sv_outcome chern = spin_marker(&model, 8, false, 0.0, 128);
    CHECK_INT(chern.verdict, SV_RESOLVED);
    CHECK_INT(chern.window_cells, wanted.window_cells);
    CHECK_CLOSE(chern.value, wanted.value, 1e-9);
    sv_model_free(test_context(), &model);
    sv_model_free(test_context(), &half);
}

/* The halves are orthonormal, span the occupied space, and have ⟨sz⟩ of their sign. */
SV_TEST(split_is_orthonormal)
{
    sv_model model = kane_mele(0.15, 0.2, 0.3);
    sv_flake_spec spec = fixture_cells(&model, 4, 5, false);
    sv_flake flake = fixture_flake(&model, &spec);
    sv_sample sample = {0};
    sv_projector *p = NULL;
    sv_projector_options o = sv_projector_options_default();
    sv_spin_split split = {0};
    sv_basis basis = {0};
    o.occupied_basis = true;
    CHECK_OK(sv_sample_draw(test_context(), &flake, NULL, 0, 1, 0, &sample));
    CHECK_OK(sv_projector_make(test_context(), &sample, &fixture_below_zero, &o, &p));
    CHECK_OK(sv_projector_occupied_basis(test_context(), p, &basis));
    CHECK_OK(sv_spin_split_make(test_context(), &sample, &basis, &split));
    CHECK_INT(split.up + split.down, basis.columns);
    CHECK_INT(split.up, split.down); /* time reversal */
    for (sv_index a = 0; a < split.up + split.down; a++) {
        const sv_complex *x = split.vectors + a * split.n;
        double spin = 0.0, outside = 0.0;
        for (sv_index r = 0; r < split.n; r++)
            spin += model.orbitals[flake.sites[r].orbital].spin * creal(x[r] * conj(x[r]));
        CHECK((a < split.down ? -spin : spin) >= 0.5 * split.gap - 1e-12);
        for (sv_index b = 0; b < a; b++) {
            sv_complex dot = 0.0;
            for (sv_index r = 0; r < split.n; r++)
                dot += conj(split.vectors[r + b * split.n]) * x[r];
            outside = fmax(outside, cabs(dot));
        }
        CHECK(outside < 1e-12);
    }
    CHECK_INT(sv_spin_split_half(&split, 1).columns, split.up);
    CHECK(sv_spin_split_half(&split, 1).vectors == split.vectors + split.n * split.down);
    basis.empty_side = true;
    sv_spin_split none = {0};
    CHECK_STATUS(SV_INVALID_INPUT, sv_spin_split_make(test_context(), &sample, &basis, &none));
    sv_spin_split_free(test_context(), &split);
    sv_spin_split_free(test_context(), &split);
    sv_projector_free(test_context(), p);
    sv_sample_free(test_context(), &sample);
    sv_flake_free(test_context(), &flake);
    sv_model_free(test_context(), &model);
}

/* No spin stated: absent. Spins mixed until P sz P has no gap: unresolved, never a number. */
SV_TEST(what_cannot_be_told)
{
    sv_model plain = fixture_haldane(0.2, M_PI / 2, 0.0), mixed = kane_mele(0.05, 1.2, 0.0);
    for (int bott = 0; bott < 2; bott++) {
        sv_outcome outcome = spin_marker(&plain, 4, bott, 0.0, 16);
        CHECK_INT(outcome.verdict, SV_ABSENT);
        CHECK(strstr(outcome.reason, "no spin") != NULL);
        outcome = spin_marker(&mixed, 6, bott, 0.3, 6 * 6 * 2);
        CHECK_INT(outcome.verdict, SV_UNRESOLVED);
        CHECK(strstr(outcome.reason, "P sz P has a gap of") != NULL);
        CHECK(outcome.margin < THRESHOLD && isnan(outcome.value));
        outcome = spin_marker(&mixed, 4, bott, 0.0, 0);
        CHECK_INT(outcome.verdict, SV_RESOLVED);
        CHECK_CLOSE(outcome.value, 0.0, 0.0);
    }
    sv_model_free(test_context(), &plain);
    sv_model_free(test_context(), &mixed);
}

/* One topological spin, one trivial one: C = 1 and half a spin Chern number. */
SV_TEST(half_a_spin_chern_number)
{
    sv_model model = kane_mele(0.15, 0.0, 0.4);
    for (int k = 0; k < model.n_orbitals; k++)
        if (model.orbitals[k].spin < 0)
            model.orbitals[k].onsite *= 5.0;
    sv_outcome bott = spin_marker(&model, 6, true, 0.0, 72);
    CHECK_INT(bott.verdict, SV_UNRESOLVED);
    CHECK(strstr(bott.reason, "indices of the spins are 1 and 0") != NULL);
    sv_outcome chern = spin_marker(&model, 9, false, 0.0, 162);
    CHECK_INT(chern.verdict, SV_RESOLVED);
    CHECK_CLOSE(chern.value, 0.5, 0.06);
    sv_model_free(test_context(), &model);
}

/* A level on the Fermi energy leaves the occupied space open. */
SV_TEST(level_on_the_fermi_energy)
{
    sv_model model = kane_mele(0.0, 0.0, 0.0);
    sv_outcome outcome = spin_marker(&model, 3, true, 0.0, 18);
    CHECK_INT(outcome.verdict, SV_UNRESOLVED);
    CHECK(strstr(outcome.reason, "P sz P") == NULL && isnan(outcome.value));
    sv_model_free(test_context(), &model);
}
