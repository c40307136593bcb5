/* SPDX-License-Identifier: GPL-3.0-or-later */
/**
 * @file linalg.h
 * Layer 2: sparse Hermitian matrix and dense kernels.
 */
#ifndef SELVEDGE_LINALG_H
#define SELVEDGE_LINALG_H

#include "base.h"

#ifdef __cplusplus
extern "C" {
#endif

/** Sparse Hermitian matrix, both triangles stored, rows sorted by column, no duplicates. */
typedef struct sv_sparse {
    sv_index n;          /**< order */
    sv_index *row_start; /**< n + 1 offsets */
    int32_t *column;     /**< row_start[n] column numbers */
    sv_complex *value;   /**< row_start[n] values */
} sv_sparse;

/** Gives the arrays back; safe on a zeroed matrix and twice in a row. */
SV_API void sv_sparse_free(sv_context *context, sv_sparse *matrix);
/** Verifies the invariants: monotone offsets, sorted columns, Hermitian to rounding. */
SV_API SV_MUST_USE sv_status sv_sparse_check(sv_context *context, const sv_sparse *matrix);
/** y = A x for one vector. @param[out] y n values, not x */
SV_API void sv_sparse_apply(const sv_sparse *matrix, const sv_complex *x, sv_complex *y);
/** Largest absolute row sum, an upper bound of the norm. */
SV_API double sv_sparse_norm_bound(const sv_sparse *matrix);
/** Dense column-major copy. @param[out] dense n² values */
SV_API void sv_sparse_to_dense(const sv_sparse *matrix, sv_complex *dense);

/** BLAS in use. */
typedef struct sv_blas_info {
    char kind[32];      /**< "openblas" or "unknown" */
    char threading[16]; /**< "serial", "pthread", "openmp" or "unknown" */
    char kernel[64];    /**< kernel name reported by the library, or "unknown" */
    char version[32];   /**< of the library, or "unknown" */
    char cholmod[32];   /**< version of CHOLMOD, which factorises sparse matrices */
    bool threads_safe;  /**< concurrent calls from several threads give right answers */
} sv_blas_info;

/** Asks the loaded BLAS what it is and sets it to one thread. Call at program start. */
SV_API void sv_blas_setup(sv_blas_info *ret_info);

/**
 * All eigenvalues and one side of the eigenvectors of a dense Hermitian matrix.
 *
 * Reduction to tridiagonal form (zhetrd), divide and conquer on the real tridiagonal matrix
 * (dstedc), and back-transformation (zunmtr) of the wanted vectors only. Of the routes measured
 * this is the fastest when half of the vectors are wanted, and it stays reliable on the highly
 * degenerate spectra of clean tori, where relatively robust representations (zstemr) fail.
 *
 * @param n           order, at most 32,000
 * @param[in,out] a   n² values column-major; destroyed
 * @param[out] values n eigenvalues, ascending
 * @param choose      called once with the values; sets the half-open range [*first, *last) of
 *                    eigenvectors wanted
 * @param[out] vectors  n × (last − first), column-major, taken from the context; orthonormal
 * @return SV_NUMERICAL when LAPACK reports failure, SV_REFUSED above 32,000
 */
typedef void (*sv_choose_range)(const double *values, sv_index n, sv_index *first, sv_index *last,
                                void *user);
SV_API SV_MUST_USE sv_status sv_dense_eigen(sv_context *context, sv_index n, sv_complex *a,
                                            double *values, sv_choose_range choose, void *user,
                                            sv_index *ret_first, sv_index *ret_last,
                                            sv_complex **ret_vectors);

/* ---------------------------------------------------- polynomials of a matrix */

/** Columns of a panel in double and in single precision: 256 bytes a row both. */
enum { SV_PANEL_COLUMNS = 16, SV_PANEL_COLUMNS_SINGLE = 32 };

/**
 * A sparse matrix shifted, scaled and packed for polynomials, elements of a row sorted into real,
 * imaginary and general ones: row r has them at start[3r], start[3r+1], start[3r+2].
 */
typedef struct sv_packed {
    sv_index n;
    sv_index *start; /**< 3n + 1 offsets */
    int32_t *column;
    double *re, *im;
    float *re_single, *im_single; /**< NULL unless added */
    sv_index span; /**< largest |row − column|: how far steps of a polynomial must keep apart */
} sv_packed;

/**
 * Packs (H − shift)/scale, or its part on some rows.
 * @param rows   n row numbers, NULL: all rows of H (then n = H.n)
 * @param place  for each row of H its place among `rows` or −1; NULL with rows NULL. Elements that
 *               lead out of the part are dropped
 */
SV_API SV_MUST_USE sv_status sv_packed_make(sv_context *context, const sv_sparse *h,
                                            const sv_index *rows, sv_index n, const int32_t *place,
                                            double shift, double scale, sv_packed *ret_packed);
/** Adds the copy in single precision that sv_panel_polynomial_single() reads. */
SV_API SV_MUST_USE sv_status sv_packed_add_single(sv_context *context, sv_packed *packed);
SV_API void sv_packed_free(sv_context *context, sv_packed *packed);

/** Copies of the inner loop; the plain one is the reference for the others. */
typedef enum sv_panel_kernel { SV_PANEL_PLAIN, SV_PANEL_AVX2, SV_PANEL_AVX512 } sv_panel_kernel;
/** The fastest copy this processor can run. */
SV_API sv_panel_kernel sv_panel_best_kernel(void);
SV_API const char *sv_panel_kernel_name(sv_panel_kernel kernel);

/**
 * y = Σ_k c_k T_k(A) x for a panel of SV_PANEL_COLUMNS columns, T_k Chebyshev polynomials.
 * A panel holds for each site SV_PANEL_COLUMNS real parts, then as many imaginary parts.
 * @param coefficients degree + 1 values
 * @param work   room for two panels
 * @param[out] y a panel, not overlapping x
 * Memory must be aligned to 64 bytes (sv_take() gives that). Cost: degree matrix products, eight of
 * them in one walk over the vectors where the rows that couple lie close together.
 */
SV_API void sv_panel_polynomial(const sv_packed *a, const double *coefficients, int degree,
                                sv_panel_kernel kernel, const double *x, double *work, double *y);
/**
 * The same in single precision, for a panel of SV_PANEL_COLUMNS_SINGLE columns and a matrix with
 * sv_packed_add_single(): about twice as many columns per second. Columns of a projector differ
 * from those in double by a few 1e-7 an element (test projector.chebyshev).
 */
SV_API void sv_panel_polynomial_single(const sv_packed *a, const double *coefficients, int degree,
                                       sv_panel_kernel kernel, const float *x, float *work,
                                       float *y);

/**
 * Chebyshev coefficients of a near-best polynomial of the occupation step: 1 on [−1, −δ], 0 on
 * [δ, 1], error ≈ sv_step_error(); between −δ and δ it falls from 1 to 0.
 * @param degree  odd
 * @param[out] ret_step degree + 1 coefficients
 * @return SV_INVALID_INPUT for δ outside (0, 1), an even degree, or one so high that the error
 *         would lie below double precision
 */
SV_API SV_MUST_USE sv_status sv_step_polynomial(sv_context *context, double delta, int degree,
                                                double *ret_step);
/** Size of the error of that polynomial outside (−δ, δ): ((1+δ)/(1−δ))^{−(degree+1)/2}. */
SV_API double sv_step_error(double delta, int degree);
/** Smallest odd degree with sv_step_error() ≤ error. */
SV_API int sv_step_degree(double delta, double error);

/* ------------------------------------------------------- complex products */

/** A factor: element (r, c) is re[r·row + c·column] + i·sign·im[r·row + c·column]. Parts apart
 * (strides 1 and n) or alternating (2 and 2n, im = re + 1); adjoints by strides and sign. */
typedef struct sv_factor {
    const double *re, *im;
    sv_index row, column; /**< strides */
    double sign;          /**< 1, or −1: the conjugate */
} sv_factor;

/** c := weight·a b, or c + weight·a b unless fresh. c overlaps neither factor. */
typedef struct sv_product_job {
    sv_index rows, columns, terms; /**< of c, c, and the sums; terms ≥ 1 */
    sv_factor a, b;
    const double *turn_re, *turn_im; /**< NULL, or a factor for each term */
    const sv_index *depth; /**< NULL, or for each index of a row or column of c, not ascending: the
                                number of terms after which its factor is zero */
    bool fresh;
    bool lower; /**< elements above the diagonal are not wanted (some are computed) */
    double weight;
    double *c_re, *c_im;
    sv_index c_row, c_column; /**< strides */
} sv_product_job;

/** The same in single precision. */
typedef struct sv_factor_single {
    const float *re, *im;
    sv_index row, column;
    float sign;
} sv_factor_single;
typedef struct sv_product_single_job {
    sv_index rows, columns, terms;
    sv_factor_single a, b;
    const float *turn_re, *turn_im;
    const sv_index *depth;
    bool fresh;
    bool lower;
    float weight;
    float *c_re, *c_im;
    sv_index c_row, c_column;
} sv_product_single_job;

/**
 * A complex product from three real ones, (a + ib)(c + id) = ac − bd + i((a+b)(c+d) − ac − bd):
 * three quarters of the work, errors bounded by the norms of the factors instead of element by
 * element (N. J. Higham, SIAM J. Matrix Anal. Appl. 13, 681 (1992)). Elements differ from the
 * exact ones by a few roundings times Σ|a||b| (measured in test linalg.product). Sums run in an
 * order that depends on the shape and the kernel alone.
 * @return SV_NO_MEMORY, with c untouched
 */
SV_API SV_MUST_USE sv_status sv_product(sv_context *context, sv_panel_kernel kernel,
                                        const sv_product_job *job);
SV_API SV_MUST_USE sv_status sv_product_single(sv_context *context, sv_panel_kernel kernel,
                                               const sv_product_single_job *job);

/* ------------------------------------------------------------------ inertia */

/**
 * Symbolic analysis, factor and work space for matrices of one pattern. Used by one thread at a
 * time; every thread makes its own.
 */
typedef struct sv_inertia_plan sv_inertia_plan;

/** What a factorisation H − shift = L D L† says (Sylvester's law of inertia). */
typedef struct sv_inertia {
    sv_index negative, positive; /**< signs of D; they add up to the order */
    sv_index replaced;           /**< pivots too small to divide by, replaced by 1e-11 norms */
    double smallest_pivot;       /**< least |eigenvalue| of a step of D */
    double growth;               /**< trace of |L| |D| |L|† over the norm */
    double error; /**< the signs are exact for a matrix at most about this far away (norm): four
                       roundings times that trace, an estimate that errs on the large side */
} sv_inertia;

/**
 * Analyses a pattern: approximate minimum degree order and supernodes (by CHOLMOD), once for any
 * number of factorisations.
 * @param pattern  values are not read
 * @param block    rows block·g … block·g + block − 1 are ordered as one group (1: none)
 * @return SV_INVALID_INPUT when the order is no multiple of block, SV_NO_MEMORY
 */
SV_API SV_MUST_USE sv_status sv_inertia_plan_make(sv_context *context, const sv_sparse *pattern,
                                                  int block, sv_inertia_plan **ret_plan);
/**
 * Makes a plan fit for matrices with another number of rows per group, all elements of a group and
 * of coupled groups within the pattern: from H, block 1, to a localizer of H, block 2. Takes new
 * memory for numbers; the analysis stays. On failure the plan is as it was.
 */
SV_API SV_MUST_USE sv_status sv_inertia_plan_regroup(sv_context *context, sv_inertia_plan *plan,
                                                     int block);
/** Copy of the inner product; a plan is made with sv_panel_best_kernel(), and needs no better. */
SV_API void sv_inertia_plan_use(sv_inertia_plan *plan, sv_panel_kernel kernel);
SV_API void sv_inertia_plan_free(sv_context *context, sv_inertia_plan *plan);

/**
 * Factors H − shift by dense fronts with pivoting inside diagonal blocks, no other.
 * The counts are the signs of the eigenvalues of H − shift + F, ‖F‖ ≲ error: an eigenvalue nearer
 * to the shift than that can fall on either side. sv_inertia_count() draws the consequences.
 * Cost: order^1.5 multiply–adds for a flake, times the square of the range of the hops.
 * @param h  elements within the pattern of the plan
 * @return SV_INVALID_INPUT outside the pattern, SV_NUMERICAL for values that are not finite
 */
SV_API SV_MUST_USE sv_status sv_inertia_factor(sv_context *context, sv_inertia_plan *plan,
                                               const sv_sparse *h, double shift,
                                               sv_inertia *ret_inertia);
/**
 * The same in single precision: two to three times faster, with an error (and a bound of it) larger
 * by the ratio of the roundoffs. Fit for proofs that no eigenvalue lies in a wide interval.
 */
SV_API SV_MUST_USE sv_status sv_inertia_factor_single(sv_context *context, sv_inertia_plan *plan,
                                                      const sv_sparse *h, double shift,
                                                      sv_inertia *ret_inertia);
/**
 * Solves (H − shift) x = b with the latest factor, in its precision.
 * @param[in,out] x  b, then x
 */
SV_API SV_MUST_USE sv_status sv_inertia_solve(sv_context *context, sv_inertia_plan *plan,
                                              sv_complex *x);

/**
 * Estimates the distance of the eigenvalue nearest to the shift of the latest factorisation by
 * inverse iterations: 1/‖(H − shift)⁻¹ x‖ for a unit x. Never too small (but for the error of that
 * factorisation); for a random x too large by a factor θ with probability below order·θ^{−2·steps}
 * (from the share of one direction in a random complex unit vector). The start is fixed.
 */
SV_API SV_MUST_USE sv_status sv_inertia_distance(sv_context *context, sv_inertia_plan *plan,
                                                 int steps, double *ret_distance);

/** How a count was reached. */
typedef enum sv_counted {
    SV_COUNTED_ONCE,  /**< one factorisation, nearest eigenvalue far beyond its error */
    SV_COUNTED_TWICE, /**< doubtful: factorisations at shift ± width */
    SV_COUNTED_DENSE  /**< doubtful and of order ≤ 300: all eigenvalues */
} sv_counted;

/** Number of eigenvalues below a shift, or between which numbers it lies. */
typedef struct sv_inertia_count {
    bool decided;       /**< false: eigenvalues lie within `width` of the shift, or the
                             factorisations cannot be trusted */
    sv_index below;     /**< the count, when decided */
    sv_index low, high; /**< it lies between these */
    double width;       /**< eigenvalues nearer to the shift than this are not told apart from it */
    double distance;    /**< estimated distance of the nearest eigenvalue, rather too large */
    sv_counted how;
    sv_inertia factor; /**< of the first factorisation */
} sv_inertia_count;

/**
 * Counts the eigenvalues of H below a shift, with safeguards: three inverse iterations estimate
 * the distance of the nearest eigenvalue; if that is not 1000 times the error, or a pivot was
 * replaced, counts at shift ± width must agree (order ≤ 300: all eigenvalues instead).
 * A count that cannot be decided is SV_OK with `decided` false. Leaves the plan with a factor of
 * some shift nearby.
 */
SV_API SV_MUST_USE sv_status sv_inertia_count_below(sv_context *context, sv_inertia_plan *plan,
                                                    const sv_sparse *h, double shift,
                                                    sv_inertia_count *ret_count);

/** Eigenvalues next to a shift; ∓∞ where there is none. */
typedef struct sv_inertia_levels {
    double below, above;             /**< nearest on either side */
    double error_below, error_above; /**< estimates */
    int steps;
} sv_inertia_levels;

/**
 * Levels next to the shift of the latest factorisation, by at most 80 steps of Lanczos on its
 * inverse. The start vector is fixed: results repeat bit by bit.
 * @param inertia, shift  of that factorisation
 * @param tolerance  wanted error of a level over its distance from the shift
 * @param target     only the level nearer to this energy must be that good; NaN: both
 * @param[out] ret_levels  the errors say what was reached: r²/δ for a residual r and the next
 *                   Ritz value δ away, plus that of the factor
 * Memory: 81 vectors. Cost: a solve and two passes over the basis per step.
 */
SV_API SV_MUST_USE sv_status sv_inertia_levels_near(sv_context *context, sv_inertia_plan *plan,
                                                    const sv_inertia *inertia, double shift,
                                                    double tolerance, double target,
                                                    sv_inertia_levels *ret_levels);

/** Where a number of electrons puts the Fermi energy. */
typedef struct sv_fermi_level {
    double energy; /**< middle of the gap; 1 below (above) all levels for no (all) electrons */
    double highest_occupied, lowest_empty; /**< ∓∞ where there is none */
    bool on_level;                         /**< the last electron goes into a degenerate level */
    double resolution;                     /**< levels closer than this are degenerate */
    double error; /**< of the two levels, an estimate: 1e-9 of their distance, more where 80 steps
                       do not reach it (far from a dense band edge) */
} sv_fermi_level;

/**
 * Fermi energy of a number of electrons by bisection on inertia, then levels next to it.
 * @return SV_INVALID_INPUT for more electrons than states
 * Cost: up to about 40 factorisations.
 */
SV_API SV_MUST_USE sv_status sv_inertia_fermi_energy(sv_context *context, sv_inertia_plan *plan,
                                                     const sv_sparse *h, sv_index electrons,
                                                     sv_fermi_level *ret_fermi);

/**
 * The count by another code, for comparison: CHOLMOD's column-by-column L D L† without pivoting,
 * in an order of single rows. Three to four times slower than sv_inertia_factor() (measured), and
 * without an error estimate.
 * @return SV_UNDEFINED when a pivot vanishes
 */
SV_API SV_MUST_USE sv_status sv_inertia_simplicial(sv_context *context, const sv_sparse *h,
                                                   double shift, sv_index *ret_negative);

/* -------------------------------------------------------- states near an energy */

/** Eigenpairs in an interval around an energy. */
typedef struct sv_near_states {
    int count;
    double half_width;   /**< all states nearer to the energy than this are here */
    double *energies;    /**< count values, in no particular order */
    sv_complex *vectors; /**< n × count, column-major, orthonormal */
} sv_near_states;

/**
 * All eigenpairs within half_width of a shift: their number from two inertia counts, the pairs by
 * Lanczos on (H − shift)^{-1} with full orthogonalisation and a fixed start vector. Degenerate
 * levels are found too (the number says when one is missing).
 * @param half_width  narrowed until at most `most` states lie inside and no level at its ends
 * @return SV_NOT_CONVERGED when pairs are missing; the shift must not be a level itself
 * Cost: an analysis, three factorisations, about twice as many solves as states. Memory: up to
 * 4·count + 60 vectors.
 */
SV_API SV_MUST_USE sv_status sv_near_states_find(sv_context *context, const sv_sparse *h,
                                                 double shift, double half_width, int most,
                                                 sv_near_states *ret_states);
/** Gives the arrays back; safe on a zeroed struct and twice in a row. */
SV_API void sv_near_states_free(sv_context *context, sv_near_states *states);

/* -------------------------------------------------- rational functions of a matrix */

enum { SV_ZOLOTAREV_MOST = 96 };

/**
 * Best approximation of the sign by an odd rational function of type (2·terms + 1, 2·terms) on
 * [−1, −δ] ∪ [δ, 1] (E. I. Zolotarev, 1877): sign x ≈ x (constant + Σ residue/(x² + pole²)).
 * Everything is positive, so no digits are lost in the sum.
 */
typedef struct sv_zolotarev {
    int terms;
    double delta;
    double error; /**< largest deviation from the sign, reached at 2·terms + 2 points of [δ, 1] */
    double constant;
    double residue[SV_ZOLOTAREV_MOST];
    double pole[SV_ZOLOTAREV_MOST]; /**< ascending */
} sv_zolotarev;

/**
 * Computes the approximation.
 * @param delta  0 < δ < 1; accurate to rounding down to 1e-12
 * @param terms  1 … SV_ZOLOTAREV_MOST
 * @return SV_INVALID_INPUT outside these ranges
 */
SV_API SV_MUST_USE sv_status sv_zolotarev_make(sv_context *context, double delta, int terms,
                                               sv_zolotarev *ret_sign);
/** Value of the approximation at x. */
SV_API double sv_zolotarev_value(const sv_zolotarev *sign, double x);
/**
 * Fewest terms with 4 exp(−(2·terms + 1) π²/(2 ln(4/δ))) ≤ error, a slight overestimate of the
 * error; SV_ZOLOTAREV_MOST when even those do not reach it.
 */
SV_API int sv_zolotarev_terms(double delta, double error);

/**
 * ((H − shift)/scale)², both triangles, every element of the pattern and the whole diagonal stored.
 * @param[out] ret_square  give back with sv_sparse_free()
 */
SV_API SV_MUST_USE sv_status sv_sparse_square(sv_context *context, const sv_sparse *h, double shift,
                                              double scale, sv_sparse *ret_square);

/**
 * A Hermitian matrix with Cholesky factors L L† of itself plus multiples of one: one analysis
 * (approximate minimum degree order, supernodes) for all of them. Used by one thread at a time.
 */
typedef struct sv_definite sv_definite;

/**
 * Copies and analyses a matrix.
 * @param factors  number of factors to be held at a time
 * @return SV_INVALID_INPUT for an empty matrix or no factors, SV_NO_MEMORY
 */
SV_API SV_MUST_USE sv_status sv_definite_make(sv_context *context, const sv_sparse *matrix,
                                              int factors, sv_definite **ret_definite);
SV_API void sv_definite_free(sv_context *context, sv_definite *definite);
/** Memory of one factor in bytes. */
SV_API double sv_definite_bytes(const sv_definite *definite);
/**
 * Factors matrix + shift into factor number `slot`, replacing what was there.
 * @return SV_NUMERICAL when the sum is not positive definite, SV_NO_MEMORY; the slot is empty then
 */
SV_API SV_MUST_USE sv_status sv_definite_factor(sv_context *context, sv_definite *definite,
                                                int slot, double shift);
/**
 * Solves (matrix + shift) x = b for a block of columns with factor number `slot`.
 * @param[in,out] x  n × columns, column-major: b, then the solution
 * @return SV_INVALID_INPUT for an empty slot
 */
SV_API SV_MUST_USE sv_status sv_definite_solve(sv_context *context, sv_definite *definite, int slot,
                                               sv_index columns, sv_complex *x);

/* -------------------------------------------- bounds of the spectrum, density of states */

/**
 * An interval that holds all eigenvalues of H: extreme Ritz values of a Lanczos run from a fixed
 * random vector, widened by 0.5 % of their distance, cut by Gershgorin's discs where those are
 * tighter. The run is long enough (about 200 steps for 10^6 rows) that an eigenvalue lies outside
 * with probability below 1e-9 over start vectors: P(error > ε·width) ≤ 1.648 √n e^{−√ε(2k−1)} after
 * k steps (J. Kuczyński, H. Woźniakowski, SIAM J. Matrix Anal. Appl. 13, 1094 (1992), Theorem 4.2).
 * The bounds exceed the spectrum by at most 0.51 % of its width (and 1e-12 of the norm) a side.
 * @param[out] ret_bounds low, high
 * @return SV_INVALID_INPUT for order 0, SV_NUMERICAL, SV_INTERRUPTED
 * Cost: a product and two passes over three vectors per step.
 */
SV_API SV_MUST_USE sv_status sv_spectral_bounds(sv_context *context, const sv_sparse *h,
                                                double ret_bounds[2]);

/**
 * Chebyshev moments μ_k = tr T_k(A)/n, k = 0 … count − 1, of a matrix with its spectrum in [−1, 1].
 *
 * Stochastic trace: every one of the SV_PANEL_COLUMNS columns of the result is an estimate of its
 * own from `panels` vectors of random phases, so that their spread gives the error of the mean
 * (A. Weiße et al., Rev. Mod. Phys. 78, 275 (2006), sections II.B.2 and II.D). Moments 2k and 2k+1
 * come from T_k x and T_{k+1} x: count/2 products per panel.
 * @param panels  ≥ 1; 0: the exact trace over unit vectors, all columns alike
 * @param stream  where the phases come from (row, column and panel fix a phase)
 * @param[out] ret_moments count × SV_PANEL_COLUMNS, moment k of column c at [k·columns + c]
 * @return SV_NUMERICAL when a moment exceeds 1: the spectrum is not in [−1, 1]; SV_INTERRUPTED
 * Memory: two panels.
 */
SV_API SV_MUST_USE sv_status sv_chebyshev_moments(sv_context *context, const sv_packed *a,
                                                  int count, int panels, const sv_stream *stream,
                                                  double *ret_moments);

/**
 * Jackson's kernel g_k, k = 0 … count − 1, which keeps a truncated Chebyshev series of a positive
 * function positive: g_k = [(N−k+1) cos(πk/(N+1)) + sin(πk/(N+1)) cot(π/(N+1))]/(N+1), N = count.
 * It broadens a level at x = 0 to about a Gaussian of standard deviation π/N (Weiße et al., Eqs.
 * (71) and (75)).
 */
SV_API void sv_jackson_kernel(int count, double *ret_kernel);

/**
 * Density of states per row and energy from moments of (H − centre)/half_width, Jackson-damped.
 * @param stride   distance between moments in the array
 * @param energies n_energies values inside centre ± half_width
 * @param[out] ret_density n_energies values; 0 outside
 */
SV_API SV_MUST_USE sv_status sv_chebyshev_density(sv_context *context, const double *moments,
                                                  int count, int stride, double centre,
                                                  double half_width, const double *energies,
                                                  sv_index n_energies, double *ret_density);

#ifdef __cplusplus
}
#endif
#endif
