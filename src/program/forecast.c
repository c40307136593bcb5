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
    bool torus = sv_flake_can_close(&setup->model, &setup->flake).possible;
    for (int k = 0; k < setup->n_markers; k++) {
        bool on_torus = table[setup->markers[k].kind].boundary == SV_CLOSED_COPY;
        *open = *open || !on_torus;
        *closed = *closed || (on_torus && torus);
    }
}

/* Does the sheet force the dense engine, whatever the size? */
static bool needs_dense(const session *s, const sv_setup *setup, int64_t sites)
{
    const int64_t dense_by_choice = 12000;
    bool open, closed;
    boundaries_needed(s, setup, &open, &closed);
    return closed || setup->occupation.by != SV_BY_ENERGY || strcmp(setup->engine, "dense") == 0 ||
           (strcmp(setup->engine, "auto") == 0 && sites <= dense_by_choice);
}

static sv_status bytes_of(session *s, const sv_setup *setup, int64_t *ret_sites, double *ret_bytes)
{
    double operations;
    sv_status status = sv_flake_count(s->context, &setup->model, &setup->flake, ret_sites);
    if (status != SV_OK)
        return status;
    if (needs_dense(s, setup, *ret_sites))
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
            "%.3g GB (make the flake smaller, or leave out what needs the dense "
            "engine: markers on a torus, a filling)",
            (long long)sites, bytes / 1e9, usable / 0.9 / 1e9);
    int fit = (int)fmin(usable / bytes, 1e6);
    if (fit < s->threads) {
        sv_log(s->context, SV_LOG_WARNING, "memory holds %d realisations at once: %d threads", fit,
               fit);
        s->threads = fit;
    }
    return SV_OK;
}

/*
 * Times one realisation of a small flake of the same kind and scales it: the work grows as the
 * cube of the number of sites, and a little faster once the matrix leaves the cache.
 */
static sv_status time_small(session *s, double *ret_seconds_per_cube)
{
    enum { SIDE = 14, SITES = 2 * SIDE * SIDE };
    sv_value mass = {.present = true, .real = {-1.0}};
    int count;
    const sv_kind *kinds = sv_model_kinds(&count);
    const sv_kind *kind = kinds;
    for (int k = 0; k < count; k++)
        if (strcmp(kinds[k].name, "qi_wu_zhang") == 0)
            kind = &kinds[k];
    sv_model model = {0};
    sv_flake flake = {0};
    sv_record record;
    sv_disorder disorder = {
        .name = "calibration", .type = SV_DISORDER_ONSITE, .on = -1, .width = 1.0};
    sv_flake_spec spec = {.shape = SV_SHAPE_RECTANGLE, .has_cells = true, .cells = {SIDE, SIDE}};
    sv_case problem = {.open_flake = &flake,
                       .disorder = &disorder,
                       .n_disorder = 1,
                       .solve = sv_projector_options_default(),
                       .n_markers = 1};
    problem.markers[0] = (sv_marker_request){.marker = sv_marker_find("local_chern"),
                                             .values = {{.present = true, .real = {0.5}}}};
    sv_status status = sv_model_make(s->context, kind, &mass, &model);
    if (status == SV_OK)
        status = sv_flake_make(s->context, &model, &spec, &flake);
    double least = INFINITY;
    for (int k = 0; status == SV_OK && k < 3; k++) {
        double start = seconds_now();
        status = sv_realise(s->context, &problem, k, NULL, NULL, &record);
        least = fmin(least, seconds_now() - start);
    }
    *ret_seconds_per_cube = least / pow((double)SITES, 3.0);
    sv_flake_free(s->context, &flake);
    sv_model_free(s->context, &model);
    return status;
}

/* Cost of one realisation in units of (sites)³ of the calibration. */
static double relative_cost(const session *s, const sv_setup *setup, int64_t sites)
{
    bool open, closed;
    boundaries_needed(s, setup, &open, &closed);
    double n = (double)sites;
    /* Measured against the calibration at 392 sites: 1.0 there, 1.35 at 1,800 sites. */
    double cache = 1.0 + 0.35 * fmin(1.0, fmax(0.0, (n - 400.0) / 1400.0));
    /* The Bott index adds the eigenvalues of a general matrix of half the order. */
    return n * n * n * cache * ((open ? 1.0 : 0.0) + (closed ? 1.5 : 0.0));
}

sv_status session_forecast(session *s, bool calibrate, forecast *ret)
{
    forecast f = {.bytes_available = memory_available()};
    double per_cube = 0.0, worst = 0.0, all = 0.0;
    sv_status status = largest(s, &f.sites, &f.bytes_per_thread);
    if (status == SV_OK && calibrate)
        status = time_small(s, &per_cube);
    for (int32_t k = 0; status == SV_OK && k < s->n_points; k++) {
        int64_t sites;
        double bytes;
        status = bytes_of(s, &s->points[k].setup, &sites, &bytes);
        double seconds = per_cube * relative_cost(s, &s->points[k].setup, sites);
        worst = fmax(worst, seconds);
        all += seconds * (double)s->base.realisations;
    }
    f.realisations = (int64_t)s->n_points * s->base.realisations;
    f.seconds_per_realisation = worst;
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
    fprintf(stream, "%sengine        dense (the only engine of this version)\n", prefix);
    fprintf(stream, "%smemory        %.3g MB per thread, %d threads, %.3g GB in this machine\n",
            prefix, f->bytes_per_thread / 1e6, s->threads, f->bytes_available / 1e9);
    fprintf(stream, "%stime          about %s per realisation, about %s in all\n", prefix, one,
            all);
}
