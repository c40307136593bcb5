/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Dotted paths: `disorder.vac.share`, `flake.cells.0`. Segments are keys; in a list, the entry of
 * that name, else of that kind when it has no name, else a number from 0. */
#include "sheet_internal.h"

#include <stdio.h>
#include <string.h>

static sv_place segment_place(const sv_path *path, int segment)
{
    int length = (int)strlen(path->segments[segment]);
    return (sv_place){path->source, path->line, path->columns[segment], length};
}

bool sv_path_split(sv_reader *reader, const char *text, const sv_place *place, sv_path *ret_path)
{
    sv_path path = {.source = place->source, .line = place->line};
    const char *rest = sv_reader_text(reader, "%s", text);
    if (rest == NULL)
        return false;
    char *at = NULL;
    memcpy(&at, &rest, sizeof at); /* the copy is ours to cut */
    int column = place->column;
    bool good = strlen(text) < SV_PATH_SIZE;
    while (good && at != NULL) {
        char *dot = strchr(at, '.');
        if (dot != NULL)
            *dot = '\0';
        good = *at != '\0' && path.count < (int)(sizeof path.columns / sizeof path.columns[0]);
        if (!good)
            break;
        path.segments[path.count] = at;
        path.columns[path.count++] = column;
        column += (int)strlen(at) + 1;
        at = dot != NULL ? dot + 1 : NULL;
    }
    if (!good)
        return sv_report_at(reader, place, "write keys with dots, as in disorder.vac.share",
                            "%.60s is not a dotted path", text);
    *ret_path = path;
    return true;
}

static const char *scalar_of(const sv_node *map, const char *key)
{
    const sv_node *node = sv_node_get(map, key, NULL);
    return node != NULL && node->kind == SV_NODE_SCALAR ? node->text : NULL;
}

/* What an entry of a list is called, or NULL. */
static const char *name_of_entry(const sv_node *entry)
{
    const char *name = scalar_of(entry, "name");
    return name != NULL ? name : scalar_of(entry, "kind");
}

static sv_index find_entry(const sv_node *list, const char *segment)
{
    int64_t number = 0;
    for (sv_index i = 0; i < list->count; i++) {
        const char *name = name_of_entry(list->items[i]);
        if (name != NULL && strcmp(name, segment) == 0)
            return i;
    }
    if (sv_parse_integer(segment, &number) != SV_PARSE_OK || number < 0 || number >= list->count)
        return -1;
    return number;
}

const sv_node *sv_path_get(const sv_node *root, const sv_path *path)
{
    const sv_node *node = root;
    for (int i = 0; i < path->count && node != NULL; i++) {
        sv_index entry = -1;
        if (node->kind == SV_NODE_LIST)
            entry = find_entry(node, path->segments[i]);
        node = node->kind == SV_NODE_MAP ? sv_node_get(node, path->segments[i], NULL)
               : entry >= 0              ? node->items[entry]
                                         : NULL;
    }
    return node;
}

/* The text of the first `count` segments. */
static const char *path_text(sv_reader *reader, const sv_path *path, int count)
{
    const char *text = "";
    for (int i = 0; i < count && text != NULL; i++)
        text = sv_reader_text(reader, "%s%s%s", text, i > 0 ? "." : "", path->segments[i]);
    return text != NULL ? text : "";
}

static bool report_no_entry(sv_reader *reader, const sv_node *list, const sv_path *path, int depth)
{
    char hint[400];
    sv_place place = segment_place(path, depth);
    sv_suggestion suggestion = sv_suggest_start(path->segments[depth]);
    for (sv_index i = 0; list != NULL && i < list->count; i++) {
        const char *name = name_of_entry(list->items[i]);
        if (name != NULL)
            sv_suggest_name(&suggestion, name);
    }
    sv_suggest_hint(&suggestion, hint, sizeof hint);
    if (suggestion.all[0] == '\0' && list != NULL && list->count > 0)
        snprintf(hint, sizeof hint, "entries are numbered 0 to %lld", (long long)list->count - 1);
    return sv_report_at(reader, &place, hint, "%s has no entry %.60s",
                        path_text(reader, path, depth), path->segments[depth]);
}

static sv_node *copy_node(sv_reader *reader, const sv_node *node, sv_index extra)
{
    sv_node *copy = sv_reader_take(reader, 1, sizeof *copy);
    sv_index n = node->kind == SV_NODE_MAP ? 2 * node->count : node->count;
    const sv_node **items = sv_reader_take(reader, n + extra, sizeof *items);
    if (copy == NULL || items == NULL)
        return NULL;
    *copy = *node;
    for (sv_index i = 0; i < n; i++)
        items[i] = node->items[i];
    copy->items = items;
    return copy;
}

