/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The spectrum of one sample: bounds, occupation, states next to the Fermi energy, statistics of
 * their spacings, density of states. */
#include "spectrum_internal.h"

#include <float.h>
#include <math.h>
#include <stdio.h>

/* The density costs at least so many rows times columns; the exact trace where that is no more. */
static const double ROW_COLUMNS = 1e6;
enum { EXACT_MOMENTS = 256, MOMENTS = 512 };

sv_spectrum_options sv_spectrum_options_default(void)
{
    return (sv_spectrum_options){.size = sizeof(sv_spectrum_options),
                                 .near_states = 16,
                                 .exact_sites = 400,
                                 .count_sites = 300000,
                                 .seed = 1};
}

double sv_spectrum_bytes(sv_index n)
{
    const sv_spectrum_options defaults = sv_spectrum_options_default();
    double order = (double)n, sample = 420.0 * order, panels = 2.0 * 256.0 * order;
    if (n <= defaults.exact_sites)
        return sample + 64.0 * order * order;
    if (n > defaults.count_sites)
        return sample + panels;
    /* Bases of at most 156 vectors, and the factor: about 1.5 log2(n)^2 elements a row. */
    double factor = 1.5 * log2(order) * log2(order) * 16.0 * order;
    return sample + fmax(panels, 2500.0 * order + factor);
}

void sv_spectrum_free(sv_context *context, sv_spectrum *spectrum)
{
    sv_give(context, spectrum->near);
    sv_give(context, spectrum->energies);
    sv_give(context, spectrum->density);
    *spectrum = (sv_spectrum){0};
}

/* ---- density of states ---- */

/* Moments count × columns. */
static sv_status fill_moments(sv_context *context, spectrum_work *w, int count, double centre,
                              double half, double *moments)
{
    sv_index n = w->sample->n;
    sv_packed packed = {0};
    sv_stream stream = sv_stream_make(w->options->seed, "density", w->options->realisation);
    if (w->values != NULL) {
        w->out.method = "all eigenvalues";
        for (int k = 0; k < count; k++)
            for (sv_index s = 0; s < n; s++)
                moments[k * SV_PANEL_COLUMNS] +=
                    cos(k * acos(fmax(-1.0, fmin(1.0, (w->values[s] - centre) / half)))) /
                    (double)n;
        return SV_OK;
    }
    int panels = (int)ceil(ROW_COLUMNS / (double)n / SV_PANEL_COLUMNS);
    bool whole = (sv_index)panels * SV_PANEL_COLUMNS >= n;
    w->out.method = whole ? "Chebyshev moments, exact trace" : "Chebyshev moments, random phases";
    sv_status status =
        sv_packed_make(context, &w->sample->hamiltonian, NULL, n, NULL, centre, half, &packed);
    if (status == SV_OK)
        status =
            sv_chebyshev_moments(context, &packed, count, whole ? 0 : panels, &stream, moments);
    sv_packed_free(context, &packed);
    return status;
}

/* Mean over the columns, and the largest standard error of it. */
static sv_status average_columns(sv_context *context, spectrum_work *w, int count, double centre,
                                 double half, const double *moments)
{
    sv_spectrum *out = &w->out;
    const int columns = w->values != NULL ? 1 : SV_PANEL_COLUMNS;
    double *one = NULL, *squares = NULL;
    sv_index n = out->n_density;
    sv_status status = sv_take(context, n, sizeof *one, &one);
    if (status == SV_OK)
        status = sv_take(context, n, sizeof *squares, &squares);
    for (int c = 0; c < columns && status == SV_OK; c++) {
        status = sv_chebyshev_density(context, moments + c, count, SV_PANEL_COLUMNS, centre, half,
                                      out->energies, n, one);
        for (sv_index e = 0; e < n && status == SV_OK; e++) { /* Welford */
            double before = one[e] - out->density[e];
            out->density[e] += before / (c + 1.0);
            squares[e] += before * (one[e] - out->density[e]);
        }
    }
    for (sv_index e = 0; e < n && columns > 1 && status == SV_OK; e++)
        out->density_error =
            fmax(out->density_error, sqrt(squares[e] / (columns * (columns - 1.0))));
    sv_give(context, one);
    sv_give(context, squares);
    return status;
}

