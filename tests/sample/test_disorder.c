/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "fixtures.h"

static sv_sample drawn(const sv_flake *flake, const sv_disorder *d, int n, sv_index k)
{
    sv_sample s = {0};
    CHECK_OK(sv_sample_draw(test_context(), flake, d, n, 20, k, &s));
    CHECK_OK(sv_sparse_check(test_context(), &s.hamiltonian));
    return s;
}

static bool contains(const sv_sample *s, sv_index site)
{
    for (sv_index r = 0; r < s->n; r++)
        if (s->pristine[r] == site)
            return true;
    return false;
}

/* u < share: a larger share contains the smaller one; the exact count likewise. */
SV_TEST(vacancies_are_nested)
{
    sv_model model = fixture_haldane(0.2, 1.0, 0.0);
    sv_flake_spec spec = fixture_cells(&model, 12, 12, false);
    sv_flake flake = fixture_flake(&model, &spec);
    sv_disorder d = {.name = "vac", .type = SV_DISORDER_VACANCIES, .on = -1};
    sv_sample before = drawn(&flake, NULL, 0, 0);
    for (int step = 1; step <= 4; step++) {
        d.has_share = true;
        d.share = 0.05 * step;
        sv_sample now = drawn(&flake, &d, 1, 3);
        for (sv_index r = 0; r < now.n; r++)
            CHECK(contains(&before, now.pristine[r]));
        CHECK_INT(now.inventory.vacancies + now.n, flake.n_sites);
        sv_sample_free(test_context(), &before);
        before = now;
    }
    /* The count takes the positions of smallest u: as many as the share took are the same ones. */
    sv_disorder counted = {.name = "vac",
                           .type = SV_DISORDER_VACANCIES,
                           .on = -1,
                           .has_count = true,
                           .count = before.inventory.vacancies};
    sv_sample exact = drawn(&flake, &counted, 1, 3);
    CHECK_INT(exact.n, before.n);
    for (sv_index r = 0; r < exact.n; r++)
        CHECK_INT(exact.pristine[r], before.pristine[r]);
    sv_sample_free(test_context(), &exact);
    sv_sample_free(test_context(), &before);
    sv_flake_free(test_context(), &flake);
    sv_model_free(test_context(), &model);
}

/* A site has the numbers of its cell whatever the size of the flake around it, so that sizes can be
 * compared with little noise. */
SV_TEST(sizes_share_their_fields)
{
    sv_model model = fixture_haldane(0.2, 1.0, 0.0);
    const sv_disorder d[2] = {
        {.name = "vac", .type = SV_DISORDER_VACANCIES, .on = -1, .has_share = true, .share = 0.1},
        {.name = "pot", .type = SV_DISORDER_ONSITE, .on = -1, .width = 2.0}};
    const sv_flake_spec specs[2] = {fixture_cells(&model, 7, 7, false),
                                    fixture_cells(&model, 11, 9, false)};
    sv_flake small = fixture_flake(&model, &specs[0]);
    sv_flake large = fixture_flake(&model, &specs[1]);
    sv_sample a = drawn(&small, d, 2, 5), b = drawn(&large, d, 2, 5);
    sv_index shared = 0;
    for (sv_index r = 0; r < a.n; r++) {
        const sv_site *site = &small.sites[a.pristine[r]];
        const sv_cell *cell = &small.cells[site->cell];
        for (sv_index q = 0; q < b.n; q++) {
            const sv_site *other = &large.sites[b.pristine[q]];
            const sv_cell *place = &large.cells[other->cell];
            if (place->i != cell->i || place->j != cell->j || other->orbital != site->orbital)
                continue;
            CHECK_CLOSE(b.potential[q], a.potential[r], 0.0);
            shared++;
        }
    }
    CHECK_INT(shared, a.n); /* what is vacant in one is vacant in the other */
    CHECK(a.n < small.n_sites);
    sv_sample_free(test_context(), &a);
    sv_sample_free(test_context(), &b);
    sv_flake_free(test_context(), &small);
    sv_flake_free(test_context(), &large);
    sv_model_free(test_context(), &model);
}

