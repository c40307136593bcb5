/* SPDX-License-Identifier: GPL-3.0-or-later */
/* An orthonormal basis of the occupied space without eigenvectors: the number of states from
 * inertia, columns of the projector from the Chebyshev engine, orthonormalised by Cholesky. The
 * result is checked; what fails is left to the dense engine. */
#include "projector_internal.h"

#include <cblas.h>
#include <math.h>

static const double POLYNOMIAL_ERROR = 1e-11;
static const double LEAST_GAP = 1e-10; /* of the norm: nearer levels are the dense engine's */
static const double MOST_DEFECT = 1e-8;
static const double EASY_DEGREE = 400.0;
static const int NEAR_STATES = 160;

typedef struct basis_state {
    sv_index n, m;
    sv_complex *vectors; /* n × m */
} basis_state;

static void basis_free(sv_context *context, void *state)
{
    basis_state *s = state;
    if (s != NULL)
        sv_give(context, s->vectors);
    sv_give(context, s);
}

/* y = Ψ Ψ† x */
static sv_status basis_apply(sv_context *context, void *state, sv_index columns,
                             const sv_complex *x, sv_complex *y)
{
    const basis_state *s = state;
    const sv_complex one = 1.0, zero = 0.0;
    int n = (int)s->n, m = (int)s->m, k = (int)columns;
    sv_complex *overlap = NULL;
    sv_status status = sv_take_raw(context, s->m * columns, sizeof *overlap, &overlap);
    if (status != SV_OK)
        return status;
    cblas_zgemm(CblasColMajor, CblasConjTrans, CblasNoTrans, m, k, n, &one, s->vectors, n, x, n,
                &zero, overlap, m);
    cblas_zgemm(CblasColMajor, CblasNoTrans, CblasNoTrans, n, k, m, &one, s->vectors, n, overlap, m,
                &zero, y, n);
    sv_give(context, overlap);
    return SV_OK;
}

static sv_basis basis_basis(const void *state)
{
    const basis_state *s = state;
    return (sv_basis){true, false, s->n, s->m, s->vectors};
}

static const engine_class basis_class = {
    .name = "chebyshev", .free = basis_free, .apply = basis_apply, .basis = basis_basis};

/* ------------------------------------------------------------------ levels */

/* Number of states and the levels next to the Fermi energy, without eigenvectors. */
static sv_status find_levels(sv_context *context, const sv_sample *sample,
                             const sv_occupation *occupation, sv_levels *levels, bool *ret_known)
{
    const sv_sparse *h = &sample->hamiltonian;
    sv_inertia_plan *plan = NULL;
    sv_inertia_count count;
    sv_inertia inertia;
    sv_inertia_levels near;
    double energy = occupation->fermi_energy;
    sv_status status = sv_inertia_plan_make(context, h, 1, &plan);
    if (status == SV_OK && occupation->by != SV_BY_ENERGY) {
        sv_fermi_level fermi;
        int64_t electrons = sv_occupation_electrons(occupation, sample->n);
        status = sv_inertia_fermi_energy(context, plan, h, electrons, &fermi);
        if (status == SV_OK)
            energy = fermi.energy;
    }
    if (status == SV_OK)
        status = sv_inertia_count_below(context, plan, h, energy, &count);
    if (status == SV_OK)
        status = sv_inertia_factor(context, plan, h, energy, &inertia);
    if (status == SV_OK)
        status = sv_inertia_levels_near(context, plan, &inertia, energy, 1e-10, NAN, &near);
    sv_inertia_plan_free(context, plan);
    if (status != SV_OK)
        return status;
    *levels = (sv_levels){.occupied = count.below,
                          .has_highest = isfinite(near.below),
                          .has_lowest = isfinite(near.above),
                          .highest_occupied = near.below,
                          .lowest_empty = near.above,
                          .fermi_energy = energy,
                          .resolution = count.width};
    *ret_known = count.decided && levels->has_highest && levels->has_lowest &&
                 levels->occupied > 0 && levels->occupied < sample->n &&
                 (occupation->by == SV_BY_ENERGY ||
                  levels->occupied == sv_occupation_electrons(occupation, sample->n));
    return SV_OK;
}

/* ------------------------------------------------------------------ filter */

/* Highest degree that still beats a diagonalisation, by the costs of plan.c (for large samples). */
static double highest_degree(sv_index n)
{
    return fmin(fmax(0.6 * (double)n, 500.0), 4001.0);
}

/* Half width of the interval the polynomial need not resolve, and whether levels inside are to be
 * computed one by one. */
static sv_status choose_gap(sv_context *context, const sv_sample *sample, const sv_levels *levels,
                            sv_projector_options *o, bool *ret_feasible)
{
    const sv_sparse *h = &sample->hamiltonian;
    double energy = levels->fermi_energy;
    double scale;
    sv_status status = sv_projector_scale(context, h, energy, &scale);
    if (status != SV_OK)
        return status;
    double gap = 0.999 * fmin(energy - levels->highest_occupied, levels->lowest_empty - energy);
    sv_near_states near = {0};
    *ret_feasible = gap > LEAST_GAP * scale;
    if (!*ret_feasible)
        return SV_OK;
    double degree = sv_step_degree(fmin(gap / scale, 0.9), POLYNOMIAL_ERROR);
    double easy = fmin(EASY_DEGREE, highest_degree(sample->n));
    o->half_gap = gap;
    o->near_states = 0;
    if (degree <= easy)
        return SV_OK;
    /* tanh: δ for which ((1+δ)/(1−δ))^(−(degree+1)/2) is the error wanted. */
    double width = scale * tanh(-log(POLYNOMIAL_ERROR) / (easy + 1.0));
    status = sv_near_states_find(context, h, energy + 1e-4 * gap, 1.06 * width, NEAR_STATES, &near);
    o->half_gap = near.half_width / 1.06;
    o->near_states = 2 * NEAR_STATES;
    sv_near_states_free(context, &near);
    if (status == SV_OK)
        *ret_feasible = sv_step_degree(fmin(o->half_gap / scale, 0.9), POLYNOMIAL_ERROR) <=
                        highest_degree(sample->n);
    return status;
}

