/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Summaries of all points of a run, in the form tables and figures take. */
#include "program_internal.h"

#include <math.h>
#include <string.h>

/* Sites and vacancies of the samples that count. */
static void mean_inventory(const sv_ensemble *ensemble, int32_t number, sv_point_result *ret)
{
    double sites = 0.0, vacancies = 0.0;
    for (int64_t k = 0; k < ret->realisations; k++) {
        const sv_kept_head *head = sv_ensemble_head(ensemble, number, k);
        sites += head != NULL ? (double)head->sites : 0.0;
        vacancies += head != NULL ? (double)head->vacancies : 0.0;
    }
    ret->mean_sites = ret->realisations > 0 ? sites / (double)ret->realisations : (double)NAN;
    ret->mean_vacancies =
        ret->realisations > 0 ? vacancies / (double)ret->realisations : (double)NAN;
}

static sv_status fill_point(session *s, const sv_ensemble *ensemble, const sv_stop_rule *stop,
                            int32_t number, sv_point_result *ret, bool *complete)
{
    const point *p = &s->points[number];
    bool settled;
    ret->n_coordinates = p->n_coordinates;
    memcpy(ret->coordinates, p->coordinates, sizeof ret->coordinates);
    ret->realisations = sv_ensemble_counted(ensemble, number, stop, &settled);
    *complete = *complete && settled;
    mean_inventory(ensemble, number, ret);
    for (int m = 0; m < p->problem.n_markers; m++) {
        sv_status status = sv_summarise(s->context, ensemble, &p->problem, number, m,
                                        ret->realisations, &ret->summaries[m]);
        if (status != SV_OK)
            return status;
        ret->n_summaries = m + 1;
    }
    return SV_OK;
}

/* Bootstrap intervals for all, unless that is more than a few seconds of random numbers. */
static sv_status add_bootstrap(session *s, const sv_ensemble *ensemble, sv_result *result)
{
    const int64_t resamples = 2000;
    const double most_draws = 5e8;
    double draws = 0.0;
    sv_status status = SV_OK;
    for (int32_t k = 0; k < result->n_points; k++)
        draws += (double)result->points[k].realisations * result->points[k].n_summaries;
    if (draws * (double)resamples > most_draws)
        return SV_OK;
    for (int32_t k = 0; status == SV_OK && k < result->n_points; k++)
        for (int m = 0; status == SV_OK && m < result->points[k].n_summaries; m++)
            status = sv_summary_bootstrap(s->context, ensemble, &s->points[k].problem, k, m,
                                          resamples, &result->points[k].summaries[m]);
    return status;
}

sv_status result_make(session *s, const sv_ensemble *ensemble, const sv_stop_rule *stop,
                      sv_result *ret)
{
    sv_result result = {.title = s->base.title, .n_points = s->n_points, .complete = true};
    sv_status status = sv_take(s->context, s->n_points, sizeof *result.points, &result.points);
    for (int32_t k = 0; status == SV_OK && k < s->n_points; k++)
        status = fill_point(s, ensemble, stop, k, &result.points[k], &result.complete);
    if (status == SV_OK)
        status = finite_size_make(s, ensemble, &result, &result.finite_size);
    if (status == SV_OK)
        status = add_bootstrap(s, ensemble, &result);
    if (status == SV_OK)
        status = comparisons_make(s, ensemble, &result);
    if (status != SV_OK) {
        result_free(s->context, &result);
        return status;
    }
    *ret = result;
    return SV_OK;
}

void result_free(sv_context *context, sv_result *result)
{
    for (int32_t k = 0; result->points != NULL && k < result->n_points; k++)
        for (int m = 0; m < result->points[k].n_summaries; m++)
            sv_summary_free(context, &result->points[k].summaries[m]);
    sv_give(context, result->points);
    if (result->finite_size != NULL)
        sv_scaling_free(context, &result->finite_size->scaling);
    sv_give(context, result->finite_size);
    sv_give(context, result->comparisons);
    *result = (sv_result){0};
}
