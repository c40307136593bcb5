/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The levels next to the Fermi energy of a sample by state counts, for engines that do not meet
 * them on their way. */
#include "projector_internal.h"

#include <float.h>
#include <math.h>

/* First distance of a shift from a level that cannot be told from the Fermi energy, over the norm:
 * far enough for an accurate factor, near enough for that level to be the nearest. */
static const double FIRST_OFFSET = 1e-8;
static const double LAST_OFFSET = 1e-5;

double sv_levels_resolution(const sv_sparse *h)
{
    double relative = fmax(1e-12, 4.0 * DBL_EPSILON * (double)h->n);
    return relative * fmax(sv_sparse_norm_bound(h), DBL_MIN / DBL_EPSILON);
}

static void note_neighbours(const sv_inertia_levels *near, sv_levels *levels)
{
    levels->has_highest = isfinite(near->below);
    levels->has_lowest = isfinite(near->above);
    levels->highest_occupied = near->below;
    levels->lowest_empty = near->above;
}

/* Any shift between the neighbouring levels serves; one right at the energy can make leading blocks
 * of a clean flake singular, and then another is tried. */
static sv_status levels_beside(sv_context *context, sv_inertia_plan *plan, const sv_sparse *h,
                               double tolerance, sv_levels *levels)
{
    sv_inertia_levels near;
    double energy = levels->fermi_energy, shift = energy;
    for (int round = 1; round <= 4; round++) {
        sv_inertia inertia;
        sv_status status;
        if ((status = sv_inertia_factor(context, plan, h, shift, &inertia)) != SV_OK ||
            (status = sv_inertia_levels_near(context, plan, &inertia, shift, tolerance, (double)NAN,
                                             &near)) != SV_OK)
            return status;
        double distance = fmin(shift - near.below, near.above - shift);
        if (!isfinite(distance) || inertia.error < 1e-6 * distance)
            break;
        shift = energy + 0.03 * round * distance;
    }
    note_neighbours(&near, levels);
    return SV_OK;
}

/* The count left it open: levels as seen from a little above, which shows whether one of them is on
 * the Fermi energy or the factorisation there was a bad one. */
static sv_status levels_on(sv_context *context, sv_inertia_plan *plan, const sv_sparse *h,
                           sv_levels *levels)
{
    const double unit = sv_sparse_norm_bound(h);
    for (double offset = FIRST_OFFSET; offset < 2.0 * LAST_OFFSET; offset *= 10.0) {
        sv_inertia inertia;
        sv_inertia_levels near;
        double energy = levels->fermi_energy, shift = energy + offset * unit;
        sv_status status = sv_inertia_factor(context, plan, h, shift, &inertia);
        if (status == SV_OK)
            status = sv_inertia_levels_near(context, plan, &inertia, shift, 1e-6, energy, &near);
        if (status != SV_OK)
            return status;
        double below = fabs(energy - near.below), above = fabs(near.above - energy);
        double error = below < above ? near.error_below : near.error_above;
        levels->on_level = fmin(below, above) <= fmax(levels->resolution, error);
        note_neighbours(&near, levels);
        if (error <= levels->resolution)
            break;
    }
    return SV_OK;
}

static sv_status levels_at_energy(sv_context *context, sv_inertia_plan *plan, const sv_sparse *h,
                                  double tolerance, sv_levels *levels)
{
    sv_inertia_count count;
    sv_status status = sv_inertia_count_below(context, plan, h, levels->fermi_energy, &count);
    if (status != SV_OK)
        return status;
    levels->occupied = count.decided ? count.below : count.low;
    return count.decided ? levels_beside(context, plan, h, tolerance, levels)
                         : levels_on(context, plan, h, levels);
}

static sv_status levels_at_filling(sv_context *context, sv_inertia_plan *plan, const sv_sparse *h,
                                   int64_t electrons, sv_levels *levels)
{
    sv_fermi_level fermi;
    sv_status status = sv_inertia_fermi_energy(context, plan, h, electrons, &fermi);
    if (status != SV_OK)
        return status;
    levels->fermi_energy = fermi.energy;
    levels->occupied = electrons;
    levels->on_level = fermi.on_level;
    levels->has_highest = isfinite(fermi.highest_occupied);
    levels->has_lowest = isfinite(fermi.lowest_empty);
    levels->highest_occupied = fermi.highest_occupied;
    levels->lowest_empty = fermi.lowest_empty;
    return SV_OK;
}

sv_status sv_levels_find(sv_context *context, const sv_sample *sample,
                         const sv_occupation *occupation, double tolerance, sv_levels *ret_levels)
{
    const sv_sparse *h = &sample->hamiltonian;
    sv_levels levels = {.fermi_energy = occupation->fermi_energy,
                        .resolution = sv_levels_resolution(h)};
    sv_inertia_plan *plan = NULL;
    int64_t electrons = sv_occupation_electrons(occupation, sample->n);
    if (occupation->by != SV_BY_ENERGY && (electrons < 0 || electrons > sample->n))
        return SV_FAIL(context, SV_UNDEFINED, "%lld electrons do not fit into %lld states",
                       (long long)electrons, (long long)sample->n);
    sv_status status = sv_inertia_plan_make(context, h, 1, &plan);
    if (status == SV_OK)
        status = occupation->by == SV_BY_ENERGY
                     ? levels_at_energy(context, plan, h, tolerance, &levels)
                     : levels_at_filling(context, plan, h, electrons, &levels);
    sv_inertia_plan_free(context, plan);
    if (status == SV_OK)
        *ret_levels = levels;
    return status;
}

double sv_levels_distance(const sv_levels *levels)
{
    double distance = (double)INFINITY;
    if (levels->has_highest)
        distance = fabs(levels->fermi_energy - levels->highest_occupied);
    if (levels->has_lowest)
        distance = fmin(distance, fabs(levels->lowest_empty - levels->fermi_energy));
    return distance;
}
