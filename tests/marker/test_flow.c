/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Spectral flow through rings: sign, both edges, holes of any shape, disorder, honest verdicts. */
#include "fixtures.h"

static sv_outcome flow_of(const sv_model *model, const sv_flake_spec *spec,
                          const sv_disorder *disorder, int n_disorder, uint64_t seed,
                          const sv_occupation *occupation, int steps)
{
    sv_context *c = test_context();
    sv_outcome o = sv_outcome_blank();
    sv_flake flake = fixture_flake(model, spec);
    sv_sample sample = {0};
    CHECK_OK(sv_sample_draw(c, &flake, disorder, n_disorder, seed, 0, &sample));
    sv_value values[2] = {{.present = true, .integer = {steps}},
                          {.present = true, .has_auto = true}};
    sv_marker_input input = {.sample = &sample, .occupation = occupation, .values = values};
    CHECK_OK(sv_spectral_flow(c, &input, &o));
    sv_sample_free(c, &sample);
    sv_flake_free(c, &flake);
    return o;
}

static const sv_flake_spec ring = {.shape = SV_SHAPE_ANNULUS, .inner = 2.5, .outer = 8.0};

SV_TEST(holes)
{
    const double corners[] = {0, 0, 12, 0, 12, 12, 0, 12, 3, 3, 9, 3, 9, 9, 8, 9, 8, 4, 3, 4};
    const int32_t one[] = {0, 4, 10}, two[] = {0, 4, 7, 10};
    const double pair[] = {0, 0, 12, 0, 12, 12, 0, 12, 3, 3, 5, 3, 4, 5, 7, 7, 9, 7, 8, 9};
    sv_model model = fixture_qi_wu_zhang(-1.0);
    sv_flake_spec specs[] = {
        ring,
        {.shape = SV_SHAPE_POLYGON, .polygon = {corners, one, 2}}, /* an L-shaped hole */
        {.shape = SV_SHAPE_POLYGON, .polygon = {pair, two, 3}},
        {.shape = SV_SHAPE_DISC, .has_radius = true, .radius = 5.0}};
    for (int k = 0; k < 4; k++) {
        double at[2] = {0, 0};
        sv_flake flake = fixture_flake(&model, &specs[k]);
        CHECK_INT(sv_flake_hole(&flake, at), k < 2);
        if (k == 1) { /* in the hole, away from its edges */
            bool lower = at[0] > 3.2 && at[0] < 8.8 && at[1] > 3.2 && at[1] < 3.8;
            bool right = at[0] > 8.2 && at[0] < 8.8 && at[1] > 3.2 && at[1] < 8.8;
            CHECK(lower || right);
            CHECK(sv_flake_by_hole(&flake, (const double[2]){6.0, 5.0}));
            CHECK(!sv_flake_by_hole(&flake, (const double[2]){1.0, 6.0}));
        }
        if (k == 0) {
            CHECK(sv_flake_by_hole(&flake, (const double[2]){0.0, -5.2}));
            CHECK(!sv_flake_by_hole(&flake, (const double[2]){3.8, 3.8}));
        }
        if (k == 3)
            CHECK(!sv_flake_by_hole(&flake, (const double[2]){0.0, 0.0}));
        sv_flake_free(test_context(), &flake);
    }
    sv_model_free(test_context(), &model);
}

/* +C on both phases and in the trivial one, on two models and lattices. */
SV_TEST(flow_is_the_chern_number)
{
    const double masses[] = {-1.0, 1.0, 3.0};
    for (int k = 0; k < 3; k++) {
        sv_model model = fixture_qi_wu_zhang(masses[k]);
        sv_outcome o = flow_of(&model, &ring, NULL, 0, 1, &fixture_below_zero, 16);
        CHECK_INT(o.verdict, SV_RESOLVED);
        CHECK_INT(o.index, fixture_link_chern(&model, 1, 20));
        CHECK(o.margin > 0.9 && o.weakest >= 0.8);
        sv_model_free(test_context(), &model);
    }
    for (int sign = 1; sign >= -1; sign -= 2) {
        sv_model model = fixture_haldane(0.2, sign * M_PI / 2, 0.0);
        const sv_occupation half = {.by = SV_BY_FILLING, .filling = 0.5};
        sv_outcome o = flow_of(&model, &ring, NULL, 0, 1, &half, 16);
        CHECK_INT(o.verdict, SV_RESOLVED);
        CHECK_INT(o.index, sign);
        sv_model_free(test_context(), &model);
    }
}