static const sv_node *empty_map(sv_reader *reader, const sv_path *path, int depth)
{
    sv_node *map = sv_reader_take(reader, 1, sizeof *map);
    int segment = depth < path->count ? depth : path->count - 1;
    sv_mark_point at = {path->line, path->columns[segment]};
    if (map != NULL)
        *map = (sv_node){.kind = SV_NODE_MAP,
                         .weight = 1,
                         .source = path->source,
                         .start = at,
                         .end = {at.line, at.column + (int)strlen(path->segments[segment])}};
    return map;
}

static const sv_node *key_node(sv_reader *reader, const sv_path *path, int depth)
{
    sv_node *key = NULL;
    sv_place place = segment_place(path, depth);
    sv_mark_point at = {place.line, place.column};
    sv_status status = sv_node_scalar(reader->context, reader->arena, path->segments[depth],
                                      path->source, at, &key);
    if (status != SV_OK) {
        reader->status = status;
        return NULL;
    }
    key->end.column += place.length;
    return key;
}

static const sv_node *set_at(sv_reader *reader, const sv_node *node, const sv_path *path, int depth,
                             const sv_node *value);

static const sv_node *set_in_list(sv_reader *reader, const sv_node *list, const sv_path *path,
                                  int depth, const sv_node *value)
{
    sv_index entry = find_entry(list, path->segments[depth]);
    if (entry < 0) {
        report_no_entry(reader, list, path, depth);
        return NULL;
    }
    sv_node *copy = copy_node(reader, list, 0);
    const sv_node *child = set_at(reader, list->items[entry], path, depth + 1, value);
    if (copy == NULL || child == NULL)
        return NULL;
    copy->items[entry] = child;
    return copy;
}

static const sv_node *set_in_map(sv_reader *reader, const sv_node *map, const sv_path *path,
                                 int depth, const sv_node *value)
{
    sv_index at = 0;
    while (at < map->count && strcmp(map->items[2 * at]->text, path->segments[depth]) != 0)
        at++;
    bool is_new = at == map->count;
    const sv_node *key = is_new ? key_node(reader, path, depth) : map->items[2 * at];
    const sv_node *old = is_new ? NULL : map->items[2 * at + 1];
    sv_node *copy = copy_node(reader, map, is_new ? 2 : 0);
    const sv_node *child = set_at(reader, old, path, depth + 1, value);
    if (copy == NULL || child == NULL || key == NULL)
        return NULL;
    copy->items[2 * at] = key;
    copy->items[2 * at + 1] = child;
    copy->count += is_new;
    return copy;
}

/* The block a missing value would begin is a list: its entries cannot be made up. */
static bool misses_list(const sv_path *path, int depth)
{
    const sv_block *block = depth == 1 ? sv_schema_find(path->segments[0]) : NULL;
    return block != NULL && block->form == SV_BLOCK_LIST;
}

static const sv_node *set_at(sv_reader *reader, const sv_node *node, const sv_path *path, int depth,
                             const sv_node *value)
{
    if (depth == path->count)
        return value;
    bool missing = sv_node_is_null(node);
    if (missing && misses_list(path, depth)) {
        report_no_entry(reader, NULL, path, depth);
        return NULL;
    }
    if (missing)
        node = empty_map(reader, path, depth);
    if (node == NULL)
        return NULL;
    if (node->kind == SV_NODE_LIST)
        return set_in_list(reader, node, path, depth, value);
    if (node->kind == SV_NODE_MAP)
        return set_in_map(reader, node, path, depth, value);
    sv_place place = segment_place(path, depth);
    sv_report_at(reader, &place, NULL, "%s is a single value and has no %.60s",
                 path_text(reader, path, depth), path->segments[depth]);
    return NULL;
}

bool sv_path_set(sv_reader *reader, const sv_node *root, const sv_path *path, const sv_node *value,
                 const sv_node **ret_root)
{
    const sv_node *copy = set_at(reader, root, path, 0, value);
    if (copy == NULL)
        return false;
    *ret_root = copy;
    return true;
}

bool sv_path_matches(const sv_section *section, const char *key, const char *path)
{
    size_t n = strlen(section->path);
    if (n == 0)
        return strcmp(path, key) == 0;
    if (strncmp(path, section->path, n) == 0 && path[n] == '.' && strcmp(path + n + 1, key) == 0)
        return true;
    if (section->entry < 0)
        return false;
    char numbered[SV_PATH_SIZE];
    snprintf(numbered, sizeof numbered, "%s.%d.%s", section->block->name, section->entry, key);
    return strcmp(path, numbered) == 0;
}