static sv_status make_density(sv_context *context, spectrum_work *w)
{
    sv_spectrum *out = &w->out;
    int count = w->options->moments > 0 ? w->options->moments
                : w->values != NULL     ? EXACT_MOMENTS
                                        : MOMENTS;
    double centre = 0.5 * (out->bounds[0] + out->bounds[1]), *moments = NULL;
    double half = 0.51 * (out->bounds[1] - out->bounds[0]);
    /* One level, or all levels equal: any width will do. */
    if (!(half > 1e-6 * fmax(fabs(centre), DBL_MIN)))
        half = centre != 0.0 ? 0.1 * fabs(centre) : 1.0;
    /* Two points per standard deviation in the middle. */
    sv_index n = (sv_index)ceil(4.0 * count / M_PI);
    sv_status status =
        sv_take(context, (sv_index)count * SV_PANEL_COLUMNS, sizeof *moments, &moments);
    if (status == SV_OK)
        status = sv_take(context, n, sizeof *out->energies, &out->energies);
    if (status == SV_OK)
        status = sv_take(context, n, sizeof *out->density, &out->density);
    if (status == SV_OK)
        status = fill_moments(context, w, count, centre, half, moments);
    if (status != SV_OK)
        goto out;
    out->n_density = n;
    out->density_resolution = M_PI / count * half;
    for (sv_index e = 0; e < n; e++)
        out->energies[e] = centre + half * (2.0 * ((double)e + 0.5) / (double)n - 1.0);
    status = average_columns(context, w, count, centre, half, moments);
out:
    sv_give(context, moments);
    return status;
}

/* ---- statistics of spacings ---- */

static sv_status make_gap_ratio(sv_context *context, spectrum_work *w)
{
    sv_spectrum *out = &w->out;
    double *levels = NULL;
    const double *used = w->values;
    sv_index n = out->n_near;
    sv_status status = SV_OK;
    if (w->values == NULL) {
        status = sv_take(context, n, sizeof *levels, &levels);
        for (sv_index k = 0; k < n && status == SV_OK; k++)
            levels[k] = out->near[k].energy;
        used = levels;
    } else { /* half of all levels, a quarter on either side of E_F */
        sv_index quarter = out->sites / 4, middle = 0;
        while (middle < out->sites && w->values[middle] < out->fermi_energy)
            middle++;
        sv_index first = middle > quarter ? middle - quarter : 0;
        sv_index last = middle + quarter < out->sites ? middle + quarter : out->sites;
        used = w->values + first;
        n = last - first;
    }
    if (status == SV_OK)
        out->gap_ratio_levels =
            sv_gap_ratio(used, n, out->resolution, &out->gap_ratio, &out->gap_ratio_error);
    if (out->gap_ratio_levels < 4)
        snprintf(out->gap_ratio_reason, sizeof out->gap_ratio_reason,
                 "%d distinct levels next to the Fermi energy: a ratio with its error needs four",
                 out->gap_ratio_levels);
    sv_give(context, levels);
    return status;
}

/* ---- all together ---- */

/* Too large to count: bounds and density are all there is. */
static void leave_levels(spectrum_work *w)
{
    sv_spectrum *out = &w->out;
    if (w->occupation->by == SV_BY_ENERGY)
        out->fermi_energy = w->occupation->fermi_energy;
    snprintf(out->reason, sizeof out->reason, "states are counted up to %lld sites",
             (long long)w->options->count_sites);
    snprintf(out->near_reason, sizeof out->near_reason, "%s", out->reason);
}

static sv_status check_electrons(sv_context *context, const spectrum_work *w)
{
    if (w->occupation->by == SV_BY_ENERGY)
        return SV_OK;
    int64_t electrons = sv_occupation_electrons(w->occupation, w->sample->n);
    if (electrons >= 0 && electrons <= w->sample->n)
        return SV_OK;
    return SV_FAIL(context, SV_UNDEFINED, "%lld electrons do not fit into %lld states",
                   (long long)electrons, (long long)w->sample->n);
}

static sv_status make_levels(sv_context *context, spectrum_work *w)
{
    sv_index n = w->sample->n;
    if (n <= w->options->exact_sites)
        return sv_spectrum_levels_exact(context, w);
    sv_status status = sv_spectral_bounds(context, &w->sample->hamiltonian, w->out.bounds);
    if (status != SV_OK)
        return status;
    if (n <= w->options->count_sites)
        return sv_spectrum_levels_counted(context, w);
    leave_levels(w);
    return SV_OK;
}

sv_status sv_spectrum_make(sv_context *context, const sv_sample *sample,
                           const sv_occupation *occupation, const sv_spectrum_options *options,
                           sv_spectrum *ret_spectrum)
{
    const double none = (double)NAN, relative = fmax(1e-12, 4.0 * DBL_EPSILON * (double)sample->n);
    spectrum_work w = {.sample = sample, .occupation = occupation, .options = options};
    w.out = (sv_spectrum){.sites = sample->n,
                          .states_below = -1,
                          .fermi_energy = none,
                          .highest_occupied = none,
                          .lowest_empty = none,
                          .gap = none,
                          .gap_ratio = none,
                          .gap_ratio_error = none,
                          .resolution = relative * sv_sparse_norm_bound(&sample->hamiltonian)};
    sv_status status = check_electrons(context, &w);
    if (status == SV_OK)
        status = make_levels(context, &w);
    if (status == SV_OK)
        status = make_gap_ratio(context, &w);
    if (status == SV_OK)
        status = make_density(context, &w);
    sv_give(context, w.values);
    if (status == SV_OK)
        *ret_spectrum = w.out;
    else
        sv_spectrum_free(context, &w.out);
    return status;
}
