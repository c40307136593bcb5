/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Every allocation may fail: a status each time, nothing left behind, nothing half done. */
#include "sheet_testing.h"

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

static const char SHEET[] =
    "selvedge: 1\ntitle: x\n"
    "model:\n  name: custom\n  lattice_constant: 0.5 nm\n  vectors: [[1, 0], [0, 1]]\n"
    "  orbitals: [{name: a, at: [0, 0]}, &b {name: b, at: [0.5, 0]}]\n"
    "  onsite: {b: 0.25 eV}\n"
    "  hops: [{from: a, to: b, shift: [0, 1], amplitude: [0.5, 0.2]}]\n"
    "flake: {shape: rectangle, cells: [4, 4]}\n"
    "disorder:\n"
    "  - {name: vac, kind: vacancies, share: 0.1}\n"
    "  - {name: spots, kind: vacancies, file: spots.csv}\n"
    "markers: {local_chern: {}, probe: {levels: [1, 2]}}\n"
    "ensemble: {stop: {standard_error: 0.1, of: probe}}\n"
    "sweep: [{parameter: disorder.vac.share, from: 0, to: 0.2, steps: 3}]\n";

static const char *const override = "disorder.vac.on=a";

/* One whole use of a sheet; the status of the first call that fails. */
static sv_status use_sheet(sv_context *context, const char *text, sv_diagnostics *said)
{
    sv_sheet *sheet = NULL;
    sv_setup plain = {0}, point = {0};
    char *relocated = NULL;
    const char *names[] = {"inputs/x.csv"};
    sv_assignment at = {.path = "disorder.vac.share", .value = 0.1};
    sv_sheet_options options = reading_options(&override, 1);
    sv_status status = sv_sheet_parse(context, test_scratch("sheet.yaml"), text, strlen(text),
                                      &options, said, &sheet);
    if (status == SV_OK)
        status = sv_sheet_setup(context, sheet, NULL, 0, said, &plain);
    if (status == SV_OK)
        status = sv_sheet_setup(context, sheet, &at, 1, said, &point);
    if (status == SV_OK)
        status = sv_sheet_resolved_relocated(context, sheet, names, 1, &relocated);
    sv_give(context, relocated);
    sv_setup_free(context, &plain);
    sv_setup_free(context, &plain); /* twice is fine */
    sv_setup_free(context, &point);
    sv_sheet_free(context, sheet);
    return status;
}

static long count_until(const char *text, sv_status expected)
{
    for (long k = 0; k < 5000; k++) {
        rationed r = {.left = k};
        sv_context context;
        sv_diagnostics said = {0};
        sv_context_init(&context);
        context.allocator = (sv_allocator){rationed_take, rationed_give, &r};
        sv_status status = use_sheet(&context, text, &said);
        sv_diagnostics_free(&context, &said);
        if (!test_check(r.outstanding == 0, __FILE__, __LINE__,
                        "after %ld allocations %ld blocks are left", k, r.outstanding))
            return -1;
        if (status == expected && r.left >= 0)
            return k;
        if (!test_check(status == SV_NO_MEMORY && context.error.status == SV_NO_MEMORY, __FILE__,
                        __LINE__, "after %ld allocations: %d", k, status))
            return -1;
    }
    return -1;
}

SV_TEST(every_allocation_may_fail)
{
    FILE *file = fopen(test_scratch("spots.csv"), "w");
    if (file == NULL || fputs("x,y\n0,0\n", file) < 0 || fclose(file) != 0)
        abort();
    long n = count_until(SHEET, SV_OK);
    test_check(n > 50, __FILE__, __LINE__, "only %ld allocations", n);
}

SV_TEST(every_allocation_may_fail_while_complaining)
{
    long n = count_until("selvedge: 1\nmodel: {name: qi_wu_zhang, m: x, y: 2}\n"
                         "flake: {shape: disc, radius: 4, boundry: open}\n"
                         "disorder: [{kind: vacancies, share: [1, 2]}]\n",
                         SV_INVALID_INPUT);
    test_check(n > 10, __FILE__, __LINE__, "only %ld allocations", n);
}
