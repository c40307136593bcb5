/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Files that are written whole or not at all. */
#include <errno.h>
#include <fcntl.h>
#include <stdio.h>
#include <string.h>
#include <sys/stat.h>
#include <unistd.h>

#include "store_internal.h"

enum { INPUT_LIMIT = 1 << 30 };

sv_status sv_join_path(sv_context *context, const char *folder, const char *name, char *path,
                       size_t size)
{
    const char *slash = folder[0] != '\0' && folder[strlen(folder) - 1] == '/' ? "" : "/";
    int length = snprintf(path, size, "%s%s%s", folder, slash, name);
    if (length < 0 || (size_t)length >= size)
        return SV_FAIL(context, SV_STORAGE, "the path %.200s…/%.100s is too long", folder, name);
    return SV_OK;
}

static sv_status write_all(sv_context *context, int file, const char *path, const char *text,
                           size_t size)
{
    while (size > 0) {
        ssize_t written = write(file, text, size);
        if (written < 0 && errno == EINTR)
            continue;
        if (written < 0)
            return SV_FAIL(context, SV_STORAGE, "cannot write %s: %s", path, strerror(errno));
        text += written;
        size -= (size_t)written;
    }
    return SV_OK;
}

/* Devices and pipes are written in place: a rename would replace the device. */
static sv_status write_in_place(sv_context *context, const char *path, const char *text,
                                size_t size)
{
    int file = open(path, O_WRONLY | O_CLOEXEC | O_NOCTTY);
    if (file < 0)
        return SV_FAIL(context, SV_STORAGE, "cannot write %s: %s", path, strerror(errno));
    sv_status status = write_all(context, file, path, text, size);
    if (close(file) != 0 && status == SV_OK)
        status = SV_FAIL(context, SV_STORAGE, "cannot write %s: %s", path, strerror(errno));
    return status;
}

sv_status sv_write_file(sv_context *context, const char *path, const char *text, size_t size)
{
    struct stat info;
    sv_output output;
    if (stat(path, &info) == 0 && S_ISDIR(info.st_mode))
        return SV_FAIL(context, SV_STORAGE, "cannot write %s: it is a folder", path);
    if (stat(path, &info) == 0 && !S_ISREG(info.st_mode))
        return write_in_place(context, path, text, size);
    sv_status status = sv_output_begin(context, path, &output);
    if (status != SV_OK)
        return status;
    errno = 0;
    if (fwrite(text, 1, size, output.stream) != size) {
        status = SV_FAIL(context, SV_STORAGE, "cannot write %s: %s", path,
                         strerror(errno != 0 ? errno : EIO));
        sv_output_abort(&output);
        return status;
    }
    return sv_output_commit(context, &output);
}

sv_status sv_make_folder(sv_context *context, const char *path)
{
    char part[SV_PATH_SIZE];
    size_t length = strlen(path);
    if (length == 0 || length >= sizeof part)
        return SV_FAIL(context, SV_STORAGE, "%s",
                       length == 0 ? "the name of the folder is empty"
                                   : "the path of the folder is too long");
    for (size_t i = 1; i <= length; i++) {
        if (i < length && path[i] != '/')
            continue;
        memcpy(part, path, i);
        part[i] = '\0';
        if (mkdir(part, 0777) != 0 && errno != EEXIST)
            return SV_FAIL(context, SV_STORAGE, "cannot make the folder %s: %s", part,
                           strerror(errno));
    }
    struct stat info;
    if (stat(path, &info) != 0 || !S_ISDIR(info.st_mode))
        return SV_FAIL(context, SV_STORAGE, "%s is not a folder", path);
    return SV_OK;
}

static sv_status copy_input(sv_context *context, const char *folder, const sv_run_input *input)
{
    char target[SV_PATH_SIZE], digest[65];
    char *data = NULL;
    size_t size = 0;
    if (input->name[0] == '\0' || input->name[0] == '.' || strchr(input->name, '/') != NULL)
        return SV_FAIL(context, SV_INTERNAL, "\"%.100s\" is no name for a copied file",
                       input->name);
    sv_status status = sv_join_path(context, folder, input->name, target, sizeof target);
    if (status == SV_OK)
        status = sv_read_file(context, input->path, INPUT_LIMIT, &data, &size);
    if (status != SV_OK)
        return status;
    sv_digest(data, size, digest);
    if (strcmp(digest, input->digest) != 0)
        status = SV_FAIL(context, SV_INVALID_INPUT,
                         "%s changed while it was read: its SHA-256 was %.16s… and is %.16s…",
                         input->path, input->digest, digest);
    else
        status = sv_write_file(context, target, data, size);
    sv_give(context, data);
    return status;
}

sv_status sv_copy_inputs(sv_context *context, const char *folder, const sv_run_input *inputs,
                         int n_inputs)
{
    if (n_inputs == 0)
        return SV_OK;
    char path[SV_PATH_SIZE];
    struct stat info;
    sv_status status = sv_join_path(context, folder, SV_INPUTS_NAME, path, sizeof path);
    if (status == SV_OK)
        status = sv_make_folder(context, path);
    if (status == SV_OK && (lstat(path, &info) != 0 || !S_ISDIR(info.st_mode)))
        status = SV_FAIL(context, SV_STORAGE, "%s is a link, not a folder", path);
    for (int i = 0; i < n_inputs && status == SV_OK; i++)
        status = copy_input(context, path, &inputs[i]);
    return status;
}
