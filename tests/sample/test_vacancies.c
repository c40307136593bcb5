/* SPDX-License-Identifier: GPL-3.0-or-later */
/* What each rule of drawing vacancies claims, by statistics. Limits are five standard errors. */
#include "fixtures.h"

#include <stdlib.h>

static sv_sample drawn(const sv_flake *flake, const sv_disorder *d, sv_index k)
{
    sv_sample s = {0};
    CHECK_OK(sv_sample_draw(test_context(), flake, d, 1, 11, k, &s));
    return s;
}

/* Vacant flags of an n×n square flake of one position per cell. */
static void vacant_map(const sv_sample *s, const sv_flake *flake, bool *vacant)
{
    for (sv_index c = 0; c < flake->n_cells; c++)
        vacant[c] = true;
    for (sv_index r = 0; r < s->n; r++)
        vacant[flake->sites[s->pristine[r]].cell] = false;
}

typedef struct mean_of {
    double sum, squares, n;
} mean_of;

static void add(mean_of *m, double x)
{
    m->sum += x;
    m->squares += x * x;
    m->n += 1.0;
}

static double mean(const mean_of *m)
{
    return m->sum / m->n;
}

static double error(const mean_of *m)
{
    double variance = m->squares / m->n - mean(m) * mean(m);
    return sqrt(variance / (m->n - 1.0));
}

/* κ ∫ (1 − exp(−b (g(x) + g(x − r)))) d²x by the midpoint rule; g: gaussian of the radius. */
static double exponent(double density, double b, double radius, double rx, double ry, bool both)
{
    const double step = radius / 12.0, reach = 8.0 * radius + hypot(rx, ry);
    double sum = 0.0;
    for (double x = -reach; x < reach; x += step)
        for (double y = -reach; y < reach; y += step) {
            double g = exp(-(x * x + y * y) / (2.0 * radius * radius));
            double u = x - rx, v = y - ry;
            if (both)
                g += exp(-(u * u + v * v) / (2.0 * radius * radius));
            sum += -expm1(-b * g);
        }
    return density * sum * step * step;
}

/* The clustered process against its own law: P(both vacant) at distance r from the void
 * probability of a shot-noise Cox process (Stoyan, Kendall, Mecke, ch. 5; recalled from memory),
 * integrated numerically here; the library uses a closed form for the density of parents. */
SV_TEST(clusters_have_their_pair_law)
{
    enum { N = 40, RUNS = 400, FAR = 5 };
    sv_model model = fixture_qi_wu_zhang(-1.0);
    sv_flake_spec spec = fixture_cells(&model, N, N, false);
    sv_flake flake = fixture_flake(&model, &spec);
    const double share = 0.06, size = 8.0, radius = 1.5, b = size / (2.0 * M_PI * radius * radius);
    sv_disorder d = {.name = "vac",
                     .type = SV_DISORDER_VACANCIES,
                     .on = -1,
                     .has_share = true,
                     .share = share,
                     .cluster_size = size,
                     .cluster_radius = radius};
    double density = -log(1.0 - share) / exponent(1.0, b, radius, 0, 0, false);
    mean_of single = {0}, pairs[FAR] = {{0}};
    const int shifts[FAR] = {1, 2, 3, 6, 20};
    bool vacant[N * N];
    for (int k = 0; k < RUNS; k++) {
        sv_sample s = drawn(&flake, &d, k);
        vacant_map(&s, &flake, vacant);
        add(&single, (double)s.inventory.vacancies / (N * N));
        CHECK_INT(s.inventory.placed[0], s.inventory.vacancies);
        for (int m = 0; m < FAR; m++) {
            double both = 0.0;
            for (int i = 0; i + shifts[m] < N; i++)
                for (int j = 0; j < N; j++)
                    both += vacant[i * N + j] && vacant[(i + shifts[m]) * N + j];
            add(&pairs[m], both / (N * (N - shifts[m])));
        }
        sv_sample_free(test_context(), &s);
    }
    CHECK_CLOSE(mean(&single), share, 5.0 * error(&single));
    for (int m = 0; m < FAR; m++) {
        double none = exp(-exponent(density, b, radius, shifts[m], 0, true));
        double both = 1.0 - 2.0 * (1.0 - share) + none;
        CHECK_CLOSE(mean(&pairs[m]), both, 5.0 * error(&pairs[m]));
        /* Clustering is what is tested: near pairs are far from independent ones. */
        if (m < 2)
            CHECK(both > 1.8 * share * share);
    }
    sv_flake_free(test_context(), &flake);
    sv_model_free(test_context(), &model);
}

