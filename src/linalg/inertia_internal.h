/* SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef SELVEDGE_INERTIA_INTERNAL_H
#define SELVEDGE_INERTIA_INTERNAL_H

#include "selvedge/linalg.h"

/* Columns eliminated together; pivoting stays inside their diagonal block, so wider is safer. */
enum { SV_PIVOT_WIDTH = 16 };

/* A diagonal block, P M Pᵀ = L D L†, with steps of one or two columns. */
typedef struct sv_pivot_block {
    int width;
    int order[SV_PIVOT_WIDTH];                     /* column taken k-th */
    bool pair[SV_PIVOT_WIDTH];                     /* columns k and k + 1 form one step */
    double d[SV_PIVOT_WIDTH];                      /* diagonal of D */
    sv_complex e[SV_PIVOT_WIDTH];                  /* D(k + 1, k) of a pair */
    sv_complex l[SV_PIVOT_WIDTH * SV_PIVOT_WIDTH]; /* unit lower, leading dimension `width` */
} sv_pivot_block;

/* What the pivots amounted to. */
typedef struct sv_pivot_tally {
    sv_index negative, positive, replaced;
    double smallest; /* least |eigenvalue| of a step */
    double grown;    /* Σ_i (|L| |D| |L|†)_ii */
} sv_pivot_tally;

/*
 * Factors a Hermitian block, width ≤ SV_PIVOT_WIDTH, lower triangle of `a` (leading dimension
 * `lead`). Pivots of size below `tiny` become `tiny` and are counted as replaced.
 */
void sv_pivot_factor(const sv_complex *a, sv_index lead, int width, double tiny,
                     sv_pivot_block *ret_block, sv_pivot_tally *tally);
/* x := M⁻¹ x in three stages. */
void sv_pivot_forward(const sv_pivot_block *block, sv_complex *x);
void sv_pivot_middle(const sv_pivot_block *block, sv_complex *x);
void sv_pivot_backward(const sv_pivot_block *block, sv_complex *x);
/* g := Pᵀ L^{−†}, so that A21 g = W and A21 M⁻¹ A21† = W D⁻¹ W†. @param g width², column-major */
void sv_pivot_divider(const sv_pivot_block *block, sv_complex *g);
/*
 * l := w D⁻¹ for `rows` rows of w; both column-major, `width` columns.
 * @return Σ |l| |w|, the part of these rows in the trace of |L| |D| |L|†
 */
double sv_pivot_divide(const sv_pivot_block *block, sv_index rows, const sv_complex *w,
                       sv_index w_lead, sv_complex *l, sv_index l_lead);

/*
 * Rows come in groups of `block` that stay together; everything symbolic counts groups.
 * Supernode s owns the columns first[s] … first[s+1]−1 of the elimination; its rows are
 * rows[row_start[s]] …, its own columns first.
 */
struct sv_inertia_plan {
    sv_index groups, order;
    int block;
    sv_index n_nodes;
    int32_t *place;      /* group → position in the elimination */
    int32_t *group;      /* position → group */
    int32_t *first;      /* n_nodes + 1 */
    int32_t *parent;     /* −1: root */
    sv_index *row_start; /* n_nodes + 1 */
    int32_t *rows;
    int32_t *target;                /* for each row: its row number in the parent's front */
    sv_index *panel_start;          /* n_nodes + 1: offsets of the columns of L, elements */
    sv_index *block_start;          /* n_nodes + 1: numbers of the pivot blocks */
    sv_index stack_size, work_size; /* elements */
    /* of the latest factorisation */
    sv_complex *panel;
    sv_pivot_block *pivots;
    bool factored;
    double norm;
    /* work space */
    sv_complex *stack, *work, *vector;
    int32_t *slot, *pending;
};

#endif
