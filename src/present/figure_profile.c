/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Index and gap of the localizer along a line of probe points, or against κ: two panels. */
#include <math.h>
#include <stdio.h>

#include "figure_internal.h"

static const double width_cm = 8.6, left_cm = 1.35, right_cm = 0.35, foot_cm = 1.05;
static const double index_cm = 1.7, panel_cm = 3.8, gap_cm = 0.3, top_air_cm = 0.15, key_cm = 0.45;

typedef struct profile {
    sv_figure figure;
    const sv_survey *survey;
    const sv_probe *probes;
    sv_index count;
    bool kappas;
    double unit; /* of the abscissa along a line: nm per lattice constant, or 1 */
    const char *unit_words;
    double low, high, tallest;
    int64_t least, most; /* indices met */
} profile;

static double abscissa(const profile *f, sv_index k)
{
    const sv_probe *p = &f->probes[k], *first = f->probes;
    return f->kappas ? p->kappa : f->unit * hypot(p->at[0] - first->at[0], p->at[1] - first->at[1]);
}

static void measure(profile *f)
{
    f->low = abscissa(f, 0);
    f->high = abscissa(f, f->count - 1);
    for (sv_index k = 0; k < f->count; k++) {
        const sv_probe *p = &f->probes[k];
        f->tallest = fmax(f->tallest, isfinite(p->gap) ? p->gap : 0.0);
        if (!p->resolved)
            continue;
        f->least = p->index < f->least ? p->index : f->least;
        f->most = p->index > f->most ? p->index : f->most;
    }
    f->tallest = fmax(f->tallest, f->survey->threshold);
    f->tallest = f->tallest > 0.0 ? 1.12 * f->tallest : 1.0;
}

static sv_status write_data(profile *f, sv_figure_files *files)
{
    sv_draft text = {.context = f->figure.context};
    char *data = NULL;
    sv_draft_add(&text, "# %s, gap, index (0 when unresolved), resolved\n",
                 f->kappas ? "kappa" : f->unit_words);
    for (sv_index k = 0; k < f->count; k++) {
        const sv_probe *p = &f->probes[k];
        sv_draft_add(&text, "%.9g %.9g %lld %d\n", abscissa(f, k), p->gap,
                     (long long)(p->resolved ? p->index : 0), p->resolved);
    }
    sv_draft_add(&text, "\n\n# from, to, certified lower bound of the gap in between\n");
    for (sv_index k = 0; !f->kappas && k < f->survey->n_between; k++)
        sv_draft_add(&text, "%.9g %.9g %.9g\n", abscissa(f, k), abscissa(f, k + 1),
                     f->survey->between[k].low);
    const size_t size = (size_t)text.size;
    sv_status status = sv_draft_finish(&text, &data);
    if (status == SV_OK)
        status = sv_figure_write(&f->figure, ".dat", data, size, files->data);
    sv_give(f->figure.context, data);
    return status;
}

static void add_panel(profile *f, double top_cm, double height_cm)
{
    const double h = f->figure.height_cm;
    sv_draft_add(&f->figure.script, "set tmargin at screen %.5f\nset bmargin at screen %.5f\n",
                 top_cm / h, (top_cm - height_cm) / h);
}

static void add_index(profile *f, double top_cm)
{
    const char *name = f->figure.name;
    sv_draft *script = &f->figure.script;
    add_panel(f, top_cm, index_cm);
    sv_draft_add(script,
                 "set yrange [%.9g:%.9g]\nset ytics %lld\nset format x ''\n"
                 "set ylabel 'index' offset 1.2,0\n"
                 "plot '%s.dat' index 0 using ($4==1 ? $1 : NaN):3 with points lc rgb '#0072b2' pt "
                 "7 ps 0.35 notitle, \\\n  '%s.dat' index 0 using ($4==0 ? $1 : NaN):(%.9g) with "
                 "points lc rgb '#d55e00' pt 2 ps 0.35 notitle\n",
                 (double)f->least - 0.6, (double)f->most + 0.6,
                 (long long)((f->most - f->least) / 4 + 1), name, name, (double)f->least - 0.35);
}

static void add_threshold(profile *f)
{
    const double tau = f->survey->threshold;
    sv_draft_add(&f->figure.script, "unset arrow\nunset label\n");
    if (!(tau > 0.0))
        return;
    sv_draft_add(
        &f->figure.script,
        "set arrow 41 from graph 0,first %.9g to graph 1,first %.9g nohead lc rgb '#606060' "
        "lw 0.6 dt (6,4) front\n"
        "set label 41 'threshold' at graph 0.01,first %.9g left offset 0,0.45 font "
        "'Helvetica,6' tc rgb '#404040' front\n",
        tau, tau, tau);
}

