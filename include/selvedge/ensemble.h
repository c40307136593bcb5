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
    int64_t first_realisation; /**< added to the number of every realisation, for points that must
                                    share none */
    sv_marker_request markers[SV_MAX_MARKERS];
    int n_markers;
    bool site_maps; /**< records carry the local Chern marker of every site */
} sv_case;

/** One realisation of one point: what the ledger keeps. */
typedef struct sv_record {
    int32_t point;
    int64_t realisation;
    sv_status status; /**< SV_OK, or why the whole realisation failed */
    int64_t sites;
    int64_t vacancies;
    int32_t n_outcomes;
    sv_outcome outcomes[SV_MAX_MARKERS]; /**< in the order of sv_case.markers */
    struct sv_site_record *maps; /**< for the maps of the ensemble, or NULL. Taken from the context
                                       by sv_realise(), given back by its caller; not kept in an
                                       sv_ensemble */
    /* What it cost and who computed it: no two runs agree on these. */
    double seconds;           /**< wall clock */
    double processor_seconds; /**< of its thread; of the process where solve.threads > 1 */
    int64_t peak_bytes;   /**< largest resident memory of the process until then; 0: not known */
    int32_t rank, thread; /**< of the worker, from 0 */
    char host[64];
} sv_record;

/**
 * Computes one realisation: draws the sample on the boundaries the markers need, builds the
 * projectors, evaluates the markers. A numerical failure is recorded, not returned.
 * @param site_values  n values of the local Chern marker or NULL
 * @param ret_sample   if not NULL, receives the sample of the open flake (give back with
 *                     sv_sample_free())
 * @param ret_record   its `maps` (sv_site_record_free()) are there only for a point with site_maps,
 *                     and only when ret_site_values and ret_sample are NULL
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

/**
 * Stop rule: holds at the first n ≥ at_least, in the order of realisations, at which
 * - the time is used up, or
 * - every precision asked for is reached:
 *   standard_error  s²(1 + 5γ²/n)/n ≤ standard_error², s the deviation, γ the skewness of the
 *                   resolved values (without it the rule would stop at skewed values too early);
 *                   values that are all the same must be 4·at_least. Of an index instead
 *                   max(s², (Σ(x − m)² + 2)/(n + 1))/n: as if two more realisations were one off.
 *   share_width     of Wilson's 95 % interval of the share of the most frequent index.
 * Coverage of the intervals under the rule: data/manual/statistics.md.
 */
typedef struct sv_stop_rule {
    bool active;
    int marker;            /**< number in sv_case.markers */
    bool of_index;         /**< it is an index */
    double standard_error; /**< 0: not asked for */
    double share_width;    /**< 0: not asked for */
    double seconds; /**< of computing, summed over the realisations of a point; 0: no limit. What
                       counts then depends on the machine, but given its records no longer on
                       anything else */
    int64_t at_least;
} sv_stop_rule;

enum { SV_STOP_INDICES = 32 };
/** The leading realisations of a point as the rule sees them; begins zeroed. */
typedef struct sv_stop_state {
    int64_t counted;             /**< realisations taken in */
    int64_t judged;              /**< of them, those on which the marker exists */
    int64_t resolved;            /**< of them, those with a value */
    double mean, squares, cubes; /**< central sums of the values */
    double seconds;
    int n_indices;
    int64_t indices[SV_STOP_INDICES], counts[SV_STOP_INDICES];
    bool settled; /**< kept by those who take in whole ensembles */
} sv_stop_state;
/** Takes in the next realisation. @return does the rule hold now? */
SV_API bool sv_stop_add(sv_stop_state *state, const sv_stop_rule *rule, sv_verdict verdict,
                        double value, double seconds);

/** Where finished realisations go. Called from the thread that called sv_ensemble_run(). */
typedef struct sv_sink {
    sv_status (*put)(sv_context *context, const sv_record *record, void *user);
    void *user;
    /** Stores several at once, all or none; NULL: `put` is called for each. */
    sv_status (*put_many)(sv_context *context, const sv_record *records, int n, void *user);
} sv_sink;

/**
 * Several processes that compute one ensemble. Rank 0 calls sv_ensemble_run(), the others
 * sv_team_help() with the same points. Both functions are called from one thread and do not wait.
 */
typedef struct sv_team {
    int rank, size;
    /** Sends a message of up to some 10 kB; the bytes may be reused at once. */
    sv_status (*send)(sv_context *context, int to, const void *message, size_t bytes, void *user);
    /** Takes a message that is waiting, in the order its sender sent them; *ret_bytes = 0 without
     * one. */
    sv_status (*receive)(sv_context *context, int *ret_from, void *message, size_t room,
                         size_t *ret_bytes, void *user);
    void *user;
} sv_team;

