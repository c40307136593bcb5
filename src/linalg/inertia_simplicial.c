/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The same count by CHOLMOD's column-by-column L D L†, without any pivoting: another order, another
 * code, to be compared with. */
#include "inertia_internal.h"

#include <float.h>
#include <string.h>

#include <suitesparse/cholmod.h>

/* The lower triangle of H − shift: row r of H, conjugated, is column r. */
static cholmod_sparse *copy_shifted(const sv_sparse *h, double shift, cholmod_common *common)
{
    cholmod_sparse *a =
        cholmod_l_allocate_sparse((size_t)h->n, (size_t)h->n, (size_t)(h->row_start[h->n] + h->n),
                                  0, 1, -1, CHOLMOD_COMPLEX, common);
    if (a == NULL)
        return NULL;
    SuiteSparse_long *start = a->p, *index = a->i, at = 0;
    sv_complex *value = a->x;
    for (sv_index r = 0; r < h->n; r++) {
        start[r] = at;
        index[at] = r;
        value[at++] = -shift;
        for (sv_index k = h->row_start[r]; k < h->row_start[r + 1]; k++) {
            if (h->column[k] == r) {
                value[start[r]] += creal(h->value[k]);
            } else if (h->column[k] > r) {
                index[at] = h->column[k];
                value[at++] = conj(h->value[k]);
            }
        }
    }
    start[h->n] = at;
    return a;
}

static sv_index count_negative(const cholmod_factor *f)
{
    const SuiteSparse_long *start = f->p;
    const sv_complex *value = f->x;
    sv_index negative = 0;
    for (size_t k = 0; k < f->n; k++)
        negative += creal(value[start[k]]) < 0.0;
    return negative;
}

sv_status sv_inertia_simplicial(sv_context *context, const sv_sparse *h, double shift,
                                sv_index *ret_negative)
{
    sv_status status = SV_OK;
    double beta[2] = {0.0, 0.0};
    cholmod_common common;
    cholmod_factor *f = NULL;
    cholmod_l_start(&common);
    common.print = 0;
    common.nmethods = 1;
    common.method[0].ordering = CHOLMOD_AMD;
    common.supernodal = CHOLMOD_SIMPLICIAL;
    common.final_ll = 0;
    cholmod_sparse *a = copy_shifted(h, shift, &common);
    if (a != NULL && (f = cholmod_l_analyze(a, &common)) != NULL)
        cholmod_l_factorize_p(a, beta, NULL, 0, f, &common);
    if (common.status < CHOLMOD_OK || f == NULL)
        status = SV_FAIL(context, SV_NO_MEMORY, "no memory to factor a matrix of order %lld",
                         (long long)h->n);
    else if (common.status != CHOLMOD_OK || f->minor < f->n)
        status = SV_FAIL(context, SV_UNDEFINED, "a pivot vanished");
    else
        *ret_negative = count_negative(f);
    cholmod_l_free_factor(&f, &common);
    cholmod_l_free_sparse(&a, &common);
    cholmod_l_finish(&common);
    return status;
}
