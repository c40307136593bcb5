/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The model `custom`: vectors, orbitals, on-site energies and hops from the sheet, each fault at
 * its place. */
#include "sheet_internal.h"

#include <stdio.h>
#include <string.h>

static const sv_key orbital_keys[] = {
    {.name = "name", .type = SV_KEY_TEXT, .required = true, .doc = "case-sensitive"},
    {.name = "at",
     .type = SV_KEY_REAL_PAIR,
     .dimension = SV_DIM_LENGTH,
     .low = -1e6,
     .high = 1e6,
     .required = true,
     .doc = "[x, y] in the cell"},
    {.name = "spin", .type = SV_KEY_CHOICE, .choices = "up down", .doc = "for markers of the spin"},
};
static const sv_key hop_keys[] = {
    {.name = "from", .type = SV_KEY_TEXT, .required = true, .doc = "orbital"},
    {.name = "to", .type = SV_KEY_TEXT, .required = true, .doc = "orbital"},
    {.name = "shift",
     .type = SV_KEY_INTEGER_PAIR,
     .low = -1000,
     .high = 1000,
     .required = true,
     .doc = "[i, j]: cells from the first orbital to the second"},
    {.name = "amplitude",
     .type = SV_KEY_TREE,
     .required = true,
     .doc = "[re, im] or a number: <to, R + shift|H|from, R>"},
};
static const sv_block orbital_block = {.name = "orbital", .keys = orbital_keys, .n_keys = 3};
static const sv_block hop_block = {.name = "hop", .keys = hop_keys, .n_keys = 4};
enum { MAX_HOPS = 20000 };
static const sv_key vector_key = {.name = "vectors",
                                  .type = SV_KEY_REAL_PAIR,
                                  .dimension = SV_DIM_LENGTH,
                                  .low = -1e6,
                                  .high = 1e6};
static const sv_key energy_key = {
    .name = "energy", .type = SV_KEY_REAL, .dimension = SV_DIM_ENERGY, .low = -1e12, .high = 1e12};

static bool begin(sv_reader *reader, const sv_section *section, sv_model *model)
{
    const sv_node *node = sv_section_node(section, "vectors");
    sv_value vectors[2] = {{0}};
    if (node->kind != SV_NODE_LIST || node->count != 2)
        return sv_report(reader, node, NULL,
                         "model.vectors: expected two vectors [[x, y], [x, y]]");
    for (int i = 0; i < 2; i++)
        if (!sv_value_read(reader, &vector_key, "model.vectors", node->items[i], &vectors[i]))
            return false;
    sv_status status =
        sv_model_begin(reader->context, "custom", vectors[0].real, vectors[1].real, model);
    return status == SV_OK || sv_report_status(reader, node, status);
}

/* One entry of `orbitals` or `hops`, read by its key table. */
bool sv_model_item_read(sv_reader *reader, const sv_block *block, const sv_node *node,
                        const char *list, sv_index number, sv_section *ret_section)
{
    const char *path = sv_reader_text(reader, "model.%s.%lld", list, (long long)number);
    if (path == NULL)
        return false;
    if (node->kind != SV_NODE_MAP)
        return sv_report(reader, node, NULL, "%s: expected a mapping of keys", path);
    *ret_section = (sv_section){
        .block = block, .path = path, .anchor = node, .kind_row = -1, .entry = (int)number};
    return sv_section_read(reader, ret_section, node);
}

static bool add_orbital(sv_reader *reader, const sv_node *item, sv_index number,
                        const sv_node *onsite, sv_model *model)
{
    sv_section section;
    double energy = 0.0;
    if (!sv_model_item_read(reader, &orbital_block, item, "orbitals", number, &section))
        return false;
    const char *name = section.values[0].text;
    const double *at = section.values[1].real;
    const sv_node *node = sv_node_get(onsite, name, NULL);
    if (node != NULL && !sv_real_read(reader, &energy_key, "model.onsite", node, &energy))
        return false;
    const char *spin = section.values[2].text;
    sv_status status = sv_model_add_orbital(reader->context, model, name, at[0], at[1], energy);
    if (status == SV_OK && spin != NULL)
        status = sv_model_set_spin(reader->context, model, model->n_orbitals - 1,
                                   strcmp(spin, "up") == 0 ? 1 : -1);
    return status == SV_OK || sv_report_status(reader, sv_section_node(&section, "name"), status);
}

/* Row of an orbital; a name that is not there is reported. */
int sv_orbital_read(sv_reader *reader, const sv_model *model, const char *name, const sv_node *node)
{
    char hint[400];
    int row = sv_model_find_orbital(model, name);
    if (row >= 0)
        return row;
    sv_suggestion suggestion = sv_suggest_start(name);
    for (int i = 0; i < model->n_orbitals; i++)
        sv_suggest_name(&suggestion, model->orbitals[i].name);
    sv_suggest_hint(&suggestion, hint, sizeof hint);
    sv_report(reader, node, hint, "the model has no orbital %.60s", name);
    return -1;
}

