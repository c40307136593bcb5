/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The thresholds of a question: of every marker, for every flake and second value. */
#include "program_internal.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

/* Other markers than the one asked about get their thresholds with this much less precision: they
 * tell how far the markers differ, not how much is tolerable. */
static const double OTHERS_PRECISION = 2.0;
/* Samples of a real marker without a band of their own count when they round to the clean value. */
static const double HALF_A_QUANTUM = 0.5;

enum { MOST_ASSIGNMENTS = 4, MOST_LOCAL_POINTS = 256 };

/* A search as the responder sees it: which points belong to which value of the parameter. */
typedef struct ground {
    inquiry *inquiry;
    const sv_sheet_question *question;
    sv_assignment fixed[MOST_ASSIGNMENTS]; /* flake and second parameter */
    int n_fixed;
    double parameters[MOST_LOCAL_POINTS];
    int numbers[MOST_LOCAL_POINTS]; /* in the inquiry */
    int n_points;
    /* of the search in hand */
    int marker;
    bool of_mean, by_index;
    double clean, within;
} ground;

static sv_status number_of(ground *g, double parameter, int *ret_number)
{
    sv_assignment assignments[MOST_ASSIGNMENTS + 1] = {
        {.path = g->question->axis.path, .value = parameter}};
    for (int k = 0; k < g->n_points; k++)
        if (g->parameters[k] == parameter) {
            *ret_number = g->numbers[k];
            return SV_OK;
        }
    if (g->n_points == MOST_LOCAL_POINTS)
        return SV_FAIL(g->inquiry->s->context, SV_REFUSED, "more than %d values asked about",
                       MOST_LOCAL_POINTS);
    memcpy(assignments + 1, g->fixed, (size_t)g->n_fixed * sizeof *assignments);
    sv_status status = inquiry_point(g->inquiry, assignments, g->n_fixed + 1, ret_number);
    if (status == SV_OK) {
        g->parameters[g->n_points] = parameter;
        g->numbers[g->n_points++] = *ret_number;
    }
    return status;
}

/* 1 where a sample meets the criterion; an unresolved one does not. */
static double meets(const ground *g, double value)
{
    if (isnan(value))
        return 0.0;
    return g->by_index ? value == g->clean : fabs(value - g->clean) <= g->within;
}

static sv_status respond(sv_context *context, double parameter, int64_t have, int64_t more,
                         double *ret_values, void *user)
{
    ground *g = user;
    int number;
    (void)context;
    sv_status status = number_of(g, parameter, &number);
    if (status == SV_OK)
        status = inquiry_more(g->inquiry, number, have + more);
    if (status != SV_OK)
        return status;
    const asked_point *p = g->inquiry->asked[number];
    for (int64_t k = 0; k < more; k++) {
        double value = p->values[(have + k) * p->at.problem.n_markers + g->marker];
        ret_values[k] = g->of_mean ? value : meets(g, value);
    }
    return SV_OK;
}

/* The flake of the ground without any disorder: what "clean" means. */
static sv_status clean_values(ground *g, double *ret_values)
{
    session *s = g->inquiry->s;
    sv_setup setup = {0};
    point p = {0};
    sv_record record = {0};
    sv_diagnostics diagnostics = {0};
    sv_plan plan;
    sv_status status =
        sv_sheet_setup(s->context, s->sheet, g->fixed, g->n_fixed, &diagnostics, &setup);
    sv_diagnostics_print(&diagnostics, wants_colour(s->options, stderr), stderr);
    sv_diagnostics_free(s->context, &diagnostics);
    p.setup = setup;
    if (status == SV_OK)
        status = session_make_point(s, &p);
    p.problem.disorder = NULL;
    p.problem.n_disorder = 0;
    if (status == SV_OK)
        status = sv_case_plan(s->context, &p.problem, false, s->base.sampling_error, &plan);
    if (status == SV_OK)
        status = sv_realise(s->context, &p.problem, 0, NULL, NULL, &record);
    for (int m = 0; status == SV_OK && m < record.n_outcomes; m++) {
        const sv_outcome *o = &record.outcomes[m];
        ret_values[m] = o->verdict == SV_RESOLVED ? o->value : (double)NAN;
        if (m == g->question->marker && isnan(ret_values[m]))
            status = SV_FAIL(s->context, SV_UNDECIDED,
                             "the clean flake has no value of %s to compare with: %s",
                             s->markers[s->base.markers[m].kind].name, o->reason);
    }
    sv_flake_free(s->context, &p.open);
    sv_flake_free(s->context, &p.closed);
    sv_setup_free(s->context, &p.setup);
    return status;
}

