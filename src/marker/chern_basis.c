/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Local Chern marker of some rows from a basis of the occupied or empty space, in three products.
 */
#include "marker_internal.h"

#include <cblas.h>
#include <math.h>

typedef struct basis_work {
    const sv_sample *sample;
    const sv_basis *basis;
    sv_complex *scaled;           /* n × m */
    sv_complex *x, *y;            /* m × m, position in the basis */
    sv_complex *picked, *px, *py; /* n_rows × m */
} basis_work;

static double coordinate(const sv_sample *sample, sv_index row, int axis)
{
    return sample->flake->sites[sample->pristine[row]].at[axis];
}

static void free_work(sv_context *context, basis_work *w)
{
    sv_give(context, w->scaled);
    sv_give(context, w->x);
    sv_give(context, w->y);
    sv_give(context, w->picked);
    sv_give(context, w->px);
    sv_give(context, w->py);
}

static sv_status take_work(sv_context *context, basis_work *w, sv_index n_rows)
{
    sv_index n = w->sample->n, m = w->basis->columns;
    size_t size = sizeof(sv_complex);
    sv_status status;
    if ((status = sv_take_raw(context, n * m, size, &w->scaled)) != SV_OK ||
        (status = sv_take(context, m * m, size, &w->x)) != SV_OK ||
        (status = sv_take(context, m * m, size, &w->y)) != SV_OK ||
        (status = sv_take_raw(context, n_rows * m, size, &w->picked)) != SV_OK ||
        (status = sv_take_raw(context, n_rows * m, size, &w->px)) != SV_OK)
        return status;
    return sv_take_raw(context, n_rows * m, size, &w->py);
}

/*
 * B† x B. The coordinate is shifted to be positive so that it has a root: a rank-k update of
 * √x B costs half of a general product. A constant shift changes no marker (⟨r|PxPyP|r⟩
 * has the same imaginary part).
 */
static void position_in_basis(basis_work *w, int axis, sv_complex *result)
{
    sv_index n = w->sample->n, m = w->basis->columns;
    double low = INFINITY;
    for (sv_index r = 0; r < n; r++)
        low = fmin(low, coordinate(w->sample, r, axis));
    for (sv_index c = 0; c < m; c++)
        for (sv_index r = 0; r < n; r++)
            w->scaled[r + c * n] =
                sqrt(coordinate(w->sample, r, axis) - low) * w->basis->vectors[r + c * n];
    cblas_zherk(CblasColMajor, CblasLower, CblasConjTrans, (int)m, (int)n, 1.0, w->scaled, (int)n,
                0.0, result, (int)m);
}

/* (4π/A) Im Σ_n (B X)_{rn} conj((B Y)_{rn}); the empty side has the opposite sign. */
static void evaluate(basis_work *w, const sv_index *rows, sv_index n_rows, double *marker)
{
    int k = (int)n_rows, m = (int)w->basis->columns;
    const sv_complex one = 1.0, zero = 0.0;
    for (int c = 0; c < m; c++)
        for (int r = 0; r < k; r++)
            w->picked[r + (sv_index)c * k] = w->basis->vectors[rows[r] + c * w->sample->n];
    cblas_zhemm(CblasColMajor, CblasRight, CblasLower, k, m, &one, w->x, m, w->picked, k, &zero,
                w->px, k);
    cblas_zhemm(CblasColMajor, CblasRight, CblasLower, k, m, &one, w->y, m, w->picked, k, &zero,
                w->py, k);
    double area = sv_model_cell_area(w->sample->flake->model);
    double factor = (w->basis->empty_side ? -4.0 : 4.0) * M_PI / area;
    for (int c = 0; c < m; c++)
        for (int r = 0; r < k; r++) {
            sv_complex a = w->px[r + (sv_index)c * k], b = w->py[r + (sv_index)c * k];
            marker[r] += cimag(a) * creal(b) - creal(a) * cimag(b);
        }
    for (int r = 0; r < k; r++)
        marker[r] *= factor;
}

sv_status sv_chern_of_basis(sv_context *context, const sv_sample *sample, const sv_basis *basis,
                            const sv_index *rows, sv_index n_rows, double *ret_marker)
{
    basis_work w = {.sample = sample, .basis = basis};
    for (sv_index r = 0; r < n_rows; r++)
        ret_marker[r] = 0.0;
    if (basis->columns == 0 || n_rows == 0)
        return SV_OK;
    sv_status status = take_work(context, &w, n_rows);
    if (status == SV_OK) {
        position_in_basis(&w, 0, w.x);
        position_in_basis(&w, 1, w.y);
        evaluate(&w, rows, n_rows, ret_marker);
    }
    free_work(context, &w);
    return status;
}

double sv_chern_error(const sv_sample *sample, double defect)
{
    double low[2] = {INFINITY, INFINITY}, high[2] = {-INFINITY, -INFINITY};
    for (sv_index r = 0; r < sample->n; r++)
        for (int k = 0; k < 2; k++) {
            low[k] = fmin(low[k], coordinate(sample, r, k));
            high[k] = fmax(high[k], coordinate(sample, r, k));
        }
    double spread = 0.25 * fmax(1.0, (high[0] - low[0]) * (high[1] - low[1]));
    return 3.0 * 4.0 * M_PI / sv_model_cell_area(sample->flake->model) * spread * defect;
}
