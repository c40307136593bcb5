/* SPDX-License-Identifier: GPL-3.0-or-later */
/*
 * Domains: the cells of a Voronoi tessellation of Poisson seeds, each changed with a probability.
 * At a distance δ from the nearest seed's boundary with a domain of the other kind the change is (1
 * ∓ tanh(δ/w))/2 of the whole, so that a flipped mass goes through zero as tanh(δ/w).
 */
#include "sample_internal.h"

#include <math.h>

enum { RINGS = 5 };                /* reach of seeds, in mean domain sizes */
static const double NEVER = 1e300; /* squared distance of no seed */

typedef struct seed {
    double at[2];
    bool changed;
} seed;

/* Seeds sorted into square bins of the mean size. */
typedef struct tessellation {
    seed *seeds; /* in order of bins */
    sv_index *start;
    double low[2], size;
    int64_t count[2];
} tessellation;

static int64_t bin_of(const tessellation *t, const double at[2], int64_t ret[2])
{
    for (int k = 0; k < 2; k++) {
        ret[k] = (int64_t)floor((at[k] - t->low[k]) / t->size);
        ret[k] = ret[k] < 0 ? 0 : ret[k] >= t->count[k] ? t->count[k] - 1 : ret[k];
    }
    return ret[0] * t->count[1] + ret[1];
}

static bool is_changed(const sv_stream *stream, const sv_point *point, double share)
{
    return sv_stream_uniform(stream, point->cell[0], point->cell[1], point->slot) < share;
}

static sv_status sort_seeds(sv_context *context, const sv_disorder *disorder,
                            const sv_stream *stream, const sv_point *points, sv_index n,
                            tessellation *t)
{
    int64_t at[2];
    sv_index bins = t->count[0] * t->count[1], *next = NULL;
    sv_status status;
    if ((status = sv_take(context, bins + 1, sizeof *t->start, &t->start)) != SV_OK ||
        (status = sv_take(context, bins, sizeof *next, &next)) != SV_OK ||
        (status = sv_take(context, n, sizeof *t->seeds, &t->seeds)) != SV_OK)
        goto out;
    for (sv_index k = 0; k < n; k++)
        t->start[bin_of(t, points[k].at, at) + 1]++;
    for (sv_index b = 0; b < bins; b++) {
        t->start[b + 1] += t->start[b];
        next[b] = t->start[b];
    }
    for (sv_index k = 0; k < n; k++)
        t->seeds[next[bin_of(t, points[k].at, at)]++] = (seed){
            {points[k].at[0], points[k].at[1]}, is_changed(stream, &points[k], disorder->share)};
out:
    sv_give(context, next);
    return status;
}

static double square_to(const seed *s, const double at[2])
{
    double x = s->at[0] - at[0], y = s->at[1] - at[1];
    return x * x + y * y;
}

/* Nearest seed: rings of bins until no nearer one can come. NULL: none within reach. */
static const seed *nearest_seed(const tessellation *t, const double at[2])
{
    int64_t b[2];
    double best = NEVER;
    const seed *found = NULL;
    bin_of(t, at, b);
    for (int64_t ring = 0; ring <= RINGS; ring++) {
        double clear = (double)(ring - 1) * t->size;
        if (found != NULL && clear > 0.0 && best <= clear * clear)
            break;
        for (int64_t i = b[0] - ring; i <= b[0] + ring; i++) {
            bool whole = i == b[0] - ring || i == b[0] + ring;
            for (int64_t j = b[1] - ring; j <= b[1] + ring;
                 j += whole || ring == 0 ? 1 : 2 * ring) {
                if (i < 0 || j < 0 || i >= t->count[0] || j >= t->count[1])
                    continue;
                sv_index bin = i * t->count[1] + j;
                for (sv_index k = t->start[bin]; k < t->start[bin + 1]; k++)
                    if (square_to(&t->seeds[k], at) < best) {
                        best = square_to(&t->seeds[k], at);
                        found = &t->seeds[k];
                    }
            }
        }
    }
    return found;
}

/* Distance from the boundary with the nearest domain of the other kind. */
static double wall_distance(const tessellation *t, const seed *own, const double at[2])
{
    int64_t b[2];
    double best = sqrt(NEVER), square = square_to(own, at);
    bin_of(t, at, b);
    for (int64_t i = b[0] - RINGS; i <= b[0] + RINGS; i++)
        for (int64_t j = b[1] - RINGS; j <= b[1] + RINGS; j++) {
            if (i < 0 || j < 0 || i >= t->count[0] || j >= t->count[1])
                continue;
            sv_index bin = i * t->count[1] + j;
            for (sv_index k = t->start[bin]; k < t->start[bin + 1]; k++) {
                const seed *other = &t->seeds[k];
                if (other->changed == own->changed)
                    continue;
                double apart = sqrt(square_to(other, own->at));
                best = fmin(best, (square_to(other, at) - square) / (2.0 * apart));
            }
        }
    return best;
}

/* Share of the change at a point: 0 in one kind of domain, 1 in the other. */
static double change_at(const tessellation *t, double wall, const double at[2])
{
    const seed *own = nearest_seed(t, at);
    if (own == NULL)
        return 0.0;
    double deep = wall > 0.0 ? tanh(wall_distance(t, own, at) / wall) : 1.0;
    return own->changed ? 0.5 * (1.0 + deep) : 0.5 * (1.0 - deep);
}

sv_status sv_draw_domains(sv_context *context, sv_drawing *d, const sv_disorder *disorder,
                          const sv_stream *stream)
{
    tessellation t = {.size = disorder->length};
    sv_point *points = NULL;
    sv_index n = 0, last = -1;
    double high[2], value = 0.0, reach = RINGS * disorder->length;
    sv_status status = sv_points_draw(
        context, d->flake, stream, 1.0 / (disorder->length * disorder->length), reach, &points, &n);
    sv_flake_box(d->flake, t.low, high);
    for (int k = 0; k < 2; k++) {
        t.low[k] -= reach;
        t.count[k] = (int64_t)ceil((high[k] + reach - t.low[k]) / t.size) + 1;
    }
    if (status == SV_OK)
        status = sort_seeds(context, disorder, stream, points, n, &t);
    for (sv_index s = 0; status == SV_OK && s < d->flake->n_sites; s++) {
        const sv_site *site = &d->flake->sites[s];
        sv_index place =
            (sv_index)site->cell * d->flake->model->n_positions + sv_position_of(d->flake, s);
        if (place != last)
            value = disorder->jump * change_at(&t, disorder->wall, site->at);
        last = place;
        if (value != 0.0)
            status = sv_add_term(context, d, disorder->term, s, value);
    }
    for (sv_index k = 0; status == SV_OK && k < n; k++)
        d->inventory.placed[d->entry] += sv_point_on_flake(d->flake, points[k].at);
    sv_give(context, points);
    sv_give(context, t.seeds);
    sv_give(context, t.start);
    return status;
}
