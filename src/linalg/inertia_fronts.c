/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Numerical factorisation H − shift = L D L† of a sparse Hermitian matrix by dense fronts
 * (multifrontal method: I. S. Duff, J. K. Reid, ACM Trans. Math. Softw. 9, 302 (1983)).
 *
 * Each supernode gathers its matrix elements and the updates of its children, eliminates its
 * columns and leaves an update for its parent on a stack. Pivoting stays inside diagonal blocks
 * of SV_PIVOT_WIDTH columns; what that costs in accuracy is measured by the trace of
 * |L| |D| |L|†, and the callers draw the consequences. */
#include "inertia_kernel.h"

#include <string.h>

/* In the order of sv_panel_kernel. */
static front_update *const UPDATES[] = {
#ifdef SV_INERTIA_SINGLE
    sv_front_update_single_plain, sv_front_update_single_avx2, sv_front_update_single_avx512
#else
    sv_front_update_double_plain, sv_front_update_double_avx2, sv_front_update_double_avx512
#endif
};

/* The front being built. */
typedef struct front {
    sv_index node, rows, columns, below; /* single rows, not groups */
    const int32_t *groups;               /* its group rows */
    number *panel;                       /* rows × columns */
    number *update;                      /* below × below, lower triangle */
} front;

static front front_of(const sv_inertia_plan *p, sv_index s)
{
    front f = {.node = s,
               .groups = p->rows + p->row_start[s],
               .panel = (number *)p->panel + p->panel_start[s]};
    f.rows = (p->row_start[s + 1] - p->row_start[s]) * p->block;
    f.columns = (sv_index)(p->first[s + 1] - p->first[s]) * p->block;
    f.below = f.rows - f.columns;
    return f;
}

/* Adds the elements of H − shift in the columns of the front. */
static bool gather(const sv_inertia_plan *p, const sv_sparse *h, double shift, const front *f)
{
    sv_index b = p->block, n_groups = f->rows / b, first = p->first[f->node];
    for (sv_index k = 0; k < n_groups; k++)
        p->slot[f->groups[k]] = (int32_t)k;
    for (sv_index c = 0; c < f->columns; c++) {
        sv_index row = (sv_index)p->group[first + c / b] * b + c % b;
        number *column = f->panel + c * f->rows;
        column[c] -= (real)shift;
        for (sv_index k = h->row_start[row]; k < h->row_start[row + 1]; k++) {
            sv_index other = h->column[k] / b, at = p->place[other];
            if (at < first)
                continue;
            sv_index slot = p->slot[at];
            if (slot < 0 || slot >= n_groups || f->groups[slot] != at)
                return false;
            sv_index r = slot * b + h->column[k] - other * b;
            if (r >= c)
                column[r] += NUMBER((real)creal(h->value[k]), -(real)cimag(h->value[k]));
        }
    }
    return true;
}

/* Adds the part of an update a child left (lower triangle) that falls into the columns of the
 * front, or into those below. */
static void absorb(const sv_inertia_plan *p, sv_index child, const number *update, bool below,
                   const front *f)
{
    sv_index b = p->block, own = p->first[child + 1] - p->first[child];
    const int32_t *target = p->target + p->row_start[child] + own;
    sv_index groups = p->row_start[child + 1] - p->row_start[child] - own, side = groups * b;
    for (sv_index c = 0; c < side; c++) {
        sv_index column = target[c / b] * b + c % b;
        if ((column >= f->columns) != below)
            continue;
        const number *from = update + c * side;
        number *to = column < f->columns ? f->panel + column * f->rows
                                         : f->update + (column - f->columns) * f->below;
        sv_index skip = column < f->columns ? 0 : f->columns;
        for (sv_index g = c / b; g < groups; g++) {
            sv_index at = target[g] * b - skip, r = g * b;
            for (sv_index k = g == c / b ? c % b : 0; k < b; k++)
                to[at + k] += from[r + k];
        }
    }
}

