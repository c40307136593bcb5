/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Published models by name: one key table and one builder each. */
#include "model_internal.h"

#include <math.h>
#include <string.h>

static const double HUGE_ENERGY = 1e12;

#define ENERGY_KEY(name_, fallback_, required_, doc_)                                              \
    {                                                                                              \
        .name = name_, .type = SV_KEY_REAL, .dimension = SV_DIM_ENERGY, .low = -1e12,              \
        .high = 1e12, .fallback = fallback_, .required = required_, .doc = doc_                    \
    }

static const sv_key haldane_keys[] = {
    ENERGY_KEY("t1", "1", false, "nearest-neighbour hop"),
    ENERGY_KEY("t2", NULL, true, "second-neighbour hop; clockwise hops carry exp(+i phi)"),
    {.name = "phi",
     .type = SV_KEY_REAL,
     .dimension = SV_DIM_ANGLE,
     .low = -1e3,
     .high = 1e3,
     .required = true,
     .doc = "phase of the clockwise second-neighbour hops"},
    ENERGY_KEY("mass", "0", false, "on-site energy +mass on A, -mass on B"),
};

static const sv_key qi_wu_zhang_keys[] = {
    ENERGY_KEY("m", NULL, true, "mass: H(k) = sin kx sx + sin ky sy + (m + cos kx + cos ky) sz"),
};

static const sv_key hofstadter_keys[] = {
    {.name = "flux",
     .type = SV_KEY_INTEGER_PAIR,
     .low = -1e6,
     .high = 1e6,
     .required = true,
     .doc = "[p, q]: p/q flux quanta per cell"},
};

static const sv_key kagome_keys[] = {
    ENERGY_KEY("t", "1", false, "nearest-neighbour hop"),
    {.name = "phi",
     .type = SV_KEY_REAL,
     .dimension = SV_DIM_ANGLE,
     .low = -1e3,
     .high = 1e3,
     .required = true,
     .doc = "phase exp(+i phi) of the hops that go counter-clockwise around a triangle"},
};

static const sv_key kane_mele_keys[] = {
    ENERGY_KEY("t1", "1", false, "nearest-neighbour hop"),
    ENERGY_KEY("so", NULL, true,
               "intrinsic spin-orbit hop to second neighbours: clockwise +i for spin up, -i down"),
    ENERGY_KEY("rashba", "0", false, "Rashba hop i rashba (s x d)_z, d the unit vector of the hop"),
    ENERGY_KEY("mass", "0", false, "on-site energy +mass on A, -mass on B"),
};

static const sv_key magnetic_film_keys[] = {
    {.name = "grid",
     .type = SV_KEY_REAL,
     .dimension = SV_DIM_LENGTH,
     .low = 0,
     .low_open = true,
     .high = 1e9,
     .required = true,
     .doc = "spacing of the square grid, bare in nm; it is the lattice constant of this model"},
    {.name = "velocity",
     .type = SV_KEY_REAL,
     .dimension = SV_DIM_ENERGY_LENGTH,
     .low = 0,
     .low_open = true,
     .high = 1e12,
     .required = true,
     .doc = "hbar v of the surface states, bare in energy units x nm"},
    ENERGY_KEY("m0", NULL, true, "hybridisation of the two surfaces: m(k) = m0 + m1 k^2"),
    {.name = "m1",
     .type = SV_KEY_REAL,
     .dimension = SV_DIM_ENERGY_AREA,
     .low = -1e12,
     .high = 1e12,
     .required = true,
     .doc = "its curvature, bare in energy units x nm^2"},
    ENERGY_KEY("exchange", NULL, true, "exchange energy g of the magnetic order: g sz"),
};

