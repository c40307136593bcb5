/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The choice of the engine and its settings for one point of a sweep. It looks at realisation 0 of
 * the point and at nothing else, so every thread, rank and later run makes the same choice. */
#include "selvedge/ensemble.h"

#include <math.h>
#include <stdio.h>
#include <string.h>

static const sv_index DENSE_ALWAYS = 400;      /* sites: below, nothing else pays */
static const sv_index BASIS_DENSE_UP_TO = 600; /* sites: below, diagonalisation is as fast */
static const sv_index DENSE_LARGEST = 12000;   /* sites: above, one diagonalisation takes an hour */
static const sv_index FILLING_LARGEST = 300000; /* sites: counting states above takes minutes */
static const sv_index SAMPLE_ABOVE = 20000;     /* window columns: above, cells are sampled */
static const sv_index PILOT_CELLS = 48;
static const int MOST_DEGREE = 4001;
static const int EASY_DEGREE = 161;      /* a plain polynomial of this degree needs no help */
static const int NEAR_STATES = 48;       /* levels computed one by one in realisation 0 … */
static const int NEAR_STATES_MOST = 192; /* … and in any other */

/* Costs measured on one core of an x86-64 machine; only their ratio matters. */
static const double DENSE_SECONDS = 0.8e-9; /* per site³ */
static const double STEP_SECONDS = 0.6e-9;  /* per site, column and degree */

/* Error of the polynomial over the accuracy asked for; the marker feels about a fifth of it. */
static const double POLYNOMIAL_SHARE = 0.5;

typedef struct pilot {
    const sv_case *point;
    sv_marker_request request; /* of the local Chern marker */
    sv_sample sample;          /* realisation 0, open */
    sv_index columns;          /* window columns of a whole realisation */
    sv_index sites;
    double energy; /* Fermi energy */
    double scale;  /* half width of the spectrum about it */
} pilot;

/* What the pilot computes: the local Chern marker asked for or, on a flake too large to be
 * diagonalised, one in the place of the markers of a disc, which use the same columns. */
static bool find_request(const sv_case *point, sv_marker_request *ret_request)
{
    const double disc_window = 0.3;
    int chern = sv_marker_find("local_chern");
    bool disc = false;
    for (int k = 0; k < point->n_markers; k++) {
        int marker = point->markers[k].marker;
        if (marker == chern) {
            *ret_request = point->markers[k];
            return true;
        }
        disc = disc || marker == sv_marker_find("three_sector") ||
               marker == sv_marker_find("crosshair");
    }
    *ret_request = (sv_marker_request){
        .marker = chern, .values = {{.present = true, .count = 1, .real = {disc_window}}}};
    return disc && point->open_flake->n_sites > DENSE_LARGEST;
}

/* δ for which a polynomial of this degree has the error asked for. */
static double half_gap_of(const pilot *p, double accuracy, int degree)
{
    double ratio = pow(POLYNOMIAL_SHARE * accuracy, -2.0 / (degree + 1));
    return p->scale * (ratio - 1.0) / (ratio + 1.0);
}

/* The marker of realisation 0 with these settings on a sample of the window. Whether a level sits
 * on its Fermi energy, which is known already, is not asked again: what matters is the error. */
static sv_status try_settings(sv_context *context, const pilot *p, const sv_projector_options *o,
                              sv_outcome *ret_outcome)
{
    sv_projector *projector = NULL;
    sv_occupation occupation = {.by = SV_BY_ENERGY, .fermi_energy = p->energy};
    sv_projector_options trial = *o;
    trial.trial = true;
    sv_status status = sv_projector_make(context, &p->sample, &occupation, &trial, &projector);
    if (status != SV_OK)
        return status;
    sv_marker_input input = {.sample = &p->sample,
                             .occupation = &occupation,
                             .projector = projector,
                             .values = p->request.values,
                             .sampled_cells = PILOT_CELLS,
                             .sampled_vectors = o->sampled_vectors,
                             .seed = p->point->seed};
    status = sv_local_chern(context, &input, ret_outcome);
    sv_projector_free(context, projector);
    return status;
}

