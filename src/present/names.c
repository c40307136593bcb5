/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Readable names of markers and swept parameters. */
#include <math.h>
#include <stdio.h>
#include <string.h>

#include "present_internal.h"

static const struct {
    const char *name, *words, *margin, *weakest, *symbol; /* NULL: that of the Chern number */
} markers[] = {
    {"local_chern", "local Chern marker", "level_spacing", NULL, NULL},
    {"bott", "Bott index", "angle_margin", "smallest_modulus", NULL},
    {"localizer", "localizer index", "gap", NULL, NULL},
    {"three_sector", "three-sector number", NULL, NULL, NULL},
    {"crosshair", "crosshair marker", NULL, NULL, NULL},
    {"spin_chern", "spin Chern number", "spin_gap", NULL, "spin C"},
    {"spin_bott", "spin Bott index", "spin_gap", "smallest_modulus", "spin C"},
    {"density_response", "density response", "nearest_level", "level_movement", NULL},
    {"spectral_flow", "spectral flow", "edge_weight", "followed", NULL},
};

static int find_marker(const char *name)
{
    for (size_t i = 0; i < sizeof markers / sizeof *markers; i++)
        if (strcmp(markers[i].name, name) == 0)
            return (int)i;
    return -1;
}

const char *sv_words_marker(const char *name)
{
    const int row = find_marker(name);
    return row < 0 ? name : markers[row].words;
}

const char *sv_words_symbol(const char *name)
{
    const int row = find_marker(name);
    return row < 0 || markers[row].symbol == NULL ? "C" : markers[row].symbol;
}

bool sv_words_estimated(const sv_summary *summary)
{
    return summary->exists && !summary->is_index && summary->estimator_error > 0.0;
}

const char *sv_words_margin(const char *name)
{
    const int row = find_marker(name);
    return row < 0 ? "margin" : markers[row].margin;
}

const char *sv_words_weakest(const char *name)
{
    const int row = find_marker(name);
    return row < 0 ? "weakest" : markers[row].weakest;
}

/* Words for the last part of a path below `disorder.NAME`; %s stands for the name. */
static const struct {
    const char *key, *words;
} disorder_keys[] = {
    {"share", "share (%s)"},
    {"count", "number (%s)"},
    {"density", "density (%s)"},
    {"volume_density", "defect density per volume (%s)"},
    {"cluster_size", "mean number of defects per cluster (%s)"},
    {"cluster_radius", "radius of the clusters (%s)"},
    {"distance", "distance (%s)"},
    {"correlation_length", "correlation length (%s)"},
    {"screening_length", "screening length (%s)"},
    {"strength", "strength (%s)"},
    {"width", "disorder width (%s; box: full width)"},
    {"phase", "phase of the bonds (%s; box: full width)"},
    {"coupling", "hop to an adatom (%s)"},
    {"energy", "energy of an adatom (%s)"},
    {"charge", "charge of a vacancy (%s)"},
    {"permittivity", "relative permittivity (%s)"},
    {"length", "length of a crack (%s)"},
    {"angle", "direction (%s)"},
    {"size", "size of a domain (%s)"},
    {"wall", "width of the walls (%s)"},
    {"change", "energy added in changed domains (%s)"},
    {"amplitude", "deepest notch of the edges (%s)"},
    {"jump", "energy of a step (%s)"},
    {"spacing", "width of the terraces (%s)"},
    {"meander", "meander of the steps (%s)"},
};

static const struct {
    const char *path, *words;
} known_paths[] = {
    {"occupation.fermi_energy", "Fermi energy"},
    {"occupation.filling", "filling (share of the states present)"},
    {"occupation.electrons", "number of electrons"},
    {"model.phi", "phase phi of the hops"},
    {"model.t1", "nearest-neighbour hop t1"},
    {"model.t2", "second-neighbour hop t2"},
    {"model.mass", "mass of the model"},
    {"model.so", "spin-orbit hop"},
    {"model.rashba", "Rashba hop"},
    {"model.exchange", "exchange energy"},
    {"model.m0", "hybridisation m0 of the surfaces"},
    {"model.m1", "curvature m1 of the hybridisation"},
    {"model.velocity", "velocity hbar v of the surfaces"},
    {"model.grid", "spacing of the grid"},
    {"flake.cells", "cells along a side of the flake"},
    {"flake.size", "length of a side of the flake"},
    {"flake.side", "length of a side of the flake"},
    {"flake.radius", "radius of the flake"},
    {"flake.inner", "inner radius of the ring"},
    {"flake.outer", "outer radius of the ring"},
    {"flake.orientation", "angle of the lattice against the outline"},
    {"markers.localizer.kappa", "kappa of the localizer"},
    {"markers.local_chern.window", "averaging window (share of the linear size)"},
    {"model.m", "mass parameter m of the model"},
};

