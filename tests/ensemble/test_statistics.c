/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "selvedge/ensemble.h"
#include "testing.h"

#include <stdlib.h>

static int64_t read_series(const char *name, double *values, int64_t most)
{
    char path[200];
    snprintf(path, sizeof path, "../data/reference/nist-strd/%s.txt", name);
    FILE *f = fopen(test_data(path), "r");
    if (!test_check(f != NULL, __FILE__, __LINE__, "%s is missing", path))
        return 0;
    int64_t n = 0;
    while (n < most && fscanf(f, "%lf", &values[n]) == 1)
        n++;
    fclose(f);
    return n;
}

static void check_series(const double *values, int64_t n, double mean, double deviation, double r1)
{
    sv_moments m = sv_moments_of(values, n);
    CHECK_CLOSE(m.mean / mean, 1.0, 1e-14);
    CHECK_CLOSE(m.deviation / deviation, 1.0, 2e-11);
    CHECK_CLOSE(sv_autocorrelation(values, n), r1, 2e-10 * fabs(r1) + 1e-13);
    CHECK_CLOSE(m.standard_error, m.deviation / sqrt((double)n), 1e-15 * m.deviation);
}

/* NIST Statistical Reference Datasets, univariate summary statistics: certified mean, standard
 * deviation (n − 1) and lag-1 autocorrelation. */
SV_TEST(nist_reference_datasets)
{
    const struct {
        const char *name;
        int64_t n;
        double mean, deviation, r1;
    } rows[] = {
        {"lew", 200, -177.435, 277.332168044316, -0.307304800605679},
        {"lottery", 218, 518.958715596330, 291.699727470969, -0.120948622967393},
        {"mavro", 50, 2.001856, 0.000429123454003053, 0.937989183438248},
        {"michelson", 100, 299.8524, 0.0790105478190518, 0.535199668621283},
        {"pidigits", 5000, 4.5348, 2.86733906028871, -0.00355099287237972},
    };
    static double values[5000];
    for (size_t k = 0; k < sizeof rows / sizeof rows[0]; k++) {
        CHECK_INT(read_series(rows[k].name, values, 5000), rows[k].n);
        check_series(values, rows[k].n, rows[k].mean, rows[k].deviation, rows[k].r1);
    }
}

/* Skewness and excess kurtosis are not among NIST's certified values; these are SciPy 1.10's
 * stats.skew and stats.kurtosis with bias=False on the same files. */
SV_TEST(skewness_and_kurtosis)
{
    const struct {
        const char *name;
        double skewness, kurtosis;
    } rows[] = {
        {"lew", -0.05060663875633401, -1.4960497921444706},
        {"lottery", -0.09333165310779383, -1.1925609107485622},
        {"mavro", 0.6449294811116145, -0.8205237967709813},
        {"michelson", -0.018538863774755665, 0.3396845984201926},
        {"pidigits", -0.007992718638901447, -1.2200087510472775},
    };
    static double values[5000];
    for (size_t k = 0; k < sizeof rows / sizeof rows[0]; k++) {
        int64_t n = read_series(rows[k].name, values, 5000);
        sv_moments m = sv_moments_of(values, n);
        CHECK_CLOSE(m.skewness, rows[k].skewness, 2e-9);
        CHECK_CLOSE(m.kurtosis, rows[k].kurtosis, 2e-9);
    }
    const double same[] = {0.1, 0.1, 0.1, 0.1};
    sv_moments m = sv_moments_of(same, 4);
    CHECK(isnan(m.skewness) && isnan(m.kurtosis));
    const double three[] = {0, 0, 1};
    m = sv_moments_of(three, 3);
    CHECK_CLOSE(m.skewness, sqrt(3.0), 1e-14); /* the largest n values can have is √n */
    CHECK(isnan(m.kurtosis));
}

/* NumAcc1–4: built to break naive sums. In doubles the data themselves are rounded, which limits
 * NumAcc3 and 4 to the accuracy of the stored numbers. */
