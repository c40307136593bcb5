/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Hops by distance: the rules of a model whose sites come from a structure. */
#include "selvedge/model.h"

#include <math.h>

enum { MOST_RULES = 1000 };

void sv_rule_range(const sv_distance_rule *rule, double ret_range[2])
{
    bool shell = rule->decay <= 0.0;
    ret_range[0] = shell ? rule->distance - rule->tolerance : 0.0;
    ret_range[1] = shell ? rule->distance + rule->tolerance : rule->cutoff;
}

static sv_status check_lengths(sv_context *context, const sv_distance_rule *rule)
{
    double range[2];
    sv_rule_range(rule, range);
    if (!(rule->distance > 0.0 && rule->tolerance >= 0.0 && rule->decay >= 0.0 &&
          isfinite(range[1])))
        return SV_FAIL(context, SV_INVALID_INPUT,
                       "a hop by distance needs positive lengths: distance %g, tolerance %g, decay "
                       "%g",
                       rule->distance, rule->tolerance, rule->decay);
    if (rule->decay > 0.0 && !(rule->cutoff >= rule->distance))
        return SV_FAIL(context, SV_INVALID_INPUT, "the cutoff %g lies below the distance %g",
                       rule->cutoff, rule->distance);
    if (!(range[0] >= 0.0))
        return SV_FAIL(context, SV_INVALID_INPUT, "the tolerance %g is above the distance %g",
                       rule->tolerance, rule->distance);
    return SV_OK;
}

static sv_status check_amplitude(sv_context *context, const sv_distance_rule *rule)
{
    if (!isfinite(creal(rule->amplitude)) || !isfinite(cimag(rule->amplitude)) ||
        !isfinite(rule->phase))
        return SV_FAIL(context, SV_INVALID_INPUT, "the amplitude of a hop is not finite");
    if (cimag(rule->amplitude) != 0.0 && (rule->from == rule->to || rule->phase != 0.0))
        return SV_FAIL(context, SV_INVALID_INPUT,
                       "%s: the amplitude must be real; a phase by the turn over the common "
                       "neighbour makes a hop complex",
                       rule->phase != 0.0 ? "a hop with a phase"
                                          : "a hop between equal species has no direction");
    return SV_OK;
}

static bool same_species(const sv_distance_rule *a, const sv_distance_rule *b)
{
    return (a->from == b->from && a->to == b->to) || (a->from == b->to && a->to == b->from);
}

sv_status sv_model_add_rule(sv_context *context, sv_model *model, const sv_distance_rule *rule)
{
    double range[2], other[2];
    sv_status status;
    if (rule->from < 0 || rule->to < 0 || rule->from >= model->n_orbitals ||
        rule->to >= model->n_orbitals)
        return SV_FAIL(context, SV_INVALID_INPUT, "a hop names a species that is not there");
    if ((status = check_lengths(context, rule)) != SV_OK ||
        (status = check_amplitude(context, rule)) != SV_OK)
        return status;
    if (model->n_rules >= MOST_RULES)
        return SV_FAIL(context, SV_INVALID_INPUT, "more than %d hops by distance", MOST_RULES);
    sv_rule_range(rule, range);
    for (int k = 0; k < model->n_rules; k++) {
        sv_rule_range(&model->rules[k], other);
        if (same_species(rule, &model->rules[k]) && range[0] <= other[1] && other[0] <= range[1])
            return SV_FAIL(context, SV_INVALID_INPUT,
                           "two hops between %s and %s meet at distances %g to %g",
                           model->orbitals[rule->from].name, model->orbitals[rule->to].name,
                           fmax(range[0], other[0]), fmin(range[1], other[1]));
    }
    if ((status = sv_reserve(context, &model->rules, &model->rule_capacity, model->n_rules + 1,
                             sizeof *model->rules)) == SV_OK)
        model->rules[model->n_rules++] = *rule;
    return status;
}
