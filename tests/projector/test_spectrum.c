/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The spectrum of one sample: counts, gap, near states, level statistics, density. */
#include "fixtures.h"
#include "selvedge/projector.h"

typedef struct bench {
    sv_model model;
    sv_flake flake;
    sv_sample sample;
    sv_spectrum spectrum;
} bench;

static void make_flake(bench *b, sv_model model, int n1, int n2, bool periodic)
{
    *b = (bench){.model = model};
    sv_flake_spec spec = fixture_cells(&b->model, n1, n2, periodic);
    b->flake = fixture_flake(&b->model, &spec);
}

static void draw(bench *b, double width, double share, uint64_t seed)
{
    sv_disorder d[2] = {{.name = "pot", .type = SV_DISORDER_ONSITE, .on = -1, .width = width},
                        {.name = "vac",
                         .type = SV_DISORDER_VACANCIES,
                         .on = -1,
                         .has_share = true,
                         .share = share}};
    CHECK_OK(sv_sample_draw(test_context(), &b->flake, d, 2, seed, 0, &b->sample));
}

static void analyse(bench *b, sv_occupation occupation, sv_index exact_sites)
{
    sv_spectrum_options options = sv_spectrum_options_default();
    options.exact_sites = exact_sites;
    CHECK_OK(sv_spectrum_make(test_context(), &b->sample, &occupation, &options, &b->spectrum));
}

static void release(bench *b)
{
    sv_spectrum_free(test_context(), &b->spectrum);
    sv_sample_free(test_context(), &b->sample);
    sv_flake_free(test_context(), &b->flake);
    sv_model_free(test_context(), &b->model);
}

static const sv_occupation at_zero = {.by = SV_BY_ENERGY};

/* Both routes, and both against the eigenvalues. */
SV_TEST(counted_and_exact_levels_agree)
{
    const sv_occupation occupations[] = {{.by = SV_BY_ENERGY, .fermi_energy = 0.1},
                                         {.by = SV_BY_FILLING, .filling = 0.4},
                                         {.by = SV_BY_ELECTRONS, .electrons = 7}};
    for (int k = 0; k < 9; k++) {
        bench b;
        make_flake(&b, fixture_haldane(0.2, 0.9, 0.1), 9, 8, k % 2);
        draw(&b, 0.8 * k, 0.02, (uint64_t)k);
        double *levels = fixture_spectrum(&b.sample);
        analyse(&b, occupations[k % 3], 400);
        sv_spectrum exact = b.spectrum;
        analyse(&b, occupations[k % 3], 0);
        const sv_spectrum *s = &b.spectrum;
        CHECK(exact.exact && !s->exact && !s->on_level);
        CHECK_INT(s->states_below, exact.states_below);
        CHECK_CLOSE(exact.highest_occupied, levels[s->states_below - 1], 1e-12);
        CHECK_CLOSE(exact.lowest_empty, levels[s->states_below], 1e-12);
        CHECK_CLOSE(s->highest_occupied, exact.highest_occupied, 1e-9);
        CHECK_CLOSE(s->gap, exact.gap, 2e-9);
        CHECK_CLOSE(s->fermi_energy, exact.fermi_energy, 1e-9);
        CHECK(s->bounds[0] <= levels[0] && s->bounds[1] >= levels[b.sample.n - 1]);
        CHECK(exact.n_near == 16 && s->n_near >= 8 && s->n_near <= 24);
        int both = 0;
        for (int e = 0; e < exact.n_near; e++) /* the same states where both have them */
            for (int f = 0; f < s->n_near; f++)
                if (fabs(exact.near[e].energy - s->near[f].energy) < 1e-10) {
                    both++;
                    CHECK_CLOSE(s->near[f].participation, exact.near[e].participation, 1e-6);
                    CHECK(k % 2 ? isnan(s->near[f].edge_weight)
                                : fabs(s->near[f].edge_weight - exact.near[e].edge_weight) < 1e-6);
                }
        CHECK(both >= 8);
        int next_to = 0; /* the interval is about the Fermi energy */
        for (int f = 0; f < s->n_near; f++)
            next_to += fabs(s->near[f].energy - exact.highest_occupied) < 1e-9 ||
                       fabs(s->near[f].energy - exact.lowest_empty) < 1e-9;
        CHECK_INT(next_to, 2);
        sv_spectrum_free(test_context(), &exact);
        sv_give(test_context(), levels);
        release(&b);
    }
}

