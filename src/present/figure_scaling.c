/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Curves of several sizes: left as they are, right against the scaling variable, below what is left
 * of them in standard errors. */
#include <math.h>
#include <stdio.h>
#include <string.h>

#include "figure_internal.h"

static const double width_cm = 17.4, left_cm = 1.45, right_cm = 0.35, foot_cm = 1.1;
static const double middle_cm = 1.75, panel_cm = 5.2, rest_cm = 1.9, gap_cm = 0.3, key_cm = 0.55;

typedef struct scaling_figure {
    sv_figure figure;
    const sv_finite_size *study;
    const sv_scaling *s;
    double top_cm, half_cm;
} scaling_figure;

/* One hue from light to dark with size, a mark of its own for each. */
static void size_style(const scaling_figure *f, int size, char colour[8], int *mark)
{
    static const int light[3] = {0x74, 0xb9, 0xe0}, dark[3] = {0x06, 0x23, 0x45};
    static const int marks[] = {7, 5, 9, 13, 11, 6, 4, 8};
    int rgb[3];
    double share = f->s->n_sizes > 1 ? (double)size / (f->s->n_sizes - 1) : 1.0;
    for (int i = 0; i < 3; i++)
        rgb[i] = (int)lround(light[i] + share * (dark[i] - light[i]));
    snprintf(colour, 8, "#%02x%02x%02x", rgb[0] & 0xff, rgb[1] & 0xff, rgb[2] & 0xff);
    *mark = marks[size % 8];
}

static void add_number(sv_draft *text, double value)
{
    if (isfinite(value))
        sv_draft_add(text, " %.9g", value);
    else
        sv_draft_add(text, " NaN");
}

/* A block per size, then the fitted function. */
static sv_status write_data(scaling_figure *f, sv_figure_files *files)
{
    const sv_scaling *s = f->s;
    sv_draft text = {.context = f->figure.context};
    char *data = NULL;
    sv_draft_add(&text, "# parameter, mean, standard error, x = (p - p_c) L^(1/nu), mean less its "
                        "correction, fit, residual in standard errors, in the fit (1) or not\n");
    for (int size = 0; size < s->n_sizes; size++) {
        sv_draft_add(&text, "%s# size %.9g\n", size > 0 ? "\n\n" : "", s->sizes[size]);
        for (sv_index i = 0; i < s->n_rows; i++) {
            const sv_scaling_row *row = &s->rows[i];
            if (row->size != s->sizes[size])
                continue;
            const double numbers[] = {row->mean,      row->standard_error, row->x,
                                      row->collapsed, row->fitted,         row->residual};
            sv_draft_add(&text, "%.12g", row->parameter);
            for (int k = 0; k < 6; k++)
                add_number(&text, numbers[k]);
            sv_draft_add(&text, " %d\n", row->used);
        }
    }
    sv_draft_add(&text, "\n\n# the fitted function: x, F(x)\nNaN NaN\n");
    for (int i = 0; i < s->n_curve; i++)
        sv_draft_add(&text, "%.9g %.9g\n", s->curve[2 * i], s->curve[2 * i + 1]);
    const size_t size = (size_t)text.size;
    sv_status status = sv_draft_finish(&text, &data);
    if (status == SV_OK)
        status = sv_figure_write(&f->figure, ".dat", data, size, files->data);
    sv_give(f->figure.context, data);
    return status;
}

static void add_panel(scaling_figure *f, bool right, double top, double height)
{
    const double w = f->figure.width_cm, h = f->figure.height_cm;
    const double left = right ? left_cm + f->half_cm + middle_cm : left_cm;
    sv_draft_add(&f->figure.script,
                 "set lmargin at screen %.5f\nset rmargin at screen %.5f\n"
                 "set tmargin at screen %.5f\nset bmargin at screen %.5f\n",
                 left / w, (left + f->half_cm) / w, top / h, (top - height) / h);
}

/* Mean with bar and mark of every size; `x` and `y` are columns of the table. Means outside the fit
 * are pale. */
static void add_points(scaling_figure *f, const char *x, const char *y, const char *bar, bool key)
{
    sv_draft *script = &f->figure.script;
    for (int size = 0; size < f->s->n_sizes; size++) {
        char colour[8];
        int mark;
        size_style(f, size, colour, &mark);
        sv_draft_add(script,
                     "%s'%s.dat' index %d using %s:(%s-%s):(0):(2*%s) with vectors nohead lc rgb "
                     "'%s' lw 0.7 notitle, \\\n",
                     size > 0 ? ", \\\n  " : "  ", f->figure.name, size, x, y, bar, bar, colour);
        sv_draft_add(script,
                     "  '%s.dat' index %d using %s:(%s) with points lc rgb '%s' pt %d ps 0.45",
                     f->figure.name, size, x, y, colour, mark);
        if (key)
            sv_draft_add(script, " title 'size %.6g'", f->s->sizes[size]);
        else
            sv_draft_add(script, " notitle");
    }
    sv_draft_add(script, "\n");
}

