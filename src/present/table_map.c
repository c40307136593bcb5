/* SPDX-License-Identifier: GPL-3.0-or-later */
/* One realisation on a terminal. */
#include <math.h>
#include <stdio.h>
#include <string.h>

#include "present_internal.h"

enum { NAME_COLUMNS = 20, LINE_COLUMNS = 79 };

static void print_line(FILE *stream, const char *name, const char *text)
{
    char fitted[512];
    fprintf(stream, "  ");
    sv_table_cell(stream, name, NAME_COLUMNS, false);
    sv_words_fit(text, LINE_COLUMNS - NAME_COLUMNS - 4, fitted, sizeof fitted);
    fprintf(stream, "%s\n", fitted);
}

static void print_window_mean(FILE *stream, const char *name, const sv_outcome *outcome)
{
    char text[256];
    if (outcome->window_cells == 0) {
        snprintf(text, sizeof text, "%.6g   (numerical error %.1g)", outcome->value + 0.0,
                 outcome->numerical_error);
        print_line(stream, name, text);
        return;
    }
    snprintf(text, sizeof text, "%.6g   mean over %lld cells, error %.1g", outcome->value + 0.0,
             (long long)outcome->window_cells, outcome->numerical_error);
    print_line(stream, name, text);
    if (outcome->estimator_error > 0.0) {
        snprintf(text, sizeof text, "%.2g   estimator error: the window is sampled",
                 outcome->estimator_error);
        print_line(stream, "", text);
    }
    if (!isfinite(outcome->sum_over_sites))
        return;
    snprintf(text, sizeof text, "%.2g   sum over all sites, zero on a finite flake",
             outcome->sum_over_sites + 0.0);
    print_line(stream, "", text);
}

/* What the verdict of a marker of the spin hangs on. */
static void print_spin_gap(FILE *stream, const sv_outcome *outcome)
{
    char text[100];
    snprintf(text, sizeof text, "    P sz P has a gap of %.3g about zero", outcome->margin);
    print_line(stream, "", text);
}

static bool is_of_spin(const sv_marker *marker)
{
    const char *margin = sv_words_margin(marker->kind.name);
    return margin != NULL && strcmp(margin, "spin_gap") == 0;
}

/* What the verdict of an index hangs on. */
static bool describe_margin(const char *marker, const sv_outcome *outcome, char *text, size_t size)
{
    if (strcmp(marker, "bott") == 0 && isfinite(outcome->weakest))
        snprintf(text, size, "    %.3g rad from pi; smallest modulus %.3g", outcome->margin,
                 outcome->weakest);
    else if (strcmp(marker, "density_response") == 0 && isfinite(outcome->margin))
        snprintf(text, size, "    nearest level %.3g off, moved by at most %.3g", outcome->margin,
                 outcome->weakest);
    else if (strcmp(marker, "spectral_flow") == 0 && isfinite(outcome->weakest))
        snprintf(text, size, "    levels found again to %.3g, crossing ones %.3g on their side",
                 outcome->weakest, outcome->margin);
    else if (isfinite(outcome->kappa))
        snprintf(text, size, "    localizer gap %.3g at kappa %.3g", outcome->margin,
                 outcome->kappa);
    else
        return false;
    return true;
}

static void print_index(FILE *stream, const char *marker, const sv_outcome *outcome)
{
    char text[256];
    snprintf(text, sizeof text, "%lld", (long long)outcome->index);
    print_line(stream, sv_words_marker(marker), text);
    if (describe_margin(marker, outcome, text, sizeof text))
        print_line(stream, "", text);
}

static void print_levels(FILE *stream, const sv_outcome *outcome)
{
    char text[256];
    if (!isfinite(outcome->highest_occupied) || !isfinite(outcome->lowest_empty))
        return;
    if (outcome->electrons < 0) {
        snprintf(text, sizeof text, "Fermi energy between the levels %.6g and %.6g",
                 outcome->highest_occupied, outcome->lowest_empty);
        print_line(stream, "", text);
        return;
    }
    snprintf(text, sizeof text, "%lld states filled up to %.6g, next at %.6g",
             (long long)outcome->electrons, outcome->highest_occupied, outcome->lowest_empty);
    print_line(stream, "", text);
}

/* How near to the Fermi energy the engine resolves levels, beside how near they are. */
static void print_resolution(FILE *stream, const sv_outcome *outcome)
{
    char text[100];
    if (!isfinite(outcome->unresolved_within) || strcmp(outcome->engine, "dense") == 0)
        return;
    if (outcome->unresolved_within > 0.0)
        snprintf(text, sizeof text, "levels within %.3g of the Fermi energy not resolved",
                 outcome->unresolved_within);
    else
        snprintf(text, sizeof text, "all levels resolved");
    print_line(stream, "", text);
    if (!isfinite(outcome->nearest_level))
        return;
    snprintf(text, sizeof text, "nearest level %.3g from the Fermi energy", outcome->nearest_level);
    print_line(stream, "", text);
}

static void print_outcome(FILE *stream, const sv_marker *marker, const sv_outcome *outcome)
{
    static const char *const words[] = {"", "unresolved", "does not exist", "failed"};
    const char *name = sv_words_marker(marker->kind.name);
    char text[300];
    if (outcome->verdict != SV_RESOLVED) {
        print_line(stream, name, words[outcome->verdict]);
        snprintf(text, sizeof text, "%s", outcome->reason);
        print_line(stream, "", text);
    } else if (marker->is_index) {
        print_index(stream, marker->kind.name, outcome);
    } else {
        print_window_mean(stream, name, outcome);
    }
    if (outcome->verdict == SV_RESOLVED && is_of_spin(marker) && isfinite(outcome->margin))
        print_spin_gap(stream, outcome);
    if (outcome->verdict == SV_RESOLVED || outcome->verdict == SV_UNRESOLVED)
        print_levels(stream, outcome);
    if (outcome->verdict == SV_RESOLVED)
        print_resolution(stream, outcome);
}

void sv_map_print(const sv_map_result *map, bool colour, FILE *stream)
{
    int count;
    const sv_marker *table = sv_marker_table(&count);
    const sv_record *record = map->record;
    sv_table_heading(stream, map->title[0] != '\0' ? map->title : "(no title)", colour);
    fprintf(stream, "  realisation %lld: %lld sites, %lld vacancies\n",
            (long long)record->realisation, (long long)record->sites, (long long)record->vacancies);
    if (map->sample != NULL) {
        char words[300];
        sv_inventory_words(map->sample, words, sizeof words);
        fprintf(stream, "  %s\n", words);
    }
    fputc('\n', stream);
    if (record->status != SV_OK)
        fprintf(stream, "  failed: %s\n", sv_status_text(record->status));
    for (int i = 0; i < record->n_outcomes && i < map->point->n_markers; i++)
        print_outcome(stream, &table[map->point->markers[i].marker], &record->outcomes[i]);
    if (map->coarse != NULL)
        sv_coarse_print(map->coarse, stream);
    if (map->survey != NULL)
        sv_survey_print(map->survey, stream);
    if (map->flow != NULL)
        fprintf(stream, "  spectral flow: at most %d levels followed over %d fluxes\n",
                map->flow->most, map->flow->fluxes);
}
