/* SPDX-License-Identifier: GPL-3.0-or-later */
/**
 * @file model.h
 * Layer 3: the clean lattice model: vectors, orbitals, hops, flux. Conventions: conventions.h.
 */
#ifndef SELVEDGE_MODEL_H
#define SELVEDGE_MODEL_H

#include "base.h"
#include "conventions.h"

#ifdef __cplusplus
extern "C" {
#endif

/** An orbital of the cell. Several orbitals may share one position. */
typedef struct sv_orbital {
    char name[32];  /**< case-sensitive */
    double at[2];   /**< Cartesian position in the cell, lattice constants */
    double onsite;  /**< diagonal energy, unit of the model */
    int position;   /**< number of its position among the distinct positions of the cell */
    int spin;       /**< +1: up, −1: down, 0: no spin is stated */
    double coupled; /**< sum of the |amplitude| of the hops that end here */
} sv_orbital;

/** amplitude = ⟨to, cell R + shift|H|from, cell R⟩; the conjugate element follows. */
typedef struct sv_hop {
    int from, to;
    int shift[2];
    sv_complex amplitude;
} sv_hop;

enum {
    SV_MODEL_FIELDS = 4,     /**< local operators a model may name */
    SV_FIELD_TERMS = 16,     /**< terms of one of them */
    SV_FIELD_POTENTIAL = -1, /**< stands for the identity, which every model has */
    SV_NO_FIELD = -2
};

/** amplitude = ⟨to|O|from⟩ of a local operator; the conjugate element follows when to ≠ from. */
typedef struct sv_field_term {
    int to, from; /**< orbitals at one position */
    sv_complex amplitude;
} sv_field_term;

/**
 * A local operator O of the model by name ("mass", "exchange"): disorder adds Σ_R δ(R) O(R) with
 * δ an energy per position or cell.
 */
typedef struct sv_model_field {
    char name[16];
    double value; /**< its coefficient in the clean model, unit of the model */
    sv_field_term terms[SV_FIELD_TERMS];
    int n_terms;
} sv_model_field;

/**
 * Hops by distance, for structures without cells. Sites of the two species at a distance r are
 * joined by
 *  - a shell (decay 0): amplitude when |r − distance| ≤ tolerance;
 *  - a decay: amplitude · exp(−(r − distance)/decay) when r ≤ cutoff.
 * With a phase φ the hop needs a common neighbour, one that rules without a phase join to both
 * ends; of several the one on the shortest way counts. Turning right (clockwise) over it multiplies
 * ⟨end|H|start⟩ by e^{iφ}, turning left by e^{−iφ}, as in the honeycomb model of F. D. M. Haldane,
 * Phys. Rev. Lett. 61, 2015 (1988). Without a common neighbour, or straight over it: no hop.
 */
typedef struct sv_distance_rule {
    int from, to; /**< orbitals of the model, here species; amplitude = ⟨to|H|from⟩ */
    double distance, tolerance, decay, cutoff; /**< lattice constants */
    sv_complex amplitude;
    double phase; /**< radian */
} sv_distance_rule;

/** A clean model. Build it with sv_model_make() or sv_model_begin() … sv_model_finish(). */
typedef struct sv_model {
    char name[32];
    double vectors[2][2]; /**< a1, a2, Cartesian, lattice constants; right-handed */
    sv_orbital *orbitals;
    int n_orbitals;
    int n_positions; /**< distinct positions per cell */
    sv_hop *hops;
    int n_hops;
    sv_index hop_capacity, orbital_capacity;
    int flux[2];                            /**< p, q: p/q quanta per cell (0, 1: none) */
    sv_model_field fields[SV_MODEL_FIELDS]; /**< local operators disorder may change */
    int n_fields;
    double velocity; /**< ħv of light states, energy × lattice constant; 0: the model has none. With
                          the gap Δ it gives the length ξ = ħv/Δ a film must exceed. */
    int32_t *hop_slots; /**< for finding hops; hop number + 1 or 0, power of two */
    sv_index n_hop_slots;
    /* Hops by distance: orbitals are species, and there are neither cells nor bands. */
    sv_distance_rule *rules;
    int n_rules;
    sv_index rule_capacity;
    double site_area; /**< mean area of a site of its structure; 0: none known yet */
} sv_model;

/** Kinds of models: table of names, docs and keys (custom has keys of type SV_KEY_TREE). */
SV_API const sv_kind *sv_model_kinds(int *ret_count);

/**
 * Builds a named model other than custom.
 * @param kind   row of sv_model_kinds()
 * @param values one per key of the kind, in its order, validated
 * @return SV_INVALID_INPUT for custom or flux [p, q] with q < 1
 */
SV_API SV_MUST_USE sv_status sv_model_make(sv_context *context, const sv_kind *kind,
                                           const sv_value *values, sv_model *ret_model);

/** Starts an empty model. @return SV_INVALID_INPUT when the vectors are not right-handed */
SV_API SV_MUST_USE sv_status sv_model_begin(sv_context *context, const char *name,
                                            const double a1[2], const double a2[2],
                                            sv_model *ret_model);
/**
 * Adds an orbital. Its name begins with a letter, a digit or `_` and holds no comma, quote or
 * control character: it is written into tables as it is.
 * @return SV_INVALID_INPUT for another, a repeated or an overlong name
 */
SV_API SV_MUST_USE sv_status sv_model_add_orbital(sv_context *context, sv_model *model,
                                                  const char *name, double x, double y,
                                                  double onsite);
/**
 * Adds a hop; the conjugate follows by itself.
 * @return SV_INVALID_INPUT when the same pair is listed twice (in either direction) or an
 *         on-site term is not real
 */
SV_API SV_MUST_USE sv_status sv_model_add_hop(sv_context *context, sv_model *model, int from,
                                              int to, int shift_i, int shift_j,
                                              sv_complex amplitude);
/** States the spin of an orbital. @param spin +1 (up) or −1 (down). @return SV_INVALID_INPUT for
 * other numbers or no such orbital */
SV_API SV_MUST_USE sv_status sv_model_set_spin(sv_context *context, sv_model *model, int orbital,
                                               int spin);
/** True when every orbital states its spin. */
SV_API bool sv_model_has_spin(const sv_model *model);
/** Number of the hop between two orbitals, in either direction, or -1. */
SV_API int sv_model_find_hop(const sv_model *model, int from, int to, int shift_i, int shift_j);
/**
 * Adds hops and on-site energies from a table, such as one fitted to first-principles bands:
 * columns from, to (orbital names), shift_i, shift_j (cells), re, im (⟨to, R + shift|H|from, R⟩; a
 * unit of energy may follow the name in brackets). A row from an orbital to itself without shift is
 * its on-site energy. A hop may be listed in one direction or in both; both must be conjugate to
 * within 1e-6 of the largest amplitude, and the first then counts.
 * @param energy_unit  eV per unit of the model; 0: energies with a unit are taken in eV
 * @param[out] ret_has_unit  some energy had a unit
 * @return SV_INVALID_INPUT with *ret_fault filled: missing column, not a number, unknown orbital, a
 *         hop or energy that is there already, one that breaks hermiticity
 */
SV_API SV_MUST_USE sv_status sv_model_read_hops(sv_context *context, sv_model *model,
                                                const char *text, size_t size, double energy_unit,
                                                bool *ret_has_unit, sv_table_fault *ret_fault);
/**
 * Adds a rule of hops by distance; the model then has no lattice. sv_structure_make() gives it the
 * grid its sites are numbered by.
 * @return SV_INVALID_INPUT for lengths or orbitals that make no sense, an amplitude between equal
 * species that is not real, one with a phase that is not real, or two rules of the same species
 * that could meet at one distance
 */
SV_API SV_MUST_USE sv_status sv_model_add_rule(sv_context *context, sv_model *model,
                                               const sv_distance_rule *rule);
/** Distances at which a rule may join sites. */
SV_API void sv_rule_range(const sv_distance_rule *rule, double ret_range[2]);
/** Sets p/q flux quanta per cell. @return SV_INVALID_INPUT for q < 1 */
SV_API SV_MUST_USE sv_status sv_model_set_flux(sv_context *context, sv_model *model, int p, int q);
/**
 * Names a local operator; its terms follow by sv_model_add_field_term(). The clean model's own part
 * of it stays in on-site terms and hops.
 * @param value  coefficient it has in the clean model
 * @return SV_INVALID_INPUT for "potential" (every model has it), a repeated or overlong name, or
 * more than SV_MODEL_FIELDS of them
 */
SV_API SV_MUST_USE sv_status sv_model_add_field(sv_context *context, sv_model *model,
                                                const char *name, double value);
/**
 * Adds a term to the local operator named last.
 * @return SV_INVALID_INPUT when the orbitals are not there or not at one position, a diagonal term
 *         is not real, or there are more than SV_FIELD_TERMS
 */
SV_API SV_MUST_USE sv_status sv_model_add_field_term(sv_context *context, sv_model *model, int to,
                                                     int from, sv_complex amplitude);
/** Row of a local operator, SV_FIELD_POTENTIAL for "potential", SV_NO_FIELD. */
SV_API int sv_model_find_field(const sv_model *model, const char *name);
/** Numbers the positions and checks invariants. Call once, last. */
SV_API SV_MUST_USE sv_status sv_model_finish(sv_context *context, sv_model *model);
SV_API void sv_model_free(sv_context *context, sv_model *model);

/** Turns vectors and orbital positions counter-clockwise about (0, 0). @param angle radian */
SV_API void sv_model_turn(sv_model *model, double angle);

/** Row of an orbital, or -1. */
SV_API int sv_model_find_orbital(const sv_model *model, const char *name);
/** Area spanned by the vectors. */
SV_API double sv_model_vector_area(const sv_model *model);
/** Area of the cell, lattice constants squared; of a model by distance: that of a site, on average
 *  (its vectors only number the sites). */
SV_API double sv_model_cell_area(const sv_model *model);
/** Reduced coordinates (u, v) of a Cartesian point: r = u·a1 + v·a2. */
SV_API void sv_model_reduce(const sv_model *model, const double at[2], double ret_uv[2]);
/** Largest |E| any flake of the clean model can have (Gershgorin: sums of |amplitude|). */
SV_API double sv_model_norm_bound(const sv_model *model);

/**
 * Bloch Hamiltonian H(k), ψ_k(R) = e^{ik·R} u_k(R), k·R with R the cell (so that H is periodic
 * in k): H_ba(k) = Σ hops t e^{−ik·s}. Only for models without flux.
 * @param k         dimensionless: k·a1, k·a2
 * @param[out] ret_matrix n_orbitals² values, column-major
 */
SV_API void sv_model_bloch(const sv_model *model, const double k[2], sv_complex *ret_matrix);

/**
 * Distance of an energy from the bands of the infinite clean model; 0 when it lies in a band.
 * Bands are followed on a grid over the (magnetic) Brillouin zone, their edges by descent from the
 * extreme grid points: a pocket narrower than the grid (36² points, 12² with flux) can be missed.
 * @return SV_UNDEFINED for more than 200 bands
 */
SV_API SV_MUST_USE sv_status sv_model_spectral_distance(sv_context *context, const sv_model *model,
                                                        double energy, double *ret_distance);
/**
 * Edges of the gap above a whole number of bands, in the same way; edge 1 ≤ edge 0: no gap.
 * @param filling    share of all states that is filled
 * @param tolerance  largest deviation of it from a whole number of bands
 * @param[out] ret_edges  top of the filled bands, bottom of the empty ones; ∓∞ where there are none
 * @return SV_UNDEFINED for a partly filled band or more than 200 bands
 */
SV_API SV_MUST_USE sv_status sv_model_filling_gap(sv_context *context, const sv_model *model,
                                                  double filling, double tolerance,
                                                  double ret_edges[2]);

#ifdef __cplusplus
}
#endif
#endif
