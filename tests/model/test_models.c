/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "fixtures.h"
#include "selvedge/model.h"

static void choose_nothing(sv_model *model)
{
    sv_model_free(test_context(), model);
}

/* Gaps at the symmetric points of half-BHZ: min|E| = min(|m+2|, |m|, |m−2|) (Qi, Wu, Zhang 2006).
 */
SV_TEST(qi_wu_zhang_bloch_matrix)
{
    sv_model model = fixture_qi_wu_zhang(-0.7);
    const double points[][3] = {{0, 0, 1.3}, {M_PI, 0, -0.7}, {0, M_PI, -0.7}, {M_PI, M_PI, -2.7}};
    for (int k = 0; k < 4; k++) {
        sv_complex h[4];
        sv_model_bloch(&model, points[k], h);
        CHECK_CLOSE(creal(h[0]), points[k][2], 1e-14);
        CHECK_CLOSE(creal(h[3]), -points[k][2], 1e-14);
        CHECK(cabs(h[1]) < 1e-14);
    }
    const double k0[2] = {0.3, -1.1};
    sv_complex h[4];
    sv_model_bloch(&model, k0, h);
    /* sin kx sx + sin ky sy + (m + cos kx + cos ky) sz, column-major */
    CHECK(cabs(h[1] - CMPLX(sin(0.3), sin(-1.1))) < 1e-14);
    CHECK(cabs(h[2] - CMPLX(sin(0.3), -sin(-1.1))) < 1e-14);
    CHECK_CLOSE(creal(h[0]), -0.7 + cos(0.3) + cos(-1.1), 1e-14);
    choose_nothing(&model);
}

/* Haldane 1988: valley gaps 2|M ∓ 3√3 t2 sin φ|. */
SV_TEST(haldane_valley_gaps)
{
    double t2 = 0.1, mass = 0.5;
    sv_model model = fixture_haldane(t2, M_PI / 2, mass);
    double found[2];
    for (int valley = 0; valley < 2; valley++) {
        /* K and K' in reduced coordinates: k·a1 = ±2π/3, k·a2 = ∓2π/3 */
        double sign = valley ? -1.0 : 1.0;
        sv_complex h[4];
        sv_model_bloch(&model, (const double[2]){sign * 2 * M_PI / 3, -sign * 2 * M_PI / 3}, h);
        CHECK(cabs(h[1]) < 1e-13);
        found[valley] = fabs(creal(h[0]) - creal(h[3]));
    }
    double low = 2.0 * fabs(mass - 3.0 * sqrt(3.0) * t2);
    double high = 2.0 * fabs(mass + 3.0 * sqrt(3.0) * t2);
    CHECK_CLOSE(fmin(found[0], found[1]), low, 1e-12);
    CHECK_CLOSE(fmax(found[0], found[1]), high, 1e-12);
    choose_nothing(&model);
}

SV_TEST(cell_geometry)
{
    sv_model model = fixture_haldane(0.1, 1.0, 0.0);
    CHECK_CLOSE(sv_model_cell_area(&model), sqrt(3.0) / 2.0, 1e-15);
    CHECK_INT(model.n_positions, 2);
    CHECK_INT(sv_model_find_orbital(&model, "B"), 1);
    CHECK_INT(sv_model_find_orbital(&model, "b"), -1);
    double uv[2];
    sv_model_reduce(&model, model.orbitals[1].at, uv);
    CHECK_CLOSE(uv[0], 1.0 / 3.0, 1e-15);
    CHECK_CLOSE(uv[1], 1.0 / 3.0, 1e-15);
    CHECK_CLOSE(sv_model_norm_bound(&model), 3.0 + 6.0 * 0.1, 1e-14);
    choose_nothing(&model);
    sv_model square = fixture_qi_wu_zhang(-1.0);
    CHECK_INT(square.n_positions, 1);
    choose_nothing(&square);
}

SV_TEST(faulty_models_are_refused)
{
    sv_context *c = test_context();
    sv_model m = {0};
    const double x[2] = {1, 0}, y[2] = {0, 1}, z[2] = {2, 0};
    CHECK_STATUS(SV_INVALID_INPUT, sv_model_begin(c, "left", y, x, &m));
    CHECK(strstr(c->error.message, "left-handed") != NULL);
    CHECK_STATUS(SV_INVALID_INPUT, sv_model_begin(c, "flat", x, z, &m));
    CHECK_OK(sv_model_begin(c, "own", x, y, &m));
    CHECK_STATUS(SV_INVALID_INPUT, sv_model_finish(c, &m));
    CHECK_OK(sv_model_add_orbital(c, &m, "a", 0, 0, 0.5));
    CHECK_STATUS(SV_INVALID_INPUT, sv_model_add_orbital(c, &m, "a", 0.5, 0, 0));
    CHECK_STATUS(SV_INVALID_INPUT, sv_model_add_orbital(c, &m, "any", 0.5, 0, 0));
    CHECK_STATUS(SV_INVALID_INPUT, sv_model_add_orbital(c, &m, "", 0.5, 0, 0));
    /* These would be formulas, further columns or commands in the tables that name orbitals. */
    static const char *const refused[] = {"=1+1",
                                          "+a",
                                          "-a",
                                          "@a",
                                          "a,b",
                                          "a\"b",
                                          "a\nb",
                                          "\x1b[m",
                                          "a\x7f",
                                          " a",
                                          "'a",
                                          "a\xC2\x9B"
                                          "31m"};
    for (size_t i = 0; i < sizeof refused / sizeof *refused; i++)
        CHECK_STATUS(SV_INVALID_INPUT, sv_model_add_orbital(c, &m, refused[i], 0.5, 0, 0));
    CHECK_OK(sv_model_add_orbital(c, &m, "b", 0.5, 0, 0));
    CHECK_OK(sv_model_add_hop(c, &m, 0, 1, 1, 0, 1.0));
    CHECK_STATUS(SV_INVALID_INPUT, sv_model_add_hop(c, &m, 0, 1, 1, 0, 1.0));
    CHECK_STATUS(SV_INVALID_INPUT, sv_model_add_hop(c, &m, 1, 0, -1, 0, 1.0));
    CHECK_STATUS(SV_INVALID_INPUT, sv_model_add_hop(c, &m, 0, 0, 0, 0, 1.0));
    CHECK_STATUS(SV_INVALID_INPUT, sv_model_add_hop(c, &m, 0, 2, 0, 0, 1.0));
    CHECK_STATUS(SV_INVALID_INPUT, sv_model_add_hop(c, &m, 0, 1, 5000, 0, 1.0));
    CHECK_STATUS(SV_INVALID_INPUT, sv_model_set_flux(c, &m, 1, 0));
    CHECK_OK(sv_model_finish(c, &m));
    sv_model_free(c, &m);
    int count;
    const sv_kind *kinds = sv_model_kinds(&count);
    CHECK_STATUS(SV_INVALID_INPUT, sv_model_make(c, &kinds[count - 1], NULL, &m));
}
