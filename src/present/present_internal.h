/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Parts of the presentation shared by its files. */
#ifndef SELVEDGE_PRESENT_INTERNAL_H
#define SELVEDGE_PRESENT_INTERNAL_H

#include <jansson.h>

#include "selvedge/present.h"

/* --------------------------------------------------------------- draft.c */

/* A growing text. The first failure sticks; sv_draft_finish() reports it. */
typedef struct sv_draft {
    sv_context *context;
    char *data;
    sv_index size, capacity;
    sv_status status;
} sv_draft;

void sv_draft_add(sv_draft *text, const char *format, ...) SV_PRINTF(2, 3);
void sv_draft_add_bytes(sv_draft *text, const void *bytes, size_t size);
/* Gives the text to the caller, or gives it back and returns what went wrong. */
sv_status sv_draft_finish(sv_draft *text, char **ret_text);
void sv_draft_drop(sv_draft *text);

/* --------------------------------------------------------------- words.c */

/* Next code point of a UTF-8 text; 0xFFFD for a byte that is none. Moves *text on. */
uint32_t sv_words_next(const char **text);
/* Controls, line and paragraph separators, and marks that turn the direction of writing. */
bool sv_words_is_control(uint32_t code);
/* Copy with bad bytes as U+FFFD, control characters kept (JSON escapes them itself). */
sv_status sv_words_repair(sv_context *context, const char *text, char **ret_text);
/* Columns a text takes on a terminal. */
int sv_words_width(const char *text);
/* Clean copy of at most `columns` columns, cut with "..". */
void sv_words_fit(const char *text, int columns, char *fitted, size_t size);
/* "local Chern marker" for local_chern; the name itself for unknown ones. */
const char *sv_words_marker(const char *name);
/* What an integer of it is called in a figure: "C", "spin C". */
const char *sv_words_symbol(const char *name);
/* What the margin and the second number of a marker are called in results, or NULL. */
const char *sv_words_margin(const char *name);
/* Was the value of a realisation itself an estimate, from a sample of its window? */
bool sv_words_estimated(const sv_summary *summary);
const char *sv_words_weakest(const char *name);
/* Axis text of a parameter: its label, or words made of its path. */
void sv_words_parameter(const sv_coordinate *coordinate, char *text, size_t size);
/* Path with its unit in brackets, for column heads. */
void sv_words_column(const sv_coordinate *coordinate, char *text, size_t size);
/* "200", or "50 to 200" where points differ. @return the largest */
int64_t sv_words_realisations(const sv_result *result, char *text, size_t size);
void sv_words_real(double value, char *text, size_t size);
/* A parameter value: an integer without decimals, else the shortest text. */
void sv_words_value(const sv_coordinate *coordinate, char *text, size_t size);

/* ---------------------------------------------------------- json_write.c */

/* A JSON document under construction; `failed` sticks. */
typedef struct sv_json {
    sv_context *context;
    bool failed;
} sv_json;

void sv_json_put(sv_json *json, json_t *object, const char *key, json_t *value);
void sv_json_push(sv_json *json, json_t *array, json_t *value);
void sv_json_put_real(sv_json *json, json_t *object, const char *key, double value);
void sv_json_put_integer(sv_json *json, json_t *object, const char *key, int64_t value);
void sv_json_put_text(sv_json *json, json_t *object, const char *key, const char *value);
json_t *sv_json_real(double value);
json_t *sv_json_pair(sv_json *json, const double pair[2]);
/* A pair, or null when it does not exist. */
void sv_json_put_range(sv_json *json, json_t *object, const char *key, const double pair[2]);
/* Writes and gives back the document. */
sv_status sv_json_finish(sv_json *json, json_t *document, char **ret_text);

/* ------------------------------------------------------------- scaling.c */

void sv_scaling_put(sv_json *json, json_t *document, const sv_finite_size *study);
void sv_scaling_print(const sv_finite_size *study, bool colour, FILE *stream);

/* ---------------------------------------------------------------- json.c */

json_t *sv_json_parameters(sv_json *json, const sv_point_result *point);

/* --------------------------------------------------------- json_spread.c */

void sv_spread_put(sv_json *json, json_t *object, const sv_summary *summary);

/* --------------------------------------------------------- comparisons.c */

void sv_comparisons_put(sv_json *json, json_t *document, const sv_result *result);
void sv_comparisons_sentence(const sv_result *result, const char *marker, FILE *stream);

