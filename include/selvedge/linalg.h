/* SPDX-License-Identifier: GPL-3.0-or-later */
/**
 * @file linalg.h
 * Layer 2: sparse Hermitian matrix and dense kernels.
 */
#ifndef SELVEDGE_LINALG_H
#define SELVEDGE_LINALG_H

#include "base.h"

#ifdef __cplusplus
extern "C" {
#endif

/** Sparse Hermitian matrix, both triangles stored, rows sorted by column, no duplicates. */
typedef struct sv_sparse {
    sv_index n;            /**< order */
    sv_index *row_start;   /**< n + 1 offsets */
    int32_t *column;       /**< row_start[n] column numbers */
    sv_complex *value;     /**< row_start[n] values */
} sv_sparse;

SV_API void sv_sparse_free(sv_context *context, sv_sparse *matrix);
/** Verifies the invariants: monotone offsets, sorted columns, Hermitian to rounding. */
SV_API SV_MUST_USE sv_status sv_sparse_check(sv_context *context, const sv_sparse *matrix);
/** y = A x for one vector. @param[out] y n values, not x */
SV_API void sv_sparse_apply(const sv_sparse *matrix, const sv_complex *x, sv_complex *y);
/** Largest absolute row sum, an upper bound of the norm. */
SV_API double sv_sparse_norm_bound(const sv_sparse *matrix);
/** Dense column-major copy. @param[out] dense n² values */
SV_API void sv_sparse_to_dense(const sv_sparse *matrix, sv_complex *dense);

/** BLAS in use. */
typedef struct sv_blas_info {
    char kind[32];      /**< "openblas" or "unknown" */
    char threading[16]; /**< "serial", "pthread", "openmp" or "unknown" */
    char kernel[64];    /**< kernel name reported by the library, or "unknown" */
    bool threads_safe;  /**< concurrent calls from several threads give right answers */
} sv_blas_info;

/** Asks the loaded BLAS what it is and sets it to one thread. Call at program start. */
SV_API void sv_blas_setup(sv_blas_info *ret_info);

/**
 * All eigenvalues and one side of the eigenvectors of a dense Hermitian matrix.
 *
 * Reduction to tridiagonal form (zhetrd), divide and conquer on the real tridiagonal matrix
 * (dstedc), and back-transformation (zunmtr) of the wanted vectors only. Of the routes measured
 * this is the fastest when half of the vectors are wanted, and it stays reliable on the highly
 * degenerate spectra of clean tori, where relatively robust representations (zstemr) fail.
 *
 * @param n           order, at most 32,000
 * @param[in,out] a   n² values column-major; destroyed
 * @param[out] values n eigenvalues, ascending
 * @param choose      called once with the values; sets the half-open range [*first, *last) of
 *                    eigenvectors wanted
 * @param[out] vectors  n × (last − first), column-major, taken from the context; orthonormal
 * @return SV_NUMERICAL when LAPACK reports failure, SV_REFUSED above 32,000
 */
typedef void (*sv_choose_range)(const double *values, sv_index n, sv_index *first, sv_index *last,
                                void *user);
SV_API SV_MUST_USE sv_status sv_dense_eigen(sv_context *context, sv_index n, sv_complex *a,
                                            double *values, sv_choose_range choose, void *user,
                                            sv_index *ret_first, sv_index *ret_last,
                                            sv_complex **ret_vectors);

#ifdef __cplusplus
}
#endif
#endif
