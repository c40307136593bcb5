/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Points of a sweep against the first one and against their neighbours, realisation by
 * realisation. */
#include "program_internal.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

/* Above, the list would be larger than all the rest. */
enum { MOST_COMPARED = 10000 };

/* Points along one axis: equal in the other coordinate, ascending in this one. */
typedef struct ordered {
    double other, value;
    int32_t point;
} ordered;

static int compare_ordered(const void *a, const void *b)
{
    const ordered *x = a, *y = b;
    if (x->other != y->other)
        return x->other < y->other ? -1 : 1;
    if (x->value != y->value)
        return x->value < y->value ? -1 : 1;
    return x->point < y->point ? -1 : x->point > y->point;
}

/* Appends one row per marker; counts what it would append without a list. */
typedef struct list {
    session *s;
    const sv_ensemble *ensemble;
    const int64_t *counted;
    sv_compared *rows; /* or NULL */
    int32_t n;
} list;

static sv_status append(list *l, int32_t number, int32_t other, bool first, bool neighbour)
{
    const sv_case *problem = &l->s->points[0].problem;
    sv_status status = SV_OK;
    for (int m = 0; status == SV_OK && m < problem->n_markers; m++, l->n++) {
        if (l->rows == NULL)
            continue;
        sv_compared *row = &l->rows[l->n];
        *row = (sv_compared){.first = first, .neighbour = neighbour};
        status = sv_compare_points(l->s->context, l->ensemble, problem, m, l->counted, other,
                                   number, &row->comparison);
    }
    return status;
}

/* Along one axis each point with the one before it. `first` marks what is in the list already. */
static sv_status append_neighbours(list *l, int axis, ordered *order)
{
    session *s = l->s;
    sv_status status = SV_OK;
    for (int32_t k = 0; k < s->n_points; k++) {
        const point *p = &s->points[k];
        order[k] = (ordered){p->n_coordinates > 1 ? p->coordinates[1 - axis].value : 0.0,
                             p->coordinates[axis].value, k};
    }
    qsort(order, (size_t)s->n_points, sizeof *order, compare_ordered);
    for (int32_t k = 1; status == SV_OK && k < s->n_points; k++)
        if (order[k].other == order[k - 1].other && order[k - 1].point != 0 && order[k].point != 0)
            status = append(l, order[k].point, order[k - 1].point, false, true);
    return status;
}

/* Is point 0 next to this one along an axis? Only then is the first one a neighbour too. */
static sv_status mark_first_neighbours(session *s, bool *is_next, ordered *order)
{
    for (int axis = 0; axis < s->points[0].n_coordinates; axis++) {
        for (int32_t k = 0; k < s->n_points; k++) {
            const point *p = &s->points[k];
            order[k] = (ordered){p->n_coordinates > 1 ? p->coordinates[1 - axis].value : 0.0,
                                 p->coordinates[axis].value, k};
        }
        qsort(order, (size_t)s->n_points, sizeof *order, compare_ordered);
        for (int32_t k = 1; k < s->n_points; k++)
            if (order[k].other == order[k - 1].other)
                is_next[order[k].point == 0 ? order[k - 1].point : order[k].point] |=
                    order[k].point == 0 || order[k - 1].point == 0;
    }
    return SV_OK;
}

static sv_status fill(list *l, const bool *is_next, ordered *order)
{
    session *s = l->s;
    sv_status status = SV_OK;
    l->n = 0;
    for (int32_t k = 1; status == SV_OK && k < s->n_points; k++)
        status = append(l, k, 0, true, is_next[k]);
    for (int axis = 0; status == SV_OK && axis < s->points[0].n_coordinates; axis++)
        status = append_neighbours(l, axis, order);
    return status;
}

/* Holm over each marker: all with the first point, and all other neighbours. */
static sv_status adjust(session *s, sv_compared *rows, int32_t n)
{
    double *p = NULL, *adjusted = NULL;
    sv_status status = sv_take(s->context, n, sizeof *p, &p);
    if (status == SV_OK)
        status = sv_take(s->context, n, sizeof *adjusted, &adjusted);
    int markers = s->points[0].problem.n_markers;
    for (int family = 0; status == SV_OK && family < 2 * markers; family++) {
        for (int32_t k = 0; k < n; k++)
            p[k] = k % markers == family / 2 && rows[k].first == (family % 2 == 0)
                       ? rows[k].comparison.p_value
                       : (double)NAN;
        status = sv_adjust_p_values(s->context, p, n, adjusted);
        for (int32_t k = 0; status == SV_OK && k < n; k++)
            if (k % markers == family / 2 && rows[k].first == (family % 2 == 0))
                rows[k].comparison.adjusted_p_value = adjusted[k];
    }
    sv_give(s->context, p);
    sv_give(s->context, adjusted);
    return status;
}

sv_status comparisons_make(session *s, const sv_ensemble *ensemble, sv_result *result)
{
    list l = {.s = s, .ensemble = ensemble};
    int64_t *counted = NULL;
    bool *is_next = NULL;
    ordered *order = NULL;
    if (s->n_points < 2 || s->n_points > MOST_COMPARED)
        return SV_OK;
    sv_status status = sv_take(s->context, s->n_points, sizeof *counted, &counted);
    if (status == SV_OK)
        status = sv_take(s->context, s->n_points, sizeof *is_next, &is_next);
    if (status == SV_OK)
        status = sv_take(s->context, s->n_points, sizeof *order, &order);
    if (status != SV_OK)
        goto out;
    for (int32_t k = 0; k < s->n_points; k++)
        counted[k] = result->points[k].realisations;
    l.counted = counted;
    if ((status = mark_first_neighbours(s, is_next, order)) != SV_OK ||
        (status = fill(&l, is_next, order)) != SV_OK ||
        (status = sv_take(s->context, l.n, sizeof *l.rows, &result->comparisons)) != SV_OK)
        goto out;
    l.rows = result->comparisons;
    status = fill(&l, is_next, order);
    if (status == SV_OK)
        status = adjust(s, l.rows, l.n);
    result->n_comparisons = l.n;
out:
    sv_give(s->context, counted);
    sv_give(s->context, is_next);
    sv_give(s->context, order);
    return status;
}
