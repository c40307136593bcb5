/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Cells and headings of terminal tables. */
#include <stdio.h>
#include <string.h>

#include "present_internal.h"

enum { COLUMNS = 79 };

void sv_table_cell(FILE *stream, const char *text, int width, bool right)
{
    char fitted[256];
    sv_words_fit(text, width, fitted, sizeof fitted);
    const int padding = width - sv_words_width(fitted);
    fprintf(stream, "%*s%s%*s  ", right ? padding : 0, "", fitted, right ? 0 : padding, "");
}

void sv_table_heading(FILE *stream, const char *text, bool colour)
{
    char fitted[512];
    sv_words_fit(text, COLUMNS, fitted, sizeof fitted);
    fprintf(stream, "%s%s%s\n", colour ? "\033[1m" : "", fitted, colour ? "\033[0m" : "");
}

void sv_table_wrapped(FILE *stream, const char *text)
{
    char clean[1024];
    int used = 0;
    sv_text_clean(text, clean, sizeof clean);
    char *rest = NULL;
    for (char *word = strtok_r(clean, " ", &rest); word != NULL;
         word = strtok_r(NULL, " ", &rest)) {
        char fitted[512];
        sv_words_fit(word, COLUMNS - 4, fitted, sizeof fitted);
        const int width = sv_words_width(fitted);
        if (used + 1 + width > COLUMNS) {
            fprintf(stream, "\n");
            used = 0;
        }
        fprintf(stream, "%s%s", used == 0 ? "  " : " ", fitted);
        used += width + (used == 0 ? 2 : 1);
    }
    fprintf(stream, "\n");
}
