/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The resolved sheet reads back as the same; the identity sees what matters and nothing else. */
#include "sheet_testing.h"

static const char FULL[] =
    "selvedge: 1\n"
    "title: \"no: \\\"quotes\\\" \\e #1\"\n"
    "model: {m: -200 meV, name: qi_wu_zhang, lattice_constant: 4.3 angstrom}\n"
    "flake: {shape: rectangle, cells: [12, 8], boundary: [periodic, open]}\n"
    "disorder:\n"
    "  - {name: vac, kind: vacancies, density: 3e12 cm^-2}\n"
    "  - {name: pot, kind: onsite, distribution: box, width: 1.5}\n"
    "  - {name: more, kind: onsite, distribution: gaussian, width: 0.1 eV, per: cell, on: a}\n"
    "markers: {probe: {at: [1 nm, 2], levels: [1, 2 meV], label: no}, bott: {}}\n"
    "ensemble: {realisations: 20, stop: {standard_error: 0.1, of: bott}}\n"
    "sweep:\n"
    "  - {parameter: disorder.pot.width, from: 0 meV, to: 3000 meV, steps: 7}\n"
    "  - {parameter: disorder.vac.density, values: [0, 1e12 cm^-2]}\n"
    "solve: {accuracy: 1e-4}\n";

static const char CUSTOM[] =
    "selvedge: 1\nmodel:\n  name: custom\n  vectors: [[1, 0], [0.5, 0.8]]\n"
    "  orbitals: [{name: a, at: [0, 0]}, {name: \"no\", at: [0.5, 0]}]\n"
    "  onsite: {\"no\": 0.25}\n"
    "  hops:\n"
    "    - {from: a, to: \"no\", shift: [-1, 2], amplitude: [0.5, 200 meV]}\n"
    "    - {from: a, to: a, shift: [1, 0], amplitude: -1}\n"
    "flake: {shape: parallelogram, cells: [6, 6]}\n";

static void check_round_trip(const char *sheet)
{
    reading first = read_text(sheet);
    if (is_read(&first)) {
        reading second = read_text(first.setup.resolved);
        if (is_read(&second)) {
            CHECK_TEXT(second.setup.identity, first.setup.identity);
            reading third = read_text(second.setup.resolved);
            if (is_read(&third))
                CHECK_TEXT(third.setup.resolved, second.setup.resolved);
            reading_free(&third);
            CHECK_TEXT(second.setup.title, first.setup.title);
            CHECK_INT(second.setup.realisations, first.setup.realisations);
            /* what the note said is now written */
            CHECK_INT(second.said.count, 0);
        } else
            printf("# %s\n", first.setup.resolved);
        reading_free(&second);
    }
    reading_free(&first);
}

SV_TEST(resolved_sheets_read_back)
{
    check_round_trip(FULL);
    check_round_trip(CUSTOM);
    check_round_trip(MODEL FLAKE);
    check_round_trip("selvedge: 1\nmodel: {name: qi_wu_zhang}\n" FLAKE
                     "sweep: [{parameter: model.m, values: [-1.5, -1]}]\n"
                     "ensemble: {stop: {standard_error: 0.1}}\n");
    check_round_trip(MODEL FLAKE "occupation: {filling: 12.5 %}\n");
    check_round_trip("selvedge: 1\nmodel: {name: haldane, t2: 0.1, phi: pi}\n"
                     "flake: {shape: hexagon, cells: 3}\noccupation: {electrons: 9}\n");
}

