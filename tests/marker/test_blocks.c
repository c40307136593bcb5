/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Coarse maps of the local Chern marker against the marker of every site. */
#include "fixtures.h"

#include <stdlib.h>

enum { WINDOW, BLOCKS, BLOCK_CELLS, N_KEYS };

typedef struct scene {
    sv_model model;
    sv_flake flake;
    sv_sample sample;
    sv_projector *projector;
    sv_value values[N_KEYS];
    double *sites; /* marker of every site */
} scene;

static void make_scene(scene *s, sv_model model, sv_flake_spec spec, double width, double vacant)
{
    sv_disorder disorder[2] = {
        {.name = "vac",
         .type = SV_DISORDER_VACANCIES,
         .on = -1,
         .has_share = true,
         .share = vacant},
        {.name = "pot", .type = SV_DISORDER_ONSITE, .on = -1, .width = width}};
    sv_projector_options options = sv_projector_options_default();
    options.engine = SV_ENGINE_DENSE;
    *s = (scene){.model = model};
    s->flake = fixture_flake(&s->model, &spec);
    CHECK_OK(sv_sample_draw(test_context(), &s->flake, disorder, 2, 3, 0, &s->sample));
    CHECK_OK(sv_projector_make(test_context(), &s->sample, &fixture_below_zero, &options,
                               &s->projector));
    s->values[WINDOW] = (sv_value){.present = true, .count = 1, .real = {0.5}};
    CHECK_OK(sv_take(test_context(), s->sample.n, sizeof *s->sites, &s->sites));
    sv_outcome o;
    sv_marker_input input = {.sample = &s->sample,
                             .occupation = &fixture_below_zero,
                             .projector = s->projector,
                             .values = s->values,
                             .ret_site_values = s->sites};
    CHECK_OK(sv_local_chern(test_context(), &input, &o));
}

static void end_scene(scene *s)
{
    sv_projector_free(test_context(), s->projector);
    sv_give(test_context(), s->sites);
    sv_sample_free(test_context(), &s->sample);
    sv_flake_free(test_context(), &s->flake);
    sv_model_free(test_context(), &s->model);
}

static sv_coarse coarse(scene *s, int blocks, int cells, uint64_t seed, int threads)
{
    sv_coarse map = {0};
    s->values[BLOCKS] = (sv_value){.present = true, .count = 1, .integer = {blocks}};
    s->values[BLOCK_CELLS] = (sv_value){.present = cells > 0, .count = 1, .integer = {cells}};
    sv_marker_input input = {.sample = &s->sample,
                             .occupation = &fixture_below_zero,
                             .projector = s->projector,
                             .values = s->values,
                             .seed = seed,
                             .threads = threads};
    CHECK_OK(sv_local_chern_blocks(test_context(), &input, &map));
    return map;
}

/* Cells of a lattice that the flake lacks make an edge; three cells on all sides must be there. */
static bool is_inner(const sv_flake *flake, const sv_cell *cell)
{
    int there = 0;
    for (sv_index c = 0; c < flake->n_cells; c++)
        there += abs(flake->cells[c].i - cell->i) <= 3 && abs(flake->cells[c].j - cell->j) <= 3;
    return there == 49;
}

/* Mean over the inner cells of one block, from all sites. */
static double exact_mean(const scene *s, const sv_coarse *map, sv_index block, sv_index *ret_cells)
{
    double sum = 0.0;
    sv_index cells = 0;
    for (sv_index c = 0; c < s->flake.n_cells; c++) {
        double at[2];
        sv_flake_cell_centre(&s->flake, c, at);
        if (sv_coarse_block(map, at) != block || !is_inner(&s->flake, &s->flake.cells[c]))
            continue;
        cells++;
        for (sv_index r = 0; r < s->sample.n; r++)
            sum += s->flake.sites[s->sample.pristine[r]].cell == c ? s->sites[r] : 0.0;
    }
    *ret_cells = cells;
    return sum / (double)cells;
}

