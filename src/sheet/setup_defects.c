/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Keys of the kinds that remove positions or add energies → sv_disorder. */
#include "sheet_internal.h"

#include <math.h>
#include <stdio.h>
#include <string.h>

/* e²/(4π ε0) in eV nm, from the exact e and c and the CODATA 2018 fine-structure constant (value
 * recalled from memory). */
static const double COULOMB = 1.4399645478;

void sv_section_drop_defaults(const sv_section *section, const char *keys)
{
    for (int i = 0; i < section->n_fields; i++)
        if (!section->values[i].written && sv_words_hold(keys, section->fields[i].key->name))
            section->values[i].present = false;
}

bool sv_section_needs(sv_reader *reader, const sv_section *section, const char *keys)
{
    for (int i = 0; i < section->n_fields; i++) {
        const sv_key *key = section->fields[i].key;
        if (sv_words_hold(keys, key->name) && !section->values[i].present)
            return sv_report(reader, section->anchor, key->doc, "%s.%s is missing", section->path,
                             key->name);
    }
    return true;
}

bool sv_section_rejects(sv_reader *reader, const sv_section *section, const char *keys,
                        const char *why)
{
    sv_section_drop_defaults(section, keys);
    return sv_section_none_of(reader, section, keys, why);
}

double sv_section_real(const sv_section *section, const char *key)
{
    return sv_section_value(section, key)->real[0];
}

int sv_section_choice(const sv_section *section, const char *key, const char *const *words, int n)
{
    const char *word = sv_section_value(section, key)->text;
    for (int i = 0; word != NULL && i < n; i++)
        if (strcmp(words[i], word) == 0)
            return i;
    return 0;
}

/* Positions per area that can hold a defect. */
static double positions_per_area(const sv_model *model, const sv_disorder *disorder)
{
    double positions = disorder->on < 0 ? (double)model->n_positions : 1.0;
    return positions / sv_model_cell_area(model);
}

/* Defects per area → probability per position that can hold one. */
static bool use_density(sv_reader *reader, const sv_section *section, const sv_model *model,
                        const char *key, double density, sv_disorder *disorder)
{
    double per_area = positions_per_area(model, disorder), a = reader->lattice_constant;
    char hint[200];
    disorder->share = density / per_area;
    if (disorder->share <= 1.0)
        return true;
    if (a > 0.0)
        snprintf(hint, sizeof hint, "there are %.4g positions per cm^2", per_area / (a * a) * 1e14);
    else
        snprintf(hint, sizeof hint, "there are %.4g positions per lattice constant squared",
                 per_area);
    return sv_report(reader, sv_section_node(section, key), hint,
                     "%s.%s: %.4g defects per position, more than one", section->path, key,
                     disorder->share);
}

bool sv_use_amount(sv_reader *reader, const sv_section *section, const sv_model *model,
                   sv_disorder *disorder)
{
    disorder->has_count = sv_section_value(section, "count")->present;
    disorder->count = sv_section_value(section, "count")->integer[0];
    disorder->has_share = sv_section_written(section, "share density volume_density") > 0;
    disorder->share = sv_section_real(section, "share");
    if (sv_section_written(section, "volume_density") > 0)
        return sv_section_needs(reader, section, "thickness") &&
               use_density(reader, section, model, "volume_density",
                           sv_section_real(section, "volume_density") *
                               sv_section_real(section, "thickness"),
                           disorder);
    if (!sv_section_none_of(reader, section, "thickness", "has no meaning without volume_density"))
        return false;
    return sv_section_written(section, "density") == 0 ||
           use_density(reader, section, model, "density", sv_section_real(section, "density"),
                       disorder);
}

static bool use_clusters(sv_reader *reader, const sv_section *section, sv_disorder *disorder)
{
    disorder->cluster_size = sv_section_real(section, "cluster_size");
    disorder->cluster_radius = sv_section_real(section, "cluster_radius");
    return sv_section_needs(reader, section, "cluster_size cluster_radius") &&
           sv_section_none_of(reader, section, "count file distance",
                              "has no meaning beside clusters; give share or density");
}

