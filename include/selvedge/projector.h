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

typedef enum sv_engine {
    SV_ENGINE_AUTO,
    SV_ENGINE_DENSE,
    SV_ENGINE_CHEBYSHEV,
    SV_ENGINE_RATIONAL
} sv_engine;

/** How a window mean of the local Chern marker is estimated. */
typedef enum sv_estimator {
    SV_ESTIMATOR_AUTO,        /**< every site; of large windows a sample of cells */
    SV_ESTIMATOR_CELLS,       /**< a sample of cells, however small the window */
    SV_ESTIMATOR_RANDOM_PHASE /**< vectors of random phases */
} sv_estimator;

/** What to build; fill with sv_projector_options_default(). */
typedef struct sv_projector_options {
    size_t size; /**< sizeof(sv_projector_options), for later versions */
    sv_engine engine;
    double accuracy;     /**< numerical error allowed per reported value, in units of the marker */
    bool occupied_basis; /**< a marker will ask for sv_projector_occupied_basis() */
    sv_engine basis_engine; /**< read by sv_realise(): engine for the markers that need a basis; a
                                 basis comes from dense, or from chebyshev (half_gap, degree and
                                 near_states are then found for each sample) */
    int degree;      /**< chebyshev: degree of the polynomial, odd; 0: from half_gap, accuracy */
    double half_gap; /**< levels at least this far from the Fermi energy are resolved, unit of the
                          model; chebyshev needs it, rational takes 0: a quarter of the
                          distance of the nearest level, at least 1e-7 of the spectrum */
    bool single;     /**< chebyshev: polynomials in single precision, about twice as fast; their
                          rounding enters the stated errors */
    int near_states; /**< chebyshev: levels nearer than half_gap, up to this many, are computed
                          one by one and occupied exactly; 0: left to the polynomial */
    double reach;    /**< chebyshev: radius of the parts for single columns, lattice constants;
                          0: columns use the whole flake */
    sv_index sampled_cells;   /**< local Chern: number of window cells to sample; 0: all */
    sv_estimator estimator;   /**< read by sv_case_plan() */
    sv_index sampled_vectors; /**< local Chern: random-phase vectors; 0: none. Chebyshev then holds
                                   the whole projector besides its parts */
    int threads;              /**< threads inside one realisation (huge flakes); 0 or 1: one */
    bool trial; /**< chebyshev: do not count states to see whether a level is on the Fermi energy */
} sv_projector_options;
SV_API sv_projector_options sv_projector_options_default(void);

/** Levels around the Fermi energy, as far as the engine knows them. */
typedef struct sv_levels {
    sv_index occupied; /**< states below the Fermi energy */
    bool has_highest, has_lowest;
    double highest_occupied, lowest_empty;
    double fermi_energy;  /**< as given, or the middle of the gap for a filling */
    bool by_count;        /**< a filling or a number of electrons chose it */
    bool on_level;        /**< a level coincides with the Fermi energy within `resolution` */
    double resolution;    /**< two energies closer than this cannot be told apart */
    double resolved_from; /**< levels at least this far from the Fermi energy are occupied or empty
                               to the accuracy asked for, nearer ones in part; 0: all */
    bool gap_resolved;    /**< no level is known to be nearer than that: the engine occupies all */
} sv_levels;

/** The projector of one sample. Belongs to one thread. */
typedef struct sv_projector sv_projector;

/**
 * Half width of an interval about `energy` that holds the spectrum of H, by which polynomials of
 * H − energy are scaled: from sv_spectral_bounds() up to 50,000 rows, from row sums (Gershgorin)
 * above, with a margin of 1e-4 against rounding. Unit of the model.
 * @return SV_NUMERICAL, SV_INTERRUPTED
 */
SV_API SV_MUST_USE sv_status sv_projector_scale(sv_context *context, const sv_sparse *h,
                                                double energy, double *ret_scale);

/**
 * Builds the projector.
 *
 * When a level coincides with the Fermi energy (or the filling cuts a degenerate level) P is not
 * unique: the call succeeds, sv_projector_levels() has on_level set, and the markers come out
 * unresolved. Every engine notices it; chebyshev by counting states, which it does for an energy up
 * to 50,000 sites (unless near levels are computed one by one, or `trial` is set) and for a filling
 * always. Above, what such a level can do is part of the error of the columns.
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
/** Degree of the polynomial (chebyshev); 0 where the engine has none. */
SV_API int sv_projector_degree(const sv_projector *projector);

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

/**
 * Switches a projector made with options.single between single and double precision.
 * @return false, and nothing happens, for a projector that has one precision only
 */
SV_API bool sv_projector_set_single(sv_projector *projector, bool single);
/** Are its polynomials in single precision now? */
SV_API bool sv_projector_single(const sv_projector *projector);

/**
 * Norm of the error of P on the levels the engine resolves, rounding of the columns applied so far
 * included. Levels it does not resolve show in ⟨u|P|u⟩ − ‖P u‖²; this part may not.
 * @return 0 for an engine that makes no such statement (dense, chebyshev)
 */
SV_API double sv_projector_uniform_error(const sv_projector *projector);

