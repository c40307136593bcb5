/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Small Hermitian blocks: L D L† with complete diagonal pivoting and steps of one or two columns
 * (J. R. Bunch, B. N. Parlett, SIAM J. Numer. Anal. 8, 639 (1971)). Complex products are written
 * out: the language's own check every one for NaN. */
#include "inertia_internal.h"

#include <math.h>

static double square(sv_complex z)
{
    return creal(z) * creal(z) + cimag(z) * cimag(z);
}

/* a − b·conj(c) */
static sv_complex minus_product(sv_complex a, sv_complex b, sv_complex c)
{
    double br = creal(b), bi = cimag(b), cr = creal(c), ci = cimag(c);
    return CMPLX(creal(a) - (br * cr + bi * ci), cimag(a) - (bi * cr - br * ci));
}

/* Exchanges rows and columns p ≤ q of the lower triangle, L in front of it included. */
static void exchange(sv_pivot_block *b, int p, int q)
{
    int w = b->width;
    sv_complex *a = b->l;
    if (p == q)
        return;
    int order = b->order[p];
    b->order[p] = b->order[q];
    b->order[q] = order;
    for (int c = 0; c < p; c++) {
        sv_complex t = a[p + c * w];
        a[p + c * w] = a[q + c * w];
        a[q + c * w] = t;
    }
    for (int r = p + 1; r < q; r++) {
        sv_complex t = conj(a[r + p * w]);
        a[r + p * w] = conj(a[q + r * w]);
        a[q + r * w] = t;
    }
    a[q + p * w] = conj(a[q + p * w]);
    for (int r = q + 1; r < w; r++) {
        sv_complex t = a[r + p * w];
        a[r + p * w] = a[r + q * w];
        a[r + q * w] = t;
    }
    sv_complex t = a[p + p * w];
    a[p + p * w] = a[q + q * w];
    a[q + q * w] = t;
}

/* Largest diagonal and off-diagonal element of what is left. */
static void search(const sv_pivot_block *b, int k, int *ret_p, double *ret_diagonal, int *ret_r,
                   int *ret_c, double *ret_off)
{
    int w = b->width;
    double diagonal = -1.0, off = -1.0;
    for (int c = k; c < w; c++) {
        const sv_complex *column = b->l + c * w;
        double here = fabs(creal(column[c]));
        if (here > diagonal) {
            diagonal = here;
            *ret_p = c;
        }
        for (int r = c + 1; r < w; r++) {
            double size = square(column[r]);
            if (size > off) {
                off = size;
                *ret_r = r;
                *ret_c = c;
            }
        }
    }
    *ret_diagonal = diagonal;
    *ret_off = off > 0.0 ? sqrt(off) : 0.0;
}

static void single_step(sv_pivot_block *b, int k, double tiny, sv_pivot_tally *tally)
{
    int w = b->width;
    sv_complex *a = b->l;
    double d = creal(a[k + k * w]);
    if (!(fabs(d) > tiny)) {
        d = d < 0.0 ? -tiny : tiny;
        tally->replaced++;
    }
    b->d[k] = d;
    b->pair[k] = false;
    tally->smallest = fmin(tally->smallest, fabs(d));
    tally->negative += d < 0.0;
    tally->positive += !(d < 0.0);
    double inverse = 1.0 / d;
    for (int c = k + 1; c < w; c++) {
        sv_complex l = a[c + k * w] * inverse;
        for (int r = c; r < w; r++)
            a[r + c * w] = minus_product(a[r + c * w], a[r + k * w], l);
    }
    for (int r = k + 1; r < w; r++)
        a[r + k * w] *= inverse;
}

/* x := D⁻¹ x for one pair, D = [[d0, ē], [e, d1]] */
static void divide_pair(double d0, double d1, sv_complex e, sv_complex *x0, sv_complex *x1)
{
    double scale = 1.0 / (d0 * d1 - square(e));
    sv_complex y0 = minus_product(d1 * *x0, *x1, e);
    sv_complex y1 = minus_product(d0 * *x1, *x0, conj(e));
    *x0 = scale * y0;
    *x1 = scale * y1;
}

static void double_step(sv_pivot_block *b, int k, sv_pivot_tally *tally)
{
    int w = b->width;
    sv_complex *a = b->l, *left = a + k * w, *right = a + (k + 1) * w;
    double d0 = creal(left[k]), d1 = creal(right[k + 1]);
    sv_complex e = left[k + 1];
    sv_complex old[2][SV_PIVOT_WIDTH];
    b->d[k] = d0;
    b->d[k + 1] = d1;
    b->e[k] = e;
    b->pair[k] = true;
    b->pair[k + 1] = false;
    /* The larger diagonal is below α·|e|, so the determinant is negative: one of each sign. */
    tally->negative++;
    tally->positive++;
    double half = 0.5 * fabs(d0 + d1), root = sqrt(0.25 * (d0 - d1) * (d0 - d1) + square(e));
    tally->smallest = fmin(tally->smallest, root - half);
    left[k + 1] = 0.0;
    for (int r = k + 2; r < w; r++) {
        old[0][r] = left[r];
        old[1][r] = right[r];
        divide_pair(d0, d1, conj(e), &left[r], &right[r]); /* a row times D⁻¹ */
    }
    for (int c = k + 2; c < w; c++)
        for (int r = c; r < w; r++)
            a[r + c * w] =
                minus_product(minus_product(a[r + c * w], old[0][r], left[c]), old[1][r], right[c]);
}