/* TKNN integers of flux 1/5 (1982) at the middle of the two lower gaps: 1 and 2. */
SV_TEST(flow_of_hofstadter_gaps)
{
    sv_model model = fixture_hofstadter(1, 5);
    const sv_flake_spec wide = {.shape = SV_SHAPE_ANNULUS, .inner = 3.0, .outer = 14.0};
    for (int gap = 1; gap <= 2; gap++) {
        double edges[2];
        CHECK_OK(sv_model_filling_gap(test_context(), &model, 0.2 * gap, 1e-6, edges));
        const sv_occupation middle = {.by = SV_BY_ENERGY,
                                      .fermi_energy = 0.5 * (edges[0] + edges[1])};
        sv_outcome o = flow_of(&model, &wide, NULL, 0, 1, &middle, 16);
        if (gap == 1)
            CHECK_INT(o.verdict, SV_RESOLVED);
        CHECK(o.verdict != SV_RESOLVED || o.index == gap);
    }
    sv_model_free(test_context(), &model);
}

/* The number of steps to begin with changes nothing: they are halved where needed. */
SV_TEST(steps_do_not_matter)
{
    sv_model model = fixture_qi_wu_zhang(-1.0);
    for (int steps = 1; steps <= 64; steps *= 4) {
        sv_outcome o = flow_of(&model, &ring, NULL, 0, 1, &fixture_below_zero, steps);
        CHECK_INT(o.verdict, SV_RESOLVED);
        CHECK_INT(o.index, 1);
    }
    sv_model_free(test_context(), &model);
}

SV_TEST(polygon_with_a_hole_off_centre)
{
    const double corners[] = {0, 0, 16, 0, 16, 14, 0, 14, 5, 5, 10, 5, 10, 9, 5, 9};
    const int32_t start[] = {0, 4, 8};
    const sv_flake_spec spec = {.shape = SV_SHAPE_POLYGON, .polygon = {corners, start, 2}};
    for (int sign = 1; sign >= -1; sign -= 2) {
        sv_model model = fixture_qi_wu_zhang(-sign);
        sv_outcome o = flow_of(&model, &spec, NULL, 0, 1, &fixture_below_zero, 16);
        CHECK_INT(o.verdict, SV_RESOLVED);
        CHECK_INT(o.index, sign);
        sv_model_free(test_context(), &model);
    }
}

SV_TEST(verdicts)
{
    sv_model model = fixture_qi_wu_zhang(-1.0);
    const sv_flake_spec disc = {.shape = SV_SHAPE_DISC, .has_radius = true, .radius = 6.0};
    sv_outcome o = flow_of(&model, &disc, NULL, 0, 1, &fixture_below_zero, 16);
    CHECK_INT(o.verdict, SV_ABSENT);
    CHECK(strstr(o.reason, "one hole") != NULL);
    sv_flake flake = fixture_flake(&model, &ring);
    sv_sample sample = {0};
    CHECK_OK(sv_sample_draw(test_context(), &flake, NULL, 0, 1, 0, &sample));
    double *levels = fixture_spectrum(&sample);
    const sv_occupation on_level = {.by = SV_BY_ENERGY, .fermi_energy = levels[sample.n / 2]};
    o = flow_of(&model, &ring, NULL, 0, 1, &on_level, 16);
    CHECK_INT(o.verdict, SV_UNRESOLVED);
    CHECK(strstr(o.reason, "coincides") != NULL);
    sv_give(test_context(), levels);
    sv_sample_free(test_context(), &sample);
    sv_flake_free(test_context(), &flake);
    /* A ring one cell wide has no two edges. */
    const sv_flake_spec thin = {.shape = SV_SHAPE_ANNULUS, .inner = 4.0, .outer = 5.2};
    o = flow_of(&model, &thin, NULL, 0, 1, &fixture_below_zero, 16);
    CHECK(o.verdict != SV_RESOLVED || o.index == 0);
    sv_model_free(test_context(), &model);
}