SV_TEST(nist_numerical_accuracy)
{
    const double first[] = {10000001, 10000003, 10000002};
    sv_moments m = sv_moments_of(first, 3);
    CHECK(m.mean == 10000002.0 && m.deviation == 1.0);
    CHECK_CLOSE(sv_autocorrelation(first, 3), -0.5, 1e-15);
    const double base[] = {1.2, 1000000.2, 10000000.2};
    const double tolerance[] = {1e-14, 1e-9, 1e-8};
    for (int k = 0; k < 3; k++) {
        static double x[1001];
        x[0] = base[k];
        for (int i = 0; i < 500; i++) {
            x[1 + 2 * i] = base[k] - 0.1;
            x[2 + 2 * i] = base[k] + 0.1;
        }
        m = sv_moments_of(x, 1001);
        CHECK_CLOSE(m.mean / base[k], 1.0, 1e-15);
        CHECK_CLOSE(m.deviation, 0.1, tolerance[k]);
        CHECK_CLOSE(sv_autocorrelation(x, 1001), -0.999, 1e-7);
    }
}

/* Student's t: 95 %, 9 degrees of freedom: 2.262157 (standard tables, recalled from memory). */
SV_TEST(student_interval)
{
    double x[10], interval[2];
    for (int k = 0; k < 10; k++)
        x[k] = k;
    sv_moments m = sv_moments_of(x, 10);
    CHECK(sv_student_interval(&m, 0.95, interval) == SV_OK);
    CHECK_CLOSE((interval[1] - m.mean) / m.standard_error, 2.262157, 6e-7);
    CHECK_CLOSE(interval[0] + interval[1], 9.0, 1e-12);
    m = sv_moments_of(x, 1);
    CHECK(sv_student_interval(&m, 0.95, interval) == SV_UNDEFINED);
    CHECK(isnan(m.standard_error) && isnan(sv_moments_of(x, 0).mean));
}

/* Deviation 5, estimator errors 3 in the mean square: 4 is left; never below 0. */
SV_TEST(disorder_and_estimator_are_kept_apart)
{
    sv_record records[3] = {{.n_outcomes = 1}, {.n_outcomes = 1}, {.n_outcomes = 1}};
    sv_ensemble ensemble = {0};
    sv_case point = {.n_markers = 1, .markers = {{.marker = sv_marker_find("local_chern")}}};
    sv_summary s;
    CHECK_OK(sv_ensemble_init(test_context(), 1, 3, 1, &ensemble));
    for (int k = 0; k < 3; k++) {
        records[k].realisation = k;
        records[k].outcomes[0] = sv_outcome_blank();
        records[k].outcomes[0].verdict = SV_RESOLVED;
        records[k].outcomes[0].value = 5.0 * (k - 1);
        records[k].outcomes[0].estimator_error = k == 1 ? sqrt(27.0) : 0.0;
        CHECK_OK(sv_ensemble_put(test_context(), &ensemble, &records[k]));
    }
    CHECK_OK(sv_summarise(test_context(), &ensemble, &point, 0, 0, 3, &s));
    CHECK_CLOSE(s.deviation, 5.0, 1e-14);
    CHECK_CLOSE(s.estimator_error, 3.0, 1e-14);
    CHECK_CLOSE(s.disorder_deviation, 4.0, 1e-14);
    sv_summary_free(test_context(), &s);
    records[0].outcomes[0].estimator_error = 50.0;
    CHECK_OK(sv_ensemble_put(test_context(), &ensemble, &records[0]));
    CHECK_OK(sv_summarise(test_context(), &ensemble, &point, 0, 0, 3, &s));
    CHECK(s.disorder_deviation == 0.0);
    sv_summary_free(test_context(), &s);
    CHECK_OK(sv_summarise(test_context(), &ensemble, &point, 0, 0, 1, &s));
    CHECK(isnan(s.disorder_deviation));
    sv_summary_free(test_context(), &s);
    sv_ensemble_free(test_context(), &ensemble);
}
