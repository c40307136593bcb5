/* SPDX-License-Identifier: GPL-3.0-or-later */
/* selvedge map: one realisation, the local Chern marker site by site. */
#include "program_internal.h"

#include <errno.h>
#include <string.h>
#include <sys/stat.h>
#include <unistd.h>

/* Above this many sites a map takes the window only. */
static const int64_t SITE_MAP_LARGEST = 200000;

static void tell_figure(const session *s, const sv_figure_files *files, const char *what)
{
    (void)what;
    if (s->options->json)
        return;
    if (files->drawn)
        printf("figure: %s\n        %s\n        %s\n", files->svg, files->pdf, files->png);
    else
        printf("figure: %s (not drawn: %s)\n", files->script, files->reason);
}

static sv_status draw_figures(session *s, const sv_map_result *map)
{
    sv_context *context = s->context;
    const options *o = s->options;
    sv_figure_files files;
    sv_status status = SV_OK;
    if (mkdir(o->output, 0777) != 0 && errno != EEXIST)
        return SV_FAIL(context, SV_STORAGE, "cannot make folder %s: %s", o->output,
                       strerror(errno));
    if (map->site_values != NULL) {
        status = sv_figure_map(context, o->output, "marker_map", map, &files);
        if (status == SV_OK)
            tell_figure(s, &files, "marker map");
    }
    if (status == SV_OK && map->survey != NULL)
        status = survey_draw(s, o->output, map, tell_figure);
    if (status == SV_OK && map->flow != NULL && map->flow->count > 0) {
        status = sv_figure_flow(context, o->output, "spectral_flow", map, &files);
        if (status == SV_OK)
            tell_figure(s, &files, "spectral flow");
    }
    return status;
}

static sv_status print_result(sv_context *context, const options *o, const sv_map_result *map)
{
    char *text = NULL;
    if (!o->json) {
        sv_map_print(map, wants_colour(o, stdout), stdout);
        return SV_OK;
    }
    sv_status status = sv_map_json(context, map, &text);
    if (status == SV_OK)
        fputs(text, stdout);
    sv_give(context, text);
    return status;
}

/* A marker that arithmetic could not decide makes the command end with 1. */
static sv_status verdict(sv_context *context, const sv_record *record)
{
    for (int k = 0; k < record->n_outcomes; k++)
        if (record->outcomes[k].verdict == SV_UNRESOLVED)
            return SV_FAIL(context, SV_UNDECIDED, "%s", record->outcomes[k].reason);
        else if (record->outcomes[k].verdict == SV_FAILED)
            return SV_FAIL(context, SV_NUMERICAL, "%s", record->outcomes[k].reason);
    return SV_OK;
}

static bool wants_every_site(const sv_case *problem)
{
    return problem->open_flake->n_sites <= SITE_MAP_LARGEST && !coarse_wanted(problem);
}

/* Exports that the sheet has nothing for, and files that are there already. */
static sv_status check_exports(sv_context *context, const options *o, const sv_case *problem)
{
    const char *const files[] = {o->csv, o->probes, o->blocks};
    for (int k = 0; k < 3; k++) {
        sv_status status = may_write(context, o, files[k]);
        if (status != SV_OK)
            return status;
    }
    if (o->probes != NULL && !survey_wanted(problem))
        return SV_FAIL(context, SV_USAGE,
                       "--probes: the sheet asks for no probe points (markers.localizer.points)");
    if (o->blocks != NULL && !coarse_wanted(problem))
        return SV_FAIL(context, SV_USAGE,
                       "--blocks: the sheet asks for no blocks (markers.local_chern.blocks)");
    if (o->csv != NULL && coarse_wanted(problem))
        return SV_FAIL(context, SV_USAGE,
                       "--csv: with markers.local_chern.blocks there is no marker of single sites; "
                       "--blocks writes the blocks");
    return flow_check(context, o, problem);
}

static sv_status map_one(session *s)
{
    sv_context *context = s->context;
    const options *o = s->options;
    const sv_case *problem = &s->points[0].problem;
    sv_record record;
    sv_sample sample = {0};
    sv_survey survey = {0};
    sv_coarse coarse = {0};
    sv_flow_trace flow = {0};
    double *values = NULL;
    sv_status status = check_exports(context, o, problem);
    if (status == SV_OK)
        status = sv_realise(context, problem, o->realisation,
                            wants_every_site(problem) ? &values : NULL, &sample, &record);
    if (status != SV_OK)
        goto out;
    if (sample.inventory.marks_merged > 0)
        sv_log(context, SV_LOG_NOTE, "%lld measured rows fell on a site that had one already",
               (long long)sample.inventory.marks_merged);
    sv_map_result map = {.title = s->base.title,
                         .sample = &sample,
                         .point = problem,
                         .record = &record,
                         .site_values = values,
                         .lattice_constant = s->base.lattice_constant};
    if (coarse_wanted(problem)) {
        if ((status = coarse_compute(s, problem, &sample, o->realisation, &coarse)) != SV_OK ||
            (status = sv_coarse_site_values(context, &sample, &coarse, &values)) != SV_OK)
            goto out;
        map.coarse = &coarse;
        map.site_values = values;
        map.note = "means over blocks of cells, sampled";
    }
    if (survey_wanted(problem)) {
        if ((status = survey_compute(s, problem, &sample, &survey)) != SV_OK)
            goto out;
        map.survey = &survey;
    }
    if (flow_wanted(o, problem)) {
        if ((status = flow_compute(s, problem, &sample, &flow)) != SV_OK)
            goto out;
        map.flow = &flow;
    }
    int chern = sv_marker_find("local_chern");
    for (int k = 0; k < record.n_outcomes; k++)
        if (problem->markers[k].marker == chern && record.outcomes[k].verdict != SV_RESOLVED)
            map.site_values = NULL;
    if (o->csv != NULL && map.site_values != NULL)
        status = sv_sample_write_sites(context, &sample, o->csv, "local_chern", values);
    if (status == SV_OK && o->blocks != NULL)
        status = coarse_write_csv(s, &coarse, o->blocks);
    if (status == SV_OK && o->probes != NULL)
        status = survey_write_csv(s, &survey, o->probes);
    if (status == SV_OK && o->flow != NULL)
        status = flow_write_csv(s, &flow, o->flow);
    if (status == SV_OK)
        status = print_result(context, o, &map);
    if (status == SV_OK && o->output != NULL &&
        (map.site_values != NULL || map.survey != NULL || map.flow != NULL))
        status = draw_figures(s, &map);
    if (status == SV_OK)
        status = verdict(context, &record);
out:
    sv_coarse_free(context, &coarse);
    sv_survey_free(context, &survey);
    sv_flow_trace_free(context, &flow);
    sv_give(context, values);
    sv_sample_free(context, &sample);
    return status;
}

int run_map(sv_context *context, const options *o)
{
    session s = {.add_map_marker = true};
    sv_status status = session_open(context, o, o->files[0], false, false, &s);
    if (status == SV_OK)
        status = session_try_windows(&s);
    if (status == SV_OK)
        status = session_plan(&s, wants_every_site(&s.points[0].problem));
    if (status == SV_OK)
        status = map_one(&s);
    session_close(&s);
    if (status == SV_UNDEFINED) /* computed: there is nothing left that could have a marker */
        status = SV_UNDECIDED;
    return status == SV_OK ? 0 : fail_exit(context, status);
}
