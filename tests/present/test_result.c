/* SPDX-License-Identifier: GPL-3.0-or-later */
/* JSON, CSV and table of an ensemble. */
#include <jansson.h>

#include "fixture.h"

static json_t *read_back(const sv_result *result)
{
    sv_context *context = test_context();
    char *text = NULL;
    json_error_t error;
    CHECK_OK(sv_result_json(context, result, &text));
    json_t *document = json_loads(text, JSON_REJECT_DUPLICATES, &error);
    CHECK(document != NULL);
    CHECK(text[strlen(text) - 1] == '\n');
    sv_give(context, text);
    return document;
}

static json_t *marker_of(json_t *document, size_t point, const char *name)
{
    json_t *points = json_object_get(document, "points");
    return json_object_get(json_object_get(json_array_get(points, point), "markers"), name);
}

static double number(const json_t *object, const char *key)
{
    return json_real_value(json_object_get(object, key));
}

SV_TEST(the_json_has_the_shape_of_the_contract)
{
    fixture f;
    fixture_make(&f);
    json_t *document = read_back(&f.result);
    CHECK_INT(json_integer_value(json_object_get(document, "selvedge")), 1);
    CHECK_TEXT(json_string_value(json_object_get(document, "command")), "average");
    CHECK_TEXT(json_string_value(json_object_get(document, "title")), "Invented vacancies");
    CHECK(json_is_true(json_object_get(document, "complete")));
    json_t *points = json_object_get(document, "points");
    CHECK_INT(json_array_size(points), 3);
    const json_t *point = json_array_get(points, 0);
    CHECK(number(json_object_get(point, "parameters"), "disorder.vac.share") == 0.02);
    CHECK_INT(json_integer_value(json_object_get(point, "realisations")), 200);
    json_t *chern = marker_of(document, 0, "local_chern");
    CHECK(number(chern, "mean") == 0.9981 && number(chern, "standard_error") == 0.0004);
    CHECK(json_real_value(json_array_get(json_object_get(chern, "interval"), 1)) == 0.9989);
    CHECK(number(chern, "confidence") == 0.95 && number(chern, "deviation") == 0.0057);
    CHECK(number(json_object_get(chern, "quantiles"), "0.95") == 0.5);
    CHECK(number(chern, "numerical_error") == 2e-8);
    CHECK(!signbit(number(chern, "estimator_error")));
    CHECK_INT(json_integer_value(json_object_get(chern, "unresolved")), 0);
    CHECK_TEXT(json_string_value(json_object_get(chern, "engine")), "dense");
    json_t *bott = marker_of(document, 2, "bott");
    const json_t *share = json_array_get(json_object_get(bott, "shares"), 1);
    CHECK(json_is_integer(json_object_get(share, "index")));
    CHECK_INT(json_integer_value(json_object_get(share, "index")), 1);
    CHECK_INT(json_integer_value(json_object_get(share, "count")), 97);
    CHECK(json_real_value(json_array_get(json_object_get(share, "interval"), 0)) == 0.981);
    CHECK_INT(json_integer_value(json_object_get(bott, "unresolved")), 3);
    CHECK(json_is_string(json_object_get(bott, "unresolved_reason")));
    CHECK(json_real_value(json_array_get(json_object_get(bott, "bounds"), 0)) == 0.47);
    CHECK(number(json_object_get(bott, "angle_margin"), "smallest") == 0.125);
    json_decref(document);
}

