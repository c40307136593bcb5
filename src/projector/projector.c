/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "projector_internal.h"

#include <math.h>

static const sv_index DENSE_FALLBACK_LARGEST = 12000; /* sites */

sv_projector_options sv_projector_options_default(void)
{
    return (sv_projector_options){.size = sizeof(sv_projector_options), .accuracy = 1e-6};
}

static sv_status make_engine(sv_context *context, const sv_sample *sample,
                             const sv_occupation *occupation, const sv_projector_options *options,
                             sv_projector *projector)
{
    sv_status status;
    bool made = false;
    if (options->engine == SV_ENGINE_RATIONAL)
        return sv_rational_engine_make(context, sample, occupation, options, projector);
    if (options->engine == SV_ENGINE_CHEBYSHEV && options->occupied_basis) {
        status = sv_occupied_basis_make(context, sample, occupation, options, projector, &made);
        if (status != SV_OK || made)
            return status;
    } else if (options->engine == SV_ENGINE_CHEBYSHEV) {
        status = sv_chebyshev_engine_make(context, sample, occupation, options, projector);
        /* Levels that refuse to converge one by one: the exact engine, while it can be afforded. */
        if (status != SV_NOT_CONVERGED || sample->n > DENSE_FALLBACK_LARGEST)
            return status;
    }
    return sv_dense_engine_make(context, sample, occupation, options, projector);
}

sv_status sv_projector_make(sv_context *context, const sv_sample *sample,
                            const sv_occupation *occupation, const sv_projector_options *options,
                            sv_projector **ret_projector)
{
    sv_projector *projector = NULL;
    sv_status status = sv_take(context, 1, sizeof *projector, &projector);
    if (status != SV_OK)
        return status;
    projector->sample = sample;
    projector->n = sample->n;
    projector->reach = options->reach;
    status = make_engine(context, sample, occupation, options, projector);
    if (status != SV_OK) {
        sv_give(context, projector);
        return status;
    }
    sv_levels *levels = &projector->levels;
    levels->by_count = occupation->by != SV_BY_ENERGY;
    levels->gap_resolved =
        levels->resolved_from <= 0.0 || ((levels->has_highest || levels->has_lowest) &&
                                         sv_levels_distance(levels) >= levels->resolved_from);
    *ret_projector = projector;
    return SV_OK;
}

void sv_projector_free(sv_context *context, sv_projector *projector)
{
    if (projector == NULL)
        return;
    projector->engine->free(context, projector->state);
    sv_give(context, projector);
}

const sv_levels *sv_projector_levels(const sv_projector *projector)
{
    return &projector->levels;
}

const char *sv_projector_engine(const sv_projector *projector)
{
    return projector->engine->name;
}

int sv_projector_degree(const sv_projector *projector)
{
    return projector->engine->degree != NULL ? projector->engine->degree(projector->state) : 0;
}

sv_status sv_projector_apply(sv_context *context, sv_projector *projector, sv_index columns,
                             const sv_complex *x, sv_complex *y)
{
    return projector->engine->apply(context, projector->state, columns, x, y);
}

double sv_projector_reach(const sv_projector *projector)
{
    return projector->engine->restrict_to != NULL ? projector->reach : 0.0;
}

bool sv_projector_set_single(sv_projector *projector, bool single)
{
    return projector->engine->set_single != NULL &&
           projector->engine->set_single(projector->state, single);
}

bool sv_projector_single(const sv_projector *projector)
{
    return projector->engine->is_single != NULL && projector->engine->is_single(projector->state);
}

double sv_projector_uniform_error(const sv_projector *projector)
{
    const engine_class *engine = projector->engine;
    return engine->uniform_error != NULL ? engine->uniform_error(projector->state) : 0.0;
}

sv_status sv_projector_restrict(sv_context *context, const sv_projector *projector,
                                const sv_index *rows, sv_index n_rows, int32_t *place,
                                sv_projector **ret_part)
{
    sv_projector *part = NULL;
    if (projector->engine->restrict_to == NULL)
        return SV_FAIL(context, SV_UNDEFINED, "the %s engine cannot be restricted",
                       projector->engine->name);
    sv_status status = sv_take(context, 1, sizeof *part, &part);
    if (status != SV_OK)
        return status;
    *part = *projector;
    part->state = NULL;
    part->n = n_rows;
    for (sv_index k = 0; k < n_rows; k++)
        place[rows[k]] = (int32_t)k;
    status = projector->engine->restrict_to(context, projector, rows, n_rows, place, &part->state);
    for (sv_index k = 0; k < n_rows; k++)
        place[rows[k]] = -1;
    if (status == SV_OK)
        *ret_part = part;
    else
        sv_give(context, part);
    return status;
}

