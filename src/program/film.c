/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The length ξ = ħv/Δ of a model with light states against the size of its film: below about eight
 * of them a film has no bulk, whatever its markers say. */
#include "program_internal.h"

#include <math.h>

static const double LEAST_LENGTHS = 8.0;

/* Smaller extent of the flake, one cell included; lattice constants. */
static double extent(const sv_flake *flake)
{
    double low[2] = {INFINITY, INFINITY}, high[2] = {-INFINITY, -INFINITY};
    for (sv_index s = 0; s < flake->n_sites; s++)
        for (int d = 0; d < 2; d++) {
            low[d] = fmin(low[d], flake->sites[s].at[d]);
            high[d] = fmax(high[d], flake->sites[s].at[d]);
        }
    return 1.0 + fmin(high[0] - low[0], high[1] - low[1]);
}

sv_status film_measure(session *s, film_length *ret)
{
    film_length film = {.lengths = INFINITY};
    for (int32_t k = 0; k < s->n_points; k++) {
        const point *p = &s->points[k];
        const sv_model *model = &p->setup.model;
        double edges[2];
        if (model->velocity <= 0.0)
            continue;
        sv_status status = sv_model_filling_gap(s->context, model, 0.5, 1e-9, edges);
        if (status == SV_UNDEFINED)
            continue;
        if (status != SV_OK)
            return status;
        double gap = fmax(0.0, edges[1] - edges[0]);
        if (gap < 1e-9 * model->velocity) /* rounding; the spacing of the grid is the length */
            gap = 0.0;
        double lengths = extent(&p->open) * gap / model->velocity;
        if (lengths >= film.lengths)
            continue;
        double a = p->setup.lattice_constant, unit = p->setup.energy_unit;
        film = (film_length){.known = true,
                             .point = k,
                             .velocity = model->velocity * unit * a,
                             .gap = gap * unit,
                             .length = model->velocity / gap * a,
                             .size = extent(&p->open) * a,
                             .lengths = lengths};
    }
    film.enough = film.lengths >= LEAST_LENGTHS;
    *ret = film;
    return SV_OK;
}

void film_print(const film_length *film, int32_t n_points, FILE *stream)
{
    if (!film->known)
        return;
    fprintf(stream, "#\n# length of the model: hbar v = %.4g eV nm", film->velocity);
    if (!(film->gap > 0.0)) {
        fprintf(stream, ", no gap at half filling\n");
    } else {
        fprintf(stream, ", gap %.4g meV, xi = hbar v / gap = %.4g nm\n", 1e3 * film->gap,
                film->length);
        fprintf(stream,
                "#   the film is %.4g nm = %.3g xi across; it should be at least %.0f xi = "
                "%.4g nm\n",
                film->size, film->lengths, LEAST_LENGTHS, LEAST_LENGTHS * film->length);
    }
    if (n_points > 1)
        fprintf(stream, "#   at point %d, the worst of the sweep\n", film->point);
}

void film_warn_vacancies(const session *s)
{
    const sv_setup *setup = &s->points[0].setup;
    double a = setup->lattice_constant;
    for (int k = 0; k < setup->n_disorder; k++)
        if (setup->model.velocity > 0.0 && setup->disorder[k].type == SV_DISORDER_VACANCIES)
            sv_log(s->context, SV_LOG_WARNING,
                   "disorder.%s: a vacancy of this model is a hole of one grid cell, %.3g nm^2; a "
                   "point "
                   "defect is a change of mass, exchange or potential (kind: mass)",
                   setup->disorder[k].name, a * a);
}

void film_warn(sv_context *context, const film_length *film)
{
    if (!film->known || film->enough)
        return;
    if (film->gap > 0.0)
        sv_log(
            context, SV_LOG_WARNING,
            "the film is %.3g xi across (xi = hbar v / gap = %.4g nm): below %.0f it has no bulk",
            film->lengths, film->length, LEAST_LENGTHS);
    else
        sv_log(context, SV_LOG_WARNING, "the clean film has no gap at half filling");
}
