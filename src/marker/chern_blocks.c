/* SPDX-License-Identifier: GPL-3.0-or-later */
/* A coarse map of the local Chern marker: square blocks, in each a stratified sample of cells. */
#include "chern_internal.h"

#include <math.h>
#include <string.h>

/* Cells nearer to the edge than this are left out: edge states there are no part of the bulk, and a
 * polynomial does not resolve them. */
enum { EDGE_CELLS = 3, ROWS_AT_A_TIME = 4096 };
/* A block whose numerical error is above this has no value. */
static const double LARGEST_ERROR = 0.02;

enum { USUAL_CELLS = 32 };

bool sv_local_chern_check(const sv_value *values, int *ret_key, char *message, size_t size)
{
    if (!values[CHERN_BLOCK_CELLS].present || values[CHERN_BLOCKS].present)
        return true;
    *ret_key = CHERN_BLOCK_CELLS;
    snprintf(message, size, "needs blocks beside it");
    return false;
}

bool sv_local_chern_wants_blocks(const sv_value *values)
{
    return values[CHERN_BLOCKS].present;
}

/* A run of neighbouring cells that is computed. */
typedef struct run_sum {
    int32_t block;
    sv_index cells;
    double marker, error;
} run_sum;

typedef struct block_work {
    const sv_sample *sample;
    sv_coarse map;
    int32_t *block;  /* per cell; −1: too near to the edge */
    sv_index *order; /* eligible cells by block, ascending within one */
    sv_index *first; /* of each block in it; one more than blocks */
    int32_t *chosen; /* per cell: number of its run, or −1 */
    run_sum *runs;
    sv_index n_runs, run_room;
    sv_index *rows, n_rows;
    double *marker, *error;
} block_work;

static void free_work(sv_context *context, block_work *w)
{
    sv_give(context, w->block);
    sv_give(context, w->order);
    sv_give(context, w->first);
    sv_give(context, w->chosen);
    sv_give(context, w->runs);
    sv_give(context, w->rows);
    sv_give(context, w->marker);
    sv_give(context, w->error);
}

/* Square blocks over the centres of the cells, so many along the longer side. */
static sv_status lay_blocks(sv_context *context, int along, block_work *w)
{
    const sv_flake *flake = w->sample->flake;
    double low[2] = {INFINITY, INFINITY}, high[2] = {-INFINITY, -INFINITY}, at[2];
    for (sv_index c = 0; c < flake->n_cells; c++) {
        sv_flake_cell_centre(flake, c, at);
        for (int d = 0; d < 2; d++) {
            low[d] = fmin(low[d], at[d]);
            high[d] = fmax(high[d], at[d]);
        }
    }
    /* Half a cell of room, so that no centre lies on the outer border. */
    double room = 0.5 * sqrt(sv_model_cell_area(flake->model));
    double longest = fmax(high[0] - low[0], high[1] - low[1]) + 2.0 * room;
    w->map.side = longest / along;
    for (int d = 0; d < 2; d++) {
        w->map.low[d] = low[d] - room;
        double count = ceil((high[d] - low[d] + 2.0 * room) / w->map.side - 1e-9);
        w->map.count[d] = (sv_index)fmin(fmax(count, 1.0), along);
    }
    w->map.n_blocks = w->map.count[0] * w->map.count[1];
    sv_status status = sv_take(context, w->map.n_blocks, sizeof *w->map.blocks, &w->map.blocks);
    for (sv_index k = 0; status == SV_OK && k < w->map.n_blocks; k++)
        w->map.blocks[k] =
            (sv_block){.at = {w->map.low[0] + ((double)(k % w->map.count[0]) + 0.5) * w->map.side,
                              w->map.low[1] + ((double)(k / w->map.count[0]) + 0.5) * w->map.side},
                       .mean = NAN,
                       .error = NAN,
                       .numerical_error = NAN};
    return status;
}

sv_index sv_coarse_block(const sv_coarse *map, const double at[2])
{
    sv_index place[2];
    for (int d = 0; d < 2; d++) {
        double k = floor((at[d] - map->low[d]) / map->side);
        if (k < 0.0 || k >= (double)map->count[d])
            return -1;
        place[d] = (sv_index)k;
    }
    return place[0] + place[1] * map->count[0];
}

