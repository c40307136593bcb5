/* SPDX-License-Identifier: GPL-3.0-or-later */
/*
 * Inside the sheet module.
 *
 *   text ──source.c──► checked text ──tree.c──► tree of nodes with positions
 *        ──override.c──► tree with --set applied
 *        ──document.c, section.c, value.c──► sections: key rows of schema.c with typed values
 *        ──setup*.c──► models, flakes, disorder      ──resolved_text.c, identity.c──► texts
 *
 * Faults of the user are collected as diagnostics and reading goes on; running out of memory stops
 * everything. To keep the readers short, both are remembered by the sv_reader: functions that meet
 * a fault of the user return false (or NULL) after reporting it, and do the same without a report
 * once memory has failed.
 */
#ifndef SELVEDGE_SHEET_INTERNAL_H
#define SELVEDGE_SHEET_INTERNAL_H

#include "selvedge/sheet.h"

#include <stdarg.h>

enum {
    SV_SHEET_LIMIT = 4 << 20,  /* bytes of a sheet */
    SV_TREE_DEPTH = 64,        /* nested lists and mappings */
    SV_TREE_NODES = 100000,    /* nodes as written */
    SV_TREE_WALK = 1000000,    /* nodes with every alias written out */
    SV_TREE_SCALAR = 64 << 10, /* bytes of one scalar */
    SV_TREE_ANCHORS = 1000,
    SV_FILE_LIMIT = 64 << 20, /* bytes of a file a sheet names */
    SV_MAX_ERRORS = 20,
    SV_PATH_SIZE = 200 /* as sv_sweep_axis.path */
};

/* ------------------------------------------------------------ arena.c */

/* Memory that is given back all at once. */
typedef struct sv_arena {
    struct sv_arena_chunk *chunks;
} sv_arena;

sv_status sv_arena_take(sv_context *context, sv_arena *arena, size_t bytes, void *ret_memory);
sv_status sv_arena_text(sv_context *context, sv_arena *arena, const char *text, size_t length,
                        const char **ret_text);
void sv_arena_free(sv_context *context, sv_arena *arena);

/* Text that grows. The first failure sticks in `status`; later additions do nothing. */
typedef struct sv_text {
    sv_context *context;
    char *data;
    sv_index length, capacity;
    sv_status status;
} sv_text;

void sv_text_add(sv_text *text, const char *format, ...) SV_PRINTF(2, 3);
void sv_text_add_bytes(sv_text *text, const char *bytes, size_t length);

/* ----------------------------------------------------------- source.c */

/* Where text came from: the sheet, an override, a sweep. */
typedef struct sv_source {
    const char *name; /* shown in messages */
    const char *text;
    size_t size;
} sv_source;

/* Line and column count from 1; 0: no place. */
typedef struct sv_mark_point {
    int line, column;
} sv_mark_point;

/* Length of the UTF-8 character at `text` and its code point; 0 when it is not well formed. */
int sv_utf8_read(const char *text, size_t size, uint32_t *ret_code);
/* Control characters, and those that change the direction of writing. */
bool sv_must_escape(uint32_t code);
/* Line and column (in characters) of a byte offset. */
sv_mark_point sv_source_locate(const char *text, size_t size, size_t offset);
/* The nth line (from 1) without its end; NULL when there is none. */
const char *sv_source_line(const char *text, size_t size, int line, size_t *ret_length);
/* What YAML text may not hold: fills *ret_what and *ret_offset. True when clean. */
bool sv_source_is_clean(const char *text, size_t size, const char **ret_what, const char **ret_hint,
                        size_t *ret_offset);

/* ------------------------------------------------------- diagnostics.c */

typedef struct sv_place {
    const sv_source *source; /* NULL: no place */
    int line, column, length;
} sv_place;

typedef struct sv_complaint {
    sv_severity severity;
    sv_place place;
    const char *hint; /* or NULL */
    const char *path; /* or NULL */
} sv_complaint;

sv_status sv_diagnose(sv_context *context, sv_diagnostics *diagnostics,
                      const sv_complaint *complaint, const char *format, va_list args);
/* Orders the items from `first` on by place, keeping files in the order they appear. */
void sv_diagnostics_sort(sv_diagnostics *diagnostics, sv_index first);

/* -------------------------------------------------------------- tree.c */

typedef enum sv_node_kind { SV_NODE_SCALAR, SV_NODE_LIST, SV_NODE_MAP } sv_node_kind;

