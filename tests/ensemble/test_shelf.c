/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The packed records of an ensemble. */
#include "selvedge/ensemble.h"

#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "testing.h"

/* Every field depends on the numbers; every third outcome gives a reason of its own. */
static sv_record make_record(int32_t point, int64_t realisation, int32_t n_outcomes)
{
    sv_record record = {.point = point,
                        .realisation = realisation,
                        .status = realisation % 5 == 0 ? SV_NUMERICAL : SV_OK,
                        .sites = 1000 + realisation,
                        .vacancies = 7 * realisation,
                        .seconds = 0.5 + (double)point,
                        .n_outcomes = n_outcomes};
    for (int k = 0; k < n_outcomes; k++) {
        double x = (double)(realisation * 16 + k) + 0.25 * (double)point;
        sv_outcome *o = &record.outcomes[k];
        *o = (sv_outcome){.verdict = (sv_verdict)((realisation + k) % 4),
                          .value = 1.0 / (x + 1.0),
                          .index = realisation - k,
                          .numerical_error = x * 1e-9,
                          .estimator_error = x * 2e-9,
                          .margin = k == 1 ? (double)NAN : x,
                          .weakest = x + 3.0,
                          .unresolved_within = (double)NAN,
                          .nearest_level = (double)NAN,
                          .sum_over_sites = x + 4.0,
                          .window_cells = 100 + k,
                          .kappa = x + 5.0,
                          .highest_occupied = -x,
                          .lowest_empty = x + 6.0,
                          .electrons = 500 + k,
                          .degree = 11 * k};
        snprintf(o->engine, sizeof o->engine, "%s", k == 0 ? "dense" : "chebyshev");
        if ((realisation + k) % 3 == 0)
            snprintf(o->reason, sizeof o->reason, "%.*s a level is %g away",
                     (int)(realisation % 150),
                     "a rather long reason that fills the chunks of the "
                     "texts sooner than a short one would, so that several chunks are needed, and "
                     "then some more of it ... and more",
                     x);
    }
    return record;
}

static bool same_real(double a, double b)
{
    return (isnan(a) && isnan(b)) || memcmp(&a, &b, sizeof a) == 0;
}

static bool same_record(const sv_record *a, const sv_record *b)
{
    bool same = a->point == b->point && a->realisation == b->realisation &&
                a->status == b->status && a->sites == b->sites && a->vacancies == b->vacancies &&
                same_real(a->seconds, b->seconds) && a->n_outcomes == b->n_outcomes;
    for (int k = 0; same && k < a->n_outcomes; k++) {
        const sv_outcome *x = &a->outcomes[k], *y = &b->outcomes[k];
        same = x->verdict == y->verdict && strcmp(x->reason, y->reason) == 0 &&
               strcmp(x->engine, y->engine) == 0 && same_real(x->value, y->value) &&
               x->index == y->index && same_real(x->numerical_error, y->numerical_error) &&
               same_real(x->estimator_error, y->estimator_error) &&
               same_real(x->margin, y->margin) && same_real(x->weakest, y->weakest) &&
               same_real(x->unresolved_within, y->unresolved_within) &&
               same_real(x->nearest_level, y->nearest_level) &&
               same_real(x->sum_over_sites, y->sum_over_sites) &&
               x->window_cells == y->window_cells && same_real(x->kappa, y->kappa) &&
               same_real(x->highest_occupied, y->highest_occupied) &&
               same_real(x->lowest_empty, y->lowest_empty) && x->electrons == y->electrons &&
               x->degree == y->degree;
    }
    return same;
}

/* Put in a scattered order, got back whole; 3 points of 700 fill several blocks of slots and
 * several chunks of texts. */
SV_TEST(records_come_back_whole)
{
    const int64_t realisations = 700;
    sv_ensemble e = {0};
    sv_record got;
    CHECK_OK(sv_ensemble_init(test_context(), 3, realisations, 4, &e));
    CHECK(!sv_ensemble_get(&e, 2, 699, &got));
    CHECK(sv_ensemble_head(&e, 0, 0) == NULL && sv_ensemble_outcome(&e, 0, 0, 0) == NULL);
    for (int64_t i = 0; i < 3 * realisations; i++) {
        int64_t slot = i * 1009 % (3 * realisations);
        if (slot % 11 == 3)
            continue; /* gaps */
        sv_record record =
            make_record((int32_t)(slot / realisations), slot % realisations, (int32_t)(slot % 5));
        CHECK_OK(sv_ensemble_put(test_context(), &e, &record));
    }
    int wrong = 0;
    for (int64_t slot = 0; slot < 3 * realisations; slot++) {
        sv_record record =
            make_record((int32_t)(slot / realisations), slot % realisations, (int32_t)(slot % 5));
        bool there = sv_ensemble_get(&e, record.point, record.realisation, &got);
        wrong += there != (slot % 11 != 3) || there != e.done[slot] ||
                 (there && !same_record(&record, &got));
    }
    CHECK_INT(wrong, 0);
    sv_ensemble_free(test_context(), &e);
    sv_ensemble_free(test_context(), &e);
}

