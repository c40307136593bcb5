/* SPDX-License-Identifier: GPL-3.0-or-later */
/* A mapping of the sheet → the values of the keys its block may have. */
#include "sheet_internal.h"

#include <stdio.h>
#include <string.h>

enum { HINT_SIZE = 400 };

int sv_section_find(const sv_section *section, const char *key)
{
    for (int i = 0; i < section->n_fields; i++)
        if (strcmp(section->fields[i].key->name, key) == 0)
            return i;
    return -1;
}

const sv_value *sv_section_value(const sv_section *section, const char *key)
{
    static const sv_value absent = {0};
    int i = sv_section_find(section, key);
    return i < 0 ? &absent : &section->values[i];
}

const sv_node *sv_section_node(const sv_section *section, const char *key)
{
    int i = sv_section_find(section, key);
    return i >= 0 && section->fields[i].node != NULL ? section->fields[i].node : section->anchor;
}

static const char *path_of(sv_reader *reader, const sv_section *section, const char *key)
{
    const char *dot = section->path[0] != '\0' ? "." : "";
    return sv_reader_text(reader, "%s%s%s", section->path, dot, key);
}

int sv_section_written(const sv_section *section, const char *keys)
{
    int written = 0;
    for (int i = 0; i < section->n_fields; i++)
        written += section->values[i].written && sv_words_hold(keys, section->fields[i].key->name);
    return written;
}

bool sv_section_one_of(sv_reader *reader, const sv_section *section, const char *keys)
{
    char list[HINT_SIZE];
    int written = sv_section_written(section, keys);
    sv_suggestion names = sv_suggest_start("");
    sv_suggest_words(&names, keys);
    snprintf(list, sizeof list, "give exactly one of: %s", names.all);
    if (written == 1)
        return true;
    if (written == 0)
        return sv_report(reader, section->anchor, list, "%s lacks one of: %s", section->path,
                         names.all);
    const sv_field *last = NULL;
    for (int i = 0; i < section->n_fields; i++)
        if (section->values[i].written && sv_words_hold(keys, section->fields[i].key->name))
            last = &section->fields[i];
    return sv_report(reader, last->key_node != NULL ? last->key_node : section->anchor, list,
                     "%s: %s excludes what is given beside it", section->path, last->key->name);
}

bool sv_section_none_of(sv_reader *reader, const sv_section *section, const char *keys,
                        const char *why)
{
    for (int i = 0; i < section->n_fields; i++)
        if (section->values[i].written && sv_words_hold(keys, section->fields[i].key->name))
            return sv_report(reader, section->fields[i].key_node, "remove it", "%s.%s %s",
                             section->path, section->fields[i].key->name, why);
    return true;
}

/* The kind that the mapping names, into section->kind. */
static bool find_kind(sv_reader *reader, sv_section *section, const sv_node *map)
{
    const sv_block *block = section->block;
    const sv_node *node = block->kind_key ? sv_node_get(map, block->kind_key, NULL) : NULL;
    if (node == NULL || section->kind != NULL)
        return true; /* a missing name is reported with the other missing keys */
    int n_kinds = 0;
    const sv_kind *kinds = block->kinds(&n_kinds);
    const char *path = path_of(reader, section, block->kind_key);
    if (path == NULL || !sv_scalar_check(reader, path, node, "a word"))
        return false;
    char hint[HINT_SIZE];
    sv_suggestion suggestion = sv_suggest_start(node->text);
    for (int i = 0; i < n_kinds; i++) {
        sv_suggest_name(&suggestion, kinds[i].name);
        if (strcmp(kinds[i].name, node->text) != 0)
            continue;
        section->kind = &kinds[i];
        section->kind_row = i;
        return true;
    }
    sv_suggest_hint(&suggestion, hint, sizeof hint);
    return sv_report(reader, node, hint, "unknown %s %.60s: %.60s", block->name, block->kind_key,
                     node->text);
}

