/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "fixtures.h"
#include "selvedge/linalg.h"

#include <stdlib.h>

/* Σ c_k T_k(x) by the definition of T_k. */
static double value_at(const double *c, int degree, double x)
{
    double sum = 0.0;
    for (int k = 0; k <= degree; k++)
        sum += c[k] * cos(k * acos(x));
    return sum;
}

SV_TEST(step_polynomials_reach_the_best_rate)
{
    const double deltas[] = {0.3, 0.1, 0.03};
    for (int d = 0; d < 3; d++)
        for (int degree = 11; sv_step_error(deltas[d], degree) > 1e-13; degree = 2 * degree + 1) {
            double *c = calloc((size_t)degree + 1, sizeof *c), worst = 0.0;
            double stated = sv_step_error(deltas[d], degree);
            CHECK_OK(sv_step_polynomial(test_context(), deltas[d], degree, c));
            for (int k = 0; k <= 2000; k++) {
                double x = deltas[d] + (1.0 - deltas[d]) * k / 2000.0;
                worst = fmax(worst, fabs(value_at(c, degree, x)));
                worst = fmax(worst, fabs(value_at(c, degree, -x) - 1.0));
                double inside = value_at(c, degree, deltas[d] * (k / 1000.0 - 1.0));
                CHECK(inside > -stated - 1e-13 && inside < 1.0 + stated + 1e-13);
            }
            CHECK(worst < stated && worst > 0.15 * stated);
            free(c);
        }
    CHECK(sv_step_error(0.1, sv_step_degree(0.1, 1e-6)) <= 1e-6);
    CHECK(sv_step_error(0.1, sv_step_degree(0.1, 1e-6) - 2) > 1e-6);
    double none[3];
    CHECK_STATUS(SV_INVALID_INPUT, sv_step_polynomial(test_context(), 0.1, 2, none));
    CHECK_STATUS(SV_INVALID_INPUT, sv_step_polynomial(test_context(), 0.0, 3, none));
    CHECK_STATUS(SV_INVALID_INPUT, sv_step_polynomial(test_context(), 0.9, 101, none));
}

/* Every copy of the loop against T_k(A) x by repeated sparse products. */
SV_TEST(panels_equal_repeated_products)
{
    sv_context *context = test_context();
    sv_model model = fixture_haldane(0.2, 0.9, 0.3);
    sv_flake_spec spec = fixture_cells(&model, 7, 5, false);
    sv_flake flake = fixture_flake(&model, &spec);
    sv_disorder d = {
        .name = "vac", .type = SV_DISORDER_VACANCIES, .on = -1, .has_share = true, .share = 0.1};
    sv_sample s = {0};
    CHECK_OK(sv_sample_draw(context, &flake, &d, 1, 1, 0, &s));
    enum { DEGREE = 9, C = SV_PANEL_COLUMNS };
    double coefficients[DEGREE + 1], shift = 0.2, scale = 5.0;
    for (int k = 0; k <= DEGREE; k++)
        coefficients[k] = 1.0 / (1.0 + k);
    sv_packed p = {0};
    CHECK_OK(sv_packed_make(context, &s.hamiltonian, NULL, s.n, NULL, shift, scale, &p));
    sv_index n = s.n, size = 2 * C * n;
    double *x = NULL, *work = NULL, *y = NULL;
    sv_complex *v = NULL;
    CHECK_OK(sv_take(context, size, sizeof *x, &x));
    CHECK_OK(sv_take(context, 2 * size, sizeof *work, &work));
    CHECK_OK(sv_take(context, size, sizeof *y, &y));
    CHECK_OK(sv_take(context, 4 * n, sizeof *v, &v));
    for (sv_index k = 0; k < size; k++)
        x[k] = sin(0.7 * (double)k);
    for (int kernel = SV_PANEL_PLAIN; kernel <= (int)sv_panel_best_kernel(); kernel++) {
        CHECK(strlen(sv_panel_kernel_name((sv_panel_kernel)kernel)) > 0);
        sv_panel_polynomial(&p, coefficients, DEGREE, (sv_panel_kernel)kernel, x, work, y);
        for (int column = 0; column < C; column += 5) {
            sv_complex *t0 = v, *t1 = v + n, *t2 = v + 2 * n, *sum = v + 3 * n;
            for (sv_index r = 0; r < n; r++) {
                t0[r] = CMPLX(x[2 * C * r + column], x[2 * C * r + C + column]);
                sum[r] = coefficients[0] * t0[r];
            }
            for (int k = 1; k <= DEGREE; k++) {
                sv_complex *from = k == 1 ? t0 : t1;
                sv_sparse_apply(&s.hamiltonian, from, t2);
                for (sv_index r = 0; r < n; r++) {
                    t2[r] = (t2[r] - shift * from[r]) / scale;
                    if (k > 1)
                        t2[r] = 2.0 * t2[r] - t0[r];
                    sum[r] += coefficients[k] * t2[r];
                }
                if (k > 1) {
                    sv_complex *swap = t0;
                    t0 = t1;
                    t1 = t2;
                    t2 = swap;
                } else {
                    sv_complex *swap = t1;
                    t1 = t2;
                    t2 = swap;
                }
            }
            double worst = 0.0;
            for (sv_index r = 0; r < n; r++)
                worst = fmax(
                    worst, cabs(sum[r] - CMPLX(y[2 * C * r + column], y[2 * C * r + C + column])));
            CHECK(worst < 1e-13);
        }
    }
    sv_give(context, x);
    sv_give(context, work);
    sv_give(context, y);
    sv_give(context, v);
    sv_packed_free(context, &p);
    sv_sample_free(context, &s);
    sv_flake_free(context, &flake);
    sv_model_free(context, &model);
}
