/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Sweeps: which key an axis points at, and the numbers it takes. */
#include "sheet_internal.h"

#include <float.h>
#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

enum { MAX_POINTS = 1000000 };

/* The number a sweep points at: its key row, or one made for a part of a value. */
typedef struct target {
    const sv_key *key;
    sv_key part; /* `key` points here when only a part of a value is swept */
} target;

static const char *scalar_of(const sv_node *map, const char *key)
{
    const sv_node *node = sv_node_get(map, key, NULL);
    return node != NULL && node->kind == SV_NODE_SCALAR ? node->text : "";
}

const sv_node *sv_sweep_parameter(const sv_node *root, const char *path)
{
    const sv_node *list = sv_node_get(root, "sweep", NULL);
    for (sv_index i = 0; list != NULL && list->kind == SV_NODE_LIST && i < list->count; i++)
        if (strcmp(scalar_of(list->items[i], "parameter"), path) == 0)
            return sv_node_get(list->items[i], "parameter", NULL);
    return NULL;
}

const sv_node *sv_sweep_first(const sv_reader *reader, const sv_section *section, const char *key)
{
    const sv_node *list = sv_node_get(reader->root, "sweep", NULL);
    for (sv_index i = 0; list != NULL && list->kind == SV_NODE_LIST && i < list->count; i++) {
        const sv_node *axis = list->items[i];
        if (!sv_path_matches(section, key, scalar_of(axis, "parameter")))
            continue;
        const sv_node *from = sv_node_get(axis, "from", NULL);
        const sv_node *values = sv_node_get(axis, "values", NULL);
        if (from == NULL && values != NULL && values->kind == SV_NODE_LIST && values->count > 0)
            from = values->items[0];
        return from;
    }
    return NULL;
}

/* A component of a pair: the same row, read as one number. */
static bool target_component(const sv_key *key, const char *rest, target *ret_target)
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
                           const sv_node *node, target *ret_target)
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
           key->type == SV_KEY_AUTO_OR_REAL || key->type == SV_KEY_INTEGER_OR_PAIR;
}

static bool is_swept_block(const sv_block *block)
{
    return block->name[0] != '\0' &&
           !sv_words_hold("ensemble stop sweep question criterion budget", block->name);
}

static bool report_not_found(sv_reader *reader, const char *path, const sv_node *node)
{
    char hint[600];
    sv_suggestion suggestion = sv_suggest_start(path);
    for (const sv_section *s = reader->sections; s != NULL; s = s->next)
        for (int i = 0; i < s->n_fields && is_swept_block(s->block); i++) {
            char name[SV_PATH_SIZE];
            snprintf(name, sizeof name, "%s.%s", s->path, s->fields[i].key->name);
            if (is_number(s->fields[i].key))
                sv_suggest_name(&suggestion, name);
        }
    sv_suggest_hint(&suggestion, hint, sizeof hint);
    return sv_report(reader, node, hint, "nothing to sweep at %.100s", path);
}

static bool target_of_field(sv_reader *reader, const sv_section *section, const sv_key *key,
                            const char *rest, const char *path, const sv_node *node,
                            target *ret_target)
{
    if (!is_swept_block(section->block))
        return sv_report(reader, node, NULL, "%s cannot be swept", path);
    if (*rest == '\0' && is_number(key)) {
        ret_target->key = key;
        if (key->type == SV_KEY_REAL || key->type == SV_KEY_INTEGER)
            return true;
        ret_target->part = *key;
        ret_target->part.type = key->type == SV_KEY_AUTO_OR_REAL ? SV_KEY_REAL : SV_KEY_INTEGER;
        ret_target->key = &ret_target->part;
        return true;
    }
    if (*rest != '\0' && target_component(key, rest, ret_target))
        return true;
    if (*rest != '\0' && key->type == SV_KEY_TREE &&
        target_in_tree(reader, key, path, node, ret_target))
        return true;
    return sv_report(reader, node, NULL, "a sweep needs a number, and %.100s is none", path);
}

