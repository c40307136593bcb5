/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Messages about an input, collected with their places. Printing: diagnostics_print.c. */
#include "sheet_internal.h"

#include <stdio.h>
#include <string.h>

static void free_item(sv_context *context, sv_diagnostic *item)
{
    sv_give(context, item->file);
    sv_give(context, item->message);
    sv_give(context, item->hint);
    sv_give(context, item->text);
    sv_give(context, item->path);
}

void sv_diagnostics_free(sv_context *context, sv_diagnostics *diagnostics)
{
    for (sv_index i = 0; i < diagnostics->count; i++)
        free_item(context, &diagnostics->items[i]);
    sv_give(context, diagnostics->items);
    *diagnostics = (sv_diagnostics){0};
}

static sv_status copy_line(sv_context *context, const sv_place *place, char **ret_text)
{
    size_t length = 0;
    const sv_source *source = place->source;
    const char *line = NULL;
    if (source != NULL && source->text != NULL && place->line > 0)
        line = sv_source_line(source->text, source->size, place->line, &length);
    if (line == NULL)
        return SV_OK;
    char *copy = NULL;
    sv_status status = sv_take(context, (sv_index)length + 1, 1, &copy);
    if (status != SV_OK)
        return status;
    memcpy(copy, line, length);
    *ret_text = copy;
    return SV_OK;
}

/* Fills a blank item; what is there already on failure is freed by the caller. */
static sv_status fill_item(sv_context *context, const sv_complaint *complaint, const char *message,
                           sv_diagnostic *item)
{
    const sv_place *place = &complaint->place;
    item->severity = complaint->severity;
    item->line = place->line;
    item->column = place->column;
    item->length = place->length > 0 ? place->length : 1;
    const char *file = place->source != NULL ? place->source->name : "sheet";
    sv_status status = sv_take_text(context, file, &item->file);
    if (status == SV_OK)
        status = sv_take_text(context, message, &item->message);
    if (status == SV_OK)
        status = sv_take_text(context, complaint->hint, &item->hint);
    if (status == SV_OK)
        status = sv_take_text(context, complaint->path, &item->path);
    if (status == SV_OK)
        status = copy_line(context, place, &item->text);
    return status;
}

/* The same fault is met again when the sheet is read a second time. */
static bool is_known(const sv_diagnostics *diagnostics, const sv_diagnostic *item)
{
    for (sv_index i = 0; i < diagnostics->count; i++) {
        const sv_diagnostic *other = &diagnostics->items[i];
        if (other->line == item->line && other->column == item->column &&
            strcmp(other->file, item->file) == 0 && strcmp(other->message, item->message) == 0)
            return true;
    }
    return false;
}

sv_status sv_diagnose(sv_context *context, sv_diagnostics *diagnostics,
                      const sv_complaint *complaint, const char *format, va_list args)
{
    char message[1000];
    sv_diagnostic item = {0};
    sv_complaint last = {.severity = SV_SEVERITY_ERROR,
                         .place = {.source = complaint->place.source}};
    bool is_error = complaint->severity == SV_SEVERITY_ERROR;
    if (is_error && diagnostics->errors > SV_MAX_ERRORS)
        return SV_OK;
    bool too_many = is_error && diagnostics->errors == SV_MAX_ERRORS;
    vsnprintf(message, sizeof message, format, args);
    if (too_many)
        snprintf(message, sizeof message, "more than %d errors; the rest is not shown",
                 SV_MAX_ERRORS);
    sv_status status = fill_item(context, too_many ? &last : complaint, message, &item);
    if (status != SV_OK)
        goto out;
    if (is_known(diagnostics, &item)) {
        free_item(context, &item);
        return SV_OK;
    }
    status = sv_reserve(context, &diagnostics->items, &diagnostics->capacity,
                        diagnostics->count + 1, sizeof item);
    if (status != SV_OK)
        goto out;
    diagnostics->items[diagnostics->count++] = item;
    diagnostics->errors += is_error;
    return SV_OK;
out:
    free_item(context, &item);
    return status;
}

/* A place of 0 ("too many errors") stays last. */
static bool comes_after(const sv_diagnostic *a, const sv_diagnostic *b)
{
    if (strcmp(a->file, b->file) != 0)
        return false;
    int line_a = a->line > 0 ? a->line : INT32_MAX, line_b = b->line > 0 ? b->line : INT32_MAX;
    return line_a != line_b ? line_a > line_b : a->column > b->column;
}

void sv_diagnostics_sort(sv_diagnostics *diagnostics, sv_index first)
{
    for (sv_index i = first + 1; i < diagnostics->count; i++) {
        sv_diagnostic item = diagnostics->items[i];
        sv_index at = i;
        for (; at > first && comes_after(&diagnostics->items[at - 1], &item); at--)
            diagnostics->items[at] = diagnostics->items[at - 1];
        diagnostics->items[at] = item;
    }
}
