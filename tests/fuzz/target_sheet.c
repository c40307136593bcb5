/* SPDX-License-Identifier: GPL-3.0-or-later */
/* A sheet from elsewhere: read, completed, and, when small, built as one sample. */
#include "sheets.h"

enum { MOST_SITES = 300, MOST_HOPS = 200 };

static void build(sv_context *context, const sv_setup *setup)
{
    sv_flake flake = {0};
    sv_sample sample = {0};
    sv_index sites = 0;
    if (setup->model.n_hops > MOST_HOPS ||
        sv_flake_count(context, &setup->model, &setup->flake, &sites) != SV_OK ||
        sites > MOST_SITES)
        return;
    sv_status status = sv_flake_make(context, &setup->model, &setup->flake, &flake);
    if (status == SV_OK)
        status = sv_sample_draw(context, &flake, setup->disorder, setup->n_disorder, setup->seed, 0,
                                &sample);
    fuzz_require_answer(status);
    sv_sample_free(context, &sample);
    sv_flake_free(context, &flake);
}

/* The sheet at the far end of its sweep. */
static void check_sweep(sv_context *context, fuzz_reading *r)
{
    sv_assignment at[2];
    sv_setup setup = {0};
    const int n = r->setup.n_axes;
    for (int k = 0; k < n; k++)
        at[k] = sv_sweep_value(&r->setup.axes[k], r->setup.axes[k].count - 1);
    if (n == 0)
        return;
    const sv_status status = sv_sheet_setup(context, r->sheet, at, n, &r->said, &setup);
    fuzz_require_answer(status);
    if (status == SV_OK)
        build(context, &setup);
    sv_setup_free(context, &setup);
}

static void check_resolved(sv_context *context, const fuzz_reading *r)
{
    fuzz_reading again =
        fuzz_read_sheet(context, r->setup.resolved, strlen(r->setup.resolved), NULL, 0);
    fuzz_require(again.status == SV_OK, "the resolved sheet does not read back:\n%s\n%s",
                 r->setup.resolved, again.said.count > 0 ? again.said.items[0].message : "");
    fuzz_require(strcmp(again.setup.identity, r->setup.identity) == 0,
                 "the resolved sheet has another identity:\n%s\n%s\n%s", r->setup.resolved,
                 r->setup.identity, again.setup.identity);
    fuzz_reading_free(context, &again);
}

int LLVMFuzzerTestOneInput(const uint8_t *data, size_t size)
{
    sv_context *context = fuzz_begin();
    fuzz_reading r = fuzz_read_sheet(context, (const char *)data, size, NULL, 0);
    if (r.status == SV_OK) {
        check_resolved(context, &r);
        build(context, &r.setup);
        check_sweep(context, &r);
    }
    fuzz_check_words(&r.said);
    fuzz_reading_free(context, &r);
    fuzz_end();
    return 0;
}
