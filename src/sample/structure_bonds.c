/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Hops of a structure by the rules of its model: neighbours by bins as wide as the longest rule. */
#include "structure_internal.h"

#include <math.h>
#include <string.h>

/* Ways over common neighbours this close in length are equally short, relative. */
static const double EQUAL = 1e-9;

typedef struct joiner {
    const sv_model *model;
    sv_structure *s;
    sv_table_fault *fault;
    double low[2], width; /* bins */
    int64_t count[2];
    int32_t *first, *next; /* per bin, per site; −1: none */
    sv_index room[2];      /* of bond_to, bond */
    sv_index used;
} joiner;

static int64_t bin_of(const joiner *j, double x, int axis)
{
    int64_t k = (int64_t)floor((x - j->low[axis]) / j->width);
    return k < 0 ? 0 : k >= j->count[axis] ? j->count[axis] - 1 : k;
}

static sv_status fill_bins(sv_context *context, joiner *j)
{
    sv_structure *s = j->s;
    double high[2] = {s->at[0][0], s->at[0][1]}, reach = 0.0;
    memcpy(j->low, s->at[0], sizeof j->low);
    for (sv_index k = 0; k < s->n; k++)
        for (int d = 0; d < 2; d++) {
            j->low[d] = fmin(j->low[d], s->at[k][d]);
            high[d] = fmax(high[d], s->at[k][d]);
        }
    for (int r = 0; r < j->model->n_rules; r++) {
        double range[2];
        sv_rule_range(&j->model->rules[r], range);
        reach = fmax(reach, range[1]);
    }
    /* No more bins than a few a site, whatever the shape of the box. */
    double x = high[0] - j->low[0], y = high[1] - j->low[1], n = (double)s->n;
    j->width = fmax(reach * (1.0 + 1e-12), fmax(sqrt(x * y / n), fmax(x, y) / (4.0 * n)));
    sv_index bins = 1;
    for (int d = 0; d < 2; d++) {
        j->count[d] = (int64_t)((high[d] - j->low[d]) / j->width) + 1;
        bins *= j->count[d];
    }
    sv_status status;
    if ((status = sv_take_raw(context, bins, sizeof *j->first, &j->first)) != SV_OK ||
        (status = sv_take_raw(context, s->n, sizeof *j->next, &j->next)) != SV_OK)
        return status;
    memset(j->first, 0xff, (size_t)bins * sizeof *j->first);
    for (sv_index k = s->n - 1; k >= 0; k--) { /* backwards: lists then go up */
        sv_index bin = bin_of(j, s->at[k][0], 0) * j->count[1] + bin_of(j, s->at[k][1], 1);
        j->next[k] = j->first[bin];
        j->first[bin] = (int32_t)k;
    }
    return SV_OK;
}

/* ⟨to|H|from⟩ of a rule without its phase; false: the rule does not join them. */
static bool match(const sv_distance_rule *rule, int from, int to, double r, sv_complex *ret)
{
    bool along = rule->from == from && rule->to == to,
         against = rule->from == to && rule->to == from;
    double range[2];
    sv_rule_range(rule, range);
    if ((!along && !against) || r < range[0] || r > range[1])
        return false;
    double factor = rule->decay > 0.0 ? exp(-(r - rule->distance) / rule->decay) : 1.0;
    *ret = factor * (along ? rule->amplitude : conj(rule->amplitude));
    return true;
}

static double distance(const sv_structure *s, sv_index a, sv_index b)
{
    return hypot(s->at[b][0] - s->at[a][0], s->at[b][1] - s->at[a][1]);
}

static bool is_joined(const sv_structure *near, sv_index a, sv_index b)
{
    for (sv_index k = near->bond_start[a]; k < near->bond_start[a + 1]; k++)
        if (near->bond_to[k] == b)
            return true;
    return false;
}

