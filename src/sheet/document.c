/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The tree → all blocks of the schema, as sections in the order of the schema. */
#include "sheet_internal.h"

#include <ctype.h>
#include <stdio.h>
#include <string.h>

static void read_children(sv_reader *reader, const sv_block *block, const sv_node *map,
                          const sv_node *anchor, const char *path);

const sv_section *sv_document_find(const sv_reader *reader, const char *block,
                                   const sv_section *previous)
{
    const sv_section *section = previous != NULL ? previous->next : reader->sections;
    while (section != NULL && strcmp(section->block->name, block) != 0)
        section = section->next;
    return section;
}

static sv_section *new_section(sv_reader *reader, const sv_block *block, const char *path,
                               const sv_node *anchor)
{
    sv_section *section = sv_reader_take(reader, 1, sizeof *section);
    if (section == NULL)
        return NULL;
    *section =
        (sv_section){.block = block, .path = path, .anchor = anchor, .kind_row = -1, .entry = -1};
    if (reader->last_section != NULL)
        reader->last_section->next = section;
    else
        reader->sections = section;
    reader->last_section = section;
    return section;
}

/* The node as a mapping; NULL stands for an empty one. */
static bool as_map(sv_reader *reader, const char *path, const sv_node *node,
                   const sv_node **ret_map)
{
    *ret_map = sv_node_is_null(node) ? NULL : node;
    if (*ret_map == NULL || node->kind == SV_NODE_MAP)
        return true;
    return sv_report(reader, node, "write its keys below it, indented",
                     "%s: expected a mapping of keys, got a %s", path,
                     node->kind == SV_NODE_LIST ? "list" : "single value");
}

static void read_map(sv_reader *reader, const sv_block *block, const sv_node *node,
                     const sv_node *anchor, const char *path)
{
    const sv_node *map = NULL;
    if (!as_map(reader, path, node, &map))
        return;
    sv_section *section = new_section(reader, block, path, anchor);
    if (section == NULL)
        return;
    sv_section_read(reader, section, map);
    read_children(reader, block, map, anchor, path);
}

/* Names become segments of dotted paths, and a number points at the nth entry. */
static bool is_good_name(const char *name)
{
    if (!isalpha((unsigned char)name[0]) && name[0] != '_')
        return false;
    for (const char *at = name; *at != '\0'; at++)
        if (!isalnum((unsigned char)*at) && *at != '_' && *at != '-')
            return false;
    return strlen(name) < 64;
}

static bool check_entry_name(sv_reader *reader, const sv_section *section, const char *name,
                             const sv_node *name_node)
{
    if (!is_good_name(name))
        return sv_report(reader, name_node, "letters, digits, _ and -; it begins with a letter",
                         "%s: %.80s cannot be used as a name", section->block->name, name);
    const sv_section *other = NULL;
    while ((other = sv_document_find(reader, section->block->name, other)) != NULL) {
        if (other == section || strcmp(other->path, section->path) != 0)
            continue;
        return sv_report(reader, name_node, "give one of them a `name:` of its own",
                         "two entries of %s are called %s", section->block->name, name);
    }
    return true;
}

static const char *entry_name(const sv_block *block, const sv_node *map, const sv_node **ret_node)
{
    const char *keys[] = {"name", block->kind_key};
    for (int i = 0; i < 2; i++) {
        const sv_node *node = keys[i] != NULL ? sv_node_get(map, keys[i], NULL) : NULL;
        if (node == NULL || node->kind != SV_NODE_SCALAR)
            continue;
        *ret_node = node;
        return node->text;
    }
    return NULL;
}

/* The default of `name` is the kind. */
static void default_name(sv_section *section)
{
    int i = sv_section_find(section, "name");
    if (i < 0 || section->values[i].present || section->kind == NULL)
        return;
    section->values[i].present = true;
    section->values[i].text = section->kind->name;
}

static void read_entry(sv_reader *reader, const sv_block *block, const sv_node *node,
                       const char *list_path, int entry)
{
    const sv_node *map = NULL, *name_node = node;
    const char *number = sv_reader_text(reader, "%s.%d", list_path, entry);
    if (number == NULL || !as_map(reader, number, node, &map))
        return;
    const char *name = block->kind_key != NULL ? entry_name(block, map, &name_node) : NULL;
    const char *path = name != NULL ? sv_reader_text(reader, "%s.%s", list_path, name) : number;
    sv_section *section = path != NULL ? new_section(reader, block, path, node) : NULL;
    if (section == NULL)
        return;
    section->entry = entry;
    bool good = sv_section_read(reader, section, map);
    if (name != NULL && (good || section->kind != NULL))
        check_entry_name(reader, section, name, name_node);
    default_name(section);
}

