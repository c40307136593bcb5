/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Counts by inertia against all eigenvalues, on clean and disordered flakes and on matrices made to
 * hurt a factorisation without full pivoting. A count may be undecided, never wrong. */
#include "fixtures.h"
#include "selvedge/linalg.h"

#include <stdlib.h>

typedef struct subject {
    sv_model model;
    sv_flake flake;
    sv_sample sample;
    double *level; /* ascending */
} subject;

enum { N_MODELS = 4 };

/* Model `kind`, n×n cells, box disorder and vacancies when asked for. */
static subject make(int kind, int n, bool periodic, double width, double vacant, uint64_t seed)
{
    subject s = {0};
    sv_model models[N_MODELS] = {fixture_haldane(0.2, M_PI / 2, 0.0),
                                 fixture_haldane(0.3, 0.7, 0.4), fixture_qi_wu_zhang(-1.0),
                                 fixture_hofstadter(1, 5)};
    for (int k = 0; k < N_MODELS; k++)
        if (k != kind)
            sv_model_free(test_context(), &models[k]);
    s.model = models[kind];
    sv_flake_spec spec = fixture_cells(&s.model, n, n, periodic);
    s.flake = fixture_flake(&s.model, &spec);
    sv_disorder disorder[2] = {
        {.name = "vac",
         .type = SV_DISORDER_VACANCIES,
         .on = -1,
         .has_share = true,
         .share = vacant},
        {.name = "pot", .type = SV_DISORDER_ONSITE, .on = -1, .width = width}};
    CHECK_OK(sv_sample_draw(test_context(), &s.flake, disorder, 2, seed, 0, &s.sample));
    s.level = fixture_spectrum(&s.sample);
    return s;
}

