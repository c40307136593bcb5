/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The table of an ensemble on a terminal: one block per marker, at most 80 columns. */
#include <math.h>
#include <stdio.h>
#include <string.h>

#include "present_internal.h"

enum { UNRESOLVED_COLUMNS = 10, INTERVAL_COLUMNS = 21, LINE_COLUMNS = 79, FEW_VALUES = 10 };

/* Column widths: one parameter gets room for its whole name. */
typedef struct widths {
    int parameter, count, mean;
} widths;

static widths choose_widths(const sv_point_result *point)
{
    return point->n_coordinates < 2 ? (widths){18, 7, 13} : (widths){9, 6, 12};
}

/* The end of a path says most: "..vac.share". */
static void print_path(FILE *stream, const sv_coordinate *coordinate, int columns)
{
    char clean[512], text[80];
    sv_words_column(coordinate, clean, sizeof clean);
    const int width = sv_words_width(clean);
    const char *rest = clean;
    for (int cut = width - columns + 2; width > columns && cut > 0; cut--)
        sv_words_next(&rest);
    snprintf(text, sizeof text, "%s%.70s", rest != clean ? ".." : "", rest);
    sv_table_cell(stream, text, columns, true);
}

/* A number in a column: fewer digits rather than a cut exponent. */
static void print_number(FILE *stream, const char *exact, double value, int columns)
{
    char text[160];
    snprintf(text, sizeof text, "%s", exact);
    for (int digits = 12; digits > 0 && (int)strlen(text) > columns; digits--)
        snprintf(text, sizeof text, "%.*g", digits, value);
    sv_table_cell(stream, text, columns, true);
}

static void print_columns(FILE *stream, const sv_point_result *point, bool is_index)
{
    const widths w = choose_widths(point);
    fprintf(stream, "  ");
    for (int i = 0; i < point->n_coordinates; i++)
        print_path(stream, &point->coordinates[i], w.parameter);
    sv_table_cell(stream, "n", w.count, true);
    sv_table_cell(stream, "mean", w.mean, false);
    sv_table_cell(stream, is_index ? "most often [95 %]" : "95 % interval", INTERVAL_COLUMNS,
                  false);
    fprintf(stream, "unresolved\n");
}

static const sv_index_share *most_often(const sv_summary *summary)
{
    const sv_index_share *best = NULL;
    for (int i = 0; i < summary->n_shares; i++)
        if (best == NULL || summary->shares[i].count > best->count)
            best = &summary->shares[i];
    return best;
}

/* An interval with one digit more than its mean. */
static void format_pair(const double pair[2], double error, char *text, size_t size)
{
    if (!(error > 0)) {
        snprintf(text, size, "[%.6g, %.6g]", pair[0] + 0.0, pair[1] + 0.0);
        return;
    }
    int decimals = 1 - (int)floor(log10(error));
    decimals = decimals < 0 ? 0 : decimals > 5 ? 5 : decimals;
    snprintf(text, size, "[%.*f, %.*f]", decimals, pair[0] + 0.0, decimals, pair[1] + 0.0);
}

static void format_interval(const sv_summary *summary, char *text, size_t size)
{
    const sv_index_share *share = most_often(summary);
    if (summary->is_index && share != NULL)
        snprintf(text, size, "%lld: %.3g%% [%.3g, %.3g]", (long long)share->index,
                 100 * share->share, 100 * share->interval[0], 100 * share->interval[1]);
    else if (!summary->is_index && isfinite(summary->interval[0]))
        format_pair(summary->interval, summary->standard_error, text, size);
    else
        snprintf(text, size, "-");
}

/* A line of small print under a row. */
static void print_remark(FILE *stream, const char *remark)
{
    char fitted[512];
    sv_words_fit(remark, LINE_COLUMNS - 6, fitted, sizeof fitted);
    fprintf(stream, "      %s\n", fitted);
}

