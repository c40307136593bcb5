/* SPDX-License-Identifier: GPL-3.0-or-later */
/* What a run is: table meta. */
#include <stdio.h>
#include <string.h>

#include "store_internal.h"

const char *sv_run_meta(const sv_run *run, const char *key)
{
    for (int i = 0; i < run->n_meta; i++)
        if (strcmp(run->meta[i].key, key) == 0)
            return run->meta[i].value;
    return NULL;
}

static void pair_checksum(const char *key, const char *value, char digest[17])
{
    const char *const texts[2] = {key, value};
    sv_texts_checksum(texts, 2, NULL, 0, digest);
}

void sv_meta_free(sv_context *context, sv_run *run)
{
    for (int i = 0; i < run->n_meta; i++) {
        sv_give(context, run->meta[i].key);
        sv_give(context, run->meta[i].value);
    }
    run->n_meta = 0;
}

/* Remembers one pair in memory, replacing an older value. */
static sv_status keep(sv_context *context, sv_run *run, const char *key, const char *value)
{
    char *new_key = NULL, *new_value = NULL;
    int i = 0;
    while (i < run->n_meta && strcmp(run->meta[i].key, key) != 0)
        i++;
    if (i == SV_MAX_META)
        return SV_FAIL(context, SV_STORAGE, "%s/%s describes itself with too many keys",
                       run->folder, SV_LEDGER_NAME);
    sv_status status = sv_take_text(context, key, &new_key);
    if (status == SV_OK)
        status = sv_take_text(context, value, &new_value);
    if (status != SV_OK) {
        sv_give(context, new_key);
        return status;
    }
    if (i < run->n_meta) {
        sv_give(context, run->meta[i].key);
        sv_give(context, run->meta[i].value);
    } else {
        run->n_meta++;
    }
    run->meta[i] = (sv_meta){new_key, new_value};
    return SV_OK;
}

/* As written, and fit to be shown. */
static bool is_sound(sqlite3_stmt *row, const char *key, const char *value, const char *digest)
{
    char expected[17];
    const int sizes[2] = {sqlite3_column_bytes(row, 0), sqlite3_column_bytes(row, 1)};
    pair_checksum(key, value, expected);
    return (size_t)sizes[0] == strlen(key) && (size_t)sizes[1] == strlen(value) &&
           strcmp(digest, expected) == 0 && sv_text_is_plain(key, (size_t)sizes[0], false) &&
           sv_text_is_plain(value, (size_t)sizes[1], true);
}

sv_status sv_meta_load(sv_context *context, sv_run *run)
{
    sqlite3_stmt *statement = NULL;
    int code = SQLITE_DONE;
    sv_status status = sv_ledger_prepare(
        context, run, "SELECT key, value, checksum FROM meta ORDER BY key", &statement);
    while (status == SV_OK && (code = sqlite3_step(statement)) == SQLITE_ROW) {
        const char *key = (const char *)sqlite3_column_text(statement, 0);
        const char *value = (const char *)sqlite3_column_text(statement, 1);
        const char *digest = (const char *)sqlite3_column_text(statement, 2);
        if (key == NULL || value == NULL || digest == NULL)
            status = sv_ledger_fail(context, run, "read");
        else if (!is_sound(statement, key, value, digest))
            status = SV_FAIL(context, SV_STORAGE,
                             "%s/%s is damaged: what it says about itself has another checksum",
                             run->folder, SV_LEDGER_NAME);
        else
            status = keep(context, run, key, value);
    }
    if (status == SV_OK && code != SQLITE_DONE)
        status = sv_ledger_fail(context, run, "read");
    sqlite3_finalize(statement);
    return status;
}

sv_status sv_meta_set(sv_context *context, sv_run *run, const char *key, const char *value)
{
    sqlite3_stmt *statement = NULL;
    char digest[17];
    pair_checksum(key, value, digest);
    sv_status status = sv_ledger_prepare(
        context, run,
        "INSERT INTO meta (key, value, checksum) VALUES (?1, ?2, ?3) ON CONFLICT "
        "(key) DO UPDATE SET value = excluded.value, checksum = excluded.checksum",
        &statement);
    if (status != SV_OK)
        return status;
    if (sqlite3_bind_text(statement, 1, key, -1, SQLITE_STATIC) != SQLITE_OK ||
        sqlite3_bind_text(statement, 2, value, -1, SQLITE_STATIC) != SQLITE_OK ||
        sqlite3_bind_text(statement, 3, digest, -1, SQLITE_STATIC) != SQLITE_OK ||
        sqlite3_step(statement) != SQLITE_DONE)
        status = sv_ledger_fail(context, run, "write");
    sqlite3_finalize(statement);
    if (status == SV_OK)
        status = keep(context, run, key, value);
    return status;
}

/* Names of the markers (separated by spaces) and number of points: the shape rows must have. */
sv_status sv_meta_set_shape(sv_context *context, sv_run *run, const sv_run_identity *identity)
{
    char names[SV_MAX_MARKERS * SV_MARKER_NAME_SIZE] = "", points[32];
    if (identity->markers == NULL)
        return SV_OK;
    if (identity->n_markers > SV_MAX_MARKERS)
        return SV_FAIL(context, SV_INTERNAL, "%d markers are more than %d", identity->n_markers,
                       SV_MAX_MARKERS);
    for (int i = 0; i < identity->n_markers; i++) {
        size_t used = strlen(names);
        snprintf(names + used, sizeof names - used, "%s%.*s", i > 0 ? " " : "",
                 SV_MARKER_NAME_SIZE - 2, identity->markers[i]);
    }
    snprintf(points, sizeof points, "%ld", (long)identity->n_points);
    sv_status status = sv_meta_set(context, run, "markers", names);
    if (status == SV_OK)
        status = sv_meta_set(context, run, "points", points);
    return status == SV_OK ? sv_meta_read_shape(context, run) : status;
}

sv_status sv_meta_read_shape(sv_context *context, sv_run *run)
{
    const char *names = sv_run_meta(run, "markers"), *points = sv_run_meta(run, "points");
    int64_t number = 0;
    run->n_markers = -1;
    run->n_points = 0;
    if (names == NULL || points == NULL)
        return SV_OK;
    int count = 0;
    for (const char *word = names; *word != '\0'; count++) {
        size_t length = strcspn(word, " ");
        if (count == SV_MAX_MARKERS || length == 0 || length >= SV_MARKER_NAME_SIZE)
            return SV_FAIL(context, SV_STORAGE, "%s/%s: the list of markers is damaged",
                           run->folder, SV_LEDGER_NAME);
        memcpy(run->markers[count], word, length);
        run->markers[count][length] = '\0';
        word += length + (word[length] == ' ');
    }
    if (sv_parse_integer(points, &number) != SV_PARSE_OK || number < 0 || number > SV_MAX_POINTS)
        return SV_FAIL(context, SV_STORAGE, "%s/%s: the number of points is damaged", run->folder,
                       SV_LEDGER_NAME);
    run->n_markers = count;
    run->n_points = (int32_t)number;
    return SV_OK;
}
