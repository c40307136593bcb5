/* SPDX-License-Identifier: GPL-3.0-or-later */
/**
 * @file sheet.h
 * The sample sheet: YAML read with positions, checked against one table of keys, completed with
 * defaults, turned into models, flakes and disorder. Uses layers 1, 3 and 4.
 */
#ifndef SELVEDGE_SHEET_H
#define SELVEDGE_SHEET_H

#include <stdio.h>

#include "sample.h"

#ifdef __cplusplus
extern "C" {
#endif

/* ------------------------------------------------------------- diagnostics */

typedef enum sv_severity { SV_SEVERITY_ERROR, SV_SEVERITY_WARNING, SV_SEVERITY_NOTE } sv_severity;

/** One message about an input, with its place. Lines and columns count from 1; 0: no place. */
typedef struct sv_diagnostic {
    sv_severity severity;
    char *file; /**< or "--set" for an override */
    int line, column;
    int length; /**< characters to underline, at least 1 */
    char *message;
    char *hint; /**< or NULL */
    char *text; /**< the source line, or NULL */
    char *path; /**< dotted path of the key, or NULL */
} sv_diagnostic;

/** Messages collected; at most 20 errors, then a last one that says so. */
typedef struct sv_diagnostics {
    sv_diagnostic *items;
    sv_index count, capacity;
    int errors;
} sv_diagnostics;

/** Gives all messages back; safe twice in a row. */
SV_API void sv_diagnostics_free(sv_context *context, sv_diagnostics *diagnostics);
/** Prints `file:line:col: error: …`, the line, a caret and the hint for each. */
SV_API void sv_diagnostics_print(const sv_diagnostics *diagnostics, bool colour, FILE *stream);

/* ------------------------------------------------------------------- sheet */

/** A sheet as read: its text, its tree, its overrides. */
typedef struct sv_sheet sv_sheet;

typedef struct sv_sheet_options {
    size_t size;                  /**< sizeof(sv_sheet_options) */
    const char *const *overrides; /**< `path=value` texts, later ones win */
    int n_overrides;
    const sv_kind *markers; /**< kinds the `markers` block may name (from the marker layer) */
    int n_markers;
    bool confined; /**< refuse files named by absolute paths, `..` or links: for the sheet of a
                        run folder that came from elsewhere */
    /** Rules between the keys of a marker (from the marker layer), or NULL: false sets the row of
     *  the key at fault and what is wrong, to follow the key's path. */
    bool (*check_marker)(int kind, const sv_value *values, int *ret_key, char *message,
                         size_t size);
    /** Are the values of a marker integers (from the marker layer)? NULL: nobody asks. */
    bool (*is_index)(int kind);
} sv_sheet_options;

/**
 * Reads and validates a sheet. Every error goes to the diagnostics; nothing else is printed.
 * @param path "-" reads standard input (files are then looked for in the current folder)
 * @return SV_INVALID_INPUT with at least one error in the diagnostics
 */
SV_API SV_MUST_USE sv_status sv_sheet_read(sv_context *context, const char *path,
                                           const sv_sheet_options *options,
                                           sv_diagnostics *diagnostics, sv_sheet **ret_sheet);
/** As sv_sheet_read() from memory. @param name shown in messages, its folder resolves files */
SV_API SV_MUST_USE sv_status sv_sheet_parse(sv_context *context, const char *name, const char *text,
                                            size_t size, const sv_sheet_options *options,
                                            sv_diagnostics *diagnostics, sv_sheet **ret_sheet);
SV_API void sv_sheet_free(sv_context *context, sv_sheet *sheet);

/** A marker the sheet asks for. */
typedef struct sv_sheet_marker {
    int kind;            /**< row of sv_sheet_options.markers */
    sv_value values[16]; /**< one per key of the kind */
} sv_sheet_marker;

/** One axis of a sweep. */
typedef struct sv_sweep_axis {
    char path[200];
    double *values;
    double *second; /**< of a parameter that is a pair: its second numbers; NULL: single numbers */
    bool square;    /**< a pair, of which every value is written as one number n for [n, n] */
    sv_index count;
    bool integer;      /**< the parameter is an integer */
    const char *unit;  /**< symbol of the unit the sweep is written in, NULL: none */
    double unit_scale; /**< what is written = unit_scale · value; 1 without a unit */
} sv_sweep_axis;

enum { SV_MAX_SIZES = 8 };

/** The block `question`: how much of one parameter is tolerable? */
typedef struct sv_sheet_question {
    sv_sweep_axis axis;   /**< the parameter; values: lowest, highest, precision, in its unit of the
                               model */
    sv_sweep_axis budget; /**< a second parameter and its values; count 0: none */
    int marker;           /**< number in sv_setup.markers */
    bool of_mean;         /**< the mean counts, else the share of samples */
    bool has_within;
    double within, share;
    double confidence;
    int64_t most;
    int64_t sizes[SV_MAX_SIZES][2];
    int n_sizes; /**< 0: the flake of the sheet alone */
} sv_sheet_question;

enum { SV_MAX_TEMPERATURES = 16 };

/** The block `plateau`: a marker against the Fermi energy. */
typedef struct sv_sheet_plateau {
    double energies[2]; /**< lowest, highest, unit of the model */
    int64_t points;
    int marker; /**< number in sv_setup.markers */
    double within;
    double kelvin[SV_MAX_TEMPERATURES];
    int n_temperatures; /**< at least 1 */
} sv_sheet_plateau;

/** The block `finite_size`: where do the curves of different sizes cross? */
typedef struct sv_sheet_finite_size {
    int marker;         /**< number in sv_setup.markers */
    int size_axis;      /**< number in sv_setup.axes; the other one is the parameter */
    double range[2];    /**< of the parameter, in the unit of its axis; NaN: not given */
    int order;          /**< 0: not given */
    char correction[8]; /**< none, fixed, free */
    double exponent;    /**< of a fixed correction, NaN otherwise */
    int resamples;
    double confidence;
} sv_sheet_finite_size;

/** A file the sheet names. */
typedef struct sv_sheet_file {
    char *path;    /**< as opened */
    char *written; /**< as written in the sheet */
    char digest[65];
    char *key_path; /**< dotted path of the key, e.g. disorder.vac.file */
} sv_sheet_file;

/** The sheet as typed values; everything in the model's units. */
typedef struct sv_setup {
    char *title;             /**< never NULL */
    double lattice_constant; /**< nm, 0: not given */
    double energy_unit;      /**< eV per unit of the model, 0: none known */
    sv_model model;
    sv_flake_spec flake;
    sv_structure *structure; /**< owned, or NULL; flake.structure */
    sv_disorder *disorder;
    int n_disorder;
    sv_occupation occupation;
    sv_sheet_marker markers[16];
    int n_markers;
    int64_t realisations;
    uint64_t seed;
    bool has_stop;
    double stop_standard_error; /**< 0: not asked for */
    double stop_share_width;    /**< 0: not asked for */
    double stop_seconds;        /**< of computing, over all points; 0: no limit */
    int stop_marker;            /**< number in `markers` */
    int64_t stop_at_least;
    bool site_maps; /**< the marker of every site over the ensemble */
    sv_sweep_axis axes[2];
    int n_axes;
    bool has_finite_size;
    sv_sheet_finite_size finite_size;
    bool has_question;
    sv_sheet_question question;
    bool has_plateau;
    sv_sheet_plateau plateau;
    char engine[16], estimator[16];
    double accuracy, sampling_error;
    sv_sheet_file *files;
    int n_files;
    char *resolved; /**< the sheet with all defaults, as YAML that can be read back; NULL at a point
                         of a sweep, which has no axes either */
    char *identity; /**< canonical text of what fixes the numbers: resolved sheet without
                         realisations, stop and threads; files by digest. NULL at a
                         point of a sweep */
    struct sv_arena_chunk *memory; /**< holds title, files and texts of values */
} sv_setup;

/** A parameter set to a number, or to a pair of them: what a sweep does at one point. */
typedef struct sv_assignment {
    const char *path;
    double value;
    double second; /**< of a pair */
    bool pair;
} sv_assignment;

/** What a point of a sweep assigns along an axis. @param number of the value, from 0 */
SV_API sv_assignment sv_sweep_value(const sv_sweep_axis *axis, sv_index number);

/**
 * The setup of the sheet, at a point of its sweep.
 * @param assignments NULL for the sheet as written
 * @return SV_INVALID_INPUT with an error at the sweep when a value is out of range
 */
SV_API SV_MUST_USE sv_status sv_sheet_setup(sv_context *context, const sv_sheet *sheet,
                                            const sv_assignment *assignments, int n_assignments,
                                            sv_diagnostics *diagnostics, sv_setup *ret_setup);
/**
 * Adds an error of the caller at a top-level key of the sheet (for what only the program can know,
 * such as memory).
 * @param hint NULL: none
 */
SV_API void sv_sheet_report(sv_context *context, const sv_sheet *sheet, const char *key,
                            const char *message, const char *hint, sv_diagnostics *diagnostics);
SV_API void sv_setup_free(sv_context *context, sv_setup *setup);

/**
 * The resolved sheet with its files named anew, for a folder that holds copies of them. Reading it
 * there gives the same identity.
 * @param names  what to write for sv_setup.files[i] of the sheet as written, one each
 * @param n_names must be the number of those files
 * @param[out] ret_text taken from the context
 */
SV_API SV_MUST_USE sv_status sv_sheet_resolved_relocated(sv_context *context, const sv_sheet *sheet,
                                                         const char *const *names, int n_names,
                                                         char **ret_text);

/** A value of a preset, as a sheet would have it, and where it comes from. */
typedef struct sv_preset_value {
    const char *key, *value, *source;
} sv_preset_value;

/** A material: values for the keys of `model`, each with its source and how certain that is. */
typedef struct sv_preset {
    const char *name, *title;
    const sv_preset_value *values;
    int n_values;
    const char *const *notes;
    int n_notes;
} sv_preset;

/** All presets of this build (data/presets.yaml). */
typedef struct sv_presets {
    sv_preset *items;
    int count;
    struct sv_arena_chunk *memory;
} sv_presets;
SV_API SV_MUST_USE sv_status sv_presets_read(sv_context *context, sv_presets *ret_presets);
/** Gives the memory back; safe on a zeroed struct and twice in a row. */
SV_API void sv_presets_free(sv_context *context, sv_presets *presets);
/** Name of the preset the sheet's model builds on, or NULL. Belongs to the sheet. */
SV_API const char *sv_sheet_preset(const sv_sheet *sheet);
/** Does the value of a key of `model` come from the preset? */
SV_API bool sv_sheet_is_preset_value(const sv_sheet *sheet, const char *key);

/** Prints every key with type, unit, range, default and doc line, from the parser's own tables. */
SV_API void sv_sheet_print_keys(const sv_kind *markers, int n_markers, FILE *stream);

#ifdef __cplusplus
}
#endif
#endif
