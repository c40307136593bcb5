/* SPDX-License-Identifier: GPL-3.0-or-later */
/* A study of finite sizes as figure, document and table. */
#include "figure_fixture.h"

enum { POINTS = 27, REALISATIONS = 60 };

/* Curves of three sizes that cross at 2.5, or do not cross. */
static void make_study(bool crossing, sv_finite_size *study)
{
    static double values[POINTS * REALISATIONS];
    sv_scaling_point points[POINTS];
    sv_scaling_data data = {.points = points, .n_points = POINTS, .realisations = REALISATIONS};
    sv_scaling_options options = sv_scaling_options_default();
    options.resamples = 60;
    for (int i = 0; i < POINTS; i++) {
        double size = 8.0 + 4.0 * (i / 9), p = 2.3 + 0.05 * (i % 9);
        points[i] = (sv_scaling_point){size, p, values + i * REALISATIONS};
        for (int k = 0; k < REALISATIONS; k++) {
            sv_stream stream = sv_stream_make(5, "figure", k);
            double x = (p - 2.5) * size, noise = 0.1 * sv_stream_normal(&stream, i, 0, 0);
            values[i * REALISATIONS + k] =
                (crossing ? 0.5 + 0.4 * tanh(0.4 * x) : 0.01 * size) + noise;
        }
    }
    *study = (sv_finite_size){
        .marker = "local_chern",
        .size = {.path = "flake.cells", .integer = true},
        .parameter = {.path = "disorder.pot.width", .unit = "meV"},
    };
    CHECK_OK(sv_scaling_study(test_context(), &data, &options, &study->scaling));
}

static void print_to(const sv_result *result, char *text, size_t size)
{
    FILE *stream = tmpfile();
    CHECK(stream != NULL);
    sv_result_print(result, false, stream);
    rewind(stream);
    text[fread(text, 1, size - 1, stream)] = '\0';
    fclose(stream);
}

static void check_study(bool crossing, const char *name)
{
    fixture f;
    sv_finite_size study;
    sv_figure_files files = {.drawn = false};
    char *json = NULL, text[20000];
    size_t size;
    fixture_make(&f);
    make_study(crossing, &study);
    f.result.finite_size = &study;
    CHECK(study.scaling.collapse.decided == crossing);
    choose_folder(name);
    CHECK_OK(sv_figure_scaling(test_context(), folder, "finite_size", &f.result, &files));
    check_files(&files, name);
    char *data = slurp(files.data, &size);
    CHECK(strstr(data, "# size 16\n") != NULL && strstr(data, "NaN NaN") != NULL);
    free(data);
    CHECK_OK(sv_result_json(test_context(), &f.result, &json));
    CHECK(strstr(json, "\"finite_size\"") != NULL && strstr(json, "\"unit\": \"meV\"") != NULL);
    CHECK(strstr(json, crossing ? "\"decided\": true" : "\"decided\": false") != NULL);
    sv_give(test_context(), json);
    print_to(&f.result, text, sizeof text);
    CHECK(strstr(text, "Finite size: ") != NULL);
    CHECK(strstr(text, crossing ? "Collapse: p_c = 2." : "the data cannot decide, because") !=
          NULL);
    for (char *line = strtok(text, "\n"); line != NULL; line = strtok(NULL, "\n"))
        test_check(strlen(line) <= 120, __FILE__, __LINE__, "too wide: %s", line);
    sv_scaling_free(test_context(), &study.scaling);
}

SV_TEST(a_collapse_is_drawn_and_told)
{
    check_study(true, "collapse");
}

SV_TEST(a_refusal_is_drawn_and_told)
{
    check_study(false, "refusal");
}

SV_TEST(without_a_study_there_is_no_figure)
{
    fixture f;
    sv_figure_files files;
    fixture_make(&f);
    choose_folder("none");
    CHECK_STATUS(SV_INVALID_INPUT,
                 sv_figure_scaling(test_context(), folder, "finite_size", &f.result, &files));
}
