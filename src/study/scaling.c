/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The study of finite sizes: crossings, collapse, bootstrap, each size left out, verdict. */
#include "scaling_internal.h"

#include <math.h>
#include <string.h>

enum { CURVE_POINTS = 201 };

sv_scaling_options sv_scaling_options_default(void)
{
    return (sv_scaling_options){.size = sizeof(sv_scaling_options),
                                .range = {(double)NAN, (double)NAN},
                                .resamples = 400,
                                .seed = 1,
                                .confidence = 0.95};
}

void sv_scaling_free(sv_context *context, sv_scaling *scaling)
{
    sv_give(context, scaling->rows);
    sv_give(context, scaling->curve);
    *scaling = (sv_scaling){0};
}

static sv_status check_options(sv_context *context, const sv_scaling_options *o)
{
    const bool some = isfinite(o->range[0]) || isfinite(o->range[1]);
    if (some && !(o->range[0] < o->range[1]))
        return SV_FAIL(context, SV_INVALID_INPUT, "%g to %g is no range of the parameter",
                       o->range[0], o->range[1]);
    if (o->order < 0 || o->order > SV_SCALING_ORDER)
        return SV_FAIL(context, SV_INVALID_INPUT, "an order of %d is not within 0 … %d", o->order,
                       SV_SCALING_ORDER);
    if (o->correction == SV_CORRECTION_FIXED && !(o->exponent > 0.0 && o->exponent < 100.0))
        return SV_FAIL(context, SV_INVALID_INPUT, "a correction exponent of %g is not above 0",
                       o->exponent);
    if (o->resamples < 50 || o->resamples > 1000000 || !(o->confidence > 0.5) ||
        !(o->confidence < 1.0))
        return SV_FAIL(context, SV_INVALID_INPUT,
                       "%d resamples for intervals at %g: at least 50, above 0.5 and below 1",
                       o->resamples, o->confidence);
    return SV_OK;
}

static sv_scaling_estimate no_estimate(void)
{
    return (sv_scaling_estimate){(double)NAN, (double)NAN, {(double)NAN, (double)NAN}};
}

static void start(const scaling_table *t, const sv_scaling_options *o, sv_scaling *s)
{
    *s = (sv_scaling){.confidence = o->confidence,
                      .n_sizes = t->n_sizes,
                      .least = t->least,
                      .most = t->most,
                      .drift = (double)NAN,
                      .drift_z = (double)NAN,
                      .crossing = no_estimate()};
    memcpy(s->sizes, t->sizes, sizeof s->sizes);
    s->collapse.critical = s->collapse.nu = s->collapse.exponent = no_estimate();
    s->collapse.p_value = s->collapse.chi_square = s->collapse.reach = NAN;
    s->collapse.correction_order = -1;
}

static void take_fit(const scaling_work *w, const scaling_fit *fit, const scaling_quality *quality,
                     sv_scaling_collapse *c)
{
    const scaling_table *t = w->table;
    c->fitted = fit->converged;
    if (!fit->converged)
        return;
    c->critical.value = fit->parameters[0];
    c->nu.value = 1.0 / fit->parameters[1];
    if (fit->model.free_exponent)
        c->exponent.value = fit->parameters[2];
    c->order = fit->model.order;
    c->correction_order = fit->model.correction_order;
    c->n_points = (int)w->n;
    c->n_parameters = fit->n_parameters;
    c->chi_square = fit->chi_square;
    c->degrees_of_freedom = c->n_points - c->n_parameters;
    c->scale = quality->scale;
    c->effective = quality->effective;
    c->p_value = quality->p_value;
    c->range[0] = INFINITY;
    c->range[1] = -INFINITY;
    for (sv_index i = 0; i < w->n; i++) {
        c->range[0] = fmin(c->range[0], t->parameter[w->rows[i]]);
        c->range[1] = fmax(c->range[1], t->parameter[w->rows[i]]);
    }
}

/* (p − p_c) L^{1/ν} */
static double abscissa(const scaling_fit *fit, double size, double parameter)
{
    return (parameter - fit->parameters[0]) * pow(size, fit->parameters[1]);
}

static sv_status take_rows(sv_context *context, const scaling_work *w, const scaling_fit *fit,
                           sv_scaling *s)
{
    const scaling_table *t = w->table;
    sv_index used = 0;
    sv_status status = sv_take(context, t->n, sizeof *s->rows, &s->rows);
    s->n_rows = status == SV_OK ? t->n : 0;
    s->collapse.reach = 0.0;
    for (sv_index i = 0; i < s->n_rows; i++) {
        sv_scaling_row *row = &s->rows[i];
        *row = (sv_scaling_row){t->size[i],  t->parameter[i], t->mean[i],  t->error[i], false,
                                (double)NAN, (double)NAN,     (double)NAN, (double)NAN};
        if (!fit->converged)
            continue;
        row->used = used < w->n && w->rows[used] == i;
        used += row->used;
        double correction =
            sv_scaling_correction(&fit->model, fit->parameters, row->size, row->parameter);
        double all =
            sv_scaling_value(&fit->model, fit->parameters, row->size, row->parameter, NULL);
        row->x = abscissa(fit, row->size, row->parameter);
        row->collapsed = row->mean - correction;
        row->fitted = all - correction;
        row->residual = (row->mean - all) / row->standard_error;
        if (row->used)
            s->collapse.reach = fmax(s->collapse.reach, fabs(row->x));
    }
    return status;
}