static void read_list(sv_reader *reader, const sv_block *block, const sv_node *node,
                      const char *path)
{
    if (sv_node_is_null(node))
        return;
    if (node->kind != SV_NODE_LIST) {
        sv_report(reader, node, "start each entry with `- `", "%s: expected a list, got a %s", path,
                  node->kind == SV_NODE_MAP ? "mapping" : "single value");
        return;
    }
    if (node->count > block->max_entries) {
        sv_report(reader, node->items[block->max_entries], NULL, "%s has more than %d entries",
                  path, block->max_entries);
        return;
    }
    for (int i = 0; i < (int)node->count && reader->status == SV_OK; i++)
        read_entry(reader, block, node->items[i], path, i);
}

static void check_kind_names(sv_reader *reader, const sv_block *block, const sv_node *map)
{
    for (sv_index i = 0; map != NULL && i < map->count; i++) {
        const sv_node *key = map->items[2 * i];
        char hint[400];
        bool known = false;
        sv_suggestion suggestion = sv_suggest_start(key->text);
        for (int k = 0; k < reader->sheet->n_markers; k++) {
            sv_suggest_name(&suggestion, reader->sheet->markers[k].name);
            known = known || strcmp(reader->sheet->markers[k].name, key->text) == 0;
        }
        sv_suggest_hint(&suggestion, hint, sizeof hint);
        if (!known)
            sv_report(reader, key, hint, "unknown name %.60s in %s", key->text, block->name);
    }
}

/* Kinds in the order of their table, so that the order in the sheet changes nothing. */
static void read_named(sv_reader *reader, const sv_block *block, const sv_node *node,
                       const sv_node *anchor, const char *path)
{
    const sv_node *map = NULL;
    if (!as_map(reader, path, node, &map))
        return;
    bool none = map == NULL || map->count == 0;
    check_kind_names(reader, block, map);
    for (int k = 0; k < reader->sheet->n_markers && reader->status == SV_OK; k++) {
        const sv_kind *kind = &reader->sheet->markers[k];
        const sv_node *key = NULL, *keys = NULL;
        const sv_node *value = sv_node_get(map, kind->name, &key);
        if (none ? strcmp(kind->name, block->fallback) != 0 : value == NULL)
            continue;
        const char *kind_path = sv_reader_text(reader, "%s.%s", path, kind->name);
        if (kind_path == NULL || !as_map(reader, kind_path, value, &keys))
            continue;
        sv_section *section = new_section(reader, block, kind_path, key != NULL ? key : anchor);
        if (section == NULL)
            return;
        section->kind = kind;
        section->kind_row = k;
        sv_section_read(reader, section, keys);
    }
}

static void read_block(sv_reader *reader, const sv_block *block, const sv_node *parent,
                       const sv_node *parent_anchor, const char *parent_path)
{
    const sv_node *anchor = parent_anchor;
    const sv_node *node = sv_node_get(parent, block->name, &anchor);
    const char *dot = parent_path[0] != '\0' ? "." : "";
    const char *path = sv_reader_text(reader, "%s%s%s", parent_path, dot, block->name);
    if (path == NULL || (sv_node_is_null(node) && block->optional_section))
        return;
    if (sv_node_is_null(node) && block->required) {
        char hint[200];
        snprintf(hint, sizeof hint, "%s: %s", block->name, block->doc);
        sv_report(reader, anchor, hint, "%s is %s", path, node == NULL ? "missing" : "empty");
        return;
    }
    if (block->form == SV_BLOCK_MAP)
        read_map(reader, block, node, anchor, path);
    else if (block->form == SV_BLOCK_LIST)
        read_list(reader, block, node, path);
    else
        read_named(reader, block, node, anchor, path);
}

static void read_children(sv_reader *reader, const sv_block *block, const sv_node *map,
                          const sv_node *anchor, const char *path)
{
    const sv_block *child = NULL;
    while (reader->status == SV_OK && (child = sv_schema_child(block, child)) != NULL)
        read_block(reader, child, map, anchor, path);
}

void sv_document_read(sv_reader *reader)
{
    const sv_node *root = reader->root;
    if (sv_node_is_null(root))
        sv_report(reader, root, "begin with the line `selvedge: 1`", "the sheet is empty");
    else if (root->kind != SV_NODE_MAP)
        sv_report(reader, root, "begin with the line `selvedge: 1`",
                  "a sheet is a mapping of keys");
    else
        read_map(reader, sv_schema_find(""), root, root, "");
}
