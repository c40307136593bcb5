/* SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef SELVEDGE_RATIONAL_INTERNAL_H
#define SELVEDGE_RATIONAL_INTERNAL_H

#include "projector_internal.h"

enum { SV_RATIONAL_WIDTH = SV_PANEL_COLUMNS }; /* right-hand sides at a time */

/* P = (1 − sign A)/2 with A = (H − energy)/scale and A² + pole² factored for every pole. */
typedef struct rational_state {
    const sv_sparse *h;
    double energy, scale;
    sv_packed packed; /* A */
    sv_panel_kernel kernel;
    double *panels; /* four: x, two of work, y */
    double nearest; /* distance of the nearest level in units of scale; 0: unknown */
    sv_zolotarev sign;
    sv_definite *factors; /* of A² + pole², slot j for pole j */
    int refined;      /* poles 0 … refined − 1 are close to the axis: solutions are refined */
    double tolerance; /* of the solutions, relative to the column projected */
    double rounding;  /* largest error of the sum over poles seen so far, same unit */
    sv_complex *work; /* seven blocks n × SV_RATIONAL_WIDTH */
} rational_state;

/* How small a pole must be for its solutions to be refined. */
double sv_rational_refined_below(double tolerance);
/* The engine's apply. */
sv_status sv_rational_apply(sv_context *context, void *state, sv_index columns, const sv_complex *x,
                            sv_complex *y);

#endif