static void print_unresolved(FILE *stream, const sv_summary *summary, bool colour)
{
    char number[32], remark[512];
    snprintf(number, sizeof number, "%lld", (long long)summary->unresolved);
    if (strlen(number) > UNRESOLVED_COLUMNS)
        snprintf(number, sizeof number, "%.4g", (double)summary->unresolved);
    const bool mark = colour && summary->unresolved > 0;
    const int padding = UNRESOLVED_COLUMNS - (int)strlen(number);
    fprintf(stream, "%*s%s%s%s\n", padding > 0 ? padding : 0, "", mark ? "\033[33m" : "", number,
            mark ? "\033[0m" : "");
    if (!summary->exists || summary->unresolved == 0 || !summary->is_index)
        return;
    snprintf(remark, sizeof remark, "with the unresolved the mean lies between %.4g and %.4g",
             summary->bounds[0] + 0.0, summary->bounds[1] + 0.0);
    print_remark(stream, remark);
}

/* What the estimator of a sampled window adds to the spread, and what is left of it. */
static void print_estimator(FILE *stream, const sv_summary *summary)
{
    char remark[200];
    int used = snprintf(remark, sizeof remark, "estimator error %.2g per realisation",
                        summary->estimator_error);
    if (isfinite(summary->disorder_deviation))
        snprintf(remark + used, sizeof remark - (size_t)used, "; disorder alone spreads by %.2g",
                 summary->disorder_deviation);
    print_remark(stream, remark);
}

/* Why the interval of the row is not to be trusted, and what to use instead. That there are too few
 * values to tell is said once, under the table. */
static bool warns(const sv_summary *summary)
{
    return summary->exists && summary->warning[0] != '\0' && summary->resolved >= FEW_VALUES;
}

static void print_warning(FILE *stream, const sv_summary *summary)
{
    char remark[300], pair[80];
    if (!warns(summary))
        return;
    format_pair(summary->interval_corrected, summary->standard_error, pair, sizeof pair);
    if (isnan(summary->skewness))
        snprintf(remark, sizeof remark, "! all the same: others in up to %.2g %% may be unseen",
                 100.0 * (1.0 - pow(0.05, 1.0 / (double)summary->resolved)));
    else if (summary->peaks.apart)
        snprintf(remark, sizeof remark, "! two-peaked: use %s, or the histogram", pair);
    else
        snprintf(remark, sizeof remark, "! skewed (%.2g): use %s", summary->skewness, pair);
    print_remark(stream, remark);
}

static void print_row(FILE *stream, const sv_point_result *point, const sv_summary *summary,
                      bool colour)
{
    const widths w = choose_widths(point);
    char text[128];
    fprintf(stream, "  ");
    for (int i = 0; i < point->n_coordinates; i++) {
        sv_words_value(&point->coordinates[i], text, sizeof text);
        if (point->coordinates[i].pair)
            sv_table_cell(stream, text, w.parameter, true);
        else
            print_number(stream, text, point->coordinates[i].value, w.parameter);
    }
    snprintf(text, sizeof text, "%lld", (long long)summary->realisations);
    print_number(stream, text, (double)summary->realisations, w.count);
    if (!summary->exists) {
        fprintf(stream, "none\n");
        return;
    }
    sv_format_uncertain(summary->mean, summary->standard_error, text, sizeof text);
    sv_table_cell(stream, text, w.mean, false);
    format_interval(summary, text, sizeof text);
    sv_table_cell(stream, text, INTERVAL_COLUMNS, false);
    print_unresolved(stream, summary, colour);
    if (sv_words_estimated(summary))
        print_estimator(stream, summary);
    print_warning(stream, summary);
}