/* Eliminates `width` columns from `start` on inside the panel; W = L D goes to the work space. */
static void eliminate(sv_inertia_plan *p, const front *f, sv_index start, int width, real tiny,
                      sv_pivot_block *block, sv_pivot_tally *tally)
{
    const number one = 1.0, zero = 0.0;
    number g[SV_PIVOT_WIDTH * SV_PIVOT_WIDTH];
    sv_index lead = f->rows, next = start + width, below = lead - next;
    number *l = f->panel + next + start * lead, *w = (number *)p->work + next + start * lead;
    sv_pivot_factor(f->panel + start + start * lead, lead, width, tiny, block, tally);
    if (below == 0)
        return;
    sv_pivot_divider(block, g);
    GEMM(CblasColMajor, CblasNoTrans, CblasNoTrans, (int)below, width, width, &one, l, (int)lead, g,
         width, &zero, w, (int)lead);
    tally->grown += sv_pivot_divide(block, below, w, lead, l, lead);
    if (next < f->columns)
        UPDATES[p->kernel](l, w, lead, below, f->columns - next, width, false,
                           f->panel + next + next * lead, lead);
}

static void factor_front(sv_inertia_plan *p, const front *f, real tiny, sv_pivot_tally *tally)
{
    sv_pivot_block *block = (sv_pivot_block *)p->pivots + p->block_start[f->node];
    for (sv_index start = 0; start < f->columns; start += SV_PIVOT_WIDTH) {
        sv_index left = f->columns - start;
        eliminate(p, f, start, (int)(left < SV_PIVOT_WIDTH ? left : SV_PIVOT_WIDTH), tiny, block++,
                  tally);
    }
    if (f->below > 0)
        UPDATES[p->kernel](f->panel + f->columns, (number *)p->work + f->columns, f->rows, f->below,
                           f->below, f->columns, true, f->update, f->below);
}

static sv_index update_side(const sv_inertia_plan *p, sv_index s)
{
    return (p->row_start[s + 1] - p->row_start[s] - (p->first[s + 1] - p->first[s])) * p->block;
}

sv_status sv_inertia_fronts(sv_context *context, sv_inertia_plan *plan, const sv_sparse *h,
                            double shift, double tiny, sv_pivot_tally *tally)
{
    sv_inertia_plan *p = plan;
    number *stack = p->stack;
    sv_index top = 0, n_pending = 0;
    for (sv_index s = 0; s < p->n_nodes; s++) {
        front f = front_of(p, s);
        sv_index size = f.below * f.below, base = top, children = 0;
        f.update = stack + top;
        memset(f.panel, 0, (size_t)(f.rows * f.columns) * sizeof *f.panel);
        if (!gather(p, h, shift, &f))
            return SV_FAIL(context, SV_INVALID_INPUT,
                           "the matrix has elements outside the pattern that was analysed");
        for (; children < n_pending && p->parent[p->pending[n_pending - 1 - children]] == s;
             children++) {
            sv_index child = p->pending[n_pending - 1 - children];
            base -= update_side(p, child) * update_side(p, child);
            absorb(p, child, stack + base, false, &f);
        }
        factor_front(p, &f, (real)tiny, tally);
        sv_index from = base;
        for (sv_index k = n_pending - children; k < n_pending; k++) {
            absorb(p, p->pending[k], stack + from, true, &f);
            from += update_side(p, p->pending[k]) * update_side(p, p->pending[k]);
        }
        n_pending -= children;
        memmove(stack + base, f.update, (size_t)size * sizeof *f.update);
        top = base + size;
        if (p->parent[s] >= 0)
            p->pending[n_pending++] = (int32_t)s;
        if ((s & 63) == 63 && sv_cancelled(context))
            return SV_FAIL(context, SV_INTERRUPTED, "stopped during a factorisation");
    }
    return SV_OK;
}
