/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Near-best odd polynomials for the sign function on [−1, −δ] ∪ [δ, 1].
 *
 * p(x) = x q(x²) with q the Chebyshev interpolant of u^{−1/2} on [δ², 1]. The nearest singularity,
 * u = 0, gives the rate ((1+δ)/(1−δ))^{−(M+1)/2}, that of the best polynomial of degree M
 * (Eremenko, Yuditskii, J. Anal. Math. 101, 313 (2007)); a Jackson-damped expansion of the step
 * converges only as 1/M near the jump. */
#include "selvedge/linalg.h"

#include <math.h>

/* Chebyshev coefficients of the interpolant of u^{−1/2} on [δ², 1] at m nodes. */
static void root_coefficients(double delta, int m, double *c)
{
    double centre = 0.5 * (1.0 + delta * delta), half = 0.5 * (1.0 - delta * delta);
    for (int k = 0; k < m; k++) {
        double sum = 0.0;
        for (int j = 0; j < m; j++) {
            double angle = M_PI * (j + 0.5) / m;
            sum += cos(k * angle) / sqrt(centre + half * cos(angle));
        }
        c[k] = (k == 0 ? 1.0 : 2.0) / m * sum;
    }
}

/* Clenshaw's recurrence for Σ c_k T_k(t). */
static double series(const double *c, int m, double t)
{
    double b1 = 0.0, b2 = 0.0;
    for (int k = m - 1; k >= 1; k--) {
        double b0 = 2.0 * t * b1 - b2 + c[k];
        b2 = b1;
        b1 = b0;
    }
    return t * b1 - b2 + c[0];
}

static double odd_value(const double *c, int m, double delta, double x)
{
    double centre = 0.5 * (1.0 + delta * delta), half = 0.5 * (1.0 - delta * delta);
    return x * series(c, m, (x * x - centre) / half);
}

sv_status sv_step_polynomial(sv_context *context, double delta, int degree, double *ret_step)
{
    int m = (degree + 1) / 2, n = degree + 1;
    double *c = NULL, *sign = NULL;
    sv_status status;
    if (!(delta > 0.0 && delta < 1.0) || degree < 1 || degree % 2 == 0)
        return SV_FAIL(context, SV_INVALID_INPUT, "a step polynomial of degree %d for gap %g",
                       degree, delta);
    if ((status = sv_take(context, m, sizeof *c, &c)) != SV_OK ||
        (status = sv_take(context, n, sizeof *sign, &sign)) != SV_OK)
        goto out;
    /* Beyond double precision the interpolant only amplifies rounding between −δ and δ. */
    if (sv_step_error(delta, degree) < 1e-15) {
        status =
            SV_FAIL(context, SV_INVALID_INPUT, "degree %d is too high for gap %g", degree, delta);
        goto out;
    }
    root_coefficients(delta, m, c);
    /* Sampled at Chebyshev nodes and transformed back: exact for a polynomial of this degree. */
    for (int j = 0; j < n; j++)
        sign[j] = odd_value(c, m, delta, cos(M_PI * (j + 0.5) / n));
    for (int k = 0; k < n; k++) {
        double sum = 0.0;
        for (int j = 0; j < n; j++)
            sum += sign[j] * cos(M_PI * (double)k * (j + 0.5) / n);
        /* Occupied states have A < 0: step = (1 − sign)/2. */
        ret_step[k] = k == 0 ? 0.5 : k % 2 == 0 ? 0.0 : -sum / n;
    }
out:
    sv_give(context, c);
    sv_give(context, sign);
    return status;
}

double sv_step_error(double delta, int degree)
{
    double ratio = (1.0 + delta) / (1.0 - delta);
    /* Measured: the true largest error is 0.17 to 0.55 of this for δ from 0.03 to 0.3. */
    return pow(ratio, -0.5 * (degree + 1));
}

int sv_step_degree(double delta, double error)
{
    double ratio = (1.0 + delta) / (1.0 - delta);
    double degree = 2.0 * log(1.0 / error) / log(ratio) - 1.0;
    int odd = 2 * (int)ceil(0.5 * (fmax(degree, 1.0) - 1.0)) + 1;
    return odd;
}
