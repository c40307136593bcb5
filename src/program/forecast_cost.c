/* SPDX-License-Identifier: GPL-3.0-or-later */
/* What one realisation costs: small trials of each kind of work on this machine, and the powers by
 * which that work grows. Only trials the sheet needs are run, each well below a tenth of a second.
 */
#include "program_internal.h"

#include <math.h>
#include <string.h>
#include <time.h>

double processor_seconds(void)
{
    struct timespec now;
    clock_gettime(CLOCK_PROCESS_CPUTIME_ID, &now);
    return (double)now.tv_sec + 1e-9 * (double)now.tv_nsec;
}

typedef enum trial {
    TRIAL_DENSE,
    TRIAL_CHEBYSHEV,
    TRIAL_BOTT_SMALL,
    TRIAL_BOTT_LARGE,
    TRIAL_LOCALIZER,
    TRIAL_RESPONSE,
    TRIAL_FLOW,
    TRIAL_SPIN_OPEN,
    TRIAL_SPIN_CLOSED
} trial;

/* Sheets of the trials. The clean half-BHZ film and its like hold levels well apart, so what is
 * timed is arithmetic, not luck. */
#define FILM                "selvedge: 1\nmodel: {name: qi_wu_zhang, m: -1}\n"
#define NOISE               "disorder: [{name: trial, kind: onsite, distribution: box, width: 1}]\n"
#define SPINS               "selvedge: 1\nmodel: {name: kane_mele, so: 0.2, rashba: 0.05}\n"
#define RECTANGLE(side)     "flake: {shape: rectangle, cells: [" #side ", " #side "]}\n"
#define PARALLELOGRAM(side) "flake: {shape: parallelogram, cells: [" #side ", " #side "]}\n"
static const char *const trial_sheets[] = {
    FILM RECTANGLE(14) NOISE "markers: {local_chern: {}}\nsolve: {engine: dense}\n",
    FILM RECTANGLE(24) NOISE "markers: {local_chern: {}}\nsolve: {engine: chebyshev}\n",
    FILM RECTANGLE(12) NOISE "markers: {bott: {}}\n",
    FILM RECTANGLE(18) NOISE "markers: {bott: {}}\n",
    FILM RECTANGLE(20) NOISE "markers: {localizer: {}}\n",
    FILM RECTANGLE(16) NOISE "markers: {density_response: {}}\n",
    FILM "flake: {shape: annulus, inner: 2, outer: 7}\n" NOISE "markers: {spectral_flow: {}}\n",
    SPINS PARALLELOGRAM(8) NOISE "markers: {spin_chern: {}}\n",
    SPINS PARALLELOGRAM(8) NOISE "markers: {spin_bott: {}}\n",
};
_Static_assert(sizeof trial_sheets / sizeof *trial_sheets == COST_TRIALS, "one sheet per trial");

/* The polynomial of the trial: planning would take longer than the trial itself. */
enum { TRIAL_DEGREE = 101, TRIAL_TURNS = 3 };

/* The fastest of a few realisations. */
static sv_status time_point(session *s, const point *p, double *ret_seconds)
{
    double fastest = INFINITY;
    sv_record record;
    sv_status status = SV_OK;
    for (int k = 0; status == SV_OK && k < TRIAL_TURNS; k++) {
        double start = processor_seconds();
        status = sv_realise(s->context, &p->problem, k, NULL, NULL, &record);
        fastest = fmin(fastest, processor_seconds() - start);
    }
    if (status == SV_OK)
        *ret_seconds = fastest;
    return status;
}

/* A session around a sheet in memory, with the markers of the real one. */
static sv_status open_trial(session *s, const char *text, session *t, point *p)
{
    sv_diagnostics diagnostics = {0};
    sv_sheet_options reading = {.size = sizeof reading,
                                .markers = s->markers,
                                .n_markers = s->n_markers,
                                .check_marker = sv_marker_check};
    t->context = s->context;
    sv_status status =
        sv_sheet_parse(s->context, "trial", text, strlen(text), &reading, &diagnostics, &t->sheet);
    if (status == SV_OK)
        status = sv_sheet_setup(s->context, t->sheet, NULL, 0, &diagnostics, &p->setup);
    if (status == SV_OK)
        status = session_make_point(t, p);
    sv_diagnostics_free(s->context, &diagnostics);
    return status;
}

