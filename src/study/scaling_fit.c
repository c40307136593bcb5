/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Weighted least squares of the scaling function. GSL's solvers take memory of their own and end
 * the process where it is missing; problems of thirty rows and ten columns need little. */
#include "scaling_internal.h"

#include <math.h>
#include <string.h>

enum { MOST_STEPS = 80 };

static double dot(const double *a, const double *b, sv_index n)
{
    double sum = 0.0;
    for (sv_index i = 0; i < n; i++)
        sum += a[i] * b[i];
    return sum;
}

bool sv_scaling_orthonormal(double *columns, sv_index n_rows, int n_columns, double *r)
{
    for (int j = 0; j < n_columns; j++) {
        double *column = columns + j * n_rows;
        double before = sqrt(dot(column, column, n_rows));
        for (int i = 0; i < j; i++)
            r[i * MOST_PARAMETERS + j] = 0.0;
        for (int pass = 0; pass < 2; pass++)
            for (int i = 0; i < j; i++) {
                const double *other = columns + i * n_rows;
                double share = dot(other, column, n_rows);
                r[i * MOST_PARAMETERS + j] += share;
                for (sv_index k = 0; k < n_rows; k++)
                    column[k] -= share * other[k];
            }
        double length = sqrt(dot(column, column, n_rows));
        if (!(length > 1e-12 * before) || !isfinite(length))
            return false;
        r[j * MOST_PARAMETERS + j] = length;
        for (sv_index k = 0; k < n_rows; k++)
            column[k] /= length;
    }
    return true;
}

void sv_scaling_back_substitute(const double *r, int n, double *x)
{
    for (int i = n - 1; i >= 0; i--) {
        for (int j = i + 1; j < n; j++)
            x[i] -= r[i * MOST_PARAMETERS + j] * x[j];
        x[i] /= r[i * MOST_PARAMETERS + i];
    }
}

/* Weighted gradients of all rows as columns of q with `extra` rows below; χ² of the residuals in
 * rhs (data − fit). */
static double linearise(scaling_work *w, const double *means, const scaling_model *model,
                        const double *parameters, int n_parameters, int extra)
{
    const scaling_table *t = w->table;
    const sv_index stride = w->n + extra;
    double gradient[MOST_PARAMETERS];
    for (sv_index i = 0; i < w->n; i++) {
        const sv_index row = w->rows[i];
        double fit = sv_scaling_value(model, parameters, t->size[row], t->parameter[row], gradient);
        w->rhs[i] = means[row] - fit;
        for (int j = 0; j < n_parameters; j++)
            w->q[j * stride + i] = gradient[j];
    }
    sv_scaling_weigh(w, w->rhs);
    for (int j = 0; j < n_parameters; j++)
        sv_scaling_weigh(w, w->q + j * stride);
    return dot(w->rhs, w->rhs, w->n);
}

static double chi_square_at(scaling_work *w, const double *means, const scaling_model *model,
                            const double *parameters)
{
    const scaling_table *t = w->table;
    for (sv_index i = 0; i < w->n; i++) {
        const sv_index row = w->rows[i];
        w->rhs[i] =
            means[row] - sv_scaling_value(model, parameters, t->size[row], t->parameter[row], NULL);
    }
    sv_scaling_weigh(w, w->rhs);
    return dot(w->rhs, w->rhs, w->n);
}

double sv_scaling_inner_solve(scaling_work *w, const double *means, const scaling_model *model,
                              double *parameters)
{
    const int outer = sv_scaling_outer(model), inner = sv_scaling_inner(model);
    memset(parameters + outer, 0, (size_t)inner * sizeof *parameters);
    linearise(w, means, model, parameters, outer + inner, 0);
    double *columns = w->q + outer * w->n, step[MOST_PARAMETERS];
    if (!sv_scaling_orthonormal(columns, w->n, inner, w->r))
        return INFINITY;
    for (int j = 0; j < inner; j++)
        step[j] = dot(columns + j * w->n, w->rhs, w->n);
    sv_scaling_back_substitute(w->r, inner, step);
    memcpy(parameters + outer, step, (size_t)inner * sizeof *parameters);
    return chi_square_at(w, means, model, parameters);
}

/* The damped step: least squares of [J; √λ D] δ = [residual; 0], D the lengths of the columns. */
static bool damped_step(scaling_work *w, int n_parameters, double damping, double *step)
{
    const sv_index stride = w->n + n_parameters;
    memset(w->rhs + w->n, 0, (size_t)n_parameters * sizeof *w->rhs);
    for (int j = 0; j < n_parameters; j++) {
        double *column = w->q + j * stride;
        double length = sqrt(dot(column, column, w->n));
        memset(column + w->n, 0, (size_t)n_parameters * sizeof *column);
        column[w->n + j] = sqrt(damping) * fmax(length, 1e-300);
    }
    if (!sv_scaling_orthonormal(w->q, stride, n_parameters, w->r))
        return false;
    for (int j = 0; j < n_parameters; j++)
        step[j] = dot(w->q + j * stride, w->rhs, stride);
    sv_scaling_back_substitute(w->r, n_parameters, step);
    return true;
}

void sv_scaling_descend(scaling_work *w, const double *means, scaling_fit *fit)
{
    const int n = fit->n_parameters = sv_scaling_outer(&fit->model) + sv_scaling_inner(&fit->model);
    double damping = 1e-6, trial[MOST_PARAMETERS], step[MOST_PARAMETERS];
    fit->converged = false;
    fit->chi_square = chi_square_at(w, means, &fit->model, fit->parameters);
    for (int i = 0; i < MOST_STEPS && !fit->converged && isfinite(fit->chi_square); i++) {
        linearise(w, means, &fit->model, fit->parameters, n, n);
        if (!damped_step(w, n, damping, step))
            return;
        for (int j = 0; j < n; j++)
            trial[j] = fit->parameters[j] + step[j];
        double next = chi_square_at(w, means, &fit->model, trial);
        if (!(next <= fit->chi_square)) {
            /* At the bottom rounding alone decides whether a step still goes down. */
            fit->converged = damping <= 1e-8 && next - fit->chi_square <= 1e-9 * (1.0 + next);
            damping *= 10.0;
            if (damping > 1e12)
                return;
            continue;
        }
        /* A damped step is short along a flat valley, wherever the bottom is. */
        fit->converged = damping <= 1e-8 && fit->chi_square - next <= 1e-9 * (1.0 + next);
        memcpy(fit->parameters, trial, (size_t)n * sizeof *trial);
        fit->chi_square = next;
        damping = fmax(damping / 100.0, 1e-12);
    }
}

bool sv_scaling_tangent(scaling_work *w, const scaling_fit *fit)
{
    linearise(w, w->table->mean, &fit->model, fit->parameters, fit->n_parameters, 0);
    return sv_scaling_orthonormal(w->q, w->n, fit->n_parameters, w->r);
}
