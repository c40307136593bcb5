/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "fixtures.h"

static sv_index bonds(const sv_flake *flake, double length)
{
    sv_index n = 0;
    for (sv_index a = 0; a < flake->n_sites; a++)
        for (sv_index b = 0; b < a; b++)
            n += fabs(hypot(flake->sites[a].at[0] - flake->sites[b].at[0],
                            flake->sites[a].at[1] - flake->sites[b].at[1]) -
                      length) < 1e-6;
    return n;
}

/* Zigzag hexagons: 6n² sites, 9n² − 3n bonds, 18n² − 12n second neighbours (independent
 * computation; circumcoronene series, common practice in aromatic chemistry). */
SV_TEST(hexagon_counts)
{
    sv_model model = fixture_haldane(0.1, 1.0, 0.0);
    for (int n = 1; n <= 5; n++) {
        sv_flake_spec spec = {.shape = SV_SHAPE_HEXAGON, .has_cells = true, .cells = {n}};
        sv_flake flake = fixture_flake(&model, &spec);
        sv_index estimate = 0;
        CHECK_OK(sv_flake_count(test_context(), &model, &spec, &estimate));
        CHECK_INT(estimate, 6 * n * n);
        CHECK_INT(flake.n_sites, 6 * n * n);
        CHECK_INT(bonds(&flake, 1.0 / sqrt(3.0)), 9 * n * n - 3 * n);
        CHECK_INT(bonds(&flake, 1.0), 18 * n * n - 12 * n);
        sv_flake_free(test_context(), &flake);
    }
    sv_model_free(test_context(), &model);
}

SV_TEST(kinds_have_keys_and_docs)
{
    int count;
    const sv_kind *shapes = sv_shape_kinds(&count);
    CHECK_INT(count, SV_SHAPE_STRUCTURE + 1);
    CHECK_TEXT(shapes[SV_SHAPE_HEXAGON].name, "hexagon");
    for (int k = 0; k < count; k++)
        CHECK(shapes[k].n_keys > 0 && strlen(shapes[k].doc) > 0);
    const sv_kind *disorders = sv_disorder_kinds(&count);
    CHECK_INT(count, SV_DISORDER_STEPS + 1);
    CHECK_TEXT(disorders[SV_DISORDER_VACANCIES].name, "vacancies");
    CHECK(sv_kind_find_key(&disorders[SV_DISORDER_ONSITE], "width") >= 0);
}

/* The centre of a cell is the mean of its orbital positions. */
SV_TEST(cell_centres)
{
    sv_model model = fixture_haldane(0.1, 1.0, 0.0);
    sv_flake_spec spec = fixture_cells(&model, 3, 2, false);
    sv_flake flake = fixture_flake(&model, &spec);
    double at[2];
    sv_flake_cell_centre(&flake, 5, at); /* cell (2, 1): 2 a1 + a2 + (a1 + a2)/6 */
    CHECK_CLOSE(at[0], 2.5 + 0.25, 1e-14);
    CHECK_CLOSE(at[1], sqrt(3.0) / 2.0 * (1.0 + 1.0 / 6.0), 1e-14);
    sv_flake_free(test_context(), &flake);
    sv_model_free(test_context(), &model);
}

SV_TEST(window_rule)
{
    /* The rule's own examples: 30·0.5 → 16, 13·0.4 → 5. */
    const struct {
        int side, cells;
        double share;
    } rows[] = {{30, 16, 0.5}, {13, 5, 0.4}, {12, 6, 0.5},  {10, 6, 0.5}, {15, 7, 0.5},
                {15, 1, 0.01}, {8, 2, 0.01}, {20, 20, 1.0}, {15, 7, 0.4}};
    sv_model model = fixture_qi_wu_zhang(-1.0);
    for (size_t k = 0; k < sizeof rows / sizeof rows[0]; k++) {
        sv_flake_spec spec = fixture_cells(&model, rows[k].side, rows[k].side, false);
        sv_flake flake = fixture_flake(&model, &spec);
        bool *inside = NULL;
        sv_index cells = 0;
        CHECK_OK(sv_flake_window(test_context(), &flake, rows[k].share, &inside, &cells));
        CHECK_INT(cells, rows[k].cells * rows[k].cells);
        double middle = 0.0;
        for (sv_index c = 0; c < flake.n_cells; c++)
            middle += inside[c] ? flake.cells[c].i : 0;
        CHECK_CLOSE(middle / (double)cells, 0.5 * (rows[k].side - 1), 1e-12);
        sv_give(test_context(), inside);
        sv_flake_free(test_context(), &flake);
    }
    sv_model_free(test_context(), &model);
}

