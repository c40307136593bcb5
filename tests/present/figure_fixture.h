/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Files of figures: where they go and what must be in them. */
#ifndef SELVEDGE_FIGURE_FIXTURE_H
#define SELVEDGE_FIGURE_FIXTURE_H

#include <sys/stat.h>

#include "fixture.h"

static char folder[1024];

static inline const char *inside(const char *name)
{
    static char path[1200];
    snprintf(path, sizeof path, "%s/%s", folder, name);
    return path;
}

static inline void choose_folder(const char *name)
{
    snprintf(folder, sizeof folder, "%s", test_scratch(name));
}

static inline bool have_gnuplot(void)
{
    return system("gnuplot --version >/dev/null 2>&1") == 0;
}

/* A whole file with a NUL behind; give it back with free(). */
static inline char *slurp(const char *path, size_t *ret_size)
{
    FILE *stream = fopen(path, "rb");
    CHECK(stream != NULL);
    if (stream == NULL || fseek(stream, 0, SEEK_END) != 0)
        abort();
    const size_t size = (size_t)ftell(stream);
    char *text = calloc(size + 1, 1);
    rewind(stream);
    CHECK(text != NULL && fread(text, 1, size, stream) == size);
    fclose(stream);
    *ret_size = size;
    return text;
}

/* Drawn where gnuplot is; else not drawn, with the reason. Script and data are there anyway. */
static inline void check_files(const sv_figure_files *files, const char *kind)
{
    struct stat info;
    CHECK(stat(files->script, &info) == 0 && info.st_size > 0);
    CHECK(stat(files->data, &info) == 0 && info.st_size > 0);
    if (!have_gnuplot()) {
        CHECK(!files->drawn && files->reason[0] != '\0' && files->svg[0] == '\0');
        return;
    }
    test_check(files->drawn, __FILE__, __LINE__, "%s: %s", kind, files->reason);
    CHECK(stat(files->png, &info) == 0 && info.st_size > 5000);
    CHECK(stat(files->pdf, &info) == 0 && info.st_size > 2000);
    CHECK(stat(files->svg, &info) == 0 && info.st_size > 2000);
}

#endif