SV_TEST(resolved_sheet_says_what_it_takes_numbers_for)
{
    reading r = read_text(FULL);
    if (is_read(&r)) {
        static const char *const parts[] = {
            "width: 1.5  # full width: V in [-0.75, 0.75]\n",
            "  m: -200 meV  # = -0.2 in the energy unit of the model\n",
            "energy_unit: 1 eV",
            "width: 0.1 eV  # = 0.1 in the energy unit of the model\n",
            "    window: 0.5\n",
            "    at_least: 50\n",
            "  sampling_error: 0.005\n",
            "; share 0.0055",
            "    label: \"no\"\n",
        };
        for (size_t i = 0; i < sizeof parts / sizeof parts[0]; i++) {
            bool window = strstr(parts[i], "window") != NULL; /* local_chern is not asked for */
            test_check((strstr(r.setup.resolved, parts[i]) != NULL) != window, __FILE__, __LINE__,
                       "%s", parts[i]);
        }
    }
    reading_free(&r);
}

/* Compares the identities of two sheets. */
static void compare(const char *a, const char *b, bool same)
{
    reading first = read_text(a), second = read_text(b);
    if (is_read(&first) && is_read(&second))
        test_check((strcmp(first.setup.identity, second.setup.identity) == 0) == same, __FILE__,
                   __LINE__, "identities of\n%s\nand\n%s", a, b);
    reading_free(&first);
    reading_free(&second);
}

#define DEFECTS "disorder: [{name: vac, kind: vacancies, share: 0.1}]\n"

SV_TEST(identity_ignores_what_changes_no_number)
{
    const char *plain = MODEL FLAKE DEFECTS;
    compare(plain, "title: other\n" MODEL FLAKE DEFECTS, false);
    compare(plain, MODEL FLAKE DEFECTS "ensemble: {realisations: 7}\n", true);
    compare(plain, MODEL FLAKE DEFECTS "ensemble: {stop: {standard_error: 1}}\n", true);
    compare(plain,
            DEFECTS FLAKE "# a comment\nmodel:\n  m: -1.0\n  name: \"qi_wu_zhang\"\n"
                          "selvedge: 1\n",
            true);
    compare(plain,
            MODEL "flake: {boundary: open, cells: [6, 4], shape: rectangle}\n"
                  "disorder: [{share: 10 %, kind: vacancies, on: any, name: vac}]\n",
            true);
    compare(MODEL FLAKE "markers: {bott: {}, local_chern: {}}\n",
            MODEL FLAKE "markers: {local_chern: {window: 0.5}, bott: null}\n", true);
    compare(MODEL FLAKE DEFECTS "sweep: [{parameter: model.m, from: 0, to: 1, steps: 3}]\n",
            MODEL FLAKE DEFECTS "sweep: [{parameter: model.m, values: [0, 0.5, 1]}]\n", true);
}

SV_TEST(identity_sees_every_number)
{
    static const char *const changes[] = {
        "model.m=-1.0000000000000002",
        "flake.cells.0=7",
        "flake.boundary=periodic",
        "disorder.vac.share=0.2",
        "disorder.vac.name=other",
        "disorder.vac.on=a",
        "occupation.fermi_energy=0.1",
        "occupation.filling=0.5",
        "markers.bott={}",
        "ensemble.seed=2",
        "solve.engine=dense",
        "solve.accuracy=1e-7",
        "solve.sampling_error=0.1",
        "solve.estimator=random_phase",
        "model.energy_unit=1 eV",
        "model.lattice_constant=1 nm",
        "markers.local_chern.window=0.25",
        "sweep=[{parameter: model.m, values: [1]}]",
    };
    reading plain = read_text(MODEL FLAKE DEFECTS);
    for (size_t i = 0; i < sizeof changes / sizeof changes[0] && is_read(&plain); i++) {
        reading other = read_with(MODEL FLAKE DEFECTS, &changes[i], 1);
        if (is_read(&other))
            test_check(strcmp(plain.setup.identity, other.setup.identity) != 0, __FILE__, __LINE__,
                       "%s leaves the identity", changes[i]);
        reading_free(&other);
    }
    reading_free(&plain);
}

