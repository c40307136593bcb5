/* SPDX-License-Identifier: GPL-3.0-or-later */
/* CSV tables from elsewhere: defects, energies, rasters, hops. The first line (one letter) says
 * which; the rest is the file. */
#include "fuzz.h"

#include <math.h>

#include "selvedge/sample.h"

static const double A1[2] = {1.0, 0.0}, A2[2] = {0.0, 1.0}, NOWHERE[2] = {0.0, 0.0};

/* Two orbitals; `with_hops` leaves the table nothing to add at (A, B, 0, 0). */
static sv_model make_model(sv_context *context, bool with_hops)
{
    sv_model model = {0};
    sv_status status = sv_model_begin(context, "custom", A1, A2, &model);
    if (status == SV_OK)
        status = sv_model_add_orbital(context, &model, "A", 0.0, 0.0, 0.0);
    if (status == SV_OK)
        status = sv_model_add_orbital(context, &model, "B", 0.5, 0.5, 0.0);
    if (status == SV_OK && with_hops)
        status = sv_model_add_hop(context, &model, 0, 1, 0, 0, CMPLX(0.5, 0.25));
    fuzz_require(status == SV_OK, "no model: %s", context->error.message);
    return model;
}

/* Disorder from a table, drawn on a small flake. */
static void draw(sv_context *context, const sv_model *model, const sv_disorder *disorder)
{
    const sv_flake_spec spec = {
        .shape = SV_SHAPE_PARALLELOGRAM, .has_cells = true, .cells = {4, 3}};
    sv_flake flake = {0};
    sv_sample sample = {0};
    sv_table_fault fault = {0};
    sv_status status = sv_flake_make(context, model, &spec, &flake);
    fuzz_require(status == SV_OK, "no flake: %s", context->error.message);
    if (disorder->has_marks)
        fuzz_require_answer(sv_marks_check(context, &flake, disorder, &fault));
    status = sv_sample_draw(context, &flake, disorder, 1, 1, 0, &sample);
    fuzz_require_answer(status);
    if (status == SV_OK)
        for (sv_index k = 0; k < sample.n; k++)
            fuzz_require(isfinite(sample.potential[k]), "site %lld has the energy %g", (long long)k,
                         sample.potential[k]);
    sv_sample_free(context, &sample);
    sv_flake_free(context, &flake);
}

static void read_marks(sv_context *context, sv_model *model, char kind, const char *text,
                       size_t size)
{
    sv_disorder disorder = {.name = "measured",
                            .type = kind == 'd' ? SV_DISORDER_VACANCIES : SV_DISORDER_ONSITE,
                            .on = -1,
                            .keep_unmatched = kind != 'd',
                            .tolerance = 0.75};
    sv_table_fault fault = {0};
    sv_status status = sv_model_finish(context, model);
    fuzz_require(status == SV_OK, "no model: %s", context->error.message);
    status = sv_read_marks(context, model, text, size, kind != 'd', 0.5, 1.0, NOWHERE,
                           &disorder.marks, &disorder.n_marks, &fault);
    fuzz_require_answer(status);
    fuzz_require(status != SV_INVALID_INPUT || fault.message[0] != '\0', "a fault without a word");
    disorder.has_marks = status == SV_OK;
    if (status == SV_OK && kind == 'r') {
        status =
            sv_grid_from_marks(context, disorder.marks, disorder.n_marks, &disorder.grid, &fault);
        fuzz_require_answer(status);
        disorder.has_grid = status == SV_OK;
        disorder.has_marks = false;
    }
    if (status == SV_OK)
        draw(context, model, &disorder);
    sv_disorder_free(context, &disorder);
}

static void read_hops(sv_context *context, sv_model *model, const char *text, size_t size)
{
    bool has_unit = false;
    sv_table_fault fault = {0};
    sv_status status = sv_model_read_hops(context, model, text, size, 1.0, &has_unit, &fault);
    fuzz_require_answer(status);
    fuzz_require(status != SV_INVALID_INPUT || fault.message[0] != '\0', "a fault without a word");
    if (status == SV_OK)
        fuzz_require_answer(sv_model_finish(context, model));
}

int LLVMFuzzerTestOneInput(const uint8_t *data, size_t size)
{
    if (size < 2)
        return 0;
    const char kind = (char)data[0], *text = (const char *)data + 2;
    sv_context *context = fuzz_begin();
    sv_model model = make_model(context, kind == 'm');
    if (kind == 'h' || kind == 'm')
        read_hops(context, &model, text, size - 2);
    else
        read_marks(context, &model, kind, text, size - 2);
    sv_model_free(context, &model);
    fuzz_end();
    return 0;
}
