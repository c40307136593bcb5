/* SPDX-License-Identifier: GPL-3.0-or-later */
/* From a sheet on disk to the points of its sweep, ready to compute. */
#include "program_internal.h"

#include <sched.h>
#include <stdlib.h>
#include <string.h>
#include <unistd.h>

int fail_exit(const sv_context *context, sv_status status)
{
    /* Names of files and words of a ledger may hold anything. */
    char clean[2 * sizeof context->error.message];
    sv_text_clean(context->error.message, clean, sizeof clean);
    if (clean[0] != '\0')
        fprintf(stderr, "selvedge: error: %s\n", clean);
    else if (status != SV_INVALID_INPUT && status != SV_REFUSED) /* those have been shown */
        fprintf(stderr, "selvedge: error: %s\n", sv_status_text(status));
    return sv_status_exit_code(status);
}

static bool colour_allowed(FILE *stream)
{
    const char *no_colour = getenv("NO_COLOR"), *terminal = getenv("TERM");
    bool refused = no_colour != NULL && no_colour[0] != '\0';
    bool dumb = terminal == NULL || strcmp(terminal, "dumb") == 0;
    return isatty(fileno(stream)) && !refused && !dumb;
}

sv_status may_write(sv_context *context, const options *o, const char *path)
{
    if (path == NULL || o->force || access(path, F_OK) != 0)
        return SV_OK;
    return SV_FAIL(context, SV_STORAGE, "%s exists; --force overwrites it", path);
}

bool wants_colour(const options *o, FILE *stream)
{
    return o->colour == CHOICE_ALWAYS || (o->colour == CHOICE_AUTO && colour_allowed(stream));
}

bool wants_progress(const options *o)
{
    return o->progress == CHOICE_ALWAYS ||
           (o->progress == CHOICE_AUTO && !o->quiet && isatty(fileno(stderr)));
}

static int default_threads(void)
{
    cpu_set_t set;
    int cores = sched_getaffinity(0, sizeof set, &set) == 0 ? CPU_COUNT(&set) : 1;
    long share = sysconf(_SC_NPROCESSORS_ONLN) / launch_neighbours();
    if (launch_neighbours() > 1 && share < cores)
        cores = (int)share; /* ranks that are not bound share the machine */
    return cores < 1 ? 1 : cores;
}

/* Several threads in a BLAS that cannot take them give wrong vectors without an error. */
static sv_status choose_threads(session *s)
{
    s->threads = s->options->threads > 0 ? (int)s->options->threads : default_threads();
    if (s->threads == 1 || s->blas.threads_safe)
        return SV_OK;
    if (s->options->threads > 1)
        return SV_FAIL(s->context, SV_REFUSED,
                       "the BLAS in use (%s, %s) gives wrong results when several threads call it; "
                       "use -j 1, or install the pthread variant (Debian: libopenblas0-pthread)",
                       s->blas.kind, s->blas.threading);
    sv_log(s->context, SV_LOG_WARNING,
           "the BLAS in use cannot be called from several threads; one thread is used");
    s->threads = 1;
    return SV_OK;
}

static sv_status set_markers(session *s, const sv_setup *setup, sv_case *problem)
{
    for (int k = 0; k < setup->n_markers; k++) {
        sv_marker_request *request = &problem->markers[problem->n_markers++];
        request->marker = setup->markers[k].kind;
        memcpy(request->values, setup->markers[k].values, sizeof request->values);
    }
    if (!s->add_map_marker)
        return SV_OK;
    int wanted = sv_marker_find("local_chern");
    for (int k = 0; k < problem->n_markers; k++)
        if (problem->markers[k].marker == wanted)
            return SV_OK;
    if (problem->n_markers == SV_MAX_MARKERS)
        return SV_FAIL(s->context, SV_INVALID_INPUT, "more than %d markers", SV_MAX_MARKERS);
    problem->markers[problem->n_markers++] = (sv_marker_request){
        .marker = wanted, .values = {{.present = true, .count = 1, .real = {0.5}}}};
    return SV_OK;
}

/* The open copy and, where a torus exists, the closed copy of the flake. */
static sv_status make_flakes(session *s, point *p)
{
    sv_flake_spec spec = p->setup.flake;
    sv_closure closure = sv_flake_can_close(&p->setup.model, &spec);
    if (closure.possible)
        closure = sv_disorder_can_close(p->setup.disorder, p->setup.n_disorder);
    spec.periodic[0] = spec.periodic[1] = false;
    sv_status status = sv_flake_make(s->context, &p->setup.model, &spec, &p->open);
    if (status != SV_OK)
        return status;
    p->problem.open_flake = &p->open;
    if (!closure.possible) {
        memcpy(p->problem.no_torus, closure.reason, sizeof p->problem.no_torus);
        return SV_OK;
    }
    spec.periodic[0] = spec.periodic[1] = true;
    status = sv_flake_make(s->context, &p->setup.model, &spec, &p->closed);
    p->has_closed = status == SV_OK;
    p->problem.closed_flake = p->has_closed ? &p->closed : NULL;
    return status;
}

