/* SPDX-License-Identifier: GPL-3.0-or-later */
/* What the disorder of a sheet amounts to, in the units of the lab: printed by `check`. */
#include "program_internal.h"

#include <math.h>

/* "12.3 meV", or a bare number in the unit of the model. */
static void energy_text(const sv_setup *setup, double energy, char *text, size_t size)
{
    if (setup->energy_unit > 0.0)
        snprintf(text, size, "%.4g meV", energy * setup->energy_unit * 1e3);
    else
        snprintf(text, size, "%.4g in units of the model", energy);
}

/* "2 nm", or lattice constants. */
static void length_text(const sv_setup *setup, double length, char *text, size_t size)
{
    double a = setup->lattice_constant;
    snprintf(text, size, "%.4g %s", length * (a > 0.0 ? a : 1.0),
             a > 0.0 ? "nm" : "lattice constants");
}

/* Positions per nm² that may hold a defect of this entry. */
static double positions_per_area(const sv_setup *setup, const sv_disorder *d)
{
    double a = setup->lattice_constant, positions = d->on < 0 ? setup->model.n_positions : 1;
    return positions / (sv_model_cell_area(&setup->model) * a * a);
}

static void print_vacancies(const sv_setup *setup, const sv_disorder *d, FILE *stream)
{
    char text[64];
    double positions = positions_per_area(setup, d);
    if (d->has_share && d->share > 0.0 && setup->lattice_constant > 0.0)
        fprintf(stream, "# %s: share %.4g is %.4g cm^-2, mean distance %.3g nm\n", d->name,
                d->share, d->share * positions * 1e14, 0.5 / sqrt(d->share * positions));
    length_text(setup, d->cluster_radius, text, sizeof text);
    if (d->cluster_size > 0.0)
        fprintf(stream, "# %s: clusters of %.4g on average, about %s in radius\n", d->name,
                d->cluster_size, text);
    length_text(setup, d->distance, text, sizeof text);
    if (d->distance > 0.0)
        fprintf(stream, "# %s: more than %s apart, which allows a share of %.4g\n", d->name, text,
                sv_disorder_share_limit(&setup->model, d));
    if (d->charge != 0.0)
        fprintf(stream, "# %s: charge %+g each\n", d->name, d->charge);
}

static void print_puddles(const sv_setup *setup, const sv_disorder *d, FILE *stream)
{
    char below[64], spread[64];
    energy_text(setup, fabs(d->strength), below, sizeof below);
    energy_text(setup, sv_disorder_puddle_deviation(d), spread, sizeof spread);
    fprintf(stream, "# %s: %s right below a charge", d->name, below);
    if (d->source[0] != '\0')
        fprintf(stream, "; charges of %s\n", d->source);
    else
        fprintf(stream, ", standard deviation of the potential %s\n", spread);
}

static void print_changes(const sv_setup *setup, const sv_disorder *d, FILE *stream)
{
    char text[64];
    double area = sv_model_cell_area(&setup->model);
    if (d->type == SV_DISORDER_DOMAINS) {
        energy_text(setup, d->jump, text, sizeof text);
        fprintf(stream, "# %s: %s added in changed domains\n", d->name, text);
    } else if (d->strength != 0.0) {
        energy_text(setup, d->strength / area, text, sizeof text);
        fprintf(stream, "# %s: %.4g point defects per cell, each changes it by %s\n", d->name,
                d->density * area, text);
    }
}

void defects_print(const sv_setup *setup, FILE *stream)
{
    for (int k = 0; k < setup->n_disorder; k++) {
        const sv_disorder *d = &setup->disorder[k];
        if (d->type == SV_DISORDER_VACANCIES)
            print_vacancies(setup, d, stream);
        else if (d->type == SV_DISORDER_ONSITE && d->distribution == SV_PUDDLES && !d->has_marks)
            print_puddles(setup, d, stream);
        else if (d->type == SV_DISORDER_MASS || d->type == SV_DISORDER_DOMAINS)
            print_changes(setup, d, stream);
    }
}
