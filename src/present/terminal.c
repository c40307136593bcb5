/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Cells and headings of terminal tables. */
#include <stdio.h>

#include "present_internal.h"

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
    sv_words_fit(text, 79, fitted, sizeof fitted);
    fprintf(stream, "%s%s%s\n", colour ? "\033[1m" : "", fitted, colour ? "\033[0m" : "");
}
