/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Between tree.c, which builds, and tree_faults.c, which refuses. */
#ifndef SELVEDGE_TREE_INTERNAL_H
#define SELVEDGE_TREE_INTERNAL_H

#include "sheet_internal.h"

#include <yaml.h>

/* A list or mapping that is still open. */
typedef struct sv_tree_frame {
    sv_node *node;
    sv_node **children;
    sv_index count, capacity;
} sv_tree_frame;

typedef struct sv_tree_anchor {
    const char *name;
    sv_node *node;
} sv_tree_anchor;

/* The tree while it is being read. */
typedef struct sv_tree_builder {
    sv_context *context;
    sv_arena *arena;
    sv_diagnostics *diagnostics;
    const sv_tree_input *input;
    int column_shift; /* characters before the YAML on its first line */
    yaml_parser_t parser;
    sv_tree_frame stack[SV_TREE_DEPTH];
    int depth;
    sv_index n_nodes;
    sv_tree_anchor *anchors;
    sv_index n_anchors, anchor_capacity;
    int n_documents;
    sv_node *root;
} sv_tree_builder;

sv_mark_point sv_tree_point(const sv_tree_builder *b, const yaml_mark_t *mark);
/* Adds the one diagnostic of a tree that is refused. Returns SV_INVALID_INPUT. */
sv_status sv_tree_fault(sv_tree_builder *b, sv_mark_point at, int length, const char *hint,
                        const char *format, ...) SV_PRINTF(5, 6);
/* Keys are plain words, and no merge keys. */
sv_status sv_tree_refuse_key(sv_tree_builder *b, const sv_node *node, bool is_alias);
sv_status sv_tree_refuse_tag(sv_tree_builder *b, const yaml_event_t *event, const yaml_char_t *tag);
/* A key given twice; both places are named. */
sv_status sv_tree_refuse_twins(sv_tree_builder *b, const sv_node *map);
/* What libyaml could not read. */
sv_status sv_tree_parser_failed(sv_tree_builder *b);

#endif
