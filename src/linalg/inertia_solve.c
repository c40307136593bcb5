/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Solves with the latest factorisation. */
#include "inertia_internal.h"

#include <cblas.h>

/* Rows of one node between the elimination vector and a contiguous piece. */
static void pick(const sv_inertia_plan *p, sv_index s, const sv_complex *from, sv_complex *to)
{
    for (sv_index k = p->row_start[s]; k < p->row_start[s + 1]; k++)
        for (sv_index c = 0; c < p->block; c++)
            *to++ = from[(sv_index)p->rows[k] * p->block + c];
}

static void put(const sv_inertia_plan *p, sv_index s, const sv_complex *from, sv_complex *to)
{
    for (sv_index k = p->row_start[s]; k < p->row_start[s + 1]; k++)
        for (sv_index c = 0; c < p->block; c++)
            to[(sv_index)p->rows[k] * p->block + c] = *from++;
}

static void forward(const sv_inertia_plan *p, sv_index s, sv_complex *x)
{
    const sv_complex one = 1.0, minus = -1.0;
    sv_index rows = (p->row_start[s + 1] - p->row_start[s]) * p->block, start = 0;
    const sv_complex *panel = p->panel + p->panel_start[s];
    for (sv_index k = p->block_start[s]; k < p->block_start[s + 1]; k++) {
        const sv_pivot_block *block = &p->pivots[k];
        sv_index next = start + block->width;
        sv_pivot_forward(block, x + start);
        if (rows > next)
            cblas_zgemv(CblasColMajor, CblasNoTrans, (int)(rows - next), block->width, &minus,
                        panel + next + start * rows, (int)rows, x + start, 1, &one, x + next, 1);
        start = next;
    }
}

static void backward(const sv_inertia_plan *p, sv_index s, sv_complex *x)
{
    const sv_complex one = 1.0, minus = -1.0;
    sv_index rows = (p->row_start[s + 1] - p->row_start[s]) * p->block;
    sv_index next = (sv_index)(p->first[s + 1] - p->first[s]) * p->block;
    const sv_complex *panel = p->panel + p->panel_start[s];
    for (sv_index k = p->block_start[s + 1] - 1; k >= p->block_start[s]; k--) {
        const sv_pivot_block *block = &p->pivots[k];
        sv_index start = next - block->width;
        sv_pivot_middle(block, x + start);
        if (rows > next)
            cblas_zgemv(CblasColMajor, CblasConjTrans, (int)(rows - next), block->width, &minus,
                        panel + next + start * rows, (int)rows, x + next, 1, &one, x + start, 1);
        sv_pivot_backward(block, x + start);
        next = start;
    }
}

sv_status sv_inertia_solve(sv_context *context, sv_inertia_plan *plan, sv_complex *x)
{
    sv_inertia_plan *p = plan;
    sv_index b = p->block;
    if (!p->factored)
        return SV_FAIL(context, SV_INTERNAL, "there is no factorisation to solve with");
    for (sv_index k = 0; k < p->order; k++)
        p->vector[k] = x[(sv_index)p->group[k / b] * b + k % b];
    for (sv_index s = 0; s < p->n_nodes; s++) {
        pick(p, s, p->vector, p->work);
        forward(p, s, p->work);
        put(p, s, p->work, p->vector);
    }
    for (sv_index s = p->n_nodes - 1; s >= 0; s--) {
        pick(p, s, p->vector, p->work);
        backward(p, s, p->work);
        put(p, s, p->work, p->vector);
    }
    for (sv_index k = 0; k < p->order; k++)
        x[(sv_index)p->group[k / b] * b + k % b] = p->vector[k];
    return SV_OK;
}
