/* SPDX-License-Identifier: GPL-3.0-or-later */
/* selvedge export: the Hamiltonian and the sites of one realisation, for anyone to recompute. */
#include "program_internal.h"

#include <string.h>
#include <unistd.h>

/* The flake with the boundary the sheet asks for, not the copy a marker would use. */
static sv_status export_one(session *s)
{
    sv_context *context = s->context;
    const options *o = s->options;
    const sv_setup *setup = &s->points[0].setup;
    sv_flake flake = {0};
    sv_sample sample = {0};
    sv_status status = sv_flake_make(context, &setup->model, &setup->flake, &flake);
    if (status == SV_OK)
        status = sv_sample_draw(context, &flake, setup->disorder, setup->n_disorder, setup->seed,
                                o->realisation, &sample);
    if (status == SV_OK && o->hamiltonian != NULL)
        status = sv_sample_write_matrix(context, &sample, o->hamiltonian);
    if (status == SV_OK && o->sites != NULL)
        status = sv_sample_write_sites(context, &sample, o->sites, NULL, NULL);
    if (status == SV_OK && !o->quiet)
        fprintf(stderr, "selvedge: %lld sites, %lld vacancies, realisation %lld\n",
                (long long)sample.n, (long long)sample.inventory.vacancies,
                (long long)o->realisation);
    sv_sample_free(context, &sample);
    sv_flake_free(context, &flake);
    return status;
}

/* The maps of a run, where the other exports are of a sheet. */
static int export_maps(sv_context *context, const options *o)
{
    session s = {0};
    sv_run *run = NULL;
    sv_ensemble ensemble = {0};
    sv_result result = {0};
    sv_status status = may_write(context, o, o->maps);
    if (status == SV_OK)
        status = report_open(context, o, &s, &run);
    if (status == SV_OK)
        status = report_load(&s, run, &ensemble, &result);
    if (status == SV_OK)
        status = site_maps_write(&s, run, &result, o->maps);
    result_free(context, &result);
    sv_ensemble_free(context, &ensemble);
    session_close(&s);
    sv_run_close(context, run);
    return status == SV_OK ? 0 : fail_exit(context, status);
}

int run_export(sv_context *context, const options *o)
{
    session s = {0};
    if (o->hamiltonian == NULL && o->sites == NULL && o->maps == NULL) {
        fprintf(stderr, "selvedge: error: nothing to export\n"
                        "hint: give --hamiltonian FILE, --sites FILE, or both; --maps FILE of a "
                        "run folder\n");
        return sv_status_exit_code(SV_USAGE);
    }
    if (o->maps != NULL && (o->hamiltonian != NULL || o->sites != NULL)) {
        fprintf(stderr, "selvedge: error: --maps is of a run folder, --hamiltonian and --sites are "
                        "of a sheet\n");
        return sv_status_exit_code(SV_USAGE);
    }
    if (o->maps != NULL)
        return export_maps(context, o);
    if (o->hamiltonian != NULL && o->sites != NULL && strcmp(o->hamiltonian, o->sites) == 0) {
        fprintf(stderr, "selvedge: error: --hamiltonian and --sites name the same file\n");
        return sv_status_exit_code(SV_USAGE);
    }
    sv_status status = may_write(context, o, o->hamiltonian);
    if (status == SV_OK)
        status = may_write(context, o, o->sites);
    if (status == SV_OK)
        status = session_open(context, o, o->files[0], false, false, &s);
    if (status == SV_OK)
        status = export_one(&s);
    session_close(&s);
    return status == SV_OK ? 0 : fail_exit(context, status);
}