/* A vacancy removes every orbital at its position; on one sublattice it leaves the other alone. */
SV_TEST(vacancies_remove_positions)
{
    sv_model square = fixture_qi_wu_zhang(-1.0);
    sv_flake_spec spec = fixture_cells(&square, 10, 10, true);
    sv_flake flake = fixture_flake(&square, &spec);
    sv_disorder d = {
        .name = "vac", .type = SV_DISORDER_VACANCIES, .on = -1, .has_count = true, .count = 17};
    sv_sample s = drawn(&flake, &d, 1, 0);
    CHECK_INT(s.n, 200 - 34);
    CHECK_INT(s.inventory.vacant_sites, 34);
    sv_sample_free(test_context(), &s);
    sv_flake_free(test_context(), &flake);
    sv_model_free(test_context(), &square);
    sv_model model = fixture_haldane(0.2, 1.0, 0.0);
    spec = fixture_cells(&model, 10, 10, false);
    flake = fixture_flake(&model, &spec);
    d.on = sv_model_find_orbital(&model, "B");
    s = drawn(&flake, &d, 1, 0);
    sv_index a = 0;
    for (sv_index r = 0; r < s.n; r++)
        a += flake.sites[s.pristine[r]].orbital == 0;
    CHECK_INT(a, 100);
    CHECK_INT(s.n, 200 - 17);
    sv_sample_free(test_context(), &s);
    d.count = 101;
    CHECK_STATUS(SV_INVALID_INPUT, sv_sample_draw(test_context(), &flake, &d, 1, 1, 0, &s));
    d.on = -1;
    d.count = 200;
    CHECK_STATUS(SV_UNDEFINED, sv_sample_draw(test_context(), &flake, &d, 1, 1, 0, &s));
    sv_flake_free(test_context(), &flake);
    sv_model_free(test_context(), &model);
}

/* Box: variance W²/12; gaussian: σ²; binary: W²/4, two values. Five standard deviations. */
SV_TEST(distributions_have_their_moments)
{
    sv_model model = fixture_qi_wu_zhang(-1.0);
    sv_flake_spec spec = fixture_cells(&model, 100, 100, false);
    sv_flake flake = fixture_flake(&model, &spec);
    const double variance[] = {4.0 / 12.0, 4.0, 1.0}, fourth[] = {1.8, 3.0, 1.0};
    for (int law = 0; law < 3; law++) {
        sv_disorder d = {.name = "pot",
                         .type = SV_DISORDER_ONSITE,
                         .on = -1,
                         .distribution = (sv_distribution)law,
                         .width = 2.0};
        sv_sample s = drawn(&flake, &d, 1, 0);
        double sum = 0.0, squares = 0.0, n = (double)s.n, widest = 0.0;
        for (sv_index r = 0; r < s.n; r++) {
            sum += s.potential[r];
            squares += s.potential[r] * s.potential[r];
            widest = fmax(widest, fabs(s.potential[r]));
        }
        CHECK_CLOSE(sum / n, 0.0, 5.0 * sqrt(variance[law] / n));
        CHECK_CLOSE(squares / n, variance[law],
                    5.0 * variance[law] * sqrt((fourth[law] - 1.0) / n) + 1e-12);
        if (law != SV_GAUSSIAN)
            CHECK(widest <= 1.0);
        sv_sample_free(test_context(), &s);
    }
    sv_flake_free(test_context(), &flake);
    sv_model_free(test_context(), &model);
}

