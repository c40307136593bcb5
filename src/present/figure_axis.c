/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Axes of figures over swept parameters: numbers that fit tick labels, names with units. */
#include <math.h>
#include <stdio.h>
#include <string.h>

#include "figure_internal.h"

/* A pair has one place on an axis: a flux p/q its ratio, a size the side of the square of its area,
 * anything else its first number. */
static double plain_number(const sv_coordinate *c)
{
    if (!c->pair)
        return c->value;
    if (strcmp(c->path, "model.flux") == 0)
        return c->value / c->second;
    if (strncmp(c->path, "flake.", 6) == 0)
        return sqrt(c->value * c->second);
    return c->value;
}

/* Power of ten taken out of the axis when its numbers are too long for tick labels. */
static int choose_exponent(const sv_result *result, int axis)
{
    double largest = 0.0;
    for (int32_t i = 0; i < result->n_points; i++)
        largest = fmax(largest, fabs(plain_number(&result->points[i].coordinates[axis])));
    bool short_enough = largest == 0.0 || (largest < 1e5 && largest >= 1e-3);
    return short_enough ? 0 : (int)floor(log10(largest));
}

/* cm^-2 as cm⁻², and the power of ten in the same way. */
static void raise_exponents(const char *plain, char *text, size_t size)
{
    static const char *const raised[] = {"\u2070", "\u00b9", "\u00b2", "\u00b3", "\u2074",
                                         "\u2075", "\u2076", "\u2077", "\u2078", "\u2079"};
    size_t used = 0;
    bool up = false;
    for (; *plain != '\0' && used + 5 < size; plain++) {
        if (*plain == '^') {
            up = true;
            continue;
        }
        up = up && (*plain == '-' || (*plain >= '0' && *plain <= '9'));
        char one[2] = {*plain, '\0'};
        const char *sign = !up ? one : *plain == '-' ? "\u207b" : raised[*plain - '0'];
        used += (size_t)snprintf(text + used, size - used, "%s", sign);
    }
    text[used] = '\0';
}

/* "vacancy density (growth) [10¹³ cm⁻²]" */
static void choose_name(const sv_coordinate *c, int exponent, char *text, size_t size)
{
    char plain[400], power[440];
    sv_words_parameter(c, plain, sizeof plain);
    if (exponent != 0 && c->unit != NULL && strrchr(plain, '[') != NULL) {
        int head = (int)(strrchr(plain, '[') - plain);
        snprintf(power, sizeof power, "%.*s[10^%d %s", head, plain, exponent, plain + head + 1);
    } else if (exponent != 0) {
        snprintf(power, sizeof power, "%s [10^%d]", plain, exponent);
    } else {
        snprintf(power, sizeof power, "%s%s", plain,
                 c->pair && strncmp(c->path, "flake.", 6) == 0 ? ", geometric mean" : "");
    }
    raise_exponents(power, text, size);
}

void sv_axis_make(const sv_result *result, int axis, sv_axis *ret_axis)
{
    ret_axis->number = axis;
    ret_axis->exponent = choose_exponent(result, axis);
    choose_name(&result->points[0].coordinates[axis], ret_axis->exponent, ret_axis->name,
                sizeof ret_axis->name);
}

double sv_axis_value(const sv_axis *axis, const sv_point_result *point)
{
    return plain_number(&point->coordinates[axis->number]) / pow(10.0, axis->exponent);
}
