/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The command line: one table of options drives parsing and help. */
#include "program_internal.h"

#include <stdarg.h>
#include <stdlib.h>
#include <string.h>

typedef enum option_id {
    OPT_OUTPUT = 'o',
    OPT_REALISATION = 'k',
    OPT_REALISATIONS = 'n',
    OPT_SEED = 's',
    OPT_THREADS = 'j',
    OPT_SET = 'S',
    OPT_JSON = 'J',
    OPT_QUIET = 'q',
    OPT_VERBOSE = 'v',
    OPT_COLOUR = 'C',
    OPT_PROGRESS = 'P',
    OPT_DRY_RUN = 'D',
    OPT_FORCE = 'F',
    OPT_TIME_LIMIT = 'T',
    OPT_HAMILTONIAN = 'H',
    OPT_SITES = 'L',
    OPT_CSV = 'V',
    OPT_PROBES = 'B',
    OPT_BLOCKS = 'M',
    OPT_FLOW = 'W',
    OPT_MAPS = 'm',
    OPT_TASK = 'A',
    OPT_HELP = 'h'
} option_id;

typedef struct option_row {
    option_id id;
    bool has_short;
    const char *name, *value, *doc;
} option_row;

static const option_row option_rows[] = {
    {OPT_OUTPUT, true, "output", "PATH", "folder to write (average: the run; map: a figure)"},
    {OPT_REALISATION, true, "realisation", "K", "which realisation (default 0)"},
    {OPT_REALISATIONS, true, "realisations", "N",
     "realisations per point, as ensemble.realisations"},
    {OPT_SEED, true, "seed", "S", "seed, as ensemble.seed"},
    {OPT_THREADS, true, "threads", "N", "worker threads (default: the cores this process may use)"},
    {OPT_SET, false, "set", "PATH=VALUE", "set a key of the sheet; repeatable, later ones win"},
    {OPT_JSON, false, "json", NULL, "one JSON document on standard output"},
    {OPT_QUIET, true, "quiet", NULL, "no notes, no progress"},
    {OPT_VERBOSE, true, "verbose", NULL, "more notes"},
    {OPT_COLOUR, false, "color", "auto|always|never", "colour in tables and messages"},
    {OPT_PROGRESS, false, "progress", "auto|always|never", "progress on standard error"},
    {OPT_DRY_RUN, false, "dry-run", NULL, "forecast only, write nothing"},
    {OPT_FORCE, false, "force", NULL, "go on in a run of another identity; overwrite exports"},
    {OPT_TIME_LIMIT, false, "time-limit", "TIME",
     "stop cleanly after so many seconds, or 10 min (exit 7)"},
    {OPT_TASK, false, "task", "I/N", "compute part I of N only, into its own folder; see merge"},
    {OPT_HAMILTONIAN, false, "hamiltonian", "FILE", "write the Hamiltonian (Matrix Market)"},
    {OPT_SITES, false, "sites", "FILE", "write the sites in matrix order (CSV)"},
    {OPT_CSV, false, "csv", "FILE",
     "write the marker of each site, or the density of states (CSV)"},
    {OPT_PROBES, false, "probes", "FILE", "write the probe points of the localizer (CSV)"},
    {OPT_BLOCKS, false, "blocks", "FILE", "write the blocks of a coarse map (CSV)"},
    {OPT_FLOW, false, "flow", "FILE", "write the levels of the spectral flow (CSV)"},
    {OPT_MAPS, false, "maps", "FILE", "write mean and deviation of the marker of each site (CSV)"},
    {OPT_HELP, true, "help", NULL, "this text"},
};
enum { N_ROWS = sizeof option_rows / sizeof option_rows[0] };

/* Prints the error and the usage line; returns the exit code. `hint`: nearest legal word, or NULL.
 */
