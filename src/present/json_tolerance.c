/* SPDX-License-Identifier: GPL-3.0-or-later */
/* What `tolerance` found, as JSON and CSV. */
#include <math.h>
#include <stdio.h>

#include "present_internal.h"

static const char *const state_words[] = {"found", "holds everywhere", "fails everywhere",
                                          "undecided"};
static const char *const verdict_words[] = {"holds", "open", "fails"};

const sv_tolerance_row *sv_tolerance_main(const sv_tolerance_result *result)
{
    const sv_tolerance_row *best = NULL;
    for (int k = 0; k < result->n_rows; k++) {
        const sv_tolerance_row *row = &result->rows[k];
        if (row->primary &&
            (best == NULL || row->cells[0] != best->cells[0] || row->cells[1] != best->cells[1]))
            best = row;
    }
    return best;
}

static json_t *make_threshold(sv_json *json, const sv_tolerance_result *result,
                              const sv_threshold_answer *answer)
{
    const double scale = result->parameter.scale;
    const double interval[2] = {scale * answer->interval[0], scale * answer->interval[1]};
    json_t *object = json_object();
    sv_json_put_real(json, object, "value", scale * answer->value);
    sv_json_put(json, object, "interval",
                isfinite(interval[0]) ? sv_json_pair(json, interval) : json_null());
    sv_json_put_real(json, object, "confidence", answer->confidence);
    sv_json_put_text(json, object, "state", state_words[answer->state]);
    if (answer->reason[0] != '\0')
        sv_json_put_text(json, object, "reason", answer->reason);
    return object;
}

static json_t *make_criterion(sv_json *json, const sv_tolerance_result *result)
{
    char quantity[100];
    json_t *object = json_object();
    snprintf(quantity, sizeof quantity, "%s%s", result->quantity, result->of_mean ? ".mean" : "");
    sv_json_put_text(json, object, "quantity", quantity);
    if (isfinite(result->within))
        sv_json_put_real(json, object, "within", result->within);
    if (isfinite(result->share))
        sv_json_put_real(json, object, "share", result->share);
    return object;
}

static json_t *make_points(sv_json *json, const sv_tolerance_result *result,
                           const sv_tolerance_row *row)
{
    json_t *array = json_array();
    for (int k = 0; k < row->answer.n_points; k++) {
        const sv_threshold_point *p = &row->answer.points[k];
        json_t *object = json_object(), *parameters = json_object();
        const double shown = result->parameter.scale * p->parameter;
        if (result->parameter.integer)
            sv_json_put_integer(json, parameters, result->parameter.path, llround(shown));
        else
            sv_json_put_real(json, parameters, result->parameter.path, shown);
        sv_json_put(json, object, "parameters", parameters);
        sv_json_put_integer(json, object, "realisations", p->responses);
        sv_json_put_integer(json, object, "unresolved", p->unresolved);
        sv_json_put_real(json, object, "measure", p->measure);
        sv_json_put_real(json, object, "standard_error", p->standard_error);
        sv_json_put_text(json, object, "criterion", verdict_words[p->verdict + 1]);
        sv_json_push(json, array, object);
    }
    return array;
}

static void put_place(sv_json *json, json_t *object, const sv_tolerance_result *result,
                      const sv_tolerance_row *row)
{
    if (row->cells[0] > 0) {
        json_t *cells = json_array();
        sv_json_push(json, cells, json_integer((json_int_t)row->cells[0]));
        sv_json_push(json, cells, json_integer((json_int_t)row->cells[1]));
        sv_json_put(json, object, "cells", cells);
    }
    if (row->has_second)
        sv_json_put_real(json, object, result->second.path, result->second.scale * row->second);
}

static json_t *make_row(sv_json *json, const sv_tolerance_result *result,
                        const sv_tolerance_row *row)
{
    json_t *object = json_object();
    const sv_threshold_answer *a = &row->answer;
    sv_json_put_text(json, object, "marker", row->marker);
    put_place(json, object, result, row);
    sv_json_put_real(json, object, "clean", row->clean);
    if (isfinite(row->within))
        sv_json_put_real(json, object, "within", row->within);
    sv_json_put(json, object, "tolerable", make_threshold(json, result, a));
    sv_json_put_integer(json, object, "realisations", a->responses);
    sv_json_put_real(json, object, "monotone_p", a->monotone_p);
    sv_json_put_real(json, object, "re_entry", result->parameter.scale * a->re_entry);
    sv_json_put(json, object, "points", make_points(json, result, row));
    return object;
}

