/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Levels next to the shift of the latest factorisation, by Lanczos on its inverse with full
 * orthogonalisation (C. Lanczos, J. Res. Natl. Bur. Stand. 45, 255 (1950)). */
#include "inertia_internal.h"

#include <cblas.h>
#include <float.h>
#include <math.h>
#include <string.h>

#define lapack_complex_double double _Complex
#define lapack_complex_float  float _Complex
#include <lapacke.h>

enum { MOST_STEPS = 80, FIRST_CHECK = 8, CHECK_EVERY = 4 };
static const double SETTLED = 1e-9; /* for the Fermi energy */
/* The Krylov space is exhausted when a step adds less than this. */
static const double BREAKDOWN = 1e-12;

typedef struct lanczos {
    sv_index n;
    int steps;
    sv_complex *basis;                            /* n × (MOST_STEPS + 1) */
    double diagonal[MOST_STEPS], off[MOST_STEPS]; /* of the tridiagonal matrix */
    double value[MOST_STEPS], copy[MOST_STEPS];
    double vectors[MOST_STEPS * MOST_STEPS];
} lanczos;

static void start_vector(sv_complex *x, sv_index n)
{
    sv_stream stream = sv_stream_make(1, "lanczos", 0);
    for (sv_index k = 0; k < n; k++)
        x[k] = CMPLX(sv_stream_normal(&stream, (int32_t)k, 0, 0),
                     sv_stream_normal(&stream, (int32_t)k, 0, 1));
    cblas_zdscal((int)n, 1.0 / cblas_dznrm2((int)n, x, 1), x, 1);
}

/* The three-term recurrence; what rounding leaves of it goes in a full pass afterwards. */
static void remove_last_two(lanczos *z, sv_complex *next)
{
    int n = (int)z->n, k = z->steps;
    const sv_complex *last = z->basis + k * z->n;
    sv_complex overlap, factor;
    cblas_zdotc_sub(n, last, 1, next, 1, &overlap);
    z->diagonal[k] = creal(overlap);
    factor = -z->diagonal[k];
    cblas_zaxpy(n, &factor, last, 1, next, 1);
    if (k == 0)
        return;
    factor = -z->off[k - 1];
    cblas_zaxpy(n, &factor, last - n, 1, next, 1);
}

/* One step. */
static sv_status lanczos_step(sv_context *context, sv_inertia_plan *plan, lanczos *z,
                              bool *ret_exhausted)
{
    const sv_complex one = 1.0, minus = -1.0, zero = 0.0;
    int n = (int)z->n, k = z->steps;
    sv_complex overlap[MOST_STEPS + 1], *next = z->basis + (k + 1) * z->n;
    memcpy(next, z->basis + k * z->n, (size_t)n * sizeof *next);
    sv_status status = sv_inertia_solve(context, plan, next);
    if (status != SV_OK)
        return status;
    remove_last_two(z, next);
    cblas_zgemv(CblasColMajor, CblasConjTrans, n, k + 1, &one, z->basis, n, next, 1, &zero, overlap,
                1);
    cblas_zgemv(CblasColMajor, CblasNoTrans, n, k + 1, &minus, z->basis, n, overlap, 1, &one, next,
                1);
    z->diagonal[k] += creal(overlap[k]);
    z->off[k] = cblas_dznrm2(n, next, 1);
    z->steps++;
    double scale = fabs(z->diagonal[0]) + z->off[0];
    /* What is left after a breakdown is rounding, not orthogonal to anything. */
    *ret_exhausted = z->steps >= n || !(z->off[k] > BREAKDOWN * scale);
    if (!*ret_exhausted)
        cblas_zdscal(n, 1.0 / z->off[k], next, 1);
    return SV_OK;
}

/* Ritz values of the inverse; the extreme ones are the levels next to the shift. */
static sv_status ritz(sv_context *context, lanczos *z)
{
    memcpy(z->value, z->diagonal, (size_t)z->steps * sizeof *z->value);
    memcpy(z->copy, z->off, (size_t)z->steps * sizeof *z->copy);
    double work[2 * MOST_STEPS];
    lapack_int info = LAPACKE_dstev_work(LAPACK_COL_MAJOR, 'V', z->steps, z->value, z->copy,
                                         z->vectors, z->steps, work);
    if (info != 0)
        return SV_FAIL(context, SV_NUMERICAL, "dstev failed with code %d", (int)info);
    return SV_OK;
}

