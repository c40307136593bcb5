/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Window mean of the local Chern marker from vectors of random phases:
 * −(4π/A) Im⟨P D z|x Q y P z⟩, D the window and Q = 1 − P, whose mean over z is the sum over the
 * window. P x Q and Q y P are short-ranged, so its spread is far below that of P x P y P. */
#include "marker_internal.h"

#include <math.h>

enum { BLOCK = SV_PANEL_COLUMNS };

/* Allowance for what is not of first order in the error of P. */
static const double CAUTION = 1.5;

typedef struct vector_work {
    const sv_sample *sample;
    sv_projector *projector;
    const bool *inside; /* cells of the window */
    sv_index n;
    int count;
    sv_complex *x, *v, *d, *u, *q; /* n × BLOCK each */
} vector_work;

/* A vector and what P makes of it: the weight in states the engine does not resolve, its square. */
typedef struct weight {
    double unresolved[BLOCK], square[BLOCK];
} weight;

static const double *place(const vector_work *w, sv_index row)
{
    return w->sample->flake->sites[w->sample->pristine[row]].at;
}

/* A phase belongs to a position, the number of the row on it (adatoms share one) and the vector. */
static void fill_phases(vector_work *w, const sv_stream *stream, sv_index first)
{
    for (sv_index r = 0; r < w->n; r++) {
        sv_index site = w->sample->pristine[r];
        int32_t on_site = 0;
        while (r - on_site > 0 && w->sample->pristine[r - on_site - 1] == site)
            on_site++;
        for (int k = 0; k < w->count; k++) {
            double u = sv_stream_uniform(stream, (int32_t)site, on_site, (uint32_t)(first + k));
            w->x[r + k * w->n] = CMPLX(cos(2.0 * M_PI * u), sin(2.0 * M_PI * u));
        }
    }
}

/* to = P from, and how much of it the engine leaves open: ⟨u|P|u⟩ − ‖P u‖². */
static sv_status project(sv_context *context, const vector_work *w, const sv_complex *from,
                         sv_complex *to, weight *ret)
{
    sv_status status = sv_projector_apply(context, w->projector, w->count, from, to);
    for (int k = 0; k < w->count && status == SV_OK; k++) {
        double uu = 0.0, uv = 0.0, vv = 0.0;
        for (sv_index r = k * w->n; r < (k + 1) * w->n; r++) {
            uu += creal(from[r]) * creal(from[r]) + cimag(from[r]) * cimag(from[r]);
            uv += creal(from[r]) * creal(to[r]) + cimag(from[r]) * cimag(to[r]);
            vv += creal(to[r]) * creal(to[r]) + cimag(to[r]) * cimag(to[r]);
        }
        ret->unresolved[k] = fabs(uv - vv);
        ret->square[k] = uu;
    }
    return status;
}

/* to = (position along the axis from the middle of the flake) (a − b); b may be NULL. */
static void move(const vector_work *w, int axis, const sv_complex *a, const sv_complex *b,
                 sv_complex *to)
{
    for (sv_index r = 0; r < w->n; r++) {
        double at = place(w, r)[axis] - w->sample->flake->centre[axis];
        for (sv_index i = r; i < w->count * w->n; i += w->n)
            to[i] = at * (a[i] - (b != NULL ? b[i] : 0.0));
    }
}

/* Values of one block of vectors, sums over the window; the weights of z, D z and y P z. */
static sv_status evaluate(sv_context *context, vector_work *w, const sv_stream *stream,
                          sv_index first, double *ret_values, weight weights[3])
{
    sv_status status;
    fill_phases(w, stream, first);
    if ((status = project(context, w, w->x, w->v, &weights[0])) != SV_OK)
        return status;
    for (sv_index r = 0; r < w->n; r++)
        if (!w->inside[w->sample->flake->sites[w->sample->pristine[r]].cell])
            for (int k = 0; k < w->count; k++)
                w->x[r + k * w->n] = 0.0;
    if ((status = project(context, w, w->x, w->d, &weights[1])) != SV_OK)
        return status;
    move(w, 1, w->v, NULL, w->u);
    if ((status = project(context, w, w->u, w->q, &weights[2])) != SV_OK)
        return status;
    move(w, 0, w->u, w->q, w->v); /* x Q y P z */
    for (int k = 0; k < w->count; k++) {
        double sum = 0.0;
        for (sv_index i = k * w->n; i < (k + 1) * w->n; i++)
            sum += creal(w->d[i]) * cimag(w->v[i]) - cimag(w->d[i]) * creal(w->v[i]);
        ret_values[k] = -sum;
    }
    return SV_OK;
}

