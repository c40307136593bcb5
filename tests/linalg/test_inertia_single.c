/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Factorisations in single precision against all eigenvalues, estimated distances, and plans that
 * serve matrices with other groups. */
#include "fixtures.h"
#include "selvedge/linalg.h"

#include <stdlib.h>

typedef struct subject {
    sv_model model;
    sv_flake flake;
    sv_sample sample;
    double *level; /* ascending */
} subject;

/* A disordered flake with vacancies; in place, since parts point to each other. */
static void make(subject *s, int n, bool periodic, double width, uint64_t seed)
{
    *s = (subject){.model = fixture_haldane(0.3, 0.7, 0.4)};
    sv_flake_spec spec = fixture_cells(&s->model, n, n, periodic);
    s->flake = fixture_flake(&s->model, &spec);
    sv_disorder disorder[2] = {
        {.name = "vac", .type = SV_DISORDER_VACANCIES, .on = -1, .has_share = true, .share = 0.05},
        {.name = "pot", .type = SV_DISORDER_ONSITE, .on = -1, .width = width}};
    CHECK_OK(sv_sample_draw(test_context(), &s->flake, disorder, 2, seed, 0, &s->sample));
    s->level = fixture_spectrum(&s->sample);
}

static void release(subject *s)
{
    sv_give(test_context(), s->level);
    sv_sample_free(test_context(), &s->sample);
    sv_flake_free(test_context(), &s->flake);
    sv_model_free(test_context(), &s->model);
}

static sv_index below(const subject *s, double shift)
{
    sv_index count = 0;
    for (sv_index k = 0; k < s->sample.n; k++)
        count += s->level[k] < shift;
    return count;
}

/* ‖(H − shift) x − b‖/‖x‖ for the solution x. */
static double backward_error(sv_inertia_plan *plan, const sv_sparse *h, double shift)
{
    sv_complex *x = NULL;
    double off = 0.0, size = 0.0;
    CHECK_OK(sv_take(test_context(), 3 * h->n, sizeof *x, &x));
    sv_complex *b = x + h->n, *hx = b + h->n;
    for (sv_index r = 0; r < h->n; r++)
        x[r] = b[r] = CMPLX(sin(1.0 + (double)r), cos(2.0 * (double)r));
    CHECK_OK(sv_inertia_solve(test_context(), plan, x));
    sv_sparse_apply(h, x, hx);
    for (sv_index r = 0; r < h->n; r++) {
        off += pow(cabs(hx[r] - shift * x[r] - b[r]), 2);
        size += pow(cabs(x[r]), 2);
    }
    sv_give(test_context(), x);
    return sqrt(off / size);
}

/* The true count lies between those at shift ± error; beside a level the count may be off. */
SV_TEST(single_counts_keep_within_the_stated_error)
{
    const int sizes[] = {1, 2, 4, 7, 11, 14};
    for (int k = 0; k < 6; k++)
        for (int seed = 1; seed <= 3; seed++) {
            subject s;
            sv_inertia_plan *plan = NULL;
            make(&s, sizes[k], seed == 2 && sizes[k] > 3, 2.0, (uint64_t)seed);
            const sv_sparse *h = &s.sample.hamiltonian;
            CHECK_OK(sv_inertia_plan_make(test_context(), h, 1, &plan));
            for (int at = 0; at < 12; at++) {
                sv_inertia one;
                double shift = at < 8 ? -3.0 + 0.777 * at : s.level[(at * 37) % h->n] + 1e-7;
                CHECK_OK(sv_inertia_factor_single(test_context(), plan, h, shift, &one));
                CHECK(one.negative + one.positive == h->n);
                CHECK(one.negative >= below(&s, shift - one.error));
                CHECK(one.negative <= below(&s, shift + one.error));
                CHECK(one.error > 1e-7 && (at >= 8 || one.error < 0.05));
                if (one.replaced == 0)
                    CHECK(backward_error(plan, h, shift) <= one.error);
            }
            sv_inertia_plan_free(test_context(), plan);
            release(&s);
        }
}

