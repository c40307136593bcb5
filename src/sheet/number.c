/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Numbers of the sheet: dimension, unit, conversion to the model's units, range. */
#include "sheet_internal.h"

#include <stdio.h>
#include <string.h>

static const double UNLIMITED = 1e300;

/* A scalar with something in it. */
bool sv_scalar_check(sv_reader *reader, const char *path, const sv_node *node, const char *what)
{
    if (node->kind != SV_NODE_SCALAR)
        return sv_report(reader, node, NULL, "%s: expected %s, got a %s", path, what,
                         node->kind == SV_NODE_LIST ? "list" : "mapping");
    if (node->plain && node->text[0] == '\0' && node->source != NULL)
        return sv_report(reader, node, NULL, "%s: expected %s, but there is no value", path, what);
    return true;
}

static bool report_quantity(sv_reader *reader, sv_dimension dimension, const char *path,
                            const sv_node *node, sv_parse_result result, const sv_quantity *got)
{
    char units[200], hint[300];
    const char *what = sv_dimension_name(dimension);
    sv_unit_list(dimension, units, sizeof units);
    snprintf(hint, sizeof hint, "units of %s: %s", what, units);
    if (result == SV_PARSE_WRONG_DIMENSION)
        return sv_report(reader, node, hint, "%s: expected %s, got %s (%.60s)", path, what,
                         sv_dimension_name(got->unit->dimension), node->text);
    bool comma = strchr(node->text, ',') != NULL;
    if (result == SV_PARSE_UNKNOWN_UNIT && !comma)
        return sv_report(reader, node, hint, "%s: unknown unit in %.60s", path, node->text);
    if (result == SV_PARSE_OUT_OF_RANGE)
        return sv_report(reader, node, NULL, "%s: %.60s is too large or too small for a number",
                         path, node->text);
    return sv_report(reader, node, comma ? "write a decimal point" : NULL,
                     "%s: expected %s, got %.60s", path,
                     dimension == SV_DIM_NONE ? "a number" : what, node->text);
}

/* Base units → the model's units. */
static bool convert(sv_reader *reader, const sv_quantity *quantity, const char *path,
                    const sv_node *node, double *ret_value)
{
    sv_dimension dimension = quantity->unit->dimension;
    bool needs_length = dimension == SV_DIM_LENGTH || dimension == SV_DIM_DENSITY ||
                        dimension == SV_DIM_VOLUME_DENSITY;
    double a = reader->lattice_constant;
    if (needs_length && a <= 0.0)
        return sv_report(
            reader, node, "give model.lattice_constant, as in `lattice_constant: 0.43 nm`",
            "%s: %s with a unit needs the lattice constant", path, sv_dimension_name(dimension));
    bool is_energy = dimension == SV_DIM_ENERGY || dimension == SV_DIM_ENERGY_LENGTH ||
                     dimension == SV_DIM_ENERGY_AREA;
    if (is_energy && reader->first_energy == NULL)
        reader->first_energy = node;
    *ret_value = dimension == SV_DIM_LENGTH               ? quantity->value / a
                 : dimension == SV_DIM_DENSITY            ? quantity->value * a * a
                 : dimension == SV_DIM_VOLUME_DENSITY     ? quantity->value * a * a * a
                 : is_energy && reader->energy_unit > 0.0 ? quantity->value / reader->energy_unit
                                                          : quantity->value;
    return true;
}

bool sv_number_read(sv_reader *reader, sv_dimension dimension, const char *path,
                    const sv_node *node, double *ret_value, bool *ret_has_unit)
{
    sv_quantity quantity = {0};
    double value = 0.0;
    if (!sv_scalar_check(reader, path, node,
                         dimension == SV_DIM_NONE ? "a number" : sv_dimension_name(dimension)))
        return false;
    sv_parse_result result = sv_parse_quantity(node->text, dimension, &quantity);
    if (result != SV_PARSE_OK)
        return report_quantity(reader, dimension, path, node, result, &quantity);
    value = quantity.value;
    if (quantity.has_unit && !convert(reader, &quantity, path, node, &value))
        return false;
    *ret_value = value;
    if (ret_has_unit != NULL)
        *ret_has_unit = quantity.has_unit;
    return true;
}

