/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Files a sheet names: found beside it, read once, hashed. Every setup of the sheet then works on
 * the same bytes, even when the file changes meanwhile. */
#include "sheet_internal.h"

#include <stdio.h>
#include <string.h>
#include <sys/stat.h>

/* Absolute, climbing out of the folder, or passing through a link. */
static bool leaves_folder(const char *folder, const char *written)
{
    char path[4096];
    struct stat info;
    if (written[0] == '/')
        return true;
    for (const char *at = written; *at != '\0'; at += strspn(at, "/")) {
        size_t length = strcspn(at, "/");
        if (length == 2 && strncmp(at, "..", 2) == 0)
            return true;
        at += length;
        int n = snprintf(path, sizeof path, "%s/%.*s", folder, (int)(at - written), written);
        if (n < 0 || (size_t)n >= sizeof path || (lstat(path, &info) == 0 && S_ISLNK(info.st_mode)))
            return true;
    }
    return false;
}

const sv_cached_file *sv_file_find(const sv_sheet *sheet, const char *path)
{
    const sv_cached_file *file = sheet->files;
    while (file != NULL && strcmp(file->path, path) != 0)
        file = file->next;
    return file;
}

/* Images are decoded once; every point of a sweep looks at the same pixels. */
static bool decode(sv_reader *reader, const sv_node *node, const char *key, sv_cached_file *file)
{
    sv_table_fault fault = {0};
    sv_status status =
        sv_image_read(reader->context, file->data, file->source.size, &file->grey, &fault);
    if (status == SV_INVALID_INPUT)
        return sv_report(reader, node, fault.hint[0] != '\0' ? fault.hint : NULL, "%s: %.300s: %s",
                         key, file->path, fault.message);
    return status == SV_OK || sv_report_status(reader, node, status);
}

/* Reads the file into the sheet; it is given back with the sheet. */
static bool load(sv_reader *reader, const sv_node *node, const char *key, const char *path)
{
    sv_sheet *sheet = reader->loading;
    sv_cached_file *file = NULL;
    const char *kept = NULL;
    sv_status status = SV_OK;
    if (sheet == NULL)
        status = SV_FAIL(reader->context, SV_INTERNAL, "%s was not read with the sheet", path);
    if (status == SV_OK)
        status = sv_arena_take(reader->context, &sheet->arena, sizeof *file, &file);
    if (status == SV_OK)
        status = sv_arena_text(reader->context, &sheet->arena, path, strlen(path), &kept);
    if (status != SV_OK)
        return sv_report_status(reader, node, status);
    status = sv_read_file(reader->context, path, SV_FILE_LIMIT, &file->data, &file->source.size);
    if (status == SV_INVALID_INPUT)
        return sv_report(reader, node, "file names are relative to the folder of the sheet",
                         "%s: %s", key, reader->context->error.message);
    if (status != SV_OK)
        return sv_report_status(reader, node, status);
    file->path = kept;
    file->source.name = kept;
    file->source.text = file->data;
    sv_digest(file->data, file->source.size, file->digest);
    file->next = sheet->files;
    sheet->files = file;
    return !sv_image_is(file->data, file->source.size) || decode(reader, node, key, file);
}

/* Adds the file to the list of the setup. */
static bool list_file(sv_reader *reader, const sv_cached_file *file, const char *written,
                      const char *key_path)
{
    sv_setup *setup = reader->setup;
    const char *texts[3] = {sv_reader_text(reader, "%s", file->path),
                            sv_reader_text(reader, "%s", written),
                            sv_reader_text(reader, "%s", key_path)};
    sv_sheet_file *files = sv_reader_take(reader, setup->n_files + 1, sizeof *files);
    if (reader->status != SV_OK)
        return false;
    for (int i = 0; i < setup->n_files; i++)
        files[i] = setup->files[i];
    sv_sheet_file *added = &files[setup->n_files];
    memcpy(&added->path, &texts[0], sizeof added->path);
    memcpy(&added->written, &texts[1], sizeof added->written);
    memcpy(&added->key_path, &texts[2], sizeof added->key_path);
    memcpy(added->digest, file->digest, sizeof added->digest);
    setup->files = files;
    setup->n_files++;
    return true;
}

bool sv_file_load(sv_reader *reader, const sv_node *node, const char *path, sv_value *ret_value)
{
    const sv_sheet *sheet = reader->sheet;
    bool absolute = node->text[0] == '/';
    if (sheet->confined && leaves_folder(sheet->folder, node->text))
        return sv_report(reader, node, "this folder came from elsewhere and is not trusted",
                         "%s: %.200s does not lie in the folder of the sheet", path, node->text);
    const char *full = sv_reader_text(reader, "%s%s%s", absolute ? "" : sheet->folder,
                                      absolute ? "" : "/", node->text);
    if (full == NULL)
        return false;
    if (sv_file_find(sheet, full) == NULL && !load(reader, node, path, full))
        return false;
    const sv_cached_file *file = sv_file_find(sheet, full);
    if (!list_file(reader, file, node->text, path))
        return false;
    ret_value->text = full;
    memcpy(ret_value->digest, file->digest, sizeof ret_value->digest);
    return true;
}
