/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The dense engine: eigenvectors of the smaller side of the spectrum. */
#include "projector_internal.h"

#include <cblas.h>
#include <float.h>
#include <math.h>

typedef struct dense_state {
    sv_index n, columns;
    bool empty_side;
    sv_complex *vectors;
} dense_state;

/* What the choice of the range needs and finds. */
typedef struct choice {
    const sv_occupation *occupation;
    bool occupied_basis;
    double resolution;
    sv_levels levels;
    bool too_many; /* more electrons than states */
    bool empty_side;
} choice;

static sv_index count_below(const double *values, sv_index n, double energy)
{
    sv_index low = 0, high = n;
    while (low < high) {
        sv_index middle = low + (high - low) / 2;
        if (values[middle] < energy)
            low = middle + 1;
        else
            high = middle;
    }
    return low;
}

static void occupy_by_energy(const double *values, sv_index n, choice *c)
{
    sv_levels *levels = &c->levels;
    double energy = c->occupation->fermi_energy;
    levels->fermi_energy = energy;
    levels->occupied = count_below(values, n, energy);
    sv_index near_below = count_below(values, n, energy - c->resolution);
    sv_index near_above = count_below(values, n, energy + c->resolution);
    levels->on_level = near_above != near_below;
}

static void occupy_by_count(const double *values, sv_index n, choice *c)
{
    sv_levels *levels = &c->levels;
    int64_t electrons = sv_occupation_electrons(c->occupation, n);
    if (electrons < 0 || electrons > n) {
        c->too_many = true;
        return;
    }
    levels->occupied = electrons;
    if (electrons == 0) {
        levels->fermi_energy = values[0] - 1.0;
    } else if (electrons == n) {
        levels->fermi_energy = values[n - 1] + 1.0;
    } else {
        levels->fermi_energy = 0.5 * (values[electrons - 1] + values[electrons]);
        levels->on_level = values[electrons] - values[electrons - 1] <= c->resolution;
    }
}

static void choose_range(const double *values, sv_index n, sv_index *first, sv_index *last,
                         void *user)
{
    choice *c = user;
    if (c->occupation->by == SV_BY_ENERGY)
        occupy_by_energy(values, n, c);
    else
        occupy_by_count(values, n, c);
    sv_levels *levels = &c->levels;
    levels->resolution = c->resolution;
    levels->has_highest = levels->occupied > 0;
    levels->has_lowest = levels->occupied < n;
    if (levels->has_highest)
        levels->highest_occupied = values[levels->occupied - 1];
    if (levels->has_lowest)
        levels->lowest_empty = values[levels->occupied];
    if (c->too_many) {
        *first = *last = 0;
        return;
    }
    c->empty_side = !c->occupied_basis && levels->occupied > n - levels->occupied;
    *first = c->empty_side ? levels->occupied : 0;
    *last = c->empty_side ? n : levels->occupied;
}

static void dense_free(sv_context *context, void *state)
{
    dense_state *s = state;
    sv_give(context, s->vectors);
    sv_give(context, s);
}

/* y = B (B† x), or x − B (B† x) when B spans the empty side. */
static sv_status dense_apply(sv_context *context, void *state, sv_index columns,
                             const sv_complex *x, sv_complex *y)
{
    const dense_state *s = state;
    const sv_complex one = 1.0, minus = -1.0, zero = 0.0;
    int n = (int)s->n, m = (int)s->columns, k = (int)columns;
    sv_complex *overlap = NULL;
    sv_status status = sv_take_raw(context, s->columns * columns, sizeof *overlap, &overlap);
    if (status != SV_OK)
        return status;
    for (sv_index e = 0; e < s->n * columns; e++)
        y[e] = s->empty_side ? x[e] : 0.0;
    if (m > 0) {
        cblas_zgemm(CblasColMajor, CblasConjTrans, CblasNoTrans, m, k, n, &one, s->vectors, n, x, n,
                    &zero, overlap, m);
        cblas_zgemm(CblasColMajor, CblasNoTrans, CblasNoTrans, n, k, m,
                    s->empty_side ? &minus : &one, s->vectors, n, overlap, m, &one, y, n);
    }
    sv_give(context, overlap);
    return SV_OK;
}

static sv_basis dense_basis(const void *state)
{
    const dense_state *s = state;
    return (sv_basis){true, s->empty_side, s->n, s->columns, s->vectors};
}

static const engine_class dense_class = {
    .name = "dense", .free = dense_free, .apply = dense_apply, .basis = dense_basis};

/* Eigenvalues of an order-n matrix carry errors of a few eps·‖H‖; the factor n is cautious. */
static double energy_resolution(const sv_sparse *h)
{
    double relative = fmax(1e-13, 4.0 * DBL_EPSILON * (double)h->n);
    return relative * fmax(sv_sparse_norm_bound(h), DBL_MIN / DBL_EPSILON);
}

sv_status sv_dense_engine_make(sv_context *context, const sv_sample *sample,
                               const sv_occupation *occupation, const sv_projector_options *options,
                               sv_projector *projector)
{
    sv_index n = sample->n, first = 0, last = 0;
    dense_state *state = NULL;
    sv_complex *a = NULL;
    double *values = NULL;
    choice c = {.occupation = occupation,
                .occupied_basis = options->occupied_basis,
                .resolution = energy_resolution(&sample->hamiltonian)};
    sv_status status;
    if ((status = sv_take(context, 1, sizeof *state, &state)) != SV_OK ||
        (status = sv_take_raw(context, n * n, sizeof *a, &a)) != SV_OK ||
        (status = sv_take_raw(context, n, sizeof *values, &values)) != SV_OK)
        goto out;
    sv_sparse_to_dense(&sample->hamiltonian, a);
    status =
        sv_dense_eigen(context, n, a, values, choose_range, &c, &first, &last, &state->vectors);
    if (status == SV_OK && c.too_many)
        status = SV_FAIL(context, SV_UNDEFINED, "%lld electrons do not fit into %lld states",
                         (long long)sv_occupation_electrons(occupation, n), (long long)n);
    if (status != SV_OK)
        goto out;
    state->n = n;
    state->columns = last - first;
    state->empty_side = c.empty_side;
    projector->engine = &dense_class;
    projector->state = state;
    projector->levels = c.levels;
    state = NULL;
out:
    if (state != NULL)
        dense_free(context, state);
    sv_give(context, a);
    sv_give(context, values);
    return status;
}
