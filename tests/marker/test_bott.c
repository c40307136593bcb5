/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The Bott index by every way against the definition, on random samples near and far from
 * transitions. The twin below shares nothing with the library but the sample. */
#include "fixtures.h"
#include "selvedge/ensemble.h"

#include <stdlib.h>

#define lapack_complex_double double _Complex
#define lapack_complex_float  float _Complex
#include <lapacke.h>

typedef struct twin {
    sv_index n, m;
    sv_complex *states; /* n × n eigenvectors, ascending; the first m are occupied */
    double (*uv)[2];
    double turns, margin, weakest;
    double spacing; /* distance of the nearest level from the Fermi energy */
} twin;

static void *room(sv_index count, size_t size)
{
    void *memory = NULL;
    CHECK_OK(sv_take(test_context(), count, size, (void *)&memory));
    return memory;
}

/* Coordinates in turns for the tori used here: n1 × n2 cells along the lattice vectors. */
static void twin_coordinates(const sv_sample *sample, int n1, int n2, twin *t)
{
    const sv_flake *flake = sample->flake;
    const double(*a)[2] = flake->model->vectors;
    double det = a[0][0] * a[1][1] - a[0][1] * a[1][0];
    t->uv = room(t->n, sizeof *t->uv);
    for (sv_index r = 0; r < t->n; r++) {
        const double *at = flake->sites[sample->pristine[r]].at;
        t->uv[r][0] = (at[0] * a[1][1] - at[1] * a[1][0]) / det / n1;
        t->uv[r][1] = (a[0][0] * at[1] - a[0][1] * at[0]) / det / n2;
    }
}

/* ⟨a| e^{2πi·coordinate} |b⟩ for all occupied a, b: three loops. */
static sv_complex *twin_turn(const twin *t, int axis)
{
    sv_complex *turn = room(t->m * t->m, sizeof *turn);
    sv_complex *column = room(t->n, sizeof *column);
    for (sv_index b = 0; b < t->m; b++) {
        for (sv_index r = 0; r < t->n; r++) {
            double angle = 2.0 * M_PI * t->uv[r][axis];
            column[r] = CMPLX(cos(angle), sin(angle)) * t->states[r + b * t->n];
        }
        for (sv_index a = 0; a < t->m; a++) {
            sv_complex sum = 0.0;
            for (sv_index r = 0; r < t->n; r++)
                sum += conj(t->states[r + a * t->n]) * column[r];
            turn[a + b * t->m] = sum;
        }
    }
    sv_give(test_context(), column);
    return turn;
}

/* a b, or a b†. */
static sv_complex *twin_product(sv_index m, const sv_complex *a, const sv_complex *b, bool adjoint)
{
    sv_complex *product = room(m * m, sizeof *product);
    for (sv_index j = 0; j < m; j++)
        for (sv_index k = 0; k < m; k++) {
            sv_complex factor = adjoint ? conj(b[j + k * m]) : b[k + j * m];
            for (sv_index i = 0; i < m; i++)
                product[i + j * m] += a[i + k * m] * factor;
        }
    return product;
}

static void twin_angles(twin *t)
{
    sv_context *context = test_context();
    sv_complex *u = twin_turn(t, 0), *v = twin_turn(t, 1);
    sv_complex *vu = twin_product(t->m, v, u, false);
    sv_complex *vuv = twin_product(t->m, vu, v, true);
    sv_complex *all = twin_product(t->m, vuv, u, true);
    sv_complex *values = room(t->m, sizeof *values);
    int m = (int)t->m;
    CHECK_INT(LAPACKE_zgeev(LAPACK_COL_MAJOR, 'N', 'N', m, all, m, values, NULL, 1, NULL, 1), 0);
    t->margin = M_PI;
    t->weakest = 1e9;
    for (int k = 0; k < m; k++) {
        t->turns += carg(values[k]) / (2.0 * M_PI);
        t->margin = fmin(t->margin, M_PI - fabs(carg(values[k])));
        t->weakest = fmin(t->weakest, cabs(values[k]));
    }
    sv_complex *blocks[] = {u, v, vu, vuv, all, values};
    for (int k = 0; k < 6; k++)
        sv_give(context, blocks[k]);
}

