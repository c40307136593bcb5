/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Disorder of hops: strengths and phases, flux, cuts, adatoms. */
#include "fixtures.h"

static sv_sample drawn(const sv_flake *flake, const sv_disorder *d, int n, sv_index k)
{
    sv_sample s = {0};
    CHECK_OK(sv_sample_draw(test_context(), flake, d, n, 5, k, &s));
    CHECK_OK(sv_sparse_check(test_context(), &s.hamiltonian)); /* Hermitian, sorted */
    return s;
}

static sv_complex element(const sv_sample *s, sv_index row, sv_index column)
{
    const sv_sparse *h = &s->hamiltonian;
    for (sv_index k = h->row_start[row]; k < h->row_start[row + 1]; k++)
        if (h->column[k] == column)
            return h->value[k];
    return 0.0;
}

/* Ratios of disordered to clean hops: moments of the laws (box: 1 ± w/√12, phase variance p²/12),
 * one number per bond of a two-orbital model, and the same ones on a torus and in a larger flake.
 */
SV_TEST(bonds_have_the_moments_of_their_law)
{
    sv_model model = fixture_qi_wu_zhang(-1.0);
    sv_flake_spec open = fixture_cells(&model, 40, 40, false);
    sv_flake_spec torus = fixture_cells(&model, 44, 42, true);
    sv_flake flake = fixture_flake(&model, &open), closed = fixture_flake(&model, &torus);
    for (int law = SV_BOX; law <= SV_GAUSSIAN; law++) {
        sv_disorder d = {.name = "hop",
                         .type = SV_DISORDER_HOPPING,
                         .on = -1,
                         .distribution = (sv_distribution)law,
                         .width = 0.3,
                         .phase = 0.5};
        sv_sample clean = drawn(&flake, NULL, 0, 0), s = drawn(&flake, &d, 1, 0);
        sv_sample t = drawn(&closed, &d, 1, 0);
        double n = 0, one = 0, two = 0, angle = 0, square = 0, scale = law == SV_BOX ? 12.0 : 1.0;
        for (int i = 0; i < 39; i++)
            for (int j = 0; j < 40; j++) {
                sv_index a = 2 * (40 * i + j), b = a + 80;
                sv_complex z = element(&s, b, a) / element(&clean, b, a);
                sv_complex other = element(&s, b + 1, a) / element(&clean, b + 1, a);
                sv_index ta = 2 * (42 * i + j);
                CHECK(cabs(z - other) < 1e-14);
                CHECK(cabs(element(&t, ta + 84, ta) - element(&s, b, a)) < 1e-15);
                n++;
                one += cabs(z) - 1.0;
                two += (cabs(z) - 1.0) * (cabs(z) - 1.0);
                angle += carg(z);
                square += carg(z) * carg(z);
            }
        double strength = 0.09 / scale, phase = 0.25 / scale;
        CHECK_CLOSE(one / n, 0.0, 5.0 * sqrt(strength / n));
        CHECK_CLOSE(two / n, strength, 5.0 * strength * sqrt(2.0 / n));
        CHECK_CLOSE(angle / n, 0.0, 5.0 * sqrt(phase / n));
        CHECK_CLOSE(square / n, phase, 5.0 * phase * sqrt(2.0 / n));
        sv_sample_free(test_context(), &clean);
        sv_sample_free(test_context(), &s);
        sv_sample_free(test_context(), &t);
    }
    sv_flake_free(test_context(), &flake);
    sv_flake_free(test_context(), &closed);
    sv_model_free(test_context(), &model);
}

SV_TEST(nearest_bonds_leave_the_others_alone)
{
    sv_model model = fixture_haldane(0.2, 1.0, 0.0);
    sv_flake_spec spec = fixture_cells(&model, 8, 8, true);
    sv_flake flake = fixture_flake(&model, &spec);
    sv_disorder d = {
        .name = "hop", .type = SV_DISORDER_HOPPING, .on = -1, .width = 0.4, .nearest = true};
    sv_sample clean = drawn(&flake, NULL, 0, 0), s = drawn(&flake, &d, 1, 0);
    int changed = 0, kept = 0;
    for (sv_index r = 0; r < s.n; r++)
        for (sv_index k = s.hamiltonian.row_start[r]; k < s.hamiltonian.row_start[r + 1]; k++) {
            double difference = cabs(s.hamiltonian.value[k] - clean.hamiltonian.value[k]);
            bool same_orbital = (r + s.hamiltonian.column[k]) % 2 == 0;
            changed += difference > 1e-9;
            kept += same_orbital && r != s.hamiltonian.column[k];
            CHECK(same_orbital ? difference == 0.0 : difference <= 0.2);
        }
    CHECK_INT(changed, 2 * 64 * 3);
    CHECK_INT(kept, 2 * 64 * 6);
    sv_sample_free(test_context(), &clean);
    sv_sample_free(test_context(), &s);
    sv_flake_free(test_context(), &flake);
    sv_model_free(test_context(), &model);
}

