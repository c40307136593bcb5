/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Sheets that are right: typed values, defaults, units. */
#include "sheet_testing.h"

SV_TEST(defaults)
{
    reading r = read_text(MODEL FLAKE);
    const sv_setup *s = &r.setup;
    if (is_read(&r)) {
        CHECK_TEXT(s->title, "");
        CHECK_TEXT(s->model.name, "qi_wu_zhang");
        CHECK_INT(s->flake.shape, SV_SHAPE_RECTANGLE);
        CHECK_INT(s->flake.cells[0], 6);
        CHECK_INT(s->flake.cells[1], 4);
        CHECK(s->flake.has_cells && !s->flake.has_size && !s->flake.has_radius);
        CHECK(!s->flake.periodic[0] && !s->flake.periodic[1]);
        CHECK_INT(s->n_disorder, 0);
        CHECK_INT(s->occupation.by, SV_BY_ENERGY);
        CHECK_CLOSE(s->occupation.fermi_energy, 0.0, 0.0);
        CHECK_INT(s->n_markers, 1);
        CHECK_INT(s->markers[0].kind, 0);
        CHECK_CLOSE(s->markers[0].values[0].real[0], 0.5, 0.0);
        CHECK_INT(s->realisations, 1);
        CHECK_INT(s->seed, 1);
        CHECK(!s->has_stop);
        CHECK_INT(s->n_axes, 0);
        CHECK_TEXT(s->engine, "auto");
        CHECK_TEXT(s->estimator, "auto");
        CHECK_CLOSE(s->accuracy, 1e-6, 0.0);
        CHECK_CLOSE(s->sampling_error, 0.005, 0.0);
        CHECK_CLOSE(s->lattice_constant, 0.0, 0.0);
        CHECK_CLOSE(s->energy_unit, 0.0, 0.0);
        CHECK_INT(r.said.count, 0);
    }
    reading_free(&r);
}

SV_TEST(everything_written)
{
    reading r = read_text(
        FILM "flake: {shape: rectangle, cells: [8, 6], boundary: [periodic, open]}\n"
             "disorder:\n"
             "  - {name: vac, kind: vacancies, count: 3, on: b}\n"
             "  - {name: pot, kind: onsite, distribution: binary, width: 1.5, per: cell}\n"
             "occupation: {electrons: 40}\n"
             "markers: {bott: null, local_chern: {window: 25 %}}\n"
             "ensemble:\n"
             "  realisations: 1000000000\n"
             "  seed: 4294967295\n"
             "  stop: {standard_error: 0.01, of: bott}\n"
             "solve: {engine: dense, accuracy: 1e-3, sampling_error: 0.1}\n");
    const sv_setup *s = &r.setup;
    if (is_read(&r)) {
        CHECK(s->flake.periodic[0] && !s->flake.periodic[1]);
        CHECK_INT(s->n_disorder, 2);
        CHECK_INT(s->disorder[0].type, SV_DISORDER_VACANCIES);
        CHECK(s->disorder[0].has_count && !s->disorder[0].has_share);
        CHECK_INT(s->disorder[0].count, 3);
        CHECK_INT(s->disorder[0].on, 1);
        CHECK_TEXT(s->disorder[1].name, "pot");
        CHECK_INT(s->disorder[1].distribution, SV_BINARY);
        CHECK_INT(s->disorder[1].on, -1);
        CHECK(s->disorder[1].per_cell);
        CHECK_CLOSE(s->disorder[1].width, 1.5, 0.0);
        CHECK_INT(s->occupation.by, SV_BY_ELECTRONS);
        CHECK_INT(s->occupation.electrons, 40);
        CHECK_INT(s->n_markers, 2);
        /* in the order of the table, not of the sheet */
        CHECK_INT(s->markers[0].kind, 0);
        CHECK_CLOSE(s->markers[0].values[0].real[0], 0.25, 0.0);
        CHECK_INT(s->markers[1].kind, 1);
        CHECK_INT(s->realisations, 1000000000);
        CHECK_INT(s->seed, 4294967295);
        CHECK(s->has_stop);
        CHECK_INT(s->stop_marker, 1);
        CHECK_INT(s->stop_at_least, 50);
        CHECK_TEXT(s->engine, "dense");
    }
    reading_free(&r);
}

