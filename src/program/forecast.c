/* SPDX-License-Identifier: GPL-3.0-or-later */
/* What a sheet will cost on this machine, and the refusal of what would not fit. */
#include "program_internal.h"

#include <math.h>
#include <string.h>
#include <time.h>
#include <unistd.h>

static double seconds_now(void)
{
    struct timespec now;
    clock_gettime(CLOCK_MONOTONIC, &now);
    return (double)now.tv_sec + 1e-9 * (double)now.tv_nsec;
}

static double read_number_file(const char *path)
{
    double value = INFINITY;
    FILE *stream = fopen(path, "r");
    if (stream == NULL)
        return INFINITY;
    if (fscanf(stream, "%lf", &value) != 1)
        value = INFINITY;
    fclose(stream);
    return value;
}

/* Memory of the machine, or of the control group when that is less. */
static double memory_available(void)
{
    double pages = (double)sysconf(_SC_PHYS_PAGES), size = (double)sysconf(_SC_PAGESIZE);
    double limit = fmin(read_number_file("/sys/fs/cgroup/memory.max"),
                        read_number_file("/sys/fs/cgroup/memory/memory.limit_in_bytes"));
    return fmin(pages * size, limit);
}

/* How many projectors one realisation needs: one per boundary asked for. */
static void boundaries_needed(const session *s, const sv_setup *setup, bool *open, bool *closed)
{
    int count;
    const sv_marker *table = sv_marker_table(&count);
    *open = s->add_map_marker;
    *closed = false;
    bool torus = sv_flake_can_close(&setup->model, &setup->flake).possible &&
                 sv_disorder_can_close(setup->disorder, setup->n_disorder).possible;
    for (int k = 0; k < setup->n_markers; k++) {
        bool on_torus = table[setup->markers[k].kind].boundary == SV_CLOSED_COPY;
        *open = *open || !on_torus;
        *closed = *closed || (on_torus && torus);
    }
}

/* Does a marker of the open flake need a basis of the occupied space? */
static bool needs_open_basis(const sv_setup *setup)
{
    int count;
    const sv_marker *table = sv_marker_table(&count);
    for (int k = 0; k < setup->n_markers; k++) {
        const sv_marker *marker = &table[setup->markers[k].kind];
        if (marker->boundary == SV_OPEN_COPY && marker->needs_occupied_basis)
            return true;
    }
    return false;
}

/* The rational engine alone; a torus needs the dense one beside it. */
static bool is_rational(const session *s, const sv_setup *setup)
{
    bool open, closed;
    boundaries_needed(s, setup, &open, &closed);
    return !closed && !needs_open_basis(setup) && strcmp(setup->engine, "rational") == 0;
}

/* Does the sheet force the dense engine, whatever the size? */
static bool needs_dense(const session *s, const sv_setup *setup, int64_t sites)
{
    const int64_t dense_by_choice = 12000;
    bool open, closed;
    boundaries_needed(s, setup, &open, &closed);
    return closed || needs_open_basis(setup) || setup->occupation.by != SV_BY_ENERGY ||
           strcmp(setup->engine, "dense") == 0 ||
           (strcmp(setup->engine, "auto") == 0 && sites <= dense_by_choice);
}

static sv_status bytes_of(session *s, const sv_setup *setup, int64_t *ret_sites, double *ret_bytes)
{
    double operations;
    sv_status status = sv_flake_count(s->context, &setup->model, &setup->flake, ret_sites);
    if (status != SV_OK)
        return status;
    if (s->levels_only)
        *ret_bytes = sv_spectrum_bytes(*ret_sites);
    else if (is_rational(s, setup))
        sv_projector_forecast(SV_ENGINE_RATIONAL, *ret_sites, ret_bytes, &operations);
    else if (needs_dense(s, setup, *ret_sites))
        sv_projector_forecast(SV_ENGINE_DENSE, *ret_sites, ret_bytes, &operations);
    else
        sv_projector_forecast(SV_ENGINE_CHEBYSHEV, *ret_sites, ret_bytes, &operations);
    return SV_OK;
}

/* Largest flake over the points (or of the sheet as written when there are none yet). */
static sv_status largest(session *s, int64_t *ret_sites, double *ret_bytes)
{
    sv_status status = bytes_of(s, &s->base, ret_sites, ret_bytes);
    for (int32_t k = 0; status == SV_OK && k < s->n_points; k++) {
        int64_t sites;
        double bytes;
        status = bytes_of(s, &s->points[k].setup, &sites, &bytes);
        if (status == SV_OK && bytes > *ret_bytes) {
            *ret_sites = sites;
            *ret_bytes = bytes;
        }
    }
    return status;
}