static void add_gap(profile *f, double top_cm)
{
    const char *name = f->figure.name;
    sv_draft *script = &f->figure.script;
    add_panel(f, top_cm, panel_cm);
    add_threshold(f);
    sv_draft_add(script,
                 "set yrange [0:%.9g]\nset ytics autofreq\nset format x '%%g'\n"
                 "set ylabel 'localizer gap' offset 1.2,0\nset xlabel '%s' offset 0,0.5\n"
                 "set key at screen %.5f,%.5f right bottom Left reverse horizontal maxrows 1 "
                 "samplen 0.8 width -2.5 font "
                 "'Helvetica,6.5'\nplot ",
                 f->tallest, f->kappas ? "kappa [energy per lattice constant]" : f->unit_words,
                 1 - right_cm / f->figure.width_cm,
                 (top_cm + gap_cm + index_cm + 0.1) / f->figure.height_cm);
    if (!f->kappas)
        sv_draft_add(script,
                     "'%s.dat' index 1 using 1:(0):1:2:(0):3 with boxxyerror fc rgb '#cfe3f2' fs "
                     "solid noborder title 'certified between', \\\n  ",
                     name);
    sv_draft_add(script,
                 "'%s.dat' index 0 using 1:2 with lines lc rgb '#0072b2' lw 0.8 notitle, \\\n"
                 "  '%s.dat' index 0 using ($4==1 ? $1 : NaN):2 with points lc rgb '#0072b2' pt 7 "
                 "ps 0.35 title 'resolved', \\\n"
                 "  '%s.dat' index 0 using ($4==0 ? $1 : NaN):2 with points lc rgb '#d55e00' pt 2 "
                 "ps 0.35 title 'unresolved'\n",
                 name, name, name);
}

static void add_script(profile *f, const sv_headline *headline)
{
    sv_draft *script = &f->figure.script;
    const double w = f->figure.width_cm, air = 0.02 * (f->high - f->low);
    const double top = f->figure.height_cm - sv_headline_height(headline) - top_air_cm - key_cm;
    sv_draft_add(script, "# The localizer %s; draw it again with: gnuplot %s.gp\n",
                 f->kappas ? "against kappa" : "along a line", f->figure.name);
    sv_script_terminals(&f->figure);
    sv_draft_add(script, "unset arrow\nunset label\nunset xlabel\nunset key\nset multiplot\n");
    sv_headline_add(headline, &f->figure);
    sv_draft_add(script,
                 "set lmargin at screen %.5f\nset rmargin at screen %.5f\nset border 31 lw 0.6\n"
                 "unset key\nset tics scale 0.5 in\nset ytics offset 0.4,0\n"
                 "set xtics offset 0,0.2 autofreq\n",
                 left_cm / w, 1 - right_cm / w);
    if (f->kappas)
        sv_draft_add(script, "set logscale x\nset xrange [%.9g:%.9g]\n", f->low / 1.05,
                     f->high * 1.05);
    else
        sv_draft_add(script, "set xrange [%.9g:%.9g]\n", f->low - air, f->high + air);
    add_index(f, top);
    add_gap(f, top - index_cm - gap_cm);
    sv_draft_add(script, "unset logscale\nunset multiplot\nunset output\n}\n");
}

static void choose_note(const profile *f, const sv_map_result *map, char *note, size_t size)
{
    const sv_survey *s = f->survey;
    const char *where = map->note == NULL ? "" : map->note;
    char place[160];
    /* In the unit of the axis along the line. */
    const double a = map->lattice_constant > 0 ? map->lattice_constant : 1.0;
    const char *unit = map->lattice_constant > 0 ? " nm" : "";
    if (f->kappas)
        snprintf(place, sizeof place, "localizer at (%.4g, %.4g)%s", a * f->probes[0].at[0],
                 a * f->probes[0].at[1], unit);
    else
        snprintf(place, sizeof place, "localizer from (%.4g, %.4g) to (%.4g, %.4g)%s, kappa %.3g",
                 a * s->from[0], a * s->from[1], a * s->to[0], a * s->to[1], unit, s->kappa);
    snprintf(note, size, "%s\nrealisation %lld%s%.150s", place, (long long)map->record->realisation,
             where[0] != '\0' ? ", " : "", where);
}

static sv_status draw(profile *f, const sv_map_result *map, sv_figure_files *files)
{
    char note[300];
    sv_headline headline;
    measure(f);
    choose_note(f, map, note, sizeof note);
    sv_headline_make(map->title, note, &headline);
    f->figure.title = map->title;
    f->figure.description = note;
    f->figure.width_cm = width_cm;
    f->figure.height_cm = sv_headline_height(&headline) + top_air_cm + key_cm + index_cm + gap_cm +
                          panel_cm + foot_cm;
    sv_status status = write_data(f, files);
    if (status != SV_OK)
        return status;
    add_script(f, &headline);
    return sv_figure_draw(&f->figure, files);
}

sv_status sv_figure_profile(sv_context *context, const char *folder, const char *name,
                            const sv_map_result *map, bool kappas, sv_figure_files *ret_files)
{
    const sv_survey *s = map->survey;
    const bool nm = map->lattice_constant > 0;
    profile f = {.figure = {.context = context, .folder = folder, .name = name},
                 .survey = s,
                 .probes = kappas ? s->kappas : s->probes,
                 .count = kappas ? s->n_kappas : s->points[0],
                 .kappas = kappas,
                 .unit = nm ? map->lattice_constant : 1.0,
                 .unit_words = nm ? "along the line [nm]" : "along the line [lattice constants]"};
    sv_figure_files files;
    if (f.count == 0 || (!kappas && !s->line))
        return SV_FAIL(context, SV_INVALID_INPUT, "the survey has no %s to draw",
                       kappas ? "kappa range" : "line");
    sv_status status = sv_figure_begin(&f.figure, &files);
    if (status == SV_OK)
        status = draw(&f, map, &files);
    sv_draft_drop(&f.figure.script);
    if (status == SV_OK)
        *ret_files = files;
    return status;
}
