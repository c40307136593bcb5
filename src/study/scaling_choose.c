/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Which parameters take part in a collapse, and the orders of its polynomials. */
#include "scaling_internal.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

enum { GRID_CRITICAL = 15, GRID_NU = 8, GRID_EXPONENT = 4, STARTS = 3, LEAST_PARAMETERS = 5 };

/* Ends and number of different parameters of the selected rows. */
typedef struct extent {
    double *values;
    int n;
} extent;

static int compare_reals(const void *a, const void *b)
{
    const double *x = a, *y = b;
    return (*x > *y) - (*x < *y);
}

static void find_extent(const scaling_work *w, extent *e)
{
    e->n = 0;
    for (sv_index i = 0; i < w->n; i++)
        e->values[i] = w->table->parameter[w->rows[i]];
    qsort(e->values, (size_t)w->n, sizeof *e->values, compare_reals);
    for (sv_index i = 0; i < w->n; i++)
        if (e->n == 0 || e->values[i] != e->values[e->n - 1])
            e->values[e->n++] = e->values[i];
}

static void set_model(const scaling_work *w, const extent *e, const sv_scaling_options *o,
                      scaling_model *model)
{
    *model = (scaling_model){.correction_order = -1,
                             .free_exponent = o->correction == SV_CORRECTION_FREE,
                             .exponent = o->exponent,
                             .width = 0.5 * (e->values[e->n - 1] - e->values[0]),
                             .largest = w->table->size[w->rows[w->n - 1]],
                             .smallest = w->table->size[w->rows[0]]};
}

/* The best cells of the grid, best first. */
static void search_grid(scaling_work *w, const extent *e, const scaling_model *model,
                        scaling_fit *starts)
{
    static const double nus[GRID_NU] = {0.4, 0.6, 0.85, 1.2, 1.7, 2.4, 3.4, 5.0};
    static const double exponents[GRID_EXPONENT] = {0.5, 1.0, 2.0, 4.0};
    const double low = e->values[0], width = e->values[e->n - 1] - low;
    const int cells = GRID_CRITICAL * GRID_NU * (model->free_exponent ? GRID_EXPONENT : 1);
    for (int s = 0; s < STARTS; s++)
        starts[s] = (scaling_fit){.model = *model, .chi_square = INFINITY};
    for (int cell = 0; cell < cells; cell++) {
        scaling_fit fit = {.model = *model};
        int c = cell % GRID_CRITICAL, rest = cell / GRID_CRITICAL;
        fit.parameters[0] = low + width * (c + 0.5) / GRID_CRITICAL;
        fit.parameters[1] = 1.0 / nus[rest % GRID_NU];
        if (model->free_exponent)
            fit.parameters[2] = exponents[rest / GRID_NU];
        fit.chi_square = sv_scaling_inner_solve(w, w->table->mean, model, fit.parameters);
        int place = STARTS;
        while (place > 0 && fit.chi_square < starts[place - 1].chi_square)
            place--;
        if (place == STARTS)
            continue;
        memmove(&starts[place + 1], &starts[place], (size_t)(STARTS - 1 - place) * sizeof fit);
        starts[place] = fit;
    }
}

/* Descends from a start to the orders of `fit`, keeps the better one. */
static void try_start(scaling_work *w, const scaling_fit *start, scaling_fit *fit)
{
    scaling_fit next = {.model = fit->model};
    memcpy(next.parameters, start->parameters, 3 * sizeof(double));
    if (!isfinite(sv_scaling_inner_solve(w, w->table->mean, &next.model, next.parameters)))
        return;
    sv_scaling_descend(w, w->table->mean, &next);
    if (next.converged && (!fit->converged || next.chi_square < fit->chi_square))
        *fit = next;
}

/* One order of F from all starts; converged is false where it cannot be fitted. */
static void fit_order(scaling_work *w, const scaling_fit *starts, const scaling_fit *before,
                      int order, scaling_fit *ret_fit)
{
    scaling_fit fit = {.model = starts[0].model};
    fit.model.order = order;
    *ret_fit = fit;
    if (sv_scaling_outer(&fit.model) + sv_scaling_inner(&fit.model) + 3 > w->n)
        return;
    for (int s = 0; s < STARTS; s++)
        try_start(w, &starts[s], &fit);
    if (before->converged)
        try_start(w, before, &fit);
    *ret_fit = fit;
}