/* Splits `disorder.NAME.KEY`; false for other paths. */
static bool split_disorder(const char *path, char *name, size_t size, const char **ret_key)
{
    static const char prefix[] = "disorder.";
    const char *key = strrchr(path, '.');
    if (strncmp(path, prefix, sizeof prefix - 1) != 0 || key < path + sizeof prefix - 1)
        return false;
    const char *start = path + sizeof prefix - 1;
    if ((size_t)(key - start) >= size)
        return false;
    memcpy(name, start, (size_t)(key - start));
    name[key - start] = '\0';
    *ret_key = key + 1;
    return true;
}

/* The one place of `%s` in a text of the table above. */
static void fill_in(const char *words, const char *name, char *text, size_t size)
{
    const char *place = strstr(words, "%s");
    snprintf(text, size, "%.*s%s%s", (int)(place - words), words, name, place + 2);
}

/* Words for a path; without a written unit the model's own holds, radian for angles. */
static void describe_path(const char *path, char *text, size_t size)
{
    char name[128], clean[160];
    const char *key = NULL;
    if (split_disorder(path, name, sizeof name, &key))
        for (size_t i = 0; i < sizeof disorder_keys / sizeof *disorder_keys; i++)
            if (strcmp(key, disorder_keys[i].key) == 0) {
                sv_text_clean(name, clean, sizeof clean);
                fill_in(disorder_keys[i].words, clean, text, size);
                return;
            }
    for (size_t i = 0; i < sizeof known_paths / sizeof *known_paths; i++)
        if (strcmp(path, known_paths[i].path) == 0) {
            snprintf(text, size, "%s", known_paths[i].words);
            return;
        }
    sv_text_clean(path, text, size);
}

void sv_words_parameter(const sv_coordinate *coordinate, char *text, size_t size)
{
    char words[300];
    if (coordinate->label != NULL) {
        sv_text_clean(coordinate->label, text, size);
        return;
    }
    describe_path(coordinate->path, words, sizeof words);
    snprintf(text, size, "%s%s%s%s", words, coordinate->unit != NULL ? " [" : "",
             coordinate->unit != NULL ? coordinate->unit : "", coordinate->unit != NULL ? "]" : "");
}

void sv_words_column(const sv_coordinate *coordinate, char *text, size_t size)
{
    char clean[400];
    sv_text_clean(coordinate->path, clean, sizeof clean);
    snprintf(text, size, "%s%s%s%s", clean, coordinate->unit != NULL ? " [" : "",
             coordinate->unit != NULL ? coordinate->unit : "", coordinate->unit != NULL ? "]" : "");
}

/* Shortest text that reads back the same; 10 as "10", not in powers of ten. */
void sv_words_real(double value, char *text, size_t size)
{
    const double plain = value + 0.0; /* no minus before a zero */
    char word[40];
    sv_format_real(plain, word, sizeof word);
    /* The exponent form of a number in this range means trailing zeros, hence an integer. */
    if (strchr(word, 'e') != NULL && fabs(plain) >= 1 && fabs(plain) < 1e7)
        snprintf(word, sizeof word, "%.0f", plain);
    snprintf(text, size, "%s", word);
}

static void one_number(const sv_coordinate *coordinate, double value, char *text, size_t size)
{
    if (coordinate->integer && fabs(value) < 9e15)
        snprintf(text, size, "%lld", (long long)value);
    else
        sv_words_real(value, text, size);
}

void sv_words_value(const sv_coordinate *coordinate, char *text, size_t size)
{
    char second[40];
    one_number(coordinate, coordinate->value, text, size);
    if (!coordinate->pair)
        return;
    const size_t used = strlen(text);
    one_number(coordinate, coordinate->second, second, sizeof second);
    snprintf(text + used, size - used, "x%s", second);
}

int64_t sv_words_realisations(const sv_result *result, char *text, size_t size)
{
    int64_t least = INT64_MAX, most = 0;
    for (int32_t i = 0; i < result->n_points; i++) {
        least = result->points[i].realisations < least ? result->points[i].realisations : least;
        most = result->points[i].realisations > most ? result->points[i].realisations : most;
    }
    if (least == most)
        snprintf(text, size, "%lld", (long long)most);
    else
        snprintf(text, size, "%lld to %lld", (long long)least, (long long)most);
    return most;
}
