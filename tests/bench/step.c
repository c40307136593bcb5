/* SPDX-License-Identifier: GPL-3.0-or-later */
/*
 * Cost of one Chebyshev step of a whole flake, per site and column, in double and in single
 * precision, beside the limits of the machine measured in the same run. One thread.
 * Run by `scripts/benchmark step`. Arguments: sides of flakes in honeycomb cells.
 */
#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <time.h>

#include "selvedge/linalg.h"
#include "selvedge/sample.h"

enum { DEGREE = 33, REPEATS = 3 };

static double now(void)
{
    struct timespec t;
    clock_gettime(CLOCK_THREAD_CPUTIME_ID, &t);
    return (double)t.tv_sec + 1e-9 * (double)t.tv_nsec;
}

/* ------------------------------------------------------------------ limits */

/* Bytes per nanosecond of a = b + s c far outside the cache, the fetch of a included. */
static double memory_rate(sv_context *context)
{
    const sv_index n = (sv_index)1 << 24;
    double *a = NULL, best = (double)INFINITY;
    if (sv_take(context, 3 * n, sizeof *a, &a) != SV_OK)
        return (double)NAN;
    double *b = a + n, *c = b + n;
    for (int repeat = 0; repeat <= REPEATS; repeat++) {
        double start = now();
        for (sv_index k = 0; k < n; k++)
            a[k] = b[k] + 0.5 * c[k];
        __asm__ volatile("" : : "r"(a) : "memory");
        if (repeat > 0)
            best = fmin(best, now() - start);
    }
    sv_give(context, a);
    return 32.0 * (double)n / best * 1e-9;
}

typedef double wide __attribute__((vector_size(64), aligned(64)));

/* Multiply–adds of doubles per nanosecond with one operand from the first cache: what a row of the
 * matrix does. */
#define ARITHMETIC(name, isa)                                                                      \
    __attribute__((target(isa), optimize("fp-contract=fast"))) static double name(const wide *x)   \
    {                                                                                              \
        wide sums[8] = {{0}};                                                                      \
        const int rounds = 200000, length = 128;                                                   \
        double start = now();                                                                      \
        for (int round = 0; round < rounds; round++) {                                             \
            for (int k = 0; k < length; k += 8)                                                    \
                for (int l = 0; l < 8; l++)                                                        \
                    sums[l] += x[k + l] * 0.999;                                                   \
            __asm__ volatile("" : : "r"(x) : "memory");                                            \
        }                                                                                          \
        double seconds = now() - start, total = 0.0;                                               \
        for (int l = 0; l < 8; l++)                                                                \
            total += sums[l][0];                                                                   \
        return total < -1.0 ? (double)NAN : 8.0 * rounds * length / seconds * 1e-9;                \
    }
ARITHMETIC(arithmetic_avx512, "avx512f,fma,prefer-vector-width=512")
ARITHMETIC(arithmetic_avx2, "avx2,fma")
ARITHMETIC(arithmetic_plain, "default")

static double arithmetic_rate(void)
{
    static const wide x[128] = {{0.0}};
    switch (sv_panel_best_kernel()) {
    case SV_PANEL_AVX512:
        return arithmetic_avx512(x);
    case SV_PANEL_AVX2:
        return arithmetic_avx2(x);
    default:
        return arithmetic_plain(x);
    }
}

/* ------------------------------------------------------------------- steps */

static sv_status build_model(sv_context *context, sv_model *model)
{
    const double a1[2] = {1, 0}, a2[2] = {0.5, sqrt(0.75)}, third = 1.0 / 3.0;
    sv_status status = sv_model_begin(context, "bench", a1, a2, model);
    if (status == SV_OK)
        status = sv_model_add_orbital(context, model, "A", 0, 0, 0);
    if (status == SV_OK)
        status = sv_model_add_orbital(context, model, "B", 1.5 * third, third * sqrt(0.75), 0);
    const struct {
        int from, to, i, j;
        sv_complex amplitude;
    } hops[] = {{0, 1, 0, 0, 1.0},
                {0, 1, -1, 0, 1.0},
                {0, 1, 0, -1, 1.0},
                {0, 0, 1, 0, CMPLX(0, -0.2)},
                {0, 0, -1, 1, CMPLX(0, -0.2)},
                {0, 0, 0, -1, CMPLX(0, -0.2)},
                {1, 1, 1, 0, CMPLX(0, 0.2)},
                {1, 1, -1, 1, CMPLX(0, 0.2)},
                {1, 1, 0, -1, CMPLX(0, 0.2)}};
    for (size_t k = 0; status == SV_OK && k < sizeof hops / sizeof *hops; k++)
        status = sv_model_add_hop(context, model, hops[k].from, hops[k].to, hops[k].i, hops[k].j,
                                  hops[k].amplitude);
    return status == SV_OK ? sv_model_finish(context, model) : status;
}

