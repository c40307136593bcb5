/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The spectrum of one realisation as JSON and its density as CSV. */
#include <math.h>

#include "present_internal.h"

static void put_count(sv_json *json, json_t *object, const char *key, sv_index count)
{
    if (count < 0)
        sv_json_put(json, object, key, json_null());
    else
        sv_json_put_integer(json, object, key, count);
}

static json_t *make_near(sv_json *json, const sv_spectrum *s)
{
    json_t *array = json_array();
    for (int k = 0; k < s->n_near; k++) {
        json_t *object = json_object();
        sv_json_put_real(json, object, "energy", s->near[k].energy);
        sv_json_put_real(json, object, "participation", s->near[k].participation);
        sv_json_put_real(json, object, "edge_weight", s->near[k].edge_weight);
        if (isnan(s->near[k].edge_weight))
            sv_json_put_text(json, object, "reason", "a torus has no edge");
        sv_json_push(json, array, object);
    }
    return array;
}

static json_t *make_gap_ratio(sv_json *json, const sv_spectrum *s)
{
    json_t *object = json_object();
    sv_json_put_real(json, object, "mean", s->gap_ratio);
    sv_json_put_real(json, object, "standard_error", s->gap_ratio_error);
    sv_json_put_integer(json, object, "levels", s->gap_ratio_levels);
    if (s->gap_ratio_reason[0] != '\0')
        sv_json_put_text(json, object, "reason", s->gap_ratio_reason);
    return object;
}

static json_t *make_reals(sv_json *json, const double *values, sv_index n)
{
    json_t *array = json_array();
    for (sv_index k = 0; k < n; k++)
        sv_json_push(json, array, sv_json_real(values[k]));
    return array;
}

static json_t *make_density(sv_json *json, const sv_spectrum *s)
{
    json_t *object = json_object();
    sv_json_put(json, object, "energies", make_reals(json, s->energies, s->n_density));
    sv_json_put(json, object, "states", make_reals(json, s->density, s->n_density));
    sv_json_put_real(json, object, "resolution", s->density_resolution);
    sv_json_put_text(json, object, "method", s->method);
    sv_json_put_real(json, object, "estimator_error", s->density_error);
    return object;
}

sv_status sv_spectrum_json(sv_context *context, const sv_spectrum_result *result, char **ret_text)
{
    const sv_spectrum *s = result->spectrum;
    sv_json json = {.context = context};
    json_t *document = json_object();
    sv_json_put_integer(&json, document, "selvedge", 1);
    sv_json_put_text(&json, document, "command", "spectrum");
    sv_json_put_text(&json, document, "title", result->title);
    sv_json_put_integer(&json, document, "realisation", result->realisation);
    sv_json_put_integer(&json, document, "sites", s->sites);
    if (result->sample != NULL)
        sv_json_put(&json, document, "inventory", sv_json_inventory(&json, result->sample));
    put_count(&json, document, "states_below_fermi", s->states_below);
    sv_json_put_real(&json, document, "highest_occupied", s->highest_occupied);
    sv_json_put_real(&json, document, "lowest_empty", s->lowest_empty);
    sv_json_put_real(&json, document, "gap", s->gap);
    sv_json_put(&json, document, "bounds", sv_json_pair(&json, s->bounds));
    sv_json_put_real(&json, document, "fermi_energy", s->fermi_energy);
    sv_json_put(&json, document, "on_level", json_boolean(s->on_level));
    if (s->reason[0] != '\0')
        sv_json_put_text(&json, document, "reason", s->reason);
    sv_json_put(&json, document, "near", s->n_near > 0 ? make_near(&json, s) : json_null());
    if (s->n_near == 0)
        sv_json_put_text(&json, document, "near_reason", s->near_reason);
    sv_json_put(&json, document, "gap_ratio", make_gap_ratio(&json, s));
    sv_json_put(&json, document, "density", make_density(&json, s));
    return sv_json_finish(&json, document, ret_text);
}

sv_status sv_spectrum_csv(sv_context *context, const sv_spectrum_result *result, char **ret_text)
{
    const sv_spectrum *s = result->spectrum;
    sv_draft text = {.context = context};
    sv_draft_add(&text, "energy,density\n");
    for (sv_index k = 0; k < s->n_density; k++) {
        char energy[32], density[32];
        sv_words_real(s->energies[k], energy, sizeof energy);
        sv_words_real(s->density[k], density, sizeof density);
        sv_draft_add(&text, "%s,%s\n", energy, density);
    }
    return sv_draft_finish(&text, ret_text);
}
