/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The map of the local Chern marker over a flake. */
#include <math.h>
#include <stdio.h>
#include <string.h>

#include "figure_internal.h"

/* The outcome and the window of the marker that is drawn. */
static sv_status find_marker(sv_context *context, sv_map_figure *f)
{
    int count;
    const sv_marker *table = sv_marker_table(&count);
    const sv_case *point = f->map->point;
    for (int i = 0; i < point->n_markers; i++) {
        const sv_marker *marker = &table[point->markers[i].marker];
        const int key = sv_kind_find_key(&marker->kind, "window");
        sv_index cells;
        if (marker->is_index || key < 0)
            continue;
        if (i < f->map->record->n_outcomes)
            f->outcome = &f->map->record->outcomes[i];
        return sv_flake_window(context, f->map->sample->flake,
                               point->markers[i].values[key].real[0], &f->window, &cells);
    }
    return SV_OK;
}

sv_status sv_map_write_data(sv_map_figure *f, sv_figure_files *files)
{
    sv_draft text = {.context = f->figure.context};
    char path[512], *data = NULL;
    sv_draft_add(&text, "# Lines and vacancies of the map, in lattice constants.\n\n\n"
                        "# outline\n");
    sv_status status = sv_outline_write(&text, &f->raster, SV_PIXEL_FLAKE);
    sv_draft_add(&text, "\n# window\n");
    if (status == SV_OK)
        status = sv_outline_write(&text, &f->raster, SV_PIXEL_WINDOW);
    sv_draft_add(&text, "\n# vacancies\n");
    for (sv_index k = 0; k < f->vacancies.count; k++)
        sv_draft_add(&text, "%.7g %.7g\n", f->vacancies.at[k][0], f->vacancies.at[k][1]);
    const size_t size = (size_t)text.size;
    if (status != SV_OK)
        sv_draft_drop(&text);
    else
        status = sv_draft_finish(&text, &data);
    if (status == SV_OK)
        status = sv_figure_write(&f->figure, ".dat", data, size, path);
    sv_give(f->figure.context, data);
    if (status == SV_OK)
        status = sv_figure_write(&f->figure, ".bin", f->raster.value,
                                 (size_t)f->raster.nx * (size_t)f->raster.ny * sizeof(float),
                                 files->data);
    return status;
}

/* What the numbers say, below the title and in the description. */
static void choose_words(sv_map_figure *f, char note[300])
{
    const sv_outcome *o = f->outcome;
    const long long realisation = (long long)f->map->record->realisation;
    const char *where = f->map->note == NULL ? "" : f->map->note;
    if (o != NULL && o->verdict == SV_RESOLVED)
        snprintf(note, 300, "mean over the dashed window %.4f (realisation %lld)%s%.150s", o->value,
                 realisation, where[0] ? "\n" : "", where);
    else
        snprintf(note, 300, "realisation %lld; the window mean is not resolved", realisation);
}

static double choose_range(const sv_map_figure *f)
{
    const bool known = f->outcome != NULL && isfinite(f->outcome->value);
    return fmax(1.25, known ? 1.25 * fabs(f->outcome->value) : 0);
}

static sv_status prepare(sv_map_figure *f)
{
    sv_context *context = f->figure.context;
    sv_status status = find_marker(context, f);
    if (status == SV_OK)
        status = sv_raster_make(context, f->map, f->window, 0, &f->raster);
    if (status == SV_OK)
        status = sv_places_vacant(context, f->map->sample, &f->vacancies);
    return status;
}

sv_status sv_figure_map(sv_context *context, const char *folder, const char *name,
                        const sv_map_result *map, sv_figure_files *ret_files)
{
    char note[300];
    sv_figure_files files;
    sv_map_figure f = {.figure = {.context = context, .folder = folder, .name = name}, .map = map};
    sv_status status = sv_figure_begin(&f.figure, &files);
    if (status == SV_OK && map->site_values == NULL) {
        snprintf(files.reason, sizeof files.reason, "the marker of each site was not computed");
        *ret_files = files;
        return SV_OK;
    }
    if (status == SV_OK)
        status = prepare(&f);
    if (status == SV_OK) {
        choose_words(&f, note);
        sv_headline_make(map->title, note, &f.headline);
        f.figure.title = map->title;
        f.figure.description = note;
        f.range = choose_range(&f);
        sv_raster_frame(&f.raster, f.low, f.high);
        sv_map_choose_layout(&f);
        status = sv_map_write_data(&f, &files);
    }
    if (status == SV_OK) {
        sv_map_add_script(&f);
        status = sv_figure_draw(&f.figure, &files);
    }
    sv_draft_drop(&f.figure.script);
    sv_give(context, f.window);
    sv_give(context, f.vacancies.at);
    sv_raster_free(context, &f.raster);
    if (status == SV_OK)
        *ret_files = files;
    return status;
}
