/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "fixtures.h"
#include "selvedge/linalg.h"

static sv_sample draw_small(sv_model *model, sv_flake *flake, bool periodic)
{
    sv_sample sample = {0};
    sv_disorder disorder[2] = {
        {.name = "vac", .type = SV_DISORDER_VACANCIES, .on = -1, .has_share = true, .share = 0.1},
        {.name = "pot", .type = SV_DISORDER_ONSITE, .on = -1, .width = 2.0}};
    *model = fixture_haldane(0.3, 0.7, 0.4);
    sv_flake_spec spec = fixture_cells(model, 5, 4, periodic);
    *flake = fixture_flake(model, &spec);
    CHECK_OK(sv_sample_draw(test_context(), flake, disorder, 2, 3, 0, &sample));
    return sample;
}

static void release(sv_model *model, sv_flake *flake, sv_sample *sample)
{
    sv_sample_free(test_context(), sample);
    sv_flake_free(test_context(), flake);
    sv_model_free(test_context(), model);
}

SV_TEST(sparse_product_equals_the_dense_one)
{
    sv_model model;
    sv_flake flake;
    sv_sample s = draw_small(&model, &flake, true);
    sv_index n = s.n;
    sv_complex *block = NULL;
    CHECK_OK(sv_take(test_context(), n * n + 2 * n, sizeof *block, &block));
    sv_complex *dense = block, *x = dense + n * n, *y = x + n;
    sv_sparse_to_dense(&s.hamiltonian, dense);
    for (sv_index k = 0; k < n; k++)
        x[k] = CMPLX(sin(1.0 + (double)k), cos(3.0 * (double)k));
    sv_sparse_apply(&s.hamiltonian, x, y);
    double bound = sv_sparse_norm_bound(&s.hamiltonian), most = 0.0;
    for (sv_index r = 0; r < n; r++) {
        sv_complex sum = 0.0;
        double row = 0.0;
        for (sv_index c = 0; c < n; c++) {
            sum += dense[r + c * n] * x[c];
            row += cabs(dense[r + c * n]);
            CHECK(dense[r + c * n] == conj(dense[c + r * n]));
        }
        CHECK(cabs(sum - y[r]) < 1e-13);
        most = fmax(most, row);
    }
    CHECK_CLOSE(bound, most, 1e-13);
    sv_give(test_context(), block);
    release(&model, &flake, &s);
}

SV_TEST(damage_to_a_matrix_is_noticed)
{
    sv_model model;
    sv_flake flake;
    sv_sample s = draw_small(&model, &flake, false);
    CHECK_OK(sv_sparse_check(test_context(), &s.hamiltonian));
    sv_index k = s.hamiltonian.row_start[2];
    while (s.hamiltonian.column[k] == 2)
        k++;
    sv_complex kept = s.hamiltonian.value[k];
    s.hamiltonian.value[k] += 1e-3;
    CHECK_STATUS(SV_INTERNAL, sv_sparse_check(test_context(), &s.hamiltonian));
    s.hamiltonian.value[k] = NAN;
    CHECK_STATUS(SV_INTERNAL, sv_sparse_check(test_context(), &s.hamiltonian));
    s.hamiltonian.value[k] = kept;
    s.hamiltonian.column[k] = (int32_t)s.n;
    CHECK_STATUS(SV_INTERNAL, sv_sparse_check(test_context(), &s.hamiltonian));
    release(&model, &flake, &s);
    sv_sparse empty = {0};
    sv_sparse_free(test_context(), &empty);
}

static void choose_upper(const double *values, sv_index n, sv_index *first, sv_index *last,
                         void *user)
{
    (void)values, (void)user;
    *first = n / 3;
    *last = n;
}

/* Residuals and orthonormality scaled by n·eps, as LAPACK's own tests do. */
SV_TEST(dense_eigenvectors_have_small_residuals)
{
    sv_model model;
    sv_flake flake;
    sv_sample s = draw_small(&model, &flake, true);
    sv_index n = s.n, first, last;
    sv_complex *a = NULL, *v = NULL, *hv = NULL;
    double *values = NULL;
    CHECK_OK(sv_take(test_context(), n * n, sizeof *a, &a));
    CHECK_OK(sv_take(test_context(), n, sizeof *hv, &hv));
    CHECK_OK(sv_take(test_context(), n, sizeof *values, &values));
    sv_sparse_to_dense(&s.hamiltonian, a);
    CHECK_OK(sv_dense_eigen(test_context(), n, a, values, choose_upper, NULL, &first, &last, &v));
    double unit = (double)n * 2.2e-16, norm = sv_sparse_norm_bound(&s.hamiltonian);
    CHECK(first == n / 3 && last == n);
    for (sv_index c = 0; c < last - first; c++) {
        sv_sparse_apply(&s.hamiltonian, v + c * n, hv);
        double residual = 0.0;
        for (sv_index r = 0; r < n; r++)
            residual = fmax(residual, cabs(hv[r] - values[first + c] * v[r + c * n]));
        CHECK(residual < 10.0 * unit * norm);
        for (sv_index d = 0; d <= c; d++) {
            sv_complex dot = 0.0;
            for (sv_index r = 0; r < n; r++)
                dot += conj(v[r + d * n]) * v[r + c * n];
            CHECK(cabs(dot - (c == d)) < 10.0 * unit);
        }
        CHECK(c == 0 || values[first + c] >= values[first + c - 1]);
    }
    sv_give(test_context(), a);
    sv_give(test_context(), v);
    sv_give(test_context(), hv);
    sv_give(test_context(), values);
    release(&model, &flake, &s);
}

SV_TEST(too_large_a_dense_matrix_is_refused)
{
    sv_index first, last;
    sv_complex *v = NULL;
    CHECK_STATUS(SV_REFUSED, sv_dense_eigen(test_context(), 40000, NULL, NULL, choose_upper, NULL,
                                            &first, &last, &v));
}

SV_TEST(blas_is_known_and_single_threaded)
{
    sv_blas_info info;
    sv_blas_setup(&info);
    CHECK(strlen(info.kind) > 0 && strlen(info.kernel) > 0 && strlen(info.threading) > 0);
    CHECK(strcmp(info.kind, "openblas") != 0 || strchr(info.version, '.') != NULL);
    CHECK(info.cholmod[0] >= '1' && info.cholmod[0] <= '9' && strchr(info.cholmod, '.') != NULL);
}
