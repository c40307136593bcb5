/* SPDX-License-Identifier: GPL-3.0-or-later */
/* A marker against the Fermi energy over the density of states. */
#include <math.h>
#include <stdio.h>

#include "figure_internal.h"

static const double width_cm = 8.6, left_cm = 1.5, right_cm = 0.35, foot_cm = 1.05;
static const double panel_cm = 4.2, density_cm = 1.9, gap_cm = 0.2, top_air_cm = 0.15,
                    key_cm = 0.45;
enum { MOST_CURVES = 6 };

/* Okabe and Ito's colours with a dash of their own, coldest first. */
static const struct {
    const char *colour, *dash;
} styles[MOST_CURVES] = {{"#0072b2", "1"},         {"#d55e00", "(8,4)"},  {"#009e73", "(3,3)"},
                         {"#cc79a7", "(8,3,2,3)"}, {"#e69f00", "(14,4)"}, {"#56b4e9", "(2,2)"}};

typedef struct plot {
    sv_figure figure;
    const sv_plateau_result *result;
    double factor; /* shown = factor · model unit */
    double low, high;
} plot;

static sv_status write_data(plot *f, sv_figure_files *files)
{
    const sv_plateau_result *r = f->result;
    sv_draft text = {.context = f->figure.context};
    char *data = NULL;
    sv_draft_add(&text, "# Fermi energy, mean, low, high, thermal means\n");
    f->low = INFINITY;
    f->high = -INFINITY;
    for (int64_t k = 0; k < r->n; k++) {
        const double error = isfinite(r->standard_error[k]) ? r->standard_error[k] : 0.0;
        sv_draft_add(&text, "%.9g %.9g %.9g %.9g", f->factor * r->energies[k], r->mean[k],
                     r->mean[k] - 2.0 * error, r->mean[k] + 2.0 * error);
        for (int t = 0; t < r->n_temperatures; t++)
            sv_draft_add(&text, " %.9g", r->thermal[t * r->n + k]);
        sv_draft_add(&text, "\n");
        if (isfinite(r->mean[k])) {
            f->low = fmin(f->low, r->mean[k] - 2.0 * error);
            f->high = fmax(f->high, r->mean[k] + 2.0 * error);
        }
    }
    sv_draft_add(&text, "\n\n# energy, density of states\n");
    for (sv_index k = 0; k < r->n_density; k++)
        sv_draft_add(&text, "%.9g %.9g\n", f->factor * r->density_energies[k], r->density[k]);
    const size_t size = (size_t)text.size;
    sv_status status = sv_draft_finish(&text, &data);
    if (status == SV_OK)
        status = sv_figure_write(&f->figure, ".dat", data, size, files->data);
    sv_give(f->figure.context, data);
    return status;
}

static void add_panel(plot *f, double top_cm, double height_cm)
{
    const double h = f->figure.height_cm;
    sv_draft_add(&f->figure.script, "set tmargin at screen %.5f\nset bmargin at screen %.5f\n",
                 top_cm / h, (top_cm - height_cm) / h);
}

static void add_window(plot *f)
{
    const sv_plateau_result *r = f->result;
    sv_draft_add(&f->figure.script, "unset object\nunset arrow\n");
    if (r->plateau.exists)
        sv_draft_add(&f->figure.script,
                     "set object 1 rect from first %.9g, first %.9g to first %.9g, first %.9g fc "
                     "rgb '#e8e8e8' fs solid noborder behind\n",
                     f->factor * r->plateau.edges[0], r->clean - r->within,
                     f->factor * r->plateau.edges[1], r->clean + r->within);
}

static void add_curves(plot *f, double top)
{
    const sv_plateau_result *r = f->result;
    const char *name = f->figure.name;
    sv_draft *script = &f->figure.script;
    char label[200];
    double air = 0.08 * (f->high > f->low ? f->high - f->low : 1.0);
    add_panel(f, top, panel_cm);
    add_window(f);
    sv_script_literal(sv_words_marker(r->marker), label, sizeof label);
    sv_draft_add(script,
                 "set yrange [%.9g:%.9g]\nset format x ''\nset ylabel %s offset 1.2,0\n"
                 "set key at screen %.5f,%.5f right bottom Left reverse horizontal maxrows 1 "
                 "samplen 2 font 'Helvetica,6.5'\n"
                 "plot '%s.dat' index 0 using 1:3:4 with filledcurves fc rgb '#cfe3f2' fs solid "
                 "noborder notitle",
                 f->low - air, f->high + air, label, 1 - right_cm / f->figure.width_cm,
                 (top + 0.1) / f->figure.height_cm, name);
    for (int t = 0; t < r->n_temperatures && t < MOST_CURVES; t++)
        sv_draft_add(
            script,
            ", \\\n  '%s.dat' index 0 using 1:%d with lines lc rgb '%s' lw 0.9 dt %s title "
            "'%.4g K'",
            name, 5 + t, styles[t].colour, styles[t].dash, r->kelvin[t]);
    sv_draft_add(script, "\n");
}

