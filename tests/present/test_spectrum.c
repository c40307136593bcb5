/* SPDX-License-Identifier: GPL-3.0-or-later */
/* An invented spectrum as JSON, CSV, table and figure. */
#include <jansson.h>

#include "figure_fixture.h"

typedef struct invented {
    sv_near_level near[5];
    double energies[40], density[40];
    sv_spectrum spectrum;
    sv_spectrum_result result;
} invented;

static void invent(invented *f)
{
    memset(f, 0, sizeof *f);
    for (int k = 0; k < 5; k++)
        f->near[k] = (sv_near_level){0.1 * k - 0.25, 0.125 / (k + 1), 0.2 * k};
    for (int k = 0; k < 40; k++) {
        f->energies[k] = 0.1 * k - 1.95;
        f->density[k] = 0.25 + 0.005 * k;
    }
    f->spectrum = (sv_spectrum){.sites = 5000,
                                .states_below = 2500,
                                .fermi_energy = 0.0,
                                .highest_occupied = -0.05,
                                .lowest_empty = 0.05,
                                .gap = 0.1,
                                .resolution = 1e-9,
                                .bounds = {-2.0, 2.0},
                                .near = f->near,
                                .n_near = 5,
                                .gap_ratio = 0.58,
                                .gap_ratio_error = 0.04,
                                .gap_ratio_levels = 5,
                                .energies = f->energies,
                                .density = f->density,
                                .n_density = 40,
                                .density_resolution = 0.0125,
                                .density_error = 0.003,
                                .method = "Chebyshev moments, random phases"};
    f->result = (sv_spectrum_result){"Invented spectrum", 3, &f->spectrum, NULL};
}

static void make_unknown(invented *f)
{
    const double none = (double)NAN;
    f->spectrum.states_below = -1;
    f->spectrum.on_level = true;
    f->spectrum.highest_occupied = f->spectrum.lowest_empty = f->spectrum.gap = none;
    f->spectrum.gap_ratio = f->spectrum.gap_ratio_error = none;
    f->spectrum.gap_ratio_levels = f->spectrum.n_near = 0;
    f->spectrum.near = NULL;
    snprintf(
        f->spectrum.reason, sizeof f->spectrum.reason, "%s",
        "a level coincides with the Fermi energy 0: between 2499 and 2501 states are occupied");
    snprintf(f->spectrum.near_reason, sizeof f->spectrum.near_reason, "%s", "too many levels");
    snprintf(f->spectrum.gap_ratio_reason, sizeof f->spectrum.gap_ratio_reason, "%s", "no levels");
}

static json_t *read_back(const invented *f)
{
    char *text = NULL;
    CHECK_OK(sv_spectrum_json(test_context(), &f->result, &text));
    json_t *document = json_loads(text, JSON_REJECT_DUPLICATES, NULL);
    CHECK(document != NULL);
    sv_give(test_context(), text);
    return document;
}

static double real_at(const json_t *object, const char *key)
{
    CHECK(json_is_real(json_object_get(object, key)));
    return json_real_value(json_object_get(object, key));
}

SV_TEST(the_spectrum_has_the_shape_of_the_contract)
{
    invented f;
    invent(&f);
    json_t *document = read_back(&f);
    CHECK_INT(json_integer_value(json_object_get(document, "selvedge")), 1);
    CHECK_TEXT(json_string_value(json_object_get(document, "command")), "spectrum");
    CHECK_TEXT(json_string_value(json_object_get(document, "title")), "Invented spectrum");
    CHECK_INT(json_integer_value(json_object_get(document, "realisation")), 3);
    CHECK_INT(json_integer_value(json_object_get(document, "sites")), 5000);
    CHECK_INT(json_integer_value(json_object_get(document, "states_below_fermi")), 2500);
    CHECK(real_at(document, "highest_occupied") == -0.05);
    CHECK(real_at(document, "lowest_empty") == 0.05 && real_at(document, "gap") == 0.1);
    CHECK(json_real_value(json_array_get(json_object_get(document, "bounds"), 1)) == 2.0);
    CHECK(json_is_false(json_object_get(document, "on_level")));
    CHECK(json_object_get(document, "reason") == NULL);
    const json_t *near = json_object_get(document, "near");
    CHECK_INT(json_array_size(near), 5);
    CHECK(real_at(json_array_get(near, 4), "energy") == f.near[4].energy);
    CHECK(real_at(json_array_get(near, 1), "participation") == 0.0625);
    CHECK(real_at(json_array_get(near, 1), "edge_weight") == 0.2);
    const json_t *ratio = json_object_get(document, "gap_ratio");
    CHECK(real_at(ratio, "mean") == 0.58 && real_at(ratio, "standard_error") == 0.04);
    CHECK_INT(json_integer_value(json_object_get(ratio, "levels")), 5);
    const json_t *density = json_object_get(document, "density");
    CHECK_INT(json_array_size(json_object_get(density, "energies")), 40);
    CHECK_INT(json_array_size(json_object_get(density, "states")), 40);
    CHECK(real_at(density, "resolution") == 0.0125 && real_at(density, "estimator_error") == 0.003);
    CHECK_TEXT(json_string_value(json_object_get(density, "method")), f.spectrum.method);
    json_decref(document);
}

