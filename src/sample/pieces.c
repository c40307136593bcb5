/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Connected pieces of a sample: what a defect list has cut off, and what hangs on by one hop. */
#include "sample_internal.h"

#include <math.h>
#include <string.h>

/* Positions by cell and number in the cell; `parent` is a forest, a root stands for its piece. */
typedef struct forest {
    const sv_sample *sample;
    bool without_turns; /* leave out hops that go around the torus */
    int32_t *parent;    /* −1: no site there */
    int32_t *neighbour; /* the only one met so far; −1: none, −2: several */
    sv_index n_positions;
} forest;

enum { NO_NEIGHBOUR = -1, SEVERAL = -2, NO_SITE = -1 };

static int32_t position_of(const sv_sample *sample, sv_index row)
{
    const sv_site *site = &sample->flake->sites[sample->pristine[row]];
    const sv_model *model = sample->flake->model;
    return site->cell * model->n_positions + model->orbitals[site->orbital].position;
}

/* Halving the path keeps the forest flat. */
static int32_t root_of(const forest *f, int32_t at)
{
    while (f->parent[at] != at) {
        f->parent[at] = f->parent[f->parent[at]];
        at = f->parent[at];
    }
    return at;
}

static void meet(forest *f, int32_t at, int32_t other)
{
    if (f->neighbour[at] == NO_NEIGHBOUR)
        f->neighbour[at] = other;
    else if (f->neighbour[at] != other)
        f->neighbour[at] = SEVERAL;
    int32_t a = root_of(f, at), b = root_of(f, other);
    if (a < b)
        f->parent[b] = a;
    else
        f->parent[a] = b;
}

/* Does a hop of the model lead from one site to the other without going around? */
static bool is_direct(const sv_sample *sample, sv_index row, sv_index column)
{
    const sv_flake *flake = sample->flake;
    const sv_site *to = &flake->sites[sample->pristine[row]];
    const sv_site *from = &flake->sites[sample->pristine[column]];
    int32_t i = flake->cells[to->cell].i - flake->cells[from->cell].i;
    int32_t j = flake->cells[to->cell].j - flake->cells[from->cell].j;
    for (int h = 0; h < flake->model->n_hops; h++) {
        const sv_hop *hop = &flake->model->hops[h];
        bool forth = hop->from == from->orbital && hop->to == to->orbital && hop->shift[0] == i &&
                     hop->shift[1] == j;
        bool back = hop->to == from->orbital && hop->from == to->orbital && hop->shift[0] == -i &&
                    hop->shift[1] == -j;
        if (forth || back)
            return true;
    }
    return false;
}

static bool links(const forest *f, sv_index row, sv_index k)
{
    const sv_sparse *h = &f->sample->hamiltonian;
    const sv_complex value = h->value[k];
    return (creal(value) != 0.0 || cimag(value) != 0.0) &&
           (!f->without_turns || is_direct(f->sample, row, h->column[k]));
}

static void drop_forest(sv_context *context, forest *f)
{
    sv_give(context, f->parent);
    sv_give(context, f->neighbour);
}

static sv_status grow_forest(sv_context *context, const sv_sample *sample, bool without_turns,
                             forest *ret)
{
    const sv_flake *flake = sample->flake;
    const sv_sparse *h = &sample->hamiltonian;
    forest f = {.sample = sample,
                .without_turns = without_turns && (flake->periodic[0] || flake->periodic[1]),
                .n_positions = flake->n_cells * flake->model->n_positions};
    sv_status status;
    if (f.n_positions > INT32_MAX)
        return SV_FAIL(context, SV_REFUSED, "%lld positions are more than can be numbered",
                       (long long)f.n_positions);
    if ((status = sv_take_raw(context, f.n_positions, sizeof *f.parent, &f.parent)) != SV_OK ||
        (status = sv_take_raw(context, f.n_positions, sizeof *f.neighbour, &f.neighbour)) !=
            SV_OK) {
        drop_forest(context, &f);
        return status;
    }
    for (sv_index p = 0; p < f.n_positions; p++) {
        f.parent[p] = NO_SITE;
        f.neighbour[p] = NO_NEIGHBOUR;
    }
    for (sv_index r = 0; r < sample->n; r++)
        f.parent[position_of(sample, r)] = position_of(sample, r);
    for (sv_index r = 0; r < sample->n; r++) {
        const int32_t at = position_of(sample, r);
        for (sv_index k = h->row_start[r]; k < h->row_start[r + 1]; k++) {
            const int32_t other = position_of(sample, h->column[k]);
            if (other != at && links(&f, r, k))
                meet(&f, at, other);
        }
    }
    *ret = f;
    return SV_OK;
}

/* Sites of each piece, kept at its root. */
static sv_status count_sites(sv_context *context, const forest *f, int32_t **ret_sites)
{
    int32_t *sites = NULL;
    sv_status status = sv_take(context, f->n_positions, sizeof *sites, &sites);
    for (sv_index r = 0; r < f->sample->n && status == SV_OK; r++)
        sites[root_of(f, position_of(f->sample, r))]++;
    if (status == SV_OK)
        *ret_sites = sites;
    return status;
}