/* Σ_i (|L| |D| |L|†)_ii: how far the factors outgrow the block they stand for. */
static double growth(const sv_pivot_block *b)
{
    int w = b->width;
    double sum = 0.0;
    for (int k = 0; k < w; k++) {
        sum += fabs(b->d[k]);
        for (int r = k + 1; r < w; r++)
            sum += square(b->l[r + k * w]) * fabs(b->d[k]);
        if (!b->pair[k])
            continue;
        double e = sqrt(square(b->e[k]));
        sum += 2.0 * e;
        for (int r = k + 2; r < w; r++)
            sum += 2.0 * e * sqrt(square(b->l[r + k * w]) * square(b->l[r + (k + 1) * w]));
    }
    return sum;
}

void sv_pivot_factor(const sv_complex *a, sv_index lead, int width, double tiny,
                     sv_pivot_block *ret_block, sv_pivot_tally *tally)
{
    const double alpha = 0.6403882032022076; /* (1 + √17)/8 */
    sv_pivot_block *b = ret_block;
    b->width = width;
    for (int c = 0; c < width; c++) {
        b->order[c] = c;
        for (int r = 0; r < width; r++)
            b->l[r + c * width] = r >= c ? a[r + c * lead] : 0.0;
    }
    for (int k = 0; k < width;) {
        int p = k, r = k, c = k;
        double diagonal, off;
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
    tally->grown += growth(b);
}

void sv_pivot_forward(const sv_pivot_block *block, sv_complex *x)
{
    int w = block->width;
    sv_complex y[SV_PIVOT_WIDTH];
    for (int k = 0; k < w; k++)
        y[k] = x[block->order[k]];
    for (int k = 0; k < w; k++)
        for (int r = k + 1; r < w; r++)
            y[r] = minus_product(y[r], y[k], conj(block->l[r + k * w]));
    for (int k = 0; k < w; k++)
        x[k] = y[k];
}

void sv_pivot_middle(const sv_pivot_block *block, sv_complex *x)
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

void sv_pivot_backward(const sv_pivot_block *block, sv_complex *x)
{
    int w = block->width;
    sv_complex y[SV_PIVOT_WIDTH];
    for (int k = w - 1; k >= 0; k--) {
        y[k] = x[k];
        for (int r = k + 1; r < w; r++)
            y[k] = minus_product(y[k], y[r], block->l[r + k * w]);
    }
    for (int k = 0; k < w; k++)
        x[block->order[k]] = y[k];
}

void sv_pivot_divider(const sv_pivot_block *block, sv_complex *g)
{
    int w = block->width;
    /* Columns of L^{−†}, upper triangular: L† u = e_c. */
    for (int c = 0; c < w; c++) {
        sv_complex u[SV_PIVOT_WIDTH] = {0};
        u[c] = 1.0;
        for (int k = c - 1; k >= 0; k--)
            for (int r = k + 1; r <= c; r++)
                u[k] = minus_product(u[k], u[r], block->l[r + k * w]);
        for (int k = 0; k < w; k++)
            g[block->order[k] + c * w] = u[k];
    }
}

/* One column: l = w/d. */
static double divide_single(double d, sv_index rows, const sv_complex *w, sv_complex *l)
{
    double inverse = 1.0 / d, sum = 0.0;
    for (sv_index r = 0; r < rows; r++) {
        double re = creal(w[r]), im = cimag(w[r]);
        sum += re * re + im * im;
        l[r] = CMPLX(re * inverse, im * inverse);
    }
    return sum * fabs(inverse);
}

static double divide_double(double d0, double d1, sv_complex e, sv_index rows, const sv_complex *w0,
                            const sv_complex *w1, sv_complex *l0, sv_complex *l1)
{
    double sum = 0.0;
    for (sv_index r = 0; r < rows; r++) {
        sv_complex x0 = w0[r], x1 = w1[r];
        divide_pair(d0, d1, conj(e), &x0, &x1);
        l0[r] = x0;
        l1[r] = x1;
        sum += sqrt(square(x0) * square(w0[r])) + sqrt(square(x1) * square(w1[r]));
    }
    return sum;
}

double sv_pivot_divide(const sv_pivot_block *block, sv_index rows, const sv_complex *w,
                       sv_index w_lead, sv_complex *l, sv_index l_lead)
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
