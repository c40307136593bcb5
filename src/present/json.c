/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The result of an ensemble as JSON. */
#include <math.h>
#include <stdio.h>
#include <string.h>

#include "present_internal.h"

static json_t *make_quantiles(sv_json *json, const sv_summary *summary)
{
    json_t *object = json_object();
    for (int i = 0; i < SV_N_QUANTILES; i++) {
        char key[32];
        snprintf(key, sizeof key, "%.2f", sv_quantile_levels()[i]);
        sv_json_put_real(json, object, key, summary->quantiles[i]);
    }
    return object;
}

static json_t *make_shares(sv_json *json, const sv_summary *summary)
{
    json_t *array = json_array();
    for (int i = 0; i < summary->n_shares; i++) {
        const sv_index_share *share = &summary->shares[i];
        json_t *object = json_object();
        sv_json_put_integer(json, object, "index", share->index);
        sv_json_put_integer(json, object, "count", share->count);
        sv_json_put_real(json, object, "share", share->share);
        sv_json_put(json, object, "interval", sv_json_pair(json, share->interval));
        sv_json_put(json, object, "exact_interval", sv_json_pair(json, share->exact_interval));
        sv_json_push(json, array, object);
    }
    return array;
}

static void put_margin(sv_json *json, json_t *object, const sv_summary *summary)
{
    const char *name = sv_words_margin(summary->marker);
    if (name == NULL || !isfinite(summary->smallest_margin))
        return;
    json_t *margin = json_object();
    sv_json_put_real(json, margin, "smallest", summary->smallest_margin);
    sv_json_put_real(json, margin, "mean", summary->mean_margin);
    sv_json_put(json, object, name, margin);
}

/* The mean and how well it is known; a single realisation tells nothing about its spread. */
static void put_mean(sv_json *json, json_t *object, const sv_summary *summary)
{
    const bool spread = isfinite(summary->standard_error);
    sv_json_put_real(json, object, "mean", summary->mean);
    sv_json_put_real(json, object, "standard_error", summary->standard_error);
    sv_json_put_range(json, object, "interval", summary->interval);
    sv_json_put_real(json, object, "confidence", summary->confidence);
    sv_json_put_real(json, object, "deviation", spread ? summary->deviation : (double)NAN);
    sv_spread_put(json, object, summary);
    if (!spread)
        sv_json_put_text(json, object, "reason",
                         "a standard error needs at least two resolved realisations");
}

static void put_unresolved(sv_json *json, json_t *object, const sv_summary *summary)
{
    sv_json_put_integer(json, object, "unresolved", summary->unresolved);
    if (summary->unresolved > 0)
        sv_json_put_text(json, object, "unresolved_reason", summary->unresolved_reason);
    if (summary->failed > 0)
        sv_json_put_integer(json, object, "failed", summary->failed);
}

static json_t *make_marker(sv_json *json, const sv_summary *summary)
{
    json_t *object = json_object();
    if (!summary->exists) {
        sv_json_put(json, object, "mean", json_null());
        sv_json_put_text(json, object, "reason", summary->reason);
        put_unresolved(json, object, summary);
        return object;
    }
    put_mean(json, object, summary);
    if (!summary->is_index)
        sv_json_put(json, object, "quantiles", make_quantiles(json, summary));
    put_unresolved(json, object, summary);
    if (summary->is_index) {
        sv_json_put(json, object, "bounds", sv_json_pair(json, summary->bounds));
        sv_json_put(json, object, "shares", make_shares(json, summary));
    }
    sv_json_put_real(json, object, "numerical_error", summary->numerical_error);
    sv_json_put_real(json, object, "estimator_error", summary->estimator_error);
    if (sv_words_estimated(summary))
        sv_json_put_real(json, object, "disorder_deviation", summary->disorder_deviation);
    put_margin(json, object, summary);
    if (isfinite(summary->kappa))
        sv_json_put_real(json, object, "kappa", summary->kappa);
    sv_json_put_text(json, object, "engine", summary->engine);
    return object;
}

json_t *sv_json_parameters(sv_json *json, const sv_point_result *point)
{
    json_t *object = json_object();
    for (int i = 0; i < point->n_coordinates; i++) {
        const sv_coordinate *coordinate = &point->coordinates[i];
        const double pair[2] = {coordinate->value, coordinate->second};
        if (coordinate->pair && coordinate->integer)
            sv_json_put(json, object, coordinate->path,
                        json_pack("[I, I]", (json_int_t)pair[0], (json_int_t)pair[1]));
        else if (coordinate->pair)
            sv_json_put(json, object, coordinate->path, sv_json_pair(json, pair));
        else if (coordinate->integer)
            sv_json_put_integer(json, object, coordinate->path, (int64_t)coordinate->value);
        else
            sv_json_put_real(json, object, coordinate->path, coordinate->value);
    }
    return object;
}

