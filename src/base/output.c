/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Files that appear whole or not at all: temporary beside the target, fsync, rename. */
#include "selvedge/base.h"

#include <errno.h>
#include <fcntl.h>
#include <libgen.h>
#include <stdlib.h>
#include <string.h>
#include <sys/stat.h>
#include <unistd.h>

static sv_status failed(sv_context *context, sv_output *output, const char *what, int error)
{
    sv_output_abort(output);
    return SV_FAIL(context, SV_STORAGE, "cannot %s %s: %s", what, output->path, strerror(error));
}

sv_status sv_output_begin(sv_context *context, const char *path, sv_output *ret_output)
{
    sv_output output = {0};
    if (strlen(path) + 16 > sizeof output.path)
        return SV_FAIL(context, SV_STORAGE, "the path %.100s… is too long", path);
    snprintf(output.path, sizeof output.path, "%s", path);
    struct stat info;
    /* A device or pipe is written to, and what /dev names (stdout may be a file): a rename would
     * replace it. Other links are replaced, never followed: folders from elsewhere have them. */
    bool device = strncmp(path, "/dev/", 5) == 0;
    if (stat(path, &info) == 0 && (device || !S_ISREG(info.st_mode))) {
        output.stream = S_ISDIR(info.st_mode) ? NULL : fopen(path, "we");
        if (output.stream == NULL)
            return failed(context, &output, "write", S_ISDIR(info.st_mode) ? EISDIR : errno);
        *ret_output = output;
        return SV_OK;
    }
    snprintf(output.temporary, sizeof output.temporary, "%s.partXXXXXX", path);
    int fd = mkostemp(output.temporary, O_CLOEXEC);
    if (fd < 0) {
        output.temporary[0] = '\0';
        return failed(context, &output, "write", errno);
    }
    mode_t mask = umask(0);
    umask(mask);
    if (fchmod(fd, 0666 & ~mask) != 0 || (output.stream = fdopen(fd, "w")) == NULL) {
        int error = errno;
        close(fd);
        return failed(context, &output, "write", error);
    }
    *ret_output = output;
    return SV_OK;
}

/* The rename is durable only once the folder is. */
static void sync_folder(const char *path)
{
    char copy[sizeof((sv_output *)0)->path];
    snprintf(copy, sizeof copy, "%s", path);
    int fd = open(dirname(copy), O_RDONLY | O_DIRECTORY | O_CLOEXEC);
    if (fd < 0)
        return;
    fsync(fd);
    close(fd);
}

sv_status sv_output_commit(sv_context *context, sv_output *output)
{
    errno = 0;
    if (fflush(output->stream) != 0 || ferror(output->stream) != 0)
        return failed(context, output, "write", errno ? errno : EIO);
    if (fsync(fileno(output->stream)) != 0 && errno != EINVAL && errno != EROFS)
        return failed(context, output, "write", errno);
    int closed = fclose(output->stream);
    output->stream = NULL;
    if (closed != 0)
        return failed(context, output, "write", errno);
    if (output->temporary[0] != '\0' && rename(output->temporary, output->path) != 0)
        return failed(context, output, "replace", errno);
    output->temporary[0] = '\0';
    sync_folder(output->path);
    return SV_OK;
}

void sv_output_abort(sv_output *output)
{
    if (output->stream != NULL)
        fclose(output->stream);
    output->stream = NULL;
    if (output->temporary[0] != '\0')
        unlink(output->temporary);
    output->temporary[0] = '\0';
}
