/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Markers along a sweep: one panel per marker over a shared axis. */
#include <math.h>
#include <stdio.h>
#include <string.h>

#include "figure_internal.h"

static const double width_cm = 8.6, left_cm = 1.35, right_cm = 0.95, foot_cm = 1.15;
static const double panel_cm = 3.3, gap_cm = 0.3, top_air_cm = 0.15;

/* Okabe and Ito's colours for all readers, each with a mark of its own. */
static const struct {
    const char *colour;
    int mark;
} styles[] = {{"#0072b2", 7},  {"#d55e00", 5},  {"#009e73", 9}, {"#cc79a7", 13},
              {"#e69f00", 11}, {"#56b4e9", 15}, {"#000000", 6}, {"#666666", 4}};

/* The shortest text of a number; NaN where there is none. */
static void add_number(sv_draft *text, double value)
{
    char word[32];
    if (!isfinite(value))
        snprintf(word, sizeof word, "NaN");
    else
        sv_words_real(value, word, sizeof word);
    sv_draft_add(text, " %s", word);
}

/* A bar is drawn where it exists and is not a point. */
static void add_bar(sv_draft *text, double low, double high)
{
    const bool drawn = isfinite(low) && isfinite(high) && high > low;
    add_number(text, drawn ? low : (double)NAN);
    add_number(text, drawn ? high : (double)NAN);
}

/* Power of ten taken out of the axis when its numbers are too long for tick labels. */
static int axis_exponent(const sv_result *result)
{
    double largest = 0.0;
    for (int32_t i = 0; i < result->n_points; i++)
        largest = fmax(largest, fabs(result->points[i].coordinates[0].value));
    bool short_enough = largest == 0.0 || (largest < 1e5 && largest >= 1e-3);
    return short_enough ? 0 : (int)floor(log10(largest));
}

static double axis_value(const sv_result *result, int32_t point)
{
    return result->points[point].coordinates[0].value / pow(10.0, axis_exponent(result));
}

/* cm^-2 as cm⁻², and the power of ten in the same way. */
static void raise_exponents(const char *plain, char *text, size_t size)
{
    static const char *const raised[] = {"\u2070", "\u00b9", "\u00b2", "\u00b3", "\u2074",
                                         "\u2075", "\u2076", "\u2077", "\u2078", "\u2079"};
    size_t used = 0;
    bool up = false;
    for (; *plain != '\0' && used + 5 < size; plain++) {
        if (*plain == '^') {
            up = true;
            continue;
        }
        up = up && (*plain == '-' || (*plain >= '0' && *plain <= '9'));
        char one[2] = {*plain, '\0'};
        const char *sign = !up ? one : *plain == '-' ? "\u207b" : raised[*plain - '0'];
        used += (size_t)snprintf(text + used, size - used, "%s", sign);
    }
    text[used] = '\0';
}

/* "vacancy density (growth) [10¹³ cm⁻²]" */
static void axis_name(const sv_result *result, char *text, size_t size)
{
    const sv_coordinate *c = &result->points[0].coordinates[0];
    char plain[400], power[440];
    int exponent = axis_exponent(result);
    sv_words_parameter(c, plain, sizeof plain);
    if (exponent != 0 && c->unit != NULL && strrchr(plain, '[') != NULL) {
        int head = (int)(strrchr(plain, '[') - plain);
        snprintf(power, sizeof power, "%.*s[10^%d %s", head, plain, exponent, plain + head + 1);
    } else if (exponent != 0) {
        snprintf(power, sizeof power, "%s [10^%d]", plain, exponent);
    } else {
        snprintf(power, sizeof power, "%s", plain);
    }
    raise_exponents(power, text, size);
}

static void add_block(sv_draft *text, const sv_result *result, int marker)
{
    sv_draft_add(text, "\n\n# %s\n", result->points[0].summaries[marker].marker);
    for (int32_t i = 0; i < result->n_points; i++) {
        const sv_summary *s = &result->points[i].summaries[marker];
        sv_draft_add(text, "%.12g", axis_value(result, i));
        add_number(text, s->exists ? s->mean : (double)NAN);
        add_bar(text, s->exists ? s->interval[0] : (double)NAN, s->interval[1]);
        add_bar(text, s->exists && s->unresolved > 0 ? s->bounds[0] : (double)NAN, s->bounds[1]);
        sv_draft_add(text, " %lld %lld\n", (long long)s->unresolved, (long long)s->realisations);
    }
}

