/* SPDX-License-Identifier: GPL-3.0-or-later */
/* One realisation as JSON and on the terminal. */
#include <jansson.h>

#include "fixture.h"

static const sv_flake_spec square = {
    .shape = SV_SHAPE_RECTANGLE, .has_cells = true, .cells = {8, 8}};

static json_t *read_back(const sv_map_result *map)
{
    sv_context *context = test_context();
    char *text = NULL;
    CHECK_OK(sv_map_json(context, map, &text));
    json_t *document = json_loads(text, JSON_REJECT_DUPLICATES, NULL);
    CHECK(document != NULL);
    sv_give(context, text);
    return document;
}

SV_TEST(the_map_has_the_shape_of_the_contract)
{
    map_fixture f;
    map_fixture_make(&f, false, &square, 0);
    f.record.realisation = 5;
    f.record.outcomes[0].sum_over_sites = -1e-13;
    f.record.outcomes[1].weakest = 0.5;
    f.record.outcomes[1].margin = 2.5;
    json_t *document = read_back(&f.map);
    CHECK_TEXT(json_string_value(json_object_get(document, "command")), "map");
    CHECK_INT(json_integer_value(json_object_get(document, "realisation")), 5);
    CHECK_INT(json_integer_value(json_object_get(document, "sites")), 128);
    CHECK_INT(json_integer_value(json_object_get(document, "vacancies")), 0);
    json_t *markers = json_object_get(document, "markers");
    const json_t *chern = json_object_get(markers, "local_chern");
    CHECK(json_real_value(json_object_get(chern, "window_mean")) == 0.98);
    CHECK_INT(json_integer_value(json_object_get(chern, "window_cells")), 16);
    CHECK(json_real_value(json_object_get(chern, "sum_over_sites")) == -1e-13);
    CHECK(json_object_get(chern, "reason") == NULL);
    CHECK(json_object_get(chern, "highest_occupied") == NULL); /* not known here */
    const json_t *bott = json_object_get(markers, "bott");
    CHECK(json_is_integer(json_object_get(bott, "index")));
    CHECK_INT(json_integer_value(json_object_get(bott, "index")), 1);
    CHECK(json_is_true(json_object_get(bott, "resolved")));
    CHECK(json_real_value(json_object_get(bott, "angle_margin")) == 2.5);
    CHECK(json_real_value(json_object_get(bott, "smallest_modulus")) == 0.5);
    json_decref(document);
    map_fixture_free(&f);
}

SV_TEST(unresolved_values_are_null_with_a_reason)
{
    map_fixture f;
    map_fixture_make(&f, false, &square, 0);
    for (int i = 0; i < 2; i++) {
        f.record.outcomes[i].verdict = i == 0 ? SV_UNRESOLVED : SV_ABSENT;
        snprintf(f.record.outcomes[i].reason, 200, "reason %d", i);
    }
    json_t *document = read_back(&f.map);
    json_t *markers = json_object_get(document, "markers");
    const json_t *chern = json_object_get(markers, "local_chern");
    CHECK(json_is_null(json_object_get(chern, "window_mean")));
    CHECK_TEXT(json_string_value(json_object_get(chern, "reason")), "reason 0");
    const json_t *bott = json_object_get(markers, "bott");
    CHECK(json_is_null(json_object_get(bott, "index")));
    CHECK(json_is_false(json_object_get(bott, "resolved")));
    CHECK_TEXT(json_string_value(json_object_get(bott, "reason")), "reason 1");
    json_decref(document);
    map_fixture_free(&f);
}

SV_TEST(the_map_prints_in_80_columns)
{
    map_fixture f;
    map_fixture_make(&f, false, &square, 0);
    f.record.outcomes[0].highest_occupied = -1.0 / 3;
    f.record.outcomes[0].lowest_empty = 1.0 / 3;
    f.record.outcomes[1].verdict = SV_FAILED;
    memset(f.record.outcomes[1].reason, 'x', 199);
    char *text = NULL;
    size_t size = 0;
    FILE *stream = open_memstream(&text, &size);
    sv_map_print(&f.map, false, stream);
    fclose(stream);
    CHECK(strstr(text, "0.98   mean over 16 cells") != NULL);
    CHECK(strstr(text, "failed") != NULL && strstr(text, "-0.333333") != NULL);
    char *rest = NULL;
    for (char *line = strtok_r(text, "\n", &rest); line != NULL; line = strtok_r(NULL, "\n", &rest))
        CHECK(strlen(line) <= 80);
    free(text);
    map_fixture_free(&f);
}

SV_TEST(a_sampled_window_states_its_estimator_error)
{
    map_fixture f;
    map_fixture_make(&f, false, &square, 0);
    for (int k = 0; k < 2; k++) {
        char *text = NULL;
        size_t size = 0;
        FILE *stream = open_memstream(&text, &size);
        f.record.outcomes[0].estimator_error = k == 0 ? 0.0 : 0.0123;
        sv_map_print(&f.map, false, stream);
        fclose(stream);
        CHECK((strstr(text, "0.012   estimator error") != NULL) == (k == 1));
        free(text);
    }
    map_fixture_free(&f);
}

SV_TEST(a_map_states_which_levels_are_resolved)
{
    static const struct {
        double within, nearest;
        const char *engine, *expected;
    } rows[] = {
        {0.25, 0.125, "chebyshev", "levels within 0.25 of the Fermi energy not resolved\n"},
        {0.25, NAN, "chebyshev", "levels within 0.25 of the Fermi energy not resolved\n"},
        {0.0, 0.125, "rational", "nearest level 0.125 from the Fermi energy\n"},
        {0.0, 0.125, "dense", NULL},
        {NAN, NAN, "", NULL},
    };
    map_fixture f;
    map_fixture_make(&f, false, &square, 0);
    for (size_t k = 0; k < sizeof rows / sizeof *rows; k++) {
        sv_outcome *o = &f.record.outcomes[0];
        char *text = NULL;
        size_t size = 0;
        FILE *stream = open_memstream(&text, &size);
        o->unresolved_within = rows[k].within;
        o->nearest_level = rows[k].nearest;
        snprintf(o->engine, sizeof o->engine, "%s", rows[k].engine);
        sv_map_print(&f.map, false, stream);
        fclose(stream);
        const char *expected = rows[k].expected;
        CHECK(strstr(text, expected != NULL ? expected : "resolved") != NULL ? expected != NULL
                                                                             : expected == NULL);
        free(text);
        json_t *document = read_back(&f.map);
        const json_t *chern = json_object_get(json_object_get(document, "markers"), "local_chern");
        const json_t *within = json_object_get(chern, "levels_unresolved_within");
        CHECK(isnan(rows[k].within) ? within == NULL : json_number_value(within) == rows[k].within);
        json_decref(document);
    }
    map_fixture_free(&f);
}
