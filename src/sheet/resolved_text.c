/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The resolved sheet: every key with its value, as the user wrote it or from the default, and what
 * the program takes it for in a comment. It reads back to the same identity. */
#include "sheet_internal.h"

#include <math.h>
#include <stdio.h>
#include <string.h>

typedef struct writer {
    const sv_setup *setup;
    const char *const *names; /* for files, or NULL */
    int n_files;              /* files written so far */
    sv_text text;
} writer;

static void add_real(sv_text *text, double value)
{
    char number[32];
    sv_format_real(value, number, sizeof number);
    sv_text_add(text, "%s", number);
}

static const char *unit_words(sv_dimension dimension)
{
    switch (dimension) {
    case SV_DIM_ENERGY:
        return " in the energy unit of the model";
    case SV_DIM_LENGTH:
        return " lattice constants";
    case SV_DIM_DENSITY:
        return " per lattice constant squared";
    case SV_DIM_VOLUME_DENSITY:
        return " per lattice constant cubed";
    case SV_DIM_ANGLE:
        return " rad";
    case SV_DIM_TEMPERATURE:
        return " K";
    case SV_DIM_TIME:
        return " s";
    case SV_DIM_ENERGY_LENGTH:
        return " energy units x nm";
    case SV_DIM_ENERGY_AREA:
        return " energy units x nm^2";
    case SV_DIM_NONE:
        break;
    }
    return "";
}

/* Was some number of the node written with a unit? */
static bool has_unit(const sv_node *node)
{
    double number = 0.0;
    if (node == NULL)
        return false;
    if (node->kind == SV_NODE_SCALAR)
        return sv_parse_real(node->text, &number) != SV_PARSE_OK;
    for (sv_index i = 0; node->kind == SV_NODE_LIST && i < node->count; i++)
        if (has_unit(node->items[i]))
            return true;
    return false;
}

static bool is_box_width(const sv_section *section, const sv_field *field)
{
    const char *distribution = sv_section_value(section, "distribution")->text;
    return strcmp(field->key->name, "width") == 0 && distribution != NULL &&
           strcmp(distribution, "box") == 0;
}

static void add_conversion(sv_text *text, const sv_field *field, const sv_value *value)
{
    bool real = field->key->type == SV_KEY_REAL ||
                (field->key->type == SV_KEY_AUTO_OR_REAL && !value->has_auto);
    bool pair = field->key->type == SV_KEY_REAL_PAIR ||
                (field->key->type == SV_KEY_PLACE && !value->has_auto);
    if ((!real && !pair) || sv_schema_is_scale(field->key) || !has_unit(field->node))
        return;
    sv_text_add(text, pair ? "  # = [" : "  # = ");
    add_real(text, value->real[0]);
    if (pair) {
        sv_text_add(text, ", ");
        add_real(text, value->real[1]);
        sv_text_add(text, "]");
    }
    sv_text_add(text, "%s", unit_words(field->key->dimension));
}

static void add_comment(writer *w, const sv_section *section, int i)
{
    const sv_field *field = &section->fields[i];
    const sv_value *value = &section->values[i];
    sv_index before = w->text.length;
    add_conversion(&w->text, field, value);
    if (is_box_width(section, field)) {
        sv_text_add(&w->text, "%sfull width: V in [", w->text.length > before ? "; " : "  # ");
        add_real(&w->text, -value->real[0] / 2);
        sv_text_add(&w->text, ", ");
        add_real(&w->text, value->real[0] / 2);
        sv_text_add(&w->text, "]");
    }
    if (sv_words_hold("density volume_density", field->key->name) && section->entry >= 0 &&
        section->entry < w->setup->n_disorder && w->setup->disorder[section->entry].has_share) {
        sv_text_add(&w->text, "%sshare ", w->text.length > before ? "; " : "  # ");
        add_real(&w->text, w->setup->disorder[section->entry].share);
    }
}

static void add_indent(writer *w, int depth)
{
    for (int i = 0; i < depth; i++)
        sv_text_add(&w->text, "  ");
}

