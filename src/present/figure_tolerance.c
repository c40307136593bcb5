/* SPDX-License-Identifier: GPL-3.0-or-later */
/* What `tolerance` asked against the parameter, or the frontier between two parameters. */
#include <math.h>
#include <stdio.h>
#include <string.h>

#include "figure_internal.h"

static const double width_cm = 8.6, panel_cm = 5.2, left_cm = 1.5, right_cm = 0.35;
static const double foot_cm = 1.05, top_air_cm = 0.15, key_cm = 0.45;
enum { MOST_SERIES = 8 };

/* Okabe and Ito's colours, each with a mark of its own. */
static const struct {
    const char *colour;
    int mark;
} styles[MOST_SERIES] = {{"#0072b2", 7},  {"#d55e00", 5},  {"#009e73", 9}, {"#cc79a7", 13},
                         {"#e69f00", 11}, {"#56b4e9", 15}, {"#000000", 6}, {"#666666", 4}};

typedef struct plot {
    sv_figure figure;
    const sv_tolerance_result *result;
    const sv_tolerance_row *main_row, *series[MOST_SERIES];
    int n_series;
    bool frontier;
    double top;      /* of the axis */
    double from, to; /* of the abscissa */
} plot;

/* With sizes the primary marker of each, else every marker of the one flake. */
static void choose_series(plot *f)
{
    const sv_tolerance_result *r = f->result;
    const bool sizes = f->main_row->cells[0] > 0;
    f->frontier = r->second.path != NULL;
    for (int k = 0; k < r->n_rows && f->n_series < MOST_SERIES; k++)
        if (sizes || f->frontier ? r->rows[k].primary : true)
            f->series[f->n_series++] = &r->rows[k];
}

static void add_number(sv_draft *text, double value)
{
    char word[32];
    snprintf(word, sizeof word, "NaN");
    if (isfinite(value))
        sv_words_real(value, word, sizeof word);
    sv_draft_add(text, " %s", word);
}

static void add_abscissa(plot *f, sv_draft *text, double value)
{
    f->from = fmin(f->from, value);
    f->to = fmax(f->to, value);
    add_number(text, value);
}

static void add_series(plot *f, sv_draft *text, const sv_tolerance_row *row)
{
    const double scale = f->result->parameter.scale;
    sv_draft_add(text, "# %s, %lld x %lld cells: parameter, measure, low, high, realisations\n",
                 row->marker, (long long)row->cells[0], (long long)row->cells[1]);
    for (int k = 0; k < row->answer.n_points; k++) {
        const sv_threshold_point *p = &row->answer.points[k];
        add_abscissa(f, text, scale * p->parameter);
        add_number(text, p->measure);
        add_number(text, p->measure - p->standard_error);
        add_number(text, p->measure + p->standard_error);
        sv_draft_add(text, " %lld\n", (long long)p->responses);
        f->top = fmax(f->top, p->measure + (isfinite(p->standard_error) ? p->standard_error : 0.0));
    }
    sv_draft_add(text, "\n\n");
}

/* The rows of the last flake, in the order of the second parameter. */
static void add_frontier(plot *f, sv_draft *text)
{
    const sv_tolerance_result *r = f->result;
    double last = -INFINITY;
    sv_draft_add(text, "# second parameter, tolerable, low, high\n");
    for (;;) {
        const sv_tolerance_row *next = NULL;
        for (int k = 0; k < r->n_rows; k++) {
            const sv_tolerance_row *row = &r->rows[k];
            if (row->primary && row->cells[0] == f->main_row->cells[0] &&
                row->cells[1] == f->main_row->cells[1] && row->second > last &&
                (next == NULL || row->second < next->second))
                next = row;
        }
        if (next == NULL)
            break;
        last = next->second;
        add_abscissa(f, text, r->second.scale * next->second);
        add_number(text, r->parameter.scale * next->answer.value);
        add_number(text, r->parameter.scale * next->answer.interval[0]);
        add_number(text, r->parameter.scale * next->answer.interval[1]);
        sv_draft_add(text, "\n");
        if (isfinite(next->answer.interval[1]))
            f->top = fmax(f->top, r->parameter.scale * next->answer.interval[1]);
    }
}