/* 78 disordered rings and 26 trivial ones, vacancies in half of them: none wrong. */
/* Followed again from the trace alone: C levels rise through the Fermi energy at the hole per
 * quantum, and as many fall at the outline. */
SV_TEST(trace_holds_the_levels_behind_the_index)
{
    sv_context *c = test_context();
    sv_model model = fixture_qi_wu_zhang(-1.0);
    sv_flake flake = fixture_flake(&model, &ring);
    sv_sample sample = {0};
    sv_outcome plain, traced;
    sv_flow_trace trace = {0};
    CHECK_OK(sv_sample_draw(c, &flake, NULL, 0, 1, 0, &sample));
    sv_value values[2] = {{.present = true, .integer = {64}}, {.present = true, .has_auto = true}};
    sv_marker_input input = {
        .sample = &sample, .occupation = &fixture_below_zero, .values = values};
    CHECK_OK(sv_spectral_flow(c, &input, &plain));
    CHECK_OK(sv_spectral_flow_trace(c, &input, &traced, &trace));
    CHECK_INT(traced.index, plain.index);
    CHECK(traced.margin == plain.margin && traced.weakest == plain.weakest);
    CHECK(trace.fluxes >= 65 && trace.most >= 2 && trace.count >= 2 * trace.fluxes);
    /* A quantum is a gauge transformation: the levels come back. */
    double first = trace.levels[0].flux, last = trace.levels[trace.count - 1].flux;
    CHECK_CLOSE(last - first, 1.0, 1e-12);
    /* Steps this small move a level by a small part of the spacing: it is the nearest one. */
    int rise[2] = {0, 0};
    for (sv_index from = 0, to = 0, end; to < trace.count; from = to, to = end) {
        for (end = to; end < trace.count && trace.levels[end].flux == trace.levels[to].flux;)
            end++;
        for (sv_index a = from; a < to; a++) {
            const sv_flow_level *l = &trace.levels[a];
            double there = INFINITY;
            int side = l->hole_weight < 0.5;
            CHECK(l->hole_weight > -1e-9 && l->hole_weight < 1.0 + 1e-9);
            for (sv_index b = to; b < end; b++)
                if ((trace.levels[b].hole_weight < 0.5) == side &&
                    fabs(trace.levels[b].energy - l->energy) < fabs(there - l->energy))
                    there = trace.levels[b].energy;
            rise[side] += isfinite(there) ? (there > 0.0) - (l->energy > 0.0) : 0;
        }
    }
    CHECK_INT(rise[0], plain.index);
    CHECK_INT(rise[1], -plain.index);
    sv_flow_trace_free(c, &trace);
    sv_sample_free(c, &sample);
    sv_flake_free(c, &flake);
    sv_model_free(c, &model);
}

SV_TEST(flow_under_disorder)
{
    int resolved = 0;
    for (int width = 1; width <= 4; width++)
        for (int seed = 1; seed <= 26; seed++) {
            sv_model model = fixture_qi_wu_zhang(width == 4 ? 3.0 : -1.0);
            const sv_disorder disorder[] = {{.name = "pot",
                                             .type = SV_DISORDER_ONSITE,
                                             .width = width == 4 ? 2.0 : width,
                                             .per_cell = true,
                                             .on = -1},
                                            {.name = "vac",
                                             .type = SV_DISORDER_VACANCIES,
                                             .has_share = true,
                                             .share = seed % 2 == 0 ? 0.02 : 0.0,
                                             .on = -1}};
            sv_outcome o =
                flow_of(&model, &ring, disorder, 2, (uint64_t)seed, &fixture_below_zero, 16);
            if (o.verdict == SV_RESOLVED)
                test_check(o.index == (width < 4), __FILE__, __LINE__, "width %d seed %d: %lld",
                           width, seed, (long long)o.index);
            resolved += o.verdict == SV_RESOLVED;
            sv_model_free(test_context(), &model);
        }
    test_check(resolved >= 65, __FILE__, __LINE__, "only %d of 104 are resolved", resolved);
}
