/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Where the curves of two sizes cross, if they do. */
#include "scaling_internal.h"

#include <math.h>
#include <stdio.h>
#include <string.h>

/* Parameters both sizes have, as pairs of rows. */
typedef struct common {
    sv_index *rows[2];
    double *weights; /* scratch of 2n */
    sv_index *both;  /* scratch of 2n */
    sv_index n;
} common;

static sv_status find_common(sv_context *context, const scaling_table *t, int small, int large,
                             common *c)
{
    sv_status status = sv_take(context, 4 * t->n, sizeof *c->both, &c->both);
    if (status == SV_OK)
        status = sv_take(context, 2 * t->n, sizeof *c->weights, &c->weights);
    if (status != SV_OK)
        return status;
    c->rows[0] = c->both + 2 * t->n;
    c->rows[1] = c->rows[0] + t->n;
    sv_index j = t->first[large];
    for (sv_index i = t->first[small]; i < t->first[small + 1]; i++) {
        while (j < t->first[large + 1] && t->parameter[j] < t->parameter[i])
            j++;
        if (j == t->first[large + 1] || t->parameter[j] != t->parameter[i] ||
            !sv_scaling_usable(t, i) || !sv_scaling_usable(t, j))
            continue;
        c->rows[0][c->n] = i;
        c->rows[1][c->n++] = j;
    }
    return SV_OK;
}

static double difference(const common *c, const double *means, sv_index i)
{
    return means[c->rows[1][i]] - means[c->rows[0][i]];
}

/* Sum of the differences from `first` to before `end`, in its standard errors. */
static double evidence(const scaling_table *t, common *c, sv_index first, sv_index end)
{
    double sum = 0.0;
    sv_index n = 0;
    for (sv_index i = first; i < end; i++) {
        sum += difference(c, t->mean, i);
        for (int side = 0; side < 2; side++) {
            c->both[n] = c->rows[side][i];
            c->weights[n++] = side == 0 ? -1.0 : 1.0;
        }
    }
    double variance = sv_scaling_variance(t, c->both, c->weights, n);
    return variance > 0.0 ? sum / sqrt(variance) : 0.0;
}

/* The split with the best evidence of opposite signs: the rows before it lie below. 0: none. */
static sv_index find_split(const scaling_table *t, common *c, double ret_evidence[2])
{
    sv_index best = 0;
    double most = 0.0;
    for (sv_index i = 1; i < c->n; i++) {
        double below = evidence(t, c, 0, i), above = evidence(t, c, i, c->n);
        double least = below * above < 0.0 ? fmin(fabs(below), fabs(above)) : 0.0;
        if (least <= most)
            continue;
        most = least;
        best = i;
        ret_evidence[0] = below;
        ret_evidence[1] = above;
    }
    return best;
}

static void choose_window(const scaling_table *t, common *c, sv_index split, scaling_pair *pair)
{
    sv_index lo = split > CROSSING_SIDE ? split - CROSSING_SIDE : 0;
    sv_index hi = split + CROSSING_SIDE < c->n ? split + CROSSING_SIDE : c->n;
    pair->n = (int)(hi - lo);
    pair->degree = pair->n < 5 ? 1 : 2;
    for (sv_index i = lo; i < hi; i++) {
        const sv_index rows[2] = {c->rows[0][i], c->rows[1][i]};
        const double weights[2] = {-1.0, 1.0};
        double error = hypot(t->error[rows[0]], t->error[rows[1]]);
        /* Shared random numbers make a difference better known than its parts, never free. */
        double variance = fmax(sv_scaling_variance(t, rows, weights, 2), 0.01 * error * error);
        pair->rows[0][i - lo] = rows[0];
        pair->rows[1][i - lo] = rows[1];
        pair->weights[i - lo] = 1.0 / sqrt(variance);
    }
    const double *p = t->parameter;
    pair->start = 0.5 * (p[c->rows[0][split - 1]] + p[c->rows[0][split]]);
    pair->bracket[0] = p[c->rows[0][lo]];
    pair->bracket[1] = p[c->rows[0][hi - 1]];
}