static double pair_bound(const weight *a, const weight *b, double eta, int count)
{
    double sum = 0.0;
    for (int k = 0; k < count; k++)
        sum += 2.0 * sqrt(a->unresolved[k] * b->unresolved[k]) +
               eta * sqrt(a->square[k] * b->square[k]);
    return sum;
}

/*
 * First-order bound of the error of a block, as in chern_check.c: an error δ of P, with |δ_n| ≤
 * 2 p_n(1 − p_n), enters as ⟨D z|δ|x Q y P z⟩, ⟨x P D z|δ|y P z⟩ and ⟨y Q x P D z|δ|z⟩. Covers the
 * levels not resolved in the window and, through the last two, those at the edge.
 */
static sv_status bound_block(sv_context *context, vector_work *w, const weight weights[3],
                             double *ret_bound)
{
    weight a, b, c;
    sv_status status;
    if ((status = project(context, w, w->v, w->q, &a)) != SV_OK)
        return status;
    move(w, 0, w->d, NULL, w->x);
    if ((status = project(context, w, w->x, w->q, &b)) != SV_OK)
        return status;
    move(w, 1, w->x, w->q, w->u);
    if ((status = project(context, w, w->u, w->q, &c)) != SV_OK)
        return status;
    double eta = sv_projector_uniform_error(w->projector);
    double sum = pair_bound(&weights[1], &a, eta, w->count) +
                 pair_bound(&b, &weights[2], eta, w->count) +
                 pair_bound(&c, &weights[0], eta, w->count);
    *ret_bound = CAUTION * sum / w->count;
    return SV_OK;
}

/* Mean and standard error of the values, per cell of the window. */
static void reduce(const double *values, sv_index n, double unit, sv_outcome *outcome)
{
    double sum = 0.0, squares = 0.0;
    for (sv_index k = 0; k < n; k++)
        sum += values[k];
    double mean = sum / (double)n;
    for (sv_index k = 0; k < n; k++)
        squares += (values[k] - mean) * (values[k] - mean);
    outcome->value = unit * mean;
    outcome->estimator_error = unit * sqrt(squares / ((double)n * (double)(n - 1)));
}

sv_status sv_chern_vectors(sv_context *context, const sv_marker_input *input, const bool *inside,
                           sv_index cells, sv_outcome *outcome)
{
    vector_work w = {.sample = input->sample,
                     .projector = input->projector,
                     .inside = inside,
                     .n = input->sample->n};
    sv_stream stream = sv_stream_make(input->seed, "window vectors", input->realisation);
    sv_index total = input->sampled_vectors < 4 ? 4 : input->sampled_vectors;
    double *values = NULL, bound = 0.0;
    sv_status status = sv_take(context, total, sizeof *values, &values);
    if (status == SV_OK)
        status = sv_take_raw(context, 5 * BLOCK * w.n, sizeof *w.x, &w.x);
    if (status != SV_OK)
        goto out;
    w.v = w.x + BLOCK * w.n;
    w.d = w.v + BLOCK * w.n;
    w.u = w.d + BLOCK * w.n;
    w.q = w.u + BLOCK * w.n;
    for (sv_index first = 0; first < total && status == SV_OK; first += BLOCK) {
        weight weights[3];
        w.count = (int)(total - first < BLOCK ? total - first : BLOCK);
        status = evaluate(context, &w, &stream, first, values + first, weights);
        if (status == SV_OK && first == 0)
            status = bound_block(context, &w, weights, &bound);
    }
    if (status != SV_OK)
        goto out;
    double unit = 4.0 * M_PI / sv_model_cell_area(w.sample->flake->model) / (double)cells;
    reduce(values, total, unit, outcome);
    outcome->numerical_error = unit * bound;
out:
    sv_give(context, values);
    sv_give(context, w.x);
    return status;
}
