/* SPDX-License-Identifier: GPL-3.0-or-later */
/* One realisation: samples on the boundaries the markers need, projectors, markers. */
#include "selvedge/ensemble.h"

#include <stdio.h>
#include <string.h>
#include <sys/resource.h>
#include <time.h>
#include <unistd.h>

static double seconds_of(clockid_t clock)
{
    struct timespec now = {0};
    clock_gettime(clock, &now);
    return (double)now.tv_sec + 1e-9 * (double)now.tv_nsec;
}

/* With several threads inside a realisation there is no other at the same time. */
static clockid_t processor_clock(const sv_case *point)
{
    return point->solve.threads > 1 ? CLOCK_PROCESS_CPUTIME_ID : CLOCK_THREAD_CPUTIME_ID;
}

static void note_cost(const sv_case *point, const double start[2], sv_record *record)
{
    struct rusage usage;
    record->seconds = seconds_of(CLOCK_MONOTONIC) - start[0];
    record->processor_seconds = seconds_of(processor_clock(point)) - start[1];
    if (getrusage(RUSAGE_SELF, &usage) == 0)
        record->peak_bytes = (int64_t)usage.ru_maxrss * 1024; /* Linux counts kilobytes */
    if (gethostname(record->host, sizeof record->host) != 0)
        record->host[0] = '\0';
    record->host[sizeof record->host - 1] = '\0';
}

/* Failures that belong to this realisation and must not end the run. */
static bool is_numerical(sv_status status)
{
    return status == SV_NUMERICAL || status == SV_NOT_CONVERGED || status == SV_UNDEFINED;
}

static bool any_on(const sv_case *point, sv_boundary boundary)
{
    for (int k = 0; k < point->n_markers; k++)
        if (sv_marker_table(&(int){0})[point->markers[k].marker].boundary == boundary)
            return true;
    return false;
}

static void mark_absent(const sv_case *point, sv_boundary boundary, sv_record *record)
{
    for (int k = 0; k < point->n_markers; k++) {
        if (sv_marker_table(&(int){0})[point->markers[k].marker].boundary != boundary)
            continue;
        record->outcomes[k] = sv_outcome_blank();
        record->outcomes[k].verdict = SV_ABSENT;
        snprintf(record->outcomes[k].reason, sizeof record->outcomes[k].reason, "%s",
                 point->no_torus);
    }
}

/* What failed, on every marker of a boundary; what is undefined on this sample is unresolved. */
static void mark_failed(const sv_context *context, const sv_case *point, sv_boundary boundary,
                        sv_record *record)
{
    bool undefined = context->error.status == SV_UNDEFINED;
    for (int k = 0; k < point->n_markers; k++) {
        if (sv_marker_table(&(int){0})[point->markers[k].marker].boundary != boundary)
            continue;
        record->outcomes[k] = sv_outcome_blank();
        record->outcomes[k].verdict = undefined ? SV_UNRESOLVED : SV_FAILED;
        snprintf(record->outcomes[k].reason, sizeof record->outcomes[k].reason, "%.190s",
                 context->error.message);
    }
}

static sv_status one_marker(sv_context *context, const sv_marker *marker,
                            const sv_marker_input *input, sv_outcome *ret_outcome)
{
    sv_status status = marker->compute(context, input, ret_outcome);
    if (!is_numerical(status))
        return status;
    *ret_outcome = sv_outcome_blank();
    ret_outcome->verdict = SV_FAILED;
    snprintf(ret_outcome->reason, sizeof ret_outcome->reason, "%.190s", context->error.message);
    return SV_OK;
}

/* The projector of one boundary, or NULL when no marker there needs one. */
static sv_status project(sv_context *context, const sv_case *point, const sv_sample *sample,
                         sv_boundary boundary, sv_projector **ret_projector)
{
    int count;
    const sv_marker *table = sv_marker_table(&count);
    sv_projector_options options = point->solve;
    bool needed = false;
    for (int k = 0; k < point->n_markers; k++) {
        const sv_marker *marker = &table[point->markers[k].marker];
        if (marker->boundary != boundary)
            continue;
        needed = needed || marker->needs_projector;
        if (marker->needs_occupied_basis)
            options.engine = point->solve.basis_engine;
        options.occupied_basis = options.occupied_basis || marker->needs_occupied_basis;
    }
    *ret_projector = NULL;
    return needed ? sv_projector_make(context, sample, &point->occupation, &options, ret_projector)
                  : SV_OK;
}

/* All markers of one boundary on one sample. */
static sv_status markers_on(sv_context *context, const sv_case *point, const sv_sample *sample,
                            sv_boundary boundary, double *site_values, sv_record *record)
{
    int count;
    const sv_marker *table = sv_marker_table(&count);
    sv_projector *projector = NULL;
    sv_status status = project(context, point, sample, boundary, &projector);
    if (is_numerical(status)) {
        mark_failed(context, point, boundary, record);
        return SV_OK;
    }
    for (int k = 0; k < point->n_markers && status == SV_OK; k++) {
        const sv_marker_request *request = &point->markers[k];
        if (table[request->marker].boundary != boundary)
            continue;
        sv_marker_input input = {.sample = sample,
                                 .occupation = &point->occupation,
                                 .projector = projector,
                                 .values = request->values,
                                 .sampled_cells = point->solve.sampled_cells,
                                 .sampled_vectors = point->solve.sampled_vectors,
                                 .threads = point->solve.threads,
                                 .seed = point->seed,
                                 .realisation = record->realisation,
                                 .ret_site_values = site_values};
        status = one_marker(context, &table[request->marker], &input, &record->outcomes[k]);
    }
    sv_projector_free(context, projector);
    return status;
}

