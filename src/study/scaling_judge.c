/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Realisations are independent, points are not: they share random numbers. What a fit's χ² means
 * follows from the covariance of its residuals. */
#include "scaling_internal.h"

#include <math.h>
#include <string.h>

#include <gsl/gsl_cdf.h>

/* a ← a − (a q) qᵀ for all columns of q; a is n × n. Adds Σ qᵀ a q to *along. */
static void project_out(const scaling_work *w, int n_columns, double *a, double *along)
{
    for (sv_index i = 0; i < w->n; i++)
        for (int c = 0; c < n_columns; c++) {
            const double *q = w->q + c * w->n;
            double *row = a + i * w->n, share = 0.0;
            for (sv_index j = 0; j < w->n; j++)
                share += row[j] * q[j];
            for (sv_index j = 0; j < w->n; j++)
                row[j] -= share * q[j];
            *along += share * q[i];
        }
}

static void transpose(double *a, sv_index n)
{
    for (sv_index i = 0; i < n; i++)
        for (sv_index j = 0; j < i; j++) {
            double other = a[i * n + j];
            a[i * n + j] = a[j * n + i];
            a[j * n + i] = other;
        }
}

/* Moments of Σ λ_i χ²_1 from the covariance of the residuals; its square is estimated without the
 * bias of a covariance from few realisations (Z. Bai, H. Saranadasa, Stat. Sinica 6, 311 (1996)).
 */
static void set_p_value(const scaling_work *w, const scaling_fit *fit, const double *covariance,
                        scaling_quality *quality)
{
    double trace = 0.0, square = 0.0;
    const double n = (double)(w->table->most - 1), left = (double)(w->n - fit->n_parameters);
    for (sv_index i = 0; i < w->n; i++) {
        trace += covariance[i * w->n + i];
        for (sv_index j = 0; j < w->n; j++)
            square += covariance[i * w->n + j] * covariance[i * w->n + j];
    }
    square = (square - trace * trace / n) * n * n / ((n - 1.0) * (n + 2.0));
    square = fmin(fmax(square, trace * trace / left), trace * trace);
    quality->scale = square / trace;
    quality->effective = trace * trace / square;
    /* Standard errors from R realisations make χ² larger by (R−1)/(R−3) on average. */
    double least = (double)w->table->least;
    double adjusted = fit->chi_square * fmax(least - 3.0, 0.0) / (least - 1.0);
    quality->p_value = gsl_cdf_chisq_Q(adjusted / quality->scale, quality->effective);
}

sv_status sv_scaling_judge(sv_context *context, scaling_work *w, const scaling_fit *fit,
                           bool with_p_value, scaling_quality *ret_quality)
{
    scaling_quality quality = {(double)NAN, (double)NAN, (double)NAN, 0.0};
    double *rest = NULL, ignored = 0.0;
    sv_status status = sv_take(context, w->n * w->n, sizeof *rest, &rest);
    if (status != SV_OK)
        return status;
    memcpy(rest, w->covariance, (size_t)(w->n * w->n) * sizeof *rest);
    if (!sv_scaling_tangent(w, fit)) {
        quality.penalty = INFINITY;
    } else {
        project_out(w, fit->n_parameters, rest, &quality.penalty);
        if (with_p_value && w->n > fit->n_parameters && w->table->least > 3) {
            transpose(rest, w->n);
            project_out(w, fit->n_parameters, rest, &ignored);
            set_p_value(w, fit, rest, &quality);
        }
    }
    sv_give(context, rest);
    *ret_quality = quality;
    return SV_OK;
}

bool sv_scaling_gain(scaling_work *w, const scaling_fit *fit, double *ret_gain)
{
    const int n = fit->n_parameters;
    memset(ret_gain, 0, (size_t)(2 * w->table->n) * sizeof *ret_gain);
    if (!sv_scaling_tangent(w, fit))
        return false;
    for (int p = 0; p < 2; p++) {
        double z[MOST_PARAMETERS]; /* row p of r⁻¹: rᵀ z = e_p */
        for (int i = 0; i < n; i++) {
            z[i] = i == p ? 1.0 : 0.0;
            for (int j = 0; j < i; j++)
                z[i] -= w->r[j * MOST_PARAMETERS + i] * z[j];
            z[i] /= w->r[i * MOST_PARAMETERS + i];
        }
        for (sv_index i = 0; i < w->n; i++) {
            w->rhs[i] = 0.0;
            for (int j = 0; j < n; j++)
                w->rhs[i] += z[j] * w->q[j * w->n + i];
        }
        sv_scaling_weigh(w, w->rhs);
        for (sv_index i = 0; i < w->n; i++)
            ret_gain[p * w->table->n + w->rows[i]] = w->rhs[i];
    }
    return true;
}
