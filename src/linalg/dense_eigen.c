/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "selvedge/linalg.h"

/* Our complex type and LAPACKE's are the same C99 type. */
#define lapack_complex_double double _Complex
#define lapack_complex_float  float _Complex
#include <lapacke.h>

/* Above this order workspace counts overflow the 32-bit integers of LAPACK. */
static const sv_index LARGEST_ORDER = 32000;

/* Work space of the three stages. */
typedef struct eigen_work {
    double *off_diagonal;
    sv_complex *tau, *work;
    lapack_int work_size;
    double *real_vectors; /* n × n, of the tridiagonal matrix */
} eigen_work;

static void free_work(sv_context *context, eigen_work *w)
{
    sv_give(context, w->off_diagonal);
    sv_give(context, w->tau);
    sv_give(context, w->work);
    sv_give(context, w->real_vectors);
}

static sv_status take_work(sv_context *context, sv_index n, eigen_work *w)
{
    sv_status status;
    w->work_size = (lapack_int)(64 * n + 64);
    if ((status = sv_take(context, n, sizeof *w->off_diagonal, &w->off_diagonal)) != SV_OK ||
        (status = sv_take(context, n, sizeof *w->tau, &w->tau)) != SV_OK ||
        (status = sv_take_raw(context, w->work_size, sizeof *w->work, &w->work)) != SV_OK)
        return status;
    return sv_take_raw(context, n * n, sizeof *w->real_vectors, &w->real_vectors);
}

static sv_status tridiagonalise(sv_context *context, sv_index n, sv_complex *a, eigen_work *w,
                                double *diagonal)
{
    lapack_int order = (lapack_int)n;
    lapack_int info = LAPACKE_zhetrd_work(LAPACK_COL_MAJOR, 'L', order, a, order, diagonal,
                                          w->off_diagonal, w->tau, w->work, w->work_size);
    if (info != 0)
        return SV_FAIL(context, SV_NUMERICAL, "zhetrd failed with code %d", (int)info);
    if (sv_cancelled(context))
        return SV_FAIL(context, SV_INTERRUPTED, "stopped during a diagonalisation");
    return SV_OK;
}

/* All values and vectors of the tridiagonal matrix; its diagonal is replaced by the values. */
static sv_status divide_and_conquer(sv_context *context, sv_index n, eigen_work *w, double *values)
{
    sv_status status;
    double *real_work = NULL;
    lapack_int *integer_work = NULL;
    sv_index real_size = 1 + 4 * n + n * n, integer_size = 3 + 5 * n;
    if ((status = sv_take_raw(context, real_size, sizeof *real_work, &real_work)) != SV_OK ||
        (status = sv_take_raw(context, integer_size, sizeof *integer_work, &integer_work)) != SV_OK)
        goto out;
    lapack_int info = LAPACKE_dstedc_work(
        LAPACK_COL_MAJOR, 'I', (lapack_int)n, values, w->off_diagonal, w->real_vectors,
        (lapack_int)n, real_work, (lapack_int)real_size, integer_work, (lapack_int)integer_size);
    if (info != 0)
        status = SV_FAIL(context, SV_NUMERICAL, "dstedc failed with code %d", (int)info);
out:
    sv_give(context, real_work);
    sv_give(context, integer_work);
    return status;
}

static sv_status back_transform(sv_context *context, sv_index n, sv_index count,
                                const sv_complex *a, eigen_work *w, sv_complex *vectors)
{
    lapack_int order = (lapack_int)n;
    lapack_int info = LAPACKE_zunmtr_work(LAPACK_COL_MAJOR, 'L', 'L', 'N', order, (lapack_int)count,
                                          a, order, w->tau, vectors, order, w->work, w->work_size);
    if (info != 0)
        return SV_FAIL(context, SV_NUMERICAL, "zunmtr failed with code %d", (int)info);
    return SV_OK;
}

sv_status sv_dense_eigen(sv_context *context, sv_index n, sv_complex *a, double *values,
                         sv_choose_range choose, void *user, sv_index *ret_first,
                         sv_index *ret_last, sv_complex **ret_vectors)
{
    sv_status status = SV_OK;
    eigen_work w = {0};
    sv_complex *vectors = NULL;
    sv_index first = 0, last = 0;
    if (n > LARGEST_ORDER)
        return SV_FAIL(context, SV_REFUSED,
                       "a dense matrix of order %lld is above the limit of %lld", (long long)n,
                       (long long)LARGEST_ORDER);
    if ((status = take_work(context, n, &w)) != SV_OK ||
        (n > 0 && (status = tridiagonalise(context, n, a, &w, values)) != SV_OK) ||
        (n > 0 && (status = divide_and_conquer(context, n, &w, values)) != SV_OK))
        goto out;
    choose(values, n, &first, &last, user);
    sv_index count = last - first;
    if ((status = sv_take_raw(context, n * count, sizeof *vectors, &vectors)) != SV_OK)
        goto out;
    for (sv_index k = 0; k < n * count; k++)
        vectors[k] = w.real_vectors[first * n + k];
    if (sv_cancelled(context))
        status = SV_FAIL(context, SV_INTERRUPTED, "stopped during a diagonalisation");
    else if (count > 0)
        status = back_transform(context, n, count, a, &w, vectors);
    if (status != SV_OK)
        goto out;
    *ret_first = first;
    *ret_last = last;
    *ret_vectors = vectors;
    vectors = NULL;
out:
    free_work(context, &w);
    sv_give(context, vectors);
    return status;
}
