/* SPDX-License-Identifier: GPL-3.0-or-later */
/* A node → the typed value of a key. The key decides the type; nothing is guessed. */
#include "sheet_internal.h"

#include <stdio.h>
#include <string.h>

static bool is_word(const sv_node *node, const char *word)
{
    return node->kind == SV_NODE_SCALAR && strcmp(node->text, word) == 0;
}

static bool read_integer(sv_reader *reader, const sv_key *key, const char *path,
                         const sv_node *node, int64_t *ret_value)
{
    int64_t value = 0;
    if (!sv_integer_read(reader, path, node, &value) ||
        !sv_range_check(reader, key, path, node, (double)value))
        return false;
    *ret_value = value;
    return true;
}

static bool is_pair(sv_reader *reader, const char *path, const sv_node *node, const char *shape)
{
    if (node->kind == SV_NODE_LIST && node->count == 2)
        return true;
    if (node->kind == SV_NODE_LIST)
        return sv_report(reader, node, NULL, "%s: expected a pair %s, got %lld values", path, shape,
                         (long long)node->count);
    return sv_report(reader, node, NULL, "%s: expected a pair %s", path, shape);
}

static bool read_reals(sv_reader *reader, const sv_key *key, const char *path, const sv_node *node,
                       sv_value *value)
{
    bool good = is_pair(reader, path, node, "[x, y]");
    for (int i = 0; good && i < 2; i++)
        good = sv_real_read(reader, key, path, node->items[i], &value->real[i]);
    value->count = 2;
    return good;
}

static bool read_integers(sv_reader *reader, const sv_key *key, const char *path,
                          const sv_node *node, sv_value *value)
{
    if (key->type == SV_KEY_INTEGER_OR_PAIR && node->kind == SV_NODE_SCALAR) {
        bool good = read_integer(reader, key, path, node, &value->integer[0]);
        value->integer[1] = value->integer[0];
        value->count = 1;
        return good;
    }
    bool good = is_pair(reader, path, node, "[n1, n2] of whole numbers");
    for (int i = 0; good && i < 2; i++)
        good = read_integer(reader, key, path, node->items[i], &value->integer[i]);
    value->count = 2;
    return good;
}

static bool read_list(sv_reader *reader, const sv_key *key, const char *path, const sv_node *node,
                      sv_value *value)
{
    if (node->kind != SV_NODE_LIST || node->count == 0)
        return sv_report(reader, node, NULL, "%s: expected a list of numbers [a, b, …]", path);
    double *list = sv_reader_take(reader, node->count, sizeof *list);
    bool good = list != NULL;
    for (sv_index i = 0; good && i < node->count; i++)
        good = sv_real_read(reader, key, path, node->items[i], &list[i]);
    value->list = list;
    value->count = (int)node->count;
    return good;
}

/* [[x, y], …] appended to the list. */
static bool read_points(sv_reader *reader, const sv_key *key, const char *path, const sv_node *node,
                        double *list, int *n)
{
    if (node->kind != SV_NODE_LIST || node->count == 0)
        return sv_report(reader, node, NULL, "%s: expected a list of points [[x, y], …]", path);
    for (sv_index i = 0; i < node->count; i++) {
        sv_value point = {0};
        if (!read_reals(reader, key, path, node->items[i], &point))
            return false;
        list[(*n)++] = point.real[0];
        list[(*n)++] = point.real[1];
    }
    return true;
}

/* Nodes of a tree; `weight` does not count what an override has put in. */
static sv_index count_nodes(const sv_node *node)
{
    sv_index n = 1;
    for (sv_index i = 0; node->kind == SV_NODE_LIST && i < node->count; i++)
        n += count_nodes(node->items[i]);
    return n;
}

/* Points of one loop, or of several, each preceded by their number. */
static bool read_loops(sv_reader *reader, const sv_key *key, const char *path, const sv_node *node,
                       sv_value *value)
{
    double *list = sv_reader_take(reader, count_nodes(node), sizeof *list);
    bool good = list != NULL;
    value->list = list;
    value->count = 0;
    if (good && key->type == SV_KEY_POINTS)
        return read_points(reader, key, path, node, list, &value->count);
    if (good && node->kind != SV_NODE_LIST)
        return sv_report(reader, node, NULL, "%s: expected a list of loops [[[x, y], …], …]", path);
    for (sv_index i = 0; good && i < node->count; i++) {
        const sv_node *loop = node->items[i];
        if (loop->kind != SV_NODE_LIST || loop->count == 0 || loop->items[0]->kind != SV_NODE_LIST)
            return sv_report(reader, loop, "one hole too is a list of holes: [[[x, y], …]]",
                             "%s: expected a list of points [[x, y], …]", path);
        list[value->count++] = (double)loop->count;
        good = read_points(reader, key, path, node->items[i], list, &value->count);
    }
    return good;
}

