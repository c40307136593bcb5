/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Spectral flow: one flux quantum is put through the hole of a ring, and the levels that pass the
 * Fermi energy at either edge are counted with their sign. */
#include "flow_internal.h"

#include <math.h>
#include <string.h>

enum { STEPS, ENERGY_WINDOW };
enum { MOST_FLUXES = 600 };

/* Steps are halved down to this part of a quantum. */
static const double FINEST = 1.0 / 8192.0;
/* Share of the norm bound that is looked at when the window is left open. */
static const double WINDOW = 0.05;
/* Flux to begin with: symmetric rings have levels cross at simple fractions of a quantum. */
static const double FIRST = 0.0131;
/* A crossing level belongs to an edge with this weight near it. */
static const double LEAST_SIDE = 0.75;
/* … and with at most this coupling to levels of the other edge, over the spacing of the levels:
 * otherwise they repel each other and no level gets across. */
static const double MOST_COUPLING = 0.15;

#define UNRESOLVED(outcome, ...) snprintf((outcome)->reason, sizeof(outcome)->reason, __VA_ARGS__)

typedef struct flow {
    flow_ring ring;
    double half_width, step;
    int rise[2], fluxes;
    double kept, side, coupling;
    sv_flow_trace *trace; /* or NULL */
} flow;

/* The levels of one flux join the trace. */
static sv_status note_levels(sv_context *context, flow *f, const flow_levels *l)
{
    sv_flow_trace *trace = f->trace;
    if (trace == NULL)
        return SV_OK;
    if (trace->count + l->count > trace->room) {
        sv_index room = 2 * (trace->count + l->count);
        sv_flow_level *levels = NULL;
        sv_status status = sv_take_raw(context, room, sizeof *levels, &levels);
        if (status != SV_OK)
            return status;
        if (trace->count > 0)
            memcpy(levels, trace->levels, (size_t)trace->count * sizeof *levels);
        sv_give(context, trace->levels);
        trace->levels = levels;
        trace->room = room;
    }
    for (int k = 0; k < l->count; k++)
        trace->levels[trace->count++] = (sv_flow_level){l->flux, l->energies[k], l->weights[k]};
    trace->fluxes++;
    trace->most = l->count > trace->most ? l->count : trace->most;
    return SV_OK;
}

static sv_status find_levels(sv_context *context, flow *f, double flux, flow_levels *ret_levels)
{
    if (sv_cancelled(context))
        return SV_FAIL(context, SV_INTERRUPTED, "stopped during the spectral flow");
    f->fluxes++;
    sv_progress(context, "spectral flow", (sv_index)floor(1000.0 * (flux - FIRST)), 1000);
    return sv_flow_levels_find(context, &f->ring, flux, f->half_width, ret_levels);
}

/* From the levels at one flux to those of the next, as far as they can be followed. */
static sv_status advance(sv_context *context, flow *f, flow_levels *here, bool *ret_done)
{
    flow_levels there = {0};
    flow_step step = {0};
    double stride = fmin(f->step, 0.5 * here->half_width / fmax(f->ring.speed, 1e-300));
    for (;; stride *= 0.5) {
        double flux = fmin(here->flux + stride, FIRST + 1.0);
        if (f->fluxes >= MOST_FLUXES || stride < FINEST) {
            *ret_done = false;
            return SV_OK;
        }
        sv_status status = find_levels(context, f, flux, &there);
        if (status == SV_OK)
            status = sv_flow_step_follow(context, &f->ring, here, &there, &step);
        if (status != SV_OK) {
            sv_flow_levels_free(context, &there);
            return status;
        }
        if (step.followed)
            break;
        sv_flow_levels_free(context, &there);
    }
    for (int part = 0; part < 2; part++)
        f->rise[part] += step.rise[part];
    f->kept = fmin(f->kept, step.kept);
    f->side = fmin(f->side, step.side);
    f->coupling = fmax(f->coupling, step.coupling);
    sv_flow_levels_free(context, here);
    *here = there;
    *ret_done = true;
    return note_levels(context, f, here);
}

