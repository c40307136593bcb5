/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Gaps of pristine models against closed forms. */
#include "fixtures.h"

static double distance(sv_model model, double energy)
{
    double d = -1.0;
    CHECK_OK(sv_model_spectral_distance(test_context(), &model, energy, &d));
    sv_model_free(test_context(), &model);
    return d;
}

/* F. D. M. Haldane, PRL 61, 2015 (1988): valley gaps 2|M ± 3√3 t2 sin φ|; for M = 0, φ = π/2 the
 * gap is 2 min(t1, 3√3 t2), the second number being the M points. */
SV_TEST(haldane_gaps)
{
    CHECK_CLOSE(distance(fixture_haldane(0.1, M_PI / 2, 0.0), 0.0), 0.3 * sqrt(3.0), 1e-4);
    CHECK_CLOSE(distance(fixture_haldane(0.25, M_PI / 2, 0.0), 0.0), 1.0, 1e-9);
    CHECK_CLOSE(distance(fixture_haldane(0.1, M_PI / 2, 0.5), 0.0), 0.3 * sqrt(3.0) - 0.5, 1e-4);
    CHECK_CLOSE(distance(fixture_haldane(0.1, -M_PI / 2, 0.53), 0.0), 0.53 - 0.3 * sqrt(3.0), 1e-4);
    CHECK_CLOSE(distance(fixture_haldane(0.1, M_PI / 2, 0.0), 0.4), 0.3 * sqrt(3.0) - 0.4, 1e-4);
    CHECK_CLOSE(distance(fixture_haldane(0.1, M_PI / 2, 0.0), 1.0), 0.0, 0.0);
    /* Above all bands: |E| ≤ 3 for t2 = 0. */
    CHECK_CLOSE(distance(fixture_haldane(0.0, 0.0, 0.0), 3.75), 0.75, 1e-9);
}

/* X.-L. Qi, Y.-S. Wu, S.-C. Zhang, PRB 74, 085308 (2006): least |E| is at a symmetric point. */
SV_TEST(qi_wu_zhang_gaps)
{
    for (int k = 0; k < 12; k++) {
        double m = -2.6 + 0.47 * k;
        double expected = fmin(fmin(fabs(m + 2.0), fabs(m)), fabs(m - 2.0));
        CHECK_CLOSE(distance(fixture_qi_wu_zhang(m), 0.0), expected, 1e-9);
    }
}

/* Exact band edges (elementary): flux 1/3 has E³ − 6E in [−4, 4]; flux 1/4 has the gap between
 * −√(4 + 2√2) and −√(4 − 2√2); flux 1/2 touches at E = 0. */
SV_TEST(hofstadter_gaps)
{
    double edge[2];
    sv_model third = fixture_hofstadter(1, 3), quarter = fixture_hofstadter(2, 8);
    CHECK_OK(sv_model_filling_gap(test_context(), &third, 1.0 / 3.0, 1e-6, edge));
    CHECK_CLOSE(edge[0], -2.0, 1e-8);
    CHECK_CLOSE(edge[1], 1.0 - sqrt(3.0), 1e-8);
    CHECK_OK(sv_model_filling_gap(test_context(), &quarter, 0.25, 1e-6, edge));
    CHECK_CLOSE(edge[0], -sqrt(4.0 + 2.0 * sqrt(2.0)), 1e-8);
    CHECK_CLOSE(edge[1], -sqrt(4.0 - 2.0 * sqrt(2.0)), 1e-8);
    CHECK_OK(sv_model_filling_gap(test_context(), &third, 0.0, 1e-6, edge));
    CHECK(isinf(edge[0]));
    CHECK_CLOSE(edge[1], -1.0 - sqrt(3.0), 1e-8);
    CHECK_STATUS(SV_UNDEFINED, sv_model_filling_gap(test_context(), &third, 0.4, 1e-6, edge));
    sv_model_free(test_context(), &third);
    sv_model_free(test_context(), &quarter);
    CHECK_CLOSE(distance(fixture_hofstadter(1, 2), 0.0), 0.0, 1e-4);
    CHECK_CLOSE(distance(fixture_hofstadter(-1, 3), -1.366025403784439), 1.5 - 0.5 * sqrt(3.0),
                1e-8);
    sv_model fine = fixture_hofstadter(1, 1001);
    double d;
    CHECK_STATUS(SV_UNDEFINED, sv_model_spectral_distance(test_context(), &fine, 0.0, &d));
    sv_model_free(test_context(), &fine);
}

static void check_torus(sv_model *model, int side, double filling)
{
    sv_flake_spec spec = fixture_cells(model, side, side, true);
    sv_flake flake = fixture_flake(model, &spec);
    sv_sample sample = {0};
    double edge[2];
    CHECK_OK(sv_sample_draw(test_context(), &flake, NULL, 0, 1, 0, &sample));
    double *level = fixture_spectrum(&sample);
    sv_index filled = (sv_index)lround((double)sample.n * filling);
    CHECK_OK(sv_model_filling_gap(test_context(), model, filling, 1e-6, edge));
    CHECK(edge[0] >= level[filled - 1] - 1e-9 && edge[0] < level[filled - 1] + 0.02);
    CHECK(edge[1] <= level[filled] + 1e-9 && edge[1] > level[filled] - 0.02);
    sv_give(test_context(), level);
    sv_sample_free(test_context(), &sample);
    sv_flake_free(test_context(), &flake);
    sv_model_free(test_context(), model);
}

/* The edges must be those of a large torus, also with orbitals off the corner of the cell. */
SV_TEST(gaps_agree_with_a_torus)
{
    const int flux[][3] = {{2, 5, 1}, {2, 5, 2}, {3, 7, 2}, {-2, 5, 1}};
    for (int k = 0; k < 4; k++) {
        sv_model model = fixture_hofstadter(flux[k][0], flux[k][1]);
        check_torus(&model, 4 * flux[k][1], (double)flux[k][2] / flux[k][1]);
    }
    for (int p = 1; p <= 2; p++) {
        sv_model model = fixture_haldane(0.2, 0.9, 0.3);
        CHECK_OK(sv_model_set_flux(test_context(), &model, p, 3));
        check_torus(&model, 18, p / 6.0);
    }
}

/* A band edge away from the symmetric points, against a fine scan. */
SV_TEST(edges_between_the_grid_points)
{
    sv_model model = fixture_haldane(0.3, 0.7, 0.1);
    enum { SCAN = 700 };
    double low = INFINITY, high = -INFINITY, edge[2];
    for (int i = 0; i < SCAN; i++)
        for (int j = 0; j < SCAN; j++) {
            sv_complex h[4];
            sv_model_bloch(&model, (const double[]){2 * M_PI * i / SCAN, 2 * M_PI * j / SCAN}, h);
            double mean = 0.5 * creal(h[0] + h[3]);
            double half = hypot(0.5 * creal(h[0] - h[3]), cabs(h[1]));
            high = fmax(high, mean - half);
            low = fmin(low, mean + half);
        }
    CHECK_OK(sv_model_filling_gap(test_context(), &model, 0.5, 1e-6, edge));
    CHECK(edge[0] >= high - 1e-12 && edge[1] <= low + 1e-12);
    CHECK_CLOSE(edge[0], high, 3e-4);
    CHECK_CLOSE(edge[1], low, 3e-4);
    sv_model_free(test_context(), &model);
}
