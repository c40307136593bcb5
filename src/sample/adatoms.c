/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Adatoms on top of sites: an orbital more, with an energy of its own and a hop to its host. */
#include "sample_internal.h"

static void place(sv_drawing *d, sv_index site)
{
    d->adatoms[site] |= (uint64_t)1 << d->entry;
    d->inventory.placed[d->entry]++;
}

sv_status sv_draw_adatoms(sv_context *context, sv_drawing *d, const sv_disorder *disorder,
                          const sv_stream *stream)
{
    sv_status status = SV_OK;
    if (d->adatoms == NULL &&
        (status = sv_take(context, d->flake->n_sites, sizeof *d->adatoms, &d->adatoms)) != SV_OK)
        return status;
    if (disorder->has_count)
        return sv_draw_count(context, d, disorder, stream, NULL, place);
    for (sv_index s = 0; s < d->flake->n_sites; s++) {
        const sv_site *site = &d->flake->sites[s];
        const sv_cell *cell = &d->flake->cells[site->cell];
        if (!d->gone[s] && (disorder->on < 0 || disorder->on == site->orbital) &&
            sv_stream_uniform(stream, cell->i, cell->j, (uint32_t)site->orbital) < disorder->share)
            place(d, s);
    }
    return SV_OK;
}
