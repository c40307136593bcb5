/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The sheet as an object: read, checked as written and at both ends of its sweep, kept. */
#include "sheet_internal.h"

#include <stdio.h>
#include <string.h>

static sv_status copy_source(sv_context *context, sv_sheet *sheet, const char *name,
                             const char *text, size_t size)
{
    const char *kept_name = NULL;
    sv_status status = sv_arena_text(context, &sheet->arena, name, strlen(name), &kept_name);
    if (status == SV_OK)
        status = sv_take(context, (sv_index)size + 1, 1, &sheet->data);
    if (status != SV_OK)
        return status;
    if (size > 0)
        memcpy(sheet->data, text, size);
    size_t mark = size >= 3 && memcmp(text, "\xEF\xBB\xBF", 3) == 0 ? 3 : 0;
    sheet->source = (sv_source){kept_name, sheet->data + mark, size - mark};
    const char *slash = strrchr(kept_name, '/');
    size_t length = slash == NULL ? 0 : slash == kept_name ? 1 : (size_t)(slash - kept_name);
    return length == 0 ? sv_arena_text(context, &sheet->arena, ".", 1, &sheet->folder)
                       : sv_arena_text(context, &sheet->arena, kept_name, length, &sheet->folder);
}

static sv_reader start_reader(sv_context *context, const sv_sheet *sheet, sv_arena *arena,
                              sv_diagnostics *diagnostics)
{
    return (sv_reader){.context = context,
                       .diagnostics = diagnostics,
                       .arena = arena,
                       .sheet = sheet,
                       .root = sheet->root};
}

/* What the reader met, as a status with a sentence in the error record. */
static sv_status finish_reader(const sv_reader *reader)
{
    if (reader->status != SV_OK)
        return reader->status;
    if (reader->errors > 0)
        return SV_FAIL(reader->context, SV_INVALID_INPUT, "%s has %d error%s",
                       reader->sheet->source.name, reader->errors, reader->errors > 1 ? "s" : "");
    return SV_OK;
}

void sv_sheet_report(sv_context *context, const sv_sheet *sheet, const char *key,
                     const char *message, const char *hint, sv_diagnostics *diagnostics)
{
    sv_arena arena = {0};
    sv_reader reader = start_reader(context, sheet, &arena, diagnostics);
    const sv_node *name = NULL;
    const sv_node *node = sv_node_get(sheet->root, key, &name);
    sv_report(&reader, node != NULL ? name : sheet->root, hint, "%s", message);
    sv_arena_free(context, &arena);
}

static sv_status read_tree(sv_context *context, sv_sheet *sheet, const sv_sheet_options *options,
                           sv_diagnostics *diagnostics)
{
    sv_tree_input input = {&sheet->source, 0, "sheet"};
    sv_node *root = NULL;
    sv_status status = sv_tree_read(context, &sheet->arena, &input, diagnostics, &root);
    if (status != SV_OK)
        return status;
    sheet->root = root;
    sv_reader reader = start_reader(context, sheet, &sheet->arena, diagnostics);
    for (int i = 0; i < options->n_overrides && reader.status == SV_OK; i++)
        sv_override_apply(&reader, options->overrides[i], &sheet->root);
    if (sv_reader_good(&reader))
        sv_preset_expand(&reader, &sheet->root);
    return finish_reader(&reader);
}

/* A number as a sheet would have it: whole ones without exponent, scales with their unit. */
static const char *number_text(sv_reader *reader, const sv_assignment *assignment, double value)
{
    char number[64];
    const char *unit = strcmp(assignment->path, "model.lattice_constant") == 0 ? " nm"
                       : strcmp(assignment->path, "model.energy_unit") == 0    ? " eV"
                                                                               : "";
    if (value > -1e15 && value < 1e15 && value == (double)(int64_t)value)
        snprintf(number, sizeof number, "%lld", (long long)value);
    else
        sv_format_real(value, number, sizeof number);
    return sv_reader_text(reader, "%s%s", number, unit);
}

static const char *assigned_text(sv_reader *reader, const sv_assignment *assignment)
{
    const char *first = number_text(reader, assignment, assignment->value);
    const char *second = number_text(reader, assignment, assignment->second);
    if (first == NULL || second == NULL || !assignment->pair)
        return first;
    return sv_reader_text(reader, "[%s, %s]", first, second);
}

