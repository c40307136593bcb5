/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Localizer index at one point: settings, Fermi energy, matrix; the verdict is in
 * localizer_verdict.c. */
#include "localizer_internal.h"

#include <math.h>
#include <string.h>

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
    sv_inertia_count count;
    sv_fermi_level fermi;
    sv_status status = sv_inertia_plan_make(context, h, 1, &w->plan);
    if (status != SV_OK)
        return status;
    *ret_degenerate = false;
    if (occupation->by == SV_BY_ENERGY) {
        w->energy = occupation->fermi_energy;
        status = sv_inertia_count_below(context, w->plan, h, w->energy, &count);
        if (status == SV_OK)
            outcome->electrons = count.below;
    } else {
        outcome->electrons = electrons_of(occupation, h->n);
        status = sv_inertia_fermi_energy(context, w->plan, h, outcome->electrons, &fermi);
        if (status == SV_OK) {
            w->energy = fermi.energy;
            *ret_degenerate = fermi.on_level;
            outcome->highest_occupied = fermi.highest_occupied;
            outcome->lowest_empty = fermi.lowest_empty;
        }
    }
    return status;
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

void sv_localizer_end(sv_context *context, localizer_work *w)
{
    sv_inertia_plan_free(context, w->plan);
    sv_sparse_free(context, &w->matrix);
    w->plan = NULL;
}

sv_status sv_localizer_begin(sv_context *context, const sv_marker_input *input, localizer_work *w,
                             sv_outcome *outcome, bool *ret_ready)
{
    bool degenerate = false;
    sv_status status;
    *w = (localizer_work){.sample = input->sample};
    *outcome = sv_outcome_blank();
    snprintf(outcome->engine, sizeof outcome->engine, "inertia");
    if ((status = read_settings(context, input, w)) != SV_OK ||
        (status = place_energy(context, input, w, &degenerate, outcome)) != SV_OK) {
        sv_localizer_end(context, w);
        return status;
    }
    outcome->kappa = w->kappa > 0.0 ? w->kappa : (double)NAN;
    outcome->numerical_error = 0.0;
    if (degenerate)
        UNRESOLVED(outcome, "the last electron goes into a degenerate level at %.6g", w->energy);
    *ret_ready = !degenerate && !lacks_scale(w, outcome);
    if (!*ret_ready)
        return SV_OK;
    status = sv_localizer_matrix(context, w->sample, w->energy, w->kappa, w->at, &w->matrix);
    if (status == SV_OK)
        status = sv_inertia_plan_regroup(context, w->plan, 2);
    if (status != SV_OK)
        sv_localizer_end(context, w);
    return status;
}

sv_status sv_localizer_index(sv_context *context, const sv_marker_input *input,
                             sv_outcome *ret_outcome)
{
    sv_outcome outcome;
    localizer_work w;
    bool ready = false;
    sv_status status = sv_localizer_begin(context, input, &w, &outcome, &ready);
    if (status == SV_OK && ready)
        status = sv_localizer_judge(context, &w, &outcome);
    if (status == SV_OK)
        *ret_outcome = outcome;
    sv_localizer_end(context, &w);
    return status;
}
