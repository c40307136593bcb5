/* SPDX-License-Identifier: GPL-3.0-or-later */
/* All eigenpairs near a shift, by Lanczos on the inverse, with the number known from inertia. */
#include "selvedge/linalg.h"

#include <cblas.h>
#include <math.h>
#include <string.h>

#define lapack_complex_double double _Complex
#define lapack_complex_float  float _Complex
#include <lapacke.h>

/* Residual of a converged pair of the inverse, relative to its eigenvalue. */
static const double CONVERGED = 1e-10;

typedef struct lanczos {
    sv_index n;
    int most, steps;
    sv_complex *basis;      /* n × (most + 1) */
    sv_complex *projection; /* most × most: basis† (H − shift)^{-1} basis, upper part */
    sv_complex *vectors;    /* its eigenvectors */
    double *values;
    double last_norm; /* length of the next basis vector before normalisation */
    uint32_t starts;  /* start vectors used */
} lanczos;

static void free_lanczos(sv_context *context, lanczos *l)
{
    sv_give(context, l->basis);
    sv_give(context, l->projection);
    sv_give(context, l->vectors);
    sv_give(context, l->values);
}

static sv_status take_lanczos(sv_context *context, sv_index n, int most, lanczos *l)
{
    sv_status status;
    *l = (lanczos){.n = n, .most = most};
    if ((status = sv_take_raw(context, n * (most + 1), sizeof *l->basis, &l->basis)) != SV_OK ||
        (status = sv_take(context, (sv_index)most * most, sizeof *l->projection, &l->projection)) !=
            SV_OK ||
        (status = sv_take(context, (sv_index)most * most, sizeof *l->vectors, &l->vectors)) !=
            SV_OK)
        return status;
    return sv_take(context, most, sizeof *l->values, &l->values);
}

/* Takes the basis out of w, twice (once is not enough in floating point); overlaps to `sums`. */
static double orthogonalise(const lanczos *l, int count, sv_complex *w, sv_complex *sums)
{
    const sv_complex one = 1.0, minus = -1.0, zero = 0.0;
    sv_complex *again = sums + count;
    int n = (int)l->n;
    memset(sums, 0, 2 * (size_t)count * sizeof *sums);
    for (int pass = 0; pass < 2 && count > 0; pass++) {
        cblas_zgemv(CblasColMajor, CblasConjTrans, n, count, &one, l->basis, n, w, 1, &zero, again,
                    1);
        cblas_zgemv(CblasColMajor, CblasNoTrans, n, count, &minus, l->basis, n, again, 1, &one, w,
                    1);
        for (int k = 0; k < count; k++)
            sums[k] += again[k];
    }
    return cblas_dznrm2(n, w, 1);
}

/* A fresh vector from a stream of its own, orthogonal to the basis so far. */
static void start_vector(lanczos *l, sv_complex *w, sv_complex *scratch)
{
    sv_stream stream = sv_stream_make(1, "near states", (sv_index)l->starts++);
    for (sv_index r = 0; r < l->n; r++)
        w[r] = CMPLX(sv_stream_uniform(&stream, (int32_t)r, 0, 0) - 0.5,
                     sv_stream_uniform(&stream, (int32_t)r, 1, 0) - 0.5);
    double norm = orthogonalise(l, l->steps, w, scratch);
    cblas_zdscal((int)l->n, 1.0 / norm, w, 1);
}

/* One more basis vector and column of the projection. */
static sv_status step(sv_context *context, sv_inertia_plan *plan, lanczos *l, sv_complex *scratch)
{
    sv_complex *v = l->basis + (sv_index)l->steps * l->n, *w = v + l->n;
    memcpy(w, v, (size_t)l->n * sizeof *w);
    sv_status status = sv_inertia_solve(context, plan, w);
    if (status != SV_OK)
        return status;
    double before = cblas_dznrm2((int)l->n, w, 1);
    l->steps++;
    double norm = orthogonalise(l, l->steps, w, scratch);
    for (int k = 0; k < l->steps; k++)
        l->projection[k + (sv_index)(l->steps - 1) * l->most] = scratch[k];
    l->last_norm = norm;
    if (norm <= 1e-12 * before) { /* an invariant space: go on elsewhere */
        l->last_norm = 0.0;
        if (l->steps < l->n)
            start_vector(l, w, scratch);
        return SV_OK;
    }
    cblas_zdscal((int)l->n, 1.0 / norm, w, 1);
    return SV_OK;
}

/* Eigenpairs of the projection; counts those converged beyond 1/half_width. */
static sv_status ritz(sv_context *context, lanczos *l, double half_width, int *ret_converged)
{
    int m = l->steps;
    for (int c = 0; c < m; c++)
        memcpy(l->vectors + (sv_index)c * m, l->projection + (sv_index)c * l->most,
               (size_t)m * sizeof *l->vectors);
    lapack_int info = LAPACKE_zheevd(LAPACK_COL_MAJOR, 'V', 'U', m, l->vectors, m, l->values);
    if (info != 0)
        return SV_FAIL(context, SV_NUMERICAL, "zheevd failed with code %d", (int)info);
    *ret_converged = 0;
    for (int k = 0; k < m; k++) {
        double size = fabs(l->values[k]);
        double residual = l->last_norm * cabs(l->vectors[m - 1 + (sv_index)k * m]);
        *ret_converged += size * half_width >= 1.0 && residual <= CONVERGED * size;
    }
    return SV_OK;
}

