/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Parabolas through a few values of the parameter, and where they cross a target. */
#include <float.h>
#include <math.h>
#include <string.h>

#include "study_internal.h"

enum { MOST_POINTS = 64, MOST_STEPS = 60, N_GRID = 2001 };

/* The variance of a point is shrunk towards the common one with the weight of this many values:
 * a dozen responses alone would now and then show almost no spread. */
static const double PRIOR_WEIGHT = 8.0;

/* One point as the fits see it. */
typedef struct row {
    double x[MOST_TERMS];
    double n, mean, squares;
} row;

/* Inverse of a small symmetric positive matrix (Cholesky); false when it is not positive. */
static bool invert(int n, double a[MOST_TERMS][MOST_TERMS], double inverse[MOST_TERMS][MOST_TERMS])
{
    double l[MOST_TERMS][MOST_TERMS] = {{0}};
    for (int j = 0; j < n; j++)
        for (int i = j; i < n; i++) {
            double sum = a[i][j];
            for (int k = 0; k < j; k++)
                sum -= l[i][k] * l[j][k];
            if (i == j && !(sum > 1e-13 * a[j][j]))
                return false;
            l[i][j] = i == j ? sqrt(sum) : sum / l[j][j];
        }
    for (int column = 0; column < n; column++) {
        double y[MOST_TERMS];
        for (int i = 0; i < n; i++) {
            y[i] = i == column ? 1.0 : 0.0;
            for (int k = 0; k < i; k++)
                y[i] -= l[i][k] * y[k];
            y[i] /= l[i][i];
        }
        for (int i = n - 1; i >= 0; i--) {
            for (int k = i + 1; k < n; k++)
                y[i] -= l[k][i] * y[k];
            y[i] /= l[i][i];
            inverse[i][column] = y[i];
        }
    }
    return true;
}

static void powers(double x, int terms, double ret[MOST_TERMS])
{
    ret[0] = 1.0;
    for (int k = 1; k < terms; k++)
        ret[k] = ret[k - 1] * x;
}

/* Fresh responses within reach, as rows; the number of terms they carry. */
static int gather(const response_table *table, double centre, double width, int terms, row *rows,
                  int *ret_terms)
{
    int n = 0;
    for (int k = 0; k < table->n && n < MOST_POINTS; k++) {
        const response_point *p = &table->points[k];
        if (fabs(p->parameter - centre) > width * (1.0 + 1e-9))
            continue;
        response_moments m = sv_responses_moments(p, p->fresh_from);
        if (m.n < 2)
            continue;
        rows[n] = (row){.n = (double)m.n, .mean = m.mean, .squares = m.squares};
        powers((p->parameter - centre) / width, MOST_TERMS, rows[n].x);
        n++;
    }
    *ret_terms = n < terms ? n : terms;
    return n;
}

static void normal_matrix(const row *rows, int n, int terms, const double *weights,
                          double a[MOST_TERMS][MOST_TERMS])
{
    memset(a, 0, sizeof(double[MOST_TERMS][MOST_TERMS]));
    for (int k = 0; k < n; k++)
        for (int i = 0; i < terms; i++)
            for (int j = 0; j < terms; j++)
                a[i][j] += weights[k] * rows[k].x[i] * rows[k].x[j];
}

static void times(int n, double a[MOST_TERMS][MOST_TERMS], const double *v, double *ret)
{
    for (int i = 0; i < n; i++) {
        ret[i] = 0.0;
        for (int j = 0; j < n; j++)
            ret[i] += a[i][j] * v[j];
    }
}

/* covariance = C (Σ w² v/n x xᵀ) C: honest when the spread changes with the parameter. */
static void sandwich(const row *rows, int n, double pooled, double c[MOST_TERMS][MOST_TERMS],
                     local_fit *fit)
{
    double meat[MOST_TERMS][MOST_TERMS], weights[MOST_POINTS], half[MOST_TERMS][MOST_TERMS];
    for (int k = 0; k < n; k++) {
        double variance =
            (rows[k].squares + PRIOR_WEIGHT * pooled) / (rows[k].n - 1.0 + PRIOR_WEIGHT);
        weights[k] = rows[k].n * variance;
    }
    normal_matrix(rows, n, fit->terms, weights, meat);
    for (int i = 0; i < fit->terms; i++)
        for (int j = 0; j < fit->terms; j++) {
            half[i][j] = 0.0;
            for (int k = 0; k < fit->terms; k++)
                half[i][j] += c[i][k] * meat[k][j];
        }
    for (int i = 0; i < fit->terms; i++)
        for (int j = 0; j < fit->terms; j++) {
            fit->covariance[i][j] = 0.0;
            for (int k = 0; k < fit->terms; k++)
                fit->covariance[i][j] += half[i][k] * c[k][j];
        }
}

/* Weights are the numbers of responses: weights from the spread would favour low means where the
 * spread grows with the mean. */
