/* SPDX-License-Identifier: GPL-3.0-or-later */
/* What all families of disorder share: positions, patches of cells, local operators. */
#include "sample_internal.h"

#include <math.h>

int sv_position_of(const sv_flake *flake, sv_index site)
{
    return flake->model->orbitals[flake->sites[site].orbital].position;
}

bool sv_position_matches(const sv_model *model, int position, int on)
{
    return on < 0 || model->orbitals[on].position == position;
}

bool sv_is_first_at_position(const sv_flake *flake, sv_index site)
{
    const sv_cell *cell = &flake->cells[flake->sites[site].cell];
    for (sv_index s = cell->first_site; s < site; s++)
        if (sv_position_of(flake, s) == sv_position_of(flake, site))
            return false;
    return true;
}

int sv_orbital_at(const sv_model *model, int position)
{
    int k = 0;
    while (model->orbitals[k].position != position)
        k++;
    return k;
}

void sv_vacate(sv_drawing *d, sv_index site)
{
    const sv_cell *cell = &d->flake->cells[d->flake->sites[site].cell];
    int position = sv_position_of(d->flake, site);
    for (sv_index s = cell->first_site; s < cell->first_site + cell->n_sites; s++) {
        if (sv_position_of(d->flake, s) == position && !d->gone[s]) {
            d->gone[s] = true;
            d->taken_by[s] = (int16_t)d->entry;
            d->inventory.vacant_sites++;
        }
    }
    d->inventory.vacancies++;
    d->inventory.placed[d->entry]++;
}

bool sv_is_candidate(const sv_drawing *d, const sv_disorder *disorder, sv_index site)
{
    return !d->gone[site] &&
           sv_position_matches(d->flake->model, sv_position_of(d->flake, site), disorder->on) &&
           /* Species of a structure share the one position of a cell. */
           (d->flake->spec.structure == NULL || disorder->on < 0 ||
            d->flake->sites[site].orbital == disorder->on) &&
           sv_is_first_at_position(d->flake, site);
}

double sv_position_uniform(const sv_stream *stream, int32_t i, int32_t j, int position)
{
    return sv_stream_uniform(stream, i, j, (uint32_t)position);
}

sv_status sv_add_term(sv_context *context, sv_drawing *d, int term, sv_index site, double energy)
{
    if (term == SV_FIELD_POTENTIAL) {
        d->potential[site] += energy;
        return SV_OK;
    }
    if (d->field[term] == NULL) {
        sv_status status =
            sv_take(context, d->flake->n_sites, sizeof *d->field[term], &d->field[term]);
        if (status != SV_OK)
            return status;
    }
    d->field[term][site] += energy;
    return SV_OK;
}

/* Where positions lie in their cell, in units of the vectors: smallest and largest. */
static void position_range(const sv_model *model, double low[2], double high[2])
{
    low[0] = low[1] = INFINITY;
    high[0] = high[1] = -INFINITY;
    for (int o = 0; o < model->n_orbitals; o++) {
        double uv[2];
        sv_model_reduce(model, model->orbitals[o].at, uv);
        for (int k = 0; k < 2; k++) {
            low[k] = fmin(low[k], uv[k]);
            high[k] = fmax(high[k], uv[k]);
        }
    }
}

static int32_t clamp(double x)
{
    return x < INT32_MIN ? INT32_MIN : x > INT32_MAX ? INT32_MAX : (int32_t)x;
}

sv_patch sv_patch_around(const sv_model *model, const double low[2], const double high[2],
                         double reach)
{
    double first[2], last[2], uv[2], from[2] = {INFINITY, INFINITY}, to[2] = {-INFINITY, -INFINITY};
    const double area = sv_model_vector_area(model);
    sv_patch patch;
    position_range(model, first, last);
    for (int corner = 0; corner < 4; corner++) {
        sv_model_reduce(
            model, (const double[2]){corner & 1 ? high[0] : low[0], corner & 2 ? high[1] : low[1]},
            uv);
        for (int k = 0; k < 2; k++) {
            from[k] = fmin(from[k], uv[k]);
            to[k] = fmax(to[k], uv[k]);
        }
    }
    for (int k = 0; k < 2; k++) {
        /* A step of 1 along a vector moves by area/|other vector| at right angles to the other. */
        const double *other = model->vectors[1 - k];
        double steps = reach * hypot(other[0], other[1]) / area;
        patch.low[k] = clamp(floor(from[k] - steps - last[k]));
        patch.high[k] = clamp(ceil(to[k] + steps - first[k]));
    }
    return patch;
}

sv_patch sv_flake_patch(const sv_flake *flake, const double at[2], double reach)
{
    sv_patch patch = sv_patch_around(flake->model, at, at, reach);
    for (int k = 0; k < 2; k++) {
        patch.low[k] = patch.low[k] < flake->low[k] ? flake->low[k] : patch.low[k];
        patch.high[k] = patch.high[k] > flake->high[k] ? flake->high[k] : patch.high[k];
    }
    return patch;
}

void sv_flake_box(const sv_flake *flake, double ret_low[2], double ret_high[2])
{
    ret_low[0] = ret_low[1] = INFINITY;
    ret_high[0] = ret_high[1] = -INFINITY;
    for (sv_index s = 0; s < flake->n_sites; s++)
        for (int k = 0; k < 2; k++) {
            ret_low[k] = fmin(ret_low[k], flake->sites[s].at[k]);
            ret_high[k] = fmax(ret_high[k], flake->sites[s].at[k]);
        }
}

double sv_shortest_distance(const sv_model *model)
{
    double best = fmin(hypot(model->vectors[0][0], model->vectors[0][1]),
                       hypot(model->vectors[1][0], model->vectors[1][1]));
    for (int a = 0; a < model->n_orbitals; a++)
        for (int b = 0; b < model->n_orbitals; b++)
            for (int i = -2; i <= 2; i++)
                for (int j = -2; j <= 2; j++) {
                    double x = model->orbitals[a].at[0] - model->orbitals[b].at[0] +
                               i * model->vectors[0][0] + j * model->vectors[1][0];
                    double y = model->orbitals[a].at[1] - model->orbitals[b].at[1] +
                               i * model->vectors[0][1] + j * model->vectors[1][1];
                    double r = hypot(x, y);
                    if (r > 1e-6)
                        best = fmin(best, r);
                }
    return best;
}
