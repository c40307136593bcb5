/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Sections → the typed setup: model, flake, occupation, markers, ensemble, solve. */
#include "sheet_internal.h"

#include <stdio.h>
#include <string.h>

bool sv_setup_model(sv_reader *reader, sv_setup *setup)
{
    const sv_section *section = sv_document_find(reader, "model", NULL);
    int n_common = section->block->n_keys;
    if (strcmp(section->kind->name, "custom") == 0)
        return sv_custom_read(reader, section, &setup->model);
    if (strcmp(section->kind->name, "by_distance") == 0)
        return sv_by_distance_read(reader, section, &setup->model);
    sv_status status =
        sv_model_make(reader->context, section->kind, section->values + n_common, &setup->model);
    /* What the sheet itself says is shown, not the text of its preset. */
    const char *place = sv_section_value(section, "preset")->present ? "preset" : "name";
    return status == SV_OK || sv_report_status(reader, sv_section_node(section, place), status);
}

static bool use_occupation(sv_reader *reader, sv_setup *setup)
{
    const sv_section *section = sv_document_find(reader, "occupation", NULL);
    const sv_value *filling = sv_section_value(section, "filling");
    const sv_value *electrons = sv_section_value(section, "electrons");
    sv_occupation *occupation = &setup->occupation;
    if (sv_section_written(section, section->block->exclusive) > 1)
        return sv_section_one_of(reader, section, section->block->exclusive);
    occupation->by = filling->present     ? SV_BY_FILLING
                     : electrons->present ? SV_BY_ELECTRONS
                                          : SV_BY_ENERGY;
    occupation->fermi_energy = sv_section_value(section, "fermi_energy")->real[0];
    occupation->filling = filling->real[0];
    occupation->electrons = electrons->integer[0];
    return true;
}

/* Rules between keys are the marker's own; the sheet only knows where they stand. */
static bool check_marker(sv_reader *reader, const sv_section *section)
{
    char message[200] = "";
    int key = 0;
    if (reader->sheet->check_marker == NULL ||
        reader->sheet->check_marker(section->kind_row, section->values, &key, message,
                                    sizeof message))
        return true;
    const sv_field *field = &section->fields[key];
    return sv_report(reader, field->node != NULL ? field->node : section->anchor, field->key->doc,
                     "%s.%s %s", section->path, field->key->name, message);
}

static bool use_markers(sv_reader *reader, sv_setup *setup)
{
    enum {
        MAX_MARKERS = sizeof setup->markers / sizeof setup->markers[0],
        MAX_VALUES = sizeof setup->markers[0].values / sizeof setup->markers[0].values[0]
    };
    const sv_section *section = NULL;
    while ((section = sv_document_find(reader, "markers", section)) != NULL) {
        if (setup->n_markers == MAX_MARKERS)
            return sv_report(reader, section->anchor, NULL, "more than %d markers", MAX_MARKERS);
        if (section->n_fields > MAX_VALUES)
            return sv_report_status(reader, section->anchor,
                                    SV_FAIL(reader->context, SV_INTERNAL,
                                            "the marker %s has too many keys",
                                            section->kind->name));
        if (!check_marker(reader, section))
            return false;
        sv_sheet_marker *marker = &setup->markers[setup->n_markers++];
        marker->kind = section->kind_row;
        for (int i = 0; i < section->n_fields; i++)
            marker->values[i] = section->values[i];
    }
    return true;
}

/* A share is one of an index. */
static bool check_share(sv_reader *reader, const sv_section *section, const sv_setup *setup)
{
    int kind = setup->markers[setup->stop_marker].kind;
    if (setup->stop_share_width <= 0.0 || reader->sheet->is_index == NULL ||
        reader->sheet->is_index(kind))
        return true;
    return sv_report(reader, sv_section_node(section, "share_width"),
                     "use standard_error for it, or share_width of an index such as bott",
                     "ensemble.stop.share_width: %.60s is no index and has no shares",
                     reader->sheet->markers[kind].name);
}

/* `of` may be left out when there is one marker; the section then gets its name. */
static bool find_stop_marker(sv_reader *reader, const sv_section *section, sv_setup *setup)
{
    int row = sv_section_find(section, "of");
    sv_value *of = &section->values[row];
    char hint[400];
    if (!of->present && setup->stop_standard_error <= 0.0 && setup->stop_share_width <= 0.0)
        return true; /* time alone asks no marker */
    if (!of->present && setup->n_markers != 1)
        return sv_report(reader, section->anchor,
                         "of: the marker whose standard error or share counts",
                         "ensemble.stop.of is missing");
    if (!of->present) {
        of->present = true;
        of->text = reader->sheet->markers[setup->markers[0].kind].name;
    }
    sv_suggestion suggestion = sv_suggest_start(of->text);
    for (int i = 0; i < setup->n_markers; i++) {
        const char *name = reader->sheet->markers[setup->markers[i].kind].name;
        sv_suggest_name(&suggestion, name);
        setup->stop_marker = i;
        if (strcmp(name, of->text) == 0)
            return check_share(reader, section, setup);
    }
    sv_suggest_hint(&suggestion, hint, sizeof hint);
    return sv_report(reader, sv_section_node(section, "of"), hint,
                     "ensemble.stop.of: %.60s is not among the markers", of->text);
}

