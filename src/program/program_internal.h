/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The program: options, commands, and what the commands share. */
#ifndef SELVEDGE_PROGRAM_INTERNAL_H
#define SELVEDGE_PROGRAM_INTERNAL_H

#include <jansson.h>

#include <selvedge/present.h>
#include <selvedge/sheet.h>

enum { MOST_OVERRIDES = 64, MOST_TASKS = 1000000, MOST_POINTS = 100000 };

typedef enum choice { CHOICE_AUTO, CHOICE_ALWAYS, CHOICE_NEVER } choice;

/* The command line after parsing. */
typedef struct options {
    const struct command *command;
    const char **files;
    int n_files;
    const char *output, *hamiltonian, *sites, *csv, *probes, *blocks, *flow, *maps;
    int64_t realisation;
    int64_t threads; /* 0: as many as the affinity mask allows */
    double time_limit;
    int64_t task, tasks; /* 0 of 0: the whole ensemble */
    bool json, quiet, dry_run, force;
    int verbose;
    choice colour, progress;
    const char *overrides[MOST_OVERRIDES];
    int n_overrides;
    char *made[2]; /* overrides made from -n and -s */
    char command_line[2000];
} options;

/* A command: one row of the table in commands.c. */
typedef struct command {
    const char *name, *operands, *doc;
    const char *option_letters; /* ids of the options it takes, see option_rows */
    int files_low, files_high;
    int (*run)(sv_context *context, const options *o);
} command;

const command *command_table(int *ret_count);

/* Parses; returns −1 to go on, or an exit code (help, usage error). */
int options_parse(int argc, char **argv, options *ret);
void options_free(options *o);
void print_help(const command *one, FILE *stream);

/* ---- session: what every command does first ---- */

/* One point of the sweep, ready to compute. */
typedef struct point {
    sv_setup setup;
    sv_flake open, closed;
    bool has_closed;
    sv_case problem;
    sv_coordinate coordinates[SV_MAX_AXES];
    int n_coordinates;
    sv_plan plan; /* of its engine, in words */
} point;

struct session;
/* Makes of a computed ensemble what a command is for, in place of the summaries. */
typedef sv_status ensemble_conclusion(struct session *s, sv_run *run, const sv_ensemble *ensemble,
                                      double seconds);

/* A sheet opened for work. */
typedef struct session {
    sv_context *context;
    const options *options;
    sv_blas_info blas;
    sv_sheet *sheet;
    sv_kind markers[SV_MAX_MARKERS];
    int n_markers;
    sv_setup base; /* the sheet as written */
    point *points;
    int32_t n_points;
    int threads;
    char kernel[256], version[100]; /* of the rows: this program's, or those of a run */
    const char *plan_lines; /* borrowed: the engines as a run notes them, when not planned here */
    bool inside_run;        /* the sheet is the one in a run folder */
    bool add_map_marker;    /* the map command always computes the local Chern marker */
    ensemble_conclusion *conclude; /* or NULL: summaries of all points */
    bool open_ended;               /* its points are chosen as the work goes on */
    char (*undrawn)[400];          /* report: the first figure that could not be drawn, or NULL */
    bool levels_only; /* the spectrum command computes no marker: other needs of memory */
} session;

/* Reads the sheet and builds all points of its sweep (`with_sweep`) or the sheet as written. */
sv_status session_open(sv_context *context, const options *o, const char *path, bool inside_run,
                       bool with_sweep, session *ret);
/* Shows the context's error at a top-level key of the sheet; returns the status it was given. */
sv_status session_blame(session *s, const char *key, sv_status status);
void session_close(session *s);
/* Flakes, markers and options of a point whose setup is filled. */
sv_status session_make_point(session *s, point *p);
/* Has every window of every point a cell? An error is shown at the flake. */
sv_status session_try_windows(session *s);
/* Settles the engine of every point (tries realisation 0 of each). */
sv_status session_plan(session *s, bool site_map);
/* The plans of all points as comment lines of a sheet; taken from the context. */
sv_status session_plan_text(const session *s, char **ret_text);
/* Refuses what would not fit memory; lowers the number of threads where that helps. */
sv_status session_fit_memory(session *s);

/* Forecast of the sheet on this machine. */
typedef struct forecast {
    int64_t sites;        /* largest flake of the sweep */
    int64_t realisations; /* over all points */
    double bytes_per_thread, bytes_available;
    double bytes_before;            /* the program itself */
    double seconds_before;          /* reading the sheet, settling the engines */
    double seconds_per_realisation; /* of the costliest point, on one thread */
    double seconds;                 /* whole ensemble on `threads` */
    double bytes_ledger;            /* of a run with all its realisations */
    double probes, seconds_probes;  /* localizer at many points: a map, on `threads` */
} forecast;
sv_status session_forecast(session *s, bool calibrate, forecast *ret);
/* How many projectors one realisation needs: one per boundary asked for. */
void boundaries_needed(const session *s, const sv_setup *setup, bool *open, bool *closed);
/* Does a marker of the open flake need a basis of the occupied space? */
bool needs_open_basis(const sv_setup *setup);
/* Processor time of this process, which other programs on the machine do not lengthen. */
double processor_seconds(void);