SV_TEST(identity_is_sorted)
{
    reading r = read_text(FULL);
    if (is_read(&r)) {
        char *text = r.setup.identity, *last = NULL;
        for (char *line = strtok(text, "\n"); line != NULL; line = strtok(NULL, "\n")) {
            CHECK(last == NULL || strcmp(last, line) < 0);
            last = line;
        }
        CHECK(last != NULL);
    }
    reading_free(&r);
}

SV_TEST(identity_of_a_custom_model_sees_its_parts)
{
    static const char *const changes[] = {
        "model.vectors.1.0=0.25", "model.orbitals.1.at.0=0.25",   "model.onsite.no=0.5",
        "model.hops.0.shift.0=1", "model.hops.0.amplitude.1=0.1", "model.hops.1.amplitude=1",
        "model.flux=[1, 3]",
    };
    reading plain = read_text(CUSTOM);
    for (size_t i = 0; i < sizeof changes / sizeof changes[0] && is_read(&plain); i++) {
        reading other = read_with(CUSTOM, &changes[i], 1);
        if (is_read(&other))
            test_check(strcmp(plain.setup.identity, other.setup.identity) != 0, __FILE__, __LINE__,
                       "%s leaves the identity", changes[i]);
        reading_free(&other);
    }
    reading_free(&plain);
}

static void write_file(const char *name, const char *text)
{
    FILE *file = fopen(test_scratch(name), "w");
    if (file == NULL || fputs(text, file) < 0 || fclose(file) != 0)
        abort();
}

static reading read_beside(const char *text)
{
    sv_sheet_options options = reading_options(NULL, 0);
    return read_named(test_scratch("sheet.yaml"), text, strlen(text), &options);
}

SV_TEST(identity_sees_content_of_files_not_names)
{
    write_file("one.csv", "x,y\n0,0\n");
    write_file("two.csv", "x,y\n0,0\n");
    write_file("three.csv", "x,y\n1,0\n");
    reading one = read_beside(FILM FLAKE "disorder: [{kind: vacancies, file: one.csv}]\n");
    reading two = read_beside(FILM FLAKE "disorder: [{kind: vacancies, file: two.csv}]\n");
    reading three = read_beside(FILM FLAKE "disorder: [{kind: vacancies, file: three.csv}]\n");
    if (is_read(&one) && is_read(&two) && is_read(&three)) {
        CHECK_TEXT(one.setup.identity, two.setup.identity);
        CHECK(strcmp(one.setup.identity, three.setup.identity) != 0);
    }
    reading_free(&one);
    reading_free(&two);
    reading_free(&three);
}

SV_TEST(relocated_files)
{
    static const char sheet[] =
        FILM FLAKE "disorder:\n  - {name: a, kind: vacancies, file: map one.csv, origin: [1, 1]}\n"
                   "  - {name: b, kind: onsite, file: map.csv, on: a}\n";
    write_file("map one.csv", "x,y\n0,0\n");
    write_file("map.csv", "x,y,energy\n0,0,1\n");
    reading r = read_beside(sheet);
    if (is_read(&r)) {
        const char *names[] = {"inputs/1: a.csv", "inputs/2.csv"};
        char *text = NULL;
        CHECK_INT(r.setup.n_files, 2);
        CHECK_STATUS(SV_INTERNAL,
                     sv_sheet_resolved_relocated(test_context(), r.sheet, names, 1, &text));
        CHECK_OK(sv_sheet_resolved_relocated(test_context(), r.sheet, names, 2, &text));
        CHECK(strstr(text, "file: \"inputs/1: a.csv\"\n") != NULL);
        CHECK(strstr(text, "file: inputs/2.csv\n") != NULL);
        CHECK(strstr(text, "map.csv") == NULL && strstr(text, "map one") == NULL);
        sv_give(test_context(), text);
        /* as it stands it reads back, too */
        reading again = read_beside(r.setup.resolved);
        if (is_read(&again))
            CHECK_TEXT(again.setup.identity, r.setup.identity);
        reading_free(&again);
    }
    reading_free(&r);
}
