/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Joining the sums over sites of a shard. A task keeps single realisations, since its numbers do
 * not follow each other; a whole run that is merged brings sums of blocks. */
#include "store_internal.h"

/* The rows of a shard, small blocks first. */
static const char rows_sql[] =
    "SELECT point, level, block FROM site_sum ORDER BY level, point, block";
/* One realisation: at most one row holds it. */
static const char holds_sql[] =
    "SELECT count(*) FROM site_sum WHERE point = ?1 AND ("
    "(level = 0 AND block = ?2) OR (level = 1 AND block = ?2 >> 6) OR "
    "(level = 2 AND block = ?2 >> 12) OR (level = 3 AND block = ?2 >> 18) OR "
    "(level = 4 AND block = ?2 >> 24) OR (level = 5 AND block = ?2 >> 30))";
/* How many of the realisations ?2 to ?3 - 1 the rows hold. */
static const char overlap_sql[] =
    "SELECT coalesce(sum(min((block + 1) << (6 * level), ?3) - max(block << (6 * level), ?2)), 0) "
    "FROM site_sum WHERE point = ?1 AND block << (6 * level) < ?3 AND "
    "(block + 1) << (6 * level) > ?2";

/* Realisations of a block that a run holds. */
static sv_status overlap(sv_context *context, sv_run *run, const sv_site_place *at,
                         int64_t *ret_count)
{
    sqlite3_stmt *row = NULL;
    const int64_t length = INT64_C(1) << (6 * at->level), start = at->block * length;
    sv_status status =
        sv_ledger_prepare(context, run, at->level == 0 ? holds_sql : overlap_sql, &row);
    if (status != SV_OK)
        return status;
    if (sqlite3_bind_int64(row, 1, at->point) != SQLITE_OK ||
        sqlite3_bind_int64(row, 2, start) != SQLITE_OK ||
        (at->level > 0 && sqlite3_bind_int64(row, 3, start + length) != SQLITE_OK) ||
        sqlite3_step(row) != SQLITE_ROW)
        status = sv_ledger_fail(context, run, "read");
    else
        *ret_count = sqlite3_column_int64(row, 0);
    sqlite3_finalize(row);
    return status;
}

/* A block of which the run has some realisations one by one takes their place. */
static sv_status merge_row(sv_context *context, sv_run *from, sv_run *run, const sv_site_place *at)
{
    unsigned char *bytes = NULL;
    size_t size = 0;
    int64_t held = 0;
    sv_status status = overlap(context, run, at, &held);
    if (status != SV_OK || held == INT64_C(1) << (6 * at->level))
        return status;
    if (held > 0 && at->level > 1)
        return SV_FAIL(context, SV_STORAGE,
                       "%s has %lld realisations of a block of sums over sites that %s joins into "
                       "one: merge that folder first",
                       run->folder, (long long)held, from->folder);
    status = sv_site_get_row(context, from, at, &bytes, &size);
    if (status == SV_OK && bytes == NULL)
        status = sv_ledger_fail(context, from, "read");
    if (status == SV_OK)
        status = sv_site_put_row(context, run, at, bytes, size);
    if (status == SV_OK && held > 0) {
        const sv_site_place below = {at->point, at->level - 1, at->block * SV_SITE_FAN};
        status = sv_site_drop_rows(context, run, &below);
    }
    sv_give(context, bytes);
    return status;
}

sv_status sv_site_merge(sv_context *context, sv_run *from, sv_run *run)
{
    sqlite3_stmt *rows = NULL;
    int code = SQLITE_DONE;
    sv_status status = sv_ledger_prepare(context, from, rows_sql, &rows);
    while (status == SV_OK && (code = sqlite3_step(rows)) == SQLITE_ROW) {
        const sqlite3_int64 point = sqlite3_column_int64(rows, 0);
        const int level = sqlite3_column_int(rows, 1);
        const sqlite3_int64 block = sqlite3_column_int64(rows, 2);
        if (point < 0 || point >= SV_MAX_POINTS || level < 0 || level >= SV_SITE_LEVELS ||
            block < 0 || block >= SV_MAX_REALISATIONS >> (6 * level))
            status = SV_FAIL(context, SV_STORAGE, "%s/%s holds sums over sites out of range",
                             from->folder, SV_LEDGER_NAME);
        const sv_site_place at = {(int32_t)point, level, block};
        if (status == SV_OK && sv_cancelled(context))
            status = SV_FAIL(context, SV_INTERRUPTED, "stopped while reading %s", from->folder);
        if (status == SV_OK)
            status = merge_row(context, from, run, &at);
    }
    if (status == SV_OK && code != SQLITE_DONE)
        status = sv_ledger_fail(context, from, "read");
    sqlite3_finalize(rows);
    return status;
}

sv_status sv_site_check_joined(sv_context *context, sv_run *run)
{
    sqlite3_stmt *row = NULL;
    int64_t any = 0;
    sv_status status =
        sv_ledger_prepare(context, run, "SELECT EXISTS (SELECT 1 FROM site_sum)", &row);
    if (status == SV_OK && sqlite3_step(row) != SQLITE_ROW)
        status = sv_ledger_fail(context, run, "read");
    if (status == SV_OK)
        any = sqlite3_column_int64(row, 0);
    sqlite3_finalize(row);
    return status == SV_OK && any != 0 ? sv_run_check_sites(context, run) : status;
}