/* Turn over the common neighbour on the shortest way: +1 right, −1 left, 0 none. */
static sv_status find_turn(sv_context *context, const joiner *j, const sv_structure *near,
                           sv_index from, sv_index to, int *ret_turn)
{
    const sv_structure *s = j->s;
    double best = INFINITY;
    sv_index over = -1;
    *ret_turn = 0;
    for (sv_index k = near->bond_start[from]; k < near->bond_start[from + 1]; k++) {
        sv_index middle = near->bond_to[k];
        if (middle == to || !is_joined(near, middle, to))
            continue;
        const double *a = s->at[from], *b = s->at[middle], *c = s->at[to];
        double cross = (b[0] - a[0]) * (c[1] - b[1]) - (b[1] - a[1]) * (c[0] - b[0]);
        double first = distance(s, from, middle), second = distance(s, middle, to);
        if (fabs(cross) < 1e-9 * first * second || first + second > best * (1.0 + EQUAL))
            continue;
        int turn = cross < 0.0 ? 1 : -1;
        if (first + second > best * (1.0 - EQUAL) && turn != *ret_turn)
            return sv_structure_fail(
                context, j->fault, s->line[to], 1,
                "a phase by the turn needs one common neighbour nearer than the others",
                "between this site and that of line %d the ways over lines %d and %d are equally "
                "short and turn to opposite sides",
                s->line[from], s->line[over], s->line[middle]);
        best = fmin(best, first + second);
        over = middle;
        *ret_turn = turn;
    }
    return SV_OK;
}

static sv_status add_bond(sv_context *context, joiner *j, sv_index to, sv_complex value)
{
    sv_structure *s = j->s;
    sv_status status =
        sv_reserve(context, &s->bond_to, &j->room[0], j->used + 1, sizeof *s->bond_to);
    if (status == SV_OK)
        status = sv_reserve(context, &s->bond, &j->room[1], j->used + 1, sizeof *s->bond);
    if (status != SV_OK)
        return status;
    s->bond_to[j->used] = (int32_t)to;
    s->bond[j->used++] = value;
    return SV_OK;
}

/* The hop that ends at `row` and starts at `other`, by the rules of one kind. */
static sv_status join_pair(sv_context *context, joiner *j, const sv_structure *near, sv_index row,
                           sv_index other)
{
    sv_structure *s = j->s;
    double r = distance(s, row, other);
    for (int k = 0; k < j->model->n_rules; k++) {
        const sv_distance_rule *rule = &j->model->rules[k];
        sv_complex value = 0.0;
        int turn = 0;
        if ((near == NULL && rule->phase != 0.0) ||
            !match(rule, s->species[other], s->species[row], r, &value))
            continue;
        if (rule->phase != 0.0) {
            sv_status status = find_turn(context, j, near, other, row, &turn);
            if (status != SV_OK)
                return status;
            if (turn == 0)
                continue;
            value *= CMPLX(cos(rule->phase), turn * sin(rule->phase));
        }
        s->longest = fmax(s->longest, r);
        return add_bond(context, j, other, value); /* rules of two species never meet */
    }
    return SV_OK;
}

/* near NULL: rules without a phase only; else all of them. */
static sv_status join_all(sv_context *context, joiner *j, const sv_structure *near)
{
    sv_structure *s = j->s;
    sv_status status = sv_take(context, s->n + 1, sizeof *s->bond_start, &s->bond_start);
    for (sv_index row = 0; row < s->n && status == SV_OK; row++) {
        int64_t x = bin_of(j, s->at[row][0], 0), y = bin_of(j, s->at[row][1], 1);
        if ((row & 0xffff) == 0 && sv_cancelled(context))
            return SV_FAIL(context, SV_INTERRUPTED, "stopped while hops were looked for");
        for (int64_t a = x > 0 ? x - 1 : 0; a <= x + 1 && a < j->count[0]; a++)
            for (int64_t b = y > 0 ? y - 1 : 0; b <= y + 1 && b < j->count[1]; b++)
                for (int32_t other = j->first[a * j->count[1] + b]; other >= 0 && status == SV_OK;
                     other = j->next[other])
                    if (other != row)
                        status = join_pair(context, j, near, row, other);
        s->bond_start[row + 1] = j->used;
    }
    return status;
}

sv_status sv_structure_join(sv_context *context, const sv_model *model, sv_structure *s,
                            sv_table_fault *fault)
{
    joiner j = {.model = model, .s = s, .fault = fault};
    bool turns = false;
    sv_structure near = {0};
    for (int k = 0; k < model->n_rules; k++)
        turns = turns || model->rules[k].phase != 0.0;
    sv_status status = fill_bins(context, &j);
    if (status == SV_OK)
        status = join_all(context, &j, NULL);
    if (status == SV_OK && turns) {
        near = (sv_structure){.bond_start = s->bond_start, .bond_to = s->bond_to, .bond = s->bond};
        s->bond_start = NULL;
        s->bond_to = NULL;
        s->bond = NULL;
        j.used = j.room[0] = j.room[1] = 0;
        status = join_all(context, &j, &near);
    }
    sv_structure_free(context, &near);
    sv_give(context, j.first);
    sv_give(context, j.next);
    return status;
}
