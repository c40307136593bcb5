/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The Fermi energy without a projector: counts of states, and the levels on either side. */
#include "marker_internal.h"

#include <math.h>

/* Relative error of the levels next to the Fermi energy. */
static const double LEVEL_ACCURACY = 1e-6;

static double known(double level)
{
    return isfinite(level) ? level : (double)NAN;
}

static sv_status at_energy(sv_context *context, sv_inertia_plan *plan, const sv_sparse *h,
                           double energy, sv_outcome *outcome, bool *ret_good)
{
    sv_inertia_count count;
    sv_inertia inertia;
    sv_inertia_levels levels;
    sv_status status = sv_inertia_count_below(context, plan, h, energy, &count);
    if (status != SV_OK)
        return status;
    *ret_good = count.decided;
    outcome->electrons = count.decided ? count.below : -1;
    if (!count.decided) {
        snprintf(outcome->reason, sizeof outcome->reason,
                 "a level coincides with the Fermi energy %.6g (within %.1e): choose a filling, a "
                 "number of electrons or another energy",
                 energy, count.width);
        return SV_OK;
    }
    if ((status = sv_inertia_factor(context, plan, h, energy, &inertia)) != SV_OK ||
        (status = sv_inertia_levels_near(context, plan, &inertia, energy, LEVEL_ACCURACY,
                                         (double)NAN, &levels)) != SV_OK)
        return status;
    outcome->highest_occupied = known(levels.below);
    outcome->lowest_empty = known(levels.above);
    return SV_OK;
}

sv_status sv_energy_place(sv_context *context, sv_inertia_plan *plan, const sv_sparse *h,
                          const sv_occupation *occupation, sv_outcome *outcome, double *ret_energy,
                          bool *ret_good)
{
    sv_fermi_level fermi;
    if (occupation->by == SV_BY_ENERGY) {
        *ret_energy = occupation->fermi_energy;
        return at_energy(context, plan, h, *ret_energy, outcome, ret_good);
    }
    outcome->electrons = sv_occupation_electrons(occupation, h->n);
    if (outcome->electrons > h->n)
        return SV_FAIL(context, SV_UNDEFINED, "%lld electrons are more than the %lld states left",
                       (long long)outcome->electrons, (long long)h->n);
    sv_status status = sv_inertia_fermi_energy(context, plan, h, outcome->electrons, &fermi);
    if (status != SV_OK)
        return status;
    *ret_energy = fermi.energy;
    *ret_good = !fermi.on_level;
    outcome->highest_occupied = known(fermi.highest_occupied);
    outcome->lowest_empty = known(fermi.lowest_empty);
    if (fermi.on_level)
        snprintf(outcome->reason, sizeof outcome->reason,
                 "the last electron goes into a degenerate level at %.6g", fermi.energy);
    return SV_OK;
}
