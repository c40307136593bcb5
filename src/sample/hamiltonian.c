/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The sparse Hamiltonian of one realisation, row by row, with Peierls phases. */
#include "sample_internal.h"

#include <math.h>
#include <string.h>

/* One stored element while a row is gathered. */
typedef struct entry {
    int32_t column;
    sv_complex value;
} entry;

typedef struct builder {
    const sv_flake *flake;
    const sv_sample *sample;
    const int32_t *row_of_site;
    double (*orbital_uv)[2]; /* reduced positions of the orbitals */
    double flux;             /* quanta per cell */
} builder;

/*
 * ⟨to|H|from⟩ of a hop that starts in cell (i, j) of the flake and whose end, before wrapping,
 * lies in cell (i, j) + shift; `torus` was taken off that end.
 *
 * Gauge A = φ u dv: the straight hop carries exp(−2πi φ ū Δv). On a torus states obey
 * ψ(r + T) = exp(−2πi φ T_u v) ψ(r), which keeps the Hamiltonian periodic; an end that wraps by T
 * picks up exp(+2πi φ T_u v) with v the wrapped coordinate.
 */
static sv_complex element(const builder *b, const sv_hop *hop, int32_t i, int32_t j,
                          const int32_t torus[2])
{
    if (b->flux == 0.0)
        return hop->amplitude;
    const double *from = b->orbital_uv[hop->from], *to = b->orbital_uv[hop->to];
    double u0 = i + from[0], v0 = j + from[1];
    double u1 = i + hop->shift[0] + to[0], v1 = j + hop->shift[1] + to[1];
    double turns = -b->flux * 0.5 * (u0 + u1) * (v1 - v0) + b->flux * torus[0] * (v1 - torus[1]);
    double angle = 2.0 * M_PI * (turns - floor(turns));
    return hop->amplitude * CMPLX(cos(angle), sin(angle));
}

/* Row number of an orbital in the cell where (i, j) lands, or −1. */
static int32_t row_at(const builder *b, int64_t i, int64_t j, int orbital, landing *ret_place)
{
    *ret_place = sv_flake_land(b->flake, i, j);
    if (ret_place->cell < 0)
        return -1;
    sv_index site = sv_flake_site_of(b->flake, ret_place->cell, orbital);
    return site < 0 ? -1 : b->row_of_site[site];
}

/* Insertion keeps the row sorted; equal columns (small tori) add up. */
static int add_entry(entry *row, int n, int32_t column, sv_complex value)
{
    int at = n;
    while (at > 0 && row[at - 1].column > column)
        at--;
    if (at > 0 && row[at - 1].column == column) {
        row[at - 1].value += value;
        return n;
    }
    memmove(&row[at + 1], &row[at], (size_t)(n - at) * sizeof *row);
    row[at] = (entry){column, value};
    return n + 1;
}

/* Gathers one row; `row` has room for 2·n_hops + 1 entries. */
static int gather_row(const builder *b, sv_index r, entry *row)
{
    const sv_site *site = &b->flake->sites[b->sample->pristine[r]];
    const sv_cell *cell = &b->flake->cells[site->cell];
    const sv_model *model = b->flake->model;
    int n = add_entry(row, 0, (int32_t)r,
                      model->orbitals[site->orbital].onsite + b->sample->potential[r]);
    for (int h = 0; h < model->n_hops; h++) {
        const sv_hop *hop = &model->hops[h];
        landing place;
        if (hop->to == site->orbital) {
            /* The hop starts in the cell where (this cell − shift) lands and ends here. */
            int32_t column = row_at(b, (int64_t)cell->i - hop->shift[0],
                                    (int64_t)cell->j - hop->shift[1], hop->from, &place);
            if (column >= 0) {
                const sv_cell *start = &b->flake->cells[place.cell];
                const int32_t torus[2] = {-place.torus[0], -place.torus[1]};
                n = add_entry(row, n, column, element(b, hop, start->i, start->j, torus));
            }
        }
        if (hop->from == site->orbital) {
            int32_t column = row_at(b, (int64_t)cell->i + hop->shift[0],
                                    (int64_t)cell->j + hop->shift[1], hop->to, &place);
            if (column >= 0)
                n = add_entry(row, n, column, conj(element(b, hop, cell->i, cell->j, place.torus)));
        }
    }
    return n;
}

static sv_status take_matrix(sv_context *context, sv_sparse *matrix, sv_index n, sv_index room)
{
    sv_status status;
    matrix->n = n;
    if ((status = sv_take(context, n + 1, sizeof *matrix->row_start, &matrix->row_start)) !=
            SV_OK ||
        (status = sv_take_raw(context, room, sizeof *matrix->column, &matrix->column)) != SV_OK)
        return status;
    return sv_take_raw(context, room, sizeof *matrix->value, &matrix->value);
}

/* Most entries a row of this orbital can have; the sum over rows sizes the matrix. */
static sv_index room_needed(const sv_sample *sample)
{
    const sv_model *model = sample->flake->model;
    sv_index room = 0;
    for (sv_index r = 0; r < sample->n; r++) {
        int orbital = sample->flake->sites[sample->pristine[r]].orbital;
        room++;
        for (int h = 0; h < model->n_hops; h++)
            room += (model->hops[h].from == orbital) + (model->hops[h].to == orbital);
    }
    return room;
}

sv_status sv_sample_build_hamiltonian(sv_context *context, sv_sample *sample,
                                      const int32_t *row_of_site)
{
    const sv_model *model = sample->flake->model;
    sv_sparse *matrix = &sample->hamiltonian;
    builder b = {.flake = sample->flake,
                 .sample = sample,
                 .row_of_site = row_of_site,
                 .flux = (double)model->flux[0] / model->flux[1]};
    entry *row = NULL;
    sv_status status;
    if ((status = sv_take(context, 2 * (sv_index)model->n_hops + 2, sizeof *row, &row)) != SV_OK ||
        (status = sv_take(context, model->n_orbitals, sizeof *b.orbital_uv, &b.orbital_uv)) !=
            SV_OK ||
        (status = take_matrix(context, matrix, sample->n, room_needed(sample))) != SV_OK)
        goto out;
    for (int k = 0; k < model->n_orbitals; k++)
        sv_model_reduce(model, model->orbitals[k].at, b.orbital_uv[k]);
    sv_index used = 0;
    for (sv_index r = 0; r < sample->n; r++) {
        int n = gather_row(&b, r, row);
        for (int k = 0; k < n; k++, used++) {
            matrix->column[used] = row[k].column;
            matrix->value[used] = row[k].value;
        }
        matrix->row_start[r + 1] = used;
    }
out:
    sv_give(context, row);
    sv_give(context, b.orbital_uv);
    return status;
}
