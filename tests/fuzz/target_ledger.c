/* SPDX-License-Identifier: GPL-3.0-or-later */
/* A run folder from elsewhere, opened for reading and, when the input says so, to continue it. Rows
 * that are read must be those that were written: each has a checksum. Inputs: ledgers.h. */
#include "ledgers.h"

static fuzz_ledger good;

static void forget(void)
{
    free(good.bytes);
}

static sv_status read_rows(sv_context *context, sv_run *run, bool others)
{
    sv_ensemble ensemble = {0};
    sv_record record;
    int64_t realisations = 0;
    int32_t points = 0;
    sv_index loaded = 0;
    sv_status status = sv_run_extent(context, run, &realisations, &points);
    if (status == SV_OK)
        status = sv_ensemble_init(context, FUZZ_POINTS, FUZZ_ROWS + 1, 2, &ensemble);
    if (status == SV_OK)
        status = sv_run_load(context, run, &ensemble, &loaded);
    for (int32_t point = 0; status == SV_OK && !others && point < FUZZ_POINTS; point++)
        for (int64_t k = 0; k <= FUZZ_ROWS; k++)
            if (sv_ensemble_get(&ensemble, point, k, &record))
                fuzz_check_record(&record);
    sv_ensemble_free(context, &ensemble);
    return status;
}

static void check_answer(const sv_context *context, sv_status status)
{
    fuzz_require(status == SV_OK || status == SV_STORAGE || status == SV_OTHER_RUN ||
                     status == SV_NO_MEMORY,
                 "ended with \"%s\": %s", sv_status_text(status), context->error.message);
    fuzz_require(status == SV_OK || context->error.message[0] != '\0', "refused without a word");
}

int LLVMFuzzerTestOneInput(const uint8_t *data, size_t size)
{
    sv_context *context = fuzz_begin();
    sv_run *run = NULL;
    if (good.bytes == NULL)
        atexit(forget);
    fuzz_ledger_make(context, &good, "run", 0, FUZZ_ROWS);
    fuzz_ledger_restore(&good);
    const fuzz_edits edits = fuzz_ledger_edit(context, &good, data, size);
    sv_status status = sv_run_open_read(context, good.folder, &run);
    if (status == SV_OK)
        status = read_rows(context, run, edits.others);
    check_answer(context, status);
    sv_run_close(context, run);
    run = NULL;
    if (edits.write) {
        const sv_run_identity who = fuzz_identity();
        status = sv_run_open(context, good.folder, &who, false, &run);
        if (status == SV_OK)
            status = read_rows(context, run, edits.others);
        check_answer(context, status);
        sv_run_close(context, run);
    }
    fuzz_end();
    return 0;
}