sv_status session_fit_memory(session *s)
{
    int64_t sites;
    double bytes, usable = 0.9 * memory_available();
    sv_status status = largest(s, &sites, &bytes);
    if (status != SV_OK)
        return status;
    if (bytes > usable)
        return SV_FAIL(
            s->context, SV_REFUSED,
            "a flake of %lld sites needs about %.3g GB per realisation; this machine has "
            "%.3g GB",
            (long long)sites, bytes / 1e9, usable / 0.9 / 1e9);
    int fit = (int)fmin(usable / bytes, 1e6);
    if (fit < s->threads) {
        sv_log(s->context, SV_LOG_WARNING, "memory holds %d realisations at once: %d threads", fit,
               fit);
        s->threads = fit;
    }
    return SV_OK;
}

/* What the forecast's small trials found. */
typedef struct calibration {
    double per_cube; /* dense: seconds per site³ */
    double per_step; /* chebyshev: seconds per stored element, column and degree */
} calibration;

/* The fastest of three realisations of a small flake, seconds. */
static sv_status time_small(session *s, const sv_case *problem, double *ret_seconds)
{
    sv_record record;
    sv_status status = SV_OK;
    *ret_seconds = INFINITY;
    for (int k = 0; status == SV_OK && k < 3; k++) {
        double start = seconds_now();
        status = sv_realise(s->context, problem, k, NULL, NULL, &record);
        *ret_seconds = fmin(*ret_seconds, seconds_now() - start);
    }
    return status;
}

/* One realisation of half-BHZ with each engine: 14×14 cells dense, 24×24 by polynomials. */
static sv_status calibrate_engine(session *s, bool dense, calibration *c)
{
    const int side = dense ? 14 : 24, degree = 101;
    double sites = 2.0 * side * side, seconds = 0.0;
    int count, qi_wu_zhang = 0;
    const sv_kind *kinds = sv_model_kinds(&count);
    while (strcmp(kinds[qi_wu_zhang].name, "qi_wu_zhang") != 0)
        qi_wu_zhang++;
    sv_value mass = {.present = true, .real = {-1.0}};
    sv_model model = {0};
    sv_flake flake = {0};
    sv_disorder disorder = {.name = "trial", .type = SV_DISORDER_ONSITE, .on = -1, .width = 1.0};
    sv_flake_spec spec = {.shape = SV_SHAPE_RECTANGLE, .has_cells = true, .cells = {side, side}};
    sv_case problem = {.open_flake = &flake,
                       .disorder = &disorder,
                       .n_disorder = 1,
                       .solve = sv_projector_options_default(),
                       .n_markers = 1};
    problem.solve.engine = dense ? SV_ENGINE_DENSE : SV_ENGINE_CHEBYSHEV;
    problem.solve.degree = degree;
    problem.solve.half_gap = 0.5;
    problem.markers[0] = (sv_marker_request){.marker = sv_marker_find("local_chern"),
                                             .values = {{.present = true, .real = {0.5}}}};
    sv_status status = sv_model_make(s->context, &kinds[qi_wu_zhang], &mass, &model);
    if (status == SV_OK)
        status = sv_flake_make(s->context, &model, &spec, &flake);
    if (status == SV_OK)
        status = time_small(s, &problem, &seconds);
    if (dense)
        c->per_cube = seconds / pow(sites, 3.0);
    else /* 9 elements a row, a window of half the side, two applications */
        c->per_step = seconds / (9.0 * sites * (0.25 * sites) * 2.0 * degree);
    sv_flake_free(s->context, &flake);
    sv_model_free(s->context, &model);
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
    if (problem->solve.sampled_cells > 0 && problem->solve.sampled_cells < cells)
        cells = problem->solve.sampled_cells;
    return (double)cells * problem->open_flake->model->n_orbitals;
}

/* Elements a row of the Hamiltonian has in the bulk. */
static double row_elements(const sv_model *model)
{
    return 1.0 + 2.0 * model->n_hops / (double)model->n_orbitals;
}

static double chebyshev_seconds(session *s, const point *p, const calibration *c)
{
    const sv_case *problem = &p->problem;
    const sv_model *model = &p->setup.model;
    double sites = (double)p->open.n_sites, part = sites;
    if (problem->solve.reach > 0.0)
        part = M_PI * pow(problem->solve.reach + 4.0, 2.0) * model->n_orbitals /
               sv_model_cell_area(model);
    double steps = part * window_columns(s, problem) * 2.0 * problem->solve.degree;
    /* Drawing the sample and, where asked for, counting and finding levels one by one. */
    double other = 1.5e-6 * sites + (problem->solve.near_states > 0 ? 5e-5 * sites : 0.0);
    return c->per_step * row_elements(model) * steps + other;
}

