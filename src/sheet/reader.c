/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The state of one reading of a sheet: what it reports and what it remembers. */
#include "sheet_internal.h"

#include <stdio.h>
#include <string.h>

bool sv_reader_good(const sv_reader *reader)
{
    return reader->status == SV_OK && reader->errors == 0;
}

void *sv_reader_take(sv_reader *reader, sv_index count, size_t size)
{
    void *memory = NULL;
    if (reader->status == SV_OK)
        reader->status =
            sv_arena_take(reader->context, reader->arena, (size_t)count * size, &memory);
    return memory;
}

const char *sv_reader_text(sv_reader *reader, const char *format, ...)
{
    va_list args, again;
    va_start(args, format);
    va_copy(again, args);
    int length = vsnprintf(NULL, 0, format, again);
    va_end(again);
    char *text = length < 0 ? NULL : sv_reader_take(reader, length + 1, 1);
    if (text != NULL)
        vsnprintf(text, (size_t)length + 1, format, args);
    va_end(args);
    return text;
}

SV_PRINTF(5, 0)
static void report(sv_reader *reader, sv_severity severity, const sv_place *place, const char *hint,
                   const char *format, va_list args)
{
    sv_complaint complaint = {severity, *place, hint, reader->at_path};
    if (severity == SV_SEVERITY_ERROR)
        reader->errors++;
    if (reader->status == SV_OK)
        reader->status =
            sv_diagnose(reader->context, reader->diagnostics, &complaint, format, args);
}

SV_PRINTF(5, 6)
static void report_text(sv_reader *reader, sv_severity severity, const sv_place *place,
                        const char *hint, const char *format, ...)
{
    va_list args;
    va_start(args, format);
    report(reader, severity, place, hint, format, args);
    va_end(args);
}

SV_PRINTF(4, 0)
static bool report_error(sv_reader *reader, const sv_place *place, const char *hint,
                         const char *format, va_list args)
{
    if (reader->prefix == NULL) {
        report(reader, SV_SEVERITY_ERROR, place, hint, format, args);
        return false;
    }
    char message[800];
    vsnprintf(message, sizeof message, format, args);
    report_text(reader, SV_SEVERITY_ERROR, &reader->prefix_place, hint, "at %s: %s", reader->prefix,
                message);
    return false;
}

bool sv_report(sv_reader *reader, const sv_node *node, const char *hint, const char *format, ...)
{
    sv_place place = sv_node_place(node);
    if (place.source == NULL)
        place.source = &reader->sheet->source;
    va_list args;
    va_start(args, format);
    report_error(reader, &place, hint, format, args);
    va_end(args);
    return false;
}

bool sv_report_at(sv_reader *reader, const sv_place *place, const char *hint, const char *format,
                  ...)
{
    va_list args;
    va_start(args, format);
    report_error(reader, place, hint, format, args);
    va_end(args);
    return false;
}

void sv_note(sv_reader *reader, const sv_node *node, const char *format, ...)
{
    sv_place place = sv_node_place(node);
    va_list args;
    va_start(args, format);
    report(reader, SV_SEVERITY_NOTE, &place, NULL, format, args);
    va_end(args);
}

bool sv_report_status(sv_reader *reader, const sv_node *node, sv_status status)
{
    if (status == SV_INVALID_INPUT)
        return sv_report(reader, node, NULL, "%s", reader->context->error.message);
    if (status == SV_REFUSED)
        sv_report(reader, node, "make the flake smaller", "%s", reader->context->error.message);
    if (reader->status == SV_OK)
        reader->status = status;
    return false;
}