/* One rung: the stated error with a polynomial of this degree, +∞ where it cannot be used. */
static sv_status try_degree(sv_context *context, const pilot *p, int degree,
                            sv_projector_options *o, double *ret_error)
{
    sv_outcome outcome;
    *ret_error = (double)INFINITY;
    o->degree = degree;
    o->half_gap = half_gap_of(p, o->accuracy, degree);
    if (o->half_gap > 0.5 * p->scale)
        return SV_OK;
    sv_status status = try_settings(context, p, o, &outcome);
    if (status == SV_OK && outcome.verdict == SV_RESOLVED)
        *ret_error = outcome.numerical_error;
    return status;
}

/* A degree between one that is too low and one that does, where the logarithm of the error, were it
 * a straight line, would cross what is allowed; a little above. */
static int between_degrees(const int degrees[2], const double errors[2], double allowed)
{
    double share = log(errors[0] / allowed) / log(errors[0] / errors[1]);
    int steps = (degrees[1] - degrees[0]) / 2;
    return degrees[0] + 2 * (int)ceil(fmin(1.0, 1.1 * share) * steps);
}

/* A low degree from `first` on whose stated error is within what is allowed. Rungs are far apart
 * while the error is far too large, so that hopeless searches end soon; then one look between. */
static sv_status climb_degrees(sv_context *context, const pilot *p, int first, int most,
                               sv_projector_options *o, bool *ret_found, double *ret_error)
{
    int degrees[2] = {0, first};
    double errors[2] = {(double)INFINITY, (double)INFINITY};
    *ret_found = false;
    o->near_states = 0;
    while (degrees[1] <= most && !*ret_found) {
        sv_status status = try_degree(context, p, degrees[1], o, &errors[1]);
        if (status != SV_OK)
            return status;
        *ret_found = errors[1] <= o->accuracy;
        if (*ret_found)
            break;
        bool far = isinf(errors[1]) || errors[1] > 30.0 * o->accuracy;
        degrees[0] = degrees[1];
        errors[0] = errors[1];
        degrees[1] += far ? 2 * (degrees[1] / 4) : 2 * (degrees[1] / 13);
    }
    if (!*ret_found)
        return SV_OK;
    *ret_error = errors[1];
    if (isinf(errors[0]) || degrees[1] - degrees[0] < 6)
        return SV_OK;
    int degree = between_degrees(degrees, errors, o->accuracy), known = degrees[1];
    sv_status status = degree < known ? try_degree(context, p, degree, o, &errors[0]) : SV_OK;
    if (status == SV_OK && degree < known && errors[0] <= o->accuracy)
        *ret_error = errors[0];
    else if (status == SV_OK) {
        o->degree = known;
        o->half_gap = half_gap_of(p, o->accuracy, known);
    }
    return status;
}

/* The widest interval that holds few levels, those computed one by one, the rest left to a
 * polynomial of the degree this needs. */
static sv_status try_near_states(sv_context *context, const pilot *p, int most,
                                 sv_projector_options *o, bool *ret_found, double *ret_error)
{
    sv_near_states near = {0};
    sv_outcome outcome;
    sv_projector_options trial = *o;
    double energy = p->energy + 1e-4 * p->scale;
    *ret_found = false;
    sv_status status = sv_near_states_find(context, &p->sample.hamiltonian, energy, 0.16 * p->scale,
                                           NEAR_STATES, &near);
    trial.half_gap = near.half_width / 1.05;
    sv_near_states_free(context, &near);
    if (status == SV_NOT_CONVERGED)
        return SV_OK;
    if (status != SV_OK)
        return status;
    trial.near_states = NEAR_STATES_MOST;
    trial.degree = sv_step_degree(trial.half_gap / p->scale, POLYNOMIAL_SHARE * o->accuracy);
    if (trial.degree > most)
        return SV_OK;
    if ((status = try_settings(context, p, &trial, &outcome)) != SV_OK)
        return status == SV_NOT_CONVERGED ? SV_OK : status;
    /* A level on the Fermi energy leaves realisation 0 unresolved whatever the engine: these
     * settings say so at once and serve the others. */
    bool on_level = outcome.verdict == SV_UNRESOLVED;
    if (!on_level && (outcome.verdict != SV_RESOLVED || outcome.numerical_error > o->accuracy))
        return SV_OK;
    *o = trial;
    *ret_found = true;
    *ret_error = on_level ? 0.0 : outcome.numerical_error;
    return SV_OK;
}