static sv_status write_data(plot *f, sv_figure_files *files)
{
    sv_draft text = {.context = f->figure.context};
    char *data = NULL;
    if (f->frontier)
        add_frontier(f, &text);
    for (int k = 0; k < f->n_series && !f->frontier; k++)
        add_series(f, &text, f->series[k]);
    const size_t size = (size_t)text.size;
    sv_status status = sv_draft_finish(&text, &data);
    if (status == SV_OK)
        status = sv_figure_write(&f->figure, ".dat", data, size, files->data);
    sv_give(f->figure.context, data);
    return status;
}

static void axis_words(const sv_shown_parameter *parameter, char *literal, size_t size)
{
    char words[300];
    const sv_coordinate coordinate = {
        .path = parameter->path, .unit = parameter->unit, .integer = parameter->integer};
    sv_words_parameter(&coordinate, words, sizeof words);
    sv_script_literal(words, literal, size);
}

static void series_words(const plot *f, const sv_tolerance_row *row, char *literal, size_t size)
{
    char words[120];
    if (row->cells[0] > 0)
        snprintf(words, sizeof words, "%lld x %lld cells", (long long)row->cells[0],
                 (long long)row->cells[1]);
    else
        snprintf(words, sizeof words, "%s", sv_words_marker(row->marker));
    (void)f;
    sv_script_literal(words, literal, size);
}

/* The interval of the answer as a band, the target as a line. */
static void add_answer(plot *f)
{
    const sv_tolerance_result *r = f->result;
    const sv_threshold_answer *a = &f->main_row->answer;
    const double target = r->of_mean ? r->within : 1.0 - r->share;
    if (isfinite(a->interval[0]))
        sv_draft_add(&f->figure.script,
                     "set object 1 rect from first %.9g, graph 0 to first %.9g, graph 1 fc rgb "
                     "'#cfe3f2' fs solid noborder behind\n",
                     r->parameter.scale * a->interval[0], r->parameter.scale * a->interval[1]);
    sv_draft_add(&f->figure.script,
                 "set arrow 41 from graph 0,first %.9g to graph 1,first %.9g nohead lc rgb "
                 "'#606060' lw 0.8 dt (6,4) front\n"
                 "set label 41 'limit' at graph 0.01,first %.9g left offset 0,0.5 font "
                 "'Helvetica,6.5' tc rgb '#404040' front\n",
                 target, target, target);
}

static void add_curves(plot *f)
{
    sv_draft *script = &f->figure.script;
    const char *name = f->figure.name;
    char literal[400];
    add_answer(f);
    sv_draft_add(script, "plot ");
    for (int k = 0; k < f->n_series; k++) {
        series_words(f, f->series[k], literal, sizeof literal);
        sv_draft_add(script,
                     "%s'%s.dat' index %d using 1:2:3:4 with yerrorbars lc rgb '%s' pt 0 lw 0.7 "
                     "notitle, \\\n  '%s.dat' index %d using 1:2 with points lc rgb '%s' pt %d ps "
                     "0.45 title %s",
                     k > 0 ? ", \\\n  " : "", name, k, styles[k].colour, name, k, styles[k].colour,
                     styles[k].mark, literal);
    }
    sv_draft_add(script, "\n");
}

static void add_budget(plot *f)
{
    sv_draft_add(&f->figure.script,
                 "plot '%s.dat' using 1:3:4 with filledcurves fc rgb '#cfe3f2' fs solid noborder "
                 "title 'interval', \\\n"
                 "  '%s.dat' using 1:2 with linespoints lc rgb '#0072b2' pt 7 ps 0.5 lw 0.9 title "
                 "'tolerable up to here'\n",
                 f->figure.name, f->figure.name);
}