/* Cells of a disc approach its area (Gauss circle problem); hexagon by radius likewise. */
SV_TEST(discs_and_hexagons_by_radius)
{
    sv_model model = fixture_qi_wu_zhang(-1.0);
    sv_flake_spec disc = {.shape = SV_SHAPE_DISC, .has_radius = true, .radius = 10.0};
    sv_flake flake = fixture_flake(&model, &disc);
    CHECK_INT(flake.n_cells, 317); /* lattice points with x² + y² ≤ 100, OEIS A000328(10) */
    bool *inside = NULL;
    sv_index cells = 0;
    CHECK_OK(sv_flake_window(test_context(), &flake, 0.5, &inside, &cells));
    CHECK_INT(cells, 81); /* x² + y² ≤ 25, OEIS A000328(5) */
    sv_give(test_context(), inside);
    sv_flake_free(test_context(), &flake);
    sv_flake_spec hexagon = {.shape = SV_SHAPE_HEXAGON, .has_radius = true, .radius = 20.0};
    flake = fixture_flake(&model, &hexagon);
    CHECK_CLOSE((double)flake.n_cells, 1.5 * sqrt(3.0) * 400.0, 40.0);
    sv_flake_free(test_context(), &flake);
    sv_model_free(test_context(), &model);
}

SV_TEST(rectangle_by_size_on_an_oblique_lattice)
{
    sv_model model = fixture_haldane(0.2, M_PI / 2, 0.0);
    sv_flake_spec spec = {.shape = SV_SHAPE_RECTANGLE,
                          .has_size = true,
                          .size = {6.0, 4.0 * sqrt(3.0)},
                          .periodic = {true, true}};
    CHECK(sv_flake_can_close(&model, &spec).possible);
    sv_flake flake = fixture_flake(&model, &spec);
    CHECK_INT(flake.n_cells, 48); /* area 6·4√3 over √3/2 */
    sv_sample sample = {0};
    CHECK_OK(sv_sample_draw(test_context(), &flake, NULL, 0, 1, 0, &sample));
    CHECK_OK(sv_sparse_check(test_context(), &sample.hamiltonian));
    for (sv_index r = 0; r < sample.n; r++) /* on-site, 3 neighbours, 6 second neighbours */
        CHECK_INT(sample.hamiltonian.row_start[r + 1] - sample.hamiltonian.row_start[r], 10);
    sv_sample_free(test_context(), &sample);
    sv_flake_free(test_context(), &flake);
    sv_outcome o = fixture_marker("bott", &model, &spec, NULL, 0, 1, &fixture_below_zero, 0);
    CHECK_INT(o.index, 1);
    spec.size[0] = 6.3;
    sv_closure closure = sv_flake_can_close(&model, &spec);
    CHECK(!closure.possible && strstr(closure.reason, "tile") != NULL);
    sv_model_free(test_context(), &model);
}

