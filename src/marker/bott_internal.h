/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Two ways to the angles of V U V† U†: sums of powers with a certificate, and eigenvalues. */
#ifndef SELVEDGE_BOTT_INTERNAL_H
#define SELVEDGE_BOTT_INTERNAL_H

#include "selvedge/marker.h"

/* Coordinates along the torus vectors, in turns: x/L is wrong on oblique cells. */
void sv_torus_coordinates(const sv_sample *sample, double (*uv)[2]);

/* The index by a truncated logarithm in single precision, where bounds prove it to be right.
 * *ret_certified is false, and the outcome untouched, where they do not. */
sv_status sv_bott_by_series(sv_context *context, const sv_basis *basis, const double (*uv)[2],
                            bool *ret_certified, sv_outcome *outcome);

/* The index by the eigenvalues in double precision. */
sv_status sv_bott_by_eigenvalues(sv_context *context, const sv_basis *basis, const double (*uv)[2],
                                 sv_outcome *outcome);

#endif
