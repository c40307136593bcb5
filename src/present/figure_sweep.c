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

/* The curves of a figure: one, or one per value of the other axis. */
typedef struct curves {
    const sv_result *result;
    sv_axis axis; /* along the curves */
    int across;   /* the other axis, or -1 */
    int count;
    int32_t first[SV_MOST_CURVES]; /* the first point of each curve */
    int32_t *order;                /* points by curve, ascending along it */
    int32_t start[SV_MOST_CURVES + 1];
} curves;

static bool same_value(const sv_coordinate *a, const sv_coordinate *b)
{
    return a->value == b->value && (!a->pair || a->second == b->second);
}

/* How many values an axis has, each kept by its first point; SV_MOST_CURVES + 1: too many. */
static int count_values(const sv_result *result, int axis, int32_t first[SV_MOST_CURVES])
{
    int n = 0;
    for (int32_t i = 0; i < result->n_points; i++) {
        int k = 0;
        while (k < n && !same_value(&result->points[first[k]].coordinates[axis],
                                    &result->points[i].coordinates[axis]))
            k++;
        if (k == SV_MOST_CURVES)
            return SV_MOST_CURVES + 1;
        if (k == n)
            first[n++] = i;
    }
    return n;
}

/* The axis of few values: sizes before all others, else the shorter one; -1: none. */
static int choose_across(const sv_result *result)
{
    int32_t first[SV_MOST_CURVES];
    int n[2];
    for (int a = 0; a < 2; a++)
        n[a] = count_values(result, a, first);
    for (int a = 0; a < 2; a++)
        if (n[a] <= SV_MOST_CURVES && n[1 - a] > 1 &&
            strncmp(result->points[0].coordinates[a].path, "flake.", 6) == 0)
            return a;
    const int shorter = n[0] < n[1] ? 0 : 1;
    return n[shorter] <= SV_MOST_CURVES && n[1 - shorter] > 1 ? shorter : -1;
}

static bool goes_before(const curves *c, int32_t a, int32_t b)
{
    return sv_axis_value(&c->axis, &c->result->points[a]) <
           sv_axis_value(&c->axis, &c->result->points[b]);
}

/* Points of every curve, put in order one by one. */
static void fill_order(curves *c)
{
    int32_t used = 0;
    for (int k = 0; k < c->count; k++) {
        c->start[k] = used;
        for (int32_t i = 0; i < c->result->n_points; i++) {
            const sv_point_result *points = c->result->points;
            if (c->across >= 0 && !same_value(&points[c->first[k]].coordinates[c->across],
                                              &points[i].coordinates[c->across]))
                continue;
            int32_t at = used++;
            for (; at > c->start[k] && goes_before(c, i, c->order[at - 1]); at--)
                c->order[at] = c->order[at - 1];
            c->order[at] = i;
        }
    }
    c->start[c->count] = used;
}

static sv_status make_curves(sv_context *context, const sv_result *result, curves *ret)
{
    curves c = {.result = result, .across = -1, .count = 1};
    if (result->points[0].n_coordinates == 2) {
        c.across = choose_across(result);
        c.count = count_values(result, c.across, c.first);
    }
    sv_axis_make(result, c.across == 0 ? 1 : 0, &c.axis);
    sv_status status = sv_take(context, result->n_points, sizeof *c.order, &c.order);
    if (status != SV_OK)
        return status;
    fill_order(&c);
    *ret = c;
    return SV_OK;
}

/* "bott", or "bott 2" of several curves. */
static void block_name(const curves *c, int marker, int curve, char *text, size_t size)
{
    const char *name = c->result->points[0].summaries[marker].marker;
    if (c->across < 0)
        snprintf(text, size, "%s", name);
    else
        snprintf(text, size, "%s %d", name, curve);
}

