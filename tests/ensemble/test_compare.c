/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "selvedge/ensemble.h"
#include "testing.h"

static const double first[] = {0.2, 1.9, 2.2, 3.1, 0.4, 5.7, 1.1, 9.3, 0.8, 2.5};
static const double second[] = {0.9, 2.1, 2.0, 4.6, 0.1, 6.9, 2.3, 9.9, 1.6, 4.1};

/* SciPy 1.10: stats.ttest_rel, stats.ttest_ind(equal_var=False), stats.t.interval; GSL's quantile
 * of Student's t is good to 1e-10. */
static void check_comparison(const sv_comparison *c)
{
    CHECK_INT(c->pairs, 10);
    CHECK_CLOSE(c->difference, 0.73, 1e-14);
    CHECK_CLOSE(c->standard_error, 0.21137118483316916, 1e-15);
    CHECK_CLOSE(c->interval[0], 0.2518451602325961, 1e-10);
    CHECK_CLOSE(c->interval[1], 1.2081548397674033, 1e-10);
    CHECK_CLOSE(c->p_value, 0.007233032768419271, 1e-13);
    CHECK_CLOSE(c->correlation, 0.9759283388896538, 1e-13);
    CHECK_CLOSE(c->unpaired_error, 1.3038447419501722, 1e-13);
    CHECK_CLOSE(c->unpaired_p_value, 0.5824916648162077, 1e-12);
}

SV_TEST(paired_means)
{
    sv_comparison c = {0};
    CHECK_OK(sv_compare_pairs(test_context(), first, second, 10, &c));
    check_comparison(&c);
    CHECK_OK(sv_compare_pairs(test_context(), first, first, 10, &c));
    CHECK(c.difference == 0.0 && c.p_value == 1.0);
    CHECK_CLOSE(c.correlation, 1.0, 1e-14);
    CHECK_OK(sv_compare_pairs(test_context(), first, second, 1, &c));
    CHECK_CLOSE(c.difference, 0.7, 1e-15);
    CHECK(isnan(c.p_value) && isnan(c.interval[0]) && isnan(c.unpaired_error));
    CHECK_OK(sv_compare_pairs(test_context(), first, second, 0, &c));
    CHECK(isnan(c.difference) && c.pairs == 0);
}

/* Ten that lose the index, three that gain it: binomtest(3, 13).pvalue = 0.09228515625. */
SV_TEST(paired_indices)
{
    double a[40], b[40];
    sv_comparison c = {0};
    for (int k = 0; k < 40; k++) {
        a[k] = k < 30 ? 1.0 : 0.0;
        b[k] = k < 10 ? -1.0 : k < 33 ? 1.0 : 0.0;
    }
    sv_compare_indices(a, b, 40, 1, &c);
    CHECK_INT(c.lost, 10);
    CHECK_INT(c.gained, 3);
    CHECK_CLOSE(c.p_value, 0.09228515625, 1e-15);
    sv_compare_indices(a, a, 40, 1, &c);
    CHECK(c.lost == 0 && c.gained == 0 && c.p_value == 1.0);
}

