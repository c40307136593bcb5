/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Layout and script of the marker map. All lengths in centimetres until the last moment. */
#include <math.h>
#include <string.h>

#include "figure_internal.h"

enum { MOST_RINGS = 3000, PALETTE_STOPS = 65 };
static const double width_cm = 8.6, side_cm = 0.25, bar_room_cm = 1.75, foot_cm = 0.85;

/* Wide flakes fill the width, tall ones are limited in height. */
void sv_map_choose_layout(sv_map_figure *f)
{
    const double room = width_cm - side_cm - bar_room_cm, tallest = 11;
    const double x = f->high[0] - f->low[0], y = f->high[1] - f->low[1];
    f->scale = fmin(room / x, tallest / y);
    f->low_cm = foot_cm;
    f->left_cm = side_cm + 0.5 * (room - f->scale * x);
    f->head_cm = sv_headline_height(&f->headline);
    f->figure.width_cm = width_cm;
    f->figure.height_cm = foot_cm + fmax(f->scale * y, 2.2) + f->head_cm;
    if (f->scale * y < 2.2)
        f->low_cm += 0.5 * (2.2 - f->scale * y);
}

static void add_palette(sv_draft *script, bool amount)
{
    sv_draft_add(script, "set palette maxcolors 0\nset palette defined (");
    for (int k = 0; k < PALETTE_STOPS; k++) {
        uint8_t rgb[3];
        if (amount)
            sv_palette_amount((double)k / (PALETTE_STOPS - 1), rgb);
        else
            sv_palette_colour(2.0 * k / (PALETTE_STOPS - 1) - 1, rgb);
        sv_draft_add(script, "%s%d '#%02x%02x%02x'", k > 0 ? ", " : "", k, rgb[0], rgb[1], rgb[2]);
        if (k % 4 == 3)
            sv_draft_add(script, "\\\n  ");
    }
    sv_draft_add(script, ")\n");
}

void sv_script_palette(sv_draft *script)
{
    add_palette(script, false);
}

/* A triangle at an end of the colour bar: the colour goes on beyond. */
static void add_bar_end(sv_map_figure *f, int number, double x, double width, double base,
                        double tip, double position)
{
    const double w = f->figure.width_cm, h = f->figure.height_cm;
    uint8_t rgb[3];
    sv_palette_colour(position, rgb);
    sv_draft_add(&f->figure.script,
                 "set object %d polygon from screen %.5f,%.5f to screen %.5f,%.5f to screen "
                 "%.5f,%.5f to screen %.5f,%.5f fc rgb '#%02x%02x%02x' fs solid 1 border lc rgb "
                 "'#333333' lw 0.5\n",
                 number, x / w, base / h, (x + width) / w, base / h, (x + width / 2) / w, tip / h,
                 x / w, base / h, rgb[0], rgb[1], rgb[2]);
}

/* From 0 to a round number; nothing lies beyond it. */
static void add_amount_bar(sv_map_figure *f)
{
    const double w = f->figure.width_cm, h = f->figure.height_cm, x = w - 1.5, width = 0.28;
    const double picture = h - foot_cm - f->head_cm, length = fmin(picture, 5.0);
    const double low = foot_cm + 0.5 * (picture - length);
    sv_draft *script = &f->figure.script;
    sv_draft_add(script,
                 "set style line 9 lc rgb '#333333' lw 0.5\nset colorbox user origin screen "
                 "%.5f,%.5f size screen %.5f,%.5f border 9\nset cbrange [0:%.6g]\n"
                 "set cbtics out nomirror scale 0.4 offset -0.6,0 font ',7' ('0' 0, '%.3g' %.6g, "
                 "'%.3g' %.6g)\n",
                 x / w, low / h, width / w, length / h, f->range, 0.5 * f->range, 0.5 * f->range,
                 f->range, f->range);
    sv_draft_add(script,
                 "set label 11 'deviation of the marker per cell' at screen %.5f,%.5f center "
                 "rotate by 90 font ',7'\n",
                 (w - 0.24) / w, (low + 0.5 * length) / h);
}

