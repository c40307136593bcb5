/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Questions about nodes of the tree. */
#include "sheet_internal.h"

#include <string.h>

sv_place sv_node_place(const sv_node *node)
{
    if (node == NULL)
        return (sv_place){0};
    sv_place place = {node->source, node->start.line, node->start.column, 1};
    if (node->end.line == node->start.line && node->end.column > node->start.column)
        place.length = node->end.column - node->start.column;
    return place;
}

const sv_node *sv_node_get(const sv_node *map, const char *key, const sv_node **ret_key)
{
    if (map == NULL || map->kind != SV_NODE_MAP)
        return NULL;
    for (sv_index i = 0; i < map->count; i++) {
        if (strcmp(map->items[2 * i]->text, key) != 0)
            continue;
        if (ret_key != NULL)
            *ret_key = map->items[2 * i];
        return map->items[2 * i + 1];
    }
    return NULL;
}

bool sv_node_is_null(const sv_node *node)
{
    if (node == NULL)
        return true;
    if (node->kind != SV_NODE_SCALAR || !node->plain)
        return false;
    return node->text[0] == '\0' || strcmp(node->text, "~") == 0 || strcmp(node->text, "null") == 0;
}

sv_status sv_node_scalar(sv_context *context, sv_arena *arena, const char *text,
                         const sv_source *source, sv_mark_point start, sv_node **ret_node)
{
    sv_node *node = NULL;
    const char *copy = NULL;
    sv_status status = sv_arena_text(context, arena, text, strlen(text), &copy);
    if (status == SV_OK)
        status = sv_arena_take(context, arena, sizeof *node, &node);
    if (status != SV_OK)
        return status;
    *node = (sv_node){.kind = SV_NODE_SCALAR,
                      .plain = true,
                      .text = copy,
                      .weight = 1,
                      .source = source,
                      .start = start,
                      .end = start};
    *ret_node = node;
    return SV_OK;
}
