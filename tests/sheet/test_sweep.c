/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Sweeps and their points. */
#include "sheet_testing.h"

#define DISORDER                                                                                   \
    "disorder:\n"                                                                                  \
    "  - {name: vac, kind: vacancies, share: 0.1}\n"                                               \
    "  - {name: pot, kind: onsite, distribution: box, width: 1}\n"

SV_TEST(steps_are_the_numbers_meant)
{
    reading r =
        read_text(MODEL FLAKE DISORDER
                  "sweep: [{parameter: disorder.vac.share, from: 0, to: 0.2, steps: 11}]\n");
    if (is_read(&r) && CHECK(r.setup.n_axes == 1)) {
        static const double expected[] = {0,    0.02, 0.04, 0.06, 0.08, 0.1,
                                          0.12, 0.14, 0.16, 0.18, 0.2};
        CHECK_INT(r.setup.axes[0].count, 11);
        CHECK(!r.setup.axes[0].integer);
        for (int i = 0; i < 11; i++)
            CHECK_CLOSE(r.setup.axes[0].values[i], expected[i], 0.0);
    }
    reading_free(&r);
}

SV_TEST(two_axes_with_units)
{
    reading r =
        read_text(FILM FLAKE DISORDER
                  "sweep:\n"
                  "  - {parameter: disorder.pot.width, from: -0 eV, to: 300 meV, steps: 4}\n"
                  "  - {parameter: flake.cells.0, values: [4, 12, 8]}\n");
    if (is_read(&r) && CHECK(r.setup.n_axes == 2)) {
        CHECK_CLOSE(r.setup.axes[0].values[1], 0.1, 0.0);
        CHECK_CLOSE(r.setup.axes[0].values[3], 0.3, 1e-16);
        CHECK(r.setup.axes[1].integer);
        CHECK_CLOSE(r.setup.axes[1].values[1], 12.0, 0.0);
        CHECK_CLOSE(r.setup.energy_unit, 1.0, 0.0);
        sv_setup point = {0};
        sv_assignment at = {.path = "disorder.pot.width", .value = 0.2};
        CHECK_OK(sv_sheet_setup(test_context(), r.sheet, &at, 1, &r.said, &point));
        CHECK_CLOSE(point.energy_unit, 1.0, 0.0);
        sv_setup_free(test_context(), &point);
    }
    reading_free(&r);
}

SV_TEST(a_point_is_the_sheet_with_other_numbers)
{
    reading r = read_text(FILM FLAKE DISORDER
                          "sweep:\n"
                          "  - {parameter: disorder.vac.share, from: 0, to: 1, steps: 3}\n"
                          "  - {parameter: flake.cells.0, values: [4, 2000000]}\n");
    /* 2000000 is above what cells may be */
    is_refused(&r, 9, 44, "flake.cells.0 must be between 1 and 1000000, got 2000000");
    reading_free(&r);
    r = read_text(FILM FLAKE DISORDER
                  "sweep:\n"
                  "  - {parameter: disorder.vac.share, from: 0, to: 1, steps: 3}\n"
                  "  - {parameter: flake.cells.0, values: [4, 12]}\n");
    if (is_read(&r)) {
        sv_setup point = {0};
        sv_assignment at[2] = {{.path = "disorder.vac.share", .value = 0.5},
                               {.path = "flake.cells.0", .value = 12}};
        CHECK_OK(sv_sheet_setup(test_context(), r.sheet, at, 2, &r.said, &point));
        CHECK_CLOSE(point.disorder[0].share, 0.5, 0.0);
        CHECK_INT(point.flake.cells[0], 12);
        CHECK_INT(point.flake.cells[1], 4);
        CHECK_INT(point.n_axes, 0);
        CHECK(point.resolved == NULL && point.identity == NULL);
        sv_setup_free(test_context(), &point);
    }
    reading_free(&r);
}

