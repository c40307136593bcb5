/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The rational engine: P = (1 − sign(H − E_F))/2 by Zolotarev's approximation, sharp down to the
 * level next to the Fermi energy, which inertia finds. The cost grows with the logarithm of its
 * distance only. */
#include "rational_internal.h"

#include <float.h>
#include <math.h>

/* Levels nearer to the Fermi energy than this share of the spectrum are not resolved by default:
 * below, rounding in the square of H takes over. */
static const double SMALLEST_GAP = 1e-7;

static void rational_free(sv_context *context, void *state)
{
    rational_state *s = state;
    if (s == NULL)
        return;
    sv_definite_free(context, s->factors);
    sv_packed_free(context, &s->packed);
    sv_give(context, s->panels);
    sv_give(context, s->work);
    sv_give(context, s);
}

static sv_basis rational_basis(const void *state)
{
    (void)state;
    return (sv_basis){.available = false};
}

static double rational_error(const void *state)
{
    const rational_state *s = state;
    return 0.5 * s->sign.error + s->rounding;
}

static const engine_class rational_class = {.name = "rational",
                                            .free = rational_free,
                                            .apply = sv_rational_apply,
                                            .basis = rational_basis,
                                            .uniform_error = rational_error};

/* Scale and approximation for what was asked and what the levels need. */
static sv_status set_sign(sv_context *context, const sv_projector_options *options,
                          sv_levels *levels, rational_state *s)
{
    s->energy = levels->fermi_energy;
    /* Gershgorin holds for every sample. */
    s->scale = 1.0001 * (sv_sparse_norm_bound(s->h) + fabs(s->energy));
    if (!(s->scale > 0.0)) /* a matrix of zeros */
        s->scale = 1.0;
    double distance = sv_levels_distance(levels);
    levels->on_level = levels->on_level || distance <= levels->resolution;
    s->nearest = levels->on_level ? 0.0 : 0.5 * fmin(distance / s->scale, 1.0);
    double delta = options->half_gap > 0.0 ? options->half_gap / s->scale
                                           : fmax(SMALLEST_GAP, 0.5 * s->nearest);
    delta = fmin(delta, 0.9);
    levels->resolved_from = delta * s->scale;
    double error = fmax(0.02 * options->accuracy, 1e-14);
    s->tolerance = fmax(0.01 * error, 1e-13);
    return sv_zolotarev_make(context, delta, sv_zolotarev_terms(delta, error), &s->sign);
}

/*
 * Factors A² + s² for every pole. Rounding in A² can spoil positive definiteness when a level and
 * the pole are very close to zero; a little more on the diagonal helps, and refinement puts the
 * solution right.
 */
static sv_status set_factors(sv_context *context, rational_state *s)
{
    sv_sparse square = {0};
    sv_status status = sv_sparse_square(context, s->h, s->energy, s->scale, &square);
    if (status == SV_OK)
        status = sv_definite_make(context, &square, s->sign.terms, &s->factors);
    sv_sparse_free(context, &square);
    double limit = sv_rational_refined_below(s->tolerance);
    for (int j = 0; j < s->sign.terms && status == SV_OK; j++) {
        double pole = s->sign.pole[j], extra = 8.0 * DBL_EPSILON;
        s->refined += pole < limit;
        if (sv_cancelled(context))
            return SV_FAIL(context, SV_INTERRUPTED, "stopped during a factorisation");
        status = sv_definite_factor(context, s->factors, j, pole * pole);
        for (; status == SV_NUMERICAL && pole < limit && extra < 1e-12; extra *= 4.0)
            status = sv_definite_factor(context, s->factors, j, pole * pole + extra);
    }
    return status;
}

/* A packed for products, and the blocks they need. */
static sv_status set_work(sv_context *context, rational_state *s)
{
    sv_index n = s->h->n;
    s->kernel = sv_panel_best_kernel();
    sv_status status =
        sv_packed_make(context, s->h, NULL, n, NULL, s->energy, s->scale, &s->packed);
    if (status == SV_OK)
        status = sv_take_raw(context, 8 * SV_PANEL_COLUMNS * n, sizeof *s->panels, &s->panels);
    if (status == SV_OK)
        status = sv_take_raw(context, 7 * SV_RATIONAL_WIDTH * n, sizeof *s->work, &s->work);
    return status;
}

sv_status sv_rational_engine_make(sv_context *context, const sv_sample *sample,
                                  const sv_occupation *occupation,
                                  const sv_projector_options *options, sv_projector *projector)
{
    rational_state *s = NULL;
    sv_levels levels;
    sv_status status;
    if ((status = sv_take(context, 1, sizeof *s, &s)) != SV_OK)
        return status;
    s->h = &sample->hamiltonian;
    if ((status = sv_levels_find(context, sample, occupation, 1e-6, &levels)) != SV_OK ||
        (status = set_sign(context, options, &levels, s)) != SV_OK ||
        (status = set_factors(context, s)) != SV_OK || (status = set_work(context, s)) != SV_OK) {
        rational_free(context, s);
        return status;
    }
    projector->engine = &rational_class;
    projector->state = s;
    projector->levels = levels;
    return SV_OK;
}