/* The flake is borrowed by the sample, the model by the flake: they must not move after make(). */
static void settle(subject *s)
{
    s->flake.model = &s->model;
    s->sample.flake = &s->flake;
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

static double nearest(const subject *s, double shift)
{
    double distance = INFINITY;
    for (sv_index k = 0; k < s->sample.n; k++)
        distance = fmin(distance, fabs(s->level[k] - shift));
    return distance;
}

/* Decided and right, or undecided; undecided only close to a level. Returns 1 when decided. */
static int check_count(const subject *s, sv_inertia_plan *plan, double shift)
{
    sv_inertia_count count;
    double distance = nearest(s, shift);
    CHECK_OK(sv_inertia_count_below(test_context(), plan, &s->sample.hamiltonian, shift, &count));
    if (count.decided && distance > 1e-12)
        CHECK_INT(count.below, below(s, shift));
    if (distance > 1e-5)
        CHECK(count.decided);
    if (distance > 1e-12)
        CHECK(count.low <= below(s, shift) && below(s, shift) <= count.high);
    if (distance < 1e-14)
        CHECK(!count.decided);
    return count.decided;
}

/* Shifts all over the spectrum and close to levels; returns how many near ones were decided. */
static int check_counts(const subject *s, int block, sv_stream *stream, int *ret_near)
{
    sv_inertia_plan *plan = NULL;
    sv_index n = s->sample.n;
    int decided = 0;
    CHECK_OK(sv_inertia_plan_make(test_context(), &s->sample.hamiltonian, block, &plan));
    for (int k = 0; k < 10; k++)
        check_count(s, plan, -5.0 + 10.0 * sv_stream_uniform(stream, k, (int32_t)n, 0));
    for (int k = 0; k < 6; k++) {
        sv_index at = (sv_index)(sv_stream_uniform(stream, k, (int32_t)n, 1) * (double)n);
        double offset = (k % 2 ? 1.0 : -1.0) * (k < 4 ? 9e-10 : 1e-8);
        decided += check_count(s, plan, s->level[at] + offset);
        (*ret_near)++;
        check_count(s, plan, s->level[at]);
    }
    check_count(s, plan, 0.0);
    sv_inertia_plan_free(test_context(), plan);
    return decided;
}

SV_TEST(counts_are_right_or_undecided)
{
    const int sizes[] = {1, 2, 3, 5, 8, 11, 14};
    sv_stream stream = sv_stream_make(5, "counts", 0);
    int near = 0, decided = 0;
    for (int kind = 0; kind < N_MODELS; kind++)
        for (int k = 0; k < 7; k++)
            for (int how = 0; how < 3; how++) {
                bool periodic = how == 1 && sizes[k] >= 5 && sizes[k] % 5 == 0;
                subject s = make(kind, sizes[k], periodic, how == 0 ? 0.0 : 2.0,
                                 how == 2 && sizes[k] > 3 ? 0.15 : 0.0, (uint64_t)(k + 1));
                settle(&s);
                stream.realisation++;
                decided += check_counts(&s, 1, &stream, &near);
                if (how != 2 && s.model.n_orbitals == 2)
                    decided += check_counts(&s, 2, &stream, &near);
                release(&s);
            }
    CHECK(near > 400);
    /* Clean flakes have degenerate levels only; 1e-9 beside a level is far in double precision. */
    CHECK(decided >= near * 98 / 100);
}

/* A diagonal matrix says its inertia itself (Sylvester). */
SV_TEST(diagonal_matrices)
{
    enum { N = 50 };
    sv_index start[N + 1];
    int32_t column[N];
    sv_complex value[N];
    for (int k = 0; k < N; k++) {
        start[k] = column[k] = k;
        value[k] = k % 5 == 0 ? 0.0 : (k % 3) - 1.5 + 1e-3 * k;
    }
    start[N] = N;
    sv_sparse h = {N, start, column, value};
    sv_inertia_plan *plan = NULL;
    CHECK_OK(sv_inertia_plan_make(test_context(), &h, 1, &plan));
    const double shifts[] = {-2.0, -0.7, -1e-9, 0.0, 1e-9, 0.3, 5.0};
    for (int s = 0; s < 7; s++) {
        sv_inertia_count count;
        sv_index expected = 0;
        for (int k = 0; k < N; k++)
            expected += creal(value[k]) < shifts[s];
        CHECK_OK(sv_inertia_count_below(test_context(), plan, &h, shifts[s], &count));
        CHECK(count.decided == (shifts[s] != 0.0));
        if (count.decided)
            CHECK_INT(count.below, expected);
        else
            CHECK(count.low == expected && count.high == expected + 10);
    }
    sv_inertia_plan_free(test_context(), plan);
}

/* Chains with a vanishing diagonal: no pivot exists without steps of two columns. */
SV_TEST(chains_without_a_diagonal)
{
    for (int n = 2; n <= 400; n = n * 3 / 2 + 1) {
        sv_sparse h = {.n = n};
        sv_index next = 0;
        CHECK_OK(sv_take(test_context(), n + 1, sizeof *h.row_start, &h.row_start));
        CHECK_OK(sv_take(test_context(), 2 * n, sizeof *h.column, &h.column));
        CHECK_OK(sv_take(test_context(), 2 * n, sizeof *h.value, &h.value));
        for (int r = 0; r < n; r++) {
            for (int c = r - 1; c <= r + 1; c += 2)
                if (c >= 0 && c < n) {
                    h.column[next] = c;
                    h.value[next++] = c < r ? CMPLX(0.0, 1.0) : CMPLX(0.0, -1.0);
                }
            h.row_start[r + 1] = next;
        }
        sv_inertia_plan *plan = NULL;
        sv_inertia_count count;
        CHECK_OK(sv_inertia_plan_make(test_context(), &h, 1, &plan));
        /* Levels 2cos(πk/(n+1)), k = 1 … n: a zero level for odd n. */
        CHECK_OK(sv_inertia_count_below(test_context(), plan, &h, 0.0, &count));
        CHECK(count.decided == (n % 2 == 0));
        if (count.decided)
            CHECK_INT(count.below, n / 2);
        CHECK(count.low <= n / 2 && count.high >= n / 2);
        CHECK_OK(sv_inertia_count_below(test_context(), plan, &h, 1e-3, &count));
        CHECK(count.decided);
        CHECK_INT(count.below, (n + 1) / 2);
        sv_inertia_plan_free(test_context(), plan);
        sv_sparse_free(test_context(), &h);
    }
}

/* Far from all levels one factorisation is enough; on a level small matrices get all eigenvalues,
 * larger ones counts on both sides. */
SV_TEST(doubt_is_met_by_size)
{
    const int sizes[] = {6, 14};
    for (int k = 0; k < 2; k++) {
        subject s = make(1, sizes[k], false, 1.0, 0.0, 2);
        settle(&s);
        const sv_sparse *h = &s.sample.hamiltonian;
        sv_inertia_plan *plan = NULL;
        sv_inertia_count count;
        CHECK_OK(sv_inertia_plan_make(test_context(), h, 1, &plan));
        double level = s.level[h->n / 3], apart = s.level[h->n / 3 + 1] - level;
        CHECK_OK(sv_inertia_count_below(test_context(), plan, h, level + 0.4 * apart, &count));
        CHECK(count.decided && count.how == SV_COUNTED_ONCE);
        CHECK(count.distance > 0.39 * apart && count.distance < 2.0 * apart);
        CHECK_OK(sv_inertia_count_below(test_context(), plan, h, level, &count));
        CHECK(!count.decided && count.how == (k == 0 ? SV_COUNTED_DENSE : SV_COUNTED_TWICE));
        CHECK(count.low == h->n / 3 && count.high == h->n / 3 + 1);
        CHECK(count.width > 0.0 && count.width < 1e-7);
        sv_inertia_plan_free(test_context(), plan);
        release(&s);
    }
}

/* A clean honeycomb with imaginary second hops has many singular leading blocks at E = 0, where its
 * spectrum is symmetric: half of the states are below. */
SV_TEST(singular_leading_blocks)
{
    sv_model model = fixture_haldane(0.2, M_PI / 2, 0.0);
    for (int periodic = 0; periodic < 2; periodic++) {
        sv_flake_spec spec = fixture_cells(&model, 24, 24, periodic);
        sv_flake flake = fixture_flake(&model, &spec);
        sv_sample sample = {0};
        sv_inertia_plan *plan = NULL;
        sv_inertia_count count;
        sv_fermi_level fermi;
        CHECK_OK(sv_sample_draw(test_context(), &flake, NULL, 0, 1, 0, &sample));
        const sv_sparse *h = &sample.hamiltonian;
        CHECK_OK(sv_inertia_plan_make(test_context(), h, 1, &plan));
        CHECK_OK(sv_inertia_count_below(test_context(), plan, h, 0.0, &count));
        CHECK(count.factor.replaced > 0 && count.how == SV_COUNTED_TWICE && count.decided);
        CHECK_INT(count.below, h->n / 2);
        CHECK_OK(sv_inertia_fermi_energy(test_context(), plan, h, h->n / 2, &fermi));
        CHECK(!fermi.on_level);
        CHECK_CLOSE(fermi.energy, 0.0, 1e-4);
        sv_inertia_plan_free(test_context(), plan);
        sv_sample_free(test_context(), &sample);
        sv_flake_free(test_context(), &flake);
    }
    sv_model_free(test_context(), &model);
}

/* Another order and another code without pivoting. */
SV_TEST(two_codes_agree)
{
    for (int kind = 0; kind < N_MODELS; kind++) {
        subject s = make(kind, 13, false, 1.5, 0.05, 7);
        settle(&s);
        sv_inertia_plan *plan = NULL;
        const sv_sparse *h = &s.sample.hamiltonian;
        CHECK_OK(sv_inertia_plan_make(test_context(), h, 1, &plan));
        for (int k = 0; k < 15; k++) {
            sv_inertia inertia;
            sv_index other = -1;
            double shift = -3.0 + 0.41 * k;
            CHECK_OK(sv_inertia_factor(test_context(), plan, h, shift, &inertia));
            CHECK_OK(sv_inertia_simplicial(test_context(), h, shift, &other));
            CHECK_INT(inertia.negative, other);
            CHECK_INT(inertia.negative + inertia.positive, h->n);
        }
        sv_inertia_plan_free(test_context(), plan);
        release(&s);
    }
}

/* The stated error must exceed the error seen: (H − E) x − b over x. */
SV_TEST(solves_keep_within_the_stated_error)
{
    for (int kind = 0; kind < N_MODELS; kind++) {
        subject s = make(kind, 12, false, 1.0, 0.0, 3);
        settle(&s);
        sv_index n = s.sample.n;
        const sv_sparse *h = &s.sample.hamiltonian;
        sv_complex *x = NULL;
        sv_inertia_plan *plan = NULL;
        CHECK_OK(sv_take(test_context(), 3 * n, sizeof *x, &x));
        sv_complex *b = x + n, *hx = b + n;
        CHECK_OK(sv_inertia_plan_make(test_context(), h, 1, &plan));
        CHECK_STATUS(SV_INTERNAL, sv_inertia_solve(test_context(), plan, x));
        for (int k = 0; k < 20; k++) {
            double shift = -2.0 + 0.2 * k, off = 0.0, size = 0.0, scale = 0.0;
            sv_inertia inertia;
            CHECK_OK(sv_inertia_factor(test_context(), plan, h, shift, &inertia));
            for (sv_index r = 0; r < n; r++) {
                x[r] = b[r] = CMPLX(sin(1.0 + (double)r), cos(2.0 * (double)r));
                scale += pow(cabs(b[r]), 2);
            }
            CHECK_OK(sv_inertia_solve(test_context(), plan, x));
            sv_sparse_apply(h, x, hx);
            for (sv_index r = 0; r < n; r++) {
                off += pow(cabs(hx[r] - shift * x[r] - b[r]), 2);
                size += pow(cabs(x[r]), 2);
            }
            CHECK(inertia.replaced == 0);
            CHECK(sqrt(off) <= inertia.error * sqrt(size) + 1e-15 * sqrt(scale));
            CHECK(inertia.error < 1e-7);
        }
        sv_inertia_plan_free(test_context(), plan);
        sv_give(test_context(), x);
        release(&s);
    }
}

SV_TEST(levels_next_to_a_shift)
{
    for (int kind = 0; kind < N_MODELS; kind++)
        for (int n = 1; n <= 13; n += 4) {
            subject s = make(kind, n, false, 1.0, 0.0, 11);
            settle(&s);
            const sv_sparse *h = &s.sample.hamiltonian;
            sv_inertia_plan *plan = NULL;
            CHECK_OK(sv_inertia_plan_make(test_context(), h, 1, &plan));
            for (int k = 0; k < 9; k++) {
                double shift = -6.0 + 1.503 * k;
                sv_inertia inertia;
                sv_inertia_levels levels;
                CHECK_OK(sv_inertia_factor(test_context(), plan, h, shift, &inertia));
                CHECK_OK(sv_inertia_levels_near(test_context(), plan, &inertia, shift, 1e-9,
                                                (double)NAN, &levels));
                sv_index count = below(&s, shift);
                if (count > 0)
                    CHECK_CLOSE(levels.below, s.level[count - 1], 1e-9);
                else
                    CHECK(isinf(levels.below) && levels.below < 0.0);
                if (count < h->n)
                    CHECK_CLOSE(levels.above, s.level[count], 1e-9);
                else
                    CHECK(isinf(levels.above) && levels.above > 0.0);
            }
            sv_inertia_plan_free(test_context(), plan);
            release(&s);
        }
}

SV_TEST(fermi_energy_of_every_number_of_electrons)
{
    for (int kind = 0; kind < N_MODELS; kind++)
        for (int clean = 0; clean < 2; clean++) {
            subject s = make(kind, 5, clean == 1, clean ? 0.0 : 1.5, 0.0, 4);
            settle(&s);
            const sv_sparse *h = &s.sample.hamiltonian;
            sv_inertia_plan *plan = NULL;
            sv_fermi_level f;
            CHECK_OK(sv_inertia_plan_make(test_context(), h, 1, &plan));
            for (sv_index e = 0; e <= h->n; e++) {
                CHECK_OK(sv_inertia_fermi_energy(test_context(), plan, h, e, &f));
                double spacing = e > 0 && e < h->n ? s.level[e] - s.level[e - 1] : 1.0;
                if (spacing < 1e-12 || spacing > 1e-9)
                    CHECK(f.on_level == (spacing < 1e-12));
                if (f.on_level)
                    continue;
                double expected = e == 0      ? s.level[0] - 1.0
                                  : e == h->n ? s.level[e - 1] + 1.0
                                              : 0.5 * (s.level[e - 1] + s.level[e]);
                CHECK_CLOSE(f.energy, expected, 1e-8);
                CHECK(f.error < 1e-8);
                CHECK(e == 0 || fabs(f.highest_occupied - s.level[e - 1]) < 1e-8);
                CHECK(e == h->n || fabs(f.lowest_empty - s.level[e]) < 1e-8);
            }
            CHECK_STATUS(SV_INVALID_INPUT,
                         sv_inertia_fermi_energy(test_context(), plan, h, h->n + 1, &f));
            sv_inertia_plan_free(test_context(), plan);
            release(&s);
        }
}

SV_TEST(misuse_is_refused)
{
    subject s = make(1, 4, false, 1.0, 0.0, 1), t = make(1, 4, true, 1.0, 0.0, 1);
    settle(&s);
    settle(&t);
    sv_inertia_plan *plan = NULL;
    sv_inertia inertia;
    sv_sparse *h = &s.sample.hamiltonian, empty = {0};
    CHECK_STATUS(SV_INVALID_INPUT, sv_inertia_plan_make(test_context(), h, 3, &plan));
    CHECK_STATUS(SV_INVALID_INPUT, sv_inertia_plan_make(test_context(), &empty, 1, &plan));
    CHECK_OK(sv_inertia_plan_make(test_context(), h, 1, &plan));
    /* The torus has hops the open flake lacks. */
    CHECK_STATUS(SV_INVALID_INPUT,
                 sv_inertia_factor(test_context(), plan, &t.sample.hamiltonian, 0.1, &inertia));
    sv_sparse part = *h;
    part.n--;
    CHECK_STATUS(SV_INVALID_INPUT, sv_inertia_factor(test_context(), plan, &part, 0.1, &inertia));
    CHECK_OK(sv_inertia_factor(test_context(), plan, h, 0.1, &inertia));
    h->value[3] = NAN;
    CHECK_STATUS(SV_NUMERICAL, sv_inertia_factor(test_context(), plan, h, 0.1, &inertia));
    sv_inertia_plan_free(test_context(), plan);
    sv_inertia_plan_free(test_context(), NULL);
    release(&s);
    release(&t);
}

static long allowed;
static sv_allocator inner;

static void *scarce_take(size_t bytes, void *user)
{
    return allowed-- > 0 ? inner.take(bytes, user) : NULL;
}

static sv_status everything(sv_context *c, const sv_sparse *h)
{
    sv_inertia_plan *plan = NULL;
    sv_inertia_count count;
    sv_fermi_level fermi;
    sv_status status = sv_inertia_plan_make(c, h, 1, &plan);
    if (status == SV_OK)
        status = sv_inertia_count_below(c, plan, h, 0.0, &count);
    if (status == SV_OK)
        status = sv_inertia_fermi_energy(c, plan, h, h->n / 2, &fermi);
    sv_inertia_plan_free(c, plan);
    return status;
}

/* The k-th allocation fails, k = 0, 1, 2, …: a status, no leak (the harness counts). The flake has
 * a level at 0, so that the dense count is reached. */
SV_TEST(every_allocation_may_fail)
{
    subject s = make(3, 3, false, 0.0, 0.0, 1);
    settle(&s);
    sv_context *c = test_context();
    inner = c->allocator;
    c->allocator.take = scarce_take;
    sv_status status = SV_NO_MEMORY;
    long k = 0;
    for (; status != SV_OK && k < 1000; k++) {
        allowed = k;
        status = everything(c, &s.sample.hamiltonian);
        CHECK(status == SV_OK || status == SV_NO_MEMORY);
    }
    c->allocator = inner;
    CHECK(status == SV_OK && k > 15);
    release(&s);
}