/* The order with the smallest criterion, among all in the range selected. */
static sv_status compare_orders(sv_context *context, scaling_work *w, const scaling_fit *starts,
                                int least_order, int most_order, scaling_fit *ret_best)
{
    scaling_fit best = {0}, last = {0}, fit;
    double least = INFINITY;
    for (int order = least_order; order <= most_order; order++) {
        scaling_quality quality;
        fit_order(w, starts, &last, order, &fit);
        if (!fit.converged)
            continue;
        last = fit;
        sv_status status = sv_scaling_judge(context, w, &fit, false, &quality);
        if (status != SV_OK)
            return status;
        double criterion = fit.chi_square + 2.0 * quality.penalty;
        if (criterion < least) {
            least = criterion;
            best = fit;
        }
    }
    *ret_best = best;
    return SV_OK;
}

/* What a criterion of prediction chooses is as wrong as its error bar is long: two orders more
 * leave the intervals room for that. *ret_smooth: those two were to be had. */
static sv_status fit_range(sv_context *context, scaling_work *w, const extent *e,
                           const sv_scaling_options *o, scaling_fit *ret_fit,
                           scaling_quality *ret_quality, bool *ret_smooth)
{
    scaling_fit starts[STARTS], best, more;
    scaling_model model;
    const int most = e->n - 1 < SV_SCALING_ORDER ? e->n - 1 : SV_SCALING_ORDER;
    set_model(w, e, o, &model);
    model.order = o->order > 0 ? o->order : most < 3 ? most : 3;
    model.correction_order = o->correction != SV_CORRECTION_NONE ? 1 : -1;
    search_grid(w, e, &model, starts);
    sv_status status = compare_orders(context, w, starts, o->order > 0 ? o->order : 1,
                                      o->order > 0 ? o->order : most, &best);
    *ret_smooth = o->order > 0;
    for (int extra = 2; status == SV_OK && best.converged && o->order == 0 && extra > 0; extra--) {
        if (best.model.order + extra > most)
            continue;
        fit_order(w, starts, &best, best.model.order + extra, &more);
        if (!more.converged)
            continue;
        *ret_smooth = extra == 2;
        best = more;
        break;
    }
    *ret_fit = best;
    *ret_quality = (scaling_quality){(double)NAN, (double)NAN, (double)NAN, (double)NAN};
    if (status == SV_OK && best.converged)
        status = sv_scaling_judge(context, w, &best, true, ret_quality);
    return status;
}

/* One parameter less, at the end farther from p_c; false: too few are left. */
static bool narrow(const extent *e, const scaling_fit *fit, double guess, double range[2])
{
    double centre = guess;
    bool inside = fit->converged && fit->parameters[0] > range[0] && fit->parameters[0] < range[1];
    if (inside)
        centre = fit->parameters[0];
    if (e->n <= LEAST_PARAMETERS)
        return false;
    if (range[1] - centre > centre - range[0])
        range[1] = e->values[e->n - 2];
    else
        range[0] = e->values[1];
    return true;
}

sv_status sv_scaling_choose(sv_context *context, scaling_work *w, const sv_scaling_options *o,
                            double guess, scaling_fit *ret_fit, scaling_quality *ret_quality)
{
    double range[2] = {-INFINITY, INFINITY}, best_range[2] = {0, 0}, best_rank = -1.0;
    extent e = {0};
    scaling_fit fit, best = {0};
    scaling_quality quality, best_quality = {0};
    bool smooth = false;
    sv_status status = sv_take(context, w->table->n, sizeof *e.values, &e.values);
    for (bool more = true; more && status == SV_OK;) {
        sv_scaling_select(w, range[0], range[1], -1);
        find_extent(w, &e);
        if (e.n < 3)
            break;
        range[0] = e.values[0];
        range[1] = e.values[e.n - 1];
        status = fit_range(context, w, &e, o, &fit, &quality, &smooth);
        /* The first range that is good ends the search; without one the best p-value counts. */
        const bool good = quality.p_value >= 0.05 && smooth;
        const double rank = good ? 2.0 : quality.p_value;
        if (status == SV_OK && fit.converged && rank > best_rank) {
            best = fit;
            best_quality = quality;
            best_rank = rank;
            memcpy(best_range, range, sizeof range);
        }
        more = !isfinite(o->range[0]) && !good && narrow(&e, &fit, guess, range);
    }
    if (best.converged)
        sv_scaling_select(w, best_range[0], best_range[1], -1);
    sv_give(context, e.values);
    if (status != SV_OK)
        return status;
    *ret_fit = best;
    *ret_quality = best_quality;
    return SV_OK;
}
