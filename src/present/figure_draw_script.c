/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Layout and script of the drawing of a flake. All lengths in centimetres until the end. */
#include <math.h>

#include "figure_internal.h"

enum { MOST_RINGS = 3000 };
static const double width_cm = 8.6, side_cm = 0.25, bar_room_cm = 1.75, line_cm = 0.42;

void sv_draw_choose_layout(sv_draw_figure *f)
{
    const double room = width_cm - 2 * side_cm - (f->range > 0 ? bar_room_cm - side_cm : 0);
    const double x = f->high[0] - f->low[0], y = f->high[1] - f->low[1], tallest = 11, least = 2.2;
    const int kinds =
        (f->vacant > 0) + (f->removed > 0) + (f->hanging > 0) + (f->lone > 0) + (f->adatoms > 0);
    f->foot_cm = 0.7 + (kinds > 0 ? line_cm * ((kinds + 1) / 2) : 0);
    f->scale = fmin(room / x, tallest / y);
    f->left_cm = side_cm + 0.5 * (room - f->scale * x);
    f->head_cm = sv_headline_height(&f->headline);
    f->low_cm = f->foot_cm + fmax(0, 0.5 * (least - f->scale * y));
    f->figure.width_cm = width_cm;
    f->figure.height_cm = f->foot_cm + fmax(f->scale * y, least) + f->head_cm;
}

/* Colour bar from −range to +range with round numbers beside it. */
static void add_bar(sv_draw_figure *f)
{
    const double w = f->figure.width_cm, h = f->figure.height_cm, x = w - 1.5, width = 0.28;
    const double picture = h - f->foot_cm - f->head_cm, length = fmin(picture - 0.2, 5.0);
    const double low = f->foot_cm + 0.5 * (picture - length), tic = sv_round_length(f->range);
    sv_draft *script = &f->figure.script;
    sv_draft_add(script,
                 "set style line 9 lc rgb '#333333' lw 0.5\nset colorbox user origin screen "
                 "%.5f,%.5f size screen %.5f,%.5f border 9\nset cbrange [%.6g:%.6g]\n"
                 "set cbtics out nomirror scale 0.4 offset -0.6,0 font ',7' ('0' 0, '+%.6g' %.6g, "
                 "'\xE2\x88\x92%.6g' %.6g)\n",
                 x / w, low / h, width / w, length / h, -f->range, f->range, tic, tic, tic, -tic);
    sv_draft_add(
        script,
        "set label 11 'on-site disorder (%s)' at screen %.5f,%.5f center rotate by 90 font "
        "',7'\n",
        f->unit, (w - 0.24) / w, (low + 0.5 * length) / h);
}

static void add_scale_bar(sv_draw_figure *f)
{
    const double constant = f->result->lattice_constant, w = f->figure.width_cm;
    const double unit = constant > 0 ? constant : 1;
    const double length = sv_round_length(0.3 * (f->high[0] - f->low[0]) * unit);
    const double cm = length / unit * f->scale, h = f->figure.height_cm, y = f->foot_cm - 0.34;
    sv_draft_add(
        &f->figure.script,
        "set arrow 21 from screen %.5f,%.5f to screen %.5f,%.5f heads size screen 0.008,90 "
        "lc rgb '#000000' lw 1.2 front\n"
        "set label 21 '%.6g %s' at screen %.5f,%.5f left font ',7' front\n",
        side_cm / w, y / h, (side_cm + cm) / w, y / h, length,
        constant > 0 ? "nm"
        : length > 1 ? "lattice constants"
                     : "lattice constant",
        (side_cm + cm + 0.15) / w, y / h);
}

enum {
    POINT_VACANT = 6,
    POINT_DARK = 5,
    POINT_REMOVED = 2,
    POINT_HANGING = 8,
    POINT_LONE = 12,
    POINT_ADATOM = 1
};

/* Pixels would drown in more symbols than this. */
static sv_index most_symbols(const sv_draw_figure *f, int point)
{
    return f->by_site || point == POINT_VACANT || point == POINT_REMOVED ? MOST_RINGS : 200;
}

/* One symbol of the legend and its text; two to a line. What is not drawn has no symbol; holes in
 * the pixels are dark. */
static void add_entry(sv_draw_figure *f, int *number, int point, sv_index count, const char *one,
                      const char *many)
{
    const double w = f->figure.width_cm, h = f->figure.height_cm;
    const double x = side_cm + 0.12 + (*number % 2) * 0.5 * (w - side_cm);
    const double y = f->foot_cm - 0.34 - line_cm * (*number / 2 + 1);
    const bool drawn = count <= most_symbols(f, point), hole = point == POINT_VACANT;
    if (count == 0)
        return;
    sv_draft_add(&f->figure.script, "set label %d '%lld %s' at screen %.5f,%.5f left font ',7'",
                 31 + *number, (long long)count, count == 1 ? one : many, x / w, y / h);
    if (drawn || hole)
        sv_draft_add(&f->figure.script,
                     " offset 1.2,0 point pt %d ps 0.45 lc rgb '#202020' lw 0.8 front",
                     drawn ? point : POINT_DARK);
    sv_draft_add(&f->figure.script, "\n");
    (*number)++;
}

static void add_legend(sv_draw_figure *f)
{
    int number = 0;
    const char *empty = sv_empty_words(f->result->sample, f->vacant);
    add_entry(f, &number, POINT_VACANT, f->vacant, empty, empty);
    add_entry(f, &number, POINT_REMOVED, f->removed, "removed position", "removed positions");
    add_entry(f, &number, POINT_HANGING, f->hanging, "dangling position", "dangling positions");
    add_entry(f, &number, POINT_ADATOM, f->adatoms, "site with an adatom", "sites with adatoms");
    add_entry(f, &number, POINT_LONE, f->lone, "isolated position", "isolated positions");
}