/* Seconds the small trials of forecast_cost.c took, 0 where one has not been needed yet. */
enum { COST_TRIALS = 9 };
typedef struct cost_model {
    double seconds[COST_TRIALS], sites[COST_TRIALS];
} cost_model;
/* Processor seconds one realisation of a point takes; runs the trials it needs. */
sv_status cost_of_point(session *s, const point *p, cost_model *costs, double *ret_seconds);
/* Processor seconds of one probe of the localizer. */
sv_status cost_of_probe(session *s, const point *p, cost_model *costs, double *ret_seconds);
void print_forecast(const forecast *f, const session *s, const char *prefix, FILE *stream);

/* Arithmetic kernel of this machine as text: part of the identity of a run. */
void kernel_text(const sv_blas_info *blas, char *text, size_t size);

/* Prints the context's error as `selvedge: error: …`; returns the exit code of the status. */
int fail_exit(const sv_context *context, sv_status status);

/* Makes the result of an ensemble: summaries of all points. */
sv_status result_make(session *s, const sv_ensemble *ensemble, const sv_stop_rule *stop,
                      sv_result *ret);
void result_free(sv_context *context, sv_result *result);
/* The study that the block `finite_size` asks for; nothing without one. */
sv_status finite_size_make(session *s, const sv_ensemble *ensemble, const sv_result *result,
                           sv_finite_size **ret_study);
/* Adds the comparisons of its points (compare.c); none for a single point or a huge sweep. */
sv_status comparisons_make(session *s, const sv_ensemble *ensemble, sv_result *result);
sv_stop_rule session_stop_rule(const session *s);

/* A run folder for the ensemble of a session (run_folder.c): opened for writing, the resolved sheet
 * in it checked against its ledger, its points.csv and summary.json written, its result judged. */
sv_status run_folder_open(session *s, sv_run **ret_run);
sv_status run_folder_check_identity(session *s, const sv_run *run);
/* Notes in the run why a computation ended before its time; nothing for SV_OK. */
void run_folder_note_end(session *s, sv_run *run, sv_status computed);
sv_status run_folder_write(session *s, sv_run *run, const sv_result *result, char **ret_json);
/* A text into a file of the run folder. */
sv_status run_folder_put_text(session *s, sv_run *run, const char *name, const char *text);
sv_status run_folder_judge(session *s, const sv_result *result);
void run_folder_warn(session *s, const sv_result *result);
/* The comment lines about engines in a resolved sheet; taken from the context. */
sv_status run_folder_plan_lines(sv_context *context, const char *sheet, char **ret_lines);

/* ---- inquiry.c: realisations at values of parameters that are chosen as the work goes on ---- */

/* A set of parameter values asked about; its cases point into it. */
typedef struct asked_point {
    point at;
    int64_t n, capacity; /* realisations 0 … n−1 are known */
    double *values;      /* n × markers; NaN: unresolved */
} asked_point;

typedef struct inquiry {
    session *s;
    sv_run *run;
    sv_ensemble there; /* what the ledger had at the start */
    asked_point **asked;
    int n_asked, capacity;
    int64_t computed; /* realisations known now, of all points */
    double deadline;  /* monotonic seconds; 0: none */
} inquiry;

/* Reads what the ledger of the run holds. */
sv_status inquiry_open(session *s, sv_run *run, inquiry *ret);
void inquiry_close(inquiry *q);
/*
 * A point at these values; its number is the order of asking, which must be the same whenever the
 * same question is asked. Realisations of different points are independent: those of point a are
 * realisations a·2²⁰ and following of its sheet.
 */
sv_status inquiry_point(inquiry *q, const sv_assignment *assignments, int n, int *ret_number);
/* Makes sure that realisations 0 … wanted−1 of a point are known. */
sv_status inquiry_more(inquiry *q, int number, int64_t wanted);

/* The levels of the spectral flow: are they wanted, can they be written, computing, writing. */
bool flow_wanted(const options *o, const sv_case *problem);
sv_status flow_check(sv_context *context, const options *o, const sv_case *problem);
sv_status flow_compute(session *s, const sv_case *problem, const sv_sample *sample,
                       sv_flow_trace *ret_trace);
sv_status flow_write_csv(session *s, const sv_flow_trace *trace, const char *path);

/* The localizer at many points (survey.c): asked for by a sheet, computed on a sample, written,
 * drawn. Each figure is told to the caller. */
typedef void (*figure_teller)(const session *s, const sv_figure_files *files, const char *what);
bool survey_wanted(const sv_case *problem);
/* How many probes it has, those over kappa included; 0 without one. */
double survey_probes(const sv_case *problem);
sv_status survey_compute(session *s, const sv_case *problem, const sv_sample *sample,
                         sv_survey *ret);
sv_status survey_write_csv(session *s, const sv_survey *survey, const char *path);
sv_status survey_draw(session *s, const char *folder, const sv_map_result *map, figure_teller tell);

