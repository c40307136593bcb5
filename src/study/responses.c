/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Responses kept by value of the parameter. */
#include <math.h>
#include <string.h>

#include "study_internal.h"

void sv_responses_free(sv_context *context, response_table *table)
{
    for (int k = 0; k < table->n; k++)
        sv_give(context, table->points[k].values);
    sv_give(context, table->points);
    *table = (response_table){0};
}

static sv_status grow(sv_context *context, response_table *table)
{
    int capacity = table->capacity == 0 ? 32 : 2 * table->capacity;
    response_point *points = NULL;
    sv_status status = sv_take(context, capacity, sizeof *points, &points);
    if (status != SV_OK)
        return status;
    if (table->n > 0)
        memcpy(points, table->points, (size_t)table->n * sizeof *points);
    sv_give(context, table->points);
    table->points = points;
    table->capacity = capacity;
    return SV_OK;
}

sv_status sv_responses_place(sv_context *context, response_table *table, double parameter,
                             int *ret_number)
{
    int k = 0;
    while (k < table->n && table->points[k].parameter < parameter)
        k++;
    if (k == table->n || table->points[k].parameter != parameter) {
        sv_status status = table->n == table->capacity ? grow(context, table) : SV_OK;
        if (status != SV_OK)
            return status;
        memmove(&table->points[k + 1], &table->points[k],
                (size_t)(table->n - k) * sizeof *table->points);
        table->points[k] = (response_point){.parameter = parameter};
        table->n++;
    }
    *ret_number = k;
    return SV_OK;
}

int sv_responses_nearest(const response_table *table, double parameter)
{
    int best = -1;
    for (int k = 0; k < table->n; k++)
        if (best < 0 || fabs(table->points[k].parameter - parameter) <
                            fabs(table->points[best].parameter - parameter))
            best = k;
    return best;
}

response_moments sv_responses_moments(const response_point *point, int64_t first)
{
    response_moments m = {0};
    double sum = 0.0;
    for (int64_t k = first; k < point->n; k++)
        if (!isnan(point->values[k])) {
            sum += point->values[k];
            m.n++;
        }
    m.mean = m.n > 0 ? sum / (double)m.n : (double)NAN;
    for (int64_t k = first; k < point->n; k++)
        if (!isnan(point->values[k]))
            m.squares += (point->values[k] - m.mean) * (point->values[k] - m.mean);
    return m;
}
