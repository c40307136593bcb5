/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The map of a marker over the two axes of a sweep. */
#include <math.h>
#include <stdio.h>
#include <string.h>

#include "figure_internal.h"

static const double width_cm = 8.6, left_cm = 1.45, bar_room_cm = 1.85, foot_cm = 1.75;
static const double picture_cm = 5.3;

typedef struct phase_figure {
    sv_figure figure;
    const sv_result *result;
    int marker;
    sv_phase_grid grid;
    double range;            /* colours go from -range to range */
    bool unresolved, absent; /* is there any? */
    sv_headline headline;
} phase_figure;

static const sv_summary *first_summary(const phase_figure *f)
{
    return &f->result->points[0].summaries[f->marker];
}

static void choose_range(phase_figure *f)
{
    const sv_phase_grid *g = &f->grid;
    f->range = 1.0;
    for (int j = 0; j < g->n[1]; j++)
        for (int i = 0; i < g->n[0]; i++) {
            const sv_summary *s = sv_phase_at(g, f->marker, i, j);
            if (s == NULL || !s->exists || !isfinite(s->mean)) {
                f->absent = true;
                continue;
            }
            f->range = fmax(f->range, fabs(s->mean));
            f->unresolved = f->unresolved || s->unresolved > 0;
        }
}

/* Rectangles of the raster; a mean that does not exist leaves a hatched one. */
static void add_cells(const phase_figure *f, sv_draft *text, bool absent)
{
    const sv_phase_grid *g = &f->grid;
    for (int j = 0; j < g->n[1]; j++)
        for (int i = 0; i < g->n[0]; i++) {
            const double mean = sv_phase_mean(g, f->marker, i, j);
            if (isfinite(mean) == absent)
                continue;
            sv_draft_add(text, "%.9g %.9g %.9g %.9g %.9g %.9g %.9g\n", g->values[0][i],
                         g->values[1][j], sv_phase_side(g, 0, i, false),
                         sv_phase_side(g, 0, i, true), sv_phase_side(g, 1, j, false),
                         sv_phase_side(g, 1, j, true), absent ? 0.0 : mean);
        }
}

static void add_points(const phase_figure *f, sv_draft *text)
{
    const sv_phase_grid *g = &f->grid;
    sv_draft_add(text, "\n\n# points\n# x, y, mean, standard error, unresolved share, n\n");
    for (int j = 0; j < g->n[1]; j++)
        for (int i = 0; i < g->n[0]; i++) {
            const sv_summary *s = sv_phase_at(g, f->marker, i, j);
            if (s == NULL)
                continue;
            char mean[40] = "NaN", error[40] = "NaN";
            if (s->exists && isfinite(s->mean))
                sv_words_real(s->mean, mean, sizeof mean);
            if (s->exists && isfinite(s->standard_error))
                sv_words_real(s->standard_error, error, sizeof error);
            sv_draft_add(
                text, "%.9g %.9g %s %s %.6g %lld\n", g->values[0][i], g->values[1][j], mean, error,
                s->realisations > 0 ? (double)s->unresolved / (double)s->realisations : 0.0,
                (long long)s->realisations);
        }
}

static sv_status write_data(phase_figure *f, sv_figure_files *files)
{
    sv_draft text = {.context = f->figure.context};
    char *data = NULL;
    sv_draft_add(&text, "# The map of a marker over two parameters, in the units of the axes.\n"
                        "\n\n# cells\n# x, y, left, right, low, high, mean\n");
    add_cells(f, &text, false);
    if (f->absent) {
        sv_draft_add(&text, "\n\n# absent\n");
        add_cells(f, &text, true);
    }
    sv_draft_add(&text,
                 "\n\n# boundary\n# pairs of ends: the mean crosses a half-integer\n0 NaN\n");
    sv_phase_add_boundary(&text, &f->grid, f->marker);
    add_points(f, &text);
    sv_draft_add(&text, "\n\n# labels\n# x, y, integer nearest to the mean of a region\n");
    sv_status status = sv_phase_add_labels(f->figure.context, &text, &f->grid, f->marker);
    const size_t size = (size_t)text.size;
    if (status != SV_OK)
        sv_draft_drop(&text);
    else
        status = sv_draft_finish(&text, &data);
    if (status == SV_OK)
        status = sv_figure_write(&f->figure, ".dat", data, size, files->data);
    sv_give(f->figure.context, data);
    return status;
}

