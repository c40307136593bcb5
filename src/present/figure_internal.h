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
/* As wide as so many columns of a page. */
void sv_headline_make_wide(const char *title, const char *note, int columns,
                           sv_headline *ret_headline);
double sv_headline_height(const sv_headline *headline); /* centimetres */
void sv_headline_add(const sv_headline *headline, sv_figure *figure);

/* What a map is of: one realisation, or an ensemble. */
typedef enum sv_map_kind { SV_MAP_SAMPLE, SV_MAP_MEAN, SV_MAP_DEVIATION } sv_map_kind;

/* figure_axis.c: an axis over a swept parameter */
typedef struct sv_axis {
    int number;     /* of the axis of the sweep */
    int exponent;   /* power of ten taken out of its numbers */
    char name[400]; /* with unit and power */
} sv_axis;
void sv_axis_make(const sv_result *result, int axis, sv_axis *ret_axis);
/* A pair has one place: a flux its ratio, a size the geometric mean, others their first number. */
double sv_axis_value(const sv_axis *axis, const sv_point_result *point);

/* phase_grid.c: the points of a two-axis sweep as a grid */
typedef struct sv_phase_grid {
    const sv_result *result;
    sv_axis axes[2];
    double *values[2]; /* ascending */
    int n[2];
    int32_t *point; /* per place, the first axis fastest; -1: none there */
    bool twice;     /* two points fell on one place */
} sv_phase_grid;
sv_status sv_phase_grid_make(sv_context *context, const sv_result *result, sv_phase_grid *ret_grid);
void sv_phase_grid_free(sv_context *context, sv_phase_grid *grid);
const sv_summary *sv_phase_at(const sv_phase_grid *grid, int marker, int i, int j); /* or NULL */
double sv_phase_mean(const sv_phase_grid *grid, int marker, int i, int j);          /* NaN: none */
/* The lower or upper side of a point's rectangle. */
double sv_phase_side(const sv_phase_grid *grid, int axis, int number, bool upper);
/* Lines along which the interpolated mean crosses a half-integer, as pairs of ends. */
void sv_phase_add_boundary(sv_draft *text, const sv_phase_grid *grid, int marker);
/* One line "x y integer" per connected region of equal rounded mean. */
sv_status sv_phase_add_labels(sv_context *context, sv_draft *text, const sv_phase_grid *grid,
                              int marker);

/* Everything the parts of a map share. */
typedef struct sv_map_figure {
    sv_figure figure;
    const sv_map_result *map;
    sv_map_kind kind;
    const sv_outcome *outcome; /* of the local Chern marker, or NULL */
    bool *window;
    sv_raster raster;
    sv_places vacancies;
    double low[2], high[2];        /* what is shown, lattice constants */
    double left_cm, low_cm, scale; /* place of the picture, centimetres per lattice constant */
    double head_cm, range;
    sv_headline headline;
} sv_map_figure;

/* Everything the parts of a drawing share. */
typedef struct sv_draw_figure {
    sv_figure figure;
    const sv_sample_result *result;
    sv_raster raster;
    bool by_site;         /* sites and bonds one by one, else pixels */
    double *site_energy;  /* per row: mean potential of its cell, or of itself */
    double range;         /* largest |potential|, energy unit of `unit`; 0: none */
    double energy_factor; /* what is shown = factor · model unit */
    const char *unit;     /* of the bar */
    sv_index vacant, removed, hanging, lone, adatoms; /* symbols drawn */
    sv_index bonds[3]; /* near, far, around the torus: lines written */
    double shortest;   /* bond, lattice constants; 0: no bonds */
    double low[2], high[2];
    double left_cm, low_cm, scale;
    double head_cm, foot_cm;
    sv_headline headline;
} sv_draw_figure;

/* figure_draw_data.c: bonds, sites and defects of a small flake */
sv_status sv_draw_write_sites(sv_draw_figure *f, sv_draft *text);
/* figure_draw_script.c */
void sv_draw_choose_layout(sv_draw_figure *f);
void sv_draw_add_script(sv_draw_figure *f);
/* 1, 2 or 5 times a power of ten, at most `longest`. */
double sv_round_length(double longest);
/* The colours −1 … 1 as a palette. */
void sv_script_palette(sv_draft *script);

/* figure_map.c: lines and raster of a map into its files */
sv_status sv_map_write_data(sv_map_figure *f, sv_figure_files *files);
/* figure_map_script.c */
void sv_map_choose_layout(sv_map_figure *f);
void sv_map_add_script(sv_map_figure *f);

#endif
