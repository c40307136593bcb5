/* SPDX-License-Identifier: GPL-3.0-or-later */
/* κ and τ of a localizer from the clean model and the flake: one pair for a whole run. */
#include "localizer_internal.h"

#include <math.h>

/* Probes nearer to the edge than this (lattice constants) see no bulk. */
static const double LEAST_RADIUS = 1.0;
/* Gaps below this share of the bandwidth count as none. */
static const double LEAST_GAP = 1e-3;

static bool has_orbital(const sv_flake *flake, int32_t i, int32_t j, int orbital)
{
    if (i < flake->low[0] || i > flake->high[0] || j < flake->low[1] || j > flake->high[1])
        return false;
    sv_index width = flake->high[1] - flake->low[1] + 1;
    int32_t cell = flake->cell_at[(i - flake->low[0]) * width + (j - flake->low[1])];
    if (cell < 0)
        return false;
    const sv_cell *c = &flake->cells[cell];
    for (int32_t s = 0; s < c->n_sites; s++)
        if (flake->sites[c->first_site + s].orbital == orbital)
            return true;
    return false;
}

/* Distance from a point to the nearest missing site among the cells low … high. */
static double nearest_missing(const sv_flake *flake, const double at[2], const int32_t low[2],
                              const int32_t high[2])
{
    const sv_model *model = flake->model;
    double nearest = INFINITY;
    for (int32_t i = low[0]; i <= high[0]; i++)
        for (int32_t j = low[1]; j <= high[1]; j++)
            for (int o = 0; o < model->n_orbitals; o++) {
                const double *in_cell = model->orbitals[o].at;
                double x = i * model->vectors[0][0] + j * model->vectors[1][0] + in_cell[0] - at[0];
                double y = i * model->vectors[0][1] + j * model->vectors[1][1] + in_cell[1] - at[1];
                double d = hypot(x, y);
                if (d < nearest && !has_orbital(flake, i, j, o))
                    nearest = d;
            }
    return nearest;
}

double sv_localizer_radius(const sv_flake *flake, const double at[2])
{
    const int32_t rim = 2;
    double uv[2];
    int32_t low[2], high[2], here[2][2];
    if (flake->spec.structure != NULL)
        return fabs(sv_structure_depth(flake->spec.structure, at));
    sv_model_reduce(flake->model, at, uv);
    for (int d = 0; d < 2; d++) {
        low[d] = flake->low[d] - rim;
        high[d] = flake->high[d] + rim;
        double cell = fmin(fmax(floor(uv[d]), -1e9), 1e9);
        here[0][d] = (int32_t)cell - rim;
        here[1][d] = (int32_t)cell + rim;
    }
    /* Far outside the missing sites of the flake's own surroundings are not the nearest ones. */
    return fmin(nearest_missing(flake, at, low, high),
                nearest_missing(flake, at, here[0], here[1]));
}

/* Half width of the pristine gap that holds the Fermi energy; 0: none, or not known. */
static sv_status pristine_gap(sv_context *context, const sv_flake *flake,
                              const sv_occupation *occupation, double *ret_gap)
{
    sv_status status;
    double gap = 0.0, edge[2];
    if (occupation->by == SV_BY_ENERGY) {
        status = sv_model_spectral_distance(context, flake->model, occupation->fermi_energy, &gap);
    } else {
        double sites = (double)flake->n_sites;
        double filling = occupation->by == SV_BY_FILLING ? occupation->filling
                                                         : (double)occupation->electrons / sites;
        status = sv_model_filling_gap(context, flake->model, filling, 1.0 / sites, edge);
        if (status == SV_OK)
            gap = fmax(0.0, 0.5 * (edge[1] - edge[0]));
    }
    if (status != SV_OK && status != SV_UNDEFINED)
        return status;
    if (status == SV_UNDEFINED || !(gap > LEAST_GAP * sv_model_norm_bound(flake->model)))
        gap = 0.0;
    /* Beyond all bands any size of gap is true; the bandwidth is as large as makes sense. */
    *ret_gap = fmin(gap, sv_model_norm_bound(flake->model));
    return SV_OK;
}

sv_status sv_localizer_prepare(sv_context *context, const sv_flake *flake,
                               const sv_occupation *occupation, sv_value *values)
{
    double gap = 0.0;
    sv_status status = pristine_gap(context, flake, occupation, &gap);
    if (status != SV_OK)
        return status;
    const double *at = values[AT].has_auto ? flake->centre : values[AT].real;
    if (values[KAPPA].has_auto) {
        double radius = sv_localizer_radius(flake, at);
        values[KAPPA].real[0] = gap > 0.0 && radius >= LEAST_RADIUS ? 2.0 * gap / radius : 0.0;
    }
    if (values[THRESHOLD].has_auto)
        values[THRESHOLD].real[0] = 0.25 * gap;
    values[KAPPA].real[1] = gap;
    values[KAPPA].count = 2;
    return SV_OK;
}
