/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Vacancies with a minimum distance: candidates with a smaller number of another candidate within
 * reach go, whether or not that one stays. The rule looks at numbers of the plane only, so it does
 * not know the flake, and a larger share keeps the vacancies of a smaller one. */
#include "sample_internal.h"

#include <math.h>

/* A position relative to another: cells away, and which. */
typedef struct neighbour {
    int32_t shift[2];
    int position;
} neighbour;

typedef struct reach {
    neighbour *list;
    sv_index count, capacity;
} reach;

/* Positions that `on` allows, nearer than `distance` or as near, to position p; list may be NULL.
 */
static sv_status find_neighbours(sv_context *context, const sv_model *model,
                                 const sv_disorder *disorder, int p, reach *ret,
                                 sv_index *ret_count)
{
    const double *at = model->orbitals[sv_orbital_at(model, p)].at;
    sv_patch patch = sv_patch_around(model, at, at, disorder->distance);
    sv_index n = 0;
    for (int32_t i = patch.low[0]; i <= patch.high[0]; i++) {
        for (int32_t j = patch.low[1]; j <= patch.high[1]; j++) {
            for (int q = 0; q < model->n_positions; q++) {
                const double *to = model->orbitals[sv_orbital_at(model, q)].at;
                double x = i * model->vectors[0][0] + j * model->vectors[1][0] + to[0] - at[0];
                double y = i * model->vectors[0][1] + j * model->vectors[1][1] + to[1] - at[1];
                if (!sv_position_matches(model, q, disorder->on) || (i == 0 && j == 0 && q == p) ||
                    hypot(x, y) > disorder->distance * (1.0 + 1e-9))
                    continue;
                n++;
                if (ret == NULL)
                    continue;
                sv_status status =
                    sv_reserve(context, &ret->list, &ret->capacity, n, sizeof *ret->list);
                if (status != SV_OK)
                    return status;
                ret->list[n - 1] = (neighbour){{i, j}, q};
            }
        }
    }
    if (ret != NULL)
        ret->count = n;
    *ret_count = n;
    return SV_OK;
}

/* Share that stays of a share p of candidates, mean over the positions. */
static double share_left(const sv_model *model, const sv_disorder *disorder, double p)
{
    double sum = 0.0;
    int matching = 0;
    for (int q = 0; q < model->n_positions; q++) {
        sv_index n = 0;
        if (!sv_position_matches(model, q, disorder->on))
            continue;
        /* Without a list there is no memory to fail for. */
        if (find_neighbours(NULL, model, disorder, q, NULL, &n) != SV_OK)
            return 0.0;
        double all = (double)n + 1.0;
        sum += p < 1.0 ? -expm1(all * log1p(-p)) / all : 1.0 / all;
        matching++;
    }
    return sum / matching;
}

double sv_disorder_share_limit(const sv_model *model, const sv_disorder *disorder)
{
    return disorder->distance > 0.0 ? share_left(model, disorder, 1.0) : 1.0;
}

static double candidates_for(const sv_model *model, const sv_disorder *disorder)
{
    double low = 0.0, high = 1.0;
    for (int step = 0; step < 60; step++) {
        double middle = 0.5 * (low + high);
        if (share_left(model, disorder, middle) < disorder->share)
            low = middle;
        else
            high = middle;
    }
    return high;
}

static bool stays(const sv_stream *stream, const reach *around, const sv_cell *cell, double u)
{
    for (sv_index n = 0; n < around->count; n++) {
        const neighbour *other = &around->list[n];
        if (sv_position_uniform(stream, cell->i + other->shift[0], cell->j + other->shift[1],
                                other->position) < u)
            return false;
    }
    return true;
}

static void keep_apart(const sv_drawing *d, const sv_disorder *disorder, const sv_stream *stream,
                       const reach *around, double share, bool *kept)
{
    for (sv_index s = 0; s < d->flake->n_sites; s++) {
        if (!sv_is_candidate(d, disorder, s))
            continue;
        const sv_cell *cell = &d->flake->cells[d->flake->sites[s].cell];
        int p = sv_position_of(d->flake, s);
        double u = sv_position_uniform(stream, cell->i, cell->j, p);
        kept[s] = u < share && stays(stream, &around[p], cell, u);
    }
}

sv_status sv_draw_spaced(sv_context *context, sv_drawing *d, const sv_disorder *disorder,
                         const sv_stream *stream)
{
    const sv_model *model = d->flake->model;
    reach *around = NULL;
    bool *kept = NULL;
    sv_status status = SV_OK;
    double share = 1.0, limit = sv_disorder_share_limit(model, disorder);
    if (disorder->has_share && disorder->share > limit)
        return SV_FAIL(
            context, SV_INVALID_INPUT,
            "disorder \"%s\": a share of %.4g is more than the %.4g its minimum distance "
            "allows",
            disorder->name, disorder->share, limit);
    if (disorder->has_share)
        share = candidates_for(model, disorder);
    if ((status = sv_take(context, d->flake->n_sites, sizeof *kept, &kept)) != SV_OK ||
        (status = sv_take(context, model->n_positions, sizeof *around, &around)) != SV_OK)
        goto out;
    for (int p = 0; p < model->n_positions && status == SV_OK; p++) {
        sv_index n;
        status = find_neighbours(context, model, disorder, p, &around[p], &n);
    }
    if (status != SV_OK)
        goto out;
    keep_apart(d, disorder, stream, around, share, kept);
    if (disorder->has_count)
        status = sv_draw_count(context, d, disorder, stream, kept, sv_vacate);
    for (sv_index s = 0; disorder->has_share && s < d->flake->n_sites; s++)
        if (kept[s])
            sv_vacate(d, s);
out:
    for (int p = 0; around != NULL && p < model->n_positions; p++)
        sv_give(context, around[p].list);
    sv_give(context, around);
    sv_give(context, kept);
    return status;
}