/* The localizer's kappa and threshold follow from the sheet: once per point, not per realisation.
 */
static sv_status prepare_localizer(session *s, point *p)
{
    int localizer = sv_marker_find("localizer");
    sv_status status = SV_OK;
    for (int k = 0; k < p->problem.n_markers && status == SV_OK; k++)
        if (p->problem.markers[k].marker == localizer)
            status = sv_localizer_prepare(s->context, &p->open, &p->problem.occupation,
                                          p->problem.markers[k].values);
    return status;
}

sv_status session_make_point(session *s, point *p)
{
    const sv_setup *setup = &p->setup;
    sv_status status = make_flakes(s, p);
    if (status != SV_OK)
        return status;
    p->problem.disorder = setup->disorder;
    p->problem.n_disorder = setup->n_disorder;
    p->problem.occupation = setup->occupation;
    p->problem.solve = sv_projector_options_default();
    p->problem.solve.accuracy = setup->accuracy;
    p->problem.solve.engine = strcmp(setup->engine, "dense") == 0       ? SV_ENGINE_DENSE
                              : strcmp(setup->engine, "chebyshev") == 0 ? SV_ENGINE_CHEBYSHEV
                              : strcmp(setup->engine, "rational") == 0  ? SV_ENGINE_RATIONAL
                                                                        : SV_ENGINE_AUTO;
    p->problem.solve.estimator = strcmp(setup->estimator, "cells") == 0 ? SV_ESTIMATOR_CELLS
                                 : strcmp(setup->estimator, "random_phase") == 0
                                     ? SV_ESTIMATOR_RANDOM_PHASE
                                     : SV_ESTIMATOR_AUTO;
    p->problem.seed = setup->seed;
    p->problem.site_maps = setup->site_maps;
    status = set_markers(s, setup, &p->problem);
    return status == SV_OK ? prepare_localizer(s, p) : status;
}

/* In the unit of the axis; rounding hides the conversion there and back. */
static double shown_value(const sv_sweep_axis *axis, double value)
{
    char text[32];
    double shown = value;
    if (axis->unit == NULL)
        return value;
    snprintf(text, sizeof text, "%.12g", value * axis->unit_scale);
    (void)sv_parse_real(text, &shown);
    return shown;
}

/* Point number → values of the axes; the last axis runs fastest. */
static int axis_values(const sv_setup *base, int32_t number, sv_assignment *ret,
                       sv_coordinate *coordinates)
{
    for (int a = base->n_axes - 1; a >= 0; a--) {
        const sv_sweep_axis *axis = &base->axes[a];
        ret[a] = sv_sweep_value(axis, number % axis->count);
        number = (int32_t)(number / axis->count);
        coordinates[a] = (sv_coordinate){.path = axis->path,
                                         .value = shown_value(axis, ret[a].value),
                                         .second = shown_value(axis, ret[a].second),
                                         .pair = axis->second != NULL && !axis->square,
                                         .integer = axis->integer,
                                         .unit = axis->unit};
    }
    return base->n_axes;
}

static sv_status make_points(session *s, bool with_sweep, sv_diagnostics *diagnostics)
{
    int64_t count = 1;
    for (int a = 0; with_sweep && a < s->base.n_axes; a++)
        count *= s->base.axes[a].count;
    if (count > MOST_POINTS)
        return SV_FAIL(s->context, SV_INVALID_INPUT, "a sweep of %lld points is above %d",
                       (long long)count, MOST_POINTS);
    sv_status status = sv_take(s->context, count, sizeof *s->points, &s->points);
    for (int32_t k = 0; status == SV_OK && k < count; k++) {
        point *p = &s->points[k];
        sv_assignment assignments[SV_MAX_AXES];
        if (with_sweep)
            p->n_coordinates = axis_values(&s->base, k, assignments, p->coordinates);
        status = sv_sheet_setup(s->context, s->sheet, assignments, p->n_coordinates, diagnostics,
                                &p->setup);
        if (status == SV_OK) {
            s->n_points = k + 1;
            status = session_make_point(s, p);
        }
    }
    return status;
}

static bool is_index_marker(int kind)
{
    return sv_marker_table(&(int){0})[kind].is_index;
}

