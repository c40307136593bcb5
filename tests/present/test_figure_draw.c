/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The drawing of a sample: what the data file says about bonds, sites and defects. */
#include <stdlib.h>
#include <sys/stat.h>

#include "fixtures.h"
#include "selvedge/present.h"

typedef struct drawing {
    sv_model model;
    sv_flake flake;
    sv_sample sample;
    char *text; /* the data file */
} drawing;

static drawing make(const sv_flake_spec *spec, double share, double width, const char *ending)
{
    sv_context *context = test_context();
    drawing d = {.model = fixture_qi_wu_zhang(-1)};
    sv_figure_files files;
    size_t size;
    sv_disorder disorder[] = {
        {.name = "v", .type = SV_DISORDER_VACANCIES, .on = -1, .has_share = true, .share = share},
        {.name = "w", .type = SV_DISORDER_ONSITE, .on = -1, .width = width, .per_cell = true}};
    CHECK_OK(sv_flake_make(context, &d.model, spec, &d.flake));
    CHECK_OK(sv_sample_draw(context, &d.flake, disorder, 2, 1, 0, &d.sample));
    const sv_sample_result result = {
        .title = "Invented", .sample = &d.sample, .lattice_constant = 0.5, .energy_unit = 1};
    CHECK_OK(sv_figure_sample(context, test_scratch("figures"), "film", ending, &result, &files));
    CHECK(files.drawn);
    CHECK((files.svg[0] != '\0') == (ending == NULL || strcmp(ending, "svg") == 0));
    CHECK((files.png[0] != '\0') == (ending == NULL || strcmp(ending, "png") == 0));
    CHECK_OK(sv_read_file(context, files.data, 1 << 24, &d.text, &size));
    return d;
}

static void drop(drawing *d)
{
    sv_give(test_context(), d->text);
    sv_sample_free(test_context(), &d->sample);
    sv_flake_free(test_context(), &d->flake);
    sv_model_free(test_context(), &d->model);
}

/* Lines of numbers in the block after "# name". */
static int count_lines(const drawing *d, const char *name)
{
    char head[40];
    int count = 0;
    snprintf(head, sizeof head, "\n# %s\n", name);
    const char *at = strstr(d->text, head);
    if (!CHECK(at != NULL))
        return -1;
    for (at += strlen(head); *at != '\0' && *at != '\n'; at = strchr(at, '\n') + 1)
        count += *at != '#';
    return count;
}

/* n1×n2 square cells have n1(n2−1) + n2(n1−1) bonds; on a torus 2·n1·n2, of which the difference
 * goes around, drawn from both ends. */
SV_TEST(bonds_of_a_square_flake_and_a_torus)
{
    sv_flake_spec spec = {.shape = SV_SHAPE_RECTANGLE, .has_cells = true, .cells = {6, 5}};
    drawing open = make(&spec, 0.0, 0.0, "svg");
    CHECK_INT(count_lines(&open, "bonds"), 6 * 4 + 5 * 5);
    CHECK_INT(count_lines(&open, "around"), 0);
    CHECK_INT(count_lines(&open, "sites"), 30);
    CHECK_INT(count_lines(&open, "vacancies"), 0);
    drop(&open);
    spec.periodic[0] = spec.periodic[1] = true;
    drawing torus = make(&spec, 0.0, 0.0, "svg");
    CHECK_INT(count_lines(&torus, "bonds"), 6 * 4 + 5 * 5);
    CHECK_INT(count_lines(&torus, "around"), 2 * (2 * 30 - 49));
    drop(&torus);
}

SV_TEST(defects_are_drawn_by_kind_and_the_inventory_agrees)
{
    sv_flake_spec spec = {.shape = SV_SHAPE_RECTANGLE, .has_cells = true, .cells = {12, 12}};
    drawing d = make(&spec, 0.45, 0.3, NULL);
    CHECK_INT(count_lines(&d, "vacancies"), d.sample.inventory.vacancies);
    CHECK_INT(count_lines(&d, "dangling"), d.sample.inventory.dangling);
    CHECK_INT(count_lines(&d, "isolated"), d.sample.inventory.isolated);
    CHECK(d.sample.inventory.isolated > 0 && d.sample.inventory.dangling > 0);
    const sv_sample_result result = {.title = "Invented", .sample = &d.sample};
    char *text = NULL, wanted[60];
    CHECK_OK(sv_sample_json(test_context(), &result, &text));
    snprintf(wanted, sizeof wanted, "\"pieces\": %lld", (long long)d.sample.inventory.pieces);
    CHECK(strstr(text, wanted) != NULL);
    sv_give(test_context(), text);
    CHECK_OK(sv_inventory_text(test_context(), &d.sample, &text));
    snprintf(wanted, sizeof wanted, "%lld dangling", (long long)d.sample.inventory.dangling);
    CHECK(strstr(text, wanted) != NULL);
    sv_give(test_context(), text);
    drop(&d);
}

/* Large flakes become pixels; the files stay small even for noise. */
SV_TEST(a_large_flake_stays_below_a_megabyte)
{
    sv_flake_spec spec = {.shape = SV_SHAPE_RECTANGLE, .has_cells = true, .cells = {300, 300}};
    drawing d = make(&spec, 0.05, 1.0, "svg");
    struct stat info;
    char path[600];
    snprintf(path, sizeof path, "%s/film.svg", test_scratch("figures"));
    CHECK(stat(path, &info) == 0 && info.st_size < 1000000 && info.st_size > 10000);
    CHECK(strstr(d.text, "# bonds") == NULL);
    drop(&d);
}