SV_TEST(faults_of_a_point_stand_at_the_sweep)
{
    reading r =
        read_text(MODEL FLAKE DISORDER
                  "sweep: [{parameter: disorder.vac.share, from: 0, to: 0.2, steps: 11}]\n");
    if (is_read(&r)) {
        sv_setup point = {0};
        sv_assignment at = {.path = "disorder.vac.share", .value = 1.4};
        CHECK_STATUS(SV_INVALID_INPUT,
                     sv_sheet_setup(test_context(), r.sheet, &at, 1, &r.said, &point));
        const sv_diagnostic *item =
            find_said(&r.said, 7, 21, "at disorder.vac.share = 1.4: disorder.vac.share must be");
        CHECK(item != NULL);
        at.path = "disorder.vac.shore";
        CHECK_STATUS(SV_INVALID_INPUT,
                     sv_sheet_setup(test_context(), r.sheet, &at, 1, &r.said, &point));
        item = find_said(&r.said, 0, 0, "at disorder.vac.shore = 1.4: unknown key shore");
        if (CHECK(item != NULL))
            CHECK_TEXT(item->hint, "did you mean share?");
    }
    reading_free(&r);
}

SV_TEST(a_swept_key_need_not_be_written)
{
    reading r = read_text("selvedge: 1\nmodel: {name: qi_wu_zhang}\n" FLAKE
                          "disorder: [{name: vac, kind: vacancies}]\n"
                          "sweep:\n"
                          "  - {parameter: model.m, values: [-1.5, -1]}\n"
                          "  - {parameter: disorder.vac.share, from: 0.1, to: 0.2, steps: 2}\n");
    if (is_read(&r)) {
        CHECK_CLOSE(r.setup.model.orbitals[0].onsite, -1.5, 0.0);
        CHECK_CLOSE(r.setup.disorder[0].share, 0.1, 0.0);
    }
    reading_free(&r);
    r = read_text(MODEL FLAKE "sweep: [{parameter: occupation.filling, values: [0.25, 0.5]}]\n");
    if (is_read(&r)) {
        CHECK_INT(r.setup.occupation.by, SV_BY_FILLING);
        CHECK_CLOSE(r.setup.occupation.filling, 0.25, 0.0);
    }
    reading_free(&r);
}

SV_TEST(a_swept_key_may_have_a_default)
{
    reading r = read_text(MODEL FLAKE
                          "sweep:\n"
                          "  - {parameter: occupation.fermi_energy, from: -1, to: 1, steps: 3}\n"
                          "  - {parameter: markers.local_chern.window, values: [0.25]}\n");
    if (is_read(&r)) {
        sv_setup point = {0};
        sv_assignment at[2] = {sv_sweep_value(&r.setup.axes[0], 2),
                               sv_sweep_value(&r.setup.axes[1], 0)};
        CHECK_CLOSE(r.setup.occupation.fermi_energy, 0.0, 0.0);
        CHECK_CLOSE(r.setup.axes[0].values[1], 0.0, 0.0);
        CHECK_OK(sv_sheet_setup(test_context(), r.sheet, at, 2, &r.said, &point));
        CHECK_CLOSE(point.occupation.fermi_energy, 1.0, 0.0);
        CHECK_INT(point.n_markers, 1);
        CHECK_CLOSE(point.markers[0].values[0].real[0], 0.25, 0.0);
        sv_setup_free(test_context(), &point);
    }
    reading_free(&r);
}

SV_TEST(numbers_inside_a_custom_model)
{
    static const char sheet[] =
        "selvedge: 1\nmodel:\n  name: custom\n  vectors: [[1, 0], [0, 1]]\n"
        "  orbitals: [{name: a, at: [0, 0]}]\n  onsite: {a: 0}\n"
        "  hops: [{from: a, to: a, shift: [1, 0], amplitude: [1, 0]}]\n" FLAKE "sweep:\n"
        "  - {parameter: model.onsite.a, values: [0, 0.5]}\n"
        "  - {parameter: model.hops.0.amplitude.1, values: [0, 2]}\n";
    reading r = read_text(sheet);
    if (is_read(&r)) {
        sv_setup point = {0};
        sv_assignment at[2] = {{.path = "model.onsite.a", .value = 0.5},
                               {.path = "model.hops.0.amplitude.1", .value = 2.0}};
        CHECK_OK(sv_sheet_setup(test_context(), r.sheet, at, 2, &r.said, &point));
        CHECK_CLOSE(point.model.orbitals[0].onsite, 0.5, 0.0);
        CHECK_CLOSE(cimag(point.model.hops[0].amplitude), 2.0, 0.0);
        sv_setup_free(test_context(), &point);
    }
    reading_free(&r);
}

