/* SPDX-License-Identifier: GPL-3.0-or-later */
/**
 * @file projector.h
 * Layer 5: the projector P on the occupied states of one sample, whatever engine makes it.
 */
#ifndef SELVEDGE_PROJECTOR_H
#define SELVEDGE_PROJECTOR_H

#include "sample.h"

#ifdef __cplusplus
extern "C" {
#endif

typedef enum sv_engine { SV_ENGINE_AUTO, SV_ENGINE_DENSE, SV_ENGINE_CHEBYSHEV } sv_engine;

/** What to build; fill with sv_projector_options_default(). */
typedef struct sv_projector_options {
    size_t size; /**< sizeof(sv_projector_options), for later versions */
    sv_engine engine;
    double accuracy; /**< numerical error allowed per reported value, in units of the marker */
    bool occupied_basis; /**< a marker will ask for sv_projector_occupied_basis() */
    int degree;          /**< chebyshev: degree of the polynomial, odd; 0: from half_gap, accuracy */
    double half_gap;     /**< chebyshev: levels at least this far from the Fermi energy are resolved,
                              unit of the model */
    int near_states;     /**< chebyshev: levels nearer than half_gap, up to this many, are computed
                              one by one and occupied exactly; 0: left to the polynomial */
    double reach;        /**< chebyshev: radius of the parts for single columns, lattice constants;
                              0: columns use the whole flake */
    sv_index sampled_cells; /**< local Chern: number of window cells to sample; 0: all */
    int threads;            /**< threads inside one realisation (huge flakes); 0 or 1: one */
} sv_projector_options;
SV_API sv_projector_options sv_projector_options_default(void);

/** Levels around the Fermi energy, as far as the engine knows them. */
typedef struct sv_levels {
    sv_index occupied;  /**< states below the Fermi energy */
    bool has_highest, has_lowest;
    double highest_occupied, lowest_empty;
    double fermi_energy; /**< as given, or the middle of the gap for a filling */
    bool on_level;       /**< a level coincides with the Fermi energy within `resolution` */
    double resolution;   /**< two energies closer than this cannot be told apart */
} sv_levels;

/** The projector of one sample. Belongs to one thread. */
typedef struct sv_projector sv_projector;

/**
 * Builds the projector.
 *
 * When a level coincides with the Fermi energy (or the filling cuts a degenerate level) P is not
 * unique: the call succeeds, sv_projector_levels() has on_level set, and the markers come out
 * unresolved.
 * @param sample   borrowed; must outlive the projector
 * @return SV_NUMERICAL, SV_NO_MEMORY, SV_INTERRUPTED; SV_UNDEFINED for more electrons than
 *         states
 */
SV_API SV_MUST_USE sv_status sv_projector_make(sv_context *context, const sv_sample *sample,
                                               const sv_occupation *occupation,
                                               const sv_projector_options *options,
                                               sv_projector **ret_projector);
SV_API void sv_projector_free(sv_context *context, sv_projector *projector);

/** Levels around the Fermi energy; owned by the projector. */
SV_API const sv_levels *sv_projector_levels(const sv_projector *projector);
/** Name of the engine ("dense"); static text. */
SV_API const char *sv_projector_engine(const sv_projector *projector);

/**
 * y = P x for a block of columns.
 * @param x        n × columns, column-major
 * @param[out] y   n × columns, not overlapping x
 */
SV_API SV_MUST_USE sv_status sv_projector_apply(sv_context *context, sv_projector *projector,
                                                sv_index columns, const sv_complex *x,
                                                sv_complex *y);

/**
 * The projector of a part of the sample: rows within `radius` of a point, hops that leave it cut.
 * Columns that start near the middle feel the cut only through their weight at the rim.
 * @param n_rows, rows  row numbers of the part, ascending; borrowed for the call
 * @param[in,out] place scratch of sample->n numbers, all −1 before and after
 * @return SV_UNDEFINED when the engine cannot be restricted (dense)
 */
SV_API SV_MUST_USE sv_status sv_projector_restrict(sv_context *context,
                                                   const sv_projector *projector,
                                                   const sv_index *rows, sv_index n_rows,
                                                   int32_t *place, sv_projector **ret_part);
/** Radius of the parts that markers should ask for, lattice constants; 0: use the whole. */
SV_API double sv_projector_reach(const sv_projector *projector);

/** Orthonormal basis of the occupied or of the empty space, when the engine has one. */
typedef struct sv_basis {
    bool available;
    bool empty_side;           /**< spans the empty states: P = 1 − B B† */
    sv_index n, columns;
    const sv_complex *vectors; /**< n × columns, column-major; owned by the projector */
} sv_basis;
SV_API sv_basis sv_projector_basis(const sv_projector *projector);
/**
 * Basis of the occupied space (ask for it in the options).
 * @return SV_UNDEFINED when the engine holds no such basis
 */
SV_API SV_MUST_USE sv_status sv_projector_occupied_basis(sv_context *context,
                                                         const sv_projector *projector,
                                                         sv_basis *ret_basis);

/**
 * Numerical error of P, from a random probe v: max(‖P²v − Pv‖, ‖[H,P]v‖/gap)/‖v‖. An estimate of
 * the norm of the error of P, not a bound.
 */
SV_API SV_MUST_USE sv_status sv_projector_defect(sv_context *context, sv_projector *projector,
                                                 double *ret_defect);

/** Memory in bytes and complex multiply–adds one projector of order n needs, for forecasts. */
SV_API void sv_projector_forecast(sv_engine engine, sv_index n, double *ret_bytes,
                                  double *ret_operations);

#ifdef __cplusplus
}
#endif
#endif
