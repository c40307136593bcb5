/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Sweep figures: what is drawn, what is written, what cannot be smuggled in. */
#include <unistd.h>

#include "figure_fixture.h"

SV_TEST(a_sweep_is_drawn)
{
    fixture f;
    sv_figure_files files = {.drawn = false};
    fixture_make(&f);
    choose_folder("sweep");
    CHECK_OK(sv_figure_sweep(test_context(), folder, "curve", &f.result, &files));
    check_files(&files, "sweep");
    size_t size;
    char *data = slurp(files.data, &size);
    CHECK(strstr(data, "# local_chern\n") != NULL && strstr(data, "# bott\n") != NULL);
    CHECK(strstr(data, " 0.9981") != NULL);
    free(data);
}

SV_TEST(the_same_numbers_give_the_same_bytes)
{
    static const char *const suffixes[] = {"svg", "pdf", "png", "gp", "dat"};
    sv_context *context = test_context();
    fixture f;
    sv_figure_files files = {.drawn = false};
    fixture_make(&f);
    choose_folder("bytes");
    CHECK_OK(sv_figure_sweep(context, folder, "a", &f.result, &files));
    if (!files.drawn)
        return;
    char *first[5], path[1200];
    size_t sizes[5], size;
    for (int i = 0; i < 5; i++) {
        snprintf(path, sizeof path, "%s/a.%s", folder, suffixes[i]);
        first[i] = slurp(path, &sizes[i]);
    }
    sleep(1); /* a date inside would show */
    CHECK_OK(sv_figure_sweep(context, folder, "a", &f.result, &files));
    for (int i = 0; i < 5; i++) {
        snprintf(path, sizeof path, "%s/a.%s", folder, suffixes[i]);
        char *second = slurp(path, &size);
        test_check(size == sizes[i] && memcmp(first[i], second, size) == 0, __FILE__, __LINE__,
                   "a.%s differs", suffixes[i]);
        free(second);
        free(first[i]);
    }
}

SV_TEST(a_sweep_needs_an_axis)
{
    fixture f;
    sv_figure_files files = {.drawn = true};
    fixture_make(&f);
    choose_folder("axis");
    f.result.n_points = 1;
    CHECK_OK(sv_figure_sweep(test_context(), folder, "curve", &f.result, &files));
    CHECK(!files.drawn && strstr(files.reason, "one swept parameter") != NULL);
}

/* Three sizes by four widths, means that cross one half between the second and the third width. */
static void make_plane(fixture *f, sv_point_result points[12])
{
    static const double means[4] = {1.0, 0.75, 0.25, -0.75};
    fixture_make(f);
    for (int i = 0; i < 12; i++) {
        points[i] = f->points[0];
        points[i].n_coordinates = 2;
        points[i].coordinates[0] = (sv_coordinate){.path = "flake.cells",
                                                   .value = 10 + 2 * (i / 4),
                                                   .second = 10 + 2 * (i / 4),
                                                   .integer = true};
        points[i].coordinates[1] =
            (sv_coordinate){.path = "disorder.pot.width", .value = 1 + i % 4};
        points[i].summaries[0].mean = means[i % 4];
    }
    f->result.points = points;
    f->result.n_points = 12;
}

/* Lines "x y" of a block of the data, in order. */
static int block_of(const char *data, const char *name, double (*at)[2], int most)
{
    int n = 0;
    const char *line = strstr(data, name);
    for (line = line != NULL ? strchr(line, '\n') : NULL; line != NULL && n < most;
         line = strchr(line + 1, '\n')) {
        if (strncmp(line, "\n\n\n", 3) == 0)
            break;
        if (line[1] != '\n' && sscanf(line, "%lf %lf", &at[n][0], &at[n][1]) == 2 &&
            isfinite(at[n][1]))
            n++;
    }
    return n;
}