SV_TEST(a_swept_scale_keeps_its_unit)
{
    reading r = read_text(FILM "flake: {shape: disc, radius: 3 nm}\n"
                               "sweep: [{parameter: model.lattice_constant, from: 0.5 nm, "
                               "to: 10 angstrom, steps: 3}]\n");
    if (is_read(&r)) {
        sv_setup point = {0};
        sv_assignment at = sv_sweep_value(&r.setup.axes[0], 2);
        CHECK_CLOSE(at.value, 1.0, 1e-15);
        CHECK_OK(sv_sheet_setup(test_context(), r.sheet, &at, 1, &r.said, &point));
        CHECK_CLOSE(point.flake.radius, 3.0, 1e-14);
        sv_setup_free(test_context(), &point);
    }
    reading_free(&r);
}

/* A sweep written in a grower's units is shown in them: 1e13 cm^-2 with a = 0.5 nm is 0.025 per
 * lattice constant squared. */
SV_TEST(an_axis_keeps_its_unit)
{
    static const char text[] = "selvedge: 1\n"
                               "model: {name: qi_wu_zhang, m: -1, lattice_constant: 0.5 nm}\n"
                               "flake: {shape: rectangle, cells: [6, 6]}\n"
                               "disorder:\n"
                               "  - {name: vac, kind: vacancies, density: 0 cm^-2}\n"
                               "sweep:\n"
                               "  - {parameter: disorder.vac.density, values: [0, 1e13 cm^-2]}\n";
    sv_context *context = test_context();
    sv_diagnostics diagnostics = {0};
    sv_sheet_options options = {.size = sizeof options};
    sv_sheet *sheet = NULL;
    sv_setup setup = {0};
    CHECK_OK(sv_sheet_parse(context, "sheet.yaml", text, sizeof text - 1, &options, &diagnostics,
                            &sheet));
    CHECK_OK(sv_sheet_setup(context, sheet, NULL, 0, &diagnostics, &setup));
    CHECK(setup.axes[0].unit != NULL && strcmp(setup.axes[0].unit, "cm^-2") == 0);
    CHECK_CLOSE(setup.axes[0].values[1], 0.025, 1e-15);
    CHECK_CLOSE(setup.axes[0].values[1] * setup.axes[0].unit_scale, 1e13, 1.0);
    /* An error only the program can know is shown at a key of the sheet. */
    sv_sheet_report(context, sheet, "flake", "too large", "make it smaller", &diagnostics);
    CHECK_INT(diagnostics.errors, 1);
    CHECK_INT(diagnostics.items[diagnostics.count - 1].line, 3);
    CHECK_TEXT(diagnostics.items[diagnostics.count - 1].message, "too large");
    sv_setup_free(context, &setup);
    sv_sheet_free(context, sheet);
    sv_diagnostics_free(context, &diagnostics);
}

