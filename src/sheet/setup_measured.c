/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The `file` of a disorder entry: rows, rasters and images, placed on the flake. */
#include "sheet_internal.h"

#include <math.h>
#include <stdio.h>
#include <string.h>

static const char PLACE_KEYS[] = "origin rotation tolerance unmatched between";
static const char IMAGE_KEYS[] = "pixel image_width black white darker_than brighter_than";

static bool report_table(sv_reader *reader, const sv_cached_file *file, const sv_table_fault *fault)
{
    sv_place place = {&file->source, fault->line, fault->column, 1};
    return sv_report_at(reader, &place, fault->hint[0] != '\0' ? fault->hint : NULL, "%s",
                        fault->message);
}

static sv_grid place_grid(const sv_section *section, sv_grid grid)
{
    memcpy(grid.origin, sv_section_value(section, "origin")->real, sizeof grid.origin);
    grid.rotation = sv_section_value(section, "rotation")->real[0];
    return grid;
}

/* From the file's coordinates to the flake's. */
static void place_marks(const sv_section *section, sv_disorder *disorder)
{
    const double *origin = sv_section_value(section, "origin")->real;
    const double angle = sv_section_value(section, "rotation")->real[0];
    const double c = cos(angle), s = sin(angle);
    for (sv_index m = 0; m < disorder->n_marks; m++) {
        double *at = disorder->marks[m].at;
        const double x = at[0], y = at[1];
        at[0] = origin[0] + c * x - s * y;
        at[1] = origin[1] + s * x + c * y;
    }
}

static bool use_threshold(sv_reader *reader, const sv_section *section, sv_disorder *disorder)
{
    if (!sv_section_one_of(reader, section, "darker_than brighter_than"))
        return false;
    disorder->darker = sv_section_written(section, "darker_than") > 0;
    disorder->threshold =
        sv_section_value(section, disorder->darker ? "darker_than" : "brighter_than")->real[0];
    return true;
}

static bool use_image(sv_reader *reader, const sv_section *section, const sv_cached_file *file,
                      sv_disorder *disorder)
{
    const bool mask = disorder->type == SV_DISORDER_VACANCIES;
    double black = 0.0, white = 1.0;
    if (!sv_section_rejects(reader, section, "tolerance between", "has no meaning for an image") ||
        !sv_section_one_of(reader, section, "pixel image_width") ||
        (mask && !use_threshold(reader, section, disorder)) ||
        (!mask && !sv_section_needs(reader, section, "black white")))
        return false;
    if (!mask) {
        black = sv_section_value(section, "black")->real[0];
        white = sv_section_value(section, "white")->real[0];
    }
    const double pixel = sv_section_written(section, "pixel") > 0
                             ? sv_section_value(section, "pixel")->real[0]
                             : sv_section_value(section, "image_width")->real[0] / file->grey.width;
    disorder->grid = place_grid(section, sv_grid_of_grey(&file->grey, pixel, black, white));
    disorder->has_grid = true;
    return true;
}

static bool use_rows(sv_reader *reader, const sv_section *section, const sv_model *model,
                     const sv_cached_file *file, sv_disorder *disorder)
{
    static const double nowhere[2] = {0.0, 0.0};
    const char *between = sv_section_value(section, "between")->text;
    sv_table_fault fault = {0};
    if (!sv_section_rejects(reader, section, IMAGE_KEYS, "belongs to images (PNG, TIFF)"))
        return false;
    sv_status status = sv_read_marks(reader->context, model, file->source.text, file->source.size,
                                     disorder->type != SV_DISORDER_VACANCIES,
                                     reader->lattice_constant, reader->setup->energy_unit, nowhere,
                                     &disorder->marks, &disorder->n_marks, &fault);
    const bool raster = between != NULL && strcmp(between, "bilinear") == 0;
    sv_grid grid = {0};
    if (status == SV_OK && raster)
        status =
            sv_grid_from_marks(reader->context, disorder->marks, disorder->n_marks, &grid, &fault);
    if (status == SV_INVALID_INPUT)
        return report_table(reader, file, &fault);
    if (status != SV_OK)
        return sv_report_status(reader, section->anchor, status);
    if (!raster) {
        place_marks(section, disorder);
        disorder->has_marks = true;
        return true;
    }
    sv_give(reader->context, disorder->marks);
    disorder->marks = NULL;
    disorder->n_marks = 0;
    disorder->grid = place_grid(section, grid);
    disorder->has_grid = true;
    return sv_section_rejects(reader, section, "tolerance", "has no meaning for a raster");
}

