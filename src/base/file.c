/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "selvedge/base.h"

#include <errno.h>
#include <fcntl.h>
#include <string.h>
#include <sys/stat.h>
#include <unistd.h>

#include <sys/types.h>

#include <sha2.h>

void sv_digest(const void *data, size_t size, char digest[65])
{
    SHA2_CTX state;
    SHA256Init(&state);
    SHA256Update(&state, data, size);
    SHA256End(&state, digest);
}

static sv_status read_all(sv_context *context, int fd, const char *path, char *data, size_t size)
{
    size_t used = 0;
    while (used < size) {
        ssize_t n = read(fd, data + used, size - used);
        if (n < 0 && errno == EINTR)
            continue;
        if (n < 0)
            return SV_FAIL(context, SV_INVALID_INPUT, "cannot read %s: %s", path, strerror(errno));
        if (n == 0)
            return SV_FAIL(context, SV_INVALID_INPUT, "%s became shorter while it was read", path);
        used += (size_t)n;
    }
    return SV_OK;
}

sv_status sv_read_file(sv_context *context, const char *path, size_t limit, char **ret_data,
                       size_t *ret_size)
{
    sv_status status = SV_OK;
    char *data = NULL;
    struct stat info;
    /* O_NONBLOCK: opening a named pipe must not hang before it is refused. */
    int fd = open(path, O_RDONLY | O_CLOEXEC | O_NONBLOCK);
    if (fd < 0 || fstat(fd, &info) != 0) {
        status = SV_FAIL(context, SV_INVALID_INPUT, "cannot open %s: %s", path, strerror(errno));
        goto out;
    }
    if (!S_ISREG(info.st_mode)) {
        status = SV_FAIL(context, SV_INVALID_INPUT, "%s is not a regular file", path);
        goto out;
    }
    if ((size_t)info.st_size > limit) {
        status = SV_FAIL(context, SV_INVALID_INPUT, "%s has %lld bytes; at most %zu are read", path,
                         (long long)info.st_size, limit);
        goto out;
    }
    status = sv_take_raw(context, (sv_index)info.st_size + 1, 1, &data);
    if (status != SV_OK)
        goto out;
    status = read_all(context, fd, path, data, (size_t)info.st_size);
    if (status != SV_OK)
        goto out;
    data[info.st_size] = '\0';
    *ret_data = data;
    *ret_size = (size_t)info.st_size;
    data = NULL;
out:
    if (fd >= 0)
        close(fd);
    sv_give(context, data);
    return status;
}