/* What is quoted: p_c of the collapse, else that of the crossings. */
static const sv_scaling_estimate *quoted(const sv_scaling *s)
{
    return s->collapse.decided ? &s->collapse.critical : &s->crossing;
}

static void add_raw(scaling_figure *f)
{
    sv_draft *script = &f->figure.script;
    const sv_scaling_estimate *p = quoted(f->s);
    char name[400], literal[500], marker[200];
    sv_words_parameter(&f->study->parameter, name, sizeof name);
    sv_script_literal(name, literal, sizeof literal);
    sv_script_literal(sv_words_marker(f->study->marker), marker, sizeof marker);
    add_panel(f, false, f->top_cm, panel_cm + gap_cm + rest_cm);
    sv_draft_add(script, "set xlabel %s offset 0,0.5\nset ylabel %s offset 1.4,0\n", literal,
                 marker);
    if (isfinite(p->value))
        sv_draft_add(script,
                     "set arrow 1 from first %.9g,graph 0 to first %.9g,graph 1 nohead lc rgb "
                     "'#d55e00' lw 0.8 back\n",
                     p->value, p->value);
    if (isfinite(p->value) && isfinite(p->interval[0]) && isfinite(p->interval[1]))
        sv_draft_add(script,
                     "set object 1 rectangle from first %.9g,graph 0 to first %.9g,graph 1 "
                     "fillcolor rgb '#f6dccb' fillstyle solid noborder behind\n",
                     p->interval[0], p->interval[1]);
    sv_draft_add(script,
                 "set key at screen %.5f,%.5f left bottom Left reverse horizontal maxrows 1 "
                 "samplen 0.8 width -1 font 'Helvetica,7'\n",
                 left_cm / f->figure.width_cm, (f->top_cm + 0.08) / f->figure.height_cm);
    sv_draft_add(script, "plot \\\n");
    for (int size = 0; size < f->s->n_sizes; size++) {
        char colour[8];
        int mark;
        size_style(f, size, colour, &mark);
        sv_draft_add(script,
                     "  '%s.dat' index %d using 1:2 with lines lc rgb '%s' lw 0.5 notitle, \\\n",
                     f->figure.name, size, colour);
    }
    add_points(f, "1", "$2", "$3", true);
    sv_draft_add(script, "unset key\nunset arrow\nunset object\n");
}

static void add_collapse(scaling_figure *f)
{
    sv_draft *script = &f->figure.script;
    const sv_scaling_collapse *c = &f->s->collapse;
    char marker[200];
    add_panel(f, true, f->top_cm, panel_cm);
    sv_draft_add(script, "unset xlabel\nset format x ''\n");
    sv_script_literal(sv_words_marker(f->study->marker), marker, sizeof marker);
    sv_draft_add(script, "set ylabel %s.'%s' offset 1.4,0\n", marker,
                 c->correction_order >= 0 ? ", corrected" : "");
    sv_draft_add(script, "set xrange [%.9g:%.9g] noextend\n", -1.04 * c->reach, 1.04 * c->reach);
    if (!c->decided)
        sv_draft_add(script, "set label 9 'not decided: not to be quoted' at graph 0.03,0.94 left "
                             "font 'Helvetica,7' tc rgb '#b04000' front\n");
    sv_draft_add(script,
                 "plot \\\n  '%s.dat' index %d using 1:2 with lines lc rgb '#d55e00' lw 0.9 "
                 "notitle, \\\n",
                 f->figure.name, f->s->n_sizes);
    add_points(f, "($8 > 0 ? $4 : NaN)", "$5", "$3", false);
    sv_draft_add(script, "unset label 9\n");
    add_panel(f, true, f->top_cm - panel_cm - gap_cm, rest_cm);
    double tall = 3.0;
    for (sv_index i = 0; i < f->s->n_rows; i++)
        if (f->s->rows[i].used)
            tall = fmax(tall, fabs(f->s->rows[i].residual));
    sv_draft_add(script,
                 "set format x '%%g'\nset xlabel '(p \u2212 p_c) L^(1/\u03bd)' offset 0,0.5\n"
                 "set ylabel 'residual / error' offset 1.4,0\nset yrange [%.4g:%.4g]\n"
                 "set ytics %d\n",
                 -1.15 * tall, 1.15 * tall, tall > 8.0 ? (int)(tall / 2.0) : 2);
    sv_draft_add(script,
                 "set arrow 2 from graph 0,first 0 to graph 1,first 0 nohead lc rgb '#808080' lw "
                 "0.5 back\n"
                 "plot \\\n");
    add_points(f, "($8 > 0 ? $4 : NaN)", "$7", "1", false);
}