/* Never too small; six steps leave less than a factor of ten (probability 1e-9). */
SV_TEST(estimated_distances)
{
    for (int seed = 1; seed <= 6; seed++) {
        subject s;
        sv_inertia_plan *plan = NULL;
        make(&s, 9, false, 3.0, (uint64_t)seed);
        const sv_sparse *h = &s.sample.hamiltonian;
        CHECK_OK(sv_inertia_plan_make(test_context(), h, 1, &plan));
        for (int at = 0; at < 10; at++) {
            double shift = -4.0 + 0.83 * at, nearest = INFINITY, previous = INFINITY;
            sv_inertia one;
            for (sv_index k = 0; k < h->n; k++)
                nearest = fmin(nearest, fabs(s.level[k] - shift));
            CHECK_OK(sv_inertia_factor(test_context(), plan, h, shift, &one));
            for (int steps = 1; steps <= 8; steps++) {
                double distance = 0.0;
                CHECK_OK(sv_inertia_distance(test_context(), plan, steps, &distance));
                CHECK(distance >= nearest * (1.0 - 1e-9) - one.error);
                CHECK(distance <= previous * (1.0 + 1e-9) &&
                      (steps < 6 || distance < 10 * nearest));
                previous = distance;
            }
        }
        sv_inertia_plan_free(test_context(), plan);
        release(&s);
    }
}

/* One analysis for H and its localizer, and back again. */
SV_TEST(plans_change_their_groups)
{
    subject s;
    sv_inertia_plan *plan = NULL, *fresh = NULL;
    sv_sparse l = {0};
    sv_inertia one, other;
    sv_complex *x = NULL;
    make(&s, 10, false, 1.0, 5);
    const sv_sparse *h = &s.sample.hamiltonian;
    CHECK_OK(sv_localizer_matrix(test_context(), &s.sample, 0.1, 0.3, s.flake.centre, &l));
    CHECK_OK(sv_take(test_context(), l.n, sizeof *x, &x));
    CHECK_OK(sv_inertia_plan_make(test_context(), h, 1, &plan));
    CHECK_OK(sv_inertia_plan_make(test_context(), &l, 2, &fresh));
    CHECK_OK(sv_inertia_factor(test_context(), plan, h, 0.1, &one));
    CHECK_INT(one.negative, below(&s, 0.1));
    CHECK_OK(sv_inertia_plan_regroup(test_context(), plan, 2));
    CHECK_STATUS(SV_INTERNAL, sv_inertia_solve(test_context(), plan, x));
    for (int k = 0; k < 9; k++) {
        CHECK_OK(sv_inertia_factor(test_context(), plan, &l, -2.0 + 0.49 * k, &one));
        CHECK_OK(sv_inertia_factor(test_context(), fresh, &l, -2.0 + 0.49 * k, &other));
        CHECK(one.negative == other.negative && backward_error(plan, &l, -2.0 + 0.49 * k) < 1e-9);
    }
    CHECK_OK(sv_inertia_plan_regroup(test_context(), plan, 1));
    CHECK_OK(sv_inertia_factor(test_context(), plan, h, 0.1, &one));
    CHECK_INT(one.negative, below(&s, 0.1));
    CHECK_STATUS(SV_INVALID_INPUT, sv_inertia_plan_regroup(test_context(), plan, 0));
    sv_give(test_context(), x);
    sv_sparse_free(test_context(), &l);
    sv_inertia_plan_free(test_context(), plan);
    sv_inertia_plan_free(test_context(), fresh);
    release(&s);
}

/* Every copy of the inner product, in both precisions; fronts of all sizes up to 2 × 4 × 21 rows.
 */
SV_TEST(kernels_agree)
{
    for (int n = 3; n <= 21; n += 6) {
        subject s;
        sv_inertia_plan *plan = NULL;
        sv_sparse l = {0};
        make(&s, n, n > 3, 1.0, 8);
        CHECK_OK(sv_localizer_matrix(test_context(), &s.sample, 0.1, 0.3, s.flake.centre, &l));
        CHECK_OK(sv_inertia_plan_make(test_context(), &l, 2, &plan));
        for (int at = 0; at < 4; at++) {
            sv_inertia plain, one;
            double shift = 0.13 + 0.31 * at;
            sv_inertia_plan_use(plan, SV_PANEL_PLAIN);
            CHECK_OK(sv_inertia_factor(test_context(), plan, &l, shift, &plain));
            for (int kernel = 0; kernel <= (int)sv_panel_best_kernel(); kernel++) {
                sv_inertia_plan_use(plan, (sv_panel_kernel)kernel);
                CHECK_OK(sv_inertia_factor(test_context(), plan, &l, shift, &one));
                CHECK(one.negative == plain.negative && one.replaced == 0);
                CHECK_CLOSE(one.growth, plain.growth, 1e-6 * plain.growth);
                CHECK(backward_error(plan, &l, shift) <= one.error);
                CHECK_OK(sv_inertia_factor_single(test_context(), plan, &l, shift, &one));
                CHECK(one.replaced > 0 || backward_error(plan, &l, shift) <= one.error);
            }
        }
        sv_inertia_plan_free(test_context(), plan);
        sv_sparse_free(test_context(), &l);
        release(&s);
    }
}