/** Settings of a run over all points. */
typedef struct sv_ensemble_options {
    size_t size;
    int64_t realisations; /**< per point */
    int threads;          /**< ≥ 1 */
    sv_stop_rule stop;
    sv_sink sink;
    double time_limit;   /**< seconds, 0: none */
    const sv_team *team; /**< other processes that help, or NULL */
    int32_t task, tasks; /**< compute only what belongs to task `task` (from 1) of `tasks`; 0 of 0:
                              everything */
} sv_ensemble_options;

/**
 * Does a realisation belong to a task? (point + realisation) mod tasks = task − 1: every point is
 * spread over all tasks, and the total number of realisations does not matter. Every one belongs to
 * task 0 of 0.
 */
SV_API bool sv_task_owns(int32_t task, int32_t tasks, int32_t point, int64_t realisation);

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
    int32_t reason, engine, degree;
    sv_verdict verdict;
} sv_kept_outcome;

/**
 * Realisations of all points, packed: 33 + 112·n_markers bytes each and every text once, taken in
 * blocks as they come in (10⁶ realisations of three markers: 370 MB).
 */
typedef struct sv_ensemble {
    int32_t n_points;
    int32_t n_markers;    /**< outcomes a realisation may have */
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
 * `nearest_level` of its outcomes are not kept (NaN), nor is its cost beside `seconds`. */
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
 * The result does not depend on the number of threads and processes or the order of completion.
 * The calling thread hands out, stores and reports; `threads` others compute.
 * @return SV_INTERRUPTED on cancel or time limit (records so far are kept), SV_STORAGE when the
 *         sink refuses, or the status of a failed draw
 */
SV_API SV_MUST_USE sv_status sv_ensemble_run(sv_context *context, const sv_case *points,
                                             const sv_ensemble_options *options,
                                             sv_ensemble *ensemble);

/**
 * Computes realisations for rank 0 of a team until it says that there are no more. The points must
 * be those rank 0 has. Waiting costs a look for messages every five milliseconds.
 * @return SV_OK when rank 0 ended it, whatever the reason; SV_INTERNAL for a message that is none,
 *         or the status of the team's functions. A failure to compute is told to rank 0.
 */
SV_API SV_MUST_USE sv_status sv_team_help(sv_context *context, const sv_team *team,
                                          const sv_case *points, int32_t n_points, int threads);

/**
 * Number of leading realisations of a point that count: up to the first gap, cut by the stop
 * rule. @param[out] ret_settled true when the rule holds or all realisations are there
 */
SV_API int64_t sv_ensemble_counted(const sv_ensemble *ensemble, int32_t point,
                                   const sv_stop_rule *stop, bool *ret_settled);

/* ------------------------------------------ the marker of each site over the ensemble */

/** Fixed point of the maps: a marker m is the integer nearest to m·2^SV_SITE_BITS. */
enum { SV_SITE_BITS = 36, SV_SITE_FAN = 64, SV_SITE_LEVELS = 6, SV_MOST_ENTRIES = 400000 };
/** In place of the value of an entry that is vacant, or whose value a map would leave blank. */
#define SV_SITE_ABSENT INT64_MIN

/**
 * What one realisation adds to the maps of its point. Entries: the sites of the pristine flake in
 * their order, then its cells when a cell has several sites; adatoms count in cells only. The value
 * of a cell is the sum over the sites it has left; none when all are gone or one of them has no
 * value.
 */
typedef struct sv_site_record {
    sv_index n;      /**< entries; 0: the marker of this realisation is not resolved */
    int64_t *values; /**< fixed point, magnitude below 4096·2^36, or SV_SITE_ABSENT */
    int64_t counted; /**< leading realisations of the point known to count when this one came in:
                          the store may sum over them for good. 0 is always right */
} sv_site_record;

/** Entries of a flake: sites, and cells when they differ from sites. */
SV_API sv_index sv_site_entries(const sv_flake *flake);
/** Number of entries before the first cell, or −1 when cells have no entries of their own. */
SV_API sv_index sv_site_first_cell(const sv_flake *flake);
/**
 * Packs the marker of each site of a sample.
 * @param values  sample->n numbers; NaN: no value
 */
SV_API SV_MUST_USE sv_status sv_site_record_make(sv_context *context, const sv_sample *sample,
                                                 const double *values, sv_site_record **ret_record);
SV_API void sv_site_record_free(sv_context *context, sv_site_record *record);

__extension__ typedef __int128 sv_wide; /**< as GCC and Clang have it on 64-bit machines */

/**
 * Exact sums over realisations. Integer addition is associative, so the order of realisations, the
 * number of workers and the way partial sums are joined leave no trace in any bit. Room for 2^31
 * realisations.
 */
typedef struct sv_site_sum {
    sv_index n;           /**< entries */
    int64_t realisations; /**< added, those without values included */
    int64_t *count;       /**< per entry: realisations in which it has a value */
    sv_wide *sum;         /**< of the fixed-point values */
    sv_wide *square;      /**< of their squares */
} sv_site_sum;

/** An empty sum over n entries. */
SV_API SV_MUST_USE sv_status sv_site_sum_init(sv_context *context, sv_index n,
                                              sv_site_sum *ret_sum);
/** Gives it back; safe on a zeroed sum and twice in a row. */
SV_API void sv_site_sum_free(sv_context *context, sv_site_sum *sum);
/** Adds a realisation. @return SV_INVALID_INPUT when it has another number of entries */
SV_API SV_MUST_USE sv_status sv_site_sum_add(sv_context *context, sv_site_sum *sum,
                                             const sv_site_record *record);
/** sum += other. @return SV_INVALID_INPUT when the numbers of entries differ */
SV_API SV_MUST_USE sv_status sv_site_sum_join(sv_context *context, sv_site_sum *sum,
                                              const sv_site_sum *other);

/* -------------------------------------------------------------- statistics */

/** Moments of a series in its order (compensated sums about the mean). */
typedef struct sv_moments {
    int64_t n;
    double mean;
    double deviation;      /**< n−1; 0 for n < 2 */
    double standard_error; /**< deviation/√n; NaN for n < 2 */
    double skewness; /**< k₃/k₂^{3/2} of unbiased cumulants; NaN for n < 3 and constant series */
    double kurtosis; /**< excess, k₄/k₂²; NaN for n < 4 and constant series */
} sv_moments;
SV_API sv_moments sv_moments_of(const double *values, int64_t n);
/** Moments of an entry of the maps over the realisations in which it has a value; exact up to the
 * rounding of each value to 2^−37. NaN mean for n = 0. */
SV_API sv_moments sv_site_moments(const sv_site_sum *sum, sv_index entry);
/** Lag-1 autocorrelation Σ(x_i−m)(x_{i+1}−m)/Σ(x_i−m)²; NaN for a constant series. */
SV_API double sv_autocorrelation(const double *values, int64_t n);
/** Student interval of a mean. @return SV_UNDEFINED for n < 2 */
SV_API sv_status sv_student_interval(const sv_moments *moments, double confidence,
                                     double ret_interval[2]);
/**
 * Student's interval corrected for skewness γ: the quantiles ±t of g(T) = T + γT²/(3√n) +
 * γ²T³/(27n) + γ/(6√n), T = √n (mean − μ)/deviation, turned back to μ. Without skewness it is
 * Student's. What it covers stands in data/manual/statistics.md.
 * @return SV_UNDEFINED for n < 3
 * Reference: P. Hall, J. R. Stat. Soc. B 54, 221 (1992) (value recalled from memory)
 */
SV_API sv_status sv_corrected_interval(const sv_moments *moments, double confidence,
                                       double ret_interval[2]);
enum { SV_BOOTSTRAP_LARGEST = 100000 };
/**
 * Bootstrap interval of a mean, bias-corrected and accelerated (BCa): quantiles Φ(z₀ + z/(1 − az)),
 * z = z₀ ± z_confidence, of the means of `resamples` resamples; z₀ from the share of them below the
 * mean (ties count half), a = Σd³/(6(Σd²)^{3/2}) by the jackknife, d the deviations from the mean.
 * Index k of resample b is ⌊n·w/2³²⌋, w word k mod 4 of the Philox block (⌊k/4⌋, 0, b, 0) under
 * (seed, "bootstrap"): a pure function of data and seed. A value is preferred by at most n/2³².
 * @param n  3 … SV_BOOTSTRAP_LARGEST @param resamples at least 100
 * @return SV_UNDEFINED for n < 3 or a constant series; SV_INVALID_INPUT, SV_NO_MEMORY
 * Cost: n · resamples random numbers.
 * Reference: B. Efron, J. Am. Stat. Assoc. 82, 171 (1987)
 */
SV_API sv_status sv_bootstrap_interval(sv_context *context, const double *values, int64_t n,
                                       int64_t resamples, uint64_t seed, double confidence,
                                       double ret_interval[2]);

/** Two groups are peaks apart when they explain more than this share of the variance. */
#define SV_TWO_PEAKS 0.85
/** Sorted values cut in two groups as the least sum of squares about the groups' means has it. */
typedef struct sv_peaks {
    bool apart;       /**< explained > SV_TWO_PEAKS */
    double explained; /**< share of the variance that lies between the groups; NaN: n < 4 or
                           constant. Normal values: 0.64, uniform: 0.75, two values: 1 */
    int64_t n_low;    /**< values of the lower group */
    double low, high; /**< means of the groups */
} sv_peaks;
/** The best cut; `apart` false and NaN below four values and for constant ones. */
SV_API sv_peaks sv_peaks_of(const double *sorted, int64_t n);
/**
 * Should Student's interval carry a warning? True for a constant series, below 10 values, and for
 * n < 25 skewness² (W. G. Cochran, Sampling Techniques, 3rd ed., section 2.15; recalled from
 * memory). @param[out] message  why, empty when false
 */
SV_API bool sv_interval_warning(const sv_moments *moments, const sv_peaks *peaks, char *message,
                                size_t size);

/** Wilson score interval of a share k/n (Wilson, J. Am. Stat. Assoc. 22, 209 (1927)). */
SV_API void sv_wilson_interval(int64_t k, int64_t n, double confidence, double ret_interval[2]);
enum { SV_EXACT_LARGEST = 1000000 };
/** Interval of a share k/n that covers at least `confidence` whatever the share (Clopper, Pearson,
 *  Biometrika 26, 404 (1934)). Above SV_EXACT_LARGEST: Wilson's. */
SV_API void sv_exact_interval(int64_t k, int64_t n, double confidence, double ret_interval[2]);
/** Exact two-sided test that k of n is a draw with probability ½: P(at least as uneven). */
SV_API double sv_binomial_test(int64_t k, int64_t n);

/** Quantile of sorted values by linear interpolation (Hyndman–Fan type 7). */
SV_API double sv_quantile_sorted(const double *sorted, int64_t n, double probability);
/**
 * Interval of a quantile between order statistics: the innermost ranks with a binomial tail of at
 * most (1 − confidence)/2 outside on each side, whatever the distribution.
 * @param[out] ret_interval NaN at a side where n is too small for it
 * Reference: H. A. David, H. N. Nagaraja, Order Statistics, 3rd ed., section 7.1 (recalled)
 */
SV_API void sv_quantile_interval(const double *sorted, int64_t n, double probability,
                                 double confidence, double ret_interval[2]);

enum { SV_N_QUANTILES = 5, SV_MOST_BINS = 64 };
/** Counts in bins [low + k·width, low + (k+1)·width). */
typedef struct sv_histogram {
    double low, width; /**< width 0: one bin that holds a constant series */
    int n_bins;
    int64_t counts[SV_MOST_BINS];
} sv_histogram;
/**
 * Histogram of sorted values. Width: 2·IQR·n^{−1/3} (Freedman, Diaconis 1981), or where the
 * quartiles coincide 3.49·deviation·n^{−1/3} (Scott 1979), rounded up to 1, 2 or 5 times a power of
 * ten, and further until SV_MOST_BINS suffice; edges are whole multiples of it.
 */
SV_API sv_histogram sv_histogram_of(const double *sorted, int64_t n, double deviation);

/** How a marker differs between two points of a sweep. NaN: does not exist. */
typedef struct sv_comparison {
    int32_t other, point; /**< point minus other */
    const char *marker;
    bool is_index;
    int64_t pairs;                                  /**< realisations resolved at both */
    double difference, standard_error, interval[2]; /**< of the means, 95 %, Student on the pairs */
    double p_value; /**< two-sided that there is none: t test of the pairs; for an index the exact
                         test of `lost` against `gained` */
    double adjusted_p_value; /**< Holm, over the comparisons of the marker; set by the caller */
    double correlation;      /**< of the pairs */
    double unpaired_error, unpaired_p_value; /**< had the points been drawn apart (Welch) */
    int64_t index;                           /**< most frequent one at `other` among the pairs */
    int64_t lost, gained; /**< pairs that have it at `other` only, at `point` only */
} sv_comparison;
/**
 * Paired comparison of n values with n others of the same realisations; sets all fields of
 * ret_comparison from `pairs` to `unpaired_p_value` but adjusted_p_value.
 * @return SV_NO_MEMORY
 */
SV_API SV_MUST_USE sv_status sv_compare_pairs(sv_context *context, const double *other,
                                              const double *values, int64_t n,
                                              sv_comparison *ret_comparison);
/** Exact test of an index (McNemar, Psychometrika 12, 153 (1947), exact form): sets index, lost,
 *  gained and p_value. */
SV_API void sv_compare_indices(const double *other, const double *values, int64_t n, int64_t index,
                               sv_comparison *ret_comparison);
/**
 * Compares a marker at two points. Realisations of the same number share their random numbers, so
 * what the disorder does to both drops out of the difference.
 * @param counted  leading realisations of each point, from sv_ensemble_counted()
 */
SV_API SV_MUST_USE sv_status sv_compare_points(sv_context *context, const sv_ensemble *ensemble,
                                               const sv_case *point, int marker,
                                               const int64_t *counted, int32_t other,
                                               int32_t number, sv_comparison *ret_comparison);
/** Holm, Scand. J. Stat. 6, 65 (1979): p-values adjusted for their number; NaN stays out. */
SV_API SV_MUST_USE sv_status sv_adjust_p_values(sv_context *context, const double *p, int64_t n,
                                                double *ret_adjusted);

/** What a realisation with a sampled window costs and is worth; the last three are the answer. */
typedef struct sv_split {
    double columns;            /**< sampled columns or vectors per realisation, as run */
    double step, most;         /**< they come in blocks of `step`, at most `most` */
    double estimator_error;    /**< of one realisation at `columns` */
    double disorder_deviation; /**< of the marker, without the estimator's part; no smaller than
                                    what can be told from none */
    double seconds_fixed, seconds_per_column;
    double best_columns;
    double work;         /**< for the same error of the mean, relative to `columns` */
    double realisations; /**< for the same error, relative */
} sv_split;
/**
 * The columns per realisation with the least work for a given error of the mean: minimises
 * (σ² + v/m)(c₀ + c₁m) over whole steps, m* = √(v c₀/c₁)/σ; σ disorder, v = estimator_error² ·
 * columns, c₀ fixed cost, c₁ cost of a column.
 * @return false when there is nothing to choose (no estimator error, no costs)
 * Reference: W. G. Cochran, Sampling Techniques, 3rd ed., section 10.6 (recalled from memory)
 */
SV_API bool sv_split_optimise(sv_split *split);

/** How often an index came out. */
typedef struct sv_index_share {
    int64_t index, count;
    double share;             /**< of all counted realisations */
    double interval[2];       /**< Wilson */
    double exact_interval[2]; /**< Clopper–Pearson */
} sv_index_share;

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
    double skewness, kurtosis;
    double interval_corrected[2]; /**< Student's, corrected for skewness; not of an index */
    double interval_bca[2];       /**< bootstrap, see sv_summary_bootstrap(); not of an index */
    int64_t resamples;            /**< behind interval_bca; 0: not computed */
    char warning[200];            /**< why `interval` may cover less than it says, or empty */
    sv_peaks peaks;               /**< not of an index */
    double quantiles[SV_N_QUANTILES];
    double quantile_intervals[SV_N_QUANTILES][2]; /**< order statistics, 95 % */
    sv_histogram histogram;                       /**< n_bins 0: an index */
    double bounds[2];       /**< mean if every unresolved one had the worst plausible value */
    double numerical_error; /**< largest */
    double estimator_error; /**< root mean square */
    double disorder_deviation; /**< √max(0, deviation² − estimator_error²): what the disorder alone
                                    does; NaN for an index and below two values */
    double smallest_margin, mean_margin;
    double kappa;           /**< localizer: of the first realisation (one per run when automatic) */
    sv_index_share *shares; /**< ascending by index; taken from the context */
    int n_shares;
    char unresolved_reason[200]; /**< of the first unresolved realisation */
} sv_summary;

/** Summarises realisations 0 … counted−1 of a point in order. */
SV_API SV_MUST_USE sv_status sv_summarise(sv_context *context, const sv_ensemble *ensemble,
                                          const sv_case *point, int32_t point_number, int marker,
                                          int64_t counted, sv_summary *ret_summary);
/**
 * Adds the bootstrap interval of the mean to a summary of the same arguments; leaves it out of
 * indices, below three values and of constant ones.
 */
SV_API SV_MUST_USE sv_status sv_summary_bootstrap(sv_context *context, const sv_ensemble *ensemble,
                                                  const sv_case *point, int32_t point_number,
                                                  int marker, int64_t resamples,
                                                  sv_summary *summary);
SV_API void sv_summary_free(sv_context *context, sv_summary *summary);

#ifdef __cplusplus
}
#endif
#endif
