/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Cholesky factors of squares of Hamiltonians against dense arithmetic, and refusals. */
#include "fixtures.h"

#include <stdlib.h>

typedef struct subject {
    sv_model model;
    sv_flake flake;
    sv_sample sample;
    sv_index n;
} subject;

static subject make(int side)
{
    subject s = {.model = fixture_haldane(0.2, 1.2, 0.1)};
    sv_flake_spec spec = fixture_cells(&s.model, side, side, false);
    sv_disorder d = {.name = "pot", .type = SV_DISORDER_ONSITE, .on = -1, .width = 2.0};
    s.flake = fixture_flake(&s.model, &spec);
    CHECK_OK(sv_sample_draw(test_context(), &s.flake, &d, 1, 3, 1, &s.sample));
    s.n = s.sample.n;
    return s;
}

static void release(subject *s)
{
    sv_sample_free(test_context(), &s->sample);
    sv_flake_free(test_context(), &s->flake);
    sv_model_free(test_context(), &s->model);
}

static sv_complex *dense_of(const sv_sparse *a)
{
    sv_complex *dense = NULL;
    CHECK_OK(sv_take(test_context(), a->n * a->n, sizeof *dense, &dense));
    sv_sparse_to_dense(a, dense);
    return dense;
}

SV_TEST(squares_are_those_of_dense_arithmetic)
{
    subject s = make(5);
    sv_sparse square = {0};
    const double shift = 0.37, scale = 2.5;
    CHECK_OK(sv_sparse_square(test_context(), &s.sample.hamiltonian, shift, scale, &square));
    CHECK_OK(sv_sparse_check(test_context(), &square));
    sv_complex *h = dense_of(&s.sample.hamiltonian), *found = dense_of(&square);
    for (sv_index k = 0; k < s.n; k++)
        h[k + k * s.n] -= shift;
    double worst = 0.0;
    for (sv_index i = 0; i < s.n; i++)
        for (sv_index j = 0; j < s.n; j++) {
            sv_complex sum = 0.0;
            for (sv_index k = 0; k < s.n; k++)
                sum += h[i + k * s.n] * h[k + j * s.n];
            worst = fmax(worst, cabs(sum / (scale * scale) - found[i + j * s.n]));
        }
    CHECK(worst < 1e-14);
    sv_give(test_context(), h);
    sv_give(test_context(), found);
    sv_sparse_free(test_context(), &square);
    release(&s);
}

/* Largest |(S + shift) x − b| over columns of known b. */
static double worst_residual(const sv_sparse *square, double shift, sv_definite *d, int slot,
                             sv_index columns)
{
    sv_index n = square->n;
    sv_complex *x = NULL;
    double worst = 0.0;
    CHECK_OK(sv_take(test_context(), (columns + 1) * n, sizeof *x, &x));
    sv_complex *back = x + columns * n;
    for (sv_index e = 0; e < columns * n; e++)
        x[e] = CMPLX(sin(0.3 * (double)e), cos(1.1 * (double)e));
    CHECK_OK(sv_definite_solve(test_context(), d, slot, columns, x));
    sv_complex *dense = dense_of(square);
    for (sv_index c = 0; c < columns; c++) {
        for (sv_index i = 0; i < n; i++) {
            back[i] = shift * x[i + c * n];
            for (sv_index k = 0; k < n; k++)
                back[i] += dense[i + k * n] * x[k + c * n];
        }
        for (sv_index i = 0; i < n; i++) {
            double e = (double)(i + c * n);
            worst = fmax(worst, cabs(back[i] - CMPLX(sin(0.3 * e), cos(1.1 * e))));
        }
    }
    sv_give(test_context(), dense);
    sv_give(test_context(), x);
    return worst;
}

/* Several factors live side by side and can be replaced; blocks of any width. */
SV_TEST(solutions_satisfy_the_dense_equations)
{
    subject s = make(6);
    sv_sparse square = {0};
    sv_definite *d = NULL;
    sv_context *c = test_context();
    CHECK_OK(sv_sparse_square(c, &s.sample.hamiltonian, 0.1, 4.0, &square));
    CHECK_OK(sv_definite_make(c, &square, 2, &d));
    CHECK(sv_definite_bytes(d) > 16.0 * (double)s.n);
    CHECK_OK(sv_definite_factor(c, d, 0, 0.5));
    CHECK_OK(sv_definite_factor(c, d, 1, 1e-4));
    CHECK(worst_residual(&square, 0.5, d, 0, 16) < 1e-13);
    CHECK(worst_residual(&square, 1e-4, d, 1, 3) < 1e-11);
    CHECK(worst_residual(&square, 0.5, d, 0, 1) < 1e-13);
    CHECK(worst_residual(&square, 0.5, d, 1, 1) > 1e-3); /* the other factor is another */
    CHECK_OK(sv_definite_factor(c, d, 0, 2.0));
    CHECK(worst_residual(&square, 2.0, d, 0, 5) < 1e-13);
    sv_complex none = 3.0;
    CHECK_OK(sv_definite_solve(c, d, 0, 0, &none));
    CHECK(none == 3.0);
    sv_definite_free(c, d);
    sv_sparse_free(c, &square);
    release(&s);
}

SV_TEST(indefinite_sums_and_empty_slots_are_refused)
{
    subject s = make(4);
    sv_definite *d = NULL;
    sv_context *c = test_context();
    sv_complex *x = NULL;
    const sv_sparse *h = &s.sample.hamiltonian;
    CHECK_OK(sv_take(c, s.n, sizeof *x, &x));
    CHECK_STATUS(SV_INVALID_INPUT, sv_definite_make(c, h, 0, &d));
    CHECK_STATUS(SV_INVALID_INPUT, sv_definite_make(c, &(sv_sparse){0}, 1, &d));
    CHECK(d == NULL);
    CHECK_OK(sv_definite_make(c, h, 1, &d));
    CHECK_STATUS(SV_INVALID_INPUT, sv_definite_solve(c, d, 0, 1, x));
    CHECK_STATUS(SV_INVALID_INPUT, sv_definite_solve(c, d, 1, 1, x));
    CHECK_STATUS(SV_INVALID_INPUT, sv_definite_factor(c, d, -1, 1.0));
    double bound = sv_sparse_norm_bound(h);
    CHECK_OK(sv_definite_factor(c, d, 0, 1.01 * bound)); /* Gershgorin: definite */
    CHECK_OK(sv_definite_solve(c, d, 0, 1, x));
    CHECK_STATUS(SV_NUMERICAL, sv_definite_factor(c, d, 0, 0.1)); /* levels on both sides */
    CHECK_STATUS(SV_INVALID_INPUT, sv_definite_solve(c, d, 0, 1, x));
    CHECK_OK(sv_definite_factor(c, d, 0, 1.01 * bound));
    sv_definite_free(c, d);
    sv_definite_free(c, NULL);
    sv_give(c, x);
    release(&s);
}
