/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The localizer gap over a grid of probe points, with the regions of equal index. */
#include <math.h>
#include <stdio.h>
#include <string.h>

#include "figure_internal.h"

enum { PALETTE_STOPS = 33 };
static const double width_cm = 8.6, side_cm = 0.25, bar_room_cm = 1.75, foot_cm = 0.85;

typedef struct probe_figure {
    sv_figure figure;
    const sv_map_result *map;
    const sv_survey *survey;
    sv_raster raster;        /* outline of the flake */
    double low[2], high[2];  /* what is shown */
    double step[2], largest; /* between probes; largest gap */
    double left_cm, scale, picture_cm;
    bool cut; /* there are larger gaps outside the flake */
    sv_headline headline;
} probe_figure;

static const sv_probe *probe_at(const probe_figure *f, sv_index i, sv_index j)
{
    return &f->survey->probes[i + j * f->survey->points[0]];
}

/* The same region: both resolved with one index, or both not. */
static bool alike(const sv_probe *a, const sv_probe *b)
{
    return a->resolved == b->resolved && (!a->resolved || a->index == b->index);
}

/* Sides of a probe's rectangle where its neighbour belongs to another region. */
static void add_boundary(const probe_figure *f, sv_draft *text)
{
    const sv_survey *s = f->survey;
    for (sv_index j = 0; j < s->points[1]; j++)
        for (sv_index i = 0; i < s->points[0]; i++) {
            const sv_probe *p = probe_at(f, i, j);
            const double x = p->at[0] + 0.5 * f->step[0], y = p->at[1] + 0.5 * f->step[1];
            if (i + 1 < s->points[0] && !alike(p, probe_at(f, i + 1, j)))
                sv_draft_add(text, "%.7g %.7g\n%.7g %.7g\n\n", x, y - f->step[1], x, y);
            if (j + 1 < s->points[1] && !alike(p, probe_at(f, i, j + 1)))
                sv_draft_add(text, "%.7g %.7g\n%.7g %.7g\n\n", x - f->step[0], y, x, y);
        }
}

/* Marks the region of one probe, returns its member deepest inside (of equals the largest gap). */
static sv_index flood(const probe_figure *f, sv_index start, uint8_t *seen, sv_index *queue)
{
    const sv_index nx = f->survey->points[0], ny = f->survey->points[1];
    const sv_probe *probes = f->survey->probes;
    sv_index head = 0, tail = 0, best = start;
    seen[start] = 1;
    queue[tail++] = start;
    while (head < tail) {
        const sv_index k = queue[head++], i = k % nx, j = k / nx;
        const sv_index next[4] = {i > 0 ? k - 1 : -1, i + 1 < nx ? k + 1 : -1, j > 0 ? k - nx : -1,
                                  j + 1 < ny ? k + nx : -1};
        if (probes[k].gap > probes[best].gap)
            best = k;
        for (int d = 0; d < 4; d++)
            if (next[d] >= 0 && !seen[next[d]] && alike(&probes[next[d]], &probes[start])) {
                seen[next[d]] = 1;
                queue[tail++] = next[d];
            }
    }
    return best;
}

/* One number per region of resolved probes. */
static sv_status add_labels(const probe_figure *f, sv_draft *text)
{
    const sv_index count = f->survey->points[0] * f->survey->points[1];
    const sv_probe *probes = f->survey->probes;
    uint8_t *seen = NULL;
    sv_index *queue = NULL;
    sv_status status = sv_take(f->figure.context, count, 1, &seen);
    if (status == SV_OK)
        status = sv_take(f->figure.context, count, sizeof *queue, &queue);
    for (sv_index k = 0; k < count && status == SV_OK; k++) {
        if (seen[k] || !probes[k].resolved)
            continue;
        const sv_index at = flood(f, k, seen, queue);
        sv_draft_add(text, "%.7g %.7g %lld\n", probes[at].at[0], probes[at].at[1],
                     (long long)probes[at].index);
    }
    sv_give(f->figure.context, seen);
    sv_give(f->figure.context, queue);
    return status;
}

static sv_status write_gaps(probe_figure *f)
{
    const sv_index count = f->survey->points[0] * f->survey->points[1];
    float *gap = NULL;
    char path[512];
    sv_status status = sv_take(f->figure.context, count, sizeof *gap, &gap);
    for (sv_index k = 0; k < count && status == SV_OK; k++)
        gap[k] = (float)f->survey->probes[k].gap;
    if (status == SV_OK)
        status = sv_figure_write(&f->figure, ".bin", gap, (size_t)count * sizeof *gap, path);
    sv_give(f->figure.context, gap);
    return status;
}