SV_TEST(parts_are_read_without_unpacking)
{
    sv_ensemble e = {0};
    sv_record record = make_record(1, 4, 2), other = make_record(1, 5, 1);
    CHECK_OK(sv_ensemble_init(test_context(), 2, 10, 2, &e));
    CHECK_OK(sv_ensemble_put(test_context(), &e, &record));
    CHECK_OK(sv_ensemble_put(test_context(), &e, &other));
    const sv_kept_head *head = sv_ensemble_head(&e, 1, 4);
    const sv_kept_outcome *o = sv_ensemble_outcome(&e, 1, 4, 1);
    CHECK(head != NULL && head->sites == 1004 && head->n_outcomes == 2);
    CHECK(o != NULL && o->value == record.outcomes[1].value && o->electrons == 501);
    CHECK_TEXT(sv_ensemble_text(&e, o->engine), "chebyshev");
    CHECK_TEXT(sv_ensemble_text(&e, o->reason), record.outcomes[1].reason);
    CHECK_TEXT(sv_ensemble_text(&e, 0), "");
    CHECK_TEXT(sv_ensemble_text(&e, -1), "");
    CHECK_TEXT(sv_ensemble_text(&e, 1000), "");
    CHECK(sv_ensemble_outcome(&e, 1, 4, 2) == NULL && sv_ensemble_outcome(&e, 1, 5, 1) == NULL);
    CHECK(sv_ensemble_outcome(&e, 1, 4, -1) == NULL && sv_ensemble_outcome(&e, 0, 4, 0) == NULL);
    /* Replaced, shorter than before: nothing of the old one shows. */
    record.n_outcomes = 1;
    CHECK_OK(sv_ensemble_put(test_context(), &e, &record));
    CHECK(sv_ensemble_outcome(&e, 1, 4, 1) == NULL);
    sv_ensemble_free(test_context(), &e);
}

SV_TEST(records_without_a_place_are_refused)
{
    sv_ensemble e = {0};
    CHECK_STATUS(SV_INVALID_INPUT, sv_ensemble_init(test_context(), 0, 5, 1, &e));
    CHECK_STATUS(SV_INVALID_INPUT, sv_ensemble_init(test_context(), 1, 0, 1, &e));
    CHECK_STATUS(SV_INVALID_INPUT, sv_ensemble_init(test_context(), 1, 5, 17, &e));
    CHECK_STATUS(SV_INVALID_INPUT, sv_ensemble_init(test_context(), 3, INT64_MAX / 2, 1, &e));
    CHECK(e.done == NULL);
    CHECK_OK(sv_ensemble_init(test_context(), 2, 5, 1, &e));
    sv_record records[6];
    for (int k = 0; k < 6; k++)
        records[k] = make_record(0, 0, 1);
    records[0].point = -1;
    records[1].point = 2;
    records[2].realisation = -1;
    records[3].realisation = 5;
    records[4].n_outcomes = -1;
    records[5].n_outcomes = 2;
    for (int k = 0; k < 6; k++)
        CHECK_STATUS(SV_INVALID_INPUT, sv_ensemble_put(test_context(), &e, &records[k]));
    for (int k = 0; k < 10; k++)
        CHECK(!e.done[k]);
    sv_ensemble_free(test_context(), &e);
}

/* Bytes the ensemble takes, counted by the allocator. */
static size_t bytes_taken;
static sv_allocator inner;

static void *counting_take(size_t bytes, void *user)
{
    bytes_taken += bytes;
    return inner.take(bytes, user);
}

/* 20,000 realisations of three markers: below 400 bytes each, texts that repeat included, and
 * little for those that never come. */
SV_TEST(an_ensemble_is_small)
{
    sv_context *c = test_context();
    sv_ensemble e = {0};
    sv_record record = make_record(0, 1, 3);
    inner = c->allocator;
    c->allocator.take = counting_take;
    bytes_taken = 0;
    CHECK_OK(sv_ensemble_init(c, 1, 1000000, 3, &e));
    CHECK(bytes_taken < 1100000);
    for (int k = 0; k < 20000; k++) {
        record.realisation = k;
        snprintf(record.outcomes[1].reason, 100, "reason %d", k % 200);
        CHECK_OK(sv_ensemble_put(c, &e, &record));
    }
    c->allocator = inner;
    CHECK((double)(bytes_taken - 1000000) / 20000.0 < 400.0);
    /* Equal texts have one number: 200 of these, three of the other outcomes. */
    int apart = 0;
    for (int k = 0; k < 20000; k++) {
        int32_t number = sv_ensemble_outcome(&e, 0, k, 1)->reason;
        apart += number != sv_ensemble_outcome(&e, 0, k % 200, 1)->reason || number > 204;
    }
    CHECK_INT(apart, 0);
    sv_ensemble_free(c, &e);
}

static long allowed;

static void *scarce_take(size_t bytes, void *user)
{
    return allowed-- > 0 ? inner.take(bytes, user) : NULL;
}

/* A record that found no memory is not there, the others are. */
SV_TEST(a_failed_allocation_leaves_the_rest)
{
    sv_context *c = test_context();
    inner = c->allocator;
    int failures = 0;
    for (long k = 0; k < 40; k++) {
        sv_ensemble e = {0};
        sv_record first = make_record(0, 0, 3), got;
        allowed = k;
        c->allocator.take = scarce_take;
        sv_status status = sv_ensemble_init(c, 1, 600, 3, &e);
        for (int64_t r = 0; status == SV_OK && r < 600; r += 50) {
            sv_record record = make_record(0, r, 3);
            status = sv_ensemble_put(c, &e, &record);
            if (status == SV_NO_MEMORY)
                CHECK(!e.done[r] &&
                      (r == 0 || (sv_ensemble_get(&e, 0, 0, &got) && same_record(&got, &first))));
        }
        CHECK(status == SV_OK || status == SV_NO_MEMORY);
        failures += status == SV_NO_MEMORY;
        c->allocator = inner;
        sv_ensemble_free(c, &e);
    }
    CHECK(failures > 8 && failures < 40);
}
