/* SPDX-License-Identifier: GPL-3.0-or-later */
/* YAML events → a bounded tree with positions. Only what a sheet needs is let in: one document,
 * scalar keys, no tags, no merge keys; aliases become shared nodes. Types are not guessed here. */
#include "tree_internal.h"

#include <string.h>

static sv_status new_node(sv_tree_builder *b, const yaml_event_t *event, sv_node_kind kind,
                          sv_node **ret_node)
{
    sv_node *node = NULL;
    if (++b->n_nodes > SV_TREE_NODES)
        return sv_tree_fault(b, sv_tree_point(b, &event->start_mark), 1, NULL,
                             "the %s has more than %d values", b->input->what, SV_TREE_NODES);
    sv_status status = sv_arena_take(b->context, b->arena, sizeof *node, &node);
    if (status != SV_OK)
        return status;
    *node = (sv_node){.kind = kind,
                      .weight = 1,
                      .source = b->input->source,
                      .start = sv_tree_point(b, &event->start_mark),
                      .end = sv_tree_point(b, &event->end_mark)};
    *ret_node = node;
    return SV_OK;
}

/* Puts a node where it belongs: into the open list or mapping, or at the root. */
static sv_status place_node(sv_tree_builder *b, sv_node *node, bool is_alias)
{
    if (b->depth == 0) {
        b->root = node;
        return SV_OK;
    }
    sv_tree_frame *top = &b->stack[b->depth - 1];
    sv_status status = SV_OK;
    if (top->node->kind == SV_NODE_MAP && top->count % 2 == 0)
        status = sv_tree_refuse_key(b, node, is_alias);
    if (status == SV_OK)
        status = sv_reserve(b->context, &top->children, &top->capacity, top->count + 1,
                            sizeof *top->children);
    if (status == SV_OK)
        top->children[top->count++] = node;
    return status;
}

static sv_status add_anchor(sv_tree_builder *b, const yaml_char_t *name, sv_node *node)
{
    const char *text = (const char *)name;
    if (name == NULL)
        return SV_OK;
    if (b->n_anchors >= SV_TREE_ANCHORS)
        return sv_tree_fault(b, node->start, 1, NULL, "more than %d anchors", SV_TREE_ANCHORS);
    sv_status status = sv_reserve(b->context, &b->anchors, &b->anchor_capacity, b->n_anchors + 1,
                                  sizeof *b->anchors);
    if (status == SV_OK)
        status = sv_arena_text(b->context, b->arena, text, strlen(text), &text);
    if (status == SV_OK)
        b->anchors[b->n_anchors++] = (sv_tree_anchor){text, node};
    return status;
}

static sv_status on_alias(sv_tree_builder *b, const yaml_event_t *event)
{
    const char *name = (const char *)event->data.alias.anchor;
    sv_mark_point at = sv_tree_point(b, &event->start_mark);
    int length = (int)strlen(name) + 1;
    sv_node *node = NULL;
    for (sv_index i = b->n_anchors - 1; i >= 0 && node == NULL; i--)
        if (strcmp(b->anchors[i].name, name) == 0)
            node = b->anchors[i].node;
    if (node == NULL)
        return sv_tree_fault(b, at, length, "an alias follows its anchor (&name) in the same file",
                             "the alias *%.60s has no anchor", name);
    if (node->open)
        return sv_tree_fault(b, at, length, NULL, "the alias *%.60s stands inside its own anchor",
                             name);
    return place_node(b, node, true);
}

static sv_status on_scalar(sv_tree_builder *b, const yaml_event_t *event)
{
    sv_node *node = NULL;
    const char *text = (const char *)event->data.scalar.value;
    size_t length = event->data.scalar.length;
    sv_mark_point at = sv_tree_point(b, &event->start_mark);
    sv_status status = sv_tree_refuse_tag(b, event, event->data.scalar.tag);
    if (status != SV_OK)
        return status;
    if (length > SV_TREE_SCALAR)
        return sv_tree_fault(b, at, 1, NULL, "a value is longer than %d bytes", SV_TREE_SCALAR);
    if (memchr(text, '\0', length) != NULL)
        return sv_tree_fault(b, at, 1, NULL, "a value holds a NUL character");
    status = new_node(b, event, SV_NODE_SCALAR, &node);
    if (status == SV_OK)
        status = sv_arena_text(b->context, b->arena, text, length, &node->text);
    if (status == SV_OK)
        status = add_anchor(b, event->data.scalar.anchor, node);
    if (status != SV_OK)
        return status;
    node->plain = event->data.scalar.style == YAML_PLAIN_SCALAR_STYLE;
    return place_node(b, node, false);
}

static sv_status on_start(sv_tree_builder *b, const yaml_event_t *event, sv_node_kind kind,
                          const yaml_char_t *tag, const yaml_char_t *name)
{
    sv_node *node = NULL;
    sv_status status = sv_tree_refuse_tag(b, event, tag);
    if (status == SV_OK && b->depth == SV_TREE_DEPTH)
        status = sv_tree_fault(b, sv_tree_point(b, &event->start_mark), 1, NULL,
                               "lists and mappings nest deeper than %d", SV_TREE_DEPTH);
    if (status == SV_OK)
        status = new_node(b, event, kind, &node);
    if (status == SV_OK)
        status = add_anchor(b, name, node);
    if (status == SV_OK)
        status = place_node(b, node, false);
    if (status != SV_OK)
        return status;
    node->open = true;
    b->stack[b->depth++] = (sv_tree_frame){.node = node};
    return SV_OK;
}