SV_TEST(flakes_that_do_not_fit_are_refused)
{
    sv_context *c = test_context();
    sv_model model = fixture_hofstadter(1, 3), honeycomb = fixture_haldane(0.1, 1.0, 0.0);
    sv_flake flake = {0};
    sv_flake_spec torus = fixture_cells(&model, 10, 10, true);
    CHECK_STATUS(SV_INVALID_INPUT, sv_flake_make(c, &model, &torus, &flake));
    CHECK(strstr(c->error.message, "flux 1/3") != NULL);
    CHECK(!sv_flake_can_close(&model, &torus).possible);
    torus.periodic[1] = false;
    CHECK_OK(sv_flake_make(c, &model, &torus, &flake));
    sv_flake_free(c, &flake);
    sv_flake_spec empty = fixture_cells(&model, 0, 4, false);
    CHECK_STATUS(SV_INVALID_INPUT, sv_flake_make(c, &model, &empty, &flake));
    sv_flake_spec oblique = {.shape = SV_SHAPE_RECTANGLE, .has_cells = true, .cells = {4, 4}};
    CHECK_STATUS(SV_INVALID_INPUT, sv_flake_make(c, &honeycomb, &oblique, &flake));
    sv_flake_spec hexagon = {.shape = SV_SHAPE_HEXAGON, .has_cells = true, .cells = {4}};
    CHECK_STATUS(SV_INVALID_INPUT, sv_flake_make(c, &model, &hexagon, &flake));
    hexagon.periodic[0] = true;
    CHECK_STATUS(SV_INVALID_INPUT, sv_flake_make(c, &honeycomb, &hexagon, &flake));
    sv_flake_spec huge = fixture_cells(&model, 1000000, 1000000, false);
    CHECK_STATUS(SV_REFUSED, sv_flake_make(c, &model, &huge, &flake));
    sv_model_free(c, &model);
    sv_model_free(c, &honeycomb);
}

SV_TEST(nearest_site)
{
    sv_model model = fixture_haldane(0.1, 1.0, 0.0);
    sv_flake_spec spec = fixture_cells(&model, 6, 5, false);
    sv_flake flake = fixture_flake(&model, &spec);
    sv_stream stream = sv_stream_make(5, "points", 0);
    for (int k = 0; k < 300; k++) {
        double at[2] = {8.0 * sv_stream_uniform(&stream, k, 0, 0),
                        4.0 * sv_stream_uniform(&stream, k, 1, 0)};
        double found, best = INFINITY;
        sv_index site = sv_flake_nearest(&flake, at, -1, &found);
        for (sv_index s = 0; s < flake.n_sites; s++)
            best = fmin(best, hypot(flake.sites[s].at[0] - at[0], flake.sites[s].at[1] - at[1]));
        if (best < 1.0)
            CHECK(site >= 0 && fabs(found - best) < 1e-8);
    }
    double distance;
    CHECK_INT(sv_flake_nearest(&flake, (const double[2]){1e12, 0}, -1, &distance), -1);
    sv_flake_free(test_context(), &flake);
    sv_model_free(test_context(), &model);
}

SV_TEST(electrons_of_a_filling)
{
    const sv_occupation filling = {.by = SV_BY_FILLING, .filling = 0.3};
    const sv_occupation count = {.by = SV_BY_ELECTRONS, .electrons = 7};
    CHECK_INT(sv_occupation_electrons(&filling, 10), 3);
    CHECK_INT(sv_occupation_electrons(&filling, 15), 5); /* 4.5: ties go up */
    CHECK_INT(sv_occupation_electrons(&count, 10), 7);
}

/* Adatoms are rows after the one of their host, with a name of their own. */
SV_TEST(rows_name_their_orbitals)
{
    sv_model model = fixture_haldane(0.1, 1.0, 0.0);
    sv_flake_spec spec = fixture_cells(&model, 5, 4, false);
    sv_flake flake = fixture_flake(&model, &spec);
    sv_disorder d = {.name = "ad",
                     .type = SV_DISORDER_ADATOMS,
                     .on = -1,
                     .has_share = true,
                     .share = 0.4,
                     .energy = 0.7,
                     .coupling = 0.2};
    sv_sample s = {0};
    CHECK_OK(sv_sample_draw(test_context(), &flake, &d, 1, 3, 0, &s));
    sv_index adatoms = 0;
    for (sv_index r = 0; r < s.n; r++) {
        bool second = r > 0 && s.pristine[r] == s.pristine[r - 1];
        int orbital = flake.sites[s.pristine[r]].orbital;
        CHECK_TEXT(sv_sample_orbital_name(&s, r), second ? "adatom" : orbital == 0 ? "A" : "B");
        adatoms += second;
    }
    CHECK(adatoms > 5 && adatoms == s.inventory.adatoms && s.n == flake.n_sites + adatoms);
    sv_sample_free(test_context(), &s);
    sv_flake_free(test_context(), &flake);
    sv_model_free(test_context(), &model);
}
