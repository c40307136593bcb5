/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The `disorder` list → sv_disorder, with measured files read. */
#include "sheet_internal.h"

#include <stdio.h>
#include <string.h>

static bool find_on(sv_reader *reader, const sv_section *section, const sv_model *model,
                    sv_disorder *disorder)
{
    const char *on = sv_section_value(section, "on")->text;
    char hint[400];
    disorder->on = -1;
    if (on == NULL || strcmp(on, "any") == 0)
        return true;
    disorder->on = sv_model_find_orbital(model, on);
    if (disorder->on >= 0)
        return true;
    sv_suggestion suggestion = sv_suggest_start(on);
    sv_suggest_name(&suggestion, "any");
    for (int i = 0; i < model->n_orbitals; i++)
        sv_suggest_name(&suggestion, model->orbitals[i].name);
    sv_suggest_hint(&suggestion, hint, sizeof hint);
    return sv_report(reader, sv_section_node(section, "on"), hint,
                     "%s.on: the model has no orbital %.60s", section->path, on);
}

/* Defaults that mean nothing here do not show in the resolved sheet. */
static void drop_defaults(const sv_section *section, const char *keys)
{
    for (int i = 0; i < section->n_fields; i++)
        if (!section->values[i].written && sv_words_hold(keys, section->fields[i].key->name))
            section->values[i].present = false;
}

/* Defects per area → probability per position that can hold one. */
static bool use_density(sv_reader *reader, const sv_section *section, const sv_model *model,
                        sv_disorder *disorder)
{
    double density = sv_section_value(section, "density")->real[0];
    double positions = disorder->on < 0 ? (double)model->n_positions : 1.0;
    double per_area = positions / sv_model_cell_area(model);
    double a = reader->lattice_constant;
    char hint[200];
    disorder->share = density / per_area;
    if (disorder->share <= 1.0)
        return true;
    if (a > 0.0)
        snprintf(hint, sizeof hint, "there are %.4g positions per cm^2", per_area / (a * a) * 1e14);
    else
        snprintf(hint, sizeof hint, "there are %.4g positions per lattice constant squared",
                 per_area);
    return sv_report(reader, sv_section_node(section, "density"), hint,
                     "%s.density: %.4g defects per position, more than one", section->path,
                     disorder->share);
}

static bool use_vacancies(sv_reader *reader, const sv_section *section, const sv_model *model,
                          sv_disorder *disorder)
{
    if (!sv_section_one_of(reader, section, "share density count file"))
        return false;
    disorder->has_count = sv_section_value(section, "count")->present;
    disorder->count = sv_section_value(section, "count")->integer[0];
    disorder->has_share = sv_section_written(section, "share density") > 0;
    disorder->share = sv_section_value(section, "share")->real[0];
    return sv_section_written(section, "density") == 0 ||
           use_density(reader, section, model, disorder);
}

static bool use_onsite(sv_reader *reader, const sv_section *section, const sv_model *model,
                       sv_disorder *disorder)
{
    static const char *const words[] = {
        [SV_BOX] = "box", [SV_GAUSSIAN] = "gaussian", [SV_BINARY] = "binary"};
    (void)model;
    if (!sv_section_one_of(reader, section, "distribution file"))
        return false;
    if (sv_section_written(section, "file") > 0) {
        drop_defaults(section, "per");
        return sv_section_none_of(reader, section, "width per", "has no meaning beside file");
    }
    if (sv_section_written(section, "width") == 0)
        return sv_report(reader, section->anchor,
                         "box: the full width; gaussian: the standard "
                         "deviation; binary: the splitting",
                         "%s.width is missing", section->path);
    const char *word = sv_section_value(section, "distribution")->text;
    for (int i = 0; i < 3; i++)
        if (strcmp(words[i], word) == 0)
            disorder->distribution = (sv_distribution)i;
    disorder->width = sv_section_value(section, "width")->real[0];
    disorder->per_cell = strcmp(sv_section_value(section, "per")->text, "cell") == 0;
    return true;
}

/* One row per kind, in the order of sv_disorder_kinds(). */
static bool (*const uses[])(sv_reader *, const sv_section *, const sv_model *, sv_disorder *) = {
    [SV_DISORDER_VACANCIES] = use_vacancies,
    [SV_DISORDER_ONSITE] = use_onsite,
};

static bool report_table(sv_reader *reader, const sv_cached_file *file, const sv_table_fault *fault)
{
    sv_place place = {&file->source, fault->line, fault->column, 1};
    return sv_report_at(reader, &place, fault->hint[0] != '\0' ? fault->hint : NULL, "%s",
                        fault->message);
}

static bool use_file(sv_reader *reader, const sv_section *section, const sv_model *model,
                     sv_disorder *disorder)
{
    if (sv_section_written(section, "file") == 0) {
        drop_defaults(section, "origin tolerance");
        return sv_section_none_of(reader, section, "origin tolerance",
                                  "has no meaning without file");
    }
    const sv_value *value = sv_section_value(section, "file");
    const sv_cached_file *file = sv_file_find(reader->sheet, value->text);
    sv_table_fault fault = {0};
    sv_status status = sv_read_marks(
        reader->context, model, file->source.text, file->source.size,
        disorder->type == SV_DISORDER_ONSITE, reader->lattice_constant, reader->setup->energy_unit,
        sv_section_value(section, "origin")->real, &disorder->marks, &disorder->n_marks, &fault);
    if (status == SV_INVALID_INPUT)
        return report_table(reader, file, &fault);
    if (status != SV_OK)
        return sv_report_status(reader, section->anchor, status);
    disorder->has_marks = true;
    disorder->tolerance = sv_section_value(section, "tolerance")->real[0];
    snprintf(disorder->file, sizeof disorder->file, "%s", value->text);
    return true;
}

static bool use_section(sv_reader *reader, const sv_section *section, const sv_model *model,
                        sv_disorder *disorder)
{
    snprintf(disorder->name, sizeof disorder->name, "%s", sv_section_value(section, "name")->text);
    disorder->type = (sv_disorder_type)section->kind_row;
    return find_on(reader, section, model, disorder) &&
           uses[section->kind_row](reader, section, model, disorder) &&
           use_file(reader, section, model, disorder);
}

bool sv_setup_disorder(sv_reader *reader, sv_setup *setup)
{
    const sv_section *section = NULL;
    int n = 0;
    bool good = true;
    while ((section = sv_document_find(reader, "disorder", section)) != NULL)
        n++;
    if (n == 0)
        return true;
    sv_status status = sv_take(reader->context, n, sizeof *setup->disorder, &setup->disorder);
    if (status != SV_OK)
        return sv_report_status(reader, NULL, status);
    while ((section = sv_document_find(reader, "disorder", section)) != NULL &&
           reader->status == SV_OK)
        good = use_section(reader, section, &setup->model, &setup->disorder[setup->n_disorder++]) &&
               good;
    return good;
}
