/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Sweeps: the axes and the numbers they take. */
#include "sheet_internal.h"

#include <float.h>
#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

enum { MAX_POINTS = 1000000 };

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

/* [n, n] at the place of n. */
static const sv_node *square_node(sv_reader *reader, const sv_node *node)
{
    sv_node *pair = sv_reader_take(reader, 1, sizeof *pair);
    const sv_node **items = sv_reader_take(reader, 2, sizeof *items);
    if (pair == NULL || items == NULL)
        return NULL;
    *pair = *node;
    pair->kind = SV_NODE_LIST;
    pair->text = NULL;
    items[0] = items[1] = node;
    pair->items = items;
    pair->count = 2;
    return pair;
}

const sv_node *sv_sweep_first(sv_reader *reader, const sv_section *section, const sv_key *key)
{
    const sv_node *list = sv_node_get(reader->root, "sweep", NULL);
    for (sv_index i = 0; list != NULL && list->kind == SV_NODE_LIST && i < list->count; i++) {
        const sv_node *axis = list->items[i];
        if (!sv_path_matches(section, key->name, scalar_of(axis, "parameter")))
            continue;
        const sv_node *from = sv_node_get(axis, "from", NULL);
        const sv_node *values = sv_node_get(axis, "values", NULL);
        if (from == NULL && values != NULL && values->kind == SV_NODE_LIST && values->count > 0)
            from = values->items[0];
        if (from != NULL && from->kind == SV_NODE_SCALAR && sv_target_is_square(section, key))
            from = square_node(reader, from);
        return from;
    }
    return NULL;
}

/* Numbers of an axis while they are read. */
typedef struct numbers {
    sv_index singles, pairs; /* values written either way */
} numbers;

/* One value: a number, or a pair where the parameter is one. */
static bool read_number(sv_reader *reader, const sv_target *aim, const char *path,
                        const sv_node *node, numbers *seen, double ret_value[2])
{
    sv_value value = {0};
    const bool takes_one =
        aim->pair == NULL || aim->square || aim->row->type == SV_KEY_INTEGER_OR_PAIR;
    const bool pair = aim->pair != NULL && (node->kind == SV_NODE_LIST || !takes_one);
    const sv_key *key = pair ? aim->pair : aim->key;
    if (!sv_value_read(reader, key, path, node, &value))
        return false;
    for (int i = 0; i < 2; i++) {
        const int at = pair ? i : 0;
        ret_value[i] =
            aim->key->type == SV_KEY_INTEGER ? (double)value.integer[at] : value.real[at];
    }
    seen->pairs += pair;
    seen->singles += !pair;
    return true;
}

/* Single numbers stay single unless the parameter is a pair. */
static void settle_pairs(const sv_target *aim, const numbers *seen, sv_sweep_axis *axis)
{
    axis->square = aim->square && seen->pairs == 0;
    if (seen->pairs == 0 && !aim->square)
        axis->second = NULL;
}