SV_TEST(nothing_or_everything_occupied)
{
    for (int exact = 0; exact < 2; exact++) {
        bench b;
        make_flake(&b, fixture_qi_wu_zhang(-1.0), 6, 6, false);
        draw(&b, 1.0, 0.0, 1);
        analyse(&b, (sv_occupation){.by = SV_BY_ELECTRONS, .electrons = 0}, exact ? 400 : 0);
        CHECK(b.spectrum.states_below == 0 && isnan(b.spectrum.highest_occupied));
        CHECK(isnan(b.spectrum.gap) && isfinite(b.spectrum.lowest_empty));
        CHECK(strstr(b.spectrum.reason, "no state") != NULL && !b.spectrum.on_level);
        sv_spectrum_free(test_context(), &b.spectrum);
        analyse(&b, (sv_occupation){.by = SV_BY_ENERGY, .fermi_energy = 50.0}, exact ? 400 : 0);
        CHECK(b.spectrum.states_below == 72 && isnan(b.spectrum.lowest_empty));
        CHECK(strstr(b.spectrum.reason, "all states") != NULL);
        sv_spectrum_free(test_context(), &b.spectrum);
        sv_occupation too_many = {.by = SV_BY_ELECTRONS, .electrons = 73};
        sv_spectrum_options options = sv_spectrum_options_default();
        CHECK_STATUS(SV_UNDEFINED,
                     sv_spectrum_make(test_context(), &b.sample, &too_many, &options, &b.spectrum));
        release(&b);
    }
}

/* Haldane's model with M = 0, φ = π/2 has E ↔ −E on every flake with any vacancies; an odd number
 * of sites leaves a level at zero (arXiv:2401.11871, recalled from memory; the counting is
 * elementary). */
SV_TEST(a_zero_mode_is_on_the_fermi_energy)
{
    int odd = 0;
    for (uint64_t seed = 1; seed < 9; seed++)
        for (int exact = 0; exact < 2; exact++) {
            bench b;
            make_flake(&b, fixture_haldane(0.2, M_PI / 2.0, 0.0), 8, 8, false);
            draw(&b, 0.0, 0.05, seed);
            double *levels = fixture_spectrum(&b.sample);
            sv_index n = b.sample.n;
            for (sv_index k = 0; k < n; k++)
                CHECK_CLOSE(levels[k] + levels[n - 1 - k], 0.0, 1e-12);
            analyse(&b, at_zero, exact ? 400 : 0);
            if (n % 2 == 1) {
                odd++;
                CHECK(b.spectrum.on_level && b.spectrum.states_below == -1);
                CHECK(isnan(b.spectrum.gap) && strstr(b.spectrum.reason, "coincides") != NULL);
            } else if (levels[n / 2] > 1e-9) {
                CHECK(!b.spectrum.on_level);
                CHECK_INT(b.spectrum.states_below, n / 2);
                CHECK_CLOSE(b.spectrum.gap, 2.0 * levels[n / 2], 1e-9);
            }
            sv_give(test_context(), levels);
            release(&b);
        }
    CHECK(odd >= 4 && odd <= 14);
}

/* A filling that cuts the zero-energy shell of the clean square lattice. */
SV_TEST(a_cut_degenerate_level_is_said)
{
    for (int exact = 0; exact < 2; exact++) {
        bench b;
        make_flake(&b, fixture_hofstadter(0, 1), 6, 6, true);
        draw(&b, 0.0, 0.0, 1);
        analyse(&b, (sv_occupation){.by = SV_BY_FILLING, .filling = 0.5}, exact ? 400 : 0);
        CHECK(b.spectrum.on_level && b.spectrum.states_below == -1);
        release(&b);
    }
}