SV_TEST(keys_of_every_type)
{
    reading r = read_text(FILM FLAKE "markers:\n  probe: {at: [1, 1 nm], kappa: 0.5, "
                                     "levels: [-1, 0, 500 meV], label: no}\n");
    const sv_value *v = r.setup.markers[0].values;
    if (is_read(&r)) {
        CHECK(!v[0].has_auto);
        CHECK_CLOSE(v[0].real[0], 1.0, 0.0);
        CHECK_CLOSE(v[0].real[1], 2.0, 1e-15);
        CHECK(!v[1].has_auto);
        CHECK_CLOSE(v[1].real[0], 0.5, 0.0);
        CHECK_INT(v[2].count, 3);
        CHECK_CLOSE(v[2].list[2], 0.5, 1e-15);
        CHECK(v[3].present && !v[3].written);
        CHECK_TEXT(v[4].text, "no");
    }
    reading_free(&r);
    r = read_text(MODEL FLAKE "markers: {probe: {}}\n");
    v = r.setup.markers[0].values;
    if (is_read(&r))
        CHECK(v[0].has_auto && v[1].has_auto && !v[2].present && !v[4].present);
    reading_free(&r);
}

SV_TEST(shapes)
{
    reading r = read_text("selvedge: 1\nmodel: {name: haldane, t2: 0.1, phi: 90 deg}\n"
                          "flake: {shape: hexagon, cells: 3}\n");
    if (is_read(&r)) {
        CHECK_INT(r.setup.flake.shape, SV_SHAPE_HEXAGON);
        CHECK_INT(r.setup.flake.cells[0], 3);
    }
    reading_free(&r);
    r = read_text(FILM "flake: {shape: disc, radius: 4 nm}\n");
    if (is_read(&r))
        CHECK_CLOSE(r.setup.flake.radius, 8.0, 1e-14);
    reading_free(&r);
    r = read_text(FILM "flake: {shape: rectangle, size: [3 nm, 5], boundary: open}\n");
    if (is_read(&r)) {
        CHECK(r.setup.flake.has_size);
        CHECK_CLOSE(r.setup.flake.size[0], 6.0, 1e-14);
        CHECK_CLOSE(r.setup.flake.size[1], 5.0, 0.0);
    }
    reading_free(&r);
}

SV_TEST(shapes_of_loops_and_edges)
{
    reading r =
        read_text(FILM "flake:\n  shape: polygon\n  orientation: 90 deg\n"
                       "  vertices: [[0, 0], [10 nm, 0], [20, 8 nm], [0, 16]]\n"
                       "  holes: [[[2, 2], [4, 2], [3, 4]], [[6, 6], [8, 6], [7, 4 nm]]]\n");
    if (is_read(&r)) {
        const sv_polygon *p = &r.setup.flake.polygon;
        CHECK_INT(p->n_loops, 3);
        CHECK_INT(p->loop_start[1], 4);
        CHECK_INT(p->loop_start[3], 10);
        CHECK_CLOSE(p->corners[2], 20.0, 1e-14);
        CHECK_CLOSE(p->corners[5], 16.0, 1e-14);
        CHECK_CLOSE(p->corners[2 * 9 + 1], 8.0, 1e-14);
        CHECK_CLOSE(r.setup.model.vectors[0][1], 1.0, 1e-15);
        CHECK(strstr(r.setup.identity, "flake.holes = [3, 2, 2, 4, 2, 3, 4, 3, 6") != NULL);
    }
    reading again = r;
    if (r.status == SV_OK) {
        again = read_text(r.setup.resolved);
        if (is_read(&again))
            CHECK_TEXT(again.setup.identity, r.setup.identity);
        reading_free(&again);
    }
    reading_free(&r);
    r = read_text("selvedge: 1\nmodel: {name: haldane, t2: 0.1, phi: 90 deg}\n"
                  "flake: {shape: ribbon, cells: [6, 7], edge: armchair}\n");
    if (is_read(&r)) {
        CHECK_INT(r.setup.flake.edge, SV_EDGE_ARMCHAIR);
        CHECK(r.setup.flake.periodic[0] && !r.setup.flake.periodic[1]);
        again = read_text(r.setup.resolved);
        if (is_read(&again))
            CHECK_TEXT(again.setup.identity, r.setup.identity);
        reading_free(&again);
    }
    reading_free(&r);
    const char *const moved[] = {"flake.vertices.1.0=30"};
    r = read_with(FILM "flake: {shape: polygon, vertices: [[0, 0], [10, 0], [0, 10]]}\n", moved, 1);
    if (is_read(&r))
        CHECK_CLOSE(r.setup.flake.polygon.corners[2], 30.0, 0.0);
    reading_free(&r);
}

