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

/* Wide of its interval a near-best polynomial is the step itself: its low coefficients are those of
 * the Chebyshev series of Θ(x_F − x) at x_F = 0, c_0 = 1/2 and c_n = −2 sin(nπ/2)/(nπ), as in A.
 * Weiße, G. Wellein, A. Alvermann, H. Fehske, RMP 78, 275 (2006) (value recalled from memory): 0.5,
 * −0.636620, 0, 0.212207, 0, −0.127324. The rounding of the step over δ changes them by O(δ²). */
SV_TEST(low_coefficients_are_those_of_the_series_of_a_step)
{
    const double series[] = {0.5, -0.636620, 0.0, 0.212207, 0.0, -0.127324};
    const double delta = 1e-3;
    int degree = sv_step_degree(delta, 1e-6);
    double *c = calloc((size_t)degree + 1, sizeof *c);
    CHECK_OK(sv_step_polynomial(test_context(), delta, degree, c));
    for (int n = 0; n < 6; n++)
        CHECK_CLOSE(c[n], series[n], 5e-6);
    free(c);
}

/* Σ c_k T_k((H − shift)/scale) x of one column by repeated sparse products; v: room for 4 n. */
static void repeated_products(const sv_sparse *h, const double *coefficients, int degree,
                              double shift, double scale, const sv_complex *x, sv_complex *v,
                              sv_complex *sum)
{
    sv_index n = h->n;
    sv_complex *before = v, *now = v + n, *next = v + 2 * n;
    memcpy(before, x, (size_t)n * sizeof *x);
    for (int k = 0; k <= degree; k++) {
        if (k > 0) {
            const sv_complex *from = k == 1 ? before : now;
            sv_sparse_apply(h, from, next);
            for (sv_index r = 0; r < n; r++) {
                next[r] = (next[r] - shift * from[r]) / scale;
                if (k > 1)
                    next[r] = 2.0 * next[r] - before[r];
            }
            sv_complex *oldest = k == 1 ? now : before;
            if (k > 1)
                before = now;
            now = next;
            next = oldest;
        }
        const sv_complex *term = k == 0 ? before : now;
        for (sv_index r = 0; r < n; r++)
            sum[r] = (k == 0 ? 0.0 : sum[r]) + coefficients[k] * term[r];
    }
}

enum { DEGREE = 21 };

typedef struct panels {
    sv_sample sample;
    sv_model model;
    sv_flake flake;
    sv_packed packed;
    double coefficients[DEGREE + 1], shift, scale;
    double *x, *y; /* double panels; y has room for work too */
    sv_complex *v; /* 5 n */
} panels;

static void start_panels(panels *p, bool periodic)
{
    sv_context *context = test_context();
    *p = (panels){.model = fixture_haldane(0.2, 0.9, 0.3), .shift = 0.2, .scale = 5.0};
    sv_flake_spec spec = fixture_cells(&p->model, 16, 6, periodic);
    sv_disorder d = {
        .name = "vac", .type = SV_DISORDER_VACANCIES, .on = -1, .has_share = true, .share = 0.1};
    p->flake = fixture_flake(&p->model, &spec);
    CHECK_OK(sv_sample_draw(context, &p->flake, &d, 1, 1, 0, &p->sample));
    for (int k = 0; k <= DEGREE; k++)
        p->coefficients[k] = k % 3 == 2 ? 0.0 : 1.0 / (1.0 + k);
    CHECK_OK(sv_packed_make(context, &p->sample.hamiltonian, NULL, p->sample.n, NULL, p->shift,
                            p->scale, &p->packed));
    sv_index size = 2 * SV_PANEL_COLUMNS * p->sample.n;
    CHECK_OK(sv_take(context, 4 * size, sizeof *p->x, &p->x));
    CHECK_OK(sv_take(context, 5 * p->sample.n, sizeof *p->v, &p->v));
    p->y = p->x + size;
}

