/* SPDX-License-Identifier: GPL-3.0-or-later */
/* A study of finite sizes in documents and tables. */
#include <math.h>
#include <stdio.h>

#include "present_internal.h"

/* -------------------------------------------------------------------- JSON */

static json_t *make_estimate(sv_json *json, const sv_scaling_estimate *estimate)
{
    json_t *object = json_object();
    sv_json_put_real(json, object, "value", estimate->value);
    sv_json_put_real(json, object, "standard_error", estimate->standard_error);
    sv_json_put(json, object, "interval", sv_json_pair(json, estimate->interval));
    return object;
}

static json_t *make_crossing(sv_json *json, const sv_scaling_crossing *crossing)
{
    json_t *object = json_object();
    sv_json_put(json, object, "sizes", sv_json_pair(json, crossing->sizes));
    sv_json_put(json, object, "found", json_boolean(crossing->found));
    if (crossing->found) {
        sv_json_put(json, object, "at", make_estimate(json, &crossing->at));
        sv_json_put_real(json, object, "height", crossing->height);
    } else {
        sv_json_put(json, object, "at", json_null());
        sv_json_put_text(json, object, "reason", crossing->reason);
    }
    sv_json_put(json, object, "evidence", sv_json_pair(json, crossing->evidence));
    return object;
}

static json_t *make_without(sv_json *json, const sv_scaling_collapse *c)
{
    json_t *list = json_array();
    for (int i = 0; i < c->n_without; i++) {
        const sv_scaling_without *w = &c->without[i];
        json_t *object = json_object();
        sv_json_put_real(json, object, "size", w->size);
        sv_json_put_real(json, object, "critical", w->fitted ? w->critical : (double)NAN);
        sv_json_put_real(json, object, "nu", w->fitted ? w->nu : (double)NAN);
        if (w->fitted)
            sv_json_put(json, object, "shift", sv_json_pair(json, w->shift));
        else
            sv_json_put_text(json, object, "reason", "no fit without this size");
        sv_json_push(json, list, object);
    }
    return list;
}

static void put_fit(sv_json *json, json_t *object, const sv_scaling_collapse *c)
{
    sv_json_put(json, object, "critical", make_estimate(json, &c->critical));
    sv_json_put(json, object, "nu", make_estimate(json, &c->nu));
    if (isfinite(c->exponent.value))
        sv_json_put(json, object, "exponent", make_estimate(json, &c->exponent));
    sv_json_put_integer(json, object, "order", c->order);
    if (c->correction_order >= 0)
        sv_json_put_integer(json, object, "correction_order", c->correction_order);
    sv_json_put_integer(json, object, "points", c->n_points);
    sv_json_put_integer(json, object, "fitted_numbers", c->n_parameters);
    sv_json_put(json, object, "range", sv_json_pair(json, c->range));
    sv_json_put_real(json, object, "reach", c->reach);
    sv_json_put_real(json, object, "chi_square", c->chi_square);
    sv_json_put_integer(json, object, "degrees_of_freedom", c->degrees_of_freedom);
    sv_json_put_real(json, object, "scale", c->scale);
    sv_json_put_real(json, object, "effective_degrees_of_freedom", c->effective);
    sv_json_put_real(json, object, "p_value", c->p_value);
    sv_json_put_integer(json, object, "resamples", c->resamples);
    sv_json_put_integer(json, object, "failed", c->failed);
    sv_json_put(json, object, "without", make_without(json, c));
}

static json_t *make_collapse(sv_json *json, const sv_scaling_collapse *c)
{
    json_t *object = json_object(), *reasons = json_array();
    sv_json_put(json, object, "decided", json_boolean(c->decided));
    for (int i = 0; i < c->n_reasons; i++)
        sv_json_push(json, reasons, json_string(c->reasons[i]));
    sv_json_put(json, object, "reasons", reasons);
    if (c->fitted)
        put_fit(json, object, c);
    return object;
}

