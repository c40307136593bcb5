/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The localizer at many points: what the map and report commands do with it. */
#include "program_internal.h"

#include <string.h>
#include <unistd.h>

static const sv_marker_request *survey_request(const sv_case *problem)
{
    const int localizer = sv_marker_find("localizer");
    for (int k = 0; k < problem->n_markers; k++)
        if (problem->markers[k].marker == localizer &&
            sv_localizer_wants_survey(problem->markers[k].values))
            return &problem->markers[k];
    return NULL;
}

bool survey_wanted(const sv_case *problem)
{
    return survey_request(problem) != NULL;
}

/* First number of a key of the localizer times the second, 0: not written. */
static double product_of(const sv_marker_request *request, const char *name)
{
    const sv_kind *kind = &sv_marker_table(&(int){0})[request->marker].kind;
    for (int i = 0; i < kind->n_keys; i++) {
        const sv_value *value = &request->values[i];
        if (strcmp(kind->keys[i].name, name) == 0 && value->present)
            return (double)value->integer[0] * (value->count > 1 ? (double)value->integer[1] : 1.0);
    }
    return 0.0;
}

double survey_probes(const sv_case *problem)
{
    const sv_marker_request *request = survey_request(problem);
    return request == NULL ? 0.0
                           : product_of(request, "points") + product_of(request, "kappa_points");
}

sv_status survey_compute(session *s, const sv_case *problem, const sv_sample *sample,
                         sv_survey *ret)
{
    const sv_marker_input input = {.sample = sample,
                                   .occupation = &problem->occupation,
                                   .values = survey_request(problem)->values,
                                   .threads = s->threads};
    sv_context *context = s->context;
    sv_progress_bar bar;
    sv_progress_bar_init(&bar, stderr, isatty(fileno(stderr)));
    if (wants_progress(s->options)) {
        context->progress = sv_progress_bar_show;
        context->progress_user = &bar;
    }
    sv_status status = sv_localizer_survey(context, &input, ret);
    context->progress = NULL;
    sv_progress_bar_end(&bar);
    return status;
}

sv_status survey_write_csv(session *s, const sv_survey *survey, const char *path)
{
    char *text = NULL;
    sv_status status = sv_survey_csv(s->context, survey, &text);
    if (status == SV_OK)
        status = write_csv_text(s->context, path, text);
    sv_give(s->context, text);
    return status;
}

sv_status survey_draw(session *s, const char *folder, const sv_map_result *map, figure_teller tell)
{
    sv_context *context = s->context;
    sv_figure_files files;
    sv_status status = SV_OK;
    if (map->survey->points[0] > 0) {
        status = map->survey->line
                     ? sv_figure_profile(context, folder, "localizer_line", map, false, &files)
                     : sv_figure_probes(context, folder, "localizer_grid", map, &files);
        if (status == SV_OK)
            tell(s, &files, map->survey->line ? "localizer along a line" : "localizer gap");
    }
    if (status == SV_OK && map->survey->n_kappas > 0) {
        status = sv_figure_profile(context, folder, "localizer_kappa", map, true, &files);
        if (status == SV_OK)
            tell(s, &files, "localizer against kappa");
    }
    return status;
}