static sv_status write_data(sv_figure *figure, const sv_result *result, sv_figure_files *files)
{
    sv_draft text = {.context = figure->context};
    char *data = NULL;
    sv_draft_add(&text, "# Means over disorder. NaN: does not exist.\n"
                        "# Columns: parameter, mean, interval of the mean, bounds with the "
                        "unresolved, unresolved, n.\n");
    for (int i = 0; i < result->points[0].n_summaries; i++)
        add_block(&text, result, i);
    const size_t size = (size_t)text.size;
    sv_status status = sv_draft_finish(&text, &data);
    if (status == SV_OK)
        status = sv_figure_write(figure, ".dat", data, size, files->data);
    sv_give(figure->context, data);
    return status;
}

static void widen(double range[2], double value)
{
    if (!isfinite(value))
        return;
    range[0] = fmin(range[0], value);
    range[1] = fmax(range[1], value);
}

/* All that is drawn, the integer the sweep starts from, and some air. */
static void choose_range(const sv_result *result, int marker, double range[2])
{
    range[0] = INFINITY;
    range[1] = -INFINITY;
    for (int32_t i = 0; i < result->n_points; i++) {
        const sv_summary *s = &result->points[i].summaries[marker];
        if (!s->exists)
            continue;
        if (range[0] > range[1])
            widen(range, round(s->mean));
        widen(range, s->mean);
        widen(range, s->interval[0]);
        widen(range, s->interval[1]);
        if (s->unresolved > 0) {
            widen(range, s->bounds[0]);
            widen(range, s->bounds[1]);
        }
    }
    if (range[0] > range[1])
        range[0] = range[1] = 0;
    if (result->points[0].summaries[marker].is_index) { /* a constant index is shown beside 0 */
        widen(range, 0.0);
        widen(range, range[0] < 0.0 ? 0.0 : 1.0);
    }
    const double air = fmax(0.08 * (range[1] - range[0]), 0.01);
    range[0] -= air;
    range[1] += air;
}

/* Thin lines at the integers, named outside the frame where no curve runs. */
static void add_integers(sv_draft *script, const char *marker, const double range[2])
{
    const char *symbol = sv_words_symbol(marker);
    const int first = (int)ceil(range[0]), last = (int)floor(range[1]);
    const int step = (last - first) / 8 + 1;
    sv_draft_add(script, "unset arrow\n");
    for (int k = first; k <= last; k += step)
        sv_draft_add(script,
                     "set arrow %d from graph 0,first %d to graph 1,first %d nohead lc rgb "
                     "'#808080' lw 0.5 dt (6,4) back\n"
                     "set label %d '%s = %s%d' at graph 1.02,first %d left font 'Helvetica,7' tc "
                     "rgb '#505050'\n",
                     40 + k - first, k, k, 40 + k - first, symbol, k < 0 ? "\xE2\x88\x92" : "",
                     k < 0 ? -k : k, k);
}

static void add_panel_plot(sv_draft *script, const sv_figure *figure, const sv_summary *summary,
                           int number)
{
    const char *colour = styles[number % 8].colour, *marker = summary->marker;
    sv_draft_add(script, "plot \\\n");
    if (summary->is_index)
        sv_draft_add(script,
                     "  '%s.dat' index '%s' using 1:5:(0):($6-$5) with vectors nohead lc rgb "
                     "'#b8b8b8' lw 3 notitle, \\\n",
                     figure->name, marker);
    /* Bars as arrows with flat ends: error-bar styles would cut gaps around the marks. */
    sv_draft_add(script,
                 "  '%s.dat' index '%s' using 1:2 with lines lc rgb '%s' lw 0.5 notitle, \\\n"
                 "  '%s.dat' index '%s' using 1:3:(0):($4-$3) with vectors heads size graph "
                 "0.008,90 lc rgb '%s' lw 0.8 notitle, \\\n"
                 "  '%s.dat' index '%s' using 1:2 with points lc rgb '%s' pt %d ps 0.45 notitle\n",
                 figure->name, marker, colour, figure->name, marker, colour, figure->name, marker,
                 colour, styles[number % 8].mark);
}

static void add_panel(sv_figure *figure, const sv_result *result, int number, double top_cm,
                      bool lowest)
{
    const sv_summary *summary = &result->points[0].summaries[number];
    sv_draft *script = &figure->script;
    const double h = figure->height_cm;
    double range[2];
    char literal[256];
    choose_range(result, number, range);
    sv_script_literal(sv_words_marker(summary->marker), literal, sizeof literal);
    sv_draft_add(script,
                 "set tmargin at screen %.5f\nset bmargin at screen %.5f\n"
                 "set yrange [%.9g:%.9g]\nset ylabel %s offset 1.2,0\n",
                 top_cm / h, (top_cm - panel_cm) / h, range[0], range[1], literal);
    add_integers(script, summary->marker, range);
    if (lowest)
        sv_draft_add(script, "set format x '%%g'\nset xlabel xname offset 0,0.4\n");
    else
        sv_draft_add(script, "set format x ''\nunset xlabel\n");
    add_panel_plot(script, figure, summary, number);
    sv_draft_add(script, "unset label\n");
}

