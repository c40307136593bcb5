/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Markers of the spin: the occupied space is split by the sign of P sz P, each half has a Chern
 * number of its own. E. Prodan, Phys. Rev. B 80, 125327 (2009). */
#include "bott_internal.h"
#include "marker_internal.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

#include <cblas.h>
#define lapack_complex_double double _Complex
#define lapack_complex_float  float _Complex
#include <lapacke.h>

/* Ψ† sz Ψ, lower triangle, m × m. */
static sv_status spin_in_basis(sv_context *context, const sv_sample *sample, const sv_basis *basis,
                               sv_complex *result)
{
    const sv_complex one = 1.0, zero = 0.0;
    const sv_model *model = sample->flake->model;
    int n = (int)basis->n, m = (int)basis->columns;
    sv_complex *turned = NULL;
    sv_status status = sv_take_raw(context, basis->n * basis->columns, sizeof *turned, &turned);
    if (status != SV_OK)
        return status;
    for (sv_index c = 0; c < m; c++)
        for (sv_index r = 0; r < n; r++) {
            int orbital = sample->flake->sites[sample->pristine[r]].orbital;
            turned[r + c * n] = model->orbitals[orbital].spin * basis->vectors[r + c * n];
        }
    cblas_zgemm(CblasColMajor, CblasConjTrans, CblasNoTrans, m, m, n, &one, basis->vectors, n,
                turned, n, &zero, result, m);
    sv_give(context, turned);
    return SV_OK;
}

/* Eigenvectors in place of the matrix, ascending eigenvalues. */
static sv_status diagonalise(sv_context *context, sv_complex *matrix, int m, double *values)
{
    sv_complex *vectors = NULL;
    lapack_int *support = NULL, found = 0;
    sv_status status = sv_take_raw(context, (sv_index)m * m, sizeof *vectors, &vectors);
    if (status == SV_OK)
        status = sv_take_raw(context, 2 * (sv_index)m, sizeof *support, &support);
    if (status == SV_OK) {
        lapack_int info = LAPACKE_zheevr(LAPACK_COL_MAJOR, 'V', 'A', 'L', m, matrix, m, 0.0, 0.0, 0,
                                         0, 0.0, &found, values, vectors, m, support);
        if (info != 0 || found != m)
            status = SV_FAIL(context, SV_NUMERICAL, "zheevr failed with code %d", (int)info);
    }
    if (status == SV_OK)
        memcpy(matrix, vectors, (size_t)m * (size_t)m * sizeof *matrix);
    sv_give(context, vectors);
    sv_give(context, support);
    return status;
}

sv_status sv_spin_split_make(sv_context *context, const sv_sample *sample, const sv_basis *basis,
                             sv_spin_split *ret_split)
{
    const sv_complex one = 1.0, zero = 0.0;
    sv_index n = basis->n, m = basis->columns;
    sv_complex *matrix = NULL;
    double *values = NULL;
    sv_spin_split split = {.n = n};
    sv_status status;
    if (!sv_model_has_spin(sample->flake->model) || !basis->available || basis->empty_side || m < 1)
        return SV_FAIL(
            context, SV_INVALID_INPUT,
            "a split by spin needs orbitals with spin and a basis of the occupied space");
    if ((status = sv_take_raw(context, m * m, sizeof *matrix, &matrix)) != SV_OK ||
        (status = sv_take_raw(context, m, sizeof *values, &values)) != SV_OK ||
        (status = sv_take_raw(context, n * m, sizeof *split.vectors, &split.vectors)) != SV_OK ||
        (status = spin_in_basis(context, sample, basis, matrix)) != SV_OK ||
        (status = diagonalise(context, matrix, (int)m, values)) != SV_OK)
        goto out;
    cblas_zgemm(CblasColMajor, CblasNoTrans, CblasNoTrans, (int)n, (int)m, (int)m, &one,
                basis->vectors, (int)n, matrix, (int)m, &zero, split.vectors, (int)n);
    while (split.down < m && values[split.down] < 0.0)
        split.down++;
    split.up = m - split.down;
    double above = split.up > 0 ? values[split.down] : -values[m - 1];
    double below = split.down > 0 ? values[split.down - 1] : -values[0];
    split.gap = above - below;
out:
    sv_give(context, matrix);
    sv_give(context, values);
    if (status == SV_OK)
        *ret_split = split;
    else
        sv_give(context, split.vectors);
    return status;
}

