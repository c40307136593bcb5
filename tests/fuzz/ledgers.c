/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "ledgers.h"

#include <dirent.h>
#include <math.h>
#include <sqlite3.h>
#include <stdio.h>
#include <unistd.h>

enum { MOST_STEPS = 2000, MOST_EDITS = 12 };

typedef struct reader {
    const uint8_t *at, *end;
} reader;

static const char *const MARKERS[2] = {"local_chern", "bott"};

sv_run_identity fuzz_identity(void)
{
    return (sv_run_identity){.identity = "model: qi_wu_zhang\n",
                             .resolved_sheet = "selvedge: 1\n",
                             .program_version = "0",
                             .kernel = "none",
                             .markers = MARKERS,
                             .n_markers = 2,
                             .n_points = FUZZ_POINTS};
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

static void empty_pool(void)
{
    sqlite3_shutdown();
    for (int k = SMALLEST; k <= LARGEST; k++)
        for (char *block = idle[k], *next; block != NULL; block = next) {
            memcpy(&next, block + POOL_HEAD, sizeof next);
            free(block);
        }
}

void fuzz_ledger_begin(void)
{
    static bool begun;
    if (begun)
        return;
    begun = true;
    use_pool();
    setenv("TMPDIR", fuzz_folder(), 1); /* copies that are rolled back go there, too */
    atexit(empty_pool);
}

void fuzz_ledger_make(sv_context *context, fuzz_ledger *l, const char *name, int64_t first,
                      int64_t end)
{
    const sv_run_identity who = fuzz_identity();
    sv_run *run = NULL;
    if (l->bytes != NULL)
        return;
    fuzz_ledger_begin();
    snprintf(l->folder, sizeof l->folder, "%s/%s", fuzz_folder(), name);
    snprintf(l->ledger, sizeof l->ledger, "%s/ledger.sqlite", l->folder);
    snprintf(l->journal, sizeof l->journal, "%s/ledger.sqlite-journal", l->folder);
    snprintf(l->sheet, sizeof l->sheet, "%s/sheet.resolved.yaml", l->folder);
    sv_status status = sv_run_open(context, l->folder, &who, false, &run);
    for (int32_t point = 0; point < FUZZ_POINTS && status == SV_OK; point++)
        for (int64_t k = first; k < end && status == SV_OK; k++) {
            const sv_record record = make_record(point, k);
            status = sv_run_put(context, &record, run);
        }
    fuzz_require(status == SV_OK, "no run: %s", context->error.message);
    sv_run_close(context, run);
    l->bytes = slurp(l->ledger, &l->size);
}

void fuzz_ledger_restore(const fuzz_ledger *l)
{
    DIR *entries = opendir(l->folder);
    fuzz_require(entries != NULL, "cannot read %s", l->folder);
    for (struct dirent *entry; (entry = readdir(entries)) != NULL;)
        if (strncmp(entry->d_name, "ledger.", 7) == 0)
            unlinkat(dirfd(entries), entry->d_name, 0);
    closedir(entries);
    fuzz_write(l->ledger, l->bytes, l->size);
    fuzz_write(l->sheet, fuzz_identity().resolved_sheet, strlen(fuzz_identity().resolved_sheet));
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
static void run_sql(const char *path, reader text)
{
    char sql[1000];
    int steps = 0;
    sqlite3 *ledger = NULL;
    snprintf(sql, sizeof sql, "%.*s", (int)(text.end - text.at), (const char *)text.at);
    if (sqlite3_open(path, &ledger) == SQLITE_OK) {
        sqlite3_limit(ledger, SQLITE_LIMIT_ATTACHED, 0);
        sqlite3_limit(ledger, SQLITE_LIMIT_LENGTH, 1 << 20);
        sqlite3_progress_handler(ledger, 100, count_steps, &steps);
        sqlite3_exec(ledger, "PRAGMA temp_store = MEMORY", NULL, NULL, NULL);
        sqlite3_exec(ledger, sql, NULL, NULL, NULL);
    }
    sqlite3_close(ledger);
}

/* A record of any content whose texts end. */
static void put_record(sv_context *context, const fuzz_ledger *l, reader *r)
{
    const sv_run_identity who = fuzz_identity();
    sv_record record = make_record(0, FUZZ_ROWS);
    sv_run *run = NULL;
    const reader part = take_bytes(r, sizeof record);
    memcpy(&record, part.at, (size_t)(part.end - part.at));
    record.n_outcomes = (int32_t)((uint32_t)record.n_outcomes % (SV_MAX_MARKERS + 1));
    for (int k = 0; k < SV_MAX_MARKERS; k++) {
        record.outcomes[k].reason[sizeof record.outcomes[k].reason - 1] = '\0';
        record.outcomes[k].engine[sizeof record.outcomes[k].engine - 1] = '\0';
    }
    if (sv_run_open(context, l->folder, &who, false, &run) == SV_OK &&
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

static void edit(sv_context *context, const fuzz_ledger *l, reader *r, fuzz_edits *done)
{
    const uint8_t what = *r->at++;
    size_t at;
    reader bytes;
    switch (what) {
    case 'b':
        at = take_number(r, 4) % (l->size + 512);
        bytes = take_bytes(r, take_number(r, 1));
        patch(l->ledger, (long)at, bytes);
        return;
    case 't':
        if (truncate(l->ledger, (off_t)(take_number(r, 4) % l->size)) != 0)
            unlink(l->ledger);
        return;
    case 'a':
        patch(l->ledger, -1, take_bytes(r, take_number(r, 1)));
        return;
    case 'j':
        bytes = take_bytes(r, take_number(r, 2));
        fuzz_write(l->journal, bytes.at, (size_t)(bytes.end - bytes.at));
        return;
    case 'x':
        bytes = take_bytes(r, take_number(r, 1));
        fuzz_write(l->sheet, bytes.at, (size_t)(bytes.end - bytes.at));
        return;
    case 's': {
        const uint8_t *stop = memchr(r->at, '\n', (size_t)(r->end - r->at));
        run_sql(l->ledger,
                take_bytes(r, stop == NULL ? (size_t)(r->end - r->at) : (size_t)(stop - r->at)));
        return;
    }
    case 'r':
        put_record(context, l, r);
        done->others = true;
        return;
    default:
        done->write = done->write || what == 'w';
        return;
    }
}

fuzz_edits fuzz_ledger_edit(sv_context *context, const fuzz_ledger *l, const uint8_t *data,
                            size_t size)
{
    reader r = {data, data + size};
    fuzz_edits done = {false, false};
    for (int k = 0; k < MOST_EDITS && r.at < r.end; k++)
        edit(context, l, &r, &done);
    return done;
}

static bool same_number(double a, double b)
{
    return a == b || (isnan(a) && isnan(b));
}

void fuzz_check_record(const sv_record *read)
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
