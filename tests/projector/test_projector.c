/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "fixtures.h"
#include "selvedge/projector.h"

typedef struct bench {
    sv_model model;
    sv_flake flake;
    sv_sample sample;
} bench;

static bench make(void)
{
    bench b = {.model = fixture_haldane(0.2, 0.9, 0.1)};
    sv_flake_spec spec = fixture_cells(&b.model, 6, 6, false);
    b.flake = fixture_flake(&b.model, &spec);
    return b;
}

static void draw(bench *b, double width)
{
    sv_disorder d = {.name = "pot", .type = SV_DISORDER_ONSITE, .on = -1, .width = width};
    b->flake.model = &b->model; /* the bench was returned by value */
    CHECK_OK(sv_sample_draw(test_context(), &b->flake, &d, 1, 1, 0, &b->sample));
}

static void release(bench *b)
{
    sv_sample_free(test_context(), &b->sample);
    sv_flake_free(test_context(), &b->flake);
    sv_model_free(test_context(), &b->model);
}

static sv_projector *project(const bench *b, sv_occupation occupation, bool occupied)
{
    sv_projector *p = NULL;
    sv_projector_options o = sv_projector_options_default();
    o.occupied_basis = occupied;
    CHECK_OK(sv_projector_make(test_context(), &b->sample, &occupation, &o, &p));
    return p;
}

/* Both sides of the spectrum give the same P; P² = P; tr P = N_occ. */
SV_TEST(both_bases_give_one_projector)
{
    bench b = make();
    draw(&b, 1.0);
    sv_index n = b.sample.n;
    sv_occupation most = {.by = SV_BY_ELECTRONS, .electrons = 50};
    sv_projector *p = project(&b, most, false), *q = project(&b, most, true);
    CHECK(sv_projector_basis(p).empty_side && !sv_projector_basis(q).empty_side);
    sv_basis basis;
    CHECK_STATUS(SV_UNDEFINED, sv_projector_occupied_basis(test_context(), p, &basis));
    CHECK_OK(sv_projector_occupied_basis(test_context(), q, &basis));
    CHECK_INT(basis.columns, 50);
    sv_complex *block = NULL;
    CHECK_OK(sv_take(test_context(), 4 * n * n, sizeof *block, &block));
    sv_complex *one = block, *px = one + n * n, *qx = px + n * n, *ppx = qx + n * n;
    for (sv_index k = 0; k < n; k++)
        one[k * (n + 1)] = 1.0;
    CHECK_OK(sv_projector_apply(test_context(), p, n, one, px));
    CHECK_OK(sv_projector_apply(test_context(), q, n, one, qx));
    CHECK_OK(sv_projector_apply(test_context(), p, n, px, ppx));
    double trace = 0.0, differs = 0.0, defect = 0.0;
    for (sv_index k = 0; k < n * n; k++) {
        differs = fmax(differs, cabs(px[k] - qx[k]));
        defect = fmax(defect, cabs(ppx[k] - px[k]));
        trace += k % (n + 1) == 0 ? creal(px[k]) : 0.0;
    }
    CHECK(differs < 1e-12 && defect < 1e-12);
    CHECK_CLOSE(trace, 50.0, 1e-11);
    CHECK_OK(sv_projector_defect(test_context(), q, &defect));
    CHECK(defect < 1e-11);
    CHECK_TEXT(sv_projector_engine(p), "dense");
    sv_give(test_context(), block);
    sv_projector_free(test_context(), p);
    sv_projector_free(test_context(), q);
    release(&b);
}

SV_TEST(occupation_rules)
{
    bench b = make();
    draw(&b, 1.0);
    double *levels = fixture_spectrum(&b.sample);
    sv_projector *p = project(&b, (sv_occupation){.by = SV_BY_ENERGY, .fermi_energy = 0.3}, false);
    const sv_levels *l = sv_projector_levels(p);
    CHECK(!l->on_level && levels[l->occupied - 1] < 0.3 && levels[l->occupied] >= 0.3);
    CHECK_CLOSE(l->highest_occupied, levels[l->occupied - 1], 1e-12);
    sv_projector_free(test_context(), p);
    /* filling·N with a tie goes up: 72·0.25 = 18; 72·0.4792 = 34.5024 → 35 */
    const double fillings[] = {0.25, 0.479166666666666667, 0.0, 1.0};
    const int electrons[] = {18, 35, 0, 72};
    for (int k = 0; k < 4; k++) {
        p = project(&b, (sv_occupation){.by = SV_BY_FILLING, .filling = fillings[k]}, false);
        l = sv_projector_levels(p);
        CHECK_INT(l->occupied, electrons[k]);
        CHECK(l->has_highest == (electrons[k] > 0) && l->has_lowest == (electrons[k] < 72));
        sv_projector_free(test_context(), p);
    }
    p = project(&b, (sv_occupation){.by = SV_BY_ENERGY, .fermi_energy = levels[40]}, false);
    CHECK(sv_projector_levels(p)->on_level);
    sv_projector_free(test_context(), p);
    sv_occupation too_many = {.by = SV_BY_ELECTRONS, .electrons = 73};
    sv_projector_options o = sv_projector_options_default();
    CHECK_STATUS(SV_UNDEFINED, sv_projector_make(test_context(), &b.sample, &too_many, &o, &p));
    sv_give(test_context(), levels);
    release(&b);
}

/* A filling that cuts a degenerate level leaves P undefined: clean torus, E = 0 shell. */
SV_TEST(a_cut_degenerate_level_is_said)
{
    sv_model model = fixture_hofstadter(0, 1);
    sv_flake_spec torus = fixture_cells(&model, 4, 4, true);
    sv_occupation half = {.by = SV_BY_FILLING, .filling = 0.5};
    sv_outcome o = fixture_marker("bott", &model, &torus, NULL, 0, 1, &half, 0);
    CHECK(o.verdict == SV_UNRESOLVED && strstr(o.reason, "only in part") != NULL);
    sv_occupation none = {.by = SV_BY_ELECTRONS, .electrons = 0};
    o = fixture_marker("bott", &model, &torus, NULL, 0, 1, &none, 0);
    CHECK(o.verdict == SV_RESOLVED && o.index == 0 && strstr(o.reason, "convention") != NULL);
    sv_model_free(test_context(), &model);
}

SV_TEST(forecast_grows_with_the_flake)
{
    double bytes[2], operations[2];
    sv_projector_forecast(SV_ENGINE_DENSE, 1000, &bytes[0], &operations[0]);
    sv_projector_forecast(SV_ENGINE_DENSE, 2000, &bytes[1], &operations[1]);
    CHECK_CLOSE(bytes[1] / bytes[0], 4.0, 0.1);
    CHECK_CLOSE(operations[1] / operations[0], 8.0, 0.1);
}