SV_TEST(all_cells_give_the_mean_of_the_sites)
{
    for (int kind = 0; kind < 3; kind++) {
        scene s;
        sv_model model =
            kind == 1 ? fixture_haldane(0.2, -M_PI / 2, 0.1) : fixture_qi_wu_zhang(-1.0);
        sv_flake_spec spec = fixture_cells(&model, 16, 13, false);
        if (kind == 2)
            spec = (sv_flake_spec){.shape = SV_SHAPE_DISC, .has_radius = true, .radius = 8.0};
        make_scene(&s, model, spec, 1.0, 0.03);
        sv_coarse map = coarse(&s, 3, 100000, 1, 1);
        sv_index cells = 0, with = 0;
        CHECK(map.count[0] == 3 && map.n_blocks == map.count[0] * map.count[1]);
        for (sv_index k = 0; k < map.n_blocks; k++) {
            const sv_block *b = &map.blocks[k];
            sv_index inner;
            double wanted = exact_mean(&s, &map, k, &inner);
            cells += b->cells;
            CHECK_INT(b->sampled, inner);
            CHECK(inner > 0 || (isnan(b->mean) && isnan(b->error)));
            if (inner == 0)
                continue;
            with++;
            CHECK_CLOSE(b->mean, wanted, 1e-9);
            CHECK_CLOSE(b->error, 0.0, 0.0);
            CHECK_CLOSE(b->left_out, 0.0, 0.0);
            CHECK(b->numerical_error < 1e-6);
            CHECK_INT(sv_coarse_block(&map, b->at), k);
        }
        CHECK_INT(cells, s.flake.n_cells);
        CHECK(with >= 4);
        CHECK_INT(sv_coarse_block(&map, (const double[]){-50.0, 3.0}), -1);
        sv_coarse_free(test_context(), &map);
        sv_coarse_free(test_context(), &map);
        end_scene(&s);
    }
}

/* The stated error is that of the sampling: the deviations over many draws have its size. */
SV_TEST(sampling_errors_have_their_size)
{
    scene s;
    sv_model model = fixture_qi_wu_zhang(-1.0);
    make_scene(&s, model, fixture_cells(&model, 22, 22, false), 4.0, 0.0);
    double squares = 0.0, stated = 0.0;
    int count = 0;
    for (uint64_t seed = 1; seed <= 12; seed++) {
        sv_coarse map = coarse(&s, 2, 24, seed, 1);
        for (sv_index k = 0; k < map.n_blocks; k++) {
            sv_index inner;
            double d = map.blocks[k].mean - exact_mean(&s, &map, k, &inner);
            CHECK(map.blocks[k].sampled < inner && map.blocks[k].sampled >= 6);
            CHECK(map.blocks[k].left_out > 0.4 && map.blocks[k].error > 0.0);
            squares += d * d;
            stated += map.blocks[k].error * map.blocks[k].error;
            count++;
        }
        sv_coarse_free(test_context(), &map);
    }
    printf("# deviation over stated error: %.2f (%d blocks)\n", sqrt(squares / stated), count);
    CHECK(squares / stated > 0.25 && squares / stated < 2.25);
    end_scene(&s);
}

/* The draw is a function of the seed; threads change nothing; the figure's values add up. */
SV_TEST(a_map_repeats_itself)
{
    scene s;
    sv_model model = fixture_haldane(0.2, M_PI / 2, 0.0);
    make_scene(&s, model, fixture_cells(&model, 18, 18, false), 1.0, 0.02);
    sv_coarse a = coarse(&s, 3, 0, 5, 1), b = coarse(&s, 3, 0, 5, 3), c = coarse(&s, 3, 0, 6, 1);
    bool differs = false;
    for (sv_index k = 0; k < a.n_blocks; k++) {
        CHECK(memcmp(&a.blocks[k], &b.blocks[k], sizeof a.blocks[k]) == 0);
        differs = differs || a.blocks[k].mean != c.blocks[k].mean;
    }
    CHECK(differs);
    double *values = NULL, sum = 0.0;
    CHECK_OK(sv_coarse_site_values(test_context(), &s.sample, &a, &values));
    double at[2];
    int32_t cell = s.flake.sites[s.sample.pristine[s.sample.n / 2]].cell;
    for (sv_index r = 0; r < s.sample.n; r++)
        sum += s.flake.sites[s.sample.pristine[r]].cell == cell ? values[r] : 0.0;
    sv_flake_cell_centre(&s.flake, cell, at);
    CHECK_CLOSE(sum, a.blocks[sv_coarse_block(&a, at)].mean, 1e-12);
    sv_give(test_context(), values);
    sv_coarse_free(test_context(), &a);
    sv_coarse_free(test_context(), &b);
    sv_coarse_free(test_context(), &c);
    end_scene(&s);
}

SV_TEST(keys_of_blocks)
{
    const int chern = sv_marker_find("local_chern");
    sv_value values[N_KEYS] = {{.present = true, .count = 1, .real = {0.5}}};
    char message[200] = "";
    int key = -1;
    CHECK(sv_marker_check(chern, values, &key, message, sizeof message));
    CHECK(!sv_local_chern_wants_blocks(values));
    values[BLOCK_CELLS] = (sv_value){.present = true, .count = 1, .integer = {8}};
    CHECK(!sv_marker_check(chern, values, &key, message, sizeof message));
    CHECK_INT(key, BLOCK_CELLS);
    values[BLOCKS] = (sv_value){.present = true, .count = 1, .integer = {4}};
    CHECK(sv_marker_check(chern, values, &key, message, sizeof message));
    CHECK(sv_local_chern_wants_blocks(values));
}
