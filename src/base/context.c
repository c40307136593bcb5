/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "selvedge/base.h"

#include <stdarg.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

enum { ALIGNMENT = 64 };

static void *standard_take(size_t bytes, void *user)
{
    (void)user;
    return aligned_alloc(ALIGNMENT, bytes);
}

static void standard_give(void *memory, void *user)
{
    (void)user;
    free(memory);
}

void sv_context_init(sv_context *context)
{
    *context = (sv_context){.allocator = {standard_take, standard_give, NULL}};
}

sv_context sv_context_fork(const sv_context *context)
{
    /* The error record is not even read: another thread may be writing into it. */
    return (sv_context){.allocator = context->allocator,
                        .log = context->log,
                        .log_user = context->log_user,
                        .progress = context->progress,
                        .progress_user = context->progress_user,
                        .cancel = context->cancel,
                        .cancel_user = context->cancel_user};
}

void sv_context_take_error(sv_context *to, const sv_context *from)
{
    to->error = from->error;
}

void sv_log(sv_context *context, sv_log_level level, const char *format, ...)
{
    if (context->log == NULL)
        return;
    char message[1000];
    va_list args;
    va_start(args, format);
    vsnprintf(message, sizeof message, format, args);
    va_end(args);
    context->log(level, message, context->log_user);
}

void sv_progress(sv_context *context, const char *phase, sv_index done, sv_index total)
{
    if (context->progress != NULL)
        context->progress(phase, done, total, context->progress_user);
}

bool sv_cancelled(const sv_context *context)
{
    return context->cancel != NULL && context->cancel(context->cancel_user);
}

sv_status sv_take_raw(sv_context *context, sv_index count, size_t size, void *ret_memory)
{
    size_t bytes;
    if (count < 0 || __builtin_mul_overflow((size_t)count, size, &bytes) ||
        bytes > SIZE_MAX - 2 * ALIGNMENT)
        return SV_FAIL(context, SV_NO_MEMORY, "an array of %lld elements is too large",
                       (long long)count);
    bytes = (bytes + ALIGNMENT - 1) / ALIGNMENT * ALIGNMENT;
    if (bytes == 0)
        bytes = ALIGNMENT;
    void *memory = context->allocator.take(bytes, context->allocator.user);
    if (memory == NULL)
        return SV_FAIL(context, SV_NO_MEMORY, "no memory for %zu bytes", bytes);
    memcpy(ret_memory, &memory, sizeof memory);
    return SV_OK;
}

sv_status sv_take(sv_context *context, sv_index count, size_t size, void *ret_memory)
{
    void *memory = NULL;
    sv_status status = sv_take_raw(context, count, size, &memory);
    if (status != SV_OK)
        return status;
    memset(memory, 0, (size_t)count * size);
    memcpy(ret_memory, &memory, sizeof memory);
    return SV_OK;
}

void sv_give(sv_context *context, void *memory)
{
    if (memory != NULL)
        context->allocator.give(memory, context->allocator.user);
}

sv_status sv_take_text(sv_context *context, const char *text, char **ret_text)
{
    if (text == NULL) {
        *ret_text = NULL;
        return SV_OK;
    }
    size_t length = strlen(text) + 1;
    char *copy = NULL;
    sv_status status = sv_take_raw(context, (sv_index)length, 1, &copy);
    if (status != SV_OK)
        return status;
    memcpy(copy, text, length);
    *ret_text = copy;
    return SV_OK;
}

sv_status sv_reserve(sv_context *context, void *array, sv_index *capacity, sv_index needed,
                     size_t size)
{
    if (needed <= *capacity)
        return SV_OK;
    sv_index grown = *capacity < 8 ? 8 : *capacity + *capacity / 2;
    if (grown < needed)
        grown = needed;
    void *old = NULL, *fresh = NULL;
    memcpy(&old, array, sizeof old);
    sv_status status = sv_take(context, grown, size, &fresh);
    if (status != SV_OK)
        return status;
    if (old != NULL)
        memcpy(fresh, old, (size_t)*capacity * size);
    sv_give(context, old);
    memcpy(array, &fresh, sizeof fresh);
    *capacity = grown;
    return SV_OK;
}
