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
    const sv_drawing *drawing;
    const int32_t *row_of_site;
    double (*orbital_uv)[2]; /* reduced positions of the orbitals */
    double flux;             /* quanta per cell */
    int quanta;              /* through the whole torus, beside those */
} builder;

/* Coordinates along the torus vectors of a point counted in cells. */
static void torus_coordinates(const sv_flake *flake, double u, double v, double ret_st[2])
{
    const int32_t(*t)[2] = flake->period;
    double det = (double)t[0][0] * t[1][1] - (double)t[0][1] * t[1][0];
    ret_st[0] = (u * t[1][1] - v * t[1][0]) / det;
    ret_st[1] = (v * t[0][0] - u * t[0][1]) / det;
}

/* Turns of a hop from (u0, v0) to (u1, v1) by the quanta through the torus: the gauge below in
 * torus coordinates, A = Φ s dt, which any torus carries for whole Φ. */
static double turns_of_quanta(const builder *b, const double from[2], const double to[2],
                              const int32_t torus[2])
{
    double start[2], end[2], wound[2];
    torus_coordinates(b->flake, from[0], from[1], start);
    torus_coordinates(b->flake, to[0], to[1], end);
    torus_coordinates(b->flake, torus[0], torus[1], wound);
    return b->quanta * (-0.5 * (start[0] + end[0]) * (end[1] - start[1]) +
                        round(wound[0]) * (end[1] - round(wound[1])));
}

/*
 * ⟨to|H|from⟩ of a hop that starts in cell `start` of the flake and whose end, before wrapping,
 * lies in start + shift; `torus` was taken off that end.
 *
 * Gauge A = φ u dv: the straight hop carries exp(−2πi φ ū Δv). On a torus states obey
 * ψ(r + T) = exp(−2πi φ T_u v) ψ(r), which keeps the Hamiltonian periodic; an end that wraps by T
 * picks up exp(+2πi φ T_u v) with v the wrapped coordinate.
 */
