/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The block `finite_size`: which curves are compared over the size of the flake, and how. */
#include "sheet_internal.h"

#include <math.h>
#include <stdio.h>
#include <string.h>

static bool is_size(const sv_sweep_axis *axis)
{
    return sv_words_hold("flake.cells flake.size flake.side flake.radius", axis->path);
}

static bool find_axes(sv_reader *reader, const sv_section *section, sv_setup *setup)
{
    const char *hint = "sweep: one axis {parameter: flake.cells, values: [10, 14, 18]}, one over "
                       "the parameter of the transition";
    if (setup->n_axes != 2)
        return sv_report(reader, section->anchor, hint,
                         "finite_size needs a sweep with two axes, and there %s %d",
                         setup->n_axes == 1 ? "is" : "are", setup->n_axes);
    const bool first = is_size(&setup->axes[0]), second = is_size(&setup->axes[1]);
    if (first == second)
        return sv_report(reader, section->anchor, hint,
                         "finite_size needs one axis over the size of the flake and one over "
                         "something else");
    setup->finite_size.size_axis = first ? 0 : 1;
    return true;
}

/* `of` may be left out when there is one marker; the section then gets its name. */
static bool find_marker(sv_reader *reader, const sv_section *section, sv_setup *setup)
{
    sv_value *of = &section->values[sv_section_find(section, "of")];
    char hint[400];
    if (!of->present && setup->n_markers != 1)
        return sv_report(reader, section->anchor, "of: the marker whose curves are compared",
                         "finite_size.of is missing");
    if (!of->present) {
        of->present = true;
        of->text = reader->sheet->markers[setup->markers[0].kind].name;
    }
    sv_suggestion suggestion = sv_suggest_start(of->text);
    for (int i = 0; i < setup->n_markers; i++) {
        const char *name = reader->sheet->markers[setup->markers[i].kind].name;
        sv_suggest_name(&suggestion, name);
        setup->finite_size.marker = i;
        if (strcmp(name, of->text) == 0)
            return true;
    }
    sv_suggest_hint(&suggestion, hint, sizeof hint);
    return sv_report(reader, sv_section_node(section, "of"), hint,
                     "finite_size.of: %.60s is not among the markers", of->text);
}

static bool read_range(sv_reader *reader, const sv_section *section, sv_setup *setup)
{
    sv_sheet_finite_size *f = &setup->finite_size;
    const sv_sweep_axis *parameter = &setup->axes[1 - f->size_axis];
    sv_sweep_axis ends = {0};
    f->range[0] = f->range[1] = NAN;
    if (sv_section_written(section, "range") == 0)
        return true;
    const sv_node *list = sv_section_node(section, "range");
    if (list->kind != SV_NODE_LIST || list->count != 2)
        return sv_report(reader, list, "range: [2, 3]",
                         "finite_size.range: expected [lowest, highest]");
    if (!sv_sweep_read_numbers(reader, sv_sweep_parameter(reader->root, parameter->path),
                               (const sv_node *const *)list->items, 2, &ends))
        return false;
    if (!(ends.values[0] < ends.values[1]))
        return sv_report(reader, list, NULL, "finite_size.range: %.6g is not below %.6g",
                         ends.values[0], ends.values[1]);
    for (int i = 0; i < 2; i++)
        f->range[i] = ends.values[i] * parameter->unit_scale;
    return true;
}

static bool read_correction(sv_reader *reader, const sv_section *section, sv_sheet_finite_size *f)
{
    const bool fixed = strcmp(f->correction, "fixed") == 0;
    const sv_value *exponent = sv_section_value(section, "exponent");
    f->exponent = exponent->present ? exponent->real[0] : (double)NAN;
    if (fixed && !exponent->present)
        return sv_report(reader, sv_section_node(section, "correction"), "exponent: 1",
                         "a fixed correction needs its exponent");
    return fixed || sv_section_none_of(reader, section, "exponent",
                                       "has no meaning without `correction: fixed`");
}

bool sv_finite_size_read(sv_reader *reader, sv_setup *setup)
{
    const sv_section *section = sv_document_find(reader, "finite_size", NULL);
    sv_sheet_finite_size *f = &setup->finite_size;
    if (section == NULL)
        return true;
    f->order = (int)sv_section_value(section, "order")->integer[0];
    f->resamples = (int)sv_section_value(section, "resamples")->integer[0];
    f->confidence = sv_section_value(section, "confidence")->real[0];
    snprintf(f->correction, sizeof f->correction, "%s",
             sv_section_value(section, "correction")->text);
    setup->has_finite_size =
        find_axes(reader, section, setup) && find_marker(reader, section, setup) &&
        read_range(reader, section, setup) && read_correction(reader, section, f);
    return setup->has_finite_size;
}
