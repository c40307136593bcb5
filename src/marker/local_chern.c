/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Local Chern marker of the sites of a window: from a basis of the occupied or empty space
 * (chern_basis.c), or column by column (chern_columns.c). */
#include "chern_internal.h"

#include <math.h>
#include <string.h>

/* Cells of the rim of a sampled window whose numerical error is looked at besides. */
static const sv_index RIM_CELLS = 16;
/* Cells next to the edge where a map by a polynomial that does not know edge states is blank. */
static const int32_t RIM_DEPTH = 3;
/* A site whose stated error is above this is left blank in a map. */
static const double LARGEST_SITE_ERROR = 0.02;

/* Work of one evaluation; rows are the sites whose marker is wanted. */
typedef struct chern_work {
    const sv_sample *sample;
    sv_basis basis;
    window_choice choice; /* unit NULL: every cell of the window */
    sv_index *rows, n_rows;
    double *marker;    /* n_rows */
    double *error;     /* n_rows, column by column only */
    bool levels_known; /* the engine resolves the levels in the gap: edge states too */
} chern_work;

static void free_work(sv_context *context, chern_work *w)
{
    sv_give(context, w->rows);
    sv_give(context, w->choice.unit);
    sv_give(context, w->marker);
    sv_give(context, w->error);
}

/* Sites of the window cells (of the chosen ones when sampling), or all sites. */
static sv_status pick_rows(sv_context *context, chern_work *w, const bool *inside, bool all)
{
    sv_status status = sv_take_raw(context, w->sample->n, sizeof *w->rows, &w->rows);
    if (status != SV_OK)
        return status;
    for (sv_index r = 0; r < w->sample->n; r++) {
        int32_t cell = w->sample->flake->sites[w->sample->pristine[r]].cell;
        bool wanted = w->choice.unit == NULL ? inside[cell] : w->choice.unit[cell] >= 0;
        if (all || wanted)
            w->rows[w->n_rows++] = r;
    }
    return SV_OK;
}

/* Window mean (and, with all rows, the sum and the site values) from the row values. */
static void reduce(const chern_work *w, const bool *inside, sv_index cells, double *ret_sites,
                   sv_outcome *outcome)
{
    double window = 0.0, total = 0.0;
    bool blanked = false;
    for (sv_index k = 0; k < w->n_rows; k++) {
        sv_index row = w->rows[k];
        bool in = inside[w->sample->flake->sites[w->sample->pristine[row]].cell];
        window += in ? w->marker[k] : 0.0;
        total += w->marker[k];
        /* Edge states lie in the gap: a polynomial need not resolve them, and the marker next to
         * the edge then means nothing. The window is judged by its own error. */
        int32_t cell = w->sample->flake->sites[w->sample->pristine[row]].cell;
        bool unsure = w->error != NULL && ret_sites != NULL &&
                      (w->error[k] > LARGEST_SITE_ERROR ||
                       (!w->levels_known && sv_near_edge(w->sample->flake, cell, RIM_DEPTH)));
        blanked = blanked || unsure;
        if (ret_sites != NULL)
            ret_sites[row] = unsure ? (double)NAN : w->marker[k];
    }
    outcome->value = window / (double)cells;
    outcome->window_cells = cells;
    if (ret_sites != NULL && !blanked)
        outcome->sum_over_sites = total;
}

/* Standard error of the mean over the sampled cells of a number per row. */
static sv_status sampling_error(sv_context *context, const chern_work *w, const double *values,
                                double *ret_error)
{
    const sv_flake *flake = w->sample->flake;
    double *sums = NULL;
    sv_index *cells = NULL;
    sv_status status;
    *ret_error = 0.0;
    if (w->choice.unit == NULL)
        return SV_OK;
    if ((status = sv_take(context, w->choice.n_units, sizeof *sums, &sums)) != SV_OK ||
        (status = sv_take(context, w->choice.n_units, sizeof *cells, &cells)) != SV_OK)
        goto out;
    for (sv_index k = 0; k < w->n_rows; k++)
        sums[w->choice.unit[flake->sites[w->sample->pristine[w->rows[k]]].cell]] += values[k];
    for (sv_index c = 0; c < flake->n_cells; c++)
        if (w->choice.unit[c] >= 0)
            cells[w->choice.unit[c]]++;
    *ret_error = sv_window_error(&w->choice, sums, cells);
out:
    sv_give(context, sums);
    sv_give(context, cells);
    return status;
}

/* All rows from the basis, in three products. */
static sv_status from_basis(sv_context *context, const sv_marker_input *input, chern_work *w,
                            sv_outcome *outcome)
{
    double defect = 0.0;
    sv_status status = sv_take(context, w->n_rows, sizeof *w->marker, &w->marker);
    if (status == SV_OK)
        status = sv_chern_of_basis(context, w->sample, &w->basis, w->rows, w->n_rows, w->marker);
    if (status != SV_OK)
        return status;
    status = sv_projector_defect(context, input->projector, &defect);
    outcome->numerical_error = sv_chern_error(w->sample, defect);
    return status;
}

/*
 * Edge states reach the outermost cells of a wide window and make most of its error there; a sample
 * of all cells has too few of them. Their mean error enters with the share of such cells.
 */
