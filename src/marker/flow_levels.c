/* SPDX-License-Identifier: GPL-3.0-or-later */
/* A ring threaded with flux, and its levels next to the Fermi energy, sorted by edge. */
#include "flow_internal.h"

#include <cblas.h>
#include <math.h>
#include <string.h>

#define lapack_complex_double double _Complex
#define lapack_complex_float  float _Complex
#include <lapacke.h>

enum { MOST_LEVELS = 24 };

/* Where levels are looked for again when one lies on the Fermi energy, share of the half width. */
static const double BESIDE = 0.0137;

/* Angle (−π, π) from `from` to `to` as seen from the hole. */
static double angle_seen(const double hole[2], const double from[2], const double to[2])
{
    double a[2] = {from[0] - hole[0], from[1] - hole[1]};
    double b[2] = {to[0] - hole[0], to[1] - hole[1]};
    return atan2(a[0] * b[1] - a[1] * b[0], a[0] * b[0] + a[1] * b[1]);
}

static void fill_angles(flow_ring *ring, const double hole[2])
{
    const sv_sample *sample = ring->sample;
    const sv_sparse *h = &sample->hamiltonian;
    const sv_site *sites = sample->flake->sites;
    for (sv_index r = 0; r < h->n; r++) {
        double sum = 0.0;
        const double *to = sites[sample->pristine[r]].at;
        ring->inner[r] = sv_flake_by_hole(sample->flake, to);
        for (sv_index k = h->row_start[r]; k < h->row_start[r + 1]; k++) {
            /* Orbitals at one position see no flux between them. */
            const double *from = sites[sample->pristine[h->column[k]]].at;
            bool apart = hypot(to[0] - from[0], to[1] - from[1]) > 1e-9;
            ring->angle[k] = apart ? angle_seen(hole, from, to) : 0.0;
            sum += cabs(h->value[k]) * fabs(ring->angle[k]);
        }
        ring->speed = fmax(ring->speed, sum);
    }
}

sv_status sv_flow_ring_make(sv_context *context, const sv_sample *sample, double energy,
                            flow_ring *ret_ring)
{
    const sv_sparse *h = &sample->hamiltonian;
    sv_index stored = h->row_start[h->n];
    flow_ring ring = {.sample = sample, .energy = energy, .turned = *h};
    double hole[2];
    ring.turned.value = NULL;
    if (!sv_flake_hole(sample->flake, hole))
        return SV_FAIL(context, SV_UNDEFINED, "the flake has no hole, or several");
    sv_status status = sv_take_raw(context, stored, sizeof *ring.angle, &ring.angle);
    if (status == SV_OK)
        status = sv_take_raw(context, h->n, sizeof *ring.inner, &ring.inner);
    if (status == SV_OK)
        status = sv_take_raw(context, stored, sizeof *ring.turned.value, &ring.turned.value);
    if (status != SV_OK) {
        sv_flow_ring_free(context, &ring);
        return status;
    }
    fill_angles(&ring, hole);
    *ret_ring = ring;
    return SV_OK;
}

void sv_flow_ring_free(sv_context *context, flow_ring *ring)
{
    sv_give(context, ring->angle);
    sv_give(context, ring->inner);
    sv_give(context, ring->turned.value);
    *ring = (flow_ring){0};
}

/* Both triangles from their own angles, which differ in sign only. */
static void thread_flux(flow_ring *ring, double flux)
{
    const sv_sparse *h = &ring->sample->hamiltonian;
    for (sv_index k = 0; k < h->row_start[h->n]; k++) {
        double turn = -flux * ring->angle[k];
        ring->turned.value[k] = h->value[k] * CMPLX(cos(turn), sin(turn));
    }
}

static sv_status diagonalise(sv_context *context, int n, sv_complex *a, int stride, double *values)
{
    if (n == 0)
        return SV_OK;
    lapack_int info = LAPACKE_zheevd(LAPACK_COL_MAJOR, 'V', 'U', n, a, stride, values);
    return info == 0 ? SV_OK
                     : SV_FAIL(context, SV_NUMERICAL, "zheevd failed with code %d", (int)info);
}

/* vectors ← vectors · turn for m columns; `work` holds as many. */
static void rotate(sv_index n, int m, sv_complex *vectors, const sv_complex *turn, int stride,
                   sv_complex *work)
{
    const sv_complex one = 1.0, zero = 0.0;
    if (m == 0)
        return;
    cblas_zgemm(CblasColMajor, CblasNoTrans, CblasNoTrans, (int)n, m, m, &one, vectors, (int)n,
                turn, stride, &zero, work, (int)n);
    memcpy(vectors, work, (size_t)n * (size_t)m * sizeof *vectors);
}

/* Matrix of the weight near the hole between the levels. */
static void weight_matrix(const flow_ring *ring, const flow_levels *l, sv_complex *work,
                          sv_complex *ret_matrix)
{
    const sv_complex one = 1.0, zero = 0.0;
    sv_index n = ring->sample->n;
    for (int c = 0; c < l->count; c++)
        for (sv_index r = 0; r < n; r++)
            work[r + c * n] = ring->inner[r] ? l->vectors[r + c * n] : 0.0;
    cblas_zgemm(CblasColMajor, CblasConjTrans, CblasNoTrans, l->count, l->count, (int)n, &one,
                l->vectors, (int)n, work, (int)n, &zero, ret_matrix, l->count);
}

