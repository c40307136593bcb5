/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "fixtures.h"
#include "selvedge/linalg.h"

static void check_against_dense(const sv_sample *s, double shift, double half_width, int most)
{
    sv_near_states near = {0};
    CHECK_OK(sv_near_states_find(test_context(), &s->hamiltonian, shift, half_width, most, &near));
    double *levels = fixture_spectrum(s);
    int inside = 0;
    for (sv_index k = 0; k < s->n; k++)
        inside += fabs(levels[k] - shift) < near.half_width;
    CHECK_INT(near.count, inside);
    CHECK(near.half_width <= half_width && near.count <= most);
    sv_complex *hv = NULL;
    CHECK_OK(sv_take(test_context(), s->n, sizeof *hv, &hv));
    for (int k = 0; k < near.count; k++) {
        const sv_complex *v = near.vectors + k * s->n;
        double residual = 0.0, nearest = INFINITY;
        sv_sparse_apply(&s->hamiltonian, v, hv);
        for (sv_index r = 0; r < s->n; r++)
            residual = fmax(residual, cabs(hv[r] - near.energies[k] * v[r]));
        for (sv_index r = 0; r < s->n; r++)
            nearest = fmin(nearest, fabs(levels[r] - near.energies[k]));
        CHECK(residual < 1e-8 && nearest < 1e-9);
        for (int l = 0; l <= k; l++) {
            sv_complex dot = 0.0;
            for (sv_index r = 0; r < s->n; r++)
                dot += conj(near.vectors[l * s->n + r]) * v[r];
            CHECK(cabs(dot - (k == l)) < 1e-9);
        }
    }
    sv_give(test_context(), hv);
    sv_give(test_context(), levels);
    sv_near_states_free(test_context(), &near);
    sv_near_states_free(test_context(), &near);
}

SV_TEST(all_states_in_an_interval)
{
    sv_model model = fixture_haldane(0.2, M_PI / 2, 0.0);
    sv_flake_spec spec = fixture_cells(&model, 10, 10, false);
    sv_flake flake = fixture_flake(&model, &spec);
    for (int k = 0; k < 6; k++) {
        sv_disorder d = {.name = "pot", .type = SV_DISORDER_ONSITE, .on = -1, .width = 1.2 * k};
        sv_sample s = {0};
        CHECK_OK(sv_sample_draw(test_context(), &flake, &d, 1, 2, k, &s));
        check_against_dense(&s, 0.01, 0.5, 200);
        check_against_dense(&s, 0.4, 0.3, 12); /* narrowed to few */
        check_against_dense(&s, 9.0, 0.5, 12); /* none */
        sv_sample_free(test_context(), &s);
    }
    sv_flake_free(test_context(), &flake);
    sv_model_free(test_context(), &model);
}

/* A clean torus has degenerate levels; one start vector sees one of each. */
SV_TEST(degenerate_levels_are_all_found)
{
    sv_model model = fixture_hofstadter(0, 1);
    sv_flake_spec spec = fixture_cells(&model, 6, 6, true);
    sv_flake flake = fixture_flake(&model, &spec);
    sv_sample s = {0};
    CHECK_OK(sv_sample_draw(test_context(), &flake, NULL, 0, 1, 0, &s));
    check_against_dense(&s, 0.05, 0.6, 36); /* ten states at E = 0 */
    check_against_dense(&s, -1.9, 1.3, 36);
    sv_sample_free(test_context(), &s);
    sv_flake_free(test_context(), &flake);
    sv_model_free(test_context(), &model);
}
