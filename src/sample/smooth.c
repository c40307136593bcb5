/* SPDX-License-Identifier: GPL-3.0-or-later */
/*
 * Gaussian random fields of the plane with a stated covariance, as moving averages of white noise.
 *
 * exp(−r²/(2 l²)) is the convolution of exp(−r²/l²) with itself. The noise sits on a square grid of
 * step l/2, where the sum over nodes equals the integral to 3e-9 (Poisson summation: exp(−2π²)), so
 * the field may be asked for anywhere, costs 16×16 nodes whatever the length, and is a function of
 * the point alone.
 *
 * exp(−r/l) is a mixture of gaussians of all lengths:
 *   exp(−r/l) = (2/√π) ∫ exp(−y²) exp(−r²/(4 y² l²)) dy,
 * summed by the trapezoid rule in ln y. What is shorter than the lattice is independent per
 * position.
 */
#include "sample_internal.h"

#include <math.h>

#include <gsl/gsl_cdf.h>

enum { NODES = 16, MOST_NODES = 1 << 26 };
static const double LONGEST = 2.5, RATIO = 1.6, SHORTEST = 0.3;

/* 1/√(Σ exp(−2 x²/l²)) over the nodes of one axis: √(2/√(2π))⁻¹ with step l/2. */
static double axis_norm(void)
{
    return 1.0 / sqrt(sqrt(2.0 * M_PI));
}

static double noise_at(const sv_smooth *smooth, int scale, int64_t i, int64_t j)
{
    return sv_stream_normal(&smooth->stream, (int32_t)i, (int32_t)j,
                            (uint32_t)SV_SLOT_SMOOTH + (uint32_t)scale);
}

static sv_status fill_noise(sv_context *context, sv_smooth *smooth, int number, const double low[2],
                            const double high[2])
{
    sv_smooth_scale *scale = &smooth->scales[number];
    for (int k = 0; k < 2; k++) {
        scale->low[k] = (int64_t)floor(low[k] / scale->step) - NODES / 2;
        scale->count[k] = (int64_t)floor(high[k] / scale->step) + NODES / 2 + 1 - scale->low[k];
    }
    if ((double)scale->count[0] * (double)scale->count[1] > MOST_NODES)
        return SV_OK;
    sv_status status = sv_take_raw(context, scale->count[0] * scale->count[1], sizeof *scale->noise,
                                   &scale->noise);
    for (int64_t i = 0; status == SV_OK && i < scale->count[0]; i++)
        for (int64_t j = 0; j < scale->count[1]; j++)
            scale->noise[i * scale->count[1] + j] =
                noise_at(smooth, number, i + scale->low[0], j + scale->low[1]);
    return status;
}

static void choose_scales(sv_smooth *smooth, double length, sv_covariance covariance,
                          double shortest)
{
    double rest = 1.0;
    if (covariance == SV_COVARIANCE_GAUSSIAN) {
        smooth->scales[0] = (sv_smooth_scale){.length = length, .weight = 1.0};
        smooth->n_scales = 1;
        return;
    }
    for (double y = LONGEST; smooth->n_scales < SV_SMOOTH_SCALES; y /= RATIO) {
        double own = M_SQRT2 * length * y;
        if (own < SHORTEST * shortest)
            break;
        double weight = log(RATIO) * M_2_SQRTPI * y * exp(-y * y);
        smooth->scales[smooth->n_scales++] =
            (sv_smooth_scale){.length = own, .weight = sqrt(weight)};
        rest -= weight;
    }
    smooth->nugget = sqrt(fmax(rest, 0.0));
}

sv_status sv_smooth_make(sv_context *context, const sv_model *model, const sv_stream *stream,
                         double length, sv_covariance covariance, const double low[2],
                         const double high[2], sv_smooth *ret_smooth)
{
    sv_smooth smooth = {.stream = *stream};
    sv_status status = SV_OK;
    choose_scales(&smooth, length, covariance, sv_shortest_distance(model));
    for (int k = 0; k < smooth.n_scales && status == SV_OK; k++) {
        smooth.scales[k].step = 0.5 * smooth.scales[k].length;
        status = fill_noise(context, &smooth, k, low, high);
    }
    if (status == SV_OK)
        *ret_smooth = smooth;
    else
        sv_smooth_free(context, &smooth);
    return status;
}

/* exp(−x²/l²) at the nodes about x; *ret_first is the first of them. */
static void weights_about(double x, double step, double ret_weights[NODES], int64_t *ret_first)
{
    int64_t first = (int64_t)floor(x / step) - NODES / 2 + 1;
    for (int n = 0; n < NODES; n++) {
        double d = 0.5 * (x / step - (double)(first + n)); /* in units of l */
        ret_weights[n] = exp(-d * d);
    }
    *ret_first = first;
}

static double component_at(const sv_smooth *smooth, int number, const double at[2])
{
    const sv_smooth_scale *scale = &smooth->scales[number];
    double wx[NODES], wy[NODES], sum = 0.0;
    int64_t i0, j0;
    weights_about(at[0], scale->step, wx, &i0);
    weights_about(at[1], scale->step, wy, &j0);
    for (int a = 0; a < NODES; a++) {
        double row = 0.0;
        if (scale->noise != NULL) {
            const double *noise =
                scale->noise + (i0 + a - scale->low[0]) * scale->count[1] + (j0 - scale->low[1]);
            for (int b = 0; b < NODES; b++)
                row += wy[b] * noise[b];
        } else {
            for (int b = 0; b < NODES; b++)
                row += wy[b] * noise_at(smooth, number, i0 + a, j0 + b);
        }
        sum += wx[a] * row;
    }
    return sum;
}

double sv_smooth_at(const sv_smooth *smooth, const double at[2], int32_t i, int32_t j, int position)
{
    double value = 0.0, norm = axis_norm() * axis_norm();
    for (int k = 0; k < smooth->n_scales; k++)
        value += smooth->scales[k].weight * norm * component_at(smooth, k, at);
    if (smooth->nugget > 0.0)
        value += smooth->nugget * sv_stream_normal(&smooth->stream, i, j, (uint32_t)position);
    return value;
}

void sv_smooth_free(sv_context *context, sv_smooth *smooth)
{
    for (int k = 0; k < SV_SMOOTH_SCALES; k++)
        sv_give(context, smooth->scales[k].noise);
    *smooth = (sv_smooth){0};
}