/* Phase around the cell (i, j) of a square lattice of single orbitals, counter-clockwise: what an
 * electron picks up is −flux, as for uniform flux (conventions.h). */
static double flux_through(const sv_sample *s, int width, int i, int j)
{
    sv_index a = width * i + j, b = a + width, c = b + 1, e = a + 1;
    return -carg(element(s, b, a) * element(s, c, b) * element(s, e, c) * element(s, a, e));
}

/* Independent: the flux of each cell is the number of its stream. Balanced: standard deviation
 * width, neighbours −1/4, diagonal neighbours 0, and the whole torus 0. */
SV_TEST(fluxes_go_through_their_cells)
{
    enum { N = 60 };
    sv_model model = fixture_hofstadter(0, 1);
    sv_flake_spec open = fixture_cells(&model, N, N, false),
                  torus = fixture_cells(&model, N, N, true);
    sv_flake flake = fixture_flake(&model, &open), closed = fixture_flake(&model, &torus);
    sv_disorder d = {
        .name = "flux", .type = SV_DISORDER_FLUX, .on = -1, .width = 0.8, .independent = true};
    sv_stream stream = sv_stream_make(5, "flux", 1);
    sv_sample s = drawn(&flake, &d, 1, 1);
    for (int i = 0; i < N - 1; i++)
        for (int j = 0; j < N - 1; j++)
            CHECK_CLOSE(flux_through(&s, N, i, j),
                        0.8 * (sv_stream_uniform(&stream, i, j, 0) - 0.5), 1e-11);
    sv_sample_free(test_context(), &s);
    CHECK_STATUS(SV_INVALID_INPUT, sv_sample_draw(test_context(), &closed, &d, 1, 5, 1, &s));
    d = (sv_disorder){.name = "flux",
                      .type = SV_DISORDER_FLUX,
                      .on = -1,
                      .width = 0.3,
                      .distribution = SV_GAUSSIAN};
    s = drawn(&flake, &d, 1, 1);
    sv_sample t = drawn(&closed, &d, 1, 1);
    double flux[N][N], total = 0.0, square = 0.0, next = 0.0, diagonal = 0.0;
    for (int i = 0; i < N; i++)
        for (int j = 0; j < N; j++) {
            sv_index a = N * i + j, b = N * ((i + 1) % N) + j, c = N * ((i + 1) % N) + (j + 1) % N,
                     e = N * i + (j + 1) % N;
            flux[i][j] = -carg(element(&t, b, a) * element(&t, c, b) * element(&t, e, c) *
                               element(&t, a, e));
            total += flux[i][j];
            if (i < N - 1 && j < N - 1)
                CHECK_CLOSE(flux_through(&s, N, i, j), flux[i][j], 1e-12);
        }
    for (int i = 0; i < N; i++)
        for (int j = 0; j < N; j++) {
            square += flux[i][j] * flux[i][j] / (N * N);
            next += flux[i][j] * flux[(i + 1) % N][j] / (N * N);
            diagonal += flux[i][j] * flux[(i + 1) % N][(j + 1) % N] / (N * N);
        }
    CHECK_CLOSE(total, 0.0, 1e-10);
    CHECK_CLOSE(square, 0.09, 5.0 * 0.09 * sqrt(2.5) / N);
    CHECK_CLOSE(next, -0.0225, 5.0 * 0.09 / N);
    CHECK_CLOSE(diagonal, 0.0, 5.0 * 0.09 / N);
    sv_sample_free(test_context(), &s);
    sv_sample_free(test_context(), &t);
    sv_flake_free(test_context(), &flake);
    sv_flake_free(test_context(), &closed);
    sv_model_free(test_context(), &model);
}

