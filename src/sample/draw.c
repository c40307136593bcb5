/* SPDX-License-Identifier: GPL-3.0-or-later */
/* One realisation: the entries of the sheet in order, then the sites that are left and their
 * Hamiltonian. Random numbers depend on cells of the plane and the name of the entry only. */
#include "sample_internal.h"

#include <stdio.h>
#include <string.h>

/* One row per kind; NULL: nothing to do here. */
static sv_status (*const draws[])(sv_context *, sv_drawing *, const sv_disorder *,
                                  const sv_stream *) = {
    [SV_DISORDER_VACANCIES] = sv_draw_vacancies, [SV_DISORDER_ONSITE] = sv_draw_onsite,
    [SV_DISORDER_MASS] = sv_draw_onsite,         [SV_DISORDER_HOPPING] = sv_draw_hopping,
    [SV_DISORDER_FLUX] = sv_draw_flux,           [SV_DISORDER_ADATOMS] = sv_draw_adatoms,
    [SV_DISORDER_CRACKS] = sv_draw_cracks,       [SV_DISORDER_DOMAINS] = sv_draw_domains,
    [SV_DISORDER_ROUGHNESS] = sv_draw_roughness, [SV_DISORDER_STEPS] = sv_draw_steps,
};

static sv_status apply(sv_context *context, sv_drawing *d)
{
    const sv_disorder *disorder = &d->disorder[d->entry];
    sv_stream stream = sv_stream_make(d->seed, disorder->name, d->realisation);
    if (sv_cancelled(context))
        return SV_FAIL(context, SV_INTERRUPTED, "stopped while a sample was drawn");
    return draws[disorder->type](context, d, disorder, &stream);
}

/* What local operators put on the diagonal joins the potential. */
static void fold_fields(sv_drawing *d)
{
    const sv_model *model = d->flake->model;
    for (int f = 0; f < model->n_fields; f++) {
        const sv_model_field *field = &model->fields[f];
        for (int t = 0; d->field[f] != NULL && t < field->n_terms; t++) {
            const sv_field_term *term = &field->terms[t];
            if (term->to != term->from)
                continue;
            for (sv_index s = 0; s < d->flake->n_sites; s++)
                if (d->flake->sites[s].orbital == term->to)
                    d->potential[s] += creal(term->amplitude) * d->field[f][s];
        }
    }
}

/* Adatoms that still have their host. */
static sv_index count_adatoms(const sv_drawing *d)
{
    sv_index n = 0;
    for (sv_index s = 0; d->adatoms != NULL && s < d->flake->n_sites; s++)
        n += d->gone[s] ? 0 : __builtin_popcountll(d->adatoms[s]);
    return n;
}

static void keep_row(sv_sample *sample, sv_index site, int adatom, double energy)
{
    sample->pristine[sample->n] = site;
    if (sample->adatom != NULL)
        sample->adatom[sample->n] = (int16_t)adatom;
    sample->potential[sample->n++] = energy;
}

/* Rows in the order of sites; adatoms follow their host. */
static void fill_rows(const sv_drawing *d, sv_sample *sample, int32_t *row)
{
    for (sv_index s = 0; s < d->flake->n_sites; s++) {
        row[s] = d->gone[s] ? -1 : (int32_t)sample->n;
        if (d->gone[s])
            continue;
        keep_row(sample, s, -1, d->potential[s]);
        for (int e = 0; d->adatoms != NULL && d->adatoms[s] >> e != 0; e++)
            if (d->adatoms[s] >> e & 1)
                keep_row(sample, s, e, d->disorder[e].energy);
    }
}

static sv_status keep_sites(sv_context *context, sv_drawing *d, sv_sample *sample,
                            int32_t **ret_row_of_site)
{
    const sv_flake *flake = d->flake;
    sv_index adatoms = count_adatoms(d), n = flake->n_sites - d->inventory.vacant_sites + adatoms;
    int32_t *row = NULL;
    sv_status status;
    if (n <= 0)
        return SV_FAIL(context, SV_UNDEFINED, "no site is left: all %lld are vacant",
                       (long long)flake->n_sites);
    if ((status = sv_take_raw(context, flake->n_sites, sizeof *row, &row)) != SV_OK)
        return status;
    *ret_row_of_site = row;
    if ((status = sv_take_raw(context, n, sizeof *sample->pristine, &sample->pristine)) != SV_OK ||
        (status = sv_take_raw(context, n, sizeof *sample->potential, &sample->potential)) != SV_OK)
        return status;
    if (adatoms > 0 &&
        (status = sv_take_raw(context, n, sizeof *sample->adatom, &sample->adatom)) != SV_OK)
        return status;
    sample->n = 0;
    fill_rows(d, sample, row);
    d->inventory.adatoms = adatoms;
    return SV_OK;
}

static void free_drawing(sv_context *context, sv_drawing *d)
{
    sv_give(context, d->gone);
    sv_give(context, d->taken_by);
    sv_give(context, d->potential);
    sv_give(context, d->adatoms);
    sv_bonds_free(context, &d->bonds);
    for (int f = 0; f < SV_MODEL_FIELDS; f++)
        sv_give(context, d->field[f]);
}

