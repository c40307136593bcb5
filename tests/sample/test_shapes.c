/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Annulus, triangle, ribbon, polygon, named edges and orientation. */
#include "fixtures.h"

#include <stdlib.h>

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

/* Every cell once, found where it is, and the count within the estimate. */
static void check_cells(const sv_flake *flake)
{
    sv_index estimate = 0, sites = 0;
    CHECK_OK(sv_flake_count(test_context(), flake->model, &flake->spec, &estimate));
    CHECK(flake->n_sites <= estimate);
    for (sv_index c = 0; c < flake->n_cells; c++) {
        const sv_cell *cell = &flake->cells[c];
        sv_index width = (sv_index)flake->high[1] - flake->low[1] + 1;
        CHECK_INT(flake->cell_at[(cell->i - flake->low[0]) * width + cell->j - flake->low[1]], c);
        CHECK_INT(cell->first_site, sites);
        sites += cell->n_sites;
        if (c > 0)
            CHECK(cell[-1].i < cell->i || (cell[-1].i == cell->i && cell[-1].j < cell->j));
    }
    CHECK_INT(sites, flake->n_sites);
}

static sv_index window_cells(const sv_flake *flake, double share, bool **ret_inside)
{
    sv_index cells = 0;
    CHECK_OK(sv_flake_window(test_context(), flake, share, ret_inside, &cells));
    return cells;
}

/* Zigzag triangle: n² + 4n + 1 sites, n hexagon faces a side give 3n(n + 3)/2 bonds (Euler: V − E +
 * F = 1 with F = n(n + 1)/2). Armchair flakes are whole rings: 3n(n + 1) and 18n² − 18n + 6 sites:
 * C6, C18, C36 and C6, C42, C114, C222 (benzenoid series, common practice). */
SV_TEST(honeycomb_counts)
{
    sv_model model = fixture_haldane(0.1, 1.0, 0.0);
    for (int n = 1; n <= 6; n++) {
        sv_flake_spec spec = {.shape = SV_SHAPE_TRIANGLE, .has_cells = true, .cells = {n}};
        sv_flake flake = fixture_flake(&model, &spec);
        CHECK_INT(flake.n_sites, n * n + 4 * n + 1);
        CHECK_INT(bonds(&flake, 1.0 / sqrt(3.0)), 3 * n * (n + 3) / 2);
        sv_flake_free(test_context(), &flake);
        spec.edge = SV_EDGE_ARMCHAIR;
        flake = fixture_flake(&model, &spec);
        check_cells(&flake);
        CHECK_INT(flake.n_sites, 3 * n * (n + 1));
        /* 6 bonds a ring, 2 between rings that touch: 3n(n − 1)/2 pairs, one bond each. */
        CHECK_INT(bonds(&flake, 1.0 / sqrt(3.0)), 3 * n * (n + 1) + 3 * n * (n - 1) / 2);
        sv_flake_free(test_context(), &flake);
        spec.shape = SV_SHAPE_HEXAGON;
        flake = fixture_flake(&model, &spec);
        check_cells(&flake);
        CHECK_INT(flake.n_sites, 18 * n * n - 18 * n + 6);
        CHECK_INT(bonds(&flake, 1.0 / sqrt(3.0)), 18 * n * n - 18 * n + 6 + 9 * n * n - 15 * n + 6);
        sv_flake_free(test_context(), &flake);
    }
    sv_model_free(test_context(), &model);
}

/* Without second-neighbour hops a zigzag triangle has exactly n − 1 zero modes, one sublattice's
 * surplus (Lieb, Phys. Rev. Lett. 62, 1201 (1989); number recalled from memory). */
SV_TEST(zigzag_triangles_have_zero_modes)
{
    sv_model model = fixture_haldane(0.0, 0.0, 0.0);
    for (int n = 2; n <= 7; n++) {
        sv_flake_spec spec = {.shape = SV_SHAPE_TRIANGLE, .has_cells = true, .cells = {n}};
        sv_flake flake = fixture_flake(&model, &spec);
        sv_sample sample = {0};
        CHECK_OK(sv_sample_draw(test_context(), &flake, NULL, 0, 1, 0, &sample));
        double *levels = fixture_spectrum(&sample);
        int zero = 0, near = 0, surplus = 0;
        for (sv_index k = 0; k < sample.n; k++) {
            zero += fabs(levels[k]) < 1e-10;
            near += fabs(levels[k]) < 1e-3;
            surplus += flake.sites[k].orbital == 0 ? 1 : -1;
        }
        CHECK_INT(zero, n - 1);
        CHECK_INT(near, n - 1);
        CHECK_INT(abs(surplus), n - 1);
        sv_give(test_context(), levels);
        sv_sample_free(test_context(), &sample);
        sv_flake_free(test_context(), &flake);
    }
    sv_model_free(test_context(), &model);
}

