/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Stratified sampling of a window too large for every cell. */
#include "marker_internal.h"

#include <math.h>
#include <string.h>

/* Cells of a run: as many as fill one block of columns with their orbitals. */
static sv_index run_length(const sv_flake *flake)
{
    sv_index cells = SV_PANEL_COLUMNS / flake->model->n_orbitals;
    return cells < 1 ? 1 : cells;
}

/* Numbers the runs of neighbouring window cells; returns how many there are. */
static sv_index number_runs(const sv_flake *flake, const bool *inside, int32_t *run)
{
    sv_index runs = 0, longest = run_length(flake), length = 0;
    for (sv_index c = 0; c < flake->n_cells; c++) {
        run[c] = -1;
        if (!inside[c]) {
            length = 0;
            continue;
        }
        bool goes_on =
            length > 0 && length < longest &&
            (flake->spec.structure != NULL || (flake->cells[c].i == flake->cells[c - 1].i &&
                                               flake->cells[c].j == flake->cells[c - 1].j + 1));
        if (!goes_on) {
            runs++;
            length = 0;
        }
        run[c] = (int32_t)(runs - 1);
        length++;
    }
    return runs;
}

sv_status sv_window_choose(sv_context *context, const sv_flake *flake, const bool *inside,
                           sv_index wanted, uint64_t seed, sv_index realisation,
                           window_choice *ret_choice)
{
    window_choice choice = {0};
    int32_t *number = NULL;
    sv_stream stream = sv_stream_make(seed, "window sample", realisation);
    sv_status status = sv_take_raw(context, flake->n_cells, sizeof *choice.unit, &choice.unit);
    if (status != SV_OK)
        return status;
    sv_index runs = number_runs(flake, inside, choice.unit);
    sv_index units = (wanted + run_length(flake) - 1) / run_length(flake);
    units = units > runs ? runs : units < 2 ? 2 : units + units % 2;
    if ((status = sv_take_raw(context, runs, sizeof *number, &number)) != SV_OK) {
        sv_give(context, choice.unit);
        return status;
    }
    memset(number, 0xff, (size_t)runs * sizeof *number);
    for (sv_index k = 0; k < units; k++) {
        sv_index low = k * runs / units, high = (k + 1) * runs / units;
        double u = sv_stream_uniform(&stream, (int32_t)k, 0, 0);
        number[low + (sv_index)(u * (double)(high - low))] = (int32_t)k;
    }
    for (sv_index c = 0; c < flake->n_cells; c++) {
        choice.unit[c] = choice.unit[c] < 0 ? -1 : number[choice.unit[c]];
        choice.n_cells += choice.unit[c] >= 0;
    }
    choice.n_units = units;
    choice.left_out = 1.0 - (double)units / (double)runs;
    sv_give(context, number);
    *ret_choice = choice;
    return SV_OK;
}

/* Of a structure: is a site it is joined to outside, or the hull near? */
static bool on_rim_of_structure(const sv_flake *flake, const bool *inside, sv_index site)
{
    const sv_structure *s = flake->spec.structure;
    for (sv_index k = s->bond_start[site]; k < s->bond_start[site + 1]; k++)
        if (!inside[s->bond_to[k]])
            return true;
    return sv_structure_depth(s, s->at[site]) < sqrt(sv_model_cell_area(flake->model));
}

/* Has the cell a neighbour outside the window? */
static bool on_rim(const sv_flake *flake, const bool *inside, sv_index cell)
{
    const sv_cell *at = &flake->cells[cell];
    if (flake->spec.structure != NULL)
        return on_rim_of_structure(flake, inside, cell);
    int64_t width = (int64_t)flake->high[1] - flake->low[1] + 1;
    for (int k = 0; k < 9; k++) {
        int32_t i = at->i + k / 3 - 1, j = at->j + k % 3 - 1, other = -1;
        if (i >= flake->low[0] && i <= flake->high[0] && j >= flake->low[1] && j <= flake->high[1])
            other = flake->cell_at[(i - flake->low[0]) * width + (j - flake->low[1])];
        if (other < 0 || !inside[other])
            return true;
    }
    return false;
}

sv_status sv_window_rim(sv_context *context, const sv_flake *flake, const bool *inside,
                        sv_index wanted, bool **ret_chosen, sv_index *ret_cells,
                        sv_index *ret_chosen_cells)
{
    bool *rim = NULL;
    sv_index cells = 0, passed = 0, chosen = 0;
    sv_status status = sv_take(context, flake->n_cells, sizeof *rim, &rim);
    if (status != SV_OK)
        return status;
    for (sv_index c = 0; c < flake->n_cells; c++) {
        rim[c] = inside[c] && on_rim(flake, inside, c);
        cells += rim[c];
    }
    if (wanted > cells)
        wanted = cells;
    for (sv_index c = 0; c < flake->n_cells; c++) {
        if (!rim[c])
            continue;
        /* The middle of each of `wanted` equal stretches. */
        rim[c] = passed == (2 * chosen + 1) * cells / (2 * wanted) && chosen < wanted;
        chosen += rim[c];
        passed++;
    }
    *ret_chosen = rim;
    *ret_cells = cells;
    *ret_chosen_cells = chosen;
    return SV_OK;
}

double sv_window_error(const window_choice *choice, const double *sums, const sv_index *cells)
{
    double squares = 0.0;
    for (sv_index k = 0; k + 1 < choice->n_units; k += 2) {
        double d = sums[k] / (double)cells[k] - sums[k + 1] / (double)cells[k + 1];
        squares += d * d;
    }
    /* One run a stratum: neighbouring strata stand in for each other (collapsed strata). */
    return sqrt(squares * choice->left_out) / (double)choice->n_units;
}