static const char *amount_key(const sv_section *section)
{
    return sv_section_written(section, "share") > 0     ? "share"
           : sv_section_written(section, "density") > 0 ? "density"
                                                        : "volume_density";
}

static bool use_distance(sv_reader *reader, const sv_section *section, const sv_model *model,
                         sv_disorder *disorder)
{
    char hint[200];
    disorder->distance = sv_section_real(section, "distance");
    if (!sv_section_none_of(reader, section, "file", "has no meaning beside distance"))
        return false;
    /* Half the circles of radius distance/2 would cover far more than any count of sites. */
    if (disorder->distance > 100.0)
        return sv_report(reader, sv_section_node(section, "distance"), NULL,
                         "%s.distance: %.4g lattice constants are more than 100", section->path,
                         disorder->distance);
    double limit = sv_disorder_share_limit(model, disorder);
    if (!disorder->has_share || disorder->share <= limit)
        return true;
    double per_area = limit * positions_per_area(model, disorder), a = reader->lattice_constant;
    if (a > 0.0)
        snprintf(hint, sizeof hint, "at most share %.4g, which is %.4g cm^-2", limit,
                 per_area / (a * a) * 1e14);
    else
        snprintf(hint, sizeof hint, "at most share %.4g", limit);
    return sv_report(reader, sv_section_node(section, amount_key(section)), hint,
                     "%s: a share of %.4g is more than the minimum distance allows", section->path,
                     disorder->share);
}

bool sv_use_vacancies(sv_reader *reader, const sv_section *section, const sv_model *model,
                      sv_disorder *disorder)
{
    if (!sv_section_one_of(reader, section, "share density volume_density count file") ||
        !sv_use_amount(reader, section, model, disorder))
        return false;
    disorder->charge = sv_section_real(section, "charge");
    if (sv_section_written(section, "cluster_size cluster_radius") > 0)
        return use_clusters(reader, section, disorder);
    return sv_section_written(section, "distance") == 0 ||
           use_distance(reader, section, model, disorder);
}

static bool use_permittivity(sv_reader *reader, const sv_section *section, sv_disorder *disorder)
{
    double a = reader->lattice_constant, unit = reader->setup->energy_unit;
    if (a <= 0.0 || unit <= 0.0)
        return sv_report(reader, sv_section_node(section, "permittivity"),
                         "give strength, or the lattice constant and energies with units",
                         "%s.permittivity needs model.lattice_constant and an energy unit",
                         section->path);
    disorder->strength = COULOMB /
                         (sv_section_real(section, "permittivity") * disorder->depth * a * unit) *
                         exp(-disorder->depth / disorder->screening);
    return true;
}

static bool use_puddles(sv_reader *reader, const sv_section *section, sv_disorder *disorder)
{
    static const char *const signs[] = {"random", "same"};
    if (!sv_section_rejects(reader, section, "width per correlation_length covariance",
                            "has no meaning for puddles") ||
        !sv_section_one_of(reader, section, "density source") ||
        !sv_section_one_of(reader, section, "strength permittivity") ||
        !sv_section_needs(reader, section, "distance screening_length"))
        return false;
    const char *source = sv_section_value(section, "source")->text;
    snprintf(disorder->source, sizeof disorder->source, "%s", source != NULL ? source : "");
    if (source != NULL &&
        !sv_section_rejects(reader, section, "sign", "follows from the charge of the source"))
        return false;
    disorder->density = sv_section_real(section, "density");
    disorder->depth = sv_section_real(section, "distance");
    disorder->screening = sv_section_real(section, "screening_length");
    disorder->strength = sv_section_real(section, "strength");
    disorder->same_sign = sv_section_choice(section, "sign", signs, 2) == 1;
    return sv_section_written(section, "permittivity") == 0 ||
           use_permittivity(reader, section, disorder);
}

