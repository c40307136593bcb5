/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "selvedge/ensemble.h"
#include "testing.h"

/* R. G. Newcombe, Stat. Med. 17, 857 (1998), Table I. */
SV_TEST(wilson_intervals)
{
    const struct {
        int64_t k, n;
        double low, high;
    } rows[] = {{81, 263, 0.255289, 0.366210}, {15, 148, 0.062386, 0.160487},
                {0, 20, 0.0, 0.161125},        {1, 29, 0.006113, 0.171755},
                {12, 150, 0.046354, 0.134621}, {23, 60, 0.270883, 0.509824}};
    for (size_t k = 0; k < sizeof rows / sizeof rows[0]; k++) {
        double interval[2];
        sv_wilson_interval(rows[k].k, rows[k].n, 0.95, interval);
        CHECK_CLOSE(interval[0], rows[k].low, 6e-7);
        CHECK_CLOSE(interval[1], rows[k].high, 6e-7);
        /* mirror image */
        sv_wilson_interval(rows[k].n - rows[k].k, rows[k].n, 0.95, interval);
        CHECK_CLOSE(interval[0], 1.0 - rows[k].high, 6e-7);
    }
    double none[2];
    sv_wilson_interval(0, 0, 0.95, none);
    CHECK(none[0] == 0.0 && none[1] == 1.0);
}

/* Clopper–Pearson: the same rows by SciPy 1.10, stats.binomtest(k,
 * n).proportion_ci(method='exact'). The last three lie where GSL's quantile of the beta
 * distribution fails. */
SV_TEST(exact_intervals)
{
    const struct {
        int64_t k, n;
        double low, high;
    } rows[] = {{81, 263, 0.252736745585, 0.367621922601},
                {15, 148, 0.057844010083, 0.161650490349},
                {0, 20, 0.0, 0.168433470983},
                {1, 29, 0.000872646884, 0.177644295488},
                {12, 150, 0.042020264700, 0.135573890213},
                {23, 60, 0.260707058016, 0.517885048569},
                {5000, 10000, 0.49015138058997, 0.50984861941003},
                {3, 100000, 0.00000618676392, 0.00008767020257},
                {412345, 1000000, 0.41137994973559, 0.41331055801360}};
    for (size_t k = 0; k < sizeof rows / sizeof rows[0]; k++) {
        double interval[2];
        sv_exact_interval(rows[k].k, rows[k].n, 0.95, interval);
        CHECK_CLOSE(interval[0], rows[k].low, 1e-12);
        CHECK_CLOSE(interval[1], rows[k].high, 1e-12);
    }
    double exact[2], wilson[2];
    sv_exact_interval(7, SV_EXACT_LARGEST + 1, 0.95, exact);
    sv_wilson_interval(7, SV_EXACT_LARGEST + 1, 0.95, wilson);
    CHECK(exact[0] == wilson[0] && exact[1] == wilson[1]);
    sv_exact_interval(0, 0, 0.95, exact);
    CHECK(exact[0] == 0.0 && exact[1] == 1.0);
}

/* SciPy 1.10, stats.binomtest(k, n).pvalue. */
SV_TEST(binomial_test)
{
    CHECK_CLOSE(sv_binomial_test(3, 10), 0.34375, 1e-14);
    CHECK_CLOSE(sv_binomial_test(15, 20), 0.04138946533203125, 1e-15);
    CHECK_CLOSE(sv_binomial_test(5, 20), 0.04138946533203125, 1e-15);
    CHECK_CLOSE(sv_binomial_test(0, 5), 0.0625, 1e-15);
    CHECK_CLOSE(sv_binomial_test(40, 120), 0.00033040001839131815, 1e-15);
    CHECK(sv_binomial_test(7, 14) == 1.0 && sv_binomial_test(1, 1) == 1.0);
    CHECK(sv_binomial_test(0, 0) == 1.0);
}

