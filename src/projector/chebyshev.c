/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The Chebyshev engine: P ≈ p(H) with a near-best polynomial of the occupation step. Levels too
 * near to the Fermi energy for the polynomial can be computed one by one and put right:
 * P = p(H) + Σ (θ_n − p(E_n)) |n⟩⟨n|. */
#include "projector_internal.h"

#include <cblas.h>
#include <float.h>
#include <math.h>
#include <string.h>

/* Sites up to which states are counted at a given Fermi energy. */
static const sv_index COUNTED_LARGEST = 50000;

/* Rows: above, bounding the spectrum costs more than the degrees it saves, since the columns of
 * large flakes are sampled and work on parts. */
static const sv_index LANCZOS_LARGEST = 50000;

typedef struct chebyshev_state {
    sv_packed packed; /* (H − E_F)/scale; empty when only parts are used */
    double *coefficients;
    bool shared_coefficients; /* of a part: they belong to the whole */
    int degree;
    double energy, scale;
    sv_panel_kernel kernel;
    bool may_be_single; /* the matrix is there in single precision too */
    bool single;        /* now: panels hold floats, twice as many columns */
    double *panels;     /* four panels: x, two of work, y */
    sv_near_states near;
    double *correction; /* θ_n − p(E_n) of the near states */
} chebyshev_state;

static void chebyshev_free(sv_context *context, void *state)
{
    chebyshev_state *s = state;
    if (s == NULL)
        return;
    sv_packed_free(context, &s->packed);
    if (!s->shared_coefficients)
        sv_give(context, s->coefficients);
    sv_give(context, s->panels);
    sv_give(context, s->correction);
    sv_near_states_free(context, &s->near);
    sv_give(context, s);
}

/* y += Σ (θ_n − p(E_n)) |n⟩⟨n|x⟩ */
static sv_status correct(sv_context *context, const chebyshev_state *s, sv_index columns,
                         const sv_complex *x, sv_complex *y)
{
    const sv_complex one = 1.0, zero = 0.0;
    int n = (int)s->packed.n, m = s->near.count, k = (int)columns;
    sv_complex *overlap = NULL;
    if (m == 0)
        return SV_OK;
    sv_status status = sv_take_raw(context, m * columns, sizeof *overlap, &overlap);
    if (status != SV_OK)
        return status;
    cblas_zgemm(CblasColMajor, CblasConjTrans, CblasNoTrans, m, k, n, &one, s->near.vectors, n, x,
                n, &zero, overlap, m);
    for (int c = 0; c < k; c++)
        for (int l = 0; l < m; l++)
            overlap[l + (sv_index)c * m] *= s->correction[l];
    cblas_zgemm(CblasColMajor, CblasNoTrans, CblasNoTrans, n, k, m, &one, s->near.vectors, n,
                overlap, m, &one, y, n);
    sv_give(context, overlap);
    return SV_OK;
}

/* y = p(H) x for at most a panel of columns. */
static void apply_panel(chebyshev_state *s, sv_index columns, const sv_complex *x, sv_complex *y)
{
    sv_index n = s->packed.n;
    if (s->single) {
        sv_index panel = 2 * SV_PANEL_COLUMNS_SINGLE * n;
        float *in = (float *)s->panels, *work = in + panel, *out = work + 2 * panel;
        sv_columns_to_panel_single(in, n, x, columns);
        sv_panel_polynomial_single(&s->packed, s->coefficients, s->degree, s->kernel, in, work,
                                   out);
        sv_panel_to_columns_single(out, n, y, columns);
    } else {
        sv_index panel = 2 * SV_PANEL_COLUMNS * n;
        double *in = s->panels, *work = in + panel, *out = work + 2 * panel;
        sv_columns_to_panel(in, n, x, columns);
        sv_panel_polynomial(&s->packed, s->coefficients, s->degree, s->kernel, in, work, out);
        sv_panel_to_columns(out, n, y, columns);
    }
}

static sv_status chebyshev_apply(sv_context *context, void *state, sv_index columns,
                                 const sv_complex *x, sv_complex *y)
{
    chebyshev_state *s = state;
    if (s->panels == NULL)
        return SV_FAIL(context, SV_INTERNAL, "a projector made for parts is applied whole");
    sv_index n = s->packed.n, most = s->single ? SV_PANEL_COLUMNS_SINGLE : SV_PANEL_COLUMNS;
    for (sv_index first = 0; first < columns; first += most) {
        sv_index width = columns - first < most ? columns - first : most;
        if (sv_cancelled(context))
            return SV_FAIL(context, SV_INTERRUPTED, "stopped during a projection");
        apply_panel(s, width, x + first * n, y + first * n);
        sv_status status = correct(context, s, width, x + first * n, y + first * n);
        if (status != SV_OK)
            return status;
    }
    return SV_OK;
}

