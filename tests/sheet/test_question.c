/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The block `question`. */
#include "sheet_testing.h"

#define DISORDER                                                                                   \
    "disorder:\n"                                                                                  \
    "  - {name: vac, kind: vacancies, share: 0.1}\n"                                               \
    "  - {name: pot, kind: onsite, distribution: box, width: 1}\n"
#define ASKED          "question:\n  parameter: disorder.vac.share\n"
#define GOOD_RANGE     "  range: [0, 0.3]\n  precision: 0.01\n"
#define GOOD_CRITERION "  criterion: {quantity: local_chern.mean, within: 0.05}\n"

SV_TEST(a_question_with_everything)
{
    reading r = read_text(FILM FLAKE DISORDER
                          "markers: {local_chern: {}, bott: {}}\n"
                          "question:\n"
                          "  parameter: disorder.pot.width\n"
                          "  range: [0 meV, 300 meV]\n"
                          "  precision: 5 meV\n"
                          "  criterion: {quantity: bott, share: 0.9}\n"
                          "  budget: {parameter: disorder.vac.share, values: [0, 0.01]}\n"
                          "  sizes: [[8, 8], [12, 16]]\n"
                          "  confidence: 0.9\n"
                          "  most: 500\n");
    if (is_read(&r) && CHECK(r.setup.has_question)) {
        const sv_sheet_question *q = &r.setup.question;
        CHECK_TEXT(q->axis.path, "disorder.pot.width");
        CHECK_CLOSE(q->axis.values[0], 0.0, 0.0);
        CHECK_CLOSE(q->axis.values[1], 0.3, 1e-16);
        CHECK_CLOSE(q->axis.values[2], 0.005, 1e-17);
        CHECK_TEXT(q->axis.unit, "meV");
        CHECK_CLOSE(q->axis.unit_scale, 1000.0, 1e-9);
        CHECK(!q->of_mean && !q->has_within);
        CHECK_INT(r.setup.markers[q->marker].kind, 1);
        CHECK_CLOSE(q->share, 0.9, 0.0);
        CHECK_CLOSE(q->confidence, 0.9, 0.0);
        CHECK_INT(q->most, 500);
        CHECK_INT(q->n_sizes, 2);
        CHECK(q->sizes[1][0] == 12 && q->sizes[1][1] == 16);
        CHECK(q->budget.count == 2 && q->budget.values[1] == 0.01);
        CHECK(strstr(r.setup.resolved, "criterion:") != NULL);
    }
    reading_free(&r);
}

/* What is asked is part of a run's identity; what it may cost is not. */
SV_TEST(identity_of_a_question)
{
    reading a = read_text(MODEL FLAKE DISORDER ASKED GOOD_RANGE GOOD_CRITERION);
    reading b = read_text(MODEL FLAKE DISORDER ASKED GOOD_RANGE GOOD_CRITERION "  most: 999\n");
    reading c = read_text(MODEL FLAKE DISORDER ASKED
                          "  range: [0, 0.3]\n  precision: 0.02\n" GOOD_CRITERION);
    if (is_read(&a) && is_read(&b) && is_read(&c)) {
        CHECK_TEXT(a.setup.identity, b.setup.identity);
        CHECK(strcmp(a.setup.identity, c.setup.identity) != 0);
        reading again = read_text(a.setup.resolved);
        if (is_read(&again))
            CHECK_TEXT(again.setup.identity, a.setup.identity);
        reading_free(&again);
    }
    reading_free(&a);
    reading_free(&b);
    reading_free(&c);
}

static void refused(const char *text, const char *message)
{
    reading r = read_text(text);
    bool found = false;
    for (sv_index k = 0; k < r.said.count; k++)
        found = found || (strstr(r.said.items[k].message, message) != NULL &&
                          r.said.items[k].line > 0 && r.said.items[k].column > 0);
    if (!test_check(found, __FILE__, __LINE__, "not said: %s", message))
        show_said(&r.said);
    reading_free(&r);
}

SV_TEST(questions_that_make_no_sense)
{
    refused(MODEL FLAKE DISORDER
            "question:\n  parameter: disorder.nix.share\n" GOOD_RANGE GOOD_CRITERION,
            "nothing to sweep at disorder.nix.share");
    refused(MODEL FLAKE DISORDER ASKED "  range: [0.3, 0]\n  precision: 0.01\n" GOOD_CRITERION,
            "0.3 is not below 0");
    refused(MODEL FLAKE DISORDER ASKED "  range: 0.3\n  precision: 0.01\n" GOOD_CRITERION,
            "expected [lowest, highest]");
    refused(MODEL FLAKE DISORDER ASKED "  range: [0, 1.5]\n  precision: 0.01\n" GOOD_CRITERION,
            "must be between 0 and 1");
    refused(MODEL FLAKE DISORDER ASKED "  range: [0, 0.3]\n  precision: 0.2\n" GOOD_CRITERION,
            "at most a quarter of the range");
    refused(MODEL FLAKE DISORDER ASKED GOOD_RANGE, "question.criterion is missing");
    refused(MODEL FLAKE DISORDER ASKED GOOD_RANGE "  criterion: {quantity: bott.mean, within: 1}\n",
            "bott.mean is not among the markers");
    refused(MODEL FLAKE DISORDER ASKED GOOD_RANGE
            "  criterion: {quantity: local_chern.median, within: 1}\n",
            "unknown .median");
    refused(MODEL FLAKE DISORDER ASKED GOOD_RANGE "  criterion: {quantity: local_chern.mean}\n",
            "a mean needs `within`");
    refused(MODEL FLAKE DISORDER ASKED GOOD_RANGE
            "  criterion: {quantity: local_chern.mean, within: 0.1, share: 0.9}\n",
            "a mean has no share");
    refused(MODEL FLAKE DISORDER ASKED GOOD_RANGE
            "  criterion: {quantity: local_chern, within: 0.1}\n",
            "samples need a `share`");
    refused(MODEL FLAKE DISORDER ASKED GOOD_RANGE GOOD_CRITERION "  sizes: [[4]]\n",
            "expected a pair of whole numbers");
    refused(MODEL FLAKE DISORDER ASKED GOOD_RANGE GOOD_CRITERION
            "  budget: {parameter: disorder.vac.share, values: [0, 1]}\n",
            "is the parameter asked for");
    refused(MODEL FLAKE DISORDER ASKED GOOD_RANGE GOOD_CRITERION
            "  budget: {parameter: disorder.pot.width, values: 3}\n",
            "expected a list of 2 to 64 numbers");
}
