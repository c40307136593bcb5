/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Zolotarev's rational approximation of the sign, by elliptic functions of a modulus close to 1.
 *
 * With x = dn(u, k'), k' = √(1 − δ²), the zeros and poles are −δ² sc²(i K'/n, k'), n = 2·terms + 1,
 * and the extremal points dn(i K'/n, k') (Y. Nakatsukasa, R. W. Freund, SIAM Rev. 58, 461 (2016)).
 * The usual routes lose half of the digits when δ is small. sc(u, k') = −i sn(i u, δ) does not:
 * descending Landen steps shrink the small modulus δ and end in a hyperbolic sine. */
#include "selvedge/linalg.h"

#include <float.h>
#include <math.h>

enum { LANDEN_STEPS = 12 };

/* K(√(1 − δ²)) by the arithmetic-geometric mean. */
static double quarter_period(double delta)
{
    double a = 1.0, b = delta;
    for (int k = 0; k < 40 && fabs(a - b) > 2.0 * DBL_EPSILON * a; k++) {
        double mean = 0.5 * (a + b);
        b = sqrt(a * b);
        a = mean;
    }
    return M_PI / (a + b);
}

/* sc(u, √(1 − δ²)) for 0 ≤ u ≤ K'/2. */
static double tangent_lower(double u, double delta)
{
    double modulus[LANDEN_STEPS];
    int steps = 0;
    for (double k = delta; steps < LANDEN_STEPS && k > 1e-18; steps++) {
        double root = 1.0 + sqrt((1.0 - k) * (1.0 + k));
        k = k * k / (root * root);
        modulus[steps] = k;
        u /= 1.0 + k;
    }
    double s = sinh(u);
    while (steps > 0) {
        double k = modulus[--steps];
        s = (1.0 + k) * s / (1.0 - k * s * s);
    }
    return s;
}

/* δ sc(i K'/n, √(1 − δ²)), 0 < i < n; above the middle by sc(K' − v) = 1/(δ sc(v)). */
static double node(int i, int n, double delta)
{
    double step = quarter_period(delta) / n;
    return 2 * i <= n ? delta * tangent_lower(i * step, delta)
                      : 1.0 / tangent_lower((n - i) * step, delta);
}

/* Residue at pole j of ∏ (x² + zero²)/(x² + pole²), factors paired to stay of moderate size. */
static double residue_at(const double *zero, const double *pole, int terms, int j)
{
    double product = 1.0;
    for (int k = 0; k < terms; k++) {
        product *= (zero[k] - pole[j]) * (zero[k] + pole[j]);
        if (k != j)
            product /= (pole[k] - pole[j]) * (pole[k] + pole[j]);
    }
    return product;
}

double sv_zolotarev_value(const sv_zolotarev *sign, double x)
{
    double sum = sign->constant;
    for (int j = sign->terms - 1; j >= 0; j--)
        sum += sign->residue[j] / (x * x + sign->pole[j] * sign->pole[j]);
    return x * sum;
}

/* Values alternate over the extremal points: scales them to lie evenly about 1. */
static void balance(sv_zolotarev *sign)
{
    int n = 2 * sign->terms + 1;
    double low = INFINITY, high = 0.0;
    for (int i = 0; i <= n; i++) {
        double t = i > 0 && i < n ? node(i, n, sign->delta) / sign->delta : 0.0;
        double x = i == n ? sign->delta : sqrt((1.0 + pow(sign->delta * t, 2.0)) / (1.0 + t * t));
        double value = sv_zolotarev_value(sign, x);
        low = fmin(low, value);
        high = fmax(high, value);
    }
    double factor = 2.0 / (low + high);
    sign->error = fmax((high - low) / (high + low), DBL_EPSILON);
    sign->constant *= factor;
    for (int j = 0; j < sign->terms; j++)
        sign->residue[j] *= factor;
}

sv_status sv_zolotarev_make(sv_context *context, double delta, int terms, sv_zolotarev *ret_sign)
{
    double zero[SV_ZOLOTAREV_MOST];
    sv_zolotarev sign = {.terms = terms, .delta = delta, .constant = 1.0};
    if (!(delta > 0.0 && delta < 1.0) || terms < 1 || terms > SV_ZOLOTAREV_MOST)
        return SV_FAIL(context, SV_INVALID_INPUT,
                       "no approximation of the sign with %d terms outside a gap of %g", terms,
                       delta);
    for (int j = 0; j < terms; j++) {
        sign.pole[j] = node(2 * j + 1, 2 * terms + 1, delta);
        zero[j] = node(2 * j + 2, 2 * terms + 1, delta);
    }
    for (int j = 0; j < terms; j++)
        sign.residue[j] = residue_at(zero, sign.pole, terms, j);
    balance(&sign);
    *ret_sign = sign;
    return SV_OK;
}

int sv_zolotarev_terms(double delta, double error)
{
    double n = 2.0 * log(4.0 / delta) * log(4.0 / error) / (M_PI * M_PI);
    double terms = ceil(0.5 * (n - 1.0));
    if (!(terms < SV_ZOLOTAREV_MOST))
        return SV_ZOLOTAREV_MOST;
    return terms < 1.0 ? 1 : (int)terms;
}
