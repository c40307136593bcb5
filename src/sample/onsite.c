/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Energies added to the potential or to a local operator of the model: independent, correlated, by
 * point defects, or by screened charges. */
#include "sample_internal.h"

#include <math.h>

#include <gsl/gsl_cdf.h>

static const uint32_t SLOT_OF_CELL = UINT32_MAX; /* one number for all orbitals of a cell */

double sv_standard_value(sv_distribution law, double u)
{
    switch (law) {
    case SV_BOX:
        return u - 0.5;
    case SV_GAUSSIAN:
        return gsl_cdf_ugaussian_Pinv(u);
    case SV_BINARY:
        return u < 0.5 ? -0.5 : 0.5;
    case SV_CORRELATED:
    case SV_PUDDLES:
        break;
    }
    return 0.0;
}

static int term_of(const sv_disorder *disorder)
{
    return disorder->type == SV_DISORDER_ONSITE ? SV_FIELD_POTENTIAL : disorder->term;
}

/* A potential is drawn per orbital; an operator joins the orbitals of a position, which share
 * theirs. */
static sv_status draw_independent(sv_context *context, sv_drawing *d, const sv_disorder *disorder,
                                  const sv_stream *stream)
{
    int term = term_of(disorder);
    sv_status status = SV_OK;
    for (sv_index s = 0; s < d->flake->n_sites && status == SV_OK; s++) {
        const sv_site *site = &d->flake->sites[s];
        if (d->gone[s] || (disorder->on >= 0 && disorder->on != site->orbital))
            continue;
        const sv_cell *cell = &d->flake->cells[site->cell];
        uint32_t slot = disorder->per_cell ? SLOT_OF_CELL
                        : disorder->type == SV_DISORDER_ONSITE
                            ? (uint32_t)site->orbital
                            : (uint32_t)sv_position_of(d->flake, s);
        double u = sv_stream_uniform(stream, cell->i, cell->j, slot);
        status = sv_add_term(context, d, term, s,
                             disorder->width * sv_standard_value(disorder->distribution, u));
    }
    return status;
}

static sv_status draw_correlated(sv_context *context, sv_drawing *d, const sv_disorder *disorder,
                                 const sv_stream *stream)
{
    const sv_flake *flake = d->flake;
    double low[2], high[2], reach = 0.0, at[2] = {0, 0}, value = 0.0;
    sv_smooth smooth = {0};
    sv_index last = -1; /* the place for which `value` holds */
    /* The centre of an incomplete cell may lie outside the box of the sites. */
    for (int k = 0; k < 2 && disorder->per_cell; k++)
        reach += hypot(flake->model->vectors[k][0], flake->model->vectors[k][1]);
    sv_flake_box(flake, low, high);
    for (int k = 0; k < 2; k++) {
        low[k] -= reach;
        high[k] += reach;
    }
    sv_status status = sv_smooth_make(context, flake->model, stream, disorder->length,
                                      disorder->covariance, low, high, &smooth);
    for (sv_index s = 0; status == SV_OK && s < flake->n_sites; s++) {
        const sv_site *site = &flake->sites[s];
        if (d->gone[s] || (disorder->on >= 0 && disorder->on != site->orbital))
            continue;
        const sv_cell *cell = &flake->cells[site->cell];
        int position = disorder->per_cell ? 0 : sv_position_of(flake, s);
        sv_index place = (sv_index)site->cell * flake->model->n_positions + position;
        if (place != last) {
            if (disorder->per_cell)
                sv_flake_cell_centre(flake, site->cell, at);
            value = disorder->width * sv_smooth_at(&smooth, disorder->per_cell ? at : site->at,
                                                   cell->i, cell->j, position);
            last = place;
        }
        status = sv_add_term(context, d, term_of(disorder), s, value);
    }
    sv_smooth_free(context, &smooth);
    return status;
}

/* A defect of strength × area changes its cell by strength/area; a cell may hold several. */
static sv_status draw_defects(sv_context *context, sv_drawing *d, const sv_disorder *disorder,
                              const sv_stream *stream)
{
    const sv_flake *flake = d->flake;
    double area = sv_model_cell_area(flake->model), mean = disorder->density * area;
    sv_status status = SV_OK;
    for (sv_index c = 0; c < flake->n_cells && status == SV_OK; c++) {
        const sv_cell *cell = &flake->cells[c];
        int n = sv_poisson(mean, sv_stream_uniform(stream, cell->i, cell->j, SV_SLOT_POINTS));
        d->inventory.placed[d->entry] += n;
        for (sv_index s = cell->first_site;
             n > 0 && s < cell->first_site + cell->n_sites && status == SV_OK; s++)
            status = sv_add_term(context, d, disorder->term, s, n * disorder->strength / area);
    }
    return status;
}

sv_status sv_draw_onsite(sv_context *context, sv_drawing *d, const sv_disorder *disorder,
                         const sv_stream *stream)
{
    if (disorder->has_marks)
        return sv_add_marks(context, d, disorder);
    if (disorder->has_grid)
        return sv_add_grid(context, d, disorder);
    if (disorder->type == SV_DISORDER_MASS && disorder->strength != 0.0)
        return draw_defects(context, d, disorder, stream);
    if (disorder->distribution == SV_PUDDLES)
        return sv_draw_puddles(context, d, disorder, stream);
    if (disorder->distribution == SV_CORRELATED)
        return draw_correlated(context, d, disorder, stream);
    return draw_independent(context, d, disorder, stream);
}
