/* SPDX-License-Identifier: GPL-3.0-or-later */
/*
 * Compares LAPACK's drivers with sv_dense_eigen() on the task of the dense engine: all energies and
 * the eigenvectors of the occupied half of a disordered flake. Run by `scripts/benchmark drivers`.
 */
#include <lapacke.h>
#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <time.h>

#include "selvedge/linalg.h"
#include "selvedge/sample.h"

enum { REPEATS = 2 };

typedef struct task {
    sv_context context;
    sv_index n, wanted;
    sv_complex *matrix; /* kept */
    sv_complex *work;   /* destroyed by each driver */
    sv_complex *vectors;
    double *values;
} task;

typedef int (*driver)(task *t);

static double now(void)
{
    struct timespec t;
    clock_gettime(CLOCK_MONOTONIC, &t);
    return (double)t.tv_sec + 1e-9 * (double)t.tv_nsec;
}

/* Qi-Wu-Zhang with mass -1 and box disorder: its occupied half is a topological phase. */
static sv_status build_model(sv_context *context, sv_model *model)
{
    const double a1[2] = {1, 0}, a2[2] = {0, 1};
    const sv_complex half_i = CMPLX(0, 0.5);
    sv_status status = sv_model_begin(context, "bench", a1, a2, model);
    if (status == SV_OK)
        status = sv_model_add_orbital(context, model, "a", 0, 0, -1);
    if (status == SV_OK)
        status = sv_model_add_orbital(context, model, "b", 0, 0, 1);
    const struct {
        int from, to, i, j;
        sv_complex amplitude;
    } hops[] = {{0, 0, 1, 0, 0.5}, {1, 1, 1, 0, -0.5}, {0, 1, 1, 0, half_i}, {1, 0, 1, 0, half_i},
                {0, 0, 0, 1, 0.5}, {1, 1, 0, 1, -0.5}, {0, 1, 0, 1, -0.5},   {1, 0, 0, 1, 0.5}};
    for (size_t k = 0; status == SV_OK && k < sizeof hops / sizeof *hops; k++)
        status = sv_model_add_hop(context, model, hops[k].from, hops[k].to, hops[k].i, hops[k].j,
                                  hops[k].amplitude);
    return status == SV_OK ? sv_model_finish(context, model) : status;
}

static sv_status build_matrix(task *t, int64_t length)
{
    sv_model model = {0};
    sv_flake flake = {0};
    sv_sample sample = {0};
    sv_flake_spec spec = {
        .shape = SV_SHAPE_RECTANGLE, .has_cells = true, .cells = {length, length}};
    sv_disorder box = {
        .name = "pot", .type = SV_DISORDER_ONSITE, .on = -1, .width = 1, .distribution = SV_BOX};
    sv_status status = build_model(&t->context, &model);
    if (status == SV_OK)
        status = sv_flake_make(&t->context, &model, &spec, &flake);
    if (status == SV_OK)
        status = sv_sample_draw(&t->context, &flake, &box, 1, 1, 0, &sample);
    if (status == SV_OK) {
        t->n = sample.n;
        t->wanted = sample.n / 2;
        status = sv_take(&t->context, t->n * t->n, sizeof(sv_complex), &t->matrix);
    }
    if (status == SV_OK)
        sv_sparse_to_dense(&sample.hamiltonian, t->matrix);
    sv_sample_free(&t->context, &sample);
    sv_flake_free(&t->context, &flake);
    sv_model_free(&t->context, &model);
    return status;
}

static int run_zheev(task *t)
{
    return LAPACKE_zheev(LAPACK_COL_MAJOR, 'V', 'L', (int)t->n, t->work, (int)t->n, t->values);
}

static int run_zheevd(task *t)
{
    return LAPACKE_zheevd(LAPACK_COL_MAJOR, 'V', 'L', (int)t->n, t->work, (int)t->n, t->values);
}