static bool use_stop(sv_reader *reader, const sv_section *stop, sv_setup *setup)
{
    if (sv_section_written(stop, "standard_error share_width time") == 0)
        return sv_report(reader, stop->anchor,
                         "give one or more of: standard_error, share_width, time",
                         "ensemble.stop says no condition");
    setup->has_stop = true;
    setup->stop_standard_error = sv_section_value(stop, "standard_error")->real[0];
    setup->stop_share_width = sv_section_value(stop, "share_width")->real[0];
    setup->stop_seconds = sv_section_value(stop, "time")->real[0];
    setup->stop_at_least = sv_section_value(stop, "at_least")->integer[0];
    return find_stop_marker(reader, stop, setup);
}

/* Maps are of one marker. */
static bool use_site_maps(sv_reader *reader, const sv_section *ensemble, sv_setup *setup)
{
    setup->site_maps = sv_section_value(ensemble, "site_maps")->integer[0] != 0;
    bool found = !setup->site_maps;
    for (int i = 0; i < setup->n_markers; i++)
        found = found ||
                strcmp(reader->sheet->markers[setup->markers[i].kind].name, "local_chern") == 0;
    return found ||
           sv_report(reader, sv_section_node(ensemble, "site_maps"),
                     "add local_chern to the markers",
                     "ensemble.site_maps is the map of local_chern, which is not among the "
                     "markers");
}

bool sv_setup_ensemble(sv_reader *reader, sv_setup *setup)
{
    const sv_section *root = sv_document_find(reader, "", NULL);
    const sv_section *ensemble = sv_document_find(reader, "ensemble", NULL);
    const sv_section *stop = sv_document_find(reader, "stop", NULL);
    const sv_section *solve = sv_document_find(reader, "solve", NULL);
    const char *title = sv_section_value(root, "title")->text;
    memcpy(&setup->title, &title, sizeof title);
    setup->realisations = sv_section_value(ensemble, "realisations")->integer[0];
    setup->seed = (uint64_t)sv_section_value(ensemble, "seed")->integer[0];
    snprintf(setup->engine, sizeof setup->engine, "%s", sv_section_value(solve, "engine")->text);
    snprintf(setup->estimator, sizeof setup->estimator, "%s",
             sv_section_value(solve, "estimator")->text);
    setup->accuracy = sv_section_value(solve, "accuracy")->real[0];
    setup->sampling_error = sv_section_value(solve, "sampling_error")->real[0];
    bool good = use_occupation(reader, setup);
    good = use_markers(reader, setup) && good;
    good = good && use_site_maps(reader, ensemble, setup);
    if (!good || stop == NULL)
        return good;
    return use_stop(reader, stop, setup);
}

/* Once an energy carries a unit, a bare 1 must be worth something: 1 eV unless the sheet says. */
static void use_scales(sv_reader *reader, sv_setup *setup)
{
    setup->lattice_constant = reader->lattice_constant;
    setup->energy_unit = reader->energy_unit;
    /* the unit may stand in the sweep, which a point does not read again */
    if (reader->prefix != NULL && reader->energy_unit <= 0.0)
        setup->energy_unit = reader->sheet->energy_unit;
    if (setup->energy_unit > 0.0 || reader->first_energy == NULL)
        return;
    setup->energy_unit = 1.0;
    if (reader->prefix == NULL)
        sv_note(reader, reader->first_energy,
                "this energy carries a unit, so bare energies are read in eV; "
                "model.energy_unit changes that");
}

static bool write_texts(sv_reader *reader, sv_setup *setup)
{
    sv_status status = sv_resolved_write(reader, setup, NULL, &setup->resolved);
    if (status == SV_OK)
        status = sv_identity_write(reader, setup, &setup->identity);
    return status == SV_OK || sv_report_status(reader, NULL, status);
}

bool sv_setup_build(sv_reader *reader, sv_setup *setup)
{
    reader->setup = setup;
    setup->model.flux[1] = 1;
    sv_document_read(reader);
    if (!sv_reader_good(reader))
        return false;
    /* A point of a sweep has no axes of its own, and no texts. */
    bool is_point = reader->prefix != NULL;
    bool good = is_point || sv_sweep_read(reader, setup);
    bool has_model = sv_setup_model(reader, setup);
    use_scales(reader, setup);
    good = sv_setup_flake(reader, setup) && good && has_model;
    if (has_model && (setup->model.n_rules == 0 || setup->model.site_area > 0.0))
        good = sv_setup_disorder(reader, setup) && good;
    good = sv_setup_ensemble(reader, setup) && good;
    good = good && (is_point || sv_question_read(reader, setup));
    good = good && (is_point || sv_plateau_read(reader, setup));
    good = good && (is_point || sv_finite_size_read(reader, setup));
    if (!good || !sv_reader_good(reader))
        return false;
    if (reader->geometry && !sv_setup_geometry(reader, setup))
        return false;
    return (is_point || write_texts(reader, setup)) && sv_reader_good(reader);
}