/* One number n of a flake's size means n cells along both sides; pairs say otherwise. */
SV_TEST(sizes_are_numbers_or_pairs)
{
    reading r = read_text(MODEL "flake: {shape: rectangle}\n" DISORDER
                                "sweep: [{parameter: flake.cells, values: [10, 14, 18]}]\n");
    if (is_read(&r)) {
        const sv_sweep_axis *axis = &r.setup.axes[0];
        CHECK(axis->integer && axis->square && axis->second != NULL);
        CHECK_INT(r.setup.flake.cells[0], 10);
        CHECK_INT(r.setup.flake.cells[1], 10);
        CHECK(strstr(r.setup.resolved, "cells: [10, 10]\n") != NULL);
        CHECK(strstr(r.setup.resolved, "values: [10, 14, 18]\n") != NULL);
        sv_setup point = {0};
        sv_assignment at = sv_sweep_value(axis, 2);
        CHECK(at.pair);
        CHECK_OK(sv_sheet_setup(test_context(), r.sheet, &at, 1, &r.said, &point));
        CHECK_INT(point.flake.cells[0], 18);
        CHECK_INT(point.flake.cells[1], 18);
        sv_setup_free(test_context(), &point);
    }
    reading_free(&r);
    r = read_text(MODEL "flake: {shape: rectangle, cells: [3, 3]}\n" DISORDER
                        "sweep: [{parameter: flake.cells, values: [[10, 12], 14]}]\n");
    if (is_read(&r)) {
        sv_setup point = {0};
        sv_assignment at = sv_sweep_value(&r.setup.axes[0], 0);
        CHECK(!r.setup.axes[0].square);
        CHECK_CLOSE(r.setup.axes[0].second[1], 14.0, 0.0);
        CHECK_OK(sv_sheet_setup(test_context(), r.sheet, &at, 1, &r.said, &point));
        CHECK_INT(point.flake.cells[0], 10);
        CHECK_INT(point.flake.cells[1], 12);
        sv_setup_free(test_context(), &point);
    }
    reading_free(&r);
    r = read_text(MODEL
                  "flake: {shape: rectangle}\n"
                  "sweep: [{parameter: flake.cells, from: [4, 8], to: [12, 16], steps: 3}]\n");
    if (is_read(&r)) {
        CHECK_CLOSE(r.setup.axes[0].values[1], 8.0, 0.0);
        CHECK_CLOSE(r.setup.axes[0].second[1], 12.0, 0.0);
    }
    reading_free(&r);
}

/* Sizes by a length keep their unit; other shapes have one number. */
SV_TEST(sizes_as_the_shape_has_them)
{
    reading r = read_text(FILM "flake: {shape: rectangle}\n"
                               "sweep: [{parameter: flake.size, values: [4 nm, 6 nm]}]\n");
    if (is_read(&r)) {
        CHECK(r.setup.axes[0].unit != NULL && strcmp(r.setup.axes[0].unit, "nm") == 0);
        CHECK_CLOSE(r.setup.axes[0].second[1] * r.setup.axes[0].unit_scale, 6.0, 1e-14);
    }
    reading_free(&r);
    r = read_text(MODEL "flake: {shape: disc}\n"
                        "sweep: [{parameter: flake.radius, values: [4, 5.5]}]\n");
    if (is_read(&r)) {
        CHECK(r.setup.axes[0].second == NULL && !r.setup.axes[0].square);
        CHECK_CLOSE(r.setup.flake.radius, 4.0, 0.0);
    }
    reading_free(&r);
}

/* Pairs of numbers count for the identity of a run as much as single ones. */
SV_TEST(pairs_are_part_of_the_identity)
{
    static const char *const values[3] = {"[10, 14]", "[[10, 10], [14, 14]]",
                                          "[[10, 10], [14, 12]]"};
    char *identities[3] = {0};
    for (int i = 0; i < 3; i++) {
        char text[400];
        snprintf(text, sizeof text,
                 MODEL "flake: {shape: rectangle, cells: [9, 9]}\n"
                       "sweep: [{parameter: flake.cells, values: %s}]\n",
                 values[i]);
        reading r = read_text(text);
        if (is_read(&r)) {
            identities[i] = r.setup.identity;
            r.setup.identity = NULL;
        }
        reading_free(&r);
    }
    CHECK_TEXT(identities[0], identities[1]);
    CHECK(strcmp(identities[1], identities[2]) != 0);
    for (int i = 0; i < 3; i++)
        sv_give(test_context(), identities[i]);
}