static void add_axis(sv_figure *figure, const sv_result *result)
{
    double low = INFINITY, high = -INFINITY;
    for (int32_t i = 0; i < result->n_points; i++) {
        low = fmin(low, axis_value(result, i));
        high = fmax(high, axis_value(result, i));
    }
    const double air = high > low ? 0.04 * (high - low) : 1;
    const double w = figure->width_cm;
    sv_draft_add(&figure->script,
                 "set lmargin at screen %.5f\nset rmargin at screen %.5f\nset xrange [%.9g:%.9g]\n"
                 "set border 31 lw 0.6\nunset key\nset tics scale 0.5 "
                 "in\nset mxtics 2\nset mytics 2\n"
                 "set ytics offset 0.4,0\nset xtics offset 0,0.2\n",
                 left_cm / w, 1 - right_cm / w, low - air, high + air);
}

static void add_script(sv_figure *figure, const sv_result *result, const sv_headline *headline)
{
    sv_draft *script = &figure->script;
    const int n = result->points[0].n_summaries;
    char name[400], literal[500];
    axis_name(result, name, sizeof name);
    sv_script_literal(name, literal, sizeof literal);
    sv_draft_add(script,
                 "# Markers along a sweep; draw it again with: gnuplot %s.gp\n"
                 "xname = %s\n",
                 figure->name, literal);
    sv_script_terminals(figure);
    sv_draft_add(script, "set multiplot\n");
    sv_headline_add(headline, figure);
    add_axis(figure, result);
    double top = figure->height_cm - sv_headline_height(headline) - top_air_cm;
    for (int i = 0; i < n; i++, top -= panel_cm + gap_cm)
        add_panel(figure, result, i, top, i == n - 1);
    sv_draft_add(script, "unset multiplot\nunset output\n}\n");
}

static bool has_unresolved_index(const sv_result *result)
{
    for (int32_t i = 0; i < result->n_points; i++)
        for (int k = 0; k < result->points[i].n_summaries; k++) {
            const sv_summary *summary = &result->points[i].summaries[k];
            if (summary->is_index && summary->exists && summary->unresolved > 0)
                return true;
        }
    return false;
}

/* What bars and marks mean; the second line only where something is unresolved. */
static void choose_note(const sv_result *result, char *note, size_t size)
{
    int64_t least = INT64_MAX, most = 0;
    char count[64];
    for (int32_t i = 0; i < result->n_points; i++) {
        least = result->points[i].realisations < least ? result->points[i].realisations : least;
        most = result->points[i].realisations > most ? result->points[i].realisations : most;
    }
    if (least == most)
        snprintf(count, sizeof count, "%lld", (long long)most);
    else
        snprintf(count, sizeof count, "%lld to %lld", (long long)least, (long long)most);
    if (most == 1) {
        snprintf(note, size, "one realisation at each point, no error bars");
        return;
    }
    snprintf(note, size, "mean of %s realisations%s; bars: 95 %% interval%s", count,
             result->complete ? "" : " (stopped early)",
             has_unresolved_index(result) ? "\ngrey: bounds of the mean with the unresolved ones"
                                          : "");
}

static sv_status draw(sv_figure *figure, const sv_result *result, sv_figure_files *files)
{
    char note[200];
    sv_headline headline;
    choose_note(result, note, sizeof note);
    sv_headline_make(result->title, note, &headline);
    const int n = result->points[0].n_summaries;
    figure->title = result->title;
    figure->description = note;
    figure->width_cm = width_cm;
    figure->height_cm =
        sv_headline_height(&headline) + top_air_cm + n * panel_cm + (n - 1) * gap_cm + foot_cm;
    sv_status status = write_data(figure, result, files);
    if (status != SV_OK)
        return status;
    add_script(figure, result, &headline);
    return sv_figure_draw(figure, files);
}

sv_status sv_figure_sweep(sv_context *context, const char *folder, const char *name,
                          const sv_result *result, sv_figure_files *ret_files)
{
    sv_figure figure = {.context = context, .folder = folder, .name = name};
    sv_figure_files files;
    sv_status status = sv_figure_begin(&figure, &files);
    if (status != SV_OK)
        return status;
    if (result->n_points < 2 || result->points[0].n_coordinates != 1 ||
        result->points[0].n_summaries == 0)
        snprintf(files.reason, sizeof files.reason,
                 "a sweep curve needs one swept parameter with at least two points");
    else
        status = draw(&figure, result, &files);
    sv_draft_drop(&figure.script);
    if (status == SV_OK)
        *ret_files = files;
    return status;
}