SV_TEST(energies_with_units_and_no_energy_unit)
{
    reading r = read_text(MODEL FLAKE "occupation: {fermi_energy: 30 meV}\n"
                                      "markers: {probe: {levels: [1 eV]}}\n");
    if (is_read(&r)) {
        CHECK_CLOSE(r.setup.energy_unit, 1.0, 0.0);
        CHECK_CLOSE(r.setup.occupation.fermi_energy, 0.03, 1e-17);
        /* said once, though the sheet is read twice */
        CHECK_INT(r.said.count, 1);
        CHECK_INT(r.said.items[0].severity, SV_SEVERITY_NOTE);
        CHECK(find_said(&r.said, 4, 28,
                        "this energy carries a unit, so bare energies are read "
                        "in eV") != NULL);
    }
    reading_free(&r);
}

SV_TEST(energies_with_units_and_an_energy_unit)
{
    reading r = read_text("selvedge: 1\n"
                          "model: {energy_unit: 2500 meV, name: qi_wu_zhang, m: -2.5 eV}\n" FLAKE
                          "occupation: {fermi_energy: 0.5}\n");
    if (is_read(&r)) {
        CHECK_CLOSE(r.setup.energy_unit, 2.5, 1e-15);
        CHECK_CLOSE(r.setup.model.orbitals[0].onsite, -1.0, 1e-15);
        CHECK_CLOSE(r.setup.occupation.fermi_energy, 0.5, 0.0);
        CHECK_INT(r.said.count, 0);
    }
    reading_free(&r);
}

SV_TEST(density_becomes_a_share)
{
    /* One position in (0.5 nm)²: 4e14 per cm², of which 3e12 are vacant. */
    reading r = read_text(FILM FLAKE "disorder: [{kind: vacancies, density: 3e12 cm^-2}]\n");
    if (is_read(&r)) {
        CHECK_TEXT(r.setup.disorder[0].name, "vacancies");
        CHECK(r.setup.disorder[0].has_share);
        CHECK_CLOSE(r.setup.disorder[0].share, 3e12 / 4e14, 1e-17);
    }
    reading_free(&r);
    /* Honeycomb: two positions in a cell of area √3/2; on A alone there is one. */
    r = read_text("selvedge: 1\nmodel: {name: haldane, t2: 0.1, phi: 0.5 pi}\n"
                  "flake: {shape: parallelogram, cells: [4, 4]}\n"
                  "disorder:\n  - {name: x, kind: vacancies, density: 0.1}\n"
                  "  - {name: y, kind: vacancies, density: 0.1, on: A}\n");
    if (is_read(&r)) {
        CHECK_CLOSE(r.setup.disorder[0].share, 0.1 * sqrt(3.0) / 4.0, 1e-16);
        CHECK_CLOSE(r.setup.disorder[1].share, 0.1 * sqrt(3.0) / 2.0, 1e-16);
    }
    reading_free(&r);
}

SV_TEST(angles_and_shares_with_units)
{
    reading r = read_text("selvedge: 1\nmodel: {name: haldane, t2: 0.1, phi: 90 deg}\n"
                          "flake: {shape: parallelogram, cells: [4, 4]}\n"
                          "disorder: [{kind: vacancies, share: 2 %}]\n");
    if (is_read(&r)) {
        CHECK_CLOSE(r.setup.disorder[0].share, 0.02, 1e-17);
        /* second hops are purely imaginary at a right angle */
        CHECK_CLOSE(creal(r.setup.model.hops[3].amplitude), 0.0, 1e-16);
        CHECK_CLOSE(cimag(r.setup.model.hops[3].amplitude), 0.1, 1e-16);
    }
    reading_free(&r);
}

