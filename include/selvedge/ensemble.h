/* SPDX-License-Identifier: GPL-3.0-or-later */
/**
 * @file ensemble.h
 * Layer 7: realisations over worker threads, and their statistics in realisation order.
 */
#ifndef SELVEDGE_ENSEMBLE_H
#define SELVEDGE_ENSEMBLE_H

#include "marker.h"

#ifdef __cplusplus
extern "C" {
#endif

enum { SV_MAX_MARKERS = 16, SV_MAX_KEYS = 16, SV_MAX_AXES = 2 };

/** A marker asked for, with the values of its keys. */
typedef struct sv_marker_request {
    int marker; /**< row of sv_marker_table() */
    sv_value values[SV_MAX_KEYS];
} sv_marker_request;

/** Everything that fixes one realisation but its number: one point of a sweep. All borrowed. */
typedef struct sv_case {
    const sv_flake *open_flake;
    const sv_flake *closed_flake; /**< NULL when no torus exists */
    char no_torus[160];           /**< why */
    const sv_disorder *disorder;
    int n_disorder;
    sv_occupation occupation;
    sv_projector_options solve;
    uint64_t seed;
    sv_marker_request markers[SV_MAX_MARKERS];
    int n_markers;
} sv_case;

/** One realisation of one point: what the ledger keeps. */
typedef struct sv_record {
    int32_t point;
    int64_t realisation;
    sv_status status; /**< SV_OK, or why the whole realisation failed */
    int64_t sites;
    int64_t vacancies;
    double seconds;
    int32_t n_outcomes;
    sv_outcome outcomes[SV_MAX_MARKERS]; /**< in the order of sv_case.markers */
} sv_record;

/**
 * Computes one realisation: draws the sample on the boundaries the markers need, builds the
 * projectors, evaluates the markers. A numerical failure is recorded, not returned.
 * @param site_values  n values of the local Chern marker or NULL
 * @param ret_sample   if not NULL, receives the sample of the open flake (give back with
 *                     sv_sample_free())
 * @return SV_NO_MEMORY, SV_INTERRUPTED, SV_INVALID_INPUT, SV_INTERNAL
 */
SV_API SV_MUST_USE sv_status sv_realise(sv_context *context, const sv_case *point,
                                        sv_index realisation, double **ret_site_values,
                                        sv_sample *ret_sample, sv_record *ret_record);

/** What sv_case_plan() decided, in words. */
typedef struct sv_plan {
    char reason[240]; /**< "chebyshev: degree …" or "dense: …" */
} sv_plan;

/**
 * Settles the engine of a point and its settings (degree, reach of columns, sampled cells) and
 * writes them into point->solve. A pure function of the point: it tries realisation 0 on a sample
 * of the window and takes the lowest degree whose stated error is within point->solve.accuracy.
 * @param site_map        the marker of every site is wanted
 * @param sampling_error  estimator error allowed when the window must be sampled (above 20,000
 *                        window columns)
 * @return SV_INVALID_INPUT when the engine asked for cannot do the job
 */
SV_API SV_MUST_USE sv_status sv_case_plan(sv_context *context, sv_case *point, bool site_map,
                                          double sampling_error, sv_plan *ret_plan);

/** Stop rule: the first n ≥ at_least at which the standard error of `marker` is ≤ the target. */
typedef struct sv_stop_rule {
    bool active;
    int marker; /**< number in sv_case.markers */
    double standard_error;
    int64_t at_least;
} sv_stop_rule;

/** Where finished realisations go. Called from one thread at a time. */
typedef struct sv_sink {
    sv_status (*put)(sv_context *context, const sv_record *record, void *user);
    void *user;
} sv_sink;

/** Settings of a run over all points. */
typedef struct sv_ensemble_options {
    size_t size;
    int64_t realisations; /**< per point */
    int threads;          /**< ≥ 1 */
    sv_stop_rule stop;
    sv_sink sink;
    double time_limit; /**< seconds, 0: none */
} sv_ensemble_options;

/** What an ensemble keeps of a realisation as a whole. */
typedef struct sv_kept_head {
    int64_t sites, vacancies;
    double seconds;
    sv_status status;
    int32_t n_outcomes;
} sv_kept_head;

/** What it keeps of one marker: sv_outcome, its two texts as numbers of sv_ensemble_text(). */
typedef struct sv_kept_outcome {
    double value;
    int64_t index;
    double numerical_error, estimator_error, margin, weakest, sum_over_sites, kappa;
    double highest_occupied, lowest_empty;
    int64_t window_cells, electrons;
    int32_t reason, engine;
    sv_verdict verdict;
} sv_kept_outcome;

/**
 * Realisations of all points, packed: 33 + 112·n_markers bytes each and every text once, taken in
 * blocks as they come in (10⁶ realisations of three markers: 370 MB).
 */
typedef struct sv_ensemble {
    int32_t n_points;
    int32_t n_markers; /**< outcomes a realisation may have */
    int64_t realisations; /**< per point */
    bool *done; /**< [point·realisations + realisation]: is there. Set by sv_ensemble_put() */
    struct sv_shelf *shelf; /**< the rest; private */
} sv_ensemble;

/** Room for all realisations, none done. @return SV_INVALID_INPUT for no points or realisations */
SV_API SV_MUST_USE sv_status sv_ensemble_init(sv_context *context, int32_t n_points,
                                              int64_t realisations, int32_t n_markers,
                                              sv_ensemble *ret_ensemble);
/** Gives everything back; safe on a zeroed ensemble and twice in a row. */
SV_API void sv_ensemble_free(sv_context *context, sv_ensemble *ensemble);
/**
 * Keeps a realisation, replacing an earlier one of its number. Not from two threads at once.
 * @return SV_INVALID_INPUT when point, realisation or the number of outcomes is out of range
 */
SV_API SV_MUST_USE sv_status sv_ensemble_put(sv_context *context, sv_ensemble *ensemble,
                                             const sv_record *record);
/** The whole record of a realisation; false when it is not there. `unresolved_within` and
 * `nearest_level` of its outcomes are not kept (NaN). */
SV_API bool sv_ensemble_get(const sv_ensemble *ensemble, int32_t point, int64_t realisation,
                            sv_record *ret_record);
/** A realisation, or NULL when it is not there. Cheap; the pointer stays good until
 * sv_ensemble_free(). */
SV_API const sv_kept_head *sv_ensemble_head(const sv_ensemble *ensemble, int32_t point,
                                            int64_t realisation);
/** One marker of a realisation, or NULL when the realisation or the outcome is not there. Cheap. */
SV_API const sv_kept_outcome *sv_ensemble_outcome(const sv_ensemble *ensemble, int32_t point,
                                                  int64_t realisation, int marker);
/** Text of a number in sv_kept_outcome; "" for 0. */
SV_API const char *sv_ensemble_text(const sv_ensemble *ensemble, int32_t number);

/**
 * Computes what is missing; what is there (sv_ensemble_put(), sv_run_load()) is skipped.
 * The result does not depend on the number of threads or the order of completion.
 * @return SV_INTERRUPTED on cancel or time limit (records so far are kept), SV_STORAGE when the
 *         sink refuses, or the status of a failed draw
 */
SV_API SV_MUST_USE sv_status sv_ensemble_run(sv_context *context, const sv_case *points,
                                             const sv_ensemble_options *options,
                                             sv_ensemble *ensemble);

/**
 * Number of leading realisations of a point that count: up to the first gap, cut by the stop
 * rule. @param[out] ret_settled true when the rule holds or all realisations are there
 */
SV_API int64_t sv_ensemble_counted(const sv_ensemble *ensemble, int32_t point,
                                   const sv_stop_rule *stop, bool *ret_settled);

/* -------------------------------------------------------------- statistics */

/** Mean and deviation of a series in its order (two passes, compensated sums). */
typedef struct sv_moments {
    int64_t n;
    double mean;
    double deviation;      /**< n−1; 0 for n < 2 */
    double standard_error; /**< deviation/√n; NaN for n < 2 */
} sv_moments;
SV_API sv_moments sv_moments_of(const double *values, int64_t n);
/** Lag-1 autocorrelation Σ(x_i−m)(x_{i+1}−m)/Σ(x_i−m)²; NaN for a constant series. */
SV_API double sv_autocorrelation(const double *values, int64_t n);
/** Student interval of a mean. @return SV_UNDEFINED for n < 2 */
SV_API sv_status sv_student_interval(const sv_moments *moments, double confidence,
                                     double ret_interval[2]);
/** Wilson score interval of a share k/n (Wilson, J. Am. Stat. Assoc. 22, 209 (1927)). */
SV_API void sv_wilson_interval(int64_t k, int64_t n, double confidence, double ret_interval[2]);
/** Quantile of sorted values by linear interpolation (Hyndman–Fan type 7). */
SV_API double sv_quantile_sorted(const double *sorted, int64_t n, double probability);

/** How often an index came out. */
typedef struct sv_index_share {
    int64_t index, count;
    double share; /**< of all counted realisations */
    double interval[2];
} sv_index_share;

enum { SV_N_QUANTILES = 5 };
/** 0.05, 0.25, 0.5, 0.75, 0.95 */
SV_API const double *sv_quantile_levels(void);

/** One marker at one point, over the ensemble. NaN: does not exist. */
typedef struct sv_summary {
    const char *marker; /**< name, static */
    bool is_index;
    bool exists; /**< false: `reason` says why (no torus, nothing resolved …) */
    char reason[200];
    char engine[16];
    int64_t realisations, resolved, unresolved; /**< failed ones count as unresolved */
    int64_t failed;
    double mean, deviation, standard_error, interval[2], confidence;
    double quantiles[SV_N_QUANTILES];
    double bounds[2];       /**< mean if every unresolved one had the worst plausible value */
    double numerical_error; /**< largest */
    double estimator_error; /**< root mean square */
    double disorder_deviation; /**< √max(0, deviation² − estimator_error²): what the disorder alone
                                    does; NaN for an index and below two values */
    double smallest_margin, mean_margin;
    double kappa; /**< localizer: of the first realisation (one per run when automatic) */
    sv_index_share *shares; /**< ascending by index; taken from the context */
    int n_shares;
    char unresolved_reason[200]; /**< of the first unresolved realisation */
} sv_summary;

/** Summarises realisations 0 … counted−1 of a point in order. */
SV_API SV_MUST_USE sv_status sv_summarise(sv_context *context, const sv_ensemble *ensemble,
                                          const sv_case *point, int32_t point_number, int marker,
                                          int64_t counted, sv_summary *ret_summary);
SV_API void sv_summary_free(sv_context *context, sv_summary *summary);

#ifdef __cplusplus
}
#endif
#endif
