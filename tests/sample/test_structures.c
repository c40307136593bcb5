/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Structures through the library: rules of hops by distance, cells, hull, window, refusals. */
#include "fixtures.h"

#include <string.h>

static const double x_axis[2] = {1.0, 0.0}, y_axis[2] = {0.0, 1.0};

/* Species A and B; ⟨B|H|A⟩ = 1 + 2i at distance 1 ± 0.1. */
static sv_model two_species(void)
{
    sv_context *context = test_context();
    sv_model model = {0};
    const sv_distance_rule rule = {
        .from = 0, .to = 1, .distance = 1.0, .tolerance = 0.1, .amplitude = CMPLX(1.0, 2.0)};
    CHECK_OK(sv_model_begin(context, "by_distance", x_axis, y_axis, &model));
    CHECK_OK(sv_model_add_orbital(context, &model, "A", 0.0, 0.0, 0.0));
    CHECK_OK(sv_model_add_orbital(context, &model, "B", 0.0, 0.0, 0.5));
    CHECK_OK(sv_model_add_rule(context, &model, &rule));
    CHECK_OK(sv_model_finish(context, &model));
    return model;
}

static sv_status make(sv_model *model, const char *text, sv_structure *s, sv_table_fault *fault)
{
    const sv_structure_options options = {.unit = 1.0, .least_distance = 0.5};
    return sv_structure_make(test_context(), model, text, strlen(text), &options, s, fault);
}

static const char rectangle[] = "6\n\nA 0 0 0\nB 1 0 0\nA 2 0 0\nB 0 1 0\nA 1 1 0\nB 2 1 0\n";

SV_TEST(rules_cover_their_ranges)
{
    sv_model model = two_species();
    double range[2];
    sv_rule_range(&model.rules[0], range);
    CHECK_CLOSE(range[0], 0.9, 1e-15);
    CHECK_CLOSE(range[1], 1.1, 1e-15);
    const sv_distance_rule decay = {
        .to = 0, .distance = 1.0, .decay = 0.5, .cutoff = 2.0, .amplitude = 1.0};
    sv_rule_range(&decay, range);
    CHECK(range[0] == 0.0 && range[1] == 2.0);
    CHECK_OK(sv_model_add_rule(test_context(), &model, &decay));
    /* Meets the decay between the same species. */
    const sv_distance_rule shell = {.distance = 1.5, .tolerance = 0.1, .amplitude = 1.0};
    CHECK_STATUS(SV_INVALID_INPUT, sv_model_add_rule(test_context(), &model, &shell));
    double gap;
    CHECK_STATUS(SV_UNDEFINED, sv_model_spectral_distance(test_context(), &model, 0.0, &gap));
    sv_model_free(test_context(), &model);
}

SV_TEST(a_structure_gives_the_model_its_cells)
{
    sv_context *context = test_context();
    sv_model model = two_species();
    sv_structure s = {0};
    sv_table_fault fault;
    CHECK_OK(make(&model, rectangle, &s, &fault));
    CHECK_INT(s.n, 6);
    CHECK_CLOSE(s.area, 2.0, 1e-12);
    CHECK_CLOSE(sv_model_cell_area(&model), 2.0 / 6.0, 1e-12);
    /* The diagonal of a cell is the least distance. */
    CHECK_CLOSE(sv_model_vector_area(&model), 0.125, 1e-8);
    CHECK_INT(s.bond_start[6], 2 * 7);
    CHECK_CLOSE(sv_model_norm_bound(&model), 0.5 + 3.0 * sqrt(5.0), 1e-12);
    CHECK_CLOSE(sv_structure_depth(&s, (const double[2]){1.0, 0.25}), 0.25, 1e-12);
    CHECK_CLOSE(sv_structure_depth(&s, (const double[2]){1.0, -2.0}), -2.0, 1e-12);

    sv_flake_spec spec = {.shape = SV_SHAPE_STRUCTURE, .structure = &s};
    sv_flake flake = fixture_flake(&model, &spec);
    double distance;
    CHECK_INT(sv_flake_nearest(&flake, (const double[2]){1.9, 0.8}, -1, &distance), 5);
    CHECK_CLOSE(distance, hypot(0.1, 0.2), 1e-12);
    CHECK_INT(sv_flake_nearest(&flake, (const double[2]){1.9, 0.8}, 0, &distance), 2);
    CHECK(!sv_flake_can_close(&model, &spec).possible);
    /* Half the rectangle holds no site: its corners and middles lie outside. */
    bool *inside = NULL;
    sv_index cells = 0;
    CHECK_STATUS(SV_INVALID_INPUT, sv_flake_window(context, &flake, 0.5, &inside, &cells));
    CHECK_OK(sv_flake_window(context, &flake, 1.0, &inside, &cells));
    CHECK_INT(cells, 6);
    CHECK_CLOSE(sv_flake_window_factor(&flake, 0.5, 3), 3.0 * (2.0 / 6.0) / (0.25 * 2.0), 1e-12);
    sv_give(context, inside);

    sv_sample sample = {0};
    CHECK_OK(sv_sample_draw(context, &flake, NULL, 0, 1, 0, &sample));
    CHECK_INT(sample.n, 6);
    CHECK_INT(sample.inventory.pieces, 1);
    for (sv_index r = 0; r < 6; r++) /* ⟨B|H|A⟩ = 1 + 2i */
        for (sv_index k = sample.hamiltonian.row_start[r]; k < sample.hamiltonian.row_start[r + 1];
             k++)
            if (sample.hamiltonian.column[k] != r)
                CHECK_CLOSE(cimag(sample.hamiltonian.value[k]), s.species[r] == 1 ? 2.0 : -2.0,
                            0.0);
    sv_sample_free(context, &sample);
    sv_flake_free(context, &flake);
    sv_structure_free(context, &s);
    sv_model_free(context, &model);
}

SV_TEST(faults_name_their_line_and_leave_nothing)
{
    sv_model model = two_species();
    sv_structure s = {0};
    sv_table_fault fault;
    CHECK_STATUS(SV_INVALID_INPUT, make(&model, "3\n\nA 0 0 0\nB 1 0 0\nA 0.6 0 0\n", &s, &fault));
    CHECK_INT(fault.line, 5);
    CHECK(s.at == NULL && model.site_area == 0.0);
    sv_flake flake = {0};
    sv_flake_spec spec = {.shape = SV_SHAPE_DISC, .has_radius = true, .radius = 3.0};
    CHECK_STATUS(SV_INVALID_INPUT, sv_flake_make(test_context(), &model, &spec, &flake));
    sv_model_free(test_context(), &model);
}

SV_TEST(kinds_that_need_a_lattice_are_refused)
{
    sv_disorder d = {.type = SV_DISORDER_VACANCIES, .on = -1, .share = 0.1, .has_share = true};
    CHECK(sv_structure_refusal(&d) == NULL);
    d.distance = 2.0;
    CHECK(sv_structure_refusal(&d) != NULL);
    d = (sv_disorder){.type = SV_DISORDER_FLUX};
    CHECK(sv_structure_refusal(&d) != NULL);
    d = (sv_disorder){.type = SV_DISORDER_ONSITE};
    CHECK(sv_structure_refusal(&d) == NULL);
}