/* Messages of a point of a sweep stand at its axis and begin with its value. */
static bool set_prefix(sv_reader *reader, const sv_assignment *assignments, int n)
{
    const char *prefix = "";
    const sv_node *node = NULL;
    for (int i = 0; i < n && prefix != NULL; i++) {
        const char *number = assigned_text(reader, &assignments[i]);
        if (number == NULL)
            return false;
        prefix = sv_reader_text(reader, "%s%s%s = %s", prefix, i > 0 ? ", " : "",
                                assignments[i].path, number);
        if (node == NULL)
            node = sv_sweep_parameter(reader->root, assignments[i].path);
    }
    reader->prefix = prefix;
    reader->prefix_place = sv_node_place(node);
    if (node == NULL)
        reader->prefix_place.source = &reader->sheet->source;
    return prefix != NULL;
}

/* One number of an assignment as a node that stands at the axis. */
static const sv_node *number_node(sv_reader *reader, const sv_assignment *assignment, double value)
{
    sv_node *node = NULL;
    const char *text = number_text(reader, assignment, value);
    if (text == NULL)
        return NULL;
    sv_mark_point at = {reader->prefix_place.line, reader->prefix_place.column};
    sv_status status = sv_node_scalar(reader->context, reader->arena, text,
                                      reader->prefix_place.source, at, &node);
    if (status != SV_OK)
        sv_report_status(reader, NULL, status);
    return node;
}

static const sv_node *assigned_node(sv_reader *reader, const sv_assignment *assignment)
{
    const sv_node *first = number_node(reader, assignment, assignment->value);
    if (first == NULL || !assignment->pair)
        return first;
    sv_node *pair = sv_reader_take(reader, 1, sizeof *pair);
    const sv_node **items = sv_reader_take(reader, 2, sizeof *items);
    const sv_node *second = number_node(reader, assignment, assignment->second);
    if (pair == NULL || items == NULL || second == NULL)
        return NULL;
    *pair = *first;
    pair->kind = SV_NODE_LIST;
    pair->text = NULL;
    items[0] = first;
    items[1] = second;
    pair->items = items;
    pair->count = 2;
    return pair;
}

static bool assign(sv_reader *reader, const sv_assignment *assignment)
{
    sv_path path;
    const sv_node *value = assigned_node(reader, assignment);
    if (value == NULL || !sv_path_split(reader, assignment->path, &reader->prefix_place, &path))
        return false;
    return sv_path_set(reader, reader->root, &path, value, &reader->root);
}

/* Reads the sheet at a point; `loading` lets files in, `geometry` builds the flake. */
typedef struct pass {
    sv_sheet *loading;
    bool geometry;
} pass;

static bool touches_flake(const sv_assignment *assignments, int n)
{
    for (int i = 0; i < n; i++)
        if (strncmp(assignments[i].path, "flake.", 6) == 0 ||
            strncmp(assignments[i].path, "model.", 6) == 0 ||
            strstr(assignments[i].path, ".count") != NULL)
            return true;
    return n == 0;
}

static sv_status build(sv_context *context, const sv_sheet *sheet, const sv_assignment *assignments,
                       int n, pass how, sv_diagnostics *diagnostics, sv_setup *ret_setup)
{
    sv_setup setup = {0};
    sv_arena arena = {0};
    sv_reader reader = start_reader(context, sheet, &arena, diagnostics);
    reader.loading = how.loading;
    reader.geometry = how.geometry && touches_flake(assignments, n);
    bool good = n == 0 || set_prefix(&reader, assignments, n);
    for (int i = 0; i < n && good; i++)
        good = assign(&reader, &assignments[i]);
    if (good)
        sv_setup_build(&reader, &setup);
    setup.memory = arena.chunks;
    sv_status status = finish_reader(&reader);
    if (status == SV_OK)
        *ret_setup = setup;
    else
        sv_setup_free(context, &setup);
    return status;
}

/* The ends of the sweep must be good; what lies between is checked when it is set up. */
static sv_status check_ends(sv_context *context, sv_sheet *sheet, const sv_setup *plain,
                            sv_diagnostics *diagnostics)
{
    for (int end = 0; end < 2 && plain->n_axes > 0; end++) {
        sv_assignment assignments[2];
        sv_setup setup = {0};
        for (int i = 0; i < plain->n_axes; i++) {
            const sv_sweep_axis *axis = &plain->axes[i];
            assignments[i] = sv_sweep_value(axis, end == 0 ? 0 : axis->count - 1);
        }
        sv_status status = build(context, sheet, assignments, plain->n_axes, (pass){sheet, true},
                                 diagnostics, &setup);
        if (status != SV_OK)
            return status;
        sv_setup_free(context, &setup);
    }
    return SV_OK;
}