/* The eligible cells, sorted by block (a counting sort keeps their order). */
static sv_status sort_cells(sv_context *context, block_work *w)
{
    const sv_flake *flake = w->sample->flake;
    sv_index n = flake->n_cells, blocks = w->map.n_blocks;
    sv_status status;
    if ((status = sv_take_raw(context, n, sizeof *w->block, &w->block)) != SV_OK ||
        (status = sv_take_raw(context, n, sizeof *w->order, &w->order)) != SV_OK ||
        (status = sv_take(context, blocks + 2, sizeof *w->first, &w->first)) != SV_OK)
        return status;
    for (sv_index c = 0; c < n; c++) {
        double at[2];
        sv_flake_cell_centre(flake, c, at);
        sv_index block = sv_coarse_block(&w->map, at);
        if (block >= 0)
            w->map.blocks[block].cells++;
        w->block[c] =
            block < 0 || sv_near_edge(flake, (int32_t)c, EDGE_CELLS) ? -1 : (int32_t)block;
        if (w->block[c] >= 0)
            w->first[block + 2]++;
    }
    for (sv_index k = 2; k <= blocks + 1; k++)
        w->first[k] += w->first[k - 1];
    for (sv_index c = 0; c < n; c++)
        if (w->block[c] >= 0)
            w->order[w->first[w->block[c] + 1]++] = c;
    return SV_OK;
}

/* Last cell (exclusive) of the run that starts at `at` in the order. */
static sv_index run_end(const block_work *w, sv_index at, sv_index end)
{
    const sv_cell *cells = w->sample->flake->cells;
    sv_index longest = SV_PANEL_COLUMNS / w->sample->flake->model->n_orbitals, k = at + 1;
    const bool lattice = w->sample->flake->spec.structure == NULL;
    while (k < end && k - at < longest &&
           (!lattice || (cells[w->order[k]].i == cells[w->order[k - 1]].i &&
                         cells[w->order[k]].j == cells[w->order[k - 1]].j + 1)))
        k++;
    return k;
}

/* Draws one run of each stratum of a block; at least two strata where there are two runs. */
static sv_status choose_runs(sv_context *context, const sv_stream *stream, int32_t block,
                             sv_index wanted, block_work *w)
{
    sv_index begin = w->first[block], end = w->first[block + 1], runs = 0, number = 0;
    sv_index longest = SV_PANEL_COLUMNS / w->sample->flake->model->n_orbitals;
    for (sv_index k = begin; k < end; k = run_end(w, k, end))
        runs++;
    sv_index units = (wanted + (longest > 0 ? longest : 1) - 1) / (longest > 0 ? longest : 1);
    units = units < 2 ? 2 : units;
    units = units > runs ? runs : units;
    for (sv_index unit = 0, k = begin; unit < units; unit++) {
        sv_index low = unit * runs / units, high = (unit + 1) * runs / units;
        double u = sv_stream_uniform(stream, block, (int32_t)unit, 0);
        sv_index drawn = low + (sv_index)(u * (double)(high - low));
        for (; number < drawn; number++)
            k = run_end(w, k, end);
        sv_index stop = run_end(w, k, end);
        sv_status status =
            sv_reserve(context, &w->runs, &w->run_room, w->n_runs + 1, sizeof *w->runs);
        if (status != SV_OK)
            return status;
        w->runs[w->n_runs] = (run_sum){.block = block, .cells = stop - k};
        for (sv_index c = k; c < stop; c++)
            w->chosen[w->order[c]] = (int32_t)w->n_runs;
        w->n_runs++;
        w->map.blocks[block].sampled += stop - k;
        w->map.blocks[block].left_out = 1.0 - (double)units / (double)runs;
    }
    return SV_OK;
}

static sv_status choose_cells(sv_context *context, const sv_marker_input *input, sv_index wanted,
                              block_work *w)
{
    sv_index n = w->sample->flake->n_cells;
    sv_stream stream = sv_stream_make(input->seed, "coarse map", input->realisation);
    sv_status status = sv_take_raw(context, n, sizeof *w->chosen, &w->chosen);
    if (status != SV_OK)
        return status;
    memset(w->chosen, 0xff, (size_t)n * sizeof *w->chosen);
    for (int32_t k = 0; status == SV_OK && k < w->map.n_blocks; k++)
        status = choose_runs(context, &stream, k, wanted, w);
    return status;
}

static int32_t run_of_row(const block_work *w, sv_index row)
{
    return w->chosen[w->sample->flake->sites[w->sample->pristine[row]].cell];
}

static sv_status compute_rows(sv_context *context, const sv_marker_input *input, block_work *w)
{
    sv_status status = sv_take_raw(context, w->sample->n, sizeof *w->rows, &w->rows);
    for (sv_index r = 0; status == SV_OK && r < w->sample->n; r++)
        if (run_of_row(w, r) >= 0)
            w->rows[w->n_rows++] = r;
    if (status != SV_OK ||
        (status = sv_take(context, w->n_rows, sizeof *w->marker, &w->marker)) != SV_OK ||
        (status = sv_take(context, w->n_rows, sizeof *w->error, &w->error)) != SV_OK)
        return status;
    for (sv_index k = 0; status == SV_OK && k < w->n_rows; k += ROWS_AT_A_TIME) {
        sv_index count = w->n_rows - k < ROWS_AT_A_TIME ? w->n_rows - k : ROWS_AT_A_TIME;
        sv_progress(context, "coarse map", k, w->n_rows);
        status = sv_chern_columns(context, w->sample, input->projector, input->threads, w->rows + k,
                                  count, w->marker + k, w->error + k);
    }
    if (status == SV_OK)
        sv_progress(context, "coarse map", w->n_rows, w->n_rows);
    return status;
}

