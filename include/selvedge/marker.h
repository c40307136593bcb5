/* SPDX-License-Identifier: GPL-3.0-or-later */
/**
 * @file marker.h
 * Layer 6: topological markers of one sample. Sign: conventions.h.
 */
#ifndef SELVEDGE_MARKER_H
#define SELVEDGE_MARKER_H

#include "projector.h"

#ifdef __cplusplus
extern "C" {
#endif

/** How far a value of one sample can be trusted. */
typedef enum sv_verdict {
    SV_RESOLVED,   /**< the value stands */
    SV_UNRESOLVED, /**< arithmetic cannot decide; `reason` says why */
    SV_ABSENT,     /**< the marker does not exist on this flake; `reason` says why */
    SV_FAILED      /**< the computation failed; `reason` has the message */
} sv_verdict;

/** One marker of one realisation, with its pedigree. */
typedef struct sv_outcome {
    sv_verdict verdict;
    char reason[200];
    char engine[16];
    double value;  /**< window mean, or the index as a number */
    int64_t index; /**< for markers that are integers */
    double numerical_error, estimator_error;
    double margin; /**< what the verdict hangs on: Bott: smallest distance of an eigenvalue angle
                        from π, radian (above 256 occupied states often a proven lower bound); local
                      Chern: level spacing at the Fermi energy; localizer: its gap, unit of the
                      model; NaN: none */
    double weakest; /**< Bott: smallest modulus of an eigenvalue of V U V† U†, which is 0 when U or
                         V is singular (or a lower bound, as for the margin); spectral flow: least
                       share of a level found again; density response: largest movement of a level
                       next to the Fermi energy; NaN: none */
    double unresolved_within; /**< levels nearer than this to the Fermi energy are occupied in part
                                   only; 0: none is; NaN: no projector. Not kept in a run folder */
    double nearest_level;     /**< distance from the Fermi energy to the nearest level; NaN: not
                                   known. Not kept in a run folder */
    double sum_over_sites;    /**< local Chern, when asked for; NaN otherwise */
    int64_t window_cells;     /**< local Chern */
    double kappa;             /**< localizer: energy per lattice constant; NaN: none */
    double highest_occupied, lowest_empty; /**< NaN when there is none */
    int64_t electrons;
    int32_t degree; /**< of the polynomial its projector applied (chebyshev); 0: none */
} sv_outcome;

/** Which copy of the flake a marker is computed on. */
typedef enum sv_boundary { SV_OPEN_COPY, SV_CLOSED_COPY } sv_boundary;

/** What a marker is given. */
typedef struct sv_marker_input {
    const sv_sample *sample;
    const sv_occupation *occupation;
    sv_projector *projector;  /**< NULL for markers that do not need one */
    const sv_value *values;   /**< one per key of its kind */
    sv_index sampled_cells;   /**< local Chern: window cells to sample, 0: all */
    sv_index sampled_vectors; /**< local Chern: random-phase vectors instead of cells; 0: none */
    int threads;              /**< inside this realisation; 0 or 1: one */
    uint64_t seed;            /**< of the ensemble: draws the sampled cells */
    sv_index realisation;
    double *ret_site_values; /**< local Chern: n values per site, or NULL; also switches on the
                                  sum over all sites */
} sv_marker_input;

/** A marker: one row of the table, one file. */
typedef struct sv_marker {
    sv_kind kind;
    bool is_index;
    sv_boundary boundary;
    bool needs_projector;
    bool needs_occupied_basis;
    /** Fills the outcome; an unresolved value is SV_OK with that verdict. */
    sv_status (*compute)(sv_context *context, const sv_marker_input *input,
                         sv_outcome *ret_outcome);
    /** Rules between its keys, see sv_marker_check(); NULL: none. */
    bool (*check)(const sv_value *values, int *ret_key, char *message, size_t size);
} sv_marker;

/** Table of all markers. */
SV_API const sv_marker *sv_marker_table(int *ret_count);
/** Row of a name, or -1. */
SV_API int sv_marker_find(const char *name);
/**
 * Do the values of a marker's keys go together? Each is within its own range already.
 * @param marker  row of sv_marker_table()
 * @param values  one per key
 * @param[out] ret_key  row of the key at fault
 * @param[out] message  what is wrong with it, to follow its path ("needs … beside it")
 */
SV_API bool sv_marker_check(int marker, const sv_value *values, int *ret_key, char *message,
                            size_t size);
/** An outcome with every number set to "none". */
SV_API sv_outcome sv_outcome_blank(void);

/**
 * Local Chern marker (Bianco, Resta, Phys. Rev. B 84, 241106(R) (2011)) of an open flake:
 * c(r) = (4π/A) Im⟨r|P x P y P|r⟩, A the area of a cell; the sum over the orbitals of a cell is
 * the marker of the cell and tends to +C in the bulk. The window mean is normalised by the number
 * of cells of the window, vacant ones included. Key: window (share of the linear size).
 *
 * With sampled_vectors and an engine without a basis the window mean is that of
 * −(4π/A) Im⟨P D z|x Q y P z⟩ over vectors z of independent random phases, D the window, Q = 1 − P;
 * its mean over z is the sum over the window, since D P x y P has a real trace. The phases
 * depend on seed, realisation, site and number of the vector only.
 */
SV_API SV_MUST_USE sv_status sv_local_chern(sv_context *context, const sv_marker_input *input,
                                            sv_outcome *ret_outcome);

/** One block of a coarse map. NaN: does not exist. */
typedef struct sv_block {
    double at[2];     /**< centre, lattice constants */
    sv_index cells;   /**< of the flake, vacant ones included; 0: outside */
    sv_index sampled; /**< cells computed; 0: all lie too near to the edge */
    double left_out;  /**< share of its runs of cells that is not computed */
    double mean;      /**< of the marker per sampled cell; none above a numerical error of 0.02 */
    double error;     /**< standard error of sampling; none for a single run of several */
    double numerical_error; /**< estimate, of the mean */
} sv_block;

/** The local Chern marker in square blocks. */
typedef struct sv_coarse {
    sv_index count[2], n_blocks; /**< blocks along x and y, and their product; x fastest */
    double low[2], side;         /**< lower left corner, side of a block; lattice constants */
    sv_block *blocks;
    char engine[16];
    char reason[160]; /**< why no block has a value, or empty */
} sv_coarse;

/** Do the values of local_chern's keys ask for a coarse map? */
SV_API bool sv_local_chern_wants_blocks(const sv_value *values);
/**
 * Coarse map of the local Chern marker: the flake is cut into squares, `blocks` along its longer
 * side; in each a stratified random sample of about `block_cells` cells, in runs of neighbouring
 * cells that one panel of columns serves (at least two runs), is computed as in sv_local_chern().
 * Cells within three cells of the edge are left out. With runs m_k, error = √((1 − f) Σ(m_k −
 * m)²/n(n−1)), f the share of the runs that is computed: where the marker varies on the scale of a
 * block it is rather too large. The draw depends on seed, realisation and block only.
 * @param input  projector of the sample, values of all keys of local_chern, threads, seed,
 *               realisation
 * @return SV_INVALID_INPUT, SV_NO_MEMORY, SV_INTERRUPTED, SV_NUMERICAL
 * Cost: two projector applications per sampled site.
 */
SV_API SV_MUST_USE sv_status sv_local_chern_blocks(sv_context *context,
                                                   const sv_marker_input *input,
                                                   sv_coarse *ret_map);
/** Number of the block of a point, or −1 outside. */
SV_API sv_index sv_coarse_block(const sv_coarse *map, const double at[2]);
/** Values per site that add up to the mean of the block over each cell: for the figure of a map. */
SV_API SV_MUST_USE sv_status sv_coarse_site_values(sv_context *context, const sv_sample *sample,
                                                   const sv_coarse *map, double **ret_values);
SV_API void sv_coarse_free(sv_context *context, sv_coarse *map);

/**
 * Bott index (Loring, Hastings, EPL 92, 67004 (2010)) of a torus:
 * (1/2π) Im Tr log(V U V† U†), U = Ψ† e^{2πi u} Ψ, V = Ψ† e^{2πi v} Ψ with Ψ a basis of the
 * occupied space and u, v the reduced coordinates of the orbital positions on the torus.
 * Unresolved when an eigenvalue of V U V† U† lies within 1e-6 rad of the negative real axis or
 * vanishes (U or V is singular), or a level sits on the Fermi energy. With no or with all states
 * occupied the index is 0 by convention, and the reason says so. See sv_bott_of_basis() for the
 * ways to the integer; all give the one of the definition.
 */
SV_API SV_MUST_USE sv_status sv_bott_index(sv_context *context, const sv_marker_input *input,
                                           sv_outcome *ret_outcome);

/** Ways to the integer of the Bott index. */
typedef enum sv_bott_method {
    SV_BOTT_AUTO,       /**< eigenvalues up to 256 states, above the series, then eigenvalues */
    SV_BOTT_SERIES,     /**< the series where it is certified, else eigenvalues */
    SV_BOTT_EIGENVALUES /**< the definition as it stands, in double precision */
} sv_bott_method;

/**
 * Bott index of a space: (1/2π) Im Tr log(V U V† U†), principal branch.
 *
 * The series sums traces of up to eight powers of V U V† U† − 1, in single precision. It is used
 * where norms of those powers prove that every eigenvalue lies within ρ < 1 of 1 and that the
 * rest of the sum cannot reach the next integer, with an allowance for rounding: the integer is
 * then that of the definition. numerical_error is 0, margin = π − asin ρ and weakest = 1 − ρ are
 * lower bounds. Without proof, and this is the rule near transitions, the eigenvalues decide.
 * @param basis  orthonormal to about 1e-8; any basis of the space gives the same index
 * @param uv     reduced coordinates on the torus, in turns, one pair per row
 * @param[in,out] outcome  verdict, reason, value, index, numerical_error, margin, weakest are set
 * @param[out] ret_used  what gave the outcome: SV_BOTT_SERIES or SV_BOTT_EIGENVALUES
 * @return SV_INVALID_INPUT for an empty basis, SV_NUMERICAL, SV_NO_MEMORY, SV_INTERRUPTED
 * Cost: N rows, n columns: 2 N n² + 3 n³ to 6 n³ multiply–adds for the series; 2 N n² + 3 n³ and
 * the eigenvalues of an n×n matrix (about 25 n³, slow ones) otherwise.
 */
SV_API SV_MUST_USE sv_status sv_bott_of_basis(sv_context *context, const sv_basis *basis,
                                              const double (*uv)[2], sv_bott_method method,
                                              sv_outcome *outcome, sv_bott_method *ret_used);

/**
 * The spectral localizer [[H − E, κ(X − iY)], [κ(X + iY), −(H − E)]], positions relative to the
 * probe, rows 2r and 2r + 1 for site r. Its half signature is −C in the bulk.
 * @param kappa  energy per lattice constant
 * @param at     probe point, Cartesian, lattice constants
 */
SV_API SV_MUST_USE sv_status sv_localizer_matrix(sv_context *context, const sv_sample *sample,
                                                 double energy, double kappa, const double at[2],
                                                 sv_sparse *ret_matrix);
/** Distance from a point to the nearest site of the infinite clean lattice that the flake lacks. */
SV_API double sv_localizer_radius(const sv_flake *flake, const double at[2]);

/**
 * Replaces `auto` among the values of the localizer's keys: κ = 2g/ρ, τ = g/4, with g the half
 * width of the clean gap around the Fermi energy (energy: its distance to the bands) and ρ =
 * sv_localizer_radius(). They depend on the sheet alone; call it once per point and hand the
 * values to every realisation, which would otherwise compute them again.
 * @param[in,out] values  at, kappa, threshold, gap; afterwards kappa.count = 2, kappa.real[1] = g
 *                        (0: no gap, or unknown), and κ = 0 or τ = 0 when there is no rule for it
 */
SV_API SV_MUST_USE sv_status sv_localizer_prepare(sv_context *context, const sv_flake *flake,
                                                  const sv_occupation *occupation,
                                                  sv_value *values);

/**
 * Localizer index at a point of an open flake (Loring, Ann. Phys. 356, 383 (2015); Loring,
 * Schulz-Baldes, J. Noncommut. Geom. 14, 1 (2020)): minus the half signature of
 * sv_localizer_matrix(), from inertia. Needs no projector; a filling is turned into a Fermi energy
 * by inertia.
 *
 * Resolved when the inertia is equal at +τ and −τ (no level of the localizer is nearer to 0) and
 * the index at κ/2 agrees; a localizer gap above g, a sign of too large a κ that trivial phases
 * show as well, asks for the same index down to a quarter of 2g/ρ. Else the reason says what
 * failed. Margin: the localizer gap (relative error 1e-7), or with gap: bound its certified lower
 * bound τ. The gap is 1-Lipschitz in H and E, κ-Lipschitz in the probe: the half signature stands
 * for every potential of norm below the margin. Keys: at, kappa, threshold, gap. Cost: one analysis
 * and three factorisations of order 2N, one or more of order N.
 */
SV_API SV_MUST_USE sv_status sv_localizer_index(sv_context *context, const sv_marker_input *input,
                                                sv_outcome *ret_outcome);

/** The localizer at one probe point and one κ. */
typedef struct sv_probe {
    double at[2]; /**< Cartesian, lattice constants */
    double kappa;
    bool resolved; /**< by the rules of sv_localizer_index() */
    int64_t index; /**< when resolved */
    double gap; /**< localizer gap, relative error 1e-7; with gap: bound its bound τ; NaN: none */
    double certain;   /**< lower bound of the gap, by inertia; 0: none. No potential of a smaller
                           operator norm changes the half signature */
    char reason[120]; /**< of an unresolved one */
} sv_probe;

/** What is certain of the space between neighbouring probes of the same κ. */
typedef struct sv_between {
    double low, high; /**< the localizer gap lies between them everywhere; high NaN: not known */
    bool constant;    /**< the ends are resolved and no level crosses zero in between */
} sv_between;

/** The localizer at many points, and over κ. */
typedef struct sv_survey {
    char reason[200]; /**< why no probe is resolved, when that has one reason for all; or empty */
    double energy, kappa, threshold;
    sv_index points[2]; /**< nx, ny of a grid; n, 1 of a line; 0, 0: not asked for */
    bool line;
    double from[2], to[2];
    sv_probe *probes;    /**< nx·ny, x fastest */
    sv_between *between; /**< line: n − 1 segments; grid: (nx − 1)(ny − 1) cells, x fastest */
    sv_index n_between;
    sv_probe *kappas; /**< at one point, κ ascending by equal ratios */
    sv_index n_kappas;
    sv_index steady[2]; /**< first and last of the longest run of κ with the same resolved index; of
                             equal ones that around κ of the sheet, else the first; −1: none */
} sv_survey;

/** Do the values of the localizer's keys ask for more than its one point? */
SV_API bool sv_localizer_wants_survey(const sv_value *values);
/**
 * The localizer along a line or over a grid of probe points, and at one point against κ. Each
 * probe has the verdict sv_localizer_index() would give there at the same κ and τ, bit by bit; all
 * share the Fermi energy, and the probes of a thread one analysis.
 *
 * Between probes a, b at distance d the gap is κ-Lipschitz: with lower bounds c it is at least
 * max(c_a − κt, c_b − κ(d − t)) at t, least of all (c_a + c_b − κd)/2; over a cell of a grid the
 * same with four corners, evaluated on 16×16 parts with the largest distances. Where that is
 * positive no level crosses zero. `certain` costs two factorisations more per probe.
 * @param input  values: all keys of the localizer, after sv_localizer_prepare(); threads: several
 *               probes at a time (one above 50,000 sites, where each would hold a large factor)
 * @return SV_INVALID_INPUT when nothing of that is asked for; SV_INTERRUPTED, SV_NO_MEMORY,
 *         SV_NUMERICAL
 * Cost: five to seven factorisations of order 2N per probe.
 */
SV_API SV_MUST_USE sv_status sv_localizer_survey(sv_context *context, const sv_marker_input *input,
                                                 sv_survey *ret_survey);
/** Gives the arrays back; safe on a zeroed survey and twice in a row. */
SV_API void sv_survey_free(sv_context *context, sv_survey *survey);

/**
 * Three-sector Chern number (A. Kitaev, Ann. Phys. 321, 2 (2006), App. C) of a disc of an open
 * flake: −12πi Σ (P_jk P_kl P_lj − P_jl P_lk P_kj) over j, k, l in three sectors,
 * counter-clockwise. Tends to +C exponentially with the radius while the disc stays away from the
 * edge; over a whole finite flake it would be 0. Keys: at, radius. Cost: one projector application
 * per site of the disc and the cube of their number.
 */
SV_API SV_MUST_USE sv_status sv_three_sector(sv_context *context, const sv_marker_input *input,
                                             sv_outcome *ret_outcome);

/**
 * Crosshair marker (P. d'Ornellas, R. Barnett, D. K. K. Lee, Phys. Rev. B 106, 155124 (2022),
 * formula recalled from memory): 4π Σ_r Im⟨r|P θx P θy P|r⟩ over a disc about the crossing of the
 * two steps. Tends to +C; needs columns of the disc only. Keys: at, radius. Cost: two projector
 * applications per site of the disc.
 */
SV_API SV_MUST_USE sv_status sv_crosshair(sv_context *context, const sv_marker_input *input,
                                          sv_outcome *ret_outcome);

/** The occupied space split by the sign of P sz P, sz = ±1 on orbitals of spin up and down. */
typedef struct sv_spin_split {
    sv_index n, down, up;
    sv_complex
        *vectors; /**< n × (down + up), column-major, orthonormal; those of spin down first */
    double gap;   /**< of P sz P about zero: smallest positive minus largest negative
                       eigenvalue (twice the smallest modulus when all have one sign); 2
                       with conserved spin */
} sv_spin_split;

/**
 * Splits the occupied space: eigenvectors of Ψ† sz Ψ (E. Prodan, Phys. Rev. B 80, 125327 (2009)).
 * The halves are well defined while the gap is open, with or without conserved spin.
 * @param basis of the occupied space
 * @return SV_INVALID_INPUT for a model that states no spin, or a basis of another kind;
 * SV_NUMERICAL Cost: N rows, m columns: 2 N m² multiply–adds and the eigenvectors of an m×m matrix.
 */
SV_API SV_MUST_USE sv_status sv_spin_split_make(sv_context *context, const sv_sample *sample,
                                                const sv_basis *basis, sv_spin_split *ret_split);
SV_API void sv_spin_split_free(sv_context *context, sv_spin_split *split);
/** Basis of one half. @param spin +1 or −1. Borrows from the split. */
SV_API sv_basis sv_spin_split_half(const sv_spin_split *split, int spin);

/**
 * Local spin Chern number of an open flake: (c↑ − c↓)/2 with c↑, c↓ the local Chern markers of the
 * two halves of sv_spin_split_make(), averaged as sv_local_chern(); compare N. Baù, A. Marrazzo,
 * arXiv:2404.04598. Tends to the spin Chern number in the bulk, an integer where C = 0. With time
 * reversal its parity is the Z2 invariant.
 * Resolved when the gap of P sz P (the margin) is at least `threshold`. Absent for a model whose
 * orbitals state no spin. Keys: window, threshold.
 */
SV_API SV_MUST_USE sv_status sv_spin_chern(sv_context *context, const sv_marker_input *input,
                                           sv_outcome *ret_outcome);
/**
 * Spin Bott index of a torus: (B↑ − B↓)/2 with B the Bott index of a half (H. Huang, F. Liu, Phys.
 * Rev. Lett. 121, 126401 (2018), formula recalled from memory). Verdict as for sv_spin_chern() and
 * sv_bott_index(); unresolved as well when B↑ − B↓ is odd, which needs C ≠ 0. Key: threshold.
 */
SV_API SV_MUST_USE sv_status sv_spin_bott(sv_context *context, const sv_marker_input *input,
                                          sv_outcome *ret_outcome);

/**
 * Density response of a torus to flux (P. Streda, J. Phys. C 15, L717 (1982)): N(Φ) − N(0) states
 * below the Fermi energy per flux quantum through the whole torus, which is +C exactly in a gap.
 * Counts by inertia on the same sample with one and two quanta of either sign; a filling is turned
 * into a Fermi energy without the flux, and that energy is kept. Resolved when all four agree
 * and the level nearest to the Fermi energy is farther away than the flux moves the two levels next
 * to it: localised levels that cross it are no response. Margin: distance of the nearest level over
 * all counts; weakest: that movement. No keys. Cost: one analysis, about twelve factorisations.
 */
SV_API SV_MUST_USE sv_status sv_density_response(sv_context *context, const sv_marker_input *input,
                                                 sv_outcome *ret_outcome);

/**
 * Spectral flow of an open flake with exactly one hole (annulus, polygon with one hole; R. B.
 * Laughlin, Phys. Rev. B 23, 5632 (1981); B. I. Halperin, Phys. Rev. B 25, 2185 (1982)): while one
 * flux quantum is put through the hole, C levels rise through the Fermi energy at the hole and C
 * fall at the outline. The index is the net number that rise at the hole, which is +C; sign of the
 * flux as in conventions.h.
 *
 * Levels next to the Fermi energy are split by edge and followed by overlaps; a step is halved
 * until every level that could reach the Fermi energy in it is found again to 0.8 and the crossings
 * are whole numbers to 0.2. Resolved when both edges together count 0 and each crossing level has
 * 0.75 of its weight on its side of the ring, and is coupled to levels of the other edge by at most
 * 0.15 of the level spacing: narrow rings have no two edges (annulus: about the middle radius;
 * polygon: nearer to the hole or to the outline). A level on the Fermi energy without flux leaves
 * it unresolved; a filling is turned into a Fermi energy without flux, and that energy is kept.
 * Margin: least weight of a crossing level on its side (1: none crossed); weakest: least share of a
 * level found again. Keys: steps, energy_window. Cost: one analysis and five to eight
 * factorisations per flux, 16 to some hundred fluxes.
 */
SV_API SV_MUST_USE sv_status sv_spectral_flow(sv_context *context, const sv_marker_input *input,
                                              sv_outcome *ret_outcome);

/** One level at one flux of a spectral flow. */
typedef struct sv_flow_level {
    double flux;        /**< quanta */
    double energy;      /**< from the Fermi energy, unit of the model */
    double hole_weight; /**< share of the level nearer to the hole than to the outline */
} sv_flow_level;

/** The levels behind one spectral flow. */
typedef struct sv_flow_trace {
    sv_flow_level *levels; /**< by flux; at one flux first those at the hole, then by energy */
    sv_index count, room;  /**< of levels; allocated */
    int fluxes, most;      /**< fluxes followed; levels followed at one flux, at most */
    double fermi_energy;   /**< unit of the model */
} sv_flow_trace;

/**
 * sv_spectral_flow() with the levels it followed: those within the energy window of each flux, the
 * window narrowed where more than 24 lie in it. Same outcome, bit by bit. Where the flow could not
 * be followed to the end the levels up to there are in the trace.
 */
SV_API SV_MUST_USE sv_status sv_spectral_flow_trace(sv_context *context,
                                                    const sv_marker_input *input,
                                                    sv_outcome *ret_outcome,
                                                    sv_flow_trace *ret_trace);
SV_API void sv_flow_trace_free(sv_context *context, sv_flow_trace *trace);

#ifdef __cplusplus
}
#endif
#endif
