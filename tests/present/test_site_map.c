/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Maps of an ensemble: the summary, the table, the two figures. */
#include "figure_fixture.h"

/* Three realisations with other vacancies: every site of cell c has k·c/4 in realisation k. */
static void fill(const map_fixture *f, sv_site_sum *sum)
{
    sv_context *context = test_context();
    CHECK_OK(sv_site_sum_init(context, sv_site_entries(&f->flake), sum));
    for (int k = 0; k < 3; k++) {
        sv_sample sample = {0};
        sv_site_record *record = NULL;
        CHECK_OK(sv_sample_draw(context, &f->flake, &f->disorder, 1, 1, k, &sample));
        double *values = calloc((size_t)sample.n, sizeof *values);
        for (sv_index r = 0; r < sample.n; r++)
            values[r] = k * f->flake.sites[sample.pristine[r]].cell / 4.0;
        CHECK_OK(sv_site_record_make(context, &sample, values, &record));
        CHECK_OK(sv_site_sum_add(context, sum, record));
        sv_site_record_free(context, record);
        sv_sample_free(context, &sample);
        free(values);
    }
}

SV_TEST(the_largest_deviation_is_found_in_its_cell)
{
    const sv_flake_spec spec = {
        .shape = SV_SHAPE_PARALLELOGRAM, .has_cells = true, .cells = {4, 3}};
    map_fixture f;
    sv_site_sum sum = {0};
    char *text = NULL;
    map_fixture_make(&f, true, &spec, 0);
    fill(&f, &sum);
    const sv_site_map map = {.title = "t", .flake = &f.flake, .point = &f.point, .sum = &sum};
    /* Cell c: 0, c/2, c over the realisations, so the deviation is c/2. */
    const sv_site_summary s = sv_site_map_summary(&map);
    CHECK(s.exists);
    CHECK_INT(s.realisations, 3);
    CHECK_INT(s.present, 3);
    CHECK_CLOSE(s.largest, 5.5, 1e-10);
    CHECK_INT(s.cell[0], f.flake.cells[11].i);
    CHECK_INT(s.cell[1], f.flake.cells[11].j);
    CHECK_CLOSE(s.deviation, 0.5 * sqrt(506.0 / 12.0), 1e-10); /* Σc² = 506 for c ≤ 11 */
    CHECK_CLOSE(sv_site_map_cell(&map, 4).mean, 2.0, 1e-10);
    CHECK_OK(sv_site_map_csv(test_context(), &map, 7, true, &text));
    CHECK(strncmp(text, "point,site,cell_i,", 18) == 0);
    const char *row = strstr(text, "\n7,9,");
    CHECK(row != NULL && strstr(row, ",B,") != NULL);
    CHECK(row != NULL && strstr(row, ",1,1,0.5773502") != NULL); /* site 9, of cell 4 */
    CHECK(row != NULL && strstr(row, ",3,2,2,1.1547005") != NULL);
    sv_give(test_context(), text);
    sv_site_sum_free(test_context(), &sum);
    map_fixture_free(&f);
}

SV_TEST(mean_and_deviation_are_drawn)
{
    const sv_flake_spec spec = {.shape = SV_SHAPE_HEXAGON, .has_cells = true, .cells = {4, 0}};
    map_fixture f;
    sv_site_sum sum = {0};
    size_t size;
    map_fixture_make(&f, true, &spec, 0.1);
    fill(&f, &sum);
    const sv_site_map map = {.title = "Invented 'film'",
                             .note = "width = 1",
                             .flake = &f.flake,
                             .point = &f.point,
                             .sum = &sum,
                             .lattice_constant = 0.43};
    const sv_site_summary s = sv_site_map_summary(&map);
    choose_folder("sites");
    for (int d = 0; d < 2; d++) {
        sv_figure_files files = {.drawn = false};
        CHECK_OK(sv_figure_site_map(test_context(), folder, d ? "deviation" : "mean", &map, d == 1,
                                    &files));
        check_files(&files, d ? "deviation" : "mean");
        char *script = slurp(files.script, &size);
        CHECK(strstr(script, d ? "deviation of the marker per cell" : "mean marker per cell"));
        CHECK(strstr(script, "3 realisations") != NULL);
        free(script);
        float *values = (float *)(void *)slurp(files.data, &size);
        float largest = 0;
        for (size_t k = 0; k < size / sizeof *values; k++)
            largest = fmaxf(largest, values[k]);
        if (d == 1)
            CHECK_CLOSE(largest, s.largest, 1e-5 * s.largest);
        free(values);
    }
    sv_site_sum_free(test_context(), &sum);
    map_fixture_free(&f);
}