/* Closes a list or mapping: its children move from the frame into the arena. */
static sv_status on_end(sv_tree_builder *b, const yaml_event_t *event)
{
    sv_tree_frame *top = &b->stack[b->depth - 1];
    sv_node *node = top->node;
    const sv_node **items = NULL;
    sv_status status =
        sv_arena_take(b->context, b->arena, sizeof(sv_node *) * (size_t)top->count, &items);
    if (status != SV_OK)
        return status;
    for (sv_index i = 0; i < top->count; i++) {
        items[i] = top->children[i];
        node->weight += top->children[i]->weight;
    }
    node->items = items;
    node->count = node->kind == SV_NODE_MAP ? top->count / 2 : top->count;
    node->open = false;
    if (node->start.column != sv_tree_point(b, &event->end_mark).column)
        node->end = sv_tree_point(b, &event->end_mark);
    sv_give(b->context, top->children);
    b->depth--;
    if (node->weight > SV_TREE_WALK)
        return sv_tree_fault(b, node->start, 1, NULL,
                             "aliases multiply this to more than %d values", SV_TREE_WALK);
    return node->kind == SV_NODE_MAP ? sv_tree_refuse_twins(b, node) : SV_OK;
}

static sv_status on_document(sv_tree_builder *b, const yaml_event_t *event)
{
    if (++b->n_documents > 1)
        return sv_tree_fault(b, sv_tree_point(b, &event->start_mark), 1,
                             "one file holds one sheet; remove what follows `---`",
                             "a second document");
    return SV_OK;
}

static sv_status on_event(sv_tree_builder *b, const yaml_event_t *event)
{
    switch (event->type) {
    case YAML_DOCUMENT_START_EVENT:
        return on_document(b, event);
    case YAML_ALIAS_EVENT:
        return on_alias(b, event);
    case YAML_SCALAR_EVENT:
        return on_scalar(b, event);
    case YAML_SEQUENCE_START_EVENT:
        return on_start(b, event, SV_NODE_LIST, event->data.sequence_start.tag,
                        event->data.sequence_start.anchor);
    case YAML_MAPPING_START_EVENT:
        return on_start(b, event, SV_NODE_MAP, event->data.mapping_start.tag,
                        event->data.mapping_start.anchor);
    case YAML_SEQUENCE_END_EVENT:
    case YAML_MAPPING_END_EVENT:
        return on_end(b, event);
    default:
        return SV_OK;
    }
}

static sv_status run(sv_tree_builder *b)
{
    for (;;) {
        yaml_event_t event;
        if (!yaml_parser_parse(&b->parser, &event))
            return sv_tree_parser_failed(b);
        bool end = event.type == YAML_STREAM_END_EVENT;
        sv_status status = on_event(b, &event);
        yaml_event_delete(&event);
        if (status != SV_OK || end)
            return status;
    }
}

static sv_status check_text(sv_tree_builder *b)
{
    const char *what = NULL, *hint = NULL;
    size_t offset = 0;
    const sv_source *source = b->input->source;
    if (source->size > SV_SHEET_LIMIT)
        return sv_tree_fault(b, (sv_mark_point){0, 0}, 1, NULL, "the %s is larger than %d MiB",
                             b->input->what, SV_SHEET_LIMIT >> 20);
    if (!sv_source_is_clean(source->text, source->size, &what, &hint, &offset))
        return sv_tree_fault(b, sv_source_locate(source->text, source->size, offset), 1, hint, "%s",
                             what);
    return SV_OK;
}

sv_status sv_tree_read(sv_context *context, sv_arena *arena, const sv_tree_input *input,
                       sv_diagnostics *diagnostics, sv_node **ret_root)
{
    const sv_source *source = input->source;
    sv_tree_builder b = {
        .context = context, .arena = arena, .diagnostics = diagnostics, .input = input};
    b.column_shift = sv_source_locate(source->text, source->size, input->skip).column - 1;
    sv_status status = check_text(&b);
    if (status != SV_OK)
        return status;
    if (!yaml_parser_initialize(&b.parser))
        return SV_FAIL(context, SV_NO_MEMORY, "out of memory while reading YAML");
    yaml_parser_set_encoding(&b.parser, YAML_UTF8_ENCODING);
    yaml_parser_set_input_string(&b.parser, (const unsigned char *)source->text + input->skip,
                                 source->size - input->skip);
    status = run(&b);
    if (status == SV_OK && b.root == NULL)
        status = sv_node_scalar(context, arena, "", source, (sv_mark_point){1, 1 + b.column_shift},
                                &b.root);
    for (int i = 0; i < b.depth; i++)
        sv_give(context, b.stack[i].children);
    sv_give(context, b.anchors);
    yaml_parser_delete(&b.parser);
    if (status == SV_OK)
        *ret_root = b.root;
    return status;
}
