/* SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef SELVEDGE_STUDY_INTERNAL_H
#define SELVEDGE_STUDY_INTERNAL_H

#include "selvedge/study.h"

enum { MOST_TERMS = 3 };

/* Responses at one value of the parameter; those from `fresh_from` on came after the scouting. */
typedef struct response_point {
    double parameter;
    int64_t n, capacity, fresh_from, unresolved;
    double *values; /* MEAN: distance from the clean value towards failure; SHARE: 1 fails, 0 not */
} response_point;

/* All points of a search, ascending by parameter. */
typedef struct response_table {
    response_point *points;
    int n, capacity;
} response_table;

/* Count, mean and spread of some responses. */
typedef struct response_moments {
    int64_t n;
    double mean, squares; /* Σ(v − mean)² */
} response_moments;

/* A polynomial in x = (parameter − centre)/width; for shares of the log odds. */
typedef struct local_fit {
    int terms;
    double b[MOST_TERMS], covariance[MOST_TERMS][MOST_TERMS];
    double centre, width;
    double degrees; /* of freedom of the variance; infinite for shares */
} local_fit;

/* Values of the parameter that a fit cannot tell from the target. */
typedef struct local_root {
    bool exists;  /* the fit rises through the target within its reach */
    bool open[2]; /* the interval reaches the end of what the fit covers */
    double value, interval[2];
} local_root;

void sv_responses_free(sv_context *context, response_table *table);
/* Number of the point at a parameter, made when there is none. */
sv_status sv_responses_place(sv_context *context, response_table *table, double parameter,
                             int *ret_number);
/* Number of the point nearest to a parameter, −1 for an empty table. */
int sv_responses_nearest(const response_table *table, double parameter);
/* Of responses first … n−1 of a point that are resolved. */
response_moments sv_responses_moments(const response_point *point, int64_t first);

/* Fits the fresh responses of points within `width` of the centre by at most `terms` terms; false
 * when they are too few. */
bool sv_local_fit_mean(const response_table *table, double centre, double width, int terms,
                       local_fit *ret);
bool sv_local_fit_share(const response_table *table, double centre, double width, int terms,
                        local_fit *ret);
/* Value and standard error of a fit at a parameter. */
double sv_local_fit_value(const local_fit *fit, double parameter, double *ret_error);
/* Root of fit = target and the interval at `quantile` standard errors, inside low … high. */
local_root sv_local_fit_root(const local_fit *fit, double target, double quantile, double low,
                             double high);
#endif