sv_basis sv_projector_basis(const sv_projector *projector)
{
    return projector->engine->basis(projector->state);
}

sv_status sv_projector_occupied_basis(sv_context *context, const sv_projector *projector,
                                      sv_basis *ret_basis)
{
    sv_basis basis = sv_projector_basis(projector);
    if (!basis.available || basis.empty_side)
        return SV_FAIL(context, SV_UNDEFINED, "the %s engine holds no basis of the occupied space",
                       projector->engine->name);
    *ret_basis = basis;
    return SV_OK;
}

static double norm_of(const sv_complex *x, sv_index n)
{
    double sum = 0.0;
    for (sv_index k = 0; k < n; k++)
        sum += creal(x[k]) * creal(x[k]) + cimag(x[k]) * cimag(x[k]);
    return sqrt(sum);
}

static double distance(const sv_complex *x, const sv_complex *y, sv_index n)
{
    double sum = 0.0;
    for (sv_index k = 0; k < n; k++) {
        sv_complex d = x[k] - y[k];
        sum += creal(d) * creal(d) + cimag(d) * cimag(d);
    }
    return sqrt(sum);
}

/* A fixed probe: its phases come from a stream of their own, so results repeat. */
static void fill_probe(sv_complex *v, sv_index n)
{
    sv_stream stream = sv_stream_make(1, "projector probe", 0);
    for (sv_index k = 0; k < n; k++) {
        double angle = 2.0 * M_PI * sv_stream_uniform(&stream, (int32_t)k, 0, 0);
        v[k] = CMPLX(cos(angle), sin(angle));
    }
}

static double gap_of(const sv_levels *levels)
{
    if (!levels->has_highest || !levels->has_lowest)
        return INFINITY;
    return fmax(levels->lowest_empty - levels->highest_occupied, levels->resolution);
}

sv_status sv_projector_defect(sv_context *context, sv_projector *projector, double *ret_defect)
{
    sv_index n = projector->sample->n;
    const sv_sparse *h = &projector->sample->hamiltonian;
    sv_complex *block = NULL;
    sv_status status = sv_take_raw(context, 5 * n, sizeof *block, &block);
    if (status != SV_OK)
        return status;
    sv_complex *v = block, *pv = v + n, *ppv = pv + n, *hv = ppv + n, *phv = hv + n;
    fill_probe(v, n);
    sv_sparse_apply(h, v, hv);
    if ((status = sv_projector_apply(context, projector, 1, v, pv)) != SV_OK ||
        (status = sv_projector_apply(context, projector, 1, pv, ppv)) != SV_OK ||
        (status = sv_projector_apply(context, projector, 1, hv, phv)) != SV_OK)
        goto out;
    double idempotency = distance(ppv, pv, n) / norm_of(v, n);
    sv_sparse_apply(h, pv, ppv);
    double commutator = distance(ppv, phv, n) / norm_of(v, n) / gap_of(&projector->levels);
    *ret_defect = fmax(idempotency, commutator);
out:
    sv_give(context, block);
    return status;
}

void sv_projector_forecast(sv_engine engine, sv_index n, double *ret_bytes, double *ret_operations)
{
    double order = (double)n;
    if (engine == SV_ENGINE_CHEBYSHEV) {
        /* Flake, sample and matrix; panels and blocks of 16 columns while the flake is small. */
        *ret_bytes = order * (420.0 + (n < 200000 ? 1800.0 : 0.0));
        *ret_operations = order * 16.0 * 10.0 * 200.0;
        return;
    }
    if (engine == SV_ENGINE_RATIONAL) {
        /* Factors for 25 poles in minimum degree order, measured on flakes with hops to second
         * neighbours (squared: to fourth) from 1,800 to 80,000 sites; panels and work blocks. */
        double factor = order * fmax(500.0, 620.0 * log2(fmax(order, 1.0)) - 4850.0);
        *ret_bytes = 25.0 * factor + 5000.0 * order;
        *ret_operations = 25.0 * 260.0 * pow(order, 1.5);
        return;
    }
    /* Matrix, half of the vectors, work blocks of the markers; reduction, back-transformation and
     * products, in units of n³ complex multiply–adds. */
    *ret_bytes = 16.0 * order * order * 2.25;
    *ret_operations = order * order * order * 2.6;
}
