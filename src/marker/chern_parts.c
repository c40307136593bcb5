/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Blocks of columns and the part of the flake each works on. */
#include "chern_internal.h"

#include <math.h>
#include <string.h>

enum { BLOCK = SV_PANEL_COLUMNS_SINGLE };

const double *sv_chern_place(const column_work *w, sv_index k)
{
    const sv_sample *s = w->area.sample;
    return s->flake->sites[s->pristine[w->area.rows == NULL ? k : w->area.rows[k]]].at;
}

/* The rows of a site: its own and those of adatoms on it. */
static sv_status add_rows_of(sv_context *context, const column_job *job, sv_index site, part *area)
{
    const sv_sample *sample = job->sample;
    for (sv_index r = job->row_of_site[site];
         r >= 0 && r < sample->n && sample->pristine[r] == site; r++) {
        sv_status status =
            sv_reserve(context, &area->rows, &area->room, area->n + 1, sizeof *area->rows);
        if (status != SV_OK)
            return status;
        area->rows[area->n++] = r;
    }
    return SV_OK;
}

/* Rows within reach of the block's middle, ascending. */
static sv_status gather_part(sv_context *context, const column_job *job, const double middle[2],
                             double radius, part *area)
{
    const sv_flake *flake = job->sample->flake;
    const double(*vectors)[2] = flake->model->vectors;
    double cell = sv_model_vector_area(flake->model), uv[2];
    double du = radius * hypot(vectors[1][0], vectors[1][1]) / cell + 1.5;
    double dv = radius * hypot(vectors[0][0], vectors[0][1]) / cell + 1.5;
    sv_model_reduce(flake->model, middle, uv);
    int64_t width = (int64_t)flake->high[1] - flake->low[1] + 1;
    int64_t i0 = (int64_t)fmax(floor(uv[0] - du), flake->low[0]);
    int64_t i1 = (int64_t)fmin(ceil(uv[0] + du), flake->high[0]);
    int64_t j0 = (int64_t)fmax(floor(uv[1] - dv), flake->low[1]);
    int64_t j1 = (int64_t)fmin(ceil(uv[1] + dv), flake->high[1]);
    area->n = 0;
    for (int64_t i = i0; i <= i1; i++)
        for (int64_t j = j0; j <= j1; j++) {
            int32_t c = flake->cell_at[(i - flake->low[0]) * width + (j - flake->low[1])];
            if (c < 0)
                continue;
            const sv_cell *at = &flake->cells[c];
            for (sv_index s = at->first_site; s < at->first_site + at->n_sites; s++) {
                if (hypot(flake->sites[s].at[0] - middle[0], flake->sites[s].at[1] - middle[1]) >
                    radius)
                    continue;
                sv_status status = add_rows_of(context, job, s, area);
                if (status != SV_OK)
                    return status;
            }
        }
    return SV_OK;
}

static sv_index find_row(const part *area, sv_index row)
{
    sv_index low = 0, high = area->n;
    while (low < high) {
        sv_index middle = low + (high - low) / 2;
        if (area->rows[middle] < row)
            low = middle + 1;
        else
            high = middle;
    }
    return low;
}

sv_status sv_chern_set_block(sv_context *context, const column_job *job, const sv_index *rows,
                             int count, column_work *w)
{
    const sv_sample *s = job->sample;
    sv_status status = SV_OK;
    w->count = count;
    if (job->reach > 0.0) {
        double middle[2] = {0.0, 0.0}, spread = 0.0;
        for (int k = 0; k < count; k++)
            for (int axis = 0; axis < 2; axis++)
                middle[axis] += s->flake->sites[s->pristine[rows[k]]].at[axis] / count;
        for (int k = 0; k < count; k++) {
            const double *at = s->flake->sites[s->pristine[rows[k]]].at;
            spread = fmax(spread, hypot(at[0] - middle[0], at[1] - middle[1]));
        }
        if ((status = gather_part(context, job, middle, job->reach + spread, &w->area)) != SV_OK ||
            (status = sv_projector_restrict(context, job->projector, w->area.rows, w->area.n,
                                            w->place, &w->area.projector)) != SV_OK)
            return status;
        w->area.owned = true;
    }
    for (int k = 0; k < count; k++)
        w->target[k] = job->reach > 0.0 ? find_row(&w->area, rows[k]) : rows[k];
    sv_index room = w->room / BLOCK;
    if (w->area.n > room) {
        sv_give(context, w->x);
        w->x = NULL;
        w->room = 0;
        sv_index size = (w->area.n + w->area.n / 8) * BLOCK;
        if ((status = sv_take_raw(context, 4 * size, sizeof *w->x, &w->x)) != SV_OK)
            return status;
        w->room = size;
        w->v = w->x + size;
        w->z = w->v + size;
        w->t = w->z + size;
    }
    return SV_OK;
}

sv_status sv_chern_start_work(sv_context *context, const column_job *job, column_work *w)
{
    *w = (column_work){
        .area = {.sample = job->sample, .projector = job->projector, .n = job->sample->n}};
    if (job->reach <= 0.0)
        return SV_OK;
    sv_status status = sv_take_raw(context, job->sample->n, sizeof *w->place, &w->place);
    if (status == SV_OK)
        memset(w->place, 0xff, (size_t)job->sample->n * sizeof *w->place);
    return status;
}

/* Sites of a block lie close together, so that one part of the flake serves them all. */
int sv_chern_block_size(const column_job *job, sv_index first)
{
    const double compact = 8.0;
    const sv_sample *s = job->sample;
    const double *start = s->flake->sites[s->pristine[job->rows[first]]].at;
    int count = 1;
    while (count < BLOCK && first + count < job->n_rows) {
        const double *at = s->flake->sites[s->pristine[job->rows[first + count]]].at;
        if (job->reach > 0.0 && hypot(at[0] - start[0], at[1] - start[1]) > compact)
            break;
        count++;
    }
    return count;
}

void sv_chern_end_work(sv_context *context, column_work *w)
{
    if (w->area.owned)
        sv_projector_free(context, w->area.projector);
    sv_give(context, w->x);
    sv_give(context, w->place);
    sv_give(context, w->area.rows);
}

bool sv_near_edge(const sv_flake *flake, int32_t cell, int32_t depth)
{
    int64_t width = (int64_t)flake->high[1] - flake->low[1] + 1;
    if (flake->spec.structure != NULL) /* by distances, of two sites to a cell */
        return sv_structure_depth(flake->spec.structure, flake->sites[cell].at) <
               depth * sqrt(2.0 * sv_model_cell_area(flake->model));
    for (int32_t i = flake->cells[cell].i - depth; i <= flake->cells[cell].i + depth; i++)
        for (int32_t j = flake->cells[cell].j - depth; j <= flake->cells[cell].j + depth; j++)
            if (i < flake->low[0] || i > flake->high[0] || j < flake->low[1] ||
                j > flake->high[1] ||
                flake->cell_at[(i - flake->low[0]) * width + (j - flake->low[1])] < 0)
                return true;
    return false;
}