/** Orthonormal basis of the occupied or of the empty space, when the engine has one. */
typedef struct sv_basis {
    bool available;
    bool empty_side; /**< spans the empty states: P = 1 − B B† */
    sv_index n, columns;
    const sv_complex *vectors; /**< n × columns, column-major; owned by the projector */
} sv_basis;
SV_API sv_basis sv_projector_basis(const sv_projector *projector);
/**
 * Basis of the occupied space (ask for it in the options). The dense engine holds eigenvectors;
 * chebyshev orthonormalises columns of P, at a fraction of the cost, and checks them against P to
 * 1e-8; where that fails, or too many levels crowd about the Fermi energy, it has left the sample
 * to the dense engine (sv_projector_engine() tells).
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

/* ---------------------------------------------------------------- spectrum */

/** What to compute; fill with sv_spectrum_options_default(). */
typedef struct sv_spectrum_options {
    size_t size;          /**< sizeof(sv_spectrum_options), for later versions */
    int near_states;      /**< states next to the Fermi energy, about so many (default 16) */
    sv_index exact_sites; /**< up to this order all eigenvalues are computed (default 400) */
    sv_index count_sites; /**< up to this order states are counted by inertia (default 300,000) */
    int moments;   /**< Chebyshev moments of the density; 0: 256 with all eigenvalues, else 512 */
    uint64_t seed; /**< of the random phases, with the realisation */
    sv_index realisation;
} sv_spectrum_options;
SV_API sv_spectrum_options sv_spectrum_options_default(void);

/** A state next to the Fermi energy. */
typedef struct sv_near_level {
    double energy;        /**< unit of the model */
    double participation; /**< Σ w², w the weight on a position (all its orbitals): 1 on a single
                               position, 1/n spread over n */
    double edge_weight;   /**< weight in cells within two lattice constants of a missing cell of the
                               pristine flake; NaN on a torus, which has no edge */
} sv_near_level;

/** Spectrum of one sample around its Fermi energy. NaN: does not exist, see the reason. */
typedef struct sv_spectrum {
    sv_index sites;
    sv_index states_below; /**< −1: not known */
    double fermi_energy, highest_occupied, lowest_empty, gap;
    bool on_level;       /**< a level coincides with the Fermi energy within `resolution` */
    double resolution;   /**< two energies closer than this cannot be told apart */
    double bounds[2];    /**< all levels lie between these */
    bool exact;          /**< all eigenvalues were computed */
    char reason[200];    /**< why one of the numbers above does not exist; empty: all do */
    sv_near_level *near; /**< ascending energies */
    int n_near;
    char near_reason[200];             /**< why there are none */
    double gap_ratio, gap_ratio_error; /**< mean of min/max of adjacent spacings; standard error */
    int gap_ratio_levels;              /**< distinct levels it was taken from */
    char gap_ratio_reason[200];
    double *energies, *density; /**< n_density values: states per site and energy */
    sv_index n_density;
    double density_resolution; /**< standard deviation of a level at the middle of the spectrum */
    double density_error;      /**< largest standard error of the density; 0: exact trace */
    const char *method;        /**< of the density; static text */
} sv_spectrum;

/**
 * Counts, gap, states next to the Fermi energy, level statistics and density of states of a sample.
 *
 * Small samples: all eigenvalues. Else counts by inertia, levels next to E_F by Lanczos on the
 * inverse, bounds by Lanczos, and the density from stochastic Chebyshev moments (exact trace up to
 * 1000 sites). The adjacent-gap ratio (V. Oganesyan, D. A. Huse, Phys. Rev. B 75, 155111 (2007)) is
 * taken over the near states or, with all eigenvalues, over half of the levels, about E_F; levels
 * closer than `resolution` count once, so that symmetry degeneracies do not enter.
 * When a level coincides with the Fermi energy (or the filling cuts a degenerate level) the count
 * and the gap do not exist: the call succeeds with on_level set.
 * @return SV_UNDEFINED for more electrons than states, SV_NUMERICAL, SV_NOT_CONVERGED,
 *         SV_NO_MEMORY, SV_INTERRUPTED
 * Cost: about ten factorisations; for the density, 2.6e8 multiply–adds of a matrix element or 256
 * products of 16 vectors, whichever is more.
 */
SV_API SV_MUST_USE sv_status sv_spectrum_make(sv_context *context, const sv_sample *sample,
                                              const sv_occupation *occupation,
                                              const sv_spectrum_options *options,
                                              sv_spectrum *ret_spectrum);
/** Memory in bytes sv_spectrum_make() needs with default options, for forecasts. */
SV_API double sv_spectrum_bytes(sv_index n);
/** Gives the arrays back; safe on a zeroed struct and twice in a row. */
SV_API void sv_spectrum_free(sv_context *context, sv_spectrum *spectrum);

/**
 * Mean adjacent-gap ratio ⟨min(s_i, s_{i+1})/max(s_i, s_{i+1})⟩ of sorted levels.
 * @param resolution levels closer than this count once
 * @param[out] ret_mean, ret_error  NaN for fewer than 3 (4) distinct levels; the error takes the
 *             correlation of neighbouring ratios into account
 * @return number of distinct levels
 */
SV_API int sv_gap_ratio(const double *levels, sv_index n, double resolution, double *ret_mean,
                        double *ret_error);

#ifdef __cplusplus
}
#endif
#endif
