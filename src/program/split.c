/* SPDX-License-Identifier: GPL-3.0-or-later */
/* A sampled window: would other numbers of columns and realisations give the same error for less
 * work? Costs from the trials of the forecast, scaled to what the realisations took. */
#include "program_internal.h"

#include <math.h>
#include <string.h>

/* Savings below this share are within the doubt of the costs. */
static const double WORTH_SAYING = 0.1;

static double sampled_columns(const sv_case *problem)
{
    const sv_projector_options *solve = &problem->solve;
    return solve->sampled_vectors > 0
               ? (double)solve->sampled_vectors
               : (double)solve->sampled_cells * problem->open_flake->model->n_orbitals;
}

static void set_columns(sv_case *problem, double columns)
{
    if (problem->solve.sampled_vectors > 0)
        problem->solve.sampled_vectors = (sv_index)columns;
    else
        problem->solve.sampled_cells = (sv_index)(columns / problem->open_flake->model->n_orbitals);
}

/* Columns of the whole window; vectors may be any number, but no more than those are of use. */
static sv_status window_columns(session *s, const sv_case *problem, int marker, double *ret)
{
    bool *inside = NULL;
    sv_index cells = 0;
    sv_status status = sv_flake_window(s->context, problem->open_flake,
                                       problem->markers[marker].values[0].real[0], &inside, &cells);
    sv_give(s->context, inside);
    if (status == SV_OK)
        *ret = (double)cells * problem->open_flake->model->n_orbitals;
    return status;
}

/* Cost of a realisation without columns, and of a column: the line through two forecasts. */
static sv_status split_costs(session *s, const point *p, cost_model *costs, sv_split *split)
{
    point other = *p;
    double one = 0.0, two = 0.0;
    set_columns(&other.problem, 2.0 * split->columns);
    sv_status status = cost_of_point(s, p, costs, &one);
    if (status == SV_OK)
        status = cost_of_point(s, &other, costs, &two);
    split->seconds_per_column = (two - one) / split->columns;
    split->seconds_fixed = fmax(0.0, one - (two - one));
    return status;
}

static sv_status split_prepare(session *s, const point *p, int marker, cost_model *costs,
                               sv_split *ret_split)
{
    sv_split split = {.columns = sampled_columns(&p->problem), .step = SV_PANEL_COLUMNS};
    sv_status status = window_columns(s, &p->problem, marker, &split.most);
    if (status == SV_OK)
        status = split_costs(s, p, costs, &split);
    if (status == SV_OK)
        *ret_split = split;
    return status;
}

static double mean_seconds(const sv_ensemble *ensemble, int32_t number, int64_t counted)
{
    double seconds = 0.0;
    for (int64_t k = 0; k < counted; k++) {
        const sv_kept_head *head = sv_ensemble_head(ensemble, number, k);
        seconds += head != NULL ? head->seconds : 0.0;
    }
    return seconds / (double)counted;
}

/* The smallest disorder these realisations could tell from none: the error of their variance. */
static double just_noticed(const sv_summary *summary)
{
    return summary->deviation * pow(2.0 / (double)(summary->resolved - 1), 0.25);
}

/* One point: fills its split when its window was sampled and the costs are known. */
static sv_status advise_point(session *s, const sv_ensemble *ensemble, int32_t number,
                              cost_model *costs, sv_point_result *result)
{
    const point *p = &s->points[number];
    int wanted = sv_marker_find("local_chern");
    for (int m = 0; m < result->n_summaries; m++) {
        const sv_summary *summary = &result->summaries[m];
        if (p->problem.markers[m].marker != wanted || !summary->exists || summary->resolved < 2 ||
            !(summary->estimator_error > 0.0) || sampled_columns(&p->problem) <= 0.0)
            continue;
        sv_split split;
        sv_status status = split_prepare(s, p, m, costs, &split);
        if (status != SV_OK)
            return status;
        double predicted = split.seconds_fixed + split.seconds_per_column * split.columns;
        double scale = mean_seconds(ensemble, number, result->realisations) / predicted;
        split.seconds_fixed *= scale;
        split.seconds_per_column *= scale;
        split.estimator_error = summary->estimator_error;
        split.disorder_deviation = fmax(summary->disorder_deviation, just_noticed(summary));
        result->has_split = sv_split_optimise(&split);
        result->split = split;
    }
    return SV_OK;
}

sv_status split_advise(session *s, const sv_ensemble *ensemble, sv_result *result)
{
    cost_model costs = {0};
    sv_status status = SV_OK;
    for (int32_t k = 0; status == SV_OK && k < result->n_points; k++)
        status = advise_point(s, ensemble, k, &costs, &result->points[k]);
    return status;
}

void split_tell(session *s, const sv_result *result)
{
    for (int32_t k = 0; k < result->n_points; k++) {
        const sv_split *split = &result->points[k].split;
        if (!result->points[k].has_split || split->work > 1.0 - WORTH_SAYING)
            continue;
        sv_log(s->context, SV_LOG_NOTE,
               "point %d: %.0f columns per realisation instead of %.0f and %.3g times as many "
               "realisations would give the same error for %.0f %% less work "
               "(solve.sampling_error: %.2g)",
               k, split->best_columns, split->columns, split->realisations,
               100.0 * (1.0 - split->work),
               s->base.sampling_error * sqrt(split->columns / split->best_columns));
    }
}

sv_status split_forecast(session *s, FILE *stream)
{
    cost_model costs = {0};
    int wanted = sv_marker_find("local_chern");
    for (int32_t k = 0; k < s->n_points; k++) {
        const point *p = &s->points[k];
        for (int m = 0; m < p->problem.n_markers; m++) {
            sv_split split;
            if (p->problem.markers[m].marker != wanted || sampled_columns(&p->problem) <= 0.0)
                continue;
            sv_status status = split_prepare(s, p, m, &costs, &split);
            if (status != SV_OK)
                return status;
            if (split.columns >= split.most || !(split.seconds_per_column > 0.0))
                continue;
            fprintf(
                stream,
                "# %.0f of %.0f window columns are sampled: the cheapest number if the disorder "
                "spreads the\n# window mean by about %.1g; average says what would be better\n",
                split.columns, split.most,
                s->base.sampling_error *
                    sqrt(split.seconds_fixed / split.seconds_per_column / split.columns));
            return SV_OK; /* the first such point stands for all */
        }
    }
    return SV_OK;
}