/* Same field whatever the width, the boundary, the size of the flake, or other disorder. */
SV_TEST(fields_are_shared)
{
    sv_model model = fixture_qi_wu_zhang(-1.0);
    sv_flake_spec small_spec = fixture_cells(&model, 6, 6, false);
    sv_flake_spec large_spec = fixture_cells(&model, 9, 9, true);
    sv_flake small = fixture_flake(&model, &small_spec), large = fixture_flake(&model, &large_spec);
    sv_disorder d[2] = {
        {.name = "pot", .type = SV_DISORDER_ONSITE, .on = -1, .width = 1.0, .per_cell = true},
        {.name = "vac", .type = SV_DISORDER_VACANCIES, .on = -1, .has_share = true, .share = 0.2}};
    sv_sample one = drawn(&small, d, 1, 5);
    d[0].width = 3.0;
    sv_sample two = drawn(&large, d, 2, 5);
    int shared = 0;
    for (sv_index r = 0; r < two.n; r++) {
        const sv_site *site = &large.sites[two.pristine[r]];
        const sv_cell *cell = &large.cells[site->cell];
        if (cell->i >= 6 || cell->j >= 6)
            continue;
        sv_index at = 2 * (6 * (sv_index)cell->i + cell->j) + site->orbital;
        CHECK_CLOSE(two.potential[r], 3.0 * one.potential[at], 1e-15);
        CHECK(one.potential[2 * (at / 2)] == one.potential[2 * (at / 2) + 1]);
        shared++;
    }
    CHECK(shared > 40);
    sv_sample_free(test_context(), &one);
    sv_sample_free(test_context(), &two);
    sv_flake_free(test_context(), &small);
    sv_flake_free(test_context(), &large);
    sv_model_free(test_context(), &model);
}

/* Share p over N positions: binomial counts, five standard deviations. */
SV_TEST(shares_are_binomial)
{
    sv_model model = fixture_qi_wu_zhang(-1.0);
    sv_flake_spec spec = fixture_cells(&model, 60, 60, false);
    sv_flake flake = fixture_flake(&model, &spec);
    sv_disorder d = {
        .name = "vac", .type = SV_DISORDER_VACANCIES, .on = -1, .has_share = true, .share = 0.03};
    double sum = 0.0;
    for (int k = 0; k < 20; k++) {
        sv_sample s = drawn(&flake, &d, 1, k);
        sum += (double)s.inventory.vacancies;
        sv_sample_free(test_context(), &s);
    }
    CHECK_CLOSE(sum, 20 * 3600 * 0.03, 5.0 * sqrt(20 * 3600 * 0.03 * 0.97));
    sv_flake_free(test_context(), &flake);
    sv_model_free(test_context(), &model);
}

/* The spectrum of a torus with flux does not depend on which side is the multiple of q, nor on a
 * shift of the gauge origin: checked against the same torus turned by exchanging the vectors. */
SV_TEST(flux_on_tori_is_gauge_invariant)
{
    sv_context *c = test_context();
    sv_model model = fixture_hofstadter(1, 3), turned = {0};
    /* Turned by 90°: x' = y, y' = −x keeps the orientation, so the spectrum is the same. */
    CHECK_OK(
        sv_model_begin(c, "turned", (const double[2]){1, 0}, (const double[2]){0, 1}, &turned));
    CHECK_OK(sv_model_add_orbital(c, &turned, "a", 0.37, -0.21, 0));
    CHECK_OK(sv_model_add_hop(c, &turned, 0, 0, 1, 0, -1.0));
    CHECK_OK(sv_model_add_hop(c, &turned, 0, 0, 0, 1, -1.0));
    CHECK_OK(sv_model_set_flux(c, &turned, 1, 3));
    CHECK_OK(sv_model_finish(c, &turned));
    sv_flake_spec first = fixture_cells(&model, 6, 5, true),
                  second = fixture_cells(&model, 5, 6, true);
    sv_flake a = fixture_flake(&model, &first), b = fixture_flake(&model, &second);
    sv_sample sa = drawn(&a, NULL, 0, 0), sb = drawn(&b, NULL, 0, 0);
    double *ea = fixture_spectrum(&sa), *eb = fixture_spectrum(&sb);
    for (sv_index k = 0; k < sa.n; k++)
        CHECK_CLOSE(ea[k], eb[k], 1e-12);
    sv_give(c, ea);
    sv_give(c, eb);
    sv_sample_free(c, &sa);
    sv_sample_free(c, &sb);
    sv_flake_free(c, &a);
    sv_flake_free(c, &b);
    /* An orbital off the lattice points only shifts the gauge. On an open flake the spectrum must
     * not notice; on a torus a shift moves the boundary twists, so a torus whose clean bands are
     * resolved is compared through its flux per plaquette instead (Bott index). */
    sv_flake_spec open = fixture_cells(&model, 6, 6, false);
    a = fixture_flake(&model, &open);
    b = fixture_flake(&turned, &open);
    sa = drawn(&a, NULL, 0, 0);
    sb = drawn(&b, NULL, 0, 0);
    ea = fixture_spectrum(&sa);
    eb = fixture_spectrum(&sb);
    for (sv_index k = 0; k < sa.n; k++)
        CHECK_CLOSE(ea[k], eb[k], 1e-12);
    sv_give(c, ea);
    sv_give(c, eb);
    sv_sample_free(c, &sa);
    sv_sample_free(c, &sb);
    sv_flake_free(c, &a);
    sv_flake_free(c, &b);
    sv_flake_spec torus = fixture_cells(&turned, 12, 12, true);
    sv_occupation third = {.by = SV_BY_FILLING, .filling = 1.0 / 3.0};
    sv_outcome o = fixture_marker("bott", &turned, &torus, NULL, 0, 1, &third, 0);
    CHECK_INT(o.index, 1);
    sv_model_free(c, &model);
    sv_model_free(c, &turned);
}

