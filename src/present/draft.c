/* SPDX-License-Identifier: GPL-3.0-or-later */
/* A text that grows. */
#include <stdarg.h>
#include <stdio.h>
#include <string.h>

#include "present_internal.h"

void sv_draft_add_bytes(sv_draft *text, const void *bytes, size_t size)
{
    if (text->status != SV_OK)
        return;
    text->status =
        sv_reserve(text->context, &text->data, &text->capacity, text->size + (sv_index)size + 1, 1);
    if (text->status != SV_OK)
        return;
    memcpy(text->data + text->size, bytes, size);
    text->size += (sv_index)size;
    text->data[text->size] = '\0';
}

void sv_draft_add(sv_draft *text, const char *format, ...)
{
    char local[512];
    va_list args, again;
    if (text->status != SV_OK)
        return;
    va_start(args, format);
    va_copy(again, args);
    const int length = vsnprintf(local, sizeof local, format, args);
    va_end(args);
    if (length >= 0 && (size_t)length < sizeof local) {
        sv_draft_add_bytes(text, local, (size_t)length);
    } else if (length >= 0) {
        text->status =
            sv_reserve(text->context, &text->data, &text->capacity, text->size + length + 1, 1);
        if (text->status == SV_OK) {
            vsnprintf(text->data + text->size, (size_t)length + 1, format, again);
            text->size += length;
        }
    }
    va_end(again);
}

void sv_draft_drop(sv_draft *text)
{
    sv_give(text->context, text->data);
    text->data = NULL;
    text->size = text->capacity = 0;
}

sv_status sv_draft_finish(sv_draft *text, char **ret_text)
{
    if (text->status == SV_OK && text->data == NULL)
        sv_draft_add_bytes(text, "", 0);
    if (text->status != SV_OK) {
        sv_draft_drop(text);
        return text->status;
    }
    *ret_text = text->data;
    text->data = NULL;
    return SV_OK;
}