/*
 * Level and its error from Ritz pair k with residual r: θ is off by r, or by r²/δ when the next
 * Ritz value is δ away (Kato, Temple), and 1/θ by that over θ². The residual has a floor of
 * rounding relative to the largest θ: a level far away is blurred by one very close to the shift.
 */
static double level_of(const lanczos *z, int k, double *ret_error)
{
    double theta = z->value[k];
    double residual =
        fabs(z->off[z->steps - 1] * z->vectors[z->steps - 1 + (sv_index)k * z->steps]);
    double largest = fmax(fabs(z->value[0]), fabs(z->value[z->steps - 1]));
    int next = k == 0 ? 1 : k - 1;
    double apart = z->steps > 1 ? fabs(theta - z->value[next]) : largest;
    double error = apart > residual ? residual * residual / apart : residual;
    *ret_error = (error + 16.0 * DBL_EPSILON * largest) / (theta * theta);
    return 1.0 / theta;
}

/* Levels as they are; true when both, or the one nearer to `target`, are known well enough. */
static bool read_levels(const lanczos *z, const sv_inertia *inertia, double shift, double tolerance,
                        double target, sv_inertia_levels *levels)
{
    bool below = true, above = true;
    *levels = (sv_inertia_levels){.below = -INFINITY, .above = INFINITY, .steps = z->steps};
    if (inertia->negative > 0) {
        double distance = level_of(z, 0, &levels->error_below);
        below = distance < 0.0 && levels->error_below <= tolerance * fabs(distance);
        levels->below = shift + distance;
        levels->error_below += inertia->error;
    }
    if (inertia->positive > 0) {
        double distance = level_of(z, z->steps - 1, &levels->error_above);
        above = distance > 0.0 && levels->error_above <= tolerance * fabs(distance);
        levels->above = shift + distance;
        levels->error_above += inertia->error;
    }
    if (isnan(target) || (below && above))
        return below && above;
    /* Ritz values lie farther out than the levels: a level can only come nearer. */
    double to_below = fabs(target - levels->below), to_above = fabs(levels->above - target);
    return to_below < to_above ? below && to_below < to_above - 100.0 * levels->error_above
                               : above && to_above < to_below - 100.0 * levels->error_below;
}

static sv_status iterate(sv_context *context, sv_inertia_plan *plan, const sv_inertia *inertia,
                         double shift, double tolerance, double target, lanczos *z,
                         sv_inertia_levels *levels)
{
    bool settled = false, exhausted = false;
    while (!settled) {
        sv_status status = lanczos_step(context, plan, z, &exhausted);
        if (status != SV_OK)
            return status;
        bool last = exhausted || z->steps == MOST_STEPS;
        if (!last && (z->steps < FIRST_CHECK || z->steps % CHECK_EVERY != 0))
            continue;
        if ((status = ritz(context, z)) != SV_OK)
            return status;
        settled = read_levels(z, inertia, shift, tolerance, target, levels) || last;
        if (sv_cancelled(context))
            return SV_FAIL(context, SV_INTERRUPTED, "stopped during a search for levels");
    }
    return SV_OK;
}

sv_status sv_inertia_levels_near(sv_context *context, sv_inertia_plan *plan,
                                 const sv_inertia *inertia, double shift, double tolerance,
                                 double target, sv_inertia_levels *ret_levels)
{
    lanczos *z = NULL;
    sv_inertia_levels levels;
    sv_status status;
    if (plan->order == 0)
        return SV_FAIL(context, SV_INVALID_INPUT, "a matrix of order 0 has no levels");
    sv_index columns = plan->order < MOST_STEPS ? plan->order + 1 : MOST_STEPS + 1;
    if ((status = sv_take_raw(context, 1, sizeof *z, &z)) != SV_OK)
        return status;
    z->n = plan->order;
    z->steps = 0;
    z->basis = NULL;
    if ((status = sv_take_raw(context, z->n * columns, sizeof *z->basis, &z->basis)) != SV_OK)
        goto out;
    start_vector(z->basis, z->n);
    status = iterate(context, plan, inertia, shift, tolerance, target, z, &levels);
    if (status == SV_OK)
        *ret_levels = levels;
out:
    sv_give(context, z->basis);
    sv_give(context, z);
    return status;
}

/* --- the Fermi energy of a number of electrons --- */