SV_TEST(what_does_not_exist_is_null_with_a_reason)
{
    static const char *const keys[] = {"states_below_fermi", "highest_occupied", "lowest_empty",
                                       "gap", "near"};
    invented f;
    invent(&f);
    f.near[0].edge_weight = (double)NAN;
    json_t *document = read_back(&f);
    const json_t *state = json_array_get(json_object_get(document, "near"), 0);
    CHECK(json_is_null(json_object_get(state, "edge_weight")));
    CHECK_TEXT(json_string_value(json_object_get(state, "reason")), "a torus has no edge");
    json_decref(document);
    make_unknown(&f);
    document = read_back(&f);
    for (int k = 0; k < 5; k++)
        CHECK(json_is_null(json_object_get(document, keys[k])));
    CHECK(json_is_true(json_object_get(document, "on_level")));
    CHECK_TEXT(json_string_value(json_object_get(document, "reason")), f.spectrum.reason);
    CHECK_TEXT(json_string_value(json_object_get(document, "near_reason")), "too many levels");
    const json_t *ratio = json_object_get(document, "gap_ratio");
    CHECK(json_is_null(json_object_get(ratio, "mean")));
    CHECK_TEXT(json_string_value(json_object_get(ratio, "reason")), "no levels");
    json_decref(document);
}

SV_TEST(the_density_is_written_as_csv)
{
    invented f;
    invent(&f);
    char *text = NULL, *rest = NULL;
    CHECK_OK(sv_spectrum_csv(test_context(), &f.result, &text));
    const char *line = strtok_r(text, "\n", &rest);
    CHECK_TEXT(line, "energy,density");
    int rows = 0;
    for (line = strtok_r(NULL, "\n", &rest); line != NULL; line = strtok_r(NULL, "\n", &rest)) {
        double energy = 0, density = 0;
        CHECK(sscanf(line, "%lf,%lf", &energy, &density) == 2 && rows < 40);
        CHECK(energy == f.energies[rows] && density == f.density[rows]);
        rows++;
    }
    CHECK_INT(rows, 40);
    sv_give(test_context(), text);
}

static char *print(const invented *f)
{
    char *text = NULL;
    size_t size = 0;
    FILE *stream = open_memstream(&text, &size);
    sv_spectrum_print(&f->result, false, stream);
    fclose(stream);
    for (const char *line = text; *line != '\0'; line += strcspn(line, "\n") + 1)
        CHECK(strcspn(line, "\n") <= 80);
    return text;
}

SV_TEST(the_table_fits_80_columns)
{
    invented f;
    invent(&f);
    char *text = print(&f);
    CHECK(strstr(text, "2500 of 5000") != NULL && strstr(text, "0.58(4) over 5 levels") != NULL);
    CHECK(strstr(text, "realisation 3") != NULL && strstr(text, "edge weight") != NULL);
    free(text);
    make_unknown(&f);
    memset(f.spectrum.near_reason, 'x', 199);
    text = print(&f);
    CHECK(strstr(text, "a level coincides with the Fermi energy\n") != NULL);
    CHECK(strstr(text, "nan") == NULL && strstr(text, "xxxx") != NULL);
    free(text);
}

static bool holds(const char *name, const char *part)
{
    size_t size;
    char *text = slurp(inside(name), &size);
    bool found = strstr(text, part) != NULL;
    free(text);
    return found;
}

SV_TEST(the_figure_shades_the_gap_and_shows_levels)
{
    invented f;
    sv_figure_files files = {.drawn = false};
    invent(&f);
    choose_folder("spectrum");
    CHECK_OK(sv_figure_spectrum(test_context(), folder, "spectrum", &f.result, &files));
    check_files(&files, "spectrum");
    CHECK(holds("spectrum.gp", "rectangle from first -0.05,graph 0 to first 0.05,graph 1"));
    CHECK(holds("spectrum.gp", "index 1 using 1:3") && holds("spectrum.gp", "gap 0.1 (shaded)"));
    CHECK(holds("spectrum.dat", "# levels") && holds("spectrum.dat", "-0.25 0.125 0"));
}

SV_TEST(the_figure_without_gap_and_levels)
{
    invented f;
    sv_figure_files files = {.drawn = false};
    invent(&f);
    make_unknown(&f);
    f.result.title = "";
    choose_folder("unknown");
    CHECK_OK(sv_figure_spectrum(test_context(), folder, "spectrum", &f.result, &files));
    check_files(&files, "unknown");
    CHECK(!holds("spectrum.gp", "rectangle") && !holds("spectrum.gp", "index 1"));
    f.spectrum.fermi_energy = (double)NAN; /* a filling of a sample too large to count */
    f.spectrum.near = f.near;
    f.spectrum.n_near = 1;
    f.near[0].edge_weight = (double)NAN;
    CHECK_OK(sv_figure_spectrum(test_context(), folder, "torus", &f.result, &files));
    check_files(&files, "torus");
    CHECK(holds("torus.gp", "positions covered") && !holds("torus.gp", "nan"));
    CHECK(holds("torus.gp", "using 1:(1/$2)") && !holds("torus.gp", "using 1:3"));
}
