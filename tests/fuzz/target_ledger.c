/* SPDX-License-Identifier: GPL-3.0-or-later */
/*
 * Run folders from elsewhere. The input is a list of edits of a good ledger, so that kept inputs
 * stay good when the layout of the ledger changes:
 *   'b' AAAA N BYTES   overwrite N bytes at A        's' SQL '\n'   run a statement on it
 *   't' AAAA           cut off at A                  'a' N BYTES    append
 *   'j' N BYTES        a journal beside it           'x' N BYTES    the sheet of the folder
 *   'r' RECORD         put a record by the library   'w'            open it for writing, too
 * Rows that are read must be those that were written: each has a checksum.
 */
#include "fuzz.h"

#include <dirent.h>
#include <math.h>
#include <sqlite3.h>
#include <stdio.h>
#include <unistd.h>

#include "selvedge/store.h"

enum { N_POINTS = 2, N_ROWS = 2, MOST_STEPS = 2000, MOST_EDITS = 12 };

static char folder[220], ledger_path[256], journal_path[256], sheet_path[256];
static unsigned char *good_ledger;
static size_t good_size;

typedef struct reader {
    const uint8_t *at, *end;
} reader;

static const char *const MARKERS[2] = {"local_chern", "bott"};

static sv_run_identity identity(void)
{
    return (sv_run_identity){.identity = "model: qi_wu_zhang\n",
                             .resolved_sheet = "selvedge: 1\n",
                             .program_version = "0",
                             .kernel = "none",
                             .markers = MARKERS,
                             .n_markers = 2,
                             .n_points = N_POINTS};
}

static sv_record make_record(int32_t point, int64_t realisation)
{
    sv_record record;
    memset(&record, 0, sizeof record);
    record.point = point;
    record.realisation = realisation;
    record.sites = 72 - realisation;
    record.vacancies = realisation;
    record.seconds = 0.25;
    record.n_outcomes = 2;
    for (int k = 0; k < 2; k++)
        record.outcomes[k] = (sv_outcome){.verdict = SV_RESOLVED,
                                          .engine = "dense",
                                          .value = 1.0 / (3.0 + (double)realisation + point),
                                          .index = k,
                                          .numerical_error = 1e-13,
                                          .margin = 0.3,
                                          .weakest = 0.25,
                                          .sum_over_sites = (double)NAN,
                                          .window_cells = 9,
                                          .highest_occupied = -0.5,
                                          .lowest_empty = 0.3,
                                          .electrons = 36,
                                          .kappa = 0.1};
    return record;
}

static unsigned char *slurp(const char *path, size_t *ret_size)
{
    FILE *stream = fopen(path, "rb");
    fuzz_require(stream != NULL && fseek(stream, 0, SEEK_END) == 0, "cannot read %s", path);
    const long size = ftell(stream);
    unsigned char *bytes = malloc((size_t)size + 1);
    rewind(stream);
    fuzz_require(bytes != NULL && fread(bytes, 1, (size_t)size, stream) == (size_t)size,
                 "cannot read %s", path);
    fclose(stream);
    *ret_size = (size_t)size;
    return bytes;
}

/*
 * SQLite takes and gives thousands of blocks for one input. It is not compiled with a checker, so
 * a plain pool for it loses nothing and is twice as fast: blocks of 2^k bytes, the size before
 * them.
 */
enum { SMALLEST = 5, LARGEST = 24, POOL_HEAD = 16 };
static void *idle[LARGEST + 1];

static int pool_round(int bytes)
{
    int k = SMALLEST;
    while (k < LARGEST && (1 << k) - POOL_HEAD < bytes)
        k++;
    return (1 << k) - POOL_HEAD;
}

static void *pool_take(int bytes)
{
    const int size = pool_round(bytes);
    const int k = __builtin_ctz((unsigned)(size + POOL_HEAD));
    char *block = idle[k];
    if (size < bytes)
        return NULL;
    if (block != NULL)
        memcpy(&idle[k], block + POOL_HEAD, sizeof *idle);
    else if ((block = malloc((size_t)(size + POOL_HEAD))) == NULL)
        return NULL;
    memcpy(block, &size, sizeof size);
    return block + POOL_HEAD;
}

static int pool_size(void *memory)
{
    int size = 0;
    if (memory != NULL)
        memcpy(&size, (char *)memory - POOL_HEAD, sizeof size);
    return size;
}

static void pool_give(void *memory)
{
    if (memory == NULL)
        return;
    const int k = __builtin_ctz((unsigned)(pool_size(memory) + POOL_HEAD));
    memcpy(memory, &idle[k], sizeof *idle);
    idle[k] = (char *)memory - POOL_HEAD;
}

static void *pool_resize(void *memory, int bytes)
{
    const int before = pool_size(memory);
    if (bytes <= before)
        return memory;
    void *larger = pool_take(bytes);
    if (larger != NULL)
        memcpy(larger, memory, (size_t)before);
    if (larger != NULL)
        pool_give(memory);
    return larger;
}

static int pool_begin(void *user)
{
    (void)user;
    return SQLITE_OK;
}

static void pool_end(void *user)
{
    (void)user;
}

