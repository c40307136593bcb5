/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The title of a figure, wrapped to the width of a column. */
#include <stdio.h>
#include <string.h>

#include "figure_internal.h"

enum { TITLE_COLUMNS = 47, NOTE_COLUMNS = 62 };
static const double line_cm = 0.36, note_cm = 0.34, air_cm = 0.2;

/* Bytes of the longest start of `text` that fits and ends at a space, if there is one. */
static size_t wrap_at(const char *text, int columns)
{
    const char *rest = text;
    size_t space = 0;
    char part[1024];
    while (*rest != '\0') {
        if (*rest == ' ')
            space = (size_t)(rest - text);
        sv_words_next(&rest);
        snprintf(part, sizeof part, "%.*s", (int)(rest - text), text);
        if (sv_words_width(part) > columns)
            break;
    }
    return space;
}

void sv_headline_make(const char *title, const char *note, sv_headline *ret_headline)
{
    sv_headline_make_wide(title, note, 1, ret_headline);
}

void sv_headline_make_wide(const char *title, const char *note, int columns,
                           sv_headline *ret_headline)
{
    char clean[1024];
    sv_headline out = {.n_lines = 1};
    const int title_columns = columns * TITLE_COLUMNS;
    sv_text_clean(title, clean, sizeof clean);
    size_t split = sv_words_width(clean) > title_columns ? wrap_at(clean, title_columns) : 0;
    if (split > 0) {
        snprintf(out.lines[0], sizeof out.lines[0], "%.*s", (int)split, clean);
        sv_words_fit(clean + split + 1, title_columns, out.lines[1], sizeof out.lines[1]);
        out.n_lines = 2;
    } else {
        sv_words_fit(clean, title_columns, out.lines[0], sizeof out.lines[0]);
        out.n_lines = clean[0] != '\0';
    }
    for (const char *line = note; *line != '\0' && out.n_notes < 2; out.n_notes++) {
        const size_t length = strcspn(line, "\n");
        snprintf(clean, sizeof clean, "%.*s", (int)length, line);
        sv_words_fit(clean, columns * NOTE_COLUMNS, out.notes[out.n_notes], sizeof out.notes[0]);
        line += length + (line[length] == '\n');
    }
    *ret_headline = out;
}

double sv_headline_height(const sv_headline *headline)
{
    return headline->n_lines * line_cm + headline->n_notes * note_cm + air_cm;
}

void sv_headline_add(const sv_headline *headline, sv_figure *figure)
{
    char literal[1100];
    double y = figure->height_cm - 0.26;
    for (int i = 0; i < headline->n_lines; i++, y -= line_cm) {
        sv_script_literal(headline->lines[i], literal, sizeof literal);
        sv_draft_add(&figure->script,
                     "set label %d %s at screen %.5f,%.5f left font 'Helvetica,8.5' front\n", 1 + i,
                     literal, 0.25 / figure->width_cm, y / figure->height_cm);
    }
    for (int i = 0; i < headline->n_notes; i++, y -= note_cm) {
        sv_script_literal(headline->notes[i], literal, sizeof literal);
        sv_draft_add(&figure->script,
                     "set label %d %s at screen %.5f,%.5f left font 'Helvetica,7' tc rgb "
                     "'#404040' front\n",
                     3 + i, literal, 0.25 / figure->width_cm, y / figure->height_cm);
    }
}
