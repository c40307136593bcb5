/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Domains, step edges, rough edges: what they claim to draw, by statistics. */
#include "fixtures.h"

static sv_sample drawn(const sv_flake *flake, const sv_disorder *d, sv_index k)
{
    sv_sample s = {0};
    CHECK_OK(sv_sample_draw(test_context(), flake, d, 1, 9, k, &s));
    return s;
}

/* Flipped share, sharp walls, and the mean number of walls met along a line: the boundary of a
 * Poisson–Voronoi tessellation of intensity λ has length 2√λ per area (J. L. Meijering, Philips
 * Res. Rep. 8, 270 (1953); value recalled from memory), so a line meets (2/π)·2√λ edges per length,
 * half of them between domains of different kind. */
SV_TEST(domains_are_a_voronoi_tessellation)
{
    enum { N = 60, RUNS = 60 };
    sv_model model = fixture_qi_wu_zhang(-1.0);
    sv_flake_spec spec = fixture_cells(&model, N, N, false);
    sv_flake flake = fixture_flake(&model, &spec);
    const double size = 12.0, step = 1.0;
    sv_disorder d = {.name = "dom",
                     .type = SV_DISORDER_DOMAINS,
                     .on = -1,
                     .term = sv_model_find_field(&model, "mass"),
                     .share = 0.5,
                     .length = size,
                     .jump = 2.0};
    double changed = 0.0, squares = 0.0, walls = 0.0, walls_square = 0.0;
    for (int k = 0; k < RUNS; k++) {
        sv_sample s = drawn(&flake, &d, k);
        double share = 0.0, met = 0.0;
        for (int i = 0; i < N; i++)
            for (int j = 0; j < N; j++) {
                double v = s.potential[2 * (N * i + j)];
                CHECK(v == 0.0 || v == 2.0);
                CHECK(s.potential[2 * (N * i + j) + 1] == -v);
                share += v / 2.0 / (N * N);
                if (i + 1 < N)
                    met += v != s.potential[2 * (N * (i + 1) + j)];
            }
        met /= (N - 1) * N * step;
        changed += share / RUNS;
        squares += share * share / RUNS;
        walls += met / RUNS;
        walls_square += met * met / RUNS;
        sv_sample_free(test_context(), &s);
    }
    CHECK_CLOSE(changed, 0.5, 5.0 * sqrt((squares - changed * changed) / (RUNS - 1)));
    /* A grid of step 1 misses pairs of walls nearer than that: a few per cent of 1/12. */
    double wanted = 0.5 * (2.0 / M_PI) * 2.0 / size;
    CHECK_CLOSE(walls, wanted,
                5.0 * sqrt((walls_square - walls * walls) / (RUNS - 1)) + 0.04 * wanted);
    sv_flake_free(test_context(), &flake);
    sv_model_free(test_context(), &model);
}

/* A wall of width w: values between, deep inside the whole change, and the same domains. */
SV_TEST(walls_are_hyperbolic_tangents)
{
    sv_model model = fixture_qi_wu_zhang(-1.0);
    sv_flake_spec spec = fixture_cells(&model, 50, 50, false);
    sv_flake flake = fixture_flake(&model, &spec);
    sv_disorder d = {.name = "dom",
                     .type = SV_DISORDER_DOMAINS,
                     .on = -1,
                     .term = 0,
                     .share = 0.5,
                     .length = 15.0,
                     .jump = 1.0};
    sv_sample sharp = drawn(&flake, &d, 1);
    d.wall = 1.5;
    sv_sample smooth = drawn(&flake, &d, 1);
    int between = 0, deep = 0;
    for (sv_index r = 0; r < sharp.n; r += 2) {
        double a = sharp.potential[r], b = smooth.potential[r];
        CHECK(a == 1.0 ? b >= 0.5 && b <= 1.0 : b >= 0.0 && b <= 0.5);
        between += b > 0.05 && b < 0.95;
        deep += fabs(a - b) < 1e-3;
    }
    CHECK(between > 100 && deep > 500);
    sv_sample_free(test_context(), &sharp);
    sv_sample_free(test_context(), &smooth);
    sv_flake_free(test_context(), &flake);
    sv_model_free(test_context(), &model);
}

