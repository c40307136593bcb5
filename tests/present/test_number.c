/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "selvedge/present.h"
#include "testing.h"

static const char *format(double value, double error)
{
    static char text[64];
    sv_format_uncertain(value, error, text, sizeof text);
    return text;
}

SV_TEST(the_error_stands_in_the_last_digits)
{
    CHECK_TEXT(format(0.99812, 0.00043), "0.9981(4)");
    CHECK_TEXT(format(0.99812, 0.00013), "0.99812(13)");
    CHECK_TEXT(format(-0.5, 0.02), "-0.50(2)");
    CHECK_TEXT(format(12.34, 1.5), "12.3(1.5)");
    CHECK_TEXT(format(12.34, 3.2), "12(3)");
    CHECK_TEXT(format(1234.5, 27), "1234(27)");
    CHECK_TEXT(format(1, 0.0996), "1.00(10)"); /* rounds up to two digits */
    CHECK_TEXT(format(1, 0.195), "1.0(2)");
    CHECK_TEXT(format(3, 0.997), "3.0(1.0)");
}

SV_TEST(corners_of_number_and_error)
{
    CHECK_TEXT(format(1, 0), "1(0)");
    CHECK_TEXT(format(0.75, (double)NAN), "0.75");
    CHECK_TEXT(format((double)NAN, 0.1), "-");
    CHECK_TEXT(format((double)INFINITY, 0.1), "-");
    CHECK_TEXT(format(-0.0001, 0.01), "0.000(10)"); /* no minus before a zero */
    CHECK_TEXT(format(-0.0, 0), "0(0)");
    CHECK_TEXT(format(1e-9, 2e-16), "1e-09 +- 2e-16");
    CHECK_TEXT(format(1e12, 3), "1e+12 +- 3");
    CHECK_TEXT(format(1, 1e300), "1 +- 1e+300");
}
