/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The block `question`: how much of one parameter is tolerable. */
#include "sheet_internal.h"

#include <math.h>
#include <stdio.h>
#include <string.h>

enum { MOST_BUDGET_VALUES = 64 };

/* [lowest, highest] and the precision, in the units of the parameter. */
static bool read_axis(sv_reader *reader, const sv_section *section, sv_sheet_question *question)
{
    const sv_node *range = sv_section_node(section, "range");
    if (range->kind != SV_NODE_LIST || range->count != 2)
        return sv_report(reader, range, "range: [0, 0.3]",
                         "question.range: expected [lowest, highest]");
    const sv_node *nodes[3] = {range->items[0], range->items[1],
                               sv_section_node(section, "precision")};
    if (!sv_sweep_read_numbers(reader, sv_section_node(section, "parameter"), nodes, 3,
                               &question->axis))
        return false;
    const double *values = question->axis.values;
    if (!(values[0] < values[1]))
        return sv_report(reader, range, NULL, "question.range: %.6g is not below %.6g", values[0],
                         values[1]);
    if (!(values[2] > 0.0) || values[2] > 0.25 * (values[1] - values[0]))
        return sv_report(reader, nodes[2], NULL,
                         "question.precision: must be above 0 and at most a quarter of the range");
    return true;
}

static bool read_sizes(sv_reader *reader, const sv_section *section, sv_sheet_question *question)
{
    const sv_node *list = sv_section_node(section, "sizes");
    if (sv_section_written(section, "sizes") == 0)
        return true;
    if (list->kind != SV_NODE_LIST || list->count < 1 || list->count > SV_MAX_SIZES)
        return sv_report(reader, list, "sizes: [[20, 20], [30, 30]]",
                         "question.sizes: expected a list of 1 to %d pairs", SV_MAX_SIZES);
    for (sv_index i = 0; i < list->count; i++) {
        const sv_node *pair = list->items[i];
        if (pair->kind != SV_NODE_LIST || pair->count != 2)
            return sv_report(reader, pair, "sizes: [[20, 20], [30, 30]]",
                             "question.sizes: expected a pair of whole numbers");
        for (int k = 0; k < 2; k++) {
            int64_t *cells = &question->sizes[i][k];
            if (!sv_integer_read(reader, "question.sizes", pair->items[k], cells))
                return false;
            if (*cells < 1)
                return sv_report(reader, pair->items[k], NULL, "question.sizes: %lld cells",
                                 (long long)*cells);
        }
    }
    question->n_sizes = (int)list->count;
    return true;
}

/* `local_chern.mean` is a mean, `local_chern` the samples themselves. */
static bool read_quantity(sv_reader *reader, const sv_section *criterion, sv_setup *setup)
{
    const sv_node *node = sv_section_node(criterion, "quantity");
    const char *text = sv_section_value(criterion, "quantity")->text;
    const char *dot = strchr(text, '.');
    size_t length = dot != NULL ? (size_t)(dot - text) : strlen(text);
    char hint[400];
    sv_suggestion suggestion = sv_suggest_start(text);
    setup->question.marker = -1;
    for (int i = 0; i < setup->n_markers; i++) {
        const char *name = reader->sheet->markers[setup->markers[i].kind].name;
        sv_suggest_name(&suggestion, name);
        if (strlen(name) == length && strncmp(name, text, length) == 0)
            setup->question.marker = i;
    }
    if (setup->question.marker < 0) {
        sv_suggest_hint(&suggestion, hint, sizeof hint);
        return sv_report(reader, node, hint,
                         "question.criterion.quantity: %.60s is not among the markers", text);
    }
    if (dot != NULL && strcmp(dot, ".mean") != 0)
        return sv_report(reader, node, "MARKER.mean, or MARKER for the samples themselves",
                         "question.criterion.quantity: unknown %.60s", dot);
    setup->question.of_mean = dot != NULL;
    return true;
}

static bool read_criterion(sv_reader *reader, sv_setup *setup)
{
    const sv_section *criterion = sv_document_find(reader, "criterion", NULL);
    sv_sheet_question *q = &setup->question;
    if (criterion == NULL || !read_quantity(reader, criterion, setup))
        return false;
    q->has_within = sv_section_written(criterion, "within") > 0;
    q->within = q->has_within ? sv_section_value(criterion, "within")->real[0] : (double)NAN;
    bool has_share = sv_section_written(criterion, "share") > 0;
    q->share = has_share ? sv_section_value(criterion, "share")->real[0] : (double)NAN;
    if (q->of_mean && !q->has_within)
        return sv_report(reader, criterion->anchor, "within: 0.05",
                         "question.criterion: a mean needs `within`");
    if (q->of_mean && has_share)
        return sv_report(reader, sv_section_node(criterion, "share"),
                         "leave out .mean to judge samples",
                         "question.criterion: a mean has no share of samples");
    if (!q->of_mean && (!has_share || q->share >= 1.0))
        return sv_report(reader,
                         has_share ? sv_section_node(criterion, "share") : criterion->anchor,
                         "share: 0.95", "question.criterion: samples need a `share` below 1");
    return true;
}

static bool read_budget(sv_reader *reader, sv_sheet_question *question)
{
    const sv_section *budget = sv_document_find(reader, "budget", NULL);
    if (budget == NULL)
        return true;
    const sv_node *list = sv_section_node(budget, "values");
    const sv_node *path = sv_section_node(budget, "parameter");
    if (list->kind != SV_NODE_LIST || list->count < 2 || list->count > MOST_BUDGET_VALUES)
        return sv_report(reader, list, "values: [0, 1, 2]",
                         "question.budget.values: expected a list of 2 to %d numbers",
                         MOST_BUDGET_VALUES);
    if (strcmp(path->text, question->axis.path) == 0)
        return sv_report(reader, path, NULL,
                         "question.budget.parameter is the parameter asked for");
    return sv_sweep_read_numbers(reader, path, list->items, (int)list->count, &question->budget);
}

bool sv_question_read(sv_reader *reader, sv_setup *setup)
{
    const sv_section *section = sv_document_find(reader, "question", NULL);
    sv_sheet_question *question = &setup->question;
    if (section == NULL)
        return true;
    question->confidence = sv_section_value(section, "confidence")->real[0];
    question->most = sv_section_value(section, "most")->integer[0];
    setup->has_question = read_axis(reader, section, question) &&
                          read_sizes(reader, section, question) && read_criterion(reader, setup) &&
                          read_budget(reader, question);
    return setup->has_question;
}