static void add_bar(phase_figure *f)
{
    const double w = f->figure.width_cm, h = f->figure.height_cm, x = w - bar_room_cm + 0.2;
    const int most = (int)floor(f->range + 1e-9), step = most > 4 ? (most + 3) / 4 : 1;
    sv_draft *script = &f->figure.script;
    char literal[256];
    sv_script_palette(script);
    sv_draft_add(script,
                 "set style line 9 lc rgb '#333333' lw 0.5\nset colorbox user origin screen "
                 "%.5f,%.5f size screen %.5f,%.5f border 9\nset cbrange [%.6g:%.6g]\n"
                 "set cbtics out nomirror scale 0.4 offset -0.6,0 font ',7' ('0' 0",
                 x / w, foot_cm / h, 0.28 / w, picture_cm / h, -f->range, f->range);
    for (int k = step; k <= most; k += step)
        sv_draft_add(script, ", '+%d' %d, '\xE2\x88\x92%d' %d", k, k, k, -k);
    sv_script_literal(sv_words_marker(first_summary(f)->marker), literal, sizeof literal);
    sv_draft_add(script, ")\nset label 11 %s at screen %.5f,%.5f center rotate by 90 font ',7'\n",
                 literal, (w - 0.3) / w, (foot_cm + 0.5 * picture_cm) / h);
}

/* What the marks mean, in words at the foot. */
static void add_legend(phase_figure *f)
{
    const double w = f->figure.width_cm, h = f->figure.height_cm;
    sv_draft_add(&f->figure.script,
                 "set label 31 'line: mean at a half-integer;  numbers: nearest integer;  dots: "
                 "points' at screen %.5f,%.5f left font ',6.5'\n",
                 0.25 / w, 0.52 / h);
    if (f->unresolved || f->absent)
        sv_draft_add(&f->figure.script,
                     "set label 32 '%s%s%s' at screen %.5f,%.5f left font ',6.5'\n",
                     f->unresolved ? "crosses: share of unresolved realisations (area)" : "",
                     f->unresolved && f->absent ? ";  " : "", f->absent ? "hatched: no value" : "",
                     0.25 / w, 0.2 / h);
}

static void add_plot(phase_figure *f)
{
    const char *name = f->figure.name;
    const sv_phase_grid *g = &f->grid;
    const double room = width_cm - left_cm - bar_room_cm;
    const double apart = fmin(room / g->n[0], picture_cm / g->n[1]); /* cm between points */
    const double cross = fmin(fmax(1.6 * apart, 0.25), 0.9),
                 dot = fmin(fmax(0.25 * apart, 0.05), 0.16);
    sv_draft *script = &f->figure.script;
    sv_draft_add(script,
                 "set style textbox opaque fc rgb '#ffffff' noborder margins 0.6,0.6\nplot \\\n"
                 "  '%s.dat' index 'cells' using 1:2:3:4:5:6:7 with boxxyerror fs solid 1 noborder "
                 "lc palette notitle, \\\n",
                 name);
    if (f->absent)
        sv_draft_add(script,
                     "  '%s.dat' index 'absent' using 1:2:3:4:5:6 with boxxyerror fs pattern 5 "
                     "fc rgb '#606060' lw 0.4 notitle, \\\n",
                     name);
    sv_draft_add(
        script,
        "  '%s.dat' index 'boundary' using 1:2 with lines lc rgb '#ffffff' lw 3 notitle, "
        "\\\n  '%s.dat' index 'boundary' using 1:2 with lines lc rgb '#000000' lw 1.4 "
        "notitle, \\\n  '%s.dat' index 'points' using 1:2 with points lc rgb '#404040' pt 7 "
        "ps %.3g notitle, \\\n",
        name, name, name, dot);
    if (f->unresolved)
        sv_draft_add(script,
                     "  '%s.dat' index 'points' using 1:2:($5>0 ? %.3g*sqrt($5)+0.12 : NaN) with "
                     "points lc rgb '#b03a00' pt 2 ps variable lw 0.8 notitle, \\\n",
                     name, cross);
    sv_draft_add(
        script,
        "  '%s.dat' index 'labels' using 1:2:($3 < 0 ? sprintf('\xE2\x88\x92%%d', int(-$3)) "
        ": sprintf('%%d', int($3))) with labels boxed "
        "font ',8' notitle\n",
        name);
}