/* Root of the largest piece; the first of equals. */
static int32_t largest_root(const forest *f, const int32_t *sites)
{
    int32_t best = root_of(f, position_of(f->sample, 0));
    for (sv_index r = 1; r < f->sample->n; r++) {
        const int32_t root = root_of(f, position_of(f->sample, r));
        if (sites[root] > sites[best])
            best = root;
    }
    return best;
}

static sv_status count_imbalance(sv_context *context, sv_sample *sample)
{
    const sv_model *model = sample->flake->model;
    sv_index *count = NULL;
    sv_status status = sv_take(context, model->n_orbitals, sizeof *count, &count);
    if (status != SV_OK)
        return status;
    for (sv_index r = 0; r < sample->n; r++)
        if (sample->adatom == NULL || sample->adatom[r] < 0)
            count[sample->flake->sites[sample->pristine[r]].orbital]++;
    sv_index low = count[0], high = count[0];
    for (int k = 1; k < model->n_orbitals; k++) {
        low = count[k] < low ? count[k] : low;
        high = count[k] > high ? count[k] : high;
    }
    sample->inventory.imbalance = high - low;
    sv_give(context, count);
    return SV_OK;
}

/* Numbers the pieces in the order of their rows; a number once given is kept at the root. */
static void number_pieces(const forest *f, int32_t *number_of_root, int32_t *piece_of_row)
{
    int32_t next = 0;
    for (sv_index p = 0; p < f->n_positions; p++)
        number_of_root[p] = -1;
    for (sv_index r = 0; r < f->sample->n; r++) {
        const int32_t root = root_of(f, position_of(f->sample, r));
        if (number_of_root[root] < 0)
            number_of_root[root] = next++;
        piece_of_row[r] = number_of_root[root];
    }
}

sv_status sv_sample_pieces(sv_context *context, sv_sample *sample, int32_t *piece_of_row)
{
    forest f = {0};
    int32_t *sites = NULL;
    sv_inventory *inventory = &sample->inventory;
    sv_status status = grow_forest(context, sample, false, &f);
    if (status != SV_OK || (status = count_sites(context, &f, &sites)) != SV_OK ||
        (status = count_imbalance(context, sample)) != SV_OK)
        goto out;
    inventory->pieces = inventory->isolated = inventory->dangling = 0;
    inventory->largest_piece = sample->n > 0 ? sites[largest_root(&f, sites)] : 0;
    for (sv_index p = 0; p < f.n_positions; p++) {
        if (f.parent[p] == NO_SITE)
            continue;
        inventory->pieces += f.parent[p] == p;
        inventory->isolated += f.neighbour[p] == NO_NEIGHBOUR;
        inventory->dangling += f.neighbour[p] >= 0;
    }
    if (piece_of_row != NULL)
        number_pieces(&f, sites, piece_of_row);
out:
    sv_give(context, sites);
    drop_forest(context, &f);
    return status;
}

/* Takes the rows with new_row < 0, and their columns, out of the sample. */
static void compress(sv_sample *sample, const int32_t *new_row)
{
    sv_sparse *h = &sample->hamiltonian;
    sv_index used = 0, kept = 0;
    for (sv_index r = 0; r < sample->n; r++) {
        const sv_index first = h->row_start[r], last = h->row_start[r + 1];
        if (new_row[r] < 0)
            continue;
        h->row_start[kept] = used;
        sample->pristine[kept] = sample->pristine[r];
        sample->potential[kept] = sample->potential[r];
        if (sample->adatom != NULL)
            sample->adatom[kept] = sample->adatom[r];
        for (sv_index k = first; k < last; k++) {
            if (new_row[h->column[k]] < 0)
                continue;
            h->column[used] = new_row[h->column[k]];
            h->value[used++] = h->value[k];
        }
        kept++;
    }
    h->row_start[kept] = used;
    h->n = kept;
    sample->n = kept;
    sample->inventory.adatoms = 0;
    for (sv_index r = 0; sample->adatom != NULL && r < kept; r++)
        sample->inventory.adatoms += sample->adatom[r] >= 0;
}

sv_status sv_sample_keep_largest(sv_context *context, sv_sample *sample)
{
    forest f = {0};
    int32_t *sites = NULL, *new_row = NULL;
    sv_status status = grow_forest(context, sample, true, &f);
    if (status != SV_OK || sample->n == 0 || (status = count_sites(context, &f, &sites)) != SV_OK ||
        (status = sv_take_raw(context, sample->n, sizeof *new_row, &new_row)) != SV_OK)
        goto out;
    const int32_t largest = largest_root(&f, sites);
    int32_t next = 0;
    for (sv_index r = 0; r < sample->n; r++)
        new_row[r] = root_of(&f, position_of(sample, r)) == largest ? next++ : -1;
    sample->inventory.removed_sites += sample->n - next;
    if (next < sample->n)
        compress(sample, new_row);
    sample->inventory.sites = sample->n;
out:
    sv_give(context, sites);
    sv_give(context, new_row);
    drop_forest(context, &f);
    return status;
}