static sv_threshold_question question_of(const ground *g, bool is_index, bool primary)
{
    const sv_sheet_question *q = g->question;
    return (sv_threshold_question){.size = sizeof(sv_threshold_question),
                                   .kind = q->of_mean ? SV_CRITERION_MEAN : SV_CRITERION_SHARE,
                                   .low = q->axis.values[0],
                                   .high = q->axis.values[1],
                                   .integer = q->axis.integer,
                                   .discrete = is_index,
                                   .clean = g->clean,
                                   .within = q->within,
                                   .share = q->share,
                                   .precision =
                                       q->axis.values[2] * (primary ? 1.0 : OTHERS_PRECISION),
                                   .confidence = q->confidence,
                                   .most = q->most};
}

static sv_status search_marker(ground *g, int marker, double clean, sv_tolerance_row *row)
{
    session *s = g->inquiry->s;
    const sv_sheet_question *q = g->question;
    const sv_marker *kind =
        &sv_marker_table(&(int){0})[s->points[0].problem.markers[marker].marker];
    g->marker = marker;
    g->clean = clean;
    g->of_mean = q->of_mean;
    g->by_index = !q->of_mean && !q->has_within && kind->is_index;
    g->within = q->has_within ? q->within : HALF_A_QUANTUM;
    row->marker = kind->kind.name;
    row->is_index = kind->is_index;
    row->primary = marker == q->marker;
    row->clean = clean;
    row->within = g->by_index ? (double)NAN : g->within;
    sv_threshold_question asked = question_of(g, kind->is_index, row->primary);
    return sv_threshold_search(s->context, &asked, respond, g, &row->answer);
}

/* The marker asked about first; the others on the same realisations and, where those do not lie
 * about their thresholds, on further ones. */
static sv_status search_flake(ground *g, const sv_tolerance_row *frame, bool others,
                              sv_tolerance_result *result)
{
    const int n = g->inquiry->s->points[0].problem.n_markers;
    double clean[SV_MAX_MARKERS];
    sv_status status = clean_values(g, clean);
    for (int k = 0; k < n && status == SV_OK; k++) {
        int marker = k == 0 ? g->question->marker : k <= g->question->marker ? k - 1 : k;
        if ((k > 0 && !others) || isnan(clean[marker]))
            continue;
        sv_tolerance_row row = *frame;
        status = search_marker(g, marker, clean[marker], &row);
        if (status == SV_UNDEFINED && !row.primary)
            status = SV_OK; /* no resolved values of another marker: no row */
        else if (status == SV_OK)
            result->rows[result->n_rows++] = row;
    }
    return status;
}

static sv_status search_all(inquiry *q, sv_tolerance_result *result)
{
    const sv_sheet_question *question = &q->s->base.question;
    int sizes = question->n_sizes > 0 ? question->n_sizes : 1;
    int seconds = question->budget.count > 0 ? (int)question->budget.count : 1;
    sv_status status = sv_take(q->s->context, (sv_index)sizes * seconds * SV_MAX_MARKERS,
                               sizeof *result->rows, &result->rows);
    for (int i = 0; i < sizes && status == SV_OK; i++)
        for (int k = 0; k < seconds && status == SV_OK; k++) {
            ground g = {.inquiry = q, .question = question};
            sv_tolerance_row frame = {0};
            if (question->n_sizes > 0) {
                memcpy(frame.cells, question->sizes[i], sizeof frame.cells);
                g.fixed[g.n_fixed++] =
                    (sv_assignment){.path = "flake.cells.0", .value = (double)frame.cells[0]};
                g.fixed[g.n_fixed++] =
                    (sv_assignment){.path = "flake.cells.1", .value = (double)frame.cells[1]};
            }
            if (question->budget.count > 0) {
                frame.has_second = true;
                frame.second = question->budget.values[k];
                g.fixed[g.n_fixed++] =
                    (sv_assignment){.path = question->budget.path, .value = frame.second};
            }
            status = search_flake(&g, &frame, question->budget.count == 0, result);
        }
    return status;
}

