/* SPDX-License-Identifier: GPL-3.0-or-later */
/* What a sheet will cost on this machine, and the refusal of what would not fit. */
#include "program_internal.h"

#include <math.h>
#include <string.h>
#include <unistd.h>

/* The program, its libraries and the buffers of BLAS with nothing computed (measured: 17 to 20). */
static const double PROGRAM_BYTES = 18e6;

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

void boundaries_needed(const session *s, const sv_setup *setup, bool *open, bool *closed)
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

bool needs_open_basis(const sv_setup *setup)
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

/* Random-phase vectors: panels of the whole flake and five blocks, per site. */
static const double VECTOR_BYTES = 2400.0;

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
    if (strcmp(setup->estimator, "random_phase") == 0)
        *ret_bytes += VECTOR_BYTES * (double)*ret_sites;
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

/* Memory of a point whose engine is settled: the open and the closed copy come one after the other.
 */
static double planned_bytes(const session *s, const point *p)
{
    bool open, closed;
    double bytes[2] = {0.0, 0.0}, operations;
    const sv_projector_options *solve = &p->problem.solve;
    boundaries_needed(s, &p->setup, &open, &closed);
    if (open)
        sv_projector_forecast(needs_open_basis(&p->setup) ? SV_ENGINE_DENSE : solve->engine,
                              p->open.n_sites, &bytes[0], &operations);
    if (solve->sampled_vectors > 0)
        bytes[0] += VECTOR_BYTES * (double)p->open.n_sites;
    if (closed) /* polynomials make a basis of half the order, as large as the dense one's */
        sv_projector_forecast(SV_ENGINE_DENSE, p->open.n_sites, &bytes[1], &operations);
    return fmax(bytes[0], bytes[1]);
}

/* A run folder's ledger (measured: 300 bytes a realisation with two markers). */
static const double LEDGER_BYTES = 20e3, ROW_BYTES = 120.0, OUTCOME_BYTES = 90.0;

/* The probes of a map of the sheet as written. */
static sv_status forecast_probes(session *s, cost_model *costs, forecast *f)
{
    double seconds = 0.0;
    f->probes = s->n_points > 0 ? survey_probes(&s->points[0].problem) : 0.0;
    if (f->probes <= 0.0)
        return SV_OK;
    sv_status status = cost_of_probe(s, &s->points[0], costs, &seconds);
    f->seconds_probes = f->probes * seconds / s->threads;
    return status;
}

sv_status session_forecast(session *s, bool calibrate, forecast *ret)
{
    forecast f = {.bytes_available = memory_available(), .bytes_before = PROGRAM_BYTES};
    /* So far the program has read the sheet and settled the engines, as `average` does again. */
    f.seconds_before = processor_seconds();
    cost_model costs = {0};
    double all = 0.0, bytes = 0.0;
    sv_status status = largest(s, &f.sites, &f.bytes_per_thread);
    for (int32_t k = 0; status == SV_OK && calibrate && k < s->n_points; k++) {
        double seconds = 0.0;
        status = cost_of_point(s, &s->points[k], &costs, &seconds);
        if (!s->levels_only)
            bytes = fmax(bytes, planned_bytes(s, &s->points[k]));
        f.seconds_per_realisation = fmax(f.seconds_per_realisation, seconds);
        all += seconds * (double)s->base.realisations;
    }
    if (bytes > 0.0)
        f.bytes_per_thread = bytes;
    if (status == SV_OK && calibrate)
        status = forecast_probes(s, &costs, &f);
    f.realisations = (int64_t)s->n_points * s->base.realisations;
    f.seconds = f.seconds_before + all / s->threads;
    f.bytes_ledger = LEDGER_BYTES + (double)f.realisations *
                                        (ROW_BYTES + OUTCOME_BYTES * (double)s->base.n_markers);
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
    fprintf(stream, "%srealisations  %s%lld over all points%s\n", prefix,
            s->base.has_stop ? "at most " : "", (long long)f->realisations,
            s->base.has_stop ? " (there is a stop rule)" : "");
    fprintf(
        stream,
        "%smemory        %.3g MB per thread, %d threads, and %.2g MB; %.3g GB in this machine\n",
        prefix, f->bytes_per_thread / 1e6, s->threads, f->bytes_before / 1e6,
        f->bytes_available / 1e9);
    fprintf(stream, "%stime          %s %s per realisation, %s %s in all, if nothing else runs\n",
            prefix, "about", one, s->base.has_stop ? "at most about" : "about", all);
    fprintf(stream, "%sledger        %s %.2g MB\n", prefix,
            s->base.has_stop ? "at most about" : "about", f->bytes_ledger / 1e6);
    if (f->probes > 0.0) {
        time_text(f->seconds_probes, all, sizeof all);
        fprintf(stream, "%sprobes        %.0f of the localizer: a map takes about %s more\n",
                prefix, f->probes, all);
    }
}
