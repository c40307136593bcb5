/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Text as lines and characters: UTF-8, places, and what a sheet may not hold. */
#include "sheet_internal.h"

#include <string.h>

static bool is_continuation(const char *text, size_t size, size_t i)
{
    return i < size && ((unsigned char)text[i] & 0xC0) == 0x80;
}

int sv_utf8_read(const char *text, size_t size, uint32_t *ret_code)
{
    if (size == 0)
        return 0;
    unsigned char first = (unsigned char)text[0];
    int length = first < 0x80 ? 1 : first < 0xC2 ? 0 : first < 0xE0 ? 2 : first < 0xF0 ? 3 : 4;
    if (length == 0 || first > 0xF4)
        return 0;
    uint32_t code = length == 1 ? first : first & (0xFFU >> (length + 1));
    for (int i = 1; i < length; i++) {
        if (!is_continuation(text, size, (size_t)i))
            return 0;
        code = code << 6 | ((unsigned char)text[i] & 0x3FU);
    }
    bool overlong = (length == 3 && code < 0x800) || (length == 4 && code < 0x10000);
    if (overlong || code > 0x10FFFF || (code >= 0xD800 && code <= 0xDFFF))
        return 0;
    *ret_code = code;
    return length;
}

/* Bytes of the line end at `i`: CR LF, LF or CR; 0: none. */
static size_t line_end_at(const char *text, size_t size, size_t i)
{
    if (i >= size)
        return 0;
    if (text[i] == '\r')
        return i + 1 < size && text[i + 1] == '\n' ? 2 : 1;
    return text[i] == '\n';
}

sv_mark_point sv_source_locate(const char *text, size_t size, size_t offset)
{
    sv_mark_point point = {1, 1};
    for (size_t i = 0; i < offset && i < size;) {
        size_t end = line_end_at(text, size, i);
        if (end > 0) {
            point = (sv_mark_point){point.line + 1, 1};
            i += end;
            continue;
        }
        uint32_t code = 0;
        int length = sv_utf8_read(text + i, size - i, &code);
        i += length > 0 ? (size_t)length : 1;
        point.column++;
    }
    return point;
}

const char *sv_source_line(const char *text, size_t size, int line, size_t *ret_length)
{
    size_t start = 0;
    for (int n = 1; n < line; n++) {
        while (start < size && line_end_at(text, size, start) == 0)
            start++;
        if (start >= size)
            return NULL;
        start += line_end_at(text, size, start);
    }
    size_t end = start;
    while (end < size && line_end_at(text, size, end) == 0)
        end++;
    *ret_length = end - start;
    return text + start;
}

/* YAML 1.1 and 1.2 disagree on whether these end a line, so a sheet holds none. */
static bool is_odd_line_end(uint32_t code)
{
    return code == 0x85 || code == 0x2028 || code == 0x2029;
}

static bool is_control(uint32_t code)
{
    if (code == '\t' || code == '\n' || code == '\r')
        return false;
    return code < 0x20 || (code >= 0x7F && code < 0xA0);
}

static const char *fault_of(uint32_t code, const char **ret_hint)
{
    *ret_hint = NULL;
    if (code == 0)
        return "the text holds a NUL byte";
    if (is_odd_line_end(code)) {
        *ret_hint = "use plain line feeds";
        return "the text holds an unusual line separator";
    }
    if (is_control(code))
        return "the text holds a control character";
    if (code == 0xFEFF || code == 0xFFFE || code == 0xFFFF)
        return "the text holds a byte order mark or a character that is none";
    return NULL;
}

static const char *bad_bytes_hint(const char *text, size_t size)
{
    bool utf16 =
        size >= 2 && (memcmp(text, "\xFF\xFE", 2) == 0 || memcmp(text, "\xFE\xFF", 2) == 0);
    return utf16 ? "the file looks like UTF-16; save it as UTF-8" : "save the file as UTF-8";
}

bool sv_source_is_clean(const char *text, size_t size, const char **ret_what, const char **ret_hint,
                        size_t *ret_offset)
{
    for (size_t i = 0; i < size;) {
        uint32_t code = 0;
        const char *hint = NULL;
        int length = sv_utf8_read(text + i, size - i, &code);
        const char *fault = length > 0 ? fault_of(code, &hint) : "the text is not valid UTF-8";
        /* Tags are refused anyway; libyaml compares each %TAG line with all before it. */
        if (text[i] == '%' && size - i > 4 && memcmp(text + i, "%TAG", 4) == 0 &&
            (i == 0 || text[i - 1] == '\n' || text[i - 1] == '\r')) {
            fault = "a sheet uses no tags";
            hint = "remove the %TAG line";
        }
        if (fault != NULL) {
            *ret_what = fault;
            *ret_hint = length > 0 ? hint : bad_bytes_hint(text, size);
            *ret_offset = i;
            return false;
        }
        i += (size_t)length;
    }
    return true;
}
