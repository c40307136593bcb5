/* SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef SELVEDGE_THRESHOLD_INTERNAL_H
#define SELVEDGE_THRESHOLD_INTERNAL_H

#include "study_internal.h"

/* A search in progress. */
typedef struct search {
    sv_context *context;
    const sv_threshold_question *question;
    sv_responder responder;
    void *user;
    response_table table;
    double target;     /* of the measure, see sv_threshold_point */
    double side;       /* +1: the mean leaves the band downwards, −1: upwards */
    int64_t looks_end; /* responses after which a value counts as undecided */
    int64_t most;
} search;

/* Asks for `more` responses; keeps them as distances towards failure. */
sv_status sv_search_ask(search *s, int number, int64_t more);
int64_t sv_search_responses(const search *s);
/* −1: holds, +1: fails, 0: open; one-sided tests at `level`. */
int sv_search_judge(const search *s, const response_point *p, double level);
/* A last look beyond the threshold; what was asked, whether the measure is monotone, and whether
 * the criterion comes back. */
sv_status sv_search_conclude(search *s, sv_threshold_answer *answer);
#endif