/* Lattice points with 16 ≤ x² + y² ≤ 100: 317 − 45 (OEIS A000328: points within 10; 45 are those
 * within √15). */
SV_TEST(annulus_cells_and_window)
{
    sv_model model = fixture_qi_wu_zhang(-1.0);
    sv_flake_spec spec = {.shape = SV_SHAPE_ANNULUS, .inner = 4.0, .outer = 10.0};
    sv_flake flake = fixture_flake(&model, &spec);
    bool *inside = NULL;
    CHECK_INT(flake.n_cells, 317 - 45);
    check_cells(&flake);
    CHECK_CLOSE(flake.centre[0], 0.0, 0.0);
    window_cells(&flake, 0.5, &inside);
    for (sv_index c = 0; c < flake.n_cells; c++) {
        double r = hypot(flake.cells[c].i, flake.cells[c].j);
        CHECK_INT(inside[c], r >= 5.5 && r <= 8.5);
    }
    sv_give(test_context(), inside);
    sv_closure closure = sv_flake_can_close(&model, &spec);
    CHECK(!closure.possible && strcmp(closure.reason, "an annulus has no torus") == 0);
    sv_flake_free(test_context(), &flake);
    spec.inner = 10.0;
    CHECK_STATUS(SV_INVALID_INPUT, sv_flake_make(test_context(), &model, &spec, &flake));
    sv_model_free(test_context(), &model);
}

/* Elements off the diagonal that are not zero. */
static sv_index count_ends(const sv_sparse *h)
{
    sv_index n = 0;
    for (sv_index r = 0; r < h->n; r++)
        for (sv_index k = h->row_start[r]; k < h->row_start[r + 1]; k++)
            n += h->column[k] != r && cabs(h->value[k]) > 0.0;
    return n;
}

static void check_ribbon(const sv_model *model, sv_edge edge, int length, int width)
{
    sv_flake_spec spec = {.shape = SV_SHAPE_RIBBON,
                          .has_cells = true,
                          .cells = {length, width},
                          .edge = edge,
                          .periodic = {true, false}};
    sv_flake flake = fixture_flake(model, &spec);
    sv_sample sample = {0};
    CHECK_INT(flake.n_sites, 2 * length * width);
    check_cells(&flake);
    CHECK_OK(sv_sample_draw(test_context(), &flake, NULL, 0, 1, 0, &sample));
    CHECK_OK(sv_sparse_check(test_context(), &sample.hamiltonian));
    /* Three bonds end at a site, one less at both sites of an outer armchair row and at one site
     * of an outer zigzag row, per period. */
    sv_index ends = length * (edge == SV_EDGE_ARMCHAIR ? 6 * width - 4 : 6 * width - 2);
    CHECK_INT(count_ends(&sample.hamiltonian), ends);
    sv_sample_free(test_context(), &sample);
    sv_flake_free(test_context(), &flake);
    CHECK(sv_flake_can_close(model, &spec).possible);
    spec.periodic[1] = true;
    flake = fixture_flake(model, &spec);
    CHECK_OK(sv_sample_draw(test_context(), &flake, NULL, 0, 1, 0, &sample));
    CHECK_INT(count_ends(&sample.hamiltonian), 6 * length * width);
    sv_sample_free(test_context(), &sample);
    sv_flake_free(test_context(), &flake);
}

SV_TEST(ribbons)
{
    sv_model model = fixture_haldane(0.0, 0.0, 0.0);
    for (int width = 3; width <= 8; width++) {
        check_ribbon(&model, SV_EDGE_USUAL, 5, width);
        check_ribbon(&model, SV_EDGE_ARMCHAIR, 4, width);
    }
    sv_model_free(test_context(), &model);
}

