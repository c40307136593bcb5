/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Density response: how many states pass below the Fermi energy per flux quantum. Counts only. */
#include "marker_internal.h"

#include <math.h>

#define UNRESOLVED(outcome, ...) snprintf((outcome)->reason, sizeof(outcome)->reason, __VA_ARGS__)

/* Relative error of the levels next to the Fermi energy. */
static const double LEVEL_ACCURACY = 1e-6;

typedef struct response {
    const sv_sample *sample;
    sv_inertia_plan *plan;
    double energy;
    sv_index below;         /* without the flux */
    double low[2], high[2]; /* range of the level below and of the level above over all fluxes */
} response;

static void note_levels(response *r, double below, double above)
{
    const double level[2] = {below, above};
    for (int side = 0; side < 2; side++)
        if (isfinite(level[side])) { /* fmin() passes over what is not there */
            r->low[side] = fmin(r->low[side], level[side]);
            r->high[side] = fmax(r->high[side], level[side]);
        }
}

/* Distance of the nearest level, and how far the two levels next to the energy move. */
static void measure(const response *r, sv_outcome *outcome)
{
    outcome->margin = fmin(r->energy - r->high[0], r->low[1] - r->energy);
    outcome->weakest = fmax(r->high[0] - r->low[0], r->high[1] - r->low[1]);
}

/* States gained with so many quanta more. */
static sv_status gain(sv_context *context, response *r, int quanta, sv_outcome *outcome,
                      int64_t *ret_gain, bool *ret_decided)
{
    sv_sparse h = {0};
    sv_inertia_count count;
    sv_inertia inertia;
    sv_inertia_levels levels;
    sv_status status = sv_sample_add_flux(context, r->sample, quanta, &h);
    if (status == SV_OK)
        status = sv_inertia_count_below(context, r->plan, &h, r->energy, &count);
    if (status != SV_OK)
        goto out;
    *ret_decided = count.decided;
    *ret_gain = count.below - r->below;
    if (!count.decided) {
        UNRESOLVED(outcome, "with %+d flux quanta a level lies on the Fermi energy %.6g", quanta,
                   r->energy);
        goto out;
    }
    if ((status = sv_inertia_factor(context, r->plan, &h, r->energy, &inertia)) == SV_OK)
        status = sv_inertia_levels_near(context, r->plan, &inertia, r->energy, LEVEL_ACCURACY,
                                        (double)NAN, &levels);
    if (status == SV_OK)
        note_levels(r, levels.below, levels.above);
out:
    sv_sparse_free(context, &h);
    return status;
}

/* The same number of states per quantum for every flux tried, or the first that disagrees. */
static sv_status compare(sv_context *context, response *r, sv_outcome *outcome)
{
    static const int tried[] = {1, -1, 2, -2};
    int64_t first = 0;
    for (size_t k = 0; k < sizeof tried / sizeof tried[0]; k++) {
        int64_t gained = 0;
        bool decided = false;
        sv_status status = gain(context, r, tried[k], outcome, &gained, &decided);
        if (status != SV_OK || !decided)
            return status;
        if (k == 0)
            first = gained;
        if (gained != tried[k] * first) {
            measure(r, outcome);
            UNRESOLVED(outcome,
                       "the response is not linear: %+lld states for one flux quantum, %+lld for "
                       "%+d; levels near the Fermi energy move across it",
                       (long long)first, (long long)gained, tried[k]);
            return SV_OK;
        }
    }
    measure(r, outcome);
    /* Levels that move across come in numbers that look like a response. */
    if (!(outcome->margin > outcome->weakest) && isfinite(outcome->margin)) {
        UNRESOLVED(
            outcome,
            "the flux moves the levels next to the Fermi energy by %.3g, and the nearest one "
            "is %.3g away",
            outcome->weakest, outcome->margin);
        return SV_OK;
    }
    outcome->verdict = SV_RESOLVED;
    outcome->index = first;
    outcome->value = (double)first;
    return SV_OK;
}

sv_status sv_density_response(sv_context *context, const sv_marker_input *input,
                              sv_outcome *ret_outcome)
{
    sv_outcome outcome = sv_outcome_blank();
    response r = {.sample = input->sample, .low = {NAN, NAN}, .high = {NAN, NAN}};
    const sv_sparse *h = &input->sample->hamiltonian;
    bool good = false;
    snprintf(outcome.engine, sizeof outcome.engine, "inertia");
    outcome.numerical_error = 0.0;
    sv_status status = sv_inertia_plan_make(context, h, 1, &r.plan);
    if (status == SV_OK)
        status = sv_energy_place(context, r.plan, h, input->occupation, &outcome, &r.energy, &good);
    if (status == SV_OK && good) {
        r.below = outcome.electrons;
        note_levels(&r, outcome.highest_occupied, outcome.lowest_empty);
        status = compare(context, &r, &outcome);
    }
    sv_inertia_plan_free(context, r.plan);
    if (status == SV_OK)
        *ret_outcome = outcome;
    return status;
}