static sv_status build_matrix(sv_context *context, int side, sv_packed *ret_packed,
                              sv_sparse *ret_matrix)
{
    sv_model model = {0};
    sv_flake flake = {0};
    sv_sample sample = {0};
    sv_flake_spec spec = {
        .shape = SV_SHAPE_PARALLELOGRAM, .has_cells = true, .cells = {side, side}};
    sv_disorder d = {.name = "pot", .type = SV_DISORDER_ONSITE, .on = -1, .width = 1.0};
    sv_status status = build_model(context, &model);
    if (status == SV_OK)
        status = sv_flake_make(context, &model, &spec, &flake);
    if (status == SV_OK)
        status = sv_sample_draw(context, &flake, &d, 1, 1, 0, &sample);
    if (status == SV_OK)
        status = sv_packed_make(context, &sample.hamiltonian, NULL, sample.n, NULL, 0.0, 4.8,
                                ret_packed);
    if (status == SV_OK) {
        *ret_matrix = sample.hamiltonian;
        sample.hamiltonian = (sv_sparse){0};
    }
    sv_sample_free(context, &sample);
    sv_flake_free(context, &flake);
    sv_model_free(context, &model);
    return status == SV_OK ? sv_packed_add_single(context, ret_packed) : status;
}

/* Nanoseconds per site, column and step. */
static double time_steps(const sv_packed *p, bool single, double *panels)
{
    double coefficients[DEGREE + 1], best = (double)INFINITY;
    sv_panel_kernel kernel = sv_panel_best_kernel();
    int columns = single ? SV_PANEL_COLUMNS_SINGLE : SV_PANEL_COLUMNS;
    sv_index size = 2 * SV_PANEL_COLUMNS * p->n, floats = 2 * SV_PANEL_COLUMNS_SINGLE * p->n;
    float *f = (float *)panels;
    for (int k = 0; k <= DEGREE; k++)
        coefficients[k] = k % 2 == 1 ? 0.1 / k : 0.0;
    for (sv_index k = 0; k < floats && single; k++)
        f[k] = (float)(k % 7) - 3.0f;
    for (sv_index k = 0; k < size && !single; k++)
        panels[k] = (double)(k % 7) - 3.0;
    for (int repeat = 0; repeat < REPEATS; repeat++) {
        double start = now();
        if (single)
            sv_panel_polynomial_single(p, coefficients, DEGREE, kernel, f, f + floats,
                                       f + 3 * floats);
        else
            sv_panel_polynomial(p, coefficients, DEGREE, kernel, panels, panels + size,
                                panels + 3 * size);
        best = fmin(best, now() - start);
    }
    return best / ((double)p->n * columns * DEGREE) * 1e9;
}