/* Gap of armchair ribbons without second neighbours: width 3m + 2 closes it, at k = 0: E = 1 + 2
 * cos(pπ/(width + 1)) (K. Wakabayashi et al., Sci. Technol. Adv. Mater. 11, 054504 (2010), value
 * recalled from memory); so do zigzag edges, which hold a flat band. */
SV_TEST(ribbon_gaps)
{
    sv_model model = fixture_haldane(0.0, 0.0, 0.0);
    for (int width = 3; width <= 11; width++) {
        sv_flake_spec spec = {.shape = SV_SHAPE_RIBBON,
                              .has_cells = true,
                              .cells = {4, width},
                              .edge = SV_EDGE_ARMCHAIR,
                              .periodic = {true, false}};
        sv_flake flake = fixture_flake(&model, &spec);
        sv_sample sample = {0};
        CHECK_OK(sv_sample_draw(test_context(), &flake, NULL, 0, 1, 0, &sample));
        double *levels = fixture_spectrum(&sample), least = 9.0, wanted = 9.0;
        for (sv_index k = 0; k < sample.n; k++)
            least = fmin(least, fabs(levels[k]));
        for (int p = 1; p <= width; p++)
            wanted = fmin(wanted, fabs(1.0 + 2.0 * cos(p * M_PI / (width + 1))));
        CHECK_CLOSE(least, wanted, 1e-10);
        CHECK_INT(wanted < 1e-12, width % 3 == 2);
        sv_give(test_context(), levels);
        sv_sample_free(test_context(), &sample);
        sv_flake_free(test_context(), &flake);
    }
    sv_model_free(test_context(), &model);
}

/* A closed armchair ribbon is a torus like any other: Bott index +1, odd widths too. */
SV_TEST(armchair_ribbons_close_to_a_torus)
{
    sv_model model = fixture_haldane(0.2, M_PI / 2, 0.0);
    for (int width = 12; width <= 13; width++) {
        sv_flake_spec spec = {.shape = SV_SHAPE_RIBBON,
                              .has_cells = true,
                              .cells = {7, width},
                              .edge = SV_EDGE_ARMCHAIR,
                              .periodic = {true, true}};
        sv_outcome o = fixture_marker("bott", &model, &spec, NULL, 0, 1, &fixture_below_zero, 0);
        CHECK_INT(o.verdict, SV_RESOLVED);
        CHECK_INT(o.index, 1);
    }
    sv_model_free(test_context(), &model);
}

/* An L-shaped film with a hole, against the same rule by hand. */
SV_TEST(polygon_with_a_hole)
{
    const double corners[] = {0, 0, 20, 0, 20, 12, 12, 12, 12, 18, 0, 18, 4, 4, 8, 4, 8, 8, 4, 8};
    const int32_t start[] = {0, 6, 10};
    sv_polygon polygon = {corners, start, 2};
    sv_polygon_fault fault;
    double centroid[2];
    CHECK_OK(sv_polygon_check(test_context(), &polygon, &fault));
    CHECK_CLOSE(sv_polygon_area(&polygon, centroid), 20 * 12 + 12 * 6 - 16, 1e-12);
    CHECK_CLOSE(centroid[0], (240.0 * 10 + 72.0 * 6 - 16.0 * 6) / 296.0, 1e-12);
    CHECK_CLOSE(centroid[1], (240.0 * 6 + 72.0 * 15 - 16.0 * 6) / 296.0, 1e-12);
    CHECK(sv_polygon_holds(&polygon, (const double[2]){4.0, 5.0}));
    CHECK(!sv_polygon_holds(&polygon, (const double[2]){6.0, 6.0}));
    CHECK(!sv_polygon_holds(&polygon, (const double[2]){13.0, 13.0}));
    sv_model models[] = {fixture_qi_wu_zhang(-1.0), fixture_haldane(0.2, 1.5, 0.0)};
    for (int m = 0; m < 2; m++) {
        sv_flake_spec spec = {.shape = SV_SHAPE_POLYGON, .polygon = polygon};
        sv_flake flake = fixture_flake(&models[m], &spec);
        bool *inside = NULL;
        sv_index wanted = 0;
        check_cells(&flake);
        for (int i = -60; i < 60; i++)
            for (int j = -60; j < 60; j++) {
                double x = i * models[m].vectors[0][0] + j * models[m].vectors[1][0];
                double y = i * models[m].vectors[0][1] + j * models[m].vectors[1][1];
                x += m == 1 ? 0.25 : 0.0;
                y += m == 1 ? 0.25 / sqrt(3.0) : 0.0;
                bool in = x >= 0 && y >= 0 && y <= 18 && x <= 20 && (x <= 12 || y <= 12);
                wanted += in && !(x > 4 && x < 8 && y > 4 && y < 8);
            }
        CHECK_INT(flake.n_cells, wanted);
        sv_index cells = window_cells(&flake, 0.5, &inside);
        CHECK(cells > 20 && cells < flake.n_cells / 2);
        sv_give(test_context(), inside);
        CHECK_INT(window_cells(&flake, 1.0, &inside), flake.n_cells);
        sv_give(test_context(), inside);
        sv_flake_free(test_context(), &flake);
        sv_model_free(test_context(), &models[m]);
    }
}

