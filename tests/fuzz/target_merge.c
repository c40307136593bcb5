/* SPDX-License-Identifier: GPL-3.0-or-later */
/* A part of a run from elsewhere, merged into a good run. Whatever the part holds, the rows of the
 * run stay, and no row is added that the part did not hold. Inputs: ledgers.h, for the part. */
#include "ledgers.h"

static fuzz_ledger run_ledger, part;

static void forget(void)
{
    free(run_ledger.bytes);
    free(part.bytes);
}

/* The rows 0 and 1 are the run's own; row 2 may have come from the part. */
static void check_run(sv_context *context, sv_status merged, bool others, int64_t added)
{
    sv_ensemble ensemble = {0};
    sv_record record;
    sv_run *run = NULL;
    sv_index loaded = 0;
    sv_status status = sv_run_open_read(context, run_ledger.folder, &run);
    if (status == SV_OK)
        status = sv_ensemble_init(context, FUZZ_POINTS, FUZZ_ROWS + 1, 2, &ensemble);
    if (status == SV_OK)
        status = sv_run_load(context, run, &ensemble, &loaded);
    fuzz_require(status == SV_OK || others, "the run cannot be read any more: %s",
                 context->error.message);
    for (int32_t point = 0; status == SV_OK && point < FUZZ_POINTS; point++)
        for (int64_t k = 0; k <= FUZZ_ROWS; k++) {
            const bool there = sv_ensemble_get(&ensemble, point, k, &record);
            fuzz_require(there || k == FUZZ_ROWS, "row %lld of point %d is gone", (long long)k,
                         point);
            fuzz_require(!there || k < FUZZ_ROWS || (merged == SV_OK && added > 0),
                         "row %lld of point %d was added by nobody", (long long)k, point);
            if (there && !(others && k == FUZZ_ROWS))
                fuzz_check_record(&record);
        }
    sv_ensemble_free(context, &ensemble);
    sv_run_close(context, run);
}

static void check_answer(const sv_context *context, sv_status status)
{
    fuzz_require(status == SV_OK || status == SV_STORAGE || status == SV_OTHER_RUN ||
                     status == SV_UNDECIDED || status == SV_NO_MEMORY,
                 "ended with \"%s\": %s", sv_status_text(status), context->error.message);
    fuzz_require(status == SV_OK || context->error.message[0] != '\0', "refused without a word");
}

int LLVMFuzzerTestOneInput(const uint8_t *data, size_t size)
{
    sv_context *context = fuzz_begin();
    const char *folders[2];
    const sv_run_identity who = fuzz_identity();
    sv_merge_survey survey = {0};
    sv_run *run = NULL;
    int64_t added = 0, present = 0;
    int32_t task = 0, tasks = 0;
    if (part.bytes == NULL)
        atexit(forget);
    fuzz_ledger_make(context, &run_ledger, "run", 0, FUZZ_ROWS);
    fuzz_ledger_make(context, &part, "part", 1, FUZZ_ROWS + 1);
    fuzz_ledger_restore(&run_ledger);
    fuzz_ledger_restore(&part);
    const fuzz_edits edits = fuzz_ledger_edit(context, &part, data, size);
    folders[0] = run_ledger.folder;
    folders[1] = part.folder;
    sv_status status = sv_run_survey(context, folders, 2, &survey);
    check_answer(context, status);
    fuzz_require(status != SV_OK || survey.distinct <= survey.rows,
                 "%lld rows, %lld of them distinct", (long long)survey.rows,
                 (long long)survey.distinct);
    /* Also when the survey refused: the part might have changed in between. */
    if (status == SV_OK || edits.write) {
        status = sv_run_open(context, run_ledger.folder, &who, false, &run);
        fuzz_require(status == SV_OK, "the run does not open: %s", context->error.message);
        status = sv_run_merge(context, run, folders + 1, 1, &added, &present);
        check_answer(context, status);
        sv_run_task(run, &task, &tasks);
        fuzz_require(tasks == 0, "the run became task %d of %d", task, tasks);
        sv_run_close(context, run);
        check_run(context, status, edits.others, added);
    }
    fuzz_end();
    return 0;
}
