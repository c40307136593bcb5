/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Nodes and words as YAML text that reads back as the same. */
#include "sheet_internal.h"

#include <ctype.h>
#include <string.h>

/* Words that YAML 1.1 takes for something else than text. */
static const char RETYPED[] = "y n yes no on off true false null";

static bool is_retyped(const char *value)
{
    char lower[8] = "";
    size_t length = strlen(value);
    if (length == 0 || length >= sizeof lower)
        return length == 0;
    for (size_t i = 0; i < length; i++)
        lower[i] = (char)tolower((unsigned char)value[i]);
    return sv_words_hold(RETYPED, lower);
}

/* A number with or without a unit, or plain words. */
static bool is_plain(const char *value)
{
    static const char inside[] = " _./%^+-";
    bool word = isalpha((unsigned char)value[0]) != 0;
    bool number =
        isdigit((unsigned char)value[0]) || (value[0] == '-' && isdigit((unsigned char)value[1]));
    size_t length = strlen(value);
    if ((!word && !number) || value[length - 1] == ' ' || is_retyped(value))
        return false;
    for (const char *at = value; *at != '\0'; at++)
        if (!isalnum((unsigned char)*at) && strchr(inside, *at) == NULL)
            return false;
    return true;
}

void sv_emit_scalar(sv_text *text, const char *value)
{
    if (value[0] != '\0' && is_plain(value)) {
        sv_text_add_bytes(text, value, strlen(value));
        return;
    }
    sv_text_add(text, "\"");
    const char *end = value + strlen(value);
    for (const char *at = value; at < end;) {
        uint32_t code = 0;
        const int length = sv_utf8_read(at, (size_t)(end - at), &code);
        if (*at == '"' || *at == '\\')
            sv_text_add(text, "\\%c", *at);
        else if (*at == '\n')
            sv_text_add(text, "\\n");
        else if (length > 0 && sv_must_escape(code))
            sv_text_add(text, code < 0x100 ? "\\x%02x" : "\\u%04x", code);
        else
            sv_text_add_bytes(text, at, length > 0 ? (size_t)length : 1);
        at += length > 0 ? length : 1;
    }
    sv_text_add(text, "\"");
}

void sv_emit_node(sv_text *text, const sv_node *node)
{
    if (node->kind == SV_NODE_SCALAR) {
        sv_emit_scalar(text, node->text);
        return;
    }
    bool map = node->kind == SV_NODE_MAP;
    sv_text_add(text, map ? "{" : "[");
    for (sv_index i = 0; i < node->count; i++) {
        sv_text_add(text, i > 0 ? ", " : "");
        if (map) {
            sv_emit_scalar(text, node->items[2 * i]->text);
            sv_text_add(text, ": ");
        }
        sv_emit_node(text, node->items[map ? 2 * i + 1 : i]);
    }
    sv_text_add(text, map ? "}" : "]");
}