typedef struct sv_node {
    sv_node_kind kind;
    bool plain;                   /* scalar without quotes */
    bool open;                    /* still being read */
    const char *text;             /* scalar: its value, NUL-terminated */
    const struct sv_node **items; /* list: entries; map: key, value, key, value … */
    sv_index count;               /* entries, or pairs */
    sv_index weight;              /* nodes below and including it, aliases written out */
    const sv_source *source;
    sv_mark_point start, end; /* end: one past the last character */
} sv_node;

typedef struct sv_tree_input {
    const sv_source *source;
    size_t skip;      /* bytes of the source text before the YAML begins (overrides) */
    const char *what; /* "sheet" or "value", for messages */
} sv_tree_input;

/* Reads one YAML document. @return SV_INVALID_INPUT with one diagnostic */
sv_status sv_tree_read(sv_context *context, sv_arena *arena, const sv_tree_input *input,
                       sv_diagnostics *diagnostics, sv_node **ret_root);

sv_place sv_node_place(const sv_node *node);
/* Value of a key of a mapping or NULL; *ret_key (may be NULL) gets the key node. */
const sv_node *sv_node_get(const sv_node *map, const char *key, const sv_node **ret_key);
/* Nothing written: an empty value, ~ or null. */
bool sv_node_is_null(const sv_node *node);
sv_status sv_node_scalar(sv_context *context, sv_arena *arena, const char *text,
                         const sv_source *source, sv_mark_point start, sv_node **ret_node);

/* ------------------------------------------------------------ schema.c */

typedef enum sv_block_form {
    SV_BLOCK_MAP,  /* keys, and those of a kind */
    SV_BLOCK_LIST, /* list of such mappings */
    SV_BLOCK_NAMED /* mapping of kind names to mappings of keys (markers) */
} sv_block_form;

/* One block of the sheet. The whole sheet is the first row, with an empty name. */
typedef struct sv_block {
    const char *parent; /* name of the block it stands in, NULL for the sheet itself */
    const char *name;
    const char *doc;
    sv_block_form form;
    bool required;
    bool optional_section; /* no section at all when it is not written */
    const char *fallback;  /* SV_BLOCK_NAMED: the kind that stands for a missing block */
    const char *exclusive; /* space-separated keys; a default falls away when another is given */
    int max_entries;       /* SV_BLOCK_LIST */
    const sv_key *keys;    /* common to all kinds */
    int n_keys;
    const char *kind_key; /* key that names the kind, or NULL */
    const sv_kind *(*kinds)(int *ret_count);
} sv_block;

const sv_block *sv_schema_blocks(int *ret_count);
const sv_block *sv_schema_find(const char *name);
/* The next block standing in `parent` after `previous` (NULL: the first). */
const sv_block *sv_schema_child(const sv_block *parent, const sv_block *previous);
/* Keys that give the scales themselves: a unit is required and kept. */
bool sv_schema_is_scale(const sv_key *key);
/* The spacing of a model on a grid of its own: its lattice constant, in nm with or without a unit.
 */
bool sv_schema_is_grid(const sv_key *key);

/* ------------------------------------------------------------ reader.c */

/* A file named by the sheet, read once. */
typedef struct sv_cached_file {
    struct sv_cached_file *next;
    const char *path;
    sv_source source;
    char *data;
    char digest[65];
    sv_grey grey; /* of an image; value NULL: something else */
} sv_cached_file;

struct sv_sheet {
    sv_arena arena;
    sv_source source;
    char *data;
    const char *folder;
    bool confined;
    bool (*check_marker)(int kind, const sv_value *values, int *ret_key, char *message,
                         size_t size);
    bool (*is_index)(int kind); /* or NULL */
    const sv_node *root;        /* overrides applied */
    const sv_kind *markers;
    int n_markers;
    double energy_unit; /* of the sheet as written; 0: none known */
    sv_cached_file *files;
};

/* A key of a block as read. */
typedef struct sv_field {
    const sv_key *key;
    const sv_node *node;     /* the value; NULL: not written, and for defaults */
    const sv_node *key_node; /* NULL when not written */
} sv_field;

/* A block, or an entry of one, as read. */
typedef struct sv_section {
    struct sv_section *next;
    const sv_block *block;
    const sv_kind *kind; /* or NULL */
    int kind_row;
    int entry;             /* number in its list, −1: not a list */
    const char *path;      /* "disorder.vac"; empty for the sheet itself */
    const sv_node *node;   /* NULL: not written */
    const sv_node *anchor; /* where faults of the whole section are shown */
    sv_field *fields;      /* common keys, then those of the kind */
    sv_value *values;
    int n_fields;
} sv_section;

