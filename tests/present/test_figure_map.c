/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Marker maps: the raster, the outline, the vacancies. */
#include "figure_fixture.h"

/* The raster of a map, read back from its file. */
static float *read_raster(const sv_figure_files *files, int *nx, int *ny)
{
    size_t size;
    char *script = slurp(files->script, &size);
    const char *array = strstr(script, "binary array=(");
    CHECK(array != NULL && sscanf(array, "binary array=(%d,%d)", nx, ny) == 2);
    free(script);
    char *bytes = slurp(files->data, &size);
    CHECK_INT(size, (size_t)*nx * (size_t)*ny * sizeof(float));
    float *raster = malloc(size);
    memcpy(raster, bytes, size);
    free(bytes);
    return raster;
}

/* Pixels per cell number; the value of cell c with s sites present is s·(c + 1). */
static void check_areas(const map_fixture *f, const sv_figure_files *files, int positions)
{
    int nx = 0, ny = 0;
    float *raster = read_raster(files, &nx, &ny);
    double *area = calloc((size_t)f->flake.n_cells, sizeof *area), total = 0;
    int *sites = calloc((size_t)f->flake.n_cells, sizeof *sites);
    for (sv_index k = 0; k < f->sample.n; k++)
        sites[f->flake.sites[f->sample.pristine[k]].cell]++;
    for (int k = 0; k < nx * ny; k++) {
        if (isnan(raster[k]))
            continue;
        int found = -1;
        for (int c = 0; c < f->flake.n_cells && found < 0; c++)
            if (sites[c] > 0 && fabsf(raster[k] - (float)(sites[c] * (c + 1))) < 0.01F &&
                area[c] >= 0)
                found = c;
        CHECK(found >= 0);
        if (found >= 0)
            area[found]++;
        total++;
    }
    /* All cells of one kind together: positions take equal areas. */
    const double present = (double)f->sample.n / (f->model.n_orbitals / positions);
    const double per_position = total / present;
    for (int c = 0; c < f->flake.n_cells; c++)
        if (sites[c] == f->model.n_orbitals && c * 2 > f->flake.n_cells)
            CHECK(fabs(area[c] / (per_position * positions) - 1) < 0.08);
    free(area);
    free(sites);
    free(raster);
}

SV_TEST(a_honeycomb_hexagon_is_mapped_site_by_site)
{
    const sv_flake_spec spec = {.shape = SV_SHAPE_HEXAGON, .has_cells = true, .cells = {4, 0}};
    map_fixture f;
    sv_figure_files files = {.drawn = false};
    map_fixture_make(&f, true, &spec, 0);
    CHECK_INT(f.sample.n, 6 * 4 * 4);
    choose_folder("hexagon");
    CHECK_OK(sv_figure_map(test_context(), folder, "map", &f.map, &files));
    check_files(&files, "hexagon");
    check_areas(&f, &files, 2);
    map_fixture_free(&f);
}

SV_TEST(the_outline_of_a_zigzag_hexagon_has_six_sides)
{
    const sv_flake_spec spec = {.shape = SV_SHAPE_HEXAGON, .has_cells = true, .cells = {6, 0}};
    map_fixture f;
    sv_figure_files files = {.drawn = false};
    map_fixture_make(&f, true, &spec, 0);
    choose_folder("sides");
    CHECK_OK(sv_figure_map(test_context(), folder, "map", &f.map, &files));
    size_t size;
    char *data = slurp(inside("map.dat"), &size);
    const char *line = strstr(data, "# outline\n");
    CHECK(line != NULL);
    double x[16], y[16], length = 0;
    int corners = 0, used = 0;
    for (line += 10;
         corners < 16 && sscanf(line, "%lf %lf\n%n", &x[corners], &y[corners], &used) == 2;
         line += used)
        if (++corners > 1)
            length += hypot(x[corners - 1] - x[corners - 2], y[corners - 1] - y[corners - 2]);
    CHECK(corners >= 7 && corners <= 13); /* closed; pixels may cut a corner in two */
    CHECK_CLOSE(length, 6 * 6, 0.3);      /* six sides of six lattice constants */
    free(data);
    map_fixture_free(&f);
}

SV_TEST(vacancies_are_holes_with_marks)
{
    const sv_flake_spec spec = {.shape = SV_SHAPE_RECTANGLE, .has_cells = true, .cells = {12, 8}};
    map_fixture f;
    sv_figure_files files = {.drawn = false};
    map_fixture_make(&f, false, &spec, 0.1);
    CHECK(f.record.vacancies > 2);
    choose_folder("holes");
    CHECK_OK(sv_figure_map(test_context(), folder, "map", &f.map, &files));
    check_files(&files, "holes");
    check_areas(&f, &files, 1);
    size_t size;
    char *data = slurp(inside("map.dat"), &size);
    int marks = 0;
    const char *start = strstr(data, "# vacancies\n");
    CHECK(start != NULL);
    for (const char *c = start; *c != '\0'; c++)
        marks += *c == '\n';
    CHECK_INT(marks - 1, f.record.vacancies);
    free(data);
    char *script = slurp(files.script, &size);
    char words[64];
    snprintf(words, sizeof words, "'%d vacancies'", (int)f.record.vacancies);
    CHECK(strstr(script, words) != NULL);
    CHECK(strstr(script, " nm'") != NULL); /* the scale bar knows the lattice constant */
    free(script);
    map_fixture_free(&f);
}

SV_TEST(a_map_without_site_values_says_so)
{
    const sv_flake_spec spec = {.shape = SV_SHAPE_DISC, .has_radius = true, .radius = 4};
    map_fixture f;
    sv_figure_files files = {.drawn = true};
    map_fixture_make(&f, true, &spec, 0);
    choose_folder("nothing");
    f.map.site_values = NULL;
    CHECK_OK(sv_figure_map(test_context(), folder, "map", &f.map, &files));
    CHECK(!files.drawn && files.reason[0] != '\0');
    map_fixture_free(&f);
}

/* Fails the k-th allocation, k = 0, 1, 2 … */
static long allowed;
static sv_allocator plenty;

static void *scarce_take(size_t bytes, void *user)
{
    return allowed-- > 0 ? plenty.take(bytes, user) : NULL;
}

SV_TEST(every_allocation_of_a_map_may_fail)
{
    const sv_flake_spec spec = {.shape = SV_SHAPE_RECTANGLE, .has_cells = true, .cells = {4, 3}};
    sv_context *context = test_context();
    map_fixture f;
    map_fixture_make(&f, false, &spec, 0.1);
    choose_folder("scarce");
    char *path = strdup(getenv("PATH"));
    setenv("PATH", "/nowhere", 1); /* drawing is not the matter here */
    plenty = context->allocator;
    context->allocator.take = scarce_take;
    sv_status status = SV_NO_MEMORY;
    long k = 0;
    for (; status != SV_OK && k < 1000; k++) {
        sv_figure_files files;
        allowed = k;
        status = sv_figure_map(context, folder, "map", &f.map, &files);
        CHECK(status == SV_OK || status == SV_NO_MEMORY);
    }
    context->allocator = plenty;
    CHECK(status == SV_OK && k > 5);
    setenv("PATH", path, 1);
    free(path);
    map_fixture_free(&f);
}
