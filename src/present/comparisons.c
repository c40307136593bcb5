/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Comparisons between the points of a sweep: JSON, CSV and the sentence under a table. */
#include <math.h>
#include <stdio.h>
#include <string.h>

#include "present_internal.h"

static json_t *roles(sv_json *json, const sv_compared *row)
{
    json_t *array = json_array();
    if (row->first)
        sv_json_push(json, array, json_string("first"));
    if (row->neighbour)
        sv_json_push(json, array, json_string("neighbour"));
    return array;
}

static json_t *make_row(sv_json *json, const sv_result *result, const sv_compared *row)
{
    const sv_comparison *c = &row->comparison;
    json_t *object = json_object(), *unpaired = json_object();
    sv_json_put_text(json, object, "marker", c->marker);
    sv_json_put(json, object, "against", roles(json, row));
    sv_json_put_integer(json, object, "point", c->point);
    sv_json_put(json, object, "parameters", sv_json_parameters(json, &result->points[c->point]));
    sv_json_put_integer(json, object, "other", c->other);
    sv_json_put(json, object, "other_parameters",
                sv_json_parameters(json, &result->points[c->other]));
    sv_json_put_integer(json, object, "pairs", c->pairs);
    sv_json_put_real(json, object, "difference", c->difference);
    sv_json_put_real(json, object, "standard_error", c->standard_error);
    sv_json_put_range(json, object, "interval", c->interval);
    sv_json_put_real(json, object, "p_value", c->p_value);
    sv_json_put_real(json, object, "adjusted_p_value", c->adjusted_p_value);
    sv_json_put_real(json, object, "correlation", c->correlation);
    sv_json_put_real(json, unpaired, "standard_error", c->unpaired_error);
    sv_json_put_real(json, unpaired, "p_value", c->unpaired_p_value);
    sv_json_put(json, object, "unpaired", unpaired);
    if (c->is_index && c->pairs > 0) {
        sv_json_put_integer(json, object, "index", c->index);
        sv_json_put_integer(json, object, "lost", c->lost);
        sv_json_put_integer(json, object, "gained", c->gained);
    }
    if (c->pairs < 2)
        sv_json_put_text(json, object, "reason",
                         "fewer than two realisations are resolved at both points");
    return object;
}

void sv_comparisons_put(sv_json *json, json_t *document, const sv_result *result)
{
    json_t *array = json_array();
    for (int32_t k = 0; k < result->n_comparisons; k++)
        sv_json_push(json, array, make_row(json, result, &result->comparisons[k]));
    sv_json_put(json, document, "comparisons", array);
}

/* The first point along the sweep whose mean differs from that of point 0 for certain, and what
 * pairing the realisations was worth. */
void sv_comparisons_sentence(const sv_result *result, const char *marker, FILE *stream)
{
    const sv_comparison *found = NULL;
    for (int32_t k = 0; k < result->n_comparisons && found == NULL; k++) {
        const sv_compared *row = &result->comparisons[k];
        if (row->first && strcmp(row->comparison.marker, marker) == 0 &&
            row->comparison.adjusted_p_value < 0.05)
            found = &row->comparison;
    }
    if (result->n_points < 2 || result->points[0].n_coordinates != 1 || found == NULL)
        return;
    const sv_coordinate *at = &result->points[found->point].coordinates[0];
    char value[40], path[256], difference[64], line[400];
    sv_words_value(at, value, sizeof value);
    sv_words_fit(at->path, 24, path, sizeof path);
    sv_format_uncertain(found->difference, found->standard_error, difference, sizeof difference);
    int used =
        snprintf(line, sizeof line, "Differs from the first point from %s = %s%s%s on: %s", path,
                 value, at->unit != NULL ? " " : "", at->unit != NULL ? at->unit : "", difference);
    if (found->is_index)
        snprintf(line + used, sizeof line - (size_t)used,
                 " in the mean; %lld of %lld realisations lost the index %lld, %lld gained it.",
                 (long long)found->lost, (long long)found->pairs, (long long)found->index,
                 (long long)found->gained);
    else
        snprintf(line + used, sizeof line - (size_t)used,
                 " in the same realisations; apart, the error would be %.2g.",
                 found->unpaired_error);
    sv_table_wrapped(stream, line);
}

static void add_real(sv_draft *text, double value)
{
    char word[32];
    sv_draft_add(text, ",");
    if (!isfinite(value))
        return;
    sv_words_real(value, word, sizeof word);
    sv_draft_add(text, "%s", word);
}

sv_status sv_comparisons_csv(sv_context *context, const sv_result *result, char **ret_text)
{
    sv_draft text = {.context = context};
    sv_draft_add(&text,
                 "# Point minus other, over the realisations resolved at both; points count from 0 "
                 "as in points.csv.\n# p_value: paired t test, of an index the exact test of lost "
                 "against gained; adjusted: Holm.\nmarker,against,point,other,pairs,difference,"
                 "standard_error,interval_low,interval_high,p_value,adjusted_p_value,correlation,"
                 "unpaired_error,unpaired_p_value,index,lost,gained\n");
    for (int32_t k = 0; k < result->n_comparisons; k++) {
        const sv_compared *row = &result->comparisons[k];
        const sv_comparison *c = &row->comparison;
        const double numbers[] = {c->difference,  c->standard_error, c->interval[0],
                                  c->interval[1], c->p_value,        c->adjusted_p_value,
                                  c->correlation, c->unpaired_error, c->unpaired_p_value};
        sv_draft_add(&text, "%s,%s,%d,%d,%lld", c->marker,
                     !row->first      ? "neighbour"
                     : row->neighbour ? "first neighbour"
                                      : "first",
                     c->point, c->other, (long long)c->pairs);
        for (size_t i = 0; i < sizeof numbers / sizeof *numbers; i++)
            add_real(&text, numbers[i]);
        if (c->is_index && c->pairs > 0)
            sv_draft_add(&text, ",%lld,%lld,%lld\n", (long long)c->index, (long long)c->lost,
                         (long long)c->gained);
        else
            sv_draft_add(&text, ",,,\n");
    }
    return sv_draft_finish(&text, ret_text);
}
