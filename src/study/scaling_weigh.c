/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Weights of a fit: the standard errors of the means alone. The covariance of realisations,
 * estimated from the same ones, would fit their noise; errors and χ² are judged with it instead. */
#include "scaling_internal.h"

sv_status sv_scaling_work_make(sv_context *context, const scaling_table *table,
                               scaling_work *ret_work)
{
    scaling_work w = {.table = table};
    sv_index rows = table->n + MOST_PARAMETERS;
    sv_status status = sv_take(context, table->n, sizeof *w.rows, &w.rows);
    if (status == SV_OK)
        status = sv_take(context, rows * (MOST_PARAMETERS + 1), sizeof *w.q, &w.q);
    if (status == SV_OK)
        status = sv_take(context, table->n * table->n, sizeof *w.covariance, &w.covariance);
    if (status != SV_OK) {
        sv_scaling_work_free(context, &w);
        return status;
    }
    w.rhs = w.q + rows * MOST_PARAMETERS;
    *ret_work = w;
    return SV_OK;
}

void sv_scaling_work_free(sv_context *context, scaling_work *work)
{
    sv_give(context, work->rows);
    sv_give(context, work->q);
    sv_give(context, work->covariance);
    *work = (scaling_work){0};
}

void sv_scaling_weigh(const scaling_work *w, double *column)
{
    for (sv_index i = 0; i < w->n; i++)
        column[i] /= w->table->error[w->rows[i]];
}

void sv_scaling_select(scaling_work *w, double lo, double hi, int without)
{
    const scaling_table *t = w->table;
    w->n = 0;
    for (int s = 0; s < t->n_sizes; s++)
        for (sv_index i = t->first[s]; s != without && i < t->first[s + 1]; i++)
            if (t->parameter[i] >= lo && t->parameter[i] <= hi && sv_scaling_usable(t, i))
                w->rows[w->n++] = i;
    for (sv_index i = 0; i < w->n; i++)
        for (sv_index j = 0; j < w->n; j++) {
            const sv_index a = w->rows[i], b = w->rows[j];
            w->covariance[i * w->n + j] = t->covariance[a * t->n + b] / (t->error[a] * t->error[b]);
        }
}