static bool rows_hold(const sv_key *keys, int n_keys, const char *name)
{
    for (int i = 0; i < n_keys; i++)
        if (strcmp(keys[i].name, name) == 0)
            return true;
    return false;
}

/* "… belongs to ensemble" for a key that stands in the wrong block or kind; false: nowhere. */
static bool hint_of_owner(const sv_section *section, const char *name, char *hint, size_t size)
{
    int n_blocks = 0, n_kinds = 0;
    const sv_block *blocks = sv_schema_blocks(&n_blocks);
    for (int i = 0; i < n_blocks; i++) {
        const sv_block *block = &blocks[i];
        if (block != section->block && rows_hold(block->keys, block->n_keys, name)) {
            snprintf(hint, size, "%s belongs to %s", name, i == 0 ? "the top level" : block->name);
            return true;
        }
        const sv_kind *kinds = block->kinds != NULL ? block->kinds(&n_kinds) : NULL;
        for (int k = 0; kinds != NULL && k < n_kinds; k++) {
            if (!rows_hold(kinds[k].keys, kinds[k].n_keys, name))
                continue;
            snprintf(hint, size, "%s belongs to %s: %s", name, block->name, kinds[k].name);
            return true;
        }
    }
    return false;
}

static bool report_unknown(sv_reader *reader, const sv_section *section, const sv_node *key)
{
    char hint[HINT_SIZE];
    sv_suggestion suggestion = sv_suggest_start(key->text);
    for (int i = 0; i < section->n_fields; i++)
        sv_suggest_name(&suggestion, section->fields[i].key->name);
    const sv_block *child = NULL;
    while ((child = sv_schema_child(section->block, child)) != NULL)
        sv_suggest_name(&suggestion, child->name);
    if (suggestion.best[0] != '\0' || !hint_of_owner(section, key->text, hint, sizeof hint))
        sv_suggest_hint(&suggestion, hint, sizeof hint);
    const char *where = section->path[0] != '\0' ? section->path : "the sheet";
    const char *kind = section->kind != NULL ? section->kind->name : "";
    bool named = strcmp(where + (strlen(where) > strlen(kind) ? strlen(where) - strlen(kind) : 0),
                        kind) == 0;
    return sv_report(reader, key, hint, "unknown key %.60s in %s%s%s%s", key->text, where,
                     named ? "" : " (", named ? "" : kind, named ? "" : ")");
}

static bool check_names(sv_reader *reader, const sv_section *section, const sv_node *map)
{
    /* Without its kind, only the common keys are known and the others cannot be judged. */
    if (map == NULL || (section->block->kinds != NULL && section->kind == NULL))
        return true;
    bool good = true;
    for (sv_index i = 0; i < map->count; i++) {
        const sv_node *key = map->items[2 * i];
        const sv_block *child = NULL;
        bool known = sv_section_find(section, key->text) >= 0;
        while (!known && (child = sv_schema_child(section->block, child)) != NULL)
            known = strcmp(child->name, key->text) == 0;
        if (!known)
            good = report_unknown(reader, section, key);
    }
    return good;
}

static bool report_missing(sv_reader *reader, const sv_section *section, const sv_key *key,
                           const char *path)
{
    char hint[HINT_SIZE];
    const sv_block *block = section->block;
    bool is_kind = block->kind_key != NULL && strcmp(block->kind_key, key->name) == 0;
    snprintf(hint, sizeof hint, "%s: %s", key->name, key->doc != NULL ? key->doc : "");
    if (is_kind) {
        int n_kinds = 0;
        const sv_kind *kinds = block->kinds(&n_kinds);
        sv_suggestion names = sv_suggest_start("");
        for (int i = 0; i < n_kinds; i++)
            sv_suggest_name(&names, kinds[i].name);
        sv_suggest_hint(&names, hint, sizeof hint);
    }
    return sv_report(reader, section->anchor, hint, "%s is missing", path);
}

