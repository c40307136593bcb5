/* SPDX-License-Identifier: GPL-3.0-or-later */
/* What the keys of the localizer ask of each other. */
#include "localizer_internal.h"

static bool fault(int key, const char *text, int *ret_key, char *message, size_t size)
{
    *ret_key = key;
    snprintf(message, size, "%s", text);
    return false;
}

static bool check_points(const sv_value *values, int *ret_key, char *message, size_t size)
{
    const sv_value *from = &values[FROM], *to = &values[TO], *points = &values[POINTS];
    if (!points->present && (from->present || to->present))
        return fault(from->present ? FROM : TO, "needs points beside it: n, or [nx, ny]", ret_key,
                     message, size);
    if (from->present != to->present)
        return fault(from->present ? FROM : TO, "is one end only: give from and to", ret_key,
                     message, size);
    if (!points->present)
        return true;
    if (points->count == 1 && !from->present)
        return fault(POINTS,
                     "is the number of points on a line, which needs from and to (a grid "
                     "has two numbers, [nx, ny])",
                     ret_key, message, size);
    if (!from->present)
        return true;
    bool same = from->real[0] == to->real[0] && from->real[1] == to->real[1];
    if (points->count == 1 && same)
        return fault(TO, "is the same point as from", ret_key, message, size);
    if (points->count == 2 && !(from->real[0] < to->real[0] && from->real[1] < to->real[1]))
        return fault(TO, "must lie above and to the right of from: they are corners of a grid",
                     ret_key, message, size);
    return true;
}

bool sv_localizer_check(const sv_value *values, int *ret_key, char *message, size_t size)
{
    const sv_value *range = &values[KAPPA_RANGE];
    if (!check_points(values, ret_key, message, size))
        return false;
    if (values[KAPPA_POINTS].present && !range->present)
        return fault(KAPPA_POINTS, "needs kappa_range beside it", ret_key, message, size);
    if (range->present && !(range->real[0] < range->real[1]))
        return fault(KAPPA_RANGE, "must be two numbers, the smaller one first", ret_key, message,
                     size);
    return true;
}