static void add_bar(sv_map_figure *f)
{
    const double w = f->figure.width_cm, h = f->figure.height_cm, x = w - 1.5, width = 0.28;
    const double picture = h - foot_cm - f->head_cm, tip = 0.24;
    const double length = fmin(picture - 2 * tip, 5.0), low = foot_cm + 0.5 * (picture - length);
    sv_draft *script = &f->figure.script;
    sv_draft_add(
        script,
        "set style line 9 lc rgb '#333333' lw 0.5\nset colorbox user origin screen "
        "%.5f,%.5f size screen %.5f,%.5f border 9\n"
        "set cbrange [%.6g:%.6g]\nset cbtics out nomirror scale 0.4 offset -0.6,0 font ',7' (",
        x / w, low / h, width / w, length / h, -f->range, f->range);
    const int most = (int)floor(f->range + 1e-9), step = most > 4 ? (most + 3) / 4 : 1;
    sv_draft_add(script, "'0' 0");
    for (int k = step; k <= most; k += step)
        sv_draft_add(script, ", '+%d' %d, '\xE2\x88\x92%d' %d", k, k, k, -k);
    sv_draft_add(script, ")\n");
    add_bar_end(f, 11, x, width, low + length, low + length + tip, 1);
    add_bar_end(f, 12, x, width, low, low - tip, -1);
    sv_draft_add(script,
                 "set label 11 '%s marker per cell' at screen %.5f,%.5f center rotate by "
                 "90 font ',7'\n",
                 f->kind == SV_MAP_MEAN ? "mean" : "local Chern", (w - 0.24) / w,
                 (low + 0.5 * length) / h);
    sv_draft_add(script,
                 "set label 12 '> %.3g' at screen %.5f,%.5f left font ',6' tc rgb '#404040'\n"
                 "set label 13 '< \xE2\x88\x92%.3g' at screen %.5f,%.5f left font ',6' tc rgb "
                 "'#404040'\n",
                 f->range, (x + width + 0.02) / w, (low + length + 0.6 * tip) / h, f->range,
                 (x + width + 0.02) / w, (low - 0.6 * tip) / h);
}

double sv_round_length(double longest)
{
    const double power = pow(10, floor(log10(longest)));
    const double leading = longest / power;
    return power * (leading >= 5 ? 5 : leading >= 2 ? 2 : 1);
}

static void add_scale_bar(sv_map_figure *f)
{
    const double constant = f->map->lattice_constant, w = f->figure.width_cm;
    const double unit = constant > 0 ? constant : 1;
    const double length = sv_round_length(0.3 * (f->high[0] - f->low[0]) * unit);
    const double cm = length / unit * f->scale, h = f->figure.height_cm, y = 0.36;
    sv_draft *script = &f->figure.script;
    sv_draft_add(script,
                 "set arrow 21 from screen %.5f,%.5f to screen %.5f,%.5f heads size screen "
                 "0.008,90 lc rgb '#000000' lw 1.2 front\n",
                 side_cm / w, y / h, (side_cm + cm) / w, y / h);
    sv_draft_add(script, "set label 21 '%.6g %s' at screen %.5f,%.5f left font ',7' front\n",
                 length,
                 constant > 0 ? "nm"
                 : length > 1 ? "lattice constants"
                              : "lattice constant",
                 (side_cm + cm + 0.15) / w, y / h);
}

/* How empty positions look, at the right of the foot. */
static void add_legend(sv_map_figure *f)
{
    const char *words = sv_empty_words(f->map->sample, f->vacancies.count);
    const double w = f->figure.width_cm, h = f->figure.height_cm, y = 0.36;
    const double x = w - (strlen(words) > 9 ? 3.1 : 2.25); /* "empty positions" is longer */
    sv_draft *script = &f->figure.script;
    if (f->vacancies.count == 0) {
        sv_draft_add(script, "set label 31 'no vacancies' at screen %.5f,%.5f left font ',7'\n",
                     x / w, y / h);
        return;
    }
    sv_draft_add(script,
                 "set object 31 circle at screen %.5f,%.5f size screen %.5f fc rgb '#202020' fs %s "
                 "lw 0.7\n",
                 (x - 0.18) / w, y / h, 0.07 / w,
                 f->vacancies.count > MOST_RINGS ? "solid 1 noborder" : "empty border");
    sv_draft_add(script, "set label 31 '%lld %s' at screen %.5f,%.5f left font ',7'\n",
                 (long long)f->vacancies.count, words, x / w, y / h);
}