static sv_status check_sheet(sv_context *context, sv_sheet *sheet, sv_diagnostics *diagnostics)
{
    sv_setup setup = {0};
    sv_status status = build(context, sheet, NULL, 0, (pass){sheet, true}, diagnostics, &setup);
    if (status != SV_OK)
        return status;
    sheet->energy_unit = setup.energy_unit;
    status = check_ends(context, sheet, &setup, diagnostics);
    sv_setup_free(context, &setup);
    return status;
}

sv_status sv_sheet_parse(sv_context *context, const char *name, const char *text, size_t size,
                         const sv_sheet_options *options, sv_diagnostics *diagnostics,
                         sv_sheet **ret_sheet)
{
    sv_sheet_options own = {0};
    sv_sheet *sheet = NULL;
    sv_index first = diagnostics->count;
    if (options != NULL)
        memcpy(&own, options, options->size < sizeof own ? options->size : sizeof own);
    sv_status status = sv_take(context, 1, sizeof *sheet, &sheet);
    if (status != SV_OK)
        return status;
    sheet->confined = own.confined;
    sheet->check_marker = own.check_marker;
    sheet->is_index = own.is_index;
    sheet->markers = own.markers;
    sheet->n_markers = own.n_markers;
    status = copy_source(context, sheet, name, text, size);
    if (status == SV_OK)
        status = read_tree(context, sheet, &own, diagnostics);
    if (status == SV_OK)
        status = check_sheet(context, sheet, diagnostics);
    sv_diagnostics_sort(diagnostics, first);
    if (status == SV_OK)
        *ret_sheet = sheet;
    else
        sv_sheet_free(context, sheet);
    return status;
}

void sv_sheet_free(sv_context *context, sv_sheet *sheet)
{
    if (sheet == NULL)
        return;
    for (sv_cached_file *file = sheet->files; file != NULL; file = file->next)
        sv_give(context, file->data), sv_grey_free(context, &file->grey);
    sv_give(context, sheet->data);
    sv_arena_free(context, &sheet->arena);
    sv_give(context, sheet);
}

sv_status sv_sheet_setup(sv_context *context, const sv_sheet *sheet,
                         const sv_assignment *assignments, int n_assignments,
                         sv_diagnostics *diagnostics, sv_setup *ret_setup)
{
    sv_index first = diagnostics->count;
    /* The sheet as written was checked in full when it was read. */
    pass how = {NULL, n_assignments > 0};
    sv_status status = build(context, sheet, assignments, assignments != NULL ? n_assignments : 0,
                             how, diagnostics, ret_setup);
    sv_diagnostics_sort(diagnostics, first);
    return status;
}

void sv_setup_free(sv_context *context, sv_setup *setup)
{
    sv_arena arena = {setup->memory};
    for (int i = 0; i < setup->n_disorder; i++)
        sv_disorder_free(context, &setup->disorder[i]);
    sv_give(context, setup->disorder);
    sv_model_free(context, &setup->model);
    if (setup->structure != NULL)
        sv_structure_free(context, setup->structure);
    sv_give(context, setup->structure);
    sv_give(context, setup->resolved);
    sv_give(context, setup->identity);
    sv_arena_free(context, &arena);
    *setup = (sv_setup){0};
}

sv_status sv_sheet_resolved_relocated(sv_context *context, const sv_sheet *sheet,
                                      const char *const *names, int n_names, char **ret_text)
{
    sv_setup setup = {0};
    sv_arena arena = {0};
    sv_diagnostics diagnostics = {0};
    sv_reader reader = start_reader(context, sheet, &arena, &diagnostics);
    sv_setup_build(&reader, &setup);
    setup.memory = arena.chunks;
    sv_status status = finish_reader(&reader);
    if (status == SV_OK && setup.n_files != n_names)
        status = SV_FAIL(context, SV_INTERNAL, "the sheet names %d files, not %d", setup.n_files,
                         n_names);
    if (status == SV_OK)
        status = sv_resolved_write(&reader, &setup, names, ret_text);
    sv_diagnostics_free(context, &diagnostics);
    sv_setup_free(context, &setup);
    return status;
}
