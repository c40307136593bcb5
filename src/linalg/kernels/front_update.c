/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The product that factorisations spend their time in, c := c − l w† on and below the diagonal,
 * compiled once per precision and instruction set (see meson.build): FRONT_UPDATE is the name of
 * this copy, FRONT_BYTES the size of a register. Parts are packed with real and imaginary parts
 * apart; fused multiply–adds are allowed. Fronts have some hundred rows: too few for a library made
 * for large matrices to be at its best. */
#include "../inertia_kernel.h"

/* Columns of c and terms of the sums that are packed at a time. */
enum { STRIPE = 64, TERMS = 128, LANES = FRONT_BYTES / sizeof(real), TILE = 2 * LANES };
/* Columns computed together: as many as the registers hold sums of. */
enum { TOGETHER = FRONT_BYTES == 64 ? 4 : 2 };

typedef real lane __attribute__((vector_size(FRONT_BYTES), aligned(FRONT_BYTES)));

/* Rows of l by tiles: for each term TILE real parts, then TILE imaginary ones. */
static void pack_rows(const number *l, sv_index lead, sv_index rows, sv_index terms, real *to)
{
    for (sv_index k = 0; k < terms; k++, to += 2 * TILE)
        for (sv_index r = 0; r < TILE; r++) {
            number x = r < rows ? l[r + k * lead] : 0;
            to[r] = RE(x);
            to[TILE + r] = IM(x);
        }
}

/* Rows of w, columns of the product, by groups: for each term their real and imaginary parts. */
static void pack_columns(const number *w, sv_index lead, sv_index columns, sv_index terms, real *to)
{
    for (sv_index first = 0; first < columns; first += TOGETHER)
        for (sv_index k = 0; k < terms; k++)
            for (sv_index c = first; c < first + TOGETHER; c++) {
                number x = c < columns ? w[c + k * lead] : 0;
                *to++ = RE(x);
                *to++ = IM(x);
            }
}

/* Sums of one tile and group, real parts of every column, then imaginary ones. */
static void sums(const real *l, const real *w, sv_index terms, lane (*ret)[4])
{
    lane re0[TOGETHER] = {{0}}, re1[TOGETHER] = {{0}}, im0[TOGETHER] = {{0}}, im1[TOGETHER] = {{0}};
    for (sv_index k = 0; k < terms; k++, l += 2 * TILE, w += 2 * TOGETHER) {
        const lane *x = (const lane *)l;
        lane a0 = x[0], a1 = x[1], b0 = x[2], b1 = x[3];
        for (int c = 0; c < TOGETHER; c++) {
            real u = w[2 * c], v = w[2 * c + 1];
            re0[c] += a0 * u;
            re1[c] += a1 * u;
            im0[c] += b0 * u;
            im1[c] += b1 * u;
            re0[c] += b0 * v;
            re1[c] += b1 * v;
            im0[c] -= a0 * v;
            im1[c] -= a1 * v;
        }
    }
    for (int c = 0; c < TOGETHER; c++) {
        ret[c][0] = re0[c];
        ret[c][1] = re1[c];
        ret[c][2] = im0[c];
        ret[c][3] = im1[c];
    }
}

static void subtract(const lane (*from)[4], sv_index rows, sv_index columns, bool fresh, number *c,
                     sv_index lead)
{
    for (sv_index column = 0; column < columns; column++, c += lead) {
        const real *re = (const real *)from[column], *im = re + TILE;
        if (fresh)
            for (sv_index r = 0; r < rows; r++)
                c[r] = NUMBER(-re[r], -im[r]);
        else
            for (sv_index r = 0; r < rows; r++)
                c[r] = NUMBER(RE(c[r]) - re[r], IM(c[r]) - im[r]);
    }
}

/* A stripe of columns, some of the terms. */
static void stripe(const number *l, const number *w, sv_index lead, sv_index rows, sv_index columns,
                   sv_index terms, bool fresh, number *c, sv_index c_lead)
{
    real packed_l[2 * TILE * TERMS] __attribute__((aligned(64)));
    real packed_w[2 * STRIPE * TERMS] __attribute__((aligned(64)));
    lane result[TOGETHER][4];
    pack_columns(w, lead, columns, terms, packed_w);
    for (sv_index r = 0; r < rows; r += TILE) {
        sv_index height = rows - r < TILE ? rows - r : TILE;
        pack_rows(l + r, lead, height, terms, packed_l);
        for (sv_index at = 0; at < columns && at < r + height; at += TOGETHER) {
            sv_index width = columns - at < TOGETHER ? columns - at : TOGETHER;
            sums(packed_l, packed_w + 2 * at * terms, terms, result);
            subtract((const lane(*)[4])result, height, width, fresh, c + r + at * c_lead, c_lead);
        }
    }
}

void FRONT_UPDATE(const number *l, const number *w, sv_index lead, sv_index rows, sv_index columns,
                  sv_index terms, bool fresh, number *c, sv_index c_lead)
{
    for (sv_index at = 0; at < columns; at += STRIPE)
        for (sv_index k = 0; k < terms; k += TERMS)
            stripe(l + at + k * lead, w + at + k * lead, lead, rows - at,
                   columns - at < STRIPE ? columns - at : STRIPE,
                   terms - k < TERMS ? terms - k : TERMS, fresh && k == 0, c + at + at * c_lead,
                   c_lead);
}