static sv_status read(const sv_model *model, const char *text, bool energy, double nm,
                      sv_mark **marks, sv_index *n, sv_table_fault *fault)
{
    const double origin[2] = {0, 0};
    return sv_read_marks(test_context(), model, text, strlen(text), energy, nm, 1.0, origin, marks,
                         n, fault);
}

SV_TEST(measured_tables_are_read_with_units)
{
    sv_model model = fixture_haldane(0.2, 1.0, 0.0);
    sv_table_fault fault;
    sv_mark *m = NULL;
    sv_index n = 0;
    CHECK_OK(read(&model, "# invented\nx [nm],y [nm],species\n0.43,0.86,V\n\n 8.6 Å , 0.43,V\n",
                  false, 0.43, &m, &n, &fault));
    CHECK_INT(n, 2);
    CHECK_CLOSE(m[0].at[0], 1.0, 1e-15);
    CHECK_CLOSE(m[1].at[0], 2.0, 1e-15);
    CHECK_INT(m[1].line, 5);
    sv_give(test_context(), m);
    m = NULL;
    CHECK_OK(read(&model, "cell_i,cell_j,orbital,energy/meV\n3,-2,B,250\n0,0,any,-1\n", true, 0.0,
                  &m, &n, &fault));
    CHECK(m[0].by_cell && m[0].cell[1] == -2 && m[0].orbital == 1 && m[1].orbital == -1);
    CHECK_CLOSE(m[0].energy, 0.25, 1e-15);
    sv_give(test_context(), m);
    sv_model_free(test_context(), &model);
}