SV_TEST(two_axes_are_a_map)
{
    fixture f;
    sv_point_result points[12];
    sv_figure_files files = {.drawn = false};
    size_t size;
    double at[40][2];
    make_plane(&f, points);
    points[5].summaries[0].unresolved = 50;
    points[6].summaries[0].exists = false;
    choose_folder("phase");
    CHECK_OK(sv_figure_phase(test_context(), folder, "map", &f.result, 0, &files));
    check_files(&files, "map");
    char *data = slurp(files.data, &size);
    CHECK(strstr(data, "\n12 2 0.75 0.0004 0.25 200\n") != NULL);
    CHECK(strstr(data, "\n12 3 11 13 2.5 3.5 0\n") != NULL); /* the hatched one */
    free(data);
    /* Linear between 0.75 and 0.25: one half lies at 2.5, minus one half at 3.75. */
    points[6].summaries[0].exists = true;
    CHECK_OK(sv_figure_phase(test_context(), folder, "map", &f.result, 0, &files));
    data = slurp(files.data, &size);
    const int n = block_of(data, "# boundary\n# pairs", at, 40);
    CHECK_INT(n, 8);
    int low = 0;
    for (int i = 0; i < n; i++) {
        const bool lower = fabs(at[i][1] - 2.5) < 1e-9;
        CHECK(lower || fabs(at[i][1] - 3.75) < 1e-9);
        CHECK(at[i][0] >= 10 && at[i][0] <= 14);
        low += lower;
    }
    CHECK_INT(low, 4);
    CHECK_INT(block_of(data, "# labels\n", at, 40), 3); /* regions of 1, 0 and -1 */
    free(data);
    CHECK_STATUS(SV_INVALID_INPUT,
                 sv_figure_phase(test_context(), folder, "map", &f.result, 9, &files));
    f.points[0].n_coordinates = 1;
    f.result.points = f.points;
    CHECK_STATUS(SV_INVALID_INPUT,
                 sv_figure_phase(test_context(), folder, "map", &f.result, 0, &files));
}

/* Opposite corners alike: the middle decides which of them belong together. */
SV_TEST(a_saddle_goes_by_its_middle)
{
    for (int high = 0; high < 2; high++) {
        fixture f;
        sv_point_result points[12];
        sv_figure_files files = {.drawn = false};
        size_t size;
        double at[8][2];
        make_plane(&f, points);
        f.result.n_points = 4;
        for (int i = 0; i < 4; i++) {
            points[i].coordinates[0].value = 10 + 2 * (i / 2);
            points[i].coordinates[1].value = 1 + i % 2;
            points[i].summaries[0].mean =
                (i == 0 || i == 3) ? (high ? 0.9 : 0.6) : (high ? 0.4 : 0.1);
        }
        choose_folder("saddle");
        CHECK_OK(sv_figure_phase(test_context(), folder, "map", &f.result, 0, &files));
        char *data = slurp(files.data, &size);
        CHECK_INT(block_of(data, "# boundary\n# pairs", at, 8), 4);
        /* The middle of a piece lies by the corner it cuts off: (12, 1) and (10, 2) when the middle
         * is high, else the other two. */
        for (int k = 0; k < 4; k += 2) {
            const double x = 0.5 * (at[k][0] + at[k + 1][0]) - 11;
            const double y = 0.5 * (at[k][1] + at[k + 1][1]) - 1.5;
            CHECK(high ? x * y < 0 : x * y > 0);
        }
        free(data);
    }
}

SV_TEST(a_short_axis_makes_a_family)
{
    fixture f;
    sv_point_result points[12];
    sv_figure_files files = {.drawn = false};
    size_t size;
    double at[40][2];
    make_plane(&f, points);
    choose_folder("family");
    CHECK_OK(sv_figure_sweep(test_context(), folder, "curves", &f.result, &files));
    check_files(&files, "curves");
    char *data = slurp(files.data, &size), *script = slurp(files.script, &size);
    for (int k = 0; k < 3; k++) {
        char name[40];
        snprintf(name, sizeof name, "# local_chern %d\n", k);
        CHECK_INT(block_of(data, name, at, 40), 4);
        CHECK_CLOSE(at[3][0], 4.0, 0.0);
        CHECK_CLOSE(at[3][1], -0.75, 0.0);
    }
    CHECK(strstr(data, "# bott 2\n") != NULL && strstr(data, "# bott 3\n") == NULL);
    CHECK(strstr(script, "'14' at screen") != NULL);
    free(data);
    free(script);
}

SV_TEST(markers_that_are_nowhere_leave_an_empty_panel)
{
    fixture f;
    sv_figure_files files = {.drawn = false};
    fixture_make(&f);
    for (int i = 0; i < 3; i++)
        f.points[i].summaries[1].exists = false;
    choose_folder("nowhere");
    CHECK_OK(sv_figure_sweep(test_context(), folder, "curve", &f.result, &files));
    check_files(&files, "nowhere");
}