bool sv_use_file(sv_reader *reader, const sv_section *section, const sv_model *model,
                 sv_disorder *disorder)
{
    if (sv_section_find(section, "file") < 0)
        return true;
    if (sv_section_written(section, "file") == 0) {
        sv_section_drop_defaults(section, PLACE_KEYS);
        return sv_section_none_of(reader, section, PLACE_KEYS, "has no meaning without file") &&
               sv_section_none_of(reader, section, IMAGE_KEYS, "has no meaning without file");
    }
    const sv_value *value = sv_section_value(section, "file");
    const sv_cached_file *file = sv_file_find(reader->sheet, value->text);
    disorder->tolerance = sv_section_value(section, "tolerance")->real[0];
    disorder->keep_unmatched = strcmp(sv_section_value(section, "unmatched")->text, "refuse") != 0;
    snprintf(disorder->file, sizeof disorder->file, "%s", value->text);
    return file->grey.value != NULL ? use_image(reader, section, file, disorder)
                                    : use_rows(reader, section, model, file, disorder);
}

/* ---- what has no partner ---- */

enum { FIRST_FEW = 3 };

static void add_place(const sv_reader *reader, const sv_flake *flake, const sv_disorder *disorder,
                      sv_index k, char *text, size_t size)
{
    const double a = reader->lattice_constant, unit = a > 0.0 ? a : 1.0;
    const char *word = a > 0.0 ? "nm" : "lattice constants";
    if (disorder->has_grid)
        snprintf(text, size, "site at (%.4g, %.4g) %s", unit * flake->sites[k].at[0],
                 unit * flake->sites[k].at[1], word);
    else if (disorder->marks[k].by_cell)
        snprintf(text, size, "line %d: cell (%d, %d)", disorder->marks[k].line,
                 disorder->marks[k].cell[0], disorder->marks[k].cell[1]);
    else
        snprintf(text, size, "line %d: (%.4g, %.4g) %s", disorder->marks[k].line,
                 unit * disorder->marks[k].at[0], unit * disorder->marks[k].at[1], word);
}

/* Count and first few, or all of them with `unmatched: list`. */
static bool tell_unmatched(sv_reader *reader, const sv_flake *flake, const sv_disorder *disorder,
                           const sv_section *section)
{
    const bool all = strcmp(sv_section_value(section, "unmatched")->text, "list") == 0;
    const sv_node *node = sv_section_node(section, "file");
    char places[400] = "", one[120];
    sv_index count = 0;
    for (sv_index k = -1; (k = sv_measured_unmatched(flake, disorder, k + 1)) >= 0; count++) {
        add_place(reader, flake, disorder, k, one, sizeof one);
        if (all)
            sv_note(reader, node, "%s: without a partner: %s", section->path, one);
        if (count < FIRST_FEW)
            snprintf(places + strlen(places), sizeof places - strlen(places), "%s%s",
                     count > 0 ? "; " : "", one);
    }
    const char *what = disorder->has_grid ? "sites of the flake lie outside the map"
                                          : "rows of the file fall on no site";
    if (count > 0 && disorder->has_grid && !disorder->keep_unmatched)
        return sv_report(reader, node,
                         "`origin`, `rotation` and the scale place the map; `unmatched: skip` "
                         "leaves these sites as they are",
                         "%s: %lld %s: %s%s", section->path, (long long)count, what, places,
                         count > FIRST_FEW ? "; …" : "");
    if (count > 0)
        sv_note(reader, node, "%s: %lld %s and are left out: %s%s", section->path, (long long)count,
                what, places, count > FIRST_FEW ? "; …" : "");
    return true;
}

bool sv_check_measured(sv_reader *reader, const sv_flake *flake, const sv_disorder *disorder,
                       const sv_section *section)
{
    sv_table_fault fault = {0};
    if (disorder->has_grid || disorder->keep_unmatched)
        return (reader->prefix != NULL && !disorder->has_grid) ||
               tell_unmatched(reader, flake, disorder, section);
    sv_status status = sv_marks_check(reader->context, flake, disorder, &fault);
    if (status == SV_OK)
        return true;
    if (status != SV_INVALID_INPUT)
        return sv_report_status(reader, section->anchor, status);
    return report_table(
        reader, sv_file_find(reader->sheet, sv_section_value(section, "file")->text), &fault);
}
