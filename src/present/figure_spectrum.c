/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The density of states with Fermi energy and gap, and below it the single levels next to it. */
#include <math.h>
#include <stdio.h>

#include "figure_internal.h"

static const double width_cm = 8.6, left_cm = 1.35, right_cm = 0.35, foot_cm = 1.05;
static const double panel_cm = 3.6, lower_cm = 2.4, gap_cm = 1.25, top_air_cm = 0.15;

static void add_number(sv_draft *text, double value)
{
    char word[32];
    if (!isfinite(value))
        snprintf(word, sizeof word, "NaN");
    else
        sv_words_real(value, word, sizeof word);
    sv_draft_add(text, " %s", word);
}

static sv_status write_data(sv_figure *figure, const sv_spectrum *s, sv_figure_files *files)
{
    sv_draft text = {.context = figure->context};
    char *data = NULL;
    sv_draft_add(&text, "# Energies in the unit of the model. NaN: does not exist.\n"
                        "# density: energy, states per site and energy\n");
    for (sv_index k = 0; k < s->n_density; k++) {
        add_number(&text, s->energies[k]);
        add_number(&text, s->density[k]);
        sv_draft_add(&text, "\n");
    }
    sv_draft_add(&text, "\n\n# levels: energy, participation, edge weight\n");
    for (int k = 0; k < s->n_near; k++) {
        add_number(&text, s->near[k].energy);
        add_number(&text, s->near[k].participation);
        add_number(&text, s->near[k].edge_weight);
        sv_draft_add(&text, "\n");
    }
    const size_t size = (size_t)text.size;
    sv_status status = sv_draft_finish(&text, &data);
    if (status == SV_OK)
        status = sv_figure_write(figure, ".dat", data, size, files->data);
    sv_give(figure->context, data);
    return status;
}

/* Distance of the tick marks of an axis from 0: about four of 1, 2 or 5 times a power of ten. */
static double tick_step(double largest)
{
    const double power = pow(10.0, floor(log10(largest / 4.0))), rest = largest / 4.0 / power;
    return power * (rest < 1.5 ? 1.0 : rest < 3.5 ? 2.0 : rest < 7.5 ? 5.0 : 10.0);
}

/* The gap as a pale band, the Fermi energy as a dashed line through a panel. */
static void add_marks(sv_draft *script, const sv_spectrum *s)
{
    sv_draft_add(script, "unset object\nunset arrow\n");
    if (isfinite(s->gap))
        sv_draft_add(script,
                     "set object 1 rectangle from first %.9g,graph 0 to first %.9g,graph 1 fc rgb "
                     "'#f2e6c9' fs solid noborder behind\n",
                     s->highest_occupied, s->lowest_empty);
    if (isfinite(s->fermi_energy))
        sv_draft_add(script,
                     "set arrow 1 from first %.9g,graph 0 to first %.9g,graph 1 nohead lc rgb "
                     "'#606060' lw 0.6 dt (6,4) back\n",
                     s->fermi_energy, s->fermi_energy);
}

/* The whole spectrum; the levels of the lower panel as ticks at the foot. */
static void add_density(sv_figure *figure, const sv_spectrum *s, double top_cm)
{
    sv_draft *script = &figure->script;
    const double h = figure->height_cm;
    double peak = 0.0, air = 0.03 * (s->bounds[1] - s->bounds[0]) + s->density_resolution;
    for (sv_index k = 0; k < s->n_density; k++)
        peak = fmax(peak, s->density[k]);
    peak = peak > 0.0 ? peak : 1.0;
    sv_draft_add(script,
                 "set tmargin at screen %.5f\nset bmargin at screen %.5f\n"
                 "set xrange [%.9g:%.9g]\nset yrange [0:%.9g]\nset ytics %.3g\n"
                 "set ylabel 'states per site and energy' offset 1.2,0\n"
                 "set xlabel 'energy [unit of the model]' offset 0,0.5\n",
                 top_cm / h, (top_cm - panel_cm) / h, s->bounds[0] - air, s->bounds[1] + air,
                 1.2 * peak, tick_step(1.2 * peak));
    add_marks(script, s);
    if (isfinite(s->fermi_energy)) {
        const bool right = 2.0 * s->fermi_energy > s->bounds[0] + s->bounds[1] + 1e-9;
        sv_draft_add(script,
                     "set label 20 'Fermi energy' at first %.9g,graph 0.94 %s offset %g,0 font "
                     "'Helvetica,7' tc rgb '#505050'\n",
                     s->fermi_energy, right ? "right" : "left", right ? -0.5 : 0.5);
    }
    sv_draft_add(script,
                 "plot '%s.dat' index 0 using 1:2 with lines lc rgb '#0072b2' lw 0.9 notitle",
                 figure->name);
    if (s->n_near > 0)
        sv_draft_add(script,
                     ", \\\n  '%s.dat' index 1 using 1:(0):(0):(%.9g) with vectors nohead lc rgb "
                     "'#d55e00' lw 0.4 notitle",
                     figure->name, 0.05 * peak);
    sv_draft_add(script, "\nunset label 20\n");
}