static void use_pool(void)
{
    static const sqlite3_mem_methods pool = {pool_take,  pool_give,  pool_resize, pool_size,
                                             pool_round, pool_begin, pool_end,    NULL};
    fuzz_require(sqlite3_config(SQLITE_CONFIG_SINGLETHREAD) == SQLITE_OK &&
                     sqlite3_config(SQLITE_CONFIG_MEMSTATUS, 0) == SQLITE_OK &&
                     sqlite3_config(SQLITE_CONFIG_MALLOC, &pool) == SQLITE_OK,
                 "SQLite is already in use");
}

static void forget(void)
{
    sqlite3_shutdown();
    for (int k = SMALLEST; k <= LARGEST; k++)
        for (char *block = idle[k], *next; block != NULL; block = next) {
            memcpy(&next, block + POOL_HEAD, sizeof next);
            free(block);
        }
    free(good_ledger);
    good_ledger = NULL;
}

/* The good run, made once. */
static void prepare(sv_context *context)
{
    const sv_run_identity who = identity();
    sv_run *run = NULL;
    if (good_ledger != NULL)
        return;
    use_pool();
    snprintf(folder, sizeof folder, "%s/run", fuzz_folder());
    setenv("TMPDIR", fuzz_folder(), 1); /* copies that are rolled back go there, too */
    snprintf(ledger_path, sizeof ledger_path, "%s/ledger.sqlite", folder);
    snprintf(journal_path, sizeof journal_path, "%s/ledger.sqlite-journal", folder);
    snprintf(sheet_path, sizeof sheet_path, "%s/sheet.resolved.yaml", folder);
    sv_status status = sv_run_open(context, folder, &who, false, &run);
    for (int32_t point = 0; point < N_POINTS && status == SV_OK; point++)
        for (int64_t k = 0; k < N_ROWS && status == SV_OK; k++) {
            const sv_record record = make_record(point, k);
            status = sv_run_put(context, &record, run);
        }
    fuzz_require(status == SV_OK, "no run: %s", context->error.message);
    sv_run_close(context, run);
    good_ledger = slurp(ledger_path, &good_size);
    atexit(forget);
}

/* The good run again, and nothing else in the folder: ledgers are set aside, journals are left. */
static void restore(void)
{
    DIR *entries = opendir(folder);
    fuzz_require(entries != NULL, "cannot read %s", folder);
    for (struct dirent *entry; (entry = readdir(entries)) != NULL;)
        if (strncmp(entry->d_name, "ledger.", 7) == 0)
            unlinkat(dirfd(entries), entry->d_name, 0);
    closedir(entries);
    fuzz_write(ledger_path, good_ledger, good_size);
    fuzz_write(sheet_path, identity().resolved_sheet, strlen(identity().resolved_sheet));
}

static size_t take_number(reader *r, int n_bytes)
{
    size_t value = 0;
    for (int k = 0; k < n_bytes && r->at < r->end; k++)
        value = value << 8 | *r->at++;
    return value;
}

static reader take_bytes(reader *r, size_t n)
{
    const size_t left = (size_t)(r->end - r->at);
    reader part = {r->at, r->at + (n < left ? n : left)};
    r->at = part.end;
    return part;
}

static int count_steps(void *user)
{
    int *steps = user;
    return ++*steps > MOST_STEPS;
}

/* As a stranger with SQL would: triggers and all. Nothing outside the file, and not for ever. */
static void run_sql(reader text)
{
    char sql[1000];
    int steps = 0;
    sqlite3 *ledger = NULL;
    snprintf(sql, sizeof sql, "%.*s", (int)(text.end - text.at), (const char *)text.at);
    if (sqlite3_open(ledger_path, &ledger) == SQLITE_OK) {
        sqlite3_limit(ledger, SQLITE_LIMIT_ATTACHED, 0);
        sqlite3_limit(ledger, SQLITE_LIMIT_LENGTH, 1 << 20);
        sqlite3_progress_handler(ledger, 100, count_steps, &steps);
        sqlite3_exec(ledger, "PRAGMA temp_store = MEMORY", NULL, NULL, NULL);
        sqlite3_exec(ledger, sql, NULL, NULL, NULL);
    }
    sqlite3_close(ledger);
}

/* A record of any content whose texts end. */
static void put_record(sv_context *context, reader *r)
{
    const sv_run_identity who = identity();
    sv_record record = make_record(0, N_ROWS);
    sv_run *run = NULL;
    const reader part = take_bytes(r, sizeof record);
    memcpy(&record, part.at, (size_t)(part.end - part.at));
    record.n_outcomes = (int32_t)((uint32_t)record.n_outcomes % (SV_MAX_MARKERS + 1));
    for (int k = 0; k < SV_MAX_MARKERS; k++) {
        record.outcomes[k].reason[sizeof record.outcomes[k].reason - 1] = '\0';
        record.outcomes[k].engine[sizeof record.outcomes[k].engine - 1] = '\0';
    }
    if (sv_run_open(context, folder, &who, false, &run) == SV_OK &&
        sv_run_put(context, &record, run) != SV_OK)
        fuzz_require(context->error.message[0] != '\0', "a record is refused without a word");
    sv_run_close(context, run);
}

