/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Verdict on one probe of the localizer: the half signature from inertia, its gap, and whether the
 * index stands. */
#include "localizer_internal.h"

#include <float.h>
#include <math.h>

/* Shifts in single precision, in units of τ. */
static const double WIDER = 1.25;
/* Relative error of the reported gap. */
static const double GAP_ACCURACY = 1e-7;

/*
 * Equal inertia a little outside ±τ in single precision, whose error must leave τ inside: proves
 * the gap at a fraction of the cost. Says nothing when it does not.
 */
static sv_status certify_quickly(sv_context *context, localizer_work *w, bool *ret_open)
{
    double shift = WIDER * w->threshold;
    sv_inertia below, above;
    sv_status status;
    *ret_open = false;
    w->reach = 0.0;
    if (!(4.0 * (double)FLT_EPSILON * (double)w->matrix.n * sv_sparse_norm_bound(&w->matrix) <
          shift))
        return SV_OK;
    if ((status = sv_inertia_factor_single(context, w->plan, &w->matrix, -shift, &below)) !=
            SV_OK ||
        (status = sv_inertia_factor_single(context, w->plan, &w->matrix, shift, &above)) != SV_OK)
        return status;
    double error = fmax(below.error, above.error);
    if (below.replaced + above.replaced > 0 || !(shift - error >= w->threshold) ||
        below.negative != above.negative)
        return SV_OK;
    *ret_open = true;
    w->negative = above.negative;
    w->certain = w->threshold;
    if (!(w->gap > 0.0) || w->want_value)
        return SV_OK;
    status = sv_inertia_distance(context, w->plan, 6, &w->reach);
    w->reach = shift + above.error + 1.01 * w->reach; /* a hundredth for rounding in the solves */
    return status;
}

/* Factors on both sides of 0, the upper side last. Clean flakes can have singular leading blocks at
 * special shifts: then a slightly larger one serves as well. */
static sv_status factor_both(sv_context *context, localizer_work *w, double *ret_shift,
                             sv_inertia *ret_below, sv_inertia *ret_above, double *ret_error)
{
    double shift = w->threshold;
    for (int attempt = 0;; attempt++) {
        sv_status status;
        if ((status = sv_inertia_factor(context, w->plan, &w->matrix, -shift, ret_below)) !=
                SV_OK ||
            (status = sv_inertia_factor(context, w->plan, &w->matrix, shift, ret_above)) != SV_OK)
            return status;
        *ret_error = fmax(ret_below->error, ret_above->error);
        *ret_shift = shift;
        if (*ret_error < 1e-6 * shift || attempt == 3)
            return SV_OK;
        shift *= 1.01;
    }
}

/* Equal inertia at ±τ: no level in between, so the index is that of any shift there. */
static sv_status certify(sv_context *context, localizer_work *w, sv_outcome *outcome)
{
    sv_inertia below, above;
    double shift, error;
    sv_status status = factor_both(context, w, &shift, &below, &above, &error);
    if (status != SV_OK)
        return status;
    bool trusted = error < 0.5 * shift, open = trusted && below.negative == above.negative;
    w->negative = above.negative;
    w->certain = open ? shift - error : 0.0;
    if (!trusted)
        UNRESOLVED(outcome, "the factorisation is too inaccurate for the threshold %.3g",
                   w->threshold);
    else if (!open)
        UNRESOLVED(outcome, "a level of the localizer lies below the threshold %.3g", shift);
    return SV_OK;
}

/* The level nearest to 0, looked for from there, which treats both signs alike, or from beside it
 * if that is singular. */
static sv_status find_lowest(sv_context *context, localizer_work *w)
{
    sv_inertia inertia;
    sv_inertia_levels levels;
    double shift = 0.0;
    sv_status status = sv_inertia_factor(context, w->plan, &w->matrix, shift, &inertia);
    if (status == SV_OK && inertia.replaced > 0) {
        shift = 1e-3 * w->threshold;
        status = sv_inertia_factor(context, w->plan, &w->matrix, shift, &inertia);
    }
    if (status == SV_OK)
        status =
            sv_inertia_levels_near(context, w->plan, &inertia, shift, GAP_ACCURACY, 0.0, &levels);
    if (status == SV_OK)
        w->lowest = fmin(fabs(levels.below), fabs(levels.above));
    return status;
}