static int SV_PRINTF(3, 4) usage_error(const command *c, const char *hint, const char *format, ...)
{
    char message[1000], clean[2000];
    va_list args;
    va_start(args, format);
    vsnprintf(message, sizeof message, format, args);
    va_end(args);
    sv_text_clean(message, clean, sizeof clean);
    fprintf(stderr, "selvedge: error: %s\n", clean);
    if (hint != NULL)
        fprintf(stderr, "hint: did you mean %s?\n", hint);
    fprintf(stderr, "usage: selvedge %s %s; see selvedge %s%s--help\n", c ? c->name : "COMMAND",
            c ? c->operands : "[OPTIONS] FILE", c ? c->name : "", c ? " " : "");
    return sv_status_exit_code(SV_USAGE);
}

static bool takes(const command *c, option_id id)
{
    return id == OPT_HELP || strchr(c->option_letters, (int)id) != NULL;
}

static const option_row *find_long(const command *c, const char *name, size_t length)
{
    for (int k = 0; k < N_ROWS; k++)
        if (strlen(option_rows[k].name) == length &&
            strncmp(option_rows[k].name, name, length) == 0 && takes(c, option_rows[k].id))
            return &option_rows[k];
    return NULL;
}

static const option_row *find_short(const command *c, char letter)
{
    for (int k = 0; k < N_ROWS; k++)
        if (option_rows[k].has_short && (char)option_rows[k].id == letter &&
            takes(c, option_rows[k].id))
            return &option_rows[k];
    return NULL;
}

/* Nearest option of the command within two edits, as "--name", or NULL. */
static const char *suggest_option(const command *c, const char *name, char *text, size_t size)
{
    const option_row *best = NULL;
    int least = 3;
    for (int k = 0; k < N_ROWS; k++) {
        int distance = sv_edit_distance(name, option_rows[k].name);
        if (takes(c, option_rows[k].id) && distance < least) {
            least = distance;
            best = &option_rows[k];
        }
    }
    if (best == NULL)
        return NULL;
    snprintf(text, size, "--%s", best->name);
    return text;
}

static bool parse_count(const char *text, int64_t low, int64_t *ret)
{
    return sv_parse_integer(text, ret) == SV_PARSE_OK && *ret >= low;
}

static bool parse_choice(const char *text, choice *ret)
{
    const char *const words[] = {"auto", "always", "never"};
    for (int k = 0; k < 3; k++)
        if (strcmp(text, words[k]) == 0) {
            *ret = (choice)k;
            return true;
        }
    return false;
}

/* -n and -s are overrides of the sheet under another name. */
static bool add_made_override(options *o, int slot, const char *path, const char *value)
{
    int64_t number;
    if (!parse_count(value, slot == 0 ? 1 : 0, &number))
        return false;
    free(o->made[slot]);
    if (asprintf(&o->made[slot], "%s=%s", path, value) < 0) {
        o->made[slot] = NULL;
        return false;
    }
    return true;
}

static bool add_override(options *o, const char *value)
{
    if (o->n_overrides == MOST_OVERRIDES - 3 || strchr(value, '=') == NULL)
        return false;
    o->overrides[o->n_overrides++] = value;
    return true;
}

/* "-" would make a file of that name; standard output is for the result itself. */
static bool is_file_name(const char *value)
{
    return value[0] != '\0' && strcmp(value, "-") != 0;
}

/* "3/20" */
static bool parse_task(const char *text, options *o)
{
    const char *slash = strchr(text, '/');
    char head[24] = "";
    if (slash == NULL || (size_t)(slash - text) >= sizeof head)
        return false;
    memcpy(head, text, (size_t)(slash - text));
    return parse_count(head, 1, &o->task) && parse_count(slash + 1, 1, &o->tasks) &&
           o->task <= o->tasks && o->tasks <= MOST_TASKS;
}

