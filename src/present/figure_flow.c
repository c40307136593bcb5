/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Levels of a ring against the flux through its hole, by edge: table and figure. */
#include <math.h>
#include <stdio.h>

#include "figure_internal.h"

static const double width_cm = 8.6, left_cm = 1.45, right_cm = 0.35, foot_cm = 1.05;
static const double panel_cm = 5.6, top_air_cm = 0.15, key_cm = 0.45;
/* Share of the weight that puts a level at one edge, as the marker asks of a crossing level. */
static const double at_edge = 0.75;

typedef struct flow_figure {
    sv_figure figure;
    const sv_flow_trace *trace;
} flow_figure;

sv_status sv_flow_csv(sv_context *context, const sv_flow_trace *trace, char **ret_text)
{
    sv_draft text = {.context = context};
    sv_draft_add(&text, "flux,energy,hole_weight\n");
    for (sv_index k = 0; k < trace->count; k++) {
        const sv_flow_level *l = &trace->levels[k];
        sv_draft_add(&text, "%.17g,%.17g,%.9g\n", l->flux, l->energy, l->hole_weight);
    }
    return sv_draft_finish(&text, ret_text);
}

/* Three blocks: levels at the hole, at the outline, at neither. */
static sv_status write_data(flow_figure *f, sv_figure_files *files)
{
    sv_draft text = {.context = f->figure.context};
    char *data = NULL;
    sv_draft_add(&text, "# flux [quanta], energy from the Fermi energy, weight near the hole\n");
    for (int block = 0; block < 3; block++) {
        /* A block is there even when empty: gnuplot counts them. */
        sv_draft_add(&text, "%sNaN NaN NaN\n", block > 0 ? "\n\n" : "");
        for (sv_index k = 0; k < f->trace->count; k++) {
            const sv_flow_level *l = &f->trace->levels[k];
            int edge = l->hole_weight >= at_edge ? 0 : l->hole_weight <= 1.0 - at_edge ? 1 : 2;
            if (edge == block)
                sv_draft_add(&text, "%.9g %.9g %.6g\n", l->flux, l->energy, l->hole_weight);
        }
    }
    const size_t size = (size_t)text.size;
    sv_status status = sv_draft_finish(&text, &data);
    if (status == SV_OK)
        status = sv_figure_write(&f->figure, ".dat", data, size, files->data);
    sv_give(f->figure.context, data);
    return status;
}

static void add_script(flow_figure *f, const sv_headline *headline)
{
    const char *name = f->figure.name;
    sv_draft *script = &f->figure.script;
    const double w = f->figure.width_cm, h = f->figure.height_cm;
    const double top = h - sv_headline_height(headline) - top_air_cm - key_cm;
    double tallest = 0.0, first = f->trace->levels[0].flux;
    for (sv_index k = 0; k < f->trace->count; k++)
        tallest = fmax(tallest, fabs(f->trace->levels[k].energy));
    sv_draft_add(script, "# Levels against flux; draw it again with: gnuplot %s.gp\n", name);
    sv_script_terminals(&f->figure);
    sv_draft_add(script, "unset arrow\nunset label\nunset xlabel\nunset key\nset multiplot\n");
    sv_headline_add(headline, &f->figure);
    sv_draft_add(script,
                 "set lmargin at screen %.5f\nset rmargin at screen %.5f\n"
                 "set tmargin at screen %.5f\nset bmargin at screen %.5f\nset border 31 lw 0.6\n"
                 "set tics scale 0.5 in\nset ytics offset 0.4,0\nset xtics offset 0,0.2 autofreq\n"
                 "set xrange [%.9g:%.9g]\nset yrange [%.9g:%.9g]\n"
                 "set xlabel 'flux through the hole [h/e]' offset 0,0.5\n"
                 "set ylabel 'energy from E_F [unit of the model]' offset 1.4,0\n",
                 left_cm / w, 1 - right_cm / w, top / h, foot_cm / h, first - 0.02, first + 1.02,
                 -1.06 * fmax(tallest, 1e-300), 1.06 * fmax(tallest, 1e-300));
    sv_draft_add(script,
                 "set arrow 41 from graph 0,first 0 to graph 1,first 0 nohead lc rgb '#606060' lw "
                 "0.6 dt (6,4) back\n"
                 "set label 41 'E_F' at graph 0.99,first 0 right offset 0,0.45 font 'Helvetica,6' "
                 "tc rgb '#404040' front\n"
                 "set key at screen %.5f,%.5f right bottom Left reverse horizontal maxrows 1 "
                 "samplen 0.8 width -1.5 font 'Helvetica,6.5'\n",
                 1 - right_cm / w, (top + 0.1) / h);
    sv_draft_add(script,
                 "plot '%s.dat' index 0 using 1:2 with points lc rgb '#0072b2' pt 7 ps 0.3 title "
                 "'at the hole', \\\n"
                 "  '%s.dat' index 1 using 1:2 with points lc rgb '#d55e00' pt 4 ps 0.3 lw 0.7 "
                 "title 'at the outline', \\\n"
                 "  '%s.dat' index 2 using 1:2 with points lc rgb '#808080' pt 2 ps 0.3 lw 0.7 "
                 "title 'at both'\n",
                 name, name, name);
    sv_draft_add(script, "unset multiplot\nunset output\n}\n");
}

static sv_status draw(flow_figure *f, const sv_map_result *map, sv_figure_files *files)
{
    char note[300];
    sv_headline headline;
    snprintf(note, sizeof note,
             "spectral flow: at most %d levels at %d fluxes, E_F = %.4g\nrealisation %lld",
             f->trace->most, f->trace->fluxes, f->trace->fermi_energy,
             (long long)map->record->realisation);
    sv_headline_make(map->title, note, &headline);
    f->figure.title = map->title;
    f->figure.description = note;
    f->figure.width_cm = width_cm;
    f->figure.height_cm = sv_headline_height(&headline) + top_air_cm + key_cm + panel_cm + foot_cm;
    sv_status status = write_data(f, files);
    if (status != SV_OK)
        return status;
    add_script(f, &headline);
    return sv_figure_draw(&f->figure, files);
}

sv_status sv_figure_flow(sv_context *context, const char *folder, const char *name,
                         const sv_map_result *map, sv_figure_files *ret_files)
{
    flow_figure f = {.figure = {.context = context, .folder = folder, .name = name},
                     .trace = map->flow};
    sv_figure_files files;
    if (f.trace == NULL || f.trace->count == 0)
        return SV_FAIL(context, SV_INVALID_INPUT, "the spectral flow has no levels to draw");
    sv_status status = sv_figure_begin(&f.figure, &files);
    if (status == SV_OK)
        status = draw(&f, map, &files);
    sv_draft_drop(&f.figure.script);
    if (status == SV_OK)
        *ret_files = files;
    return status;
}
