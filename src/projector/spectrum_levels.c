/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Which states are occupied and which are next to the Fermi energy: from all eigenvalues, or by
 * inertia counts and Lanczos on the inverse. */
#include "spectrum_internal.h"

#include <float.h>
#include <math.h>
#include <stdio.h>

static double distance_to(double fermi, double energy)
{
    return fabs(energy - fermi);
}

/* Nothing is known of the occupation, and why. */
static void forget_occupation(sv_spectrum *out, sv_index low, sv_index high)
{
    out->on_level = true;
    out->states_below = -1;
    out->highest_occupied = out->lowest_empty = out->gap = (double)NAN;
    snprintf(out->reason, sizeof out->reason,
             "a level coincides with the Fermi energy %.9g: between %lld and %lld states are "
             "occupied",
             out->fermi_energy, (long long)low, (long long)high);
}

/* Sets count, neighbours and gap; ∓∞ where there is no neighbour. */
static void set_occupation(sv_spectrum *out, sv_index below, double highest, double lowest)
{
    out->states_below = below;
    out->highest_occupied = isfinite(highest) ? highest : (double)NAN;
    out->lowest_empty = isfinite(lowest) ? lowest : (double)NAN;
    out->gap = out->lowest_empty - out->highest_occupied;
    if (below == 0)
        snprintf(out->reason, sizeof out->reason, "no state is occupied");
    else if (below == out->sites)
        snprintf(out->reason, sizeof out->reason, "all states are occupied");
    else if (isnan(out->gap))
        snprintf(out->reason, sizeof out->reason,
                 "the levels next to the Fermi energy did not "
                 "converge");
}

/* ---- all eigenvalues ---- */

/* Number of levels below an energy. */
static sv_index count_below(const double *values, sv_index n, double energy)
{
    sv_index below = 0;
    while (below < n && values[below] < energy)
        below++;
    return below;
}

/* Fermi energy, count and neighbours from sorted levels. */
static void occupy(spectrum_work *w, const double *values)
{
    sv_spectrum *out = &w->out;
    sv_index n = out->sites, below;
    if (w->occupation->by == SV_BY_ENERGY) {
        out->fermi_energy = w->occupation->fermi_energy;
        below = count_below(values, n, out->fermi_energy);
    } else {
        below = sv_occupation_electrons(w->occupation, n);
        out->fermi_energy = below == 0   ? values[0] - 1.0
                            : below == n ? values[n - 1] + 1.0
                                         : 0.5 * (values[below - 1] + values[below]);
    }
    sv_index low = count_below(values, n, out->fermi_energy - out->resolution);
    sv_index high = count_below(values, n, out->fermi_energy + out->resolution);
    if (low != high)
        forget_occupation(out, low, high);
    else
        set_occupation(out, below, below > 0 ? values[below - 1] : -(double)INFINITY,
                       below < n ? values[below] : (double)INFINITY);
}

/* Called by sv_dense_eigen(): occupies, and asks for the vectors next to the Fermi energy. */
static void choose_near(const double *values, sv_index n, sv_index *first, sv_index *last,
                        void *user)
{
    spectrum_work *w = user;
    occupy(w, values);
    double fermi = w->out.fermi_energy;
    *first = *last = count_below(values, n, fermi);
    while (*last - *first < w->options->near_states && (*first > 0 || *last < n)) {
        double below = *first > 0 ? distance_to(fermi, values[*first - 1]) : (double)INFINITY;
        double above = *last < n ? distance_to(fermi, values[*last]) : (double)INFINITY;
        if (below <= above)
            (*first)--;
        else
            (*last)++;
    }
}

