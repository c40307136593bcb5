/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Localizer index: the half signature of the spectral localizer from inertia, with its verdict. */
#include "marker_internal.h"

#include <math.h>
#include <string.h>

enum { AT, KAPPA, THRESHOLD, GAP };

/* Relative error of the reported gap. */
static const double GAP_ACCURACY = 1e-7;

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
    /* Inside the threshold the level is looked for from 0, or from beside it if that is singular.
     */
    if (!open) {
        shift = 0.0;
        status = sv_inertia_factor(context, w->plan, &w->matrix, shift, &above);
        if (status == SV_OK && above.replaced > 0) {
            shift = 1e-3 * w->threshold;
            status = sv_inertia_factor(context, w->plan, &w->matrix, shift, &above);
        }
        if (status != SV_OK)
            return status;
    }
    status = sv_inertia_levels_near(context, w->plan, &above, shift, GAP_ACCURACY, 0.0, &levels);
    if (status == SV_OK)
        w->lowest = fmin(fabs(levels.below), fabs(levels.above));
    return status;
}

/* Is the localizer gap larger than the pristine one? */
static sv_status exceeds_gap(sv_context *context, localizer_work *w, bool *ret_exceeds)
{
    sv_inertia one;
    *ret_exceeds = w->gap > 0.0;
    if (w->gap > 0.0 && w->want_value)
        *ret_exceeds = w->lowest > w->gap;
    if (!*ret_exceeds || w->want_value)
        return SV_OK;
    for (int side = 1; side >= -1; side -= 2) {
        sv_status status = sv_inertia_factor(context, w->plan, &w->matrix, side * w->gap, &one);
        if (status != SV_OK)
            return status;
        *ret_exceeds = *ret_exceeds && one.negative == w->negative;
    }
    return SV_OK;
}

/*
 * How far down the index must not change: κ/2. A localizer gap above g is found in trivial phases,
 * but also where κ is too large and the integer wrong: then down to a quarter of 2g/ρ, and at least
 * to κ/4.
 */
static sv_status least_kappa(sv_context *context, localizer_work *w, double *ret_kappa)
{
    bool exceeds = false;
    sv_status status = exceeds_gap(context, w, &exceeds);
    if (status != SV_OK)
        return status;
    *ret_kappa = 0.5 * w->kappa;
    if (exceeds) {
        double radius = sv_localizer_radius(w->sample->flake, w->at);
        *ret_kappa = fmin(0.25 * w->kappa, 0.5 * w->gap / fmax(radius, 1.0));
    }
    return SV_OK;
}

/* Follows the index from κ/2 down by halves; false when it changes or cannot be decided. */
static sv_status follow_index(sv_context *context, localizer_work *w, double least,
                              sv_outcome *outcome, bool *ret_steady)
{
    sv_inertia_count count;
    *ret_steady = true;
    for (double kappa = 0.5 * w->kappa; *ret_steady; kappa *= 0.5) {
        sv_sparse_free(context, &w->matrix);
        sv_status status =
            sv_localizer_matrix(context, w->sample, w->energy, kappa, w->at, &w->matrix);
        if (status == SV_OK)
            status = sv_inertia_count_below(context, w->plan, &w->matrix, 0.0, &count);
        if (status != SV_OK)
            return status;
        *ret_steady = count.decided && count.below == w->negative;
        if (!*ret_steady)
            UNRESOLVED(outcome, "the index differs between kappa %.3g and %.3g", w->kappa, kappa);
        if (kappa <= least * (1.0 + 1e-12))
            break;
    }
    return SV_OK;
}

static sv_status judge(sv_context *context, localizer_work *w, sv_outcome *outcome)
{
    bool steady = false;
    double least;
    sv_status status = certify(context, w, outcome);
    if (status != SV_OK)
        return status;
    outcome->margin = w->want_value ? w->lowest : w->certain;
    if (!(w->certain > 0.0))
        return SV_OK;
    if ((status = least_kappa(context, w, &least)) != SV_OK ||
        (status = follow_index(context, w, least, outcome, &steady)) != SV_OK)
        return status;
    if (!steady)
        return SV_OK;
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