static void judge(const flow *f, sv_outcome *outcome)
{
    outcome->margin = f->side;
    outcome->weakest = f->kept;
    if (f->rise[0] + f->rise[1] != 0)
        UNRESOLVED(outcome,
                   "%+d levels rise at the hole and %+d at the outline: together they must be none",
                   f->rise[0], f->rise[1]);
    else if (f->side < LEAST_SIDE)
        UNRESOLVED(
            outcome,
            "a level passes the Fermi energy with only %.2f of its weight on its side of the "
            "ring",
            f->side);
    else if (f->coupling > MOST_COUPLING)
        UNRESOLVED(outcome,
                   "levels of the two edges repel each other: coupling %.2f of their spacing",
                   f->coupling);
    else {
        outcome->verdict = SV_RESOLVED;
        outcome->index = f->rise[0];
        outcome->value = (double)f->rise[0];
    }
}

static sv_status follow(sv_context *context, flow *f, sv_outcome *outcome)
{
    flow_levels here = {0};
    bool done = true;
    sv_status status = find_levels(context, f, FIRST, &here);
    if (status == SV_OK)
        status = note_levels(context, f, &here);
    while (status == SV_OK && done && here.flux < FIRST + 1.0)
        status = advance(context, f, &here, &done);
    if (status == SV_OK && !done)
        UNRESOLVED(outcome, "the levels cannot be followed at flux %.4f, not in %d steps%s",
                   here.flux, f->fluxes, f->fluxes < MOST_FLUXES ? " down to 1/8192" : "");
    else if (status == SV_OK)
        judge(f, outcome);
    sv_flow_levels_free(context, &here);
    return status;
}

static sv_status start(sv_context *context, const sv_marker_input *input, flow *f,
                       sv_outcome *outcome, bool *ret_good)
{
    const sv_sample *sample = input->sample;
    const sv_value *window = &input->values[ENERGY_WINDOW];
    sv_inertia_plan *plan = NULL;
    double energy = 0.0;
    sv_status status = sv_inertia_plan_make(context, &sample->hamiltonian, 1, &plan);
    if (status == SV_OK)
        status = sv_energy_place(context, plan, &sample->hamiltonian, input->occupation, outcome,
                                 &energy, ret_good);
    sv_inertia_plan_free(context, plan);
    if (status != SV_OK || !*ret_good)
        return status;
    f->half_width = window->has_auto || !(window->real[0] > 0.0)
                        ? WINDOW * sv_model_norm_bound(sample->flake->model)
                        : window->real[0];
    f->step =
        1.0 / (double)(input->values[STEPS].integer[0] > 0 ? input->values[STEPS].integer[0] : 16);
    return sv_flow_ring_make(context, sample, energy, &f->ring);
}

static sv_status compute(sv_context *context, const sv_marker_input *input, sv_flow_trace *trace,
                         sv_outcome *ret_outcome)
{
    sv_outcome outcome = sv_outcome_blank();
    flow f = {.kept = 1.0, .side = 1.0, .trace = trace};
    double hole[2];
    bool good = false;
    snprintf(outcome.engine, sizeof outcome.engine, "near states");
    outcome.numerical_error = 0.0;
    if (!sv_flake_hole(input->sample->flake, hole)) {
        outcome.verdict = SV_ABSENT;
        UNRESOLVED(
            &outcome,
            "spectral flow needs a flake with exactly one hole: an annulus, or a polygon with "
            "one hole");
        *ret_outcome = outcome;
        return SV_OK;
    }
    sv_status status = start(context, input, &f, &outcome, &good);
    if (status == SV_OK && good)
        status = follow(context, &f, &outcome);
    if (status == SV_NOT_CONVERGED) {
        UNRESOLVED(&outcome, "%.190s", context->error.message);
        status = SV_OK;
    }
    if (trace != NULL)
        trace->fermi_energy = f.ring.energy;
    sv_flow_ring_free(context, &f.ring);
    if (status == SV_OK)
        *ret_outcome = outcome;
    return status;
}

sv_status sv_spectral_flow(sv_context *context, const sv_marker_input *input,
                           sv_outcome *ret_outcome)
{
    return compute(context, input, NULL, ret_outcome);
}

sv_status sv_spectral_flow_trace(sv_context *context, const sv_marker_input *input,
                                 sv_outcome *ret_outcome, sv_flow_trace *ret_trace)
{
    sv_flow_trace trace = {0};
    sv_status status = compute(context, input, &trace, ret_outcome);
    if (status == SV_OK)
        *ret_trace = trace;
    else
        sv_flow_trace_free(context, &trace);
    return status;
}

void sv_flow_trace_free(sv_context *context, sv_flow_trace *trace)
{
    sv_give(context, trace->levels);
    *trace = (sv_flow_trace){0};
}
