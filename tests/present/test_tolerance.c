/* SPDX-License-Identifier: GPL-3.0-or-later */
/* What `tolerance` found, as JSON, CSV, words and figure. */
#include <jansson.h>
#include <stdlib.h>

#include "figure_fixture.h"

static sv_threshold_point asked[] = {
    {.parameter = 0.0, .responses = 12, .measure = 0.0, .standard_error = 0.001, .verdict = -1},
    {.parameter = 0.1, .responses = 80, .measure = 0.052, .standard_error = 0.004, .verdict = 0},
    {.parameter = 0.2, .responses = 12, .measure = 0.4, .standard_error = 0.03, .verdict = 1}};

static sv_tolerance_row row_of(const char *marker, bool primary, double value)
{
    return (sv_tolerance_row){.marker = marker,
                              .primary = primary,
                              .clean = 0.99,
                              .within = 0.05,
                              .answer = {.state = SV_THRESHOLD_FOUND,
                                         .value = value,
                                         .interval = {value - 0.01, value + 0.01},
                                         .confidence = 0.95,
                                         .responses = 104,
                                         .re_entry = NAN,
                                         .monotone_p = 0.7,
                                         .points = asked,
                                         .n_points = 3}};
}

static sv_tolerance_result result_of(sv_tolerance_row *rows, int n)
{
    return (sv_tolerance_result){.title = "Film <b> $(x)",
                                 .parameter = {.path = "disorder.vac.share", .scale = 1.0},
                                 .range = {0.0, 0.3},
                                 .precision = 0.01,
                                 .confidence = 0.95,
                                 .quantity = "local_chern",
                                 .of_mean = true,
                                 .within = 0.05,
                                 .share = NAN,
                                 .per_area = 4e14,
                                 .rows = rows,
                                 .n_rows = n,
                                 .realisations = 104};
}

SV_TEST(document_and_table)
{
    sv_tolerance_row rows[] = {row_of("local_chern", true, 0.1), row_of("bott", false, 0.13)};
    sv_tolerance_result result = result_of(rows, 2);
    char *json = NULL, *csv = NULL;
    CHECK(sv_tolerance_main(&result) == &rows[0]);
    CHECK_OK(sv_tolerance_json(test_context(), &result, &json));
    CHECK_OK(sv_tolerance_csv(test_context(), &result, &csv));
    json_t *document = json_loads(json, 0, NULL);
    if (CHECK(document != NULL)) {
        json_t *tolerable = json_object_get(document, "tolerable");
        CHECK_CLOSE(json_real_value(json_object_get(tolerable, "value")), 0.1, 1e-15);
        CHECK_CLOSE(json_real_value(json_array_get(json_object_get(tolerable, "interval"), 1)),
                    0.11, 1e-15);
        CHECK_CLOSE(
            json_number_value(json_object_get(json_object_get(document, "density"), "per_cm2")),
            4e13, 1.0);
        CHECK_INT(json_array_size(json_object_get(document, "points")), 3);
        CHECK_INT(json_array_size(json_object_get(document, "thresholds")), 2);
        CHECK(json_is_null(json_object_get(
            json_array_get(json_object_get(document, "thresholds"), 0), "re_entry")));
    }
    json_decref(document);
    CHECK(strstr(csv, "local_chern,0,0,,0.1,80,0,0.052,0.004,open\n") != NULL);
    sv_give(test_context(), json);
    sv_give(test_context(), csv);
}

static char *words_of(const sv_tolerance_result *result)
{
    char *text = NULL;
    size_t size = 0;
    FILE *stream = open_memstream(&text, &size);
    sv_tolerance_print(result, stream);
    fclose(stream);
    for (char *c = text; *c != '\0'; c++)
        *c = *c == '\n' ? ' ' : *c;
    return text;
}

SV_TEST(plain_words)
{
    sv_tolerance_row rows[] = {row_of("local_chern", true, 0.1), row_of("bott", false, 0.13)};
    sv_tolerance_result result = result_of(rows, 2);
    char *text = words_of(&result);
    CHECK(strstr(text, "0.100 [0.090, 0.110]") != NULL);
    CHECK(strstr(text, "4e+13 cm^-2 [3.6e+13, 4.4e+13]") != NULL);
    CHECK(strstr(text, "lasts 0.03 longer") != NULL);
    free(text);
    rows[0].answer.state = SV_THRESHOLD_NEVER;
    rows[0].answer.value = rows[0].answer.interval[0] = rows[0].answer.interval[1] = NAN;
    text = words_of(&result);
    CHECK(strstr(text, "Nothing is tolerable") != NULL && strstr(text, "Evidence: at 0 ") != NULL);
    free(text);
    rows[0].answer.state = SV_THRESHOLD_ALWAYS;
    text = words_of(&result);
    CHECK(strstr(text, "No limit found") != NULL && strstr(text, "at 0.2 ") != NULL);
    free(text);
}

SV_TEST(figure_of_points_and_of_a_frontier)
{
    sv_tolerance_row rows[] = {row_of("local_chern", true, 0.1), row_of("local_chern", true, 0.13)};
    sv_tolerance_result result = result_of(rows, 1);
    sv_figure_files files = {0};
    CHECK_OK(sv_figure_tolerance(test_context(), test_scratch("figures"), "one", &result, &files));
    CHECK(files.data[0] != '\0');
    result.n_rows = 2;
    result.second = (sv_shown_parameter){.path = "disorder.pot.width", .scale = 1.0};
    rows[0].has_second = rows[1].has_second = true;
    rows[0].second = 2.0;
    CHECK_OK(sv_figure_tolerance(test_context(), test_scratch("figures"), "two", &result, &files));
    result.n_rows = 0;
    char *json = NULL;
    CHECK_STATUS(SV_INVALID_INPUT, sv_figure_tolerance(test_context(), test_scratch("figures"),
                                                       "three", &result, &files));
    CHECK_STATUS(SV_INVALID_INPUT, sv_tolerance_json(test_context(), &result, &json));
}