/* Rings in the holes; too many of them would hide the map, so then the holes are dark. */
static void add_plot(sv_map_figure *f)
{
    const sv_raster *r = &f->raster;
    const char *name = f->figure.name;
    const bool rings = f->vacancies.count <= MOST_RINGS;
    const double cell = sqrt(sv_model_cell_area(f->map->sample->flake->model) /
                             f->map->sample->flake->model->n_positions);
    const double radius = fmax(0.3 * cell, 0.022 / f->scale);
    sv_draft *script = &f->figure.script;
    sv_draft_add(script, "plot \\\n");
    if (!rings)
        sv_draft_add(script,
                     "  '%s.dat' index 'outline' using 1:2 with filledcurves closed fc rgb "
                     "'#202020' notitle, \\\n",
                     name);
    sv_draft_add(script,
                 "  '%s.bin' binary array=(%d,%d) format='%%float' endian=little "
                 "origin=(%.9g,%.9g) dx=%.9g dy=%.9g using 1 with image notitle, \\\n",
                 name, r->nx, r->ny, r->low[0], r->low[1], r->step, r->step);
    if (rings && f->vacancies.count > 0)
        sv_draft_add(script,
                     "  '%s.dat' index 'vacancies' using 1:2:(%.6g) with circles lc rgb '#202020' "
                     "lw %.2g fs %s notitle, \\\n",
                     name, radius, 0.7, radius * f->scale < 0.04 ? "solid 1" : "empty border");
    if (f->window != NULL)
        sv_draft_add(
            script,
            "  '%s.dat' index 'window' using 1:2 with lines lc rgb '#000000' lw 1 dt (8,5) "
            "notitle, \\\n",
            name);
    sv_draft_add(script,
                 "  '%s.dat' index 'outline' using 1:2 with lines lc rgb '#000000' lw 0.7 "
                 "notitle\n",
                 name);
}

void sv_map_add_script(sv_map_figure *f)
{
    const double w = f->figure.width_cm, h = f->figure.height_cm;
    const double x = f->high[0] - f->low[0], y = f->high[1] - f->low[1];
    sv_draft *script = &f->figure.script;
    sv_draft_add(script,
                 "# Map of the %slocal Chern marker; draw it again with: gnuplot %s.gp\n"
                 "# %s.bin: %d x %d values as 32-bit floats, rows from below; NaN: outside "
                 "or vacant.\n",
                 f->kind == SV_MAP_DEVIATION ? "deviation over the ensemble of the "
                 : f->kind == SV_MAP_MEAN    ? "mean over the ensemble of the "
                                             : "",
                 f->figure.name, f->figure.name, f->raster.nx, f->raster.ny);
    sv_script_terminals(&f->figure);
    sv_draft_add(script,
                 "set lmargin at screen %.5f\nset rmargin at screen %.5f\n"
                 "set bmargin at screen %.5f\nset tmargin at screen %.5f\n"
                 "set xrange [%.9g:%.9g]\nset yrange [%.9g:%.9g]\n"
                 "unset border\nunset tics\nunset key\n",
                 f->left_cm / w, (f->left_cm + f->scale * x) / w, f->low_cm / h,
                 (f->low_cm + f->scale * y) / h, f->low[0], f->high[0], f->low[1], f->high[1]);
    sv_headline_add(&f->headline, &f->figure);
    add_palette(script, f->kind == SV_MAP_DEVIATION);
    if (f->kind == SV_MAP_DEVIATION)
        add_amount_bar(f);
    else
        add_bar(f);
    add_scale_bar(f);
    if (f->kind == SV_MAP_SAMPLE)
        add_legend(f);
    add_plot(f);
    sv_draft_add(script, "unset output\n}\n");
}
