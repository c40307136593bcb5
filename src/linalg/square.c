/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Square of a shifted and scaled sparse matrix, row by row. */
#include "selvedge/linalg.h"

#include <stdlib.h>
#include <string.h>

/* Scratch of one row: values by column, and which columns occur. */
typedef struct row_work {
    sv_complex *value; /* n */
    int32_t *mark;     /* n: row + 1 that last used the column */
    int32_t *list;
    sv_index count;
} row_work;

static int ascending(const void *a, const void *b)
{
    int32_t x, y;
    memcpy(&x, a, sizeof x);
    memcpy(&y, b, sizeof y);
    return (x > y) - (x < y);
}

static void add(row_work *w, sv_index row, int32_t column, sv_complex value)
{
    if (w->mark[column] != (int32_t)(row + 1)) {
        w->mark[column] = (int32_t)(row + 1);
        w->list[w->count++] = column;
        w->value[column] = 0.0;
    }
    w->value[column] += value;
}

/* Adds factor times row k of H − shift. */
static void add_row(row_work *w, sv_index row, const sv_sparse *h, sv_index k, double shift,
                    sv_complex factor)
{
    add(w, row, (int32_t)k, -shift * factor);
    for (sv_index e = h->row_start[k]; e < h->row_start[k + 1]; e++)
        add(w, row, h->column[e], factor * h->value[e]);
}

/* Row of (H − shift)², columns ascending. */
static void square_row(row_work *w, const sv_sparse *h, sv_index row, double shift)
{
    w->count = 0;
    add_row(w, row, h, row, shift, -shift);
    for (sv_index e = h->row_start[row]; e < h->row_start[row + 1]; e++)
        add_row(w, row, h, h->column[e], shift, h->value[e]);
    qsort(w->list, (size_t)w->count, sizeof *w->list, ascending);
}

static sv_status take_work(sv_context *context, sv_index n, row_work *w)
{
    sv_status status;
    if ((status = sv_take_raw(context, n, sizeof *w->value, &w->value)) != SV_OK ||
        (status = sv_take(context, n, sizeof *w->mark, &w->mark)) != SV_OK)
        return status;
    return sv_take_raw(context, n, sizeof *w->list, &w->list);
}

static sv_status append_row(sv_context *context, const row_work *w, sv_index row, double factor,
                            sv_sparse *s, sv_index *columns, sv_index *values)
{
    sv_index at = s->row_start[row];
    sv_status status = sv_reserve(context, &s->column, columns, at + w->count, sizeof *s->column);
    if (status == SV_OK)
        status = sv_reserve(context, &s->value, values, at + w->count, sizeof *s->value);
    if (status != SV_OK)
        return status;
    for (sv_index k = 0; k < w->count; k++) {
        s->column[at + k] = w->list[k];
        s->value[at + k] = factor * w->value[w->list[k]];
    }
    s->row_start[row + 1] = at + w->count;
    return SV_OK;
}

sv_status sv_sparse_square(sv_context *context, const sv_sparse *h, double shift, double scale,
                           sv_sparse *ret_square)
{
    sv_sparse s = {.n = h->n};
    row_work w = {0};
    sv_index columns = 0, values = 0;
    sv_status status;
    if ((status = take_work(context, h->n, &w)) != SV_OK ||
        (status = sv_take(context, h->n + 1, sizeof *s.row_start, &s.row_start)) != SV_OK)
        goto out;
    for (sv_index row = 0; row < h->n && status == SV_OK; row++) {
        square_row(&w, h, row, shift);
        status = append_row(context, &w, row, 1.0 / (scale * scale), &s, &columns, &values);
    }
out:
    sv_give(context, w.value);
    sv_give(context, w.mark);
    sv_give(context, w.list);
    if (status == SV_OK)
        *ret_square = s;
    else
        sv_sparse_free(context, &s);
    return status;
}
