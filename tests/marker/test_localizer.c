/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Localizer index: published integers, independent computations, Lipschitz bounds, verdicts. */
#include "fixtures.h"

#include <stdlib.h>

enum { AT, KAPPA, THRESHOLD, GAP };

/* What is asked; zero for kappa and threshold and has_at false mean auto and centre. */
typedef struct probe {
    double at[2], kappa, threshold;
    bool has_at, bound;
} probe;

static void fill_values(const probe *p, sv_value values[4])
{
    memset(values, 0, 4 * sizeof *values);
    values[AT] = (sv_value){.has_auto = !p->has_at, .count = 1, .real = {p->at[0], p->at[1]}};
    values[KAPPA] = (sv_value){.has_auto = p->kappa == 0.0, .count = 1, .real = {p->kappa}};
    values[THRESHOLD] =
        (sv_value){.has_auto = p->threshold == 0.0, .count = 1, .real = {p->threshold}};
    values[GAP].text = p->bound ? "bound" : "value";
}

static sv_outcome localize(const sv_sample *sample, const sv_occupation *occupation, const probe *p)
{
    sv_value values[4];
    sv_outcome outcome = sv_outcome_blank();
    sv_marker_input input = {.sample = sample, .occupation = occupation, .values = values};
    fill_values(p, values);
    CHECK_OK(sv_localizer_index(test_context(), &input, &outcome));
    return outcome;
}

static sv_outcome localize_flake(const sv_model *model, const sv_flake_spec *spec,
                                 const sv_disorder *disorder, int n_disorder, uint64_t seed,
                                 const sv_occupation *occupation, const probe *p)
{
    sv_sample sample = {0};
    sv_flake flake = fixture_flake(model, spec);
    CHECK_OK(sv_sample_draw(test_context(), &flake, disorder, n_disorder, seed, 0, &sample));
    sv_outcome outcome = localize(&sample, occupation, p);
    sv_sample_free(test_context(), &sample);
    sv_flake_free(test_context(), &flake);
    return outcome;
}

static void choose_none(const double *values, sv_index n, sv_index *first, sv_index *last,
                        void *user)
{
    (void)values, (void)n, (void)user;
    *first = *last = 0;
}

/* Least eigenvalue (absolute) of a localizer, and the index, from all of them. */
static double dense_gap(const sv_sample *sample, double energy, double kappa, const double at[2],
                        int *ret_index)
{
    sv_context *c = test_context();
    sv_sparse l = {0};
    sv_index first, last;
    sv_complex *a = NULL, *vectors = NULL;
    double *values = NULL, gap = INFINITY;
    int negative = 0;
    CHECK_OK(sv_localizer_matrix(c, sample, energy, kappa, at, &l));
    CHECK_OK(sv_sparse_check(c, &l));
    CHECK_OK(sv_take_raw(c, l.n * l.n, sizeof *a, &a));
    CHECK_OK(sv_take_raw(c, l.n, sizeof *values, &values));
    sv_sparse_to_dense(&l, a);
    CHECK_OK(sv_dense_eigen(c, l.n, a, values, choose_none, NULL, &first, &last, &vectors));
    for (sv_index k = 0; k < l.n; k++) {
        gap = fmin(gap, fabs(values[k]));
        negative += values[k] < 0.0;
    }
    *ret_index = negative - (int)sample->n;
    sv_give(c, a);
    sv_give(c, values);
    sv_give(c, vectors);
    sv_sparse_free(c, &l);
    return gap;
}

