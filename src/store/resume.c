/* SPDX-License-Identifier: GPL-3.0-or-later */
/* A run that is there: is it complete, is it the same, may it go on? */
#include <stdio.h>
#include <string.h>
#include <sys/stat.h>

#include "store_internal.h"

enum { SHEET_LIMIT = 1 << 24 };

/* Text of the sheet in the folder; *ret_text stays NULL when there is none or it is empty. */
static sv_status read_sheet(sv_context *context, const sv_run *run, char **ret_text)
{
    char path[SV_PATH_SIZE];
    struct stat info;
    sv_status status = sv_run_path(context, run, SV_SHEET_NAME, path, sizeof path);
    if (status != SV_OK || lstat(path, &info) != 0 || info.st_size == 0)
        return status;
    if (!S_ISREG(info.st_mode))
        return SV_FAIL(context, SV_STORAGE, "%s is a link or no regular file", path);
    size_t size;
    char *text = NULL;
    status = sv_read_file(context, path, SHEET_LIMIT, &text, &size);
    if (status == SV_INVALID_INPUT)
        return SV_FAIL(context, SV_STORAGE, "cannot read %s", path);
    if (status != SV_OK)
        return status;
    *ret_text = text;
    return SV_OK;
}

/* A torn sheet is a beginning of the one the ledger knows. */
static bool is_complete(const sv_run *run, const char *sheet)
{
    const char *whole = sv_run_meta(run, "sheet");
    const size_t length = strlen(sheet);
    return whole == NULL || strncmp(sheet, whole, length) != 0 || strlen(whole) == length;
}

static sv_status check_shape(sv_context *context, const sv_run *run,
                             const sv_run_identity *identity)
{
    bool same = identity->markers == NULL || run->n_markers < 0 ||
                (run->n_markers == identity->n_markers && run->n_points == identity->n_points);
    for (int i = 0; same && identity->markers != NULL && i < run->n_markers; i++)
        same = strcmp(run->markers[i], identity->markers[i]) == 0;
    if (same)
        return SV_OK;
    return SV_FAIL(context, SV_OTHER_RUN,
                   "%s keeps %ld points of the markers \"%.200s\"; this sheet has others, so the "
                   "rows cannot be continued even with --force",
                   run->folder, (long)run->n_points, sv_run_meta(run, "markers"));
}

static sv_status force_identity(sv_context *context, sv_run *run, const sv_run_identity *identity,
                                const char *difference)
{
    char note[700], digest[65];
    const char *old_digest = sv_run_meta(run, "identity_digest");
    sv_status status = check_shape(context, run, identity);
    if (status != SV_OK)
        return status;
    sv_identity_digest(context, identity, digest);
    snprintf(note, sizeof note, "forced from %.64s to %s: %s",
             old_digest == NULL ? "unknown" : old_digest, digest, difference);
    status = sv_run_event(context, run, "identity change", note);
    if (status == SV_OK)
        status = sv_copy_inputs(context, run->folder, identity->inputs, identity->n_inputs);
    if (status == SV_OK)
        sv_log(context, SV_LOG_WARNING, "continuing %s under another identity: %s", run->folder,
               difference);
    return status;
}

/* Rows of another sheet answer another question: they are kept aside and a new ledger begins. */
static sv_status force_sheet(sv_context *context, sv_run *run, const sv_run_identity *identity,
                             const char *difference)
{
    char note[700], digest[65], old_digest[65];
    const char *before = sv_run_meta(run, "identity_digest");
    snprintf(old_digest, sizeof old_digest, "%.64s", before == NULL ? "unknown" : before);
    sv_identity_digest(context, identity, digest);
    snprintf(note, sizeof note, "forced from %s to %s: %s", old_digest, digest, difference);
    sv_status status = sv_session_start(context, run, identity);
    if (status == SV_OK)
        status = sv_run_event(context, run, "identity change", note);
    if (status == SV_OK)
        sv_log(context, SV_LOG_WARNING, "%s starts over under another sheet: %s", run->folder,
               difference);
    return status;
}

