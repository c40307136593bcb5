/* SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef SELVEDGE_MARKER_INTERNAL_H
#define SELVEDGE_MARKER_INTERNAL_H

#include <stdio.h>

#include "selvedge/marker.h"

/* A blank outcome with engine and levels filled in; says so when the projector is ambiguous. */
sv_outcome sv_outcome_start(const sv_projector *projector);

/* Local Chern marker of some rows from a basis of the occupied or empty space; an empty one gives
 * 0. */
sv_status sv_chern_of_basis(sv_context *context, const sv_sample *sample, const sv_basis *basis,
                            const sv_index *rows, sv_index n_rows, double *ret_marker);
/* First-order effect of an error `defect` of P on one value: P enters three times, and positions
 * relative to the site matter only over the extent of the flake. */
double sv_chern_error(const sv_sample *sample, double defect);

/*
 * Local Chern marker of some rows by two projector applications each: v = P|r⟩, then
 * (4π/A) Im⟨x v|P|y v⟩ with positions relative to the site.
 * ret_error receives an estimate of the numerical error of each row; their sum is an estimate of a
 * bound of the error of the sum.
 */
sv_status sv_chern_columns(sv_context *context, const sv_sample *sample, sv_projector *projector,
                           int threads, const sv_index *rows, sv_index n_rows, double *ret_marker,
                           double *ret_error);

/* Window mean from input->sampled_vectors vectors of random phases (at least 4), three applications
 * of the whole projector each: value, estimator_error, and numerical_error from the first block. */
sv_status sv_chern_vectors(sv_context *context, const sv_marker_input *input, const bool *inside,
                           sv_index cells, sv_outcome *outcome);

/* A stratified random choice of window cells, in runs that one block of columns serves. */
typedef struct window_choice {
    int32_t *unit; /* per cell: number of its chosen run, −1: not chosen */
    sv_index n_units, n_cells;
    double left_out; /* share of the window's runs that are not chosen */
} window_choice;

/* Chooses about `wanted` cells: the window's runs of neighbouring cells are cut into as many strata
 * as runs are wanted, and one run of each is drawn. */
sv_status sv_window_choose(sv_context *context, const sv_flake *flake, const bool *inside,
                           sv_index wanted, uint64_t seed, sv_index realisation,
                           window_choice *ret_choice);
/* About `wanted` cells spread evenly over the outermost ones of a window, those with a neighbour
 * outside it: a flag per cell of the flake, and how many such cells there are and are chosen. */
sv_status sv_window_rim(sv_context *context, const sv_flake *flake, const bool *inside,
                        sv_index wanted, bool **ret_chosen, sv_index *ret_cells,
                        sv_index *ret_chosen_cells);
/* Standard error of the mean over the chosen runs: differences of neighbouring strata. */
double sv_window_error(const window_choice *choice, const double *sums, const sv_index *cells);

/* Rows of the keys of local_chern, and what they ask of each other. */
enum { CHERN_WINDOW, CHERN_BLOCKS, CHERN_BLOCK_CELLS };
bool sv_local_chern_check(const sv_value *values, int *ret_key, char *message, size_t size);

/*
 * The Fermi energy of a sample by inertia of its Hamiltonian (as given, or for a filling),
 * electrons and the levels on either side to the outcome. *ret_good false: a level lies on it, and
 * the outcome has the reason. Leaves the plan with a factor at the energy.
 */
sv_status sv_energy_place(sv_context *context, sv_inertia_plan *plan, const sv_sparse *h,
                          const sv_occupation *occupation, sv_outcome *outcome, double *ret_energy,
                          bool *ret_good);

#endif