static void add_density(plot *f, double top)
{
    sv_draft *script = &f->figure.script;
    add_panel(f, top, density_cm);
    sv_draft_add(script,
                 "unset object\nunset key\nset yrange [0:*]\nset format x '%%g'\nset ytics "
                 "(0)\nset ylabel 'states' offset 1.2,0\nset xlabel '%s' offset 0,0.5\n"
                 "plot '%s.dat' index 1 using 1:2 with filledcurves y1=0 fc rgb '#9a9a9a' fs solid "
                 "0.6 noborder notitle\n",
                 f->result->energy_unit > 0.0 ? "Fermi energy [meV]"
                                              : "Fermi energy [units of the model]",
                 f->figure.name);
}

static void add_script(plot *f, const sv_headline *headline)
{
    const sv_plateau_result *r = f->result;
    sv_draft *script = &f->figure.script;
    const double w = f->figure.width_cm;
    const double top = f->figure.height_cm - sv_headline_height(headline) - top_air_cm - key_cm;
    sv_draft_add(script, "# A marker against the Fermi energy; draw it again with: gnuplot %s.gp\n",
                 f->figure.name);
    sv_script_terminals(&f->figure);
    sv_draft_add(script, "unset arrow\nunset label\nunset object\nunset xlabel\nset multiplot\n");
    sv_headline_add(headline, &f->figure);
    sv_draft_add(script,
                 "set lmargin at screen %.5f\nset rmargin at screen %.5f\nset border 31 lw 0.6 "
                 "front\nset tics scale 0.5 in front\nset ytics offset 0.4,0\nset xtics offset "
                 "0,0.2 autofreq\nset xrange [%.9g:%.9g]\n",
                 left_cm / w, 1 - right_cm / w, f->factor * r->energies[0],
                 f->factor * r->energies[r->n - 1]);
    add_curves(f, top);
    add_density(f, top - panel_cm - gap_cm);
    sv_draft_add(script, "unset multiplot\nunset output\n}\n");
}

static sv_status draw(plot *f, sv_figure_files *files)
{
    const sv_plateau_result *r = f->result;
    sv_headline headline;
    char note[300];
    snprintf(note, sizeof note,
             "%lld realisations, band: 2 standard errors\ngrey: within %.3g of %.4g; states of "
             "realisation 0",
             (long long)r->realisations, r->within, r->clean);
    sv_headline_make(r->title, note, &headline);
    f->figure.title = r->title;
    f->figure.description = note;
    f->figure.width_cm = width_cm;
    f->figure.height_cm = sv_headline_height(&headline) + top_air_cm + key_cm + panel_cm + gap_cm +
                          density_cm + foot_cm;
    sv_status status = write_data(f, files);
    if (status != SV_OK)
        return status;
    add_script(f, &headline);
    return sv_figure_draw(&f->figure, files);
}

sv_status sv_figure_plateau(sv_context *context, const char *folder, const char *name,
                            const sv_plateau_result *result, sv_figure_files *ret_files)
{
    plot f = {.figure = {.context = context, .folder = folder, .name = name},
              .result = result,
              .factor = result->energy_unit > 0.0 ? 1e3 * result->energy_unit : 1.0};
    sv_figure_files files;
    if (result->n < 2)
        return SV_FAIL(context, SV_INVALID_INPUT, "a plateau of %lld energies",
                       (long long)result->n);
    sv_status status = sv_figure_begin(&f.figure, &files);
    if (status == SV_OK)
        status = draw(&f, &files);
    sv_draft_drop(&f.figure.script);
    if (status == SV_OK)
        *ret_files = files;
    return status;
}
