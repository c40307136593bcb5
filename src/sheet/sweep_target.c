/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Which key of the sheet an axis of a sweep points at, and how its numbers are read. */
#include "sheet_internal.h"

#include <stdio.h>
#include <string.h>

/* A component of a pair: the same row, read as one number. */
static bool target_component(const sv_key *key, const char *rest, sv_target *ret_target)
{
    bool real = key->type == SV_KEY_REAL_PAIR || key->type == SV_KEY_PLACE;
    bool integer = key->type == SV_KEY_INTEGER_PAIR || key->type == SV_KEY_INTEGER_OR_PAIR;
    if ((!real && !integer) || (strcmp(rest, "0") != 0 && strcmp(rest, "1") != 0))
        return false;
    ret_target->part = *key;
    ret_target->part.type = real ? SV_KEY_REAL : SV_KEY_INTEGER;
    ret_target->key = &ret_target->part;
    return true;
}

/* A number inside a nested block, such as model.onsite.a: it must be written in the sheet. */
static bool target_in_tree(sv_reader *reader, const sv_key *key, const char *path,
                           const sv_node *node, sv_target *ret_target)
{
    sv_path split;
    double number = 0.0;
    sv_place place = sv_node_place(node);
    if (!sv_path_split(reader, path, &place, &split))
        return false;
    const sv_node *value = sv_path_get(reader->root, &split);
    if (value == NULL || value->kind != SV_NODE_SCALAR)
        return false;
    bool energy = strcmp(key->name, "onsite") == 0 || strstr(path, ".amplitude") != NULL;
    sv_quantity quantity;
    sv_parse_result result =
        sv_parse_quantity(value->text, energy ? SV_DIM_ENERGY : SV_DIM_NONE, &quantity);
    if (result != SV_PARSE_OK && sv_parse_real(value->text, &number) != SV_PARSE_OK)
        return false;
    ret_target->part = (sv_key){.name = key->name,
                                .type = SV_KEY_REAL,
                                .dimension = energy ? SV_DIM_ENERGY : SV_DIM_NONE,
                                .low = -1e12,
                                .high = 1e12};
    ret_target->key = &ret_target->part;
    return true;
}

/* The rest of the path after section and key; NULL: another key. Empty: the key itself. */
static const char *rest_of(const sv_section *section, const char *key, const char *path)
{
    char prefix[SV_PATH_SIZE];
    size_t length = strlen(path);
    if (sv_path_matches(section, key, path))
        return "";
    for (size_t i = length; i-- > 0;) {
        if (path[i] != '.')
            continue;
        snprintf(prefix, sizeof prefix, "%.*s", (int)i, path);
        if (sv_path_matches(section, key, prefix))
            return path + i + 1;
    }
    return NULL;
}

static bool is_number(const sv_key *key)
{
    return key->type == SV_KEY_REAL || key->type == SV_KEY_INTEGER ||
           key->type == SV_KEY_AUTO_OR_REAL;
}

static bool is_pair(const sv_key *key)
{
    return key->type == SV_KEY_REAL_PAIR || key->type == SV_KEY_INTEGER_PAIR ||
           key->type == SV_KEY_INTEGER_OR_PAIR || key->type == SV_KEY_PLACE;
}

static bool is_swept_block(const sv_block *block)
{
    return block->name[0] != '\0' &&
           !sv_words_hold("ensemble stop sweep question criterion budget plateau finite_size",
                          block->name);
}

/* Sizes of a flake; elsewhere [n, n] is no more likely to be meant than anything else. */
bool sv_target_is_square(const sv_section *section, const sv_key *key)
{
    return strcmp(section->block->name, "flake") == 0 &&
           (key->type == SV_KEY_INTEGER_PAIR || key->type == SV_KEY_REAL_PAIR);
}

static bool report_not_found(sv_reader *reader, const char *path, const sv_node *node)
{
    char hint[600];
    const sv_section *flake = sv_document_find(reader, "flake", NULL);
    sv_suggestion suggestion = sv_suggest_start(path);
    bool of_flake = strncmp(path, "flake.", 6) == 0 && flake != NULL && flake->kind != NULL;
    for (const sv_section *s = reader->sections; s != NULL; s = s->next)
        for (int i = 0; i < s->n_fields && is_swept_block(s->block); i++) {
            char name[SV_PATH_SIZE];
            snprintf(name, sizeof name, "%s.%s", s->path, s->fields[i].key->name);
            if ((is_number(s->fields[i].key) || is_pair(s->fields[i].key)) &&
                (!of_flake || s == flake))
                sv_suggest_name(&suggestion, name);
        }
    sv_suggest_hint(&suggestion, hint, sizeof hint);
    if (of_flake)
        return sv_report(reader, node, hint, "nothing to sweep at %.100s: the shape is %s", path,
                         flake->kind->name);
    return sv_report(reader, node, hint, "nothing to sweep at %.100s", path);
}

/* The key itself: one number, or a pair. */
static void target_whole(const sv_section *section, const sv_key *key, sv_target *target)
{
    target->part = *key;
    target->whole = *key;
    if (key->type == SV_KEY_AUTO_OR_REAL || key->type == SV_KEY_REAL_PAIR ||
        key->type == SV_KEY_PLACE)
        target->part.type = SV_KEY_REAL;
    else
        target->part.type = key->type == SV_KEY_REAL ? SV_KEY_REAL : SV_KEY_INTEGER;
    target->whole.type = target->part.type == SV_KEY_REAL ? SV_KEY_REAL_PAIR : SV_KEY_INTEGER_PAIR;
    target->key = is_number(key) && key->type != SV_KEY_AUTO_OR_REAL ? key : &target->part;
    target->pair = is_pair(key) ? &target->whole : NULL;
    target->square = sv_target_is_square(section, key);
}

static bool target_of_field(sv_reader *reader, const sv_section *section, const sv_key *key,
                            const char *rest, const char *path, const sv_node *node,
                            sv_target *ret_target)
{
    if (!is_swept_block(section->block))
        return sv_report(reader, node, NULL, "%s cannot be swept", path);
    ret_target->section = section;
    ret_target->row = key;
    ret_target->rest = rest;
    if (*rest == '\0' && (is_number(key) || is_pair(key))) {
        target_whole(section, key, ret_target);
        return true;
    }
    if (*rest != '\0' && target_component(key, rest, ret_target))
        return true;
    if (*rest != '\0' && key->type == SV_KEY_TREE &&
        target_in_tree(reader, key, path, node, ret_target))
        return true;
    return sv_report(reader, node, NULL, "a sweep needs a number, and %.100s is none", path);
}

bool sv_target_find(sv_reader *reader, const char *path, const sv_node *node, sv_target *ret_target)
{
    for (const sv_section *s = reader->sections; s != NULL; s = s->next)
        for (int i = 0; i < s->n_fields; i++) {
            const sv_key *key = s->fields[i].key;
            const char *rest = rest_of(s, key->name, path);
            if (rest != NULL)
                return target_of_field(reader, s, key, rest, path, node, ret_target);
        }
    return report_not_found(reader, path, node);
}

bool sv_targets_clash(const sv_target *a, const sv_target *b)
{
    return a->section == b->section && a->row == b->row &&
           (*a->rest == '\0' || *b->rest == '\0' || strcmp(a->rest, b->rest) == 0);
}
