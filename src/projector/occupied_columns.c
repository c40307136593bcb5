/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Columns of the projector, chosen and orthonormalised.
 *
 * m columns P|s⟩ are chosen by a Cholesky factorisation with pivoting of their overlaps
 * ⟨P s|P t⟩ = P_st (the choice of A. Damle, L. Lin, L. Ying, J. Chem. Theory Comput. 11, 1463
 * (2015), in the occupied space itself). In a Chern phase the sites of one sublattice alone never
 * do: their overlaps are singular at some point of the Brillouin zone. */
#include "projector_internal.h"

#include <cblas.h>
#include <math.h>
#include <stdlib.h>

#define lapack_complex_double double _Complex
#define lapack_complex_float  float _Complex
#include <lapacke.h>

static const double LEAST_PIVOT = 1e-7; /* of overlaps: errors of P grow by its inverse at most */

typedef struct columns_work {
    const sv_sample *sample;
    sv_index n, m, s; /* rows, states, sites chosen */
    sv_index *sites;  /* n: the chosen first */
    sv_complex *p;    /* n × s: P on the chosen sites */
    sv_complex *unit; /* n × 16 */
    sv_complex *factor;
    lapack_int *pivot;
} columns_work;

static void free_columns(sv_context *context, columns_work *w)
{
    sv_give(context, w->sites);
    sv_give(context, w->p);
    sv_give(context, w->unit);
    sv_give(context, w->factor);
    sv_give(context, w->pivot);
}

/* Mean energy of an orbital of the cell on this sample; +∞ when it has no site left. */
static double orbital_energy(const sv_sample *sample, int32_t orbital)
{
    const sv_sparse *h = &sample->hamiltonian;
    double sum = 0.0;
    sv_index count = 0;
    for (sv_index r = 0; r < sample->n; r++) {
        if (sample->flake->sites[sample->pristine[r]].orbital != orbital)
            continue;
        count++;
        for (sv_index k = h->row_start[r]; k < h->row_start[r + 1]; k++)
            if (h->column[k] == r)
                sum += creal(h->value[k]);
    }
    return count > 0 ? sum / (double)count : (double)INFINITY;
}

/* Where a site stands in the order of choice: whole sublattices of low energy first; within one,
 * and this matters for the last of them, by a sequence that spreads evenly. */
static double site_rank(const columns_work *w, const double *energies, sv_index r)
{
    const double golden = 0.6180339887498949;
    double whole, spread = modf((double)r * golden, &whole), rank = 0.0;
    int32_t own = w->sample->flake->sites[w->sample->pristine[r]].orbital;
    for (int32_t o = 0; o < w->sample->flake->model->n_orbitals; o++)
        rank += energies[o] < energies[own] || (energies[o] == energies[own] && o < own);
    return rank + spread;
}

typedef struct ranked {
    double rank;
    sv_index site;
} ranked;

static int by_rank(const void *a, const void *b)
{
    const ranked *x = a, *y = b;
    return x->rank < y->rank ? -1 : x->rank > y->rank ? 1 : x->site < y->site ? -1 : 1;
}

static sv_status order_sites(sv_context *context, columns_work *w)
{
    int32_t orbitals = w->sample->flake->model->n_orbitals;
    double *energies = NULL;
    ranked *order = NULL;
    sv_status status;
    if ((status = sv_take(context, orbitals, sizeof *energies, &energies)) != SV_OK ||
        (status = sv_take(context, w->n, sizeof *order, &order)) != SV_OK)
        goto out;
    for (int32_t o = 0; o < orbitals; o++)
        energies[o] = orbital_energy(w->sample, o);
    for (sv_index r = 0; r < w->n; r++)
        order[r] = (ranked){site_rank(w, energies, r), r};
    qsort(order, (size_t)w->n, sizeof *order, by_rank);
    /* Chosen ones and others ascending: memory is walked in order later. */
    for (sv_index k = 0; k < w->n; k++)
        order[k].rank = 0.0;
    qsort(order, (size_t)w->s, sizeof *order, by_rank);
    qsort(order + w->s, (size_t)(w->n - w->s), sizeof *order, by_rank);
    for (sv_index k = 0; k < w->n; k++)
        w->sites[k] = order[k].site;
out:
    sv_give(context, energies);
    sv_give(context, order);
    return status;
}

