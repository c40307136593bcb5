/* SPDX-License-Identifier: GPL-3.0-or-later */
/*
 * The maps of an ensemble in the ledger. A row of `site_sum` at level 0 is one realisation; one at
 * level L the exact sum over 64^L of them that follow each other. Once the 64 rows below it are
 * there, and count for good, a row takes their place in one transaction: a point never has more
 * than 63 rows of a level beside those of unfinished blocks, however long the run.
 */
#include <string.h>

#include "store_internal.h"

static const char put_sql[] =
    "INSERT INTO site_sum (point, level, block, data, checksum) VALUES (?1, ?2, ?3, ?4, ?5)";
static const char get_sql[] =
    "SELECT data, checksum FROM site_sum WHERE point = ?1 AND level = ?2 AND block = ?3";
static const char first_sql[] = "SELECT min(block) FROM site_sum WHERE point = ?1 AND level = ?2";
static const char drop_sql[] =
    "DELETE FROM site_sum WHERE point = ?1 AND level = ?2 AND block BETWEEN ?3 AND ?4";

enum { HEAD_BYTES = SV_SITE_HEAD_BYTES };

static sv_status bind(sv_context *context, sv_run *run, sqlite3_stmt *row, const sv_site_place *at)
{
    if (sqlite3_bind_int64(row, 1, at->point) != SQLITE_OK ||
        sqlite3_bind_int64(row, 2, at->level) != SQLITE_OK ||
        sqlite3_bind_int64(row, 3, at->block) != SQLITE_OK)
        return sv_ledger_fail(context, run, "use");
    return SV_OK;
}

/* Place and data under one checksum. @param bytes HEAD_BYTES of room, then the data */
static void seal(const sv_site_place *at, unsigned char *bytes, size_t size, char digest[65])
{
    const int64_t head[3] = {at->point, at->level, at->block};
    for (int i = 0; i < HEAD_BYTES; i++)
        bytes[i] = (unsigned char)((uint64_t)head[i / 8] >> (8 * (i % 8)));
    sv_digest(bytes, HEAD_BYTES + size, digest);
}

sv_status sv_site_put_row(sv_context *context, sv_run *run, const sv_site_place *at,
                          unsigned char *bytes, size_t size)
{
    char digest[65];
    sqlite3_stmt *row = NULL;
    seal(at, bytes, size, digest);
    sv_status status = sv_ledger_prepare(context, run, put_sql, &row);
    if (status == SV_OK)
        status = bind(context, run, row, at);
    if (status == SV_OK &&
        (sqlite3_bind_blob64(row, 4, bytes + HEAD_BYTES, size, SQLITE_STATIC) != SQLITE_OK ||
         sqlite3_bind_text(row, 5, digest, -1, SQLITE_STATIC) != SQLITE_OK ||
         sqlite3_step(row) != SQLITE_DONE))
        status = sv_ledger_fail(context, run, "write");
    sqlite3_finalize(row);
    return status;
}

static sv_status damaged(sv_context *context, const sv_run *run, const sv_site_place *at,
                         const char *what)
{
    return SV_FAIL(context, SV_STORAGE,
                   "%s/%s: the sums over sites of point %ld, level %d, block %lld are damaged: %s",
                   run->folder, SV_LEDGER_NAME, (long)at->point, at->level, (long long)at->block,
                   what);
}

sv_status sv_site_get_row(sv_context *context, sv_run *run, const sv_site_place *at,
                          unsigned char **ret_bytes, size_t *ret_size)
{
    sqlite3_stmt *row = NULL;
    unsigned char *bytes = NULL;
    char digest[65];
    size_t size = 0;
    sv_status status = sv_ledger_prepare(context, run, get_sql, &row);
    if (status == SV_OK)
        status = bind(context, run, row, at);
    const int code = status == SV_OK ? sqlite3_step(row) : SQLITE_DONE;
    if (status == SV_OK && code != SQLITE_DONE && code != SQLITE_ROW)
        status = sv_ledger_fail(context, run, "read");
    if (status == SV_OK && code == SQLITE_ROW) {
        const void *data = sqlite3_column_blob(row, 0);
        const char *checksum = (const char *)sqlite3_column_text(row, 1);
        size = (size_t)sqlite3_column_bytes(row, 0);
        status = sv_take_raw(context, (sv_index)(HEAD_BYTES + size), 1, &bytes);
        if (status == SV_OK && size > 0)
            memcpy(bytes + HEAD_BYTES, data, size);
        if (status == SV_OK) {
            seal(at, bytes, size, digest);
            if (checksum == NULL || strcmp(checksum, digest) != 0)
                status = damaged(context, run, at, "the checksum does not fit");
        }
    }
    sqlite3_finalize(row);
    if (status != SV_OK) {
        sv_give(context, bytes);
        return status;
    }
    *ret_bytes = bytes;
    *ret_size = size;
    return SV_OK;
}