SV_TEST(the_spread_over_realisations)
{
    fixture f;
    fixture_make(&f);
    snprintf(f.points[1].summaries[0].warning, 200, "skewed (-2.5) for 200 values");
    json_t *document = read_back(&f.result);
    json_t *chern = marker_of(document, 0, "local_chern");
    CHECK(number(chern, "skewness") == -2.5 && number(chern, "kurtosis") == 7.5);
    CHECK(json_real_value(json_array_get(json_object_get(chern, "interval_corrected"), 0)) ==
          0.9962);
    CHECK(json_real_value(json_array_get(json_object_get(chern, "interval_bca"), 1)) == 0.9988);
    CHECK_INT(json_integer_value(json_object_get(chern, "resamples")), 2000);
    CHECK(json_object_get(chern, "warning") == NULL);
    CHECK_TEXT(json_string_value(json_object_get(marker_of(document, 1, "local_chern"), "warning")),
               "skewed (-2.5) for 200 values");
    const json_t *intervals = json_object_get(chern, "quantile_intervals");
    CHECK(json_is_null(json_array_get(json_object_get(intervals, "0.05"), 0)));
    CHECK(json_real_value(json_array_get(json_object_get(intervals, "0.25"), 1)) == 0.25);
    const json_t *histogram = json_object_get(chern, "histogram");
    CHECK(number(histogram, "low") == 0.9 && number(histogram, "width") == 0.05);
    CHECK_INT(json_array_size(json_object_get(histogram, "counts")), 2);
    CHECK_INT(json_integer_value(json_array_get(json_object_get(histogram, "counts"), 1)), 160);
    const json_t *peaks = json_object_get(chern, "two_peaks");
    CHECK(json_is_false(json_object_get(peaks, "apart")) && number(peaks, "explained") == 0.7);
    CHECK_INT(json_integer_value(json_array_get(json_object_get(peaks, "counts"), 1)), 170);
    CHECK_CLOSE(number(json_object_get(chern, "error_parts"), "disorder"), 0.0057 / sqrt(200.0),
                1e-18);
    json_t *bott = marker_of(document, 1, "bott");
    const json_t *share = json_array_get(json_object_get(bott, "shares"), 0);
    CHECK(json_real_value(json_array_get(json_object_get(share, "exact_interval"), 1)) == 0.21);
    CHECK(json_object_get(bott, "histogram") == NULL && number(bott, "skewness") == -2.5);
    json_decref(document);
}

SV_TEST(comparisons_of_points)
{
    fixture f;
    fixture_make(&f);
    f.comparisons[1].neighbour = true;
    json_t *document = read_back(&f.result);
    const json_t *rows = json_object_get(document, "comparisons");
    CHECK_INT(json_array_size(rows), 2);
    const json_t *row = json_array_get(rows, 1);
    CHECK_TEXT(json_string_value(json_object_get(row, "marker")), "bott");
    CHECK_INT(json_array_size(json_object_get(row, "against")), 2);
    CHECK(number(json_object_get(row, "parameters"), "disorder.vac.share") == 0.06);
    CHECK(number(json_object_get(row, "other_parameters"), "disorder.vac.share") == 0.02);
    CHECK(number(row, "difference") == -0.5 && number(row, "p_value") == 0.0625);
    CHECK(number(json_object_get(row, "unpaired"), "standard_error") == 0.025);
    CHECK_INT(json_integer_value(json_object_get(row, "lost")), 100);
    CHECK(json_object_get(json_array_get(rows, 0), "lost") == NULL);
    json_decref(document);
    char *text = NULL;
    CHECK_OK(sv_comparisons_csv(test_context(), &f.result, &text));
    CHECK(strstr(text,
                 "\nlocal_chern,first,2,0,197,-0.5,0.0125,-0.525,-0.475,0.0625,0.03125,0.75,0.025,"
                 "0.5,,,\n") != NULL);
    CHECK(strstr(text, "\nbott,first neighbour,2,0,197,") != NULL);
    CHECK(strstr(text, ",0.5,1,100,4\n") != NULL);
    sv_give(test_context(), text);
}

SV_TEST(what_does_not_exist_is_null_with_a_reason)
{
    fixture f;
    fixture_make(&f);
    f.points[0].summaries[1] = (sv_summary){.marker = "bott", .is_index = true};
    snprintf(f.points[0].summaries[1].reason, 200, "no torus exists for a disc");
    f.points[1].summaries[0].standard_error = (double)NAN;
    f.points[1].summaries[0].interval[0] = f.points[1].summaries[0].interval[1] = (double)NAN;
    json_t *document = read_back(&f.result);
    const json_t *bott = marker_of(document, 0, "bott");
    CHECK(json_is_null(json_object_get(bott, "mean")));
    CHECK_TEXT(json_string_value(json_object_get(bott, "reason")), "no torus exists for a disc");
    const json_t *chern = marker_of(document, 1, "local_chern");
    CHECK(json_is_real(json_object_get(chern, "mean")));
    CHECK(json_is_null(json_object_get(chern, "standard_error")));
    CHECK(json_is_null(json_object_get(chern, "interval")));
    CHECK(json_is_string(json_object_get(chern, "reason")));
    json_decref(document);
}

SV_TEST(timings_stay_outside_the_points)
{
    fixture f;
    fixture_make(&f);
    json_t *first = read_back(&f.result);
    f.result.seconds = 99;
    f.result.complete = false;
    json_t *second = read_back(&f.result);
    CHECK(json_equal(json_object_get(first, "points"), json_object_get(second, "points")));
    CHECK(number(json_object_get(second, "timings"), "seconds") == 99);
    CHECK(json_is_false(json_object_get(second, "complete")));
    json_decref(first);
    json_decref(second);
}

