/* SPDX-License-Identifier: GPL-3.0-or-later */
/* A level on the Fermi energy: every engine notices it, and says what can be done. */
#include "fixtures.h"
#include "selvedge/ensemble.h"

typedef struct bench {
    sv_model model;
    sv_flake flake;
    sv_sample sample;
} bench;

static void draw(bench *b, const sv_disorder *d, sv_index realisation)
{
    sv_sample_free(test_context(), &b->sample);
    CHECK_OK(sv_sample_draw(test_context(), &b->flake, d, d != NULL, 5, realisation, &b->sample));
}

static void make(bench *b, sv_model model, int side)
{
    *b = (bench){.model = model};
    sv_flake_spec spec = fixture_cells(&b->model, side, side, false);
    b->flake = fixture_flake(&b->model, &spec);
}

static void release(bench *b)
{
    sv_sample_free(test_context(), &b->sample);
    sv_flake_free(test_context(), &b->flake);
    sv_model_free(test_context(), &b->model);
}

enum { N_WAYS = 4 };
static const char *const ways[N_WAYS] = {"dense", "polynomial", "one by one", "rational"};

static sv_projector_options way(int k)
{
    sv_projector_options o = sv_projector_options_default();
    o.engine = k == 0 ? SV_ENGINE_DENSE : k == 3 ? SV_ENGINE_RATIONAL : SV_ENGINE_CHEBYSHEV;
    o.half_gap = k == 1 || k == 2 ? 0.4 : 0.0;
    o.degree = k == 1 ? 61 : 0;
    o.near_states = k == 2 ? 150 : 0;
    return o;
}

static sv_outcome window_mean(const bench *b, const sv_projector_options *o,
                              const sv_occupation *occupation, sv_levels *ret_levels)
{
    sv_projector *p = NULL;
    sv_outcome outcome = sv_outcome_blank();
    sv_value window[16] = {{.present = true, .real = {0.5}}};
    CHECK_OK(sv_projector_make(test_context(), &b->sample, occupation, o, &p));
    sv_marker_input input = {
        .sample = &b->sample, .occupation = occupation, .projector = p, .values = window};
    CHECK_OK(sv_local_chern(test_context(), &input, &outcome));
    *ret_levels = *sv_projector_levels(p);
    sv_projector_free(test_context(), p);
    return outcome;
}

/*
 * M = 0, phi = 90 degrees: the spectrum is symmetric about 0 for every pattern of vacancies (with
 * real hops to neighbours and imaginary ones to next neighbours sz H* sz = -H), so an odd number of
 * sites has an exact level at 0: of a vacancy, or at the edge, far from the window.
 */
SV_TEST(zero_levels_of_vacancies_are_noticed)
{
    enum { SAMPLES = 24 };
    bench b;
    int odd = 0, even = 0;
    make(&b, fixture_haldane(0.2, M_PI / 2, 0.0), 9);
    sv_disorder d = {
        .name = "vac", .type = SV_DISORDER_VACANCIES, .on = -1, .has_share = true, .share = 0.05};
    for (int k = 0; k < SAMPLES; k++) {
        draw(&b, &d, k);
        bool ambiguous = b.sample.n % 2 == 1;
        odd += ambiguous;
        even += !ambiguous;
        for (int e = 0; e < N_WAYS; e++) {
            sv_projector_options o = way(e);
            sv_levels levels;
            sv_outcome outcome = window_mean(&b, &o, &fixture_below_zero, &levels);
            test_check(levels.on_level == ambiguous, __FILE__, __LINE__,
                       "%s, %lld sites: on_level is %d", ways[e], (long long)b.sample.n,
                       levels.on_level);
            CHECK((outcome.verdict == SV_UNRESOLVED) == ambiguous);
            if (ambiguous)
                CHECK(strstr(outcome.reason, "coincides with the Fermi energy 0") != NULL);
        }
    }
    CHECK(odd > 5 && even > 5);
    release(&b);
}

/* Right on an edge level, next to it, and in the middle of a gap; the clean flake at 0, where
 * leading blocks of the matrix are singular and no level is. */
