/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The spectrum of one realisation on a terminal. */
#include <math.h>
#include <stdarg.h>
#include <stdio.h>

#include "present_internal.h"

enum { NAME_COLUMNS = 20, LINE_COLUMNS = 79, NUMBER_COLUMNS = 14 };

static void SV_PRINTF(3, 4) print_line(FILE *stream, const char *name, const char *format, ...)
{
    char text[512], fitted[512];
    va_list args;
    va_start(args, format);
    vsnprintf(text, sizeof text, format, args);
    va_end(args);
    fprintf(stream, "  ");
    sv_table_cell(stream, name, NAME_COLUMNS, false);
    sv_words_fit(text, LINE_COLUMNS - NAME_COLUMNS - 4, fitted, sizeof fitted);
    fprintf(stream, "%s\n", fitted);
}

/* A number, or "-" for one that does not exist; what is zero to rounding shows as zero. */
static void number(double value, double resolution, char *text, size_t size)
{
    if (isfinite(value))
        snprintf(text, size, "%.6g", fabs(value) <= resolution ? 0.0 : value);
    else
        snprintf(text, size, "-");
}

static void print_levels(const sv_spectrum *s, FILE *stream)
{
    char fermi[32], highest[32], lowest[32], gap[32];
    number(s->fermi_energy, s->resolution, fermi, sizeof fermi);
    number(s->highest_occupied, s->resolution, highest, sizeof highest);
    number(s->lowest_empty, s->resolution, lowest, sizeof lowest);
    number(s->gap, s->resolution, gap, sizeof gap);
    print_line(stream, "levels", s->exact ? "from %.6g to %.6g" : "between %.6g and %.6g",
               s->bounds[0] + 0.0, s->bounds[1] + 0.0);
    print_line(stream, "Fermi energy", "%s", fermi);
    if (s->states_below >= 0)
        print_line(stream, "states below it", "%lld of %lld", (long long)s->states_below,
                   (long long)s->sites);
    else
        print_line(stream, "states below it", "-");
    print_line(stream, "highest occupied", "%s", highest);
    print_line(stream, "lowest empty", "%s", lowest);
    print_line(stream, "gap", "%s", gap);
    /* In two lines where it is long. */
    char first[64];
    sv_words_fit(s->reason, LINE_COLUMNS - NAME_COLUMNS - 4, first, sizeof first);
    if (s->reason[0] != '\0' && sv_words_width(s->reason) <= LINE_COLUMNS - NAME_COLUMNS - 4)
        print_line(stream, "", "%s", first);
    else if (s->reason[0] != '\0')
        print_line(stream, "", "%s",
                   s->on_level ? "a level coincides with the Fermi energy" : first);
}

static void print_statistics(const sv_spectrum *s, FILE *stream)
{
    char ratio[48];
    sv_format_uncertain(s->gap_ratio, s->gap_ratio_error, ratio, sizeof ratio);
    print_line(stream, "adjacent-gap ratio", "%s over %d levels", ratio, s->gap_ratio_levels);
    print_line(stream, "", "0.3863 localised, 0.5996 extended (unitary)");
    print_line(stream, "density of states", "%lld energies, resolution %.2g",
               (long long)s->n_density, s->density_resolution);
    print_line(stream, "", "%s, largest error %.1g", s->method, s->density_error);
}

static void print_near(const sv_spectrum *s, FILE *stream)
{
    static const char *const heads[] = {"energy", "participation", "edge weight"};
    if (s->n_near == 0) {
        print_line(stream, "states next to it", "-");
        print_line(stream, "", "%s", s->near_reason);
        return;
    }
    fprintf(stream, "\n  states next to the Fermi energy\n  ");
    for (int k = 0; k < 3; k++)
        sv_table_cell(stream, heads[k], NUMBER_COLUMNS, true);
    fprintf(stream, "\n");
    for (int k = 0; k < s->n_near; k++) {
        const double values[] = {s->near[k].energy, s->near[k].participation,
                                 s->near[k].edge_weight};
        fprintf(stream, "  ");
        for (int c = 0; c < 3; c++) {
            char text[32];
            number(values[c], c == 0 ? s->resolution : 0.0, text, sizeof text);
            sv_table_cell(stream, text, NUMBER_COLUMNS, true);
        }
        fprintf(stream, "\n");
    }
}

void sv_spectrum_print(const sv_spectrum_result *result, bool colour, FILE *stream)
{
    const sv_spectrum *s = result->spectrum;
    sv_table_heading(stream, result->title[0] != '\0' ? result->title : "(no title)", colour);
    fprintf(stream, "  realisation %lld: %lld sites\n", (long long)result->realisation,
            (long long)s->sites);
    if (result->sample != NULL) {
        char words[300];
        sv_inventory_words(result->sample, words, sizeof words);
        fprintf(stream, "  %s\n", words);
    }
    fputc('\n', stream);
    print_levels(s, stream);
    print_statistics(s, stream);
    print_near(s, stream);
}
