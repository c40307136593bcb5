/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The house style of all figures: files beside the script, terminals, safe texts. */
#include <ctype.h>
#include <errno.h>
#include <stdio.h>
#include <string.h>
#include <sys/stat.h>

#include "present_internal.h"

static const double points_per_cm = 72 / 2.54;
/* The cairo terminals set type for 96 dots an inch and lines of half a point. */
static const double cairo_font = 0.75;
enum { PREVIEW_PIXELS = 1290 }; /* 150 per centimetre at 8.6 cm */

static double preview_scale(double width_cm)
{
    return PREVIEW_PIXELS / (width_cm * points_per_cm);
}

/* Names become file names and gnuplot arguments. */
static bool is_good_name(const char *name)
{
    if (!isalnum((unsigned char)name[0]) || strlen(name) >= SV_FIGURE_NAME_SIZE)
        return false;
    for (const char *c = name; *c != '\0'; c++)
        if (!isalnum((unsigned char)*c) && strchr("_.-", *c) == NULL)
            return false;
    return true;
}

static sv_status file_path(sv_figure *figure, const char *suffix, char path[512])
{
    const int length = snprintf(path, 512, "%s/%s%s", figure->folder, figure->name, suffix);
    if (length < 0 || length >= 512)
        return SV_FAIL(figure->context, SV_STORAGE, "the path %.200s/%.100s is too long",
                       figure->folder, figure->name);
    return SV_OK;
}

sv_status sv_figure_begin(sv_figure *figure, sv_figure_files *files)
{
    memset(files, 0, sizeof *files);
    figure->script = (sv_draft){.context = figure->context};
    if (!is_good_name(figure->name))
        return SV_FAIL(figure->context, SV_INVALID_INPUT,
                       "\"%.100s\" is no name for a figure: letters, digits, _ . - only",
                       figure->name);
    if (mkdir(figure->folder, 0777) != 0 && errno != EEXIST)
        return SV_FAIL(figure->context, SV_STORAGE, "cannot make the folder %s: %s", figure->folder,
                       strerror(errno));
    return SV_OK;
}

void sv_script_literal(const char *text, char *literal, size_t size)
{
    char clean[1024];
    size_t used = 0;
    sv_text_clean(text, clean, sizeof clean);
    literal[used++] = '\'';
    for (const char *c = clean; *c != '\0' && used + 4 < size; c++) {
        if (*c == '\'') { /* the typographic one needs no quoting; 5.4 misreads quotes at a start */
            memcpy(literal + used, "\u2019", 3);
            used += 3;
            continue;
        }
        literal[used++] = *c;
    }
    literal[used++] = '\'';
    literal[used] = '\0';
}

/* Terminals by number; all of them unless the figure wants one. */
static const char *const endings[] = {"svg", "pdf", "png"};

static bool wants(const sv_figure *figure, const char *ending)
{
    return figure->only == NULL || strcmp(figure->only, ending) == 0;
}

static void add_loop(sv_figure *figure)
{
    int first = 1, last = 3;
    for (int k = 0; k < 3 && figure->only != NULL; k++)
        if (strcmp(figure->only, endings[k]) == 0)
            first = last = k + 1;
    sv_draft_add(&figure->script, "do for [k = %d:%d] {\n", first, last);
}

/*
 * One drawing, three files: every terminal is laid out at the size of the paper column, the SVG
 * in points, the preview in pixels with all sizes scaled along.
 */
void sv_script_terminals(sv_figure *figure)
{
    const double w = figure->width_cm, h = figure->height_cm, scale = preview_scale(w);
    sv_draft_add(&figure->script, "set encoding utf8\nset decimalsign '.'\n"
                                  "set datafile missing 'NaN'\n\n");
    add_loop(figure);
    sv_draft_add(
        &figure->script,
        "if (k == 1) {\n"
        "    set terminal svg size %.6g,%.6g dynamic rounded noenhanced font 'Helvetica,8' "
        "background '#ffffff'\n    set output '%s.svg'\n}\n",
        w * points_per_cm, h * points_per_cm, figure->name);
    sv_draft_add(&figure->script,
                 "if (k == 2) {\n"
                 "    set terminal pdfcairo size %.6gcm,%.6gcm noenhanced font 'Helvetica,8' "
                 "fontscale %.5g linewidth 2 dashlength 1.5 rounded\n    set output '%s.pdf'\n}\n",
                 w, h, cairo_font, figure->name);
    sv_draft_add(&figure->script,
                 "if (k == 3) {\n"
                 "    set terminal pngcairo size %d,%.0f noenhanced font 'Helvetica,8' fontscale "
                 "%.5g linewidth %.5g pointscale %.5g dashlength 1.5 rounded background '#ffffff'\n"
                 "    set output '%s.png'\n}\n",
                 PREVIEW_PIXELS, PREVIEW_PIXELS * h / w, cairo_font * scale, scale, scale,
                 figure->name);
}

sv_status sv_figure_write(sv_figure *figure, const char *suffix, const void *bytes, size_t size,
                          char path[512])
{
    sv_status status = file_path(figure, suffix, path);
    if (status == SV_OK)
        status = sv_write_file(figure->context, path, bytes, size);
    return status;
}

static void remove_pictures(const sv_figure_files *files)
{
    const char *const paths[] = {files->svg, files->pdf, files->png};
    for (int k = 0; k < 3; k++)
        if (paths[k][0] != '\0')
            remove(paths[k]);
}

/* Old pictures go first: a link could point anywhere, and a stale file would look like success. */
static sv_status clear_pictures(sv_figure *figure, sv_figure_files *files)
{
    sv_status status = SV_OK;
    if (wants(figure, "svg"))
        status = file_path(figure, ".svg", files->svg);
    if (status == SV_OK && wants(figure, "pdf"))
        status = file_path(figure, ".pdf", files->pdf);
    if (status == SV_OK && wants(figure, "png"))
        status = file_path(figure, ".png", files->png);
    if (status == SV_OK)
        remove_pictures(files);
    return status;
}

/* Half a picture is none. */
static void forget_pictures(sv_figure_files *files)
{
    remove_pictures(files);
    files->svg[0] = files->pdf[0] = files->png[0] = '\0';
}

sv_status sv_figure_draw(sv_figure *figure, sv_figure_files *files)
{
    char *script = NULL, name[SV_FIGURE_NAME_SIZE + 8];
    const sv_index size = figure->script.size;
    sv_status status = sv_draft_finish(&figure->script, &script);
    if (status == SV_OK)
        status = sv_figure_write(figure, ".gp", script, (size_t)size, files->script);
    sv_give(figure->context, script);
    if (status == SV_OK)
        status = clear_pictures(figure, files);
    if (status != SV_OK)
        return status;
    snprintf(name, sizeof name, "%s.gp", figure->name);
    files->drawn =
        sv_gnuplot_run(figure->context, figure->folder, name, files->reason, sizeof files->reason);
    if (files->drawn)
        status = sv_picture_finish(figure, files);
    if (!files->drawn)
        forget_pictures(files);
    return status;
}