SV_TEST(titles_are_shown_and_never_run)
{
    fixture f;
    sv_figure_files files = {.drawn = false};
    struct stat info;
    char title[600];
    fixture_make(&f);
    choose_folder("hostile");
    snprintf(
        title, sizeof title,
        "it's `touch pwned` \"$(touch pwned)\" <b>&\n' ; system('touch pwned') #{/Symbol a}\xff");
    f.result.title = title;
    for (int i = 0; i < 3; i++)
        f.points[i].coordinates[0].path = "disorder.a'`touch pwned`\"<i>\n.width";
    CHECK_OK(sv_figure_sweep(test_context(), folder, "hostile", &f.result, &files));
    check_files(&files, "hostile");
    CHECK(stat(inside("pwned"), &info) != 0 && stat("pwned", &info) != 0);
    size_t size;
    char *script = slurp(files.script, &size);
    CHECK(strstr(script, "set label 1 'it\u2019s `touch pwned` \"$(touch pwned)\" <b>&") != NULL);
    free(script);
    if (!files.drawn)
        return;
    char *svg = slurp(files.svg, &size);
    CHECK(strstr(svg, "<b>") == NULL && strstr(svg, "<i>") == NULL);
    CHECK(strstr(svg, "<title>it's `touch pwned` \"$(touch pwned)\" &lt;b&gt;&amp;\\n") != NULL);
    CHECK(strstr(svg, "&lt;i>\\n") != NULL);
    free(svg);
}

SV_TEST(names_of_figures_are_plain)
{
    static const char *const bad[] = {"", "../up", "-e", ".hidden", "a b", "a'b", "a/b", "a\nb"};
    fixture f;
    sv_figure_files files = {.drawn = false};
    fixture_make(&f);
    choose_folder("names");
    for (size_t i = 0; i < sizeof bad / sizeof *bad; i++)
        CHECK_STATUS(SV_INVALID_INPUT,
                     sv_figure_sweep(test_context(), folder, bad[i], &f.result, &files));
    CHECK_STATUS(SV_STORAGE, sv_figure_sweep(test_context(), "/proc/none", "a", &f.result, &files));
}

SV_TEST(without_gnuplot_there_is_a_script_and_a_reason)
{
    fixture f;
    sv_figure_files files = {.drawn = true};
    fixture_make(&f);
    choose_folder("without");
    char *path = strdup(getenv("PATH"));
    setenv("PATH", "/nowhere", 1);
    CHECK_OK(sv_figure_sweep(test_context(), folder, "curve", &f.result, &files));
    setenv("PATH", path, 1);
    free(path);
    struct stat info;
    CHECK(!files.drawn && strstr(files.reason, "gnuplot was not found") != NULL);
    CHECK(files.svg[0] == '\0' && files.pdf[0] == '\0' && files.png[0] == '\0');
    CHECK(stat(files.script, &info) == 0 && info.st_size > 0);
}

/* Puts a shell script named gnuplot first in PATH. */
static void draw_with_stand_in(const char *script, sv_figure_files *files)
{
    fixture f;
    char place[1024], path[1200], longer[4096];
    fixture_make(&f);
    snprintf(place, sizeof place, "%s", test_scratch("bin"));
    mkdir(place, 0777);
    snprintf(path, sizeof path, "%s/gnuplot", place);
    FILE *stream = fopen(path, "w");
    fprintf(stream, "#!/bin/sh\n%s\n", script);
    fclose(stream);
    chmod(path, 0755);
    char *before = strdup(getenv("PATH"));
    snprintf(longer, sizeof longer, "%s:%s", place, before);
    setenv("PATH", longer, 1);
    CHECK_OK(sv_figure_sweep(test_context(), folder, "curve", &f.result, files));
    setenv("PATH", before, 1);
    free(before);
}

SV_TEST(success_is_not_believed_without_files)
{
    sv_figure_files files = {.drawn = true};
    struct stat info;
    choose_folder("believed");
    draw_with_stand_in("exit 0", &files);
    CHECK(!files.drawn && strstr(files.reason, "left no curve.png") != NULL);
    draw_with_stand_in("printf 'IEND....' >curve.png; printf '%%PDF half' >curve.pdf", &files);
    CHECK(!files.drawn && strstr(files.reason, "incomplete curve.pdf") != NULL);
    CHECK(stat(inside("curve.png"), &info) != 0); /* half a figure is none */
    draw_with_stand_in("echo 'line 3: nonsense' >&2; exit 1", &files);
    CHECK(!files.drawn && strstr(files.reason, "line 3: nonsense") != NULL);
}

SV_TEST(links_in_the_folder_are_not_written_through)
{
    fixture f;
    sv_figure_files files = {.drawn = false};
    char target[1200];
    struct stat info;
    fixture_make(&f);
    choose_folder("links");
    CHECK(mkdir(folder, 0777) == 0);
    snprintf(target, sizeof target, "%s", test_scratch("victim"));
    FILE *stream = fopen(target, "w");
    fputs("precious", stream);
    fclose(stream);
    static const char *const names[] = {"curve.svg", "curve.pdf", "curve.png", "curve.gp",
                                        "curve.dat"};
    for (int i = 0; i < 5; i++)
        CHECK(symlink(target, inside(names[i])) == 0);
    CHECK_OK(sv_figure_sweep(test_context(), folder, "curve", &f.result, &files));
    CHECK(stat(target, &info) == 0 && info.st_size == 8);
}
