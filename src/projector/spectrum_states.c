/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Single states: how many positions they cover, and how much of them lies at the edge. */
#include "spectrum_internal.h"

#include <math.h>
#include <stdlib.h>

/* Lattice constants that count as the edge. */
static const double EDGE_DEPTH = 2.0;

static bool has_cell(const sv_flake *flake, int32_t i, int32_t j)
{
    if (i < flake->low[0] || i > flake->high[0] || j < flake->low[1] || j > flake->high[1])
        return false;
    int64_t width = (int64_t)flake->high[1] - flake->low[1] + 1;
    return flake->cell_at[(i - flake->low[0]) * width + (j - flake->low[1])] >= 0;
}

/* Is there a cell at (i, j), perhaps around a periodic side? Turns beyond two are not needed: the
 * shifts are as short as the depth of the edge. */
static bool covers(const sv_flake *flake, int32_t i, int32_t j)
{
    int32_t most[2] = {flake->periodic[0] ? 2 : 0, flake->periodic[1] ? 2 : 0};
    for (int32_t s = -most[0]; s <= most[0]; s++)
        for (int32_t t = -most[1]; t <= most[1]; t++)
            if (has_cell(flake, i + s * flake->period[0][0] + t * flake->period[1][0],
                         j + s * flake->period[0][1] + t * flake->period[1][1]))
                return true;
    return false;
}

static bool is_edge_cell(const sv_flake *flake, const sv_cell *cell)
{
    const double(*a)[2] = flake->model->vectors;
    /* Lattice vectors no longer than the depth: their indices are bounded by depth·|a|/area. */
    double area = sv_model_vector_area(flake->model);
    int32_t reach[2];
    if (flake->spec.structure != NULL)
        return sv_structure_depth(flake->spec.structure, flake->sites[cell->first_site].at) <=
               EDGE_DEPTH;
    for (int k = 0; k < 2; k++)
        reach[k] = (int32_t)floor(EDGE_DEPTH * hypot(a[1 - k][0], a[1 - k][1]) / area + 1e-9);
    for (int32_t i = -reach[0]; i <= reach[0]; i++)
        for (int32_t j = -reach[1]; j <= reach[1]; j++) {
            double length = hypot(i * a[0][0] + j * a[1][0], i * a[0][1] + j * a[1][1]);
            if (length <= EDGE_DEPTH + 1e-9 && !covers(flake, cell->i + i, cell->j + j))
                return true;
        }
    return false;
}

static sv_status mark_edge(sv_context *context, const sv_flake *flake, bool **ret_edge)
{
    bool *edge = NULL;
    sv_status status = sv_take(context, flake->n_cells, sizeof *edge, &edge);
    if (status != SV_OK)
        return status;
    for (sv_index c = 0; c < flake->n_cells; c++)
        edge[c] = is_edge_cell(flake, &flake->cells[c]);
    *ret_edge = edge;
    return SV_OK;
}

static sv_near_level describe(const sv_sample *sample, const sv_complex *v, const bool *edge,
                              double energy, double *weights)
{
    const sv_flake *flake = sample->flake;
    const sv_orbital *orbitals = flake->model->orbitals;
    sv_near_level level = {.energy = energy, .edge_weight = edge == NULL ? (double)NAN : 0.0};
    /* Sites of a cell follow one another: one cell's positions at a time. */
    for (sv_index k = 0; k < sample->n;) {
        int32_t cell = flake->sites[sample->pristine[k]].cell;
        for (int p = 0; p < flake->model->n_positions; p++)
            weights[p] = 0.0;
        for (; k < sample->n && flake->sites[sample->pristine[k]].cell == cell; k++)
            weights[orbitals[flake->sites[sample->pristine[k]].orbital].position] +=
                creal(v[k]) * creal(v[k]) + cimag(v[k]) * cimag(v[k]);
        for (int p = 0; p < flake->model->n_positions; p++) {
            level.participation += weights[p] * weights[p];
            if (edge != NULL && edge[cell])
                level.edge_weight += weights[p];
        }
    }
    return level;
}

static int by_energy(const void *a, const void *b)
{
    double x = ((const sv_near_level *)a)->energy, y = ((const sv_near_level *)b)->energy;
    return (x > y) - (x < y);
}

sv_status sv_spectrum_describe_states(sv_context *context, spectrum_work *w, const double *energies,
                                      const sv_complex *vectors, int count)
{
    const sv_sample *sample = w->sample;
    const sv_flake *flake = sample->flake;
    sv_near_level *near = NULL;
    bool *edge = NULL;
    double *weights = NULL;
    sv_status status;
    if ((status = sv_take(context, count, sizeof *near, &near)) != SV_OK ||
        (status = sv_take(context, flake->model->n_positions, sizeof *weights, &weights)) != SV_OK)
        goto out;
    if (!(flake->periodic[0] && flake->periodic[1]))
        status = mark_edge(context, flake, &edge);
    if (status != SV_OK)
        goto out;
    for (int k = 0; k < count; k++)
        near[k] = describe(sample, vectors + k * sample->n, edge, energies[k], weights);
    if (count > 1)
        qsort(near, (size_t)count, sizeof *near, by_energy);
    w->out.near = near;
    w->out.n_near = count;
    near = NULL;
out:
    sv_give(context, near);
    sv_give(context, edge);
    sv_give(context, weights);
    return status;
}

int sv_gap_ratio(const double *levels, sv_index n, double resolution, double *ret_mean,
                 double *ret_error)
{
    double sum = 0.0, squares = 0.0, lagged = 0.0, before = (double)NAN, spacing = (double)NAN;
    double last = n > 0 ? levels[0] : 0.0;
    int distinct = n > 0, ratios = 0;
    for (int pass = 0; pass < 2; pass++) { /* the mean, then the spread about it */
        double mean = ratios > 0 ? sum / ratios : (double)NAN;
        last = n > 0 ? levels[0] : 0.0;
        spacing = before = (double)NAN;
        for (sv_index k = 1; k < n; k++) {
            double next = levels[k] - last;
            if (next <= resolution)
                continue;
            double ratio = fmin(next, spacing) / fmax(next, spacing);
            bool is_ratio = !isnan(spacing);
            if (pass == 0) {
                distinct++;
                ratios += is_ratio;
                sum += is_ratio ? ratio : 0.0;
            } else if (is_ratio) {
                squares += (ratio - mean) * (ratio - mean);
                lagged += isnan(before) ? 0.0 : (ratio - mean) * (before - mean);
                before = ratio;
            }
            spacing = next;
            last = levels[k];
        }
    }
    *ret_mean = ratios > 0 ? sum / ratios : (double)NAN;
    /* Var(mean) = (γ0 + 2γ1)/m; never less than half of the uncorrelated value. */
    double variance = fmax(squares + 2.0 * lagged, 0.5 * squares) / fmax(ratios - 1.0, 1.0);
    *ret_error = ratios > 1 ? sqrt(variance / ratios) : (double)NAN;
    return distinct;
}
