/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Material presets on the terminal: the list, and where the values of a sheet come from. */
#include "program_internal.h"

#include <math.h>
#include <string.h>

/* ħv and the gap of a preset's clean model at half filling, from the smallest sheet that names it.
 */
static sv_status measure(sv_context *context, const char *name, double *ret_velocity,
                         double *ret_gap)
{
    char text[300];
    double edges[2];
    sv_sheet *sheet = NULL;
    sv_setup setup = {0};
    sv_diagnostics diagnostics = {0};
    int count;
    sv_kind kinds[SV_MAX_MARKERS];
    const sv_marker *markers = sv_marker_table(&count);
    for (int k = 0; k < count; k++)
        kinds[k] = markers[k].kind;
    const sv_sheet_options reading = {.size = sizeof reading, .markers = kinds, .n_markers = count};
    snprintf(text, sizeof text,
             "selvedge: 1\nmodel: {preset: %.60s}\nflake: {shape: rectangle, cells: [4, 4]}\n",
             name);
    sv_status status =
        sv_sheet_parse(context, "preset", text, strlen(text), &reading, &diagnostics, &sheet);
    if (status == SV_OK)
        status = sv_sheet_setup(context, sheet, NULL, 0, &diagnostics, &setup);
    if (status == SV_OK)
        status = sv_model_filling_gap(context, &setup.model, 0.5, 1e-9, edges);
    if (status == SV_OK) {
        *ret_velocity = setup.model.velocity * setup.lattice_constant * setup.energy_unit;
        *ret_gap = fmax(0.0, edges[1] - edges[0]) * setup.energy_unit;
    }
    sv_setup_free(context, &setup);
    sv_sheet_free(context, sheet);
    sv_diagnostics_free(context, &diagnostics);
    return status;
}

static sv_status print_preset(sv_context *context, const sv_preset *preset)
{
    double velocity, gap;
    sv_status status = measure(context, preset->name, &velocity, &gap);
    if (status != SV_OK)
        return status;
    printf("%s\n  %s\n", preset->name, preset->title);
    for (int k = 0; k < preset->n_values; k++)
        printf("  %-16s %s\n                   %s\n", preset->values[k].key,
               preset->values[k].value, preset->values[k].source);
    if (velocity > 0.0 && gap > 0.0)
        printf("  xi = hbar v / gap = %.3g nm: a film should be at least 8 xi = %.3g nm across\n",
               velocity / gap, 8.0 * velocity / gap);
    for (int k = 0; k < preset->n_notes; k++)
        printf("  - %s\n", preset->notes[k]);
    printf("\n");
    return SV_OK;
}

sv_status presets_print(sv_context *context)
{
    sv_presets presets = {0};
    sv_status status = sv_presets_read(context, &presets);
    printf("In a sheet: model: {preset: NAME}; keys written beside it win. Sources: seen - the "
           "text was "
           "read;\nrecalled - from memory; choice - not a property of the material.\n\n");
    for (int k = 0; k < presets.count && status == SV_OK; k++)
        status = print_preset(context, &presets.items[k]);
    sv_presets_free(context, &presets);
    return status;
}

/* The preset of the sheet among all; NULL when it names none. */
static const sv_preset *find(const sv_presets *presets, const sv_sheet *sheet)
{
    const char *name = sv_sheet_preset(sheet);
    for (int k = 0; name != NULL && k < presets->count; k++)
        if (strcmp(presets->items[k].name, name) == 0)
            return &presets->items[k];
    return NULL;
}

sv_status presets_print_sources(sv_context *context, const sv_sheet *sheet, FILE *stream)
{
    sv_presets presets = {0};
    if (sv_sheet_preset(sheet) == NULL)
        return SV_OK;
    sv_status status = sv_presets_read(context, &presets);
    const sv_preset *preset = find(&presets, sheet);
    if (preset != NULL)
        fprintf(stream, "#\n# preset %s: %s\n", preset->name, preset->title);
    for (int k = 0; preset != NULL && k < preset->n_values; k++) {
        const sv_preset_value *value = &preset->values[k];
        if (sv_sheet_is_preset_value(sheet, value->key))
            fprintf(stream, "#   %s %s: %s\n", value->key, value->value, value->source);
        else
            fprintf(stream, "#   %s: the sheet's own, %s in the preset\n", value->key,
                    value->value);
    }
    sv_presets_free(context, &presets);
    return status;
}

sv_status presets_json(sv_context *context, const sv_sheet *sheet, json_t **ret_object)
{
    sv_presets presets = {0};
    json_t *object = json_null();
    sv_status status = SV_OK;
    if (sv_sheet_preset(sheet) != NULL)
        status = sv_presets_read(context, &presets);
    const sv_preset *preset = find(&presets, sheet);
    if (preset != NULL) {
        json_t *sources = json_object();
        for (int k = 0; k < preset->n_values; k++)
            if (sv_sheet_is_preset_value(sheet, preset->values[k].key))
                json_object_set_new(sources, preset->values[k].key,
                                    json_string(preset->values[k].source));
        object = json_pack("{s:s, s:o}", "name", preset->name, "sources", sources);
    }
    sv_presets_free(context, &presets);
    *ret_object = object;
    return status;
}
