/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The list of keys for help and manual, from the tables that drive the parser. */
#include "sheet_internal.h"

#include <string.h>

static const char *type_words(const sv_key *key)
{
    switch (key->type) {
    case SV_KEY_REAL:
        return key->dimension == SV_DIM_NONE ? "number" : sv_dimension_name(key->dimension);
    case SV_KEY_INTEGER:
        return "whole number";
    case SV_KEY_TEXT:
        return "text";
    case SV_KEY_CHOICE:
        return "one word";
    case SV_KEY_FLAG:
        return "true or false";
    case SV_KEY_FILE:
        return "file";
    case SV_KEY_REAL_PAIR:
        return key->dimension == SV_DIM_LENGTH ? "[x, y], lengths" : "[x, y]";
    case SV_KEY_INTEGER_PAIR:
        return "[i, j]";
    case SV_KEY_INTEGER_OR_PAIR:
        return "n or [n1, n2]";
    case SV_KEY_AUTO_OR_REAL:
        return "auto or number";
    case SV_KEY_PLACE:
        return "centre or [x, y]";
    case SV_KEY_REAL_LIST:
        return "[a, b, …]";
    case SV_KEY_POINTS:
        return "[[x, y], …]";
    case SV_KEY_LOOPS:
        return "[[[x, y], …], …]";
    case SV_KEY_TREE:
        return "nested";
    case SV_KEY_CHOICE_PAIR:
        return "word or [a, b]";
    }
    return "";
}

static bool has_range(const sv_key *key)
{
    bool numeric = key->type == SV_KEY_REAL || key->type == SV_KEY_INTEGER ||
                   key->type == SV_KEY_REAL_PAIR || key->type == SV_KEY_INTEGER_PAIR ||
                   key->type == SV_KEY_INTEGER_OR_PAIR || key->type == SV_KEY_AUTO_OR_REAL ||
                   key->type == SV_KEY_REAL_LIST;
    return numeric && (key->low != 0.0 || key->high != 0.0);
}

static void print_range(const sv_key *key, FILE *stream)
{
    char low[32], high[32];
    sv_format_bound(key->low, low, sizeof low);
    sv_format_bound(key->high, high, sizeof high);
    fprintf(stream, ", %s%s", key->low_open ? "above " : "", low);
    if (key->high == key->low)
        return;
    if (key->high < 1e300)
        fprintf(stream, " … %s", high);
    else if (!key->low_open)
        fputs(" or more", stream);
}

static void print_key(const sv_key *key, int indent, FILE *stream)
{
    char units[200] = "";
    fprintf(stream, "%*s%-18s %s", indent, "", key->name, type_words(key));
    if (key->choices != NULL)
        fprintf(stream, ": %s", key->choices);
    if (has_range(key))
        print_range(key, stream);
    if (key->dimension != SV_DIM_NONE)
        sv_unit_list(key->dimension, units, sizeof units);
    if (units[0] != '\0')
        fprintf(stream, " (%s)", units);
    if (key->required)
        fputs(", required", stream);
    else if (key->fallback != NULL && key->fallback[0] != '\0')
        fprintf(stream, ", default %s", key->fallback);
    fprintf(stream, "\n%*s    %s\n", indent, "", key->doc != NULL ? key->doc : "");
}

static void print_kinds(const sv_kind *kinds, int n_kinds, const char *kind_key, int indent,
                        FILE *stream)
{
    for (int k = 0; k < n_kinds; k++) {
        if (kind_key != NULL)
            fprintf(stream, "%*s%s: %s\n", indent, "", kind_key, kinds[k].name);
        else
            fprintf(stream, "%*s%s:\n", indent, "", kinds[k].name);
        fprintf(stream, "%*s    %s\n", indent, "", kinds[k].doc != NULL ? kinds[k].doc : "");
        for (int i = 0; i < kinds[k].n_keys; i++)
            print_key(&kinds[k].keys[i], indent + 2, stream);
    }
}

static int depth_of(const sv_block *block)
{
    return block->parent == NULL ? 0 : depth_of(sv_schema_find(block->parent)) + 1;
}

void sv_sheet_print_keys(const sv_kind *markers, int n_markers, FILE *stream)
{
    int n_blocks = 0;
    const sv_block *blocks = sv_schema_blocks(&n_blocks);
    for (int i = 0; i < n_blocks; i++) {
        const sv_block *block = &blocks[i];
        int n_kinds = 0, indent = 2 * depth_of(block);
        const sv_kind *kinds = block->kinds != NULL ? block->kinds(&n_kinds) : NULL;
        if (block->parent != NULL)
            fprintf(stream, "%s%*s%s:%s\n%*s    %s\n", indent == 2 ? "\n" : "", indent - 2, "",
                    block->name, block->required ? " required" : "", indent - 2, "", block->doc);
        for (int k = 0; k < block->n_keys; k++)
            print_key(&block->keys[k], indent, stream);
        if (block->form == SV_BLOCK_NAMED)
            print_kinds(markers, n_markers, NULL, indent, stream);
        else
            print_kinds(kinds, n_kinds, block->kind_key, indent, stream);
    }
}
