/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Cholesky factors of a Hermitian matrix plus multiples of one, by CHOLMOD's supernodal code
 * (Y. Chen, T. A. Davis, W. W. Hager, S. Rajamanickam, ACM Trans. Math. Softw. 35, 22 (2008)).
 * The order is approximate minimum degree: METIS would replace signal handlers and draw from the
 * generator of the C library, which threads share. CHOLMOD takes its own memory. */
#include "selvedge/linalg.h"

#include <string.h>
#include <suitesparse/cholmod.h>

struct sv_definite {
    sv_index n;
    int slots;
    cholmod_common common;
    cholmod_sparse *matrix;   /* lower triangle */
    cholmod_factor *symbolic; /* never factored: copied for every slot */
    cholmod_factor **factor;  /* slots; NULL: empty */
    cholmod_dense *x, *y, *e; /* work space of solves */
};

void sv_definite_free(sv_context *context, sv_definite *definite)
{
    if (definite == NULL)
        return;
    cholmod_common *common = &definite->common;
    for (int k = 0; definite->factor != NULL && k < definite->slots; k++)
        cholmod_l_free_factor(&definite->factor[k], common);
    cholmod_l_free_factor(&definite->symbolic, common);
    cholmod_l_free_sparse(&definite->matrix, common);
    cholmod_l_free_dense(&definite->x, common);
    cholmod_l_free_dense(&definite->y, common);
    cholmod_l_free_dense(&definite->e, common);
    cholmod_l_finish(common);
    sv_give(context, definite->factor);
    sv_give(context, definite);
}

/* Row r from the diagonal on, conjugated, is column r of the lower triangle. */
static cholmod_sparse *lower_triangle(const sv_sparse *a, cholmod_common *common)
{
    size_t room = (size_t)((a->row_start[a->n] + a->n) / 2 + a->n);
    cholmod_sparse *c = cholmod_l_allocate_sparse((size_t)a->n, (size_t)a->n, room, 1, 1, -1,
                                                  CHOLMOD_COMPLEX, common);
    if (c == NULL)
        return NULL;
    SuiteSparse_long *start = c->p, *row = c->i, at = 0;
    double *value = c->x;
    for (sv_index r = 0; r < a->n; r++) {
        start[r] = at;
        for (sv_index k = a->row_start[r]; k < a->row_start[r + 1]; k++) {
            if (a->column[k] < r)
                continue;
            row[at] = a->column[k];
            value[2 * at] = creal(a->value[k]);
            value[2 * at + 1] = -cimag(a->value[k]);
            at++;
        }
    }
    start[a->n] = at;
    return c;
}

static void start_common(cholmod_common *common)
{
    cholmod_l_start(common);
    common->print = 0;
    common->nmethods = 1;
    common->method[0].ordering = CHOLMOD_AMD;
    common->postorder = 1;
    common->supernodal = CHOLMOD_SUPERNODAL;
    common->quick_return_if_not_posdef = 1;
}

sv_status sv_definite_make(sv_context *context, const sv_sparse *matrix, int factors,
                           sv_definite **ret_definite)
{
    sv_definite *d = NULL;
    if (matrix->n < 1 || factors < 1)
        return SV_FAIL(context, SV_INVALID_INPUT, "%d factors of a matrix of order %lld", factors,
                       (long long)matrix->n);
    sv_status status = sv_take(context, 1, sizeof *d, &d);
    if (status != SV_OK)
        return status;
    d->n = matrix->n;
    d->slots = factors;
    start_common(&d->common);
    if ((status = sv_take(context, factors, sizeof(cholmod_factor *), &d->factor)) != SV_OK)
        goto out;
    d->matrix = lower_triangle(matrix, &d->common);
    if (d->matrix != NULL)
        d->symbolic = cholmod_l_analyze(d->matrix, &d->common);
    if (d->symbolic == NULL)
        status = SV_FAIL(context, SV_NO_MEMORY, "no memory to analyse a matrix of order %lld",
                         (long long)matrix->n);
out:
    if (status == SV_OK)
        *ret_definite = d;
    else
        sv_definite_free(context, d);
    return status;
}

double sv_definite_bytes(const sv_definite *definite)
{
    const cholmod_factor *f = definite->symbolic;
    double numbers = 16.0 * (double)f->xsize;
    return numbers + 8.0 * (double)(f->ssize + 3 * f->nsuper + 2 * f->n);
}

sv_status sv_definite_factor(sv_context *context, sv_definite *definite, int slot, double shift)
{
    cholmod_common *common = &definite->common;
    double beta[2] = {shift, 0.0};
    if (slot < 0 || slot >= definite->slots)
        return SV_FAIL(context, SV_INVALID_INPUT, "factor %d of %d", slot, definite->slots);
    cholmod_factor **f = &definite->factor[slot];
    if (*f == NULL)
        *f = cholmod_l_copy_factor(definite->symbolic, common);
    int done = *f != NULL && cholmod_l_factorize_p(definite->matrix, beta, NULL, 0, *f, common);
    if (done && common->status == CHOLMOD_OK && (*f)->minor == (*f)->n)
        return SV_OK;
    bool indefinite = done && common->status == CHOLMOD_NOT_POSDEF;
    cholmod_l_free_factor(f, common);
    if (indefinite)
        return SV_FAIL(context, SV_NUMERICAL, "the matrix plus %g is not positive definite", shift);
    return SV_FAIL(context, common->status == CHOLMOD_OUT_OF_MEMORY ? SV_NO_MEMORY : SV_NUMERICAL,
                   "no Cholesky factor of a matrix of order %lld (code %d)", (long long)definite->n,
                   common->status);
}

sv_status sv_definite_solve(sv_context *context, sv_definite *definite, int slot, sv_index columns,
                            sv_complex *x)
{
    sv_index n = definite->n;
    cholmod_dense b = {.nrow = (size_t)n,
                       .ncol = (size_t)columns,
                       .nzmax = (size_t)(n * columns),
                       .d = (size_t)n,
                       .x = x,
                       .xtype = CHOLMOD_COMPLEX,
                       .dtype = CHOLMOD_DOUBLE};
    if (slot < 0 || slot >= definite->slots || definite->factor[slot] == NULL)
        return SV_FAIL(context, SV_INVALID_INPUT, "there is no factor %d", slot);
    if (columns == 0)
        return SV_OK;
    if (!cholmod_l_solve2(CHOLMOD_A, definite->factor[slot], &b, NULL, &definite->x, NULL,
                          &definite->y, &definite->e, &definite->common))
        return SV_FAIL(context, SV_NO_MEMORY, "no memory to solve for %lld columns",
                       (long long)columns);
    memcpy(x, definite->x->x, (size_t)(n * columns) * sizeof *x);
    return SV_OK;
}