/* Appends to or changes a file of the folder in place. */
static void patch(const char *path, long at, reader bytes)
{
    FILE *stream = fopen(path, at < 0 ? "ab" : "r+b");
    if (stream == NULL)
        return;
    if (at >= 0)
        fseek(stream, at, SEEK_SET);
    fwrite(bytes.at, 1, (size_t)(bytes.end - bytes.at), stream);
    fclose(stream);
}

/* One edit; what it promises about the rows is returned: true when they may now be others. */
static bool edit(sv_context *context, reader *r, bool *ret_write)
{
    const uint8_t what = *r->at++;
    size_t at;
    reader bytes;
    switch (what) {
    case 'b':
        at = take_number(r, 4) % (good_size + 512);
        bytes = take_bytes(r, take_number(r, 1));
        patch(ledger_path, (long)at, bytes);
        return false;
    case 't':
        if (truncate(ledger_path, (off_t)(take_number(r, 4) % good_size)) != 0)
            unlink(ledger_path);
        return false;
    case 'a':
        patch(ledger_path, -1, take_bytes(r, take_number(r, 1)));
        return false;
    case 'j':
        bytes = take_bytes(r, take_number(r, 2));
        fuzz_write(journal_path, bytes.at, (size_t)(bytes.end - bytes.at));
        return false;
    case 'x':
        bytes = take_bytes(r, take_number(r, 1));
        fuzz_write(sheet_path, bytes.at, (size_t)(bytes.end - bytes.at));
        return false;
    case 's': {
        const uint8_t *stop = memchr(r->at, '\n', (size_t)(r->end - r->at));
        run_sql(take_bytes(r, stop == NULL ? (size_t)(r->end - r->at) : (size_t)(stop - r->at)));
        return false;
    }
    case 'r':
        put_record(context, r);
        return true;
    default:
        *ret_write = *ret_write || what == 'w';
        return false;
    }
}

static bool same_number(double a, double b)
{
    return a == b || (isnan(a) && isnan(b));
}

static void check_record(const sv_record *read)
{
    const sv_record good = make_record(read->point, read->realisation);
    fuzz_require(read->n_outcomes == good.n_outcomes && read->sites == good.sites &&
                     read->status == good.status && read->vacancies == good.vacancies,
                 "row %lld of point %d is another", (long long)read->realisation, read->point);
    for (int k = 0; k < good.n_outcomes; k++) {
        const sv_outcome *a = &read->outcomes[k], *b = &good.outcomes[k];
        fuzz_require(a->verdict == b->verdict && a->index == b->index &&
                         same_number(a->value, b->value) && same_number(a->margin, b->margin) &&
                         same_number(a->numerical_error, b->numerical_error) &&
                         strcmp(a->engine, b->engine) == 0 && strcmp(a->reason, b->reason) == 0,
                     "outcome %d of row %lld of point %d is another", k,
                     (long long)read->realisation, read->point);
    }
}

static sv_status read_rows(sv_context *context, sv_run *run, bool others)
{
    sv_ensemble ensemble = {0};
    int64_t realisations = 0;
    int32_t points = 0;
    sv_index loaded = 0;
    sv_status status = sv_run_extent(context, run, &realisations, &points);
    if (status == SV_OK)
        status = sv_ensemble_init(context, N_POINTS, N_ROWS + 1, 2, &ensemble);
    if (status == SV_OK)
        status = sv_run_load(context, run, &ensemble, &loaded);
    sv_record record;
    for (int32_t point = 0; status == SV_OK && !others && point < N_POINTS; point++)
        for (int64_t k = 0; k <= N_ROWS; k++)
            if (sv_ensemble_get(&ensemble, point, k, &record))
                check_record(&record);
    sv_ensemble_free(context, &ensemble);
    return status;
}

static void check_answer(const sv_context *context, sv_status status)
{
    fuzz_require(status == SV_OK || status == SV_STORAGE || status == SV_OTHER_RUN ||
                     status == SV_NO_MEMORY,
                 "ended with \"%s\": %s", sv_status_text(status), context->error.message);
    fuzz_require(status == SV_OK || context->error.message[0] != '\0', "refused without a word");
}

int LLVMFuzzerTestOneInput(const uint8_t *data, size_t size)
{
    sv_context *context = fuzz_begin();
    reader r = {data, data + size};
    bool others = false, write = false;
    sv_run *run = NULL;
    prepare(context);
    const sv_run_identity who = identity();
    restore();
    for (int k = 0; k < MOST_EDITS && r.at < r.end; k++)
        others = edit(context, &r, &write) || others;

    sv_status status = sv_run_open_read(context, folder, &run);
    if (status == SV_OK)
        status = read_rows(context, run, others);
    check_answer(context, status);
    sv_run_close(context, run);
    run = NULL;
    if (write) {
        status = sv_run_open(context, folder, &who, false, &run);
        if (status == SV_OK)
            status = read_rows(context, run, others);
        check_answer(context, status);
        sv_run_close(context, run);
    }
    fuzz_end();
    return 0;
}
