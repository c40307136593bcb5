/* SPDX-License-Identifier: GPL-3.0-or-later */
/* What the two figures share beyond the script: the headline. */
#ifndef SELVEDGE_FIGURE_INTERNAL_H
#define SELVEDGE_FIGURE_INTERNAL_H

#include "present_internal.h"

/* Title in at most two lines, small print below in as many lines as it has, at most two. */
typedef struct sv_headline {
    char lines[2][256];
    char notes[2][300];
    int n_lines, n_notes;
} sv_headline;

/* Lines of the note are separated by newlines. */
void sv_headline_make(const char *title, const char *note, sv_headline *ret_headline);
double sv_headline_height(const sv_headline *headline); /* centimetres */
void sv_headline_add(const sv_headline *headline, sv_figure *figure);

/* Everything the parts of a map share. */
typedef struct sv_map_figure {
    sv_figure figure;
    const sv_map_result *map;
    const sv_outcome *outcome; /* of the local Chern marker, or NULL */
    bool *window;
    sv_raster raster;
    sv_places vacancies;
    double low[2], high[2];        /* what is shown, lattice constants */
    double left_cm, low_cm, scale; /* place of the picture, centimetres per lattice constant */
    double head_cm, range;
    sv_headline headline;
} sv_map_figure;

/* figure_map_script.c */
void sv_map_choose_layout(sv_map_figure *f);
void sv_map_add_script(sv_map_figure *f);

#endif
