/* SPDX-License-Identifier: GPL-3.0-or-later */
/* What `tolerance` found, for people: a table of thresholds and a closing paragraph. */
#include <math.h>
#include <stdarg.h>
#include <stdio.h>
#include <string.h>

#include "present_internal.h"

enum { COLUMNS = 79 };

/* "0.0931 [0.0902, 0.0960]" with as many digits as the interval carries. */
static void format_threshold(const sv_tolerance_result *result, const sv_threshold_answer *a,
                             char *text, size_t size)
{
    const double f = result->parameter.scale;
    const double half = 0.5 * f * (a->interval[1] - a->interval[0]);
    if (!isfinite(a->value)) {
        snprintf(text, size, "-");
        return;
    }
    int decimals = half > 0.0 ? 1 - (int)floor(log10(half)) : 3;
    decimals = decimals < 0 ? 0 : decimals > 9 ? 9 : decimals;
    snprintf(text, size, "%.*f [%.*f, %.*f]", decimals, f * a->value, decimals, f * a->interval[0],
             decimals, f * a->interval[1]);
}

static void place_words(const sv_tolerance_result *result, const sv_tolerance_row *row, char *text,
                        size_t size)
{
    text[0] = '\0';
    if (row->cells[0] > 0)
        snprintf(text, size, "%lld x %lld", (long long)row->cells[0], (long long)row->cells[1]);
    else if (row->has_second)
        snprintf(text, size, "%.6g%s%s", result->second.scale * row->second,
                 result->second.unit != NULL ? " " : "",
                 result->second.unit != NULL ? result->second.unit : "");
}

static void print_rows(const sv_tolerance_result *result, FILE *stream)
{
    const sv_tolerance_row *first = result->rows;
    const bool places = first->cells[0] > 0 || first->has_second;
    fprintf(stream, "  ");
    if (places)
        sv_table_cell(stream, first->cells[0] > 0 ? "cells" : result->second.path, 16, true);
    sv_table_cell(stream, "marker", 13, false);
    sv_table_cell(stream, "n", 7, true);
    fprintf(stream, "tolerable\n");
    for (int k = 0; k < result->n_rows; k++) {
        const sv_tolerance_row *row = &result->rows[k];
        char place[64], number[32], threshold[120];
        place_words(result, row, place, sizeof place);
        snprintf(number, sizeof number, "%lld", (long long)row->answer.responses);
        format_threshold(result, &row->answer, threshold, sizeof threshold);
        fprintf(stream, "  ");
        if (places)
            sv_table_cell(stream, place, 16, true);
        sv_table_cell(stream, row->marker, 13, false);
        sv_table_cell(stream, number, 7, true);
        fprintf(stream, "%s\n", threshold);
        if (row->answer.reason[0] != '\0')
            fprintf(stream, "      %.73s\n", row->answer.reason);
    }
}

/* ---- plain words, wrapped ---- */

typedef struct paragraph {
    FILE *stream;
    int column;
} paragraph;

static void say(paragraph *p, const char *format, ...) SV_PRINTF(2, 3);
static void say(paragraph *p, const char *format, ...)
{
    char text[700];
    va_list args;
    va_start(args, format);
    vsnprintf(text, sizeof text, format, args);
    va_end(args);
    for (char *rest = NULL, *word = strtok_r(text, " ", &rest); word != NULL;
         word = strtok_r(NULL, " ", &rest)) {
        const int width = sv_words_width(word);
        if (p->column > 0 && p->column + 1 + width > COLUMNS) {
            fprintf(p->stream, "\n");
            p->column = 0;
        }
        fprintf(p->stream, "%s%s", p->column > 0 ? " " : "", word);
        p->column += width + (p->column > 0);
    }
}

static void say_criterion(paragraph *p, const sv_tolerance_result *result,
                          const sv_tolerance_row *row, const char *end)
{
    const char *name = sv_words_marker(row->marker);
    if (result->of_mean)
        say(p, "the mean of the %s stays within %.3g of %.4g (the flake without disorder)%s", name,
            result->within, row->clean, end);
    else if (isnan(row->within))
        say(p, "at least %.3g %% of the samples have the %s %.0f of the flake without disorder%s",
            100.0 * result->share, name, row->clean, end);
    else
        say(p, "at least %.3g %% of the samples have a %s within %.3g of %.4g%s",
            100.0 * result->share, name, row->within, row->clean, end);
}