/* How far the index of the first point stays the one of most realisations. */
static void print_index_sentence(FILE *stream, const sv_result *result, int marker)
{
    const sv_index_share *first = most_often(&result->points[0].summaries[marker]);
    const sv_coordinate *last_good = &result->points[0].coordinates[0];
    char value[40], path[256];
    if (first == NULL || result->n_points < 2 || result->points[0].n_coordinates != 1)
        return;
    sv_words_fit(last_good->path, 24, path, sizeof path);
    for (int32_t i = 1; i < result->n_points; i++) {
        const sv_summary *summary = &result->points[i].summaries[marker];
        double share = 0;
        for (int k = 0; k < summary->n_shares; k++)
            if (summary->shares[k].index == first->index)
                share = summary->shares[k].share;
        if (share < 0.5) {
            sv_words_value(last_good, value, sizeof value);
            fprintf(stream, "  Most realisations have the index %lld up to %s = %s%s%s.\n",
                    (long long)first->index, path, value, last_good->unit != NULL ? " " : "",
                    last_good->unit != NULL ? last_good->unit : "");
            return;
        }
        last_good = &result->points[i].coordinates[0];
    }
    fprintf(stream, "  Most realisations have the index %lld at every point.\n",
            (long long)first->index);
}

/* The first reason of the block stands for all. */
static void print_reason(FILE *stream, const sv_result *result, int marker)
{
    char text[300];
    bool none = false, open = false;
    for (int32_t i = 0; i < result->n_points; i++) {
        const sv_summary *summary = &result->points[i].summaries[marker];
        if (!summary->exists && !none) {
            snprintf(text, sizeof text, "None: %s.", summary->reason);
            sv_table_wrapped(stream, text);
            none = true;
        } else if (summary->exists && summary->unresolved > 0 && !open) {
            snprintf(text, sizeof text, "Unresolved, for one: %s.", summary->unresolved_reason);
            sv_table_wrapped(stream, text);
            open = true;
        }
    }
}

static void print_block(FILE *stream, const sv_result *result, int marker, bool colour)
{
    const sv_summary *first = &result->points[0].summaries[marker];
    char heading[160];
    snprintf(heading, sizeof heading, "%s%s", sv_words_marker(first->marker),
             strcmp(first->marker, "local_chern") == 0 ? ", mean over the window" : "");
    fprintf(stream, "\n");
    sv_table_heading(stream, heading, colour);
    print_columns(stream, &result->points[0], first->is_index);
    for (int32_t i = 0; i < result->n_points; i++)
        print_row(stream, &result->points[i], &result->points[i].summaries[marker], colour);
    print_reason(stream, result, marker);
    if (first->is_index)
        print_index_sentence(stream, result, marker);
    sv_comparisons_sentence(result, first->marker, stream);
}

/* Warnings of the intervals, each explained once. */
static void print_legend_of_warnings(FILE *stream, const sv_result *result)
{
    bool uneven = false, few = false;
    for (int32_t k = 0; k < result->n_points; k++)
        for (int m = 0; m < result->points[k].n_summaries; m++) {
            const sv_summary *summary = &result->points[k].summaries[m];
            uneven = uneven || (warns(summary) && !isnan(summary->skewness));
            few = few || (summary->exists && !summary->is_index && summary->resolved > 1 &&
                          summary->resolved < FEW_VALUES);
        }
    if (uneven)
        fprintf(stream,
                "  !: the interval covers less than 95 %%; the one to use instead is corrected "
                "for\n  skewness (data/manual/statistics.md).\n");
    if (few)
        fprintf(stream, "  Fewer than 10 realisations do not show whether they are skewed: "
                        "their\n  intervals are for normal values.\n");
}

void sv_result_print(const sv_result *result, bool colour, FILE *stream)
{
    sv_table_heading(stream, result->title[0] != '\0' ? result->title : "(no title)", colour);
    if (result->n_points == 0) {
        fprintf(stream, "  nothing computed yet\n");
        return;
    }
    for (int i = 0; i < result->points[0].n_summaries; i++)
        print_block(stream, result, i, colour);
    if (result->finite_size != NULL)
        sv_scaling_print(result->finite_size, colour, stream);
    fprintf(stream, "\n  n: realisations; 0.9981(4) means 0.9981 with a standard error of 0.0004."
                    "\n  The interval is where the mean over all disorder lies with 95 %% "
                    "confidence.\n");
    print_legend_of_warnings(stream, result);
    if (!result->complete)
        fprintf(stream, "  Stopped early: some realisations are missing; the same command goes "
                        "on.\n");
}