/* Independent computation: half-BHZ m = −1 (C = +1), 12×12, centre, E = 0. */
SV_TEST(gaps_of_a_clean_square)
{
    const struct {
        double kappa, gap;
    } rows[] = {{0.02, 0.0666}, {0.05, 0.2533}, {0.1, 0.5455}, {0.3, 0.7757}, {1.0, 0.3218}};
    sv_model model = fixture_qi_wu_zhang(-1.0);
    sv_flake_spec spec = fixture_cells(&model, 12, 12, false);
    for (int k = 0; k < 5; k++) {
        probe p = {.kappa = rows[k].kappa, .threshold = 0.005};
        sv_outcome o = localize_flake(&model, &spec, NULL, 0, 1, &fixture_below_zero, &p);
        CHECK(o.verdict == SV_RESOLVED);
        CHECK_INT(o.index, 1);
        CHECK_CLOSE(o.margin, rows[k].gap, 6e-5);
        CHECK_CLOSE(o.kappa, rows[k].kappa, 0.0);
        p.bound = true;
        sv_outcome b = localize_flake(&model, &spec, NULL, 0, 1, &fixture_below_zero, &p);
        CHECK(b.verdict == SV_RESOLVED && b.index == 1);
        CHECK_CLOSE(b.margin, 0.005, 1e-4);
    }
    /* κ = 2 gives the integer 0: κ/2 gives 1, so the verdict must not stand. */
    probe p = {.kappa = 2.0, .threshold = 0.005};
    sv_outcome o = localize_flake(&model, &spec, NULL, 0, 1, &fixture_below_zero, &p);
    CHECK(o.verdict == SV_UNRESOLVED && o.reason[0] != '\0');
    sv_model_free(test_context(), &model);
}

/* Independent computation: zigzag hexagon of 294 sites, t2 = 0.2, M = 0. Lengths there are in
 * nearest-neighbour distances, 1/√3 lattice constants; its φ has the opposite sense. */
SV_TEST(gaps_of_a_honeycomb_hexagon)
{
    const struct {
        double kappa, x, gap;
        int index;
    } rows[] = {{0.05, 0, 0.4366, 1}, {0.1, 0, 0.9453, 1}, {0.2, 0, 0.8792, 1},
                {0.4, 0, 0.7173, 1},  {1.0, 0, 0.1997, 1}, {0.2, 5, 0.8803, 1},
                {0.2, 10, 0.1004, 1}, {0.2, 15, 0.871, 0}, {0.2, 20, 1.853, 0}};
    double scale = sqrt(3.0);
    sv_flake_spec spec = {.shape = SV_SHAPE_HEXAGON, .has_cells = true, .cells = {7}};
    for (int sign = 1; sign >= -1; sign -= 2) {
        sv_model model = fixture_haldane(0.2, sign * M_PI / 2, 0.0);
        sv_flake flake = fixture_flake(&model, &spec);
        sv_sample sample = {0};
        CHECK_OK(sv_sample_draw(test_context(), &flake, NULL, 0, 1, 0, &sample));
        for (int k = 0; k < 9; k++) {
            probe p = {.at = {flake.centre[0] + rows[k].x / scale, flake.centre[1]},
                       .kappa = rows[k].kappa * scale,
                       .threshold = 0.01,
                       .has_at = true};
            sv_outcome o = localize(&sample, &fixture_below_zero, &p);
            CHECK_CLOSE(o.margin, rows[k].gap, 6e-4);
            CHECK(o.verdict == SV_RESOLVED || rows[k].x > 9.0);
            if (o.verdict == SV_RESOLVED)
                CHECK_INT(o.index, sign * rows[k].index);
        }
        sv_sample_free(test_context(), &sample);
        sv_flake_free(test_context(), &flake);
        sv_model_free(test_context(), &model);
    }
}