static void add_script(plot *f, const sv_headline *headline)
{
    sv_draft *script = &f->figure.script;
    const sv_tolerance_result *r = f->result;
    const double w = f->figure.width_cm, h = f->figure.height_cm;
    const double top = h - sv_headline_height(headline) - top_air_cm - key_cm;
    char x[400], y[400];
    axis_words(f->frontier ? &r->second : &r->parameter, x, sizeof x);
    if (f->frontier)
        axis_words(&r->parameter, y, sizeof y);
    else
        snprintf(y, sizeof y, "%s",
                 r->of_mean ? "'distance from the clean value'"
                            : "'share that misses the criterion'");
    sv_draft_add(script, "# What is tolerable; draw it again with: gnuplot %s.gp\n",
                 f->figure.name);
    sv_script_terminals(&f->figure);
    sv_draft_add(script, "unset arrow\nunset label\nunset object\n");
    sv_headline_add(headline, &f->figure);
    sv_draft_add(script,
                 "set lmargin at screen %.5f\nset rmargin at screen %.5f\nset tmargin at screen "
                 "%.5f\nset bmargin at screen %.5f\nset border 31 lw 0.6 front\nset tics scale 0.5 "
                 "in front\nset xrange [%.9g:%.9g]\nset "
                 "ytics offset 0.4,0\nset xtics offset 0,0.2\n"
                 "set xlabel %s offset 0,0.5\nset ylabel %s offset 1.2,0\nset yrange [0:%.9g]\n"
                 "set key at screen %.5f,%.5f right bottom Left reverse horizontal maxrows 1 "
                 "samplen 1.2 font 'Helvetica,6.5'\n",
                 left_cm / w, 1 - right_cm / w, top / h, (top - panel_cm) / h,
                 f->from - 0.03 * (f->to - f->from), f->to + 0.03 * (f->to - f->from), x, y,
                 1.08 * (f->top > 0.0 ? f->top : 1.0), 1 - right_cm / w, (top + 0.1) / h);
    if (f->frontier)
        add_budget(f);
    else
        add_curves(f);
    sv_draft_add(script, "unset output\n}\n");
}

static sv_status draw(plot *f, sv_figure_files *files)
{
    const sv_tolerance_result *r = f->result;
    const sv_threshold_answer *a = &f->main_row->answer;
    sv_headline headline;
    char note[300];
    if (f->frontier)
        snprintf(note, sizeof note, "%.3g %% intervals of %.120s", 100.0 * r->confidence,
                 r->parameter.path);
    else if (isfinite(a->value))
        snprintf(note, sizeof note, "tolerable: %.4g [%.4g, %.4g]%s%.20s, %.3g %% interval",
                 r->parameter.scale * a->value, r->parameter.scale * a->interval[0],
                 r->parameter.scale * a->interval[1], r->parameter.unit != NULL ? " " : "",
                 r->parameter.unit != NULL ? r->parameter.unit : "", 100.0 * r->confidence);
    else
        snprintf(note, sizeof note, "%.200s", a->reason);
    sv_headline_make(r->title, note, &headline);
    f->figure.title = r->title;
    f->figure.description = note;
    f->figure.width_cm = width_cm;
    f->figure.height_cm = sv_headline_height(&headline) + top_air_cm + key_cm + panel_cm + foot_cm;
    sv_status status = write_data(f, files);
    if (status != SV_OK)
        return status;
    add_script(f, &headline);
    return sv_figure_draw(&f->figure, files);
}

sv_status sv_figure_tolerance(sv_context *context, const char *folder, const char *name,
                              const sv_tolerance_result *result, sv_figure_files *ret_files)
{
    plot f = {.figure = {.context = context, .folder = folder, .name = name},
              .result = result,
              .main_row = sv_tolerance_main(result),
              .from = INFINITY,
              .to = -INFINITY};
    sv_figure_files files;
    if (f.main_row == NULL)
        return SV_FAIL(context, SV_INVALID_INPUT, "a tolerance without a threshold");
    choose_series(&f);
    sv_status status = sv_figure_begin(&f.figure, &files);
    if (status == SV_OK)
        status = draw(&f, &files);
    sv_draft_drop(&f.figure.script);
    if (status == SV_OK)
        *ret_files = files;
    return status;
}