static sv_status make_filter(sv_context *context, const sv_sample *sample,
                             const sv_projector_options *options, const sv_levels *levels,
                             sv_projector *filter, bool *ret_feasible)
{
    sv_projector_options o = *options;
    sv_occupation fixed = {.by = SV_BY_ENERGY, .fermi_energy = levels->fermi_energy};
    o.accuracy = 100.0 * POLYNOMIAL_ERROR; /* the engine takes a hundredth */
    o.degree = 0;
    o.reach = 0.0;
    o.trial = true; /* states are counted already */
    sv_status status = choose_gap(context, sample, levels, &o, ret_feasible);
    if (status != SV_OK || !*ret_feasible)
        return status;
    *filter = (sv_projector){.sample = sample, .n = sample->n};
    return sv_chebyshev_engine_make(context, sample, &fixed, &o, filter);
}

/* Largest of ‖Px − ΨΨ†x‖, ‖P²x − Px‖ and ‖ΨΨ†Px − ΨΨ†x‖ over random x of norm 1: the right space,
 * a projector, orthonormal. */
static sv_status check_basis(sv_context *context, sv_projector *filter, basis_state *b,
                             double *ret_defect)
{
    const sv_index n = b->n, block = n * SV_PANEL_COLUMNS;
    sv_complex *x = NULL;
    sv_status status = sv_take_raw(context, 5 * block, sizeof *x, &x);
    if (status != SV_OK)
        return status;
    sv_complex *px = x + block, *ppx = px + block, *bx = ppx + block, *bbx = bx + block;
    sv_stream stream = sv_stream_make(1, "occupied basis", 0);
    for (sv_index e = 0; e < block; e++) {
        double angle = 2.0 * M_PI * sv_stream_uniform(&stream, (int32_t)e, 0, 0);
        x[e] = CMPLX(cos(angle), sin(angle)) / sqrt((double)n);
    }
    if ((status = sv_projector_apply(context, filter, SV_PANEL_COLUMNS, x, px)) == SV_OK &&
        (status = sv_projector_apply(context, filter, SV_PANEL_COLUMNS, px, ppx)) == SV_OK &&
        (status = basis_apply(context, b, SV_PANEL_COLUMNS, x, bx)) == SV_OK)
        status = basis_apply(context, b, SV_PANEL_COLUMNS, bx, bbx);
    double sums[3] = {0.0, 0.0, 0.0};
    for (sv_index e = 0; e < block && status == SV_OK; e++) {
        sums[0] += pow(cabs(px[e] - bx[e]), 2.0);
        sums[1] += pow(cabs(ppx[e] - px[e]), 2.0);
        sums[2] += pow(cabs(bbx[e] - bx[e]), 2.0);
    }
    *ret_defect = sqrt(fmax(fmax(sums[0], sums[1]), sums[2]) / SV_PANEL_COLUMNS);
    sv_give(context, x);
    return status;
}

/* One try with s sites; SV_NUMERICAL when it does not give a good basis. */
static sv_status try_sites(sv_context *context, const sv_sample *sample, sv_projector *filter,
                           sv_index m, sv_index s, basis_state **ret_state)
{
    basis_state *b = NULL;
    double defect = INFINITY;
    sv_status status = sv_take(context, 1, sizeof *b, &b);
    if (status != SV_OK)
        return status;
    b->n = sample->n;
    b->m = m;
    if ((status = sv_occupied_columns(context, sample, filter, m, s, &b->vectors)) == SV_OK)
        status = check_basis(context, filter, b, &defect);
    if (status == SV_OK && !(defect <= MOST_DEFECT))
        status =
            SV_FAIL(context, SV_NUMERICAL, "a basis of the occupied space is off by %.1e", defect);
    if (status == SV_OK)
        *ret_state = b;
    else
        basis_free(context, b);
    return status;
}

/* What this way cannot do, others may. */
static bool is_refusal(sv_status status)
{
    return status == SV_NUMERICAL || status == SV_NOT_CONVERGED || status == SV_UNDEFINED;
}

sv_status sv_occupied_basis_make(sv_context *context, const sv_sample *sample,
                                 const sv_occupation *occupation,
                                 const sv_projector_options *options, sv_projector *projector,
                                 bool *ret_made)
{
    sv_projector filter = {0};
    basis_state *state = NULL;
    sv_levels levels;
    bool known = false, feasible = false;
    sv_status status = find_levels(context, sample, occupation, &levels, &known);
    if (status == SV_OK && known)
        status = make_filter(context, sample, options, &levels, &filter, &feasible);
    if (status == SV_OK && feasible) {
        /* An eighth more sites than states, or all. */
        sv_index m = levels.occupied, s = m + m / 8 + 8;
        s = s < sample->n ? s : sample->n;
        status = try_sites(context, sample, &filter, m, s, &state);
        if (status == SV_NUMERICAL && s < sample->n)
            status = try_sites(context, sample, &filter, m, sample->n, &state);
    }
    if (filter.engine != NULL)
        filter.engine->free(context, filter.state);
    if (status != SV_OK && !is_refusal(status))
        return status;
    *ret_made = status == SV_OK && state != NULL;
    if (*ret_made) {
        projector->engine = &basis_class;
        projector->state = state;
        projector->levels = levels;
    }
    return SV_OK;
}
