/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Small Hermitian blocks: L D L† with complete diagonal pivoting and steps of one or two columns
 * (J. R. Bunch, B. N. Parlett, SIAM J. Numer. Anal. 8, 639 (1971)). Complex products are written
 * out: the language's own check every one for NaN. */
#include "inertia_kernel.h"

static real square(number z)
{
    return RE(z) * RE(z) + IM(z) * IM(z);
}

/* a − b·CONJ(c) */
static number minus_product(number a, number b, number c)
{
    real br = RE(b), bi = IM(b), cr = RE(c), ci = IM(c);
    return NUMBER(RE(a) - (br * cr + bi * ci), IM(a) - (bi * cr - br * ci));
}

/* Exchanges rows and columns p ≤ q of the lower triangle, L in front of it included. */
static void exchange(sv_pivot_block *b, int p, int q)
{
    int w = b->width;
    number *a = b->l;
    if (p == q)
        return;
    int order = b->order[p];
    b->order[p] = b->order[q];
    b->order[q] = order;
    for (int c = 0; c < p; c++) {
        number t = a[p + c * w];
        a[p + c * w] = a[q + c * w];
        a[q + c * w] = t;
    }
    for (int r = p + 1; r < q; r++) {
        number t = CONJ(a[r + p * w]);
        a[r + p * w] = CONJ(a[q + r * w]);
        a[q + r * w] = t;
    }
    a[q + p * w] = CONJ(a[q + p * w]);
    for (int r = q + 1; r < w; r++) {
        number t = a[r + p * w];
        a[r + p * w] = a[r + q * w];
        a[r + q * w] = t;
    }
    number t = a[p + p * w];
    a[p + p * w] = a[q + q * w];
    a[q + q * w] = t;
}

/* Largest diagonal and off-diagonal element of what is left. */
static void search(const sv_pivot_block *b, int k, int *ret_p, real *ret_diagonal, int *ret_r,
                   int *ret_c, real *ret_off)
{
    int w = b->width;
    real diagonal = -1, off = -1;
    for (int c = k; c < w; c++) {
        const number *column = b->l + c * w;
        real here = SIZE(RE(column[c]));
        if (here > diagonal) {
            diagonal = here;
            *ret_p = c;
        }
        for (int r = c + 1; r < w; r++) {
            real size = square(column[r]);
            if (size > off) {
                off = size;
                *ret_r = r;
                *ret_c = c;
            }
        }
    }
    *ret_diagonal = diagonal;
    *ret_off = off > 0 ? ROOT(off) : 0;
}

static void single_step(sv_pivot_block *b, int k, real tiny, sv_pivot_tally *tally)
{
    int w = b->width;
    number *a = b->l;
    real d = RE(a[k + k * w]);
    if (!(SIZE(d) > tiny)) {
        d = d < 0 ? -tiny : tiny;
        tally->replaced++;
    }
    b->d[k] = d;
    b->pair[k] = false;
    tally->smallest = fmin(tally->smallest, (double)SIZE(d));
    tally->negative += d < 0;
    tally->positive += !(d < 0);
    real inverse = 1 / d;
    for (int c = k + 1; c < w; c++) {
        number l = a[c + k * w] * inverse;
        for (int r = c; r < w; r++)
            a[r + c * w] = minus_product(a[r + c * w], a[r + k * w], l);
    }
    for (int r = k + 1; r < w; r++)
        a[r + k * w] *= inverse;
}

/* x := D⁻¹ x for one pair, D = [[d0, ē], [e, d1]] */
static void divide_pair(real d0, real d1, number e, number *x0, number *x1)
{
    real scale = 1 / (d0 * d1 - square(e));
    number y0 = minus_product(d1 * *x0, *x1, e);
    number y1 = minus_product(d0 * *x1, *x0, CONJ(e));
    *x0 = scale * y0;
    *x1 = scale * y1;
}

static void double_step(sv_pivot_block *b, int k, sv_pivot_tally *tally)
{
    int w = b->width;
    number *a = b->l, *left = a + k * w, *right = a + (k + 1) * w;
    real d0 = RE(left[k]), d1 = RE(right[k + 1]);
    number e = left[k + 1];
    number old[2][SV_PIVOT_WIDTH];
    b->d[k] = d0;
    b->d[k + 1] = d1;
    b->e[k] = e;
    b->pair[k] = true;
    b->pair[k + 1] = false;
    /* The larger diagonal is below α·|e|, so the determinant is negative: one of each sign. */
    tally->negative++;
    tally->positive++;
    real half = SIZE(d0 + d1) / 2, root = ROOT((d0 - d1) * (d0 - d1) / 4 + square(e));
    tally->smallest = fmin(tally->smallest, (double)(root - half));
    left[k + 1] = 0;
    for (int r = k + 2; r < w; r++) {
        old[0][r] = left[r];
        old[1][r] = right[r];
        divide_pair(d0, d1, CONJ(e), &left[r], &right[r]); /* a row times D⁻¹ */
    }
    for (int c = k + 2; c < w; c++)
        for (int r = c; r < w; r++)
            a[r + c * w] =
                minus_product(minus_product(a[r + c * w], old[0][r], left[c]), old[1][r], right[c]);
}