/* Energies within a part: diagonalises turn† E turn for columns first … first + m − 1 of `turn`. */
static sv_status part_energies(sv_context *context, flow_levels *l, const sv_complex *turn,
                               int first, int m, sv_complex *matrix, double *energies)
{
    int c = l->count;
    for (int a = 0; a < m; a++)
        for (int b = 0; b < m; b++) {
            sv_complex sum = 0.0;
            for (int k = 0; k < c; k++)
                sum += conj(turn[k + (first + a) * c]) * l->energies[k] * turn[k + (first + b) * c];
            matrix[a + b * m] = sum;
        }
    return diagonalise(context, m, matrix, m, energies);
}

/* How strongly each level is coupled to those of the other part. */
static void find_couplings(flow_levels *l, const sv_complex *turn)
{
    int c = l->count;
    double spacing = 2.0 * l->half_width / c;
    for (int a = 0; a < c; a++) {
        double sum = 0.0;
        for (int b = 0; b < c; b++) {
            sv_complex element = 0.0;
            if ((a < l->n_inner) == (b < l->n_inner))
                continue;
            for (int k = 0; k < c; k++)
                element += conj(turn[k + a * c]) * l->energies[k] * turn[k + b * c];
            sum += creal(element) * creal(element) + cimag(element) * cimag(element);
        }
        l->couplings[a] = sqrt(sum) / spacing;
    }
}

/* Splits the space of the levels by their weight near the hole. */
static sv_status split(sv_context *context, const flow_ring *ring, flow_levels *l)
{
    int c = l->count;
    sv_index n = ring->sample->n;
    sv_complex *work = NULL, *turn = NULL, *part = NULL;
    double *values = NULL, *energies = NULL;
    sv_status status;
    if (c <= 0)
        return SV_OK;
    if ((status = sv_take_raw(context, n * c, sizeof *work, &work)) != SV_OK ||
        (status = sv_take_raw(context, (sv_index)c * c, sizeof *turn, &turn)) != SV_OK ||
        (status = sv_take_raw(context, (sv_index)c * c, sizeof *part, &part)) != SV_OK ||
        (status = sv_take_raw(context, c, sizeof *energies, &energies)) != SV_OK ||
        (status = sv_take_raw(context, c, sizeof *values, &values)) != SV_OK)
        goto out;
    weight_matrix(ring, l, work, turn);
    for (int k = 0; k < c * c; k++) /* ascending values of −W: the hole comes first */
        turn[k] = -turn[k];
    if ((status = diagonalise(context, c, turn, c, values)) != SV_OK)
        goto out;
    while (l->n_inner < c && values[l->n_inner] < -0.5)
        l->n_inner++;
    rotate(n, c, l->vectors, turn, c, work);
    for (int first = 0; first < c; first = first == 0 && l->n_inner > 0 ? l->n_inner : c) {
        int m = first < l->n_inner ? l->n_inner : c - first;
        if ((status = part_energies(context, l, turn, first, m, part, energies + first)) != SV_OK)
            goto out;
        rotate(n, m, l->vectors + first * n, part, m, work);
        rotate(c, m, turn + first * c, part, m, work);
    }
    find_couplings(l, turn);
    memcpy(l->energies, energies, (size_t)c * sizeof *energies);
    weight_matrix(ring, l, work, part);
    for (int k = 0; k < c; k++)
        l->weights[k] = creal(part[k + k * c]);
out:
    sv_give(context, work);
    sv_give(context, turn);
    sv_give(context, part);
    sv_give(context, energies);
    sv_give(context, values);
    return status;
}

sv_status sv_flow_levels_find(sv_context *context, flow_ring *ring, double flux, double half_width,
                              flow_levels *ret_levels)
{
    sv_near_states near = {0};
    flow_levels l = {.flux = flux};
    double beside = 0.0;
    thread_flux(ring, flux);
    sv_status status =
        sv_near_states_find(context, &ring->turned, ring->energy, half_width, MOST_LEVELS, &near);
    /* A level on the Fermi energy spoils the inverse; beside it all is well. */
    if (status == SV_NOT_CONVERGED) {
        beside = BESIDE * half_width;
        status = sv_near_states_find(context, &ring->turned, ring->energy + beside, half_width,
                                     MOST_LEVELS, &near);
    }
    if (status != SV_OK)
        return status;
    l.count = near.count;
    l.half_width = near.half_width - beside;
    l.energies = near.energies;
    l.vectors = near.vectors;
    for (int k = 0; k < l.count; k++)
        l.energies[k] -= ring->energy;
    status = sv_take(context, l.count, sizeof *l.weights, &l.weights);
    if (status == SV_OK)
        status = sv_take(context, l.count, sizeof *l.couplings, &l.couplings);
    if (status == SV_OK)
        status = split(context, ring, &l);
    if (status == SV_OK)
        *ret_levels = l;
    else
        sv_flow_levels_free(context, &l);
    return status;
}

void sv_flow_levels_free(sv_context *context, flow_levels *levels)
{
    sv_give(context, levels->energies);
    sv_give(context, levels->weights);
    sv_give(context, levels->couplings);
    sv_give(context, levels->vectors);
    *levels = (flow_levels){0};
}