void sv_spin_split_free(sv_context *context, sv_spin_split *split)
{
    sv_give(context, split->vectors);
    *split = (sv_spin_split){0};
}

sv_basis sv_spin_split_half(const sv_spin_split *split, int spin)
{
    const sv_complex *first = spin < 0 ? split->vectors : split->vectors + split->n * split->down;
    return (sv_basis){true, false, split->n, spin < 0 ? split->down : split->up, first};
}

/* ---------------------------------------------------------------- verdicts */

/* What both markers begin with; *ret_done when nothing is left to compute. */
static sv_status begin(sv_context *context, const sv_marker_input *input, double threshold,
                       sv_outcome *outcome, sv_spin_split *split, bool *ret_done)
{
    const sv_levels *levels = sv_projector_levels(input->projector);
    sv_basis basis = {0};
    *outcome = sv_outcome_start(input->projector);
    *ret_done = true;
    if (!sv_model_has_spin(input->sample->flake->model)) {
        outcome->verdict = SV_ABSENT;
        snprintf(outcome->reason, sizeof outcome->reason,
                 "the orbitals of the model state no spin (model.orbitals: spin: up or down)");
        return SV_OK;
    }
    if (levels->on_level)
        return SV_OK;
    if (levels->occupied == 0) {
        outcome->verdict = SV_RESOLVED;
        outcome->value = outcome->numerical_error = 0.0;
        snprintf(outcome->reason, sizeof outcome->reason,
                 "no states are occupied: 0 by convention");
        return SV_OK;
    }
    sv_status status = sv_projector_occupied_basis(context, input->projector, &basis);
    if (status == SV_OK)
        status = sv_spin_split_make(context, input->sample, &basis, split);
    if (status != SV_OK)
        return status;
    outcome->margin = split->gap;
    *ret_done = split->gap < threshold;
    if (*ret_done)
        snprintf(
            outcome->reason, sizeof outcome->reason,
            "P sz P has a gap of %.3g about zero, below the threshold %.3g: the spins cannot be "
            "told apart",
            split->gap, threshold);
    return SV_OK;
}

/* ------------------------------------------------------------- spin_chern */

static sv_status window_rows(sv_context *context, const sv_sample *sample, const bool *inside,
                             sv_index **ret_rows, sv_index *ret_count)
{
    sv_index *rows = NULL, count = 0;
    sv_status status = sv_take_raw(context, sample->n, sizeof *rows, &rows);
    if (status != SV_OK)
        return status;
    for (sv_index r = 0; r < sample->n; r++)
        if (inside[sample->flake->sites[sample->pristine[r]].cell])
            rows[count++] = r;
    *ret_rows = rows;
    *ret_count = count;
    return SV_OK;
}

/* (c↑ − c↓)/2 summed over the window. */
static sv_status window_sum(sv_context *context, const sv_sample *sample,
                            const sv_spin_split *split, const bool *inside, double *ret_sum)
{
    sv_index *rows = NULL, n_rows = 0;
    double *marker = NULL, sum = 0.0;
    sv_status status = window_rows(context, sample, inside, &rows, &n_rows);
    if (status == SV_OK)
        status = sv_take(context, n_rows, sizeof *marker, &marker);
    for (int spin = 1; spin >= -1 && status == SV_OK; spin -= 2) {
        sv_basis half = sv_spin_split_half(split, spin);
        status = sv_chern_of_basis(context, sample, &half, rows, n_rows, marker);
        for (sv_index k = 0; k < n_rows && status == SV_OK; k++)
            sum += 0.5 * spin * marker[k];
    }
    sv_give(context, rows);
    sv_give(context, marker);
    *ret_sum = sum;
    return status;
}

