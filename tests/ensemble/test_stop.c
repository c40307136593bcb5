/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "selvedge/ensemble.h"
#include "testing.h"

/* First n at which the rule holds, or −1. */
static int64_t first(const sv_stop_rule *rule, const double *values, int64_t n)
{
    sv_stop_state state = {0};
    for (int64_t k = 0; k < n; k++)
        if (sv_stop_add(&state, rule, SV_RESOLVED, values[k], 0.5))
            return k + 1;
    return -1;
}

/* s²(1 + 5γ²/n)/n from the definition. */
static double believed_variance(const double *x, int64_t n)
{
    double mean = 0.0, two = 0.0, three = 0.0, size = (double)n;
    for (int64_t k = 0; k < n; k++)
        mean += x[k] / size;
    for (int64_t k = 0; k < n; k++) {
        two += (x[k] - mean) * (x[k] - mean) / size;
        three += (x[k] - mean) * (x[k] - mean) * (x[k] - mean) / size;
    }
    return two * size / (size - 1.0) * (1.0 + 5.0 * three * three / (two * two * two) / size) /
           size;
}

SV_TEST(skewed_values_count_as_wider)
{
    double x[2000];
    sv_stream stream = sv_stream_make(5, "values", 0);
    for (int k = 0; k < 2000; k++)
        x[k] = 1e4 - log(sv_stream_uniform(&stream, k, 0, 0));
    sv_stop_rule rule = {.active = true, .standard_error = 0.05, .at_least = 50};
    int64_t n = first(&rule, x, 2000), plain = 50;
    CHECK(n > 350 && n < 500);
    CHECK(believed_variance(x, n) <= 0.0025 && believed_variance(x, n - 1) > 0.0025);
    while (sv_moments_of(x, plain).standard_error > 0.05)
        plain++;
    CHECK(plain < n);
    CHECK(sv_moments_of(x, n).standard_error <= 0.05);
    rule.active = false;
    CHECK_INT(first(&rule, x, 2000), -1);
}

SV_TEST(values_all_the_same)
{
    double x[200];
    for (int k = 0; k < 200; k++)
        x[k] = 0.1;
    sv_stop_rule rule = {.active = true, .standard_error = 0.05, .at_least = 30};
    CHECK_INT(first(&rule, x, 200), 120);
    /* an index: 2/(n(n + 1)) ≤ 0.0025 from 28 on */
    rule.of_index = true;
    rule.at_least = 5;
    CHECK_INT(first(&rule, x, 200), 28);
    for (int k = 0; k < 200; k++) /* far spread: the variance itself, 9·n/(n − 1)/n ≤ 0.0625 */
        x[k] = k % 2 == 0 ? 3.0 : -3.0;
    rule.standard_error = 0.25;
    CHECK_INT(first(&rule, x, 200), 145);
}

/* 9 of 10 are 1, in a fixed order: the first n at which Wilson's interval is narrow. */
SV_TEST(width_of_a_share)
{
    double x[2000], interval[2];
    for (int k = 0; k < 2000; k++)
        x[k] = k % 10 == 4 ? (double)(k / 10 % 3) - 5.0 : 1.0;
    sv_stop_rule rule = {.active = true, .of_index = true, .share_width = 0.06, .at_least = 50};
    int64_t n = first(&rule, x, 2000), ones = 0;
    CHECK(n > 300 && n < 500);
    for (int64_t k = 0; k < n; k++)
        ones += x[k] == 1.0;
    sv_wilson_interval(ones, n, 0.95, interval);
    CHECK(interval[1] - interval[0] <= 0.06);
    sv_wilson_interval(ones - (x[n - 1] == 1.0), n - 1, 0.95, interval);
    CHECK(interval[1] - interval[0] > 0.06);
    /* both conditions: the later one */
    rule.standard_error = 0.05;
    int64_t both = first(&rule, x, 2000);
    rule.share_width = 0.0;
    CHECK(both > n && first(&rule, x, 2000) == both);
    /* all the same: Wilson's upper end is 1, the lower n/(n + 3.84) */
    for (int k = 0; k < 2000; k++)
        x[k] = -2.0;
    rule = (sv_stop_rule){.active = true, .of_index = true, .share_width = 0.06, .at_least = 10};
    CHECK_INT(first(&rule, x, 2000), 61);
    for (int k = 0; k < 2000; k++)
        x[k] = k; /* never the same: room for 32, then only their share falls */
    CHECK_INT(first(&rule, x, 2000), 88);
}

/* Unresolved ones count for the share and not for the mean; absent ones for neither. */
SV_TEST(what_counts)
{
    sv_stop_rule rule = {.active = true, .of_index = true, .share_width = 0.1, .at_least = 10};
    sv_stop_state state = {0};
    for (int k = 0; k < 60; k++)
        (void)sv_stop_add(&state, &rule,
                          k % 3 == 0   ? SV_UNRESOLVED
                          : k % 3 == 1 ? SV_RESOLVED
                                       : SV_ABSENT,
                          k % 3 == 1 ? 1.0 : (double)NAN, 0.25);
    CHECK(state.counted == 60 && state.judged == 40 && state.resolved == 20);
    CHECK(state.mean == 1.0 && state.squares == 0.0 && state.counts[0] == 20);
    CHECK_CLOSE(state.seconds, 15.0, 1e-12);
    /* 61 values that agree are enough for 0.06; half as many unresolved ones spoil the share */
    state = (sv_stop_state){0};
    rule.share_width = 0.06;
    bool holds = false;
    for (int k = 0; k < 120; k++)
        holds = sv_stop_add(&state, &rule, k % 3 == 0 ? SV_UNRESOLVED : SV_RESOLVED, 1.0, 0.0);
    CHECK(!holds && state.resolved == 80);
}

/* Time ends what precision would not, but not before at_least. */
SV_TEST(time_is_a_limit)
{
    double x[400];
    sv_stream stream = sv_stream_make(6, "values", 0);
    for (int k = 0; k < 400; k++)
        x[k] = sv_stream_normal(&stream, k, 0, 0);
    sv_stop_rule rule = {.active = true, .seconds = 30.0, .at_least = 10};
    CHECK_INT(first(&rule, x, 400), 60);
    rule.at_least = 100;
    CHECK_INT(first(&rule, x, 400), 100);
    rule.standard_error = 1e-3;
    rule.at_least = 50;
    CHECK_INT(first(&rule, x, 400), 60);
    rule.standard_error = 0.16;
    int64_t n = first(&rule, x, 400);
    CHECK(n >= 50 && n <= 60);
    rule.seconds = 0.0;
    rule.standard_error = 1e-3;
    CHECK_INT(first(&rule, x, 400), -1);
}