/* The disordered sample of the reference table (see test_reference.c). */
SV_TEST(golden_disordered_sample)
{
    sv_model model = fixture_qi_wu_zhang(-1.0);
    sv_mark *marks = NULL;
    CHECK_OK(sv_take(test_context(), 64, sizeof *marks, &marks));
    for (int i = 0; i < 64; i++) {
        uint32_t word[4];
        sv_philox((const uint32_t[4]){(uint32_t)i, 0, 0, 0}, (const uint32_t[2]){1, 0}, word);
        marks[i] = (sv_mark){.by_cell = true,
                             .cell = {i / 8, i % 8},
                             .orbital = -1,
                             .energy = 2.0 * ((word[0] + 0.5) / 4294967296.0 - 0.5)};
    }
    sv_disorder disorder = {.name = "golden",
                            .type = SV_DISORDER_ONSITE,
                            .on = -1,
                            .has_marks = true,
                            .n_marks = 64,
                            .marks = marks};
    sv_flake_spec spec = fixture_cells(&model, 8, 8, false);
    probe p = {.at = {3.5, 3.5}, .has_at = true, .kappa = 0.3, .threshold = 0.1};
    sv_outcome o = localize_flake(&model, &spec, &disorder, 1, 1, &fixture_below_zero, &p);
    CHECK(o.verdict == SV_RESOLVED);
    CHECK_INT(o.index, 1);
    CHECK_CLOSE(o.margin, 0.5472504762, 6e-8);
    CHECK_INT(o.electrons, 63);
    sv_disorder_free(test_context(), &disorder);
    sv_model_free(test_context(), &model);
}

/* Everything automatic, against the link-variable Chern number. */
SV_TEST(signs_against_the_link_variable_chern_number)
{
    sv_model models[] = {fixture_qi_wu_zhang(-1.0),       fixture_qi_wu_zhang(1.2),
                         fixture_qi_wu_zhang(-3.0),       fixture_haldane(0.2, M_PI / 2, 0.3),
                         fixture_haldane(0.2, -1.2, 0.0), fixture_haldane(0.1, M_PI / 2, 1.5)};
    for (size_t k = 0; k < sizeof models / sizeof models[0]; k++) {
        sv_flake_spec spec = fixture_cells(&models[k], 14, 14, false);
        sv_occupation half = {.by = SV_BY_FILLING, .filling = 0.5};
        int expected = fixture_link_chern(&models[k], 1, 24);
        probe p = {0};
        sv_outcome o = localize_flake(&models[k], &spec, NULL, 0, 1, &fixture_below_zero, &p);
        CHECK(o.verdict == SV_RESOLVED);
        CHECK_INT(o.index, expected);
        CHECK(o.margin > 0.0 && o.kappa > 0.0);
        sv_outcome f = localize_flake(&models[k], &spec, NULL, 0, 1, &half, &p);
        CHECK(f.verdict == SV_RESOLVED || strstr(f.reason, "degenerate") != NULL);
        if (f.verdict == SV_RESOLVED)
            CHECK_INT(f.index, expected);
        sv_model_free(test_context(), &models[k]);
    }
}

/* D. J. Thouless, M. Kohmoto, M. P. Nightingale, M. den Nijs, PRL 49, 405 (1982). Wide and narrow
 * gaps on flakes of 20 and 21 cells: right or unresolved, most right, none wrong. */
SV_TEST(hofstadter_gaps_are_right_or_unresolved)
{
    const struct {
        int p, q, r, chern;
    } gaps[] = {{1, 3, 1, 1},  {1, 3, 2, -1}, {1, 5, 1, 1},  {1, 5, 2, 2},  {1, 5, 3, -2},
                {1, 5, 4, -1}, {2, 5, 1, -2}, {2, 5, 2, 1},  {2, 5, 3, -1}, {2, 5, 4, 2},
                {2, 7, 1, -3}, {2, 7, 2, 1},  {2, 7, 3, -2}, {3, 7, 1, -2}, {3, 7, 2, 3},
                {3, 7, 3, 1},  {1, 4, 1, 1},  {3, 8, 1, 3},  {3, 8, 2, -2}};
    int right = 0, total = (int)(sizeof gaps / sizeof gaps[0]);
    for (int k = 0; k < total; k++) {
        int q = gaps[k].q, side = q == 7 || q == 3 ? 21 : 20;
        double edge[2];
        sv_model model = fixture_hofstadter(gaps[k].p, q);
        sv_flake_spec spec = fixture_cells(&model, side, side, false);
        CHECK_OK(sv_model_filling_gap(test_context(), &model, (double)gaps[k].r / q, 1e-6, edge));
        sv_occupation middle = {.by = SV_BY_ENERGY, .fermi_energy = 0.5 * (edge[0] + edge[1])};
        probe p = {0};
        sv_outcome o = localize_flake(&model, &spec, NULL, 0, 1, &middle, &p);
        if (o.verdict == SV_RESOLVED)
            CHECK_INT(o.index, gaps[k].chern);
        else
            printf("# flux %d/%d, gap %d: %s\n", gaps[k].p, q, gaps[k].r, o.reason);
        right += o.verdict == SV_RESOLVED && o.index == gaps[k].chern;
        sv_model_free(test_context(), &model);
    }
    printf("# %d of %d gaps resolved\n", right, total);
    CHECK(10 * right >= 8 * total);
}