static sv_status write_data(probe_figure *f, sv_figure_files *files)
{
    sv_draft text = {.context = f->figure.context};
    char *data = NULL;
    const sv_index count = f->survey->points[0] * f->survey->points[1];
    sv_draft_add(&text, "# Lines and marks of the map, in lattice constants.\n\n\n# outline\n");
    sv_status status = sv_outline_write(&text, &f->raster, SV_PIXEL_FLAKE);
    sv_draft_add(&text, "\n# boundary\n");
    add_boundary(f, &text);
    sv_draft_add(&text, "\n\n# unresolved\n");
    for (sv_index k = 0; k < count; k++)
        if (!f->survey->probes[k].resolved)
            sv_draft_add(&text, "%.7g %.7g\n", f->survey->probes[k].at[0],
                         f->survey->probes[k].at[1]);
    sv_draft_add(&text, "\n\n# labels\n");
    if (status == SV_OK)
        status = add_labels(f, &text);
    const size_t size = (size_t)text.size;
    if (status != SV_OK)
        sv_draft_drop(&text);
    else
        status = sv_draft_finish(&text, &data);
    if (status == SV_OK)
        status = sv_figure_write(&f->figure, ".dat", data, size, files->data);
    sv_give(f->figure.context, data);
    return status == SV_OK ? write_gaps(f) : status;
}

static bool on_flake(const probe_figure *f, const double at[2])
{
    const sv_raster *r = &f->raster;
    const long x = lround((at[0] - r->low[0]) / r->step), y = lround((at[1] - r->low[1]) / r->step);
    return x >= 0 && y >= 0 && x < r->nx && y < r->ny && r->inside[(sv_index)y * r->nx + x] != 0;
}

/* The shades serve the flake: outside, the gap grows with the distance and is cut. */
static void choose_range(probe_figure *f)
{
    const sv_survey *s = f->survey;
    double beyond = 0.0;
    for (sv_index k = 0; k < s->points[0] * s->points[1]; k++) {
        const sv_probe *p = &s->probes[k];
        if (isfinite(p->gap) && on_flake(f, p->at))
            f->largest = fmax(f->largest, p->gap);
        else if (isfinite(p->gap))
            beyond = fmax(beyond, p->gap);
    }
    if (!(f->largest > 0.0))
        f->largest = beyond > 0.0 ? beyond : 1.0;
    f->cut = beyond > f->largest;
}

static void choose_frame(probe_figure *f)
{
    const sv_survey *s = f->survey;
    const sv_raster *r = &f->raster;
    const int pixels[2] = {r->nx, r->ny};
    for (int d = 0; d < 2; d++) {
        f->step[d] = (s->to[d] - s->from[d]) / (double)(s->points[d] - 1);
        f->low[d] = fmin(s->from[d] - 0.5 * f->step[d], r->low[d]);
        f->high[d] = fmax(s->to[d] + 0.5 * f->step[d], r->low[d] + (pixels[d] - 1) * r->step);
    }
    choose_range(f);
}

static void choose_layout(probe_figure *f)
{
    const double room = width_cm - side_cm - bar_room_cm, tallest = 11;
    const double x = f->high[0] - f->low[0], y = f->high[1] - f->low[1];
    f->scale = fmin(room / x, tallest / y);
    f->left_cm = side_cm + 0.5 * (room - f->scale * x);
    f->picture_cm = fmax(f->scale * y, 2.2);
    f->figure.width_cm = width_cm;
    f->figure.height_cm = foot_cm + f->picture_cm + sv_headline_height(&f->headline);
}

static void add_palette(probe_figure *f)
{
    const double w = f->figure.width_cm, h = f->figure.height_cm, x = w - 1.5;
    sv_draft *script = &f->figure.script;
    sv_draft_add(script, "set palette maxcolors 0\nset palette defined (");
    for (int k = 0; k < PALETTE_STOPS; k++) {
        uint8_t rgb[3];
        sv_palette_colour(-0.85 * k / (PALETTE_STOPS - 1), rgb);
        sv_draft_add(script, "%s%d '#%02x%02x%02x'%s", k > 0 ? ", " : "", k, rgb[0], rgb[1], rgb[2],
                     k % 4 == 3 ? "\\\n  " : "");
    }
    sv_draft_add(
        script,
        ")\nset style line 9 lc rgb '#333333' lw 0.5\nset colorbox user origin screen "
        "%.5f,%.5f size screen %.5f,%.5f border 9\nset cbrange [0:%.6g]\n"
        "set cbtics out nomirror scale 0.4 offset -0.6,0 font ',7'\n"
        "set label 11 'localizer gap%s' at screen %.5f,%.5f center rotate by 90 font ',7'\n",
        x / w, (foot_cm + 0.1) / h, 0.28 / w, fmin(f->picture_cm - 0.2, 5.0) / h, f->largest,
        f->cut ? " (larger outside)" : "", (w - 0.24) / w,
        (foot_cm + 0.5 * fmin(f->picture_cm, 5.2)) / h);
}