static void add_nothing(scaling_figure *f)
{
    sv_draft *script = &f->figure.script;
    const double x = (left_cm + 1.5 * f->half_cm + middle_cm) / f->figure.width_cm;
    sv_draft_add(script,
                 "set label 9 'no collapse could be fitted' at screen %.5f,%.5f center font "
                 "'Helvetica,7' tc rgb '#606060'\n",
                 x, (f->top_cm - 0.5 * panel_cm) / f->figure.height_cm);
}

static void add_script(scaling_figure *f, const sv_headline *headline)
{
    sv_draft *script = &f->figure.script;
    const bool fitted = f->s->collapse.fitted;
    sv_draft_add(script, "# Finite sizes; draw it again with: gnuplot %s.gp\n", f->figure.name);
    sv_script_terminals(&f->figure);
    sv_draft_add(script, "reset session\nset encoding utf8\nset datafile missing 'NaN'\n"
                         "set multiplot\n");
    sv_headline_add(headline, &f->figure);
    sv_draft_add(script, "set border 31 lw 0.6\nunset key\nset tics scale 0.5 in\nset mxtics 2\n"
                         "set mytics 2\nset ytics offset 0.4,0\nset xtics offset 0,0.2\n"
                         "set offsets graph 0.03, graph 0.03, graph 0.04, graph 0.04\n"
                         "set autoscale xfix\n");
    if (!fitted)
        add_nothing(f);
    add_raw(f);
    if (fitted)
        add_collapse(f);
    sv_draft_add(script, "unset multiplot\nunset output\n}\n");
}

/* What came out, in two lines of small print. */
static void choose_note(const sv_finite_size *study, char *note, size_t size)
{
    const sv_scaling *s = &study->scaling;
    const sv_scaling_collapse *c = &s->collapse;
    const char *unit = study->parameter.unit != NULL ? study->parameter.unit : "";
    const char *gap = unit[0] != '\0' ? " " : "";
    char p[48], nu[48], crossing[48];
    sv_format_uncertain(c->critical.value, c->critical.standard_error, p, sizeof p);
    sv_format_uncertain(c->nu.value, c->nu.standard_error, nu, sizeof nu);
    sv_format_uncertain(s->crossing.value, s->crossing.standard_error, crossing, sizeof crossing);
    if (c->decided)
        snprintf(note, size,
                 "collapse: p_c = %s%s%s, \u03bd = %s, \u03c7\u00b2 = %.3g for %d, p-value %.2g\n"
                 "crossings: p_c = %s%s%s; bars: one standard error, band: interval of p_c",
                 p, gap, unit, nu, c->chi_square, c->degrees_of_freedom, c->p_value, crossing, gap,
                 unit);
    else
        snprintf(note, size,
                 "the data do not decide a collapse: %.150s\ncrossings: p_c = %s%s%s; "
                 "bars: one standard error",
                 c->n_reasons > 0 ? c->reasons[0] : "", crossing, gap, unit);
}

static sv_status draw(scaling_figure *f, const sv_result *result, sv_figure_files *files)
{
    char note[600];
    sv_headline headline;
    choose_note(f->study, note, sizeof note);
    sv_headline_make_wide(result->title, note, 2, &headline);
    f->figure.title = result->title;
    f->figure.description = note;
    f->figure.width_cm = width_cm;
    f->figure.height_cm =
        sv_headline_height(&headline) + key_cm + panel_cm + gap_cm + rest_cm + foot_cm;
    f->top_cm = f->figure.height_cm - sv_headline_height(&headline) - key_cm;
    f->half_cm = 0.5 * (width_cm - left_cm - middle_cm - right_cm);
    sv_status status = write_data(f, files);
    if (status != SV_OK)
        return status;
    add_script(f, &headline);
    return sv_figure_draw(&f->figure, files);
}

sv_status sv_figure_scaling(sv_context *context, const char *folder, const char *name,
                            const sv_result *result, sv_figure_files *ret_files)
{
    scaling_figure f = {.figure = {.context = context, .folder = folder, .name = name},
                        .study = result->finite_size};
    sv_figure_files files;
    if (f.study == NULL)
        return SV_FAIL(context, SV_INVALID_INPUT, "there is no study of finite sizes to draw");
    f.s = &f.study->scaling;
    sv_status status = sv_figure_begin(&f.figure, &files);
    if (status == SV_OK)
        status = draw(&f, result, &files);
    sv_draft_drop(&f.figure.script);
    if (status == SV_OK)
        *ret_files = files;
    return status;
}
