/* SPDX-License-Identifier: GPL-3.0-or-later */
/*
 * Potential of screened charges at a distance h from the plane. With ρ = √(r² + h²), a charge adds
 *   V(r) = q U (h/ρ) exp(−(ρ − h)/λ),
 * the screened Coulomb law scaled to U right below the charge. Random charges are q = ±1 at Poisson
 * points of density n. Campbell's theorem gives mean 2π n U h λ ⟨q⟩ and variance
 * 2π n U² h² exp(2h/λ) E1(2h/λ).
 */
#include "sample_internal.h"

#include <math.h>
#include <string.h>

#include <gsl/gsl_sf_expint.h>

static const double NEGLIGIBLE = 1e-7; /* of U */

/* Distance beyond which a charge is left out. */
static double reach_of(const sv_disorder *disorder)
{
    double h = disorder->depth, rho = h;
    while (h / rho * exp(-(rho - h) / disorder->screening) > NEGLIGIBLE)
        rho += 0.25 * disorder->screening;
    return sqrt(rho * rho - h * h);
}

static void add_charge(sv_drawing *d, const sv_disorder *disorder, const double at[2], double reach,
                       double strength)
{
    const sv_flake *flake = d->flake;
    double h = disorder->depth;
    sv_patch patch = sv_flake_patch(flake, at, reach);
    for (int32_t i = patch.low[0]; i <= patch.high[0]; i++) {
        for (int32_t j = patch.low[1]; j <= patch.high[1]; j++) {
            int32_t number = sv_flake_look_up(flake, i, j);
            if (number < 0)
                continue;
            const sv_cell *cell = &flake->cells[number];
            for (sv_index s = cell->first_site; s < cell->first_site + cell->n_sites; s++) {
                double x = flake->sites[s].at[0] - at[0], y = flake->sites[s].at[1] - at[1];
                double r2 = x * x + y * y;
                if (d->gone[s] || r2 > reach * reach ||
                    (disorder->on >= 0 && disorder->on != flake->sites[s].orbital))
                    continue;
                double rho = sqrt(r2 + h * h);
                d->potential[s] += strength * h / rho * exp(-(rho - h) / disorder->screening);
            }
        }
    }
}

/* Charges of the defects of an earlier entry; an electron gains energy near a positive one. */
static sv_status add_sources(sv_context *context, sv_drawing *d, const sv_disorder *disorder)
{
    int source = 0;
    double reach = reach_of(disorder);
    while (source < d->entry && strcmp(d->disorder[source].name, disorder->source) != 0)
        source++;
    if (source == d->entry)
        return SV_FAIL(context, SV_INVALID_INPUT, "no disorder \"%s\" stands before \"%s\"",
                       disorder->source, disorder->name);
    for (sv_index s = 0; s < d->flake->n_sites; s++) {
        if (d->taken_by[s] != source || !sv_is_first_at_position(d->flake, s))
            continue;
        add_charge(d, disorder, d->flake->sites[s].at, reach,
                   -d->disorder[source].charge * disorder->strength);
        d->inventory.placed[d->entry]++;
    }
    return SV_OK;
}

static void take_mean_off(sv_drawing *d, const sv_disorder *disorder)
{
    double mean =
        2.0 * M_PI * disorder->density * disorder->strength * disorder->depth * disorder->screening;
    for (sv_index s = 0; s < d->flake->n_sites; s++)
        if (!d->gone[s] && (disorder->on < 0 || disorder->on == d->flake->sites[s].orbital))
            d->potential[s] -= mean;
}

sv_status sv_draw_puddles(sv_context *context, sv_drawing *d, const sv_disorder *disorder,
                          const sv_stream *stream)
{
    sv_point *points = NULL;
    sv_index n = 0;
    double reach = reach_of(disorder);
    if (disorder->source[0] != '\0')
        return add_sources(context, d, disorder);
    sv_status status =
        sv_points_draw(context, d->flake, stream, disorder->density, reach, &points, &n);
    if (status != SV_OK)
        return status;
    for (sv_index k = 0; k < n; k++) {
        double u = sv_stream_uniform(stream, points[k].cell[0], points[k].cell[1], points[k].slot);
        double sign = disorder->same_sign || u < 0.5 ? 1.0 : -1.0;
        add_charge(d, disorder, points[k].at, reach, sign * disorder->strength);
    }
    if (disorder->same_sign)
        take_mean_off(d, disorder);
    for (sv_index k = 0; k < n; k++)
        d->inventory.placed[d->entry] += sv_point_on_flake(d->flake, points[k].at);
    sv_give(context, points);
    return SV_OK;
}

double sv_disorder_puddle_deviation(const sv_disorder *disorder)
{
    double x = fmax(2.0 * disorder->depth / disorder->screening, 1e-300); /* E1(0) is infinite */
    double h = disorder->depth;
    return fabs(disorder->strength) * h *
           sqrt(2.0 * M_PI * disorder->density * gsl_sf_expint_E1_scaled(x));
}
