/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Bott index: coordinates on the torus, trivial cases, and the choice between the two ways. */
#include "bott_internal.h"
#include "marker_internal.h"

#include <stdio.h>

/* Up to this many states eigenvalues take a tenth of a second and give exact margins. */
static const sv_index EIGENVALUES_UP_TO = 256;

void sv_torus_coordinates(const sv_sample *sample, double (*uv)[2])
{
    const sv_flake *flake = sample->flake;
    const int32_t(*t)[2] = flake->period;
    double det = (double)t[0][0] * t[1][1] - (double)t[0][1] * t[1][0];
    for (sv_index r = 0; r < sample->n; r++) {
        double c[2];
        sv_model_reduce(flake->model, flake->sites[sample->pristine[r]].at, c);
        uv[r][0] = (c[0] * t[1][1] - c[1] * t[1][0]) / det;
        uv[r][1] = (c[1] * t[0][0] - c[0] * t[0][1]) / det;
    }
}

sv_status sv_bott_of_basis(sv_context *context, const sv_basis *basis, const double (*uv)[2],
                           sv_bott_method method, sv_outcome *outcome, sv_bott_method *ret_used)
{
    bool certified = false;
    if (!basis->available || basis->columns < 1)
        return SV_FAIL(context, SV_INVALID_INPUT, "a Bott index of an empty basis");
    bool series =
        method == SV_BOTT_SERIES || (method == SV_BOTT_AUTO && basis->columns > EIGENVALUES_UP_TO);
    sv_status status = series ? sv_bott_by_series(context, basis, uv, &certified, outcome) : SV_OK;
    if (status == SV_OK && !certified)
        status = sv_bott_by_eigenvalues(context, basis, uv, outcome);
    if (status == SV_OK)
        *ret_used = certified ? SV_BOTT_SERIES : SV_BOTT_EIGENVALUES;
    return status;
}

static bool trivial_filling(const sv_levels *levels, sv_index n, sv_outcome *outcome)
{
    if (levels->occupied != 0 && levels->occupied != n)
        return false;
    outcome->verdict = SV_RESOLVED;
    outcome->index = 0;
    outcome->value = 0.0;
    outcome->numerical_error = 0.0;
    snprintf(outcome->reason, sizeof outcome->reason, "%s states are occupied: 0 by convention",
             levels->occupied == 0 ? "no" : "all");
    return true;
}

sv_status sv_bott_index(sv_context *context, const sv_marker_input *input, sv_outcome *ret_outcome)
{
    sv_outcome outcome = sv_outcome_start(input->projector);
    const sv_levels *levels = sv_projector_levels(input->projector);
    sv_basis basis = {0};
    sv_bott_method used;
    double(*uv)[2] = NULL;
    sv_status status = SV_OK;
    if (!(input->sample->flake->periodic[0] && input->sample->flake->periodic[1]))
        return SV_FAIL(context, SV_UNDEFINED, "the Bott index needs a torus");
    if (levels->on_level || trivial_filling(levels, input->sample->n, &outcome))
        goto done;
    if ((status = sv_projector_occupied_basis(context, input->projector, &basis)) != SV_OK ||
        (status = sv_take_raw(context, input->sample->n, sizeof *uv, &uv)) != SV_OK)
        goto out;
    sv_torus_coordinates(input->sample, uv);
    status =
        sv_bott_of_basis(context, &basis, (const double(*)[2])uv, SV_BOTT_AUTO, &outcome, &used);
    if (status != SV_OK)
        goto out;
done:
    *ret_outcome = outcome;
out:
    sv_give(context, uv);
    return status;
}
