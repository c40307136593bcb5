/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Pieces of samples whose answer is known by counting, and the rule that keeps the largest. */
#include "fixtures.h"

#include <stdlib.h>

/* Samples of a square lattice with vacancies in the cells given. */
static sv_sample with_holes(const sv_flake *flake, const int32_t (*cells)[2], int n)
{
    sv_context *context = test_context();
    sv_sample sample = {0};
    sv_disorder disorder = {.name = "holes",
                            .type = SV_DISORDER_VACANCIES,
                            .on = -1,
                            .has_marks = true,
                            .n_marks = n,
                            .tolerance = 0.5};
    CHECK_OK(sv_take(context, n, sizeof *disorder.marks, &disorder.marks));
    for (int k = 0; k < n; k++)
        disorder.marks[k] =
            (sv_mark){.by_cell = true, .cell = {cells[k][0], cells[k][1]}, .orbital = -1};
    CHECK_OK(sv_sample_draw(context, flake, &disorder, 1, 1, 0, &sample));
    sv_disorder_free(context, &disorder);
    return sample;
}

/* 5×3 cells, column 2 gone: two pieces of 2×3 cells. With one more hole a cell hangs by one hop. */
SV_TEST(a_cut_makes_two_pieces_and_a_hole_a_dangling_cell)
{
    sv_model model = fixture_qi_wu_zhang(-1);
    sv_flake_spec spec = fixture_cells(&model, 5, 3, false);
    sv_flake flake = fixture_flake(&model, &spec);
    const int32_t cut[][2] = {{2, 0}, {2, 1}, {2, 2}, {0, 1}};
    sv_sample two = with_holes(&flake, cut, 3);
    CHECK_INT(two.inventory.pieces, 2);
    CHECK_INT(two.inventory.largest_piece, 2 * 2 * 3);
    CHECK_INT(two.inventory.dangling, 0);
    sv_sample hanging = with_holes(&flake, cut, 4); /* (0, 0) and (0, 2) have one neighbour each */
    int32_t *piece = NULL;
    CHECK_OK(sv_take(test_context(), hanging.n, sizeof *piece, &piece));
    CHECK_OK(sv_sample_pieces(test_context(), &hanging, piece));
    CHECK_INT(hanging.inventory.dangling, 2);
    CHECK_INT(hanging.inventory.isolated, 0);
    CHECK_INT(hanging.inventory.largest_piece, 12);
    for (sv_index r = 0; r < hanging.n; r++) {
        const sv_cell *cell = &flake.cells[flake.sites[hanging.pristine[r]].cell];
        CHECK_INT(piece[r], cell->i > 2);
    }
    sv_give(test_context(), piece);
    sv_sample_free(test_context(), &two);
    sv_sample_free(test_context(), &hanging);
    sv_flake_free(test_context(), &flake);
    sv_model_free(test_context(), &model);
}

/* The cut leaves one piece on the torus, but both copies must keep the same sites. */
SV_TEST(open_and_closed_copies_keep_the_same_sites)
{
    sv_model model = fixture_qi_wu_zhang(-1);
    const int32_t cut[][2] = {{3, 0}, {3, 1}, {3, 2}, {3, 3}};
    sv_sample samples[2];
    sv_flake flakes[2];
    for (int closed = 0; closed < 2; closed++) {
        sv_flake_spec spec = fixture_cells(&model, 5, 4, closed);
        spec.keep_largest = true;
        flakes[closed] = fixture_flake(&model, &spec);
        samples[closed] = with_holes(&flakes[closed], cut, 4);
        CHECK_OK(sv_sparse_check(test_context(), &samples[closed].hamiltonian));
        CHECK_INT(samples[closed].n, 3 * 4 * 2);
        CHECK_INT(samples[closed].inventory.removed_sites, 4 * 2);
        CHECK_INT(samples[closed].inventory.vacant_sites, 4 * 2);
        CHECK_INT(samples[closed].inventory.pieces, 1);
    }
    for (sv_index r = 0; r < samples[0].n; r++)
        CHECK_INT(samples[0].pristine[r], samples[1].pristine[r]);
    for (int closed = 0; closed < 2; closed++) {
        sv_sample_free(test_context(), &samples[closed]);
        sv_flake_free(test_context(), &flakes[closed]);
    }
    sv_model_free(test_context(), &model);
}

/* What is left must be the matrix of the flake that never had the other piece. */
SV_TEST(keeping_the_largest_equals_a_smaller_flake)
{
    sv_model model = fixture_qi_wu_zhang(-1.3);
    sv_flake_spec large = fixture_cells(&model, 6, 3, false);
    sv_flake_spec small = fixture_cells(&model, 4, 3, false);
    sv_flake flakes[2] = {fixture_flake(&model, &large), fixture_flake(&model, &small)};
    const int32_t cut[][2] = {{4, 0}, {4, 1}, {4, 2}};
    sv_sample cut_off = with_holes(&flakes[0], cut, 3), whole = {0};
    CHECK_OK(sv_sample_draw(test_context(), &flakes[1], NULL, 0, 1, 0, &whole));
    CHECK_OK(sv_sample_keep_largest(test_context(), &cut_off));
    const sv_sparse *a = &cut_off.hamiltonian, *b = &whole.hamiltonian;
    CHECK_INT(a->n, b->n);
    CHECK_INT(a->row_start[a->n], b->row_start[b->n]);
    for (sv_index k = 0; k < b->row_start[b->n]; k++) {
        CHECK_INT(a->column[k], b->column[k]);
        CHECK_CLOSE(cabs(a->value[k] - b->value[k]), 0.0, 0.0);
    }
    sv_sample_free(test_context(), &cut_off);
    sv_sample_free(test_context(), &whole);
    sv_flake_free(test_context(), &flakes[0]);
    sv_flake_free(test_context(), &flakes[1]);
    sv_model_free(test_context(), &model);
}

/* Honeycomb triangle of a zigzag flake has n − 1 more sites on one sublattice; one vacancy, one. */
SV_TEST(imbalance_counts_orbitals)
{
    sv_model model = fixture_haldane(0.1, 1.0, 0.0);
    sv_flake_spec spec = fixture_cells(&model, 4, 4, false);
    sv_flake flake = fixture_flake(&model, &spec);
    sv_disorder disorder = {.name = "v",
                            .type = SV_DISORDER_VACANCIES,
                            .on = sv_model_find_orbital(&model, "B"),
                            .has_count = true,
                            .count = 3};
    sv_sample sample = {0};
    CHECK_OK(sv_sample_draw(test_context(), &flake, &disorder, 1, 1, 0, &sample));
    CHECK_INT(sample.inventory.imbalance, 3);
    sv_sample_free(test_context(), &sample);
    sv_flake_free(test_context(), &flake);
    sv_model_free(test_context(), &model);
}