/* `strict`: a sample that cannot be drawn is a failure, not an unresolved realisation. */
static sv_status open_part(sv_context *context, const sv_case *point, sv_index realisation,
                           bool strict, double **ret_site_values, sv_sample *ret_sample,
                           sv_record *record)
{
    sv_sample sample = {0};
    double *site_values = NULL;
    sv_status status = sv_sample_draw(context, point->open_flake, point->disorder,
                                      point->n_disorder, point->seed, realisation, &sample);
    if (status == SV_UNDEFINED && !strict) {
        mark_failed(context, point, SV_OPEN_COPY, record);
        return SV_OK;
    }
    if (status != SV_OK)
        return status;
    record->sites = sample.n;
    record->vacancies = sample.inventory.vacancies;
    if (ret_site_values != NULL)
        status = sv_take(context, sample.n, sizeof *site_values, &site_values);
    if (status == SV_OK && any_on(point, SV_OPEN_COPY))
        status = markers_on(context, point, &sample, SV_OPEN_COPY, site_values, record);
    if (status == SV_OK && ret_site_values != NULL) {
        *ret_site_values = site_values;
        site_values = NULL;
    }
    if (status == SV_OK && ret_sample != NULL) {
        *ret_sample = sample;
        sample = (sv_sample){0};
    }
    sv_give(context, site_values);
    sv_sample_free(context, &sample);
    return status;
}

static sv_status closed_part(sv_context *context, const sv_case *point, sv_index realisation,
                             sv_record *record)
{
    if (!any_on(point, SV_CLOSED_COPY))
        return SV_OK;
    if (point->closed_flake == NULL) {
        mark_absent(point, SV_CLOSED_COPY, record);
        return SV_OK;
    }
    sv_sample sample = {0};
    sv_status status = sv_sample_draw(context, point->closed_flake, point->disorder,
                                      point->n_disorder, point->seed, realisation, &sample);
    if (status == SV_UNDEFINED) {
        mark_failed(context, point, SV_CLOSED_COPY, record);
        return SV_OK;
    }
    if (status != SV_OK)
        return status;
    record->sites = sample.n;
    record->vacancies = sample.inventory.vacancies;
    status = markers_on(context, point, &sample, SV_CLOSED_COPY, NULL, record);
    sv_sample_free(context, &sample);
    return status;
}

/* The row of the local Chern marker when it has a value, else NULL. */
static const sv_outcome *resolved_chern(const sv_case *point, const sv_record *record)
{
    const int marker = sv_marker_find("local_chern");
    for (int k = 0; k < point->n_markers; k++)
        if (point->markers[k].marker == marker && record->outcomes[k].verdict == SV_RESOLVED)
            return &record->outcomes[k];
    return NULL;
}

/* What the maps of the ensemble keep; a realisation without the marker counts as one without
 * values. */
static sv_status keep_sites(sv_context *context, const sv_case *point, const sv_sample *sample,
                            const double *values, sv_record *record)
{
    if (sample->n > 0 && resolved_chern(point, record) != NULL)
        return sv_site_record_make(context, sample, values, &record->maps);
    return sv_take(context, 1, sizeof *record->maps, &record->maps);
}

sv_status sv_realise(sv_context *context, const sv_case *point, sv_index realisation,
                     double **ret_site_values, sv_sample *ret_sample, sv_record *ret_record)
{
    const double start[2] = {seconds_of(CLOCK_MONOTONIC), seconds_of(processor_clock(point))};
    const sv_index drawn = point->first_realisation + realisation;
    sv_record record = {.realisation = drawn, .status = SV_OK, .n_outcomes = point->n_markers};
    double *site_values = NULL;
    sv_sample sample = {0};
    sv_status status = SV_OK;
    const bool maps = point->site_maps && ret_site_values == NULL && ret_sample == NULL;
    bool want_open = ret_site_values != NULL || ret_sample != NULL || any_on(point, SV_OPEN_COPY);
    if (want_open)
        status = open_part(context, point, drawn, ret_sample != NULL,
                           maps || ret_site_values ? &site_values : NULL,
                           maps || ret_sample ? &sample : NULL, &record);
    if (status == SV_OK && maps)
        status = keep_sites(context, point, &sample, site_values, &record);
    if (status == SV_OK)
        status = closed_part(context, point, drawn, &record);
    if (status != SV_OK || maps) {
        sv_give(context, site_values);
        sv_sample_free(context, &sample);
    }
    if (status != SV_OK) {
        sv_site_record_free(context, record.maps);
        return status;
    }
    record.realisation = realisation;
    note_cost(point, start, &record);
    if (ret_site_values != NULL)
        *ret_site_values = site_values;
    if (ret_sample != NULL)
        *ret_sample = sample;
    *ret_record = record;
    return SV_OK;
}
