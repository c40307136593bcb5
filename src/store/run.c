/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The run folder: opening and closing. */
#include <errno.h>
#include <stdio.h>
#include <string.h>
#include <sys/stat.h>

#include "store_internal.h"

sv_status sv_run_path(sv_context *context, const sv_run *run, const char *name, char *path,
                      size_t size)
{
    return sv_join_path(context, run->folder, name, path, size);
}

sv_status sv_run_new(sv_context *context, const char *folder, bool writing, sv_run **ret_run)
{
    sv_run *run = NULL;
    sv_status status = sv_take(context, 1, sizeof *run, &run);
    if (status != SV_OK)
        return status;
    run->lock = -1;
    run->n_markers = -1;
    run->writing = writing;
    status = sv_take_text(context, folder, &run->folder);
    if (status != SV_OK) {
        sv_give(context, run);
        return status;
    }
    *ret_run = run;
    return SV_OK;
}

void sv_run_free(sv_context *context, sv_run *run)
{
    sv_ledger_close(run);
    sv_folder_unlock(run->lock);
    sv_meta_free(context, run);
    sv_give(context, run->folder);
    sv_give(context, run);
}

void sv_run_close(sv_context *context, sv_run *run)
{
    if (run == NULL)
        return;
    if (run->writing && run->ledger != NULL && run->session > 0 &&
        sv_run_event(context, run, "end", "") != SV_OK)
        sv_log(context, SV_LOG_WARNING, "%s", context->error.message);
    sv_run_free(context, run);
}

sv_status sv_run_open(sv_context *context, const char *folder, const sv_run_identity *identity,
                      bool force, sv_run **ret_run)
{
    sv_folder_kind kind;
    char foreign[256];
    sv_run *run = NULL;
    sv_status status = sv_make_folder(context, folder);
    if (status == SV_OK)
        status = sv_folder_look(context, folder, &kind, foreign);
    if (status == SV_OK && kind == SV_FOLDER_FOREIGN)
        status = SV_FAIL(context, SV_STORAGE,
                         "%s is not empty and holds no run (it has \"%.100s\"); give a new or an "
                         "empty folder",
                         folder, foreign);
    if (status == SV_OK)
        status = sv_run_new(context, folder, true, &run);
    if (status != SV_OK)
        return status;
    status = sv_folder_lock(context, folder, &run->lock);
    if (status == SV_OK) {
        sv_folder_sweep(folder);
        status = sv_session_start_or_resume(context, run, identity, force);
    }
    if (status == SV_OK)
        *ret_run = run;
    else
        sv_run_free(context, run);
    return status;
}

sv_status sv_run_open_read(sv_context *context, const char *folder, sv_run **ret_run)
{
    sv_run *run = NULL;
    struct stat info;
    if (stat(folder, &info) != 0)
        return SV_FAIL(context, SV_STORAGE, "cannot open the run %s: %s", folder, strerror(errno));
    if (!S_ISDIR(info.st_mode))
        return SV_FAIL(context, SV_STORAGE, "%s is not a folder", folder);
    sv_status status = sv_run_new(context, folder, false, &run);
    if (status != SV_OK)
        return status;
    status = sv_ledger_open_read(context, run);
    if (status == SV_OK)
        status = sv_meta_load(context, run);
    if (status == SV_OK)
        status = sv_meta_read_shape(context, run);
    if (status == SV_OK)
        status = sv_session_check_sheet(context, run);
    if (status == SV_OK)
        *ret_run = run;
    else
        sv_run_free(context, run);
    return status;
}
