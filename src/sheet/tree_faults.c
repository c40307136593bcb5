/* SPDX-License-Identifier: GPL-3.0-or-later */
/* What a sheet's YAML may not say, and the words for what libyaml cannot read. */
#include "tree_internal.h"

#include <stdio.h>
#include <stdlib.h>
#include <string.h>

sv_mark_point sv_tree_point(const sv_tree_builder *b, const yaml_mark_t *mark)
{
    int column = (int)mark->column + 1 + (mark->line == 0 ? b->column_shift : 0);
    return (sv_mark_point){(int)mark->line + 1, column};
}

sv_status sv_tree_fault(sv_tree_builder *b, sv_mark_point at, int length, const char *hint,
                        const char *format, ...)
{
    sv_complaint complaint = {.severity = SV_SEVERITY_ERROR,
                              .place = {b->input->source, at.line, at.column, length},
                              .hint = hint};
    va_list args;
    va_start(args, format);
    sv_status status = sv_diagnose(b->context, b->diagnostics, &complaint, format, args);
    va_end(args);
    if (status != SV_OK)
        return status;
    return SV_FAIL(b->context, SV_INVALID_INPUT, "%s is not a valid %s", b->input->source->name,
                   b->input->what);
}

sv_status sv_tree_refuse_key(sv_tree_builder *b, const sv_node *node, bool is_alias)
{
    if (is_alias || node->kind != SV_NODE_SCALAR)
        return sv_tree_fault(b, node->start, 1, "write a plain word before the colon",
                             "a key must be a plain word");
    if (node->plain && strcmp(node->text, "<<") == 0)
        return sv_tree_fault(b, node->start, 2,
                             "write the keys out, or use an alias for the whole block",
                             "merge keys (<<) are not part of a sheet");
    return SV_OK;
}

sv_status sv_tree_refuse_tag(sv_tree_builder *b, const yaml_event_t *event, const yaml_char_t *tag)
{
    if (tag == NULL)
        return SV_OK;
    return sv_tree_fault(b, sv_tree_point(b, &event->start_mark), 1,
                         "remove the tag; the key alone decides how a value is read",
                         "a sheet uses no tags");
}

static int compare_keys(const void *a, const void *b)
{
    const sv_node *const *x = a, *const *y = b;
    int order = strcmp((*x)->text, (*y)->text);
    if (order == 0)
        order = ((*x)->start.line > (*y)->start.line) - ((*x)->start.line < (*y)->start.line);
    return order != 0 ? order : (*x)->start.column - (*y)->start.column;
}

sv_status sv_tree_refuse_twins(sv_tree_builder *b, const sv_node *map)
{
    const sv_node **keys = NULL;
    sv_status status = sv_take(b->context, map->count, sizeof *keys, &keys);
    if (status != SV_OK)
        return status;
    for (sv_index i = 0; i < map->count; i++)
        keys[i] = map->items[2 * i];
    qsort(keys, (size_t)map->count, sizeof *keys, compare_keys);
    for (sv_index i = 1; i < map->count && status == SV_OK; i++) {
        const sv_node *first = keys[i - 1], *second = keys[i];
        char hint[100];
        snprintf(hint, sizeof hint, "the first is at line %d, column %d; keep one of them",
                 first->start.line, first->start.column);
        if (strcmp(first->text, second->text) == 0)
            status = sv_tree_fault(b, second->start, sv_node_place(second).length, hint,
                                   "the key %.60s is given twice", second->text);
    }
    sv_give(b->context, keys);
    return status;
}

static const char *hint_of_problem(const sv_tree_builder *b)
{
    const yaml_parser_t *p = &b->parser;
    size_t length = 0;
    const char *line = sv_source_line(b->input->source->text, b->input->source->size,
                                      (int)p->problem_mark.line + 1, &length);
    size_t column = p->problem_mark.column;
    if (line != NULL && column < length && line[column] == '\t')
        return "indent with spaces, not tabs";
    if (strstr(p->problem, "mapping values are not allowed") != NULL)
        return "indent the keys of one block alike; quote text that holds a colon";
    if (strstr(p->problem, "start any token") != NULL)
        return "put the value in quotes";
    if (strstr(p->problem, "expected") != NULL)
        return "look for a missing bracket, comma, quote or indentation above";
    return NULL;
}

/* A fault at the end of the text is shown where the unfinished thing begins. */
static sv_mark_point place_of_problem(const sv_tree_builder *b)
{
    const sv_source *source = b->input->source;
    const yaml_parser_t *p = &b->parser;
    sv_mark_point at = sv_tree_point(b, &p->problem_mark);
    sv_mark_point end = sv_source_locate(source->text, source->size, source->size);
    bool at_end = at.line > end.line || (at.line == end.line && at.column >= end.column);
    if (at_end && p->context != NULL)
        return sv_tree_point(b, &p->context_mark);
    return at_end ? end : at;
}

sv_status sv_tree_parser_failed(sv_tree_builder *b)
{
    const yaml_parser_t *p = &b->parser;
    if (p->error == YAML_MEMORY_ERROR)
        return SV_FAIL(b->context, SV_NO_MEMORY, "out of memory while reading YAML");
    const char *problem = p->problem != NULL ? p->problem : "unknown fault";
    if (p->error == YAML_READER_ERROR) {
        size_t offset = b->input->skip + p->problem_offset;
        return sv_tree_fault(
            b, sv_source_locate(b->input->source->text, b->input->source->size, offset), 1, NULL,
            "not readable as YAML: %s", problem);
    }
    return sv_tree_fault(b, place_of_problem(b), 1, hint_of_problem(b), "not valid YAML: %s",
                         problem);
}