static sv_status collect(sv_context *context, const lanczos *l, double shift, double half_width,
                         int count, sv_near_states *ret)
{
    sv_near_states found = {.count = count, .half_width = half_width};
    sv_complex *chosen = NULL;
    const sv_complex one = 1.0, zero = 0.0;
    int m = l->steps, at = 0;
    sv_status status;
    if ((status = sv_take_raw(context, l->n * count, sizeof *found.vectors, &found.vectors)) !=
            SV_OK ||
        (status = sv_take_raw(context, count, sizeof *found.energies, &found.energies)) != SV_OK ||
        (status = sv_take_raw(context, (sv_index)m * count, sizeof *chosen, &chosen)) != SV_OK) {
        sv_near_states_free(context, &found);
        return status;
    }
    for (int k = 0; k < m && at < count; k++) {
        if (fabs(l->values[k]) * half_width < 1.0)
            continue;
        memcpy(chosen + (sv_index)at * m, l->vectors + (sv_index)k * m, (size_t)m * sizeof *chosen);
        found.energies[at++] = shift + 1.0 / l->values[k];
    }
    if (count > 0)
        cblas_zgemm(CblasColMajor, CblasNoTrans, CblasNoTrans, (int)l->n, count, m, &one, l->basis,
                    (int)l->n, chosen, m, &zero, found.vectors, (int)l->n);
    sv_give(context, chosen);
    *ret = found;
    return SV_OK;
}

/* States in (shift − half_width, shift + half_width) by two counts; −1: not decided. */
static sv_status count_states(sv_context *context, sv_inertia_plan *plan, const sv_sparse *h,
                              double shift, double half_width, sv_index *ret_count)
{
    sv_inertia_count low, high;
    sv_status status = sv_inertia_count_below(context, plan, h, shift - half_width, &low);
    if (status == SV_OK)
        status = sv_inertia_count_below(context, plan, h, shift + half_width, &high);
    if (status == SV_OK)
        *ret_count = low.decided && high.decided ? high.below - low.below : -1;
    return status;
}

/* Narrows the interval until it holds at most `most` states and its ends lie between levels. */
static sv_status fit_interval(sv_context *context, sv_inertia_plan *plan, const sv_sparse *h,
                              double shift, int most, double *half_width, sv_index *ret_count)
{
    for (int tries = 0; tries < 40; tries++) {
        sv_status status = count_states(context, plan, h, shift, *half_width, ret_count);
        if (status != SV_OK || (*ret_count >= 0 && *ret_count <= most))
            return status;
        *half_width *= *ret_count < 0 ? 0.99 : 0.7;
    }
    return SV_FAIL(context, SV_NOT_CONVERGED, "too many levels next to the energy %g", shift);
}

sv_status sv_near_states_find(sv_context *context, const sv_sparse *h, double shift,
                              double half_width, int most, sv_near_states *ret_states)
{
    sv_inertia_plan *plan = NULL;
    sv_inertia inertia;
    lanczos l = {0};
    sv_complex *scratch = NULL;
    sv_index count = 0;
    int converged = 0;
    sv_status status = sv_inertia_plan_make(context, h, 1, &plan);
    if (status == SV_OK)
        status = fit_interval(context, plan, h, shift, most, &half_width, &count);
    if (status == SV_OK)
        status = sv_inertia_factor(context, plan, h, shift, &inertia);
    if (status != SV_OK)
        goto out;
    int room = (int)fmin((double)h->n, 4.0 * (double)count + 60.0);
    if ((status = take_lanczos(context, h->n, room, &l)) != SV_OK ||
        (status = sv_take(context, 2 * (sv_index)room + 2, sizeof *scratch, &scratch)) != SV_OK)
        goto out;
    if (count > 0)
        start_vector(&l, l.basis, scratch);
    while (status == SV_OK && converged < count && l.steps < room) {
        status = step(context, plan, &l, scratch);
        bool look = l.steps == room || (l.steps >= 2 * count && l.steps % 8 == 0);
        if (status == SV_OK && look)
            status = ritz(context, &l, half_width, &converged);
    }
    if (status == SV_OK && converged != count)
        status = SV_FAIL(context, SV_NOT_CONVERGED, "%d of %lld levels next to %g converged",
                         converged, (long long)count, shift);
    if (status == SV_OK)
        status = collect(context, &l, shift, half_width, (int)count, ret_states);
out:
    free_lanczos(context, &l);
    sv_give(context, scratch);
    sv_inertia_plan_free(context, plan);
    return status;
}

void sv_near_states_free(sv_context *context, sv_near_states *states)
{
    sv_give(context, states->energies);
    sv_give(context, states->vectors);
    *states = (sv_near_states){0};
}