static sv_status run_trial(session *s, trial which, cost_model *costs)
{
    session t = {0};
    point p = {0};
    if (costs->seconds[which] > 0.0)
        return SV_OK;
    sv_status status = open_trial(s, trial_sheets[which], &t, &p);
    if (status == SV_OK) {
        p.problem.solve.basis_engine =
            which == TRIAL_BOTT_LARGE ? SV_ENGINE_CHEBYSHEV : SV_ENGINE_DENSE;
        if (which != TRIAL_CHEBYSHEV)
            p.problem.solve.engine = SV_ENGINE_DENSE;
        p.problem.solve.degree = TRIAL_DEGREE;
        p.problem.solve.half_gap = 0.5;
        costs->sites[which] = (double)p.open.n_sites;
        status = time_point(s, &p, &costs->seconds[which]);
    }
    sv_flake_free(s->context, &p.open);
    sv_flake_free(s->context, &p.closed);
    sv_setup_free(s->context, &p.setup);
    sv_sheet_free(s->context, t.sheet);
    return status;
}

/* Adds a trial's time scaled to a number of sites. */
static sv_status add_scaled(session *s, trial which, double sites, double power, cost_model *costs,
                            double *seconds)
{
    sv_status status = run_trial(s, which, costs);
    if (status == SV_OK)
        *seconds += costs->seconds[which] * pow(sites / costs->sites[which], power);
    return status;
}

static double window_columns(session *s, const sv_case *problem)
{
    bool *inside = NULL;
    sv_index cells = 0;
    double share = 0.5;
    for (int k = 0; k < problem->n_markers; k++)
        if (problem->markers[k].marker == sv_marker_find("local_chern"))
            share = problem->markers[k].values[0].real[0];
    if (sv_flake_window(s->context, problem->open_flake, share, &inside, &cells) != SV_OK)
        return 0.0;
    sv_give(s->context, inside);
    /* Three applications a vector instead of two a column, and three more for the first block. */
    if (problem->solve.sampled_vectors > 0)
        return 1.5 * (double)(problem->solve.sampled_vectors + SV_PANEL_COLUMNS);
    if (problem->solve.sampled_cells > 0 && problem->solve.sampled_cells < cells)
        cells = problem->solve.sampled_cells;
    return (double)cells * problem->open_flake->model->n_orbitals;
}

/* Elements a row of the Hamiltonian has in the bulk. */
static double row_elements(const sv_flake *flake)
{
    const sv_model *model = flake->model;
    const sv_structure *s = flake->spec.structure;
    if (s != NULL)
        return 1.0 + (double)s->bond_start[s->n] / (double)s->n;
    return 1.0 + 2.0 * model->n_hops / (double)model->n_orbitals;
}

static sv_status add_chebyshev(session *s, const point *p, cost_model *costs, double *seconds)
{
    const sv_case *problem = &p->problem;
    const sv_model *model = &p->setup.model;
    double sites = (double)p->open.n_sites, part = sites;
    sv_status status = run_trial(s, TRIAL_CHEBYSHEV, costs);
    if (status != SV_OK)
        return status;
    /* The trial: 9 elements a row, a window of half the side, two applications. */
    double n = costs->sites[TRIAL_CHEBYSHEV];
    double per_step = costs->seconds[TRIAL_CHEBYSHEV] / (9.0 * n * 0.25 * n * 2.0 * TRIAL_DEGREE);
    if (problem->solve.reach > 0.0)
        part = M_PI * pow(problem->solve.reach + 4.0, 2.0) * model->n_orbitals /
               sv_model_cell_area(model);
    if (problem->solve.sampled_vectors > 0)
        part = sites;
    double steps = part * window_columns(s, problem) * 2.0 * problem->solve.degree;
    /* Drawing the sample and, where asked for, counting and finding levels one by one. */
    double other = 1.5e-6 * sites + (problem->solve.near_states > 0 ? 5e-5 * sites : 0.0);
    *seconds += per_step * row_elements(&p->open) * steps + other;
    return SV_OK;
}

/* Factors and solutions for every pole. A solution moves its factor through the processor once each
 * way: its time follows the size of the factor (measured, 1,800 to 80,000 sites); speeds are taken
 * relative to the dense trial. */
