/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The result of an ensemble as CSV: one row per point and marker. */
#include <math.h>
#include <stdio.h>
#include <string.h>

#include "present_internal.h"

/* A field that cannot end early, and that a spreadsheet does not take for a formula. */
static void add_field(sv_draft *text, const char *field)
{
    char clean[1024];
    sv_text_clean(field, clean, sizeof clean);
    const bool formula = clean[0] != '\0' && strchr("=+-@", clean[0]) != NULL;
    if (!formula && strpbrk(clean, ",\"") == NULL) {
        sv_draft_add(text, "%s", clean);
        return;
    }
    sv_draft_add(text, formula ? "\"'" : "\"");
    for (const char *c = clean; *c != '\0'; c++) {
        if (*c == '"')
            sv_draft_add_bytes(text, "\"", 1);
        sv_draft_add_bytes(text, c, 1);
    }
    sv_draft_add(text, "\"");
}

/* Is a window mean an estimate at any point? Then there is one more column. */
static bool any_estimated(const sv_result *result)
{
    for (int i = 0; i < result->n_points; i++)
        for (int j = 0; j < result->points[i].n_summaries; j++)
            if (sv_words_estimated(&result->points[i].summaries[j]))
                return true;
    return false;
}

/* An empty field for a number that does not exist. */
static void add_real(sv_draft *text, double value)
{
    char word[32];
    sv_draft_add(text, ",");
    if (!isfinite(value))
        return;
    sv_words_real(value, word, sizeof word);
    sv_draft_add(text, "%s", word);
}

static void add_head(sv_draft *text, const sv_result *result)
{
    char clean[512];
    sv_text_clean(result->title, clean, sizeof clean);
    sv_draft_add(text, "# %s\n", clean);
    sv_draft_add(
        text,
        "# Markers are dimensionless (Hall conductance in units of e^2/h; an index is the "
        "sum of integers over n).\n"
        "# Parameters are in the unit in brackets; without one, energies in the unit of the "
        "model, lengths in lattice constants, angles in radian; the width of box disorder is its "
        "full width.\n"
        "# mean: over resolved realisations; interval: of the mean, at `confidence`; "
        "bounds: of the mean if every unresolved one had its worst value; shares: "
        "index:count. Empty: does not exist (see reason).\n");
    if (!result->complete)
        sv_draft_add(text, "# Stopped early: some realisations are missing.\n");
    for (int i = 0; result->n_points > 0 && i < result->points[0].n_coordinates; i++) {
        const sv_coordinate *coordinate = &result->points[0].coordinates[i];
        for (int part = 0; part < (coordinate->pair ? 2 : 1); part++) {
            char column[512], path[256];
            sv_coordinate one = *coordinate;
            snprintf(path, sizeof path, "%.200s.%d", coordinate->path, part);
            one.path = coordinate->pair ? path : coordinate->path;
            sv_words_column(&one, column, sizeof column);
            add_field(text, column);
            sv_draft_add(text, ",");
        }
    }
    sv_draft_add(text, "marker,realisations,resolved,unresolved,mean,standard_error,interval_low,"
                       "interval_high,confidence,deviation");
    for (int i = 0; i < SV_N_QUANTILES; i++)
        sv_draft_add(text, ",quantile_%.2f", sv_quantile_levels()[i]);
    sv_draft_add(
        text,
        ",bounds_low,bounds_high,shares,numerical_error,estimator_error,"
        "%ssmallest_margin,engine,reason,skewness,corrected_low,corrected_high,bca_low,bca_high,"
        "warning\n",
        any_estimated(result) ? "disorder_deviation," : "");
}

/* Later columns of the table, behind those that were there first. */
static void add_spread(sv_draft *text, const sv_summary *summary)
{
    const double numbers[] = {summary->skewness, summary->interval_corrected[0],
                              summary->interval_corrected[1], summary->interval_bca[0],
                              summary->interval_bca[1]};
    const bool exists = summary->exists;
    for (size_t i = 0; i < sizeof numbers / sizeof *numbers; i++)
        add_real(text, exists && (i == 0 || !summary->is_index) ? numbers[i] : (double)NAN);
    sv_draft_add(text, ",");
    add_field(text, exists ? summary->warning : "");
}

static void add_row(sv_draft *text, const sv_point_result *point, const sv_summary *summary,
                    bool estimated)
{
    const double numbers[] = {summary->mean,        summary->standard_error, summary->interval[0],
                              summary->interval[1], summary->confidence,     summary->deviation};
    for (int i = 0; i < point->n_coordinates; i++) {
        for (int part = 0; part < (point->coordinates[i].pair ? 2 : 1); part++) {
            char word[40];
            sv_coordinate one = point->coordinates[i];
            one.value = part == 0 ? one.value : one.second;
            one.pair = false;
            sv_words_value(&one, word, sizeof word);
            sv_draft_add(text, "%s,", word);
        }
    }
    sv_draft_add(text, "%s,%lld,%lld,%lld", summary->marker, (long long)summary->realisations,
                 (long long)summary->resolved, (long long)summary->unresolved);
    for (size_t i = 0; i < sizeof numbers / sizeof *numbers; i++)
        add_real(text, summary->exists ? numbers[i] : (double)NAN);
    for (int i = 0; i < SV_N_QUANTILES; i++)
        add_real(text, summary->exists ? summary->quantiles[i] : (double)NAN);
    add_real(text, summary->exists ? summary->bounds[0] : (double)NAN);
    add_real(text, summary->exists ? summary->bounds[1] : (double)NAN);
    sv_draft_add(text, ",");
    for (int i = 0; i < summary->n_shares; i++)
        sv_draft_add(text, "%s%lld:%lld", i > 0 ? " " : "", (long long)summary->shares[i].index,
                     (long long)summary->shares[i].count);
    add_real(text, summary->numerical_error);
    add_real(text, summary->estimator_error);
    if (estimated)
        add_real(text, summary->exists ? summary->disorder_deviation : (double)NAN);
    add_real(text, summary->smallest_margin);
    sv_draft_add(text, ",");
    add_field(text, summary->engine);
    sv_draft_add(text, ",");
    add_field(text, !summary->exists          ? summary->reason
                    : summary->unresolved > 0 ? summary->unresolved_reason
                                              : "");
    add_spread(text, summary);
    sv_draft_add(text, "\n");
}

sv_status sv_result_csv(sv_context *context, const sv_result *result, char **ret_text)
{
    sv_draft text = {.context = context};
    const bool estimated = any_estimated(result);
    add_head(&text, result);
    for (int32_t i = 0; i < result->n_points; i++)
        for (int j = 0; j < result->points[i].n_summaries; j++)
            add_row(&text, &result->points[i], &result->points[i].summaries[j], estimated);
    return sv_draft_finish(&text, ret_text);
}
