/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Mean and deviation of the local Chern marker over an ensemble, cell by cell. */
#include <math.h>
#include <stdio.h>

#include "figure_internal.h"

/* The flake without defects, as a sample: every position is drawn that has a value in any
 * realisation. */
static sv_status whole_flake(sv_context *context, const sv_flake *flake, sv_sample *ret_sample)
{
    sv_sample sample = {.flake = flake, .n = flake->n_sites};
    sv_status status = sv_take_raw(context, sample.n, sizeof *sample.pristine, &sample.pristine);
    for (sv_index k = 0; status == SV_OK && k < sample.n; k++)
        sample.pristine[k] = k;
    if (status == SV_OK)
        *ret_sample = sample;
    return status;
}

/* The number of a cell on its first site and nothing on the others; the largest one, as a range. */
static double spread_over_sites(const sv_site_map *map, bool deviation, double *values)
{
    double largest = 0.0;
    for (sv_index c = 0; c < map->flake->n_cells; c++) {
        const sv_cell *cell = &map->flake->cells[c];
        const sv_moments m = sv_site_map_cell(map, c);
        const double value = !deviation ? m.mean : m.n > 1 ? m.deviation : (double)NAN;
        for (sv_index k = 0; k < cell->n_sites; k++)
            values[cell->first_site + k] = k == 0 ? value : 0.0;
        if (isfinite(value))
            largest = fmax(largest, fabs(value));
    }
    return largest;
}

/* A round number, at least `value`. */
static double round_up(double value)
{
    const double power = pow(10.0, floor(log10(value)));
    const double steps[] = {1.0, 1.2, 1.6, 2.0, 2.4, 3.0, 4.0, 5.0, 6.0, 8.0, 10.0};
    for (size_t k = 0; k < sizeof steps / sizeof *steps; k++)
        if (steps[k] * power >= value * (1.0 - 1e-12))
            return steps[k] * power;
    return value;
}

static void choose_note(const sv_site_map *map, bool deviation, char note[300])
{
    const sv_site_summary s = sv_site_map_summary(map);
    const char *where = map->note == NULL ? "" : map->note;
    int used = snprintf(note, 300, "%s over %lld realisations", deviation ? "deviation" : "mean",
                        (long long)s.realisations);
    if (deviation && isfinite(s.largest))
        used += snprintf(note + used, 300 - (size_t)used, ", largest %.3g in cell (%d, %d)",
                         s.largest, s.cell[0], s.cell[1]);
    if (where[0] != '\0')
        snprintf(note + used, 300 - (size_t)used, "\n%.150s", where);
}

static sv_status window_of(sv_context *context, const sv_site_map *map, bool **ret_inside)
{
    const sv_case *point = map->point;
    const int chern = sv_marker_find("local_chern");
    sv_index cells;
    for (int k = 0; k < point->n_markers; k++)
        if (point->markers[k].marker == chern)
            return sv_flake_window(context, map->flake, point->markers[k].values[0].real[0],
                                   ret_inside, &cells);
    return SV_OK;
}

static sv_status draw(sv_map_figure *f, const sv_site_map *map, double largest, bool deviation,
                      sv_figure_files *files)
{
    char note[300];
    choose_note(map, deviation, note);
    sv_headline_make(map->title, note, &f->headline);
    f->figure.title = map->title;
    f->figure.description = note;
    f->kind = deviation ? SV_MAP_DEVIATION : SV_MAP_MEAN;
    f->range = deviation ? round_up(fmax(largest, 1e-6)) : 1.25;
    sv_raster_frame(&f->raster, f->low, f->high);
    sv_map_choose_layout(f);
    sv_status status = sv_map_write_data(f, files);
    if (status != SV_OK)
        return status;
    sv_map_add_script(f);
    return sv_figure_draw(&f->figure, files);
}

sv_status sv_figure_site_map(sv_context *context, const char *folder, const char *name,
                             const sv_site_map *map, bool deviation, sv_figure_files *ret_files)
{
    sv_figure_files files;
    sv_sample sample = {0};
    double *values = NULL, largest = 0.0;
    sv_map_result result = {.title = map->title,
                            .sample = &sample,
                            .point = map->point,
                            .lattice_constant = map->lattice_constant};
    sv_map_figure f = {.figure = {.context = context, .folder = folder, .name = name},
                       .map = &result};
    sv_status status = sv_figure_begin(&f.figure, &files);
    if (status == SV_OK)
        status = whole_flake(context, map->flake, &sample);
    if (status == SV_OK)
        status = sv_take(context, map->flake->n_sites, sizeof *values, &values);
    if (status == SV_OK) {
        largest = spread_over_sites(map, deviation, values);
        result.site_values = values;
        status = window_of(context, map, &f.window);
    }
    if (status == SV_OK)
        status = sv_raster_make(context, &result, f.window, 0, &f.raster);
    if (status == SV_OK)
        status = draw(&f, map, largest, deviation, &files);
    sv_draft_drop(&f.figure.script);
    sv_give(context, f.window);
    sv_give(context, values);
    sv_give(context, sample.pristine);
    sv_raster_free(context, &f.raster);
    if (status == SV_OK)
        *ret_files = files;
    return status;
}