static sv_basis chebyshev_basis(const void *state)
{
    (void)state;
    return (sv_basis){.available = false};
}

/* Matrix and panels for the given rows (NULL: all). */
static sv_status set_matrix(sv_context *context, const sv_sparse *h, const sv_index *rows,
                            sv_index n, const int32_t *place, chebyshev_state *s)
{
    sv_status status = sv_packed_make(context, h, rows, n, place, s->energy, s->scale, &s->packed);
    if (status == SV_OK && s->may_be_single)
        status = sv_packed_add_single(context, &s->packed);
    if (status != SV_OK)
        return status;
    return sv_take_raw(context, 8 * SV_PANEL_COLUMNS * n, sizeof *s->panels, &s->panels);
}

static sv_status chebyshev_restrict(sv_context *context, const sv_projector *projector,
                                    const sv_index *rows, sv_index n_rows, const int32_t *place,
                                    void **ret_state)
{
    const chebyshev_state *whole = projector->state;
    chebyshev_state *part = NULL;
    sv_status status = sv_take(context, 1, sizeof *part, &part);
    if (status != SV_OK)
        return status;
    *part = (chebyshev_state){.coefficients = whole->coefficients,
                              .shared_coefficients = true,
                              .degree = whole->degree,
                              .energy = whole->energy,
                              .scale = whole->scale,
                              .may_be_single = whole->single,
                              .single = whole->single,
                              .kernel = whole->kernel};
    status = set_matrix(context, &projector->sample->hamiltonian, rows, n_rows, place, part);
    if (status == SV_OK)
        *ret_state = part;
    else
        chebyshev_free(context, part);
    return status;
}

/* Panels are as large in both precisions; the matrix is there in double always. */
static bool chebyshev_set_single(void *state, bool single)
{
    chebyshev_state *s = state;
    if (!s->may_be_single)
        return false;
    s->single = single;
    return true;
}

static bool chebyshev_is_single(const void *state)
{
    return ((const chebyshev_state *)state)->single;
}

static int chebyshev_degree(const void *state)
{
    return ((const chebyshev_state *)state)->degree;
}

static const engine_class chebyshev_class = {.name = "chebyshev",
                                             .free = chebyshev_free,
                                             .apply = chebyshev_apply,
                                             .basis = chebyshev_basis,
                                             .set_single = chebyshev_set_single,
                                             .is_single = chebyshev_is_single,
                                             .degree = chebyshev_degree,
                                             .restrict_to = chebyshev_restrict};

/* Gap and degree in units of the half width of the spectrum about the Fermi energy. */
static sv_status set_polynomial(sv_context *context, const sv_projector_options *options,
                                double scale, chebyshev_state *s)
{
    double delta = options->half_gap / scale;
    if (!(delta > 0.0))
        return SV_FAIL(context, SV_INVALID_INPUT, "the chebyshev engine needs a gap to resolve");
    delta = fmin(delta, 0.9);
    s->degree =
        options->degree > 0 ? options->degree : sv_step_degree(delta, 0.01 * options->accuracy);
    sv_status status = sv_take(context, s->degree + 1, sizeof *s->coefficients, &s->coefficients);
    return status == SV_OK ? sv_step_polynomial(context, delta, s->degree, s->coefficients)
                           : status;
}

/* p(E) by Clenshaw's recurrence. */
static double polynomial_at(const chebyshev_state *s, double energy)
{
    double t = (energy - s->energy) / s->scale, b1 = 0.0, b2 = 0.0;
    for (int k = s->degree; k >= 1; k--) {
        double b0 = 2.0 * t * b1 - b2 + s->coefficients[k];
        b2 = b1;
        b1 = b0;
    }
    return t * b1 - b2 + s->coefficients[0];
}