/* gnuplot takes another block for an empty one. */
static void add_vectors(sv_draw_figure *f, sv_index count, const char *index, const char *style)
{
    if (count == 0)
        return;
    sv_draft_add(&f->figure.script,
                 "  '%s.dat' index '%s' using 1:2:3:4 with vectors nohead %s notitle, \\\n",
                 f->figure.name, index, style);
}

static bool has_far_bonds(const sv_draw_figure *f)
{
    return f->result->sample->flake->n_cells <= 150;
}

/* Sites as discs in the colour of their disorder; without any, the first position of a cell is
 * filled and the others are open, so that sublattices are told apart. */
static void add_sites(sv_draw_figure *f, double radius)
{
    sv_draft *script = &f->figure.script;
    const char *name = f->figure.name;
    const sv_flake *flake = f->result->sample->flake;
    if (has_far_bonds(f))
        add_vectors(f, f->bonds[1], "far", "lc rgb '#d4d4d4' lw 0.35");
    add_vectors(f, f->bonds[0], "bonds", "lc rgb '#8a8a8a' lw 0.7");
    add_vectors(f, f->bonds[2], "around", "lc rgb '#8a8a8a' lw 0.7 dt (4,4)");
    if (f->range > 0) {
        sv_draft_add(script,
                     "  '%s.dat' index 'sites' using 1:2:(%.6g):3 with circles fs solid 1 border "
                     "lc rgb '#404040' lw 0.3 fc palette notitle, \\\n",
                     name, radius);
        return;
    }
    sv_draft_add(script,
                 "  '%s.dat' index 'sites' using 1:2:(%.6g) with circles fs solid 1 noborder fc "
                 "rgb '#4a6d8c' notitle, \\\n",
                 name, radius);
    if (flake->model->n_positions > 1)
        sv_draft_add(script,
                     "  '%s.dat' index 'sites' using 1:($4 > 0 ? $2 : NaN):(%.6g) with circles fs "
                     "solid 1 noborder fc rgb '#ffffff' notitle, \\\n",
                     name, 0.62 * radius);
}

static void add_symbols(sv_draw_figure *f, const char *index, int point, sv_index count,
                        double size)
{
    if (count == 0 || count > most_symbols(f, point))
        return;
    sv_draft_add(
        &f->figure.script,
        "  '%s.dat' index '%s' using 1:2 with points pt %d ps %.4g lc rgb '#202020' lw 0.7 "
        "notitle, \\\n",
        f->figure.name, index, point, size);
}

static void add_pixels(sv_draw_figure *f)
{
    const sv_raster *r = &f->raster;
    sv_draft_add(&f->figure.script,
                 "  '%s.dat' index 'outline' using 1:2 with filledcurves closed fc rgb '#202020' "
                 "notitle, \\\n"
                 "  '%s.bin' binary array=(%d,%d) format='%%float' endian=little "
                 "origin=(%.9g,%.9g) dx=%.9g dy=%.9g using 1 with image notitle, \\\n",
                 f->figure.name, f->figure.name, r->nx, r->ny, r->low[0], r->low[1], r->step,
                 r->step);
}

static void add_plot(sv_draw_figure *f)
{
    const sv_model *model = f->result->sample->flake->model;
    const double spacing =
        f->shortest > 0 ? f->shortest : sqrt(sv_model_cell_area(model) / model->n_positions);
    const double radius = 0.26 * spacing;
    /* A point of size 1 is about 0.26 cm wide here. */
    const double size = fmin(0.7, fmax(0.12, 2 * radius * f->scale / 0.2));
    sv_draft_add(&f->figure.script, "plot \\\n");
    if (f->by_site)
        add_sites(f, radius);
    else
        add_pixels(f);
    add_symbols(f, "vacancies", POINT_VACANT, f->vacant, size);
    add_symbols(f, "removed", POINT_REMOVED, f->removed, size);
    add_symbols(f, "dangling", POINT_HANGING, f->hanging, 1.5 * size);
    add_symbols(f, "adatoms", POINT_ADATOM, f->adatoms, size);
    add_symbols(f, "isolated", POINT_LONE, f->lone, 1.5 * size);
    sv_draft_add(&f->figure.script,
                 "  '%s.dat' index 'outline' using 1:2 with lines lc rgb '#000000' lw 0.7 "
                 "notitle\n",
                 f->figure.name);
}

void sv_draw_add_script(sv_draw_figure *f)
{
    const double w = f->figure.width_cm, h = f->figure.height_cm;
    const double x = f->high[0] - f->low[0], y = f->high[1] - f->low[1];
    sv_draft *script = &f->figure.script;
    sv_draft_add(script, "# Drawing of a sample; draw it again with: gnuplot %s.gp\n",
                 f->figure.name);
    sv_script_terminals(&f->figure);
    sv_draft_add(script,
                 "set lmargin at screen %.5f\nset rmargin at screen %.5f\n"
                 "set bmargin at screen %.5f\nset tmargin at screen %.5f\n"
                 "set xrange [%.9g:%.9g]\nset yrange [%.9g:%.9g]\n"
                 "unset border\nunset tics\nunset key\nunset colorbox\n",
                 f->left_cm / w, (f->left_cm + f->scale * x) / w, f->low_cm / h,
                 (f->low_cm + f->scale * y) / h, f->low[0], f->high[0], f->low[1], f->high[1]);
    sv_headline_add(&f->headline, &f->figure);
    sv_script_palette(script);
    if (f->range > 0)
        add_bar(f);
    else
        sv_draft_add(script, "set cbrange [-1:1]\n");
    add_scale_bar(f);
    add_legend(f);
    add_plot(f);
    sv_draft_add(script, "unset output\n}\n");
}
