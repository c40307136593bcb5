/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The text of a sheet from a file or standard input. */
#include "sheet_internal.h"

#include <stdio.h>
#include <string.h>

/* One byte more than the limit is read, so that an overlong sheet is noticed later. */
static sv_status read_stream(sv_context *context, FILE *stream, char **ret_data, size_t *ret_size)
{
    char *data = NULL;
    sv_index capacity = 0;
    size_t used = 0;
    sv_status status = SV_OK;
    while (used <= SV_SHEET_LIMIT && status == SV_OK) {
        status = sv_reserve(context, &data, &capacity, (sv_index)used + 4096, 1);
        if (status != SV_OK)
            break;
        size_t n = fread(data + used, 1, 4096, stream);
        used += n;
        if (n == 0)
            break;
    }
    if (status == SV_OK && ferror(stream))
        status = SV_FAIL(context, SV_INVALID_INPUT, "cannot read standard input");
    if (status != SV_OK) {
        sv_give(context, data);
        return status;
    }
    *ret_data = data;
    *ret_size = used;
    return SV_OK;
}

SV_PRINTF(4, 5)
static sv_status report(sv_context *context, const char *path, sv_diagnostics *diagnostics,
                        const char *format, ...)
{
    sv_source source = {.name = path};
    sv_complaint complaint = {.severity = SV_SEVERITY_ERROR, .place = {.source = &source}};
    va_list args;
    va_start(args, format);
    sv_status status = sv_diagnose(context, diagnostics, &complaint, format, args);
    va_end(args);
    return status;
}

sv_status sv_sheet_read(sv_context *context, const char *path, const sv_sheet_options *options,
                        sv_diagnostics *diagnostics, sv_sheet **ret_sheet)
{
    char *data = NULL;
    size_t size = 0;
    bool standard = strcmp(path, "-") == 0;
    const char *name = standard ? "stdin" : path;
    sv_status status = standard ? read_stream(context, stdin, &data, &size)
                                : sv_read_file(context, path, SV_SHEET_LIMIT, &data, &size);
    if (status == SV_INVALID_INPUT) {
        sv_status reported = report(context, name, diagnostics, "%s", context->error.message);
        return reported != SV_OK ? reported : status;
    }
    if (status != SV_OK)
        return status;
    status = sv_sheet_parse(context, name, data, size, options, diagnostics, ret_sheet);
    sv_give(context, data);
    return status;
}
