/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Many probes of the localizer: JSON, CSV, a few lines for a terminal. */
#include <math.h>

#include "present_internal.h"

static json_t *index_of(const sv_probe *p)
{
    return p->resolved ? json_integer((json_int_t)p->index) : json_null();
}

/* The parts every list of probes has. */
static void put_verdicts(sv_json *json, json_t *object, const sv_probe *probes, sv_index count)
{
    json_t *index = json_array(), *gap = json_array(), *resolved = json_array();
    json_t *reasons = json_array();
    for (sv_index k = 0; k < count; k++) {
        sv_json_push(json, index, index_of(&probes[k]));
        sv_json_push(json, gap, sv_json_real(probes[k].gap));
        sv_json_push(json, resolved, json_boolean(probes[k].resolved));
        sv_json_push(json, reasons,
                     probes[k].resolved ? json_null() : json_string(probes[k].reason));
    }
    sv_json_put(json, object, "index", index);
    sv_json_put(json, object, "gap", gap);
    sv_json_put(json, object, "resolved", resolved);
    sv_json_put(json, object, "reasons", reasons);
}

static json_t *make_between(sv_json *json, const sv_survey *s)
{
    json_t *object = json_object(), *low = json_array(), *high = json_array();
    json_t *constant = json_array();
    for (sv_index k = 0; k < s->n_between; k++) {
        sv_json_push(json, low, sv_json_real(s->between[k].low));
        sv_json_push(json, high, sv_json_real(s->between[k].high));
        sv_json_push(json, constant, json_boolean(s->between[k].constant));
    }
    sv_json_put(json, object, "gap_low", low);
    sv_json_put(json, object, "gap_high", high);
    sv_json_put(json, object, "index_constant", constant);
    return object;
}

static json_t *make_probes(sv_json *json, const sv_survey *s)
{
    const sv_index count = s->points[0] * s->points[1];
    json_t *object = json_object(), *points = json_array(), *x = json_array(), *y = json_array();
    json_t *withstands = json_array();
    sv_json_put_text(json, object, "form", s->line ? "line" : "grid");
    for (int d = 0; d < (s->line ? 1 : 2); d++)
        sv_json_push(json, points, json_integer((json_int_t)s->points[d]));
    sv_json_put(json, object, "points", points);
    sv_json_put_real(json, object, "kappa", s->kappa > 0.0 ? s->kappa : (double)NAN);
    sv_json_put_real(json, object, "threshold", s->threshold > 0.0 ? s->threshold : (double)NAN);
    for (sv_index k = 0; k < count; k++) {
        const sv_probe *p = &s->probes[k];
        sv_json_push(json, x, sv_json_real(p->at[0]));
        sv_json_push(json, y, sv_json_real(p->at[1]));
        sv_json_push(json, withstands, sv_json_real(p->resolved ? p->certain : (double)NAN));
    }
    sv_json_put(json, object, "x", x);
    sv_json_put(json, object, "y", y);
    put_verdicts(json, object, s->probes, count);
    sv_json_put(json, object, "withstands", withstands);
    sv_json_put(json, object, "between", make_between(json, s));
    return object;
}

static json_t *make_kappas(sv_json *json, const sv_survey *s)
{
    json_t *object = json_object(), *kappa = json_array(), *same = json_null();
    for (sv_index k = 0; k < s->n_kappas; k++)
        sv_json_push(json, kappa, sv_json_real(s->kappas[k].kappa));
    sv_json_put(json, object, "kappa", kappa);
    put_verdicts(json, object, s->kappas, s->n_kappas);
    if (s->steady[0] >= 0) {
        same = json_object();
        sv_json_put(json, same, "index", index_of(&s->kappas[s->steady[0]]));
        sv_json_put_real(json, same, "from", s->kappas[s->steady[0]].kappa);
        sv_json_put_real(json, same, "to", s->kappas[s->steady[1]].kappa);
        sv_json_put(json, same, "whole_range",
                    json_boolean(s->steady[1] - s->steady[0] + 1 == s->n_kappas));
    }
    sv_json_put(json, object, "same_index", same);
    if (s->steady[0] < 0)
        sv_json_put_text(json, object, "reason", "no kappa of the range gives a resolved index");
    return object;
}

void sv_survey_put(sv_json *json, json_t *marker, const sv_survey *survey)
{
    if (survey->points[0] > 0)
        sv_json_put(json, marker, "probes", make_probes(json, survey));
    if (survey->n_kappas > 0)
        sv_json_put(json, marker, "kappas", make_kappas(json, survey));
}

