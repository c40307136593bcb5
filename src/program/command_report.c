/* SPDX-License-Identifier: GPL-3.0-or-later */
/* selvedge report: figures of a run. The run folder may come from elsewhere: it is read, checked,
 * and only its figures/ folder is written. */
#include "program_internal.h"

#include <errno.h>
#include <string.h>
#include <sys/stat.h>

static sv_status figure_folder(session *s, sv_run *run, char *path, size_t size)
{
    struct stat info;
    sv_status status = SV_OK;
    if (s->options->output != NULL)
        snprintf(path, size, "%s", s->options->output);
    else
        status = sv_run_path(s->context, run, "figures", path, size);
    if (status != SV_OK)
        return status;
    if (mkdir(path, 0777) != 0 && errno != EEXIST)
        return SV_FAIL(s->context, SV_STORAGE, "cannot make folder %s: %s", path, strerror(errno));
    if (lstat(path, &info) != 0 || !S_ISDIR(info.st_mode))
        return SV_FAIL(s->context, SV_STORAGE, "%s is not a folder", path);
    return SV_OK;
}

/* Names the files of a figure, or says why there are none; the first failure is kept for the end.
 */
static void name_figure(const session *s, const sv_figure_files *files, const char *what)
{
    if (!files->drawn && s->undrawn != NULL && (*s->undrawn)[0] == '\0')
        snprintf(*s->undrawn, sizeof *s->undrawn, "%.80s not drawn: %s", what, files->reason);
    if (files->drawn)
        printf("%s\n  %s\n  %s\n  %s\n", what, files->svg, files->pdf, files->png);
    else
        printf("%s not drawn: %s\n  script and data: %s, %s\n", what, files->reason, files->script,
               files->data);
}

/* The first point at which the sample has defects makes the more telling map. */
static int32_t map_point(const session *s)
{
    return s->n_points > 1 ? s->n_points / 2 : 0;
}

void describe_point(const point *p, char *text, size_t size)
{
    int used = 0;
    text[0] = '\0';
    for (int c = 0; c < p->n_coordinates && used >= 0 && (size_t)used < size; c++) {
        const sv_coordinate *at = &p->coordinates[c];
        char second[40] = "";
        if (at->pair)
            snprintf(second, sizeof second, " x %g", at->second);
        used +=
            snprintf(text + used, size - (size_t)used, "%s%s = %g%s%s%s", c > 0 ? ", " : "",
                     at->path, at->value, second, at->unit ? " " : "", at->unit ? at->unit : "");
    }
}

static sv_status draw_map(session *s, const char *folder)
{
    sv_context *context = s->context;
    const point *p = &s->points[map_point(s)];
    sv_record record;
    sv_sample sample = {0};
    double *values = NULL;
    sv_figure_files files;
    int chern = sv_marker_find("local_chern");
    sv_case problem = p->problem;
    int k = 0;
    while (k < problem.n_markers && problem.markers[k].marker != chern)
        k++;
    if (k == problem.n_markers)
        return SV_OK; /* the run did not ask for it */
    /* Only the map is wanted: other markers would cost time and show nothing. */
    problem.markers[0] = problem.markers[k];
    problem.n_markers = 1;
    problem.solve.engine = SV_ENGINE_AUTO;
    const bool blocks = coarse_wanted(&problem);
    sv_coarse coarse = {0};
    sv_plan plan;
    sv_status planned = sv_case_plan(context, &problem, !blocks, p->setup.sampling_error, &plan);
    if (planned != SV_OK)
        return planned;
    sv_status status = sv_realise(context, &problem, s->options->realisation,
                                  blocks ? NULL : &values, &sample, &record);
    if (status == SV_OK && blocks)
        status = coarse_compute(s, &problem, &sample, s->options->realisation, &coarse);
    if (status == SV_OK && blocks)
        status = sv_coarse_site_values(context, &sample, &coarse, &values);
    if (status == SV_OK && record.outcomes[0].verdict != SV_RESOLVED) {
        printf("marker map not drawn: %s\n", record.outcomes[0].reason);
    } else if (status == SV_OK) {
        sv_map_result map = {.title = s->base.title,
                             .sample = &sample,
                             .point = &problem,
                             .record = &record,
                             .site_values = values,
                             .lattice_constant = s->base.lattice_constant};
        char where[300], what[400];
        describe_point(p, where, sizeof where);
        snprintf(what, sizeof what, "marker map, realisation %lld%s%s",
                 (long long)s->options->realisation, where[0] != '\0' ? ", " : "", where);
        map.note = where[0] != '\0' ? where : blocks ? "means over blocks of cells, sampled" : NULL;
        status = sv_figure_map(context, folder, "marker_map", &map, &files);
        if (status == SV_OK)
            name_figure(s, &files, what);
    }
    sv_coarse_free(context, &coarse);
    sv_give(context, values);
    sv_sample_free(context, &sample);
    return status;
}