/* Smallest radius of parts whose rim adds little to the error; 0 when the flake is not much larger.
 */
static sv_status find_reach(sv_context *context, const pilot *p, double whole_error,
                            sv_projector_options *o)
{
    const sv_flake *flake = p->point->open_flake;
    double per_area = (double)flake->model->n_orbitals / sv_model_cell_area(flake->model);
    double allowed = fmax(whole_error, 0.25 * o->accuracy) + 0.25 * o->accuracy;
    sv_projector_options trial = *o;
    o->reach = 0.0;
    for (double reach = 6.0; reach < 1e4; reach = ceil(1.25 * reach)) {
        double part = M_PI * (reach + 4.0) * (reach + 4.0) * per_area;
        sv_outcome outcome;
        if (part > 0.5 * (double)p->sites)
            return SV_OK;
        trial.reach = reach;
        sv_status status = try_settings(context, p, &trial, &outcome);
        if (status != SV_OK)
            return status;
        if (outcome.verdict == SV_RESOLVED && outcome.numerical_error <= allowed) {
            o->reach = reach;
            return SV_OK;
        }
    }
    return SV_OK;
}

/* Cells to sample so that the window mean has the sampling error asked for. */
static sv_status find_sampling(sv_context *context, const pilot *p, sv_projector_options *o,
                               double sampling_error)
{
    sv_outcome outcome;
    if (p->columns <= SAMPLE_ABOVE && o->estimator != SV_ESTIMATOR_CELLS)
        return SV_OK;
    sv_status status = try_settings(context, p, o, &outcome);
    if (status != SV_OK)
        return status;
    double ratio = outcome.estimator_error / sampling_error;
    /* A margin of 2 in the variance for the roughness of the pilot's own error. */
    o->sampled_cells = (sv_index)((double)PILOT_CELLS * fmax(1.0, 2.0 * ratio * ratio));
    return SV_OK;
}

/* Vectors of random phases for the sampling error asked for, in whole blocks: a block of the
 * polynomial costs the same however few of its columns are used. */
static sv_status find_vectors(sv_context *context, const pilot *p, sv_projector_options *o,
                              double sampling_error)
{
    const double margin = 1.5; /* in the variance, for the roughness of the pilot's own error */
    sv_outcome outcome;
    sv_projector_options trial = *o;
    trial.sampled_vectors = SV_PANEL_COLUMNS;
    sv_status status = try_settings(context, p, &trial, &outcome);
    if (status != SV_OK)
        return status;
    double ratio = outcome.estimator_error / sampling_error;
    o->sampled_vectors = SV_PANEL_COLUMNS * (sv_index)ceil(fmax(1.0, margin * ratio * ratio));
    return SV_OK;
}

static sv_status find_estimator(sv_context *context, const pilot *p, sv_projector_options *o,
                                double sampling_error)
{
    return o->estimator == SV_ESTIMATOR_RANDOM_PHASE ? find_vectors(context, p, o, sampling_error)
                                                     : find_sampling(context, p, o, sampling_error);
}