/* Takes one option; false when its value is not legal. */
static bool apply(options *o, option_id id, const char *value)
{
    sv_quantity time;
    switch (id) {
    case OPT_OUTPUT:
        o->output = value;
        return value[0] != '\0';
    case OPT_REALISATION:
        /* The random streams number realisations with 32 bits. */
        return parse_count(value, 0, &o->realisation) && o->realisation <= UINT32_MAX;
    case OPT_REALISATIONS:
        return add_made_override(o, 0, "ensemble.realisations", value);
    case OPT_SEED:
        return add_made_override(o, 1, "ensemble.seed", value);
    case OPT_THREADS:
        return parse_count(value, 1, &o->threads) && o->threads <= 4096;
    case OPT_SET:
        return add_override(o, value);
    case OPT_JSON:
        return o->json = true;
    case OPT_QUIET:
        return o->quiet = true;
    case OPT_VERBOSE:
        o->verbose++;
        return true;
    case OPT_COLOUR:
        return parse_choice(value, &o->colour);
    case OPT_PROGRESS:
        return parse_choice(value, &o->progress);
    case OPT_DRY_RUN:
        return o->dry_run = true;
    case OPT_FORCE:
        return o->force = true;
    case OPT_TIME_LIMIT:
        if (sv_parse_quantity(value, SV_DIM_TIME, &time) != SV_PARSE_OK || !(time.value > 0.0))
            return false;
        o->time_limit = time.value;
        return true;
    case OPT_HAMILTONIAN:
        o->hamiltonian = value;
        return is_file_name(value);
    case OPT_SITES:
        o->sites = value;
        return is_file_name(value);
    case OPT_CSV:
        o->csv = value;
        return is_file_name(value);
    case OPT_PROBES:
        o->probes = value;
        return is_file_name(value);
    case OPT_FLOW:
        o->flow = value;
        return is_file_name(value);
    case OPT_MAPS:
        o->maps = value;
        return is_file_name(value);
    case OPT_BLOCKS:
        o->blocks = value;
        return is_file_name(value);
    case OPT_TASK:
        return parse_task(value, o);
    case OPT_HELP:
        return true;
    }
    return false;
}

/* Parses one word that starts with a dash; −1 to go on. */
static int parse_option(int argc, char **argv, int *at, options *o)
{
    const command *c = o->command;
    const char *word = argv[*at], *value = NULL;
    const option_row *row;
    char hint[64];
    if (word[1] == '-') {
        const char *equals = strchr(word, '=');
        size_t length = equals ? (size_t)(equals - word - 2) : strlen(word + 2);
        row = find_long(c, word + 2, length);
        value = equals ? equals + 1 : NULL;
    } else {
        row = find_short(c, word[1]);
        value = word[2] != '\0' ? word + 2 : NULL;
    }
    if (row == NULL)
        return usage_error(c, suggest_option(c, word + 1 + (word[1] == '-'), hint, sizeof hint),
                           "unknown option %s", word);
    if (row->value == NULL && value != NULL)
        return usage_error(c, NULL, "option %s takes no value", word);
    if (row->value != NULL && value == NULL) {
        if (*at + 1 >= argc)
            return usage_error(c, NULL, "option %s needs a value", word);
        value = argv[++*at];
    }
    if (row->id == OPT_HELP) {
        print_help(c, stdout);
        return 0;
    }
    if (!apply(o, row->id, value ? value : ""))
        return usage_error(c, NULL, "not a legal value: --%s %s (expected %s)", row->name, value,
                           row->value);
    return -1;
}

static const command *find_command(const char *name)
{
    int count;
    const command *table = command_table(&count);
    for (int k = 0; k < count; k++)
        if (strcmp(table[k].name, name) == 0)
            return &table[k];
    return NULL;
}

static int unknown_command(const char *name)
{
    int count, least = 3;
    const command *table = command_table(&count);
    const char *best = NULL;
    for (int k = 0; k < count; k++) {
        int distance = sv_edit_distance(name, table[k].name);
        if (distance < least) {
            least = distance;
            best = table[k].name;
        }
    }
    return usage_error(NULL, best, "unknown command \"%s\"", name);
}

static void keep_command_line(int argc, char **argv, options *o)
{
    size_t used = 0;
    for (int k = 0; k < argc && used + 2 < sizeof o->command_line; k++) {
        int n = snprintf(o->command_line + used, sizeof o->command_line - used, "%s%s",
                         k ? " " : "", k ? argv[k] : "selvedge");
        if (n < 0)
            return;
        used += (size_t)n;
    }
}

