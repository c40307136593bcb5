/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The table of commands, and the two that only talk about the program itself. */
#include "program_internal.h"

#include <gnu/libc-version.h>
#include <limits.h>
#include <sched.h>
#include <string.h>

#define SHEET_OPTIONS "nsSqvCJ"

static const command commands[] = {
    {"check", "SHEET", "validates a sheet, prints it resolved, forecasts time and memory",
     SHEET_OPTIONS "j", 1, 1, run_check},
    {"draw", "SHEET -o FIGURE", "one realisation of the sample as a figure, and its inventory",
     SHEET_OPTIONS "ko", 1, 1, run_draw},
    {"map", "SHEET", "one realisation: the local Chern marker site by site",
     SHEET_OPTIONS "kojVBMWPF", 1, 1, run_map},
    {"spectrum", "SHEET", "states below E_F, gap, states next to it, density of states",
     SHEET_OPTIONS "koVF", 1, 1, run_spectrum},
    {"average", "SHEET -o RUN", "the ensemble and its sweep; continues an existing run",
     SHEET_OPTIONS "ojPDFTA", 1, 1, run_average},
    {"merge", "RUN SHARD...", "joins the folders of tasks in one run; repeatable, in any order",
     "jqvCJP", 2, INT_MAX, run_merge},
    {"tolerance", "SHEET -o RUN", "the largest disorder that still meets a stated criterion",
     SHEET_OPTIONS "ojPFT", 1, 1, run_tolerance},
    {"plateau", "SHEET -o RUN", "a marker against the Fermi energy and temperature",
     SHEET_OPTIONS "ojPFT", 1, 1, run_plateau},
    {"report", "RUN", "figures of a finished or unfinished run", "okjqvCJP", 1, 1, run_report},
    {"export", "SHEET|RUN",
     "writes the Hamiltonian and the sites of one realisation, or the site maps of a run",
     SHEET_OPTIONS "kHLFm", 1, 1, run_export},
    {"info", "", "versions, BLAS, arithmetic kernel, threads", "J", 0, 0, run_info},
    {"help", "[COMMAND|keys|presets]",
     "help on a command, the keys of a sheet, or material presets", "", 0, 1, run_help},
};

const command *command_table(int *ret_count)
{
    *ret_count = (int)(sizeof commands / sizeof commands[0]);
    return commands;
}

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

int run_info(sv_context *context, const options *o)
{
    (void)context;
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

int run_help(sv_context *context, const options *o)
{
    int count;
    if (o->n_files == 0) {
        print_help(NULL, stdout);
        return 0;
    }
    if (strcmp(o->files[0], "keys") == 0) {
        sv_kind kinds[SV_MAX_MARKERS];
        const sv_marker *markers = sv_marker_table(&count);
        for (int k = 0; k < count; k++)
            kinds[k] = markers[k].kind;
        sv_sheet_print_keys(kinds, count, stdout);
        return 0;
    }
    if (strcmp(o->files[0], "presets") == 0) {
        sv_status status = presets_print(context);
        return status == SV_OK ? 0 : fail_exit(context, status);
    }
    const command *table = command_table(&count);
    for (int k = 0; k < count; k++) {
        if (strcmp(table[k].name, o->files[0]) != 0)
            continue;
        print_help(&table[k], stdout);
        return 0;
    }
    char clean[200];
    sv_text_clean(o->files[0], clean, sizeof clean);
    fprintf(stderr, "selvedge: error: no help on \"%s\"\n", clean);
    return sv_status_exit_code(SV_USAGE);
}