static twin twin_make(const sv_sample *sample, const sv_occupation *occupation, int n1, int n2)
{
    sv_context *context = test_context();
    sv_index n = sample->n;
    twin t = {.n = n, .states = room(n * n, sizeof(sv_complex))};
    double *energies = room(n, sizeof *energies);
    sv_sparse_to_dense(&sample->hamiltonian, t.states);
    CHECK_INT(LAPACKE_zheev(LAPACK_COL_MAJOR, 'V', 'L', (int)n, t.states, (int)n, energies), 0);
    double fermi = occupation->fermi_energy;
    if (occupation->by == SV_BY_ENERGY)
        while (t.m < n && energies[t.m] < fermi)
            t.m++;
    else
        t.m = sv_occupation_electrons(occupation, n);
    if (t.m > 0 && t.m < n) {
        if (occupation->by != SV_BY_ENERGY)
            fermi = 0.5 * (energies[t.m - 1] + energies[t.m]);
        t.spacing = fmin(fermi - energies[t.m - 1], energies[t.m] - fermi);
        twin_coordinates(sample, n1, n2, &t);
        twin_angles(&t);
    }
    sv_give(context, energies);
    return t;
}

static void twin_free(twin *t)
{
    sv_give(test_context(), t->states);
    sv_give(test_context(), t->uv);
}

/* What a batch of samples saw. */
typedef struct tally {
    int samples, resolved, nonzero, close, certified, eigenvalues, filtered, dense, vacant;
} tally;

/* Largest weight outside the twin's occupied states of a column of the basis. */
static double outside(const twin *t, const sv_basis *basis)
{
    double worst = 0.0;
    for (sv_index c = 0; c < basis->columns; c++) {
        double inside = 0.0, all = 0.0;
        for (sv_index k = 0; k < t->m; k++) {
            sv_complex sum = 0.0;
            for (sv_index r = 0; r < t->n; r++)
                sum += conj(t->states[r + k * t->n]) * basis->vectors[r + c * t->n];
            inside += creal(sum) * creal(sum) + cimag(sum) * cimag(sum);
        }
        for (sv_index r = 0; r < t->n; r++)
            all += pow(cabs(basis->vectors[r + c * t->n]), 2.0);
        worst = fmax(worst, fmax(fabs(all - 1.0), fabs(all - inside)));
    }
    return worst;
}

/* One basis by one method against the twin. */
static void compare(const twin *t, const sv_basis *basis, sv_bott_method method, tally *seen)
{
    sv_outcome o = sv_outcome_blank();
    sv_bott_method used = SV_BOTT_AUTO;
    CHECK_OK(sv_bott_of_basis(test_context(), basis, (const double(*)[2])t->uv, method, &o, &used));
    CHECK(used == SV_BOTT_SERIES || used == SV_BOTT_EIGENVALUES);
    seen->certified += used == SV_BOTT_SERIES;
    seen->eigenvalues += used == SV_BOTT_EIGENVALUES;
    if (used == SV_BOTT_SERIES) {
        CHECK(o.verdict == SV_RESOLVED);
        CHECK(o.margin <= t->margin + 1e-6 && o.margin > 0.5 * M_PI);
        CHECK(o.weakest <= t->weakest + 1e-6 && o.weakest > 0.0);
    } else {
        /* Eigenvalues of a matrix that is not normal: a few digits are lost now and then. */
        CHECK_CLOSE(o.margin, t->margin, 1e-5);
        CHECK_CLOSE(o.weakest, t->weakest, 1e-5);
    }
    if (o.verdict != SV_RESOLVED) {
        CHECK(t->margin < 1e-5 || t->weakest < 1e-8);
        return;
    }
    seen->resolved++;
    seen->nonzero += o.index != 0;
    test_check(o.index == lround(t->turns), __FILE__, __LINE__,
               "index %lld, definition %.9f, margin %.3g, weakest %.3g", (long long)o.index,
               t->turns, t->margin, t->weakest);
}

