/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "selvedge/linalg.h"

#include <float.h>
#include <math.h>
#include <string.h>

void sv_sparse_free(sv_context *context, sv_sparse *matrix)
{
    sv_give(context, matrix->row_start);
    sv_give(context, matrix->column);
    sv_give(context, matrix->value);
    *matrix = (sv_sparse){0};
}

/* Value at (row, column), or 0 when it is not stored. */
static sv_complex element(const sv_sparse *matrix, sv_index row, sv_index column)
{
    sv_index low = matrix->row_start[row], high = matrix->row_start[row + 1];
    while (low < high) {
        sv_index middle = low + (high - low) / 2;
        if (matrix->column[middle] < column)
            low = middle + 1;
        else
            high = middle;
    }
    bool found = low < matrix->row_start[row + 1] && matrix->column[low] == column;
    return found ? matrix->value[low] : 0.0;
}

static sv_status check_row(sv_context *context, const sv_sparse *matrix, sv_index row,
                           double tolerance)
{
    for (sv_index k = matrix->row_start[row]; k < matrix->row_start[row + 1]; k++) {
        sv_index column = matrix->column[k];
        if (column < 0 || column >= matrix->n ||
            (k > matrix->row_start[row] && column <= matrix->column[k - 1]))
            return SV_FAIL(context, SV_INTERNAL, "row %lld: columns out of order", (long long)row);
        if (!(cabs(matrix->value[k] - conj(element(matrix, column, row))) <= tolerance))
            return SV_FAIL(context, SV_INTERNAL, "element (%lld, %lld) is not Hermitian",
                           (long long)row, (long long)column);
    }
    return SV_OK;
}

sv_status sv_sparse_check(sv_context *context, const sv_sparse *matrix)
{
    if (matrix->row_start[0] != 0)
        return SV_FAIL(context, SV_INTERNAL, "the first row does not start at 0");
    for (sv_index row = 0; row < matrix->n; row++)
        if (matrix->row_start[row + 1] < matrix->row_start[row])
            return SV_FAIL(context, SV_INTERNAL, "row %lld ends before it starts", (long long)row);
    double tolerance = 8.0 * DBL_EPSILON * sv_sparse_norm_bound(matrix);
    for (sv_index row = 0; row < matrix->n; row++) {
        sv_status status = check_row(context, matrix, row, tolerance);
        if (status != SV_OK)
            return status;
    }
    return SV_OK;
}

void sv_sparse_apply(const sv_sparse *matrix, const sv_complex *x, sv_complex *y)
{
    for (sv_index row = 0; row < matrix->n; row++) {
        sv_complex sum = 0.0;
        for (sv_index k = matrix->row_start[row]; k < matrix->row_start[row + 1]; k++)
            sum += matrix->value[k] * x[matrix->column[k]];
        y[row] = sum;
    }
}

double sv_sparse_norm_bound(const sv_sparse *matrix)
{
    double bound = 0.0;
    for (sv_index row = 0; row < matrix->n; row++) {
        double sum = 0.0;
        for (sv_index k = matrix->row_start[row]; k < matrix->row_start[row + 1]; k++)
            sum += cabs(matrix->value[k]);
        bound = fmax(bound, sum);
    }
    return bound;
}

void sv_sparse_to_dense(const sv_sparse *matrix, sv_complex *dense)
{
    sv_index n = matrix->n;
    memset(dense, 0, (size_t)n * (size_t)n * sizeof *dense);
    for (sv_index row = 0; row < n; row++)
        for (sv_index k = matrix->row_start[row]; k < matrix->row_start[row + 1]; k++)
            dense[row + matrix->column[k] * n] = matrix->value[k];
}