static const sv_key custom_keys[] = {
    {.name = "vectors",
     .type = SV_KEY_TREE,
     .required = true,
     .doc = "[[x, y], [x, y]]: lattice vectors, right-handed, in lattice constants"},
    {.name = "orbitals",
     .type = SV_KEY_TREE,
     .required = true,
     .doc = "[{name: a, at: [x, y], spin: up}, …]: orbitals of the cell; spin may be left out"},
    {.name = "onsite", .type = SV_KEY_TREE, .doc = "{a: 0.5, …}: on-site energies (default 0)"},
    {.name = "hops",
     .type = SV_KEY_TREE,
     .doc = "[{from: a, to: b, shift: [i, j], amplitude: [re, im]}, …]; each once"},
    {.name = "hops_file",
     .type = SV_KEY_FILE,
     .doc =
         "CSV table of hops: from,to,shift_i,shift_j,re,im, as re [meV] with a unit; also on-site"},
    {.name = "flux",
     .type = SV_KEY_INTEGER_PAIR,
     .low = -1e6,
     .high = 1e6,
     .fallback = "[0, 1]",
     .doc = "[p, q]: p/q flux quanta per cell"},
};

static const sv_key by_distance_keys[] = {
    {.name = "species",
     .type = SV_KEY_TREE,
     .required = true,
     .doc = "[{name: A, onsite: 0.2}, …]: species of the file, one orbital each; onsite 0"},
    {.name = "hops",
     .type = SV_KEY_TREE,
     .required = true,
     .doc = "[{between: [A, B], distance: r0, tolerance: d, amplitude: t}, …]: shells; decay: l "
            "and cutoff: t exp(-(r - r0)/l); phase: angle, by the turn over the common neighbour"},
};

#define KIND(name_, doc_, keys_)                                                                   \
    {                                                                                              \
        .name = name_, .doc = doc_, .keys = keys_, .n_keys = (int)(sizeof keys_ / sizeof keys_[0]) \
    }

static const sv_kind kinds[] = {
    KIND("haldane", "honeycomb, complex second-neighbour hops (Haldane 1988)", haldane_keys),
    KIND("qi_wu_zhang", "square, two orbitals (Qi, Wu, Zhang 2006)", qi_wu_zhang_keys),
    KIND("hofstadter", "square, one orbital, p/q flux quanta per cell (Hofstadter 1976)",
         hofstadter_keys),
    KIND("kagome",
         "kagome lattice, complex nearest hops; C = +1 for 0 < phi < pi/3 and t > 0, at "
         "filling 1/3 and 2/3",
         kagome_keys),
    KIND("kane_mele",
         "honeycomb with spin (Kane, Mele 2005); spin Chern number +1 for so > 0 inside "
         "the lobe",
         kane_mele_keys),
    KIND("magnetic_film",
         "thin film of a magnetic topological insulator (Yu et al. 2010); C = "
         "sign(exchange) when |exchange| > |m0|",
         magnetic_film_keys),
    KIND("custom", "own vectors, orbitals, on-site terms, hops and flux", custom_keys),
    KIND("by_distance", "hops by distance between the sites of a structure (flake: structure)",
         by_distance_keys),
};

const sv_kind *sv_model_kinds(int *ret_count)
{
    *ret_count = (int)(sizeof kinds / sizeof kinds[0]);
    return kinds;
}

static const struct {
    const char *name;
    sv_status (*make)(sv_context *context, const sv_value *values, sv_model *model);
} builders[] = {
    {"haldane", sv_make_haldane},       {"qi_wu_zhang", sv_make_qi_wu_zhang},
    {"hofstadter", sv_make_hofstadter}, {"kagome", sv_make_kagome},
    {"kane_mele", sv_make_kane_mele},   {"magnetic_film", sv_make_magnetic_film},
};

sv_status sv_model_make(sv_context *context, const sv_kind *kind, const sv_value *values,
                        sv_model *ret_model)
{
    sv_model model = {.flux = {0, 1}};
    for (size_t i = 0; i < sizeof builders / sizeof builders[0]; i++) {
        if (strcmp(builders[i].name, kind->name) != 0)
            continue;
        sv_status status = builders[i].make(context, values, &model);
        if (status == SV_OK && !(sv_model_norm_bound(&model) < HUGE_ENERGY))
            status = SV_FAIL(context, SV_INVALID_INPUT, "the model's energies are too large");
        if (status == SV_OK)
            status = sv_model_finish(context, &model);
        if (status == SV_OK)
            *ret_model = model;
        else
            sv_model_free(context, &model);
        return status;
    }
    return SV_FAIL(context, SV_INVALID_INPUT, "model %s cannot be made by name", kind->name);
}
