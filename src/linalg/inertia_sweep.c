/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Solves with the latest factorisation. */
#include "inertia_kernel.h"

/* Rows of one node between the elimination vector and a contiguous piece. */
static void pick(const sv_inertia_plan *p, sv_index s, const number *from, number *to)
{
    for (sv_index k = p->row_start[s]; k < p->row_start[s + 1]; k++)
        for (sv_index c = 0; c < p->block; c++)
            *to++ = from[(sv_index)p->rows[k] * p->block + c];
}

static void put(const sv_inertia_plan *p, sv_index s, const number *from, number *to)
{
    for (sv_index k = p->row_start[s]; k < p->row_start[s + 1]; k++)
        for (sv_index c = 0; c < p->block; c++)
            to[(sv_index)p->rows[k] * p->block + c] = *from++;
}

static void forward(const sv_inertia_plan *p, sv_index s, number *x)
{
    const number one = 1.0, minus = -1.0;
    sv_index rows = (p->row_start[s + 1] - p->row_start[s]) * p->block, start = 0;
    const number *panel = (const number *)p->panel + p->panel_start[s];
    for (sv_index k = p->block_start[s]; k < p->block_start[s + 1]; k++) {
        const sv_pivot_block *block = (const sv_pivot_block *)p->pivots + k;
        sv_index next = start + block->width;
        sv_pivot_forward(block, x + start);
        if (rows > next)
            GEMV(CblasColMajor, CblasNoTrans, (int)(rows - next), block->width, &minus,
                 panel + next + start * rows, (int)rows, x + start, 1, &one, x + next, 1);
        start = next;
    }
}

static void backward(const sv_inertia_plan *p, sv_index s, number *x)
{
    const number one = 1.0, minus = -1.0;
    sv_index rows = (p->row_start[s + 1] - p->row_start[s]) * p->block;
    sv_index next = (sv_index)(p->first[s + 1] - p->first[s]) * p->block;
    const number *panel = (const number *)p->panel + p->panel_start[s];
    for (sv_index k = p->block_start[s + 1] - 1; k >= p->block_start[s]; k--) {
        const sv_pivot_block *block = (const sv_pivot_block *)p->pivots + k;
        sv_index start = next - block->width;
        sv_pivot_middle(block, x + start);
        if (rows > next)
            GEMV(CblasColMajor, CblasConjTrans, (int)(rows - next), block->width, &minus,
                 panel + next + start * rows, (int)rows, x + next, 1, &one, x + start, 1);
        sv_pivot_backward(block, x + start);
        next = start;
    }
}

void sv_inertia_sweep(const sv_inertia_plan *plan, sv_complex *x)
{
    const sv_inertia_plan *p = plan;
    sv_index b = p->block;
    number *vector = p->vector, *work = p->work;
    for (sv_index k = 0; k < p->order; k++) {
        sv_complex value = x[(sv_index)p->group[k / b] * b + k % b];
        vector[k] = NUMBER((real)creal(value), (real)cimag(value));
    }
    for (sv_index s = 0; s < p->n_nodes; s++) {
        pick(p, s, vector, work);
        forward(p, s, work);
        put(p, s, work, vector);
    }
    for (sv_index s = p->n_nodes - 1; s >= 0; s--) {
        pick(p, s, vector, work);
        backward(p, s, work);
        put(p, s, work, vector);
    }
    for (sv_index k = 0; k < p->order; k++)
        x[(sv_index)p->group[k / b] * b + k % b] =
            CMPLX((double)RE(vector[k]), (double)IM(vector[k]));
}
