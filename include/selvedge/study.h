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

#ifdef __cplusplus
}
#endif
#endif