/* Flux is gauge invariant where hops are oblique: on a honeycomb the three second-neighbour hops
 * around half a cell enclose half its flux. */
SV_TEST(oblique_hops_see_their_share_of_the_flux)
{
    sv_model model = fixture_haldane(0.2, 0.0, 0.0);
    sv_flake_spec spec = fixture_cells(&model, 9, 9, true);
    sv_flake flake = fixture_flake(&model, &spec);
    sv_disorder d = {.name = "flux",
                     .type = SV_DISORDER_FLUX,
                     .on = -1,
                     .width = 0.3,
                     .distribution = SV_GAUSSIAN};
    sv_sample s = drawn(&flake, &d, 1, 1);
    for (int i = 0; i < 8; i++)
        for (int j = 0; j < 8; j++) {
            sv_index a = 2 * (9 * i + j), b = a + 18, c = a + 2, e = b + 2;
            double lower = -carg(element(&s, b, a) * element(&s, c, b) * element(&s, a, c));
            double upper = -carg(element(&s, e, b) * element(&s, c, e) * element(&s, b, c));
            CHECK_CLOSE(lower, upper, 1e-13);
            CHECK(fabs(lower) > 1e-9);
        }
    sv_sample_free(test_context(), &s);
    sv_flake_free(test_context(), &flake);
    sv_model_free(test_context(), &model);
}

/* A slit across the whole flake parts it; the hops left are those that do not cross it. */
SV_TEST(slits_cut_what_crosses_them)
{
    sv_model model = fixture_qi_wu_zhang(-1.0);
    sv_flake_spec spec = fixture_cells(&model, 10, 8, false);
    sv_flake flake = fixture_flake(&model, &spec);
    sv_disorder d = {.name = "slit",
                     .type = SV_DISORDER_CRACKS,
                     .on = -1,
                     .has_line = true,
                     .from = {4.5, -1.0},
                     .to = {4.5, 3.2}};
    sv_sample clean = drawn(&flake, NULL, 0, 0), s = drawn(&flake, &d, 1, 0);
    for (sv_index r = 0; r < clean.n; r++)
        for (sv_index k = clean.hamiltonian.row_start[r]; k < clean.hamiltonian.row_start[r + 1];
             k++) {
            sv_index c = clean.hamiltonian.column[k];
            const double *a = flake.sites[r].at, *b = flake.sites[c].at;
            bool crosses = (a[0] < 4.5) != (b[0] < 4.5) && a[1] < 3.2;
            sv_complex wanted = crosses ? 0.0 : clean.hamiltonian.value[k];
            CHECK(element(&s, r, c) == wanted);
        }
    CHECK_INT(fixture_largest_piece(&s), 160);
    sv_sample_free(test_context(), &s);
    d.to[1] = 9.0;
    s = drawn(&flake, &d, 1, 0);
    CHECK_INT(fixture_largest_piece(&s), 80);
    sv_sample_free(test_context(), &s);
    sv_sample_free(test_context(), &clean);
    sv_flake_free(test_context(), &flake);
    sv_model_free(test_context(), &model);
}

/* Isotropic needles of density n and mean length L cut a bond of length b with the probability
 * 1 − exp(−2 n L b/π) (Buffon's needle in a Poisson field). */
SV_TEST(random_cracks_cut_as_many_bonds_as_needles)
{
    sv_model model = fixture_hofstadter(0, 1);
    sv_flake_spec spec = fixture_cells(&model, 60, 60, false);
    sv_flake flake = fixture_flake(&model, &spec);
    for (int law = 0; law < 2; law++) {
        sv_disorder d = {.name = "crack",
                         .type = SV_DISORDER_CRACKS,
                         .on = -1,
                         .density = 0.02,
                         .length = 5.0,
                         .exponential = law == 1};
        double sum = 0.0, squares = 0.0, wanted = 1.0 - exp(-2.0 * 0.02 * 5.0 / M_PI);
        const double bonds = 2.0 * 59 * 60;
        for (int k = 0; k < 40; k++) {
            sv_sample s = drawn(&flake, &d, 1, k);
            double cut = 1.0 - (double)(s.hamiltonian.row_start[s.n] - s.n) / 2.0 / bonds;
            sum += cut;
            squares += cut * cut;
            sv_sample_free(test_context(), &s);
        }
        double spread = sqrt((squares / 40 - sum * sum / 1600) / 39);
        CHECK_CLOSE(sum / 40, wanted, 5.0 * spread);
    }
    sv_flake_free(test_context(), &flake);
    sv_model_free(test_context(), &model);
}