/* Coefficients of the local polynomial of the differences in u = (p − start)/width. */
static bool fit_local(const scaling_table *t, const scaling_pair *pair, const double *means,
                      double *ret_coefficients)
{
    double columns[3 * 2 * CROSSING_SIDE], r[MOST_PARAMETERS * MOST_PARAMETERS];
    const double width = pair->bracket[1] - pair->bracket[0];
    for (int i = 0; i < pair->n; i++) {
        double u = (t->parameter[pair->rows[0][i]] - pair->start) / width, power = 1.0;
        for (int d = 0; d <= pair->degree; d++, power *= u)
            columns[d * pair->n + i] = power * pair->weights[i];
    }
    if (!sv_scaling_orthonormal(columns, pair->n, pair->degree + 1, r))
        return false;
    for (int d = 0; d <= pair->degree; d++) {
        ret_coefficients[d] = 0.0;
        for (int i = 0; i < pair->n; i++)
            ret_coefficients[d] += columns[d * pair->n + i] * pair->weights[i] *
                                   (means[pair->rows[1][i]] - means[pair->rows[0][i]]);
    }
    sv_scaling_back_substitute(r, pair->degree + 1, ret_coefficients);
    return true;
}

/* Mean of both sizes at p, between the neighbours. */
static double height_at(const scaling_table *t, const scaling_pair *pair, const double *means,
                        double p)
{
    int i = 1;
    while (i + 1 < pair->n && t->parameter[pair->rows[0][i]] < p)
        i++;
    double low = t->parameter[pair->rows[0][i - 1]], high = t->parameter[pair->rows[0][i]];
    double share = (p - low) / (high - low), sum = 0.0;
    for (int side = 0; side < 2; side++)
        sum += (1.0 - share) * means[pair->rows[side][i - 1]] + share * means[pair->rows[side][i]];
    return 0.5 * sum;
}

double sv_scaling_root(const scaling_table *t, const scaling_pair *pair, const double *means,
                       double *ret_height)
{
    double c[3] = {0}, roots[2] = {(double)NAN, (double)NAN};
    const double width = pair->bracket[1] - pair->bracket[0];
    if (pair->n < 2 || !fit_local(t, pair, means, c))
        return NAN;
    double inside = c[1] * c[1] - 4.0 * c[2] * c[0];
    if (inside >= 0.0) { /* the form without cancellation; c[2] may be 0 */
        double q = -0.5 * (c[1] + copysign(sqrt(inside), c[1]));
        roots[0] = q != 0.0 ? c[0] / q : (double)NAN;
        roots[1] = c[2] != 0.0 ? q / c[2] : (double)NAN;
    }
    double nearest = NAN;
    for (int i = 0; i < 2; i++) {
        double p = pair->start + width * roots[i];
        if (!(p >= pair->bracket[0] && p <= pair->bracket[1]))
            continue;
        if (isnan(nearest) || fabs(p - pair->start) < fabs(nearest - pair->start))
            nearest = p;
    }
    if (!isnan(nearest) && ret_height != NULL)
        *ret_height = height_at(t, pair, means, nearest);
    return nearest;
}

static void explain(const common *c, sv_index split, sv_scaling_crossing *crossing)
{
    const double *z = crossing->evidence;
    if (c->n < 3)
        snprintf(crossing->reason, sizeof crossing->reason,
                 "only %d parameters have a mean and an error for both sizes", (int)c->n);
    else if (split == 0)
        snprintf(crossing->reason, sizeof crossing->reason,
                 "the difference of the curves has the same sign everywhere");
    else if (fmin(fabs(z[0]), fabs(z[1])) < 2.0)
        snprintf(crossing->reason, sizeof crossing->reason,
                 "the curves differ by %+.1f standard errors below and %+.1f above the best place",
                 z[0], z[1]);
    else if (isnan(crossing->at.value))
        snprintf(crossing->reason, sizeof crossing->reason,
                 "the local fit has no root between the parameters around %.6g",
                 crossing->at.interval[0]);
}

sv_status sv_scaling_cross(sv_context *context, const scaling_table *t, int small, int large,
                           scaling_pair *ret_pair, sv_scaling_crossing *ret_crossing)
{
    common c = {0};
    scaling_pair pair = {0};
    sv_scaling_crossing crossing = {.sizes = {t->sizes[small], t->sizes[large]},
                                    .at = {(double)NAN, (double)NAN, {(double)NAN, (double)NAN}},
                                    .height = (double)NAN};
    sv_status status = find_common(context, t, small, large, &c);
    if (status == SV_OK) {
        sv_index split = c.n >= 3 ? find_split(t, &c, crossing.evidence) : 0;
        const double *z = crossing.evidence;
        if (split > 0 && fmin(fabs(z[0]), fabs(z[1])) >= 2.0) {
            choose_window(t, &c, split, &pair);
            crossing.at.value = sv_scaling_root(t, &pair, t->mean, &crossing.height);
            crossing.at.interval[0] = pair.start;
        }
        explain(&c, split, &crossing);
        crossing.at.interval[0] = NAN;
        crossing.found = crossing.reason[0] == '\0';
        *ret_pair = pair;
        *ret_crossing = crossing;
    }
    sv_give(context, c.both);
    sv_give(context, c.weights);
    return status;
}
