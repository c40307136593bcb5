/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The stop rule is judged in realisation order, so it holds at the same place on any machine. */
#include "ensemble_internal.h"

#include <math.h>

/* Quantile of the standard normal distribution at 0.975. */
static const double Z95 = 1.9599639845400545;
/* Weight of the skewness: chosen by simulation (data/manual/statistics.md), no cost for even
 * values. */
static const double SKEW_WEIGHT = 5.0;
/* Values that are all the same say little about rarer ones: they must be this many times at_least.
 */
static const int64_t CONSTANT_TIMES = 4;

/* Central sums of the orders 2 and 3 in one pass (Pébay, Sandia report SAND2008-6212, eqs. 1.3). */
static void take_value(sv_stop_state *state, double value)
{
    double n = (double)++state->resolved;
    double delta = value - state->mean, part = delta / n;
    state->cubes += part * (delta * part * (n - 1.0) * (n - 2.0) - 3.0 * state->squares);
    state->squares += delta * part * (n - 1.0);
    state->mean += part;
}

/* Beyond the room for different indices, new ones are counted in `judged` alone. */
static void take_index(sv_stop_state *state, int64_t index)
{
    int k = 0;
    while (k < state->n_indices && state->indices[k] != index)
        k++;
    if (k == SV_STOP_INDICES)
        return;
    if (k == state->n_indices)
        state->indices[state->n_indices++] = index;
    state->counts[k]++;
}

static bool error_holds(const sv_stop_state *state, const sv_stop_rule *rule)
{
    double n = (double)state->resolved, squares = state->squares, variance;
    if (state->resolved < 2)
        return false;
    variance = squares / (n - 1.0);
    if (rule->of_index) {
        /* Two more realisations, one unit off on each side: an index that never changed is not
         * known exactly. */
        variance = fmax(variance, (squares + 2.0) / (n + 1.0));
    } else if (squares > 0.0) {
        double skewness = state->cubes / n / (squares / n * sqrt(squares / n));
        variance *= 1.0 + SKEW_WEIGHT * skewness * skewness / n;
    } else if (state->counted < CONSTANT_TIMES * rule->at_least) {
        return false;
    }
    return variance / n <= rule->standard_error * rule->standard_error;
}

/* Width of Wilson's interval of the share of the most frequent index. */
static bool width_holds(const sv_stop_state *state, const sv_stop_rule *rule)
{
    int64_t most = 0;
    for (int k = 0; k < state->n_indices; k++)
        most = state->counts[k] > most ? state->counts[k] : most;
    if (state->judged < 1)
        return false;
    double n = (double)state->judged, p = (double)most / n;
    double width =
        2.0 * Z95 * sqrt(p * (1.0 - p) / n + Z95 * Z95 / (4.0 * n * n)) / (1.0 + Z95 * Z95 / n);
    return width <= rule->share_width;
}

static bool rule_holds(const sv_stop_state *state, const sv_stop_rule *rule)
{
    bool asked = rule->standard_error > 0.0 || rule->share_width > 0.0;
    if (!rule->active || state->counted < rule->at_least)
        return false;
    if (rule->seconds > 0.0 && state->seconds >= rule->seconds)
        return true;
    return asked && (!(rule->standard_error > 0.0) || error_holds(state, rule)) &&
           (!(rule->share_width > 0.0) || width_holds(state, rule));
}

bool sv_stop_add(sv_stop_state *state, const sv_stop_rule *rule, sv_verdict verdict, double value,
                 double seconds)
{
    state->counted++;
    state->seconds += seconds;
    state->judged += verdict != SV_ABSENT;
    if (verdict == SV_RESOLVED) {
        take_value(state, value);
        if (rule->of_index)
            take_index(state, (int64_t)value);
    }
    return rule_holds(state, rule);
}

/* A realisation without the outcome asked for (a record from elsewhere) is not resolved. */
static bool take_record(sv_stop_state *state, const sv_ensemble *ensemble, int32_t point, int64_t k,
                        const sv_stop_rule *rule)
{
    const sv_kept_head *head = sv_ensemble_head(ensemble, point, k);
    const sv_kept_outcome *outcome = sv_ensemble_outcome(ensemble, point, k, rule->marker);
    bool good = head != NULL && head->status == SV_OK && outcome != NULL;
    return sv_stop_add(state, rule, good ? outcome->verdict : SV_FAILED,
                       good ? outcome->value : (double)NAN, head != NULL ? head->seconds : 0.0);
}

void sv_stop_advance(sv_stop_state *state, const sv_ensemble *ensemble, int32_t point,
                     const sv_stop_rule *rule)
{
    const bool *done = &ensemble->done[point * ensemble->realisations];
    while (!state->settled && state->counted < ensemble->realisations && done[state->counted]) {
        bool holds = take_record(state, ensemble, point, state->counted, rule);
        state->settled = state->counted == ensemble->realisations || holds;
    }
}

int64_t sv_ensemble_counted(const sv_ensemble *ensemble, int32_t point, const sv_stop_rule *stop,
                            bool *ret_settled)
{
    sv_stop_state state = {0};
    sv_stop_advance(&state, ensemble, point, stop);
    *ret_settled = state.settled;
    return state.counted;
}