typedef struct sv_reader {
    sv_context *context;
    sv_diagnostics *diagnostics;
    sv_arena *arena;
    const sv_sheet *sheet;
    sv_sheet *loading; /* the sheet while it is being read: files may be added */
    const sv_node *root;
    sv_status status; /* first failure that is not the user's */
    int errors;       /* faults of the user so far */
    /* an assignment: what to say before each message, and where */
    const char *prefix;
    sv_place prefix_place;
    const char *at_path; /* dotted path being read, for diagnostics, or NULL */
    bool geometry;       /* build the flake to check it */
    double lattice_constant, energy_unit;
    const sv_node *first_energy; /* the first energy written with a unit */
    int listed_hops;             /* hops of a custom model that the sheet itself lists */
    sv_section *sections, *last_section;
    struct sv_setup *setup; /* receives the files as they are met */
} sv_reader;

bool sv_reader_good(const sv_reader *reader);
void *sv_reader_take(sv_reader *reader, sv_index count, size_t size);
const char *sv_reader_text(sv_reader *reader, const char *format, ...) SV_PRINTF(2, 3);
/* Reports an error at a node; `hint` may be NULL. Always false. */
bool sv_report(sv_reader *reader, const sv_node *node, const char *hint, const char *format, ...)
    SV_PRINTF(4, 5);
bool sv_report_at(sv_reader *reader, const sv_place *place, const char *hint, const char *format,
                  ...) SV_PRINTF(4, 5);
void sv_note(sv_reader *reader, const sv_node *node, const char *format, ...) SV_PRINTF(3, 4);
/* A library call that failed: the user's fault at a node, or a failure of its own. Always false. */
bool sv_report_status(sv_reader *reader, const sv_node *node, sv_status status);

/* ----------------------------------------------------------- suggest.c */

/* Collects names and keeps the one nearest to a word. */
typedef struct sv_suggestion {
    const char *word;
    char best[SV_PATH_SIZE];
    int distance;
    bool by_prefix;
    char all[300]; /* the names offered, for a hint without a near one */
} sv_suggestion;

sv_suggestion sv_suggest_start(const char *word);
void sv_suggest_name(sv_suggestion *suggestion, const char *name);
void sv_suggest_words(sv_suggestion *suggestion, const char *words);
/* "did you mean …?" or "known: …". @param[out] hint at least `size` bytes */
void sv_suggest_hint(const sv_suggestion *suggestion, char *hint, size_t size);
/* True when `word` is one of the space-separated words. */
bool sv_words_hold(const char *words, const char *word);

/* ------------------------------------------------- number.c, value.c */

/* Reads the value of a key; false after a report. `path` is dotted, for messages. */
bool sv_value_read(sv_reader *reader, const sv_key *key, const char *path, const sv_node *node,
                   sv_value *ret_value);
/* The node must be a scalar with something in it; `what` names what is expected. */
bool sv_scalar_check(sv_reader *reader, const char *path, const sv_node *node, const char *what);
/* A number with the dimension given, converted to the model's units. */
bool sv_number_read(sv_reader *reader, sv_dimension dimension, const char *path,
                    const sv_node *node, double *ret_value, bool *ret_has_unit);
/* A number of a key: dimension and range of its row. */
bool sv_real_read(sv_reader *reader, const sv_key *key, const char *path, const sv_node *node,
                  double *ret_value);
bool sv_integer_read(sv_reader *reader, const char *path, const sv_node *node, int64_t *ret_value);
/* True when the value keeps to the range of its key. */
bool sv_range_check(sv_reader *reader, const sv_key *key, const char *path, const sv_node *node,
                    double value);
/* A bound of a range: 1000000 rather than 1e+06. @param[out] text at least 32 bytes */
void sv_format_bound(double value, char *text, size_t size);
/* The words of a row of choices: `row` from 0, copied to `word`. False past the end. */
bool sv_choice_word(const char *choices, int row, char *word, size_t size);

/* ----------------------------------------------------------- section.c */

bool sv_section_read(sv_reader *reader, sv_section *section, const sv_node *map);
int sv_section_find(const sv_section *section, const char *key);
/* Value of a key that the table has; the row is there by construction. */
const sv_value *sv_section_value(const sv_section *section, const char *key);
/* Where the value of a key is written, or the section when it is not. */
const sv_node *sv_section_node(const sv_section *section, const char *key);
/* How many of the space-separated keys are written. */
int sv_section_written(const sv_section *section, const char *keys);
/* Exactly one of the space-separated keys must be written. */
bool sv_section_one_of(sv_reader *reader, const sv_section *section, const char *keys);
/* None of the space-separated keys may be written: they have no meaning beside `with`. */
bool sv_section_none_of(sv_reader *reader, const sv_section *section, const char *keys,
                        const char *why);