SV_TEST(custom_model)
{
    reading r = read_text("selvedge: 1\nmodel:\n  name: custom\n  lattice_constant: 0.5 nm\n"
                          "  vectors: [[1, 0], [0, 1 nm]]\n"
                          "  orbitals: [{name: a, at: [0, 0]}, {name: B, at: [0.5, 0]}]\n"
                          "  onsite: {B: 0.25}\n"
                          "  hops:\n"
                          "    - {from: a, to: B, shift: [-1, 2], amplitude: [0.5, 200 meV]}\n"
                          "    - {from: a, to: a, shift: [1, 0], amplitude: -1}\n"
                          "  flux: [1, 3]\n"
                          "flake: {shape: rectangle, cells: [6, 6]}\n");
    const sv_model *m = &r.setup.model;
    if (is_read(&r)) {
        CHECK_CLOSE(m->vectors[1][1], 2.0, 1e-15);
        CHECK_INT(m->n_orbitals, 2);
        CHECK_INT(m->n_positions, 2);
        CHECK_TEXT(m->orbitals[1].name, "B");
        CHECK_CLOSE(m->orbitals[1].onsite, 0.25, 0.0);
        CHECK_CLOSE(m->orbitals[0].onsite, 0.0, 0.0);
        CHECK_INT(m->n_hops, 2);
        CHECK_INT(m->hops[0].shift[0], -1);
        CHECK_INT(m->hops[0].shift[1], 2);
        CHECK_CLOSE(creal(m->hops[0].amplitude), 0.5, 0.0);
        CHECK_CLOSE(cimag(m->hops[0].amplitude), 0.2, 1e-16);
        CHECK_CLOSE(creal(m->hops[1].amplitude), -1.0, 0.0);
        CHECK_INT(m->flux[1], 3);
        /* the unit in a hop also switches bare energies to eV */
        CHECK_CLOSE(r.setup.energy_unit, 1.0, 0.0);
    }
    reading_free(&r);
}

SV_TEST(null_blocks_count_as_left_out)
{
    reading r = read_text(MODEL FLAKE "disorder:\noccupation: ~\nmarkers: null\nensemble:\n"
                                      "sweep:\nsolve: {}\n");
    if (is_read(&r)) {
        CHECK_INT(r.setup.n_disorder, 0);
        CHECK_INT(r.setup.n_markers, 1);
        CHECK_INT(r.setup.n_axes, 0);
    }
    reading_free(&r);
}

SV_TEST(huge_flakes_are_not_built_to_be_checked)
{
    reading r = read_text(MODEL "flake: {shape: rectangle, cells: [20000, 20000]}\n"
                                "disorder: [{kind: vacancies, count: 1000}]\n");
    is_read(&r);
    reading_free(&r);
}

/* Conditions of the stop rule, alone and together; times have units. */
SV_TEST(stop_rules)
{
    const char *head = FILM "flake: {shape: rectangle, cells: [6, 6]}\n"
                            "markers: {bott: null, local_chern: {}}\nensemble: {stop: ";
    const struct {
        const char *stop;
        double error, width, seconds;
        int marker;
    } rows[] = {
        {"{share_width: 0.05, of: bott}", 0.0, 0.05, 0.0, 1},
        {"{time: 10 min}", 0.0, 0.0, 600.0, 0},
        {"{time: 90, of: bott}", 0.0, 0.0, 90.0, 1},
        {"{time: 0.5 h, standard_error: 0.01, share_width: 2 %, of: bott}", 0.01, 0.02, 1800.0, 1}};
    for (size_t k = 0; k < sizeof rows / sizeof rows[0]; k++) {
        char text[600];
        snprintf(text, sizeof text, "%s%s}\n", head, rows[k].stop);
        reading r = read_text(text);
        if (is_read(&r)) {
            CHECK(r.setup.has_stop);
            CHECK_CLOSE(r.setup.stop_standard_error, rows[k].error, 0.0);
            CHECK_CLOSE(r.setup.stop_share_width, rows[k].width, 0.0);
            CHECK_CLOSE(r.setup.stop_seconds, rows[k].seconds, 0.0);
            CHECK_INT(r.setup.stop_marker, rows[k].marker);
            CHECK_INT(r.setup.stop_at_least, 50);
        }
        reading_free(&r);
    }
}