static bool add_orbitals(sv_reader *reader, const sv_section *section, sv_model *model)
{
    const sv_node *list = sv_section_node(section, "orbitals");
    const sv_value *given = sv_section_value(section, "onsite");
    const sv_node *onsite = given->present ? sv_section_node(section, "onsite") : NULL;
    bool good = true;
    if (list->kind != SV_NODE_LIST || list->count == 0)
        return sv_report(reader, list, NULL,
                         "model.orbitals: expected a list [{name: a, at: [x, y]}, …]");
    if (sv_node_is_null(onsite))
        onsite = NULL;
    if (onsite != NULL && onsite->kind != SV_NODE_MAP)
        return sv_report(reader, onsite, NULL, "model.onsite: expected a mapping {a: 0.5, …}");
    for (sv_index i = 0; i < list->count && reader->status == SV_OK; i++)
        good = add_orbital(reader, list->items[i], i, onsite, model) && good;
    if (!good)
        return false;
    for (sv_index i = 0; onsite != NULL && i < onsite->count; i++)
        good =
            sv_orbital_read(reader, model, onsite->items[2 * i]->text, onsite->items[2 * i]) >= 0 &&
            good;
    return good;
}

bool sv_amplitude_read(sv_reader *reader, const sv_node *node, const char *path,
                       sv_complex *ret_amplitude)
{
    double parts[2] = {0.0, 0.0};
    bool is_list = node->kind == SV_NODE_LIST;
    if (is_list && node->count != 2)
        return sv_report(reader, node, NULL, "%s.amplitude: expected [re, im] or a number", path);
    for (int i = 0; i < (is_list ? 2 : 1); i++)
        if (!sv_real_read(reader, &energy_key, path, is_list ? node->items[i] : node, &parts[i]))
            return false;
    *ret_amplitude = CMPLX(parts[0], parts[1]);
    return true;
}

static bool add_hop(sv_reader *reader, const sv_node *item, sv_index number, sv_model *model)
{
    sv_section section;
    sv_complex amplitude = 0.0;
    if (!sv_model_item_read(reader, &hop_block, item, "hops", number, &section))
        return false;
    const sv_value *v = section.values;
    int from = sv_orbital_read(reader, model, v[0].text, sv_section_node(&section, "from"));
    int to = sv_orbital_read(reader, model, v[1].text, sv_section_node(&section, "to"));
    if (from < 0 || to < 0 ||
        !sv_amplitude_read(reader, sv_section_node(&section, "amplitude"), section.path,
                           &amplitude))
        return false;
    sv_status status = sv_model_add_hop(reader->context, model, from, to, (int)v[2].integer[0],
                                        (int)v[2].integer[1], amplitude);
    return status == SV_OK || sv_report_status(reader, item, status);
}

static bool add_hops(sv_reader *reader, const sv_section *section, sv_model *model)
{
    if (!sv_section_value(section, "hops")->present)
        return true;
    const sv_node *list = sv_section_node(section, "hops");
    bool good = true;
    if (list->kind != SV_NODE_LIST)
        return sv_node_is_null(list) ||
               sv_report(reader, list, "a table of hops is named by hops_file",
                         "model.hops: expected a list of hops");
    if (list->count > MAX_HOPS)
        return sv_report(reader, list, "put them into a table and name it by hops_file",
                         "model.hops has more than %d entries", MAX_HOPS);
    for (sv_index i = 0; i < list->count && reader->status == SV_OK; i++)
        good = add_hop(reader, list->items[i], i, model) && good;
    return good;
}

/* The table of hops; a fault is shown in the file. */
static bool read_hops_file(sv_reader *reader, const sv_section *section, sv_model *model)
{
    const sv_value *value = sv_section_value(section, "hops_file");
    bool has_unit = false;
    sv_table_fault fault = {0};
    if (!value->present)
        return true;
    const sv_node *node = sv_section_node(section, "hops_file");
    const sv_cached_file *file = sv_file_find(reader->sheet, value->text);
    if (file == NULL)
        return sv_report_status(
            reader, node, SV_FAIL(reader->context, SV_INTERNAL, "%s is not loaded", value->text));
    sv_status status =
        sv_model_read_hops(reader->context, model, file->source.text, file->source.size,
                           reader->energy_unit, &has_unit, &fault);
    if (has_unit && reader->first_energy == NULL)
        reader->first_energy = node;
    if (status != SV_INVALID_INPUT || fault.line == 0)
        return status == SV_OK || sv_report_status(reader, node, status);
    sv_place place = {&file->source, fault.line, fault.column, 1};
    return sv_report_at(reader, &place, fault.hint[0] != '\0' ? fault.hint : NULL, "%s",
                        fault.message);
}

bool sv_custom_read(sv_reader *reader, const sv_section *section, sv_model *model)
{
    if (!begin(reader, section, model) || !add_orbitals(reader, section, model) ||
        !add_hops(reader, section, model))
        return false;
    reader->listed_hops = model->n_hops;
    if (!read_hops_file(reader, section, model))
        return false;
    const int64_t *flux = sv_section_value(section, "flux")->integer;
    sv_status status = sv_model_set_flux(reader->context, model, (int)flux[0], (int)flux[1]);
    if (status != SV_OK)
        return sv_report_status(reader, sv_section_node(section, "flux"), status);
    status = sv_model_finish(reader->context, model);
    return status == SV_OK || sv_report_status(reader, section->anchor, status);
}
