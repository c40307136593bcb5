/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Invented results and maps for the tests of the presentation. */
#ifndef SELVEDGE_PRESENT_FIXTURE_H
#define SELVEDGE_PRESENT_FIXTURE_H

#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "selvedge/present.h"
#include "testing.h"

/* Three points of a sweep with both markers; the last has unresolved indices. */
typedef struct fixture {
    sv_point_result points[3];
    sv_index_share shares[3][2];
    sv_compared comparisons[2];
    sv_result result;
} fixture;

static inline void fixture_fill_chern(sv_summary *s, int i)
{
    *s = (sv_summary){.marker = "local_chern",
                      .exists = true,
                      .engine = "dense",
                      .realisations = 200,
                      .resolved = 200,
                      .mean = 0.9981 - 0.25 * i,
                      .deviation = 0.0057,
                      .standard_error = 0.0004,
                      .interval = {0.9973 - 0.25 * i, 0.9989 - 0.25 * i},
                      .confidence = 0.95,
                      .skewness = -2.5,
                      .kurtosis = 7.5,
                      .interval_corrected = {0.9962 - 0.25 * i, 0.9987 - 0.25 * i},
                      .interval_bca = {0.9964 - 0.25 * i, 0.9988 - 0.25 * i},
                      .resamples = 2000,
                      .peaks = {.explained = 0.7, .n_low = 30, .low = 0.98, .high = 1.0},
                      .quantile_intervals = {{(double)NAN, 0.15},
                                             {0.15, 0.25},
                                             {0.25, 0.35},
                                             {0.35, 0.45},
                                             {0.45, (double)NAN}},
                      .histogram = {.low = 0.9, .width = 0.05, .n_bins = 2, .counts = {40, 160}},
                      .disorder_deviation = 0.0057,
                      .quantiles = {0.1, 0.2, 0.3, 0.4, 0.5},
                      .bounds = {(double)NAN, (double)NAN},
                      .numerical_error = 2e-8,
                      .estimator_error = -0.0,
                      .smallest_margin = 0.125,
                      .mean_margin = 0.5};
}

static inline void fixture_fill_bott(sv_summary *s, sv_index_share shares[2], int i)
{
    fixture_fill_chern(s, i);
    s->marker = "bott";
    s->is_index = true;
    s->unresolved = i == 2 ? 3 : 0;
    s->resolved = 200 - s->unresolved;
    s->mean = 1 - 0.25 * i;
    s->bounds[0] = i == 2 ? 0.47 : s->mean;
    s->bounds[1] = i == 2 ? 0.53 : s->mean;
    if (i == 2)
        snprintf(s->unresolved_reason, sizeof s->unresolved_reason,
                 "an eigenvalue lies 3e-8 from the negative axis, \"too near\"");
    shares[0] = (sv_index_share){0, 50 * i, 0.25 * i, {0.1, 0.2}, {0.09, 0.21}};
    shares[1] =
        (sv_index_share){1, 200 - 50 * i - s->unresolved, 1 - 0.25 * i, {0.981, 1}, {0.98, 1}};
    s->shares = shares;
    s->n_shares = 2;
}

static inline void fixture_make(fixture *f)
{
    memset(f, 0, sizeof *f);
    for (int i = 0; i < 3; i++) {
        sv_point_result *point = &f->points[i];
        point->coordinates[0] =
            (sv_coordinate){.path = "disorder.vac.share", .value = 0.02 * (i + 1)};
        point->n_coordinates = 1;
        point->realisations = 200;
        point->n_summaries = 2;
        fixture_fill_chern(&point->summaries[0], i);
        fixture_fill_bott(&point->summaries[1], f->shares[i], i);
    }
    for (int m = 0; m < 2; m++)
        f->comparisons[m] = (sv_compared){.comparison = {.point = 2,
                                                         .marker = m == 0 ? "local_chern" : "bott",
                                                         .is_index = m == 1,
                                                         .pairs = 197,
                                                         .difference = -0.5,
                                                         .standard_error = 0.0125,
                                                         .interval = {-0.525, -0.475},
                                                         .p_value = 0.0625,
                                                         .adjusted_p_value = 0.03125,
                                                         .correlation = 0.75,
                                                         .unpaired_error = 0.025,
                                                         .unpaired_p_value = 0.5,
                                                         .index = 1,
                                                         .lost = 100,
                                                         .gained = 4},
                                          .first = true};
    f->result = (sv_result){.title = "Invented vacancies",
                            .points = f->points,
                            .n_points = 3,
                            .comparisons = f->comparisons,
                            .n_comparisons = 2,
                            .seconds = 1.5,
                            .complete = true};
}

