/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The scaling function and its gradient. Chebyshev polynomials keep high orders well-conditioned.
 */
#include "scaling_internal.h"

#include <math.h>

int sv_scaling_outer(const scaling_model *model)
{
    return model->free_exponent ? 3 : 2;
}

int sv_scaling_inner(const scaling_model *model)
{
    return model->order + 1 + model->correction_order + 1;
}

/* T_n(t) and its derivative for n = 0 … order. */
static void chebyshev(double t, int order, double *value, double *slope)
{
    value[0] = 1.0;
    slope[0] = 0.0;
    if (order > 0) {
        value[1] = t;
        slope[1] = 1.0;
    }
    for (int n = 2; n <= order; n++) {
        value[n] = 2.0 * t * value[n - 1] - value[n - 2];
        slope[n] = 2.0 * value[n - 1] + 2.0 * t * slope[n - 1] - slope[n - 2];
    }
}

/* Everything that depends on size and parameter alone. */
typedef struct place {
    double growth, t, damping, log_largest, log_smallest;
    double value[SV_SCALING_ORDER + 1], slope[SV_SCALING_ORDER + 1];
} place;

static void find_place(const scaling_model *model, const double *parameters, double size, double p,
                       place *at)
{
    double exponent = model->free_exponent ? parameters[2] : model->exponent;
    int order = model->order > model->correction_order ? model->order : model->correction_order;
    at->log_largest = log(size / model->largest);
    at->log_smallest = log(size / model->smallest);
    at->growth = exp(parameters[1] * at->log_largest) / model->width;
    at->t = (p - parameters[0]) * at->growth;
    at->damping = model->correction_order < 0 ? 0.0 : exp(-exponent * at->log_smallest);
    chebyshev(at->t, order, at->value, at->slope);
}

double sv_scaling_correction(const scaling_model *model, const double *parameters, double size,
                             double p)
{
    place at;
    const double *d = parameters + sv_scaling_outer(model) + model->order + 1;
    double sum = 0.0;
    find_place(model, parameters, size, p, &at);
    for (int n = 0; n <= model->correction_order; n++)
        sum += d[n] * at.value[n];
    return at.damping * sum;
}

double sv_scaling_value(const scaling_model *model, const double *parameters, double size, double p,
                        double *gradient)
{
    place at;
    const int outer = sv_scaling_outer(model);
    const double *c = parameters + outer, *d = c + model->order + 1;
    double main = 0.0, rest = 0.0, slope = 0.0;
    find_place(model, parameters, size, p, &at);
    for (int n = 0; n <= model->order; n++) {
        main += c[n] * at.value[n];
        slope += c[n] * at.slope[n];
    }
    for (int n = 0; n <= model->correction_order; n++) {
        rest += d[n] * at.value[n];
        slope += at.damping * d[n] * at.slope[n];
    }
    if (gradient != NULL) {
        gradient[0] = -slope * at.growth;
        gradient[1] = slope * at.t * at.log_largest;
        if (model->free_exponent)
            gradient[2] = -at.log_smallest * at.damping * rest;
        for (int n = 0; n <= model->order; n++)
            gradient[outer + n] = at.value[n];
        for (int n = 0; n <= model->correction_order; n++)
            gradient[outer + model->order + 1 + n] = at.damping * at.value[n];
    }
    return main + at.damping * rest;
}