/* The lattice constant and the energy unit give the scale: in nm and eV, never bare; a grid may be,
 * since its model is in nm. */
static bool read_scale(sv_reader *reader, const sv_key *key, const char *path, const sv_node *node,
                       double *ret_value)
{
    sv_quantity quantity = {0};
    char units[200], hint[300];
    if (!sv_scalar_check(reader, path, node, sv_dimension_name(key->dimension)))
        return false;
    sv_parse_result result = sv_parse_quantity(node->text, key->dimension, &quantity);
    if (result != SV_PARSE_OK)
        return report_quantity(reader, key->dimension, path, node, result, &quantity);
    sv_unit_list(key->dimension, units, sizeof units);
    snprintf(hint, sizeof hint, "add one of: %s", units);
    if (!quantity.has_unit && !sv_schema_is_grid(key))
        return sv_report(reader, node, hint, "%s needs a unit, got %.60s", path, node->text);
    *ret_value = quantity.value;
    return true;
}

void sv_format_bound(double value, char *text, size_t size)
{
    if (value > -1e12 && value < 1e12 && value == (double)(int64_t)value)
        snprintf(text, size, "%lld", (long long)value);
    else
        sv_format_real(value, text, size);
}

static void describe_range(const sv_key *key, char *text, size_t size)
{
    char low[32], high[32];
    sv_format_bound(key->low, low, sizeof low);
    sv_format_bound(key->high, high, sizeof high);
    const char *from = key->low_open ? "above" : "at least";
    if (key->low == key->high)
        snprintf(text, size, "%s", low);
    else if (key->high >= UNLIMITED)
        snprintf(text, size, "%s %s", from, low);
    else if (key->low <= -UNLIMITED)
        snprintf(text, size, "at most %s", high);
    else if (key->low_open)
        snprintf(text, size, "above %s and at most %s", low, high);
    else
        snprintf(text, size, "between %s and %s", low, high);
}

bool sv_range_check(sv_reader *reader, const sv_key *key, const char *path, const sv_node *node,
                    double value)
{
    if (key->low == 0.0 && key->high == 0.0)
        return true; /* the row states no range */
    bool good = value >= key->low && value <= key->high && !(key->low_open && value <= key->low);
    if (good)
        return true;
    char range[100], number[32], shown[48] = "";
    double plain = 0.0;
    describe_range(key, range, sizeof range);
    sv_format_real(value, number, sizeof number);
    const char *text = node->kind == SV_NODE_SCALAR ? node->text : number;
    if (sv_parse_real(text, &plain) != SV_PARSE_OK)
        snprintf(shown, sizeof shown, " = %s", number);
    return sv_report(reader, node, NULL, "%s must be %s, got %.60s%s", path, range, text, shown);
}

bool sv_real_read(sv_reader *reader, const sv_key *key, const char *path, const sv_node *node,
                  double *ret_value)
{
    double value = 0.0;
    bool good = sv_schema_is_scale(key)
                    ? read_scale(reader, key, path, node, &value)
                    : sv_number_read(reader, key->dimension, path, node, &value, NULL);
    if (!good || !sv_range_check(reader, key, path, node, value))
        return false;
    *ret_value = value;
    return true;
}

bool sv_integer_read(sv_reader *reader, const char *path, const sv_node *node, int64_t *ret_value)
{
    double real = 0.0;
    if (!sv_scalar_check(reader, path, node, "a whole number"))
        return false;
    sv_parse_result result = sv_parse_integer(node->text, ret_value);
    if (result == SV_PARSE_OK)
        return true;
    if (result == SV_PARSE_OUT_OF_RANGE)
        return sv_report(reader, node, NULL, "%s: %.60s is too large", path, node->text);
    bool is_real = sv_parse_real(node->text, &real) == SV_PARSE_OK;
    return sv_report(reader, node,
                     is_real ? "write it out in digits, without point or exponent" : NULL,
                     "%s: expected a whole number, got %.60s", path, node->text);
}