/* Units of the parameters that have one. */
static void put_units(sv_json *json, json_t *object, const sv_point_result *point)
{
    json_t *units = json_object();
    for (int i = 0; i < point->n_coordinates; i++)
        if (point->coordinates[i].unit != NULL)
            sv_json_put_text(json, units, point->coordinates[i].path, point->coordinates[i].unit);
    if (json_object_size(units) > 0)
        sv_json_put(json, object, "units", units);
    else
        json_decref(units);
}

/* Where the marker differs most from one realisation to the next. */
static json_t *make_sites(sv_json *json, const sv_site_summary *sites)
{
    json_t *object = json_object(), *largest = json_object(), *cell = json_array();
    sv_json_put_integer(json, object, "realisations", sites->realisations);
    sv_json_put_real(json, object, "deviation", sites->deviation);
    if (!isfinite(sites->largest)) {
        sv_json_put(json, object, "largest_deviation", json_null());
        sv_json_put_text(json, object, "reason", "no cell has a value in two realisations or more");
        json_decref(largest);
        json_decref(cell);
        return object;
    }
    sv_json_put_real(json, largest, "value", sites->largest);
    for (int k = 0; k < 2; k++)
        sv_json_push(json, cell, json_integer(sites->cell[k]));
    sv_json_put(json, largest, "cell", cell);
    sv_json_put_real(json, largest, "x", sites->at[0]);
    sv_json_put_real(json, largest, "y", sites->at[1]);
    sv_json_put_integer(json, largest, "realisations", sites->present);
    sv_json_put(json, object, "largest_deviation", largest);
    return object;
}

static json_t *make_point(sv_json *json, const sv_point_result *point)
{
    json_t *object = json_object(), *markers = json_object(), *inventory = json_object();
    sv_json_put(json, object, "parameters", sv_json_parameters(json, point));
    put_units(json, object, point);
    sv_json_put_integer(json, object, "realisations", point->realisations);
    sv_json_put_real(json, inventory, "sites", point->mean_sites);
    sv_json_put_real(json, inventory, "vacancies", point->mean_vacancies);
    sv_json_put(json, object, "inventory", inventory);
    for (int i = 0; i < point->n_summaries; i++)
        sv_json_put(json, markers, point->summaries[i].marker,
                    make_marker(json, &point->summaries[i]));
    sv_json_put(json, object, "markers", markers);
    if (point->sites.exists)
        sv_json_put(json, object, "site_maps", make_sites(json, &point->sites));
    return object;
}

/* What a sampled window costs depends on the machine, so it stands with the timings. */
static void put_splits(sv_json *json, json_t *timings, const sv_result *result)
{
    json_t *array = json_array();
    for (int32_t i = 0; i < result->n_points; i++) {
        const sv_split *split = &result->points[i].split;
        if (!result->points[i].has_split)
            continue;
        json_t *object = json_object();
        sv_json_put_integer(json, object, "point", i);
        sv_json_put_real(json, object, "columns", split->columns);
        sv_json_put_real(json, object, "disorder_deviation", split->disorder_deviation);
        sv_json_put_real(json, object, "best_columns", split->best_columns);
        sv_json_put_real(json, object, "realisations", split->realisations);
        sv_json_put_real(json, object, "work", split->work);
        sv_json_put_real(json, object, "seconds_fixed", split->seconds_fixed);
        sv_json_put_real(json, object, "seconds_per_column", split->seconds_per_column);
        sv_json_push(json, array, object);
    }
    if (json_array_size(array) > 0)
        sv_json_put(json, timings, "split", array);
    else
        json_decref(array);
}

sv_status sv_result_json(sv_context *context, const sv_result *result, char **ret_text)
{
    sv_json json = {.context = context};
    json_t *document = json_object(), *points = json_array(), *timings = json_object();
    sv_json_put_integer(&json, document, "selvedge", 1);
    sv_json_put_text(&json, document, "command", "average");
    sv_json_put_text(&json, document, "title", result->title);
    for (int32_t i = 0; i < result->n_points; i++)
        sv_json_push(&json, points, make_point(&json, &result->points[i]));
    sv_json_put(&json, document, "points", points);
    if (result->finite_size != NULL)
        sv_scaling_put(&json, document, result->finite_size);
    sv_comparisons_put(&json, document, result);
    sv_json_put(&json, document, "complete", json_boolean(result->complete));
    sv_json_put_real(&json, timings, "seconds", result->seconds);
    put_splits(&json, timings, result);
    sv_json_put(&json, document, "timings", timings);
    return sv_json_finish(&json, document, ret_text);
}
