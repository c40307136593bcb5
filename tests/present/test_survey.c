/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The localizer at many points: CSV, JSON, figures. */
#include "figure_fixture.h"

/* A grid of 4×3 probes: a region of index 1 within one of 0, one probe unresolved. */
typedef struct survey_fixture {
    map_fixture map;
    sv_probe probes[12], kappas[3];
    sv_between between[6];
    sv_survey survey;
} survey_fixture;

static void make(survey_fixture *f, bool line)
{
    const sv_flake_spec spec = {.shape = SV_SHAPE_HEXAGON, .has_cells = true, .cells = {4, 0}};
    map_fixture_make(&f->map, true, &spec, 0);
    for (int k = 0; k < 12; k++)
        f->probes[k] = (sv_probe){.at = {k % 4, line ? 0 : k / 4},
                                  .kappa = 0.25,
                                  .resolved = k != 7,
                                  .index = k == 5 || k == 6,
                                  .gap = 0.1 * (k + 1),
                                  .certain = 0.0999 * (k + 1)};
    snprintf(f->probes[7].reason, sizeof f->probes[7].reason, "too near, invented");
    for (int k = 0; k < 6; k++)
        f->between[k] = (sv_between){
            .low = 0.05 * k, .high = k == 3 ? (double)NAN : 1.0 + k, .constant = k > 2};
    for (int k = 0; k < 3; k++)
        f->kappas[k] = (sv_probe){.kappa = pow(2.0, k),
                                  .resolved = k > 0,
                                  .index = -2,
                                  .gap = 0.3 + k,
                                  .reason = "small"};
    f->survey = (sv_survey){.kappa = 0.25,
                            .threshold = 0.05,
                            .points = {line ? 4 : 4, line ? 1 : 3},
                            .line = line,
                            .to = {3, line ? 0 : 2},
                            .probes = f->probes,
                            .between = f->between,
                            .n_between = line ? 3 : 6,
                            .kappas = f->kappas,
                            .n_kappas = 3,
                            .steady = {1, 2}};
    f->map.map.survey = &f->survey;
}

SV_TEST(probes_as_csv)
{
    survey_fixture f;
    char *text = NULL;
    make(&f, false);
    CHECK_OK(sv_survey_csv(test_context(), &f.survey, &text));
    CHECK(strncmp(text, "x,y,kappa,index,gap,certain,resolved,reason\n0,0,0.25,0,0.1,0.0999,1,\n",
                  69) == 0);
    CHECK(strstr(text, "\n1,1,0.25,1,") != NULL);
    CHECK(strstr(text, "\n3,1,0.25,,") != NULL);
    CHECK(strstr(text, ",0,\"too near, invented\"\n") != NULL);
    int lines = 0;
    for (const char *c = text; *c != '\0'; c++)
        lines += *c == '\n';
    CHECK_INT(lines, 13);
    sv_give(test_context(), text);
    map_fixture_free(&f.map);
}

SV_TEST(a_grid_is_drawn_with_regions_and_crosses)
{
    survey_fixture f;
    sv_figure_files files = {.drawn = false};
    size_t size;
    make(&f, false);
    choose_folder("grid");
    CHECK_OK(sv_figure_probes(test_context(), folder, "grid", &f.map.map, &files));
    check_files(&files, "grid");
    char *data = slurp(files.data, &size);
    CHECK(strstr(data, "# unresolved\n3 1\n") != NULL);
    /* one number for the outer region, at its largest gap, one for the inner */
    CHECK(strstr(data, "# labels\n3 2 0\n2 1 1\n") != NULL);
    /* sides: left of the pair, above it */
    CHECK(strstr(data, "0.5 0.5\n0.5 1.5\n") != NULL && strstr(data, "0.5 1.5\n1.5 1.5\n") != NULL);
    free(data);
    char *gaps = slurp(inside("grid.bin"), &size);
    float third;
    CHECK_INT(size, 12 * sizeof(float));
    memcpy(&third, gaps + 2 * sizeof third, sizeof third);
    CHECK_CLOSE(third, 0.3, 1e-6);
    free(gaps);
    CHECK_STATUS(SV_INVALID_INPUT,
                 sv_figure_profile(test_context(), folder, "x", &f.map.map, false, &files));
    map_fixture_free(&f.map);
}