/* The scaled outline of a polygon without holes: a right triangle about its centroid (4, 3). */
SV_TEST(polygon_window)
{
    const double corners[] = {0, 0, 12, 0, 0, 9};
    const int32_t start[] = {0, 3};
    sv_model model = fixture_qi_wu_zhang(-1.0);
    sv_flake_spec spec = {.shape = SV_SHAPE_POLYGON, .polygon = {corners, start, 1}};
    sv_flake flake = fixture_flake(&model, &spec);
    bool *inside = NULL;
    window_cells(&flake, 0.5, &inside);
    for (sv_index c = 0; c < flake.n_cells; c++) {
        double x = flake.cells[c].i, y = flake.cells[c].j;
        CHECK_INT(inside[c], x >= 2 && y >= 1.5 && x / 12 + y / 9 <= 2.0 / 3 + 1.0 / 6 + 1e-9);
    }
    sv_give(test_context(), inside);
    sv_flake_free(test_context(), &flake);
    sv_model_free(test_context(), &model);
}

static const char *fault_of(const double *corners, const int32_t *start, int loops, int *ret_loop)
{
    static sv_polygon_fault fault;
    sv_polygon polygon = {corners, start, loops};
    fault.message[0] = '\0';
    CHECK_STATUS(SV_INVALID_INPUT, sv_polygon_check(test_context(), &polygon, &fault));
    *ret_loop = fault.loop;
    return fault.message;
}

SV_TEST(polygons_that_bound_no_area_are_refused)
{
    int loop = -1;
    const int32_t four[] = {0, 4}, two[] = {0, 2}, pair[] = {0, 4, 8}, three[] = {0, 4, 8, 12};
    CHECK(strstr(fault_of((const double[]){0, 0, 4, 4, 4, 0, 0, 4}, four, 1, &loop), "itself"));
    CHECK(strstr(fault_of((const double[]){0, 0, 4, 4}, two, 1, &loop), "2 corners"));
    CHECK(strstr(fault_of((const double[]){0, 0, 4, 0, 4, 0, 4, 4}, four, 1, &loop), "twice"));
    CHECK(strstr(fault_of((const double[]){0, 0, 4, 0, 2, 0, 2, 4}, four, 1, &loop), "folds"));
    CHECK(strstr(fault_of((const double[]){0, 0, 9, 0, 9, 9, 0, 9, 7, 7, 11, 7, 11, 8, 7, 8}, pair,
                          2, &loop),
                 "hole 1 meets the outline"));
    CHECK_INT(loop, 1);
    CHECK(strstr(fault_of((const double[]){0, 0, 9, 0, 9, 9, 0, 9, 17, 7, 19, 7, 19, 8, 17, 8},
                          pair, 2, &loop),
                 "hole 1 lies outside"));
    CHECK(strstr(fault_of((const double[]){0, 0, 9, 0, 9, 9, 0, 9, 1, 1, 8, 1,
                                           8, 8, 1, 8, 3, 3, 4, 3, 4, 4, 3, 4},
                          three, 3, &loop),
                 "hole 2 lies inside hole 1"));
}

/* Turning the lattice under a disc changes neither its sites nor its bulk marker; under a rectangle
 * it changes the cut, and the bulk marker stays. */
