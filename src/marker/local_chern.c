/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Local Chern marker of the sites of a window: from a basis of the occupied or empty space, or
 * column by column (chern_columns.c). */
#include "marker_internal.h"

#include <cblas.h>
#include <math.h>
#include <string.h>

/* A site whose stated error is above this is left blank in a map. */
static const double LARGEST_SITE_ERROR = 0.02;

/* Work of one evaluation; rows are the sites whose marker is wanted. */
typedef struct chern_work {
    const sv_sample *sample;
    sv_basis basis;
    window_choice choice; /* unit NULL: every cell of the window */
    sv_index *rows, n_rows;
    sv_complex *scaled;           /* n × m */
    sv_complex *x, *y;            /* m × m, position in the basis */
    sv_complex *picked, *px, *py; /* n_rows × m */
    double *marker;               /* n_rows */
    double *error;                /* n_rows, column by column only */
    bool levels_known;            /* the engine resolves the levels in the gap: edge states too */
} chern_work;

static void free_work(sv_context *context, chern_work *w)
{
    sv_give(context, w->rows);
    sv_give(context, w->choice.unit);
    sv_give(context, w->scaled);
    sv_give(context, w->x);
    sv_give(context, w->y);
    sv_give(context, w->picked);
    sv_give(context, w->px);
    sv_give(context, w->py);
    sv_give(context, w->marker);
    sv_give(context, w->error);
}

static sv_status take_blocks(sv_context *context, chern_work *w)
{
    sv_index n = w->sample->n, m = w->basis.columns;
    size_t size = sizeof(sv_complex);
    sv_status status;
    if ((status = sv_take_raw(context, n * m, size, &w->scaled)) != SV_OK ||
        (status = sv_take(context, m * m, size, &w->x)) != SV_OK ||
        (status = sv_take(context, m * m, size, &w->y)) != SV_OK ||
        (status = sv_take_raw(context, w->n_rows * m, size, &w->picked)) != SV_OK ||
        (status = sv_take_raw(context, w->n_rows * m, size, &w->px)) != SV_OK ||
        (status = sv_take_raw(context, w->n_rows * m, size, &w->py)) != SV_OK)
        return status;
    return sv_take(context, w->n_rows, sizeof *w->marker, &w->marker);
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

static double coordinate(const sv_sample *sample, sv_index row, int axis)
{
    return sample->flake->sites[sample->pristine[row]].at[axis];
}

/*
 * B† x B. The coordinate is shifted to be positive so that it has a root: a rank-k update of
 * √x B costs half of a general product. A constant shift changes no marker (⟨r|PxPyP|r⟩
 * has the same imaginary part).
 */
static void position_in_basis(chern_work *w, int axis, sv_complex *result)
{
    sv_index n = w->sample->n, m = w->basis.columns;
    double low = INFINITY;
    for (sv_index r = 0; r < n; r++)
        low = fmin(low, coordinate(w->sample, r, axis));
    for (sv_index c = 0; c < m; c++)
        for (sv_index r = 0; r < n; r++)
            w->scaled[r + c * n] =
                sqrt(coordinate(w->sample, r, axis) - low) * w->basis.vectors[r + c * n];
    cblas_zherk(CblasColMajor, CblasLower, CblasConjTrans, (int)m, (int)n, 1.0, w->scaled, (int)n,
                0.0, result, (int)m);
}

/* (4π/A) Im Σ_n (B X)_{rn} conj((B Y)_{rn}); the empty side has the opposite sign. */
static void evaluate(chern_work *w)
{
    int k = (int)w->n_rows, m = (int)w->basis.columns;
    const sv_complex one = 1.0, zero = 0.0;
    for (int c = 0; c < m; c++)
        for (int r = 0; r < k; r++)
            w->picked[r + (sv_index)c * k] = w->basis.vectors[w->rows[r] + c * w->sample->n];
    cblas_zhemm(CblasColMajor, CblasRight, CblasLower, k, m, &one, w->x, m, w->picked, k, &zero,
                w->px, k);
    cblas_zhemm(CblasColMajor, CblasRight, CblasLower, k, m, &one, w->y, m, w->picked, k, &zero,
                w->py, k);
    double area = sv_model_cell_area(w->sample->flake->model);
    double factor = (w->basis.empty_side ? -4.0 : 4.0) * M_PI / area;
    for (int c = 0; c < m; c++)
        for (int r = 0; r < k; r++) {
            sv_complex a = w->px[r + (sv_index)c * k], b = w->py[r + (sv_index)c * k];
            w->marker[r] += cimag(a) * creal(b) - creal(a) * cimag(b);
        }
    for (int r = 0; r < k; r++)
        w->marker[r] *= factor;
}

/*
 * First-order effect of an error δ of P on one value: P enters three times, and positions relative
 * to the site matter only over the extent of the flake.
 */
static double error_estimate(const sv_sample *sample, double defect)
{
    double low[2] = {INFINITY, INFINITY}, high[2] = {-INFINITY, -INFINITY};
    for (sv_index r = 0; r < sample->n; r++)
        for (int k = 0; k < 2; k++) {
            low[k] = fmin(low[k], coordinate(sample, r, k));
            high[k] = fmax(high[k], coordinate(sample, r, k));
        }
    double spread = 0.25 * fmax(1.0, (high[0] - low[0]) * (high[1] - low[1]));
    return 3.0 * 4.0 * M_PI / sv_model_cell_area(sample->flake->model) * spread * defect;
}

/* Does the flake lack a cell within three cells of this one? */
static bool near_edge(const sv_flake *flake, int32_t cell)
{
    const int32_t reach = 3;
    int64_t width = (int64_t)flake->high[1] - flake->low[1] + 1;
    for (int32_t i = flake->cells[cell].i - reach; i <= flake->cells[cell].i + reach; i++)
        for (int32_t j = flake->cells[cell].j - reach; j <= flake->cells[cell].j + reach; j++)
            if (i < flake->low[0] || i > flake->high[0] || j < flake->low[1] ||
                j > flake->high[1] ||
                flake->cell_at[(i - flake->low[0]) * width + (j - flake->low[1])] < 0)
                return true;
    return false;
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
                       (!w->levels_known && near_edge(w->sample->flake, cell)));
        blanked = blanked || unsure;
        if (ret_sites != NULL)
            ret_sites[row] = unsure ? (double)NAN : w->marker[k];
    }
    outcome->value = window / (double)cells;
    outcome->window_cells = cells;
    if (ret_sites != NULL && !blanked)
        outcome->sum_over_sites = total;
}