static void one_sample(const sv_flake *flake, int n1, int n2, const sv_disorder *disorder,
                       int n_disorder, uint64_t seed, const sv_occupation *occupation, tally *seen)
{
    sv_context *context = test_context();
    sv_sample sample = {0};
    CHECK_OK(sv_sample_draw(context, flake, disorder, n_disorder, seed, 0, &sample));
    twin t = twin_make(&sample, occupation, n1, n2);
    seen->samples++;
    seen->close += t.margin < 0.3;
    seen->vacant += sample.inventory.vacancies > 0;
    for (int e = 0; e < 2 && t.spacing > 1e-9; e++) {
        sv_projector *projector = NULL;
        sv_projector_options options = sv_projector_options_default();
        sv_basis basis;
        options.engine = e == 0 ? SV_ENGINE_DENSE : SV_ENGINE_CHEBYSHEV;
        options.occupied_basis = true;
        CHECK_OK(sv_projector_make(context, &sample, occupation, &options, &projector));
        CHECK_OK(sv_projector_occupied_basis(context, projector, &basis));
        CHECK_INT(basis.columns, t.m);
        CHECK_INT(sv_projector_levels(projector)->occupied, t.m);
        if (e == 1) {
            bool filtered = strcmp(sv_projector_engine(projector), "chebyshev") == 0;
            seen->filtered += filtered;
            seen->dense += !filtered;
            CHECK(outside(&t, &basis) < 2e-8);
        }
        compare(&t, &basis, SV_BOTT_SERIES, seen);
        if (e == 0)
            compare(&t, &basis, SV_BOTT_EIGENVALUES, &(tally){0});
        sv_projector_free(context, projector);
    }
    twin_free(&t);
    sv_sample_free(context, &sample);
}

/* Box widths 0 … 9 in turn, the later half with vacancies. */
static tally batch(sv_model model, int n1, int n2, const sv_occupation *occupation, int samples,
                   double least, double most)
{
    tally seen = {0};
    sv_flake_spec spec = fixture_cells(&model, n1, n2, true);
    sv_flake flake = fixture_flake(&model, &spec);
    for (int k = 0; k < samples; k++) {
        double width = least + (most - least) * k / (samples > 1 ? samples - 1 : 1);
        sv_disorder disorder[] = {
            {.name = "pot", .type = SV_DISORDER_ONSITE, .on = -1, .width = width},
            {.name = "gone",
             .type = SV_DISORDER_VACANCIES,
             .on = -1,
             .has_share = true,
             .share = 0.04}};
        one_sample(&flake, n1, n2, disorder, k % 2 == 0 ? 1 : 2, (uint64_t)k + 1, occupation,
                   &seen);
    }
    sv_flake_free(test_context(), &flake);
    sv_model_free(test_context(), &model);
    printf("# %d samples: %d certified, %d by eigenvalues, %d filtered, %d dense, %d close\n",
           seen.samples, seen.certified, seen.eigenvalues, seen.filtered, seen.dense, seen.close);
    return seen;
}

SV_TEST(half_bhz_equals_the_definition)
{
    tally t = batch(fixture_qi_wu_zhang(-1.0), 6, 7, &fixture_below_zero, 120, 0.0, 9.0);
    CHECK(t.certified > 20 && t.eigenvalues > 20 && t.close > 1);
    CHECK(t.filtered > 20 && t.nonzero > 20 && t.vacant > 20);
}

SV_TEST(haldane_equals_the_definition)
{
    tally t = batch(fixture_haldane(0.2, M_PI / 2, 0.0), 6, 6, &fixture_below_zero, 120, 0.0, 9.0);
    CHECK(t.certified > 20 && t.eigenvalues > 20 && t.close > 1);
    CHECK(t.filtered > 20 && t.nonzero > 20 && t.vacant > 20);
}