/* Whatever κ is given: never a wrong integer. At κ = 0.6 gap 1 of 3/7 gives 0 with a localizer gap
 * of 0.32, above g itself. */
SV_TEST(no_kappa_gives_a_wrong_integer)
{
    const struct {
        int p, q, r, chern;
    } gaps[] = {{3, 7, 1, -2}, {2, 5, 1, -2}, {1, 5, 2, 2}, {1, 3, 1, 1}};
    const double kappas[] = {0.01, 0.03, 0.1, 0.2, 0.4, 0.6, 0.9, 1.5, 3.0, 8.0, 30.0};
    for (int k = 0; k < 4; k++) {
        int right = 0;
        double edge[2];
        sv_model model = fixture_hofstadter(gaps[k].p, gaps[k].q);
        sv_flake_spec spec = fixture_cells(&model, 20, 20, false);
        CHECK_OK(sv_model_filling_gap(test_context(), &model, (double)gaps[k].r / gaps[k].q, 1e-6,
                                      edge));
        sv_occupation middle = {.by = SV_BY_ENERGY, .fermi_energy = 0.5 * (edge[0] + edge[1])};
        for (size_t j = 0; j < sizeof kappas / sizeof kappas[0]; j++) {
            probe p = {.kappa = kappas[j], .bound = j % 2 == 0};
            sv_outcome o = localize_flake(&model, &spec, NULL, 0, 1, &middle, &p);
            if (o.verdict != SV_RESOLVED)
                continue;
            CHECK_INT(o.index, gaps[k].chern);
            right++;
        }
        CHECK(right >= 1);
        sv_model_free(test_context(), &model);
    }
}

static sv_sample random_sample(const sv_flake *flake, double width, double vacant, uint64_t seed)
{
    sv_sample sample = {0};
    sv_disorder disorder[2] = {
        {.name = "vac",
         .type = SV_DISORDER_VACANCIES,
         .on = -1,
         .has_share = true,
         .share = vacant},
        {.name = "pot", .type = SV_DISORDER_ONSITE, .on = -1, .width = width}};
    CHECK_OK(sv_sample_draw(test_context(), flake, disorder, 2, seed, 0, &sample));
    return sample;
}

/* Gap and index against all eigenvalues of the localizer. */
SV_TEST(disordered_samples_against_all_eigenvalues)
{
    int resolved = 0;
    for (int seed = 1; seed <= 16; seed++) {
        sv_model model = seed % 2 ? fixture_qi_wu_zhang(-1.0) : fixture_haldane(0.2, M_PI / 2, 0.0);
        sv_flake_spec spec = fixture_cells(&model, 8, 8, false);
        sv_flake flake = fixture_flake(&model, &spec);
        sv_sample s = random_sample(&flake, seed % 4 * 1.5, 0.04 * (seed % 3), (uint64_t)seed);
        probe p = {.at = {flake.centre[0] + 0.3, flake.centre[1] - 0.2},
                   .has_at = true,
                   .kappa = 0.3,
                   .threshold = 0.02};
        sv_occupation below = {.by = SV_BY_ENERGY, .fermi_energy = 0.05 * (seed % 5)};
        sv_outcome o = localize(&s, &below, &p);
        int index;
        double gap = dense_gap(&s, below.fermi_energy, p.kappa, p.at, &index);
        CHECK_CLOSE(o.margin, gap, 1e-7);
        CHECK(gap >= 0.02 || o.verdict == SV_UNRESOLVED);
        if (o.verdict == SV_RESOLVED)
            CHECK_INT(o.index, index);
        double *level = fixture_spectrum(&s);
        int electrons = 0;
        for (sv_index k = 0; k < s.n; k++)
            electrons += level[k] < below.fermi_energy;
        CHECK_INT(o.electrons, electrons);
        resolved += o.verdict == SV_RESOLVED;
        sv_give(test_context(), level);
        sv_sample_free(test_context(), &s);
        sv_flake_free(test_context(), &flake);
        sv_model_free(test_context(), &model);
    }
    CHECK(resolved >= 8);
}

