/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Material presets: complete, sourced, and nothing but keys one could have written. */
#include "sheet_testing.h"

#include <math.h>

#define FILM_FLAKE "flake: {shape: rectangle, size: [40 nm, 40 nm]}\n"

static bool begins_with_certainty(const char *source)
{
    static const char *const words[] = {
        "seen: ", "recalled: ", "recalled, low certainty: ", "choice: "};
    for (int k = 0; k < 4; k++)
        if (strncmp(source, words[k], strlen(words[k])) == 0)
            return strlen(source) > strlen(words[k]) + 10;
    return false;
}

SV_TEST(every_value_has_a_source_of_stated_certainty)
{
    sv_presets presets = {0};
    CHECK_OK(sv_presets_read(test_context(), &presets));
    CHECK(presets.count >= 4);
    for (int p = 0; p < presets.count; p++) {
        const sv_preset *preset = &presets.items[p];
        CHECK(preset->title[0] != '\0' && preset->n_values >= 5);
        for (int k = 0; k < preset->n_values; k++) {
            const sv_preset_value *value = &preset->values[k];
            if (!CHECK(value->value[0] != '\0' && begins_with_certainty(value->source)))
                printf("# %s: %s: %s\n", preset->name, value->key, value->source);
        }
        for (int k = 0; k < preset->n_notes; k++)
            CHECK(strstr(preset->notes[k], "(seen: ") != NULL ||
                  strstr(preset->notes[k], "(computed)") != NULL ||
                  strstr(preset->notes[k], "same work") != NULL);
    }
    sv_presets_free(test_context(), &presets);
    sv_presets_free(test_context(), &presets);
}

/* Each makes a model with a gap, and with light states a length. */
SV_TEST(every_preset_makes_a_model)
{
    sv_presets presets = {0};
    CHECK_OK(sv_presets_read(test_context(), &presets));
    for (int p = 0; p < presets.count; p++) {
        char text[300];
        double edges[2];
        snprintf(text, sizeof text, "selvedge: 1\nmodel: {preset: %s}\n" FILM_FLAKE,
                 presets.items[p].name);
        reading r = read_text(text);
        if (is_read(&r)) {
            CHECK(strcmp(sv_sheet_preset(r.sheet), presets.items[p].name) == 0);
            CHECK(sv_sheet_is_preset_value(r.sheet, "velocity"));
            CHECK(r.setup.model.velocity > 0.0);
            CHECK_OK(sv_model_filling_gap(test_context(), &r.setup.model, 0.5, 1e-9, edges));
            CHECK(edges[1] - edges[0] > 1e-3);
        }
        reading_free(&r);
    }
    sv_presets_free(test_context(), &presets);
}

/* What the sheet writes wins; the run is that of the sheet with all keys written out. */
SV_TEST(a_preset_is_its_values)
{
    const char *written = "selvedge: 1\n"
                          "model: {name: magnetic_film, lattice_constant: 0.4262 nm, grid: 2 nm,\n"
                          "  velocity: 0.25 eV nm, m0: 0, m1: 0.15 eV nm^2, exchange: 30 meV}\n" //
        FILM_FLAKE;
    reading preset =
        read_text("selvedge: 1\nmodel: {exchange: 30 meV, preset: cr_bst_6ql}\n" FILM_FLAKE);
    reading plain = read_text(written);
    if (is_read(&preset) && is_read(&plain)) {
        CHECK(strcmp(preset.setup.identity, plain.setup.identity) == 0);
        CHECK(!sv_sheet_is_preset_value(preset.sheet, "exchange"));
        CHECK(!sv_sheet_is_preset_value(plain.sheet, "velocity"));
        CHECK(sv_sheet_preset(plain.sheet) == NULL);
        CHECK(strstr(preset.setup.resolved, "# preset: cr_bst_6ql") != NULL);
        CHECK(strstr(preset.setup.resolved, "velocity: 2.5 eV angstrom") != NULL);
        reading again = read_text(preset.setup.resolved);
        if (is_read(&again))
            CHECK(strcmp(again.setup.identity, preset.setup.identity) == 0);
        reading_free(&again);
    }
    reading_free(&preset);
    reading_free(&plain);
}