/* -------------------------------------------------------------- survey.c */

void sv_survey_put(sv_json *json, json_t *marker, const sv_survey *survey);
void sv_survey_print(const sv_survey *survey, FILE *stream);

/* ----------------------------------------------------------- inventory.c */

json_t *sv_json_inventory(sv_json *json, const sv_sample *sample);
/* Places where nothing is are vacancies only when no other kind, nor flake.keep, emptied any. */
const char *sv_empty_words(const sv_sample *sample, sv_index count);
/* "2 pieces (largest: 840 sites), 3 dangling, …" @param[out] text at least 300 bytes */
void sv_inventory_words(const sv_sample *sample, char *text, size_t size);
/* -------------------------------------------------------------- coarse.c */

void sv_coarse_put(sv_json *json, json_t *marker, const sv_coarse *map);
void sv_coarse_print(const sv_coarse *map, FILE *stream);

/* ------------------------------------------------------------ terminal.c */

/* One cell of a table: padded to `width` columns, then two spaces. */
void sv_table_cell(FILE *stream, const char *text, int width, bool right);
void sv_table_heading(FILE *stream, const char *text, bool colour);
/* Over as many lines as it takes, broken at spaces, indented. */
void sv_table_wrapped(FILE *stream, const char *text);

/* -------------------------------------------------------------- raster.c */

/* A flake as pixels: what each shows. Row 0 is the lowest. */
typedef struct sv_raster {
    int nx, ny;
    double low[2], step; /* centre of pixel (0, 0); lattice constants per pixel */
    float *value;        /* marker of the pixel's cell; NaN outside and at vacancies */
    uint8_t *inside;     /* 1: flake, 3: flake and window */
} sv_raster;
enum { SV_PIXEL_FLAKE = 1, SV_PIXEL_WINDOW = 2 };

/* Positions where something is missing, Cartesian. */
typedef struct sv_places {
    double (*at)[2];
    sv_index count;
} sv_places;

/* `window`: one flag per cell, or NULL; `most`: pixels along the longer side, 0: fit for a map. */
sv_status sv_raster_make(sv_context *context, const sv_map_result *map, const bool *window,
                         int most, sv_raster *ret_raster);
/* The pixels of the flake with a little air around, lattice constants. */
void sv_raster_frame(const sv_raster *raster, double ret_low[2], double ret_high[2]);
void sv_raster_free(sv_context *context, sv_raster *raster);
sv_status sv_places_vacant(sv_context *context, const sv_sample *sample, sv_places *ret_places);

/* -------------------------------------------------------------- outline.c */

/* Writes the border of the pixels that have `mask` as closed polylines, blank lines between. */
sv_status sv_outline_write(sv_draft *text, const sv_raster *raster, uint8_t mask);

/* -------------------------------------------------------------- script.c */

enum { SV_FIGURE_NAME_SIZE = 128 };

/* Everything about one figure while it is made. */
typedef struct sv_figure {
    sv_context *context;
    const char *folder, *name;
    double width_cm, height_cm;
    const char *title, *description; /* of the SVG, for readers that cannot see it */
    const char *only;                /* the one ending to draw, "svg" …, or NULL for all three */
    sv_draft script;
} sv_figure;

/* Checks name and folder, sets paths, starts the script. */
sv_status sv_figure_begin(sv_figure *figure, sv_figure_files *files);
/* A text as gnuplot literal: single-quoted, cleaned, quotes doubled. */
void sv_script_literal(const char *text, char *literal, size_t size);
void sv_script_terminals(sv_figure *figure);
/* Writes the script, runs gnuplot, checks what came out. */
sv_status sv_figure_draw(sv_figure *figure, sv_figure_files *files);
sv_status sv_figure_write(sv_figure *figure, const char *suffix, const void *bytes, size_t size,
                          char path[512]);

/* ------------------------------------------------------------- gnuplot.c */

/* Runs gnuplot on a script in its folder; false with a reason when it did not work. */
bool sv_gnuplot_run(sv_context *context, const char *folder, const char *script, char *reason,
                    size_t size);

/* -------------------------------------------------------------- finish.c */

/* Checks the three pictures; takes the date out of the PDF, puts title and text into the SVG. */
sv_status sv_picture_finish(sv_figure *figure, sv_figure_files *files);

#endif