static void put_density(sv_json *json, json_t *document, const sv_tolerance_result *result,
                        const sv_tolerance_row *row)
{
    const double f = result->per_area * 1.0;
    if (!(f > 0.0) || !isfinite(row->answer.value))
        return;
    const double pair[2] = {f * row->answer.interval[0], f * row->answer.interval[1]};
    json_t *object = json_object();
    sv_json_put_real(json, object, "per_cm2", f * row->answer.value);
    sv_json_put(json, object, "interval", sv_json_pair(json, pair));
    sv_json_put_real(json, object, "mean_distance_nm", 0.5e7 / sqrt(f * row->answer.value));
    sv_json_put(json, document, "density", object);
}

static void put_trend(sv_json *json, json_t *document, const sv_size_trend *trend)
{
    json_t *object = json_object();
    if (!trend->asked) {
        json_decref(object);
        return;
    }
    sv_json_put_real(json, object, "limit", trend->exists ? trend->limit : (double)NAN);
    sv_json_put_real(json, object, "standard_error",
                     trend->exists ? trend->standard_error : (double)NAN);
    sv_json_put_real(json, object, "p_value", trend->p_value);
    if (!trend->exists)
        sv_json_put_text(json, object, "reason", trend->reason);
    sv_json_put(json, document, "extrapolation", object);
}

sv_status sv_tolerance_json(sv_context *context, const sv_tolerance_result *result, char **ret_text)
{
    sv_json json = {.context = context};
    const sv_tolerance_row *row = sv_tolerance_main(result);
    json_t *document = json_object(), *rows = json_array(), *timings = json_object();
    if (row == NULL)
        return SV_FAIL(context, SV_INVALID_INPUT, "a tolerance without a threshold");
    sv_json_put_integer(&json, document, "selvedge", 1);
    sv_json_put_text(&json, document, "command", "tolerance");
    sv_json_put_text(&json, document, "title", result->title);
    sv_json_put_text(&json, document, "parameter", result->parameter.path);
    if (result->parameter.unit != NULL)
        sv_json_put_text(&json, document, "unit", result->parameter.unit);
    sv_json_put(&json, document, "criterion", make_criterion(&json, result));
    sv_json_put(&json, document, "tolerable", make_threshold(&json, result, &row->answer));
    put_density(&json, document, result, row);
    sv_json_put_real(&json, document, "clean", row->clean);
    sv_json_put_integer(&json, document, "realisations", result->realisations);
    sv_json_put(&json, document, "points", make_points(&json, result, row));
    for (int k = 0; k < result->n_rows; k++)
        sv_json_push(&json, rows, make_row(&json, result, &result->rows[k]));
    sv_json_put(&json, document, "thresholds", rows);
    put_trend(&json, document, &result->trend);
    sv_json_put_real(&json, timings, "seconds", result->seconds);
    sv_json_put(&json, document, "timings", timings);
    return sv_json_finish(&json, document, ret_text);
}

sv_status sv_tolerance_csv(sv_context *context, const sv_tolerance_result *result, char **ret_text)
{
    sv_draft text = {.context = context};
    const char *unit = result->parameter.unit != NULL ? result->parameter.unit : "";
    sv_draft_add(&text,
                 "marker,cells_1,cells_2,%s,%s%s%s%s,realisations,unresolved,measure,"
                 "standard_error,criterion\n",
                 result->second.path != NULL ? result->second.path : "second",
                 result->parameter.path, unit[0] != '\0' ? " (" : "", unit,
                 unit[0] != '\0' ? ")" : "");
    for (int k = 0; k < result->n_rows; k++) {
        const sv_tolerance_row *row = &result->rows[k];
        for (int i = 0; i < row->answer.n_points; i++) {
            const sv_threshold_point *p = &row->answer.points[i];
            sv_draft_add(&text, "%s,%lld,%lld,", row->marker, (long long)row->cells[0],
                         (long long)row->cells[1]);
            if (row->has_second)
                sv_draft_add(&text, "%.12g", result->second.scale * row->second);
            sv_draft_add(&text, ",%.12g,%lld,%lld,%.12g,%.6g,%s\n",
                         result->parameter.scale * p->parameter, (long long)p->responses,
                         (long long)p->unresolved, p->measure, p->standard_error,
                         verdict_words[p->verdict + 1]);
        }
    }
    return sv_draft_finish(&text, ret_text);
}
