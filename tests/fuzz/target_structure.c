/* SPDX-License-Identifier: GPL-3.0-or-later */
/* XYZ files, plain and extended: sites, hops by distance, hull, and a sample of them. */
#include "fuzz.h"

#include <math.h>

#include "selvedge/sample.h"

static const double A1[2] = {1.0, 0.0}, A2[2] = {0.0, 1.0};

static sv_model make_model(sv_context *context)
{
    sv_model model = {0};
    const sv_distance_rule rules[2] = {
        {.from = 0, .to = 1, .distance = 1.0, .tolerance = 0.1, .amplitude = CMPLX(1.0, 2.0)},
        {.from = 0, .to = 0, .distance = 1.0, .decay = 0.5, .cutoff = 2.0, .amplitude = 1.0}};
    sv_status status = sv_model_begin(context, "by_distance", A1, A2, &model);
    if (status == SV_OK)
        status = sv_model_add_orbital(context, &model, "A", 0.0, 0.0, 0.0);
    if (status == SV_OK)
        status = sv_model_add_orbital(context, &model, "B", 0.0, 0.0, 0.5);
    for (int k = 0; k < 2 && status == SV_OK; k++)
        status = sv_model_add_rule(context, &model, &rules[k]);
    if (status == SV_OK)
        status = sv_model_finish(context, &model);
    fuzz_require(status == SV_OK, "no model: %s", context->error.message);
    return model;
}

static void build(sv_context *context, const sv_model *model, const sv_structure *structure)
{
    const sv_flake_spec spec = {.shape = SV_SHAPE_STRUCTURE, .structure = structure};
    const sv_disorder disorder = {
        .name = "vac", .type = SV_DISORDER_VACANCIES, .on = -1, .has_share = true, .share = 0.1};
    sv_flake flake = {0};
    sv_sample sample = {0};
    bool *inside = NULL;
    sv_index cells = 0;
    sv_status status = sv_flake_make(context, model, &spec, &flake);
    fuzz_require_answer(status);
    if (status == SV_OK) {
        fuzz_require(flake.n_sites == structure->n, "%lld sites became %lld",
                     (long long)structure->n, (long long)flake.n_sites);
        status = sv_flake_window(context, &flake, 0.5, &inside, &cells);
        fuzz_require_answer(status);
        fuzz_require_answer(sv_sample_draw(context, &flake, &disorder, 1, 1, 0, &sample));
    }
    sv_give(context, inside);
    sv_sample_free(context, &sample);
    sv_flake_free(context, &flake);
}

int LLVMFuzzerTestOneInput(const uint8_t *data, size_t size)
{
    const sv_structure_options options = {.unit = 1.0, .least_distance = 0.5, .thickness = 0.25};
    sv_context *context = fuzz_begin();
    sv_model model = make_model(context);
    sv_structure structure = {0};
    sv_table_fault fault = {0};
    const sv_status status =
        sv_structure_make(context, &model, (const char *)data, size, &options, &structure, &fault);
    fuzz_require_answer(status);
    fuzz_require(status != SV_INVALID_INPUT || fault.message[0] != '\0', "a fault without a word");
    if (status == SV_OK) {
        fuzz_require(isfinite(structure.area) && structure.area > 0.0, "a hull of area %g",
                     structure.area);
        build(context, &model, &structure);
    }
    sv_structure_free(context, &structure);
    sv_model_free(context, &model);
    fuzz_end();
    return 0;
}
