/* SPDX-License-Identifier: GPL-3.0-or-later */
/**
 * @file base.h
 * Layer 1: status and error record, context, units, keyed options, random streams.
 *
 * Every function that can fail returns an ::sv_status; its outputs come last and are
 * untouched on failure. The place that finds a fault writes one sentence into the error
 * record of the context; callers above only pass the status on.
 *
 * Thread safety: a context belongs to one thread. Worker threads get their own with
 * sv_context_fork(). Nothing in the library keeps writable static state.
 */
#ifndef SELVEDGE_BASE_H
#define SELVEDGE_BASE_H

#include <stdbool.h>
#include <stddef.h>
#include <stdint.h>
#include <stdio.h>

#ifdef __cplusplus
#include <complex>
/** Complex double; the same memory layout in C and C++. */
typedef std::complex<double> sv_complex;
extern "C" {
#else
#include <complex.h>
/** Complex double; the same memory layout in C and C++. */
typedef double _Complex sv_complex;
#endif

#if defined(__GNUC__)
#define SV_API                __attribute__((visibility("default")))
#define SV_MUST_USE           __attribute__((warn_unused_result))
#define SV_PRINTF(fmt, first) __attribute__((format(printf, fmt, first)))
#else
#define SV_API
#define SV_MUST_USE
#define SV_PRINTF(fmt, first)
#endif

/** Sizes, sites, realisations, nonzeros. */
typedef int64_t sv_index;
#define SV_INDEX_FORMAT "lld"

/* ------------------------------------------------------------------ status */

/**
 * The one list of outcomes: name, exit code of the program, text.
 * Expanded into the enum, the message table and the manual.
 */
#define SV_STATUS_LIST(X)                                                                          \
    X(OK, 0, "done")                                                                               \
    X(UNDECIDED, 1, "computed, but a requested check failed or could not be decided")              \
    X(USAGE, 2, "wrong usage")                                                                     \
    X(INVALID_INPUT, 3, "invalid input")                                                           \
    X(STORAGE, 4, "output or storage failure")                                                     \
    X(OTHER_RUN, 4, "the folder holds a run of another identity")                                  \
    X(NUMERICAL, 5, "numerical failure")                                                           \
    X(NOT_CONVERGED, 5, "an iteration did not converge")                                           \
    X(UNDEFINED, 5, "the quantity is not defined here")                                            \
    X(REFUSED, 6, "refused: it would not fit, or the set-up is unsafe")                            \
    X(NO_MEMORY, 6, "out of memory")                                                               \
    X(INTERRUPTED, 7, "stopped early on request")                                                  \
    X(INTERNAL, 70, "internal error")

typedef enum sv_status {
#define SV_STATUS_ENUM(name, exit_code, text) SV_##name,
    SV_STATUS_LIST(SV_STATUS_ENUM)
#undef SV_STATUS_ENUM
        SV_STATUS_COUNT
} sv_status;

/** Short text of a status; never NULL. */
SV_API const char *sv_status_text(sv_status status);
/** Exit code the program uses for a status (see the manual: 0, 1 … 7, 70). */
SV_API int sv_status_exit_code(sv_status status);

/* ----------------------------------------------------------------- context */

/** What went wrong, where it was found, in one sentence with the offending values. */
typedef struct sv_error {
    sv_status status;
    const char *source_file; /**< file of the library that found it; static text */
    int source_line;
    char message[1000]; /**< one sentence, no trailing full stop or newline */
} sv_error;

/** Memory interface; resize is not needed anywhere. Both functions must be thread-safe. */
typedef struct sv_allocator {
    /** Returns `bytes` bytes aligned to 64, or NULL. Contents undefined. */
    void *(*take)(size_t bytes, void *user);
    /** Gives back what take() returned; NULL is allowed. */
    void (*give)(void *memory, void *user);
    void *user;
} sv_allocator;

typedef enum sv_log_level { SV_LOG_WARNING = 1, SV_LOG_NOTE = 2, SV_LOG_DETAIL = 3 } sv_log_level;

/** Progress of long work; `phase` is static text. Called at most about ten times a second. */
typedef void (*sv_progress_function)(const char *phase, sv_index done, sv_index total, void *user);
typedef void (*sv_log_function)(sv_log_level level, const char *message, void *user);
/** True when the caller wants the work to stop soon. Must be thread-safe and cheap. */
typedef bool (*sv_cancel_function)(void *user);

/** Everything a function may use beside its arguments: memory, log, progress, cancel, errors. */
typedef struct sv_context {
    sv_allocator allocator;
    sv_log_function log;
    void *log_user;
    sv_progress_function progress;
    void *progress_user;
    sv_cancel_function cancel;
    void *cancel_user;
    sv_error error;
} sv_context;

/** Fills a context with malloc-based memory, no log, no progress, no cancel. Never fails. */
SV_API void sv_context_init(sv_context *context);
/** A context for another thread: same callbacks, an error record of its own. */
SV_API sv_context sv_context_fork(const sv_context *context);
/** Copies the error record of `from` (a forked context) into `to`. */
SV_API void sv_context_take_error(sv_context *to, const sv_context *from);

/** Writes the error record and returns `status`. Use the SV_FAIL macro. */
SV_API sv_status sv_fail_at(sv_context *context, sv_status status, const char *file, int line,
                            const char *format, ...) SV_PRINTF(5, 6);
#define SV_FAIL(context, status, ...)                                                              \
    sv_fail_at((context), (status), __FILE__, __LINE__, __VA_ARGS__)

/** Hands a message to the log callback; nothing without one. */
SV_API void sv_log(sv_context *context, sv_log_level level, const char *format, ...)
    SV_PRINTF(3, 4);
/** Tells the progress callback how far the work is. */
SV_API void sv_progress(sv_context *context, const char *phase, sv_index done, sv_index total);
/** True when the caller asked to stop; the function that sees it returns SV_INTERRUPTED. */
SV_API bool sv_cancelled(const sv_context *context);

/**
 * Takes zero-filled memory for count·size bytes, aligned to 64.
 * @param[out] ret_memory the memory; count·size = 0 gives a valid pointer to give back
 * @return SV_NO_MEMORY when it is not there or the product overflows
 */
SV_API SV_MUST_USE sv_status sv_take(sv_context *context, sv_index count, size_t size,
                                     void *ret_memory);
/** As sv_take(), contents undefined (for large numerical work arrays). */
SV_API SV_MUST_USE sv_status sv_take_raw(sv_context *context, sv_index count, size_t size,
                                         void *ret_memory);
/** Gives memory back; NULL is allowed. */
SV_API void sv_give(sv_context *context, void *memory);
/** Copies a string into context memory; NULL stays NULL. */
SV_API SV_MUST_USE sv_status sv_take_text(sv_context *context, const char *text, char **ret_text);
/**
 * Grows an array geometrically to hold at least `needed` elements (contents kept).
 * @param[in,out] array    address of the array pointer (may hold NULL)
 * @param[in,out] capacity its capacity in elements
 */
SV_API SV_MUST_USE sv_status sv_reserve(sv_context *context, void *array, sv_index *capacity,
                                        sv_index needed, size_t size);

/* ------------------------------------------------------------------- units */

/** What a quantity measures. Angles and shares have units too (deg, %). */
typedef enum sv_dimension {
    SV_DIM_NONE = 0,       /**< a pure number; `%` and `ppm` allowed */
    SV_DIM_ENERGY,         /**< inside: electronvolt when written with a unit */
    SV_DIM_LENGTH,         /**< inside: nanometre when written with a unit */
    SV_DIM_DENSITY,        /**< per area; inside: nm^-2 when written with a unit */
    SV_DIM_ANGLE,          /**< inside: radian */
    SV_DIM_TEMPERATURE,    /**< inside: kelvin */
    SV_DIM_ENERGY_LENGTH,  /**< ħ times a velocity; inside: eV nm, in a model: energy unit × nm */
    SV_DIM_ENERGY_AREA,    /**< inside: eV nm², in a model: energy unit × nm² */
    SV_DIM_VOLUME_DENSITY, /**< inside: nm^-3 when written with a unit */
    SV_DIM_TIME            /**< inside: second */
} sv_dimension;

/** One row of the table of units: value_in_base = factor · value. */
typedef struct sv_unit {
    const char *symbol;
    sv_dimension dimension;
    double factor;
} sv_unit;

/** A number as read: `value` is in the base unit of its dimension if has_unit, bare otherwise. */
typedef struct sv_quantity {
    double value;
    bool has_unit;
    const sv_unit *unit; /**< row of the table, NULL for a bare number */
} sv_quantity;

/** Name of a dimension for messages: "an energy", "a length" …; never NULL. */
SV_API const char *sv_dimension_name(sv_dimension dimension);
/** Table of all units; the count goes to *ret_count. */
SV_API const sv_unit *sv_unit_table(size_t *ret_count);
/** Row of a symbol, or NULL. */
SV_API const sv_unit *sv_unit_find(const char *symbol);
/** Space-separated symbols of one dimension, for messages. @param[out] text at least `size` bytes
 */
SV_API void sv_unit_list(sv_dimension dimension, char *text, size_t size);

typedef enum sv_parse_result {
    SV_PARSE_OK = 0,
    SV_PARSE_NOT_A_NUMBER,
    SV_PARSE_OUT_OF_RANGE, /**< overflows or is not finite */
    SV_PARSE_UNKNOWN_UNIT,
    SV_PARSE_WRONG_DIMENSION
} sv_parse_result;

/**
 * Reads `NUMBER` or `NUMBER UNIT` (white space between is optional), independent of locale.
 * The whole text must match. `pi` counts as a unit of angle (0.5 pi).
 * @param dimension  what is expected
 * @param[out] ret_quantity  set on SV_PARSE_OK; on SV_PARSE_WRONG_DIMENSION its `unit` is set
 */
SV_API sv_parse_result sv_parse_quantity(const char *text, sv_dimension dimension,
                                         sv_quantity *ret_quantity);
/** Reads a plain real number (whole text, C locale, finite). */
SV_API sv_parse_result sv_parse_real(const char *text, double *ret_value);
/** Reads a plain decimal integer (whole text). */
SV_API sv_parse_result sv_parse_integer(const char *text, int64_t *ret_value);

/** Shortest decimal text that reads back as the same double. @param[out] text at least 32 bytes */
SV_API void sv_format_real(double value, char *text, size_t size);

/* ------------------------------------------------------------- keyed options */

/** How the value of a sheet key is written. */
typedef enum sv_key_type {
    SV_KEY_REAL = 1,        /**< number, unit allowed per dimension → real[0] */
    SV_KEY_INTEGER,         /**< → integer[0] */
    SV_KEY_TEXT,            /**< → text */
    SV_KEY_CHOICE,          /**< one of `choices` → text */
    SV_KEY_FLAG,            /**< true or false → integer[0] */
    SV_KEY_FILE,            /**< path beside the sheet → text (resolved path), digest */
    SV_KEY_REAL_PAIR,       /**< [x, y] → real[0..1] */
    SV_KEY_INTEGER_PAIR,    /**< [i, j] → integer[0..1] */
    SV_KEY_INTEGER_OR_PAIR, /**< n or [n1, n2] → integer[0..count-1] */
    SV_KEY_AUTO_OR_REAL,    /**< the word auto (has_auto) or a number → real[0] */
    SV_KEY_PLACE,           /**< the word centre (has_auto) or [x, y] → real[0..1] */
    SV_KEY_REAL_LIST,       /**< [a, b, …] → list, count */
    SV_KEY_TREE,            /**< nested block, read by code of its own */
    SV_KEY_CHOICE_PAIR, /**< one of `choices` for both, or [a, b] → integer[0..1], row numbers */
    SV_KEY_POINTS,      /**< [[x, y], …] → list, count numbers */
    SV_KEY_LOOPS /**< [[[x, y], …], …] → list, count numbers: points of a loop, x, y, … */
} sv_key_type;

/** One row of a key table: drives validation, defaults, help, `check` and the JSON Schema. */
typedef struct sv_key {
    const char *name;
    sv_key_type type;
    sv_dimension dimension;
    double low, high;     /**< admissible range, both ends included unless open */
    bool low_open;        /**< low itself is not admissible */
    const char *choices;  /**< space-separated words for SV_KEY_CHOICE */
    const char *fallback; /**< default as text; NULL: none */
    bool required;
    const char *doc; /**< one line for help and schema */
} sv_key;

/** Value of one key after validation. Lengths are in lattice constants, energies in the model's
 *  unit, densities per lattice constant squared, angles in radians. */
typedef struct sv_value {
    bool present; /**< written by the user or filled from the default */
    bool written; /**< written by the user */
    bool has_auto;
    int count;
    double real[2];
    int64_t integer[2];
    const char *text;   /**< owned by the sheet's setup */
    const double *list; /**< owned by the sheet's setup */
    char digest[65];    /**< SHA-256 of a file, hexadecimal; empty for other types */
} sv_value;

/** A named kind with its keys: a model, a shape, a disorder kind, a marker … */
typedef struct sv_kind {
    const char *name;
    const char *doc;
    const sv_key *keys;
    int n_keys;
} sv_kind;

/** Row number of a key in a kind, or -1. */
SV_API int sv_kind_find_key(const sv_kind *kind, const char *name);

/* ------------------------------------------------------------------ tables */

/** What is wrong with a file, and where. */
typedef struct sv_table_fault {
    int line, column; /**< from 1 */
    char message[256];
    char hint[256];
    char text[256]; /**< the offending line */
} sv_table_fault;

enum { SV_TABLE_COLUMNS = 16, SV_TABLE_FIELDS = 64 };

/** A column a table may have. */
typedef struct sv_table_column {
    const char *name;
    sv_dimension dimension;
    bool required;
} sv_table_column;

typedef struct sv_table_field {
    char text[200];
    int column; /**< where it starts in its line, from 1 */
} sv_table_field;

/** A comma-separated table being read; fill with sv_table_begin(). Borrows text and columns. */
typedef struct sv_table {
    const sv_table_column *columns;
    int n_columns;
    int place[SV_TABLE_COLUMNS];           /**< field of a column, −1: absent */
    const sv_unit *unit[SV_TABLE_COLUMNS]; /**< from the header, or NULL */
    const char *at, *end;                  /**< what is not read yet */
    const char *line_text;
    int line, line_length; /**< line from 1 */
    int header_fields, n_fields;
    sv_table_field fields[SV_TABLE_FIELDS];
    sv_table_fault fault; /**< set by whatever fails */
} sv_table;

/**
 * Starts a table and reads its first row, which names the columns; a unit may follow the name in
 * brackets, `re [meV]`. Columns that are not asked for are skipped, so are blank lines and those
 * that begin with #.
 * @param example a hint for a first row that is not good
 * @return SV_INVALID_INPUT with ret_table->fault filled
 */
SV_API SV_MUST_USE sv_status sv_table_begin(sv_context *context, const char *text, size_t size,
                                            const sv_table_column *columns, int n_columns,
                                            const char *example, sv_table *ret_table);
/** The next row. @param[out] ret_more false at the end. @return SV_INVALID_INPUT, fault filled */
SV_API SV_MUST_USE sv_status sv_table_next(sv_context *context, sv_table *table, bool *ret_more);
/** Text of a column in this row; empty when the table has no such column. */
SV_API const char *sv_table_text(const sv_table *table, int column);
/**
 * A number of a column, with its own unit or the header's, in the base unit of its dimension.
 * @param[out] ret_has_unit false: bare
 * @return SV_INVALID_INPUT, fault filled
 */
SV_API SV_MUST_USE sv_status sv_table_real(sv_context *context, sv_table *table, int column,
                                           double *ret_value, bool *ret_has_unit);
/** A whole number of a column. @return SV_INVALID_INPUT, fault filled */
SV_API SV_MUST_USE sv_status sv_table_integer(sv_context *context, sv_table *table, int column,
                                              int64_t *ret_value);
/** Fills the fault for a column of this row (−1: the row). @param hint or NULL. @return
 * SV_INVALID_INPUT */
SV_API SV_MUST_USE sv_status sv_table_fail(sv_context *context, sv_table *table, int column,
                                           const char *hint, const char *format, ...)
    SV_PRINTF(5, 6);

/* ---------------------------------------------------------- random streams */

/**
 * Stream of random numbers: Philox4x32-10 (Salmon et al., SC'11, doi:10.1145/2063384.2063405).
 * A number is a function of (seed, purpose, realisation, cell, slot) and of nothing else:
 * key = (seed, purpose), counter = (cell_i, cell_j, realisation, slot), each taken modulo 2^32.
 */
typedef struct sv_stream {
    uint32_t seed;
    uint32_t purpose;
    uint32_t realisation;
} sv_stream;

/** Stream of one purpose, named by text (FNV-1a hash of it) so that adding a purpose moves none. */
SV_API sv_stream sv_stream_make(uint64_t seed, const char *purpose, sv_index realisation);
/** The raw Philox4x32-10 block function. @param[out] output 4 words */
SV_API void sv_philox(const uint32_t counter[4], const uint32_t key[2], uint32_t output[4]);
/** Uniform in the open interval (0, 1): (52 random bits + ½)·2^-52, from words 0 and 1. */
SV_API double sv_stream_uniform(const sv_stream *stream, int32_t cell_i, int32_t cell_j,
                                uint32_t slot);
/** Standard normal by the inverse distribution function of sv_stream_uniform(). */
SV_API double sv_stream_normal(const sv_stream *stream, int32_t cell_i, int32_t cell_j,
                               uint32_t slot);

/* ------------------------------------------------------------------- other */

/** SHA-256 of a memory block as 64 hexadecimal digits. @param[out] digest 65 bytes */
SV_API void sv_digest(const void *data, size_t size, char digest[65]);
/**
 * Reads a whole file of at most `limit` bytes; a NUL byte is appended and not counted.
 * @return SV_INVALID_INPUT when it is missing, not a regular file, or larger
 */
SV_API SV_MUST_USE sv_status sv_read_file(sv_context *context, const char *path, size_t limit,
                                          char **ret_data, size_t *ret_size);
/** A file being written; it appears under its name only when committed. */
typedef struct sv_output {
    FILE *stream;
    char path[1024], temporary[1040];
} sv_output;
/** Opens a temporary file beside `path`. @return SV_STORAGE with the system's reason */
SV_API SV_MUST_USE sv_status sv_output_begin(sv_context *context, const char *path,
                                             sv_output *ret_output);
/** Flushes, syncs and renames; on failure the temporary is removed and the old file stays. */
SV_API SV_MUST_USE sv_status sv_output_commit(sv_context *context, sv_output *output);
/** Throws the temporary away. */
SV_API void sv_output_abort(sv_output *output);
/** Edit distance (insert, delete, replace, swap of neighbours), for did-you-mean. */
SV_API int sv_edit_distance(const char *a, const char *b);
/** Version of the library, from the build. */
SV_API const char *sv_version(void);

#ifdef __cplusplus
}
#endif
#endif