sv_status sv_spectrum_levels_exact(sv_context *context, spectrum_work *w)
{
    sv_index n = w->sample->n, first = 0, last = 0;
    sv_complex *a = NULL, *vectors = NULL;
    sv_status status = sv_take_raw(context, n * n, sizeof *a, &a);
    if (status == SV_OK)
        status = sv_take_raw(context, n, sizeof *w->values, &w->values);
    if (status != SV_OK)
        goto out;
    sv_sparse_to_dense(&w->sample->hamiltonian, a);
    status = sv_dense_eigen(context, n, a, w->values, choose_near, w, &first, &last, &vectors);
    if (status != SV_OK)
        goto out;
    w->out.exact = true;
    w->out.bounds[0] = w->values[0];
    w->out.bounds[1] = w->values[n - 1];
    status =
        sv_spectrum_describe_states(context, w, w->values + first, vectors, (int)(last - first));
out:
    sv_give(context, a);
    sv_give(context, vectors);
    return status;
}

/* ---- inertia ---- */

/* What the factorisations at the Fermi energy say. */
typedef struct counted {
    sv_inertia_plan *plan;
    bool decided;
    sv_index below, low, high;
    double highest, lowest; /* ∓∞: none */
} counted;

static sv_status count_at_energy(sv_context *context, spectrum_work *w, counted *c)
{
    const sv_sparse *h = &w->sample->hamiltonian;
    double energy = w->occupation->fermi_energy;
    sv_inertia_count count;
    sv_inertia inertia;
    sv_inertia_levels levels;
    w->out.fermi_energy = energy;
    sv_status status = sv_inertia_count_below(context, c->plan, h, energy, &count);
    if (status != SV_OK)
        return status;
    c->decided = count.decided;
    c->below = count.below;
    c->low = count.decided ? count.below : count.low;
    c->high = count.decided ? count.below : count.high;
    if (!count.decided)
        return SV_OK;
    status = sv_inertia_factor(context, c->plan, h, energy, &inertia);
    if (status == SV_OK)
        status =
            sv_inertia_levels_near(context, c->plan, &inertia, energy, 1e-9, (double)NAN, &levels);
    if (status != SV_OK)
        return status;
    double gap = levels.above - levels.below;
    double poor = fmax(isfinite(gap) ? 1e-6 * gap : 0.0, 1e4 * w->out.resolution);
    c->highest = levels.error_below < poor ? levels.below : (double)NAN;
    c->lowest = levels.error_above < poor ? levels.above : (double)NAN;
    return SV_OK;
}

static sv_status count_electrons(sv_context *context, spectrum_work *w, counted *c)
{
    sv_fermi_level fermi;
    sv_index electrons = sv_occupation_electrons(w->occupation, w->sample->n);
    sv_status status =
        sv_inertia_fermi_energy(context, c->plan, &w->sample->hamiltonian, electrons, &fermi);
    if (status != SV_OK)
        return status;
    w->out.fermi_energy = fermi.energy;
    c->decided = !fermi.on_level;
    c->below = c->low = c->high = electrons;
    c->highest = fermi.highest_occupied;
    c->lowest = fermi.lowest_empty;
    return SV_OK;
}

/* Distance to the nearer level, as far as one is known. */
static double nearest_level(const sv_spectrum *out, const counted *c)
{
    double below = fabs(out->fermi_energy - c->highest),
           above = fabs(c->lowest - out->fermi_energy);
    double nearest = fmin(isfinite(below) ? below : DBL_MAX, isfinite(above) ? above : DBL_MAX);
    return c->decided && nearest < DBL_MAX ? nearest : 0.0;
}

/* Half width of an interval about the Fermi energy with about the wanted number of states. */
static sv_status choose_width(sv_context *context, const spectrum_work *w, const counted *c,
                              int most, double *ret_half_width)
{
    const sv_spectrum *out = &w->out;
    sv_inertia low, high;
    double width = out->bounds[1] - out->bounds[0], wanted = w->options->near_states;
    double half = 1.05 * nearest_level(out, c) + 0.5 * wanted * width / (double)out->sites;
    for (int k = 0; k < 16; k++) {
        if (sv_cancelled(context))
            return SV_FAIL(context, SV_INTERRUPTED, "stopped during a search for levels");
        sv_status status = sv_inertia_factor(context, c->plan, &w->sample->hamiltonian,
                                             out->fermi_energy - half, &low);
        if (status == SV_OK)
            status = sv_inertia_factor(context, c->plan, &w->sample->hamiltonian,
                                       out->fermi_energy + half, &high);
        if (status != SV_OK)
            return status;
        double inside = (double)(high.negative - low.negative);
        if ((inside >= wanted && inside <= most) || half > 2.0 * width)
            break;
        half *= inside < wanted ? fmin(2.0, fmax(1.1, wanted / fmax(inside, 0.5)))
                                : fmax(0.5, most / inside);
    }
    *ret_half_width = half;
    return SV_OK;
}

