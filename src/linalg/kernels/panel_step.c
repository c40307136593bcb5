/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The inner loop of every polynomial of the Hamiltonian, compiled once per instruction set (see
 * meson.build): PANEL_STEP is the name of this copy. Fused multiply–adds are allowed here and only
 * here, so the copies differ in the last bits and the copy in use is part of a run's identity. */
#include "../linalg_internal.h"

/* One register's worth of columns; a panel row is two of them real, two imaginary. */
typedef double lane __attribute__((vector_size(64), aligned(64)));
enum { LANES = SV_PANEL_COLUMNS / 8 };

void PANEL_STEP(const sv_packed *a, sv_index first, sv_index last, const double *x, double *t,
                double *y, double factor, double weight)
{
    for (sv_index r = first; r < last; r++) {
        lane re[LANES] = {{0}}, im[LANES] = {{0}};
        const sv_index *start = a->start + 3 * r;
        for (sv_index k = start[0]; k < start[1]; k++) { /* real elements */
            const lane *in = (const lane *)(x + a->column[k] * SV_PANEL_ROW);
            for (int l = 0; l < LANES; l++) {
                re[l] += a->re[k] * in[l];
                im[l] += a->re[k] * in[LANES + l];
            }
        }
        for (sv_index k = start[1]; k < start[2]; k++) { /* imaginary elements */
            const lane *in = (const lane *)(x + a->column[k] * SV_PANEL_ROW);
            for (int l = 0; l < LANES; l++) {
                re[l] -= a->im[k] * in[LANES + l];
                im[l] += a->im[k] * in[l];
            }
        }
        for (sv_index k = start[2]; k < start[3]; k++) { /* the others */
            const lane *in = (const lane *)(x + a->column[k] * SV_PANEL_ROW);
            for (int l = 0; l < LANES; l++) {
                re[l] += a->re[k] * in[l];
                im[l] += a->re[k] * in[LANES + l];
                re[l] -= a->im[k] * in[LANES + l];
                im[l] += a->im[k] * in[l];
            }
        }
        lane *out = (lane *)(t + r * SV_PANEL_ROW), *sum = (lane *)(y + r * SV_PANEL_ROW);
        for (int l = 0; l < LANES; l++) {
            lane new_re = factor * re[l] - out[l], new_im = factor * im[l] - out[LANES + l];
            out[l] = new_re;
            out[LANES + l] = new_im;
            sum[l] += weight * new_re;
            sum[LANES + l] += weight * new_im;
        }
    }
}