SV_TEST(presets_can_be_set_and_swept)
{
    const char *const overrides[] = {"model.preset=mnbi2te4", "model.grid=1 nm"};
    reading r = read_with("selvedge: 1\nmodel: {preset: cr_bst_6ql}\n" FILM_FLAKE
                          "sweep: [{parameter: model.exchange, values: [10 meV, 40 meV]}]\n",
                          overrides, 2);
    sv_setup point = {0};
    sv_assignment at = {.path = "model.exchange", .value = 0.04};
    if (is_read(&r)) {
        CHECK_CLOSE(r.setup.model.orbitals[0].onsite, 0.028, 1e-15);
        CHECK_CLOSE(r.setup.lattice_constant, 1.0, 0.0);
        CHECK_OK(sv_sheet_setup(test_context(), r.sheet, &at, 1, &r.said, &point));
        CHECK_CLOSE(point.model.orbitals[0].onsite, 0.04, 1e-15);
    }
    sv_setup_free(test_context(), &point);
    reading_free(&r);
}

SV_TEST(faults_stand_in_the_sheet)
{
    reading r = read_text("selvedge: 1\nmodel: {preset: cr_bst_6l}\n" FILM_FLAKE);
    if (is_refused(&r, 2, 17, "unknown preset: cr_bst_6l"))
        CHECK(strstr(find_said(&r.said, 2, 17, "unknown")->hint, "cr_bst_6ql") != NULL);
    reading_free(&r);
    r = read_text("selvedge: 1\nmodel: {preset: [a]}\n" FILM_FLAKE);
    is_refused(&r, 2, 17, "model.preset: expected the name of a preset");
    reading_free(&r);
    r = read_text(
        "selvedge: 1\nmodel:\n  preset: cr_bst_6ql\n  grid: 8 nm\n  exchange: 60 meV\n" FILM_FLAKE);
    is_refused(&r, 3, 11, "a grid of 8 nm is too coarse");
    reading_free(&r);
    r = read_text("selvedge: 1\nmodel: {preset: cr_bst_6ql, t1: 1}\n" FILM_FLAKE);
    is_refused(&r, 2, 29, "unknown key t1 in model");
    reading_free(&r);
}

/* Lets `left` allocations through and fails the others. */
typedef struct rationed {
    long left, outstanding;
} rationed;

static void *rationed_take(size_t bytes, void *user)
{
    rationed *r = user;
    if (r->left-- <= 0)
        return NULL;
    r->outstanding++;
    return aligned_alloc(64, bytes);
}

static void rationed_give(void *memory, void *user)
{
    rationed *r = user;
    r->outstanding -= memory != NULL;
    free(memory);
}

SV_TEST(every_allocation_may_fail)
{
    const char text[] = "selvedge: 1\nmodel: {preset: cr_bst_6ql}\n" FILM_FLAKE;
    sv_status status = SV_NO_MEMORY;
    for (long left = 0; status != SV_OK && left < 2000; left++) {
        rationed ration = {.left = left};
        sv_context context;
        sv_presets presets = {0};
        sv_sheet *sheet = NULL;
        sv_diagnostics said = {0};
        sv_sheet_options options = reading_options(NULL, 0);
        sv_context_init(&context);
        context.allocator = (sv_allocator){rationed_take, rationed_give, &ration};
        status = sv_presets_read(&context, &presets);
        if (status == SV_OK)
            status =
                sv_sheet_parse(&context, "s.yaml", text, strlen(text), &options, &said, &sheet);
        if (status != SV_OK && !CHECK(status == SV_NO_MEMORY))
            break;
        sv_presets_free(&context, &presets);
        sv_sheet_free(&context, sheet);
        sv_diagnostics_free(&context, &said);
        CHECK_INT(ration.outstanding, 0);
    }
    CHECK_INT(status, SV_OK);
}