/* Hyndman, Fan, Am. Stat. 50, 361 (1996), type 7. */
SV_TEST(quantiles)
{
    const double x[] = {1, 2, 4, 8};
    CHECK_CLOSE(sv_quantile_sorted(x, 4, 0.5), 3.0, 1e-15);
    CHECK_CLOSE(sv_quantile_sorted(x, 4, 0.25), 1.75, 1e-15);
    CHECK_CLOSE(sv_quantile_sorted(x, 4, 1.0), 8.0, 0.0);
    CHECK_CLOSE(sv_quantile_sorted(x, 1, 0.3), 1.0, 0.0);
    CHECK(isnan(sv_quantile_sorted(x, 0, 0.3)));
    for (int k = 1; k < SV_N_QUANTILES; k++)
        CHECK(sv_quantile_levels()[k] > sv_quantile_levels()[k - 1]);
}

/* Ranks by direct search with SciPy 1.10's stats.binom.cdf. */
SV_TEST(quantile_intervals)
{
    const struct {
        int64_t n;
        double probability;
        int64_t low, high; /* 0 and above n: none */
    } rows[] = {{60, 0.5, 22, 39},
                {60, 0.05, 0, 8},
                {200, 0.95, 184, 197},
                {60, 0.25, 9, 23},
                {100, 0.95, 90, 100}};
    double ranks[200], interval[2];
    for (int k = 0; k < 200; k++)
        ranks[k] = k + 1;
    for (size_t k = 0; k < sizeof rows / sizeof rows[0]; k++) {
        sv_quantile_interval(ranks, rows[k].n, rows[k].probability, 0.95, interval);
        CHECK(rows[k].low == 0 ? isnan(interval[0]) : interval[0] == (double)rows[k].low);
        CHECK(interval[1] == (double)rows[k].high);
    }
    sv_quantile_interval(ranks, 5, 0.5, 0.95, interval); /* 2·2⁻⁵ is above 5 % */
    CHECK(isnan(interval[0]) && isnan(interval[1]));
    sv_quantile_interval(ranks, 6, 0.5, 0.95, interval);
    CHECK(interval[0] == 1.0 && interval[1] == 6.0);
    sv_quantile_interval(ranks, 0, 0.5, 0.95, interval);
    CHECK(isnan(interval[0]));
}

SV_TEST(histograms)
{
    /* 0 … 99: quartiles 24.75 and 74.25, 2·49.5/100^(1/3) = 21.3, rounded up to 50 */
    double x[100];
    for (int k = 0; k < 100; k++)
        x[k] = k;
    sv_histogram h = sv_histogram_of(x, 100, 29.0);
    CHECK(h.low == 0.0 && h.width == 50.0 && h.n_bins == 2);
    CHECK(h.counts[0] == 50 && h.counts[1] == 50);
    /* negative edges, and values on an edge belong to the bin that begins there */
    const double y[] = {-0.3, -0.1, 0.0, 0.1, 0.2, 0.3};
    h = sv_histogram_of(y, 6, 0.2); /* 2·0.25/6^(1/3) = 0.275 */
    CHECK(h.width == 0.5 && h.low == -0.5 && h.n_bins == 2);
    CHECK(h.counts[0] == 2 && h.counts[1] == 4);
    /* one far value stretches the bins, it does not multiply them */
    x[99] = 1e6;
    h = sv_histogram_of(x, 100, 1e5);
    CHECK(h.n_bins <= SV_MOST_BINS && h.counts[0] == 99 && h.counts[h.n_bins - 1] == 1);
    CHECK(h.low + h.width * h.n_bins > 1e6);
    /* more than half the values equal: Scott's rule */
    for (int k = 0; k < 100; k++)
        x[k] = k < 90 ? 1.0 : 2.0;
    h = sv_histogram_of(x, 100, 0.3015); /* 3.49·0.3015/100^(1/3) = 0.227 */
    CHECK_CLOSE(h.width, 0.5, 1e-15);
    CHECK(h.n_bins == 3 && h.counts[0] == 90 && h.counts[2] == 10);
    for (int k = 0; k < 100; k++)
        x[k] = 7.0;
    h = sv_histogram_of(x, 100, 0.0);
    CHECK(h.width == 0.0 && h.n_bins == 1 && h.low == 7.0 && h.counts[0] == 100);
    CHECK_INT(sv_histogram_of(x, 0, 0.0).n_bins, 0);
}

