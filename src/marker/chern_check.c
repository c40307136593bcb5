/* SPDX-License-Identifier: GPL-3.0-or-later */
/* How large the error of the columns can be: a bound to first order, taken on some of them. */
#include "chern_internal.h"

#include <math.h>

enum { CHECKED = SV_PANEL_COLUMNS_SINGLE, CHECKED_BLOCKS = 4 };

/*
 * Allowance for what is not of first order in the error of P: terms with two errors take positions
 * between edge states, of the size of the flake, and matter where edge states reach. Measured on
 * flakes of 46 to 60 cells with windows of 0.8 to 1 (test projector.edges) the true error is up to
 * seven times the bound without it; away from the edge (test projector.chebyshev) at most 0.99
 * times.
 */
static const double CAUTION = 1.5, CAUTION_AT_EDGE = 6.0;
static const int32_t EDGE_CELLS = 7; /* how far from the edge the second one holds */
/* Without anything to check (no weight at all) and at least. */
static const double LEAST_FACTOR = 1.0;

typedef struct tally {
    double ratios, squares;
    int count;
} tally;

/*
 * First-order bound of the error of column k. P enters c = ⟨r|P x P y P|r⟩ three times; an error
 * δ = Σ d_n |n⟩⟨n| changes it by ⟨xv|δ|yv⟩ in the middle and by ⟨r|δ|x z⟩ outside, with v = P|r⟩
 * and z = P y v (and the same with x and y exchanged). Between 0 and 1 |d_n| ≤ 2 p_n(1 − p_n) on
 * the right side of the step, so by Cauchy and Schwarz each is at most twice the geometric mean
 * of two weights of unresolved states. Edge states extend along the edge, where x z is large: the
 * weight of z alone, which is at hand in any case, says too little.
 */
static double bound(double first, const double middle[2], double outer)
{
    return 2.0 * (sqrt(middle[0] * middle[1]) + 2.0 * sqrt(first * outer));
}

/* What a close look at a row gives; values over 4π/A. */
typedef struct look {
    double bound, base, marker;
} look;

/* Looks at each row of one block; `axis` is the position next to |r⟩ in the outer term. */
static sv_status look_at(sv_context *context, const column_job *job, const sv_index *rows,
                         int count, int axis, column_work *w, look *ret_looks)
{
    double first[SV_PANEL_COLUMNS_SINGLE], middle[SV_PANEL_COLUMNS_SINGLE][2];
    sv_status status = sv_chern_set_block(context, job, rows, count, w);
    if (status == SV_OK)
        status = sv_chern_project_sites(context, w);
    for (int k = 0; k < count && status == SV_OK; k++)
        first[k] = sv_chern_weight_of_site(w, k);
    /* First along the axis whose projection is not needed afterwards. */
    for (int turn = 0; turn < 2 && status == SV_OK; turn++) {
        int along = turn == 0 ? axis : 1 - axis;
        status = sv_chern_project_moved(context, w, along, w->v, w->z);
        for (int k = 0; k < count && status == SV_OK; k++) {
            middle[k][along] = sv_chern_weight_of_moved(w, k, w->z);
            if (along == 1)
                ret_looks[k].marker = sv_chern_overlap(w, k);
        }
    }
    if (status == SV_OK)
        status = sv_chern_project_moved(context, w, axis, w->z, w->t);
    for (int k = 0; k < count && status == SV_OK; k++) {
        const sv_sample *sample = job->sample;
        int32_t cell = sample->flake->sites[sample->pristine[rows[k]]].cell;
        ret_looks[k].bound =
            bound(first[k], middle[k], sv_chern_weight_of_moved(w, k, w->t)) *
            (sv_near_edge(sample->flake, cell, EDGE_CELLS) ? CAUTION_AT_EDGE : CAUTION);
        ret_looks[k].base = sv_chern_base(first[k], middle[k][1]);
    }
    if (w->area.owned)
        sv_projector_free(context, w->area.projector);
    w->area.owned = false;
    return status;
}

static void add(tally *t, double bound, double base)
{
    double ratio = base > 0.0 ? bound / base : 0.0;
    t->ratios += ratio;
    t->squares += ratio * ratio;
    t->count++;
}

/* Mean over the ratios, and twice its standard error in case the sample was a lucky one. */
static double factor_of(const tally *t)
{
    if (t->count == 0)
        return LEAST_FACTOR;
    double n = t->count, mean = t->ratios / n;
    double variance = n > 1.0 ? fmax(0.0, t->squares / n - mean * mean) / (n - 1.0) : 0.0;
    return fmax(LEAST_FACTOR, mean + 2.0 * sqrt(variance));
}

/* Single columns, drawn systematically with probability in proportion to their base: the mean of
 * the ratios is then an estimate of the ratio of the sums. */
static sv_status check_columns(sv_context *context, const column_job *job, double total,
                               column_work *w, tally *t)
{
    sv_index chosen[CHECKED];
    double step = total / CHECKED, mark = 0.5 * step, sum = 0.0;
    int found = 0;
    for (sv_index k = 0; k < job->n_rows && found < CHECKED; k++)
        for (sum += job->base[k]; mark < sum && found < CHECKED; mark += step)
            chosen[found++] = job->rows[k];
    for (int first = 0; first < found; first += SV_PANEL_COLUMNS_SINGLE) {
        look looks[SV_PANEL_COLUMNS_SINGLE];
        int count =
            found - first < SV_PANEL_COLUMNS_SINGLE ? found - first : SV_PANEL_COLUMNS_SINGLE;
        sv_status status = look_at(context, job, chosen + first, count,
                                   first / SV_PANEL_COLUMNS_SINGLE % 2, w, looks);
        if (status != SV_OK)
            return status;
        for (int k = 0; k < count; k++)
            add(t, looks[k].bound, looks[k].base);
    }
    return SV_OK;
}