static void tell_figure(const session *s, const sv_figure_files *files, const char *what)
{
    name_figure(s, files, what);
}

/* The localizer at many points, on the sample of the map. */
static sv_status draw_survey(session *s, const char *folder)
{
    sv_context *context = s->context;
    const point *p = &s->points[map_point(s)];
    sv_case problem = p->problem;
    sv_record record;
    sv_sample sample = {0};
    sv_survey survey = {0};
    char where[300];
    if (!survey_wanted(&problem))
        return SV_OK;
    problem.n_markers = 0; /* the sample only */
    sv_status status =
        sv_realise(context, &problem, s->options->realisation, NULL, &sample, &record);
    if (status == SV_OK)
        status = survey_compute(s, &p->problem, &sample, &survey);
    if (status == SV_OK) {
        describe_point(p, where, sizeof where);
        const sv_map_result map = {.title = s->base.title,
                                   .sample = &sample,
                                   .point = &problem,
                                   .record = &record,
                                   .lattice_constant = s->base.lattice_constant,
                                   .note = where[0] != '\0' ? where : NULL,
                                   .survey = &survey};
        status = survey_draw(s, folder, &map, tell_figure);
    }
    sv_survey_free(context, &survey);
    sv_sample_free(context, &sample);
    return status;
}

static sv_status draw_scaling(session *s, const sv_result *result, const char *folder)
{
    sv_figure_files files;
    if (result->finite_size == NULL)
        return SV_OK;
    sv_status status = sv_figure_scaling(s->context, folder, "finite_size", result, &files);
    if (status == SV_OK)
        name_figure(s, &files, "finite size");
    return status;
}

/* Two values of both axes at least make a map. */
static bool is_plane(const session *s)
{
    return s->base.n_axes == 2 && s->base.axes[0].count > 1 && s->base.axes[1].count > 1;
}

/* Two points, and with two axes one that is short. */
static bool has_curves(const session *s)
{
    return s->n_points > 1 && (s->base.n_axes == 1 || s->base.axes[0].count <= SV_MOST_CURVES ||
                               s->base.axes[1].count <= SV_MOST_CURVES);
}

static sv_status draw_sweep(session *s, const sv_result *result, const char *folder)
{
    sv_figure_files files;
    if (s->base.n_axes == 0) {
        printf("sweep figure: none, the run has no sweep\n");
        return SV_OK;
    }
    sv_status status = SV_OK;
    if (has_curves(s))
        status = sv_figure_sweep(s->context, folder, "sweep", result, &files);
    else
        printf("sweep curves: none, they need two points and an axis with at most %d values\n",
               SV_MOST_CURVES);
    if (status == SV_OK && has_curves(s))
        name_figure(s, &files, s->base.n_axes > 1 ? "sweep, a curve for each value" : "sweep");
    for (int m = 0; status == SV_OK && is_plane(s) && m < result->points[0].n_summaries; m++) {
        char name[100], what[140];
        snprintf(name, sizeof name, "phase_%s", result->points[0].summaries[m].marker);
        snprintf(what, sizeof what, "%s over both axes", result->points[0].summaries[m].marker);
        status = sv_figure_phase(s->context, folder, name, result, m, &files);
        if (status == SV_OK)
            name_figure(s, &files, what);
    }
    return status;
}

