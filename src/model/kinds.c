/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Published models by name: one key table and one builder each. */
#include "selvedge/model.h"

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

static const sv_key custom_keys[] = {
    {.name = "vectors",
     .type = SV_KEY_TREE,
     .required = true,
     .doc = "[[x, y], [x, y]]: lattice vectors, right-handed, in lattice constants"},
    {.name = "orbitals",
     .type = SV_KEY_TREE,
     .required = true,
     .doc = "[{name: a, at: [x, y]}, …]: orbitals of the cell"},
    {.name = "onsite", .type = SV_KEY_TREE, .doc = "{a: 0.5, …}: on-site energies (default 0)"},
    {.name = "hops",
     .type = SV_KEY_TREE,
     .doc = "[{from: a, to: b, shift: [i, j], amplitude: [re, im]}, …]; each once"},
    {.name = "flux",
     .type = SV_KEY_INTEGER_PAIR,
     .low = -1e6,
     .high = 1e6,
     .fallback = "[0, 1]",
     .doc = "[p, q]: p/q flux quanta per cell"},
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
    KIND("custom", "own vectors, orbitals, on-site terms, hops and flux", custom_keys),
};

const sv_kind *sv_model_kinds(int *ret_count)
{
    *ret_count = (int)(sizeof kinds / sizeof kinds[0]);
    return kinds;
}

/* Passes a failure on; keeps the builders readable. */
#define TRY(call)                                                                                  \
    do {                                                                                           \
        sv_status try_status = (call);                                                             \
        if (try_status != SV_OK)                                                                   \
            return try_status;                                                                     \
    } while (0)

/* F. D. M. Haldane, Phys. Rev. Lett. 61, 2015 (1988). */
static sv_status make_haldane(sv_context *context, const sv_value *values, sv_model *model)
{
    const double a1[2] = {1.0, 0.0}, a2[2] = {0.5, sqrt(3.0) / 2.0};
    double t1 = values[0].real[0], t2 = values[1].real[0];
    double phi = values[2].real[0], mass = values[3].real[0];
    enum { A, B };
    TRY(sv_model_begin(context, "haldane", a1, a2, model));
    TRY(sv_model_add_orbital(context, model, "A", 0.0, 0.0, mass));
    TRY(sv_model_add_orbital(context, model, "B", (a1[0] + a2[0]) / 3.0, (a1[1] + a2[1]) / 3.0,
                             -mass));
    TRY(sv_model_add_hop(context, model, A, B, 0, 0, t1));
    TRY(sv_model_add_hop(context, model, A, B, -1, 0, t1));
    TRY(sv_model_add_hop(context, model, A, B, 0, -1, t1));
    /* A → A' over their common B turns right (clockwise) for these shifts; on B for the opposite
     * ones. */
    const int clockwise[3][2] = {{1, 0}, {-1, 1}, {0, -1}};
    sv_complex amplitude = CMPLX(t2 * cos(phi), t2 * sin(phi));
    for (int k = 0; k < 3; k++) {
        int i = clockwise[k][0], j = clockwise[k][1];
        TRY(sv_model_add_hop(context, model, A, A, i, j, amplitude));
        TRY(sv_model_add_hop(context, model, B, B, -i, -j, amplitude));
    }
    TRY(sv_model_add_field(context, model, "mass", mass));
    TRY(sv_model_add_field_term(context, model, A, A, 1.0));
    TRY(sv_model_add_field_term(context, model, B, B, -1.0));
    return SV_OK;
}

/* X.-L. Qi, Y.-S. Wu, S.-C. Zhang, Phys. Rev. B 74, 085308 (2006). */
static sv_status make_qi_wu_zhang(sv_context *context, const sv_value *values, sv_model *model)
{
    const double a1[2] = {1.0, 0.0}, a2[2] = {0.0, 1.0};
    double m = values[0].real[0];
    enum { A, B };
    TRY(sv_model_begin(context, "qi_wu_zhang", a1, a2, model));
    TRY(sv_model_add_orbital(context, model, "a", 0.0, 0.0, m));
    TRY(sv_model_add_orbital(context, model, "b", 0.0, 0.0, -m));
    /* ⟨R+x|H|R⟩ = (sz + i sx)/2, ⟨R+y|H|R⟩ = (sz + i sy)/2 */
    TRY(sv_model_add_hop(context, model, A, A, 1, 0, 0.5));
    TRY(sv_model_add_hop(context, model, B, B, 1, 0, -0.5));
    TRY(sv_model_add_hop(context, model, A, B, 1, 0, CMPLX(0.0, 0.5)));
    TRY(sv_model_add_hop(context, model, B, A, 1, 0, CMPLX(0.0, 0.5)));
    TRY(sv_model_add_hop(context, model, A, A, 0, 1, 0.5));
    TRY(sv_model_add_hop(context, model, B, B, 0, 1, -0.5));
    TRY(sv_model_add_hop(context, model, A, B, 0, 1, -0.5));
    TRY(sv_model_add_hop(context, model, B, A, 0, 1, 0.5));
    TRY(sv_model_add_field(context, model, "mass", m));
    TRY(sv_model_add_field_term(context, model, A, A, 1.0));
    TRY(sv_model_add_field_term(context, model, B, B, -1.0));
    return SV_OK;
}

/* D. R. Hofstadter, Phys. Rev. B 14, 2239 (1976). */
static sv_status make_hofstadter(sv_context *context, const sv_value *values, sv_model *model)
{
    const double a1[2] = {1.0, 0.0}, a2[2] = {0.0, 1.0};
    TRY(sv_model_begin(context, "hofstadter", a1, a2, model));
    TRY(sv_model_add_orbital(context, model, "a", 0.0, 0.0, 0.0));
    TRY(sv_model_add_hop(context, model, 0, 0, 1, 0, -1.0));
    TRY(sv_model_add_hop(context, model, 0, 0, 0, 1, -1.0));
    TRY(sv_model_set_flux(context, model, (int)values[0].integer[0], (int)values[0].integer[1]));
    return SV_OK;
}

static const struct {
    const char *name;
    sv_status (*make)(sv_context *context, const sv_value *values, sv_model *model);
} builders[] = {
    {"haldane", make_haldane},
    {"qi_wu_zhang", make_qi_wu_zhang},
    {"hofstadter", make_hofstadter},
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
