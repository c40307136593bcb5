/* SPDX-License-Identifier: GPL-3.0-or-later */
/**
 * @file study.h
 * Layer 9: questions asked of ensembles. A question does not know how realisations are made: it
 * asks a responder for values and decides where to ask next.
 */
#ifndef SELVEDGE_STUDY_H
#define SELVEDGE_STUDY_H

#include "store.h"

#ifdef __cplusplus
extern "C" {
#endif

/* -------------------------------------------------- threshold of a criterion */

/**
 * Gives responses number have … have+more−1 at a value of the parameter: one number per
 * realisation. They must depend on (parameter, number) alone, and responses at different values
 * should be independent; then the search is repeatable and can be replayed from a ledger.
 * Criterion SV_CRITERION_MEAN: the value of the quantity, NaN where it is unresolved.
 * Criterion SV_CRITERION_SHARE: 1 where the realisation meets the criterion, else 0 (unresolved
 * ones do not meet it).
 */
typedef sv_status (*sv_responder)(sv_context *context, double parameter, int64_t have, int64_t more,
                                  double *ret_values, void *user);

typedef enum sv_criterion_kind {
    SV_CRITERION_MEAN, /**< |mean − clean| ≤ within */
    SV_CRITERION_SHARE /**< share of realisations that meet it ≥ share */
} sv_criterion_kind;

/** Where does a criterion, met at small values of a parameter, first fail? */
typedef struct sv_threshold_question {
    size_t size;
    sv_criterion_kind kind;
    double low, high;  /**< range of the parameter */
    bool integer;      /**< only whole numbers make sense */
    bool discrete;     /**< MEAN: values are whole numbers: a few equal ones say little about their
                            spread */
    double clean;      /**< MEAN: the quantised value */
    double within;     /**< MEAN: half width of the band */
    double share;      /**< SHARE: 0 < share < 1 */
    double precision;  /**< half width of the interval wanted */
    double confidence; /**< of the interval, e.g. 0.95 */
    int64_t most;      /**< responses at most; 0: 200,000 */
} sv_threshold_question;

typedef enum sv_threshold_state {
    SV_THRESHOLD_FOUND,
    SV_THRESHOLD_ALWAYS,   /**< the criterion holds up to `high` */
    SV_THRESHOLD_NEVER,    /**< it fails already at `low` */
    SV_THRESHOLD_UNDECIDED /**< not within `most` responses; the interval is what is known */
} sv_threshold_state;

/** What was asked at one value of the parameter. */
typedef struct sv_threshold_point {
    double parameter;
    int64_t responses, unresolved;
    double measure; /**< MEAN: |mean − clean|; SHARE: share that does not meet the criterion */
    double standard_error; /**< NaN below two responses */
    int verdict;           /**< −1: holds, +1: fails, 0: open; each at 99 % */
} sv_threshold_point;

typedef struct sv_threshold_answer {
    sv_threshold_state state;
    double value;       /**< NaN unless FOUND or UNDECIDED */
    double interval[2]; /**< for ALWAYS and NEVER: NaN */
    double confidence;
    int64_t responses;
    bool bracketed;             /**< interval from two decided values instead of a local fit */
    bool re_enters;             /**< beyond the threshold the criterion holds again … */
    double re_entry;            /**< … at this value, NaN otherwise */
    double monotone_p;          /**< p-value of "the measure never falls as the parameter grows" */
    char reason[240];           /**< for every state but FOUND */
    sv_threshold_point *points; /**< ascending; taken from the context */
    int n_points;
} sv_threshold_answer;

/**
 * Searches for the first failure going up from `low`.
 *
 * 1. Nine evenly spaced values with six responses each; the first whose measure is beyond the
 *    target, and the one before it, are tested until decided (t or exact binomial test, 0.5 %
 *    each look).
 * 2. Bisection between them as long as the middle is decided. Two decided values closer than
 *    twice the precision are the answer.
 * 3. Around the value left undecided only fresh responses count: 60 % there and 20 % on either
 *    side at three times the precision, fitted by a parabola (MEAN: weighted least squares with a
 *    sandwich covariance; SHARE: logistic with Firth's penalty, Biometrika 80, 27 (1993)). The
 *    interval holds all values at which the fit does not differ from the target (inverted test, as
 *    Fieller's); the centre follows the root, the sides come closer where the parabola bends too
 *    much, and the number of responses at most doubles per step until the interval is narrow
 *    enough.
 *
 * The coverage of the interval is measured by simulation in tests/study/test_threshold.c.
 * @return SV_INVALID_INPUT for a question that makes no sense, or the responder's status
 */
SV_API SV_MUST_USE sv_status sv_threshold_search(sv_context *context,
                                                 const sv_threshold_question *question,
                                                 sv_responder responder, void *user,
                                                 sv_threshold_answer *ret_answer);
/** Gives the points back; safe on a zeroed answer and twice in a row. */
SV_API void sv_threshold_free(sv_context *context, sv_threshold_answer *answer);

/** Standard error behind an interval made for its confidence: half width / normal quantile. */
SV_API double sv_threshold_error(const sv_threshold_answer *answer);

/** A straight line y = value + slope·x through points with known errors. */
typedef struct sv_line {
    bool exists; /**< at least two different x, all errors positive */
    double value, value_error, slope, slope_error;
    double chi_square, p_value; /**< NaN for two points */
} sv_line;
/** Weighted least squares, weights 1/error². */
SV_API sv_line sv_line_fit(const double *x, const double *y, const double *error, int n);

/* ------------------------------------------------------------------ plateau */

/**
 * Weights of a thermal mean: Σ_k w_k g(E_k) = ∫ g(E) (−∂f/∂E) dE at μ = energies[at], exact for a g
 * that is straight between the energies; kT = 0 gives g(μ) itself. The marker is averaged over
 * Fermi energies; a smooth f(H) in its place would not be (P x P y P is not linear in P).
 * @param thermal_energy  kT, in the unit of the energies
 * @return false when the window (15 kT either way) reaches beyond the energies
 */
SV_API bool sv_thermal_weights(const double *energies, int64_t n, double thermal_energy, int64_t at,
                               double *ret_weights);

/** A marker at ascending Fermi energies, on the same samples at all of them. */
typedef struct sv_plateau_input {
    const double *energies;
    int64_t n;
    const double *values; /**< [realisation·n + energy]; NaN: unresolved */
    int64_t realisations;
    double clean, within; /**< the band */
    double about;         /**< energy the window must hold */
    double confidence;
    uint64_t seed; /**< of the resampling */
} sv_plateau_input;

/** Energies about `about` at which the mean is within the band. */
typedef struct sv_plateau {
    bool exists; /**< the mean at `about` is within the band */
    double width, centre, edges[2];
    double interval[2]; /**< of the width: percentiles of 1,000 resamples of whole realisations; NaN
                             for one realisation */
    bool open[2]; /**< the window reaches the first or last energy: the width is a lower bound */
} sv_plateau;
/** Edges are interpolated between energies. @return SV_INVALID_INPUT for energies that do not
 * ascend and bands that make no sense */
SV_API SV_MUST_USE sv_status sv_plateau_measure(sv_context *context, const sv_plateau_input *input,
                                                sv_plateau *ret_plateau);

/* ------------------------------------------------------------- finite size */

enum { SV_SCALING_SIZES = 32, SV_SCALING_ORDER = 9, SV_SCALING_REASONS = 8 };

/** All realisations of one size at one parameter. */
typedef struct sv_scaling_point {
    double size, parameter;
    const double *values; /**< sv_scaling_data.realisations of them, by realisation number; NaN: not
                               there, or unresolved. Borrowed */
} sv_scaling_point;

/**
 * Curves of several sizes. The same realisation number at two points stands for the same random
 * numbers: whatever is correlated that way is accounted for.
 */
typedef struct sv_scaling_data {
    const sv_scaling_point *points; /**< in any order, no pair twice */
    sv_index n_points;
    int64_t realisations;
    double quantum; /**< smallest change of one value, 1 for an index; 0: continuous. A mean of n
                         equal values gets the standard error quantum/n instead of 0 */
    double floor;   /**< least standard error of a mean (its numerical error); 0: none */
} sv_scaling_data;

typedef enum sv_correction {
    SV_CORRECTION_NONE,
    SV_CORRECTION_FIXED, /**< L^{−y} with y given */
    SV_CORRECTION_FREE   /**< y fitted; needs four sizes */
} sv_correction;

/** How to look. Start from sv_scaling_options_default(). */
typedef struct sv_scaling_options {
    size_t size;
    double range[2]; /**< of the parameter; NaN: automatic, see sv_scaling_study() */
    int order;       /**< of F, 1 … SV_SCALING_ORDER; 0: automatic */
    sv_correction correction;
    double exponent;   /**< y of SV_CORRECTION_FIXED, above 0 */
    int resamples;     /**< of the bootstrap, at least 50 */
    uint64_t seed;     /**< of its random numbers */
    double confidence; /**< of the intervals */
} sv_scaling_options;
/** Automatic range and order, no correction, 400 resamples, 95 %. */
SV_API sv_scaling_options sv_scaling_options_default(void);

/** A number with half the central 68 % and the central interval of its bootstrap distribution; NaN
 *  where it does not exist, an end of the interval may be infinite. */
typedef struct sv_scaling_estimate {
    double value, standard_error, interval[2];
} sv_scaling_estimate;

/** Where the curves of two sizes cross. */
typedef struct sv_scaling_crossing {
    double sizes[2];
    bool found;
    char reason[200];       /**< why not */
    sv_scaling_estimate at; /**< the parameter */
    double height;          /**< the common mean there */
    double evidence[2];     /**< sum of the differences below and above, in standard errors */
} sv_scaling_crossing;

/** The collapse with one size left out. */
typedef struct sv_scaling_without {
    double size;
    bool fitted;
    double critical, nu;
    double
        shift[2]; /**< of p_c and of 1/ν against the whole fit, in standard errors of the shift */
} sv_scaling_without;

/** One mean in the figure of the collapse. */
typedef struct sv_scaling_row {
    double size, parameter, mean, standard_error;
    bool used;                   /**< inside the range of the collapse */
    double x, collapsed, fitted; /**< (p−p_c) L^{1/ν}; mean less its correction; F(x) */
    double residual;             /**< (mean − fit)/standard_error */
} sv_scaling_row;

/** mean = F[(p−p_c) L^{1/ν}] + L^{−y} G[(p−p_c) L^{1/ν}] */
typedef struct sv_scaling_collapse {
    bool fitted;  /**< there are numbers, to be trusted only when decided */
    bool decided; /**< none of the reasons against holds */
    int n_reasons;
    char reasons[SV_SCALING_REASONS][240];
    sv_scaling_estimate critical, nu, exponent; /**< exponent: NaN unless free */
    int order, correction_order;                /**< of F and G (−1: no G) */
    int n_points, n_parameters;
    double range[2];         /**< of the parameters used */
    double reach;            /**< largest |x| used */
    double chi_square;       /**< Σ residual² */
    int degrees_of_freedom;  /**< n_points − n_parameters: were the points independent */
    double scale, effective; /**< under the correlations of the data chi_square is distributed as
                                  scale · χ² of `effective` degrees of freedom */
    double p_value;
    int resamples, failed;                        /**< failed: of the bootstrap's refits */
    sv_scaling_without without[SV_SCALING_SIZES]; /**< ascending sizes; from three sizes on */
    int n_without;
} sv_scaling_collapse;

/** All answers. Owned: rows, curve. */
typedef struct sv_scaling {
    double confidence;
    int n_sizes;
    double sizes[SV_SCALING_SIZES];                  /**< ascending */
    int64_t least, most;                             /**< realisations with a value at a point */
    sv_scaling_crossing crossings[SV_SCALING_SIZES]; /**< of neighbouring sizes */
    int n_crossings;
    double drift;                 /**< last crossing − first, NaN below two */
    double drift_z;               /**< in standard errors */
    sv_scaling_estimate crossing; /**< p_c from crossings: weighted mean, or that of the largest
                                       pair when they drift (|drift_z| > 2); NaN: none found */
    sv_scaling_collapse collapse;
    sv_scaling_row *rows; /**< by size, then parameter */
    sv_index n_rows;
    double *curve; /**< x, F(x) of n_curve values of x over the range used */
    int n_curve;
} sv_scaling;

/**
 * Crossings and collapse of curves of different sizes near a continuous transition.
 *
 * *Crossing* of two sizes: of all splits of the common parameters the one whose sums of differences
 * below and above are best established with opposite signs; both must exceed two standard errors.
 * The root of a parabola fitted, weighted, to the differences at up to three parameters on each
 * side (a line when there are fewer than five).
 *
 * *Collapse*: least squares, weighted with the standard errors, in p_c, 1/ν, the coefficients of
 * the polynomial F, and with a correction those of G (order 1) and y, by Levenberg and Marquardt
 * from the best cells of a grid over (p_c, ν, y) whose linear part is solved exactly. Order of F:
 * that of the smallest χ² + 2 tr(PΣ), P the projection on the columns of the Jacobian, Σ the
 * correlations of the means (for independent points Mallows' C_p; B. Efron, J. Am. Stat. Assoc. 99,
 * 619 (2004)), and two more, so that what F leaves out stays below the errors. Automatic range: all
 * parameters, then one less at the end farther from p_c, until the p-value is 0.05 and those two
 * orders exist.
 *
 * *Errors*: the bootstrap resamples realisation numbers, at all points at once, and refits. χ² is
 * judged with the covariance of the realisations: its first two moments give scale and effective
 * degrees of freedom (J. N. K. Rao, A. J. Scott, Ann. Stat. 12, 46 (1984), second order).
 *
 * *Refusal*: reasons in words when there are fewer than three sizes, p_c is not inside the range,
 * the interval of ν is not bounded within [0.1, 20], the p-value is below 1e-3, more than a tenth
 * of the resamples fail, smallest and largest size do not cross, or leaving out the smallest size
 * moves p_c or 1/ν by more than 3.3 standard errors of the shift.
 * @param[out] ret_scaling give back with sv_scaling_free()
 * @return SV_INVALID_INPUT for a table that is none (sizes not positive, a pair twice, more than
 *         SV_SCALING_SIZES sizes, options out of range); SV_INTERRUPTED; never because the data
 *         cannot decide
 */
SV_API SV_MUST_USE sv_status sv_scaling_study(sv_context *context, const sv_scaling_data *data,
                                              const sv_scaling_options *options,
                                              sv_scaling *ret_scaling);
/** Safe on a zeroed struct and twice in a row. */
SV_API void sv_scaling_free(sv_context *context, sv_scaling *scaling);

#ifdef __cplusplus
}
#endif
#endif
