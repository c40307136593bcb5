/* SPDX-License-Identifier: GPL-3.0-or-later */
/* From one flux to the next: which levels went over into which, and which rose or fell through the
 * Fermi energy. Sums over groups of levels are used, so that a degenerate level does no harm. */
#include "flow_internal.h"

#include <cblas.h>
#include <math.h>

/* A level counts as found again with this share, a number of crossings as whole within one less
 * that. */
static const double FOUND = 0.8;

/* |⟨a|b⟩|² of levels i of a and j of b at [i + j·count of a]. */
static sv_status overlaps(sv_context *context, const flow_ring *ring, const flow_levels *a,
                          const flow_levels *b, double **ret_share)
{
    const sv_complex one = 1.0, zero = 0.0;
    sv_complex *o = NULL;
    double *share = NULL;
    sv_index size = (sv_index)a->count * b->count;
    int n = (int)ring->sample->n;
    sv_status status = sv_take(context, size, sizeof *o, &o);
    if (status == SV_OK)
        status = sv_take(context, size, sizeof *share, &share);
    if (status == SV_OK && size > 0)
        cblas_zgemm(CblasColMajor, CblasConjTrans, CblasNoTrans, a->count, b->count, n, &one,
                    a->vectors, n, b->vectors, n, &zero, o, a->count);
    for (sv_index k = 0; status == SV_OK && k < size; k++)
        share[k] = creal(o[k]) * creal(o[k]) + cimag(o[k]) * cimag(o[k]);
    sv_give(context, o);
    if (status == SV_OK)
        *ret_share = share;
    return status;
}

/* Least share of a level of `one` near the Fermi energy that is found among all of the other. */
static double least_found(const flow_levels *one, const flow_levels *other, const double *share,
                          bool columns)
{
    double least = 1.0;
    for (int i = 0; i < one->count; i++) {
        double sum = 0.0;
        if (fabs(one->energies[i]) > 0.5 * one->half_width)
            continue;
        for (int j = 0; j < other->count; j++)
            sum += columns ? share[j + (sv_index)i * other->count]
                           : share[i + (sv_index)j * one->count];
        least = fmin(least, sum);
    }
    return least;
}

/* Weight on its own side of a crossing pair. */
static double own_side(const flow_levels *a, int i, const flow_levels *b, int j, int side)
{
    double wa = a->weights[i], wb = b->weights[j];
    return side == 0 ? fmin(wa, wb) : fmin(1.0 - wa, 1.0 - wb);
}

/* Shares that pass from below to above ([0]) and from above to below ([1]), by part of a and b. */
static void sum_crossings(const flow_levels *a, const flow_levels *b, const double *share,
                          double sums[2][2][2], flow_step *step)
{
    for (int i = 0; i < a->count; i++)
        for (int j = 0; j < b->count; j++) {
            bool up = a->energies[i] < 0.0 && b->energies[j] >= 0.0;
            bool down = a->energies[i] >= 0.0 && b->energies[j] < 0.0;
            int from = i >= a->n_inner, to = j >= b->n_inner;
            double s = share[i + (sv_index)j * a->count];
            if (!up && !down)
                continue;
            sums[down][from][to] += s;
            if (from != to || s <= 0.25)
                continue;
            step->side = fmin(step->side, own_side(a, i, b, j, from));
            step->coupling = fmax(step->coupling, fmax(a->couplings[i], b->couplings[j]));
        }
}

sv_status sv_flow_step_follow(sv_context *context, const flow_ring *ring, const flow_levels *a,
                              const flow_levels *b, flow_step *ret_step)
{
    double *share = NULL, sums[2][2][2] = {{{0}}};
    flow_step step = {.side = 1.0};
    double stride = ring->speed * fabs(b->flux - a->flux);
    sv_status status = overlaps(context, ring, a, b, &share);
    if (status != SV_OK)
        return status;
    step.kept = fmin(least_found(a, b, share, false), least_found(b, a, share, true));
    sum_crossings(a, b, share, sums, &step);
    sv_give(context, share);
    /* Weyl: no level moves by more than the norm of the change, so that only levels in the inner
     * half of the interval can reach the Fermi energy in this step. */
    step.followed = step.kept >= FOUND && stride <= 0.5 * fmin(a->half_width, b->half_width);
    for (int way = 0; way < 2; way++)
        for (int part = 0; part < 2; part++) {
            double whole = round(sums[way][part][part]);
            step.rise[part] += way == 0 ? (int)whole : -(int)whole;
            step.followed = step.followed && fabs(sums[way][part][part] - whole) <= 1.0 - FOUND &&
                            sums[way][part][1 - part] <= 1.0 - FOUND;
        }
    *ret_step = step;
    return SV_OK;
}
