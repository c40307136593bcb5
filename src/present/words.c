/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Texts fit to be shown: titles, names and reasons come from files and may hold anything. */
#include <stdio.h>
#include <string.h>

#include "present_internal.h"

enum { REPLACEMENT = 0xFFFD };

/* Continuation bytes wanted after a first byte, or -1. */
static int tail_length(unsigned char byte)
{
    return byte < 0x80   ? 0
           : byte < 0xC2 ? -1
           : byte < 0xE0 ? 1
           : byte < 0xF0 ? 2
           : byte < 0xF5 ? 3
                         : -1;
}

uint32_t sv_words_next(const char **text)
{
    static const uint32_t smallest[4] = {0, 0x80, 0x800, 0x10000};
    const unsigned char *byte = (const unsigned char *)*text;
    const int tail = tail_length(*byte);
    uint32_t code = tail <= 0 ? *byte : *byte & (0x3Fu >> tail);
    (*text)++;
    if (tail <= 0)
        return tail == 0 ? code : REPLACEMENT;
    for (int i = 1; i <= tail; i++) {
        if ((byte[i] & 0xC0) != 0x80)
            return REPLACEMENT;
        code = code << 6 | (byte[i] & 0x3F);
    }
    if (code < smallest[tail] || code > 0x10FFFF || (code >= 0xD800 && code < 0xE000))
        return REPLACEMENT;
    *text += tail;
    return code;
}

static size_t encode(uint32_t code, char bytes[5])
{
    size_t n = 0;
    if (code < 0x80) {
        bytes[n++] = (char)code;
    } else if (code < 0x800) {
        bytes[n++] = (char)(0xC0 | code >> 6);
    } else if (code < 0x10000) {
        bytes[n++] = (char)(0xE0 | code >> 12);
        bytes[n++] = (char)(0x80 | (code >> 6 & 0x3F));
    } else {
        bytes[n++] = (char)(0xF0 | code >> 18);
        bytes[n++] = (char)(0x80 | (code >> 12 & 0x3F));
        bytes[n++] = (char)(0x80 | (code >> 6 & 0x3F));
    }
    if (code >= 0x80)
        bytes[n++] = (char)(0x80 | (code & 0x3F));
    bytes[n] = '\0';
    return n;
}

bool sv_words_is_control(uint32_t code)
{
    return code < 0x20 || (code >= 0x7F && code < 0xA0) || (code >= 0x200B && code <= 0x200F) ||
           (code >= 0x2028 && code <= 0x202E) || (code >= 0x2060 && code <= 0x206F) ||
           code == 0xFEFF;
}

static size_t spell(uint32_t code, char word[16])
{
    if (!sv_words_is_control(code))
        return encode(code, word);
    const char letter = code == '\n' ? 'n' : code == '\t' ? 't' : code == '\r' ? 'r' : '\0';
    if (letter != '\0')
        return (size_t)snprintf(word, 16, "\\%c", letter);
    return (size_t)snprintf(word, 16, code < 0x100 ? "\\x%02x" : "\\u%04x", (unsigned)code);
}

void sv_text_clean(const char *text, char *clean, size_t size)
{
    size_t used = 0;
    char word[16];
    while (*text != '\0') {
        const size_t length = spell(sv_words_next(&text), word);
        if (used + length + 1 > size)
            break;
        memcpy(clean + used, word, length);
        used += length;
    }
    clean[used] = '\0';
}

sv_status sv_words_repair(sv_context *context, const char *text, char **ret_text)
{
    sv_draft out = {.context = context};
    char word[5];
    while (*text != '\0') {
        const size_t length = encode(sv_words_next(&text), word);
        sv_draft_add_bytes(&out, word, length);
    }
    return sv_draft_finish(&out, ret_text);
}

/* Combining marks take no column, most East Asian signs and pictures two. */
static int code_width(uint32_t code)
{
    if (code >= 0x300 && code < 0x370)
        return 0;
    const bool wide = (code >= 0x1100 && code < 0x1160) || (code >= 0x2E80 && code < 0xA4D0) ||
                      (code >= 0xAC00 && code < 0xD7A4) || (code >= 0xF900 && code < 0xFB00) ||
                      (code >= 0xFE30 && code < 0xFE70) || (code >= 0xFF00 && code < 0xFF61) ||
                      code >= 0x1F300;
    return wide ? 2 : 1;
}

int sv_words_width(const char *text)
{
    int width = 0;
    while (*text != '\0')
        width += code_width(sv_words_next(&text));
    return width;
}

void sv_words_fit(const char *text, int columns, char *fitted, size_t size)
{
    char clean[1024], word[5];
    sv_text_clean(text, clean, sizeof clean);
    const bool cut = sv_words_width(clean) > columns;
    const int room = cut ? columns - 2 : columns;
    const char *rest = clean;
    int width = 0;
    size_t used = 0;
    while (*rest != '\0') {
        const uint32_t code = sv_words_next(&rest);
        const size_t length = encode(code, word);
        if (width + code_width(code) > room || used + length + 3 > size)
            break;
        memcpy(fitted + used, word, length);
        used += length;
        width += code_width(code);
    }
    snprintf(fitted + used, size - used, "%s", cut ? ".." : "");
}
