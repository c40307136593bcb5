/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Texts of a ledger end on terminals and in pages: one line of well-formed UTF-8, no controls. */
#include <string.h>

#include "store_internal.h"

/* Bytes of the character at `text` and its code; 0 when it is not well formed (RFC 3629). */
static size_t read_character(const unsigned char *text, size_t size, uint32_t *ret_code)
{
    static const uint32_t least[5] = {0, 0, 0x80, 0x800, 0x10000};
    const unsigned char first = text[0];
    const size_t length = first < 0x80   ? 1
                          : first < 0xc0 ? 0
                          : first < 0xe0 ? 2
                          : first < 0xf0 ? 3
                          : first < 0xf8 ? 4
                                         : 0;
    if (length == 0 || length > size)
        return 0;
    uint32_t code = length == 1 ? first : first & (0x7fU >> length);
    for (size_t i = 1; i < length; i++) {
        if ((text[i] & 0xc0) != 0x80)
            return 0;
        code = code << 6 | (text[i] & 0x3f);
    }
    if (code < least[length] || code > 0x10ffff || (code >= 0xd800 && code < 0xe000))
        return 0;
    *ret_code = code;
    return length;
}

/* Controls, line separators, and marks that turn the direction of what follows. */
static bool is_unwelcome(uint32_t code)
{
    return code < 0x20 || (code >= 0x7f && code < 0xa0) || code == 0x200e || code == 0x200f ||
           (code >= 0x2028 && code <= 0x202e) || (code >= 0x2066 && code <= 0x2069);
}

size_t sv_text_plain(const char *text, char *plain, size_t size)
{
    const size_t length = strlen(text);
    size_t used = 0;
    for (size_t i = 0; i < length;) {
        uint32_t code = 0;
        size_t bytes = read_character((const unsigned char *)text + i, length - i, &code);
        const bool good = bytes > 0 && !is_unwelcome(code);
        const size_t room = good ? bytes : 1;
        if (used + room + 1 > size)
            break;
        if (good)
            memcpy(plain + used, text + i, bytes);
        else
            plain[used] = '?';
        used += room;
        i += bytes > 0 ? bytes : 1;
    }
    plain[used] = '\0';
    return used;
}

bool sv_text_is_plain(const char *text, size_t length, bool lines)
{
    for (size_t i = 0; i < length;) {
        uint32_t code = 0;
        const size_t bytes = read_character((const unsigned char *)text + i, length - i, &code);
        const bool layout = lines && (code == '\n' || code == '\t');
        if (bytes == 0 || code == 0 || (!layout && (lines ? code < 0x20 : is_unwelcome(code))))
            return false;
        i += bytes;
    }
    return true;
}
