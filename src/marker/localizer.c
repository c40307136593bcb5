/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Localizer index: the half signature of the spectral localizer from inertia, with its verdict. */
#include "marker_internal.h"

#include <math.h>
#include <string.h>

enum { AT, KAPPA, THRESHOLD, GAP };

/* A probe farther than this from every site is outside the flake, lattice constants. */
static const double OUTSIDE = 1.0;

typedef struct localizer_work {
    const sv_sample *sample;
    double at[2], energy, kappa, threshold;
    double gap; /* of the pristine torus, from its Fermi energy; 0: none */
    bool want_value;
    sv_inertia_plan *plan;
    sv_sparse matrix;
    sv_index negative;      /* of the localizer */
    double certain, lowest; /* its gap is at least / is */
} localizer_work;

#define UNRESOLVED(outcome, ...) snprintf((outcome)->reason, sizeof(outcome)->reason, __VA_ARGS__)

static sv_status read_settings(sv_context *context, const sv_marker_input *input, localizer_work *w)
{
    sv_value values[GAP + 1];
    memcpy(values, input->values, sizeof values);
    if (values[KAPPA].count != 2) {
        sv_status status =
            sv_localizer_prepare(context, input->sample->flake, input->occupation, values);
        if (status != SV_OK)
            return status;
    }
    const double *at = values[AT].has_auto ? input->sample->flake->centre : values[AT].real;
    memcpy(w->at, at, sizeof w->at);
    w->kappa = values[KAPPA].real[0];
    w->gap = values[KAPPA].real[1];
    w->threshold = values[THRESHOLD].real[0];
    w->want_value = values[GAP].text == NULL || strcmp(values[GAP].text, "bound") != 0;
    return SV_OK;
}

/* Electrons as in sv_occupation: nearest integer, ties up; the nudge absorbs 0.3·10 = 2.9999…. */
static sv_index electrons_of(const sv_occupation *occupation, sv_index n)
{
    if (occupation->by == SV_BY_ELECTRONS)
        return occupation->electrons;
    return (sv_index)floor(occupation->filling * (double)n + 0.5 + 1e-9);
}

/* The Fermi energy and the number of electrons, by inertia of H. */
static sv_status place_energy(sv_context *context, const sv_marker_input *input, localizer_work *w,
                              bool *ret_degenerate, sv_outcome *outcome)
{
    const sv_sparse *h = &input->sample->hamiltonian;
    const sv_occupation *occupation = input->occupation;
    sv_inertia_plan *plan = NULL;
    sv_inertia_count count;
    sv_fermi_level fermi;
    sv_status status = sv_inertia_plan_make(context, h, 1, &plan);
    if (status != SV_OK)
        return status;
    *ret_degenerate = false;
    if (occupation->by == SV_BY_ENERGY) {
        w->energy = occupation->fermi_energy;
        status = sv_inertia_count_below(context, plan, h, w->energy, &count);
        if (status == SV_OK)
            outcome->electrons = count.below;
    } else {
        outcome->electrons = electrons_of(occupation, h->n);
        status = sv_inertia_fermi_energy(context, plan, h, outcome->electrons, &fermi);
        if (status == SV_OK) {
            w->energy = fermi.energy;
            *ret_degenerate = fermi.on_level;
            outcome->highest_occupied = fermi.highest_occupied;
            outcome->lowest_empty = fermi.lowest_empty;
        }
    }
    sv_inertia_plan_free(context, plan);
    return status;
}

/* Factors on both sides of 0, the upper side last. Clean flakes can have singular leading blocks at
 * special shifts: then a slightly larger one serves as well. */
static sv_status factor_both(sv_context *context, localizer_work *w, double *ret_shift,
                             sv_inertia *ret_below, sv_inertia *ret_above, double *ret_error)
{
    double shift = w->threshold;
    for (int attempt = 0;; attempt++) {
        sv_status status;
        if ((status = sv_inertia_factor(context, w->plan, &w->matrix, -shift, ret_below)) !=
                SV_OK ||
            (status = sv_inertia_factor(context, w->plan, &w->matrix, shift, ret_above)) != SV_OK)
            return status;
        *ret_error = fmax(ret_below->error, ret_above->error);
        *ret_shift = shift;
        if (*ret_error < 1e-6 * shift || attempt == 3)
            return SV_OK;
        shift *= 1.01;
    }
}

/*
 * Equal inertia at ±τ: no level in between, so the index is that of any shift there, and the levels
 * next to +τ are those next to 0.
 */
static sv_status certify(sv_context *context, localizer_work *w, sv_outcome *outcome)
{
    sv_inertia below, above;
    sv_inertia_levels levels;
    double shift, error;
    sv_status status = factor_both(context, w, &shift, &below, &above, &error);
    if (status != SV_OK)
        return status;
    bool trusted = error < 0.5 * shift, open = trusted && below.negative == above.negative;
    w->negative = above.negative;
    w->certain = open ? shift - error : 0.0;
    if (!trusted)
        UNRESOLVED(outcome, "the factorisation is too inaccurate for the threshold %.3g",
                   w->threshold);
    else if (!open)
        UNRESOLVED(outcome, "a level of the localizer lies below the threshold %.3g", shift);
    if (!w->want_value)
        return SV_OK;
    shift = open ? shift : 0.0;
    if (!open && (status = sv_inertia_factor(context, w->plan, &w->matrix, shift, &above)) != SV_OK)
        return status;
    status = sv_inertia_levels_near(context, w->plan, &above, shift, &levels);
    if (status == SV_OK)
        w->lowest = fmin(fabs(levels.below), fabs(levels.above));
    return status;
}