static int parse_words(int argc, char **argv, options *o)
{
    bool only_files = false;
    for (int at = 2; at < argc; at++) {
        if (!only_files && strcmp(argv[at], "--") == 0) {
            only_files = true;
        } else if (!only_files && argv[at][0] == '-' && argv[at][1] != '\0') {
            int code = parse_option(argc, argv, &at, o);
            if (code >= 0)
                return code;
        } else if (o->n_files == o->command->files_high) {
            return usage_error(o->command, NULL, "unexpected argument \"%s\"", argv[at]);
        } else {
            o->files[o->n_files++] = argv[at];
        }
    }
    if (o->n_files < o->command->files_low)
        return usage_error(o->command, NULL, "%s is missing", o->command->operands);
    for (int slot = 0; slot < 2; slot++)
        if (o->made[slot] != NULL)
            o->overrides[o->n_overrides++] = o->made[slot];
    return -1;
}

int options_parse(int argc, char **argv, options *ret)
{
    *ret = (options){0};
    if (argc < 2)
        return usage_error(NULL, NULL, "a command is missing");
    if (strcmp(argv[1], "--help") == 0 || strcmp(argv[1], "-h") == 0) {
        print_help(NULL, stdout);
        return 0;
    }
    if (strcmp(argv[1], "--version") == 0) {
        printf("selvedge %s\n", sv_version());
        return 0;
    }
    if (argv[1][0] == '-')
        return usage_error(NULL, NULL, "unknown option %s before a command", argv[1]);
    ret->command = find_command(argv[1]);
    if (ret->command == NULL)
        return unknown_command(argv[1]);
    keep_command_line(argc, argv, ret);
    ret->files = calloc((size_t)argc, sizeof *ret->files);
    if (ret->files == NULL) {
        fprintf(stderr, "selvedge: error: %s\n", sv_status_text(SV_NO_MEMORY));
        return sv_status_exit_code(SV_NO_MEMORY);
    }
    return parse_words(argc, argv, ret);
}

void options_free(options *o)
{
    free(o->made[0]);
    free(o->made[1]);
    free(o->files);
}

static void print_option_rows(const command *c, FILE *stream)
{
    for (int k = 0; k < N_ROWS; k++) {
        const option_row *row = &option_rows[k];
        char left[60];
        if (!takes(c, row->id))
            continue;
        if (row->has_short)
            snprintf(left, sizeof left, "-%c, --%s%s%s", (char)row->id, row->name,
                     row->value ? " " : "", row->value ? row->value : "");
        else
            snprintf(left, sizeof left, "    --%s%s%s", row->name, row->value ? " " : "",
                     row->value ? row->value : "");
        fprintf(stream, "  %-28s %s%s%s\n", left, strlen(left) > 28 ? "\n" : "",
                strlen(left) > 28 ? "                               " : "", row->doc);
    }
}

void print_help(const command *one, FILE *stream)
{
    int count;
    const command *table = command_table(&count);
    if (one != NULL) {
        fprintf(stream, "usage: selvedge %s [OPTIONS] %s\n\n%s\n\n", one->name, one->operands,
                one->doc);
        print_option_rows(one, stream);
        return;
    }
    fprintf(stream,
            "selvedge %s: how much disorder a film can take before its quantised Hall "
            "response frays\n\nusage: selvedge COMMAND [OPTIONS] FILE\n\n",
            sv_version());
    for (int k = 0; k < count; k++)
        fprintf(stream, "  %-9s %s\n", table[k].name, table[k].doc);
    fprintf(stream, "\nselvedge COMMAND --help has the options of a command, selvedge help keys "
                    "the keys of a sheet.\n\nexit codes: 0 done, 1 could not be decided, 2 usage, "
                    "3 invalid input, 4 storage,\n5 numerical failure, 6 refused, 7 stopped early "
                    "(can be continued), 70 internal error\n");
}
