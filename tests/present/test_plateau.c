/* SPDX-License-Identifier: GPL-3.0-or-later */
/* A marker against the Fermi energy, as JSON, CSV, words and figure. */
#include <jansson.h>
#include <stdlib.h>

#include "figure_fixture.h"

static const double energies[] = {-1, 0, 1}, mean[] = {0.2, 1, 0.4}, error[] = {0.1, NAN, 0.05};
static const double kelvin[] = {0, 4}, thermal[] = {0.2, 1, 0.4, NAN, 0.9, NAN};
static const double thermal_error[] = {0.1, NAN, 0.05, NAN, 0.01, NAN}, widths[] = {0.5, NAN};

static sv_plateau_result made_up(void)
{
    return (sv_plateau_result){.title = "Invented",
                               .marker = "local_chern",
                               .clean = 1,
                               .within = 0.1,
                               .confidence = 0.95,
                               .energy_unit = 0.02,
                               .energies = energies,
                               .mean = mean,
                               .standard_error = error,
                               .n = 3,
                               .realisations = 7,
                               .unresolved = 2,
                               .kelvin = kelvin,
                               .thermal = thermal,
                               .thermal_error = thermal_error,
                               .thermal_width = widths,
                               .n_temperatures = 2,
                               .plateau = {.exists = true,
                                           .width = 0.5,
                                           .centre = 0.1,
                                           .edges = {-0.15, 0.35},
                                           .interval = {0.4, 0.6}},
                               .density_energies = energies,
                               .density = mean,
                               .n_density = 3};
}

SV_TEST(document_table_and_words)
{
    sv_plateau_result result = made_up();
    char *json = NULL, *csv = NULL, *text = NULL;
    size_t size = 0;
    CHECK_OK(sv_plateau_json(test_context(), &result, &json));
    CHECK_OK(sv_plateau_csv(test_context(), &result, &csv));
    json_t *document = json_loads(json, 0, NULL);
    if (CHECK(document != NULL)) {
        json_t *window = json_object_get(document, "plateau");
        CHECK_CLOSE(json_real_value(json_object_get(window, "width_meV")), 10.0, 1e-12);
        CHECK(json_is_null(json_array_get(json_object_get(document, "standard_error"), 1)));
        json_t *warm = json_array_get(json_object_get(document, "temperatures"), 1);
        CHECK(json_is_null(json_array_get(json_object_get(warm, "mean"), 0)));
        /* k_B = 8.617333262e-5 eV/K (CODATA 2018, exact) */
        CHECK_CLOSE(json_real_value(json_object_get(warm, "kT_meV")), 4 * 0.08617333262, 1e-9);
    }
    json_decref(document);
    CHECK(strstr(csv, "\n0,1,,1,,0.9,0.01\n") != NULL);
    FILE *stream = open_memstream(&text, &size);
    sv_plateau_print(&result, stream);
    fclose(stream);
    CHECK(strstr(text, "a window of 10 meV (95 % interval 8 meV to 12 meV).") != NULL);
    CHECK(strstr(text, "2 of the values are unresolved") != NULL);
    free(text);
    sv_give(test_context(), json);
    sv_give(test_context(), csv);
}

SV_TEST(figure)
{
    sv_plateau_result result = made_up();
    sv_figure_files files = {0};
    choose_folder("plateaus");
    CHECK_OK(sv_figure_plateau(test_context(), folder, "plateau", &result, &files));
    check_files(&files, "plateau");
    result.n = 1;
    CHECK_STATUS(SV_INVALID_INPUT,
                 sv_figure_plateau(test_context(), folder, "plateau", &result, &files));
}
