/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Bott index by the eigenvalues of V U V† U† in the occupied basis.
 *
 * Replacing U and V by their unitary polar factors would allow a Hermitian eigenvalue solver, but
 * it changes the integer of a few per cent of the samples near a transition (measured on
 * half-BHZ, 12×12, box width 6: 3 of 60), so the compressions are used as they are defined. */
#include "bott_internal.h"

#include <cblas.h>
#include <math.h>

#define lapack_complex_double double _Complex
#define lapack_complex_float  float _Complex
#include <lapacke.h>

static const double LEAST_ANGLE = 1e-6;    /* rad: nearer to the negative axis is undecided */
static const double LEAST_MODULUS = 1e-10; /* smaller eigenvalues have no angle */
static const double LEAST_INTEGER = 1e-6;  /* the sum of angles must be this near to an integer */

typedef struct bott_work {
    sv_basis basis;
    const double (*uv)[2];
    sv_complex *turned;                  /* n × m */
    sv_complex *u, *v, *vu, *uv_product; /* m × m */
    sv_complex *eigenvalues;             /* m */
} bott_work;

static void free_work(sv_context *context, bott_work *w)
{
    sv_give(context, w->turned);
    sv_give(context, w->u);
    sv_give(context, w->v);
    sv_give(context, w->vu);
    sv_give(context, w->uv_product);
    sv_give(context, w->eigenvalues);
}

static sv_status take_blocks(sv_context *context, bott_work *w)
{
    sv_index n = w->basis.n, m = w->basis.columns;
    size_t size = sizeof(sv_complex);
    sv_status status;
    if ((status = sv_take_raw(context, n * m, size, &w->turned)) != SV_OK ||
        (status = sv_take_raw(context, m * m, size, &w->u)) != SV_OK ||
        (status = sv_take_raw(context, m * m, size, &w->v)) != SV_OK ||
        (status = sv_take_raw(context, m * m, size, &w->vu)) != SV_OK ||
        (status = sv_take_raw(context, m * m, size, &w->uv_product)) != SV_OK)
        return status;
    return sv_take_raw(context, m, size, &w->eigenvalues);
}

/* Ψ† e^{2πi·coordinate} Ψ */
static void compress(bott_work *w, int axis, sv_complex *result)
{
    int n = (int)w->basis.n, m = (int)w->basis.columns;
    const sv_complex one = 1.0, zero = 0.0;
    for (sv_index r = 0; r < n; r++) {
        double angle = 2.0 * M_PI * w->uv[r][axis];
        sv_complex phase = CMPLX(cos(angle), sin(angle));
        for (sv_index c = 0; c < m; c++)
            w->turned[r + c * n] = phase * w->basis.vectors[r + c * n];
    }
    cblas_zgemm(CblasColMajor, CblasConjTrans, CblasNoTrans, m, m, n, &one, w->basis.vectors, n,
                w->turned, n, &zero, result, m);
}

/* Eigenvalues of V U V† U† = (VU)(UV)†. */
static sv_status product_eigenvalues(sv_context *context, bott_work *w)
{
    int m = (int)w->basis.columns;
    const sv_complex one = 1.0, zero = 0.0;
    cblas_zgemm(CblasColMajor, CblasNoTrans, CblasNoTrans, m, m, m, &one, w->v, m, w->u, m, &zero,
                w->vu, m);
    cblas_zgemm(CblasColMajor, CblasNoTrans, CblasNoTrans, m, m, m, &one, w->u, m, w->v, m, &zero,
                w->uv_product, m);
    cblas_zgemm(CblasColMajor, CblasNoTrans, CblasConjTrans, m, m, m, &one, w->vu, m, w->uv_product,
                m, &zero, w->u, m);
    if (sv_cancelled(context))
        return SV_FAIL(context, SV_INTERRUPTED, "stopped during a Bott index");
    sv_complex *work = NULL;
    double *real_work = NULL;
    sv_status status;
    lapack_int work_size = 64 * m + 64;
    if ((status = sv_take_raw(context, work_size, sizeof *work, &work)) != SV_OK ||
        (status = sv_take_raw(context, 2 * (sv_index)m, sizeof *real_work, &real_work)) != SV_OK)
        goto out;
    lapack_int info = LAPACKE_zgeev_work(LAPACK_COL_MAJOR, 'N', 'N', m, w->u, m, w->eigenvalues,
                                         NULL, 1, NULL, 1, work, work_size, real_work);
    if (info != 0)
        status = SV_FAIL(context, SV_NUMERICAL, "zgeev failed with code %d", (int)info);
out:
    sv_give(context, work);
    sv_give(context, real_work);
    return status;
}

static void judge(const bott_work *w, sv_outcome *outcome)
{
    double sum = 0.0, largest = 0.0, smallest = INFINITY;
    for (sv_index k = 0; k < w->basis.columns; k++) {
        double angle = carg(w->eigenvalues[k]);
        sum += angle;
        largest = fmax(largest, fabs(angle));
        smallest = fmin(smallest, cabs(w->eigenvalues[k]));
    }
    double turns = sum / (2.0 * M_PI), nearest = round(turns);
    outcome->margin = M_PI - largest;
    outcome->weakest = smallest;
    outcome->numerical_error = fabs(turns - nearest);
    if (smallest < LEAST_MODULUS)
        snprintf(outcome->reason, sizeof outcome->reason,
                 "an eigenvalue of V U V† U† has modulus %.1e: U or V is singular", smallest);
    else if (outcome->margin < LEAST_ANGLE)
        snprintf(outcome->reason, sizeof outcome->reason,
                 "an eigenvalue of V U V† U† is %.1e rad from the negative real axis",
                 outcome->margin);
    else if (!(outcome->numerical_error < LEAST_INTEGER))
        snprintf(outcome->reason, sizeof outcome->reason,
                 "the sum of angles is %.1e away from an integer", outcome->numerical_error);
    else {
        outcome->verdict = SV_RESOLVED;
        outcome->index = (int64_t)nearest;
        outcome->value = nearest + 0.0;
    }
}

sv_status sv_bott_by_eigenvalues(sv_context *context, const sv_basis *basis, const double (*uv)[2],
                                 sv_outcome *outcome)
{
    bott_work w = {.basis = *basis, .uv = uv};
    sv_status status = take_blocks(context, &w);
    if (status == SV_OK) {
        compress(&w, 0, w.u);
        compress(&w, 1, w.v);
        status = product_eigenvalues(context, &w);
    }
    if (status == SV_OK)
        judge(&w, outcome);
    free_work(context, &w);
    return status;
}