sv_status sv_spin_chern(sv_context *context, const sv_marker_input *input, sv_outcome *ret_outcome)
{
    sv_outcome outcome;
    sv_spin_split split = {0};
    bool *inside = NULL, done = false;
    sv_index cells = 0;
    double sum = 0.0, defect = 0.0;
    sv_status status =
        sv_flake_window(context, input->sample->flake, input->values[0].real[0], &inside, &cells);
    if (status == SV_OK)
        status = begin(context, input, input->values[1].real[0], &outcome, &split, &done);
    if (status == SV_OK && !done)
        status = window_sum(context, input->sample, &split, inside, &sum);
    if (status == SV_OK && !done)
        status = sv_projector_defect(context, input->projector, &defect);
    if (status == SV_OK) {
        outcome.window_cells = cells;
        if (!done) {
            outcome.verdict = SV_RESOLVED;
            outcome.value = sum / (double)cells;
            /* An error of P turns the halves by that of P sz P over its gap. */
            outcome.numerical_error =
                sv_chern_error(input->sample, defect) * (1.0 + 4.0 / split.gap);
        }
        *ret_outcome = outcome;
    }
    sv_spin_split_free(context, &split);
    sv_give(context, inside);
    return status;
}

/* -------------------------------------------------------------- spin_bott */

/* Bott index of one half; an empty half has 0. */
static sv_status half_index(sv_context *context, const sv_spin_split *split, int spin,
                            const double (*uv)[2], sv_outcome *outcome, int64_t *ret_index)
{
    sv_bott_method used;
    sv_basis half = sv_spin_split_half(split, spin);
    sv_outcome own = *outcome;
    *ret_index = 0;
    if (half.columns == 0)
        return SV_OK;
    own.verdict = SV_UNRESOLVED;
    sv_status status = sv_bott_of_basis(context, &half, uv, SV_BOTT_AUTO, &own, &used);
    if (status != SV_OK)
        return status;
    outcome->weakest = isnan(outcome->weakest) ? own.weakest : fmin(outcome->weakest, own.weakest);
    *ret_index = own.index;
    if (own.verdict != SV_RESOLVED && outcome->verdict == SV_RESOLVED) {
        outcome->verdict = own.verdict;
        snprintf(outcome->reason, sizeof outcome->reason, "spin %s: %.180s",
                 spin > 0 ? "up" : "down", own.reason);
    }
    return SV_OK;
}

static void conclude(int64_t up, int64_t down, sv_outcome *outcome)
{
    if (outcome->verdict != SV_RESOLVED)
        return;
    if ((up - down) % 2 != 0) {
        outcome->verdict = SV_UNRESOLVED;
        snprintf(outcome->reason, sizeof outcome->reason,
                 "the Bott indices of the spins are %lld and %lld: half their difference is no "
                 "integer, the system has a Chern number",
                 (long long)up, (long long)down);
        return;
    }
    outcome->index = (up - down) / 2;
    outcome->value = (double)outcome->index;
    outcome->numerical_error = 0.0;
}

sv_status sv_spin_bott(sv_context *context, const sv_marker_input *input, sv_outcome *ret_outcome)
{
    sv_outcome outcome;
    sv_spin_split split = {0};
    bool done = false;
    double(*uv)[2] = NULL;
    int64_t up = 0, down = 0;
    if (!(input->sample->flake->periodic[0] && input->sample->flake->periodic[1]))
        return SV_FAIL(context, SV_UNDEFINED, "the spin Bott index needs a torus");
    sv_status status = begin(context, input, input->values[0].real[0], &outcome, &split, &done);
    if (status != SV_OK || done)
        goto out;
    if ((status = sv_take_raw(context, input->sample->n, sizeof *uv, &uv)) != SV_OK)
        goto out;
    sv_torus_coordinates(input->sample, uv);
    outcome.verdict = SV_RESOLVED;
    const double(*where)[2] = (const double(*)[2])uv;
    if ((status = half_index(context, &split, 1, where, &outcome, &up)) != SV_OK ||
        (status = half_index(context, &split, -1, where, &outcome, &down)) != SV_OK)
        goto out;
    conclude(up, down, &outcome);
out:
    if (status == SV_OK)
        *ret_outcome = outcome;
    sv_spin_split_free(context, &split);
    sv_give(context, uv);
    return status;
}