/* ---------------------------------------------------------- document.c */

/* Reads all blocks into reader->sections. */
void sv_document_read(sv_reader *reader);
/* The section of a block by name, the one after `previous` (NULL: the first), or NULL. */
const sv_section *sv_document_find(const sv_reader *reader, const char *block,
                                   const sv_section *previous);

/* -------------------------------------------------------------- path.c */

typedef struct sv_path {
    int count;
    const char *segments[16];
    int columns[16]; /* of each segment in the text, from 1 */
    const sv_source *source;
    int line;
} sv_path;

/* Splits at dots; `place` is that of the text. False after a report: empty or overlong. */
bool sv_path_split(sv_reader *reader, const char *text, const sv_place *place, sv_path *ret_path);
/*
 * A copy of the tree with the value at the path; what is not on the path is shared.
 * A fault is reported at the offending segment; unknown keys are left to the schema.
 */
bool sv_path_set(sv_reader *reader, const sv_node *root, const sv_path *path, const sv_node *value,
                 const sv_node **ret_root);
/* The node at the path, or NULL. */
const sv_node *sv_path_get(const sv_node *root, const sv_path *path);
/* Does this dotted path point at key `key` of the section? */
bool sv_path_matches(const sv_section *section, const char *key, const char *path);

/* ---------------------------------------------------------- override.c */

/* Sets `path=value` in *root. */
bool sv_override_apply(sv_reader *reader, const char *text, const sv_node **root);

/* ----------------------------------------------------------- presets.c */

extern const char sv_presets_text[]; /* data/presets.yaml, made at build time */
/* Fills the model of *root with what its preset says; nothing without one. */
bool sv_preset_expand(sv_reader *reader, const sv_node **root);

/* ------------------------------------------------ sweep.c, sweep_target.c */

/* The number a sweep points at: its key row, or one made for a part of a value. */
typedef struct sv_target {
    const sv_section *section;
    const sv_key *row;  /* as in the table */
    const char *rest;   /* of the path below that row: a component of a pair, a place in a tree */
    const sv_key *key;  /* reads one number */
    sv_key part;        /* `key` points here when only a part of a value is swept */
    const sv_key *pair; /* reads [a, b] where values may be pairs, else NULL */
    sv_key whole;       /* `pair` points here when it is no row of the table */
    bool square;        /* one number n stands for [n, n] */
} sv_target;

/* Finds what the path points at; `node` is the path as written. */
bool sv_target_find(sv_reader *reader, const char *path, const sv_node *node,
                    sv_target *ret_target);
/* Do both point at the same number, or one at a part of the other? */
bool sv_targets_clash(const sv_target *a, const sv_target *b);
/* May a key of the flake be one number n for [n, n]? */
bool sv_target_is_square(const sv_section *section, const sv_key *key);

/* The first value of a sweep over this key, when one is written; else NULL. */
const sv_node *sv_sweep_first(sv_reader *reader, const sv_section *section, const sv_key *key);
bool sv_sweep_read(sv_reader *reader, sv_setup *setup);
/* Numbers that mean what an axis over the parameter at `path_node` would mean by them. */
bool sv_sweep_read_numbers(sv_reader *reader, const sv_node *path_node, const sv_node *const *nodes,
                           int n, sv_sweep_axis *axis);

/* ------------------------------------------------------- finite_size.c */

/* The block `finite_size`, where there is one; after markers and sweep. */
bool sv_finite_size_read(sv_reader *reader, sv_setup *setup);

/* ---------------------------------------------------------- question.c */

/* The block `question`, where there is one. */
bool sv_question_read(sv_reader *reader, sv_setup *setup);
/* The block `plateau`, where there is one. */
bool sv_plateau_read(sv_reader *reader, sv_setup *setup);
/* The `parameter` value of the axis that sweeps this path, or NULL. */
const sv_node *sv_sweep_parameter(const sv_node *root, const char *path);

/* ------------------------------------------------------------- files.c */

bool sv_file_load(sv_reader *reader, const sv_node *node, const char *path, sv_value *ret_value);
const sv_cached_file *sv_file_find(const sv_sheet *sheet, const char *path);

/* ------------------------------------------------------------- setup*.c */