static sv_status take_columns(sv_context *context, sv_index s, columns_work *w)
{
    sv_status status;
    w->s = s;
    if ((status = sv_take_raw(context, w->n, sizeof *w->sites, &w->sites)) != SV_OK ||
        (status = sv_take_raw(context, w->n * s, sizeof *w->p, &w->p)) != SV_OK ||
        (status = sv_take(context, w->n * SV_PANEL_COLUMNS, sizeof *w->unit, &w->unit)) != SV_OK ||
        (status = sv_take_raw(context, s * s, sizeof *w->factor, &w->factor)) != SV_OK)
        return status;
    return sv_take_raw(context, s, sizeof *w->pivot, &w->pivot);
}

/* P on the chosen sites, in panels. */
static sv_status project_sites(sv_context *context, sv_projector *filter, columns_work *w)
{
    for (sv_index first = 0; first < w->s; first += SV_PANEL_COLUMNS) {
        sv_index width = w->s - first < SV_PANEL_COLUMNS ? w->s - first : SV_PANEL_COLUMNS;
        for (sv_index k = 0; k < width; k++)
            w->unit[w->sites[first + k] + k * w->n] = 1.0;
        sv_status status = sv_projector_apply(context, filter, width, w->unit, w->p + first * w->n);
        if (status != SV_OK)
            return status;
        for (sv_index k = 0; k < width; k++)
            w->unit[w->sites[first + k] + k * w->n] = 0.0;
    }
    return SV_OK;
}

/* P_ss = R†R with pivoting; false unless its rank is the number of states. */
static bool factor_overlaps(columns_work *w, double *real_work)
{
    lapack_int s = (lapack_int)w->s, rank = 0;
    for (sv_index c = 0; c < s; c++)
        for (sv_index r = 0; r <= c; r++)
            w->factor[r + c * s] = w->p[w->sites[r] + c * w->n];
    lapack_int info = LAPACKE_zpstrf_work(LAPACK_COL_MAJOR, 'U', s, w->factor, s, w->pivot, &rank,
                                          LEAST_PIVOT, real_work);
    return info >= 0 && rank == w->m;
}

/* Ψ = P_{·s} R^{-1}: on the chosen sites R† itself, on the others by solving. `rest` takes the
 * other rows of P, n − s of them. */
static void orthonormalise(const columns_work *w, sv_complex *rest, sv_complex *vectors)
{
    const sv_complex one = 1.0;
    sv_index n = w->n, m = w->m, s = w->s, others = n - s;
    for (sv_index c = 0; c < m; c++) {
        const sv_complex *from = w->p + (w->pivot[c] - 1) * n;
        for (sv_index k = 0; k < others; k++)
            rest[k + c * others] = from[w->sites[s + k]];
    }
    if (others > 0)
        cblas_ztrsm(CblasColMajor, CblasRight, CblasUpper, CblasNoTrans, CblasNonUnit, (int)others,
                    (int)m, &one, w->factor, (int)s, rest, (int)others);
    for (sv_index c = 0; c < m; c++)
        for (sv_index k = 0; k < others; k++)
            vectors[w->sites[s + k] + c * n] = rest[k + c * others];
    const sv_index tile = 16; /* R is read along its rows */
    for (sv_index c0 = 0; c0 < m; c0 += tile)
        for (sv_index k = 0; k < s; k++)
            for (sv_index c = c0; c < m && c < c0 + tile; c++)
                vectors[w->sites[w->pivot[k] - 1] + c * n] =
                    k < c ? 0.0 : conj(w->factor[c + k * s]);
}

sv_status sv_occupied_columns(sv_context *context, const sv_sample *sample, sv_projector *filter,
                              sv_index m, sv_index s, sv_complex **ret_vectors)
{
    columns_work w = {.sample = sample, .n = sample->n, .m = m};
    double *real_work = NULL;
    sv_complex *rest = NULL, *vectors = NULL;
    sv_status status;
    if ((status = take_columns(context, s, &w)) != SV_OK ||
        (status = sv_take_raw(context, 2 * s, sizeof *real_work, &real_work)) != SV_OK ||
        (status = order_sites(context, &w)) != SV_OK ||
        (status = project_sites(context, filter, &w)) != SV_OK)
        goto out;
    if (!factor_overlaps(&w, real_work)) {
        status = SV_FAIL(context, SV_NUMERICAL, "%lld columns do not span %lld occupied states",
                         (long long)s, (long long)m);
        goto out;
    }
    if ((status = sv_take_raw(context, (w.n - s) * m, sizeof *rest, &rest)) != SV_OK ||
        (status = sv_take_raw(context, w.n * m, sizeof *vectors, &vectors)) != SV_OK)
        goto out;
    orthonormalise(&w, rest, vectors);
    *ret_vectors = vectors;
out:
    free_columns(context, &w);
    sv_give(context, real_work);
    sv_give(context, rest);
    return status;
}
