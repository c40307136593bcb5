/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The table of commands, and help on them. */
#include "program_internal.h"

#include <limits.h>
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
    {"info", "[RUN]", "versions, BLAS, kernel, threads; or history, health and cost of a run", "J",
     0, 1, run_info},
    {"help", "[COMMAND|keys|presets]",
     "help on a command, the keys of a sheet, or material presets", "", 0, 1, run_help},
};

const command *command_table(int *ret_count)
{
    *ret_count = (int)(sizeof commands / sizeof commands[0]);
    return commands;
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