static sv_status weigh_rim(sv_context *context, const sv_marker_input *input, const bool *inside,
                           sv_index window_cells, double *error)
{
    const sv_sample *sample = input->sample;
    bool *chosen = NULL;
    sv_index rim_cells = 0, chosen_cells = 0, *rows = NULL, n_rows = 0;
    double *work = NULL, sum = 0.0;
    sv_status status;
    if ((status = sv_window_rim(context, sample->flake, inside, RIM_CELLS, &chosen, &rim_cells,
                                &chosen_cells)) != SV_OK ||
        (status = sv_take_raw(context, sample->n, sizeof *rows, &rows)) != SV_OK)
        goto out;
    for (sv_index r = 0; r < sample->n; r++)
        if (chosen[sample->flake->sites[sample->pristine[r]].cell])
            rows[n_rows++] = r;
    if ((status = sv_take(context, 2 * n_rows, sizeof *work, &work)) != SV_OK ||
        (status = sv_chern_columns(context, sample, input->projector, input->threads, rows, n_rows,
                                   work, work + n_rows)) != SV_OK)
        goto out;
    for (sv_index k = 0; k < n_rows; k++)
        sum += work[n_rows + k];
    double share = (double)rim_cells / (double)window_cells;
    *error = (1.0 - share) * *error + share * sum / (double)chosen_cells;
out:
    sv_give(context, chosen);
    sv_give(context, rows);
    sv_give(context, work);
    return status;
}

/* Row by row through P · columns, for engines without a basis. */
static sv_status from_columns(sv_context *context, const sv_marker_input *input, chern_work *w,
                              const bool *inside, sv_index cells, sv_outcome *outcome)
{
    double sum = 0.0;
    sv_status status;
    /* Maps judge every site by its own error, which single precision does not tell. */
    if (input->ret_site_values != NULL)
        sv_projector_set_single(input->projector, false);
    if ((status = sv_take(context, w->n_rows, sizeof *w->marker, &w->marker)) != SV_OK ||
        (status = sv_take(context, w->n_rows, sizeof *w->error, &w->error)) != SV_OK ||
        (status = sv_chern_columns(context, w->sample, input->projector, input->threads, w->rows,
                                   w->n_rows, w->marker, w->error)) != SV_OK)
        return status;
    for (sv_index k = 0; k < w->n_rows; k++)
        if (inside[w->sample->flake->sites[w->sample->pristine[w->rows[k]]].cell])
            sum += w->error[k];
    double error = sum / (double)cells, spread;
    if ((status = sampling_error(context, w, w->error, &spread)) != SV_OK)
        return status;
    error += 2.0 * spread;
    /* outcome->window_cells still counts the whole window here. */
    if (w->choice.unit != NULL)
        status = weigh_rim(context, input, inside, outcome->window_cells, &error);
    outcome->numerical_error = error;
    return status;
}

/* Vectors stand in for the sites; a basis, or the marker of every site, needs no estimate. */
static bool by_vectors(const sv_marker_input *input, const chern_work *w)
{
    return input->sampled_vectors > 0 && !w->basis.available && input->ret_site_values == NULL;
}

/* Sampling replaces the window by a random choice of its cells; site maps need them all. */
static sv_status choose_cells(sv_context *context, const sv_marker_input *input, const bool *inside,
                              sv_index *cells, chern_work *w)
{
    if (input->sampled_cells <= 0 || input->sampled_cells >= *cells ||
        input->ret_site_values != NULL)
        return SV_OK;
    sv_status status = sv_window_choose(context, w->sample->flake, inside, input->sampled_cells,
                                        input->seed, input->realisation, &w->choice);
    if (status == SV_OK)
        *cells = w->choice.n_cells;
    return status;
}

/* From a mean over cells to one over the area of the window. */
static void scale_outcome(const sv_marker_input *input, sv_index window_cells, sv_outcome *outcome)
{
    const double factor =
        sv_flake_window_factor(input->sample->flake, input->values[0].real[0], window_cells);
    outcome->value *= factor;
    outcome->numerical_error *= factor;
    outcome->estimator_error *= factor;
}

sv_status sv_local_chern(sv_context *context, const sv_marker_input *input, sv_outcome *ret_outcome)
{
    sv_outcome outcome = sv_outcome_start(input->projector);
    chern_work w = {.sample = input->sample, .basis = sv_projector_basis(input->projector)};
    const sv_levels *levels = sv_projector_levels(input->projector);
    w.levels_known = levels->gap_resolved;
    bool *inside = NULL;
    sv_index cells = 0, window_cells = 0;
    sv_status status = SV_OK;
    if ((status = sv_flake_window(context, w.sample->flake, input->values[0].real[0], &inside,
                                  &cells)) != SV_OK)
        goto out;
    outcome.window_cells = window_cells = cells;
    if (levels->on_level)
        goto done;
    if (by_vectors(input, &w)) {
        if ((status = sv_chern_vectors(context, input, inside, cells, &outcome)) != SV_OK)
            goto out;
        goto settled;
    }
    if ((status = choose_cells(context, input, inside, &cells, &w)) != SV_OK ||
        (status = pick_rows(context, &w, inside, input->ret_site_values != NULL)) != SV_OK)
        goto out;
    status = w.basis.available ? from_basis(context, input, &w, &outcome)
                               : from_columns(context, input, &w, inside, cells, &outcome);
    if (status != SV_OK)
        goto out;
    reduce(&w, inside, cells, input->ret_site_values, &outcome);
    if ((status = sampling_error(context, &w, w.marker, &outcome.estimator_error)) != SV_OK)
        goto out;
settled:
    scale_outcome(input, window_cells, &outcome);
    outcome.margin = levels->has_highest && levels->has_lowest
                         ? levels->lowest_empty - levels->highest_occupied
                         : (double)NAN;
    outcome.verdict = isfinite(outcome.value) ? SV_RESOLVED : SV_FAILED;
done:
    *ret_outcome = outcome;
out:
    sv_give(context, inside);
    free_work(context, &w);
    return status;
}
