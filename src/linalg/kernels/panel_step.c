/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The inner loop of every polynomial of the Hamiltonian, compiled once per instruction set (see
 * meson.build): PANEL_STEP is the name of this copy. Fused multiply–adds are allowed here and only
 * here, so the copies differ in the last bits and the copy in use is part of a run's identity. */
#include "../linalg_internal.h"

/* One register's worth of columns; a panel row is two of them real, two imaginary. */
typedef double lane __attribute__((vector_size(64), aligned(64)));
enum { LANES = SV_PANEL_COLUMNS / 8 };

/* Adds an element times a row of x; real and imaginary elements have sums of their own, so that the
 * chains of dependent additions stay short. */
static inline void add_real(lane *re, lane *im, double value, const lane *in)
{
    for (int l = 0; l < LANES; l++) {
        re[l] += value * in[l];
        im[l] += value * in[LANES + l];
    }
}

static inline void add_imaginary(lane *re, lane *im, double value, const lane *in)
{
    for (int l = 0; l < LANES; l++) {
        re[l] -= value * in[LANES + l];
        im[l] += value * in[l];
    }
}

void PANEL_STEP(const sv_packed *a, sv_index first, sv_index last, const double *x, double *t,
                double *y, double factor, double weight)
{
    for (sv_index r = first; r < last; r++) {
        lane re[LANES] = {{0}}, im[LANES] = {{0}}, re_i[LANES] = {{0}}, im_i[LANES] = {{0}};
        const sv_index *start = a->start + 3 * r;
        for (sv_index k = start[0]; k < start[1]; k++)
            add_real(re, im, a->re[k], (const lane *)(x + a->column[k] * SV_PANEL_ROW));
        for (sv_index k = start[1]; k < start[2]; k++)
            add_imaginary(re_i, im_i, a->im[k], (const lane *)(x + a->column[k] * SV_PANEL_ROW));
        for (sv_index k = start[2]; k < start[3]; k++) { /* neither real nor imaginary */
            const lane *in = (const lane *)(x + a->column[k] * SV_PANEL_ROW);
            add_real(re, im, a->re[k], in);
            add_imaginary(re_i, im_i, a->im[k], in);
        }
        lane *out = (lane *)(t + r * SV_PANEL_ROW), *sum = (lane *)(y + r * SV_PANEL_ROW);
        for (int l = 0; l < LANES; l++) {
            re[l] = factor * (re[l] + re_i[l]) - out[l];
            im[l] = factor * (im[l] + im_i[l]) - out[LANES + l];
            out[l] = re[l];
            out[LANES + l] = im[l];
        }
        /* Odd polynomials have no even terms: half the traffic of the sum is saved. */
        for (int l = 0; l < LANES && weight != 0.0; l++) {
            sum[l] += weight * re[l];
            sum[LANES + l] += weight * im[l];
        }
    }
}