/* Defaults are written as in a sheet: a scalar, or a flow list. */
static bool fallback_node(sv_reader *reader, const char *text, const sv_node **ret_node)
{
    sv_node *node = NULL;
    sv_source *source = sv_reader_take(reader, 1, sizeof *source);
    if (source == NULL)
        return false;
    *source = (sv_source){"default", text, strlen(text)};
    sv_tree_input input = {source, 0, "default"};
    sv_status status =
        text[0] == '[' || text[0] == '{'
            ? sv_tree_read(reader->context, reader->arena, &input, reader->diagnostics, &node)
            : sv_node_scalar(reader->context, reader->arena, text, NULL, (sv_mark_point){0, 0},
                             &node);
    if (status != SV_OK) {
        reader->status = reader->status != SV_OK ? reader->status : status;
        return false;
    }
    node->source = NULL;
    *ret_node = node;
    return true;
}

/* A default falls away when another key of its group is written or swept. */
static bool is_excluded(sv_reader *reader, const sv_section *section, const sv_node *map,
                        const sv_key *key)
{
    const char *group = section->block->exclusive;
    if (group == NULL || !sv_words_hold(group, key->name))
        return false;
    for (int i = 0; i < section->n_fields; i++) {
        const sv_key *other = section->fields[i].key;
        if (sv_words_hold(group, other->name) && (sv_node_get(map, other->name, NULL) != NULL ||
                                                  sv_sweep_first(reader, section, other) != NULL))
            return true;
    }
    return false;
}

static bool read_field(sv_reader *reader, sv_section *section, const sv_node *map, int i)
{
    sv_field *field = &section->fields[i];
    const sv_key *key = field->key;
    const char *path = path_of(reader, section, key->name);
    const sv_node *value = sv_node_get(map, key->name, &field->key_node);
    if (path == NULL)
        return false;
    /* A swept key need not be written: the sheet as written then has the first value. */
    if (value == NULL && key->fallback == NULL && key->type != SV_KEY_TREE)
        value = sv_sweep_first(reader, section, key);
    field->node = value;
    if (value == NULL && key->required)
        return report_missing(reader, section, key, path);
    if (value == NULL && (key->fallback == NULL || is_excluded(reader, section, map, key)))
        return true;
    if (value == NULL && !fallback_node(reader, key->fallback, &value))
        return false;
    reader->at_path = path;
    bool good = sv_value_read(reader, key, path, value, &section->values[i]);
    reader->at_path = NULL;
    return good;
}

/* Later values are converted with the scales the model block gives. */
static void note_scale(sv_reader *reader, const sv_section *section, int i)
{
    const sv_key *key = section->fields[i].key;
    if (!section->values[i].present || !sv_schema_is_scale(key))
        return;
    if (key->dimension == SV_DIM_LENGTH) {
        reader->lattice_constant = section->values[i].real[0];
        /* A model on a grid is in eV and nm. */
        if (sv_schema_is_grid(key) && reader->energy_unit <= 0.0)
            reader->energy_unit = 1.0;
    } else
        reader->energy_unit = section->values[i].real[0];
}

bool sv_section_read(sv_reader *reader, sv_section *section, const sv_node *map)
{
    const sv_block *block = section->block;
    bool good = find_kind(reader, section, map);
    int n_kind = section->kind != NULL ? section->kind->n_keys : 0;
    int n = block->n_keys + n_kind;
    sv_field *fields = sv_reader_take(reader, n, sizeof *fields);
    section->values = sv_reader_take(reader, n, sizeof *section->values);
    if (fields == NULL || section->values == NULL)
        return false;
    for (int i = 0; i < n; i++)
        fields[i].key =
            i < block->n_keys ? &block->keys[i] : &section->kind->keys[i - block->n_keys];
    section->fields = fields;
    section->n_fields = n;
    section->node = map;
    good = check_names(reader, section, map) && good;
    for (int i = 0; i < n; i++) {
        good = read_field(reader, section, map, i) && good;
        note_scale(reader, section, i);
    }
    return good;
}
