/* SPDX-License-Identifier: GPL-3.0-or-later */
/* selvedge draw: the sample of one realisation as a figure, and what it consists of. */
#include "program_internal.h"

#include <stdio.h>
#include <string.h>

/* Where the figure goes: folder, name, and the ending that says which picture. */
typedef struct target {
    char folder[512], name[256];
    const char *ending; /* NULL: all */
} target;

static sv_status split_path(sv_context *context, const char *path, target *ret)
{
    static const char *const endings[] = {"svg", "pdf", "png"};
    target t = {.folder = ".", .ending = NULL};
    const char *slash = strrchr(path, '/');
    const char *name = slash == NULL ? path : slash + 1;
    const char *dot = strrchr(name, '.');
    size_t length = slash == NULL ? 1 : slash == path ? 1 : (size_t)(slash - path);
    if (length >= sizeof t.folder || strlen(name) >= sizeof t.name || name[0] == '\0')
        return SV_FAIL(context, SV_USAGE, "-o %.200s names no figure", path);
    if (slash != NULL)
        snprintf(t.folder, sizeof t.folder, "%.*s", (int)length, path);
    for (int k = 0; k < 3 && dot != NULL; k++)
        if (strcmp(dot + 1, endings[k]) == 0)
            t.ending = endings[k];
    if (dot != NULL && t.ending == NULL)
        return SV_FAIL(context, SV_USAGE,
                       "-o %.200s: a figure ends in .svg, .pdf or .png (without an ending all "
                       "three are made)",
                       path);
    snprintf(t.name, sizeof t.name, "%.*s",
             (int)(dot == NULL ? strlen(name) : (size_t)(dot - name)), name);
    *ret = t;
    return SV_OK;
}

static void print_files(const sv_figure_files *files)
{
    const char *const paths[] = {files->svg, files->pdf, files->png};
    const char *before = "figure: ";
    if (!files->drawn)
        printf("figure: %s (not drawn: %s)\n", files->script, files->reason);
    for (int k = 0; k < 3 && files->drawn; k++) {
        if (paths[k][0] == '\0')
            continue;
        printf("%s%s\n", before, paths[k]);
        before = "        ";
    }
}

static sv_status print_result(sv_context *context, const options *o, const sv_sample_result *result,
                              const sv_figure_files *files)
{
    char *text = NULL;
    sv_status status = o->json ? sv_sample_json(context, result, &text)
                               : sv_inventory_text(context, result->sample, &text);
    if (status != SV_OK)
        return status;
    if (o->json) {
        fputs(text, stdout);
    } else {
        printf("realisation %lld: %lld sites, %lld vacancies\n%s\n", (long long)result->realisation,
               (long long)result->sample->n, (long long)result->sample->inventory.vacancies, text);
        print_files(files);
    }
    sv_give(context, text);
    return SV_OK;
}

/* The sample as the sheet has it and, where pieces are dropped, with them. */
static sv_status draw_samples(session *s, sv_flake *flake, sv_sample *sample, sv_sample *whole)
{
    const sv_setup *setup = &s->points[0].setup;
    const int64_t k = s->options->realisation;
    sv_status status = sv_flake_make(s->context, &setup->model, &setup->flake, flake);
    if (status == SV_OK)
        status = sv_sample_draw(s->context, flake, setup->disorder, setup->n_disorder, setup->seed,
                                k, sample);
    if (status != SV_OK || sample->inventory.removed_sites == 0)
        return status;
    flake->spec.keep_largest = false;
    status = sv_sample_draw(s->context, flake, setup->disorder, setup->n_disorder, setup->seed, k,
                            whole);
    flake->spec.keep_largest = true;
    return status;
}

static sv_status draw_figure(session *s, const target *where)
{
    sv_context *context = s->context;
    sv_flake flake = {0};
    sv_sample sample = {0}, whole = {0};
    sv_figure_files files = {.drawn = false};
    sv_status status = draw_samples(s, &flake, &sample, &whole);
    const sv_sample_result result = {.title = s->base.title,
                                     .sample = &sample,
                                     .whole = whole.n > 0 ? &whole : NULL,
                                     .realisation = s->options->realisation,
                                     .lattice_constant = s->points[0].setup.lattice_constant,
                                     .energy_unit = s->points[0].setup.energy_unit};
    if (status == SV_OK)
        status =
            sv_figure_sample(context, where->folder, where->name, where->ending, &result, &files);
    if (status == SV_OK)
        status = print_result(context, s->options, &result, &files);
    if (status == SV_OK && !files.drawn)
        status = SV_FAIL(context, SV_STORAGE, "the figure was not drawn: %s", files.reason);
    sv_sample_free(context, &whole);
    sv_sample_free(context, &sample);
    sv_flake_free(context, &flake);
    return status;
}

/* FIGURE.dat stands beside FIGURE.svg, and film.dat may be somebody's measurement: only the data of
 * a drawing are replaced. */
static sv_status spare_data(const session *s, const target *where)
{
    static const char ours[] = "# The parts of the drawing";
    char path[800], head[sizeof ours] = "";
    snprintf(path, sizeof path, "%s/%s.dat", where->folder, where->name);
    FILE *file = s->options->force ? NULL : fopen(path, "r");
    if (file == NULL)
        return SV_OK;
    size_t length = fread(head, 1, sizeof ours - 1, file);
    fclose(file);
    if (length == sizeof ours - 1 && memcmp(head, ours, length) == 0)
        return SV_OK;
    return SV_FAIL(s->context, SV_STORAGE, "%s exists and is not of a drawing; choose another name",
                   path);
}

int run_draw(sv_context *context, const options *o)
{
    session s = {.levels_only = true};
    target where;
    sv_status status = SV_OK;
    if (o->output == NULL)
        status = SV_FAIL(context, SV_USAGE, "draw needs -o FIGURE, ending in .svg, .pdf or .png");
    else
        status = split_path(context, o->output, &where);
    if (status == SV_OK)
        status = session_open(context, o, o->files[0], false, false, &s);
    if (status == SV_OK)
        status = spare_data(&s, &where);
    if (status == SV_OK)
        status = draw_figure(&s, &where);
    session_close(&s);
    if (status == SV_UNDEFINED) /* computed: nothing is left to draw */
        status = SV_UNDECIDED;
    return status == SV_OK ? 0 : fail_exit(context, status);
}