/* Error of the sampled mean from the means of the chosen runs. */
static sv_status estimator_error(sv_context *context, const chern_work *w, sv_outcome *outcome)
{
    const sv_flake *flake = w->sample->flake;
    double *sums = NULL;
    sv_index *cells = NULL;
    sv_status status;
    if (w->choice.unit == NULL)
        return SV_OK;
    if ((status = sv_take(context, w->choice.n_units, sizeof *sums, &sums)) != SV_OK ||
        (status = sv_take(context, w->choice.n_units, sizeof *cells, &cells)) != SV_OK)
        goto out;
    for (sv_index k = 0; k < w->n_rows; k++)
        sums[w->choice.unit[flake->sites[w->sample->pristine[w->rows[k]]].cell]] += w->marker[k];
    for (sv_index c = 0; c < flake->n_cells; c++)
        if (w->choice.unit[c] >= 0)
            cells[w->choice.unit[c]]++;
    outcome->estimator_error = sv_window_error(&w->choice, sums, cells);
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
    sv_status status = take_blocks(context, w);
    if (status != SV_OK)
        return status;
    if (w->basis.columns > 0 && w->n_rows > 0) {
        position_in_basis(w, 0, w->x);
        position_in_basis(w, 1, w->y);
        evaluate(w);
    }
    status = sv_projector_defect(context, input->projector, &defect);
    outcome->numerical_error = error_estimate(w->sample, defect);
    return status;
}

/* Row by row through P · columns, for engines without a basis. */
static sv_status from_columns(sv_context *context, const sv_marker_input *input, chern_work *w,
                              const bool *inside, sv_index cells, sv_outcome *outcome)
{
    double sum = 0.0;
    sv_status status;
    if ((status = sv_take(context, w->n_rows, sizeof *w->marker, &w->marker)) != SV_OK ||
        (status = sv_take(context, w->n_rows, sizeof *w->error, &w->error)) != SV_OK ||
        (status = sv_chern_columns(context, w->sample, input->projector, input->threads, w->rows,
                                   w->n_rows, w->marker, w->error)) != SV_OK)
        return status;
    for (sv_index k = 0; k < w->n_rows; k++)
        if (inside[w->sample->flake->sites[w->sample->pristine[w->rows[k]]].cell])
            sum += w->error[k];
    outcome->numerical_error = sum / (double)cells;
    return SV_OK;
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

sv_status sv_local_chern(sv_context *context, const sv_marker_input *input, sv_outcome *ret_outcome)
{
    sv_outcome outcome = sv_outcome_start(input->projector);
    chern_work w = {.sample = input->sample, .basis = sv_projector_basis(input->projector)};
    const sv_levels *levels = sv_projector_levels(input->projector);
    w.levels_known = levels->gap_resolved;
    bool *inside = NULL;
    sv_index cells = 0;
    sv_status status = SV_OK;
    if ((status = sv_flake_window(context, w.sample->flake, input->values[0].real[0], &inside,
                                  &cells)) != SV_OK)
        goto out;
    outcome.window_cells = cells;
    if (levels->on_level)
        goto done;
    if ((status = choose_cells(context, input, inside, &cells, &w)) != SV_OK ||
        (status = pick_rows(context, &w, inside, input->ret_site_values != NULL)) != SV_OK)
        goto out;
    status = w.basis.available ? from_basis(context, input, &w, &outcome)
                               : from_columns(context, input, &w, inside, cells, &outcome);
    if (status != SV_OK)
        goto out;
    reduce(&w, inside, cells, input->ret_site_values, &outcome);
    if ((status = estimator_error(context, &w, &outcome)) != SV_OK)
        goto out;
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