static void end_panels(panels *p)
{
    sv_context *context = test_context();
    sv_give(context, p->x);
    sv_give(context, p->v);
    sv_packed_free(context, &p->packed);
    sv_sample_free(context, &p->sample);
    sv_flake_free(context, &p->flake);
    sv_model_free(context, &p->model);
}

/* Largest difference of one column from repeated products. */
static double worst_of_column(panels *p, const sv_complex *x, const sv_complex *y)
{
    double worst = 0.0;
    sv_complex *sum = p->v + 4 * p->sample.n;
    repeated_products(&p->sample.hamiltonian, p->coefficients, DEGREE, p->shift, p->scale, x,
                      p->v + p->sample.n, sum);
    for (sv_index r = 0; r < p->sample.n; r++)
        worst = fmax(worst, cabs(sum[r] - y[r]));
    return worst;
}

/* Every copy of the loop against T_k(A) x by repeated sparse products, on flakes where steps follow
 * each other closely and on tori, where they cannot. */
SV_TEST(panels_equal_repeated_products)
{
    enum { C = SV_PANEL_COLUMNS };
    for (int periodic = 0; periodic < 2; periodic++) {
        panels p;
        start_panels(&p, periodic);
        sv_index n = p.sample.n, size = 2 * C * n;
        sv_complex *x = NULL, *y = NULL;
        CHECK_OK(sv_take(test_context(), 2 * n, sizeof *x, &x));
        y = x + n;
        CHECK((p.packed.span > n / 2) == (periodic == 1));
        for (sv_index k = 0; k < size; k++)
            p.x[k] = sin(0.7 * (double)k);
        for (int kernel = SV_PANEL_PLAIN; kernel <= (int)sv_panel_best_kernel(); kernel++) {
            CHECK(strlen(sv_panel_kernel_name((sv_panel_kernel)kernel)) > 0);
            sv_panel_polynomial(&p.packed, p.coefficients, DEGREE, (sv_panel_kernel)kernel, p.x,
                                p.y + size, p.y);
            for (int column = 0; column < C; column += 5) {
                for (sv_index r = 0; r < n; r++) {
                    x[r] = CMPLX(p.x[2 * C * r + column], p.x[2 * C * r + C + column]);
                    y[r] = CMPLX(p.y[2 * C * r + column], p.y[2 * C * r + C + column]);
                }
                CHECK(worst_of_column(&p, x, y) < 1e-13);
            }
        }
        sv_give(test_context(), x);
        end_panels(&p);
    }
}

SV_TEST(single_precision_is_as_good_as_it_can_be)
{
    enum { C = SV_PANEL_COLUMNS_SINGLE };
    for (int periodic = 0; periodic < 2; periodic++) {
        panels p;
        start_panels(&p, periodic);
        CHECK_OK(sv_packed_add_single(test_context(), &p.packed));
        sv_index n = p.sample.n, size = 2 * C * n;
        float *in = (float *)p.x, *out = (float *)p.y;
        sv_complex *x = NULL, *y = NULL;
        CHECK_OK(sv_take(test_context(), 2 * n, sizeof *x, &x));
        y = x + n;
        for (sv_index k = 0; k < size; k++)
            in[k] = (float)sin(0.7 * (double)k);
        for (int kernel = SV_PANEL_PLAIN; kernel <= (int)sv_panel_best_kernel(); kernel++) {
            sv_panel_polynomial_single(&p.packed, p.coefficients, DEGREE, (sv_panel_kernel)kernel,
                                       in, out + size, out);
            for (int column = 0; column < C; column += 7) {
                for (sv_index r = 0; r < n; r++) {
                    x[r] =
                        CMPLX((double)in[2 * C * r + column], (double)in[2 * C * r + C + column]);
                    y[r] =
                        CMPLX((double)out[2 * C * r + column], (double)out[2 * C * r + C + column]);
                }
                double worst = worst_of_column(&p, x, y);
                CHECK(worst < 2e-6 && worst > 1e-9);
            }
        }
        sv_give(test_context(), x);
        end_panels(&p);
    }
}