static void add_real(sv_draft *text, double value)
{
    char word[32] = "";
    if (isfinite(value))
        sv_words_real(value, word, sizeof word);
    sv_draft_add(text, "%s,", word);
}

sv_status sv_survey_csv(sv_context *context, const sv_survey *survey, char **ret_text)
{
    sv_draft text = {.context = context};
    sv_draft_add(&text, "x,y,kappa,index,gap,certain,resolved,reason\n");
    for (sv_index k = 0; k < survey->points[0] * survey->points[1]; k++) {
        const sv_probe *p = &survey->probes[k];
        add_real(&text, p->at[0]);
        add_real(&text, p->at[1]);
        add_real(&text, p->kappa);
        if (p->resolved)
            sv_draft_add(&text, "%lld", (long long)p->index);
        sv_draft_add(&text, ",");
        add_real(&text, p->gap);
        add_real(&text, p->certain);
        sv_draft_add(&text, "%d,", p->resolved ? 1 : 0);
        sv_draft_add(&text, p->resolved ? "\n" : "\"%s\"\n", p->reason);
    }
    return sv_draft_finish(&text, ret_text);
}

/* How many probes came out, with which indices, and where the gap is least. */
static void print_probes(const sv_survey *s, FILE *stream)
{
    const sv_index count = s->points[0] * s->points[1];
    sv_index resolved = 0, constant = 0;
    const sv_probe *weakest = NULL;
    for (sv_index k = 0; k < count; k++) {
        const sv_probe *p = &s->probes[k];
        resolved += p->resolved;
        if (p->resolved && (weakest == NULL || p->gap < weakest->gap))
            weakest = p;
    }
    for (sv_index k = 0; k < s->n_between; k++)
        constant += s->between[k].constant;
    if (s->line)
        fprintf(stream, "\n  localizer along a line of %lld points at kappa %.3g\n",
                (long long)count, s->kappa);
    else
        fprintf(stream, "\n  localizer over a grid of %lld x %lld points at kappa %.3g\n",
                (long long)s->points[0], (long long)s->points[1], s->kappa);
    fprintf(stream, "    resolved %lld of %lld; index certified between them in %lld of %lld %s\n",
            (long long)resolved, (long long)count, (long long)constant, (long long)s->n_between,
            s->line ? "pieces" : "cells");
    if (weakest != NULL)
        fprintf(stream,
                "    least gap of a resolved one %.3g at (%.4g, %.4g), where the index is %lld\n",
                weakest->gap, weakest->at[0], weakest->at[1], (long long)weakest->index);
}

/* A line is short enough to be shown point by point. */
static void print_rows(const sv_probe *probes, sv_index count, bool kappas, FILE *stream)
{
    enum { MOST_ROWS = 60 };
    sv_index each = (count + MOST_ROWS - 1) / MOST_ROWS;
    fprintf(stream, kappas ? "         kappa  index        gap\n"
                           : "             x          y  index        gap\n");
    for (sv_index k = 0; k < count; k += each) {
        const sv_probe *p = &probes[k];
        char index[24] = "-";
        if (p->resolved)
            snprintf(index, sizeof index, "%lld", (long long)p->index);
        if (kappas)
            fprintf(stream, "    %10.4g", p->kappa);
        else
            fprintf(stream, "    %10.4g %10.4g", p->at[0], p->at[1]);
        fprintf(stream, "  %5s %10.4g%s\n", index, p->gap, p->resolved ? "" : "  unresolved");
    }
}

void sv_survey_print(const sv_survey *survey, FILE *stream)
{
    if (survey->points[0] > 0)
        print_probes(survey, stream);
    if (survey->line && survey->points[0] > 0)
        print_rows(survey->probes, survey->points[0], false, stream);
    if (survey->n_kappas == 0)
        return;
    fprintf(stream, "\n  localizer against kappa\n");
    print_rows(survey->kappas, survey->n_kappas, true, stream);
    if (survey->steady[0] < 0)
        fprintf(stream, "    no kappa of the range gives a resolved index\n");
    else
        fprintf(stream, "    same index %lld over kappa %.4g to %.4g%s\n",
                (long long)survey->kappas[survey->steady[0]].index,
                survey->kappas[survey->steady[0]].kappa, survey->kappas[survey->steady[1]].kappa,
                survey->steady[1] - survey->steady[0] + 1 == survey->n_kappas ? ", the whole range"
                                                                              : "");
}