bool sv_local_fit_mean(const response_table *table, double centre, double width, int terms,
                       local_fit *ret)
{
    row rows[MOST_POINTS];
    double weights[MOST_POINTS], a[MOST_TERMS][MOST_TERMS], c[MOST_TERMS][MOST_TERMS] = {{0}};
    double right[MOST_TERMS] = {0}, squares = 0.0, degrees = 0.0;
    local_fit fit = {.centre = centre, .width = width};
    int n = gather(table, centre, width, terms, rows, &fit.terms);
    if (n < 2)
        return false;
    for (int k = 0; k < n; k++) {
        weights[k] = rows[k].n;
        squares += rows[k].squares;
        degrees += rows[k].n - 1.0;
        fit.degrees = fmax(fit.degrees, rows[k].n - 1.0);
        for (int i = 0; i < fit.terms; i++)
            right[i] += rows[k].n * rows[k].mean * rows[k].x[i];
    }
    normal_matrix(rows, n, fit.terms, weights, a);
    if (!invert(fit.terms, a, c))
        return false;
    times(fit.terms, c, right, fit.b);
    sandwich(rows, n, squares / degrees, c, &fit);
    *ret = fit;
    return true;
}

/* One step of Newton's method on the penalised score (Firth 1993); returns its largest part. */
static double logistic_step(const row *rows, int n, local_fit *fit)
{
    double weights[MOST_POINTS], shares[MOST_POINTS], a[MOST_TERMS][MOST_TERMS];
    double score[MOST_TERMS] = {0}, step[MOST_TERMS], largest = 0.0;
    for (int k = 0; k < n; k++) {
        double eta = 0.0;
        for (int i = 0; i < fit->terms; i++)
            eta += fit->b[i] * rows[k].x[i];
        shares[k] = 1.0 / (1.0 + exp(-fmax(-30.0, fmin(30.0, eta))));
        weights[k] = rows[k].n * shares[k] * (1.0 - shares[k]) + 1e-12;
    }
    normal_matrix(rows, n, fit->terms, weights, a);
    for (int i = 0; i < fit->terms; i++)
        a[i][i] += 1e-9;
    if (!invert(fit->terms, a, fit->covariance))
        return NAN;
    for (int k = 0; k < n; k++) {
        double part[MOST_TERMS], leverage = 0.0;
        times(fit->terms, fit->covariance, rows[k].x, part);
        for (int i = 0; i < fit->terms; i++)
            leverage += rows[k].x[i] * part[i];
        double pull =
            rows[k].n * (rows[k].mean - shares[k]) + weights[k] * leverage * (0.5 - shares[k]);
        for (int i = 0; i < fit->terms; i++)
            score[i] += pull * rows[k].x[i];
    }
    times(fit->terms, fit->covariance, score, step);
    for (int i = 0; i < fit->terms; i++)
        largest = fmax(largest, fabs(step[i]));
    for (int i = 0; i < fit->terms; i++)
        fit->b[i] += largest > 2.0 ? step[i] * 2.0 / largest : step[i];
    return largest;
}

bool sv_local_fit_share(const response_table *table, double centre, double width, int terms,
                        local_fit *ret)
{
    row rows[MOST_POINTS];
    local_fit fit = {.centre = centre, .width = width, .degrees = INFINITY};
    int n = gather(table, centre, width, terms, rows, &fit.terms);
    double hits = 0.5, all = 1.0;
    if (n < 2)
        return false;
    for (int k = 0; k < n; k++) {
        hits += rows[k].n * rows[k].mean;
        all += rows[k].n;
    }
    fit.b[0] = log(hits / (all - hits));
    for (int k = 0; k < MOST_STEPS; k++) {
        double step = logistic_step(rows, n, &fit);
        if (isnan(step))
            return false;
        if (step < 1e-9)
            break;
    }
    *ret = fit;
    return true;
}

double sv_local_fit_value(const local_fit *fit, double parameter, double *ret_error)
{
    double x[MOST_TERMS], value = 0.0, variance = 0.0;
    powers((parameter - fit->centre) / fit->width, fit->terms, x);
    for (int i = 0; i < fit->terms; i++) {
        value += fit->b[i] * x[i];
        for (int j = 0; j < fit->terms; j++)
            variance += x[i] * fit->covariance[i][j] * x[j];
    }
    *ret_error = sqrt(fmax(variance, 0.0));
    return value;
}

/* Is the fit at grid point k within the interval of the target? */
static bool inside(const local_fit *fit, double target, double quantile, double at)
{
    double error, value = sv_local_fit_value(fit, at, &error);
    return fabs(value - target) <= quantile * error;
}

local_root sv_local_fit_root(const local_fit *fit, double target, double quantile, double low,
                             double high)
{
    local_root root = {.value = NAN, .interval = {NAN, NAN}};
    double from = fmax(low, fit->centre - fit->width), to = fmin(high, fit->centre + fit->width);
    double step = (to - from) / (N_GRID - 1), unused;
    int best = -1;
    for (int k = 0; k + 1 < N_GRID; k++) {
        double here = sv_local_fit_value(fit, from + k * step, &unused) - target;
        double next = sv_local_fit_value(fit, from + (k + 1) * step, &unused) - target;
        if (!(here < 0.0 && next >= 0.0))
            continue;
        double at = from + step * (k + here / (here - next));
        if (best < 0 || fabs(at - fit->centre) < fabs(root.value - fit->centre)) {
            best = k;
            root.value = at;
        }
    }
    if (best < 0)
        return root;
    int first = best, last = best + 1;
    while (first > 0 && inside(fit, target, quantile, from + (first - 1) * step))
        first--;
    while (last < N_GRID - 1 && inside(fit, target, quantile, from + (last + 1) * step))
        last++;
    root.exists = true;
    root.open[0] = first == 0;
    root.open[1] = last == N_GRID - 1;
    root.interval[0] = fmin(root.value, from + first * step);
    root.interval[1] = fmax(root.value, from + last * step);
    return root;
}