/* Thresholds on both sides of the gap, near and far: open when the gap of all eigenvalues is
 * larger, by whatever precision that was found, and a bound is one. */
SV_TEST(thresholds_around_the_gap)
{
    const double parts[] = {0.05, 0.5, 0.78, 0.82, 0.999, 1.001, 1.2, 1.3, 2.0};
    for (int seed = 1; seed <= 5; seed++) {
        sv_model model = fixture_haldane(0.2, M_PI / 2, 0.0);
        sv_flake_spec spec = fixture_cells(&model, 9, 9, false);
        sv_flake flake = fixture_flake(&model, &spec);
        sv_sample s = random_sample(&flake, 1.0, 0.0, (uint64_t)seed);
        sv_occupation below = {.by = SV_BY_ENERGY, .fermi_energy = 0.1};
        int index;
        probe p = {.at = {flake.centre[0], flake.centre[1]}, .has_at = true, .kappa = 0.4};
        double gap = dense_gap(&s, below.fermi_energy, p.kappa, p.at, &index);
        for (int k = 0; k < 9; k++)
            for (int bound = 0; bound < 2; bound++) {
                p.threshold = parts[k] * gap;
                p.bound = bound == 1;
                sv_outcome o = localize(&s, &below, &p);
                CHECK((o.verdict == SV_RESOLVED) == (parts[k] < 1.0));
                CHECK(o.verdict != SV_RESOLVED || o.index == index);
                if (!p.bound)
                    CHECK_CLOSE(o.margin, gap, 1e-7);
                else if (parts[k] < 1.0)
                    CHECK(o.margin <= gap && o.margin > 0.999 * p.threshold);
                else
                    CHECK(!(o.margin > 0.0));
            }
        sv_sample_free(test_context(), &s);
        sv_flake_free(test_context(), &flake);
        sv_model_free(test_context(), &model);
    }
}

static double gap_at(const sv_sample *s, double energy, double kappa, double x, double y)
{
    probe p = {.at = {x, y}, .has_at = true, .kappa = kappa, .threshold = 1e-3};
    sv_occupation below = {.by = SV_BY_ENERGY, .fermi_energy = energy};
    return localize(s, &below, &p).margin;
}