/* The same for square parts of the flake, as columns of large flakes use them; packing included. */
static sv_status time_parts(sv_context *context, const sv_sparse *h, int side, bool single,
                            double *panels, double *ret_cost)
{
    enum { PARTS = 24, PART = 40 };
    double coefficients[DEGREE + 1], seconds = 0.0, work = 0.0;
    sv_index *rows = NULL;
    int32_t *place = NULL;
    int columns = single ? SV_PANEL_COLUMNS_SINGLE : SV_PANEL_COLUMNS,
        part = side < PART ? side : PART;
    sv_index n = 2 * (sv_index)part * part;
    sv_status status = sv_take(context, n, sizeof *rows, &rows);
    if (status == SV_OK)
        status = sv_take(context, h->n, sizeof *place, &place);
    for (int k = 0; k <= DEGREE; k++)
        coefficients[k] = k % 2 == 1 ? 0.1 / k : 0.0;
    memset(place, 0xff, (size_t)h->n * sizeof *place);
    for (int k = 0; k < PARTS && status == SV_OK; k++) {
        int corner = (int)((sv_index)(side - part) * k / PARTS);
        sv_packed p = {0};
        double start = now();
        for (int i = 0; i < part; i++)
            for (int j = 0; j < 2 * part; j++) {
                rows[2 * i * part + j] = 2 * ((sv_index)(corner + i) * side + corner) + j;
                place[rows[2 * i * part + j]] = 2 * i * part + j;
            }
        status = sv_packed_make(context, h, rows, n, place, 0.0, 4.8, &p);
        if (status == SV_OK)
            status = sv_packed_add_single(context, &p);
        for (sv_index r = 0; r < n; r++)
            place[rows[r]] = -1;
        float *f = (float *)panels;
        sv_index size = 2 * (sv_index)columns * n;
        if (status == SV_OK && single)
            sv_panel_polynomial_single(&p, coefficients, DEGREE, sv_panel_best_kernel(), f,
                                       f + size, f + 3 * size);
        else if (status == SV_OK)
            sv_panel_polynomial(&p, coefficients, DEGREE, sv_panel_best_kernel(), panels,
                                panels + size, panels + 3 * size);
        seconds += now() - start;
        work += (double)n * columns * DEGREE;
        sv_packed_free(context, &p);
    }
    sv_give(context, rows);
    sv_give(context, place);
    *ret_cost = seconds / work * 1e9;
    return status;
}

/* One line of figures per flake, read by the script beside the peer. */
static sv_status measure(sv_context *context, int side, double memory, double arithmetic)
{
    sv_packed p = {0};
    sv_sparse h = {0};
    double *panels = NULL, parts[2] = {0};
    sv_status status = build_matrix(context, side, &p, &h);
    if (status == SV_OK)
        status = sv_take(context, 8 * SV_PANEL_COLUMNS * p.n, sizeof *panels, &panels);
    for (int single = 0; single < 2 && status == SV_OK; single++)
        for (int repeat = 0; repeat < 2 && status == SV_OK; repeat++) { /* the first warms up */
            memset(panels, 0, (size_t)(8 * SV_PANEL_COLUMNS * p.n) * sizeof *panels);
            status = time_parts(context, &h, side, single == 1, panels, &parts[single]);
        }
    if (status == SV_OK) {
        double elements = (double)p.start[3 * p.n] / (double)p.n;
        /* x and t read, t written, the sum read and written every other step; the matrix. */
        double bytes = 4.0 * 16.0 + elements * 20.0 / SV_PANEL_COLUMNS;
        /* Real or imaginary elements: two multiply–adds; recurrence and sum: three. */
        double operations = 2.0 * elements + 3.0;
        printf("{\"sites\": %lld, \"double\": %.4f, \"single\": %.4f, \"parts_double\": %.4f, "
               "\"parts_single\": %.4f, \"streaming_limit\": %.4f, \"arithmetic_limit\": %.4f, "
               "\"memory_rate\": %.2f, \"kernel\": \"%s\"}\n",
               (long long)p.n, time_steps(&p, false, panels), time_steps(&p, true, panels),
               parts[0], parts[1], bytes / memory, operations / arithmetic, memory,
               sv_panel_kernel_name(sv_panel_best_kernel()));
        fflush(stdout);
    }
    sv_give(context, panels);
    sv_sparse_free(context, &h);
    sv_packed_free(context, &p);
    return status;
}

int main(int argc, char **argv)
{
    sv_context context;
    sv_context_init(&context);
    double memory = memory_rate(&context), arithmetic = arithmetic_rate();
    for (int k = 1; k < argc; k++)
        if (measure(&context, atoi(argv[k]), memory, arithmetic) != SV_OK) {
            fprintf(stderr, "side %s failed\n", argv[k]);
            return 1;
        }
    return 0;
}
