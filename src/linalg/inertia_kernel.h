/* SPDX-License-Identifier: GPL-3.0-or-later */
/* What inertia_fronts.c, inertia_pivot.c and inertia_sweep.c are made of. They are compiled twice
 * (see meson.build): in double and, with SV_INERTIA_SINGLE, in single precision, names then ending
 * in `_single`. Nothing else may include this header. */
#ifndef SELVEDGE_INERTIA_KERNEL_H
#define SELVEDGE_INERTIA_KERNEL_H

#include "inertia_internal.h"

#include <cblas.h>
#include <math.h>

#ifdef SV_INERTIA_SINGLE
typedef float real;
typedef float _Complex number;
#define RE                crealf
#define IM                cimagf
#define CONJ              conjf
#define NUMBER(x, y)      CMPLXF(x, y)
#define SIZE              fabsf
#define ROOT              sqrtf
#define LEAST             fminf
#define GEMM              cblas_cgemm
#define GEMV              cblas_cgemv
#define sv_pivot_block    sv_pivot_block_single
#define sv_pivot_factor   sv_pivot_factor_single
#define sv_pivot_forward  sv_pivot_forward_single
#define sv_pivot_middle   sv_pivot_middle_single
#define sv_pivot_backward sv_pivot_backward_single
#define sv_pivot_divider  sv_pivot_divider_single
#define sv_pivot_divide   sv_pivot_divide_single
#define sv_inertia_fronts sv_inertia_fronts_single
#define sv_inertia_sweep  sv_inertia_sweep_single
#else
typedef double real;
typedef sv_complex number;
#define RE           creal
#define IM           cimag
#define CONJ         conj
#define NUMBER(x, y) CMPLX(x, y)
#define SIZE         fabs
#define ROOT         sqrt
#define LEAST        fmin
#define GEMM         cblas_zgemm
#define GEMV         cblas_zgemv
#endif

/*
 * c := c − l w†, or −l w† if fresh, on and below the diagonal (and on some elements above it);
 * l and w rows × terms with leading dimension `lead`, c rows × columns.
 */
typedef void front_update(const number *l, const number *w, sv_index lead, sv_index rows,
                          sv_index columns, sv_index terms, bool fresh, number *c, sv_index c_lead);
#ifdef SV_INERTIA_SINGLE
front_update sv_front_update_single_plain, sv_front_update_single_avx2,
    sv_front_update_single_avx512;
#else
front_update sv_front_update_double_plain, sv_front_update_double_avx2,
    sv_front_update_double_avx512;
#endif

/* A diagonal block, P M Pᵀ = L D L†, with steps of one or two columns. */
typedef struct sv_pivot_block {
    int width;
    int order[SV_PIVOT_WIDTH];                 /* column taken k-th */
    bool pair[SV_PIVOT_WIDTH];                 /* columns k and k + 1 form one step */
    real d[SV_PIVOT_WIDTH];                    /* diagonal of D */
    number e[SV_PIVOT_WIDTH];                  /* D(k + 1, k) of a pair */
    number l[SV_PIVOT_WIDTH * SV_PIVOT_WIDTH]; /* unit lower, leading dimension `width` */
} sv_pivot_block;

/*
 * Factors a Hermitian block, width ≤ SV_PIVOT_WIDTH, lower triangle of `a` (leading dimension
 * `lead`). Pivots of size below `tiny` become `tiny` and are counted as replaced.
 */
void sv_pivot_factor(const number *a, sv_index lead, int width, real tiny,
                     sv_pivot_block *ret_block, sv_pivot_tally *tally);
/* x := M⁻¹ x in three stages. */
void sv_pivot_forward(const sv_pivot_block *block, number *x);
void sv_pivot_middle(const sv_pivot_block *block, number *x);
void sv_pivot_backward(const sv_pivot_block *block, number *x);
/* g := Pᵀ L^{−†}, so that A21 g = W and A21 M⁻¹ A21† = W D⁻¹ W†. @param g width², column-major */
void sv_pivot_divider(const sv_pivot_block *block, number *g);
/*
 * l := w D⁻¹ for `rows` rows of w; both column-major, `width` columns.
 * @return Σ |l| |w|, the part of these rows in the trace of |L| |D| |L|†
 */
double sv_pivot_divide(const sv_pivot_block *block, sv_index rows, const number *w, sv_index w_lead,
                       number *l, sv_index l_lead);

#endif