/* How the window is estimated, behind the reason of the engine. */
static void say_estimator(const sv_projector_options *o, sv_plan *plan)
{
    size_t used = strlen(plan->reason), room = sizeof plan->reason - used;
    if (o->sampled_vectors > 0)
        snprintf(plan->reason + used, room, "; window by %lld random-phase vectors",
                 (long long)o->sampled_vectors);
    else if (o->sampled_cells > 0)
        snprintf(plan->reason + used, room, "; window by about %lld sampled cells",
                 (long long)o->sampled_cells);
    else if (o->estimator != SV_ESTIMATOR_AUTO)
        snprintf(plan->reason + used, room, "; every site: no estimator is needed");
}

/* Fermi energy of realisation 0; a filling is turned into one by counting states. */
static sv_status find_energy(sv_context *context, const sv_case *point, pilot *p)
{
    sv_inertia_plan *plan = NULL;
    sv_fermi_level fermi = {.energy = point->occupation.fermi_energy};
    sv_status status = SV_OK;
    if (point->occupation.by != SV_BY_ENERGY) {
        status = sv_inertia_plan_make(context, &p->sample.hamiltonian, 1, &plan);
        if (status == SV_OK)
            status = sv_inertia_fermi_energy(
                context, plan, &p->sample.hamiltonian,
                sv_occupation_electrons(&point->occupation, p->sample.n), &fermi);
        sv_inertia_plan_free(context, plan);
    }
    p->energy = fermi.energy;
    return status;
}

static sv_status start_pilot(sv_context *context, const sv_case *point, pilot *p)
{
    bool *inside = NULL;
    sv_index cells = 0;
    *p = (pilot){.point = point, .sites = point->open_flake->n_sites};
    (void)find_request(point, &p->request);
    sv_status status =
        sv_flake_window(context, point->open_flake, p->request.values[0].real[0], &inside, &cells);
    if (status != SV_OK)
        return status;
    p->columns = cells * point->open_flake->model->n_orbitals;
    status = sv_sample_draw(context, point->open_flake, point->disorder, point->n_disorder,
                            point->seed, 0, &p->sample);
    if (status == SV_OK)
        status = find_energy(context, point, p);
    if (status == SV_OK)
        status = sv_projector_scale(context, &p->sample.hamiltonian, p->energy, &p->scale);
    sv_give(context, inside);
    return status;
}

/* Highest degree that still beats (or, for huge flakes, replaces) the dense engine. */
static int highest_degree(const pilot *p)
{
    double n = (double)p->sites;
    double columns = (double)(p->columns > SAMPLE_ABOVE ? SAMPLE_ABOVE : p->columns);
    double degree = DENSE_SECONDS * n * n / (2.0 * columns * STEP_SECONDS);
    return p->sites > DENSE_LARGEST ? MOST_DEGREE : (int)fmin(degree, (double)MOST_DEGREE);
}

/* Why the dense engine is the only one, or NULL. */
static const char *dense_reason(const sv_case *point, bool site_map)
{
    sv_marker_request request;
    if (!find_request(point, &request))
        return "no marker of single sites is asked for";
    if (point->occupation.by != SV_BY_ENERGY && point->open_flake->n_sites > FILLING_LARGEST)
        return "a filling needs state counts, too costly for a flake of this size";
    if (point->solve.engine == SV_ENGINE_CHEBYSHEV || point->solve.engine == SV_ENGINE_RATIONAL)
        return NULL;
    if (point->solve.engine == SV_ENGINE_DENSE)
        return "asked for";
    if (point->open_flake->n_sites <= DENSE_ALWAYS)
        return "the flake is small";
    if (site_map && point->open_flake->n_sites <= DENSE_LARGEST)
        return "every site is wanted";
    return NULL;
}

