/* SPDX-License-Identifier: GPL-3.0-or-later */
/* When a collapse must not be quoted, and why. */
#include "scaling_internal.h"

#include <math.h>
#include <stdarg.h>
#include <stdio.h>

enum { LEAST_VALUES = 10 };

static void add_reason(sv_scaling_collapse *c, const char *format, ...) SV_PRINTF(2, 3);

static void add_reason(sv_scaling_collapse *c, const char *format, ...)
{
    va_list arguments;
    if (c->n_reasons == SV_SCALING_REASONS)
        return;
    va_start(arguments, format);
    vsnprintf(c->reasons[c->n_reasons++], sizeof c->reasons[0], format, arguments);
    va_end(arguments);
}

static void judge_errors(const sv_scaling *s, sv_scaling_collapse *c)
{
    const double *p = c->critical.interval, *nu = c->nu.interval;
    if (!(p[0] > c->range[0] && p[1] < c->range[1]))
        add_reason(c, "p_c is not inside the range looked at: %.5g to %.5g against %.5g to %.5g",
                   p[0], p[1], c->range[0], c->range[1]);
    if (!(nu[0] >= 0.1) || !(nu[1] <= 20.0) || !(c->nu.value > 0.0))
        add_reason(
            c,
            "the data do not bound nu: the interval at %.4g %% reaches from %.3g to %.3g, so "
            "the curves do not steepen with size within the errors",
            100.0 * s->confidence, nu[0], nu[1]);
    if (10 * c->failed > c->resamples)
        add_reason(c, "%d of %d resamples of the realisations cannot be fitted", c->failed,
                   c->resamples);
}

static void judge_fit(sv_scaling_collapse *c)
{
    if (isnan(c->p_value))
        add_reason(c, "the goodness of the fit cannot be judged");
    else if (c->p_value < 1e-3)
        add_reason(c,
                   "the curves do not fall onto one: chi-square %.4g for %d degrees of freedom, "
                   "p-value %.1g",
                   c->chi_square, c->degrees_of_freedom, c->p_value);
}

static void judge_smallest(sv_scaling_collapse *c)
{
    if (c->n_without == 0)
        return;
    const sv_scaling_without *w = &c->without[0];
    if (!w->fitted)
        add_reason(c, "without the smallest size there is no fit");
    else if (fmax(fabs(w->shift[0]), fabs(w->shift[1])) > 3.3)
        add_reason(c,
                   "the result hangs on the smallest size: without %.6g p_c is %.5g and nu %.3g, "
                   "shifts of %.1f and %.1f standard errors",
                   w->size, w->critical, w->nu, fabs(w->shift[0]), fabs(w->shift[1]));
}

void sv_scaling_refuse(sv_scaling *s, const sv_scaling_options *options,
                       const sv_scaling_crossing *widest, int64_t least_values)
{
    sv_scaling_collapse *c = &s->collapse;
    if (s->n_sizes < 3)
        add_reason(c, "%d size%s: a collapse needs at least three", s->n_sizes,
                   s->n_sizes == 1 ? "" : "s");
    else if (options->correction == SV_CORRECTION_FREE && s->n_sizes < 4)
        add_reason(c, "%d sizes: a free correction exponent needs at least four", s->n_sizes);
    if (s->n_sizes >= 2 && !widest->found)
        add_reason(c, "the curves of %.6g and %.6g do not cross: %s", widest->sizes[0],
                   widest->sizes[1], widest->reason);
    if (least_values < LEAST_VALUES)
        add_reason(c, "a mean of only %lld realisations: its error needs at least %d",
                   (long long)least_values, LEAST_VALUES);
    if (!c->fitted) {
        add_reason(c, "no fit: it needs three parameters at least and three means more than its "
                      "own parameters");
        return;
    }
    judge_errors(s, c);
    judge_fit(c);
    judge_smallest(c);
    c->decided = c->n_reasons == 0;
}