/* Runs a whole reading of the sheet; every field of *setup is freed by sv_setup_free(). */
bool sv_setup_build(sv_reader *reader, sv_setup *setup);
bool sv_setup_model(sv_reader *reader, sv_setup *setup);
bool sv_setup_flake(sv_reader *reader, sv_setup *setup);
bool sv_setup_disorder(sv_reader *reader, sv_setup *setup);
/* setup_defects.c, setup_lines.c: one per kind of disorder, and what they share. */
bool sv_use_vacancies(sv_reader *reader, const sv_section *section, const sv_model *model,
                      sv_disorder *disorder);
bool sv_use_onsite(sv_reader *reader, const sv_section *section, const sv_model *model,
                   sv_disorder *disorder);
bool sv_use_mass(sv_reader *reader, const sv_section *section, const sv_model *model,
                 sv_disorder *disorder);
bool sv_use_hopping(sv_reader *reader, const sv_section *section, const sv_model *model,
                    sv_disorder *disorder);
bool sv_use_flux(sv_reader *reader, const sv_section *section, const sv_model *model,
                 sv_disorder *disorder);
bool sv_use_adatoms(sv_reader *reader, const sv_section *section, const sv_model *model,
                    sv_disorder *disorder);
bool sv_use_cracks(sv_reader *reader, const sv_section *section, const sv_model *model,
                   sv_disorder *disorder);
bool sv_use_domains(sv_reader *reader, const sv_section *section, const sv_model *model,
                    sv_disorder *disorder);
bool sv_use_roughness(sv_reader *reader, const sv_section *section, const sv_model *model,
                      sv_disorder *disorder);
bool sv_use_steps(sv_reader *reader, const sv_section *section, const sv_model *model,
                  sv_disorder *disorder);
/* Share, density or count of the section. */
bool sv_use_amount(sv_reader *reader, const sv_section *section, const sv_model *model,
                   sv_disorder *disorder);
/* The local operator that `term` names. */
bool sv_use_term(sv_reader *reader, const sv_section *section, const sv_model *model,
                 sv_disorder *disorder);
/* Defaults that mean nothing here do not show in the resolved sheet. */
void sv_section_drop_defaults(const sv_section *section, const char *keys);
/* All of the keys must have a value. */
bool sv_section_needs(sv_reader *reader, const sv_section *section, const char *keys);
/* None of them may be written, and their defaults fall away. */
bool sv_section_rejects(sv_reader *reader, const sv_section *section, const char *keys,
                        const char *why);
double sv_section_real(const sv_section *section, const char *key);
/* Number of the word of a key among n words. */
int sv_section_choice(const sv_section *section, const char *key, const char *const *words, int n);
/* setup_measured.c: the `file` of a disorder entry, and what of it has no partner */
bool sv_use_file(sv_reader *reader, const sv_section *section, const sv_model *model,
                 sv_disorder *disorder);
bool sv_check_measured(sv_reader *reader, const sv_flake *flake, const sv_disorder *disorder,
                       const sv_section *section);
bool sv_setup_ensemble(sv_reader *reader, sv_setup *setup);
/* Builds the flake, when it is not too large, to see that it exists and holds the defects. */
bool sv_setup_geometry(sv_reader *reader, const sv_setup *setup);
/* One entry of a list of the model, read by its key table. */
bool sv_model_item_read(sv_reader *reader, const sv_block *block, const sv_node *node,
                        const char *list, sv_index number, sv_section *ret_section);
/* Row of an orbital; a name that is not there is reported, and −1. */
int sv_orbital_read(sv_reader *reader, const sv_model *model, const char *name,
                    const sv_node *node);
/* [re, im] or a number. */
bool sv_amplitude_read(sv_reader *reader, const sv_node *node, const char *path,
                       sv_complex *ret_amplitude);
bool sv_by_distance_read(sv_reader *reader, const sv_section *section, sv_model *model);
bool sv_setup_structure(sv_reader *reader, const sv_section *section, sv_setup *setup);
bool sv_custom_read(sv_reader *reader, const sv_section *section, sv_model *model);

/* ---------------------------------------------- resolved_text.c, identity.c */

/* @param names what to write for the i-th file instead of its path, or NULL */
sv_status sv_resolved_write(sv_reader *reader, const sv_setup *setup, const char *const *names,
                            char **ret_text);
sv_status sv_identity_write(sv_reader *reader, const sv_setup *setup, char **ret_text);
/* YAML text of a scalar, quoted when it needs to be. */
void sv_emit_scalar(sv_text *text, const char *value);
/* YAML flow text of a node. */
void sv_emit_node(sv_text *text, const sv_node *node);

#endif