/* States of a clean torus of one orbital have |ψ|² = 1/N or combine few plane waves; a state on one
 * site has 1. Two orbitals at one position count together. */
SV_TEST(participation_and_edge_weight)
{
    bench b;
    make_flake(&b, fixture_qi_wu_zhang(-1.0), 14, 14, false);
    draw(&b, 0.0, 0.0, 1);
    analyse(&b, at_zero, 400);
    CHECK_INT(b.spectrum.n_near, 16);
    for (int k = 0; k < 16; k++) { /* in the gap: edge states of a topological flake */
        CHECK(b.spectrum.near[k].edge_weight > 0.8 && b.spectrum.near[k].edge_weight < 1.0);
        CHECK(b.spectrum.near[k].participation > 1.0 / 196 &&
              b.spectrum.near[k].participation < 0.1);
        CHECK(k == 0 || b.spectrum.near[k - 1].energy <= b.spectrum.near[k].energy);
    }
    release(&b);
    /* Without hops every state sits on one position: QWZ of mass 1e6 is as good as that. */
    make_flake(&b, fixture_qi_wu_zhang(1e6), 6, 6, false);
    draw(&b, 1e5, 0.0, 1);
    analyse(&b, at_zero, 400);
    for (int k = 0; k < b.spectrum.n_near; k++) {
        CHECK_CLOSE(b.spectrum.near[k].participation, 1.0, 0.01);
        double edge = b.spectrum.near[k].edge_weight; /* in the middle 2×2 cells or not */
        CHECK(edge < 0.01 || edge > 0.99);
    }
    release(&b);
}

/* Independent levels: Y. Y. Atas, E. Bogomolny, O. Giraud, G. Roux, PRL 110, 084101 (2013):
 * ⟨r⟩ = 2 ln 2 − 1 = 0.386294 (value recalled from memory). Disorder of 60 hops localises every
 * state on one site. */
SV_TEST(localised_levels_are_poissonian)
{
    double sum = 0.0, squares = 0.0;
    const int samples = 40;
    for (int k = 0; k < samples; k++) {
        bench b;
        make_flake(&b, fixture_hofstadter(1, 4), 16, 16, true);
        draw(&b, 60.0, 0.0, (uint64_t)k + 1);
        analyse(&b, at_zero, 400);
        CHECK_INT(b.spectrum.gap_ratio_levels, 128);
        CHECK(b.spectrum.gap_ratio_error > 0.01 && b.spectrum.gap_ratio_error < 0.05);
        sum += b.spectrum.gap_ratio;
        squares += b.spectrum.gap_ratio * b.spectrum.gap_ratio;
        release(&b);
    }
    double mean = sum / samples, error = sqrt((squares / samples - mean * mean) / (samples - 1.0));
    test_check(fabs(mean - 0.386294) < 3.0 * error && error < 0.006, __FILE__, __LINE__,
               "Poisson: %.4f(%.4f)", mean, error);
}

/* Extended states without time reversal: the unitary ensemble. Tested is the large-N value of the
 * same paper, 0.5996(1) (recalled from memory), not the 3×3 surmise 0.602658. Flux and a disorder
 * that closes the gaps, in a torus much shorter than the localisation length. */
SV_TEST(extended_levels_repel_as_in_the_unitary_ensemble)
{
    double sum = 0.0, squares = 0.0;
    const int samples = 40;
    for (int k = 0; k < samples; k++) {
        bench b;
        make_flake(&b, fixture_hofstadter(1, 4), 16, 16, true);
        draw(&b, 3.0, 0.0, (uint64_t)k + 1);
        analyse(&b, at_zero, 400);
        sum += b.spectrum.gap_ratio;
        squares += b.spectrum.gap_ratio * b.spectrum.gap_ratio;
        release(&b);
    }
    double mean = sum / samples, error = sqrt((squares / samples - mean * mean) / (samples - 1.0));
    test_check(fabs(mean - 0.5996) < 3.0 * error && error < 0.006, __FILE__, __LINE__,
               "unitary: %.4f(%.4f)", mean, error);
}

