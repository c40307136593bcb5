/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Bonds, sites and defects of a drawing, one block of the data file each. */
#include <math.h>

#include "figure_internal.h"

enum { MOST_RINGS = 3000 };
enum { NONE = -1, SEVERAL = -2 };

/* What stands at a position (cell by cell, then by position in the cell). */
typedef struct place {
    double at[2], energy;
    int32_t rows; /* orbitals left */
    int32_t adatoms;
    int32_t neighbour; /* the only one, NONE or SEVERAL */
    bool pristine, whole;
} place;

typedef struct places {
    place *at;
    sv_index count;
} places;

static sv_index place_of(const sv_sample *sample, sv_index row)
{
    const sv_site *site = &sample->flake->sites[sample->pristine[row]];
    const sv_model *model = sample->flake->model;
    return (sv_index)site->cell * model->n_positions + model->orbitals[site->orbital].position;
}

static bool is_hop(const sv_sparse *h, sv_index k)
{
    return creal(h->value[k]) != 0.0 || cimag(h->value[k]) != 0.0;
}

static void note_neighbours(const sv_sample *sample, places *p)
{
    const sv_sparse *h = &sample->hamiltonian;
    for (sv_index r = 0; r < sample->n; r++) {
        const sv_index from = place_of(sample, r);
        for (sv_index k = h->row_start[r]; k < h->row_start[r + 1]; k++) {
            const sv_index to = place_of(sample, h->column[k]);
            int32_t *only = &p->at[from].neighbour;
            if (to == from || !is_hop(h, k))
                continue;
            *only = *only == NONE || *only == to ? (int32_t)to : SEVERAL;
        }
    }
}

static sv_status fill_places(sv_draw_figure *f, places *p)
{
    const sv_sample *sample = f->result->sample, *whole = f->result->whole;
    const sv_flake *flake = sample->flake;
    const sv_model *model = flake->model;
    p->count = flake->n_cells * model->n_positions;
    sv_status status = sv_take(f->figure.context, p->count, sizeof *p->at, &p->at);
    if (status != SV_OK)
        return status;
    for (sv_index k = 0; k < p->count; k++)
        p->at[k].neighbour = NONE;
    for (sv_index s = 0; s < flake->n_sites; s++) {
        const sv_site *site = &flake->sites[s];
        place *at = &p->at[(sv_index)site->cell * model->n_positions +
                           model->orbitals[site->orbital].position];
        at->pristine = true;
        at->at[0] = site->at[0];
        at->at[1] = site->at[1];
    }
    for (sv_index r = 0; whole != NULL && r < whole->n; r++)
        p->at[place_of(whole, r)].whole = true;
    for (sv_index r = 0; r < sample->n; r++) {
        place *at = &p->at[place_of(sample, r)];
        if (sample->adatom != NULL && sample->adatom[r] >= 0) {
            at->adatoms++;
            continue;
        }
        at->rows++;
        at->energy += f->energy_factor * sample->potential[r];
    }
    note_neighbours(sample, p);
    return SV_OK;
}

/* Is the straight line between the two no longer than the hops of the model? Else it goes around
 * the torus. */
static bool is_straight(const sv_flake *flake, const double a[2], const double b[2])
{
    double longest = 0;
    if (!flake->periodic[0] && !flake->periodic[1])
        return true;
    for (int h = 0; h < flake->model->n_hops; h++) {
        const sv_hop *hop = &flake->model->hops[h];
        const double *from = flake->model->orbitals[hop->from].at;
        const double *to = flake->model->orbitals[hop->to].at;
        double d[2];
        for (int k = 0; k < 2; k++)
            d[k] = hop->shift[0] * flake->model->vectors[0][k] +
                   hop->shift[1] * flake->model->vectors[1][k] + to[k] - from[k];
        longest = fmax(longest, hypot(d[0], d[1]));
    }
    return hypot(a[0] - b[0], a[1] - b[1]) <= longest + 1e-6;
}

typedef enum bond_kind { BOND_NEAR, BOND_FAR, BOND_AROUND } bond_kind;

/* The shift by torus vectors that brings `to` nearest to `from`. */
static void nearest_image(const sv_flake *flake, const double from[2], double to[2])
{
    const double(*a)[2] = flake->model->vectors;
    double best[2] = {to[0], to[1]}, least = hypot(to[0] - from[0], to[1] - from[1]);
    for (int i = -1; i <= 1; i++)
        for (int j = -1; j <= 1; j++) {
            double at[2];
            for (int k = 0; k < 2; k++) {
                const int32_t(*t)[2] = flake->period;
                const double u = i * t[0][0] + j * t[1][0], v = i * t[0][1] + j * t[1][1];
                at[k] = to[k] + u * a[0][k] + v * a[1][k];
            }
            const double length = hypot(at[0] - from[0], at[1] - from[1]);
            if (length < least) {
                least = length;
                best[0] = at[0];
                best[1] = at[1];
            }
        }
    to[0] = best[0];
    to[1] = best[1];
}

/* Has a hop before this element joined the same two positions, in this row or in one of another
 * orbital of the position? */
static bool is_repeated(const sv_sample *sample, sv_index row, sv_index k)
{
    const sv_sparse *h = &sample->hamiltonian;
    const sv_index from = place_of(sample, row), to = place_of(sample, h->column[k]);
    const int32_t cell = sample->flake->sites[sample->pristine[row]].cell;
    for (sv_index r = row; r >= 0 && sample->flake->sites[sample->pristine[r]].cell == cell; r--) {
        const sv_index end = r == row ? k : h->row_start[r + 1];
        for (sv_index e = h->row_start[r]; e < end && place_of(sample, r) == from; e++)
            if (is_hop(h, e) && place_of(sample, h->column[e]) == to)
                return true;
    }
    return false;
}

