/* SPDX-License-Identifier: GPL-3.0-or-later */
/*
 * What multiplies hops. A bond is a pair of positions; all hops between the orbitals of a bond
 * share its strength 1 + w x and its phase exp(iθ) (from the position of the bond's first hop to
 * the other), so that the matrix stays Hermitian. The numbers belong to the cell where that hop
 * starts; a torus and an open flake have the same ones.
 */
#include "sample_internal.h"

#include <math.h>

/* Which bond a hop of the model belongs to. */
typedef struct sv_bond_class {
    uint32_t bond;    /* number of the first hop of the bond */
    bool reversed;    /* goes against it */
    bool nearest;     /* as short as any */
    double vector[2]; /* Cartesian, from start to end */
} sv_bond_class;

static void positions_of(const sv_model *model, const sv_hop *hop, int ret[2])
{
    ret[0] = model->orbitals[hop->from].position;
    ret[1] = model->orbitals[hop->to].position;
}

/* +1: along the same bond, −1: against it, 0: another bond. */
static int same_bond(const sv_model *model, const sv_hop *a, const sv_hop *b)
{
    int p[2], q[2];
    positions_of(model, a, p);
    positions_of(model, b, q);
    if (p[0] == q[0] && p[1] == q[1] && a->shift[0] == b->shift[0] && a->shift[1] == b->shift[1])
        return 1;
    if (p[0] == q[1] && p[1] == q[0] && a->shift[0] == -b->shift[0] && a->shift[1] == -b->shift[1])
        return -1;
    return 0;
}

static sv_status classify(sv_context *context, const sv_model *model, sv_bond_class **ret_classes)
{
    sv_bond_class *classes = NULL;
    sv_status status = sv_take(context, model->n_hops, sizeof *classes, &classes);
    if (status != SV_OK)
        return status;
    double shortest = sv_shortest_distance(model);
    for (int h = 0; h < model->n_hops; h++) {
        const sv_hop *hop = &model->hops[h];
        const double *a = model->orbitals[hop->from].at, *b = model->orbitals[hop->to].at;
        int first = 0;
        while (same_bond(model, hop, &model->hops[first]) == 0)
            first++;
        classes[h].bond = (uint32_t)first;
        classes[h].reversed = same_bond(model, hop, &model->hops[first]) < 0;
        for (int k = 0; k < 2; k++)
            classes[h].vector[k] = b[k] - a[k] + hop->shift[0] * model->vectors[0][k] +
                                   hop->shift[1] * model->vectors[1][k];
        classes[h].nearest = hypot(classes[h].vector[0], classes[h].vector[1]) < shortest + 1e-6;
    }
    *ret_classes = classes;
    return SV_OK;
}

static sv_status need_classes(sv_context *context, sv_drawing *d)
{
    return d->bonds.classes != NULL ? SV_OK : classify(context, d->flake->model, &d->bonds.classes);
}

sv_status sv_draw_hopping(sv_context *context, sv_drawing *d, const sv_disorder *disorder,
                          const sv_stream *stream)
{
    (void)disorder, (void)stream; /* drawn hop by hop while the matrix is built */
    return need_classes(context, d);
}

static bool is_local(const sv_bond_class *class)
{
    return hypot(class->vector[0], class->vector[1]) < 1e-9;
}

/* Strength and phase of one entry of the sheet on a bond. */
static sv_complex bond_number(const sv_drawing *d, int entry, int h, const sv_cell *start)
{
    const sv_disorder *disorder = &d->disorder[entry];
    const sv_bond_class *class = &d->bonds.classes[h];
    const sv_hop *hop = &d->flake->model->hops[h];
    int32_t i = start->i, j = start->j;
    if (is_local(class) || (disorder->nearest && !class->nearest))
        return 1.0;
    if (class->reversed) {
        landing place =
            sv_flake_land(d->flake, (int64_t)i + hop->shift[0], (int64_t)j + hop->shift[1]);
        i = d->flake->cells[place.cell].i;
        j = d->flake->cells[place.cell].j;
    }
    sv_stream stream = sv_stream_make(d->seed, disorder->name, d->realisation);
    uint32_t slot = (uint32_t)SV_SLOT_BONDS + 2 * class->bond;
    double strength = 1.0, phase = 0.0;
    if (disorder->width > 0.0)
        strength += disorder->width * sv_standard_value(disorder->distribution,
                                                        sv_stream_uniform(&stream, i, j, slot));
    if (disorder->phase > 0.0)
        phase = disorder->phase * sv_standard_value(disorder->distribution,
                                                    sv_stream_uniform(&stream, i, j, slot + 1));
    if (class->reversed)
        phase = -phase;
    return phase == 0.0 ? strength : strength * CMPLX(cos(phase), sin(phase));
}

static sv_complex flux_number(const sv_drawing *d, int h, const sv_cell *start)
{
    const sv_model *model = d->flake->model;
    const sv_hop *hop = &model->hops[h];
    double from[2], to[2];
    sv_model_reduce(model, model->orbitals[hop->from].at, from);
    sv_model_reduce(model, model->orbitals[hop->to].at, to);
    from[0] += start->i;
    from[1] += start->j;
    to[0] += start->i + hop->shift[0];
    to[1] += start->j + hop->shift[1];
    double angle = sv_flux_along(&d->bonds, from, to);
    return CMPLX(cos(angle), -sin(angle));
}