/* Means of the blocks; their error from the spread of the means of the runs. */
static void reduce(block_work *w)
{
    for (sv_index k = 0; k < w->n_rows; k++) {
        run_sum *run = &w->runs[run_of_row(w, w->rows[k])];
        run->marker += w->marker[k];
        run->error += w->error[k];
    }
    for (sv_index low = 0, high; low < w->n_runs; low = high) {
        sv_block *block = &w->map.blocks[w->runs[low].block];
        double sum = 0.0, error = 0.0, squares = 0.0;
        for (high = low; high < w->n_runs && w->runs[high].block == w->runs[low].block; high++) {
            sum += w->runs[high].marker;
            error += w->runs[high].error;
        }
        double n = (double)(high - low), mean = sum / (double)block->sampled;
        for (sv_index k = low; k < high; k++) {
            double share = n * (double)w->runs[k].cells / (double)block->sampled;
            double d = share * (w->runs[k].marker / (double)w->runs[k].cells - mean);
            squares += d * d;
        }
        block->numerical_error = error / (double)block->sampled;
        if (!(block->numerical_error <= LARGEST_ERROR))
            continue;
        block->mean = mean;
        if (n > 1.0 || block->left_out <= 0.0)
            block->error = n > 1.0 ? sqrt(block->left_out * squares / (n * (n - 1.0))) : 0.0;
    }
}

sv_status sv_local_chern_blocks(sv_context *context, const sv_marker_input *input,
                                sv_coarse *ret_map)
{
    const sv_value *values = input->values;
    const int blocks = (int)values[CHERN_BLOCKS].integer[0];
    const sv_index cells =
        values[CHERN_BLOCK_CELLS].present ? values[CHERN_BLOCK_CELLS].integer[0] : USUAL_CELLS;
    block_work w = {.sample = input->sample};
    const sv_levels *levels = sv_projector_levels(input->projector);
    sv_status status = SV_OK;
    if (!sv_local_chern_wants_blocks(values) || blocks < 1 || cells < 1)
        return SV_FAIL(context, SV_INVALID_INPUT, "%d blocks of %lld sampled cells", blocks,
                       (long long)cells);
    if ((status = lay_blocks(context, blocks, &w)) != SV_OK ||
        (status = sort_cells(context, &w)) != SV_OK)
        goto out;
    if (levels->on_level) {
        snprintf(w.map.reason, sizeof w.map.reason, "a level coincides with the Fermi energy %.6g",
                 levels->fermi_energy);
        goto out;
    }
    if ((status = choose_cells(context, input, cells, &w)) != SV_OK ||
        (status = compute_rows(context, input, &w)) != SV_OK)
        goto out;
    reduce(&w);
out:
    snprintf(w.map.engine, sizeof w.map.engine, "%s", sv_projector_engine(input->projector));
    free_work(context, &w);
    if (status == SV_OK)
        *ret_map = w.map;
    else
        sv_coarse_free(context, &w.map);
    return status;
}

sv_status sv_coarse_site_values(sv_context *context, const sv_sample *sample, const sv_coarse *map,
                                double **ret_values)
{
    double *values = NULL;
    int32_t *present = NULL;
    sv_status status = sv_take(context, sample->n, sizeof *values, &values);
    if (status == SV_OK)
        status = sv_take(context, sample->flake->n_cells, sizeof *present, &present);
    for (sv_index r = 0; status == SV_OK && r < sample->n; r++)
        present[sample->flake->sites[sample->pristine[r]].cell]++;
    for (sv_index r = 0; status == SV_OK && r < sample->n; r++) {
        int32_t cell = sample->flake->sites[sample->pristine[r]].cell;
        double at[2];
        sv_flake_cell_centre(sample->flake, cell, at);
        sv_index block = sv_coarse_block(map, at);
        values[r] = block < 0 ? (double)NAN : map->blocks[block].mean / present[cell];
    }
    sv_give(context, present);
    if (status == SV_OK)
        *ret_values = values;
    else
        sv_give(context, values);
    return status;
}

void sv_coarse_free(sv_context *context, sv_coarse *map)
{
    sv_give(context, map->blocks);
    *map = (sv_coarse){0};
}
