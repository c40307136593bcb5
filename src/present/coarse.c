/* SPDX-License-Identifier: GPL-3.0-or-later */
/* A coarse map of the local Chern marker: JSON, CSV, a few lines for a terminal. */
#include <math.h>

#include "present_internal.h"

static const char *why_empty(const sv_coarse *map, const sv_block *block)
{
    if (map->reason[0] != '\0')
        return map->reason;
    if (block->sampled == 0)
        return "all its cells lie too near to the edge";
    return "the numerical error is too large";
}

static json_t *make_column(sv_json *json, const sv_coarse *map, double (*value)(const sv_block *))
{
    json_t *array = json_array();
    for (sv_index k = 0; k < map->n_blocks; k++)
        if (map->blocks[k].cells > 0)
            sv_json_push(json, array, sv_json_real(value(&map->blocks[k])));
    return array;
}

static double x_of(const sv_block *b)
{
    return b->at[0];
}

static double y_of(const sv_block *b)
{
    return b->at[1];
}

static double mean_of(const sv_block *b)
{
    return b->mean;
}

static double error_of(const sv_block *b)
{
    return b->error;
}

static double numerical_of(const sv_block *b)
{
    return b->numerical_error;
}

void sv_coarse_put(sv_json *json, json_t *marker, const sv_coarse *map)
{
    json_t *object = json_object(), *count = json_array(), *cells = json_array();
    json_t *sampled = json_array(), *reasons = json_array();
    for (int d = 0; d < 2; d++)
        sv_json_push(json, count, json_integer((json_int_t)map->count[d]));
    sv_json_put(json, object, "count", count);
    sv_json_put_real(json, object, "side", map->side);
    sv_json_put(json, object, "x", make_column(json, map, x_of));
    sv_json_put(json, object, "y", make_column(json, map, y_of));
    sv_json_put(json, object, "mean", make_column(json, map, mean_of));
    sv_json_put(json, object, "error", make_column(json, map, error_of));
    sv_json_put(json, object, "numerical_error", make_column(json, map, numerical_of));
    for (sv_index k = 0; k < map->n_blocks; k++) {
        const sv_block *b = &map->blocks[k];
        if (b->cells == 0)
            continue;
        sv_json_push(json, cells, json_integer((json_int_t)b->cells));
        sv_json_push(json, sampled, json_integer((json_int_t)b->sampled));
        sv_json_push(json, reasons,
                     isfinite(b->mean) ? json_null() : json_string(why_empty(map, b)));
    }
    sv_json_put(json, object, "cells", cells);
    sv_json_put(json, object, "sampled", sampled);
    sv_json_put(json, object, "reasons", reasons);
    sv_json_put_text(json, object, "engine", map->engine);
    sv_json_put(json, marker, "blocks", object);
}

static void add_real(sv_draft *text, double value)
{
    char word[32] = "";
    if (isfinite(value))
        sv_words_real(value, word, sizeof word);
    sv_draft_add(text, "%s,", word);
}

sv_status sv_coarse_csv(sv_context *context, const sv_coarse *map, char **ret_text)
{
    sv_draft text = {.context = context};
    sv_draft_add(&text, "x,y,mean,error,numerical_error,cells,sampled\n");
    for (sv_index k = 0; k < map->n_blocks; k++) {
        const sv_block *b = &map->blocks[k];
        if (b->cells == 0)
            continue;
        add_real(&text, b->at[0]);
        add_real(&text, b->at[1]);
        add_real(&text, b->mean);
        add_real(&text, b->error);
        add_real(&text, b->numerical_error);
        sv_draft_add(&text, "%lld,%lld\n", (long long)b->cells, (long long)b->sampled);
    }
    return sv_draft_finish(&text, ret_text);
}

void sv_coarse_print(const sv_coarse *map, FILE *stream)
{
    const sv_block *least = NULL;
    sv_index with = 0, sampled = 0, blocks = 0;
    double worst = 0.0;
    for (sv_index k = 0; k < map->n_blocks; k++) {
        const sv_block *b = &map->blocks[k];
        blocks += b->cells > 0;
        sampled += b->sampled;
        if (!isfinite(b->mean))
            continue;
        with++;
        worst = fmax(worst, isfinite(b->error) ? b->error : 0.0);
        if (least == NULL || fabs(b->mean) < fabs(least->mean))
            least = b;
    }
    fprintf(stream,
            "\n  coarse map of %lld blocks, side %.4g, %lld cells computed (%s)\n"
            "    %lld blocks have a value, largest sampling error %.2g\n",
            (long long)blocks, map->side, (long long)sampled, map->engine, (long long)with, worst);
    if (least != NULL)
        fprintf(stream, "    smallest mean %.4g(%.2g) about (%.4g, %.4g)\n", least->mean,
                least->error, least->at[0], least->at[1]);
    if (map->reason[0] != '\0')
        fprintf(stream, "    %s\n", map->reason);
}