static bool find_target(sv_reader *reader, const char *path, const sv_node *node,
                        target *ret_target)
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

static bool read_number(sv_reader *reader, const target *aim, const char *path, const sv_node *node,
                        double *ret_value)
{
    sv_value value = {0};
    if (!sv_value_read(reader, aim->key, path, node, &value))
        return false;
    *ret_value = aim->key->type == SV_KEY_INTEGER ? (double)value.integer[0] : value.real[0];
    return true;
}

/* 0.2·3/10 is 0.06000000000000001 in binary; the nearest number of 15 digits is what is meant. */
static double round_digits(double value, double scale)
{
    char text[40];
    if (fabs(value) < 1e-14 * scale)
        return 0.0;
    snprintf(text, sizeof text, "%.15g", value);
    return strtod(text, NULL);
}

static void fill_steps(double from, double to, sv_sweep_axis *axis)
{
    sv_index last = axis->count - 1;
    double scale = fmax(fabs(from), fabs(to));
    for (sv_index i = 0; i <= last; i++)
        axis->values[i] = round_digits(from + (to - from) * (double)i / (double)last, scale);
    axis->values[0] = from;
    axis->values[last] = to;
}

static bool read_steps(sv_reader *reader, const sv_section *section, const target *aim,
                       sv_sweep_axis *axis)
{
    double from = 0.0, to = 0.0;
    const char *missing = sv_section_written(section, "from") == 0    ? "from"
                          : sv_section_written(section, "to") == 0    ? "to"
                          : sv_section_written(section, "steps") == 0 ? "steps"
                                                                      : NULL;
    if (missing != NULL)
        return sv_report(reader, section->anchor, "give from, to and steps, or values",
                         "%s.%s is missing", section->path, missing);
    const sv_node *ends[2] = {sv_section_node(section, "from"), sv_section_node(section, "to")};
    axis->count = sv_section_value(section, "steps")->integer[0];
    axis->values = sv_reader_take(reader, axis->count, sizeof *axis->values);
    if (axis->values == NULL || !read_number(reader, aim, axis->path, ends[0], &from) ||
        !read_number(reader, aim, axis->path, ends[1], &to))
        return false;
    fill_steps(from, to, axis);
    for (sv_index i = 0; axis->integer && i < axis->count; i++)
        if (axis->values[i] != nearbyint(axis->values[i]))
            return sv_report(reader, sv_section_node(section, "steps"),
                             "choose steps so that every value is whole, or give values",
                             "%s is a whole number, and the sweep gives it %.6g", axis->path,
                             axis->values[i]);
    return true;
}

static bool read_values(sv_reader *reader, const sv_section *section, const target *aim,
                        sv_sweep_axis *axis)
{
    const sv_node *list = sv_section_node(section, "values");
    if (!sv_section_none_of(reader, section, "from to steps", "has no meaning beside values"))
        return false;
    if (list->kind != SV_NODE_LIST || list->count == 0)
        return sv_report(reader, list, NULL, "%s.values: expected a list of numbers [a, b, …]",
                         section->path);
    axis->count = list->count;
    axis->values = sv_reader_take(reader, axis->count, sizeof *axis->values);
    bool good = axis->values != NULL;
    for (sv_index i = 0; good && i < axis->count; i++)
        good = read_number(reader, aim, axis->path, list->items[i], &axis->values[i]);
    return good;
}

