/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Invented runs and records for the tests of the store. */
#ifndef SELVEDGE_STORE_FIXTURE_H
#define SELVEDGE_STORE_FIXTURE_H

#include <math.h>
#include <sqlite3.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "selvedge/store.h"
#include "testing.h"

static const char *const fixture_markers[2] = {"local_chern", "bott"};

static inline sv_run_identity fixture_identity(void)
{
    return (sv_run_identity){
        .identity = "model: qi_wu_zhang\nseed: 1\nmarkers: local_chern bott\n",
        .resolved_sheet = "selvedge: 1\nmodel: {name: qi_wu_zhang, m: -1}\n# the end\n",
        .program_version = "0.1.0",
        .kernel = "openblas pthread test",
        .command_line = "selvedge average sheet.yaml -o run",
        .libraries = "invented 1.0",
        .threads = 2,
        .ranks = 1,
        .markers = fixture_markers,
        .n_markers = 2,
        .n_points = 3,
    };
}

/* A record whose every field depends on (point, realisation). */
static inline sv_record fixture_record(int32_t point, int64_t realisation)
{
    sv_record record;
    memset(&record, 0, sizeof record);
    record.point = point;
    record.realisation = realisation;
    record.sites = 1800 - realisation;
    record.vacancies = realisation;
    record.seconds = 0.1 + 1e-3 * (double)realisation;
    record.processor_seconds = 0.09 + 1e-3 * (double)point;
    record.peak_bytes = 1000000 + realisation;
    record.rank = point;
    record.thread = (int32_t)(realisation % 2);
    snprintf(record.host, sizeof record.host, "node%d", (int)point);
    record.n_outcomes = 2;
    sv_outcome *chern = &record.outcomes[0], *bott = &record.outcomes[1];
    *chern = (sv_outcome){.verdict = SV_RESOLVED,
                          .engine = "dense",
                          .value = 1.0 / (3.0 + (double)realisation + point),
                          .numerical_error = 1e-13,
                          .margin = 0.3,
                          .weakest = (double)NAN,
                          .sum_over_sites = (double)NAN,
                          .window_cells = 256,
                          .highest_occupied = -0.5,
                          .lowest_empty = 0.1 + 0.2,
                          .electrons = 900,
                          .degree = 41};
    *bott = *chern;
    bott->value = 1;
    bott->index = 1;
    bott->weakest = 0.25;
    if (realisation % 3 == 1) {
        bott->verdict = SV_UNRESOLVED;
        bott->value = (double)NAN;
        bott->numerical_error = (double)INFINITY;
        snprintf(bott->reason, sizeof bott->reason, "an angle is %g from pi, \"too\" near", 1e-7);
    }
    return record;
}

/* The same bits, where any NaN equals any NaN. */
static inline bool same_real(double a, double b)
{
    return (isnan(a) && isnan(b)) || memcmp(&a, &b, sizeof a) == 0;
}

static inline bool same_outcome(const sv_outcome *a, const sv_outcome *b)
{
    return a->verdict == b->verdict && strcmp(a->reason, b->reason) == 0 &&
           strcmp(a->engine, b->engine) == 0 && same_real(a->value, b->value) &&
           a->index == b->index && same_real(a->numerical_error, b->numerical_error) &&
           same_real(a->estimator_error, b->estimator_error) && same_real(a->margin, b->margin) &&
           same_real(a->weakest, b->weakest) && same_real(a->sum_over_sites, b->sum_over_sites) &&
           a->window_cells == b->window_cells &&
           same_real(a->highest_occupied, b->highest_occupied) &&
           same_real(a->lowest_empty, b->lowest_empty) && a->electrons == b->electrons &&
           same_real(a->kappa, b->kappa) && a->degree == b->degree;
}

static inline bool same_record(const sv_record *a, const sv_record *b)
{
    bool same = a->point == b->point && a->realisation == b->realisation &&
                a->status == b->status && a->sites == b->sites && a->vacancies == b->vacancies &&
                same_real(a->seconds, b->seconds) && a->n_outcomes == b->n_outcomes;
    for (int i = 0; same && i < a->n_outcomes; i++)
        same = same_outcome(&a->outcomes[i], &b->outcomes[i]);
    return same;
}

static inline sv_ensemble fixture_ensemble(int32_t n_points, int64_t realisations)
{
    sv_ensemble ensemble = {0};
    CHECK_OK(sv_ensemble_init(test_context(), n_points, realisations, SV_MAX_MARKERS, &ensemble));
    return ensemble;
}

/* Is the realisation there, and is it this record? */
static inline bool fixture_holds(const sv_ensemble *ensemble, const sv_record *record)
{
    sv_record kept;
    return sv_ensemble_get(ensemble, record->point, record->realisation, &kept) &&
           same_record(&kept, record);
}

/* A fresh folder with a run of `realisations` records at each of the three points. */
static inline void fixture_make_run(const char *folder, int64_t realisations)
{
    sv_context *context = test_context();
    const sv_run_identity identity = fixture_identity();
    sv_run *run = NULL;
    CHECK_OK(sv_run_open(context, folder, &identity, false, &run));
    for (int32_t point = 0; run != NULL && point < 3; point++)
        for (int64_t k = 0; k < realisations; k++) {
            const sv_record record = fixture_record(point, k);
            CHECK_OK(sv_run_put(context, &record, run));
        }
    sv_run_close(context, run);
}

/* The folder a test works in. */
static char fixture_folder[1024];

static inline const char *fixture_path(const char *name)
{
    static char path[1200];
    snprintf(path, sizeof path, "%s/%s", fixture_folder, name);
    return path;
}

static inline void fixture_fresh_run(const char *name, int64_t realisations)
{
    snprintf(fixture_folder, sizeof fixture_folder, "%s", test_scratch(name));
    fixture_make_run(fixture_folder, realisations);
}

/* Runs one statement on the ledger as a stranger would; returns SQLite's code. */
static inline int fixture_sql(const char *sql)
{
    sqlite3 *ledger = NULL;
    int code = sqlite3_open(fixture_path("ledger.sqlite"), &ledger);
    if (code == SQLITE_OK)
        code = sqlite3_exec(ledger, sql, NULL, NULL, NULL);
    sqlite3_close(ledger);
    return code;
}

/* Changes what the run says about itself as somebody would who knows the checksum. */
static inline int fixture_meta(const char *key, const char *value)
{
    char parts[129], digest[65], sql[1000];
    sv_digest(key, strlen(key), parts);
    sv_digest(value, strlen(value), parts + 64);
    sv_digest(parts, 128, digest);
    snprintf(sql, sizeof sql, "INSERT OR REPLACE INTO meta VALUES ('%s', '%s', '%.16s')", key,
             value, digest);
    return fixture_sql(sql);
}

#endif
