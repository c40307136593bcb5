/* SPDX-License-Identifier: GPL-3.0-or-later */
/**
 * @file present.h
 * Layer 10: terminal tables, JSON, CSV and figures.
 */
#ifndef SELVEDGE_PRESENT_H
#define SELVEDGE_PRESENT_H

#include <stdio.h>

#include "study.h"

#ifdef __cplusplus
extern "C" {
#endif

/** Value of one swept parameter at one point. */
typedef struct sv_coordinate {
    const char *path;
    double value; /**< in `unit` where there is one, else in the model's unit */
    bool integer;
    const char *unit;  /**< symbol, or NULL */
    const char *label; /**< readable name with unit for axes, or NULL: made from the path */
    bool pair;         /**< the parameter is a pair [value, second] */
    double second;
} sv_coordinate;

/** What the maps of one point come to. Deviations are of the marker of a cell. */
typedef struct sv_site_summary {
    bool exists;          /**< false: the sheet asks for no maps, or none are there */
    int64_t realisations; /**< in the sums */
    double deviation;     /**< root mean square over the cells with two values or more; NaN: none */
    double largest;       /**< NaN: none */
    int64_t present;      /**< realisations in which that cell has a value */
    int32_t cell[2];
    double at[2]; /**< its centre, lattice constants */
} sv_site_summary;

/** One point with its summaries, in sweep order. */
typedef struct sv_point_result {
    sv_coordinate coordinates[SV_MAX_AXES];
    int n_coordinates;
    int64_t realisations;
    double mean_sites, mean_vacancies; /**< over the realisations counted; NaN without any */
    sv_summary summaries[SV_MAX_MARKERS];
    int n_summaries;
    sv_site_summary sites;
    bool has_split; /**< the window was sampled, and `split` says how it might be better */
    sv_split split;
} sv_point_result;

/** Curves of several flake sizes compared, and what came out. */
typedef struct sv_finite_size {
    const char *marker;
    sv_coordinate size, parameter; /**< the axes; their values mean nothing */
    sv_scaling scaling;            /**< in the units of the axes */
} sv_finite_size;

/** Two points compared, and why. */
typedef struct sv_compared {
    sv_comparison comparison;
    bool first;     /**< with the first point of the sweep */
    bool neighbour; /**< with the one before it along an axis */
} sv_compared;

/** All a table, a JSON document or a sweep figure needs. */
typedef struct sv_result {
    const char *title;
    sv_point_result *points;
    int32_t n_points;
    sv_compared *comparisons; /**< with the first point, then along the axes; all markers of a pair
                                   follow each other */
    int32_t n_comparisons;
    double seconds;              /**< of this invocation; kept outside `points` */
    bool complete;               /**< false: stopped early */
    sv_finite_size *finite_size; /**< or NULL */
} sv_result;

/**
 * A value with its standard error in the last digits: 0.9981(4), 12.3(1.5), 1(0); the error has
 * one digit, two when it begins with 1. A NaN error leaves the parentheses out, a NaN value gives
 * "-". @param[out] text at least 48 bytes
 */
SV_API void sv_format_uncertain(double value, double error, char *text, size_t size);

/**
 * A text fit to be shown on a terminal: control characters and marks that turn the direction of
 * writing are written out (`\n`, `\x1b`, `\u202e`), bytes that are no UTF-8 become U+FFFD. Cut
 * at `size`.
 */
SV_API void sv_text_clean(const char *text, char *clean, size_t size);

/** JSON document of an ensemble (contract: "Results"), newline-terminated; taken from context. */
SV_API SV_MUST_USE sv_status sv_result_json(sv_context *context, const sv_result *result,
                                            char **ret_text);
/** CSV of all points: one row per point and marker, a header with the parameter paths. */
SV_API SV_MUST_USE sv_status sv_result_csv(sv_context *context, const sv_result *result,
                                           char **ret_text);
/** CSV of the comparisons: one row per pair of points and marker. */
SV_API SV_MUST_USE sv_status sv_comparisons_csv(sv_context *context, const sv_result *result,
                                                char **ret_text);
/** Table for a terminal, at most 80 columns. */
SV_API void sv_result_print(const sv_result *result, bool colour, FILE *stream);

/**
 * The pieces of a sample in one line: "2 pieces (largest: 840 sites), 3 dangling, …".
 * @param[out] ret_text taken from the context
 */
SV_API SV_MUST_USE sv_status sv_inventory_text(sv_context *context, const sv_sample *sample,
                                               char **ret_text);

/** One realisation seen site by site. */
typedef struct sv_map_result {
    const char *title;
    const sv_sample *sample;
    const sv_case *point;
    const sv_record *record;
    const double *site_values; /**< local Chern marker per site, or NULL */
    double lattice_constant;   /**< nm, 0: none */
    const char *note;          /**< shown under the title of the figure, or NULL */
    const sv_coarse *coarse;   /**< means over blocks, from which site_values were made, or NULL */
    const sv_survey *survey;   /**< the localizer at many points and over κ, or NULL */
    const sv_flow_trace *flow; /**< the levels of the spectral flow, or NULL */
} sv_map_result;

/** JSON document of one realisation (contract: `map`). */
SV_API SV_MUST_USE sv_status sv_map_json(sv_context *context, const sv_map_result *map,
                                         char **ret_text);
SV_API void sv_map_print(const sv_map_result *map, bool colour, FILE *stream);
/** Blocks of a coarse map as CSV: x,y,mean,error,numerical_error,cells,sampled; blocks without a
 *  cell of the flake are left out, numbers that do not exist are empty. */
SV_API SV_MUST_USE sv_status sv_coarse_csv(sv_context *context, const sv_coarse *map,
                                           char **ret_text);
/** Probe points of a survey as CSV: x,y,kappa,index,gap,certain,resolved,reason, x fastest; the
 *  index of an unresolved one is empty. */
SV_API SV_MUST_USE sv_status sv_survey_csv(sv_context *context, const sv_survey *survey,
                                           char **ret_text);

/** The levels of a spectral flow as CSV: flux [quanta], energy (from the Fermi energy, unit of the
 *  model), hole_weight. Taken from the context. */
SV_API SV_MUST_USE sv_status sv_flow_csv(sv_context *context, const sv_flow_trace *trace,
                                         char **ret_text);

/** The local Chern marker of each site over the ensemble of one point. All borrowed. */
typedef struct sv_site_map {
    const char *title;
    const char *note; /**< shown under the title of figures, or NULL */
    const sv_flake *flake;
    const sv_case *point;    /**< for the window */
    const sv_site_sum *sum;  /**< sv_site_entries(flake) entries */
    double lattice_constant; /**< nm, 0: none */
} sv_site_map;
/** Moments of the marker of a cell: the sum over the sites it has left in a realisation. */
SV_API sv_moments sv_site_map_cell(const sv_site_map *map, sv_index cell);
/** The largest deviation and where; the first of equal ones. */
SV_API sv_site_summary sv_site_map_summary(const sv_site_map *map);
/**
 * One row per site of the pristine flake:
 * point,site,cell_i,cell_j,orbital,x,y,mean,deviation,standard_error,present and the same four of
 * its cell, cell_mean … cell_present. Positions in lattice constants; present: realisations in
 * which it has a value; empty: does not exist.
 * @param head  begin with the names of the columns
 * @param[out] ret_text taken from the context
 */
SV_API SV_MUST_USE sv_status sv_site_map_csv(sv_context *context, const sv_site_map *map,
                                             int32_t point, bool head, char **ret_text);

/** The spectrum of one realisation. */
typedef struct sv_spectrum_result {
    const char *title;
    int64_t realisation;
    const sv_spectrum *spectrum; /**< borrowed */
    const sv_sample *sample;     /**< borrowed, for the inventory, or NULL */
} sv_spectrum_result;

/** JSON document of a spectrum (contract: `spectrum`). */
SV_API SV_MUST_USE sv_status sv_spectrum_json(sv_context *context, const sv_spectrum_result *result,
                                              char **ret_text);
/** Density of states as CSV: energy,density. */
SV_API SV_MUST_USE sv_status sv_spectrum_csv(sv_context *context, const sv_spectrum_result *result,
                                             char **ret_text);
SV_API void sv_spectrum_print(const sv_spectrum_result *result, bool colour, FILE *stream);

/**
 * Colour of the marker maps: diverging, even steps in the Oklab space (Ottosson 2020), lightness
 * falling equally to both sides of a neutral centre.
 * @param position −1 … 1, clipped; 0 is the neutral centre
 * @param[out] ret_rgb sRGB, 0 … 255
 */
SV_API void sv_palette_colour(double position, uint8_t ret_rgb[3]);
/** Colour of a number that has no sign, such as a deviation: lightness falls in even steps from the
 * neutral centre of sv_palette_colour(), in hues that the marker maps do not have.
 * @param position 0 … 1, clipped */
SV_API void sv_palette_amount(double position, uint8_t ret_rgb[3]);

/** Paths of the files of one figure; empty when not made. */
typedef struct sv_figure_files {
    char script[512], data[512], svg[512], pdf[512], png[512];
    bool drawn; /**< false: gnuplot is missing or failed; `reason` says so */
    char reason[300];
} sv_figure_files;

/** Marker map of a flake, diverging colours about 0, vacancies visible, scale bar. */
SV_API SV_MUST_USE sv_status sv_figure_map(sv_context *context, const char *folder,
                                           const char *name, const sv_map_result *map,
                                           sv_figure_files *ret_files);
/** One realisation of a sample as it is, before any marker. */
typedef struct sv_sample_result {
    const char *title;
    const sv_sample *sample; /**< borrowed */
    const sv_sample *whole;  /**< borrowed: the same before pieces were dropped, or NULL */
    int64_t realisation;
    double lattice_constant; /**< nm, 0: none */
    double energy_unit;      /**< eV per unit of the model, 0: none known */
} sv_sample_result;

/** JSON document of a sample: its inventory. */
SV_API SV_MUST_USE sv_status sv_sample_json(sv_context *context, const sv_sample_result *result,
                                            char **ret_text);
/**
 * The flake as a figure: up to 3,000 positions as symbols with their bonds, larger ones as pixels
 * (each shows the site nearest to its middle); vacancies, removed pieces, dangling and isolated
 * positions as symbols of their own, the on-site disorder as colour, the edge, a scale bar. Hops
 * around a torus are dashed stubs.
 * @param ending "svg", "pdf" or "png" for one picture only, NULL for all three
 */
SV_API SV_MUST_USE sv_status sv_figure_sample(sv_context *context, const char *folder,
                                              const char *name, const char *ending,
                                              const sv_sample_result *result,
                                              sv_figure_files *ret_files);
/** Curves of a family that can be told apart. */
enum { SV_MOST_CURVES = 6 };
/** Sweep curves with error bars and the quantised values marked: one per marker, or with two axes
 *  a family, one curve per value of an axis with at most six (a size before others); else not
 *  drawn, with a reason. */
SV_API SV_MUST_USE sv_status sv_figure_sweep(sv_context *context, const char *folder,
                                             const char *name, const sv_result *result,
                                             sv_figure_files *ret_files);
/** Curves of all sizes with their crossing, their collapse, and the residuals of it in standard
 *  errors. @return SV_INVALID_INPUT without result->finite_size; else as sv_figure_map() */
SV_API SV_MUST_USE sv_status sv_figure_scaling(sv_context *context, const char *folder,
                                               const char *name, const sv_result *result,
                                               sv_figure_files *ret_files);
/**
 * The mean of a marker over the two axes of a sweep: a raster of diverging colours about 0, lines
 * where the mean, interpolated between the points, crosses a half-integer, the nearest integer
 * written in each region, the points, unresolved shares as crosses, missing values hatched.
 * @param marker number of the summary
 * @return SV_INVALID_INPUT when the result has no two axes, four points, or no such marker
 */
SV_API SV_MUST_USE sv_status sv_figure_phase(sv_context *context, const char *folder,
                                             const char *name, const sv_result *result, int marker,
                                             sv_figure_files *ret_files);
/** Density of states with Fermi energy and gap; below, the levels next to the Fermi energy. */
SV_API SV_MUST_USE sv_status sv_figure_spectrum(sv_context *context, const char *folder,
                                                const char *name, const sv_spectrum_result *result,
                                                sv_figure_files *ret_files);

/** Localizer gap over a grid of probe points: shades, the boundary of each region of equal resolved
 *  index with the index written in it, unresolved probes crossed, outline of the flake. */
SV_API SV_MUST_USE sv_status sv_figure_probes(sv_context *context, const char *folder,
                                              const char *name, const sv_map_result *map,
                                              sv_figure_files *ret_files);
/** Mean, or deviation, of the marker of each cell over an ensemble, as sv_figure_map(). */
SV_API SV_MUST_USE sv_status sv_figure_site_map(sv_context *context, const char *folder,
                                                const char *name, const sv_site_map *map,
                                                bool deviation, sv_figure_files *ret_files);
/** Index and gap along a line of probe points (with the certified bound between them), or against
 *  κ (`kappas`), as two panels. */
SV_API SV_MUST_USE sv_status sv_figure_profile(sv_context *context, const char *folder,
                                               const char *name, const sv_map_result *map,
                                               bool kappas, sv_figure_files *ret_files);
/** Levels against flux with the Fermi energy: at the hole (dots), at the outline (open squares), at
 *  neither with 0.75 of the weight (crosses).
 *  @return SV_INVALID_INPUT when map->flow holds no levels; else as sv_figure_map() */
SV_API SV_MUST_USE sv_status sv_figure_flow(sv_context *context, const char *folder,
                                            const char *name, const sv_map_result *map,
                                            sv_figure_files *ret_files);

/* --------------------------------------------------------------- tolerance */

/** A parameter as results show it: shown value = scale · value in the unit of the model. */
typedef struct sv_shown_parameter {
    const char *path;
    const char *unit; /**< symbol, or NULL */
    double scale;
    bool integer;
} sv_shown_parameter;

/** One threshold: of a marker, for a flake, at a value of the second parameter. */
typedef struct sv_tolerance_row {
    const char *marker; /**< name, static */
    bool is_index;
    bool primary;     /**< the quantity asked about; others get the same criterion */
    int64_t cells[2]; /**< of the flake; 0: the flake of the sheet */
    bool has_second;
    double second;              /**< value of the second parameter, unit of the model */
    double clean;               /**< value of the flake without disorder */
    double within;              /**< band used for this marker; NaN: the clean index itself */
    sv_threshold_answer answer; /**< in the unit of the model */
} sv_tolerance_row;

/** Threshold against size, where the sizes carry it: p(L) = limit + slope/L, weighted. */
typedef struct sv_size_trend {
    bool asked;  /**< at least two sizes */
    bool exists; /**< false: `reason` */
    double limit, standard_error;
    double p_value; /**< of the straight line; NaN with two sizes */
    char reason[200];
} sv_size_trend;

/** All that `tolerance` found. */
typedef struct sv_tolerance_result {
    const char *title;
    sv_shown_parameter parameter, second; /**< second.path NULL: none */
    double range[2], precision, confidence;
    const char *quantity; /**< as written in the sheet */
    bool of_mean;
    double within, share; /**< as written; NaN: not given */
    double per_area; /**< cm⁻² per unit of the parameter as a share of positions; 0: no such unit */
    sv_tolerance_row *rows; /**< primary ones first for each flake and second value */
    int n_rows;
    sv_size_trend trend;
    int64_t realisations; /**< computed in all */
    double seconds;
} sv_tolerance_result;

/** The row that answers the question: primary, last flake, first value of the second parameter. */
SV_API const sv_tolerance_row *sv_tolerance_main(const sv_tolerance_result *result);
/** The document of contract `tolerance` with points, sizes, markers and budget. Given back by
 *  sv_give(). */
SV_API SV_MUST_USE sv_status sv_tolerance_json(sv_context *context,
                                               const sv_tolerance_result *result, char **ret_text);
/** Every point asked about, one line each: marker, cells, second, parameter, responses, measure …
 */
SV_API SV_MUST_USE sv_status sv_tolerance_csv(sv_context *context,
                                              const sv_tolerance_result *result, char **ret_text);
/** Table and closing paragraph in plain words. */
SV_API void sv_tolerance_print(const sv_tolerance_result *result, FILE *stream);
/** What was asked against the parameter, with the target and the interval; with a second parameter
 *  the frontier between both. @return as sv_figure_map() */
SV_API SV_MUST_USE sv_status sv_figure_tolerance(sv_context *context, const char *folder,
                                                 const char *name,
                                                 const sv_tolerance_result *result,
                                                 sv_figure_files *ret_files);

/* ------------------------------------------------------------------ plateau */

/** k_B in eV/K: 1.380649e-23 J/K over 1.602176634e-19 J/eV, both exact in the SI since 2019. */
#define SV_BOLTZMANN_EV (1.380649e-23 / 1.602176634e-19)

/** A marker against the Fermi energy; energies in the unit of the model. All borrowed. */
typedef struct sv_plateau_result {
    const char *title, *marker;
    double clean, within, confidence;
    double energy_unit;                             /**< eV per unit of the model; 0: none known */
    const double *energies, *mean, *standard_error; /**< n values; NaN where nothing is resolved */
    int64_t n, realisations, unresolved;
    const double *kelvin, *thermal,
        *thermal_error;          /**< [temperature·n + energy]; NaN where the
                                      thermal window reaches beyond the energies */
    const double *thermal_width; /**< of the window at each temperature; NaN: none */
    int n_temperatures;
    sv_plateau plateau;                       /**< at 0 K */
    const double *density_energies, *density; /**< states per site and energy */
    sv_index n_density;
    double seconds;
} sv_plateau_result;

/** The document of contract `plateau`. Given back by sv_give(). */
SV_API SV_MUST_USE sv_status sv_plateau_json(sv_context *context, const sv_plateau_result *result,
                                             char **ret_text);
/** One line per energy: mean and standard error at 0 K and at each temperature. */
SV_API SV_MUST_USE sv_status sv_plateau_csv(sv_context *context, const sv_plateau_result *result,
                                            char **ret_text);
/** The window in plain words. */
SV_API void sv_plateau_print(const sv_plateau_result *result, FILE *stream);
/** Mean with its band and the thermal means, over the density of states. @return as
 *  sv_figure_map() */
SV_API SV_MUST_USE sv_status sv_figure_plateau(sv_context *context, const char *folder,
                                               const char *name, const sv_plateau_result *result,
                                               sv_figure_files *ret_files);

/* ----------------------------------------------------------------- progress */

/** Progress display of the terminal: bar, counts, time to go. */
typedef struct sv_progress_bar {
    FILE *stream;
    bool terminal; /**< false: sparse plain lines */
    double start_seconds, last_seconds;
    sv_index first_done;
    int last_percent;
    bool shown;
} sv_progress_bar;
SV_API void sv_progress_bar_init(sv_progress_bar *bar, FILE *stream, bool terminal);
/** An sv_progress_function with user = sv_progress_bar. */
SV_API void sv_progress_bar_show(const char *phase, sv_index done, sv_index total, void *user);
/** Clears the line. */
SV_API void sv_progress_bar_end(sv_progress_bar *bar);

/** What `info RUN` shows. All borrowed. */
typedef struct sv_provenance {
    const char *folder;
    const sv_run *run;
    const sv_run_history *history;
    const sv_run_health *health;
} sv_provenance;

/** Provenance, health and cost of a run as JSON. */
SV_API SV_MUST_USE sv_status sv_provenance_json(sv_context *context, const sv_provenance *p,
                                                char **ret_text);
SV_API void sv_provenance_print(const sv_provenance *p, FILE *stream);

#ifdef __cplusplus
}
#endif
#endif
