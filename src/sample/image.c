/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Grey-scale images as tables of numbers between black (0) and white (1). The file is not
 * trusted: its size is judged before memory is taken, and faults name the byte where known. */
#include "image_internal.h"

#include <stdarg.h>
#include <stdio.h>
#include <string.h>

static const double MOST_PIXELS = 33554432.0; /* 2^25: 5,792 squared */

sv_status sv_image_fail(sv_context *context, sv_table_fault *fault, long long offset,
                        const char *hint, const char *format, ...)
{
    char message[200];
    va_list args;
    va_start(args, format);
    vsnprintf(message, sizeof message, format, args);
    va_end(args);
    *fault = (sv_table_fault){.line = 0};
    if (offset >= 0)
        snprintf(fault->message, sizeof fault->message, "byte %lld: %s", offset, message);
    else
        snprintf(fault->message, sizeof fault->message, "%s", message);
    snprintf(fault->hint, sizeof fault->hint, "%.250s", hint);
    return SV_FAIL(context, SV_INVALID_INPUT, "%s", fault->message);
}

sv_status sv_image_check_size(sv_context *context, sv_table_fault *fault, double width,
                              double height)
{
    if (width < 1 || height < 1)
        return sv_image_fail(context, fault, -1, "", "the image has no pixels");
    if (width * height <= MOST_PIXELS)
        return SV_OK;
    return sv_image_fail(context, fault, -1, "scale it down: a few pixels per site are enough",
                         "the image has %.0f x %.0f pixels, at most %.0f are read", width, height,
                         MOST_PIXELS);
}

bool sv_image_is(const void *data, size_t size)
{
    const unsigned char *d = data;
    static const unsigned char png[] = {0x89, 'P', 'N', 'G'};
    if (size < 4)
        return false;
    return memcmp(d, png, 4) == 0 || memcmp(d, "II*\0", 4) == 0 || memcmp(d, "MM\0*", 4) == 0 ||
           memcmp(d, "II+\0", 4) == 0 || memcmp(d, "MM\0+", 4) == 0;
}

sv_status sv_image_read(sv_context *context, const void *data, size_t size, sv_grey *ret_grey,
                        sv_table_fault *ret_fault)
{
    sv_image_source source = {.data = data, .size = size};
    if (!sv_image_is(data, size))
        return sv_image_fail(context, ret_fault, 0, "grey-scale PNG and TIFF can be read",
                             "the file is no PNG and no TIFF image");
    return source.data[0] == 0x89 ? sv_image_read_png(context, &source, ret_grey, ret_fault)
                                  : sv_image_read_tiff(context, &source, ret_grey, ret_fault);
}

void sv_grey_free(sv_context *context, sv_grey *grey)
{
    sv_give(context, grey->value);
    *grey = (sv_grey){0};
}