SV_TEST(faulty_tables_name_line_and_column)
{
    const struct {
        const char *text, *message;
        int line, column;
        bool energy;
    } rows[] = {
        {"", "no rows", 0, 1, false},
        {"a,b\n1,2\n", "must name the columns", 1, 1, false},
        {"x [nm],y [nm]\n1,2,3\n", "3 columns", 2, 1, false},
        {"x [nm],y [nm]\n1,nan\n", "not a length", 2, 3, false},
        {"x [nm],y [nm]\n1,\n", "missing", 2, 3, false},
        {"x [nm],y [eV]\n1,2\n", "not a unit of a length", 1, 8, false},
        {"x [parsec],y\n1,2\n", "not a unit", 1, 1, false},
        {"x,y\n1,2\n", "energy", 1, 1, true},
        {"x,y,x\n1,2,3\n", "twice", 1, 5, false},
        {"cell_i,cell_j,orbital,energy\n1,2,C,0\n", "no orbital", 2, 5, true},
        {"cell_i,cell_j,energy\n1.5,2,0\n", "not a cell number", 2, 1, true},
        {"x,y,energy\n1,2,1e999\n", "not an energy", 2, 5, true},
    };
    sv_model model = fixture_haldane(0.2, 1.0, 0.0);
    for (size_t k = 0; k < sizeof rows / sizeof rows[0]; k++) {
        sv_table_fault fault = {0};
        sv_mark *m = NULL;
        sv_index n;
        CHECK_STATUS(SV_INVALID_INPUT,
                     read(&model, rows[k].text, rows[k].energy, 0.4, &m, &n, &fault));
        CHECK(strstr(fault.message, rows[k].message) != NULL);
        CHECK_INT(fault.line, rows[k].line);
        CHECK_INT(fault.column, rows[k].column);
    }
    sv_table_fault fault;
    sv_mark *m = NULL;
    sv_index n;
    CHECK_STATUS(SV_INVALID_INPUT, read(&model, "x [nm],y\n1,2\n", false, 0.0, &m, &n, &fault));
    CHECK(strstr(fault.message, "lattice_constant") != NULL);
    sv_model_free(test_context(), &model);
}

SV_TEST(measured_defects_match_sites_or_are_refused)
{
    sv_model model = fixture_qi_wu_zhang(-1.0);
    sv_flake_spec spec = fixture_cells(&model, 5, 5, false);
    sv_flake flake = fixture_flake(&model, &spec);
    sv_mark marks[3] = {{.at = {1.2, 2.9}, .orbital = -1, .line = 2},
                        {.at = {0.9, 3.1}, .orbital = -1, .line = 3},
                        {.at = {4.4, 0.1}, .orbital = -1, .line = 4}};
    sv_disorder d = {.name = "vac",
                     .type = SV_DISORDER_VACANCIES,
                     .on = -1,
                     .has_marks = true,
                     .marks = marks,
                     .n_marks = 3,
                     .tolerance = 0.75};
    sv_table_fault fault = {0};
    CHECK_OK(sv_marks_check(test_context(), &flake, &d, &fault));
    sv_sample s = drawn(&flake, &d, 1, 0);
    CHECK_INT(s.inventory.vacancies, 2);
    CHECK_INT(s.inventory.marks_merged, 1);
    CHECK(!contains(&s, 2 * (5 * 1 + 3)) && !contains(&s, 2 * (5 * 4 + 0)));
    sv_sample_free(test_context(), &s);
    marks[2].at[0] = 7.0;
    CHECK_STATUS(SV_INVALID_INPUT, sv_marks_check(test_context(), &flake, &d, &fault));
    CHECK_INT(fault.line, 4);
    CHECK(strstr(fault.message, "outside the film") != NULL);
    d.n_marks = 0;
    d.marks = NULL;
    sv_disorder_free(test_context(), &d);
    sv_flake_free(test_context(), &flake);
    sv_model_free(test_context(), &model);
}