static sv_status add_rational(session *s, const point *p, cost_model *costs, double *seconds)
{
    const double forecast_poles = 25.0, per_operation = 5.2e-10, per_byte = 3.6e-11;
    const double reference = 4.2e-10; /* seconds per site³ where these were measured */
    const sv_case *problem = &p->problem;
    double sites = (double)p->open.n_sites, bytes, operations;
    sv_status status = run_trial(s, TRIAL_DENSE, costs);
    if (status != SV_OK)
        return status;
    double poles = sv_zolotarev_terms(0.25 / sites, 0.02 * problem->solve.accuracy);
    double speed = costs->seconds[TRIAL_DENSE] / pow(costs->sites[TRIAL_DENSE], 3.0) / reference;
    sv_projector_forecast(SV_ENGINE_RATIONAL, p->open.n_sites, &bytes, &operations);
    double work = per_operation * operations + 2.0 * window_columns(s, problem) * per_byte * bytes;
    *seconds += speed * poles / forecast_poles * work;
    return SV_OK;
}

static bool asks_for(const point *p, const char *name)
{
    int marker = sv_marker_find(name);
    for (int k = 0; k < p->problem.n_markers; k++)
        if (p->problem.markers[k].marker == marker)
            return true;
    return false;
}

/* The projector of the open flake and what its markers make of it. */
static sv_status add_open(session *s, const point *p, cost_model *costs, double *seconds)
{
    double sites = (double)p->open.n_sites;
    sv_engine engine = p->problem.solve.engine;
    bool projector =
        asks_for(p, "local_chern") || asks_for(p, "three_sector") || asks_for(p, "crosshair");
    sv_status status = SV_OK;
    if (needs_open_basis(&p->setup))
        status = add_scaled(s, TRIAL_SPIN_OPEN, sites, 3.0, costs, seconds);
    else if (projector && engine == SV_ENGINE_CHEBYSHEV)
        status = add_chebyshev(s, p, costs, seconds);
    else if (projector && engine == SV_ENGINE_RATIONAL)
        status = add_rational(s, p, costs, seconds);
    else if (projector)
        status = add_scaled(s, TRIAL_DENSE, sites, 3.0, costs, seconds);
    if (status == SV_OK && asks_for(p, "localizer"))
        status = add_scaled(s, TRIAL_LOCALIZER, sites, 1.5, costs, seconds);
    if (status == SV_OK && asks_for(p, "spectral_flow"))
        status = add_scaled(s, TRIAL_FLOW, sites, 1.5, costs, seconds);
    return status;
}

static sv_status add_closed(session *s, const point *p, cost_model *costs, double *seconds)
{
    double sites = (double)p->open.n_sites;
    bool large = p->problem.solve.basis_engine == SV_ENGINE_CHEBYSHEV;
    sv_status status = SV_OK;
    if (!p->has_closed)
        return SV_OK;
    if (asks_for(p, "bott"))
        status =
            add_scaled(s, large ? TRIAL_BOTT_LARGE : TRIAL_BOTT_SMALL, sites, 3.0, costs, seconds);
    if (status == SV_OK && asks_for(p, "spin_bott"))
        status = add_scaled(s, TRIAL_SPIN_CLOSED, sites, 3.0, costs, seconds);
    if (status == SV_OK && asks_for(p, "density_response"))
        status = add_scaled(s, TRIAL_RESPONSE, sites, 1.5, costs, seconds);
    return status;
}

sv_status cost_of_probe(session *s, const point *p, cost_model *costs, double *ret_seconds)
{
    double seconds = 0.0;
    sv_status status =
        add_scaled(s, TRIAL_LOCALIZER, (double)p->open.n_sites, 1.5, costs, &seconds);
    if (status == SV_OK)
        *ret_seconds = seconds;
    return status;
}

sv_status cost_of_point(session *s, const point *p, cost_model *costs, double *ret_seconds)
{
    double seconds = 0.0;
    sv_status status = add_open(s, p, costs, &seconds);
    if (status == SV_OK)
        status = add_closed(s, p, costs, &seconds);
    if (status == SV_OK)
        *ret_seconds = seconds;
    return status;
}