SV_TEST(hofstadter_equals_the_definition)
{
    sv_occupation third = {.by = SV_BY_FILLING, .filling = 1.0 / 3.0};
    tally t = batch(fixture_hofstadter(1, 3), 9, 9, &third, 120, 0.0, 5.0);
    CHECK(t.certified > 10 && t.eigenvalues > 20 && t.filtered > 20 && t.nonzero > 20);
    /* The upper gap: more than half of the states are occupied. */
    third.filling = 2.0 / 3.0;
    t = batch(fixture_hofstadter(1, 3), 9, 9, &third, 30, 0.0, 2.0);
    CHECK(t.certified > 5 && t.filtered > 10 && t.nonzero > 10);
}

/* Next to the transition, where polar factors of U and V give another integer now and then. */
SV_TEST(close_to_a_transition)
{
    tally t = batch(fixture_qi_wu_zhang(-1.0), 8, 9, &fixture_below_zero, 24, 5.0, 7.0);
    CHECK(t.eigenvalues > 5 && t.close > 1);
    t = batch(fixture_haldane(0.15, M_PI / 2, 0.7), 8, 8, &fixture_below_zero, 24, 0.0, 3.0);
    CHECK(t.resolved > 24);
}

/* Above 256 states the marker itself takes the series; its bounds are marked by an exact integer.
 */
SV_TEST(large_tori_are_certified)
{
    sv_model model = fixture_qi_wu_zhang(-1.0);
    sv_flake_spec torus = fixture_cells(&model, 17, 17, true);
    sv_disorder pot = {.name = "pot", .type = SV_DISORDER_ONSITE, .on = -1, .width = 1.0};
    sv_outcome o = fixture_marker("bott", &model, &torus, &pot, 1, 1, &fixture_below_zero, 0);
    CHECK_INT(o.index, 1);
    CHECK(o.verdict == SV_RESOLVED && o.numerical_error == 0.0);
    CHECK(o.margin > 0.5 * M_PI && o.weakest > 0.5 && o.weakest < 0.9255);
    sv_model_free(test_context(), &model);
}

/* A state with equal weight half a turn apart has ⟨e^{2πiu}⟩ = 0: no angle, so no index. */
SV_TEST(a_singular_product_is_unresolved)
{
    const sv_complex state[2] = {sqrt(0.5), sqrt(0.5)};
    const double uv[2][2] = {{0.0, 0.25}, {0.5, 0.25}};
    sv_basis basis = {.available = true, .n = 2, .columns = 1, .vectors = state};
    for (int k = 0; k < 3; k++) {
        sv_outcome o = sv_outcome_blank();
        sv_bott_method used = SV_BOTT_AUTO;
        o.verdict = SV_UNRESOLVED;
        CHECK_OK(sv_bott_of_basis(test_context(), &basis, uv, (sv_bott_method)k, &o, &used));
        CHECK(used == SV_BOTT_EIGENVALUES && o.verdict == SV_UNRESOLVED);
        CHECK(strstr(o.reason, "singular") != NULL);
    }
    basis.columns = 0;
    sv_outcome o = sv_outcome_blank();
    sv_bott_method used;
    CHECK_STATUS(SV_INVALID_INPUT,
                 sv_bott_of_basis(test_context(), &basis, uv, SV_BOTT_AUTO, &o, &used));
}

/* Through the marker, with either engine for the basis. */
static sv_outcome marker_with(sv_engine engine, const sv_model *model, int side,
                              const sv_occupation *occupation)
{
    sv_context *context = test_context();
    sv_outcome outcome = sv_outcome_blank();
    sv_flake_spec spec = fixture_cells(model, side, side, true);
    sv_flake flake = fixture_flake(model, &spec);
    sv_sample sample = {0};
    sv_projector *projector = NULL;
    sv_projector_options options = sv_projector_options_default();
    options.engine = engine;
    options.occupied_basis = true;
    CHECK_OK(sv_sample_draw(context, &flake, NULL, 0, 1, 0, &sample));
    CHECK_OK(sv_projector_make(context, &sample, occupation, &options, &projector));
    sv_marker_input input = {.sample = &sample, .occupation = occupation, .projector = projector};
    CHECK_OK(sv_bott_index(context, &input, &outcome));
    sv_projector_free(context, projector);
    sv_sample_free(context, &sample);
    sv_flake_free(context, &flake);
    return outcome;
}