/* One stick per level next to the Fermi energy: its weight at the edge, or how far it spreads. */
static void add_levels(sv_figure *figure, const sv_spectrum *s, double top_cm)
{
    sv_draft *script = &figure->script;
    const double h = figure->height_cm, low = s->near[0].energy,
                 high = s->near[s->n_near - 1].energy;
    const bool edge = isfinite(s->near[0].edge_weight);
    double from = low, to = high, air, most = 0.0;
    if (isfinite(s->fermi_energy)) {
        from = fmin(from, s->fermi_energy);
        to = fmax(to, s->fermi_energy);
    }
    air = to > from ? 0.05 * (to - from) : 1e-3;
    for (int k = 0; k < s->n_near; k++)
        most = fmax(most, edge ? 1.0 : 1.0 / s->near[k].participation);
    sv_draft_add(script,
                 "set tmargin at screen %.5f\nset bmargin at screen %.5f\n"
                 "set xrange [%.9g:%.9g]\nset yrange [0:%.9g]\nset ytics %.3g\n"
                 "set xtics %.3g\nset ylabel '%s' offset 1.2,0\n"
                 "set xlabel 'energy of single levels' offset 0,0.5\n",
                 top_cm / h, (top_cm - lower_cm) / h, from - air, to + air, 1.1 * most,
                 tick_step(1.1 * most), tick_step(to - from + 2.0 * air),
                 edge ? "edge weight" : "positions covered");
    add_marks(script, s);
    const char *height = edge ? "3" : "(1/$2)"; /* of the inverse participation ratio */
    sv_draft_add(script,
                 "plot '%s.dat' index 1 using 1:(0):(0):%s with vectors nohead lc rgb '#d55e00' lw "
                 "0.8 notitle, \\\n  '%s.dat' index 1 using 1:%s with points lc rgb '#d55e00' pt 7 "
                 "ps 0.35 notitle\n",
                 figure->name, height, figure->name, height);
}

static void add_script(sv_figure *figure, const sv_spectrum *s, const sv_headline *headline)
{
    sv_draft *script = &figure->script;
    const double w = figure->width_cm,
                 top = figure->height_cm - sv_headline_height(headline) - top_air_cm;
    sv_draft_add(script, "# The spectrum of one sample; draw it again with: gnuplot %s.gp\n",
                 figure->name);
    sv_script_terminals(figure);
    sv_draft_add(script, "set multiplot\n");
    sv_headline_add(headline, figure);
    sv_draft_add(script,
                 "set lmargin at screen %.5f\nset rmargin at screen %.5f\nset border 31 lw 0.6\n"
                 "unset key\nset tics scale 0.5 in\nset mxtics 2\nset mytics 2\n"
                 "set ytics offset 0.4,0\nset xtics offset 0,0.2 autofreq\n",
                 left_cm / w, 1 - right_cm / w);
    add_density(figure, s, top);
    sv_draft_add(script, "unset label\n"); /* the headline is drawn once */
    if (s->n_near > 0)
        add_levels(figure, s, top - panel_cm - gap_cm);
    sv_draft_add(script, "unset multiplot\nunset output\n}\n");
}

static void choose_note(const sv_spectrum_result *result, char *note, size_t size)
{
    const sv_spectrum *s = result->spectrum;
    char gap[64];
    if (isfinite(s->gap))
        snprintf(gap, sizeof gap, "gap %.4g (shaded)", s->gap);
    else
        snprintf(gap, sizeof gap, s->on_level ? "a level at the Fermi energy" : "no gap known");
    snprintf(note, size, "realisation %lld, %lld sites, resolution %.2g\n%s",
             (long long)result->realisation, (long long)s->sites, s->density_resolution, gap);
}

static sv_status draw(sv_figure *figure, const sv_spectrum_result *result, sv_figure_files *files)
{
    const sv_spectrum *s = result->spectrum;
    char note[200];
    sv_headline headline;
    choose_note(result, note, sizeof note);
    sv_headline_make(result->title, note, &headline);
    figure->title = result->title;
    figure->description = note;
    figure->width_cm = width_cm;
    figure->height_cm = sv_headline_height(&headline) + top_air_cm + panel_cm + foot_cm +
                        (s->n_near > 0 ? gap_cm + lower_cm : 0.0);
    sv_status status = write_data(figure, s, files);
    if (status != SV_OK)
        return status;
    add_script(figure, s, &headline);
    return sv_figure_draw(figure, files);
}

sv_status sv_figure_spectrum(sv_context *context, const char *folder, const char *name,
                             const sv_spectrum_result *result, sv_figure_files *ret_files)
{
    sv_figure figure = {.context = context, .folder = folder, .name = name};
    sv_figure_files files;
    sv_status status = sv_figure_begin(&figure, &files);
    if (status == SV_OK)
        status = draw(&figure, result, &files);
    sv_draft_drop(&figure.script);
    if (status == SV_OK)
        *ret_files = files;
    return status;
}
