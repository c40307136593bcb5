/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The block `plateau`: a marker against the Fermi energy. */
#include "sheet_internal.h"

#include <stdio.h>
#include <string.h>

static bool read_temperatures(sv_reader *reader, const sv_section *section, sv_setup *setup)
{
    sv_sheet_plateau *plateau = &setup->plateau;
    const sv_node *list = sv_section_node(section, "temperatures");
    plateau->n_temperatures = 1;
    if (sv_section_written(section, "temperatures") == 0)
        return true;
    if (list->kind != SV_NODE_LIST || list->count < 1 || list->count > SV_MAX_TEMPERATURES)
        return sv_report(reader, list, "temperatures: [0 K, 4 K]",
                         "plateau.temperatures: expected a list of 1 to %d temperatures",
                         SV_MAX_TEMPERATURES);
    for (int i = 0; i < (int)list->count; i++) {
        bool has_unit;
        double *kelvin = &plateau->kelvin[i];
        if (!sv_number_read(reader, SV_DIM_TEMPERATURE, "plateau.temperatures", list->items[i],
                            kelvin, &has_unit))
            return false;
        if (!(*kelvin >= 0.0))
            return sv_report(reader, list->items[i], NULL,
                             "plateau.temperatures: %.6g K is below zero", *kelvin);
        if (*kelvin > 0.0 && setup->energy_unit <= 0.0)
            return sv_report(reader, list->items[i], "model.energy_unit: 1 eV",
                             "a temperature needs to know what an energy of 1 is worth");
    }
    plateau->n_temperatures = (int)list->count;
    return true;
}

static bool find_marker(sv_reader *reader, const sv_section *section, sv_setup *setup)
{
    const sv_value *of = sv_section_value(section, "of");
    char hint[400];
    setup->plateau.marker = 0;
    if (!of->present && setup->n_markers == 1)
        return true;
    if (!of->present)
        return sv_report(reader, section->anchor, "of: the marker to follow",
                         "plateau.of is missing");
    sv_suggestion suggestion = sv_suggest_start(of->text);
    for (int i = 0; i < setup->n_markers; i++) {
        const char *name = reader->sheet->markers[setup->markers[i].kind].name;
        sv_suggest_name(&suggestion, name);
        setup->plateau.marker = i;
        if (strcmp(name, of->text) == 0)
            return true;
    }
    sv_suggest_hint(&suggestion, hint, sizeof hint);
    return sv_report(reader, sv_section_node(section, "of"), hint,
                     "plateau.of: %.60s is not among the markers", of->text);
}

bool sv_plateau_read(sv_reader *reader, sv_setup *setup)
{
    const sv_section *section = sv_document_find(reader, "plateau", NULL);
    sv_sheet_plateau *plateau = &setup->plateau;
    if (section == NULL)
        return true;
    const sv_value *energies = sv_section_value(section, "energies");
    if (!(energies->real[0] < energies->real[1]))
        return sv_report(reader, sv_section_node(section, "energies"), NULL,
                         "plateau.energies: %.6g is not below %.6g", energies->real[0],
                         energies->real[1]);
    memcpy(plateau->energies, energies->real, sizeof plateau->energies);
    plateau->points = sv_section_value(section, "points")->integer[0];
    plateau->within = sv_section_value(section, "within")->real[0];
    setup->has_plateau =
        find_marker(reader, section, setup) && read_temperatures(reader, section, setup);
    return setup->has_plateau;
}
