/* SPDX-License-Identifier: GPL-3.0-or-later */
/* `--set path=value`. */
#include "sheet_testing.h"

static const char SHEET[] = FILM FLAKE "disorder:\n"
                                       "  - {name: vac, kind: vacancies, share: 0.1}\n"
                                       "  - {kind: onsite, distribution: box, width: 1}\n";

static reading set(const char *override)
{
    return read_with(SHEET, &override, 1);
}

SV_TEST(values_are_replaced)
{
    const char *overrides[] = {
        "model.m = -1.5",      "disorder.vac.share=0.3", "disorder.onsite.width=200 meV",
        "disorder.1.per=cell", "flake.cells.1=5",        "title=\"a: b\"",
        "title=later wins"};
    reading r = read_with(SHEET, overrides, 7);
    if (is_read(&r)) {
        CHECK_CLOSE(r.setup.model.orbitals[0].onsite, -1.5, 0.0);
        CHECK_CLOSE(r.setup.disorder[0].share, 0.3, 0.0);
        CHECK_CLOSE(r.setup.disorder[1].width, 0.2, 1e-16);
        CHECK(r.setup.disorder[1].per_cell);
        CHECK_INT(r.setup.flake.cells[0], 6);
        CHECK_INT(r.setup.flake.cells[1], 5);
        CHECK_TEXT(r.setup.title, "later wins");
    }
    reading_free(&r);
}

SV_TEST(missing_blocks_are_made)
{
    const char *overrides[] = {"ensemble.stop.standard_error=0.01", "ensemble.seed=7",
                               "markers.bott={}", "ensemble.stop.of=bott",
                               "occupation.filling=50 %"};
    reading r = read_with(SHEET, overrides, 5);
    if (is_read(&r)) {
        CHECK(r.setup.has_stop);
        CHECK_INT(r.setup.seed, 7);
        CHECK_INT(r.setup.n_markers, 1);
        CHECK_INT(r.setup.markers[0].kind, 1);
        CHECK_CLOSE(r.setup.occupation.filling, 0.5, 0.0);
    }
    reading_free(&r);
}

SV_TEST(whole_blocks_are_replaced)
{
    const char *overrides[] = {"flake={shape: disc, radius: 5}", "disorder=[]"};
    reading r = read_with(SHEET, overrides, 2);
    if (is_read(&r)) {
        CHECK_INT(r.setup.flake.shape, SV_SHAPE_DISC);
        CHECK_INT(r.setup.n_disorder, 0);
    }
    reading_free(&r);
}

SV_TEST(faults_point_into_the_override)
{
    static const struct {
        const char *override;
        int column;
        const char *message, *hint;
    } cases[] = {
        {"model.mm=3", 7, "unknown key mm in model", "did you mean m?"},
        {"ensmble.seed=3", 1, "unknown key ensmble in the sheet", "did you mean ensemble?"},
        {"model.m=12 nm", 9, "model.m: expected an energy, got a length (12 nm)", "eV meV"},
        {"disorder.vac.share=1.4", 20, "disorder.vac.share must be between 0 and 1, got 1.4", ""},
        {"disorder.vac2.share=0.1", 10, "disorder has no entry vac2", "did you mean vac?"},
        {"disorder.2.share=0.1", 10, "disorder has no entry 2", "vac, onsite"},
        {"sweep.0.to=1", 7, "sweep has no entry 0", "there are none"},
        {"flake.cells.2=1", 13, "flake.cells has no entry 2", "0 to 1"},
        {"selvedge.x=1", 10, "selvedge is a single value and has no x", ""},
        {"model.m", 1, "expected path=value", "--set disorder.vac.share=0.02"},
        {"=3", 1, "expected path=value", ""},
        {"model..m=3", 1, "model..m is not a dotted path", "with dots"},
        {"model.m=[1", 9, "not valid YAML", ""},
        {"model.m={a: 1, a: 2}", 16, "the key a is given twice", "line 1, column 10"},
        {"disorder.vac.count=3", 14, "disorder.vac: count excludes", "exactly one of"},
    };
    for (size_t i = 0; i < sizeof cases / sizeof cases[0]; i++) {
        reading r = set(cases[i].override);
        if (is_refused(&r, 1, cases[i].column, cases[i].message)) {
            const sv_diagnostic *item = find_said(&r.said, 1, cases[i].column, cases[i].message);
            CHECK_TEXT(item->file, "--set");
            CHECK_TEXT(item->text, cases[i].override);
            CHECK(cases[i].hint[0] == '\0' ||
                  (item->hint != NULL && strstr(item->hint, cases[i].hint) != NULL));
        } else
            printf("# %s\n", cases[i].override);
        reading_free(&r);
    }
}

SV_TEST(faults_of_the_sheet_are_still_its_own)
{
    const char *override = "model.m=-1";
    reading r = read_with(FILM "flake: {shape: rectangle, cells: [0, 4]}\n", &override, 1);
    is_refused(&r, 3, 35, "flake.cells must be");
    CHECK_TEXT(r.said.items[0].file, "sheet.yaml");
    reading_free(&r);
}