SV_TEST(steps_jump_on_their_left)
{
    sv_model model = fixture_qi_wu_zhang(-1.0);
    sv_flake_spec spec = fixture_cells(&model, 20, 20, false);
    sv_flake flake = fixture_flake(&model, &spec);
    sv_disorder d = {.name = "step",
                     .type = SV_DISORDER_STEPS,
                     .on = -1,
                     .term = SV_FIELD_POTENTIAL,
                     .from = {0.0, 7.5},
                     .jump = 0.25};
    sv_sample one = drawn(&flake, &d, 0);
    d.spacing = 4.0;
    sv_sample many = drawn(&flake, &d, 0);
    d.amplitude = 1.2;
    d.length = 3.0;
    sv_sample wavy = drawn(&flake, &d, 0);
    int moved = 0;
    for (sv_index r = 0; r < one.n; r++) {
        double y = flake.sites[r].at[1];
        CHECK_CLOSE(one.potential[r], y > 7.5 ? 0.25 : 0.0, 0.0);
        CHECK_CLOSE(many.potential[r], 0.25 * (floor((y - 7.5) / 4.0) + 1.0), 0.0);
        moved += wavy.potential[r] != many.potential[r];
    }
    CHECK(moved > 50 && moved < 500);
    sv_sample_free(test_context(), &one);
    sv_sample_free(test_context(), &many);
    sv_sample_free(test_context(), &wavy);
    sv_flake_free(test_context(), &flake);
    sv_model_free(test_context(), &model);
}

/* Depths along a straight edge: uniform on [0, A] up to whole rows, so mean A/2 and variance A²/12
 * + (rows − depth)² ≈ 1/12, with correlation (6/π) asin(C/2) at a distance. */
SV_TEST(rough_edges_have_their_depths)
{
    enum { N = 240, RUNS = 150, LAG = 4 };
    sv_model model = fixture_qi_wu_zhang(-1.0);
    sv_flake_spec spec = fixture_cells(&model, N, 24, false);
    sv_flake flake = fixture_flake(&model, &spec);
    const double amplitude = 8.0, length = 5.0;
    sv_disorder d = {.name = "rim",
                     .type = SV_DISORDER_ROUGHNESS,
                     .on = -1,
                     .amplitude = amplitude,
                     .length = length};
    double sum = 0, squares = 0, product = 0, run_means = 0, run_squares = 0, products_square = 0;
    const int from = 20, to = N - 20, n = to - from - LAG;
    for (int k = 0; k < RUNS; k++) {
        sv_sample s = drawn(&flake, &d, k);
        double depth[N], mean = 0.0, both = 0.0;
        for (int i = 0; i < N; i++)
            depth[i] = 24.0;
        for (sv_index r = 0; r < s.n; r++) {
            const sv_cell *cell = &flake.cells[flake.sites[s.pristine[r]].cell];
            depth[cell->i] = fmin(depth[cell->i], cell->j);
        }
        for (int i = from; i < from + n; i++) {
            mean += depth[i] / n;
            squares += depth[i] * depth[i] / n / RUNS;
            both += (depth[i] - 4.0) * (depth[i + LAG] - 4.0) / n;
        }
        sum += mean / RUNS;
        run_squares += mean * mean / RUNS;
        product += both / RUNS;
        products_square += both * both / RUNS;
        sv_sample_free(test_context(), &s);
    }
    run_means = sqrt((run_squares - sum * sum) / (RUNS - 1));
    double c = exp(-LAG * LAG / (2.0 * length * length));
    double wanted = amplitude * amplitude / 12.0 * 6.0 / M_PI * asin(c / 2.0);
    CHECK_CLOSE(sum, amplitude / 2.0, 5.0 * run_means);
    CHECK_CLOSE(squares - sum * sum, amplitude * amplitude / 12.0 + 1.0 / 12.0, 0.35);
    CHECK_CLOSE(product, wanted,
                5.0 * sqrt((products_square - product * product) / (RUNS - 1)) + 0.05);
    sv_flake_free(test_context(), &flake);
    sv_model_free(test_context(), &model);
}

