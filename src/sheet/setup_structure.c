/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The file of a flake of shape `structure`. */
#include "sheet_internal.h"

#include <math.h>
#include <string.h>

/* Length unit of the file, in lattice constants; 0 after a report. */
static double file_unit(sv_reader *reader, const sv_section *section)
{
    const char *word = sv_section_value(section, "unit")->text;
    const double a = reader->lattice_constant;
    if (strcmp(word, "lattice") == 0)
        return 1.0;
    if (a > 0.0)
        return (strcmp(word, "nm") == 0 ? 1.0 : 0.1) / a;
    sv_report(reader, sv_section_node(section, "file"),
              "give model.lattice_constant, the unit of bare lengths, as in `lattice_constant: "
              "0.246 nm`; or flake.unit: lattice",
              "positions in %s need a lattice constant", word);
    return 0.0;
}

static double shortest_hop(const sv_model *model)
{
    double shortest = INFINITY;
    for (int k = 0; k < model->n_rules; k++)
        shortest = fmin(shortest, model->rules[k].distance);
    return shortest;
}

static void tell(sv_reader *reader, const sv_section *section, const sv_structure *s, double unit)
{
    const sv_node *node = sv_section_node(section, "file");
    if (reader->prefix != NULL)
        return;
    if (s->has_lattice)
        sv_note(reader, node, "the periodic cell of the file is not used: the flake is open");
    if (s->z[1] - s->z[0] > 1e-9)
        sv_note(reader, node, "sites are projected onto the plane; z goes from %.4g to %.4g %s",
                s->z[0] / unit, s->z[1] / unit, sv_section_value(section, "unit")->text);
}

bool sv_setup_structure(sv_reader *reader, const sv_section *section, sv_setup *setup)
{
    const sv_node *node = sv_section_node(section, "file");
    const sv_value *value = sv_section_value(section, "file");
    const sv_value *least = sv_section_value(section, "least_distance");
    sv_table_fault fault = {0};
    if (setup->model.n_rules == 0) /* a faulty model by_distance is reported already */
        return setup->model.n_orbitals == 0 || strcmp(setup->model.name, "by_distance") == 0 ||
               sv_report(reader, section->anchor,
                         "model: {name: by_distance, …} has hops by distance",
                         "%s.shape: a structure needs the model by_distance", section->path);
    const double unit = file_unit(reader, section);
    const sv_cached_file *file = sv_file_find(reader->sheet, value->text);
    if (unit == 0.0 || file == NULL)
        return unit != 0.0 && sv_report_status(reader, node,
                                               SV_FAIL(reader->context, SV_INTERNAL,
                                                       "%s is not loaded", value->text));
    const sv_structure_options options = {
        .unit = unit,
        .least_distance = least->has_auto ? 0.5 * shortest_hop(&setup->model) : least->real[0],
        .thickness = sv_section_value(section, "thickness")->real[0]};
    sv_status status = sv_take(reader->context, 1, sizeof *setup->structure, &setup->structure);
    if (status == SV_OK)
        status = sv_structure_make(reader->context, &setup->model, file->source.text,
                                   file->source.size, &options, setup->structure, &fault);
    if (status == SV_OK) {
        setup->flake.structure = setup->structure;
        tell(reader, section, setup->structure, unit);
        return true;
    }
    if (status != SV_INVALID_INPUT || fault.line == 0)
        return sv_report_status(reader, node, status);
    const sv_place place = {&file->source, fault.line, fault.column, 1};
    return sv_report_at(reader, &place, fault.hint[0] != '\0' ? fault.hint : NULL, "%s",
                        fault.message);
}