static void add_block(sv_draft *text, const curves *c, int marker, int curve)
{
    char name[160];
    block_name(c, marker, curve, name, sizeof name);
    sv_draft_add(text, "\n\n# %s\n", name);
    for (int32_t k = c->start[curve]; k < c->start[curve + 1]; k++) {
        const sv_point_result *point = &c->result->points[c->order[k]];
        const sv_summary *s = &point->summaries[marker];
        sv_draft_add(text, "%.12g", sv_axis_value(&c->axis, point));
        add_number(text, s->exists ? s->mean : (double)NAN);
        add_bar(text, s->exists ? s->interval[0] : (double)NAN, s->interval[1]);
        add_bar(text, s->exists && s->unresolved > 0 ? s->bounds[0] : (double)NAN, s->bounds[1]);
        sv_draft_add(text, " %lld %lld\n", (long long)s->unresolved, (long long)s->realisations);
    }
}

static sv_status write_data(sv_figure *figure, const curves *c, sv_figure_files *files)
{
    sv_draft text = {.context = figure->context};
    char *data = NULL;
    sv_draft_add(&text, "# Means over disorder. NaN: does not exist.\n"
                        "# Columns: parameter, mean, interval of the mean, bounds with the "
                        "unresolved, unresolved, n.\n");
    for (int i = 0; i < c->result->points[0].n_summaries; i++)
        for (int k = 0; k < c->count; k++)
            add_block(&text, c, i, k);
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

/* Curves of a family differ in colour, mark and dashes; a single one has those of its marker. */
static void add_curve_plot(sv_draft *script, const sv_figure *figure, const curves *c, int number,
                           int curve)
{
    static const char *const dashes[SV_MOST_CURVES] = {
        "", " dt (6,3)", " dt (2,2)", " dt (8,3,2,3)", " dt (12,4)", " dt (4,2,1,2)"};
    const int style = c->across < 0 ? number % 8 : curve;
    const char *colour = styles[style].colour, *dash = c->across < 0 ? "" : dashes[curve];
    char marker[160];
    block_name(c, number, curve, marker, sizeof marker);
    if (curve > 0)
        sv_draft_add(script, ", \\\n");
    if (c->result->points[0].summaries[number].is_index)
        sv_draft_add(script,
                     "  '%s.dat' index '%s' using 1:5:(0):($6-$5) with vectors nohead lc rgb "
                     "'#b8b8b8' lw 3 notitle, \\\n",
                     figure->name, marker);
    /* Bars as arrows with flat ends: error-bar styles would cut gaps around the marks. */
    sv_draft_add(script,
                 "  '%s.dat' index '%s' using 1:2 with lines lc rgb '%s' lw 0.6%s notitle, \\\n"
                 "  '%s.dat' index '%s' using 1:3:(0):($4-$3) with vectors heads size graph "
                 "0.008,90 lc rgb '%s' lw 0.8 notitle, \\\n"
                 "  '%s.dat' index '%s' using 1:2 with points lc rgb '%s' pt %d ps 0.45 notitle",
                 figure->name, marker, colour, dash, figure->name, marker, colour, figure->name,
                 marker, colour, styles[style].mark);
}

/* What the curves stand for: the name of the axis, below it a mark and a value for each. */
static double legend_height(const curves *c)
{
    return c->across < 0 ? 0.0 : 0.72;
}

static void add_legend(sv_figure *figure, const curves *c, double top_cm)
{
    const double w = figure->width_cm, h = figure->height_cm;
    const double room = w - left_cm - right_cm;
    char name[400], literal[500], word[80];
    sv_axis axis;
    if (c->across < 0)
        return;
    sv_axis_make(c->result, c->across, &axis);
    sv_words_parameter(&c->result->points[0].coordinates[c->across], name, sizeof name);
    sv_script_literal(name, literal, sizeof literal);
    sv_draft_add(&figure->script, "set label 20 %s at screen %.5f,%.5f left font ',7'\n", literal,
                 left_cm / w, (top_cm - 0.17) / h);
    for (int k = 0; k < c->count; k++) {
        sv_words_value(&c->result->points[c->first[k]].coordinates[c->across], word, sizeof word);
        sv_script_literal(word, literal, sizeof literal);
        sv_draft_add(&figure->script,
                     "set label %d %s at screen %.5f,%.5f left font ',7' point pt %d ps 0.55 lc "
                     "rgb '%s' offset 0.7,-0.2\n",
                     21 + k, literal, (left_cm + 0.1 + room * k / c->count) / w, (top_cm - 0.5) / h,
                     styles[k].mark, styles[k].colour);
    }
}

static void add_panel(sv_figure *figure, const curves *c, int number, double top_cm, bool lowest)
{
    const sv_result *result = c->result;
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
    sv_draft_add(script, "plot \\\n");
    for (int k = 0; k < c->count; k++)
        add_curve_plot(script, figure, c, number, k);
    sv_draft_add(script, "\nunset label\n");
}

static void add_axis(sv_figure *figure, const curves *c)
{
    const sv_result *result = c->result;
    double low = INFINITY, high = -INFINITY;
    for (int32_t i = 0; i < result->n_points; i++) {
        low = fmin(low, sv_axis_value(&c->axis, &result->points[i]));
        high = fmax(high, sv_axis_value(&c->axis, &result->points[i]));
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

static void add_script(sv_figure *figure, const curves *c, const sv_headline *headline)
{
    sv_draft *script = &figure->script;
    const int n = c->result->points[0].n_summaries;
    char literal[600];
    sv_script_literal(c->axis.name, literal, sizeof literal);
    sv_draft_add(script,
                 "# Markers along a sweep; draw it again with: gnuplot %s.gp\n"
                 "xname = %s\n",
                 figure->name, literal);
    sv_script_terminals(figure);
    sv_draft_add(script, "set multiplot\n");
    sv_headline_add(headline, figure);
    add_axis(figure, c);
    double top = figure->height_cm - sv_headline_height(headline);
    add_legend(figure, c, top);
    top -= legend_height(c) + top_air_cm;
    for (int i = 0; i < n; i++, top -= panel_cm + gap_cm)
        add_panel(figure, c, i, top, i == n - 1);
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
    char count[64];
    if (sv_words_realisations(result, count, sizeof count) == 1) {
        snprintf(note, size, "one realisation at each point, no error bars");
        return;
    }
    snprintf(note, size, "mean of %s realisations%s; bars: 95 %% interval%s", count,
             result->complete ? "" : " (stopped early)",
             has_unresolved_index(result) ? "\ngrey: bounds of the mean with the unresolved ones"
                                          : "");
}

static sv_status draw(sv_figure *figure, const curves *c, sv_figure_files *files)
{
    const sv_result *result = c->result;
    char note[200];
    sv_headline headline;
    choose_note(result, note, sizeof note);
    sv_headline_make(result->title, note, &headline);
    const int n = result->points[0].n_summaries;
    figure->title = result->title;
    figure->description = note;
    figure->width_cm = width_cm;
    figure->height_cm = sv_headline_height(&headline) + legend_height(c) + top_air_cm +
                        n * panel_cm + (n - 1) * gap_cm + foot_cm;
    sv_status status = write_data(figure, c, files);
    if (status != SV_OK)
        return status;
    add_script(figure, c, &headline);
    return sv_figure_draw(figure, files);
}

sv_status sv_figure_sweep(sv_context *context, const char *folder, const char *name,
                          const sv_result *result, sv_figure_files *ret_files)
{
    sv_figure figure = {.context = context, .folder = folder, .name = name};
    sv_figure_files files;
    curves c = {0};
    sv_status status = sv_figure_begin(&figure, &files);
    if (status != SV_OK)
        return status;
    if (result->n_points < 2 || result->points[0].n_coordinates < 1 ||
        result->points[0].n_summaries == 0)
        snprintf(files.reason, sizeof files.reason,
                 "a sweep curve needs one swept parameter with at least two points");
    else if (result->points[0].n_coordinates == 2 && choose_across(result) < 0)
        snprintf(files.reason, sizeof files.reason,
                 "curves of a sweep over two parameters need one with at most %d values",
                 SV_MOST_CURVES);
    else
        status = make_curves(context, result, &c);
    if (status == SV_OK && c.count > 0)
        status = draw(&figure, &c, &files);
    sv_give(context, c.order);
    sv_draft_drop(&figure.script);
    if (status == SV_OK)
        *ret_files = files;
    return status;
}