SV_TEST(gap_ratio_of_given_levels)
{
    double mean, error;
    /* Spacings 1, 2, 1, 4: ratios 1/2, 1/2, 1/4; the repeated level counts once. */
    const double levels[] = {0.0, 1.0, 1.0 + 1e-12, 3.0, 4.0, 8.0};
    CHECK_INT(sv_gap_ratio(levels, 6, 1e-9, &mean, &error), 5);
    CHECK_CLOSE(mean, 5.0 / 12.0, 1e-12);
    CHECK(error > 0.0 && error < 0.2);
    CHECK_INT(sv_gap_ratio(levels, 2, 1e-9, &mean, &error), 2);
    CHECK(isnan(mean) && isnan(error));
    CHECK_INT(sv_gap_ratio(levels, 0, 1e-9, &mean, &error), 0);
    CHECK(isnan(mean));
}

/* Σ density·E^k·step */
static double integral(const sv_spectrum *s, int power)
{
    double sum = 0.0, step = s->energies[1] - s->energies[0];
    for (sv_index e = 0; e < s->n_density; e++)
        sum += s->density[e] * pow(s->energies[e], power) * step;
    return sum;
}

/* Graphene of hop t = 1: levels in [−3, 3], moments 1, 0, 3, 0, 15 (closed walks on the honeycomb
 * lattice, OEIS A002893; recalled from memory), density per site |E|/(√3 π) near zero (A. H.
 * Castro Neto et al., Rev. Mod. Phys. 81, 109 (2009), Eq. (14) and below, per cell without spin
 * 2|E|/(√3 π); recalled from memory). */
SV_TEST(density_of_graphene)
{
    bench b;
    make_flake(&b, fixture_haldane(0.0, 0.0, 0.0), 60, 60, true);
    draw(&b, 0.0, 0.0, 1);
    analyse(&b, (sv_occupation){.by = SV_BY_ENERGY, .fermi_energy = 0.123}, 400);
    const sv_spectrum *s = &b.spectrum;
    CHECK(s->bounds[0] <= -3.0 && s->bounds[0] > -3.04);
    CHECK(s->bounds[1] >= 3.0 && s->bounds[1] < 3.04);
    double sigma = s->density_resolution;
    CHECK_CLOSE(sigma, M_PI / 512 * 3.06, 0.001);
    CHECK(s->density_error > 0.0 && s->density_error < 0.02);
    CHECK_CLOSE(integral(s, 0), 1.0, 1e-3);
    CHECK_CLOSE(integral(s, 1), 0.0, 0.02);
    CHECK_CLOSE(integral(s, 2), 3.0, 0.02); /* random phases: √(var E²/(16·4·7200)) = 0.004 */
    CHECK_CLOSE(integral(s, 4), 15.0, 0.15);
    double slope = 0.0, peak = 0.0, peak_at = 0.0, outside = 0.0;
    int used = 0;
    for (sv_index e = 0; e < s->n_density; e++) {
        double energy = fabs(s->energies[e]);
        if (energy > 0.2 && energy < 0.5) {
            slope += s->density[e] / energy;
            used++;
        }
        if (s->density[e] > peak) {
            peak = s->density[e];
            peak_at = energy;
        }
        outside = energy > 3.0 + 4.0 * sigma ? fmax(outside, s->density[e]) : outside;
    }
    /* The band bends: at 0.35 the density is 3 % above the cone. */
    CHECK_CLOSE(slope / used, 1.0 / (sqrt(3.0) * M_PI), 0.08 / (sqrt(3.0) * M_PI));
    CHECK_CLOSE(peak_at, 1.0, 2.0 * sigma); /* van Hove */
    CHECK(outside < 1e-3);
    release(&b);
}

