/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The flake of one realisation as a figure: site by site, or as pixels when there are many. */
#include <math.h>
#include <stdio.h>
#include <string.h>

#include "figure_internal.h"

enum { MOST_SYMBOLS = 3000, FINE_PIXELS = 900, COARSE_PIXELS = 420 };
static const double fine_cells = 110; /* across; larger flakes get pixels that keep files small */

static double cells_across(const sv_flake *flake)
{
    double low[2] = {INFINITY, INFINITY}, high[2] = {-INFINITY, -INFINITY};
    for (sv_index k = 0; k < flake->n_sites; k++)
        for (int d = 0; d < 2; d++) {
            low[d] = fmin(low[d], flake->sites[k].at[d]);
            high[d] = fmax(high[d], flake->sites[k].at[d]);
        }
    return fmax(high[0] - low[0], high[1] - low[1]) / sqrt(sv_model_cell_area(flake->model));
}

/* Unit and range of the potential: in meV when the model's unit is known. */
static void choose_colour(sv_draw_figure *f)
{
    const sv_sample *sample = f->result->sample;
    double largest = 0;
    for (sv_index r = 0; r < sample->n; r++)
        largest = fmax(largest, fabs(sample->potential[r]));
    const double ev = f->result->energy_unit;
    const bool small = ev > 0 && largest * ev < 0.9995;
    f->energy_factor = ev > 0 ? (small ? 1000 * ev : ev) : 1;
    f->unit = ev > 0 ? (small ? "meV" : "eV") : "model unit";
    f->range = largest * f->energy_factor;
}

/* The raster sums over the sites of a cell: shares of the cell's mean. */
static sv_status make_energies(sv_draw_figure *f)
{
    sv_context *context = f->figure.context;
    const sv_sample *sample = f->result->sample;
    const sv_flake *flake = sample->flake;
    int32_t *present = NULL;
    sv_status status = sv_take(context, flake->n_cells, sizeof *present, &present);
    if (status == SV_OK)
        status = sv_take(context, sample->n, sizeof *f->site_energy, &f->site_energy);
    for (sv_index r = 0; r < sample->n && status == SV_OK; r++)
        present[flake->sites[sample->pristine[r]].cell]++;
    for (sv_index r = 0; r < sample->n && status == SV_OK; r++)
        f->site_energy[r] = f->energy_factor * sample->potential[r] /
                            present[flake->sites[sample->pristine[r]].cell];
    sv_give(context, present);
    return status;
}

static sv_status make_raster(sv_draw_figure *f)
{
    const sv_flake *flake = f->result->sample->flake;
    const sv_map_result map = {.sample = f->result->sample, .site_values = f->site_energy};
    const int most = cells_across(flake) > fine_cells ? COARSE_PIXELS : FINE_PIXELS;
    return sv_raster_make(f->figure.context, &map, NULL, most, &f->raster);
}

static void choose_words(const sv_draw_figure *f, char note[300])
{
    const sv_flake *flake = f->result->sample->flake;
    const bool torus = flake->periodic[0] || flake->periodic[1];
    const char *boundary = !torus                                     ? "open flake"
                           : flake->periodic[0] && flake->periodic[1] ? "torus"
                                                                      : "closed along one side";
    const sv_inventory *inventory = &f->result->sample->inventory;
    char largest[64] = "";
    if (inventory->pieces > 1)
        snprintf(largest, sizeof largest, " (largest: %lld sites)",
                 (long long)inventory->largest_piece);
    snprintf(note, 300, "realisation %lld, %lld sites, %s%s\n%lld piece%s%s, imbalance %lld",
             (long long)f->result->realisation, (long long)f->result->sample->n, boundary,
             torus && f->by_site ? ": dashed hops go around" : "", (long long)inventory->pieces,
             inventory->pieces == 1 ? "" : "s", largest, (long long)inventory->imbalance);
}

static sv_status write_data(sv_draw_figure *f, sv_figure_files *files)
{
    sv_draft text = {.context = f->figure.context};
    char path[512], *data = NULL;
    sv_draft_add(&text, "# The parts of the drawing, in lattice constants.\n\n\n# outline\n");
    sv_status status = sv_outline_write(&text, &f->raster, SV_PIXEL_FLAKE);
    if (status == SV_OK)
        status = sv_draw_write_sites(f, &text);
    const size_t size = (size_t)text.size;
    if (status != SV_OK)
        sv_draft_drop(&text);
    else
        status = sv_draft_finish(&text, &data);
    if (status == SV_OK)
        status = sv_figure_write(&f->figure, ".dat", data, size, files->data);
    sv_give(f->figure.context, data);
    if (status == SV_OK && !f->by_site)
        status = sv_figure_write(&f->figure, ".bin", f->raster.value,
                                 (size_t)f->raster.nx * (size_t)f->raster.ny * sizeof(float), path);
    return status;
}

static sv_index count_positions(const sv_flake *flake)
{
    return flake->n_cells * flake->model->n_positions;
}

static sv_status draw(sv_draw_figure *f, sv_figure_files *files)
{
    char note[300];
    f->by_site = count_positions(f->result->sample->flake) <= MOST_SYMBOLS;
    choose_colour(f);
    sv_status status = make_energies(f);
    if (status == SV_OK)
        status = make_raster(f);
    if (status != SV_OK)
        return status;
    choose_words(f, note);
    sv_headline_make(f->result->title, note, &f->headline);
    f->figure.title = f->result->title;
    f->figure.description = note;
    sv_raster_frame(&f->raster, f->low, f->high);
    status = write_data(f, files);
    if (status == SV_OK) {
        sv_draw_choose_layout(f);
        sv_draw_add_script(f);
        status = sv_figure_draw(&f->figure, files);
    }
    return status;
}

sv_status sv_figure_sample(sv_context *context, const char *folder, const char *name,
                           const char *ending, const sv_sample_result *result,
                           sv_figure_files *ret_files)
{
    sv_figure_files files;
    sv_draw_figure f = {
        .figure = {.context = context, .folder = folder, .name = name, .only = ending},
        .result = result};
    sv_status status = sv_figure_begin(&f.figure, &files);
    if (status == SV_OK)
        status = draw(&f, &files);
    sv_draft_drop(&f.figure.script);
    sv_give(context, f.site_energy);
    sv_raster_free(context, &f.raster);
    if (status == SV_OK)
        *ret_files = files;
    return status;
}