/* Factors and solutions for every pole. A solution moves its factor through the processor once each
 * way: its time follows the size of the factor (measured, 1,800 to 80,000 sites); speeds are taken
 * relative to the dense trial. */
static double rational_seconds(session *s, const point *p, const calibration *c)
{
    const double forecast_poles = 25.0, per_operation = 5.2e-10, per_byte = 3.6e-11;
    const double reference = 4.2e-10; /* per_cube of the machine these were measured on */
    const sv_case *problem = &p->problem;
    double sites = (double)p->open.n_sites, bytes, operations;
    double poles = sv_zolotarev_terms(0.25 / sites, 0.02 * problem->solve.accuracy);
    sv_projector_forecast(SV_ENGINE_RATIONAL, p->open.n_sites, &bytes, &operations);
    double work = per_operation * operations + 2.0 * window_columns(s, problem) * per_byte * bytes;
    return c->per_cube / reference * poles / forecast_poles * work;
}

/* Dense work grows as the cube of the sites, a little faster once it leaves the cache (measured:
 * 1.0 at the calibration's 392 sites, 1.35 at 1,800). */
static double dense_seconds(double sites, const calibration *c)
{
    double cache = 1.0 + 0.35 * fmin(1.0, fmax(0.0, (sites - 400.0) / 1400.0));
    return c->per_cube * sites * sites * sites * cache;
}

static double point_seconds(session *s, const point *p, const calibration *c)
{
    bool open, closed;
    boundaries_needed(s, &p->setup, &open, &closed);
    double sites = (double)p->open.n_sites, seconds = 0.0;
    if (open && needs_open_basis(&p->setup)) /* the split by spin costs as much again */
        seconds += 2.0 * dense_seconds(sites, c);
    else if (open && p->problem.solve.engine == SV_ENGINE_CHEBYSHEV)
        seconds += chebyshev_seconds(s, p, c);
    else if (open && p->problem.solve.engine == SV_ENGINE_RATIONAL)
        seconds += rational_seconds(s, p, c);
    else if (open)
        seconds += dense_seconds(sites, c);
    /* The Bott index adds the eigenvalues of a general matrix of half the order. */
    return closed ? seconds + 1.5 * dense_seconds(sites, c) : seconds;
}

sv_status session_forecast(session *s, bool calibrate, forecast *ret)
{
    forecast f = {.bytes_available = memory_available()};
    calibration c = {0};
    double all = 0.0;
    sv_status status = largest(s, &f.sites, &f.bytes_per_thread);
    if (status == SV_OK && calibrate)
        status = calibrate_engine(s, true, &c);
    if (status == SV_OK && calibrate)
        status = calibrate_engine(s, false, &c);
    for (int32_t k = 0; status == SV_OK && k < s->n_points; k++) {
        double seconds = point_seconds(s, &s->points[k], &c);
        f.seconds_per_realisation = fmax(f.seconds_per_realisation, seconds);
        all += seconds * (double)s->base.realisations;
    }
    f.realisations = (int64_t)s->n_points * s->base.realisations;
    f.seconds = all / s->threads;
    if (status == SV_OK)
        *ret = f;
    return status;
}

static void time_text(double seconds, char *text, size_t size)
{
    if (seconds < 1.0)
        snprintf(text, size, "%.2g s", seconds);
    else if (seconds < 120.0)
        snprintf(text, size, "%.0f s", seconds);
    else if (seconds < 7200.0)
        snprintf(text, size, "%.0f min", seconds / 60.0);
    else if (seconds < 172800.0)
        snprintf(text, size, "%.1f h", seconds / 3600.0);
    else
        snprintf(text, size, "%.1f days", seconds / 86400.0);
}

void print_forecast(const forecast *f, const session *s, const char *prefix, FILE *stream)
{
    char one[40], all[40];
    time_text(f->seconds_per_realisation, one, sizeof one);
    time_text(f->seconds, all, sizeof all);
    fprintf(stream, "%ssites         %lld (largest flake)\n", prefix, (long long)f->sites);
    fprintf(stream, "%spoints        %d\n", prefix, s->n_points);
    fprintf(stream, "%srealisations  %lld over all points\n", prefix, (long long)f->realisations);
    fprintf(stream, "%smemory        %.3g MB per thread, %d threads, %.3g GB in this machine\n",
            prefix, f->bytes_per_thread / 1e6, s->threads, f->bytes_available / 1e9);
    fprintf(stream, "%stime          about %s per realisation, about %s in all\n", prefix, one,
            all);
}