SV_TEST(integers_stay_integers_and_odd_titles_stay_texts)
{
    fixture f;
    fixture_make(&f);
    f.points[0].coordinates[0] =
        (sv_coordinate){.path = "disorder.vac.count", .value = 40, .integer = true};
    f.result.title = "a \"quote\", a\nline, \xff\xfe bad bytes, </script>";
    json_t *document = read_back(&f.result);
    json_t *point = json_array_get(json_object_get(document, "points"), 0);
    const json_t *value =
        json_object_get(json_object_get(point, "parameters"), "disorder.vac.count");
    CHECK(json_is_integer(value) && json_integer_value(value) == 40);
    CHECK_TEXT(json_string_value(json_object_get(document, "title")),
               "a \"quote\", a\nline, \xEF\xBF\xBD\xEF\xBF\xBD bad bytes, </script>");
    json_decref(document);
}

SV_TEST(a_pair_is_a_pair)
{
    fixture f;
    fixture_make(&f);
    char *csv = NULL;
    for (int i = 0; i < 3; i++)
        f.points[i].coordinates[0] = (sv_coordinate){.path = "flake.cells",
                                                     .value = 10 + i,
                                                     .second = 12 + i,
                                                     .pair = true,
                                                     .integer = true};
    json_t *document = read_back(&f.result);
    json_t *point = json_array_get(json_object_get(document, "points"), 1);
    const json_t *value = json_object_get(json_object_get(point, "parameters"), "flake.cells");
    CHECK_INT(json_array_size(value), 2);
    CHECK(json_is_integer(json_array_get(value, 0)));
    CHECK_INT(json_integer_value(json_array_get(value, 0)), 11);
    CHECK_INT(json_integer_value(json_array_get(value, 1)), 13);
    json_decref(document);
    CHECK_OK(sv_result_csv(test_context(), &f.result, &csv));
    CHECK(strstr(csv, "\nflake.cells.0,flake.cells.1,marker,") != NULL);
    CHECK(strstr(csv, "\n11,13,local_chern,") != NULL);
    sv_give(test_context(), csv);
}

SV_TEST(no_sweep_is_one_point_without_parameters)
{
    fixture f;
    fixture_make(&f);
    f.result.n_points = 1;
    f.points[0].n_coordinates = 0;
    json_t *document = read_back(&f.result);
    json_t *points = json_object_get(document, "points");
    CHECK_INT(json_array_size(points), 1);
    CHECK_INT(json_object_size(json_object_get(json_array_get(points, 0), "parameters")), 0);
    json_decref(document);
}

/* Counts fields of a CSV line; quotes protect commas. */
static int count_fields(const char *line)
{
    int fields = 1;
    bool quoted = false;
    for (; *line != '\0' && *line != '\n'; line++) {
        quoted ^= *line == '"';
        fields += *line == ',' && !quoted;
    }
    return fields;
}

SV_TEST(the_csv_has_one_row_per_point_and_marker)
{
    sv_context *context = test_context();
    fixture f;
    fixture_make(&f);
    f.result.title = "title\nwith a second line";
    f.points[1].summaries[1].exists = false;
    snprintf(f.points[1].summaries[1].reason, 200, "=HYPERLINK(\"http://x\",1)");
    char *text = NULL;
    CHECK_OK(sv_result_csv(context, &f.result, &text));
    int rows = 0, columns = 0;
    bool title = false, formula = false;
    char *rest = NULL;
    for (char *line = strtok_r(text, "\n", &rest); line != NULL;
         line = strtok_r(NULL, "\n", &rest)) {
        if (line[0] == '#') {
            title |= strstr(line, "title\\nwith a second line") != NULL;
            continue;
        }
        if (columns == 0)
            CHECK(strncmp(line, "disorder.vac.share,marker,realisations,", 39) == 0);
        else
            CHECK_INT(count_fields(line), columns);
        columns = count_fields(line);
        formula |= strstr(line, "\"'=HYPERLINK(\"\"http://x\"\",1)\"") != NULL;
        rows++;
    }
    CHECK(title && formula);
    CHECK_INT(rows, 1 + 3 * 2);
    sv_give(context, text);
}

/* Columns of the widest line; escape sequences do not count. */
static int widest_line(const char *text)
{
    int widest = 0, width = 0;
    for (; *text != '\0'; text++) {
        if (*text == '\033')
            text += strcspn(text, "m");
        else if (*text == '\n')
            width = 0;
        else if ((*text & 0xC0) != 0x80)
            width++;
        widest = width > widest ? width : widest;
    }
    return widest;
}