/* Is there a level within the pristine gap? Without one κ is too large for the flake, unless the
 * probe lies well outside and sees nothing at all. */
static sv_status gap_is_plausible(sv_context *context, localizer_work *w, bool *ret_plausible)
{
    sv_inertia one;
    double distance;
    sv_flake_nearest(w->sample->flake, w->at, &distance);
    *ret_plausible = !(w->gap > 0.0) || distance > OUTSIDE;
    if (*ret_plausible)
        return SV_OK;
    *ret_plausible = true;
    if (w->want_value) {
        *ret_plausible = w->lowest <= w->gap * (1.0 + 1e-9);
        return SV_OK;
    }
    for (int side = 1; side >= -1; side -= 2) {
        sv_status status =
            sv_inertia_factor(context, w->plan, &w->matrix, side * w->gap * (1.0 + 1e-9), &one);
        if (status != SV_OK || one.negative != w->negative)
            return status;
    }
    *ret_plausible = false;
    return SV_OK;
}

/* The index at κ/2, undecided included. */
static sv_status index_at_half(sv_context *context, localizer_work *w, sv_inertia_count *ret_count)
{
    sv_sparse_free(context, &w->matrix);
    sv_status status =
        sv_localizer_matrix(context, w->sample, w->energy, 0.5 * w->kappa, w->at, &w->matrix);
    return status == SV_OK ? sv_inertia_count_below(context, w->plan, &w->matrix, 0.0, ret_count)
                           : status;
}

static sv_status judge(sv_context *context, localizer_work *w, sv_outcome *outcome)
{
    bool plausible = false;
    sv_inertia_count half;
    sv_status status = certify(context, w, outcome);
    if (status != SV_OK)
        return status;
    outcome->margin = w->want_value ? w->lowest : w->certain;
    if (!(w->certain > 0.0))
        return SV_OK;
    if ((status = gap_is_plausible(context, w, &plausible)) != SV_OK)
        return status;
    if (!plausible) {
        UNRESOLVED(
            outcome,
            "the localizer gap exceeds the gap %.3g of the pristine torus: kappa %.3g is too "
            "large here",
            w->gap, w->kappa);
        return SV_OK;
    }
    if ((status = index_at_half(context, w, &half)) != SV_OK)
        return status;
    if (!half.decided || half.below != w->negative) {
        UNRESOLVED(outcome, "the index at kappa %.3g and at half of it disagree", w->kappa);
        return SV_OK;
    }
    outcome->verdict = SV_RESOLVED;
    outcome->index = w->negative - w->sample->n;
    outcome->value = (double)outcome->index;
    return SV_OK;
}

/* No κ or τ could be derived, and none was given. */
static bool lacks_scale(const localizer_work *w, sv_outcome *outcome)
{
    if (w->kappa > 0.0 && w->threshold > 0.0)
        return false;
    if (w->gap > 0.0)
        UNRESOLVED(outcome, "the probe lies at the edge of the flake or outside: give kappa");
    else
        UNRESOLVED(outcome, "the clean model has no gap at the Fermi energy: give %s",
                   w->kappa > 0.0 ? "threshold" : "kappa and threshold");
    return true;
}

sv_status sv_localizer_index(sv_context *context, const sv_marker_input *input,
                             sv_outcome *ret_outcome)
{
    sv_outcome outcome = sv_outcome_blank();
    localizer_work w = {.sample = input->sample};
    bool degenerate = false;
    sv_status status;
    snprintf(outcome.engine, sizeof outcome.engine, "inertia");
    if ((status = read_settings(context, input, &w)) != SV_OK ||
        (status = place_energy(context, input, &w, &degenerate, &outcome)) != SV_OK)
        goto out;
    outcome.kappa = w.kappa > 0.0 ? w.kappa : (double)NAN;
    outcome.numerical_error = 0.0;
    if (degenerate) {
        UNRESOLVED(&outcome, "the last electron goes into a degenerate level at %.6g", w.energy);
        goto done;
    }
    if (lacks_scale(&w, &outcome))
        goto done;
    if ((status = sv_localizer_matrix(context, w.sample, w.energy, w.kappa, w.at, &w.matrix)) !=
            SV_OK ||
        (status = sv_inertia_plan_make(context, &w.matrix, 2, &w.plan)) != SV_OK ||
        (status = judge(context, &w, &outcome)) != SV_OK)
        goto out;
done:
    *ret_outcome = outcome;
out:
    sv_inertia_plan_free(context, w.plan);
    sv_sparse_free(context, &w.matrix);
    return status;
}