/* A plain polynomial if an easy one will do, else near levels one by one, else a long one. */
static sv_status settle_degree(sv_context *context, const pilot *p, sv_projector_options *o,
                               bool *ret_found, double *ret_error)
{
    bool asked = p->point->solve.engine == SV_ENGINE_CHEBYSHEV;
    int most = asked ? MOST_DEGREE : highest_degree(p);
    int easy = most < EASY_DEGREE ? most : EASY_DEGREE;
    sv_status status = climb_degrees(context, p, 31, easy, o, ret_found, ret_error);
    if (status == SV_OK && !*ret_found && o->reach <= 0.0)
        status = try_near_states(context, p, most, o, ret_found, ret_error);
    if (status == SV_OK && !*ret_found)
        status = climb_degrees(context, p, EASY_DEGREE + 2, most, o, ret_found, ret_error);
    return status;
}

/* Lower degrees while the stated error leaves room. */
static sv_status trim_degree(sv_context *context, const pilot *p, sv_projector_options *o,
                             double *ret_error)
{
    const double share = 0.9, room = 0.7;
    for (int turn = 0; turn < 6 && *ret_error < 0.5 * room * o->accuracy; turn++) {
        sv_projector_options trial = *o;
        sv_outcome outcome;
        trial.degree = 2 * (int)(0.5 * share * o->degree) + 1;
        if (trial.degree >= o->degree)
            return SV_OK;
        sv_status status = try_settings(context, p, &trial, &outcome);
        if (status != SV_OK)
            return status;
        if (outcome.verdict != SV_RESOLVED || outcome.numerical_error > room * o->accuracy)
            return SV_OK;
        *o = trial;
        *ret_error = outcome.numerical_error;
    }
    return SV_OK;
}

/* Single precision where its rounding leaves the stated error within what is allowed. */
static sv_status try_single(sv_context *context, const pilot *p, sv_projector_options *o,
                            double *ret_error)
{
    sv_projector_options trial = *o;
    sv_outcome outcome;
    trial.single = true;
    sv_status status = try_settings(context, p, &trial, &outcome);
    if (status != SV_OK || outcome.verdict != SV_RESOLVED ||
        outcome.numerical_error > 0.9 * o->accuracy)
        return status;
    *o = trial;
    *ret_error = outcome.numerical_error;
    return SV_OK;
}

/* Degree, reach and sampling, in this order: each is tried with the ones before it. On huge flakes
 * the degree is tried on parts from the start, of a radius the next step corrects. */
static sv_status settle(sv_context *context, const pilot *p, double sampling_error,
                        sv_projector_options *o, bool *ret_found, double *ret_error)
{
    const double first_reach = 24.0;
    o->reach = p->sites > DENSE_LARGEST ? first_reach : 0.0;
    sv_status status = settle_degree(context, p, o, ret_found, ret_error);
    if (status == SV_OK && o->near_states == 0)
        status = find_reach(context, p, *ret_error, o);
    if (status == SV_OK && *ret_found)
        status = trim_degree(context, p, o, ret_error);
    /* Nothing vouches for the rounding of single precision in vectors. */
    if (status == SV_OK && *ret_found && o->estimator != SV_ESTIMATOR_RANDOM_PHASE)
        status = try_single(context, p, o, ret_error);
    return status == SV_OK ? find_estimator(context, p, o, sampling_error) : status;
}

static sv_status plan_chebyshev(sv_context *context, sv_case *point, double sampling_error,
                                sv_plan *plan)
{
    pilot p;
    bool found = false, asked = point->solve.engine == SV_ENGINE_CHEBYSHEV;
    double error = NAN;
    sv_projector_options o = point->solve;
    o.engine = SV_ENGINE_CHEBYSHEV;
    sv_status status = start_pilot(context, point, &p);
    if (status == SV_OK)
        status = settle(context, &p, sampling_error, &o, &found, &error);
    sv_index sites = p.sites;
    sv_sample_free(context, &p.sample);
    if (status != SV_OK)
        return status;
    if (!found && !asked && sites <= DENSE_LARGEST) {
        point->solve.engine = SV_ENGINE_DENSE;
        snprintf(plan->reason, sizeof plan->reason,
                 "dense: levels near the Fermi energy need more than a polynomial can give");
        return SV_OK;
    }
    point->solve = o;
    snprintf(
        plan->reason, sizeof plan->reason,
        "chebyshev: degree %d resolves levels %.3g from the Fermi energy%s%s, stated error %.1e%s",
        o.degree, o.half_gap, o.near_states > 0 ? ", nearer ones one by one" : "",
        o.single ? ", single precision" : "", error,
        found ? "" : " (more than the accuracy asked for)");
    return SV_OK;
}