static char *print_table(const sv_result *result, bool colour)
{
    char *text = NULL;
    size_t size = 0;
    FILE *stream = open_memstream(&text, &size);
    sv_result_print(result, colour, stream);
    fclose(stream);
    return text;
}

SV_TEST(the_table_says_the_numbers_in_80_columns)
{
    fixture f;
    fixture_make(&f);
    char *text = print_table(&f.result, false);
    CHECK(widest_line(text) <= 80);
    CHECK(strstr(text, "0.9981(4)") != NULL);
    CHECK(strstr(text, "[0.99730, 0.99890]") != NULL);
    CHECK(strstr(text, "1: 100% [98.1, 100]") != NULL);
    CHECK(strstr(text, "disorder.vac.share") != NULL);
    CHECK(strstr(text, "between 0.47 and 0.53") != NULL);
    CHECK(strstr(text, "an eigenvalue lies 3e-8") != NULL);
    CHECK(strstr(text, "Most realisations have the index 1") != NULL);
    CHECK(strchr(text, '\033') == NULL);
    free(text);
    text = print_table(&f.result, true);
    CHECK(strstr(text, "\033[1m") != NULL && widest_line(text) <= 80);
    free(text);
}

SV_TEST(the_table_warns_of_intervals)
{
    fixture f;
    fixture_make(&f);
    sv_summary *s = &f.points[1].summaries[0];
    char *text = print_table(&f.result, false);
    CHECK(strstr(text, "!") == NULL && strstr(text, "Fewer than 10") == NULL);
    CHECK(strstr(text, "Differs from the first point from disorder.vac.share = 0.06 on: -0.500(13) "
                       "in\n  the same realisations; apart, the error would be 0.025.\n") != NULL);
    CHECK(strstr(text, "100 of 197 realisations lost the index 1, 4 gained it.") != NULL);
    free(text);
    snprintf(s->warning, sizeof s->warning, "skewed (-2.5) for 200 values: too much");
    text = print_table(&f.result, false);
    CHECK(strstr(text, "      ! skewed (-2.5): use [0.74620, 0.74870]\n") != NULL);
    CHECK(strstr(text, "!: the interval covers less") != NULL && widest_line(text) <= 80);
    free(text);
    s->peaks.apart = true;
    text = print_table(&f.result, false);
    CHECK(strstr(text, "! two-peaked: use [0.74620, 0.74870]") != NULL);
    free(text);
    s->skewness = (double)NAN; /* 1 − 0.05^(1/200) */
    text = print_table(&f.result, false);
    CHECK(strstr(text, "! all the same: others in up to 1.5 % may be unseen") != NULL);
    CHECK(strstr(text, "!: the interval") == NULL);
    free(text);
    s->resolved = 9;
    f.comparisons[0].comparison.adjusted_p_value = 0.05;
    text = print_table(&f.result, false);
    CHECK(strstr(text, "!") == NULL && strstr(text, "Fewer than 10 realisations") != NULL);
    CHECK(strstr(text, "same realisations;") == NULL && widest_line(text) <= 80);
    free(text);
}

SV_TEST(hostile_and_huge_contents_stay_in_the_table)
{
    fixture f;
    fixture_make(&f);
    char title[400];
    memset(title, 'W', sizeof title);
    memcpy(title, "\033[2J\033]0;x\a\r\n", 12);
    title[399] = '\0';
    f.result.title = title;
    for (int i = 0; i < 3; i++) {
        sv_point_result *point = &f.points[i];
        point->coordinates[0] =
            (sv_coordinate){.path = "disorder.a very long name of a disorder, much too long.width",
                            .value = -1.0 / 3e-200,
                            .integer = false};
        point->coordinates[1] =
            (sv_coordinate){.path = "disorder.\033[31mred.count", .value = 9e14, .integer = true};
        point->n_coordinates = 2;
        point->summaries[0].mean = -1.23456789e-250;
        point->summaries[0].realisations = INT64_MAX;
        point->summaries[0].unresolved = INT64_MAX / 2;
        memset(point->summaries[0].unresolved_reason, 'r', 199);
        point->summaries[1].shares[0].index = INT64_MIN;
        point->summaries[1].shares[0].count = 1000;
    }
    char *text = print_table(&f.result, false);
    CHECK(widest_line(text) <= 80);
    CHECK(strchr(text, '\033') == NULL && strchr(text, '\a') == NULL && strchr(text, '\r') == NULL);
    CHECK(strstr(text, "\\x1b[2J") != NULL);
    CHECK(strstr(text, "-3.3e+199") != NULL); /* fewer digits, never a lost exponent */
    free(text);
}