/* What the marks mean, in words at the foot. */
static void add_legend(probe_figure *f)
{
    const double w = f->figure.width_cm, h = f->figure.height_cm, y = 0.42;
    sv_draft_add(&f->figure.script,
                 "set label 31 'numbers: index of the region;  crosses: unresolved;  thin line: "
                 "flake' at screen %.5f,%.5f left font ',6.5'\n",
                 side_cm / w, y / h);
}

static void add_plot(probe_figure *f)
{
    const sv_survey *s = f->survey;
    const char *name = f->figure.name;
    const double apart = f->scale * fmin(f->step[0], f->step[1]);
    sv_draft_add(&f->figure.script,
                 "set style textbox opaque fc rgb '#ffffff' noborder margins 0.6,0.6\nplot \\\n"
                 "  '%s.bin' binary array=(%lld,%lld) format='%%float' endian=little "
                 "origin=(%.9g,%.9g) dx=%.9g dy=%.9g using 1 with image pixels notitle, \\\n"
                 "  '%s.dat' index 'outline' using 1:2 with lines lc rgb '#000000' lw 0.4 notitle, "
                 "\\\n  '%s.dat' index 'boundary' using 1:2 with lines lc rgb '#000000' lw 1.6 "
                 "notitle, \\\n  '%s.dat' index 'unresolved' using 1:2 with points lc rgb "
                 "'#b03a00' pt 2 ps %.3g lw 0.6 notitle, \\\n"
                 "  '%s.dat' index 'labels' using 1:2:(sprintf('%%d', int($3))) with labels boxed "
                 "font ',8' notitle\n",
                 name, (long long)s->points[0], (long long)s->points[1], s->from[0], s->from[1],
                 f->step[0], f->step[1], name, name, name, fmin(fmax(1.2 * apart, 0.12), 0.4),
                 name);
}

static void add_script(probe_figure *f)
{
    const double w = f->figure.width_cm, h = f->figure.height_cm;
    const double x = f->high[0] - f->low[0], y = f->high[1] - f->low[1];
    const double foot = foot_cm + 0.5 * (f->picture_cm - f->scale * y);
    sv_draft *script = &f->figure.script;
    sv_draft_add(script,
                 "# Localizer gap over a grid of probe points; draw it again with: gnuplot %s.gp\n"
                 "# %s.bin: %lld x %lld values as 32-bit floats, rows from below.\n",
                 f->figure.name, f->figure.name, (long long)f->survey->points[0],
                 (long long)f->survey->points[1]);
    sv_script_terminals(&f->figure);
    sv_draft_add(script,
                 "set lmargin at screen %.5f\nset rmargin at screen %.5f\n"
                 "set bmargin at screen %.5f\nset tmargin at screen %.5f\n"
                 "set xrange [%.9g:%.9g]\nset yrange [%.9g:%.9g]\n"
                 "unset border\nunset tics\nunset key\n",
                 f->left_cm / w, (f->left_cm + f->scale * x) / w, foot / h,
                 (foot + f->scale * y) / h, f->low[0], f->high[0], f->low[1], f->high[1]);
    sv_headline_add(&f->headline, &f->figure);
    add_palette(f);
    add_legend(f);
    add_plot(f);
    sv_draft_add(script, "unset output\n}\n");
}

static void choose_words(probe_figure *f, char note[300])
{
    const sv_survey *s = f->survey;
    const char *where = f->map->note == NULL ? "" : f->map->note;
    snprintf(note, 300, "localizer gap at %lld x %lld points, kappa %.3g, realisation %lld\n%.150s",
             (long long)s->points[0], (long long)s->points[1], s->kappa,
             (long long)f->map->record->realisation, where);
    sv_headline_make(f->map->title, note, &f->headline);
    f->figure.title = f->map->title;
    f->figure.description = note;
}

sv_status sv_figure_probes(sv_context *context, const char *folder, const char *name,
                           const sv_map_result *map, sv_figure_files *ret_files)
{
    char note[300];
    sv_figure_files files;
    sv_map_result outline = *map;
    probe_figure f = {.figure = {.context = context, .folder = folder, .name = name},
                      .map = map,
                      .survey = map->survey};
    if (map->survey->points[0] == 0 || map->survey->line)
        return SV_FAIL(context, SV_INVALID_INPUT, "the survey has no grid to draw");
    outline.site_values = NULL;
    sv_status status = sv_figure_begin(&f.figure, &files);
    if (status == SV_OK)
        status = sv_raster_make(context, &outline, NULL, 0, &f.raster);
    if (status == SV_OK) {
        choose_words(&f, note);
        choose_frame(&f);
        choose_layout(&f);
        status = write_data(&f, &files);
    }
    if (status == SV_OK) {
        add_script(&f);
        status = sv_figure_draw(&f.figure, &files);
    }
    sv_draft_drop(&f.figure.script);
    sv_raster_free(context, &f.raster);
    if (status == SV_OK)
        *ret_files = files;
    return status;
}
