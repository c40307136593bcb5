/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Files that a sheet names. */
#include "sheet_testing.h"

#include <sys/stat.h>
#include <unistd.h>

/* Writes a scratch file; returns the name of the sheet that stands beside it. */
static const char *write_file(const char *name, const char *text)
{
    FILE *file = fopen(test_scratch(name), "w");
    if (file == NULL || fputs(text, file) < 0 || fclose(file) != 0)
        abort();
    return test_scratch("sheet.yaml");
}

static reading read_beside(const char *text, bool confined)
{
    sv_sheet_options options = reading_options(NULL, 0);
    options.confined = confined;
    return read_named(test_scratch("sheet.yaml"), text, strlen(text), &options);
}

#define DEFECTS FILM FLAKE "disorder:\n  - {name: spots, kind: vacancies, file: spots.csv}\n"

SV_TEST(measured_defects)
{
    write_file("spots.csv", "x,y\n1 nm,0.5 nm\n0,0\n");
    reading r = read_beside(DEFECTS, false);
    if (is_read(&r)) {
        const sv_disorder *d = &r.setup.disorder[0];
        CHECK(d->has_marks && !d->has_share && !d->has_count);
        CHECK_INT(d->n_marks, 2);
        CHECK_CLOSE(d->marks[0].at[0], 2.0, 1e-14);
        CHECK_CLOSE(d->marks[0].at[1], 1.0, 1e-14);
        CHECK_CLOSE(d->tolerance, 0.75, 0.0);
        CHECK_INT(r.setup.n_files, 1);
        CHECK_TEXT(r.setup.files[0].written, "spots.csv");
        CHECK_TEXT(r.setup.files[0].path, test_scratch("spots.csv"));
        CHECK_TEXT(r.setup.files[0].key_path, "disorder.spots.file");
        char digest[65];
        sv_digest("x,y\n1 nm,0.5 nm\n0,0\n", 20, digest);
        CHECK_TEXT(r.setup.files[0].digest, digest);
    }
    reading_free(&r);
}

SV_TEST(origin_and_tolerance)
{
    write_file("spots.csv", "x,y\n0,0\n");
    reading r = read_beside(FILM FLAKE "disorder:\n  - {kind: vacancies, file: spots.csv, "
                                       "origin: [1 nm, 3], tolerance: 0.1 nm}\n",
                            false);
    if (is_read(&r)) {
        CHECK_CLOSE(r.setup.disorder[0].marks[0].at[0], 2.0, 1e-14);
        CHECK_CLOSE(r.setup.disorder[0].marks[0].at[1], 3.0, 1e-14);
        CHECK_CLOSE(r.setup.disorder[0].tolerance, 0.2, 1e-15);
    }
    reading_free(&r);
}

SV_TEST(a_potential_map)
{
    write_file("map.csv", "cell_i,cell_j,energy\n0,0,500 meV\n1,2,-1 eV\n");
    reading r = read_beside("selvedge: 1\n"
                            "model: {name: qi_wu_zhang, m: -1, energy_unit: 2 eV}\n" FLAKE
                            "disorder:\n  - {name: pot, kind: onsite, file: map.csv}\n",
                            false);
    if (is_read(&r)) {
        CHECK_INT(r.setup.disorder[0].n_marks, 2);
        CHECK_CLOSE(r.setup.disorder[0].marks[0].energy, 0.25, 1e-15);
        CHECK_CLOSE(r.setup.disorder[0].marks[1].energy, -0.5, 1e-15);
    }
    reading_free(&r);
}

/* The message about the file itself, with its own place and line. */
static void check_file_fault(const char *csv, int line, const char *text)
{
    write_file("spots.csv", csv);
    reading r = read_beside(DEFECTS, false);
    CHECK(r.status == SV_INVALID_INPUT);
    if (CHECK(r.said.count == 1)) {
        CHECK_TEXT(r.said.items[0].file, test_scratch("spots.csv"));
        CHECK_INT(r.said.items[0].line, line);
        CHECK(r.said.items[0].column >= 1);
        CHECK_TEXT(r.said.items[0].text, text);
    }
    reading_free(&r);
}

SV_TEST(faults_of_a_file_point_into_it)
{
    check_file_fault("x,y\n1,2\n3,x4\n", 3, "3,x4");
    check_file_fault("x,y\n1 eV,2\n", 2, "1 eV,2");
    check_file_fault("x,why\n1,2\n", 1, "x,why");
    /* outside the film of 6×4 cells */
    check_file_fault("x,y\n1,2\n\n# far away\n40,2\n", 5, "40,2");
}

SV_TEST(a_file_is_read_once)
{
    write_file("spots.csv", "x,y\n0,0\n");
    reading r = read_beside(DEFECTS, false);
    if (is_read(&r)) {
        sv_setup again = {0};
        write_file("spots.csv", "x,y\n0,0\n1,1\n");
        CHECK_OK(sv_sheet_setup(test_context(), r.sheet, NULL, 0, &r.said, &again));
        CHECK_INT(again.disorder[0].n_marks, 1);
        CHECK_TEXT(again.identity, r.setup.identity);
        sv_setup_free(test_context(), &again);
    }
    reading_free(&r);
}

SV_TEST(a_confined_sheet_stays_in_its_folder)
{
    char sheet[1000], absolute[600];
    write_file("spots.csv", "x,y\n0,0\n");
    mkdir(test_scratch("inputs"), 0700);
    write_file("inputs/in.csv", "x,y\n0,0\n");
    CHECK(symlink("spots.csv", test_scratch("link.csv")) == 0);
    CHECK(symlink("inputs", test_scratch("linked")) == 0);
    snprintf(absolute, sizeof absolute, "%s", test_scratch("spots.csv"));
    const struct {
        const char *file;
        bool good;
    } cases[] = {{"spots.csv", true},
                 {"inputs/in.csv", true},
                 {"./spots.csv", true},
                 {"../x/spots.csv", false},
                 {"link.csv", false},
                 {"linked/in.csv", false},
                 {"inputs/../spots.csv", false},
                 {absolute, false}};
    for (size_t i = 0; i < sizeof cases / sizeof cases[0]; i++) {
        snprintf(sheet, sizeof sheet, FILM FLAKE "disorder:\n  - {kind: vacancies, file: %s}\n",
                 cases[i].file);
        reading r = read_beside(sheet, true);
        if (cases[i].good)
            is_read(&r);
        else
            is_refused(&r, 5, 29, "disorder.vacancies.file: ");
        reading_free(&r);
    }
    reading r = read_beside(FILM FLAKE "disorder:\n  - {kind: vacancies, file: link.csv}\n", false);
    is_read(&r);
    reading_free(&r);
    unlink(test_scratch("link.csv"));
    unlink(test_scratch("linked"));
}