/* Shares of positions in cm⁻²: only where the parameter is such a share. */
static double per_area(const session *s)
{
    const sv_setup *setup = &s->base;
    const char *path = setup->question.axis.path;
    size_t length = strlen(path);
    if (setup->lattice_constant <= 0.0 || length < 15 || strncmp(path, "disorder.", 9) != 0 ||
        strcmp(path + length - 6, ".share") != 0)
        return 0.0;
    for (int k = 0; k < setup->n_disorder; k++) {
        const sv_disorder *d = &setup->disorder[k];
        if (strlen(d->name) != length - 15 || strncmp(d->name, path + 9, length - 15) != 0)
            continue;
        double positions = d->on < 0 ? setup->model.n_positions : 1;
        double area =
            sv_model_cell_area(&setup->model) * setup->lattice_constant * setup->lattice_constant;
        return 1e14 * positions / area;
    }
    return 0.0;
}

sv_status tolerance_search(inquiry *q, sv_tolerance_result *ret)
{
    const session *s = q->s;
    const sv_sheet_question *question = &s->base.question;
    const sv_sweep_axis *axis = &question->axis, *second = &question->budget;
    sv_tolerance_result result = {
        .title = s->base.title,
        .parameter = {axis->path, axis->unit, axis->unit_scale, axis->integer},
        .range = {axis->values[0], axis->values[1]},
        .precision = axis->values[2],
        .confidence = question->confidence,
        .quantity = s->markers[s->base.markers[question->marker].kind].name,
        .of_mean = question->of_mean,
        .within = question->within,
        .share = question->share,
        .per_area = per_area(s)};
    if (second->count > 0)
        result.second =
            (sv_shown_parameter){second->path, second->unit, second->unit_scale, second->integer};
    sv_status status = search_all(q, &result);
    result.realisations = q->computed;
    if (status == SV_OK && question->n_sizes > 1 && second->count == 0)
        tolerance_trend(&result);
    if (status == SV_OK)
        *ret = result;
    else
        tolerance_free(q->s->context, &result);
    return status;
}

void tolerance_free(sv_context *context, sv_tolerance_result *result)
{
    for (int k = 0; k < result->n_rows; k++)
        sv_threshold_free(context, &result->rows[k].answer);
    sv_give(context, result->rows);
    *result = (sv_tolerance_result){0};
}

/* Thresholds of the primary marker against 1/L. With three sizes or more the straight line is
 * tested; two carry no test and no extrapolation. */
void tolerance_trend(sv_tolerance_result *result)
{
    double x[SV_MAX_SIZES], y[SV_MAX_SIZES], error[SV_MAX_SIZES];
    sv_size_trend *t = &result->trend;
    int n = 0;
    t->asked = true;
    t->limit = t->standard_error = t->p_value = NAN;
    for (int k = 0; k < result->n_rows && n < SV_MAX_SIZES; k++) {
        const sv_tolerance_row *row = &result->rows[k];
        if (!row->primary || row->answer.state != SV_THRESHOLD_FOUND)
            continue;
        x[n] = 1.0 / sqrt((double)row->cells[0] * (double)row->cells[1]);
        y[n] = row->answer.value;
        error[n] = sv_threshold_error(&row->answer);
        n++;
    }
    if (n < 3) {
        snprintf(t->reason, sizeof t->reason,
                 "%d sizes with a threshold carry no extrapolation: a straight line in 1/L needs "
                 "three to be tested",
                 n);
        return;
    }
    sv_line line = sv_line_fit(x, y, error, n);
    t->limit = line.value;
    t->standard_error = line.value_error;
    t->p_value = line.p_value;
    t->exists = line.exists && line.p_value > 0.05;
    if (!t->exists)
        snprintf(t->reason, sizeof t->reason,
                 "the thresholds do not lie on a straight line in 1/L (p = %.2g)", line.p_value);
}
