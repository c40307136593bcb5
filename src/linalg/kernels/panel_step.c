/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Polynomials of the Hamiltonian over panels, compiled once per instruction set and precision (see
 * meson.build): PANEL_STEP and PANEL_POLYNOMIAL are the names of this copy. Fused multiply–adds are
 * allowed here and only here, so the copies differ in the last bits and the copy in use is part of
 * a run's identity. */
#include "../linalg_internal.h"

#include <string.h>

#ifdef PANEL_SINGLE
typedef float real;
enum { COLUMNS = SV_PANEL_COLUMNS_SINGLE };
#else
typedef double real;
enum { COLUMNS = SV_PANEL_COLUMNS };
#endif

/* One register's worth of columns; a row has LANES of them real, LANES imaginary. */
typedef real lane __attribute__((vector_size(64), aligned(64)));
enum { LANES = COLUMNS * sizeof(real) / 64, ROW = 2 * COLUMNS };

/* Eight steps: measured best from 1,800 to 10^6 rows; more of them spill from the cache again. */
enum { STEPS_PER_WALK = 8, LEAST_STRIDE = 64 };
_Static_assert(STEPS_PER_WALK % 2 == 0, "the vectors of a walk come back to their places");

/* Adds an element times a row of x; real and imaginary elements have sums of their own, so that the
 * chains of dependent additions stay short. */
static inline void add_real(lane *re, lane *im, real value, const lane *in)
{
    for (int l = 0; l < LANES; l++) {
        re[l] += value * in[l];
        im[l] += value * in[LANES + l];
    }
}

static inline void add_imaginary(lane *re, lane *im, real value, const lane *in)
{
    for (int l = 0; l < LANES; l++) {
        re[l] -= value * in[LANES + l];
        im[l] += value * in[l];
    }
}

void PANEL_STEP(const sv_packed *a, sv_index first, sv_index last, const real *x, real *t, real *y,
                real factor, real weight)
{
#ifdef PANEL_SINGLE
    const float *a_re = a->re_single, *a_im = a->im_single;
#else
    const double *a_re = a->re, *a_im = a->im;
#endif
    for (sv_index r = first; r < last; r++) {
        lane re[LANES] = {{0}}, im[LANES] = {{0}}, re_i[LANES] = {{0}}, im_i[LANES] = {{0}};
        const sv_index *start = a->start + 3 * r;
        for (sv_index k = start[0]; k < start[1]; k++)
            add_real(re, im, a_re[k], (const lane *)(x + a->column[k] * ROW));
        for (sv_index k = start[1]; k < start[2]; k++)
            add_imaginary(re_i, im_i, a_im[k], (const lane *)(x + a->column[k] * ROW));
        for (sv_index k = start[2]; k < start[3]; k++) { /* neither real nor imaginary */
            const lane *in = (const lane *)(x + a->column[k] * ROW);
            add_real(re, im, a_re[k], in);
            add_imaginary(re_i, im_i, a_im[k], in);
        }
        lane *out = (lane *)(t + r * ROW), *sum = (lane *)(y + r * ROW);
        for (int l = 0; l < LANES; l++) {
            re[l] = factor * (re[l] + re_i[l]) - out[l];
            im[l] = factor * (im[l] + im_i[l]) - out[LANES + l];
            out[l] = re[l];
            out[LANES + l] = im[l];
        }
        /* Odd polynomials have no even terms: half the traffic of the sum is saved. */
        for (int l = 0; l < LANES && weight != 0; l++) {
            sum[l] += weight * re[l];
            sum[LANES + l] += weight * im[l];
        }
    }
}

/*
 * Several steps in one walk over the rows: step s follows s·span rows behind the first, where all
 * rows it reads are done and none it overwrites is still wanted. Vectors far larger than the cache
 * then come from memory once per walk, not once per step.
 */
static void walk(const sv_packed *a, const double *weights, int steps, real *before, real *now,
                 real *y)
{
    sv_index stride = a->span > LEAST_STRIDE ? a->span : LEAST_STRIDE;
    for (sv_index base = 0; base < a->n + (steps - 1) * a->span; base += stride)
        for (int s = 0; s < steps; s++) {
            sv_index first = base - s * a->span, last = first + stride;
            first = first < 0 ? 0 : first;
            last = last > a->n ? a->n : last;
            if (first < last)
                PANEL_STEP(a, first, last, s % 2 == 0 ? now : before, s % 2 == 0 ? before : now, y,
                           2, (real)weights[s]);
        }
}

void PANEL_POLYNOMIAL(const sv_packed *a, const double *coefficients, int degree, const real *x,
                      real *work, real *y)
{
    size_t size = (size_t)a->n * ROW;
    real *before = work, *now = work + size;
    /* T_0 = 1 and T_1 = A: the same loop with factor 1 and nothing to take off. */
    for (size_t k = 0; k < size; k++) {
        y[k] = (real)coefficients[0] * x[k];
        now[k] = 0;
    }
    memcpy(before, x, size * sizeof *x);
    if (degree < 1)
        return;
    PANEL_STEP(a, 0, a->n, before, now, y, 1, (real)coefficients[1]);
    /* Steps per walk are even: after a full one `now` is the newest again. */
    for (int k = 2; k <= degree; k += STEPS_PER_WALK) {
        int left = degree - k + 1, steps = left < STEPS_PER_WALK ? left : STEPS_PER_WALK;
        walk(a, coefficients + k, steps, before, now, y);
    }
}