/* Is the localizer gap larger than the pristine one? */
static sv_status exceeds_gap(sv_context *context, localizer_work *w, bool *ret_exceeds)
{
    sv_inertia one;
    *ret_exceeds = w->gap > 0.0;
    if (w->gap > 0.0 && w->want_value)
        *ret_exceeds = w->lowest > w->gap;
    if (!*ret_exceeds || w->want_value)
        return SV_OK;
    /* A level known to lie inside settles it. */
    *ret_exceeds = !(w->reach > 0.0 && w->reach < w->gap);
    for (int side = 1; side >= -1 && *ret_exceeds; side -= 2) {
        sv_status status = sv_inertia_factor(context, w->plan, &w->matrix, side * w->gap, &one);
        if (status != SV_OK)
            return status;
        *ret_exceeds = one.negative == w->negative;
    }
    return SV_OK;
}

/*
 * How far down the index must not change: κ/2. A localizer gap above g is found in trivial phases,
 * but also where κ is too large and the integer wrong: then down to a quarter of 2g/ρ, and at least
 * to κ/4.
 */
static sv_status least_kappa(sv_context *context, localizer_work *w, double *ret_kappa)
{
    bool exceeds = false;
    sv_status status = exceeds_gap(context, w, &exceeds);
    if (status != SV_OK)
        return status;
    *ret_kappa = 0.5 * w->kappa;
    if (exceeds) {
        double radius = sv_localizer_radius(w->sample->flake, w->at);
        *ret_kappa = fmin(0.25 * w->kappa, 0.5 * w->gap / fmax(radius, 1.0));
    }
    return SV_OK;
}

/* Follows the index from κ/2 down by halves; false when it changes or cannot be decided. */
static sv_status follow_index(sv_context *context, localizer_work *w, double least,
                              sv_outcome *outcome, bool *ret_steady)
{
    sv_inertia_count count;
    *ret_steady = true;
    for (double kappa = 0.5 * w->kappa; *ret_steady; kappa *= 0.5) {
        sv_localizer_move(w->sample, kappa, w->at, &w->matrix);
        sv_status status = sv_inertia_count_below(context, w->plan, &w->matrix, 0.0, &count);
        if (status != SV_OK)
            return status;
        *ret_steady = count.decided && count.below == w->negative;
        if (!*ret_steady)
            UNRESOLVED(outcome, "the index differs between kappa %.3g and %.3g", w->kappa, kappa);
        if (kappa <= least * (1.0 + 1e-12))
            break;
    }
    return SV_OK;
}

sv_status sv_localizer_judge(sv_context *context, localizer_work *w, sv_outcome *outcome)
{
    bool steady = false, open;
    double least;
    sv_status status = certify_quickly(context, w, &open);
    if (status == SV_OK && !open)
        status = certify(context, w, outcome);
    if (status == SV_OK && w->want_value)
        status = find_lowest(context, w);
    if (status != SV_OK)
        return status;
    outcome->margin = w->want_value ? w->lowest : w->certain;
    if (!(w->certain > 0.0))
        return SV_OK;
    if ((status = least_kappa(context, w, &least)) != SV_OK ||
        (status = follow_index(context, w, least, outcome, &steady)) != SV_OK)
        return status;
    if (!steady)
        return SV_OK;
    outcome->verdict = SV_RESOLVED;
    outcome->index = w->negative - w->sample->n;
    outcome->value = (double)outcome->index;
    return SV_OK;
}

sv_status sv_localizer_certify_gap(sv_context *context, localizer_work *w)
{
    const double share = 0.999; /* Lanczos finds a level, inertia that there is none nearer */
    sv_inertia below, above;
    double shift = share * w->lowest;
    if (!(w->certain > 0.0) || !w->want_value || !(shift > w->certain))
        return SV_OK;
    sv_localizer_move(w->sample, w->kappa, w->at, &w->matrix);
    sv_status status = sv_inertia_factor(context, w->plan, &w->matrix, -shift, &below);
    if (status == SV_OK)
        status = sv_inertia_factor(context, w->plan, &w->matrix, shift, &above);
    if (status != SV_OK)
        return status;
    double error = fmax(below.error, above.error);
    if (error < 0.5 * shift && below.negative == w->negative && above.negative == w->negative)
        w->certain = shift - error;
    return SV_OK;
}