sv_complex sv_bond_factor(const sv_drawing *d, int hop, const sv_cell *start)
{
    sv_complex factor = 1.0;
    if (d->bonds.classes == NULL)
        return factor;
    for (int e = 0; e < d->n_disorder; e++)
        if (d->disorder[e].type == SV_DISORDER_HOPPING)
            factor *= bond_number(d, e, hop, start);
    if (d->bonds.edges[0] != NULL)
        factor *= flux_number(d, hop, start);
    return factor;
}

/* ------------------------------------------------------------------ cuts */

static double cross(double ax, double ay, double bx, double by)
{
    return ax * by - ay * bx;
}

/* Is the point on the left of the line, or on it? */
static bool is_left(const double from[2], const double to[2], const double at[2])
{
    return cross(to[0] - from[0], to[1] - from[1], at[0] - from[0], at[1] - from[1]) >= 0.0;
}

bool sv_bond_is_cut(const sv_drawing *d, int h, const sv_cell *start)
{
    const sv_bonds *bonds = &d->bonds;
    if (bonds->cut_start == NULL || is_local(&bonds->classes[h]))
        return false;
    sv_index cell = start - d->flake->cells;
    const sv_model *model = d->flake->model;
    double from[2], to[2];
    for (int k = 0; k < 2; k++) {
        from[k] = start->i * model->vectors[0][k] + start->j * model->vectors[1][k] +
                  model->orbitals[model->hops[h].from].at[k];
        to[k] = from[k] + bonds->classes[h].vector[k];
    }
    for (sv_index n = bonds->cut_start[cell]; n < bonds->cut_start[cell + 1]; n++) {
        const sv_cut *cut = &bonds->cuts[bonds->cut_list[n]];
        if (is_left(cut->from, cut->to, from) != is_left(cut->from, cut->to, to) &&
            is_left(from, to, cut->from) != is_left(from, to, cut->to))
            return true;
    }
    return false;
}

static double distance_to(const sv_cut *cut, const double at[2])
{
    double x = cut->to[0] - cut->from[0], y = cut->to[1] - cut->from[1];
    double px = at[0] - cut->from[0], py = at[1] - cut->from[1], square = x * x + y * y;
    double t = square > 0.0 ? fmin(1.0, fmax(0.0, (px * x + py * y) / square)) : 0.0;
    return hypot(px - t * x, py - t * y);
}

/* Calls back for every cell with a site within reach of a cut; list NULL: only counts. */
static void sort_cut(const sv_drawing *d, sv_index number, double reach, sv_index *next,
                     int32_t *list)
{
    const sv_flake *flake = d->flake;
    const sv_cut *cut = &d->bonds.cuts[number];
    double low[2], high[2];
    for (int k = 0; k < 2; k++) {
        low[k] = fmin(cut->from[k], cut->to[k]);
        high[k] = fmax(cut->from[k], cut->to[k]);
    }
    sv_patch patch = sv_patch_around(flake->model, low, high, reach);
    for (int64_t i = patch.low[0] > flake->low[0] ? patch.low[0] : flake->low[0];
         i <= patch.high[0] && i <= flake->high[0]; i++) {
        for (int64_t j = patch.low[1] > flake->low[1] ? patch.low[1] : flake->low[1];
             j <= patch.high[1] && j <= flake->high[1]; j++) {
            int32_t c = sv_flake_look_up(flake, i, j);
            bool near = false;
            for (sv_index s = c < 0 ? 0 : flake->cells[c].first_site;
                 c >= 0 && s < flake->cells[c].first_site + flake->cells[c].n_sites; s++)
                near = near || distance_to(cut, flake->sites[s].at) <= reach;
            if (!near)
                continue;
            if (list != NULL)
                list[next[c]] = (int32_t)number;
            next[c]++;
        }
    }
}

sv_status sv_bonds_finish(sv_context *context, sv_drawing *d)
{
    sv_bonds *bonds = &d->bonds;
    const sv_flake *flake = d->flake;
    sv_index *next = NULL;
    double reach = 0.0;
    sv_status status;
    if (bonds->n_cuts == 0)
        return SV_OK;
    if ((status = need_classes(context, d)) != SV_OK ||
        (status = sv_take(context, flake->n_cells, sizeof *next, &next)) != SV_OK ||
        (status = sv_take(context, flake->n_cells + 1, sizeof *bonds->cut_start,
                          &bonds->cut_start)) != SV_OK)
        goto out;
    for (int h = 0; h < flake->model->n_hops; h++)
        reach = fmax(reach, hypot(bonds->classes[h].vector[0], bonds->classes[h].vector[1]));
    for (sv_index k = 0; k < bonds->n_cuts; k++)
        sort_cut(d, k, reach + 1e-6, next, NULL);
    for (sv_index c = 0; c < flake->n_cells; c++) {
        bonds->cut_start[c + 1] = bonds->cut_start[c] + next[c];
        next[c] = bonds->cut_start[c];
    }
    if ((status = sv_take(context, bonds->cut_start[flake->n_cells] + 1, sizeof *bonds->cut_list,
                          &bonds->cut_list)) != SV_OK)
        goto out;
    for (sv_index k = 0; k < bonds->n_cuts; k++)
        sort_cut(d, k, reach + 1e-6, next, bonds->cut_list);
out:
    sv_give(context, next);
    return status;
}

void sv_bonds_free(sv_context *context, sv_bonds *bonds)
{
    sv_give(context, bonds->classes);
    sv_give(context, bonds->edges[0]);
    sv_give(context, bonds->edges[1]);
    sv_give(context, bonds->cuts);
    sv_give(context, bonds->cut_start);
    sv_give(context, bonds->cut_list);
    *bonds = (sv_bonds){0};
}