/* The unit of the first value that has one: results are shown in it. */
static void unit_of(const sv_reader *reader, const sv_node *const *nodes, sv_index count,
                    const target *aim, sv_sweep_axis *axis)
{
    double a = reader->lattice_constant;
    double unit = reader->energy_unit > 0.0 ? reader->energy_unit : 1.0;
    sv_dimension dimension = aim->key->dimension;
    bool scale = sv_schema_is_scale(aim->key); /* stays in nm or eV */
    double base = scale                                ? 1.0
                  : dimension == SV_DIM_LENGTH         ? a
                  : dimension == SV_DIM_DENSITY        ? 1.0 / (a * a)
                  : dimension == SV_DIM_VOLUME_DENSITY ? 1.0 / (a * a * a)
                  : dimension == SV_DIM_ENERGY         ? unit
                  : dimension == SV_DIM_ENERGY_LENGTH  ? unit
                  : dimension == SV_DIM_ENERGY_AREA    ? unit
                                                       : 1.0;
    axis->unit_scale = 1.0;
    for (sv_index i = 0; i < count && axis->unit == NULL; i++) {
        sv_quantity quantity = {0};
        if (nodes[i]->text == NULL ||
            sv_parse_quantity(nodes[i]->text, aim->key->dimension, &quantity) != SV_PARSE_OK ||
            !quantity.has_unit)
            continue;
        axis->unit = quantity.unit->symbol;
        axis->unit_scale = base / quantity.unit->factor;
    }
}

static void set_unit(const sv_reader *reader, const sv_section *section, const target *aim,
                     sv_sweep_axis *axis)
{
    const sv_node *list = sv_section_node(section, "values");
    const sv_node *ends[2] = {sv_section_node(section, "from"), sv_section_node(section, "to")};
    bool by_list = sv_section_written(section, "values") > 0;
    unit_of(reader, by_list ? list->items : ends, by_list ? list->count : 2, aim, axis);
}

static bool read_axis(sv_reader *reader, const sv_section *section, sv_sweep_axis *axis)
{
    target aim = {0};
    const sv_node *node = sv_section_node(section, "parameter");
    const char *path = sv_section_value(section, "parameter")->text;
    if (strlen(path) >= sizeof axis->path)
        return sv_report(reader, node, NULL, "the path is too long");
    if (!find_target(reader, path, node, &aim))
        return false;
    snprintf(axis->path, sizeof axis->path, "%s", path);
    axis->integer = aim.key->type == SV_KEY_INTEGER;
    bool good = sv_section_written(section, "values") > 0 ? read_values(reader, section, &aim, axis)
                                                          : read_steps(reader, section, &aim, axis);
    if (good)
        set_unit(reader, section, &aim, axis);
    return good;
}

bool sv_sweep_read(sv_reader *reader, sv_setup *setup)
{
    const sv_section *section = NULL;
    sv_index points = 1;
    while ((section = sv_document_find(reader, "sweep", section)) != NULL) {
        sv_sweep_axis *axis = &setup->axes[setup->n_axes];
        if (!read_axis(reader, section, axis))
            return false;
        if (setup->n_axes == 1 && strcmp(axis->path, setup->axes[0].path) == 0)
            return sv_report(reader, sv_section_node(section, "parameter"), NULL,
                             "both axes sweep %s", axis->path);
        points *= axis->count;
        setup->n_axes++;
    }
    if (points > MAX_POINTS)
        return sv_report(reader, sv_section_node(sv_document_find(reader, "sweep", NULL), "steps"),
                         NULL, "the sweep has %lld points; at most %d", (long long)points,
                         MAX_POINTS);
    return true;
}

bool sv_sweep_read_numbers(sv_reader *reader, const sv_node *path_node, const sv_node *const *nodes,
                           int n, sv_sweep_axis *axis)
{
    target aim = {0};
    if (strlen(path_node->text) >= sizeof axis->path)
        return sv_report(reader, path_node, NULL, "the path is too long");
    snprintf(axis->path, sizeof axis->path, "%s", path_node->text);
    if (!find_target(reader, axis->path, path_node, &aim))
        return false;
    axis->integer = aim.key->type == SV_KEY_INTEGER;
    axis->count = n;
    axis->values = sv_reader_take(reader, n, sizeof *axis->values);
    bool good = axis->values != NULL;
    for (int i = 0; good && i < n; i++)
        good = read_number(reader, &aim, axis->path, nodes[i], &axis->values[i]);
    if (good)
        unit_of(reader, nodes, n, &aim, axis);
    return good;
}