/* The coarse map of the local Chern marker (coarse.c). */
bool coarse_wanted(const sv_case *problem);
sv_status coarse_compute(session *s, const sv_case *problem, const sv_sample *sample,
                         sv_index realisation, sv_coarse *ret);
sv_status coarse_write_csv(session *s, const sv_coarse *map, const char *path);
/* The maps of an ensemble (site_maps.c), from a run whose result is made: what they come to, joined
 * as far as they count when the run is being written; a table of all sites; figures. */
sv_status site_maps_add(session *s, sv_run *run, bool writing, sv_result *result);
sv_status site_maps_write(session *s, sv_run *run, sv_result *result, const char *path);
sv_status site_maps_draw(session *s, sv_run *run, sv_result *result, const char *folder,
                         figure_teller tell);
/* "disorder.pot.width = 4, …" of a point of a sweep; empty without one. */
void describe_point(const point *p, char *text, size_t size);
/* Opens a run folder for reading and the sheet in it; *ret_run is to be closed in any case. */
sv_status report_open(sv_context *context, const options *o, session *s, sv_run **ret_run);
/* The realisations a run folder open for reading holds, and their summaries. */
sv_status report_load(session *s, sv_run *run, sv_ensemble *ensemble, sv_result *result);

/* A text into a file that appears only when it is complete. */
sv_status write_csv_text(sv_context *context, const char *path, const char *text);

/* Exports never overwrite a file without --force; NULL is no export. */
sv_status may_write(sv_context *context, const options *o, const char *path);
bool wants_colour(const options *o, FILE *stream);
bool wants_progress(const options *o);

/* Stop requests from signals. */
void signals_install(void);
bool signals_stop_requested(void *user);
/* Name of the signal that asked, or NULL. */
const char *signals_name(void);

/* Processes of one job: launch_mpi.c, or launch_none.c for a build without MPI. */
/* Joins the others when a launcher has started this process; only rank 0 has an output then. */
void launch_begin(int *argc, char ***argv);
/* The job, or NULL when this is the only process. */
const sv_team *launch_team(void);
/* Ranks on this machine, this one among them. */
int launch_neighbours(void);
/* All ranks compare: SV_OK when all are well and have the same digest, else what is wrong, with the
 * message at rank 0. Every rank must call it. */
sv_status launch_agree(sv_context *context, sv_status own, const char *digest);
/* Ends the whole job at once: for what cannot be told to the others. */
void launch_abort(sv_status status);
bool launch_knows_mpi(void);
/* The exit code of rank 0, at all ranks. */
int launch_end(int code);

int run_check(sv_context *context, const options *o);
int run_draw(sv_context *context, const options *o);
int run_map(sv_context *context, const options *o);
int run_spectrum(sv_context *context, const options *o);
int run_average(sv_context *context, const options *o);
int run_merge(sv_context *context, const options *o);
/* ---- tolerance.c ---- */

sv_status tolerance_search(inquiry *q, sv_tolerance_result *ret);
void tolerance_free(sv_context *context, sv_tolerance_result *result);
/* Fills the trend with size from the rows. */
void tolerance_trend(sv_tolerance_result *result);

int run_tolerance(sv_context *context, const options *o);
int run_plateau(sv_context *context, const options *o);
/* As run_average() up to the results. */
int average_and_conclude(sv_context *context, const options *o, ensemble_conclusion *conclude);
int run_report(sv_context *context, const options *o);
int run_export(sv_context *context, const options *o);
int run_info(sv_context *context, const options *o);
int run_help(sv_context *context, const options *o);

/* ------------------------------------------------------------ split.c */

/* Fills has_split and split of the points whose window was sampled. */
sv_status split_advise(session *s, const sv_ensemble *ensemble, sv_result *result);
/* A note for each point where another split saves a tenth of the work. */
void split_tell(session *s, const sv_result *result);
/* A comment for `check`: what spread the planned number of columns is best for. */
sv_status split_forecast(session *s, FILE *stream);

/* ---------------------------------------------------------- defects.c */

/* One comment line per thing worth knowing about the disorder of a sheet. */
void defects_print(const sv_setup *setup, FILE *stream);

/* ------------------------------------------------------------- film.c */

/* Length of a model with light states; eV and nm. */
typedef struct film_length {
    bool known;    /* false: the model has no velocity */
    int32_t point; /* of the sweep: the one with the fewest lengths */
    double velocity, gap, length, size;
    double lengths; /* size / length */
    bool enough;
} film_length;

sv_status film_measure(session *s, film_length *ret);
void film_print(const film_length *film, int32_t n_points, FILE *stream);
void film_warn(sv_context *context, const film_length *film);
/* Vacancies of a film model are holes of whole grid cells. */
void film_warn_vacancies(const session *s);

/* ---------------------------------------------------------- presets.c */

/* The list for `help presets`. */
sv_status presets_print(sv_context *context);
/* Comment lines that say where the values of the sheet's preset come from; none without one. */
sv_status presets_print_sources(sv_context *context, const sv_sheet *sheet, FILE *stream);
/* The same as JSON; null without a preset. */
sv_status presets_json(sv_context *context, const sv_sheet *sheet, json_t **ret_object);

#endif
