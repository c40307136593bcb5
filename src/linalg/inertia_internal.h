/* SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef SELVEDGE_INERTIA_INTERNAL_H
#define SELVEDGE_INERTIA_INTERNAL_H

#include "selvedge/linalg.h"

/* Columns eliminated together; pivoting stays inside their diagonal block, so wider is safer. */
enum { SV_PIVOT_WIDTH = 16 };

/* What the pivots amounted to. */
typedef struct sv_pivot_tally {
    sv_index negative, positive, replaced;
    double smallest; /* least |eigenvalue| of a step */
    double grown;    /* Σ_i (|L| |D| |L|†)_ii */
} sv_pivot_tally;

/*
 * Rows come in groups of `block` that stay together; everything symbolic counts groups.
 * Supernode s owns the columns first[s] … first[s+1]−1 of the elimination; its rows are
 * rows[row_start[s]] …, its own columns first.
 */
struct sv_inertia_plan {
    sv_index groups, order;
    sv_panel_kernel kernel;
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
    /* of the latest factorisation; elements are complex numbers of its precision */
    void *panel, *pivots;
    bool factored, single;
    double norm;
    /* work space */
    void *stack, *work, *vector;
    int32_t *slot, *pending;
};

/* Bytes of a pivot block in double precision. */
size_t sv_inertia_pivot_size(void);
/* The factorisation proper, and x := (H − shift)⁻¹ x with its result; compiled for both precisions.
 * @param tiny  pivots of size below this are replaced */
sv_status sv_inertia_fronts(sv_context *context, sv_inertia_plan *plan, const sv_sparse *h,
                            double shift, double tiny, sv_pivot_tally *tally);
sv_status sv_inertia_fronts_single(sv_context *context, sv_inertia_plan *plan, const sv_sparse *h,
                                   double shift, double tiny, sv_pivot_tally *tally);
void sv_inertia_sweep(const sv_inertia_plan *plan, sv_complex *x);
void sv_inertia_sweep_single(const sv_inertia_plan *plan, sv_complex *x);

#endif