/* A flake too large for the numbers of this program is refused before anything is built. */
static sv_status open_sheet(session *s, const char *path, bool inside_run, bool with_sweep,
                            sv_diagnostics *diagnostics)
{
    int count;
    const sv_marker *table = sv_marker_table(&count);
    for (int k = 0; k < count; k++)
        s->markers[k] = table[k].kind;
    s->n_markers = count;
    sv_sheet_options sheet_options = {.size = sizeof sheet_options,
                                      .overrides = s->options->overrides,
                                      .n_overrides = s->options->n_overrides,
                                      .markers = s->markers,
                                      .n_markers = count,
                                      .confined = inside_run,
                                      .check_marker = sv_marker_check,
                                      .is_index = is_index_marker};
    sv_status status = sv_sheet_read(s->context, path, &sheet_options, diagnostics, &s->sheet);
    if (status == SV_OK)
        status = sv_sheet_setup(s->context, s->sheet, NULL, 0, diagnostics, &s->base);
    if (status == SV_OK)
        status = session_fit_memory(s);
    if (status == SV_OK)
        status = make_points(s, with_sweep, diagnostics);
    if (status == SV_OK && with_sweep && s->base.n_axes > 0)
        status = session_fit_memory(s);
    if (status == SV_REFUSED && diagnostics->errors == 0 && s->sheet != NULL)
        sv_sheet_report(s->context, s->sheet, "flake", s->context->error.message,
                        "make the flake smaller, or leave out what needs the dense engine: markers "
                        "on a torus, engine: dense",
                        diagnostics);
    return status;
}

sv_status session_open(sv_context *context, const options *o, const char *path, bool inside_run,
                       bool with_sweep, session *ret)
{
    sv_diagnostics diagnostics = {0};
    ret->context = context;
    ret->options = o;
    ret->inside_run = inside_run;
    sv_blas_setup(&ret->blas);
    kernel_text(&ret->blas, ret->kernel, sizeof ret->kernel);
    snprintf(ret->version, sizeof ret->version, "%s", sv_version());
    sv_status status = choose_threads(ret);
    if (status == SV_OK)
        status = open_sheet(ret, path, inside_run, with_sweep, &diagnostics);
    bool quiet = o->quiet && diagnostics.errors == 0;
    if (!quiet)
        sv_diagnostics_print(&diagnostics, wants_colour(o, stderr), stderr);
    /* What the diagnostics have said need not be said again. */
    if (diagnostics.errors > 0 && (status == SV_INVALID_INPUT || status == SV_REFUSED))
        context->error.message[0] = '\0';
    sv_diagnostics_free(context, &diagnostics);
    return status;
}

sv_status session_blame(session *s, const char *key, sv_status status)
{
    sv_diagnostics diagnostics = {0};
    if (status != SV_INVALID_INPUT || s->context->error.message[0] == '\0')
        return status;
    sv_sheet_report(s->context, s->sheet, key, s->context->error.message, NULL, &diagnostics);
    sv_diagnostics_print(&diagnostics, wants_colour(s->options, stderr), stderr);
    if (diagnostics.errors > 0) /* said, with its place */
        s->context->error.message[0] = '\0';
    sv_diagnostics_free(s->context, &diagnostics);
    return status;
}

void session_close(session *s)
{
    for (int32_t k = 0; k < s->n_points; k++) {
        sv_flake_free(s->context, &s->points[k].open);
        sv_flake_free(s->context, &s->points[k].closed);
        sv_setup_free(s->context, &s->points[k].setup);
    }
    sv_give(s->context, s->points);
    sv_setup_free(s->context, &s->base);
    sv_sheet_free(s->context, s->sheet);
}

sv_status session_plan(session *s, bool site_map)
{
    const char *before = "";
    for (int32_t k = 0; k < s->n_points; k++) {
        point *p = &s->points[k];
        sv_status status = sv_case_plan(s->context, &p->problem, site_map || p->problem.site_maps,
                                        p->setup.sampling_error, &p->plan);
        if (status != SV_OK)
            return status;
        /* With fewer realisations than threads the cores work inside one realisation. */
        const int64_t work = s->n_points * s->base.realisations;
        p->problem.solve.threads = work < s->threads ? (int)(s->threads / work) : 1;
        if (strcmp(before, p->plan.reason) != 0)
            sv_log(s->context, SV_LOG_DETAIL, "point %d: engine %s", k, p->plan.reason);
        before = p->plan.reason;
    }
    return SV_OK;
}

sv_status session_plan_text(const session *s, char **ret_text)
{
    const size_t line = sizeof s->points[0].plan.reason + 40;
    size_t size = line * (size_t)(s->n_points + 1), used = 0;
    char *text = NULL;
    sv_status status = sv_take(s->context, (sv_index)size, 1, &text);
    if (status != SV_OK)
        return status;
    for (int32_t k = 0; k < s->n_points; k++)
        if (k == 0 || strcmp(s->points[k].plan.reason, s->points[k - 1].plan.reason) != 0)
            used += (size_t)snprintf(text + used, size - used, "# engine from point %d: %s\n", k,
                                     s->points[k].plan.reason);
    *ret_text = text;
    return SV_OK;
}

sv_stop_rule session_stop_rule(const session *s)
{
    const sv_case *problem = &s->points[0].problem;
    return (sv_stop_rule){.active = s->base.has_stop,
                          .marker = s->base.stop_marker,
                          .of_index = is_index_marker(problem->markers[s->base.stop_marker].marker),
                          .standard_error = s->base.stop_standard_error,
                          .share_width = s->base.stop_share_width,
                          .seconds = s->base.stop_seconds / s->n_points,
                          .at_least = s->base.stop_at_least};
}
