/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Between columns of complex numbers and panels of [re…][im…] rows. */
#include "projector_internal.h"

#include <string.h>

void sv_columns_to_panel(double *panel, sv_index n, const sv_complex *x, sv_index columns)
{
    const int c = SV_PANEL_COLUMNS;
    memset(panel, 0, (size_t)(2 * c * n) * sizeof *panel);
    for (sv_index k = 0; k < columns; k++)
        for (sv_index r = 0; r < n; r++) {
            panel[2 * c * r + k] = creal(x[r + k * n]);
            panel[2 * c * r + c + k] = cimag(x[r + k * n]);
        }
}

void sv_panel_to_columns(const double *panel, sv_index n, sv_complex *y, sv_index columns)
{
    const int c = SV_PANEL_COLUMNS;
    for (sv_index k = 0; k < columns; k++)
        for (sv_index r = 0; r < n; r++)
            y[r + k * n] = CMPLX(panel[2 * c * r + k], panel[2 * c * r + c + k]);
}

void sv_columns_to_panel_single(float *panel, sv_index n, const sv_complex *x, sv_index columns)
{
    const int c = SV_PANEL_COLUMNS_SINGLE;
    memset(panel, 0, (size_t)(2 * c * n) * sizeof *panel);
    for (sv_index k = 0; k < columns; k++)
        for (sv_index r = 0; r < n; r++) {
            panel[2 * c * r + k] = (float)creal(x[r + k * n]);
            panel[2 * c * r + c + k] = (float)cimag(x[r + k * n]);
        }
}

void sv_panel_to_columns_single(const float *panel, sv_index n, sv_complex *y, sv_index columns)
{
    const int c = SV_PANEL_COLUMNS_SINGLE;
    for (sv_index k = 0; k < columns; k++)
        for (sv_index r = 0; r < n; r++)
            y[r + k * n] = CMPLX((double)panel[2 * c * r + k], (double)panel[2 * c * r + c + k]);
}