SV_TEST(units_go_with_their_values)
{
    sv_context *context = test_context();
    fixture f;
    fixture_make(&f);
    for (int i = 0; i < 3; i++)
        f.points[i].coordinates[0] =
            (sv_coordinate){.path = "disorder.pot.width", .value = 100 * i, .unit = "meV"};
    f.points[0].summaries[0].standard_error = 0;
    char *text = print_table(&f.result, false);
    CHECK(strstr(text, " 100 ") != NULL); /* not 1e+02 */
    CHECK(strstr(text, "[0.9973, 0.9989]") != NULL);
    CHECK(strstr(text, "pot.width [meV]") != NULL);
    free(text);
    CHECK_OK(sv_result_csv(context, &f.result, &text));
    CHECK(strstr(text, "\ndisorder.pot.width [meV],marker,") != NULL);
    CHECK(strstr(text, "\n100,bott,") != NULL);
    sv_give(context, text);
    json_t *document = read_back(&f.result);
    const json_t *point = json_array_get(json_object_get(document, "points"), 1);
    CHECK(number(json_object_get(point, "parameters"), "disorder.pot.width") == 100);
    CHECK_TEXT(
        json_string_value(json_object_get(json_object_get(point, "units"), "disorder.pot.width")),
        "meV");
    json_decref(document);
}

SV_TEST(an_empty_result_says_so)
{
    const sv_result result = {.title = ""};
    char *text = print_table(&result, false);
    CHECK(strstr(text, "nothing computed yet") != NULL);
    free(text);
}

/* Fails the k-th allocation, k = 0, 1, 2 … */
static long allowed;
static sv_allocator plenty;

static void *scarce_take(size_t bytes, void *user)
{
    return allowed-- > 0 ? plenty.take(bytes, user) : NULL;
}

SV_TEST(every_allocation_may_fail)
{
    sv_context *context = test_context();
    fixture f;
    fixture_make(&f);
    plenty = context->allocator;
    context->allocator.take = scarce_take;
    sv_status status = SV_NO_MEMORY;
    long k = 0;
    for (; status != SV_OK && k < 1000; k++) {
        char *json = NULL, *csv = NULL;
        allowed = k;
        status = sv_result_json(context, &f.result, &json);
        if (status == SV_OK)
            status = sv_result_csv(context, &f.result, &csv);
        CHECK(status == SV_OK || status == SV_NO_MEMORY);
        sv_give(context, json);
        sv_give(context, csv);
    }
    context->allocator = plenty;
    CHECK(status == SV_OK && k > 5);
}

/* Sampled windows: the error of the estimator and what is left for the disorder stand apart. */
SV_TEST(estimator_and_disorder_are_kept_apart)
{
    fixture f;
    fixture_make(&f);
    json_t *document = read_back(&f.result);
    CHECK(json_object_get(marker_of(document, 0, "local_chern"), "disorder_deviation") == NULL);
    json_decref(document);
    char *text = print_table(&f.result, false), *csv = NULL;
    CHECK(strstr(text, "estimator") == NULL);
    free(text);
    f.points[0].summaries[0].estimator_error = 0.003;
    f.points[0].summaries[0].disorder_deviation = 0.0048;
    document = read_back(&f.result);
    CHECK(number(marker_of(document, 0, "local_chern"), "disorder_deviation") == 0.0048);
    CHECK(json_object_get(marker_of(document, 0, "bott"), "disorder_deviation") == NULL);
    json_decref(document);
    text = print_table(&f.result, false);
    CHECK(strstr(text, "estimator error 0.003 per realisation; disorder alone spreads by 0.0048") !=
          NULL);
    CHECK(widest_line(text) <= 80);
    free(text);
    CHECK_OK(sv_result_csv(test_context(), &f.result, &csv));
    const char *head = strstr(csv, "estimator_error,disorder_deviation,smallest_margin");
    CHECK(head != NULL);
    if (head != NULL) {
        int fields = 0;
        const char *row = strchr(head, '\n') + 1;
        const char *start = head;
        while (start > csv && start[-1] != '\n')
            start--;
        fields = count_fields(start);
        for (; *row != '\0'; row = strchr(row, '\n') + 1)
            CHECK_INT(count_fields(row), fields);
    }
    CHECK(strstr(csv, ",0.003,0.0048,0.125,") != NULL);
    sv_give(test_context(), csv);
}
