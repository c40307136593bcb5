/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Prints messages: `file:line:col: error: …`, the line, a caret, the hint. Text of the user is
 * escaped, so that a sheet cannot drive the terminal. */
#include "sheet_internal.h"

#include <string.h>

enum { SHOWN_BEFORE = 60, SHOWN_WIDTH = 150 };

static const char *const severity_names[] = {"error", "warning", "note"};
static const char *const severity_colours[] = {"\033[1;31m", "\033[1;35m", "\033[1;36m"};

bool sv_must_escape(uint32_t code)
{
    return code < 0x20 || (code >= 0x7F && code < 0xA0) || (code >= 0x200B && code <= 0x200F) ||
           (code >= 0x2028 && code <= 0x202E) || (code >= 0x2060 && code <= 0x206F) ||
           code == 0xFEFF;
}

/* Writes the character at `text` in visible form; returns the bytes read, width to *ret_width. */
static size_t show_character(const char *text, size_t size, char shown[16], int *ret_width)
{
    uint32_t code = 0;
    int length = sv_utf8_read(text, size, &code);
    if (length == 0)
        *ret_width = snprintf(shown, 16, "\\x%02x", (unsigned char)text[0]);
    else if (code == '\t')
        *ret_width = snprintf(shown, 16, " ");
    else if (sv_must_escape(code))
        *ret_width = snprintf(shown, 16, code < 0x100 ? "\\x%02x" : "\\u%04x", code);
    else {
        *ret_width = 1;
        memcpy(shown, text, (size_t)length);
        shown[length] = '\0';
    }
    return length > 0 ? (size_t)length : 1;
}

static void print_visible(const char *text, FILE *stream)
{
    char shown[16];
    int width = 0;
    for (size_t i = 0, size = strlen(text); i < size;) {
        i += show_character(text + i, size - i, shown, &width);
        fputs(shown, stream);
    }
}

/* Prints the part of the line around the column and, below, spaces up to it and the caret. */
static void print_line(const sv_diagnostic *item, FILE *stream)
{
    char shown[16];
    int width = 0, before = 0, under = 0, column = 1;
    int first = item->column > SHOWN_BEFORE * 2 ? item->column - SHOWN_BEFORE : 1;
    size_t size = strlen(item->text);
    fputs(first > 1 ? "  …" : "  ", stream);
    before = first > 1;
    for (size_t i = 0; i < size && column < first + SHOWN_WIDTH; column++) {
        i += show_character(item->text + i, size - i, shown, &width);
        if (column < first)
            continue;
        fputs(shown, stream);
        if (column < item->column)
            before += width;
        else if (column < item->column + item->length)
            under += width;
    }
    fprintf(stream, "\n  %*s^", before, "");
    for (int i = 1; i < under; i++)
        fputc('~', stream);
    fputc('\n', stream);
}

static void print_item(const sv_diagnostic *item, bool colour, FILE *stream)
{
    print_visible(item->file, stream);
    if (item->line > 0)
        fprintf(stream, ":%d:%d", item->line, item->column);
    fprintf(stream, ": %s%s:%s ", colour ? severity_colours[item->severity] : "",
            severity_names[item->severity], colour ? "\033[0m" : "");
    print_visible(item->message, stream);
    fputc('\n', stream);
    if (item->text != NULL && item->line > 0)
        print_line(item, stream);
    if (item->hint != NULL) {
        fputs("hint: ", stream);
        print_visible(item->hint, stream);
        fputc('\n', stream);
    }
}

void sv_diagnostics_print(const sv_diagnostics *diagnostics, bool colour, FILE *stream)
{
    for (sv_index i = 0; i < diagnostics->count; i++)
        print_item(&diagnostics->items[i], colour, stream);
}
