/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The spectral localizer as a sparse matrix, rows in (site, component) pairs. */
#include "localizer_internal.h"

/* Row of a site and component: the row of ±(H − E), with κ(x ∓ iy) beside the diagonal. */
static sv_index write_row(const sv_sample *sample, sv_index site, int component, double energy,
                          double kappa, const double at[2], sv_index next, sv_sparse *l)
{
    const sv_sparse *h = &sample->hamiltonian;
    const double *r = sample->flake->sites[sample->pristine[site]].at;
    double sign = component == 0 ? 1.0 : -1.0;
    sv_complex place = kappa * CMPLX(r[0] - at[0], -sign * (r[1] - at[1]));
    sv_index k = h->row_start[site], end = h->row_start[site + 1];
    for (; k < end && h->column[k] < site; k++, next++) {
        l->column[next] = 2 * h->column[k] + component;
        l->value[next] = sign * h->value[k];
    }
    double onsite = -energy;
    if (k < end && h->column[k] == site)
        onsite += creal(h->value[k++]);
    for (int c = 0; c < 2; c++, next++) {
        l->column[next] = (int32_t)(2 * site + c);
        l->value[next] = c == component ? sign * onsite : place;
    }
    for (; k < end; k++, next++) {
        l->column[next] = 2 * h->column[k] + component;
        l->value[next] = sign * h->value[k];
    }
    return next;
}

sv_status sv_localizer_matrix(sv_context *context, const sv_sample *sample, double energy,
                              double kappa, const double at[2], sv_sparse *ret_matrix)
{
    sv_sparse l = {.n = 2 * sample->n};
    sv_index most = 2 * (sample->hamiltonian.row_start[sample->n] + 2 * sample->n), next = 0;
    sv_status status;
    if (l.n > INT32_MAX)
        return SV_FAIL(context, SV_REFUSED, "a localizer of order %lld is too large",
                       (long long)l.n);
    if ((status = sv_take_raw(context, l.n + 1, sizeof *l.row_start, &l.row_start)) != SV_OK ||
        (status = sv_take_raw(context, most, sizeof *l.column, &l.column)) != SV_OK ||
        (status = sv_take_raw(context, most, sizeof *l.value, &l.value)) != SV_OK) {
        sv_sparse_free(context, &l);
        return status;
    }
    l.row_start[0] = 0;
    for (sv_index row = 0; row < l.n; row++) {
        next = write_row(sample, row / 2, (int)(row % 2), energy, kappa, at, next, &l);
        l.row_start[row + 1] = next;
    }
    *ret_matrix = l;
    return SV_OK;
}

void sv_localizer_move(const sv_sample *sample, double kappa, const double at[2], sv_sparse *matrix)
{
    for (sv_index row = 0; row < matrix->n; row++) {
        const double *r = sample->flake->sites[sample->pristine[row / 2]].at;
        double sign = row % 2 == 0 ? 1.0 : -1.0;
        sv_index k = matrix->row_start[row];
        while (matrix->column[k] != (row ^ 1))
            k++;
        matrix->value[k] = kappa * CMPLX(r[0] - at[0], -sign * (r[1] - at[1]));
    }
}