static void say_found(paragraph *p, const sv_tolerance_result *result, const sv_tolerance_row *row)
{
    char threshold[120];
    const char *unit = result->parameter.unit != NULL ? result->parameter.unit : "";
    const double f = result->per_area;
    const bool lab = f > 0.0 && row->answer.value > 0.0;
    format_threshold(result, &row->answer, threshold, sizeof threshold);
    if (row->has_second)
        say(p, "At %s = %.6g%s%s:", result->second.path, result->second.scale * row->second,
            result->second.unit != NULL ? " " : "",
            result->second.unit != NULL ? result->second.unit : "");
    say(p, "Up to %s = %s%s%s (%.3g %% confidence)", result->parameter.path, threshold,
        unit[0] != '\0' ? " " : "", unit, 100.0 * row->answer.confidence);
    say_criterion(p, result, row, lab ? "" : ".");
    if (lab)
        say(p, "- that is %.3g cm^-2 [%.3g, %.3g], the next defect %.3g nm away on average.",
            f * row->answer.value, f * row->answer.interval[0], f * row->answer.interval[1],
            0.5e7 / sqrt(f * row->answer.value));
}

static void say_state(paragraph *p, const sv_tolerance_result *result, const sv_tolerance_row *row)
{
    const double f = result->parameter.scale;
    const sv_threshold_answer *a = &row->answer;
    const sv_threshold_point *end =
        a->state == SV_THRESHOLD_NEVER ? &a->points[0] : &a->points[a->n_points - 1];
    if (a->state == SV_THRESHOLD_FOUND) {
        say_found(p, result, row);
        return;
    }
    say(p,
        a->state == SV_THRESHOLD_ALWAYS  ? "No limit found: over the whole range of %s"
        : a->state == SV_THRESHOLD_NEVER ? "Nothing is tolerable: already at the lowest %s "
                                           "it is not true that"
                                         : "Not decided: up to which %s",
        result->parameter.path);
    say_criterion(p, result, row, a->state == SV_THRESHOLD_UNDECIDED ? "" : ".");
    if (a->state == SV_THRESHOLD_UNDECIDED) {
        char threshold[120];
        format_threshold(result, a, threshold, sizeof threshold);
        say(p, "is known to %s only; raise question.most.", threshold);
    } else {
        say(p, "Evidence: at %.6g the %s is %.3g +- %.2g in %lld realisations (limit %.3g).",
            f * end->parameter,
            result->of_mean ? "distance of the mean from the clean value"
                            : "share of samples that do not meet it",
            end->measure, end->standard_error, (long long)end->responses,
            result->of_mean ? result->within : 1.0 - result->share);
    }
}

/* Where other markers give way, beside the one asked about. */
static void say_margins(paragraph *p, const sv_tolerance_result *result,
                        const sv_tolerance_row *main_row)
{
    const double f = result->parameter.scale;
    for (int k = 0; k < result->n_rows; k++) {
        const sv_tolerance_row *row = &result->rows[k];
        if (row->primary || row->cells[0] != main_row->cells[0] ||
            row->cells[1] != main_row->cells[1] || !isfinite(row->answer.value) ||
            !isfinite(main_row->answer.value))
            continue;
        const double margin = f * (row->answer.value - main_row->answer.value);
        say(p, "By the %s the same criterion lasts %.3g %s.", sv_words_marker(row->marker),
            fabs(margin), margin >= 0.0 ? "longer" : "less");
    }
}

static void say_doubts(paragraph *p, const sv_tolerance_result *result, const sv_tolerance_row *row)
{
    const sv_threshold_answer *a = &row->answer;
    if (a->re_enters)
        say(p,
            "The criterion holds again at %.6g: the value given is the first failure, not the "
            "only one.",
            result->parameter.scale * a->re_entry);
    else if (a->monotone_p < 0.01)
        say(p, "The response is not monotone (p = %.1e).", a->monotone_p);
    if (result->trend.asked && result->trend.exists)
        say(p, "Extrapolated to a large film: %.4g +- %.2g.",
            result->parameter.scale * result->trend.limit,
            result->parameter.scale * result->trend.standard_error);
    else if (result->trend.asked)
        say(p, "No extrapolation to a large film: %s.", result->trend.reason);
    else if (result->second.path == NULL && row->cells[0] == 0)
        say(p, "One flake size was asked: with another size or window the value moves; "
               "question.sizes shows how far.");
}

void sv_tolerance_print(const sv_tolerance_result *result, FILE *stream)
{
    const sv_tolerance_row *row = sv_tolerance_main(result);
    paragraph p = {stream, 0};
    char title[400];
    if (row == NULL)
        return;
    sv_words_fit(result->title, COLUMNS, title, sizeof title);
    if (title[0] != '\0')
        fprintf(stream, "%s\n", title);
    fprintf(stream, "tolerable %s%s%s%s, %.3g %% interval\n", result->parameter.path,
            result->parameter.unit != NULL ? " [" : "",
            result->parameter.unit != NULL ? result->parameter.unit : "",
            result->parameter.unit != NULL ? "]" : "", 100.0 * result->confidence);
    print_rows(result, stream);
    fprintf(stream, "\n");
    say_state(&p, result, row);
    say_margins(&p, result, row);
    say_doubts(&p, result, row);
    say(&p, "%lld realisations in all.", (long long)result->realisations);
    say(&p, "This describes the stated model, not a device: contacts, inelastic scattering and "
            "chemistry are left out, and the number releases nothing for use.");
    fprintf(stream, "\n");
}