/* Near states; not to find them is no failure of the spectrum. */
static sv_status find_near(sv_context *context, spectrum_work *w, const counted *c)
{
    sv_near_states states = {0};
    double half = 0.0, aside = 0.0;
    int most = w->options->near_states + w->options->near_states / 2;
    sv_status status = choose_width(context, w, c, most, &half);
    if (status == SV_OK) { /* a little aside: a level at the Fermi energy would spoil the inverse */
        aside = 0.0137 * half;
        status = sv_near_states_find(context, &w->sample->hamiltonian, w->out.fermi_energy + aside,
                                     half, most, &states);
    }
    if (status == SV_OK && (states.count == 0 || states.half_width <= aside))
        snprintf(w->out.near_reason, sizeof w->out.near_reason,
                 "more than %d states lie at the Fermi energy", most);
    else if (status == SV_OK)
        status =
            sv_spectrum_describe_states(context, w, states.energies, states.vectors, states.count);
    sv_near_states_free(context, &states);
    if (status == SV_NOT_CONVERGED || status == SV_NUMERICAL) {
        snprintf(w->out.near_reason, sizeof w->out.near_reason, "%.190s", context->error.message);
        status = SV_OK;
    }
    return status;
}

/* The near states are better known than anything before: levels on and next to the Fermi energy. */
static bool refine(const spectrum_work *w, counted *c)
{
    const sv_spectrum *out = &w->out;
    double highest = -INFINITY, lowest = INFINITY;
    for (int k = 0; k < out->n_near; k++) {
        double energy = out->near[k].energy;
        if (distance_to(out->fermi_energy, energy) <= out->resolution)
            return true;
        if (energy < out->fermi_energy)
            highest = fmax(highest, energy);
        else
            lowest = fmin(lowest, energy);
    }
    c->highest = isfinite(highest) ? highest : c->highest;
    c->lowest = isfinite(lowest) ? lowest : c->lowest;
    return false;
}

/* A count that could not be decided at the Fermi energy may be so in the middle of its gap. */
static sv_status count_in_gap(sv_context *context, const spectrum_work *w, counted *c)
{
    sv_inertia_count count;
    if (!isfinite(c->highest) || !isfinite(c->lowest))
        return SV_OK;
    sv_status status = sv_inertia_count_below(context, c->plan, &w->sample->hamiltonian,
                                              0.5 * (c->highest + c->lowest), &count);
    if (status == SV_OK && count.decided) {
        c->decided = true;
        c->below = count.below;
    }
    return status;
}

sv_status sv_spectrum_levels_counted(sv_context *context, spectrum_work *w)
{
    counted c = {.highest = (double)NAN, .lowest = (double)NAN};
    bool by_energy = w->occupation->by == SV_BY_ENERGY;
    sv_status status = sv_inertia_plan_make(context, &w->sample->hamiltonian, 1, &c.plan);
    if (status == SV_OK)
        status = by_energy ? count_at_energy(context, w, &c) : count_electrons(context, w, &c);
    if (status == SV_OK)
        status = find_near(context, w, &c);
    if (status != SV_OK)
        goto out;
    bool on_level = refine(w, &c);
    if (!on_level && !c.decided && by_energy)
        status = count_in_gap(context, w, &c);
    if (on_level || !c.decided)
        forget_occupation(&w->out, c.low, c.high);
    else
        set_occupation(&w->out, c.below, c.highest, c.lowest);
out:
    sv_inertia_plan_free(context, c.plan);
    return status;
}