/* The same with whole blocks where each block works on a part of its own. */
static sv_status check_blocks(sv_context *context, const column_job *job, double total,
                              column_work *w, tally *t)
{
    double step = total / CHECKED_BLOCKS, mark = 0.5 * step, sum = 0.0;
    int count;
    for (sv_index first = 0; first < job->n_rows && t->count < CHECKED_BLOCKS; first += count) {
        count = sv_chern_block_size(job, first);
        for (int k = 0; k < count; k++)
            sum += job->base[first + k];
        if (!(mark < sum))
            continue;
        look looks[SV_PANEL_COLUMNS_SINGLE];
        double of_bounds = 0.0, of_bases = 0.0;
        sv_status status = look_at(context, job, job->rows + first, count, t->count % 2, w, looks);
        if (status != SV_OK)
            return status;
        for (int k = 0; k < count; k++) {
            of_bounds += looks[k].bound;
            of_bases += looks[k].base;
        }
        for (; mark < sum && t->count < CHECKED_BLOCKS; mark += step)
            add(t, of_bounds, of_bases);
    }
    return SV_OK;
}

sv_status sv_chern_check(sv_context *context, const column_job *job, double *ret_factor)
{
    column_work w;
    tally t = {0};
    double total = 0.0;
    for (sv_index k = 0; k < job->n_rows; k++)
        total += job->base[k];
    if (!(total > 0.0) || !isfinite(total)) {
        *ret_factor = LEAST_FACTOR;
        return SV_OK;
    }
    sv_status status = sv_chern_start_work(context, job, &w);
    if (status == SV_OK)
        status = job->reach > 0.0 ? check_blocks(context, job, total, &w, &t)
                                  : check_columns(context, job, total, &w, &t);
    sv_chern_end_work(context, &w);
    if (status == SV_OK)
        *ret_factor = factor_of(&t);
    return status;
}

/* ------------------------------------------------------------------ single precision */

typedef struct exact_tally {
    double bounds, squares, rounding;
    int count;
} exact_tally;

static void add_exact(const column_job *job, sv_index row, const look *found, exact_tally *t)
{
    double unit = 4.0 * M_PI / sv_model_cell_area(job->sample->flake->model);
    double difference = job->marker[row] / unit - found->marker;
    t->bounds += found->bound;
    t->squares += found->bound * found->bound;
    t->rounding += difference * difference;
    t->count++;
}

static sv_status look_evenly(sv_context *context, const column_job *job, column_work *w,
                             exact_tally *t)
{
    sv_index chosen[CHECKED], rows[CHECKED];
    int found = 0;
    for (int k = 0; k < CHECKED; k++) {
        sv_index number = (sv_index)((double)job->n_rows * (k + 0.5) / CHECKED);
        if (found > 0 && chosen[found - 1] == number)
            continue;
        chosen[found] = number;
        rows[found++] = job->rows[number];
    }
    look looks[CHECKED];
    sv_status status = look_at(context, job, rows, found, 0, w, looks);
    for (int k = 0; k < found && status == SV_OK; k++)
        add_exact(job, chosen[k], &looks[k], t);
    return status;
}

/* The same with whole blocks where each block works on a part of its own. */
static sv_status look_at_blocks(sv_context *context, const column_job *job, column_work *w,
                                exact_tally *t)
{
    sv_status status = SV_OK;
    int count, done = 0;
    for (sv_index first = 0; first < job->n_rows && status == SV_OK; first += count) {
        look looks[SV_PANEL_COLUMNS_SINGLE];
        count = sv_chern_block_size(job, first);
        if ((double)(first + count) * CHECKED_BLOCKS <= (double)job->n_rows * (done + 0.5))
            continue;
        status = look_at(context, job, job->rows + first, count, done++ % 2, w, looks);
        for (int k = 0; k < count && status == SV_OK; k++)
            add_exact(job, first + k, &looks[k], t);
    }
    return status;
}

sv_status sv_chern_check_single(sv_context *context, const column_job *job, double *ret_error)
{
    column_work w;
    exact_tally t = {0};
    *ret_error = 0.0;
    if (job->n_rows == 0)
        return SV_OK;
    sv_status status = sv_chern_start_work(context, job, &w);
    sv_projector_set_single(job->projector, false);
    if (status == SV_OK)
        status = job->reach > 0.0 ? look_at_blocks(context, job, &w, &t)
                                  : look_evenly(context, job, &w, &t);
    sv_projector_set_single(job->projector, true);
    sv_chern_end_work(context, &w);
    if (status != SV_OK)
        return status;
    double n = t.count, mean = t.bounds / n;
    double variance = n > 1.0 ? fmax(0.0, t.squares / n - mean * mean) / (n - 1.0) : 0.0;
    *ret_error = mean + 2.0 * sqrt(variance) + 3.0 * sqrt(t.rounding / n);
    return SV_OK;
}