/* F over the x that are used, through the largest size. */
static sv_status take_curve(sv_context *context, const scaling_fit *fit, sv_scaling *s)
{
    double lo = INFINITY, hi = -INFINITY;
    sv_status status = sv_take(context, 2 * CURVE_POINTS, sizeof *s->curve, &s->curve);
    if (status != SV_OK)
        return status;
    s->n_curve = CURVE_POINTS;
    for (sv_index i = 0; i < s->n_rows; i++)
        if (s->rows[i].used) {
            lo = fmin(lo, s->rows[i].x);
            hi = fmax(hi, s->rows[i].x);
        }
    const double largest = fit->model.largest, growth = pow(largest, fit->parameters[1]);
    for (int i = 0; i < CURVE_POINTS; i++) {
        double x = lo + (hi - lo) * i / (CURVE_POINTS - 1), p = fit->parameters[0] + x / growth;
        s->curve[2 * i] = x;
        s->curve[2 * i + 1] = sv_scaling_value(&fit->model, fit->parameters, largest, p, NULL) -
                              sv_scaling_correction(&fit->model, fit->parameters, largest, p);
    }
    return SV_OK;
}

/* The fit without one size, and how far it moves in units of what that may move by chance. */
static void leave_out(scaling_work *w, const scaling_fit *fit, const double *whole, double *part,
                      int size, sv_scaling *s)
{
    const scaling_table *t = w->table;
    sv_scaling_without *without = &s->collapse.without[s->collapse.n_without++];
    scaling_fit next = *fit;
    *without = (sv_scaling_without){.size = t->sizes[size]};
    sv_scaling_select(w, s->collapse.range[0], s->collapse.range[1], size);
    if (w->n <= fit->n_parameters)
        return;
    sv_scaling_descend(w, t->mean, &next);
    if (!next.converged || !sv_scaling_gain(w, &next, part))
        return;
    without->fitted = true;
    without->critical = next.parameters[0];
    without->nu = 1.0 / next.parameters[1];
    for (sv_index i = 0; i < 2 * t->n; i++)
        part[i] -= whole[i];
    for (int j = 0; j < 2; j++) {
        const double *d = part + j * t->n;
        double shift = next.parameters[j] - fit->parameters[j], variance = 0.0;
        for (sv_index a = 0; a < t->n; a++)
            for (sv_index b = 0; b < t->n; b++)
                variance += d[a] * d[b] * t->covariance[a * t->n + b];
        without->shift[j] = variance > 0.0 ? shift / sqrt(variance) : 0.0;
    }
}

static sv_status leave_each_out(sv_context *context, scaling_work *w, const scaling_fit *fit,
                                sv_scaling *s)
{
    const scaling_table *t = w->table;
    double *gain = NULL;
    if (!fit->converged || t->n_sizes < 3)
        return SV_OK;
    sv_status status = sv_take(context, 4 * t->n, sizeof *gain, &gain);
    if (status != SV_OK)
        return status;
    if (sv_scaling_gain(w, fit, gain))
        for (int size = 0; size < t->n_sizes; size++)
            leave_out(w, fit, gain, gain + 2 * t->n, size, s);
    sv_scaling_select(w, s->collapse.range[0], s->collapse.range[1], -1);
    sv_give(context, gain);
    return SV_OK;
}

static int64_t least_values(const scaling_work *w)
{
    int64_t least = INT64_MAX;
    for (sv_index i = 0; i < w->n; i++) {
        const double *values = w->table->values[w->rows[i]];
        int64_t count = 0;
        for (int64_t k = 0; k < w->table->realisations; k++)
            count += isfinite(values[k]) != 0;
        least = count < least ? count : least;
    }
    return least;
}

static sv_status study(sv_context *context, scaling_table *t, scaling_work *w,
                       const sv_scaling_options *o, sv_scaling *s)
{
    scaling_pair pairs[SV_SCALING_SIZES], widest_pair = {0};
    sv_scaling_crossing widest = {0};
    scaling_fit fit = {0};
    scaling_quality quality = {0};
    sv_status status = SV_OK;
    start(t, o, s);
    s->n_crossings = t->n_sizes - 1;
    for (int k = 0; status == SV_OK && k < s->n_crossings; k++)
        status = sv_scaling_cross(context, t, k, k + 1, &pairs[k], &s->crossings[k]);
    if (status == SV_OK && t->n_sizes > 1)
        status = sv_scaling_cross(context, t, 0, t->n_sizes - 1, &widest_pair, &widest);
    double guess = widest.found ? widest.at.value : t->parameter[t->first[0]];
    if (status == SV_OK && t->n_sizes > 1)
        status = sv_scaling_choose(context, w, o, guess, &fit, &quality);
    if (status != SV_OK)
        return status;
    take_fit(w, &fit, &quality, &s->collapse);
    status = sv_scaling_resample(context, t, w, o, pairs, &fit, s);
    if (status == SV_OK)
        status = leave_each_out(context, w, &fit, s);
    if (status == SV_OK)
        status = take_rows(context, w, &fit, s);
    if (status == SV_OK && fit.converged)
        status = take_curve(context, &fit, s);
    if (status == SV_OK)
        sv_scaling_refuse(s, o, &widest, least_values(w));
    return status;
}

sv_status sv_scaling_study(sv_context *context, const sv_scaling_data *data,
                           const sv_scaling_options *options, sv_scaling *ret_scaling)
{
    scaling_table table = {0};
    scaling_work work = {0};
    sv_scaling scaling = {0};
    sv_status status = check_options(context, options);
    if (status == SV_OK)
        status = sv_scaling_table_make(context, data, options->range, &table);
    if (status == SV_OK)
        status = sv_scaling_work_make(context, &table, &work);
    if (status == SV_OK)
        status = study(context, &table, &work, options, &scaling);
    sv_scaling_work_free(context, &work);
    sv_scaling_table_free(context, &table);
    if (status == SV_OK)
        *ret_scaling = scaling;
    else
        sv_scaling_free(context, &scaling);
    return status;
}
