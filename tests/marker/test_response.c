/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Density response to flux: in a gap N(Φ) − N(0) = C·Φ/(h/e) exactly (P. Streda, J. Phys. C 15,
 * L717 (1982)), by state counts alone: no projector, no marker of this library. */
#include "fixtures.h"
#include "selvedge/linalg.h"

/* States below zero on a side×side torus with p/side flux quanta per cell. */
static sv_index states_below(sv_model *model, int side, int p)
{
    CHECK_OK(sv_model_set_flux(test_context(), model, p, side));
    sv_flake_spec torus = fixture_cells(model, side, side, true);
    sv_flake flake = fixture_flake(model, &torus);
    sv_sample sample = {0};
    sv_inertia_plan *plan = NULL;
    sv_inertia_count count = {0};
    CHECK_OK(sv_sample_draw(test_context(), &flake, NULL, 0, 1, 0, &sample));
    CHECK_OK(sv_inertia_plan_make(test_context(), &sample.hamiltonian, 1, &plan));
    CHECK_OK(sv_inertia_count_below(test_context(), plan, &sample.hamiltonian, 1e-3, &count));
    CHECK(count.decided);
    sv_inertia_plan_free(test_context(), plan);
    sv_sample_free(test_context(), &sample);
    sv_flake_free(test_context(), &flake);
    return count.below;
}

SV_TEST(states_move_with_the_flux)
{
    const double masses[] = {-1.0, 1.0, 3.0};
    const int chern[] = {1, -1, 0};
    enum { SIDE = 16 }; /* one quantum per SIDE cells: SIDE quanta through the torus */
    for (int k = 0; k < 3; k++) {
        sv_model model = fixture_qi_wu_zhang(masses[k]);
        sv_index none = states_below(&model, SIDE, 0);
        CHECK_INT(none, SIDE * SIDE);
        CHECK_INT(states_below(&model, SIDE, 1) - none, chern[k] * SIDE);
        CHECK_INT(states_below(&model, SIDE, -1) - none, -chern[k] * SIDE);
        sv_model_free(test_context(), &model);
    }
    for (int sign = 1; sign >= -1; sign -= 2) {
        sv_model model = fixture_haldane(0.2, sign * M_PI / 2, 0.0);
        sv_index none = states_below(&model, SIDE, 0);
        CHECK_INT(states_below(&model, SIDE, 1) - none, sign * SIDE);
        sv_model_free(test_context(), &model);
    }
}