/* Width, law and covariance of onsite and mass. */
static bool use_law(sv_reader *reader, const sv_section *section, sv_disorder *disorder)
{
    static const char *const covariances[] = {"gaussian", "exponential"};
    if (sv_section_written(section, "width") == 0)
        return sv_report(reader, section->anchor,
                         "box: the full width; gaussian, correlated: the standard "
                         "deviation; binary: the splitting",
                         "%s.width is missing", section->path);
    disorder->width = sv_section_real(section, "width");
    disorder->per_cell = strcmp(sv_section_value(section, "per")->text, "cell") == 0;
    if (disorder->distribution != SV_CORRELATED)
        return sv_section_rejects(reader, section, "correlation_length covariance",
                                  "belongs to distribution: correlated");
    disorder->length = sv_section_real(section, "correlation_length");
    disorder->covariance = (sv_covariance)sv_section_choice(section, "covariance", covariances, 2);
    return sv_section_needs(reader, section, "correlation_length");
}

static const char *const laws[] = {[SV_BOX] = "box",
                                   [SV_GAUSSIAN] = "gaussian",
                                   [SV_BINARY] = "binary",
                                   [SV_CORRELATED] = "correlated",
                                   [SV_PUDDLES] = "puddles"};

static const char LAW_KEYS[] = "width per correlation_length covariance";
static const char PUDDLE_KEYS[] =
    "density source distance screening_length strength permittivity sign";

bool sv_use_onsite(sv_reader *reader, const sv_section *section, const sv_model *model,
                   sv_disorder *disorder)
{
    (void)model;
    if (!sv_section_one_of(reader, section, "distribution file"))
        return false;
    if (sv_section_written(section, "file") > 0)
        return sv_section_rejects(reader, section, LAW_KEYS, "has no meaning beside file") &&
               sv_section_rejects(reader, section, PUDDLE_KEYS, "has no meaning beside file");
    disorder->distribution = (sv_distribution)sv_section_choice(section, "distribution", laws, 5);
    if (disorder->distribution == SV_PUDDLES)
        return use_puddles(reader, section, disorder);
    return sv_section_rejects(reader, section, PUDDLE_KEYS, "belongs to distribution: puddles") &&
           use_law(reader, section, disorder);
}

bool sv_use_term(sv_reader *reader, const sv_section *section, const sv_model *model,
                 sv_disorder *disorder)
{
    const char *term = sv_section_value(section, "term")->text;
    char hint[400];
    disorder->term = sv_model_find_field(model, term);
    if (disorder->term != SV_NO_FIELD)
        return true;
    sv_suggestion suggestion = sv_suggest_start(term);
    sv_suggest_name(&suggestion, "potential");
    for (int f = 0; f < model->n_fields; f++)
        sv_suggest_name(&suggestion, model->fields[f].name);
    sv_suggest_hint(&suggestion, hint, sizeof hint);
    return sv_report(reader, sv_section_node(section, "term"), hint,
                     "%s.term: the model %s has no %.60s", section->path, model->name, term);
}

/* Energy × area comes in nm² once there is a scale. */
static bool use_point_defects(sv_reader *reader, const sv_section *section, sv_disorder *disorder)
{
    double a = reader->lattice_constant;
    disorder->strength = sv_section_real(section, "strength") / (a > 0.0 ? a * a : 1.0);
    disorder->density = sv_section_real(section, "density");
    return sv_section_rejects(reader, section, LAW_KEYS, "has no meaning beside strength") &&
           sv_section_needs(reader, section, "density");
}

bool sv_use_mass(sv_reader *reader, const sv_section *section, const sv_model *model,
                 sv_disorder *disorder)
{
    if (!sv_use_term(reader, section, model, disorder) ||
        !sv_section_one_of(reader, section, "distribution strength file"))
        return false;
    if (sv_section_written(section, "file") > 0)
        return sv_section_rejects(reader, section, LAW_KEYS, "has no meaning beside file") &&
               sv_section_rejects(reader, section, "density", "has no meaning beside file");
    if (sv_section_written(section, "strength") > 0)
        return use_point_defects(reader, section, disorder);
    disorder->distribution = (sv_distribution)sv_section_choice(section, "distribution", laws, 5);
    return sv_section_rejects(reader, section, "density", "belongs to strength") &&
           use_law(reader, section, disorder);
}