static bool read_text(sv_reader *reader, const char *path, const sv_node *node, sv_value *value)
{
    if (!sv_scalar_check(reader, path, node, "text"))
        return false;
    value->text = sv_reader_text(reader, "%s", node->text);
    return value->text != NULL;
}

bool sv_choice_word(const char *choices, int row, char *word, size_t size)
{
    while (row-- > 0 && *choices != '\0') {
        choices += strcspn(choices, " ");
        choices += strspn(choices, " ");
    }
    snprintf(word, size, "%.*s", (int)strcspn(choices, " "), choices);
    return word[0] != '\0';
}

/* Row of a word among space-separated choices, or −1. */
static int choice_row(const char *choices, const char *word)
{
    char choice[64];
    for (int row = 0; sv_choice_word(choices, row, choice, sizeof choice); row++)
        if (strcmp(choice, word) == 0)
            return row;
    return -1;
}

static bool read_choice(sv_reader *reader, const sv_key *key, const char *path, const sv_node *node,
                        int64_t *ret_row)
{
    if (!sv_scalar_check(reader, path, node, "a word"))
        return false;
    int row = choice_row(key->choices, node->text);
    if (row >= 0) {
        *ret_row = row;
        return true;
    }
    char hint[400];
    sv_suggestion suggestion = sv_suggest_start(node->text);
    sv_suggest_words(&suggestion, key->choices);
    sv_suggest_hint(&suggestion, hint, sizeof hint);
    return sv_report(reader, node, hint, "%s: %.60s is not one of: %s", path, node->text,
                     key->choices);
}

static bool read_choices(sv_reader *reader, const sv_key *key, const char *path,
                         const sv_node *node, sv_value *value)
{
    bool is_list = node->kind == SV_NODE_LIST;
    bool good = !is_list || is_pair(reader, path, node, "[a, b]");
    for (int i = 0; good && i < 2; i++)
        good = read_choice(reader, key, path, is_list ? node->items[i] : node, &value->integer[i]);
    value->count = 2;
    return good;
}

static bool read_flag(sv_reader *reader, const char *path, const sv_node *node, sv_value *value)
{
    bool yes = is_word(node, "true"), no = is_word(node, "false");
    if (!yes && !no)
        return sv_report(reader, node, NULL, "%s: expected true or false", path);
    value->integer[0] = yes;
    return true;
}

static bool read_typed(sv_reader *reader, const sv_key *key, const char *path, const sv_node *node,
                       sv_value *value)
{
    int64_t row = 0;
    value->count = 1;
    switch (key->type) {
    case SV_KEY_AUTO_OR_REAL:
        value->has_auto = is_word(node, "auto");
        return value->has_auto || sv_real_read(reader, key, path, node, &value->real[0]);
    case SV_KEY_REAL:
        return sv_real_read(reader, key, path, node, &value->real[0]);
    case SV_KEY_INTEGER:
        return read_integer(reader, key, path, node, &value->integer[0]);
    case SV_KEY_CHOICE:
        return read_choice(reader, key, path, node, &row) && read_text(reader, path, node, value);
    case SV_KEY_TEXT:
        return read_text(reader, path, node, value);
    case SV_KEY_FLAG:
        return read_flag(reader, path, node, value);
    case SV_KEY_FILE:
        return sv_scalar_check(reader, path, node, "a file name") &&
               sv_file_load(reader, node, path, value);
    case SV_KEY_PLACE:
        value->has_auto = is_word(node, "centre");
        return value->has_auto || read_reals(reader, key, path, node, value);
    case SV_KEY_REAL_PAIR:
        return read_reals(reader, key, path, node, value);
    case SV_KEY_INTEGER_PAIR:
    case SV_KEY_INTEGER_OR_PAIR:
        return read_integers(reader, key, path, node, value);
    case SV_KEY_REAL_LIST:
        return read_list(reader, key, path, node, value);
    case SV_KEY_CHOICE_PAIR:
        return read_choices(reader, key, path, node, value);
    case SV_KEY_POINTS:
    case SV_KEY_LOOPS:
        return read_loops(reader, key, path, node, value);
    case SV_KEY_TREE:
        return true;
    }
    return true;
}

bool sv_value_read(sv_reader *reader, const sv_key *key, const char *path, const sv_node *node,
                   sv_value *ret_value)
{
    sv_value value = {.present = true, .written = node->source != NULL};
    if (!read_typed(reader, key, path, node, &value))
        return false;
    *ret_value = value;
    return true;
}
