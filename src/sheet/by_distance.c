/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The model `by_distance`: species and hops by distance, each fault at its place. */
#include "sheet_internal.h"

#include <stdio.h>
#include <string.h>

enum { SPECIES_KEYS = 2, HOP_KEYS = 7, MOST_LISTED = 1000 };
#define LENGTH(name_, doc_)                                                                        \
    {                                                                                              \
        .name = name_, .type = SV_KEY_REAL, .dimension = SV_DIM_LENGTH, .low = 0, .high = 1e6,     \
        .doc = doc_                                                                                \
    }

static const sv_key species_keys[SPECIES_KEYS] = {
    {.name = "name", .type = SV_KEY_TEXT, .required = true, .doc = "as in the file"},
    {.name = "onsite",
     .type = SV_KEY_REAL,
     .dimension = SV_DIM_ENERGY,
     .low = -1e12,
     .high = 1e12,
     .fallback = "0",
     .doc = "its energy"},
};
static const sv_key hop_keys[HOP_KEYS] = {
    {.name = "between", .type = SV_KEY_TREE, .required = true, .doc = "[A, B]: from A to B"},
    {.name = "distance",
     .type = SV_KEY_REAL,
     .dimension = SV_DIM_LENGTH,
     .low = 0,
     .low_open = true,
     .high = 1e6,
     .required = true,
     .doc = "of a shell, or where a decay has its amplitude"},
    LENGTH("tolerance", "of a shell: half its width"),
    LENGTH("decay", "length l of exp(-(r - distance)/l)"),
    LENGTH("cutoff", "of a decay: no hop beyond it"),
    {.name = "amplitude",
     .type = SV_KEY_TREE,
     .required = true,
     .doc = "[re, im] or a number: <B|H|A>"},
    {.name = "phase",
     .type = SV_KEY_REAL,
     .dimension = SV_DIM_ANGLE,
     .low = -1e3,
     .high = 1e3,
     .fallback = "0",
     .doc = "e^{i phase} turning right over the common neighbour, its conjugate turning left"},
};
static const sv_block species_block = {
    .name = "species", .keys = species_keys, .n_keys = SPECIES_KEYS};
static const sv_block hop_block = {.name = "hop", .keys = hop_keys, .n_keys = HOP_KEYS};

static bool check_list(sv_reader *reader, const sv_node *list, const char *key, const char *example)
{
    if (list->kind == SV_NODE_LIST && list->count > 0 && list->count <= MOST_LISTED)
        return true;
    return sv_report(reader, list, example, "model.%s: expected a list of 1 to %d entries", key,
                     MOST_LISTED);
}

static bool add_species(sv_reader *reader, const sv_node *item, sv_index number, sv_model *model)
{
    sv_section section;
    if (!sv_model_item_read(reader, &species_block, item, "species", number, &section))
        return false;
    sv_status status = sv_model_add_orbital(reader->context, model, section.values[0].text, 0.0,
                                            0.0, section.values[1].real[0]);
    return status == SV_OK || sv_report_status(reader, sv_section_node(&section, "name"), status);
}

static bool read_between(sv_reader *reader, const sv_section *section, const sv_model *model,
                         int ret_ends[2])
{
    const sv_node *node = sv_section_node(section, "between");
    if (node->kind != SV_NODE_LIST || node->count != 2)
        return sv_report(reader, node, NULL, "%s.between: expected two species [A, B]",
                         section->path);
    for (int k = 0; k < 2; k++) {
        if (!sv_scalar_check(reader, section->path, node->items[k], "a species"))
            return false;
        ret_ends[k] = sv_orbital_read(reader, model, node->items[k]->text, node->items[k]);
        if (ret_ends[k] < 0)
            return false;
    }
    return true;
}

static bool add_hop(sv_reader *reader, const sv_node *item, sv_index number, sv_model *model)
{
    sv_section section;
    sv_distance_rule rule = {0};
    int ends[2];
    if (!sv_model_item_read(reader, &hop_block, item, "hops", number, &section) ||
        !read_between(reader, &section, model, ends) ||
        !sv_section_one_of(reader, &section, "tolerance decay") ||
        !sv_amplitude_read(reader, sv_section_node(&section, "amplitude"), section.path,
                           &rule.amplitude))
        return false;
    const bool decays = sv_section_value(&section, "decay")->present;
    const bool cut = sv_section_value(&section, "cutoff")->present;
    if (decays != cut)
        return sv_report(reader, item, NULL, "%s: decay and cutoff go together", section.path);
    if (decays && !(sv_section_value(&section, "decay")->real[0] > 0.0))
        return sv_report(reader, sv_section_node(&section, "decay"), NULL,
                         "%s.decay must be above 0", section.path);
    rule.from = ends[0];
    rule.to = ends[1];
    rule.distance = sv_section_value(&section, "distance")->real[0];
    rule.tolerance = sv_section_value(&section, "tolerance")->real[0];
    rule.decay = sv_section_value(&section, "decay")->real[0];
    rule.cutoff = sv_section_value(&section, "cutoff")->real[0];
    rule.phase = sv_section_value(&section, "phase")->real[0];
    sv_status status = sv_model_add_rule(reader->context, model, &rule);
    return status == SV_OK || sv_report_status(reader, item, status);
}

bool sv_by_distance_read(sv_reader *reader, const sv_section *section, sv_model *model)
{
    const sv_node *species = sv_section_node(section, "species");
    const sv_node *hops = sv_section_node(section, "hops");
    /* A structure gives it the cells its sites are numbered by. */
    sv_status status = sv_model_begin(reader->context, "by_distance", (const double[2]){1.0, 0.0},
                                      (const double[2]){0.0, 1.0}, model);
    bool good = status == SV_OK || sv_report_status(reader, section->anchor, status);
    if (!good || !check_list(reader, species, "species", "for example [{name: A}, {name: B}]") ||
        !check_list(reader, hops, "hops",
                    "for example [{between: [A, B], distance: 0.142 nm, tolerance: 0.01 nm, "
                    "amplitude: -1}]"))
        return false;
    for (sv_index i = 0; i < species->count && reader->status == SV_OK; i++)
        good = add_species(reader, species->items[i], i, model) && good;
    for (sv_index i = 0; good && i < hops->count && reader->status == SV_OK; i++)
        good = add_hop(reader, hops->items[i], i, model) && good;
    if (!good)
        return false;
    status = sv_model_finish(reader->context, model);
    return status == SV_OK || sv_report_status(reader, section->anchor, status);
}