/* Pairs are realisations resolved at both points; what comes after the shorter one is left out. */
SV_TEST(points_of_an_ensemble)
{
    enum { N = 12 };
    static sv_record records[2 * N];
    sv_ensemble ensemble = {0};
    sv_case point = {.n_markers = 1};
    sv_comparison c;
    const int64_t counted[] = {N, N - 1};
    point.markers[0].marker = sv_marker_find("local_chern");
    CHECK_OK(sv_ensemble_init(test_context(), 2, N, 1, &ensemble));
    for (int k = 0; k < N; k++)
        for (int p = 0; p < 2; p++) {
            sv_record *r = &records[p * N + k];
            r->point = p;
            r->realisation = k;
            r->n_outcomes = 1;
            r->outcomes[0] = sv_outcome_blank();
            r->outcomes[0].verdict = k == 3 && p == 1 ? SV_UNRESOLVED : SV_RESOLVED;
            int row = k < 3 ? k : k - 1;
            r->outcomes[0].value = k == N - 1 || k == 3 ? 1e6 : p == 0 ? first[row] : second[row];
            CHECK_OK(sv_ensemble_put(test_context(), &ensemble, r));
        }
    CHECK_OK(sv_compare_points(test_context(), &ensemble, &point, 0, counted, 0, 1, &c));
    check_comparison(&c);
    CHECK(c.other == 0 && c.point == 1 && !c.is_index);
    CHECK_TEXT(c.marker, "local_chern");
    point.markers[0].marker = sv_marker_find("bott");
    for (int k = 0; k < N; k++)
        for (int p = 0; p < 2; p++) {
            sv_record *r = &records[p * N + k];
            r->outcomes[0].value = k < (p == 0 ? 9 : 4) ? -1.0 : 2.0;
            CHECK_OK(sv_ensemble_put(test_context(), &ensemble, r));
        }
    CHECK_OK(sv_compare_points(test_context(), &ensemble, &point, 0, counted, 0, 1, &c));
    CHECK(c.is_index && c.index == -1 && c.lost == 5 && c.gained == 0);
    CHECK_CLOSE(c.p_value, 0.0625, 1e-15);
    CHECK_CLOSE(c.difference, 1.5, 1e-14);
    /* of two indices as frequent, the one that comes first */
    for (int k = 0; k < N; k++) {
        records[k].outcomes[0].value = k % 2 == 0 ? 3.0 : -2.0;
        records[k].outcomes[0].verdict = k == 10 ? SV_UNRESOLVED : SV_RESOLVED;
        CHECK_OK(sv_ensemble_put(test_context(), &ensemble, &records[k]));
    }
    CHECK_OK(sv_compare_points(test_context(), &ensemble, &point, 0, counted, 0, 1, &c));
    CHECK_INT(c.pairs, 9); /* without 3 and 10 of either point and 11 */
    CHECK_INT(c.index, 3);
    records[0].outcomes[0].verdict = SV_UNRESOLVED;
    CHECK_OK(sv_ensemble_put(test_context(), &ensemble, &records[0]));
    CHECK_OK(sv_compare_points(test_context(), &ensemble, &point, 0, counted, 0, 1, &c));
    CHECK_INT(c.index, -2); /* four each */
    sv_ensemble_free(test_context(), &ensemble);
}

/* Holm: 0.01·4, 0.02·3, 0.03·2, 0.04·1 made monotone; the unknown one does not count. */
SV_TEST(adjusted_p_values)
{
    const double p[] = {0.03, 0.01, NAN, 0.04, 0.02};
    const double expected[] = {0.06, 0.04, NAN, 0.06, 0.06};
    double adjusted[5];
    CHECK_OK(sv_adjust_p_values(test_context(), p, 5, adjusted));
    for (int k = 0; k < 5; k++)
        CHECK(k == 2 ? isnan(adjusted[k]) : fabs(adjusted[k] - expected[k]) < 1e-15);
    const double large[] = {0.6, 0.9};
    CHECK_OK(sv_adjust_p_values(test_context(), large, 2, adjusted));
    CHECK(adjusted[0] == 1.0 && adjusted[1] == 1.0);
}

/* σ = 0.01, 64 columns give 0.02, so v = 0.0256; c₀ = 3, c₁ = 0.01: m* = √(0.0256·300)/0.01 = 277.
 */
SV_TEST(columns_or_realisations)
{
    sv_split s = {.columns = 64,
                  .step = 16,
                  .most = 4096,
                  .estimator_error = 0.02,
                  .disorder_deviation = 0.01,
                  .seconds_fixed = 3,
                  .seconds_per_column = 0.01};
    CHECK(sv_split_optimise(&s));
    CHECK_CLOSE(s.best_columns, 272, 0.0);
    /* (1e-4 + 0.0256/272)·5.72 / ((1e-4 + 4e-4)·3.64) */
    CHECK_CLOSE(s.work, 0.61008403361, 1e-10);
    CHECK_CLOSE(s.realisations, (1e-4 + 0.0256 / 272) / 5e-4, 1e-14);
    for (double m = 32; m <= 4096; m += 16) { /* no other whole number of blocks does better */
        double work = (1e-4 + 0.0256 / m) * (3 + 0.01 * m) / (5e-4 * 3.64);
        CHECK(work >= s.work - 1e-12);
    }
    s.most = 128; /* the window has no more */
    CHECK(sv_split_optimise(&s) && s.best_columns == 128.0);
    s.most = 4096;
    s.seconds_fixed = 0.0; /* never less than two blocks */
    CHECK(sv_split_optimise(&s) && s.best_columns == 32.0);
    s.disorder_deviation = 0.0;
    s.seconds_fixed = 3;
    CHECK(sv_split_optimise(&s) && s.best_columns == 4096.0);
    s.estimator_error = 0.0;
    CHECK(!sv_split_optimise(&s));
}
