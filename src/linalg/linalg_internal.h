/* SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef SELVEDGE_LINALG_INTERNAL_H
#define SELVEDGE_LINALG_INTERNAL_H

#include "selvedge/linalg.h"

enum { SV_PANEL_ROW = 2 * SV_PANEL_COLUMNS }; /* doubles per site of a panel */

/* Copies of the same loops for several instruction sets, in double and in single precision. */
typedef void (*panel_step)(const sv_packed *a, sv_index first, sv_index last, const double *x,
                           double *t, double *y, double factor, double weight);
#define PANEL_COPY(isa)                                                                            \
    void sv_panel_step_##isa(const sv_packed *a, sv_index first, sv_index last, const double *x,   \
                             double *t, double *y, double factor, double weight);                  \
    void sv_panel_polynomial_##isa(const sv_packed *a, const double *coefficients, int degree,     \
                                   const double *x, double *work, double *y);                      \
    void sv_panel_step_single_##isa(const sv_packed *a, sv_index first, sv_index last,             \
                                    const float *x, float *t, float *y, float factor,              \
                                    float weight);                                                 \
    void sv_panel_single_##isa(const sv_packed *a, const double *coefficients, int degree,         \
                               const float *x, float *work, float *y)
PANEL_COPY(plain);
PANEL_COPY(avx2);
PANEL_COPY(avx512);
#undef PANEL_COPY

/* Room for the packed parts of a product, in numbers. */
typedef void sv_product_copy(const sv_product_job *job, double *work);
typedef void sv_product_single_copy(const sv_product_single_job *job, float *work);
sv_product_copy sv_product_double_plain, sv_product_double_avx2, sv_product_double_avx512;
sv_product_single_copy sv_product_single_plain, sv_product_single_avx2, sv_product_single_avx512;

#endif