SV_TEST(no_and_all_electrons_and_closed_gaps)
{
    sv_model model = fixture_qi_wu_zhang(-1.0), critical = fixture_qi_wu_zhang(0.0);
    for (int e = SV_ENGINE_DENSE; e <= SV_ENGINE_CHEBYSHEV; e++) {
        sv_occupation count = {.by = SV_BY_ELECTRONS, .electrons = 0};
        sv_outcome o = marker_with((sv_engine)e, &model, 6, &count);
        CHECK(o.verdict == SV_RESOLVED && o.index == 0 && strstr(o.reason, "convention") != NULL);
        count.electrons = 72;
        o = marker_with((sv_engine)e, &model, 6, &count);
        CHECK(o.verdict == SV_RESOLVED && o.index == 0 && strstr(o.reason, "convention") != NULL);
        /* m = 0 closes the gap at k = (π, 0) and (0, π): levels at the Fermi energy. */
        o = marker_with((sv_engine)e, &critical, 6, &fixture_below_zero);
        CHECK(o.verdict == SV_UNRESOLVED && o.reason[0] != '\0');
        CHECK_TEXT(o.engine, "dense"); /* the filter leaves such samples to it */
        o = marker_with((sv_engine)e, &model, 6, &fixture_below_zero);
        CHECK(o.verdict == SV_RESOLVED && o.index == 1);
    }
    sv_model_free(test_context(), &model);
    sv_model_free(test_context(), &critical);
}

/* Large tori take the filter unless dense is asked for, with the same index and levels. */
SV_TEST(plans_choose_the_engine_of_the_basis)
{
    sv_context *context = test_context();
    sv_model model = fixture_haldane(0.2, M_PI / 2, 0.0);
    sv_record records[3];
    const struct {
        int side;
        sv_engine asked, expected;
    } rows[] = {{18, SV_ENGINE_AUTO, SV_ENGINE_CHEBYSHEV},
                {18, SV_ENGINE_DENSE, SV_ENGINE_DENSE},
                {12, SV_ENGINE_AUTO, SV_ENGINE_DENSE}};
    sv_disorder pot = {.name = "pot", .type = SV_DISORDER_ONSITE, .on = -1, .width = 1.5};
    for (int k = 0; k < 3; k++) {
        sv_flake_spec spec = fixture_cells(&model, rows[k].side, rows[k].side, false);
        sv_flake open = fixture_flake(&model, &spec);
        spec.periodic[0] = spec.periodic[1] = true;
        sv_flake closed = fixture_flake(&model, &spec);
        sv_case point = {.open_flake = &open,
                         .closed_flake = &closed,
                         .disorder = &pot,
                         .n_disorder = 1,
                         .occupation = fixture_below_zero,
                         .solve = sv_projector_options_default(),
                         .seed = 1,
                         .markers = {{.marker = sv_marker_find("bott")}},
                         .n_markers = 1};
        sv_plan plan;
        point.solve.engine = rows[k].asked;
        CHECK_OK(sv_case_plan(context, &point, false, 0.005, &plan));
        CHECK_INT(point.solve.basis_engine, rows[k].expected);
        CHECK_OK(sv_realise(context, &point, 0, NULL, NULL, &records[k]));
        const sv_outcome *o = &records[k].outcomes[0];
        CHECK_TEXT(o->engine, rows[k].expected == SV_ENGINE_DENSE ? "dense" : "chebyshev");
        CHECK(o->verdict == SV_RESOLVED && o->index == 1);
        sv_flake_free(context, &open);
        sv_flake_free(context, &closed);
    }
    const sv_outcome *filtered = &records[0].outcomes[0], *dense = &records[1].outcomes[0];
    CHECK_INT(filtered->electrons, dense->electrons);
    CHECK_CLOSE(filtered->highest_occupied, dense->highest_occupied, 1e-8);
    CHECK_CLOSE(filtered->lowest_empty, dense->lowest_empty, 1e-8);
    sv_model_free(context, &model);
}
