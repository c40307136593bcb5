/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Units and numbers as text. SI constants: exact since 20 May 2019 (SI brochure, 9th edition). */
#include "selvedge/base.h"

#include <ctype.h>
#include <errno.h>
#include <inttypes.h>
#include <locale.h>
#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

static const double PI = 3.14159265358979323846;

static const sv_unit unit_rows[] = {
    {"%", SV_DIM_NONE, 1e-2},
    {"ppm", SV_DIM_NONE, 1e-6},
    {"eV", SV_DIM_ENERGY, 1.0},
    {"meV", SV_DIM_ENERGY, 1e-3},
    {"ueV", SV_DIM_ENERGY, 1e-6},
    {"µeV", SV_DIM_ENERGY, 1e-6},
    {"keV", SV_DIM_ENERGY, 1e3},
    {"J", SV_DIM_ENERGY, 1.0 / 1.602176634e-19},
    {"nm", SV_DIM_LENGTH, 1.0},
    {"angstrom", SV_DIM_LENGTH, 0.1},
    {"Å", SV_DIM_LENGTH, 0.1},
    {"pm", SV_DIM_LENGTH, 1e-3},
    {"um", SV_DIM_LENGTH, 1e3},
    {"µm", SV_DIM_LENGTH, 1e3},
    {"mm", SV_DIM_LENGTH, 1e6},
    {"cm", SV_DIM_LENGTH, 1e7},
    {"m", SV_DIM_LENGTH, 1e9},
    {"nm^-2", SV_DIM_DENSITY, 1.0},
    {"cm^-2", SV_DIM_DENSITY, 1e-14},
    {"um^-2", SV_DIM_DENSITY, 1e-6},
    {"m^-2", SV_DIM_DENSITY, 1e-18},
    {"nm^-3", SV_DIM_VOLUME_DENSITY, 1.0},
    {"cm^-3", SV_DIM_VOLUME_DENSITY, 1e-21},
    {"m^-3", SV_DIM_VOLUME_DENSITY, 1e-27},
    {"rad", SV_DIM_ANGLE, 1.0},
    {"deg", SV_DIM_ANGLE, 3.14159265358979323846 / 180.0},
    {"pi", SV_DIM_ANGLE, 3.14159265358979323846},
    {"K", SV_DIM_TEMPERATURE, 1.0},
    {"mK", SV_DIM_TEMPERATURE, 1e-3},
    {"s", SV_DIM_TIME, 1.0},
    {"ms", SV_DIM_TIME, 1e-3},
    {"min", SV_DIM_TIME, 60.0},
    {"h", SV_DIM_TIME, 3600.0},
    {"d", SV_DIM_TIME, 86400.0},
    {"eV nm", SV_DIM_ENERGY_LENGTH, 1.0},
    {"meV nm", SV_DIM_ENERGY_LENGTH, 1e-3},
    {"eV angstrom", SV_DIM_ENERGY_LENGTH, 0.1},
    {"eV Å", SV_DIM_ENERGY_LENGTH, 0.1},
    {"eV nm^2", SV_DIM_ENERGY_AREA, 1.0},
    {"meV nm^2", SV_DIM_ENERGY_AREA, 1e-3},
    {"eV angstrom^2", SV_DIM_ENERGY_AREA, 1e-2},
    {"eV Å^2", SV_DIM_ENERGY_AREA, 1e-2},
};
enum { N_UNITS = sizeof unit_rows / sizeof unit_rows[0] };

const sv_unit *sv_unit_table(size_t *ret_count)
{
    *ret_count = N_UNITS;
    return unit_rows;
}

const sv_unit *sv_unit_find(const char *symbol)
{
    for (size_t i = 0; i < N_UNITS; i++)
        if (strcmp(unit_rows[i].symbol, symbol) == 0)
            return &unit_rows[i];
    return NULL;
}

const char *sv_dimension_name(sv_dimension dimension)
{
    switch (dimension) {
    case SV_DIM_NONE:
        return "a pure number";
    case SV_DIM_ENERGY:
        return "an energy";
    case SV_DIM_LENGTH:
        return "a length";
    case SV_DIM_DENSITY:
        return "a density per area";
    case SV_DIM_VOLUME_DENSITY:
        return "a density per volume";
    case SV_DIM_ANGLE:
        return "an angle";
    case SV_DIM_TEMPERATURE:
        return "a temperature";
    case SV_DIM_TIME:
        return "a time";
    case SV_DIM_ENERGY_LENGTH:
        return "an energy times a length";
    case SV_DIM_ENERGY_AREA:
        return "an energy times an area";
    }
    return "a quantity";
}

void sv_unit_list(sv_dimension dimension, char *text, size_t size)
{
    size_t used = 0;
    bool spaced = dimension == SV_DIM_ENERGY_LENGTH || dimension == SV_DIM_ENERGY_AREA;
    const char *join = spaced ? ", " : " ";
    text[0] = '\0';
    for (size_t i = 0; i < N_UNITS; i++) {
        if (unit_rows[i].dimension != dimension)
            continue;
        int n = snprintf(text + used, size - used, "%s%s", used ? join : "", unit_rows[i].symbol);
        if (n < 0 || (size_t)n >= size - used)
            return;
        used += (size_t)n;
    }
}