static bool same_sheet(const sv_run *run, const sv_run_identity *identity)
{
    const char *before = sv_run_meta(run, "identity");
    return before != NULL && strcmp(before, identity->identity) == 0;
}

/* The part of a task holds what is that task's and nothing else. */
static sv_status check_task(sv_context *context, const sv_run *run, const sv_run_identity *identity)
{
    int32_t task, tasks;
    sv_run_task(run, &task, &tasks);
    if (task == identity->task && tasks == identity->tasks)
        return SV_OK;
    if (tasks == 0)
        return SV_FAIL(context, SV_OTHER_RUN,
                       "%s holds a whole run, not the part of a task; give each task a folder of "
                       "its own",
                       run->folder);
    if (identity->tasks == 0)
        return SV_FAIL(context, SV_OTHER_RUN,
                       "%s holds the part of task %ld of %ld; continue it with --task %ld/%ld, or "
                       "join the parts in another folder with merge",
                       run->folder, (long)task, (long)tasks, (long)task, (long)tasks);
    return SV_FAIL(context, SV_OTHER_RUN,
                   "%s holds the part of task %ld of %ld, not of task %ld of %ld; give each task a "
                   "folder of its own",
                   run->folder, (long)task, (long)tasks, (long)identity->task,
                   (long)identity->tasks);
}

static sv_status resume(sv_context *context, sv_run *run, const sv_run_identity *identity,
                        bool force)
{
    char digest[65], difference[500];
    const char *old_digest = sv_run_meta(run, "identity_digest");
    sv_identity_digest(context, identity, digest);
    sv_status status = SV_OK;
    if (same_sheet(run, identity) && (status = check_task(context, run, identity)) != SV_OK)
        return status;
    if (old_digest == NULL || strcmp(digest, old_digest) != 0) {
        sv_identity_difference(run, identity, difference, sizeof difference);
        if (!force)
            return SV_FAIL(context, SV_OTHER_RUN,
                           "%s holds another run: %s; choose another folder, or --force to go on "
                           "here and record the change",
                           run->folder, difference);
        if (!same_sheet(run, identity))
            return force_sheet(context, run, identity, difference);
        status = force_identity(context, run, identity, difference);
    }
    /* The sheet may call the same file by another name now. */
    if (status == SV_OK)
        status = sv_copy_inputs(context, run->folder, identity->inputs, identity->n_inputs);
    if (status == SV_OK)
        status = sv_session_begin(context, run, identity, "continue", false);
    if (status == SV_OK)
        status = sv_session_write_sheet(context, run, identity);
    return status;
}

/* Decides under the lock whether the run starts or goes on. */
sv_status sv_session_start_or_resume(sv_context *context, sv_run *run,
                                     const sv_run_identity *identity, bool force)
{
    char *sheet = NULL;
    sv_status status = read_sheet(context, run, &sheet);
    if (status != SV_OK)
        return status;
    if (sheet == NULL)
        return sv_session_start(context, run, identity);
    status = sv_ledger_open(context, run);
    if (status == SV_OK)
        status = sv_meta_load(context, run);
    if (status == SV_OK)
        status = sv_meta_read_shape(context, run);
    if (status == SV_OK)
        status = is_complete(run, sheet) ? resume(context, run, identity, force)
                                         : sv_session_start(context, run, identity);
    sv_give(context, sheet);
    return status;
}

/* A reader wants the sheet the rows were made with. */
sv_status sv_session_check_sheet(sv_context *context, const sv_run *run)
{
    char *sheet = NULL;
    sv_status status = read_sheet(context, run, &sheet);
    if (status != SV_OK)
        return status;
    const char *whole = sv_run_meta(run, "sheet");
    if (sheet == NULL)
        status = SV_FAIL(context, SV_STORAGE, "%s is no complete run: %s is missing or empty",
                         run->folder, SV_SHEET_NAME);
    else if (whole == NULL || strcmp(sheet, whole) != 0)
        status = SV_FAIL(context, SV_STORAGE,
                         "%s/%s is not the sheet the ledger was made with: it was changed since",
                         run->folder, SV_SHEET_NAME);
    sv_give(context, sheet);
    return status;
}
