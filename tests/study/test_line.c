/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "selvedge/study.h"
#include "testing.h"

/* NIST StRD Norris (linear regression, certified values): weights of one, so the certified standard
 * errors are ours times the residual deviation 0.884796396144373. */
SV_TEST(norris)
{
    static const double y[] = {0.1,   338.8, 118.1, 888.0, 9.2,   228.1, 668.5, 998.5, 449.1,
                               778.9, 559.2, 0.3,   0.1,   778.1, 668.8, 339.3, 448.9, 10.8,
                               557.7, 228.3, 998.0, 888.8, 119.6, 0.3,   0.6,   557.6, 339.3,
                               888.0, 998.5, 778.9, 10.2,  117.6, 228.9, 668.4, 449.2, 0.2};
    static const double x[] = {0.2,   337.4, 118.2, 884.6, 10.1,  226.5, 666.3, 996.3, 448.6,
                               777.0, 558.2, 0.4,   0.6,   775.5, 666.9, 338.0, 447.5, 11.6,
                               556.0, 228.1, 995.8, 887.6, 120.2, 0.3,   0.3,   556.8, 339.1,
                               887.2, 999.0, 779.0, 11.1,  118.3, 229.2, 669.1, 448.9, 0.5};
    double error[36];
    for (int k = 0; k < 36; k++)
        error[k] = 1.0;
    sv_line line = sv_line_fit(x, y, error, 36);
    const double deviation = 0.884796396144373;
    CHECK(line.exists);
    CHECK_CLOSE(line.value, -0.262323073774029, 1e-11);
    CHECK_CLOSE(line.slope, 1.00211681802045, 1e-13);
    CHECK_CLOSE(line.value_error * deviation, 0.232818234301152, 1e-12);
    CHECK_CLOSE(line.slope_error * deviation, 0.429796848199937e-03, 1e-15);
    CHECK_CLOSE(line.chi_square, 26.6173985294224, 1e-9);
}

SV_TEST(lines_that_do_not_exist)
{
    const double x[] = {1.0, 1.0, 2.0}, y[] = {1.0, 2.0, 3.0};
    const double good[] = {0.1, 0.1, 0.1}, bad[] = {0.1, 0.0, 0.1};
    CHECK(!sv_line_fit(x, y, good, 2).exists);
    CHECK(!sv_line_fit(x, y, bad, 3).exists);
    CHECK(isnan(sv_line_fit(x + 1, y + 1, good, 2).p_value));
    CHECK(sv_line_fit(x, y, good, 3).p_value < 1e-5);
}

SV_TEST(error_behind_an_interval)
{
    const sv_threshold_answer answer = {.interval = {1.0, 3.0}, .confidence = 0.95};
    CHECK_CLOSE(sv_threshold_error(&answer), 1.0 / 1.959963984540054, 1e-12);
}