SV_TEST(a_line_and_kappa_are_drawn_as_profiles)
{
    survey_fixture f;
    sv_figure_files files = {.drawn = false};
    size_t size;
    make(&f, true);
    f.map.map.lattice_constant = 0.5;
    choose_folder("line");
    CHECK_OK(sv_figure_profile(test_context(), folder, "line", &f.map.map, false, &files));
    check_files(&files, "line");
    char *data = slurp(files.data, &size);
    CHECK(strstr(data, "\n0.5 0.2 0 1\n") != NULL); /* nm */
    CHECK(strstr(data, "\n0.5 1 0.05\n") != NULL);
    free(data);
    CHECK_OK(sv_figure_profile(test_context(), folder, "kappa", &f.map.map, true, &files));
    check_files(&files, "kappa");
    data = slurp(files.data, &size);
    CHECK(strstr(data, "\n1 0.3 0 0\n2 1.3 -2 1\n4 2.3 -2 1\n") != NULL);
    free(data);
    CHECK_STATUS(SV_INVALID_INPUT,
                 sv_figure_probes(test_context(), folder, "x", &f.map.map, &files));
    map_fixture_free(&f.map);
}

SV_TEST(a_spectral_flow_is_written_and_drawn)
{
    sv_flow_level levels[] = {{0.0, -0.25, 1.0}, {0.0, 0.5, 0.125}, {1.0, 0.25, 0.5}};
    sv_flow_trace trace = {.levels = levels, .count = 3, .fluxes = 2, .most = 2};
    survey_fixture f;
    sv_figure_files files = {.drawn = false};
    char *text = NULL;
    size_t size;
    make(&f, false);
    choose_folder("flow");
    CHECK_STATUS(SV_INVALID_INPUT,
                 sv_figure_flow(test_context(), folder, "flow", &f.map.map, &files));
    f.map.map.flow = &trace;
    CHECK_OK(sv_flow_csv(test_context(), &trace, &text));
    CHECK(strcmp(text, "flux,energy,hole_weight\n0,-0.25,1\n0,0.5,0.125\n1,0.25,0.5\n") == 0);
    sv_give(test_context(), text);
    CHECK_OK(sv_figure_flow(test_context(), folder, "flow", &f.map.map, &files));
    check_files(&files, "flow");
    char *data = slurp(files.data, &size);
    const char *hole = strstr(data, "\n0 -0.25 1\n"), *both = strstr(data, "\n1 0.25 0.5\n");
    const char *outline = strstr(data, "\n0 0.5 0.125\n");
    CHECK(hole != NULL && hole < outline && outline < both); /* one block each, in this order */
    free(data);
    map_fixture_free(&f.map);
}

SV_TEST(blocks_as_csv)
{
    sv_block blocks[3] = {
        {.at = {0.5, 1.5},
         .cells = 9,
         .sampled = 4,
         .mean = 0.75,
         .error = 0.01,
         .numerical_error = 1e-6},
        {.at = {3.5, 1.5}, .cells = 0, .mean = NAN},
        {.at = {6.5, 1.5}, .cells = 3, .mean = NAN, .error = NAN, .numerical_error = NAN}};
    const sv_coarse map = {.count = {3, 1}, .n_blocks = 3, .side = 3, .blocks = blocks};
    char *text = NULL;
    CHECK_OK(sv_coarse_csv(test_context(), &map, &text));
    CHECK_TEXT(text, "x,y,mean,error,numerical_error,cells,sampled\n"
                     "0.5,1.5,0.75,0.01,1e-06,9,4\n6.5,1.5,,,,3,0\n");
    sv_give(test_context(), text);
}