/* Hall's interval against a numerical inversion of his cubic (SciPy 1.10, optimize.brentq). */
SV_TEST(corrected_interval)
{
    const double x[] = {0.2, 1.9, 2.2, 3.1, 0.4, 5.7, 1.1, 9.3, 0.8, 2.5};
    double interval[2], student[2];
    sv_moments m = sv_moments_of(x, 10);
    CHECK(sv_corrected_interval(&m, 0.95, interval) == SV_OK);
    CHECK_CLOSE(interval[0], 1.2548360034105759, 1e-9);
    CHECK_CLOSE(interval[1], 10.902176639359961, 1e-9);
    m.skewness = 0.0;
    CHECK(sv_corrected_interval(&m, 0.95, interval) == SV_OK);
    CHECK(sv_student_interval(&m, 0.95, student) == SV_OK);
    CHECK_CLOSE(interval[0], student[0], 1e-14);
    CHECK_CLOSE(interval[1], student[1], 1e-14);
    m.skewness = 1e-7; /* the series about 0 joins the formula */
    double near[2];
    CHECK(sv_corrected_interval(&m, 0.95, near) == SV_OK);
    CHECK_CLOSE(near[1], student[1], 1e-6);
    m = sv_moments_of(x, 2);
    CHECK(sv_corrected_interval(&m, 0.95, interval) == SV_UNDEFINED);
}

SV_TEST(peaks)
{
    double x[100];
    for (int k = 0; k < 100; k++)
        x[k] = k; /* uniform: halves explain 3/4 */
    sv_peaks p = sv_peaks_of(x, 100);
    CHECK_CLOSE(p.explained, 0.75, 1e-3);
    CHECK(!p.apart && p.n_low == 50);
    CHECK_CLOSE(p.low, 24.5, 1e-12);
    CHECK_CLOSE(p.high, 74.5, 1e-12);
    for (int k = 0; k < 100; k++)
        x[k] = (k < 7 ? 0.1 : 1.0) + 1e-3 * k;
    p = sv_peaks_of(x, 100);
    CHECK(p.apart && p.n_low == 7);
    CHECK_CLOSE(p.low, 0.103, 1e-12);
    CHECK(p.explained > 0.98 && p.explained <= 1.0);
    for (int k = 0; k < 100; k++)
        x[k] = 0.3;
    CHECK(!sv_peaks_of(x, 100).apart && isnan(sv_peaks_of(x, 100).explained));
}

static bool warns(const double *sorted, int64_t n, const char *word)
{
    char message[200];
    sv_moments m = sv_moments_of(sorted, n);
    sv_peaks p = sv_peaks_of(sorted, n);
    bool warned = sv_interval_warning(&m, &p, message, sizeof message);
    CHECK(warned == (message[0] != '\0'));
    return word == NULL ? warned : strstr(message, word) != NULL;
}

SV_TEST(warnings)
{
    double x[100];
    for (int k = 0; k < 100; k++)
        x[k] = k;
    CHECK(!warns(x, 100, NULL));
    CHECK(warns(x, 9, "9 values do not show") && !warns(x, 10, NULL) && !warns(x, 1, NULL));
    for (int k = 0; k < 100; k++)
        x[k] = exp(0.04 * k); /* skewness 1.13: 25·1.28 = 32 */
    CHECK(!warns(x, 100, NULL));
    for (int k = 0; k < 100; k++)
        x[k] = exp(0.0008 * k * k);
    CHECK(warns(x, 100, "skewed ("));
    for (int k = 0; k < 100; k++)
        x[k] = (k < 7 ? 0.1 : 1.0) + 1e-3 * k;
    CHECK(warns(x, 100, "two-peaked: 7 of 100 values about 0.103, the others about 1.05"));
    for (int k = 0; k < 100; k++)
        x[k] = 0.3; /* 1 − 0.05^(1/100) = 2.95 % */
    CHECK(warns(x, 100, "all 100 values are the same: others in up to 3 %"));
}