static sv_status take_drawing(sv_context *context, sv_drawing *d)
{
    sv_index n = d->flake->n_sites;
    sv_status status;
    if (d->n_disorder > SV_DISORDER_MOST)
        return SV_FAIL(context, SV_INVALID_INPUT, "%d entries of disorder are more than %d",
                       d->n_disorder, SV_DISORDER_MOST);
    if ((status = sv_take(context, n, sizeof *d->gone, &d->gone)) != SV_OK ||
        (status = sv_take_raw(context, n, sizeof *d->taken_by, &d->taken_by)) != SV_OK ||
        (status = sv_take(context, n, sizeof *d->potential, &d->potential)) != SV_OK)
        return status;
    memset(d->taken_by, 0xff, (size_t)n * sizeof *d->taken_by);
    d->inventory.pristine_sites = n;
    return SV_OK;
}

/* `as` tells flake, disorder, seed and realisation. */
static sv_status draw_sample(sv_context *context, const sv_sample *as, int quanta,
                             sv_sample *ret_sample)
{
    const sv_flake *flake = as->flake;
    int n_disorder = as->n_disorder;
    sv_drawing d = {.flake = flake,
                    .disorder = as->disorder,
                    .n_disorder = n_disorder,
                    .seed = as->seed,
                    .realisation = as->realisation,
                    .quanta = quanta};
    sv_sample sample = {.flake = flake,
                        .disorder = as->disorder,
                        .n_disorder = n_disorder,
                        .seed = as->seed,
                        .realisation = as->realisation};
    int32_t *row_of_site = NULL;
    sv_status status = take_drawing(context, &d);
    for (; d.entry < n_disorder && status == SV_OK; d.entry++)
        status = apply(context, &d);
    if (status != SV_OK)
        goto out;
    fold_fields(&d);
    if ((status = sv_bonds_finish(context, &d)) != SV_OK ||
        (status = keep_sites(context, &d, &sample, &row_of_site)) != SV_OK)
        goto out;
    d.inventory.sites = sample.n;
    sample.inventory = d.inventory;
    if ((status = sv_sample_build_hamiltonian(context, &sample, &d, row_of_site)) != SV_OK ||
        (flake->spec.keep_largest &&
         (status = sv_sample_keep_largest(context, &sample)) != SV_OK) ||
        (status = sv_sample_pieces(context, &sample, NULL)) != SV_OK)
        goto out;
    *ret_sample = sample;
    sample = (sv_sample){0};
out:
    free_drawing(context, &d);
    sv_give(context, row_of_site);
    sv_sample_free(context, &sample);
    return status;
}

sv_status sv_sample_draw(sv_context *context, const sv_flake *flake, const sv_disorder *disorder,
                         int n_disorder, uint64_t seed, sv_index index, sv_sample *ret_sample)
{
    const sv_sample as = {.flake = flake,
                          .disorder = disorder,
                          .n_disorder = n_disorder,
                          .seed = seed,
                          .realisation = index};
    return draw_sample(context, &as, 0, ret_sample);
}

sv_status sv_sample_add_flux(sv_context *context, const sv_sample *sample, int quanta,
                             sv_sparse *ret_hamiltonian)
{
    sv_sample other = {0};
    if (!(sample->flake->periodic[0] && sample->flake->periodic[1]))
        return SV_FAIL(context, SV_UNDEFINED,
                       "flux through a torus needs a flake closed both ways");
    sv_status status = draw_sample(context, sample, quanta, &other);
    if (status != SV_OK)
        return status;
    *ret_hamiltonian = other.hamiltonian;
    other.hamiltonian = (sv_sparse){0};
    sv_sample_free(context, &other);
    return SV_OK;
}

void sv_sample_free(sv_context *context, sv_sample *sample)
{
    sv_give(context, sample->pristine);
    sv_give(context, sample->potential);
    sv_give(context, sample->adatom);
    sv_sparse_free(context, &sample->hamiltonian);
    *sample = (sv_sample){0};
}

void sv_disorder_free(sv_context *context, sv_disorder *disorder)
{
    sv_give(context, disorder->marks);
    sv_grid_free(context, &disorder->grid);
    *disorder = (sv_disorder){0};
}

sv_closure sv_disorder_can_close(const sv_disorder *disorder, int n)
{
    sv_closure closure = {.possible = true};
    for (int k = 0; k < n && closure.possible; k++) {
        if (disorder[k].type == SV_DISORDER_ROUGHNESS) {
            closure.possible = false;
            snprintf(closure.reason, sizeof closure.reason,
                     "%.60s makes the edges rough, and a torus has none", disorder[k].name);
        } else if (disorder[k].type == SV_DISORDER_FLUX && disorder[k].independent) {
            closure.possible = false;
            snprintf(closure.reason, sizeof closure.reason,
                     "the independent fluxes of %.60s do not add up to whole quanta on a torus",
                     disorder[k].name);
        }
    }
    return closure;
}