SV_TEST(orientation_leaves_the_bulk_alone)
{
    double clean = 0.0;
    for (int k = 0; k < 3; k++) {
        sv_model model = fixture_haldane(0.2, M_PI / 2, 0.0);
        sv_model_turn(&model, k * 15.0 * M_PI / 180.0);
        CHECK_CLOSE(sv_model_cell_area(&model), sqrt(0.75), 1e-14);
        sv_flake_spec spec = {.shape = SV_SHAPE_RECTANGLE, .has_size = true, .size = {17.0, 16.0}};
        sv_outcome o =
            fixture_marker("local_chern", &model, &spec, NULL, 0, 1, &fixture_below_zero, 0.3);
        CHECK_CLOSE(o.value, 1.0, 1e-3);
        sv_flake_spec disc = {.shape = SV_SHAPE_DISC, .has_radius = true, .radius = 7.0};
        o = fixture_marker("local_chern", &model, &disc, NULL, 0, 1, &fixture_below_zero, 0.5);
        if (k == 0)
            clean = o.value;
        CHECK_CLOSE(o.value, clean, 1e-10);
        sv_model_free(test_context(), &model);
    }
    sv_model model = fixture_haldane(0.2, M_PI / 2, 0.0);
    sv_model_turn(&model, M_PI / 2);
    CHECK_CLOSE(model.vectors[0][0], 0.0, 1e-15);
    CHECK_CLOSE(model.vectors[0][1], 1.0, 1e-15);
    sv_model_free(test_context(), &model);
}

/* The clean bulk marker of every shape on an oblique lattice. */
SV_TEST(markers_of_every_shape)
{
    const double corners[] = {0, 0, 18, 1, 15, 16, 2, 13};
    const int32_t start[] = {0, 4};
    const sv_flake_spec shapes[] = {
        {.shape = SV_SHAPE_ANNULUS, .inner = 3.0, .outer = 14.0},
        {.shape = SV_SHAPE_TRIANGLE, .has_side = true, .side = 22.0},
        {.shape = SV_SHAPE_TRIANGLE, .has_cells = true, .cells = {8}, .edge = SV_EDGE_ARMCHAIR},
        {.shape = SV_SHAPE_HEXAGON, .has_cells = true, .cells = {5}, .edge = SV_EDGE_ARMCHAIR},
        {.shape = SV_SHAPE_RIBBON, .has_cells = true, .cells = {14, 13}},
        {.shape = SV_SHAPE_POLYGON, .polygon = {corners, start, 1}},
    };
    for (size_t k = 0; k < sizeof shapes / sizeof shapes[0]; k++) {
        sv_model model = fixture_haldane(0.2, M_PI / 2, 0.0);
        sv_outcome o = fixture_marker("local_chern", &model, &shapes[k], NULL, 0, 1,
                                      &fixture_below_zero, 0.25);
        CHECK_INT(o.verdict, SV_RESOLVED);
        CHECK_CLOSE(o.value, 1.0, 5e-3);
        sv_model_free(test_context(), &model);
    }
}

SV_TEST(edges_need_a_honeycomb)
{
    sv_model model = fixture_qi_wu_zhang(-1.0);
    sv_context *c = test_context();
    sv_flake flake = {0};
    sv_flake_spec ribbon = {.shape = SV_SHAPE_RIBBON,
                            .has_cells = true,
                            .cells = {4, 4},
                            .edge = SV_EDGE_ZIGZAG,
                            .periodic = {true, false}};
    CHECK_STATUS(SV_INVALID_INPUT, sv_flake_make(c, &model, &ribbon, &flake));
    CHECK(strstr(c->error.message, "no honeycomb") != NULL);
    sv_flake_spec triangle = {
        .shape = SV_SHAPE_TRIANGLE, .has_side = true, .side = 9.0, .edge = SV_EDGE_ARMCHAIR};
    CHECK_STATUS(SV_INVALID_INPUT, sv_flake_make(c, &model, &triangle, &flake));
    triangle = (sv_flake_spec){.shape = SV_SHAPE_TRIANGLE, .has_cells = true, .cells = {3}};
    CHECK_STATUS(SV_INVALID_INPUT, sv_flake_make(c, &model, &triangle, &flake));
    sv_model_free(c, &model);
}