/* Lists of mappings (hops, orbitals) get a line each. */
static void add_tree(writer *w, const sv_node *node, int depth)
{
    bool tall =
        node->kind == SV_NODE_LIST && node->count > 0 && node->items[0]->kind == SV_NODE_MAP;
    if (!tall) {
        sv_text_add(&w->text, " ");
        sv_emit_node(&w->text, node);
        return;
    }
    for (sv_index i = 0; i < node->count; i++) {
        sv_text_add(&w->text, "\n");
        add_indent(w, depth + 1);
        sv_text_add(&w->text, "- ");
        sv_emit_node(&w->text, node->items[i]);
    }
}

static void add_value(writer *w, const sv_section *section, int i, int depth)
{
    const sv_field *field = &section->fields[i];
    const sv_value *value = &section->values[i];
    if (field->key->type == SV_KEY_FILE && w->names != NULL) {
        sv_text_add(&w->text, " ");
        sv_emit_scalar(&w->text, w->names[w->n_files++]);
    } else if (field->key->type == SV_KEY_FLAG) /* as text it would be quoted */
        sv_text_add(&w->text, value->integer[0] != 0 ? " true" : " false");
    else if (field->node != NULL)
        add_tree(w, field->node, depth);
    else if (field->key->fallback != NULL && field->key->fallback[0] != '\0')
        sv_text_add(&w->text, " %s", field->key->fallback);
    else if (value->text != NULL) {
        sv_text_add(&w->text, " ");
        sv_emit_scalar(&w->text, value->text);
    }
}

/* The energy unit that follows from the rule for energies with units. */
static bool is_implied_unit(const writer *w, const sv_section *section, int i)
{
    const sv_key *key = section->fields[i].key;
    return sv_schema_is_scale(key) && key->dimension == SV_DIM_ENERGY &&
           !section->values[i].present && w->setup->energy_unit > 0.0;
}

/* Its values are written out, so that a later version of the preset changes nothing. */
static bool is_preset(const sv_key *key)
{
    return key->type == SV_KEY_TEXT && strcmp(key->name, "preset") == 0;
}

static void add_field(writer *w, const sv_section *section, int i, int depth, bool *first)
{
    bool implied = is_implied_unit(w, section, i);
    if (!section->values[i].present && !implied)
        return;
    /* The first key of an entry of a list follows its dash. */
    bool dash = *first && section->entry >= 0;
    *first = false;
    add_indent(w, dash ? depth - 1 : depth);
    if (is_preset(section->fields[i].key)) {
        sv_text_add(&w->text, "# preset: %s\n", section->values[i].text);
        return;
    }
    sv_text_add(&w->text, "%s%s:", dash ? "- " : "", section->fields[i].key->name);
    if (implied)
        sv_text_add(&w->text, " 1 eV  # %s",
                    w->setup->model.velocity > 0.0 ? "of this model"
                                                   : "since energies carry units");
    else
        add_value(w, section, i, depth);
    add_comment(w, section, i);
    sv_text_add(&w->text, "\n");
}

static int depth_of(const sv_block *block)
{
    return block->parent == NULL ? 0 : depth_of(sv_schema_find(block->parent)) + 1;
}

static void add_section(writer *w, const sv_section *section, bool is_first)
{
    const sv_block *block = section->block;
    int depth = depth_of(block);
    bool first = true;
    if (is_first && block->parent != NULL) {
        add_indent(w, depth - 1);
        sv_text_add(&w->text, "%s:\n", block->name);
    }
    if (block->form == SV_BLOCK_NAMED) {
        add_indent(w, depth);
        sv_text_add(&w->text, "%s:%s\n", section->kind->name, section->n_fields == 0 ? " {}" : "");
    }
    int inner = depth + (block->form != SV_BLOCK_MAP);
    for (int i = 0; i < section->n_fields; i++)
        add_field(w, section, i, inner, &first);
    if (first && block->form == SV_BLOCK_NAMED && section->n_fields > 0)
        sv_text_add(&w->text, "\n"); /* nothing present: an empty mapping, read as null */
}

sv_status sv_resolved_write(sv_reader *reader, const sv_setup *setup, const char *const *names,
                            char **ret_text)
{
    writer w = {.setup = setup, .names = names, .text = {.context = reader->context}};
    const sv_block *previous = NULL;
    for (const sv_section *s = reader->sections; s != NULL; s = s->next) {
        add_section(&w, s, s->block != previous);
        previous = s->block;
    }
    if (w.text.status != SV_OK) {
        sv_give(reader->context, w.text.data);
        return w.text.status;
    }
    *ret_text = w.text.data;
    return SV_OK;
}
