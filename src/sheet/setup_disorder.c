/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The `disorder` list → sv_disorder, with measured files read. */
#include "sheet_internal.h"

#include <stdio.h>
#include <string.h>

static bool find_on(sv_reader *reader, const sv_section *section, const sv_model *model,
                    sv_disorder *disorder)
{
    const char *on = sv_section_value(section, "on")->text; /* NULL: a kind without it */
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

/* One row per kind, in the order of sv_disorder_kinds(). */
static bool (*const uses[])(sv_reader *, const sv_section *, const sv_model *, sv_disorder *) = {
    [SV_DISORDER_VACANCIES] = sv_use_vacancies, [SV_DISORDER_ONSITE] = sv_use_onsite,
    [SV_DISORDER_MASS] = sv_use_mass,           [SV_DISORDER_HOPPING] = sv_use_hopping,
    [SV_DISORDER_FLUX] = sv_use_flux,           [SV_DISORDER_ADATOMS] = sv_use_adatoms,
    [SV_DISORDER_CRACKS] = sv_use_cracks,       [SV_DISORDER_DOMAINS] = sv_use_domains,
    [SV_DISORDER_ROUGHNESS] = sv_use_roughness, [SV_DISORDER_STEPS] = sv_use_steps,
};

/* Charges of an earlier entry: it must be there and have some. */
static bool find_source(sv_reader *reader, const sv_section *section, const sv_setup *setup,
                        const sv_disorder *disorder)
{
    char hint[400];
    if (disorder->source[0] == '\0')
        return true;
    sv_suggestion suggestion = sv_suggest_start(disorder->source);
    for (int k = 0; k < setup->n_disorder - 1; k++) {
        const sv_disorder *other = &setup->disorder[k];
        if (other->type != SV_DISORDER_VACANCIES || other->charge == 0.0)
            continue;
        if (strcmp(other->name, disorder->source) == 0)
            return true;
        sv_suggest_name(&suggestion, other->name);
    }
    sv_suggest_hint(&suggestion, hint, sizeof hint);
    return sv_report(reader, sv_section_node(section, "source"), hint,
                     "%s.source: no vacancies called %.60s with a charge stand before it",
                     section->path, disorder->source);
}

static bool suits_structure(sv_reader *reader, const sv_section *section, const sv_model *model,
                            const sv_disorder *disorder)
{
    const char *reason = model->n_rules > 0 ? sv_structure_refusal(disorder) : NULL;
    if (reason == NULL && model->n_rules > 0 && disorder->on >= 0 && disorder->has_share &&
        !sv_section_value(section, "share")->written)
        reason = "a density on one species needs its share of the sites; give share or count";
    return reason == NULL || sv_report(reader, section->anchor, NULL,
                                       "%s does not suit a structure: %s", section->path, reason);
}

static bool use_section(sv_reader *reader, const sv_section *section, const sv_model *model,
                        sv_disorder *disorder)
{
    snprintf(disorder->name, sizeof disorder->name, "%s", sv_section_value(section, "name")->text);
    disorder->type = (sv_disorder_type)section->kind_row;
    return find_on(reader, section, model, disorder) &&
           uses[section->kind_row](reader, section, model, disorder) &&
           find_source(reader, section, reader->setup, disorder) &&
           sv_use_file(reader, section, model, disorder) &&
           suits_structure(reader, section, model, disorder);
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