/* Adds a row to a sum. *ret_found false: there is none, nothing is added. */
static sv_status add_row(sv_context *context, sv_run *run, const sv_site_place *at,
                         sv_site_sum *sum, bool *ret_found)
{
    unsigned char *bytes = NULL;
    size_t size = 0;
    sv_status status = sv_site_get_row(context, run, at, &bytes, &size);
    *ret_found = bytes != NULL;
    if (status == SV_OK && bytes != NULL) {
        const int64_t most = INT64_C(1) << (6 * at->level);
        const bool good = at->level == 0 ? sv_site_unpack_values(bytes + HEAD_BYTES, size, sum)
                                         : sv_site_unpack_sums(bytes + HEAD_BYTES, size, most, sum);
        if (!good)
            status = damaged(context, run, at, "its size or a count does not fit this flake");
        else
            sum->realisations += most;
    }
    sv_give(context, bytes);
    return status;
}

sv_status sv_site_put(sv_context *context, sv_run *run, int32_t point, int64_t realisation,
                      const sv_site_record *record)
{
    const sv_site_place at = {.point = point, .block = realisation};
    const size_t size = (size_t)record->n * 8;
    unsigned char *bytes = NULL;
    if (record->n > SV_MOST_ENTRIES)
        return SV_FAIL(context, SV_INVALID_INPUT, "maps keep up to %d entries, not %lld",
                       SV_MOST_ENTRIES, (long long)record->n);
    sv_status status = sv_take_raw(context, (sv_index)(HEAD_BYTES + size), 1, &bytes);
    if (status == SV_OK) {
        sv_site_pack_values(record, bytes + HEAD_BYTES);
        status = sv_site_put_row(context, run, &at, bytes, size);
    }
    sv_give(context, bytes);
    return status == SV_OK ? sv_site_fold(context, run, point, record->counted) : status;
}

/* The first block of a level, or −1. */
static sv_status first_block(sv_context *context, sv_run *run, int32_t point, int level,
                             int64_t *ret_block)
{
    sqlite3_stmt *row = NULL;
    sv_status status = sv_ledger_prepare(context, run, first_sql, &row);
    if (status != SV_OK)
        return status;
    if (sqlite3_bind_int64(row, 1, point) != SQLITE_OK ||
        sqlite3_bind_int64(row, 2, level) != SQLITE_OK || sqlite3_step(row) != SQLITE_ROW)
        status = sv_ledger_fail(context, run, "read");
    else
        *ret_block = sqlite3_column_type(row, 0) == SQLITE_NULL ? -1 : sqlite3_column_int64(row, 0);
    sqlite3_finalize(row);
    return status;
}

sv_status sv_site_drop_rows(sv_context *context, sv_run *run, const sv_site_place *first)
{
    sqlite3_stmt *row = NULL;
    sv_status status = sv_ledger_prepare(context, run, drop_sql, &row);
    if (status == SV_OK)
        status = bind(context, run, row, first);
    if (status == SV_OK &&
        (sqlite3_bind_int64(row, 4, first->block + SV_SITE_FAN - 1) != SQLITE_OK ||
         sqlite3_step(row) != SQLITE_DONE))
        status = sv_ledger_fail(context, run, "write");
    sqlite3_finalize(row);
    return status;
}

/* Entries of a row; 0 also for one without values. */
static sv_status entries_of(sv_context *context, sv_run *run, const sv_site_place *at,
                            sv_index *ret_n)
{
    unsigned char *bytes = NULL;
    size_t size = 0;
    sv_status status = sv_site_get_row(context, run, at, &bytes, &size);
    if (status == SV_OK)
        *ret_n = (sv_index)(size / (at->level == 0 ? 8 : SV_SITE_SUM_BYTES));
    sv_give(context, bytes);
    return status;
}

/* 64 rows from `first` on, if all are there, become one of the next level. */
static sv_status fold_block(sv_context *context, sv_run *run, const sv_site_place *first,
                            bool *ret_folded)
{
    sv_site_sum sum = {0};
    sv_index n = 0;
    bool found = true;
    unsigned char *bytes = NULL;
    sv_status status = SV_OK;
    *ret_folded = false;
    for (int k = 0; k < SV_SITE_FAN && n == 0 && status == SV_OK; k++) {
        const sv_site_place at = {first->point, first->level, first->block + k};
        status = entries_of(context, run, &at, &n);
    }
    if (status == SV_OK)
        status = sv_site_sum_init(context, n, &sum);
    for (int k = 0; k < SV_SITE_FAN && found && status == SV_OK; k++) {
        const sv_site_place at = {first->point, first->level, first->block + k};
        status = add_row(context, run, &at, &sum, &found);
    }
    const size_t size = (size_t)n * SV_SITE_SUM_BYTES;
    if (status == SV_OK && found)
        status = sv_take_raw(context, (sv_index)(HEAD_BYTES + size), 1, &bytes);
    if (status == SV_OK && found) {
        const sv_site_place above = {first->point, first->level + 1, first->block / SV_SITE_FAN};
        sv_site_pack_sums(&sum, bytes + HEAD_BYTES);
        status = sv_site_put_row(context, run, &above, bytes, size);
        if (status == SV_OK)
            status = sv_site_drop_rows(context, run, first);
        *ret_folded = status == SV_OK;
    }
    sv_give(context, bytes);
    sv_site_sum_free(context, &sum);
    return status;
}

