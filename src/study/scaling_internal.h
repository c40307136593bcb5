/* SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef SELVEDGE_STUDY_SCALING_INTERNAL_H
#define SELVEDGE_STUDY_SCALING_INTERNAL_H

#include "selvedge/study.h"

/* -------------------------------------------------------- scaling_table.c */

enum { MOST_POINTS = 2000 };

/* The data by size, then parameter, and the covariance of the means. */
typedef struct scaling_table {
    sv_index n;
    int64_t realisations;
    int n_sizes;
    double sizes[SV_SCALING_SIZES];
    sv_index first[SV_SCALING_SIZES + 1]; /* rows of a size */
    double *size, *parameter, *mean, *error;
    const double **values;
    double *covariance;  /* n × n */
    double *draw;        /* means of a resample */
    double *scale;       /* 1/√(count (count − 1)) */
    int64_t *counts;     /* how often it has each realisation */
    int64_t least, most; /* values of a row */
    double range[2];     /* of the parameters looked at */
} scaling_table;

sv_status sv_scaling_table_make(sv_context *context, const sv_scaling_data *data,
                                const double range[2], scaling_table *ret_table);
/* Has a mean and an error, in the range. */
bool sv_scaling_usable(const scaling_table *table, sv_index row);
void sv_scaling_table_free(sv_context *context, scaling_table *table);
/* Means over realisation numbers drawn with replacement, into table->draw. */
void sv_scaling_table_draw(scaling_table *table, uint64_t seed, int resample);
/* Variance of Σ weights_i means[rows_i]. */
double sv_scaling_variance(const scaling_table *table, const sv_index *rows, const double *weights,
                           sv_index n);

/* --------------------------------------------------------- scaling_cross.c */

enum { CROSSING_SIDE = 3 };

/* Which parameters the local fit of a crossing takes. */
typedef struct scaling_pair {
    sv_index rows[2][2 * CROSSING_SIDE];
    double weights[2 * CROSSING_SIDE]; /* of the differences */
    int n, degree;
    double bracket[2]; /* where the root must lie */
    double start;      /* middle of the split */
} scaling_pair;

/* Finds the split and the crossing. */
sv_status sv_scaling_cross(sv_context *context, const scaling_table *table, int small, int large,
                           scaling_pair *ret_pair, sv_scaling_crossing *ret_crossing);
/* Root of the local fit for these means; NaN: none inside the bracket. */
double sv_scaling_root(const scaling_table *table, const scaling_pair *pair, const double *means,
                       double *ret_height);

/* --------------------------------------------------------- scaling_model.c */

enum { MOST_PARAMETERS = 3 + (SV_SCALING_ORDER + 1) + 2 };

/* f = Σ c_n T_n(t) + (L/L_min)^{−y} Σ d_n T_n(t), t = (p − p_c)/width · (L/L_max)^a, a = 1/ν.
 * Parameters: p_c, a, [y], c_0 … c_order, [d_0 …]. */
typedef struct scaling_model {
    int order, correction_order; /* −1: no correction */
    bool free_exponent;
    double exponent; /* when not free */
    double width, largest, smallest;
} scaling_model;

int sv_scaling_outer(const scaling_model *model); /* p_c, a, [y] */
int sv_scaling_inner(const scaling_model *model); /* coefficients */
/* Value and, where asked for, gradient in all parameters. */
double sv_scaling_value(const scaling_model *model, const double *parameters, double size, double p,
                        double *gradient);
/* The correction alone. */
double sv_scaling_correction(const scaling_model *model, const double *parameters, double size,
                             double p);

/* ------------------------------------------- scaling_fit.c, scaling_weigh.c */

/* A fit to some rows of a table. */
typedef struct scaling_fit {
    scaling_model model;
    double parameters[MOST_PARAMETERS];
    int n_parameters;
    double chi_square;
    bool converged;
} scaling_fit;

/* Rows, their weights, and room for the linear algebra. */
typedef struct scaling_work {
    const scaling_table *table;
    sv_index *rows;
    sv_index n;
    double *covariance; /* n × n: of the means in units of their errors */
    double *q;          /* (n + MOST_PARAMETERS) × MOST_PARAMETERS, by columns */
    double *rhs;        /* n + MOST_PARAMETERS */
    double r[MOST_PARAMETERS * MOST_PARAMETERS];
} scaling_work;

sv_status sv_scaling_work_make(sv_context *context, const scaling_table *table,
                               scaling_work *ret_work);
void sv_scaling_work_free(sv_context *context, scaling_work *work);
/* Rows with lo ≤ p ≤ hi, without one size (−1: with all), and their weights. */
void sv_scaling_select(scaling_work *work, double lo, double hi, int without);
/* Divides by the standard errors. */
void sv_scaling_weigh(const scaling_work *work, double *column);

/* Orthonormal columns q and r of a by modified Gram–Schmidt, twice; false: a column depends on
 * those before it. */
bool sv_scaling_orthonormal(double *columns, sv_index n_rows, int n_columns, double *r);
void sv_scaling_back_substitute(const double *r, int n, double *x);
/* Best coefficients at fixed p_c, a, y; χ². Infinity when there are none. */
double sv_scaling_inner_solve(scaling_work *work, const double *means, const scaling_model *model,
                              double *parameters);
/* Levenberg–Marquardt from fit->parameters. */
void sv_scaling_descend(scaling_work *work, const double *means, scaling_fit *fit);
/* The weighted Jacobian at the fit, orthonormal, in work->q and work->r. */
bool sv_scaling_tangent(scaling_work *work, const scaling_fit *fit);

/* --------------------------------------------------------- scaling_judge.c */

/* χ² of a fit against the correlations of the data. */
typedef struct scaling_quality {
    double scale, effective, p_value;
    double penalty; /* tr(PΣ) */
} scaling_quality;

sv_status sv_scaling_judge(sv_context *context, scaling_work *work, const scaling_fit *fit,
                           bool with_p_value, scaling_quality *ret_quality);
/* Derivatives of p_c and a in the means of all rows of the table. @param[out] ret_gain 2 × n */
bool sv_scaling_gain(scaling_work *work, const scaling_fit *fit, double *ret_gain);

/* -------------------------------------------------------- scaling_choose.c */

/* Range, orders and fit as sv_scaling_study() says. work->rows holds the range afterwards. */
sv_status sv_scaling_choose(sv_context *context, scaling_work *work,
                            const sv_scaling_options *options, double guess, scaling_fit *ret_fit,
                            scaling_quality *ret_quality);

/* ------------------------------------------------------ scaling_resample.c */

/* Bootstrap of crossings and collapse together: fills their errors. `fit` need not have converged,
 * then there is no collapse. */
sv_status sv_scaling_resample(sv_context *context, scaling_table *table, scaling_work *work,
                              const sv_scaling_options *options, const scaling_pair *pairs,
                              const scaling_fit *fit, sv_scaling *scaling);

/* ------------------------------------------------------- scaling_verdict.c */

/* Collects the reasons against the collapse and decides. */
void sv_scaling_refuse(sv_scaling *scaling, const sv_scaling_options *options,
                       const sv_scaling_crossing *widest, int64_t least_values);

#endif