/* All three routes to the density say the same within their errors. */
SV_TEST(density_by_eigenvalues_and_by_moments)
{
    bench b;
    make_flake(&b, fixture_haldane(0.2, 0.9, 0.1), 12, 12, false);
    draw(&b, 1.0, 0.03, 4);
    sv_spectrum_options options = sv_spectrum_options_default();
    options.moments = 200;
    CHECK_OK(sv_spectrum_make(test_context(), &b.sample, &at_zero, &options, &b.spectrum));
    sv_spectrum exact = b.spectrum;
    CHECK_TEXT(exact.method, "all eigenvalues");
    CHECK(exact.density_error == 0.0);
    CHECK_CLOSE(integral(&exact, 0), 1.0, 2e-3);
    options.exact_sites = 0;
    CHECK_OK(sv_spectrum_make(test_context(), &b.sample, &at_zero, &options, &b.spectrum));
    CHECK_TEXT(b.spectrum.method, "Chebyshev moments, exact trace");
    CHECK(b.spectrum.density_error == 0.0);
    CHECK_CLOSE(integral(&b.spectrum, 0), 1.0, 2e-3);
    CHECK_CLOSE(integral(&b.spectrum, 2), integral(&exact, 2), 1e-2);
    sv_spectrum_free(test_context(), &exact);
    release(&b);
}

/* Too many sites to count: bounds and density remain, the rest says why not. */
SV_TEST(large_samples_are_not_counted)
{
    bench b;
    make_flake(&b, fixture_qi_wu_zhang(-1.0), 8, 8, false);
    draw(&b, 1.0, 0.0, 1);
    sv_spectrum_options options = sv_spectrum_options_default();
    options.exact_sites = 0;
    options.count_sites = 100;
    CHECK_OK(sv_spectrum_make(test_context(), &b.sample, &at_zero, &options, &b.spectrum));
    CHECK(b.spectrum.states_below == -1 && isnan(b.spectrum.gap) && b.spectrum.n_near == 0);
    CHECK(strstr(b.spectrum.reason, "up to 100 sites") != NULL);
    CHECK(b.spectrum.near_reason[0] != '\0' && b.spectrum.gap_ratio_reason[0] != '\0');
    CHECK(b.spectrum.n_density > 600 && !b.spectrum.on_level);
    release(&b);
}

SV_TEST(the_forecast_of_memory_follows_the_routes)
{
    CHECK(sv_spectrum_bytes(400) > 400.0 * 400.0 * 32.0); /* matrix and vectors of LAPACK */
    CHECK(sv_spectrum_bytes(100000) > 81.0 * 16.0 * 1e5); /* a Lanczos basis */
    CHECK(sv_spectrum_bytes(1000000) > 512.0 * 1e6);      /* two panels */
    CHECK(sv_spectrum_bytes(1000000) < 2e9);
}

static long allowed;
static sv_allocator inner;

static void *scarce_take(size_t bytes, void *user)
{
    return allowed-- > 0 ? inner.take(bytes, user) : NULL;
}

/* The k-th allocation fails, k = 0, 1, 2, …: a status, nothing returned, no leak (the harness
 * counts). */
SV_TEST(every_allocation_may_fail)
{
    bench b;
    make_flake(&b, fixture_qi_wu_zhang(-1.0), 5, 5, false);
    draw(&b, 1.0, 0.0, 1);
    sv_context *context = test_context();
    inner = context->allocator;
    context->allocator.take = scarce_take;
    for (int exact = 0; exact < 2; exact++) {
        sv_spectrum_options options = sv_spectrum_options_default();
        options.exact_sites = exact ? 400 : 0;
        sv_status status = SV_NO_MEMORY;
        long k = 0;
        for (; status != SV_OK && k < 1000; k++) {
            allowed = k;
            status = sv_spectrum_make(context, &b.sample, &at_zero, &options, &b.spectrum);
            CHECK(status == SV_OK || (status == SV_NO_MEMORY && b.spectrum.near == NULL));
        }
        CHECK(status == SV_OK && k > 10);
        sv_spectrum_free(context, &b.spectrum);
    }
    context->allocator = inner;
    release(&b);
}
