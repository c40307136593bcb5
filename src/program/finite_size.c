/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The curves of a sweep over sizes, handed to the study of finite sizes. */
#include "program_internal.h"

#include <math.h>
#include <string.h>

/* The values of a marker at one point; NaN where a realisation has none. */
static void take_values(const sv_ensemble *ensemble, int32_t number, int marker, int64_t counted,
                        int64_t realisations, double *values)
{
    for (int64_t k = 0; k < realisations; k++) {
        const sv_kept_outcome *o =
            k < counted ? sv_ensemble_outcome(ensemble, number, k, marker) : NULL;
        values[k] = o != NULL && o->verdict == SV_RESOLVED ? o->value : (double)NAN;
    }
}

/* A side of the flake; of an oblong one the side of the square with as many cells. */
static double size_of(const sv_coordinate *coordinate)
{
    return coordinate->pair ? sqrt(coordinate->value * coordinate->second) : coordinate->value;
}

static sv_status make(session *s, const sv_ensemble *ensemble, const sv_result *result,
                      sv_scaling_point *points, double *values, sv_finite_size *study)
{
    const sv_sheet_finite_size *f = &s->base.finite_size;
    const int marker = f->marker, parameter = 1 - f->size_axis;
    const int64_t realisations = ensemble->realisations;
    sv_scaling_options o = sv_scaling_options_default();
    sv_scaling_data data = {
        .points = points, .n_points = result->n_points, .realisations = realisations};
    for (int32_t k = 0; k < result->n_points; k++) {
        const sv_point_result *p = &result->points[k];
        const sv_summary *summary = &p->summaries[marker];
        points[k] = (sv_scaling_point){size_of(&p->coordinates[f->size_axis]),
                                       p->coordinates[parameter].value, values + k * realisations};
        take_values(ensemble, k, marker, p->realisations, realisations, values + k * realisations);
        data.quantum = summary->is_index ? 1.0 : 0.0;
        if (summary->exists && !summary->is_index && isfinite(summary->numerical_error))
            data.floor = fmax(data.floor, summary->numerical_error);
    }
    memcpy(o.range, f->range, sizeof o.range);
    o.order = f->order;
    o.correction = strcmp(f->correction, "fixed") == 0  ? SV_CORRECTION_FIXED
                   : strcmp(f->correction, "free") == 0 ? SV_CORRECTION_FREE
                                                        : SV_CORRECTION_NONE;
    o.exponent = isfinite(f->exponent) ? f->exponent : 0.0;
    o.resamples = f->resamples;
    o.confidence = f->confidence;
    o.seed = s->base.seed;
    study->marker = result->points[0].summaries[marker].marker;
    study->size = result->points[0].coordinates[f->size_axis];
    study->parameter = result->points[0].coordinates[parameter];
    return sv_scaling_study(s->context, &data, &o, &study->scaling);
}

sv_status finite_size_make(session *s, const sv_ensemble *ensemble, const sv_result *result,
                           sv_finite_size **ret_study)
{
    sv_scaling_point *points = NULL;
    double *values = NULL;
    sv_finite_size *study = NULL;
    if (!s->base.has_finite_size)
        return SV_OK;
    sv_status status = sv_take(s->context, result->n_points, sizeof *points, &points);
    if (status == SV_OK)
        status =
            sv_take(s->context, result->n_points * ensemble->realisations, sizeof *values, &values);
    if (status == SV_OK)
        status = sv_take(s->context, 1, sizeof *study, &study);
    if (status == SV_OK)
        status = make(s, ensemble, result, points, values, study);
    sv_give(s->context, points);
    sv_give(s->context, values);
    if (status == SV_OK)
        *ret_study = study;
    else
        sv_give(s->context, study);
    return status;
}
