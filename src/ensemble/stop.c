/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The stop rule is judged in realisation order, so it holds at the same place on any machine. */
#include "ensemble_internal.h"

#include <math.h>

/* Welford's recurrence: one pass, so that the rule can be judged after every realisation. */
static void take_in(stop_state *state, double value)
{
    state->resolved++;
    double delta = value - state->mean;
    state->mean += delta / (double)state->resolved;
    state->squares += delta * (value - state->mean);
}

static void judge(stop_state *state, const sv_kept_head *head, const sv_kept_outcome *outcome)
{
    if (head != NULL && head->status == SV_OK && outcome != NULL && outcome->verdict == SV_RESOLVED)
        take_in(state, outcome->value);
}

static bool rule_holds(const stop_state *state, const sv_stop_rule *rule)
{
    if (!rule->active || state->counted < rule->at_least || state->resolved < 2)
        return false;
    double n = (double)state->resolved;
    return sqrt(state->squares / (n - 1.0) / n) <= rule->standard_error;
}

void sv_stop_advance(stop_state *state, const sv_ensemble *ensemble, int32_t point,
                     const sv_stop_rule *rule)
{
    const bool *done = &ensemble->done[point * ensemble->realisations];
    while (!state->settled && state->counted < ensemble->realisations && done[state->counted]) {
        const int64_t k = state->counted++;
        if (rule->active)
            judge(state, sv_ensemble_head(ensemble, point, k),
                  sv_ensemble_outcome(ensemble, point, k, rule->marker));
        state->settled = state->counted == ensemble->realisations || rule_holds(state, rule);
    }
}

int64_t sv_ensemble_counted(const sv_ensemble *ensemble, int32_t point, const sv_stop_rule *stop,
                            bool *ret_settled)
{
    stop_state state = {0};
    sv_stop_advance(&state, ensemble, point, stop);
    *ret_settled = state.settled;
    return state.counted;
}