/* Each pair of positions once; hops around the torus as half a hop from both ends. */
static void write_bonds(sv_draw_figure *f, const places *p, bond_kind kind, sv_draft *text)
{
    const sv_sample *sample = f->result->sample;
    const sv_sparse *h = &sample->hamiltonian;
    const double slack = sample->flake->spec.structure != NULL ? 1.3 : 1.05;
    for (sv_index r = 0; r < sample->n; r++) {
        const sv_index a = place_of(sample, r);
        for (sv_index k = h->row_start[r]; k < h->row_start[r + 1]; k++) {
            const sv_index b = place_of(sample, h->column[k]);
            const double *from = p->at[a].at;
            double to[2] = {p->at[b].at[0], p->at[b].at[1]};
            if (a == b || !is_hop(h, k))
                continue;
            const bool around = !is_straight(sample->flake, from, to);
            if (around)
                nearest_image(sample->flake, from, to);
            const double length = hypot(to[0] - from[0], to[1] - from[1]);
            const bool near = length <= f->shortest * slack;
            const bond_kind is = around ? BOND_AROUND : near ? BOND_NEAR : BOND_FAR;
            if (is != kind || (!around && a > b) || (around && !near) || is_repeated(sample, r, k))
                continue;
            f->bonds[kind]++;
            const double part = around ? 0.5 : 1;
            sv_draft_add(text, "%.6g %.6g %.6g %.6g\n", from[0], from[1], part * (to[0] - from[0]),
                         part * (to[1] - from[1]));
        }
    }
}

static void find_shortest(sv_draw_figure *f, const places *p)
{
    const sv_sample *sample = f->result->sample;
    const sv_sparse *h = &sample->hamiltonian;
    double shortest = INFINITY, sum = 0.0;
    sv_index joined = 0;
    for (sv_index r = 0; r < sample->n; r++) {
        double own = INFINITY; /* shortest hop of this site */
        for (sv_index k = h->row_start[r]; k < h->row_start[r + 1]; k++) {
            const double *a = p->at[place_of(sample, r)].at;
            const double *b = p->at[place_of(sample, h->column[k])].at;
            const double length = hypot(a[0] - b[0], a[1] - b[1]);
            if (is_hop(h, k) && length > 1e-9)
                own = fmin(own, length);
        }
        shortest = fmin(shortest, own);
        sum += isfinite(own) ? own : 0.0;
        joined += isfinite(own);
    }
    /* Hops of a structure differ from site to site. */
    if (sample->flake->spec.structure != NULL && joined > 0)
        shortest = sum / (double)joined;
    f->shortest = isfinite(shortest) ? shortest : 0;
}

typedef enum place_kind {
    PLACE_VACANT,
    PLACE_REMOVED,
    PLACE_HANGING,
    PLACE_LONE,
    PLACE_ADATOM
} place_kind;

static bool is_kind(const place *at, place_kind kind)
{
    switch (kind) {
    case PLACE_VACANT:
        return at->pristine && at->rows == 0 && !at->whole;
    case PLACE_REMOVED:
        return at->rows == 0 && at->whole;
    case PLACE_HANGING:
        return at->rows > 0 && at->neighbour >= 0;
    case PLACE_ADATOM:
        return at->adatoms > 0;
    case PLACE_LONE:
        return at->rows > 0 && at->neighbour == NONE;
    }
    return false;
}

static sv_index write_places(const places *p, place_kind kind, const char *name, sv_draft *text)
{
    sv_index count = 0;
    sv_draft_add(text, "\n\n# %s\n", name);
    for (sv_index k = 0; k < p->count; k++)
        count += is_kind(&p->at[k], kind);
    for (sv_index k = 0; k < p->count && count <= MOST_RINGS; k++)
        if (is_kind(&p->at[k], kind))
            sv_draft_add(text, "%.7g %.7g\n", p->at[k].at[0], p->at[k].at[1]);
    return count;
}

sv_status sv_draw_write_sites(sv_draw_figure *f, sv_draft *text)
{
    static const char *const bonds[] = {"bonds", "far", "around"};
    places p = {0};
    sv_status status = fill_places(f, &p);
    if (status != SV_OK)
        return status;
    find_shortest(f, &p);
    f->vacant = write_places(&p, PLACE_VACANT, "vacancies", text);
    f->removed = write_places(&p, PLACE_REMOVED, "removed", text);
    f->hanging = write_places(&p, PLACE_HANGING, "dangling", text);
    f->lone = write_places(&p, PLACE_LONE, "isolated", text);
    f->adatoms = write_places(&p, PLACE_ADATOM, "adatoms", text);
    for (int kind = BOND_NEAR; kind <= BOND_AROUND && f->by_site; kind++) {
        sv_draft_add(text, "\n\n# %s\n", bonds[kind]);
        write_bonds(f, &p, (bond_kind)kind, text);
    }
    sv_draft_add(text, "\n\n# sites\n# x, y, mean on-site disorder, position in the cell\n");
    const int n_positions = f->result->sample->flake->model->n_positions;
    for (sv_index k = 0; k < p.count && f->by_site; k++)
        if (p.at[k].rows > 0)
            sv_draft_add(text, "%.7g %.7g %.6g %d\n", p.at[k].at[0], p.at[k].at[1],
                         p.at[k].energy / p.at[k].rows, (int)(k % n_positions));
    sv_give(f->figure.context, p.at);
    return SV_OK;
}