sv_status report_load(session *s, sv_run *run, sv_ensemble *ensemble, sv_result *result)
{
    sv_context *context = s->context;
    sv_index loaded = 0;
    int64_t realisations;
    int32_t points;
    sv_stop_rule stop = session_stop_rule(s);
    sv_status status = run_folder_check_identity(s, run);
    if (status == SV_OK)
        status = sv_run_extent(context, run, &realisations, &points);
    if (status == SV_OK && realisations == 0)
        status = SV_FAIL(context, SV_STORAGE, "the run has no finished realisation yet");
    if (status == SV_OK && points > s->n_points)
        status = SV_FAIL(context, SV_STORAGE, "the ledger has %d points, the sheet %d", points,
                         s->n_points);
    if (status == SV_OK && realisations > 10000000 / s->n_points)
        status = SV_FAIL(context, SV_REFUSED, "the ledger claims %lld realisations at %d points",
                         (long long)realisations, s->n_points);
    if (status == SV_OK)
        status = sv_ensemble_init(context, s->n_points, realisations,
                                  s->points[0].problem.n_markers, ensemble);
    if (status == SV_OK)
        status = sv_run_load(context, run, ensemble, &loaded);
    if (status == SV_OK)
        status = result_make(s, ensemble, &stop, result);
    if (status == SV_OK)
        status = site_maps_add(s, run, false, result);
    return status;
}

static sv_status report(session *s, sv_run *run)
{
    sv_context *context = s->context;
    sv_ensemble ensemble = {0};
    sv_result result = {0};
    char folder[1024], undrawn[400] = "";
    s->undrawn = &undrawn;
    sv_status status = report_load(s, run, &ensemble, &result);
    if (status == SV_OK && !s->options->quiet && !s->options->json)
        sv_result_print(&result, wants_colour(s->options, stdout), stdout);
    if (status == SV_OK)
        status = figure_folder(s, run, folder, sizeof folder);
    if (status == SV_OK)
        status = draw_sweep(s, &result, folder);
    if (status == SV_OK)
        status = draw_scaling(s, &result, folder);
    if (status == SV_OK)
        status = draw_map(s, folder);
    if (status == SV_OK)
        status = site_maps_draw(s, run, &result, folder, tell_figure);
    if (status == SV_OK)
        status = draw_survey(s, folder);
    if (status == SV_OK && undrawn[0] != '\0')
        status = SV_FAIL(context, SV_STORAGE, "%s", undrawn);
    s->undrawn = NULL;
    result_free(context, &result);
    sv_ensemble_free(context, &ensemble);
    return status;
}

sv_status report_open(sv_context *context, const options *o, session *s, sv_run **ret_run)
{
    sv_run *run = NULL;
    char sheet[1024];
    int32_t task = 0, tasks = 0;
    sv_status status = sv_run_open_read(context, o->files[0], &run);
    *ret_run = run;
    if (status == SV_OK)
        sv_run_task(run, &task, &tasks);
    if (status == SV_OK && tasks > 0)
        status = SV_FAIL(context, SV_USAGE,
                         "%s holds the part of task %ld of %ld; join the parts with merge first",
                         o->files[0], (long)task, (long)tasks);
    if (status == SV_OK)
        status = sv_run_path(context, run, "sheet.resolved.yaml", sheet, sizeof sheet);
    if (status == SV_OK)
        status = session_open(context, o, sheet, true, true, s);
    return status;
}

int run_report(sv_context *context, const options *o)
{
    session s = {0};
    sv_run *run = NULL;
    sv_status status = report_open(context, o, &s, &run);
    if (status == SV_OK)
        status = report(&s, run);
    session_close(&s);
    sv_run_close(context, run);
    return status == SV_OK ? 0 : fail_exit(context, status);
}