SV_TEST(levels_are_told_from_near_ones)
{
    bench b;
    make(&b, fixture_qi_wu_zhang(-1.0), 9);
    for (int k = 0; k < 8; k++) {
        sv_disorder d = {.name = "pot", .type = SV_DISORDER_ONSITE, .on = -1, .width = 0.5 * k};
        draw(&b, &d, k);
        double *spectrum = fixture_spectrum(&b.sample);
        double below = spectrum[b.sample.n / 2 - 1], above = spectrum[b.sample.n / 2];
        const double energies[] = {below, below + 1e-9, 0.5 * (below + above), above};
        for (int e = 0; e < N_WAYS * 4; e++) {
            sv_projector_options o = way(e % N_WAYS);
            sv_occupation at = {.by = SV_BY_ENERGY, .fermi_energy = energies[e / N_WAYS]};
            sv_levels levels;
            /* The clean flake has levels in pairs at both signs: the middle is 0. */
            bool expected = e / N_WAYS == 0 || e / N_WAYS == 3;
            (void)window_mean(&b, &o, &at, &levels);
            test_check(levels.on_level == expected, __FILE__, __LINE__,
                       "%s, sample %d, energy %d: on_level is %d", ways[e % N_WAYS], k, e / N_WAYS,
                       levels.on_level);
            if (!expected && e % N_WAYS != 2) { /* one by one: those inside its interval only */
                CHECK_CLOSE(levels.highest_occupied, below, 1e-3 * (above - below));
                CHECK_CLOSE(levels.lowest_empty, above, 1e-3 * (above - below));
                CHECK_INT(levels.occupied, b.sample.n / 2);
            }
        }
        sv_give(test_context(), spectrum);
    }
    release(&b);
    make(&b, fixture_haldane(0.2, M_PI / 2, 0.0), 8);
    draw(&b, NULL, 0);
    for (int e = 0; e < N_WAYS; e++) {
        sv_projector_options o = way(e);
        sv_levels levels;
        CHECK(window_mean(&b, &o, &fixture_below_zero, &levels).verdict == SV_RESOLVED);
        /* A polynomial of half gap 0.4 leaves the edge levels unresolved, and knows it. */
        CHECK(levels.gap_resolved == (e != 1));
        CHECK(e == 1 ? levels.resolved_from == 0.4 : levels.resolved_from < 0.1);
    }
    release(&b);
}

/* Half filling of a pair of zero levels: advice that helps, and too many electrons. */
SV_TEST(fillings_that_cut_a_level)
{
    bench b;
    make(&b, fixture_haldane(0.0, 0.0, 0.0), 6);
    sv_mark marks[2] = {{.by_cell = true, .cell = {2, 2}, .orbital = 0},
                        {.by_cell = true, .cell = {4, 3}, .orbital = 0}};
    sv_disorder d = {.name = "hole",
                     .type = SV_DISORDER_VACANCIES,
                     .on = -1,
                     .has_marks = true,
                     .marks = marks,
                     .n_marks = 2,
                     .tolerance = 0.1};
    draw(&b, &d, 0); /* two sites of one sublattice missing: at least two levels at 0 */
    sv_occupation half = {.by = SV_BY_FILLING, .filling = 0.5};
    sv_occupation many = {.by = SV_BY_ELECTRONS, .electrons = b.sample.n + 1};
    for (int e = 0; e < N_WAYS; e++) {
        sv_projector_options o = way(e);
        sv_levels levels;
        sv_projector *p = NULL;
        sv_outcome outcome = window_mean(&b, &o, &half, &levels);
        CHECK(levels.on_level && levels.by_count && outcome.verdict == SV_UNRESOLVED);
        test_check(strstr(outcome.reason, "only in part") != NULL &&
                       strstr(outcome.reason, "filling") == NULL,
                   __FILE__, __LINE__, "%s: %s", ways[e], outcome.reason);
        CHECK_STATUS(SV_UNDEFINED, sv_projector_make(test_context(), &b.sample, &many, &o, &p));
    }
    release(&b);
}

/* The plan and the ensemble: unresolved ones are counted, whatever the engine, and the mean runs
 * over the same others. A plain polynomial is still chosen: realisation 0 has an odd number. */
SV_TEST(averages_agree_on_what_is_unresolved)
{
    enum { SAMPLES = 8, ENGINES = 3 };
    bench b;
    make(&b, fixture_haldane(0.2, M_PI / 2, 0.0), 14);
    sv_disorder d = {
        .name = "vac", .type = SV_DISORDER_VACANCIES, .on = -1, .has_share = true, .share = 0.01};
    const sv_engine engines[] = {SV_ENGINE_DENSE, SV_ENGINE_CHEBYSHEV, SV_ENGINE_RATIONAL};
    sv_outcome first[SAMPLES];
    for (int e = 0; e < ENGINES; e++) {
        sv_case point = {.open_flake = &b.flake,
                         .disorder = &d,
                         .n_disorder = 1,
                         .occupation = fixture_below_zero,
                         .solve = sv_projector_options_default(),
                         .seed = 7,
                         .n_markers = 1};
        sv_plan plan;
        point.solve.engine = engines[e];
        point.solve.accuracy = 0.03;
        point.markers[0] = (sv_marker_request){.marker = sv_marker_find("local_chern"),
                                               .values = {{.present = true, .real = {0.3}}}};
        CHECK_OK(sv_case_plan(test_context(), &point, false, 0.005, &plan));
        for (int k = 0; k < SAMPLES; k++) {
            sv_record record;
            CHECK_OK(sv_realise(test_context(), &point, k, NULL, NULL, &record));
            const sv_outcome *o = &record.outcomes[0];
            CHECK((o->verdict == SV_UNRESOLVED) == (record.sites % 2 == 1));
            if (e == 0)
                first[k] = *o;
            CHECK_INT(o->verdict, first[k].verdict);
            if (o->verdict == SV_RESOLVED)
                CHECK_CLOSE(o->value, first[k].value, o->numerical_error + 1e-9);
        }
    }
    release(&b);
}
