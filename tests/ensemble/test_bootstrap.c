/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "selvedge/ensemble.h"
#include "testing.h"

static const double data[] = {0.2, 1.9, 2.2, 3.1, 0.4, 5.7, 1.1, 9.3, 0.8, 2.5};

/* The same resamples by a Philox and a jackknife written in Python from their papers, quantiles by
 * NumPy. scipy.stats.bootstrap (method BCa, 200,000 resamples of its own): [1.48, 5.07]. */
SV_TEST(bca_interval)
{
    double interval[2], again[2], other[2];
    CHECK_OK(sv_bootstrap_interval(test_context(), data, 10, 2000, 20, 0.95, interval));
    CHECK_CLOSE(interval[0], 1.48, 1e-12);
    CHECK_CLOSE(interval[1], 4.996992487691, 2e-12);
    CHECK_OK(sv_bootstrap_interval(test_context(), data, 10, 2000, 20, 0.95, again));
    CHECK(memcmp(interval, again, sizeof again) == 0);
    CHECK_OK(sv_bootstrap_interval(test_context(), data, 10, 2000, 21, 0.95, other));
    CHECK(memcmp(interval, other, sizeof other) != 0);
    CHECK_OK(sv_bootstrap_interval(test_context(), data, 10, 100000, 20, 0.95, interval));
    CHECK_CLOSE(interval[0], 1.48, 0.011);
    CHECK_CLOSE(interval[1], 5.07, 0.03);
}

SV_TEST(bca_needs_a_spread)
{
    const double same[] = {1.0, 1.0, 1.0, 1.0};
    double interval[2] = {5.0, 5.0};
    CHECK_STATUS(SV_UNDEFINED,
                 sv_bootstrap_interval(test_context(), same, 4, 200, 1, 0.95, interval));
    CHECK_STATUS(SV_UNDEFINED,
                 sv_bootstrap_interval(test_context(), data, 2, 200, 1, 0.95, interval));
    CHECK_STATUS(SV_INVALID_INPUT,
                 sv_bootstrap_interval(test_context(), data, 10, 99, 1, 0.95, interval));
    CHECK(interval[0] == 5.0 && interval[1] == 5.0);
}

/* A summary takes the resolved values in their order, and leaves an index alone. */
SV_TEST(bootstrap_of_a_summary)
{
    sv_record records[11] = {{0}};
    sv_ensemble ensemble = {0};
    sv_case point = {.n_markers = 1, .seed = 20};
    sv_summary s;
    double interval[2];
    point.markers[0].marker = sv_marker_find("local_chern");
    CHECK_OK(sv_ensemble_init(test_context(), 1, 11, 1, &ensemble));
    for (int k = 0; k < 11; k++) {
        records[k].realisation = k;
        records[k].n_outcomes = 1;
        records[k].outcomes[0] = sv_outcome_blank();
        records[k].outcomes[0].verdict = k == 4 ? SV_UNRESOLVED : SV_RESOLVED;
        records[k].outcomes[0].value = k < 4 ? data[k] : k > 4 ? data[k - 1] : 1e9;
        CHECK_OK(sv_ensemble_put(test_context(), &ensemble, &records[k]));
    }
    CHECK_OK(sv_summarise(test_context(), &ensemble, &point, 0, 0, 11, &s));
    CHECK(isnan(s.interval_bca[0]) && s.resamples == 0);
    CHECK_OK(sv_summary_bootstrap(test_context(), &ensemble, &point, 0, 0, 500, &s));
    CHECK_OK(sv_bootstrap_interval(test_context(), data, 10, 500, 20, 0.95, interval));
    CHECK(memcmp(interval, s.interval_bca, sizeof interval) == 0 && s.resamples == 500);
    CHECK(s.interval_corrected[1] > 10.9 && s.interval_corrected[1] < 10.91);
    CHECK(strstr(s.warning, "skewed (1.7) for 10 values") != NULL);
    CHECK_INT(s.histogram.n_bins, 5); /* 2·IQR/∛10 = 1.93: width 2 */
    CHECK(s.histogram.counts[0] == 5 && s.histogram.counts[1] == 3 && s.histogram.counts[4] == 1);
    CHECK(isnan(s.quantile_intervals[0][0]) && s.quantile_intervals[2][0] == 0.4);
    sv_summary_free(test_context(), &s);
    point.markers[0].marker = sv_marker_find("bott");
    for (int k = 0; k < 11; k++) {
        records[k].outcomes[0].value = k % 2;
        CHECK_OK(sv_ensemble_put(test_context(), &ensemble, &records[k]));
    }
    CHECK_OK(sv_summarise(test_context(), &ensemble, &point, 0, 0, 11, &s));
    CHECK_OK(sv_summary_bootstrap(test_context(), &ensemble, &point, 0, 0, 500, &s));
    CHECK(s.resamples == 0 && s.histogram.n_bins == 0 && s.warning[0] == '\0');
    CHECK_INT(s.n_shares, 2);
    sv_exact_interval(5, 11, 0.95, interval);
    CHECK(memcmp(interval, s.shares[1].exact_interval, sizeof interval) == 0);
    sv_summary_free(test_context(), &s);
    sv_ensemble_free(test_context(), &ensemble);
}
