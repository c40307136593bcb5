/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Measured maps on the flake: energies of sites, and positions emptied where an image is dark or
 * bright. */
#include "sample_internal.h"

#include <stdio.h>

static bool is_meant(const sv_flake *flake, const sv_disorder *disorder, sv_index site)
{
    return disorder->on < 0 || flake->sites[site].orbital == disorder->on;
}

sv_index sv_grid_uncovered(const sv_flake *flake, const sv_disorder *disorder, sv_index from)
{
    double value;
    for (sv_index s = from; s < flake->n_sites; s++)
        if (is_meant(flake, disorder, s) &&
            !sv_grid_at(&disorder->grid, flake->sites[s].at, &value))
            return s;
    return -1;
}

sv_status sv_add_grid(sv_context *context, sv_drawing *d, const sv_disorder *disorder)
{
    const int term = disorder->type == SV_DISORDER_MASS ? disorder->term : SV_FIELD_POTENTIAL;
    sv_status status = SV_OK;
    double value;
    for (sv_index s = 0; s < d->flake->n_sites && status == SV_OK; s++)
        if (!d->gone[s] && is_meant(d->flake, disorder, s) &&
            sv_grid_at(&disorder->grid, d->flake->sites[s].at, &value))
            status = sv_add_term(context, d, term, s, value);
    return status;
}

/* An image as a mask: vacant where its grey lies beyond the threshold. */
void sv_vacate_grid(sv_drawing *d, const sv_disorder *disorder)
{
    double value;
    for (sv_index s = 0; s < d->flake->n_sites; s++)
        if (sv_is_candidate(d, disorder, s) &&
            sv_grid_at(&disorder->grid, d->flake->sites[s].at, &value) &&
            (disorder->darker ? value < disorder->threshold : value > disorder->threshold))
            sv_vacate(d, s);
}
