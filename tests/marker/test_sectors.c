/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Three-sector and crosshair markers: sign and convergence against integers from link variables. */
#include "fixtures.h"
#include "selvedge/ensemble.h"

static double value_of(const char *name, const sv_model *model, int side, double radius)
{
    sv_flake_spec spec = fixture_cells(model, side, side, false);
    sv_flake flake = fixture_flake(model, &spec);
    sv_sample sample = {0};
    sv_projector *p = NULL;
    sv_projector_options o = sv_projector_options_default();
    sv_outcome outcome = sv_outcome_blank();
    CHECK_OK(sv_sample_draw(test_context(), &flake, NULL, 0, 1, 0, &sample));
    CHECK_OK(sv_projector_make(test_context(), &sample, &fixture_below_zero, &o, &p));
    sv_value values[2] = {{.present = true, .has_auto = true},
                          {.present = true, .has_auto = radius <= 0.0, .real = {radius}}};
    sv_marker_input input = {
        .sample = &sample, .occupation = &fixture_below_zero, .projector = p, .values = values};
    bool crosshair = strcmp(name, "crosshair") == 0;
    CHECK_OK(crosshair ? sv_crosshair(test_context(), &input, &outcome)
                       : sv_three_sector(test_context(), &input, &outcome));
    CHECK(outcome.verdict == SV_RESOLVED && outcome.numerical_error < 1e-9);
    sv_projector_free(test_context(), p);
    sv_sample_free(test_context(), &sample);
    sv_flake_free(test_context(), &flake);
    return outcome.value;
}

/* Independent computation: half-BHZ, disc r < 6.5 on 12 to 16 cells, −ν = 0.99997 for m = −1 (their
 * table has −0.99997 with +C = 1), opposite for m = +1, 0 for m = 3. */
SV_TEST(sectors_and_crosshair_have_the_sign_of_the_chern_number)
{
    const double masses[] = {-1.0, 1.0, 3.0};
    const int expected[] = {1, -1, 0};
    for (int k = 0; k < 3; k++) {
        sv_model model = fixture_qi_wu_zhang(masses[k]);
        CHECK_INT(fixture_link_chern(&model, 1, 20), expected[k]);
        CHECK_CLOSE(value_of("three_sector", &model, 16, 6.5), expected[k], 2e-3);
        CHECK_CLOSE(value_of("crosshair", &model, 16, 6.5), expected[k], 2e-3);
        sv_model_free(test_context(), &model);
    }
    for (int sign = 1; sign >= -1; sign -= 2) {
        sv_model model = fixture_haldane(0.2, sign * M_PI / 2, 0.0);
        CHECK_CLOSE(value_of("three_sector", &model, 14, 0.0), sign, 1e-2);
        CHECK_CLOSE(value_of("crosshair", &model, 14, 0.0), sign, 1e-2);
        sv_model_free(test_context(), &model);
    }
}

/* Kitaev 2006: the sum over a whole finite sample is 0. */
SV_TEST(the_whole_flake_sums_to_zero)
{
    sv_model model = fixture_qi_wu_zhang(-1.0);
    CHECK_CLOSE(value_of("three_sector", &model, 8, 100.0), 0.0, 1e-10);
    sv_model_free(test_context(), &model);
}

/* On parts of the flake through the polynomial engine: the cost does not grow with the flake. */
SV_TEST(discs_work_on_parts)
{
    sv_model model = fixture_qi_wu_zhang(-1.0);
    sv_flake_spec spec = fixture_cells(&model, 60, 60, false);
    sv_flake flake = fixture_flake(&model, &spec);
    sv_sample sample = {0};
    sv_projector *p = NULL;
    sv_projector_options o = sv_projector_options_default();
    o.engine = SV_ENGINE_CHEBYSHEV;
    o.degree = 61;
    o.half_gap = 0.8;
    o.reach = 10.0;
    CHECK_OK(sv_sample_draw(test_context(), &flake, NULL, 0, 1, 0, &sample));
    CHECK_OK(sv_projector_make(test_context(), &sample, &fixture_below_zero, &o, &p));
    sv_value values[2] = {{.present = true, .real = {20.0, 31.0}},
                          {.present = true, .real = {6.0}}};
    sv_outcome outcome;
    sv_marker_input input = {
        .sample = &sample, .occupation = &fixture_below_zero, .projector = p, .values = values};
    CHECK_OK(sv_crosshair(test_context(), &input, &outcome));
    CHECK_CLOSE(outcome.value, 1.0, 2e-3);
    CHECK_OK(sv_three_sector(test_context(), &input, &outcome));
    CHECK_CLOSE(outcome.value, 1.0, 2e-3);
    values[0].real[0] = 500.0; /* far outside */
    CHECK_STATUS(SV_UNDEFINED, sv_crosshair(test_context(), &input, &outcome));
    sv_projector_free(test_context(), p);
    sv_sample_free(test_context(), &sample);
    sv_flake_free(test_context(), &flake);
    sv_model_free(test_context(), &model);
}

/* Discs alone on a flake too large to be diagonalised: parts of it, never the dense engine. */
SV_TEST(discs_alone_are_planned_on_parts)
{
    sv_model model = fixture_qi_wu_zhang(-1.0);
    sv_flake_spec spec = fixture_cells(&model, 80, 80, false);
    sv_flake flake = fixture_flake(&model, &spec);
    sv_disorder d = {.name = "pot", .type = SV_DISORDER_ONSITE, .on = -1, .width = 0.5};
    sv_case point = {.open_flake = &flake,
                     .disorder = &d,
                     .n_disorder = 1,
                     .occupation = fixture_below_zero,
                     .solve = sv_projector_options_default(),
                     .seed = 5,
                     .n_markers = 2};
    sv_plan plan = {0};
    sv_record record;
    const char *const names[] = {"three_sector", "crosshair"};
    for (int k = 0; k < 2; k++)
        point.markers[k] = (sv_marker_request){
            .marker = sv_marker_find(names[k]),
            .values = {{.present = true, .has_auto = true}, {.present = true, .real = {7.0}}}};
    CHECK_OK(sv_case_plan(test_context(), &point, false, 0.005, &plan));
    CHECK_INT(point.solve.engine, SV_ENGINE_CHEBYSHEV);
    CHECK(point.solve.reach > 0.0);
    if (point.solve.engine == SV_ENGINE_CHEBYSHEV) {
        CHECK_OK(sv_realise(test_context(), &point, 0, NULL, NULL, &record));
        for (int k = 0; k < 2; k++) {
            CHECK_INT(record.outcomes[k].verdict, SV_RESOLVED);
            CHECK_CLOSE(record.outcomes[k].value, 1.0, 2e-3);
        }
    }
    sv_flake_free(test_context(), &flake);
    sv_model_free(test_context(), &model);
}