/* Notes the level of a near state: nearest ones, and whether it sits on the Fermi energy. */
static void note_level(sv_levels *levels, double energy)
{
    if (fabs(energy - levels->fermi_energy) <= levels->resolution)
        levels->on_level = true;
    if (energy < levels->fermi_energy) {
        if (!levels->has_highest || energy > levels->highest_occupied)
            levels->highest_occupied = energy;
        levels->has_highest = true;
    } else {
        if (!levels->has_lowest || energy < levels->lowest_empty)
            levels->lowest_empty = energy;
        levels->has_lowest = true;
    }
}

static sv_status set_near_states(sv_context *context, const sv_sample *sample,
                                 const sv_projector_options *options, chebyshev_state *s,
                                 sv_levels *levels)
{
    /* A little off the Fermi energy, so that a level exactly there does not spoil the inverse. */
    double shift = s->energy + 0.0137 * options->half_gap;
    sv_status status =
        sv_near_states_find(context, &sample->hamiltonian, shift, 1.02 * options->half_gap,
                            options->near_states, &s->near);
    if (status == SV_OK)
        status = sv_take(context, s->near.count, sizeof *s->correction, &s->correction);
    for (int k = 0; k < s->near.count && status == SV_OK; k++) {
        double energy = s->near.energies[k];
        s->correction[k] = (energy < s->energy ? 1.0 : 0.0) - polynomial_at(s, energy);
        note_level(levels, energy);
    }
    levels->resolved_from = 0.0;
    return status;
}

/*
 * Fermi energy and what is known of the levels around it. A filling becomes an energy in the middle
 * of the gap by counting states. With an energy the count tells whether a level sits on it, which
 * the polynomial would not notice; near states computed one by one tell as well.
 */
static sv_status set_levels(sv_context *context, const sv_sample *sample,
                            const sv_occupation *occupation, const sv_projector_options *options,
                            sv_levels *levels)
{
    bool one_by_one = options->near_states > 0 && options->reach <= 0.0;
    bool unknown = one_by_one || options->trial || sample->n > COUNTED_LARGEST;
    *levels = (sv_levels){.occupied = -1,
                          .fermi_energy = occupation->fermi_energy,
                          .resolution = sv_levels_resolution(&sample->hamiltonian)};
    sv_status status = SV_OK;
    if (occupation->by != SV_BY_ENERGY || !unknown)
        status = sv_levels_find(context, sample, occupation, 1e-3, levels);
    levels->resolved_from = options->half_gap;
    return status;
}

sv_status sv_projector_scale(sv_context *context, const sv_sparse *h, double energy,
                             double *ret_scale)
{
    double bounds[2], scale = sv_sparse_norm_bound(h) + fabs(energy);
    if (h->n > 0 && h->n <= LANCZOS_LARGEST) {
        sv_status status = sv_spectral_bounds(context, h, bounds);
        if (status != SV_OK)
            return status;
        scale = fmin(scale, fmax(bounds[1] - energy, energy - bounds[0]));
    }
    /* The margin keeps |T_k| ≤ 1 under rounding; a scale of 0 is a matrix of zeros. */
    *ret_scale = 1.0001 * fmax(scale, DBL_MIN);
    return SV_OK;
}

sv_status sv_chebyshev_engine_make(sv_context *context, const sv_sample *sample,
                                   const sv_occupation *occupation,
                                   const sv_projector_options *options, sv_projector *projector)
{
    chebyshev_state *s = NULL;
    sv_index n = sample->n;
    sv_status status;
    sv_levels levels;
    if ((status = set_levels(context, sample, occupation, options, &levels)) != SV_OK ||
        (status = sv_take(context, 1, sizeof *s, &s)) != SV_OK)
        return status;
    s->energy = levels.fermi_energy;
    s->kernel = sv_panel_best_kernel();
    s->may_be_single = s->single = options->single;
    status = sv_projector_scale(context, &sample->hamiltonian, s->energy, &s->scale);
    if (status == SV_OK)
        status = set_polynomial(context, options, s->scale, s);
    /* Parts bring their own matrix; the whole one would only cost memory. */
    if (status == SV_OK && (options->reach <= 0.0 || options->sampled_vectors > 0))
        status = set_matrix(context, &sample->hamiltonian, NULL, n, NULL, s);
    if (status == SV_OK && options->near_states > 0 && options->reach <= 0.0)
        status = set_near_states(context, sample, options, s, &levels);
    if (status != SV_OK) {
        chebyshev_free(context, s);
        return status;
    }
    projector->engine = &chebyshev_class;
    projector->state = s;
    projector->levels = levels;
    return SV_OK;
}
