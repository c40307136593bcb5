/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "selvedge/base.h"

#include <stdarg.h>
#include <stdio.h>
#include <string.h>

static const struct {
    int exit_code;
    const char *text;
} status_rows[SV_STATUS_COUNT] = {
#define STATUS_ROW(name, exit_code, text) {exit_code, text},
    SV_STATUS_LIST(STATUS_ROW)
#undef STATUS_ROW
};

static bool is_status(sv_status status)
{
    return (int)status >= 0 && status < SV_STATUS_COUNT;
}

const char *sv_status_text(sv_status status)
{
    return is_status(status) ? status_rows[status].text : "unknown status";
}

int sv_status_exit_code(sv_status status)
{
    return is_status(status) ? status_rows[status].exit_code : status_rows[SV_INTERNAL].exit_code;
}

sv_status sv_fail_at(sv_context *context, sv_status status, const char *file, int line,
                     const char *format, ...)
{
    sv_error *error = &context->error;
    error->status = status;
    error->source_file = file;
    error->source_line = line;
    va_list args;
    va_start(args, format);
    vsnprintf(error->message, sizeof error->message, format, args);
    va_end(args);
    return status;
}

const char *sv_version(void)
{
    return SV_VERSION;
}
