/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Keys of the kinds that change hops, add adatoms, or follow lines and regions → sv_disorder. */
#include "sheet_internal.h"

#include <string.h>

static const char *const laws[] = {
    [SV_BOX] = "box", [SV_GAUSSIAN] = "gaussian", [SV_BINARY] = "binary"};

bool sv_use_hopping(sv_reader *reader, const sv_section *section, const sv_model *model,
                    sv_disorder *disorder)
{
    (void)model;
    if (sv_section_written(section, "width phase") == 0)
        return sv_report(reader, section->anchor, "give width, phase, or both",
                         "%s lacks width or phase", section->path);
    disorder->distribution = (sv_distribution)sv_section_choice(section, "distribution", laws, 3);
    disorder->width = sv_section_real(section, "width");
    disorder->phase = sv_section_real(section, "phase");
    disorder->nearest = strcmp(sv_section_value(section, "bonds")->text, "nearest") == 0;
    return true;
}

static bool is_closed(const sv_setup *setup)
{
    return setup->flake.periodic[0] || setup->flake.periodic[1];
}

bool sv_use_flux(sv_reader *reader, const sv_section *section, const sv_model *model,
                 sv_disorder *disorder)
{
    (void)model;
    disorder->width = sv_section_real(section, "width");
    disorder->independent = strcmp(sv_section_value(section, "fluxes")->text, "independent") == 0;
    disorder->distribution = (sv_distribution)sv_section_choice(section, "distribution", laws, 3);
    if (!disorder->independent) {
        const char *law = sv_section_value(section, "distribution")->text;
        disorder->distribution = SV_GAUSSIAN;
        return law == NULL || strcmp(law, "gaussian") == 0 ||
               sv_report(reader, sv_section_node(section, "distribution"),
                         "fluxes: independent may have other laws",
                         "%s.distribution: balanced fluxes are gaussian", section->path);
    }
    return !is_closed(reader->setup) ||
           sv_report(reader, sv_section_node(section, "fluxes"), "fluxes: balanced fits any flake",
                     "%s: independent fluxes do not fit a periodic flake", section->path);
}

bool sv_use_adatoms(sv_reader *reader, const sv_section *section, const sv_model *model,
                    sv_disorder *disorder)
{
    if (!sv_section_one_of(reader, section, "share density count") ||
        !sv_use_amount(reader, section, model, disorder))
        return false;
    /* A density counts per position; every orbital of a position may carry an adatom. */
    if (sv_section_written(section, "density") > 0 && disorder->on < 0)
        disorder->share *= (double)model->n_positions / model->n_orbitals;
    disorder->energy = sv_section_real(section, "energy");
    disorder->coupling = sv_section_real(section, "coupling");
    return true;
}

bool sv_use_cracks(sv_reader *reader, const sv_section *section, const sv_model *model,
                   sv_disorder *disorder)
{
    static const char *const lengths[] = {"equal", "exponential"};
    (void)model;
    if (sv_section_written(section, "from to") > 0) {
        disorder->has_line = true;
        memcpy(disorder->from, sv_section_value(section, "from")->real, sizeof disorder->from);
        memcpy(disorder->to, sv_section_value(section, "to")->real, sizeof disorder->to);
        return sv_section_needs(reader, section, "from to") &&
               sv_section_rejects(reader, section, "density length lengths angle",
                                  "has no meaning beside from and to");
    }
    disorder->density = sv_section_real(section, "density");
    disorder->length = sv_section_real(section, "length");
    disorder->exponential = sv_section_choice(section, "lengths", lengths, 2) == 1;
    disorder->has_angle = sv_section_value(section, "angle")->present;
    disorder->angle = sv_section_real(section, "angle");
    return sv_section_needs(reader, section, "density length");
}

bool sv_use_domains(sv_reader *reader, const sv_section *section, const sv_model *model,
                    sv_disorder *disorder)
{
    const sv_value *change = sv_section_value(section, "change");
    if (!sv_use_term(reader, section, model, disorder))
        return false;
    disorder->length = sv_section_real(section, "size");
    disorder->share = sv_section_real(section, "share");
    disorder->wall = sv_section_real(section, "wall");
    disorder->jump = change->real[0];
    if (!change->has_auto)
        return true;
    if (disorder->term == SV_FIELD_POTENTIAL)
        return sv_report(reader, sv_section_node(section, "change"), "give an energy",
                         "%s.change: a potential has no sign to flip", section->path);
    disorder->jump = -2.0 * model->fields[disorder->term].value;
    return true;
}

bool sv_use_roughness(sv_reader *reader, const sv_section *section, const sv_model *model,
                      sv_disorder *disorder)
{
    static const char *const covariances[] = {"gaussian", "exponential"};
    (void)model;
    disorder->amplitude = sv_section_real(section, "amplitude");
    disorder->length = sv_section_real(section, "correlation_length");
    disorder->covariance = (sv_covariance)sv_section_choice(section, "covariance", covariances, 2);
    return !(reader->setup->flake.periodic[0] && reader->setup->flake.periodic[1]) ||
           sv_report(reader, section->anchor, "flake.boundary: open", "%s: a torus has no edge",
                     section->path);
}

bool sv_use_steps(sv_reader *reader, const sv_section *section, const sv_model *model,
                  sv_disorder *disorder)
{
    if (!sv_use_term(reader, section, model, disorder) ||
        !sv_section_needs(reader, section, "at angle"))
        return false;
    memcpy(disorder->from, sv_section_value(section, "at")->real, sizeof disorder->from);
    disorder->angle = sv_section_real(section, "angle");
    disorder->jump = sv_section_real(section, "jump");
    disorder->spacing = sv_section_real(section, "spacing");
    disorder->amplitude = sv_section_real(section, "meander");
    disorder->length = sv_section_real(section, "correlation_length");
    return sv_section_written(section, "meander") ==
               sv_section_written(section, "correlation_length") ||
           sv_report(reader, section->anchor, "a meander has a standard deviation and a length",
                     "%s: meander and correlation_length go together", section->path);
}