static bool take_values(sv_reader *reader, const sv_target *aim, sv_sweep_axis *axis)
{
    axis->values = sv_reader_take(reader, axis->count, sizeof *axis->values);
    if (aim->pair != NULL)
        axis->second = sv_reader_take(reader, axis->count, sizeof *axis->second);
    return axis->values != NULL && (aim->pair == NULL || axis->second != NULL);
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

static void fill_steps(double from, double to, sv_index count, double *values)
{
    sv_index last = count - 1;
    double scale = fmax(fabs(from), fabs(to));
    for (sv_index i = 0; i <= last; i++)
        values[i] = round_digits(from + (to - from) * (double)i / (double)last, scale);
    values[0] = from;
    values[last] = to;
}

static bool check_whole(sv_reader *reader, const sv_section *section, const sv_sweep_axis *axis,
                        const double *values)
{
    for (sv_index i = 0; axis->integer && i < axis->count; i++)
        if (values[i] != nearbyint(values[i]))
            return sv_report(reader, sv_section_node(section, "steps"),
                             "choose steps so that every value is whole, or give values",
                             "%s is a whole number, and the sweep gives it %.6g", axis->path,
                             values[i]);
    return true;
}

static bool read_steps(sv_reader *reader, const sv_section *section, const sv_target *aim,
                       sv_sweep_axis *axis)
{
    double from[2], to[2];
    numbers seen = {0};
    const char *missing = sv_section_written(section, "from") == 0    ? "from"
                          : sv_section_written(section, "to") == 0    ? "to"
                          : sv_section_written(section, "steps") == 0 ? "steps"
                                                                      : NULL;
    if (missing != NULL)
        return sv_report(reader, section->anchor, "give from, to and steps, or values",
                         "%s.%s is missing", section->path, missing);
    const sv_node *ends[2] = {sv_section_node(section, "from"), sv_section_node(section, "to")};
    axis->count = sv_section_value(section, "steps")->integer[0];
    if (!take_values(reader, aim, axis) ||
        !read_number(reader, aim, axis->path, ends[0], &seen, from) ||
        !read_number(reader, aim, axis->path, ends[1], &seen, to))
        return false;
    fill_steps(from[0], to[0], axis->count, axis->values);
    if (axis->second != NULL)
        fill_steps(from[1], to[1], axis->count, axis->second);
    settle_pairs(aim, &seen, axis);
    return check_whole(reader, section, axis, axis->values) &&
           (axis->second == NULL || check_whole(reader, section, axis, axis->second));
}

static bool read_values(sv_reader *reader, const sv_section *section, const sv_target *aim,
                        sv_sweep_axis *axis)
{
    numbers seen = {0};
    const sv_node *list = sv_section_node(section, "values");
    if (!sv_section_none_of(reader, section, "from to steps", "has no meaning beside values"))
        return false;
    if (list->kind != SV_NODE_LIST || list->count == 0)
        return sv_report(reader, list, NULL, "%s.values: expected a list of numbers [a, b, …]",
                         section->path);
    axis->count = list->count;
    bool good = take_values(reader, aim, axis);
    for (sv_index i = 0; good && i < axis->count; i++) {
        double value[2];
        good = read_number(reader, aim, axis->path, list->items[i], &seen, value);
        axis->values[i] = value[0];
        if (axis->second != NULL)
            axis->second[i] = value[1];
    }
    settle_pairs(aim, &seen, axis);
    return good;
}

/* What is written = scale · value, in the unit of the first number that has one. */
static double base_of(const sv_reader *reader, const sv_key *key)
{
    double a = reader->lattice_constant;
    double unit = reader->energy_unit > 0.0 ? reader->energy_unit : 1.0;
    if (sv_schema_is_scale(key)) /* stays in nm or eV */
        return 1.0;
    switch (key->dimension) {
    case SV_DIM_LENGTH:
        return a;
    case SV_DIM_DENSITY:
        return 1.0 / (a * a);
    case SV_DIM_VOLUME_DENSITY:
        return 1.0 / (a * a * a);
    case SV_DIM_ENERGY:
    case SV_DIM_ENERGY_LENGTH:
    case SV_DIM_ENERGY_AREA:
        return unit;
    default:
        return 1.0;
    }
}

/* The first number of the node that is written with a unit. */
static const sv_unit *unit_of(const sv_node *node, sv_dimension dimension)
{
    sv_quantity quantity = {0};
    const sv_unit *unit = NULL;
    for (sv_index i = 0; node->kind == SV_NODE_LIST && i < node->count && unit == NULL; i++)
        unit = unit_of(node->items[i], dimension);
    if (node->kind == SV_NODE_SCALAR &&
        sv_parse_quantity(node->text, dimension, &quantity) == SV_PARSE_OK && quantity.has_unit)
        unit = quantity.unit;
    return unit;
}

static void set_unit(const sv_reader *reader, const sv_node *const *nodes, int n,
                     const sv_target *aim, sv_sweep_axis *axis)
{
    const sv_unit *unit = NULL;
    for (int i = 0; i < n && unit == NULL; i++)
        unit = unit_of(nodes[i], aim->key->dimension);
    axis->unit = unit != NULL ? unit->symbol : NULL;
    axis->unit_scale = unit != NULL ? base_of(reader, aim->key) / unit->factor : 1.0;
}

static bool read_axis(sv_reader *reader, const sv_section *section, sv_target *aim,
                      sv_sweep_axis *axis)
{
    const sv_node *node = sv_section_node(section, "parameter");
    const char *path = sv_section_value(section, "parameter")->text;
    if (strlen(path) >= sizeof axis->path)
        return sv_report(reader, node, NULL, "the path is too long");
    if (!sv_target_find(reader, path, node, aim))
        return false;
    snprintf(axis->path, sizeof axis->path, "%s", path);
    axis->integer = aim->key->type == SV_KEY_INTEGER;
    const bool by_list = sv_section_written(section, "values") > 0;
    const sv_node *nodes[2] = {sv_section_node(section, by_list ? "values" : "from"),
                               sv_section_node(section, "to")};
    bool good =
        by_list ? read_values(reader, section, aim, axis) : read_steps(reader, section, aim, axis);
    if (good)
        set_unit(reader, nodes, by_list ? 1 : 2, aim, axis);
    return good;
}

bool sv_sweep_read(sv_reader *reader, sv_setup *setup)
{
    const sv_section *section = NULL;
    sv_index points = 1;
    sv_target aims[2] = {0};
    while ((section = sv_document_find(reader, "sweep", section)) != NULL) {
        sv_sweep_axis *axis = &setup->axes[setup->n_axes];
        if (!read_axis(reader, section, &aims[setup->n_axes], axis))
            return false;
        if (setup->n_axes == 1 && sv_targets_clash(&aims[0], &aims[1]))
            return sv_report(reader, sv_section_node(section, "parameter"),
                             "sweep another parameter, or put all values on one axis",
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

sv_assignment sv_sweep_value(const sv_sweep_axis *axis, sv_index number)
{
    const bool pair = axis->second != NULL;
    return (sv_assignment){.path = axis->path,
                           .value = axis->values[number],
                           .second = pair ? axis->second[number] : 0.0,
                           .pair = pair};
}

bool sv_sweep_read_numbers(sv_reader *reader, const sv_node *path_node, const sv_node *const *nodes,
                           int n, sv_sweep_axis *axis)
{
    sv_target aim = {0};
    numbers seen = {0};
    if (strlen(path_node->text) >= sizeof axis->path)
        return sv_report(reader, path_node, NULL, "the path is too long");
    snprintf(axis->path, sizeof axis->path, "%s", path_node->text);
    if (!sv_target_find(reader, axis->path, path_node, &aim))
        return false;
    if (aim.pair != NULL)
        return sv_report(reader, path_node, "one of the two: end the path with .0 or .1",
                         "a single number is needed, and %.100s is a pair", axis->path);
    axis->integer = aim.key->type == SV_KEY_INTEGER;
    axis->count = n;
    axis->values = sv_reader_take(reader, n, sizeof *axis->values);
    bool good = axis->values != NULL;
    for (int i = 0; good && i < n; i++) {
        double value[2] = {0.0, 0.0};
        good = read_number(reader, &aim, axis->path, nodes[i], &seen, value);
        axis->values[i] = value[0];
    }
    if (good)
        set_unit(reader, nodes, n, &aim, axis);
    return good;
}