/* A flake with vacancies and values on its sites. */
typedef struct map_fixture {
    sv_model model;
    sv_flake flake;
    sv_disorder disorder;
    sv_sample sample;
    sv_case point;
    sv_record record;
    double *values;
    sv_map_result map;
} map_fixture;

/* Honeycomb: A at 0, B at (a1+a2)/3; otherwise a square lattice with two orbitals per site. */
static inline void map_fixture_model(sv_model *model, bool honeycomb)
{
    static const double a1[2] = {1, 0};
    const double oblique[2] = {0.5, sqrt(0.75)}, straight[2] = {0, 1};
    sv_context *context = test_context();
    CHECK_OK(sv_model_begin(context, "custom", a1, honeycomb ? oblique : straight, model));
    CHECK_OK(sv_model_add_orbital(context, model, "A", 0, 0, 0));
    CHECK_OK(sv_model_add_orbital(context, model, "B", honeycomb ? 0.5 : 0,
                                  honeycomb ? sqrt(1.0 / 12) : 0, 0));
    CHECK_OK(sv_model_add_hop(context, model, 0, 1, 0, 0, 1));
    CHECK_OK(sv_model_finish(context, model));
}

static inline void map_fixture_make(map_fixture *f, bool honeycomb, const sv_flake_spec *spec,
                                    double share)
{
    sv_context *context = test_context();
    memset(f, 0, sizeof *f);
    map_fixture_model(&f->model, honeycomb);
    CHECK_OK(sv_flake_make(context, &f->model, spec, &f->flake));
    snprintf(f->disorder.name, sizeof f->disorder.name, "vac");
    f->disorder.type = SV_DISORDER_VACANCIES;
    f->disorder.on = -1;
    f->disorder.has_share = true;
    f->disorder.share = share;
    CHECK_OK(sv_sample_draw(context, &f->flake, &f->disorder, 1, 1, 0, &f->sample));
    f->values = calloc((size_t)f->sample.n, sizeof *f->values);
    for (sv_index k = 0; k < f->sample.n; k++) /* every site of cell c has c + 1 */
        f->values[k] = f->flake.sites[f->sample.pristine[k]].cell + 1;
    f->point.n_markers = 2;
    f->point.markers[0].marker = sv_marker_find("local_chern");
    f->point.markers[0].values[0] = (sv_value){.present = true, .count = 1, .real = {0.5, 0}};
    f->point.markers[1].marker = sv_marker_find("bott");
    f->record.sites = f->sample.n;
    f->record.vacancies = f->sample.inventory.vacancies;
    f->record.n_outcomes = 2;
    f->record.outcomes[0] = sv_outcome_blank();
    f->record.outcomes[0].verdict = SV_RESOLVED;
    f->record.outcomes[0].value = 0.98;
    f->record.outcomes[0].window_cells = 16;
    f->record.outcomes[1] = f->record.outcomes[0];
    f->record.outcomes[1].value = 1;
    f->record.outcomes[1].index = 1;
    f->map = (sv_map_result){.title = "Invented map",
                             .sample = &f->sample,
                             .point = &f->point,
                             .record = &f->record,
                             .site_values = f->values,
                             .lattice_constant = 0.43};
}

static inline void map_fixture_free(map_fixture *f)
{
    sv_context *context = test_context();
    free(f->values);
    sv_sample_free(context, &f->sample);
    sv_flake_free(context, &f->flake);
    sv_model_free(context, &f->model);
}

#endif
