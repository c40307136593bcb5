/* SPDX-License-Identifier: GPL-3.0-or-later */
/* A value with its standard error in parentheses: 0.9981(4). */
#include <math.h>
#include <stdio.h>

#include "selvedge/present.h"

enum { MOST_DECIMALS = 12 };

/* "-0.00" is "0.00". */
static void format_fixed(double value, int decimals, char *text, size_t size)
{
    const double unit = pow(10.0, -decimals);
    snprintf(text, size, "%.*f", decimals, fabs(value) < 0.5 * unit ? 0.0 : value);
}

void sv_format_uncertain(double value, double error, char *text, size_t size)
{
    char digits[64];
    if (!isfinite(value)) {
        snprintf(text, size, "-");
        return;
    }
    if (!isfinite(error) || error < 0) {
        snprintf(text, size, "%.6g", value + 0.0);
        return;
    }
    if (error <= 0) {
        snprintf(text, size, "%.6g(0)", value + 0.0);
        return;
    }
    const int exponent = (int)floor(log10(error));
    const double leading = error * pow(10.0, -exponent);
    /* One digit of the error, two when it begins with 1: 1.4 and 1.0 must not look alike. */
    const int wanted = (leading < 1.95 ? 1 : 0) - exponent;
    const int decimals = wanted > 0 ? wanted : 0;
    if (decimals > MOST_DECIMALS || fabs(value) >= 1e8 || error >= 1e8) {
        snprintf(text, size, "%.6g +- %.2g", value, error);
        return;
    }
    format_fixed(value, decimals, digits, sizeof digits);
    const double scaled = round(error * pow(10.0, decimals));
    if (decimals == 0 || error < 0.995)
        snprintf(text, size, "%s(%.0f)", digits, scaled);
    else
        snprintf(text, size, "%s(%.*f)", digits, decimals, error);
}
