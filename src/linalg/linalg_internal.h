/* SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef SELVEDGE_LINALG_INTERNAL_H
#define SELVEDGE_LINALG_INTERNAL_H

#include "selvedge/linalg.h"

enum { SV_PANEL_ROW = 2 * SV_PANEL_COLUMNS }; /* doubles per site of a panel */

/* Copies of the same loop for several instruction sets. */
typedef void (*panel_step)(const sv_packed *a, sv_index first, sv_index last, const double *x,
                           double *t, double *y, double factor, double weight);
void sv_panel_step_plain(const sv_packed *a, sv_index first, sv_index last, const double *x,
                         double *t, double *y, double factor, double weight);
void sv_panel_step_avx2(const sv_packed *a, sv_index first, sv_index last, const double *x,
                        double *t, double *y, double factor, double weight);
void sv_panel_step_avx512(const sv_packed *a, sv_index first, sv_index last, const double *x,
                          double *t, double *y, double factor, double weight);

#endif
