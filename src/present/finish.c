/* SPDX-License-Identifier: GPL-3.0-or-later */
/*
 * What gnuplot made is looked at before it counts: it ends with 0 even when a file could not be
 * written. The PDF loses its date, so that the same numbers give the same bytes; the SVG gets a
 * title and a description for readers who cannot see it.
 */
#include <stdio.h>
#include <string.h>
#include <sys/stat.h>

#include "present_internal.h"

enum { PICTURE_LIMIT = 1 << 28, TAIL_BYTES = 64 };

/* Reads a picture and looks for its last word; false with a reason when it is not whole. */
static bool read_picture(sv_figure *figure, sv_figure_files *files, const char *path,
                         const char *last_word, char **ret_data, size_t *ret_size)
{
    struct stat info;
    char *data = NULL;
    const char *name = strrchr(path, '/') + 1;
    size_t size = 0;
    const sv_error before = figure->context->error;
    const bool there = lstat(path, &info) == 0 && S_ISREG(info.st_mode) && info.st_size > 0 &&
                       sv_read_file(figure->context, path, PICTURE_LIMIT, &data, &size) == SV_OK;
    figure->context->error = before;
    const size_t tail = size < TAIL_BYTES ? size : TAIL_BYTES;
    const bool whole = there && memmem(data + size - tail, tail, last_word, strlen(last_word));
    if (!whole) {
        snprintf(files->reason, sizeof files->reason, "gnuplot left %s %.120s",
                 there ? "an incomplete" : "no", name);
        sv_give(figure->context, data);
        files->drawn = false;
        return false;
    }
    *ret_data = data;
    *ret_size = size;
    return true;
}

/* Same length, so that the table of positions in the PDF stays right. */
static void blank_date(char *data, size_t size)
{
    static const char key[] = "/CreationDate (D:";
    char *place = memmem(data, size, key, sizeof key - 1);
    if (place == NULL)
        return;
    for (char *c = place + sizeof key - 1; c < data + size && *c != ')'; c++)
        if (*c >= '0' && *c <= '9')
            *c = c - place < (long)sizeof key - 1 + 8 ? "20000101"[c - place - (long)sizeof key + 1]
                                                      : '0';
}

static void add_escaped(sv_draft *text, const char *word)
{
    char clean[1024];
    sv_text_clean(word, clean, sizeof clean);
    for (const char *c = clean; *c != '\0'; c++) {
        if (*c == '<')
            sv_draft_add(text, "&lt;");
        else if (*c == '>')
            sv_draft_add(text, "&gt;");
        else if (*c == '&')
            sv_draft_add(text, "&amp;");
        else
            sv_draft_add_bytes(text, c, 1);
    }
}

/* Replaces what stands between two marks; leaves the text alone when they are not there. */
static void replace_between(sv_draft *text, const char **rest, const char *open, const char *close,
                            const char *word)
{
    const char *start = strstr(*rest, open);
    const char *end = start == NULL ? NULL : strstr(start, close);
    if (end == NULL)
        return;
    start += strlen(open);
    sv_draft_add_bytes(text, *rest, (size_t)(start - *rest));
    add_escaped(text, word);
    *rest = end;
}

/* A family of faces instead of one that may be missing where the figure is looked at. */
static void add_with_families(sv_draft *text, const char *rest, size_t size)
{
    static const char face[] = "font-family=\"Helvetica\"";
    const char *end = rest + size;
    for (;;) {
        const char *place = memmem(rest, (size_t)(end - rest), face, sizeof face - 1);
        if (place == NULL)
            break;
        sv_draft_add_bytes(text, rest, (size_t)(place - rest));
        sv_draft_add(text, "font-family=\"Helvetica, Arial, sans-serif\"");
        rest = place + sizeof face - 1;
    }
    sv_draft_add_bytes(text, rest, (size_t)(end - rest));
}

static sv_status finish_svg(sv_figure *figure, sv_figure_files *files)
{
    char *data = NULL, *named = NULL;
    size_t size = 0;
    if (!read_picture(figure, files, files->svg, "</svg>", &data, &size))
        return SV_OK;
    sv_draft text = {.context = figure->context};
    const char *rest = data;
    replace_between(&text, &rest, "<title>", "</title>", figure->title);
    replace_between(&text, &rest, "<desc>", "</desc>", figure->description);
    add_with_families(&text, rest, size - (size_t)(rest - data));
    const size_t new_size = (size_t)text.size;
    sv_status status = sv_draft_finish(&text, &named);
    if (status == SV_OK)
        status = sv_write_file(figure->context, files->svg, named, new_size);
    sv_give(figure->context, named);
    sv_give(figure->context, data);
    return status;
}

/* The pictures that were asked for have a path. */
sv_status sv_picture_finish(sv_figure *figure, sv_figure_files *files)
{
    char *data = NULL;
    size_t size = 0;
    sv_status status = SV_OK;
    if (files->png[0] != '\0') {
        if (!read_picture(figure, files, files->png, "IEND", &data, &size))
            return SV_OK;
        sv_give(figure->context, data);
    }
    if (files->pdf[0] != '\0') {
        if (!read_picture(figure, files, files->pdf, "%%EOF", &data, &size))
            return SV_OK;
        blank_date(data, size);
        status = sv_write_file(figure->context, files->pdf, data, size);
        sv_give(figure->context, data);
    }
    return status == SV_OK && files->svg[0] != '\0' ? finish_svg(figure, files) : status;
}
