/* SPDX-License-Identifier: GPL-3.0-or-later */
/* selvedge spectrum: counts, gap, levels next to the Fermi energy, density of states. */
#include "program_internal.h"

#include <errno.h>
#include <string.h>
#include <sys/stat.h>
#include <unistd.h>

static sv_status write_csv(sv_context *context, const char *path, const sv_spectrum_result *result)
{
    char *text = NULL;
    sv_output file;
    sv_status status = sv_spectrum_csv(context, result, &text);
    if (status != SV_OK)
        return status;
    status = sv_output_begin(context, path, &file);
    if (status == SV_OK) {
        fputs(text, file.stream);
        status = sv_output_commit(context, &file);
    }
    sv_give(context, text);
    return status;
}

static sv_status draw_figure(sv_context *context, const options *o,
                             const sv_spectrum_result *result)
{
    sv_figure_files files;
    if (mkdir(o->output, 0777) != 0 && errno != EEXIST)
        return SV_FAIL(context, SV_STORAGE, "cannot make folder %s: %s", o->output,
                       strerror(errno));
    sv_status status = sv_figure_spectrum(context, o->output, "spectrum", result, &files);
    if (status != SV_OK || o->json)
        return status;
    if (files.drawn)
        printf("figure: %s\n        %s\n        %s\n", files.svg, files.pdf, files.png);
    else
        printf("figure: %s (not drawn: %s)\n", files.script, files.reason);
    return SV_OK;
}

static sv_status print_result(sv_context *context, const options *o,
                              const sv_spectrum_result *result)
{
    char *text = NULL;
    if (!o->json) {
        sv_spectrum_print(result, wants_colour(o, stdout), stdout);
        return SV_OK;
    }
    sv_status status = sv_spectrum_json(context, result, &text);
    if (status == SV_OK)
        fputs(text, stdout);
    sv_give(context, text);
    return status;
}

/* Everything that was asked for; then the verdict: an occupation that arithmetic could not decide
 * ends the command with 1. */
static sv_status present(session *s, const sv_spectrum *spectrum, const sv_sample *sample)
{
    sv_context *context = s->context;
    const options *o = s->options;
    sv_spectrum_result result = {.title = s->base.title,
                                 .realisation = o->realisation,
                                 .spectrum = spectrum,
                                 .sample = sample};
    sv_status status = SV_OK;
    if (o->csv != NULL)
        status = write_csv(context, o->csv, &result);
    if (status == SV_OK)
        status = print_result(context, o, &result);
    if (status == SV_OK && o->output != NULL)
        status = draw_figure(context, o, &result);
    if (status == SV_OK && spectrum->on_level)
        status = SV_FAIL(context, SV_UNDECIDED, "%s; choose %s", spectrum->reason,
                         s->points[0].setup.occupation.by == SV_BY_ENERGY
                             ? "a filling or another energy"
                             : "a Fermi energy above or below it");
    return status;
}

/* The sheet's own boundary: neither the open nor the closed copy that markers take. */
static sv_status analyse(session *s)
{
    sv_context *context = s->context;
    const sv_setup *setup = &s->points[0].setup;
    sv_spectrum_options wanted = sv_spectrum_options_default();
    sv_flake flake = {0};
    sv_sample sample = {0};
    sv_spectrum spectrum = {0};
    wanted.seed = setup->seed;
    wanted.realisation = s->options->realisation;
    sv_status status = may_write(context, s->options, s->options->csv);
    if (status == SV_OK)
        status = sv_flake_make(context, &setup->model, &setup->flake, &flake);
    if (status == SV_OK)
        status = sv_sample_draw(context, &flake, setup->disorder, setup->n_disorder, setup->seed,
                                s->options->realisation, &sample);
    if (status == SV_OK)
        status = sv_spectrum_make(context, &sample, &setup->occupation, &wanted, &spectrum);
    if (status == SV_OK)
        status = present(s, &spectrum, &sample);
    sv_spectrum_free(context, &spectrum);
    sv_sample_free(context, &sample);
    sv_flake_free(context, &flake);
    return status;
}

int run_spectrum(sv_context *context, const options *o)
{
    session s = {.levels_only = true};
    sv_status status = session_open(context, o, o->files[0], false, false, &s);
    if (status == SV_OK)
        status = analyse(&s);
    session_close(&s);
    return status == SV_OK ? 0 : fail_exit(context, status);
}
