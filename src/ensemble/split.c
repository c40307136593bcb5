/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Few realisations looked at closely, or many looked at briefly? */
#include "selvedge/ensemble.h"

#include <math.h>

/* Work for a given error of the mean, up to a factor: variance of a realisation × its cost. */
static double work(const sv_split *s, double columns)
{
    double estimator = s->estimator_error * s->estimator_error * s->columns / columns;
    return (s->disorder_deviation * s->disorder_deviation + estimator) *
           (s->seconds_fixed + s->seconds_per_column * columns);
}

bool sv_split_optimise(sv_split *split)
{
    sv_split s = *split;
    if (!(s.columns > 0.0) || !(s.estimator_error > 0.0) || !(s.seconds_per_column > 0.0) ||
        !(s.seconds_fixed >= 0.0) || !(s.disorder_deviation >= 0.0) || !(s.step > 0.0) ||
        !(s.most >= 2.0 * s.step))
        return false;
    double variance = s.estimator_error * s.estimator_error * s.columns; /* of one column */
    double best = sqrt(variance * s.seconds_fixed / s.seconds_per_column) / s.disorder_deviation;
    best = isfinite(best) ? fmin(best, s.most) : s.most; /* no disorder: one careful look */
    /* Whole blocks of columns, at least two so that the estimator knows its own error. */
    double below = fmax(2.0, floor(best / s.step)) * s.step;
    double above = fmin(below + s.step, floor(s.most / s.step) * s.step);
    s.best_columns = work(&s, above) < work(&s, below) ? above : below;
    s.work = work(&s, s.best_columns) / work(&s, s.columns);
    double estimator = variance / s.best_columns;
    s.realisations =
        (s.disorder_deviation * s.disorder_deviation + estimator) /
        (s.disorder_deviation * s.disorder_deviation + s.estimator_error * s.estimator_error);
    *split = s;
    return true;
}
