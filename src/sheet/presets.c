/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Material presets: data/presets.yaml, compiled in as text, read as any YAML. The sheet's model
 * takes what it does not say itself from the preset it names. */
#include "sheet_internal.h"

#include <string.h>

static const char SOURCE_NAME[] = "presets.yaml";

static sv_status read_tree(sv_context *context, sv_arena *arena, const sv_node **ret_root)
{
    sv_diagnostics diagnostics = {0};
    sv_source *source = NULL;
    sv_node *root = NULL;
    sv_status status = sv_arena_take(context, arena, sizeof *source, &source);
    if (status != SV_OK)
        return status;
    *source = (sv_source){SOURCE_NAME, sv_presets_text, strlen(sv_presets_text)};
    sv_tree_input input = {source, 0, "presets"};
    status = sv_tree_read(context, arena, &input, &diagnostics, &root);
    if (status == SV_INVALID_INPUT)
        status = SV_FAIL(context, SV_INTERNAL, "the presets of this build cannot be read: %.200s",
                         diagnostics.count > 0 ? diagnostics.items[0].message : "");
    sv_diagnostics_free(context, &diagnostics);
    if (status == SV_OK)
        *ret_root = root;
    return status;
}

/* ------------------------------------------------------------------- lists */

static const char *text_of(const sv_node *node)
{
    return node != NULL && node->kind == SV_NODE_SCALAR ? node->text : "";
}

static sv_status copy_values(sv_context *context, sv_arena *arena, const sv_node *values,
                             sv_preset *preset)
{
    sv_preset_value *rows = NULL;
    sv_status status = sv_arena_take(context, arena, (size_t)values->count * sizeof *rows, &rows);
    if (status != SV_OK)
        return status;
    for (sv_index i = 0; i < values->count; i++) {
        const sv_node *pair = values->items[2 * i + 1];
        if (pair->kind != SV_NODE_LIST || pair->count != 2)
            return SV_FAIL(context, SV_INTERNAL, "preset %s: %s lacks its source", preset->name,
                           values->items[2 * i]->text);
        rows[i] = (sv_preset_value){values->items[2 * i]->text, text_of(pair->items[0]),
                                    text_of(pair->items[1])};
    }
    preset->values = rows;
    preset->n_values = (int)values->count;
    return SV_OK;
}

static sv_status copy_notes(sv_context *context, sv_arena *arena, const sv_node *notes,
                            sv_preset *preset)
{
    const char **rows = NULL;
    if (notes == NULL)
        return SV_OK;
    sv_status status = sv_arena_take(context, arena, (size_t)notes->count * sizeof *rows, &rows);
    if (status != SV_OK)
        return status;
    for (sv_index i = 0; i < notes->count; i++)
        rows[i] = text_of(notes->items[i]);
    preset->notes = rows;
    preset->n_notes = (int)notes->count;
    return SV_OK;
}

sv_status sv_presets_read(sv_context *context, sv_presets *ret_presets)
{
    sv_presets presets = {0};
    sv_arena arena = {0};
    sv_preset *items = NULL;
    const sv_node *root = NULL;
    sv_status status = read_tree(context, &arena, &root);
    if (status == SV_OK)
        status = sv_arena_take(context, &arena, (size_t)root->count * sizeof *items, &items);
    for (sv_index i = 0; status == SV_OK && i < root->count; i++) {
        const sv_node *entry = root->items[2 * i + 1];
        const sv_node *values = sv_node_get(entry, "values", NULL);
        items[i] = (sv_preset){.name = root->items[2 * i]->text,
                               .title = text_of(sv_node_get(entry, "title", NULL))};
        if (values == NULL)
            status = SV_FAIL(context, SV_INTERNAL, "preset %s has no values", items[i].name);
        if (status == SV_OK)
            status = copy_values(context, &arena, values, &items[i]);
        if (status == SV_OK)
            status = copy_notes(context, &arena, sv_node_get(entry, "notes", NULL), &items[i]);
        presets.count += status == SV_OK;
    }
    presets.items = items;
    presets.memory = arena.chunks;
    if (status == SV_OK)
        *ret_presets = presets;
    else
        sv_arena_free(context, &arena);
    return status;
}

