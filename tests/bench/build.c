/* SPDX-License-Identifier: GPL-3.0-or-later */
/*
 * How long a large disordered sample takes to be drawn and built, and what memory: vacancies, a
 * correlated potential and rough edges on a honeycomb flake. Run by `scripts/benchmark build`.
 */
#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <sys/resource.h>
#include <time.h>

#include "selvedge/sample.h"

static double now(void)
{
    struct timespec t;
    clock_gettime(CLOCK_MONOTONIC, &t);
    return (double)t.tv_sec + 1e-9 * (double)t.tv_nsec;
}

static sv_status make_model(sv_context *context, sv_model *model)
{
    int count;
    const sv_kind *kinds = sv_model_kinds(&count);
    /* haldane: t1, t2, phi, mass */
    const sv_value values[4] = {{.real = {1.0}}, {.real = {0.2}}, {.real = {M_PI / 2}}, {0}};
    return sv_model_make(context, &kinds[0], values, model);
}

int main(int argc, char **argv)
{
    int64_t side = (int64_t)ceil(sqrt(0.5 * (argc > 1 ? atof(argv[1]) : 1e6)));
    sv_context context;
    sv_model model = {0};
    sv_flake flake = {0};
    sv_sample sample = {0};
    sv_flake_spec spec = {
        .shape = SV_SHAPE_PARALLELOGRAM, .has_cells = true, .cells = {side, side}};
    const sv_disorder disorder[3] = {
        {.name = "vac", .type = SV_DISORDER_VACANCIES, .on = -1, .has_share = true, .share = 0.02},
        {.name = "pot",
         .type = SV_DISORDER_ONSITE,
         .on = -1,
         .distribution = SV_CORRELATED,
         .width = 0.2,
         .length = 5.0},
        {.name = "rim", .type = SV_DISORDER_ROUGHNESS, .on = -1, .amplitude = 10.0, .length = 8.0}};
    struct rusage usage;
    sv_context_init(&context);
    sv_status status = make_model(&context, &model);
    double start = now(), flake_done = start;
    if (status == SV_OK)
        status = sv_flake_make(&context, &model, &spec, &flake);
    flake_done = now();
    if (status == SV_OK)
        status = sv_sample_draw(&context, &flake, disorder, 3, 1, 0, &sample);
    double end = now();
    if (status != SV_OK) {
        fprintf(stderr, "%s\n", context.error.message);
        return sv_status_exit_code(status);
    }
    getrusage(RUSAGE_SELF, &usage);
    printf("%lld sites, %lld left: flake %.2f s, disorder and Hamiltonian %.2f s, peak memory %.2f "
           "GB\n",
           (long long)flake.n_sites, (long long)sample.n, flake_done - start, end - flake_done,
           (double)usage.ru_maxrss / 1048576.0);
    sv_sample_free(&context, &sample);
    sv_flake_free(&context, &flake);
    sv_model_free(&context, &model);
    return 0;
}