/* Weyl: |Δgap| ≤ |ΔE|, ≤ κ·|Δ probe|, ≤ ‖ΔH‖ = max |ΔV| for a potential. */
SV_TEST(the_gap_is_lipschitz)
{
    sv_model model = fixture_haldane(0.2, M_PI / 2, 0.0);
    sv_flake_spec spec = fixture_cells(&model, 9, 9, false);
    sv_flake flake = fixture_flake(&model, &spec);
    sv_stream stream = sv_stream_make(2, "lipschitz", 0);
    double x = flake.centre[0], y = flake.centre[1], kappa = 0.25, moved = 0.0;
    for (int k = 0; k < 8; k++) {
        sv_sample s = random_sample(&flake, 2.0, 0.0, (uint64_t)(k + 1));
        double gap = gap_at(&s, 0.0, kappa, x, y);
        double de = sv_stream_uniform(&stream, k, 0, 0) - 0.5;
        CHECK(fabs(gap_at(&s, de, kappa, x, y) - gap) <= fabs(de) + 2e-7);
        double dx = 4.0 * sv_stream_uniform(&stream, k, 0, 1) - 2.0;
        double dy = 4.0 * sv_stream_uniform(&stream, k, 0, 2) - 2.0;
        double there = gap_at(&s, 0.0, kappa, x + dx, y + dy);
        CHECK(fabs(there - gap) <= kappa * hypot(dx, dy) + 2e-7);
        double most = 0.0;
        for (sv_index r = 0; r < s.n; r++) {
            double v = 0.3 * (sv_stream_uniform(&stream, (int32_t)r, k, 3) - 0.5);
            for (sv_index e = s.hamiltonian.row_start[r]; e < s.hamiltonian.row_start[r + 1]; e++)
                if (s.hamiltonian.column[e] == r)
                    s.hamiltonian.value[e] += v;
            most = fmax(most, fabs(v));
        }
        double shaken = gap_at(&s, 0.0, kappa, x, y);
        CHECK(fabs(shaken - gap) <= most + 2e-7);
        moved = fmax(moved, fmax(fabs(shaken - gap), fabs(there - gap)));
        sv_sample_free(test_context(), &s);
    }
    CHECK(moved > 1e-3); /* the bounds above were put to use */
    sv_flake_free(test_context(), &flake);
    sv_model_free(test_context(), &model);
}

/* The distance to the nearest site that is missing. */
SV_TEST(radius_of_the_flake)
{
    sv_model square = fixture_qi_wu_zhang(-1.0), honeycomb = fixture_haldane(0.2, 1.0, 0.0);
    sv_flake_spec cells = fixture_cells(&square, 12, 8, false);
    sv_flake_spec hexagon = {.shape = SV_SHAPE_HEXAGON, .has_cells = true, .cells = {5}};
    sv_flake flake = fixture_flake(&square, &cells), six = fixture_flake(&honeycomb, &hexagon);
    CHECK_CLOSE(sv_localizer_radius(&flake, flake.centre), hypot(0.5, 4.5), 1e-12);
    CHECK_CLOSE(sv_localizer_radius(&flake, (const double[]){10.0, 3.0}), 2.0, 1e-12);
    CHECK_CLOSE(sv_localizer_radius(&flake, (const double[]){12.0, 3.0}), 0.0, 1e-12);
    double least = INFINITY, r = sv_localizer_radius(&six, six.centre);
    for (int i = -12; i <= 12; i++)
        for (int j = -12; j <= 12; j++)
            for (int o = 0; o < 2; o++) {
                double at[2] = {i + 0.5 * j + honeycomb.orbitals[o].at[0],
                                j * sqrt(3.0) / 2 + honeycomb.orbitals[o].at[1]};
                bool there = false;
                for (sv_index s = 0; s < six.n_sites; s++)
                    there = there ||
                            hypot(six.sites[s].at[0] - at[0], six.sites[s].at[1] - at[1]) < 1e-6;
                if (!there)
                    least = fmin(least, hypot(at[0] - six.centre[0], at[1] - six.centre[1]));
            }
    CHECK_CLOSE(r, least, 1e-12);
    sv_flake_free(test_context(), &flake);
    sv_flake_free(test_context(), &six);
    sv_model_free(test_context(), &square);
    sv_model_free(test_context(), &honeycomb);
}

