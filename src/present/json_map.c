/* SPDX-License-Identifier: GPL-3.0-or-later */
/* One realisation as JSON. */
#include <math.h>
#include <string.h>

#include "present_internal.h"

static void put_known(sv_json *json, json_t *object, const char *key, double value)
{
    if (key != NULL && isfinite(value))
        sv_json_put_real(json, object, key, value);
}

static void put_levels(sv_json *json, json_t *object, const sv_outcome *outcome)
{
    if (outcome->verdict == SV_ABSENT || outcome->verdict == SV_FAILED)
        return;
    const bool none = outcome->electrons == 0 && isfinite(outcome->lowest_empty);
    const bool all = outcome->electrons > 0 && isfinite(outcome->highest_occupied) &&
                     !isfinite(outcome->lowest_empty);
    if (none || isfinite(outcome->highest_occupied))
        sv_json_put_real(json, object, "highest_occupied", outcome->highest_occupied);
    if (all || isfinite(outcome->lowest_empty))
        sv_json_put_real(json, object, "lowest_empty", outcome->lowest_empty);
    if (outcome->electrons >= 0) /* an engine without levels does not count them */
        sv_json_put_integer(json, object, "electrons", outcome->electrons);
    if ((none || all) && json_object_get(object, "reason") == NULL)
        sv_json_put_text(json, object, "reason",
                         none ? "no state is occupied" : "all states are occupied");
}

static json_t *make_index(sv_json *json, const char *name, const sv_outcome *outcome)
{
    json_t *object = json_object();
    const bool resolved = outcome->verdict == SV_RESOLVED;
    if (resolved)
        sv_json_put_integer(json, object, "index", outcome->index);
    else
        sv_json_put(json, object, "index", json_null());
    sv_json_put(json, object, "resolved", json_boolean(resolved));
    put_known(json, object, sv_words_margin(name), outcome->margin);
    put_known(json, object, sv_words_weakest(name), outcome->weakest);
    put_known(json, object, "kappa", outcome->kappa);
    return object;
}

/* A real number of one sample that is no window mean: three-sector, crosshair. */
static json_t *make_value(sv_json *json, const sv_outcome *outcome)
{
    json_t *object = json_object();
    const bool resolved = outcome->verdict == SV_RESOLVED;
    sv_json_put_real(json, object, "value", resolved ? outcome->value : (double)NAN);
    sv_json_put(json, object, "resolved", json_boolean(resolved));
    return object;
}

static json_t *make_window_mean(sv_json *json, const char *name, const sv_outcome *outcome)
{
    json_t *object = json_object();
    const bool resolved = outcome->verdict == SV_RESOLVED;
    sv_json_put_real(json, object, "window_mean", resolved ? outcome->value : (double)NAN);
    sv_json_put(json, object, "resolved", json_boolean(resolved));
    sv_json_put_integer(json, object, "window_cells", outcome->window_cells);
    if (strcmp(name, "local_chern") != 0) {
        put_known(json, object, sv_words_margin(name), outcome->margin);
        return object;
    }
    sv_json_put_real(json, object, "sum_over_sites", outcome->sum_over_sites);
    if (resolved && !isfinite(outcome->sum_over_sites))
        sv_json_put_text(json, object, "reason",
                         "the sum over all sites needs the marker of every site; some were not "
                         "computed, or are left blank because their error is too large");
    return object;
}

static json_t *make_marker(sv_json *json, const sv_marker *marker, const sv_outcome *outcome)
{
    json_t *object = marker->is_index ? make_index(json, marker->kind.name, outcome)
                     : outcome->window_cells > 0
                         ? make_window_mean(json, marker->kind.name, outcome)
                         : make_value(json, outcome);
    if (outcome->verdict != SV_RESOLVED)
        sv_json_put_text(json, object, "reason", outcome->reason);
    if (outcome->verdict == SV_ABSENT || outcome->verdict == SV_FAILED)
        return object;
    sv_json_put_real(json, object, "numerical_error", outcome->numerical_error);
    sv_json_put_real(json, object, "estimator_error", outcome->estimator_error);
    sv_json_put_text(json, object, "engine", outcome->engine);
    put_levels(json, object, outcome);
    put_known(json, object, "levels_unresolved_within", outcome->unresolved_within);
    put_known(json, object, "level_distance", outcome->nearest_level);
    return object;
}

sv_status sv_map_json(sv_context *context, const sv_map_result *map, char **ret_text)
{
    int count;
    const sv_marker *table = sv_marker_table(&count);
    const sv_record *record = map->record;
    sv_json json = {.context = context};
    json_t *document = json_object(), *markers = json_object();
    sv_json_put_integer(&json, document, "selvedge", 1);
    sv_json_put_text(&json, document, "command", "map");
    sv_json_put_text(&json, document, "title", map->title);
    sv_json_put_integer(&json, document, "realisation", record->realisation);
    sv_json_put_integer(&json, document, "sites", record->sites);
    sv_json_put_integer(&json, document, "vacancies", record->vacancies);
    if (map->sample != NULL)
        sv_json_put(&json, document, "inventory", sv_json_inventory(&json, map->sample));
    if (record->status != SV_OK)
        sv_json_put_text(&json, document, "reason", sv_status_text(record->status));
    for (int i = 0; i < record->n_outcomes && i < map->point->n_markers; i++) {
        const sv_marker *marker = &table[map->point->markers[i].marker];
        json_t *object = make_marker(&json, marker, &record->outcomes[i]);
        if (map->coarse != NULL && marker->compute == sv_local_chern)
            sv_coarse_put(&json, object, map->coarse);
        if (map->survey != NULL && marker->compute == sv_localizer_index)
            sv_survey_put(&json, object, map->survey);
        if (map->flow != NULL && marker->compute == sv_spectral_flow) {
            sv_json_put_integer(&json, object, "fluxes", map->flow->fluxes);
            sv_json_put_integer(&json, object, "levels_followed", map->flow->most);
        }
        sv_json_put(&json, markers, marker->kind.name, object);
    }
    sv_json_put(&json, document, "markers", markers);
    return sv_json_finish(&json, document, ret_text);
}