static sv_complex element(const builder *b, int number, const sv_cell *start,
                          const int32_t torus[2])
{
    const sv_hop *hop = &b->flake->model->hops[number];
    sv_complex amplitude = hop->amplitude * sv_bond_factor(b->drawing, number, start);
    int32_t i = start->i, j = start->j;
    if (b->flux == 0.0 && b->quanta == 0)
        return amplitude;
    const double *from = b->orbital_uv[hop->from], *to = b->orbital_uv[hop->to];
    double u0 = i + from[0], v0 = j + from[1];
    double u1 = i + hop->shift[0] + to[0], v1 = j + hop->shift[1] + to[1];
    double turns = -b->flux * 0.5 * (u0 + u1) * (v1 - v0) + b->flux * torus[0] * (v1 - torus[1]);
    if (b->quanta != 0)
        turns += turns_of_quanta(b, (const double[2]){u0, v0}, (const double[2]){u1, v1}, torus);
    double angle = 2.0 * M_PI * (turns - floor(turns));
    return amplitude * CMPLX(cos(angle), sin(angle));
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

/* Changed local operators that join this orbital to others of its position. */
static int add_local(const builder *b, sv_index s, entry *row, int n)
{
    const sv_model *model = b->flake->model;
    const sv_site *site = &b->flake->sites[s];
    for (int f = 0; f < model->n_fields; f++) {
        const sv_model_field *field = &model->fields[f];
        for (int t = 0; b->drawing->field[f] != NULL && t < field->n_terms; t++) {
            const sv_field_term *term = &field->terms[t];
            if (term->to == term->from ||
                (term->to != site->orbital && term->from != site->orbital))
                continue;
            bool ends_here = term->to == site->orbital;
            sv_index other =
                sv_flake_site_of(b->flake, site->cell, ends_here ? term->from : term->to);
            int32_t column = other < 0 ? -1 : b->row_of_site[other];
            sv_complex amplitude = ends_here ? term->amplitude : conj(term->amplitude);
            if (column >= 0)
                n = add_entry(row, n, column, amplitude * b->drawing->field[f][s]);
        }
    }
    return n;
}

/* Row of an adatom: its energy and the hop to its host, whose row stands before. */
static int gather_adatom(const builder *b, sv_index r, entry *row)
{
    const sv_sample *sample = b->sample;
    int n = add_entry(row, 0, (int32_t)r, sample->potential[r]);
    return add_entry(row, n, b->row_of_site[sample->pristine[r]],
                     b->drawing->disorder[sample->adatom[r]].coupling);
}

/* Hops of a site to the adatoms on it, whose rows follow. */
static int add_adatoms(const builder *b, sv_index r, entry *row, int n)
{
    const sv_sample *sample = b->sample;
    for (sv_index k = r + 1;
         sample->adatom != NULL && k < sample->n && sample->pristine[k] == sample->pristine[r]; k++)
        n = add_entry(row, n, (int32_t)k, b->drawing->disorder[sample->adatom[k]].coupling);
    return n;
}

/* Hops of a structure are listed with it. */
static int add_bonds(const builder *b, sv_index site, entry *row, int n)
{
    const sv_structure *s = b->flake->spec.structure;
    for (sv_index k = s->bond_start[site]; k < s->bond_start[site + 1]; k++) {
        int32_t column = b->row_of_site[s->bond_to[k]];
        if (column >= 0)
            n = add_entry(row, n, column, s->bond[k]);
    }
    return n;
}

/* Gathers one row; `row` has room for 2·n_hops + 1 entries and those of the local operators. */
static int gather_row(const builder *b, sv_index r, entry *row)
{
    const sv_site *site = &b->flake->sites[b->sample->pristine[r]];
    const sv_cell *cell = &b->flake->cells[site->cell];
    const sv_model *model = b->flake->model;
    if (b->sample->adatom != NULL && b->sample->adatom[r] >= 0)
        return gather_adatom(b, r, row);
    int n = add_entry(row, 0, (int32_t)r,
                      model->orbitals[site->orbital].onsite + b->sample->potential[r]);
    n = add_local(b, b->sample->pristine[r], row, n);
    n = add_adatoms(b, r, row, n);
    if (b->flake->spec.structure != NULL)
        return add_bonds(b, b->sample->pristine[r], row, n);
    for (int h = 0; h < model->n_hops; h++) {
        const sv_hop *hop = &model->hops[h];
        landing place;
        if (hop->to == site->orbital) {
            /* The hop starts in the cell where (this cell − shift) lands and ends here. */
            int32_t column = row_at(b, (int64_t)cell->i - hop->shift[0],
                                    (int64_t)cell->j - hop->shift[1], hop->from, &place);
            const sv_cell *start = &b->flake->cells[place.cell < 0 ? 0 : place.cell];
            if (column >= 0 && !sv_bond_is_cut(b->drawing, h, start)) {
                const int32_t torus[2] = {-place.torus[0], -place.torus[1]};
                n = add_entry(row, n, column, element(b, h, start, torus));
            }
        }
        if (hop->from == site->orbital) {
            int32_t column = row_at(b, (int64_t)cell->i + hop->shift[0],
                                    (int64_t)cell->j + hop->shift[1], hop->to, &place);
            if (column >= 0 && !sv_bond_is_cut(b->drawing, h, cell))
                n = add_entry(row, n, column, conj(element(b, h, cell, place.torus)));
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

/* Most entries that changed local operators can add to a row. */
static sv_index room_of_fields(const sv_drawing *d)
{
    const sv_model *model = d->flake->model;
    sv_index room = 0;
    for (int f = 0; f < model->n_fields; f++)
        for (int t = 0; d->field[f] != NULL && t < model->fields[f].n_terms; t++)
            room += model->fields[f].terms[t].to != model->fields[f].terms[t].from;
    return room;
}

/* Hops of a site of a structure. */
static sv_index bonds_of(const sv_flake *flake, sv_index site)
{
    const sv_structure *s = flake->spec.structure;
    return s->bond_start[site + 1] - s->bond_start[site];
}

/* Hops of the site that has most of them; 0 for lattices. */
static sv_index most_bonds(const sv_flake *flake)
{
    sv_index most = 0;
    for (sv_index s = 0; flake->spec.structure != NULL && s < flake->n_sites; s++)
        most = bonds_of(flake, s) > most ? bonds_of(flake, s) : most;
    return most;
}

/* Most entries a row of this orbital can have; the sum over rows sizes the matrix. */
static sv_index room_needed(const sv_sample *sample, const sv_drawing *d)
{
    const sv_model *model = sample->flake->model;
    sv_index room = sample->n * room_of_fields(d) + d->inventory.adatoms;
    for (sv_index r = 0; r < sample->n; r++) {
        int orbital = sample->flake->sites[sample->pristine[r]].orbital;
        if (sample->adatom != NULL && sample->adatom[r] >= 0) {
            room += 2;
            continue;
        }
        room++;
        if (sample->flake->spec.structure != NULL)
            room += bonds_of(sample->flake, sample->pristine[r]);
        for (int h = 0; h < model->n_hops; h++)
            room += (model->hops[h].from == orbital) + (model->hops[h].to == orbital);
    }
    return room;
}

sv_status sv_sample_build_hamiltonian(sv_context *context, sv_sample *sample, const sv_drawing *d,
                                      const int32_t *row_of_site)
{
    const sv_model *model = sample->flake->model;
    sv_sparse *matrix = &sample->hamiltonian;
    builder b = {.flake = sample->flake,
                 .sample = sample,
                 .drawing = d,
                 .row_of_site = row_of_site,
                 .flux = (double)model->flux[0] / model->flux[1],
                 .quanta = d->quanta};
    entry *row = NULL;
    sv_status status;
    if ((status = sv_take(context,
                          2 * (sv_index)model->n_hops + most_bonds(sample->flake) + 2 +
                              room_of_fields(d) + SV_DISORDER_MOST,
                          sizeof *row, &row)) != SV_OK ||
        (status = sv_take(context, model->n_orbitals, sizeof *b.orbital_uv, &b.orbital_uv)) !=
            SV_OK ||
        (status = take_matrix(context, matrix, sample->n, room_needed(sample, d))) != SV_OK)
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