void sv_scaling_put(sv_json *json, json_t *document, const sv_finite_size *study)
{
    const sv_scaling *s = &study->scaling;
    json_t *object = json_object(), *crossings = json_array(), *sizes = json_array();
    sv_json_put_text(json, object, "marker", study->marker);
    sv_json_put_text(json, object, "size", study->size.path);
    sv_json_put_text(json, object, "parameter", study->parameter.path);
    if (study->parameter.unit != NULL)
        sv_json_put_text(json, object, "unit", study->parameter.unit);
    for (int i = 0; i < s->n_sizes; i++)
        sv_json_push(json, sizes, sv_json_real(s->sizes[i]));
    sv_json_put(json, object, "sizes", sizes);
    sv_json_put_real(json, object, "confidence", s->confidence);
    for (int i = 0; i < s->n_crossings; i++)
        sv_json_push(json, crossings, make_crossing(json, &s->crossings[i]));
    sv_json_put(json, object, "crossings", crossings);
    sv_json_put(json, object, "crossing", make_estimate(json, &s->crossing));
    sv_json_put_real(json, object, "drift", s->drift);
    sv_json_put_real(json, object, "drift_in_errors", s->drift_z);
    sv_json_put(json, object, "collapse", make_collapse(json, &s->collapse));
    sv_json_put(json, document, "finite_size", object);
}

/* ------------------------------------------------------------------- table */

/* A number in the unit of the parameter. */
static void with_unit(const sv_finite_size *study, const sv_scaling_estimate *estimate,
                      char text[80])
{
    char number[48];
    sv_format_uncertain(estimate->value, estimate->standard_error, number, sizeof number);
    const char *unit = study->parameter.unit;
    snprintf(text, 80, "%s%s%.20s", number, unit != NULL ? " " : "", unit != NULL ? unit : "");
}

static void print_crossings(FILE *stream, const sv_finite_size *study)
{
    const sv_scaling *s = &study->scaling;
    char text[400], at[80];
    for (int i = 0; i < s->n_crossings; i++) {
        const sv_scaling_crossing *c = &s->crossings[i];
        with_unit(study, &c->at, at);
        if (c->found)
            snprintf(text, sizeof text, "Sizes %.6g and %.6g cross at %s, height %.3g.",
                     c->sizes[0], c->sizes[1], at, c->height);
        else
            snprintf(text, sizeof text, "Sizes %.6g and %.6g: no crossing; %s.", c->sizes[0],
                     c->sizes[1], c->reason);
        sv_table_wrapped(stream, text);
    }
    if (isnan(s->crossing.value))
        return;
    with_unit(study, &s->crossing, at);
    snprintf(text, sizeof text, "p_c from crossings = %s (%.4g %%: %.5g to %.5g)%s", at,
             100.0 * s->confidence, s->crossing.interval[0], s->crossing.interval[1],
             isnan(s->drift_z)        ? "; whether it drifts with size cannot be told."
             : fabs(s->drift_z) > 2.0 ? ", of the largest pair: the crossings drift with size."
                                      : ", no drift with size within the errors.");
    sv_table_wrapped(stream, text);
}

static void print_collapse(FILE *stream, const sv_finite_size *study)
{
    const sv_scaling *s = &study->scaling;
    const sv_scaling_collapse *c = &s->collapse;
    char text[600], p[80], nu[48], y[48];
    with_unit(study, &c->critical, p);
    sv_format_uncertain(c->nu.value, c->nu.standard_error, nu, sizeof nu);
    sv_format_uncertain(c->exponent.value, c->exponent.standard_error, y, sizeof y);
    if (c->decided) {
        snprintf(text, sizeof text,
                 "Collapse: p_c = %s (%.5g to %.5g), nu = %s (%.3g to %.3g)%s%s; chi-square "
                 "%.3g for %d degrees of freedom, p-value %.2g with the correlations of the data; "
                 "order %d, %d means from %.5g to %.5g.",
                 p, c->critical.interval[0], c->critical.interval[1], nu, c->nu.interval[0],
                 c->nu.interval[1], isfinite(c->exponent.value) ? ", y = " : "",
                 isfinite(c->exponent.value) ? y : "", c->chi_square, c->degrees_of_freedom,
                 c->p_value, c->order, c->n_points, c->range[0], c->range[1]);
        sv_table_wrapped(stream, text);
        return;
    }
    for (int i = 0; i < c->n_reasons; i++) {
        snprintf(text, sizeof text, "%s%s.",
                 i == 0 ? "Collapse: the data cannot decide, because " : "Also: ", c->reasons[i]);
        sv_table_wrapped(stream, text);
    }
}

void sv_scaling_print(const sv_finite_size *study, bool colour, FILE *stream)
{
    char heading[512];
    snprintf(heading, sizeof heading, "Finite size: %.60s against %.100s, size = %.60s",
             sv_words_marker(study->marker), study->parameter.path, study->size.path);
    fprintf(stream, "\n");
    sv_table_heading(stream, heading, colour);
    print_crossings(stream, study);
    print_collapse(stream, study);
}