/* Bisects to an energy with the wanted number of states below it. */
static sv_status bisect(sv_context *context, sv_inertia_plan *plan, const sv_sparse *h,
                        sv_index electrons, double resolution, double *ret_energy,
                        sv_inertia *ret_inertia, bool *ret_found)
{
    double bound = sv_sparse_norm_bound(h);
    double low = -bound - 1.0, high = bound + 1.0;
    double energy = electrons == 0 ? low : electrons == h->n ? high : 0.0;
    for (;;) {
        sv_status status = sv_inertia_factor(context, plan, h, energy, ret_inertia);
        if (status != SV_OK)
            return status;
        *ret_energy = energy;
        *ret_found = ret_inertia->negative == electrons;
        if (*ret_found || high - low <= resolution)
            return SV_OK;
        if (ret_inertia->negative < electrons)
            low = energy;
        else
            high = energy;
        energy = 0.5 * (low + high);
    }
}

static double middle(const sv_inertia_levels *levels, sv_index electrons, sv_index n)
{
    if (electrons == 0)
        return levels->above - 1.0;
    return electrons == n ? levels->below + 1.0 : 0.5 * (levels->below + levels->above);
}

/* Moves to the middle of the gap around an energy with the right count, and looks again from there:
 * from close to one level the other is seen badly. */
static sv_status settle_between(sv_context *context, sv_inertia_plan *plan, const sv_sparse *h,
                                sv_index electrons, const sv_inertia *first, sv_fermi_level *fermi)
{
    sv_inertia inertia = *first;
    sv_inertia_levels levels;
    sv_inertia_count check = {0};
    sv_status status = SV_OK;
    for (int round = 0; round < 6; round++) {
        double energy = fermi->energy;
        status =
            sv_inertia_levels_near(context, plan, &inertia, energy, SETTLED, (double)NAN, &levels);
        if (status != SV_OK)
            return status;
        double gap = levels.above - levels.below, half = isfinite(gap) ? 0.5 * gap : 1.0;
        bool exact = inertia.error < 1e-9 * half;
        fermi->energy = middle(&levels, electrons, h->n);
        if (exact && fabs(fermi->energy - energy) < 0.4 * half)
            break;
        /* Clean flakes can have singular leading blocks right in the middle of a gap. */
        double aside = exact ? 0.0 : 0.05 * (round + 1) * half;
        status = sv_inertia_factor(context, plan, h, fermi->energy + aside, &inertia);
        if (status != SV_OK)
            return status;
        fermi->energy += aside;
    }
    fermi->energy = middle(&levels, electrons, h->n);
    fermi->highest_occupied = levels.below;
    fermi->lowest_empty = levels.above;
    fermi->error = fmax(levels.error_below, levels.error_above);
    /* Any energy between the two levels proves the count as well as the middle. */
    double gap = levels.above - levels.below, half = isfinite(gap) ? 0.5 * gap : 1.0;
    for (int k = 0; k < 3 && status == SV_OK && !check.decided; k++)
        status = sv_inertia_count_below(context, plan, h, fermi->energy + 0.17 * k * half, &check);
    if (status != SV_OK)
        return status;
    fermi->on_level = levels.above - levels.below <= fermi->resolution || !check.decided ||
                      check.below != electrons;
    return SV_OK;
}

sv_status sv_inertia_fermi_energy(sv_context *context, sv_inertia_plan *plan, const sv_sparse *h,
                                  sv_index electrons, sv_fermi_level *ret_fermi)
{
    sv_fermi_level fermi = {.resolution = 1e-11 * fmax(sv_sparse_norm_bound(h), 1e-300)};
    sv_inertia inertia;
    double energy;
    bool found;
    if (electrons < 0 || electrons > h->n)
        return SV_FAIL(context, SV_INVALID_INPUT, "%lld electrons do not fit into %lld states",
                       (long long)electrons, (long long)h->n);
    sv_status status =
        bisect(context, plan, h, electrons, fermi.resolution, &energy, &inertia, &found);
    if (status != SV_OK)
        return status;
    fermi.energy = energy;
    fermi.highest_occupied = fermi.lowest_empty = energy;
    fermi.on_level = !found;
    if (found)
        status = settle_between(context, plan, h, electrons, &inertia, &fermi);
    if (status == SV_OK)
        *ret_fermi = fermi;
    return status;
}
