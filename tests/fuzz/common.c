/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "fuzz.h"

#include <ftw.h>
#include <stdarg.h>
#include <stdio.h>
#include <unistd.h>

enum { HEAD = 64 /* bytes before each block, for its size */ };
static const size_t MOST_BYTES = (size_t)256 << 20;

static sv_context context;
static size_t bytes_out;
static long blocks_out;
static char folder[200];

static void *take(size_t bytes, void *user)
{
    (void)user;
    if (bytes > MOST_BYTES || bytes_out + bytes > MOST_BYTES)
        return NULL;
    /* Not rounded up, so that a checker sees a step beyond the end. */
    unsigned char *block = NULL;
    if (posix_memalign((void **)&block, 64, bytes + HEAD) != 0)
        return NULL;
    memcpy(block, &bytes, sizeof bytes);
    bytes_out += bytes;
    blocks_out++;
    return block + HEAD;
}

static void give(void *memory, void *user)
{
    (void)user;
    if (memory == NULL)
        return;
    unsigned char *block = (unsigned char *)memory - HEAD;
    size_t bytes;
    memcpy(&bytes, block, sizeof bytes);
    bytes_out -= bytes;
    blocks_out--;
    free(block);
}

sv_context *fuzz_begin(void)
{
    sv_context_init(&context);
    context.allocator = (sv_allocator){.take = take, .give = give};
    return &context;
}

void fuzz_end(void)
{
    fuzz_require(blocks_out == 0, "%ld blocks were not given back", blocks_out);
}

void fuzz_require(bool condition, const char *format, ...)
{
    if (condition)
        return;
    va_list args;
    va_start(args, format);
    fputs("fuzz: ", stderr);
    vfprintf(stderr, format, args);
    fputc('\n', stderr);
    va_end(args);
    abort();
}

void fuzz_require_answer(sv_status status)
{
    const bool allowed = status == SV_OK || status == SV_INVALID_INPUT || status == SV_NO_MEMORY ||
                         status == SV_REFUSED || status == SV_UNDEFINED;
    fuzz_require(allowed, "ended with \"%s\": %s", sv_status_text(status), context.error.message);
    fuzz_require(status == SV_OK || context.error.message[0] != '\0', "refused without a word");
}

static int remove_one(const char *path, const struct stat *info, int kind, struct FTW *place)
{
    (void)info, (void)kind, (void)place;
    return remove(path);
}

static void remove_folder(void)
{
    nftw(folder, remove_one, 8, FTW_DEPTH | FTW_PHYS);
}

const char *fuzz_folder(void)
{
    if (folder[0] != '\0')
        return folder;
    const char *place = getenv("TMPDIR");
    if (access("/dev/shm", W_OK) == 0)
        place = "/dev/shm";
    snprintf(folder, sizeof folder, "%s/selvedge-fuzz-XXXXXX", place != NULL ? place : "/tmp");
    fuzz_require(mkdtemp(folder) != NULL, "cannot make %s", folder);
    atexit(remove_folder);
    return folder;
}

void fuzz_write(const char *path, const void *data, size_t size)
{
    FILE *stream = fopen(path, "wb");
    fuzz_require(stream != NULL && fwrite(data, 1, size, stream) == size && fclose(stream) == 0,
                 "cannot write %s", path);
}