/* strtod in the C locale whatever the program's locale is; NULL end when nothing was read. */
static double read_double(const char *text, char **end)
{
    locale_t c_locale = newlocale(LC_ALL_MASK, "C", (locale_t)0);
    if (c_locale == (locale_t)0) {
        *end = NULL;
        return 0.0;
    }
    errno = 0;
    double value = strtod_l(text, end, c_locale);
    freelocale(c_locale);
    return value;
}

/* Decimal numbers only: strtod would take hexadecimal, inf and nan as well. */
static bool starts_number(const char *text)
{
    if (*text == '+' || *text == '-')
        text++;
    if (text[0] == '0' && (text[1] == 'x' || text[1] == 'X'))
        return false;
    return isdigit((unsigned char)text[0]) || (text[0] == '.' && isdigit((unsigned char)text[1]));
}

static sv_parse_result read_number(const char *text, double *ret_value, const char **ret_rest)
{
    if (!starts_number(text))
        return SV_PARSE_NOT_A_NUMBER;
    char *end = NULL;
    double value = read_double(text, &end);
    if (end == NULL || end == text)
        return SV_PARSE_NOT_A_NUMBER;
    if (!isfinite(value) || (errno == ERANGE && fabs(value) > 1.0))
        return SV_PARSE_OUT_OF_RANGE;
    *ret_value = value;
    *ret_rest = end;
    return SV_PARSE_OK;
}

sv_parse_result sv_parse_real(const char *text, double *ret_value)
{
    const char *rest = NULL;
    double value = 0.0;
    sv_parse_result result = read_number(text, &value, &rest);
    if (result != SV_PARSE_OK)
        return result;
    if (*rest != '\0')
        return SV_PARSE_NOT_A_NUMBER;
    *ret_value = value;
    return SV_PARSE_OK;
}

sv_parse_result sv_parse_integer(const char *text, int64_t *ret_value)
{
    const char *digits = text + (*text == '+' || *text == '-');
    if (!isdigit((unsigned char)*digits))
        return SV_PARSE_NOT_A_NUMBER;
    char *end = NULL;
    errno = 0;
    intmax_t value = strtoimax(text, &end, 10);
    if (*end != '\0')
        return SV_PARSE_NOT_A_NUMBER;
    if (errno == ERANGE)
        return SV_PARSE_OUT_OF_RANGE;
    *ret_value = value;
    return SV_PARSE_OK;
}

/* "3 %" and "2.7eV", but also "pi" and "-pi" alone. */
static const char *read_bare_pi(const char *text, double *ret_value)
{
    bool negative = *text == '-';
    if (strcmp(text + negative, "pi") != 0)
        return NULL;
    *ret_value = negative ? -1.0 : 1.0;
    return text + negative;
}

sv_parse_result sv_parse_quantity(const char *text, sv_dimension dimension,
                                  sv_quantity *ret_quantity)
{
    double value = 0.0;
    const char *rest = dimension == SV_DIM_ANGLE ? read_bare_pi(text, &value) : NULL;
    if (rest == NULL) {
        sv_parse_result result = read_number(text, &value, &rest);
        if (result != SV_PARSE_OK)
            return result;
    }
    while (*rest == ' ' || *rest == '\t')
        rest++;
    if (*rest == '\0') {
        *ret_quantity = (sv_quantity){value, false, NULL};
        return SV_PARSE_OK;
    }
    const sv_unit *unit = sv_unit_find(rest);
    if (unit == NULL)
        return SV_PARSE_UNKNOWN_UNIT;
    *ret_quantity = (sv_quantity){value * unit->factor, true, unit};
    if (unit->dimension != dimension)
        return SV_PARSE_WRONG_DIMENSION;
    /* 30 deg and pi must be the nearest doubles to π/6 and π, not one rounding off. */
    if (unit->dimension == SV_DIM_ANGLE && strcmp(unit->symbol, "deg") == 0)
        ret_quantity->value = value * PI / 180.0;
    return SV_PARSE_OK;
}

/* Digits needed so that whole numbers below 10⁷ are written out: 10, not 1e+01. */
static int whole_digits(double value)
{
    double size = fabs(value);
    return size >= 10.0 && size < 1e7 ? (int)floor(log10(size)) + 1 : 1;
}

void sv_format_real(double value, char *text, size_t size)
{
    if (!isfinite(value)) {
        snprintf(text, size, "%s", isnan(value) ? "nan" : value > 0 ? "inf" : "-inf");
        return;
    }
    for (int digits = whole_digits(value); digits <= 17; digits++) {
        snprintf(text, size, "%.*g", digits, value);
        char *comma = strchr(text, ',');
        if (comma != NULL)
            *comma = '.';
        char *end = NULL;
        if (read_double(text, &end) == value && end != NULL)
            return;
    }
}