void sv_presets_free(sv_context *context, sv_presets *presets)
{
    sv_arena arena = {presets->memory};
    sv_arena_free(context, &arena);
    *presets = (sv_presets){0};
}

/* --------------------------------------------------------------- expansion */

/* The values of the preset that a node names; NULL after a report. */
static const sv_node *find_values(sv_reader *reader, const sv_node *name)
{
    const sv_node *root = NULL;
    char hint[400];
    if (!sv_scalar_check(reader, "model.preset", name, "the name of a preset"))
        return NULL;
    sv_status status = read_tree(reader->context, reader->arena, &root);
    if (status != SV_OK) {
        sv_report_status(reader, name, status);
        return NULL;
    }
    const sv_node *entry = sv_node_get(root, name->text, NULL);
    if (entry != NULL)
        return sv_node_get(entry, "values", NULL);
    sv_suggestion suggestion = sv_suggest_start(name->text);
    for (sv_index i = 0; i < root->count; i++)
        sv_suggest_name(&suggestion, root->items[2 * i]->text);
    sv_suggest_hint(&suggestion, hint, sizeof hint);
    sv_report(reader, name, hint, "unknown preset: %.60s", name->text);
    return NULL;
}

/* A map with further pairs; the memory is the reader's. */
static sv_node *widen(sv_reader *reader, const sv_node *map, sv_index more)
{
    sv_node *wide = sv_reader_take(reader, 1, sizeof *wide);
    const sv_node **items = sv_reader_take(reader, 2 * (map->count + more), sizeof(sv_node *));
    if (wide == NULL || items == NULL)
        return NULL;
    *wide = *map;
    for (sv_index i = 0; i < 2 * map->count; i++)
        items[i] = map->items[i];
    wide->items = items;
    return wide;
}

/* The model with what the preset says and the sheet does not. */
static const sv_node *fill_model(sv_reader *reader, const sv_node *model, const sv_node *values)
{
    sv_node *full = widen(reader, model, values->count);
    if (full == NULL)
        return NULL;
    for (sv_index i = 0; i < values->count; i++) {
        const sv_node *key = values->items[2 * i];
        if (sv_node_get(model, key->text, NULL) != NULL)
            continue;
        full->items[2 * full->count] = key;
        full->items[2 * full->count + 1] = values->items[2 * i + 1]->items[0];
        full->count++;
    }
    return full;
}

bool sv_preset_expand(sv_reader *reader, const sv_node **root)
{
    const sv_node *model = sv_node_get(*root, "model", NULL);
    const sv_node *name = model != NULL ? sv_node_get(model, "preset", NULL) : NULL;
    if (name == NULL)
        return true;
    const sv_node *values = find_values(reader, name);
    const sv_node *full = values != NULL ? fill_model(reader, model, values) : NULL;
    sv_node *top = full != NULL ? widen(reader, *root, 0) : NULL;
    if (top == NULL)
        return false;
    for (sv_index i = 0; i < top->count; i++)
        if (top->items[2 * i + 1] == model)
            top->items[2 * i + 1] = full;
    *root = top;
    return true;
}

const char *sv_sheet_preset(const sv_sheet *sheet)
{
    const sv_node *model = sv_node_get(sheet->root, "model", NULL);
    const sv_node *name = model != NULL ? sv_node_get(model, "preset", NULL) : NULL;
    return name != NULL ? name->text : NULL;
}

bool sv_sheet_is_preset_value(const sv_sheet *sheet, const char *key)
{
    const sv_node *model = sv_node_get(sheet->root, "model", NULL);
    const sv_node *value = model != NULL ? sv_node_get(model, key, NULL) : NULL;
    return value != NULL && value->source != NULL && strcmp(value->source->name, SOURCE_NAME) == 0;
}