/* Σ_i (|L| |D| |L|†)_ii: how far the factors outgrow the block they stand for. */
static real growth(const sv_pivot_block *b)
{
    int w = b->width;
    real sum = 0;
    for (int k = 0; k < w; k++) {
        sum += SIZE(b->d[k]);
        for (int r = k + 1; r < w; r++)
            sum += square(b->l[r + k * w]) * SIZE(b->d[k]);
        if (!b->pair[k])
            continue;
        real e = ROOT(square(b->e[k]));
        sum += 2 * e;
        for (int r = k + 2; r < w; r++)
            sum += 2 * e * ROOT(square(b->l[r + k * w]) * square(b->l[r + (k + 1) * w]));
    }
    return sum;
}

void sv_pivot_factor(const number *a, sv_index lead, int width, real tiny,
                     sv_pivot_block *ret_block, sv_pivot_tally *tally)
{
    const real alpha = (real)0.6403882032022076; /* (1 + √17)/8 */
    sv_pivot_block *b = ret_block;
    b->width = width;
    for (int c = 0; c < width; c++) {
        b->order[c] = c;
        for (int r = 0; r < width; r++)
            b->l[r + c * width] = r >= c ? a[r + c * lead] : 0;
    }
    for (int k = 0; k < width;) {
        int p = k, r = k, c = k;
        real diagonal, off;
        search(b, k, &p, &diagonal, &r, &c, &off);
        if (diagonal >= alpha * off || off <= tiny) {
            exchange(b, k, p);
            single_step(b, k, tiny, tally);
            k++;
        } else {
            exchange(b, k, c);
            exchange(b, k + 1, r);
            double_step(b, k, tally);
            k += 2;
        }
    }
    tally->grown += (double)growth(b);
}

void sv_pivot_forward(const sv_pivot_block *block, number *x)
{
    int w = block->width;
    number y[SV_PIVOT_WIDTH];
    for (int k = 0; k < w; k++)
        y[k] = x[block->order[k]];
    for (int k = 0; k < w; k++)
        for (int r = k + 1; r < w; r++)
            y[r] = minus_product(y[r], y[k], CONJ(block->l[r + k * w]));
    for (int k = 0; k < w; k++)
        x[k] = y[k];
}

void sv_pivot_middle(const sv_pivot_block *block, number *x)
{
    for (int k = 0; k < block->width; k++) {
        if (block->pair[k]) {
            divide_pair(block->d[k], block->d[k + 1], block->e[k], &x[k], &x[k + 1]);
            k++;
        } else {
            x[k] /= block->d[k];
        }
    }
}

void sv_pivot_backward(const sv_pivot_block *block, number *x)
{
    int w = block->width;
    number y[SV_PIVOT_WIDTH];
    for (int k = w - 1; k >= 0; k--) {
        y[k] = x[k];
        for (int r = k + 1; r < w; r++)
            y[k] = minus_product(y[k], y[r], block->l[r + k * w]);
    }
    for (int k = 0; k < w; k++)
        x[block->order[k]] = y[k];
}

void sv_pivot_divider(const sv_pivot_block *block, number *g)
{
    int w = block->width;
    /* Columns of L^{−†}, upper triangular: L† u = e_c. */
    for (int c = 0; c < w; c++) {
        number u[SV_PIVOT_WIDTH] = {0};
        u[c] = 1;
        for (int k = c - 1; k >= 0; k--)
            for (int r = k + 1; r <= c; r++)
                u[k] = minus_product(u[k], u[r], block->l[r + k * w]);
        for (int k = 0; k < w; k++)
            g[block->order[k] + c * w] = u[k];
    }
}

/* One column: l = w/d. */
static double divide_single(real d, sv_index rows, const number *w, number *l)
{
    real inverse = 1 / d, sum = 0;
    for (sv_index r = 0; r < rows; r++) {
        real re = RE(w[r]), im = IM(w[r]);
        sum += re * re + im * im;
        l[r] = NUMBER(re * inverse, im * inverse);
    }
    return (double)(sum * SIZE(inverse));
}

static double divide_double(real d0, real d1, number e, sv_index rows, const number *w0,
                            const number *w1, number *l0, number *l1)
{
    real sum = 0;
    for (sv_index r = 0; r < rows; r++) {
        number x0 = w0[r], x1 = w1[r];
        divide_pair(d0, d1, CONJ(e), &x0, &x1);
        l0[r] = x0;
        l1[r] = x1;
        sum += ROOT(square(x0) * square(w0[r])) + ROOT(square(x1) * square(w1[r]));
    }
    return (double)sum;
}

double sv_pivot_divide(const sv_pivot_block *block, sv_index rows, const number *w, sv_index w_lead,
                       number *l, sv_index l_lead)
{
    double sum = 0.0;
    for (int k = 0; k < block->width; k++) {
        if (!block->pair[k]) {
            sum += divide_single(block->d[k], rows, w + k * w_lead, l + k * l_lead);
            continue;
        }
        sum += divide_double(block->d[k], block->d[k + 1], block->e[k], rows, w + k * w_lead,
                             w + (k + 1) * w_lead, l + k * l_lead, l + (k + 1) * l_lead);
        k++;
    }
    return sum;
}

#ifndef SV_INERTIA_SINGLE
size_t sv_inertia_pivot_size(void)
{
    return sizeof(sv_pivot_block);
}
#endif
