/* SPDX-License-Identifier: GPL-3.0-or-later */
/* selvedge info: the program itself, or the history of a run, how good it is and what it cost. */
#include "program_internal.h"

#include <gnu/libc-version.h>
#include <sched.h>
#include <string.h>

void kernel_text(const sv_blas_info *blas, char *text, size_t size)
{
    snprintf(text, size, "%s %s %s %s, cholmod %s, glibc %s, panels %s", blas->kind, blas->version,
             blas->threading, blas->kernel, blas->cholmod, gnu_get_libc_version(),
             sv_panel_kernel_name(sv_panel_best_kernel()));
}

static int cores_allowed(void)
{
    cpu_set_t set;
    return sched_getaffinity(0, sizeof set, &set) == 0 ? CPU_COUNT(&set) : 1;
}

static int show_program(const options *o)
{
    sv_blas_info blas;
    sv_blas_setup(&blas);
    if (o->json) {
        printf("{\"selvedge\": 1, \"command\": \"info\", \"version\": \"%s\",\n"
               " \"blas\": \"%s\", \"blas_version\": \"%s\", \"cholmod_version\": \"%s\",\n"
               " \"blas_threading\": \"%s\", \"kernel\": \"%s\",\n"
               " \"panel_kernel\": \"%s\", \"threads_safe\": %s, \"threads\": %d, \"mpi\": %s,\n"
               " \"engines\": [\"dense\", \"chebyshev\", \"rational\"]}\n",
               sv_version(), blas.kind, blas.version, blas.cholmod, blas.threading, blas.kernel,
               sv_panel_kernel_name(sv_panel_best_kernel()), blas.threads_safe ? "true" : "false",
               cores_allowed(), launch_knows_mpi() ? "true" : "false");
        return 0;
    }
    printf("selvedge   %s\n", sv_version());
    printf("BLAS       %s %s, %s, kernel %s%s\n", blas.kind, blas.version, blas.threading,
           blas.kernel,
           blas.threads_safe ? "" : " (wrong results with several threads: one is used)");
    printf("CHOLMOD    %s\n", blas.cholmod);
    printf("threads    %d\n", cores_allowed());
    printf("panels     %s\n", sv_panel_kernel_name(sv_panel_best_kernel()));
    printf("MPI        %s\n", launch_knows_mpi() ? "yes" : "no (built without)");
    printf("engines    dense, chebyshev, rational\n");
    int count;
    const sv_marker *markers = sv_marker_table(&count);
    for (int k = 0; k < count; k++)
        printf("%-10s %-12s %s\n", k ? "" : "markers", markers[k].kind.name, markers[k].kind.doc);
    return 0;
}

static sv_status show_run(sv_context *context, const options *o, sv_run *run)
{
    sv_run_history history = {0};
    sv_run_health health = {0};
    sv_provenance provenance = {
        .folder = o->files[0], .run = run, .history = &history, .health = &health};
    char *json = NULL;
    sv_status status = sv_run_history_read(context, run, &history);
    if (status == SV_OK)
        status = sv_run_health_read(context, run, &health);
    if (status == SV_OK && o->json)
        status = sv_provenance_json(context, &provenance, &json);
    if (status == SV_OK && o->json)
        fputs(json, stdout);
    else if (status == SV_OK)
        sv_provenance_print(&provenance, stdout);
    sv_give(context, json);
    sv_run_health_free(context, &health);
    sv_run_history_free(context, &history);
    return status;
}

int run_info(sv_context *context, const options *o)
{
    sv_run *run = NULL;
    if (o->n_files == 0)
        return show_program(o);
    sv_status status = sv_run_open_read(context, o->files[0], &run);
    if (status == SV_OK)
        status = show_run(context, o, run);
    sv_run_close(context, run);
    return status == SV_OK ? 0 : fail_exit(context, status);
}