static int range_zheevr(task *t, char range, int last)
{
    int n = (int)t->n, found = 0;
    int *support = calloc((size_t)n * 2, sizeof *support);
    if (support == NULL)
        return -1;
    int info = LAPACKE_zheevr(LAPACK_COL_MAJOR, 'V', range, 'L', n, t->work, n, 0, 0, 1, last, 0,
                              &found, t->values, t->vectors, n, support);
    free(support);
    return info;
}

static int run_zheevr(task *t)
{
    return range_zheevr(t, 'A', (int)t->n);
}

static int run_zheevr_half(task *t)
{
    return range_zheevr(t, 'I', (int)t->wanted);
}

static int run_zheevx_half(task *t)
{
    int n = (int)t->n, found = 0;
    int *failed = calloc((size_t)n, sizeof *failed);
    if (failed == NULL)
        return -1;
    int info = LAPACKE_zheevx(LAPACK_COL_MAJOR, 'V', 'I', 'L', n, t->work, n, 0, 0, 1,
                              (int)t->wanted, 0, &found, t->values, t->vectors, n, failed);
    free(failed);
    return info;
}

static void lower_half(const double *values, sv_index n, sv_index *first, sv_index *last,
                       void *user)
{
    (void)values, (void)user;
    *first = 0;
    *last = n / 2;
}

static int run_ours(task *t)
{
    sv_index first, last;
    sv_complex *vectors = NULL;
    sv_status status = sv_dense_eigen(&t->context, t->n, t->work, t->values, lower_half, NULL,
                                      &first, &last, &vectors);
    sv_give(&t->context, vectors);
    return (int)status;
}

/* Best of a few runs, in seconds; the lowest energy tells that the answer is the same. */
static int measure(task *t, const char *name, const char *what, driver run)
{
    double best = INFINITY;
    for (int k = 0; k < REPEATS; k++) {
        memcpy(t->work, t->matrix, (size_t)(t->n * t->n) * sizeof(sv_complex));
        double begin = now();
        if (run(t) != 0) {
            printf("%-16s failed\n", name);
            return 1;
        }
        best = fmin(best, now() - begin);
    }
    printf("%-16s %-24s %8.3f s   lowest energy %.12f\n", name, what, best, t->values[0]);
    fflush(stdout);
    return 0;
}

static int compare(task *t)
{
    int failed = 0;
    printf("%lld sites, one thread, best of %d\n", (long long)t->n, REPEATS);
    failed += measure(t, "sv_dense_eigen", "lower half of the vectors", run_ours);
    failed += measure(t, "zheevr", "all vectors", run_zheevr);
    failed += measure(t, "zheevr", "lower half", run_zheevr_half);
    failed += measure(t, "zheevd", "all vectors", run_zheevd);
    failed += measure(t, "zheevx", "lower half", run_zheevx_half);
    failed += measure(t, "zheev", "all vectors", run_zheev);
    return failed;
}

int main(int argc, char **argv)
{
    task t = {0};
    sv_blas_info info;
    int failed = 1;
    int64_t sites = argc > 1 ? strtoll(argv[1], NULL, 10) : 1800;
    sv_context_init(&t.context);
    sv_blas_setup(&info);
    if (sites < 8 || sites > 20000) {
        fprintf(stderr, "usage: bench-drivers [SITES], 8 to 20000\n");
        return 2;
    }
    sv_status status = build_matrix(&t, (int64_t)floor(sqrt((double)sites / 2)));
    if (status == SV_OK)
        status = sv_take(&t.context, t.n * t.n, sizeof(sv_complex), &t.work);
    if (status == SV_OK)
        status = sv_take(&t.context, t.n * t.n, sizeof(sv_complex), &t.vectors);
    if (status == SV_OK)
        status = sv_take(&t.context, t.n, sizeof(double), &t.values);
    if (status == SV_OK)
        failed = compare(&t);
    else
        fprintf(stderr, "bench-drivers: %s\n", t.context.error.message);
    sv_give(&t.context, t.values);
    sv_give(&t.context, t.vectors);
    sv_give(&t.context, t.work);
    sv_give(&t.context, t.matrix);
    return failed != 0;
}