/* Inside a transaction. */
sv_status sv_site_fold(sv_context *context, sv_run *run, int32_t point, int64_t counted)
{
    sv_status status = SV_OK;
    for (int level = 0; level + 1 < SV_SITE_LEVELS && status == SV_OK; level++) {
        bool folded = true;
        while (folded && status == SV_OK) {
            int64_t block = -1;
            folded = false;
            status = first_block(context, run, point, level, &block);
            if (status != SV_OK || block < 0 || block % SV_SITE_FAN != 0 ||
                block >= SV_MAX_REALISATIONS ||
                (block / SV_SITE_FAN + 1) > counted >> (6 * (level + 1)))
                continue;
            const sv_site_place first = {point, level, block};
            status = fold_block(context, run, &first, &folded);
        }
    }
    return status;
}

sv_status sv_run_fold_sites(sv_context *context, sv_run *run, int32_t point, int64_t counted)
{
    sv_status status = sv_ledger_execute(context, run, "BEGIN IMMEDIATE");
    if (status != SV_OK)
        return status;
    status = sv_site_fold(context, run, point, counted);
    if (status == SV_OK)
        status = sv_ledger_execute(context, run, "COMMIT");
    if (status != SV_OK && sqlite3_get_autocommit(run->ledger) == 0)
        sqlite3_exec(run->ledger, "ROLLBACK", NULL, NULL, NULL);
    return status;
}

/* The largest block that begins at a realisation and ends within the counted ones. */
static sv_status add_largest(sv_context *context, sv_run *run, int32_t point, int64_t counted,
                             sv_site_sum *sum, bool *ret_found)
{
    sv_status status = SV_OK;
    const int64_t start = sum->realisations;
    *ret_found = false;
    for (int level = SV_SITE_LEVELS - 1; level >= 0 && !*ret_found && status == SV_OK; level--) {
        const int64_t length = INT64_C(1) << (6 * level);
        if (start % length != 0 || start + length > counted)
            continue;
        const sv_site_place at = {point, level, start / length};
        status = add_row(context, run, &at, sum, ret_found);
    }
    return status;
}

sv_status sv_run_load_sites(sv_context *context, sv_run *run, int32_t point, int64_t counted,
                            sv_index entries, sv_site_sum *ret_sum)
{
    sv_site_sum sum = {0};
    bool found = true;
    sv_status status = sv_site_sum_init(context, entries, &sum);
    if (status != SV_OK)
        return status;
    status = sv_ledger_execute(context, run, "BEGIN");
    while (status == SV_OK && found && sum.realisations < counted)
        status = add_largest(context, run, point, counted, &sum, &found);
    sqlite3_exec(run->ledger, "COMMIT", NULL, NULL, NULL);
    if (status != SV_OK) {
        sv_site_sum_free(context, &sum);
        return status;
    }
    *ret_sum = sum;
    return SV_OK;
}

/* Realisations of all points that the sums cover, and that there are. */
sv_status sv_run_check_sites(sv_context *context, sv_run *run)
{
    sqlite3_stmt *row = NULL;
    sv_status status = sv_ledger_prepare(
        context, run,
        "SELECT point, sum(n), sum(kept) FROM ("
        "SELECT point, count(*) AS n, 0 AS kept FROM realisation GROUP BY point UNION ALL "
        "SELECT point, 0, sum(1 << (6 * level)) FROM site_sum GROUP BY point) "
        "GROUP BY point HAVING sum(n) <> sum(kept) LIMIT 1",
        &row);
    const int code = status == SV_OK ? sqlite3_step(row) : SQLITE_DONE;
    if (code == SQLITE_ROW)
        status = SV_FAIL(context, SV_STORAGE,
                         "%s/%s: point %lld has %lld realisations, its sums over sites hold %lld",
                         run->folder, SV_LEDGER_NAME, (long long)sqlite3_column_int64(row, 0),
                         (long long)sqlite3_column_int64(row, 1),
                         (long long)sqlite3_column_int64(row, 2));
    else if (status == SV_OK && code != SQLITE_DONE)
        status = sv_ledger_fail(context, run, "read");
    sqlite3_finalize(row);
    return status;
}
