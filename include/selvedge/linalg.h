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

/* ---------------------------------------------------- polynomials of a matrix */

enum { SV_PANEL_COLUMNS = 16 };

/**
 * A sparse matrix shifted, scaled and packed for polynomials, elements of a row sorted into real,
 * imaginary and general ones: row r has them at start[3r], start[3r+1], start[3r+2].
 */
typedef struct sv_packed {
    sv_index n;
    sv_index *start; /**< 3n + 1 offsets */
    int32_t *column;
    double *re, *im;
} sv_packed;

/**
 * Packs (H − shift)/scale, or its part on some rows.
 * @param rows   n row numbers, NULL: all rows of H (then n = H.n)
 * @param place  for each row of H its place among `rows` or −1; NULL with rows NULL. Elements that
 *               lead out of the part are dropped
 */
SV_API SV_MUST_USE sv_status sv_packed_make(sv_context *context, const sv_sparse *h,
                                            const sv_index *rows, sv_index n,
                                            const int32_t *place, double shift, double scale,
                                            sv_packed *ret_packed);
SV_API void sv_packed_free(sv_context *context, sv_packed *packed);

/** Copies of the inner loop; the plain one is the reference for the others. */
typedef enum sv_panel_kernel { SV_PANEL_PLAIN, SV_PANEL_AVX2, SV_PANEL_AVX512 } sv_panel_kernel;
/** The fastest copy this processor can run. */
SV_API sv_panel_kernel sv_panel_best_kernel(void);
SV_API const char *sv_panel_kernel_name(sv_panel_kernel kernel);

/**
 * y = Σ_k c_k T_k(A) x for a panel of SV_PANEL_COLUMNS columns, T_k Chebyshev polynomials.
 * A panel holds for each site SV_PANEL_COLUMNS real parts, then as many imaginary parts.
 * @param coefficients degree + 1 values
 * @param work   room for two panels
 * @param[out] y a panel, not overlapping x
 * Memory must be aligned to 64 bytes (sv_take() gives that). Cost: degree matrix products.
 */
SV_API void sv_panel_polynomial(const sv_packed *a, const double *coefficients, int degree,
                                sv_panel_kernel kernel, const double *x, double *work, double *y);

/**
 * Chebyshev coefficients of a near-best polynomial of the occupation step: 1 on [−1, −δ], 0 on
 * [δ, 1], error ≈ sv_step_error(); between −δ and δ it falls from 1 to 0.
 * @param degree  odd
 * @param[out] ret_step degree + 1 coefficients
 * @return SV_INVALID_INPUT for δ outside (0, 1), an even degree, or one so high that the error
 *         would lie below double precision
 */
SV_API SV_MUST_USE sv_status sv_step_polynomial(sv_context *context, double delta, int degree,
                                                double *ret_step);
/** Size of the error of that polynomial outside (−δ, δ): ((1+δ)/(1−δ))^{−(degree+1)/2}. */
SV_API double sv_step_error(double delta, int degree);
/** Smallest odd degree with sv_step_error() ≤ error. */
SV_API int sv_step_degree(double delta, double error);

#ifdef __cplusplus
}
#endif
#endif