static void add_script(phase_figure *f)
{
    const double w = f->figure.width_cm, h = f->figure.height_cm;
    const sv_phase_grid *g = &f->grid;
    sv_draft *script = &f->figure.script;
    char x[600], y[600];
    sv_script_literal(g->axes[0].name, x, sizeof x);
    sv_script_literal(g->axes[1].name, y, sizeof y);
    sv_draft_add(script,
                 "# The map of a marker over two parameters; draw it again with: gnuplot %s.gp\n"
                 "xname = %s\nyname = %s\n",
                 f->figure.name, x, y);
    sv_script_terminals(&f->figure);
    sv_draft_add(script,
                 "set lmargin at screen %.5f\nset rmargin at screen %.5f\n"
                 "set bmargin at screen %.5f\nset tmargin at screen %.5f\n"
                 "set xrange [%.9g:%.9g]\nset yrange [%.9g:%.9g]\n"
                 "set border 31 lw 0.6 front\nunset key\nset tics scale 0.5 out nomirror front\n"
                 "set ytics offset 0.4,0\nset xtics offset 0,0.2\n"
                 "set xlabel xname offset 0,0.5\nset ylabel yname offset 1.2,0\n",
                 left_cm / w, (w - bar_room_cm) / w, foot_cm / h, (foot_cm + picture_cm) / h,
                 sv_phase_side(g, 0, 0, false), sv_phase_side(g, 0, g->n[0] - 1, true),
                 sv_phase_side(g, 1, 0, false), sv_phase_side(g, 1, g->n[1] - 1, true));
    sv_headline_add(&f->headline, &f->figure);
    add_bar(f);
    add_legend(f);
    add_plot(f);
    sv_draft_add(script, "unset output\n}\n");
}

static sv_status draw(phase_figure *f, sv_figure_files *files)
{
    char note[300], count[64];
    sv_words_realisations(f->result, count, sizeof count);
    snprintf(note, sizeof note, "%s, mean of %s realisations%s\n%d x %d points",
             sv_words_marker(first_summary(f)->marker), count,
             f->result->complete ? "" : " (stopped early)", f->grid.n[0], f->grid.n[1]);
    sv_headline_make(f->result->title, note, &f->headline);
    f->figure.title = f->result->title;
    f->figure.description = note;
    f->figure.width_cm = width_cm;
    f->figure.height_cm = foot_cm + picture_cm + 0.15 + sv_headline_height(&f->headline);
    choose_range(f);
    sv_status status = write_data(f, files);
    if (status != SV_OK)
        return status;
    add_script(f);
    return sv_figure_draw(&f->figure, files);
}

sv_status sv_figure_phase(sv_context *context, const char *folder, const char *name,
                          const sv_result *result, int marker, sv_figure_files *ret_files)
{
    sv_figure_files files;
    phase_figure f = {.figure = {.context = context, .folder = folder, .name = name},
                      .result = result,
                      .marker = marker};
    if (result->n_points < 4 || result->points[0].n_coordinates != 2 || marker < 0 ||
        marker >= result->points[0].n_summaries)
        return SV_FAIL(context, SV_INVALID_INPUT,
                       "a map over two parameters needs both of them, four points and a marker");
    sv_status status = sv_figure_begin(&f.figure, &files);
    if (status == SV_OK)
        status = sv_phase_grid_make(context, result, &f.grid);
    if (status == SV_OK && f.grid.twice)
        snprintf(files.reason, sizeof files.reason,
                 "two points of the sweep lie at the same place of the map");
    else if (status == SV_OK)
        status = draw(&f, &files);
    sv_draft_drop(&f.figure.script);
    sv_phase_grid_free(context, &f.grid);
    if (status == SV_OK)
        *ret_files = files;
    return status;
}