/* Larger shares keep what smaller ones have, larger flakes what smaller ones have. */
SV_TEST(rules_are_nested_and_know_no_flake)
{
    sv_model model = fixture_haldane(0.2, 1.0, 0.0);
    sv_flake_spec small_spec = fixture_cells(&model, 14, 14, false);
    sv_flake_spec large_spec = fixture_cells(&model, 20, 20, true);
    sv_flake small = fixture_flake(&model, &small_spec), large = fixture_flake(&model, &large_spec);
    for (int rule = 0; rule < 2; rule++) {
        sv_disorder d = {.name = "vac",
                         .type = SV_DISORDER_VACANCIES,
                         .on = -1,
                         .has_share = true,
                         .cluster_size = rule == 0 ? 4.0 : 0.0,
                         .cluster_radius = 1.2,
                         .distance = rule == 1 ? 1.1 : 0.0};
        d.share = 0.04;
        sv_sample few = drawn(&small, &d, 2);
        sv_sample wide = drawn(&large, &d, 2);
        d.share = 0.08;
        sv_sample many = drawn(&small, &d, 2);
        CHECK(many.n < few.n && few.n < small.n_sites);
        bool there[2 * 14 * 14] = {false}, far_there[2 * 20 * 20] = {false};
        for (sv_index r = 0; r < few.n; r++)
            there[few.pristine[r]] = true;
        for (sv_index r = 0; r < many.n; r++)
            CHECK(there[many.pristine[r]]);
        for (sv_index r = 0; r < wide.n; r++)
            far_there[wide.pristine[r]] = true;
        for (int i = 0; i < 14; i++)
            for (int j = 0; j < 14; j++)
                for (int o = 0; o < 2; o++)
                    CHECK(there[2 * (14 * i + j) + o] == far_there[2 * (20 * i + j) + o]);
        sv_sample_free(test_context(), &few);
        sv_sample_free(test_context(), &many);
        sv_sample_free(test_context(), &wide);
    }
    sv_flake_free(test_context(), &small);
    sv_flake_free(test_context(), &large);
    sv_model_free(test_context(), &model);
}

static double nearest_pair(const sv_flake *flake, const sv_sample *s)
{
    double best = INFINITY;
    bool *gone = NULL;
    CHECK_OK(sv_take(test_context(), flake->n_sites, sizeof *gone, &gone));
    for (sv_index a = 0; a < flake->n_sites; a++)
        gone[a] = true;
    for (sv_index r = 0; r < s->n; r++)
        gone[s->pristine[r]] = false;
    for (sv_index a = 0; a < flake->n_sites; a++)
        for (sv_index b = 0; gone[a] && b < a; b++)
            if (gone[b])
                best = fmin(best, hypot(flake->sites[a].at[0] - flake->sites[b].at[0],
                                        flake->sites[a].at[1] - flake->sites[b].at[1]));
    sv_give(test_context(), gone);
    return best;
}

/* Share left of candidates p with n neighbours: (1 − (1 − p)^(n+1))/(n + 1); on the honeycomb 12
 * other sites lie within one lattice constant and a bit (3 at 1/√3, 6 at 1, 3 at 2/√3). */
SV_TEST(minimum_distance_is_kept_at_the_share_asked_for)
{
    sv_model model = fixture_haldane(0.2, 1.0, 0.0);
    sv_flake_spec spec = fixture_cells(&model, 20, 20, false);
    sv_flake flake = fixture_flake(&model, &spec);
    sv_disorder d = {.name = "vac",
                     .type = SV_DISORDER_VACANCIES,
                     .on = -1,
                     .has_share = true,
                     .share = 0.05,
                     .distance = 1.2};
    CHECK_CLOSE(sv_disorder_share_limit(&model, &d), 1.0 / 13.0, 1e-14);
    d.on = 0;
    CHECK_CLOSE(sv_disorder_share_limit(&model, &d), 1.0 / 7.0, 1e-14);
    d.on = -1;
    mean_of share = {0};
    for (int k = 0; k < 200; k++) {
        sv_sample s = drawn(&flake, &d, k);
        add(&share, (double)s.inventory.vacancies / 800.0);
        if (k < 20)
            CHECK(nearest_pair(&flake, &s) > 1.2);
        sv_sample_free(test_context(), &s);
    }
    CHECK_CLOSE(mean(&share), 0.05, 5.0 * error(&share));
    sv_sample s = {0};
    d.share = 0.08;
    CHECK_STATUS(SV_INVALID_INPUT, sv_sample_draw(test_context(), &flake, &d, 1, 1, 0, &s));
    /* An exact number; more than the rule leaves is refused. */
    d.has_share = false;
    d.has_count = true;
    d.count = 30;
    s = drawn(&flake, &d, 0);
    CHECK_INT(s.inventory.vacancies, 30);
    CHECK(nearest_pair(&flake, &s) > 1.2);
    sv_sample_free(test_context(), &s);
    d.count = 100;
    CHECK_STATUS(SV_INVALID_INPUT, sv_sample_draw(test_context(), &flake, &d, 1, 1, 0, &s));
    sv_flake_free(test_context(), &flake);
    sv_model_free(test_context(), &model);
}

static int compare(const void *a, const void *b)
{
    double x = *(const double *)a, y = *(const double *)b;
    return x < y ? -1 : x > y;
}

/* The count is that of a full sort: the largest number taken is the count-th smallest. */
SV_TEST(counts_take_the_smallest_numbers)
{
    sv_model model = fixture_qi_wu_zhang(-1.0);
    sv_flake_spec spec = fixture_cells(&model, 30, 30, false);
    sv_flake flake = fixture_flake(&model, &spec);
    sv_stream stream = sv_stream_make(11, "vac", 4);
    double u[900], sorted[900];
    for (sv_index c = 0; c < 900; c++)
        sorted[c] = u[c] = sv_stream_uniform(&stream, flake.cells[c].i, flake.cells[c].j, 0);
    qsort(sorted, 900, sizeof *sorted, compare);
    for (int count = 1; count < 900; count += 113) {
        sv_disorder d = {.name = "vac",
                         .type = SV_DISORDER_VACANCIES,
                         .on = -1,
                         .has_count = true,
                         .count = count};
        bool vacant[900];
        sv_sample s = drawn(&flake, &d, 4);
        vacant_map(&s, &flake, vacant);
        for (sv_index c = 0; c < 900; c++)
            CHECK(vacant[c] == (u[c] <= sorted[count - 1]));
        sv_sample_free(test_context(), &s);
    }
    sv_flake_free(test_context(), &flake);
    sv_model_free(test_context(), &model);
}