/* Rows on one site are averaged; `on` picks among its own sites; a row by cell empties the cell. */
SV_TEST(measured_rows_mean_what_they_say)
{
    sv_model model = fixture_haldane(0.2, 1.0, 0.0);
    sv_flake_spec spec = fixture_cells(&model, 4, 4, false);
    sv_flake flake = fixture_flake(&model, &spec);
    sv_mark rows[3] = {{.at = {0.0, 0.0}, .orbital = -1, .energy = 1.0},
                       {.at = {0.1, 0.0}, .orbital = -1, .energy = 2.0},
                       {.at = {1.2, 0.1}, .orbital = -1, .energy = 5.0}};
    sv_disorder d = {.name = "map",
                     .type = SV_DISORDER_ONSITE,
                     .on = -1,
                     .has_marks = true,
                     .marks = rows,
                     .n_marks = 3,
                     .tolerance = 0.75};
    sv_sample s = drawn(&flake, &d, 1, 0);
    CHECK_CLOSE(s.potential[0], 1.5, 1e-15); /* mean of two rows on A of cell (0, 0) */
    CHECK_CLOSE(s.potential[1], 0.0, 0.0);
    CHECK_CLOSE(s.potential[2 * 4], 5.0, 1e-15); /* A of cell (1, 0) */
    CHECK_INT(s.inventory.marks_merged, 1);
    sv_sample_free(test_context(), &s);
    d.on = 1; /* the nearest B instead */
    s = drawn(&flake, &d, 1, 0);
    CHECK_CLOSE(s.potential[0], 0.0, 0.0);
    CHECK_CLOSE(s.potential[1], 1.5, 1e-15);
    sv_sample_free(test_context(), &s);
    sv_mark cells[2] = {{.by_cell = true, .cell = {2, 1}, .orbital = -1, .line = 2},
                        {.by_cell = true, .cell = {0, 3}, .orbital = 1, .line = 3}};
    sv_disorder v = {.name = "vac",
                     .type = SV_DISORDER_VACANCIES,
                     .on = -1,
                     .has_marks = true,
                     .marks = cells,
                     .n_marks = 2,
                     .tolerance = 0.75};
    s = drawn(&flake, &v, 1, 0);
    CHECK_INT(s.inventory.vacancies, 3);
    CHECK(!contains(&s, 2 * (4 * 2 + 1)) && !contains(&s, 2 * (4 * 2 + 1) + 1));
    CHECK(contains(&s, 2 * 3) && !contains(&s, 2 * 3 + 1));
    sv_sample_free(test_context(), &s);
    v.on = 0; /* contradicts the orbital of the second row */
    sv_table_fault fault = {0};
    CHECK_STATUS(SV_INVALID_INPUT, sv_marks_check(test_context(), &flake, &v, &fault));
    CHECK_INT(fault.line, 3);
    sv_flake_free(test_context(), &flake);
    sv_model_free(test_context(), &model);
}

/* Exports read back: the header of Matrix Market (math.nist.gov/MatrixMarket/formats.html). */
SV_TEST(exports_are_complete)
{
    sv_model model = fixture_qi_wu_zhang(-1.0);
    sv_flake_spec spec = fixture_cells(&model, 3, 3, true);
    sv_flake flake = fixture_flake(&model, &spec);
    sv_sample s = drawn(&flake, NULL, 0, 0);
    char path[1024], line[200];
    snprintf(path, sizeof path, "%s", test_scratch("h.mtx"));
    CHECK_OK(sv_sample_write_matrix(test_context(), &s, path));
    FILE *f = fopen(path, "r");
    CHECK(fgets(line, sizeof line, f) &&
          strcmp(line, "%%MatrixMarket matrix coordinate complex hermitian\n") == 0);
    int lines = 0;
    long long n = 0, m = 0, stored = 0;
    while (fgets(line, sizeof line, f))
        if (line[0] != '%' && lines++ == 0)
            CHECK(sscanf(line, "%lld %lld %lld", &n, &m, &stored) == 3);
    fclose(f);
    CHECK(n == 18 && m == 18 && stored == lines - 1);
    CHECK_INT(2 * (stored - 18) + 18, s.hamiltonian.row_start[18]);
    snprintf(path, sizeof path, "%s", test_scratch("sites.csv"));
    CHECK_OK(sv_sample_write_sites(test_context(), &s, path, "extra", s.potential));
    f = fopen(path, "r");
    CHECK(fgets(line, sizeof line, f) &&
          strcmp(line, "site,cell_i,cell_j,orbital,x,y,extra\n") == 0);
    for (lines = 0; fgets(line, sizeof line, f); lines++)
        CHECK(lines != 3 || strcmp(line, "3,0,1,b,0,1,0\n") == 0);
    CHECK_INT(lines, 18);
    fclose(f);
    CHECK_STATUS(SV_STORAGE, sv_sample_write_matrix(test_context(), &s, "/nowhere/h.mtx"));
    sv_sample_free(test_context(), &s);
    sv_flake_free(test_context(), &flake);
    sv_model_free(test_context(), &model);
}