/* An adatom of energy ε and coupling V adds V²/(E − ε) to its host: with H ψ = E ψ, the rows of the
 * host and of the adatom say so. Rows follow their host; the count is binomial. */
SV_TEST(adatoms_are_rows_of_their_own)
{
    sv_model model = fixture_haldane(0.2, 1.0, 0.0);
    sv_flake_spec spec = fixture_cells(&model, 20, 20, false);
    sv_flake flake = fixture_flake(&model, &spec);
    sv_disorder d[3] = {
        {.name = "ad",
         .type = SV_DISORDER_ADATOMS,
         .on = -1,
         .has_share = true,
         .share = 0.1,
         .energy = 0.4,
         .coupling = 1.5},
        {.name = "ad2",
         .type = SV_DISORDER_ADATOMS,
         .on = 1,
         .has_count = true,
         .count = 31,
         .energy = -0.3,
         .coupling = 0.7},
        {.name = "vac", .type = SV_DISORDER_VACANCIES, .on = -1, .has_share = true, .share = 0.05}};
    sv_sample s = drawn(&flake, d, 2, 0);
    CHECK_CLOSE((double)s.inventory.placed[0], 80.0, 5.0 * sqrt(72.0));
    CHECK_INT(s.inventory.placed[1], 31);
    CHECK_INT(s.n, 800 + s.inventory.adatoms);
    CHECK_INT(s.inventory.adatoms, s.inventory.placed[0] + 31);
    sv_index host = -1;
    for (sv_index r = 0; r < s.n; r++) {
        if (s.adatom[r] < 0) {
            host = r;
            CHECK(strcmp(sv_sample_orbital_name(&s, r),
                         model.orbitals[flake.sites[s.pristine[r]].orbital].name) == 0);
            continue;
        }
        const sv_disorder *own = &d[s.adatom[r]];
        CHECK_INT(s.pristine[r], s.pristine[host]);
        CHECK(element(&s, r, r) == own->energy && element(&s, host, r) == own->coupling);
        CHECK_INT(s.hamiltonian.row_start[r + 1] - s.hamiltonian.row_start[r], 2);
        CHECK(strcmp(sv_sample_orbital_name(&s, r), "adatom") == 0);
        CHECK(s.adatom[r] == 0 || flake.sites[s.pristine[r]].orbital == 1);
    }
    sv_sample_free(test_context(), &s);
    /* A vacancy takes the adatom on it along. */
    s = drawn(&flake, d, 3, 0);
    CHECK(s.inventory.adatoms < s.inventory.placed[0] + 31);
    CHECK_INT(s.n, 800 - s.inventory.vacancies + s.inventory.adatoms);
    sv_sample_free(test_context(), &s);
    sv_flake_free(test_context(), &flake);
    sv_model_free(test_context(), &model);
}

/* Site by site, the map with adatoms by polynomials on parts of a flake is the dense one. */
SV_TEST(adatoms_count_in_markers)
{
    sv_model model = fixture_qi_wu_zhang(-1.0);
    sv_flake_spec spec = fixture_cells(&model, 12, 12, false);
    sv_disorder d = {.name = "ad",
                     .type = SV_DISORDER_ADATOMS,
                     .on = -1,
                     .has_share = true,
                     .share = 0.05,
                     .energy = 2.5,
                     .coupling = 0.2};
    sv_occupation half = {.by = SV_BY_ENERGY, .fermi_energy = 0.0};
    sv_outcome o = fixture_marker("local_chern", &model, &spec, &d, 1, 3, &half, 0.4);
    CHECK_CLOSE(o.value, 1.0, 0.02);
    spec = fixture_cells(&model, 12, 12, true);
    o = fixture_marker("bott", &model, &spec, &d, 1, 3, &half, 0.4);
    CHECK_INT(o.index, 1);
    sv_model_free(test_context(), &model);
}
