/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Memory given back all at once, and text that grows. */
#include "sheet_internal.h"

#include <stdio.h>
#include <string.h>

enum { CHUNK_BYTES = 16 << 10, ALIGNMENT = 16 };

struct sv_arena_chunk {
    struct sv_arena_chunk *next;
    size_t used, size; /* bytes of `memory` */
    _Alignas(ALIGNMENT) char memory[];
};

static sv_status add_chunk(sv_context *context, sv_arena *arena, size_t bytes)
{
    struct sv_arena_chunk *chunk = NULL;
    size_t size = bytes > CHUNK_BYTES ? bytes : CHUNK_BYTES;
    sv_status status = sv_take(context, (sv_index)(sizeof *chunk + size), 1, &chunk);
    if (status != SV_OK)
        return status;
    chunk->size = size;
    chunk->next = arena->chunks;
    arena->chunks = chunk;
    return SV_OK;
}

sv_status sv_arena_take(sv_context *context, sv_arena *arena, size_t bytes, void *ret_memory)
{
    bytes = (bytes + ALIGNMENT - 1) / ALIGNMENT * ALIGNMENT;
    struct sv_arena_chunk *chunk = arena->chunks;
    if (chunk == NULL || chunk->size - chunk->used < bytes) {
        sv_status status = add_chunk(context, arena, bytes);
        if (status != SV_OK)
            return status;
        chunk = arena->chunks;
    }
    void *memory = chunk->memory + chunk->used;
    chunk->used += bytes;
    memcpy(ret_memory, &memory, sizeof memory);
    return SV_OK;
}

sv_status sv_arena_text(sv_context *context, sv_arena *arena, const char *text, size_t length,
                        const char **ret_text)
{
    char *copy = NULL;
    sv_status status = sv_arena_take(context, arena, length + 1, &copy);
    if (status != SV_OK)
        return status;
    memcpy(copy, text, length);
    copy[length] = '\0';
    *ret_text = copy;
    return SV_OK;
}

void sv_arena_free(sv_context *context, sv_arena *arena)
{
    while (arena->chunks != NULL) {
        struct sv_arena_chunk *next = arena->chunks->next;
        sv_give(context, arena->chunks);
        arena->chunks = next;
    }
}

void sv_text_add_bytes(sv_text *text, const char *bytes, size_t length)
{
    sv_index needed = text->length + (sv_index)length + 1;
    if (text->status == SV_OK)
        text->status = sv_reserve(text->context, &text->data, &text->capacity, needed, 1);
    if (text->status != SV_OK)
        return;
    memcpy(text->data + text->length, bytes, length);
    text->length += (sv_index)length;
    text->data[text->length] = '\0';
}

void sv_text_add(sv_text *text, const char *format, ...)
{
    char line[1200];
    va_list args;
    va_start(args, format);
    int length = vsnprintf(line, sizeof line, format, args);
    va_end(args);
    if (length < 0 || (size_t)length >= sizeof line)
        text->status = text->status != SV_OK ? text->status : SV_INTERNAL;
    else
        sv_text_add_bytes(text, line, (size_t)length);
}