/* The rational engine finds what it must resolve by itself, sample by sample; only the sampling of
 * large windows is settled here. It is never chosen, only asked for: measured at 1,800 sites with
 * levels filling the gap it takes 3.0 s, near levels one by one and a polynomial for the others
 * 0.85 s, the dense engine 3.4 s; at 20,000 sites a column costs as much as degree 8,000. */
static sv_status plan_rational(sv_context *context, sv_case *point, double sampling_error,
                               sv_plan *plan)
{
    pilot p;
    sv_projector_options o = point->solve;
    sv_status status = start_pilot(context, point, &p);
    if (status == SV_OK)
        status = find_estimator(context, &p, &o, sampling_error);
    sv_sample_free(context, &p.sample);
    if (status != SV_OK)
        return status;
    point->solve = o;
    snprintf(plan->reason, sizeof plan->reason,
             "rational: asked for; resolves the level next to the Fermi energy of every sample");
    return SV_OK;
}

/* Engine for a basis of the occupied space on the torus: a rule of its size alone. It need not look
 * at a sample, since what the polynomial cannot do is done densely, sample by sample. */
static sv_engine basis_engine(const sv_case *point)
{
    bool large = point->closed_flake != NULL && point->closed_flake->n_sites > BASIS_DENSE_UP_TO;
    return large && point->solve.engine != SV_ENGINE_DENSE ? SV_ENGINE_CHEBYSHEV : SV_ENGINE_DENSE;
}

static bool needs_basis(const sv_case *point)
{
    for (int k = 0; k < point->n_markers; k++)
        if (sv_marker_table(&(int){0})[point->markers[k].marker].needs_occupied_basis)
            return point->closed_flake != NULL;
    return false;
}

sv_status sv_case_plan(sv_context *context, sv_case *point, bool site_map, double sampling_error,
                       sv_plan *ret_plan)
{
    sv_plan plan = {0};
    sv_status status = SV_OK;
    const char *reason = dense_reason(point, site_map);
    if (site_map)
        point->solve.estimator = SV_ESTIMATOR_AUTO;
    point->solve.basis_engine = basis_engine(point);
    if (reason != NULL && point->solve.engine == SV_ENGINE_CHEBYSHEV)
        return SV_FAIL(context, SV_INVALID_INPUT, "the chebyshev engine cannot be used: %s",
                       reason);
    if (reason != NULL && point->solve.engine == SV_ENGINE_RATIONAL)
        return SV_FAIL(context, SV_INVALID_INPUT, "the rational engine cannot be used: %s", reason);
    if (reason != NULL) {
        point->solve.engine = SV_ENGINE_DENSE;
        snprintf(plan.reason, sizeof plan.reason, "dense: %s", reason);
    } else if (point->solve.engine == SV_ENGINE_RATIONAL) {
        status = plan_rational(context, point, sampling_error, &plan);
    } else {
        status = plan_chebyshev(context, point, sampling_error, &plan);
    }
    if (status == SV_OK)
        say_estimator(&point->solve, &plan);
    if (status == SV_OK && needs_basis(point) && point->solve.basis_engine == SV_ENGINE_CHEBYSHEV) {
        size_t used = strlen(plan.reason);
        snprintf(plan.reason + used, sizeof plan.reason - used, "; torus: basis by polynomials");
    }
    if (status == SV_OK)
        *ret_plan = plan;
    return status;
}