/* Site percolation: the largest piece of the nearest-neighbour network holds most sites above the
 * threshold and almost none below. Thresholds p_c: square 0.592746 (Jacobsen 2015), honeycomb
 * 0.697040 (Jacobsen 2014), triangular 1/2, kagome 1 − 2 sin(π/18) (both exact: Sykes, Essam 1964);
 * the digits of the first two are recalled from memory. */
static double largest_share(sv_model *model, double vacant)
{
    sv_flake_spec spec = {
        .shape = SV_SHAPE_PARALLELOGRAM,
        .has_cells = true,
        .cells = {260 / (model->n_orbitals > 1 ? 2 : 1), 260 / (model->n_orbitals > 1 ? 2 : 1)}};
    sv_flake flake = fixture_flake(model, &spec);
    sv_disorder d = {
        .name = "vac", .type = SV_DISORDER_VACANCIES, .on = -1, .has_share = true, .share = vacant};
    sv_sample s = drawn(&flake, &d, 0);
    double share = (double)fixture_largest_piece(&s) / (double)s.n;
    sv_sample_free(test_context(), &s);
    sv_flake_free(test_context(), &flake);
    return share;
}

static void check_threshold(sv_model *model, double threshold)
{
    CHECK(largest_share(model, 1.0 - threshold - 0.05) > 0.75);
    CHECK(largest_share(model, 1.0 - threshold + 0.05) < 0.2);
    sv_model_free(test_context(), model);
}

SV_TEST(networks_fall_apart_at_the_published_thresholds)
{
    sv_context *c = test_context();
    const double right[2] = {1, 0}, oblique[2] = {0.5, sqrt(0.75)};
    sv_model square = fixture_hofstadter(0, 1), honeycomb = fixture_haldane(0.0, 0.0, 0.0);
    sv_model triangular = {0}, kagome = {0};
    CHECK_OK(sv_model_begin(c, "triangular", right, oblique, &triangular));
    CHECK_OK(sv_model_add_orbital(c, &triangular, "a", 0, 0, 0));
    CHECK_OK(sv_model_add_hop(c, &triangular, 0, 0, 1, 0, -1.0));
    CHECK_OK(sv_model_add_hop(c, &triangular, 0, 0, 0, 1, -1.0));
    CHECK_OK(sv_model_add_hop(c, &triangular, 0, 0, 1, -1, -1.0));
    CHECK_OK(sv_model_finish(c, &triangular));
    CHECK_OK(sv_model_begin(c, "kagome", right, oblique, &kagome));
    CHECK_OK(sv_model_add_orbital(c, &kagome, "a", 0, 0, 0));
    CHECK_OK(sv_model_add_orbital(c, &kagome, "b", 0.5, 0, 0));
    CHECK_OK(sv_model_add_orbital(c, &kagome, "c", 0.25, sqrt(0.1875), 0));
    CHECK_OK(sv_model_add_hop(c, &kagome, 0, 1, 0, 0, -1.0));
    CHECK_OK(sv_model_add_hop(c, &kagome, 0, 2, 0, 0, -1.0));
    CHECK_OK(sv_model_add_hop(c, &kagome, 1, 2, 0, 0, -1.0));
    CHECK_OK(sv_model_add_hop(c, &kagome, 1, 0, 1, 0, -1.0));
    CHECK_OK(sv_model_add_hop(c, &kagome, 2, 0, 0, 1, -1.0));
    CHECK_OK(sv_model_add_hop(c, &kagome, 2, 1, -1, 1, -1.0));
    CHECK_OK(sv_model_finish(c, &kagome));
    check_threshold(&square, 0.59274605079210);
    check_threshold(&honeycomb, 0.697040230);
    check_threshold(&triangular, 0.5);
    check_threshold(&kagome, 1.0 - 2.0 * sin(M_PI / 18.0));
}