/* κ = 2g/ρ and τ = g/4 from the sheet alone; prepared values give the same outcome. */
SV_TEST(automatic_scale)
{
    sv_model model = fixture_qi_wu_zhang(-1.0);
    sv_flake_spec spec = fixture_cells(&model, 12, 12, false);
    sv_flake flake = fixture_flake(&model, &spec);
    sv_sample s = random_sample(&flake, 1.0, 0.02, 3);
    sv_value values[4];
    probe p = {0};
    fill_values(&p, values);
    CHECK_OK(sv_localizer_prepare(test_context(), &flake, &fixture_below_zero, values));
    CHECK_CLOSE(values[KAPPA].real[0], 2.0 / hypot(0.5, 6.5), 1e-8);
    CHECK_CLOSE(values[KAPPA].real[1], 1.0, 1e-8);
    CHECK_CLOSE(values[THRESHOLD].real[0], 0.25, 1e-8);
    sv_outcome a = localize(&s, &fixture_below_zero, &p), b = sv_outcome_blank();
    sv_marker_input input = {.sample = &s, .occupation = &fixture_below_zero, .values = values};
    CHECK_OK(sv_localizer_index(test_context(), &input, &b));
    CHECK(a.verdict == SV_RESOLVED && b.verdict == SV_RESOLVED);
    CHECK_INT(a.index, b.index);
    CHECK_CLOSE(a.margin, b.margin, 0.0);
    CHECK_CLOSE(a.kappa, b.kappa, 0.0);
    sv_sample_free(test_context(), &s);
    sv_flake_free(test_context(), &flake);
    sv_model_free(test_context(), &model);
}

SV_TEST(undecidable_cases_say_why)
{
    sv_model metal = fixture_qi_wu_zhang(0.0), gapped = fixture_qi_wu_zhang(-1.0);
    sv_flake_spec spec = fixture_cells(&metal, 10, 10, false);
    probe p = {0}, edge = {.at = {9.6, 5.0}, .has_at = true};
    probe low = {.kappa = 0.3, .threshold = 0.99};
    sv_outcome o = localize_flake(&metal, &spec, NULL, 0, 1, &fixture_below_zero, &p);
    CHECK(o.verdict == SV_UNRESOLVED && isnan(o.kappa));
    CHECK(strstr(o.reason, "give kappa") != NULL);
    o = localize_flake(&gapped, &spec, NULL, 0, 1, &fixture_below_zero, &edge);
    CHECK(o.verdict == SV_UNRESOLVED && strstr(o.reason, "edge") != NULL);
    o = localize_flake(&gapped, &spec, NULL, 0, 1, &fixture_below_zero, &low);
    CHECK(o.verdict == SV_UNRESOLVED && strstr(o.reason, "threshold") != NULL);
    CHECK(o.margin > 0.5 && o.margin < 0.99);
    /* A third of the states: a band is cut, no gap of the clean model. */
    sv_occupation third = {.by = SV_BY_FILLING, .filling = 1.0 / 3.0};
    o = localize_flake(&gapped, &spec, NULL, 0, 1, &third, &p);
    CHECK(o.verdict == SV_UNRESOLVED);
    sv_model_free(test_context(), &metal);
    sv_model_free(test_context(), &gapped);
    CHECK(sv_marker_find("localizer") >= 0);
}

static long allowed;
static sv_allocator inner;

static void *scarce_take(size_t bytes, void *user)
{
    return allowed-- > 0 ? inner.take(bytes, user) : NULL;
}

SV_TEST(every_allocation_may_fail)
{
    sv_model model = fixture_qi_wu_zhang(-1.0);
    sv_flake_spec spec = fixture_cells(&model, 5, 5, false);
    sv_flake flake = fixture_flake(&model, &spec);
    sv_sample s = random_sample(&flake, 1.0, 0.05, 1);
    sv_context *c = test_context();
    sv_value values[4];
    probe p = {0};
    fill_values(&p, values);
    sv_occupation half = {.by = SV_BY_FILLING, .filling = 0.5};
    sv_marker_input input = {.sample = &s, .occupation = &half, .values = values};
    sv_status status = SV_NO_MEMORY;
    long k = 0;
    inner = c->allocator;
    c->allocator.take = scarce_take;
    for (; status != SV_OK && k < 1000; k++) {
        sv_outcome o;
        allowed = k;
        status = sv_localizer_index(c, &input, &o);
        CHECK(status == SV_OK || status == SV_NO_MEMORY);
    }
    c->allocator = inner;
    CHECK(status == SV_OK && k > 30);
    sv_sample_free(c, &s);
    sv_flake_free(c, &flake);
    sv_model_free(c, &model);
}
