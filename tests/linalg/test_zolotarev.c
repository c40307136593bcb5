/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Zolotarev's approximation of the sign: errors, alternation, poles, number of terms. */
#include "selvedge/linalg.h"
#include "testing.h"

#include <float.h>

/* Largest deviation from 1 on a fine logarithmic grid of [δ, 1]. */
static double sampled_error(const sv_zolotarev *sign, double *ret_low, double *ret_high)
{
    enum { POINTS = 40000 };
    *ret_low = *ret_high = 0.0;
    for (int k = 0; k <= POINTS; k++) {
        double x = k == POINTS ? 1.0 : sign->delta * pow(1.0 / sign->delta, (double)k / POINTS);
        double deviation = sv_zolotarev_value(sign, x) - 1.0;
        *ret_low = fmin(*ret_low, deviation);
        *ret_high = fmax(*ret_high, deviation);
    }
    return fmax(-*ret_low, *ret_high);
}

/* Minimax errors to four digits, computed from elliptic functions by another code (SciPy), in the
 * parametrisation of Y. Nakatsukasa, R. W. Freund, SIAM Rev. 58, 461 (2016). */
SV_TEST(errors_are_the_tabulated_ones)
{
    static const int terms[6] = {1, 2, 3, 4, 6, 8};
    static const struct {
        double delta, error[6];
    } table[3] = {{0.1, {7.201e-2, 4.957e-3, 3.408e-4, 2.343e-5, 1.107e-7, 5.233e-10}},
                  {0.01, {3.286e-1, 6.503e-2, 1.253e-2, 2.414e-3, 8.952e-5, 3.320e-6}},
                  {0.001, {6.025e-1, 2.021e-1, 6.207e-2, 1.890e-2, 1.749e-3, 1.619e-4}}};
    for (int row = 0; row < 3; row++)
        for (int k = 0; k < 6; k++) {
            sv_zolotarev sign;
            double low, high, expected = table[row].error[k];
            CHECK_OK(sv_zolotarev_make(test_context(), table[row].delta, terms[k], &sign));
            CHECK_CLOSE(sign.error, expected, 0.51e-3 * pow(10.0, floor(log10(expected))));
            /* The grid misses a peak by little, and both signs of the deviation occur. */
            double sampled = sampled_error(&sign, &low, &high);
            CHECK_CLOSE(sampled, sign.error, 1e-5 * sign.error + 4e-15);
            CHECK_CLOSE(-low, high, 1e-5 * sign.error + 4e-15);
        }
}

/* The deviation reaches its largest size at 2·terms + 2 points with alternating signs: by
 * Chebyshev's theorem no other function of this type does better. */
SV_TEST(the_deviation_alternates)
{
    static const double deltas[3] = {0.3, 1e-3, 1e-8};
    for (int d = 0; d < 3; d++)
        for (int terms = 1; terms <= 8; terms++) {
            enum { POINTS = 60000 };
            sv_zolotarev sign;
            int peaks = 0, last = 0;
            CHECK_OK(sv_zolotarev_make(test_context(), deltas[d], terms, &sign));
            if (sign.error < 1e-12) /* rounding hides the peaks */
                continue;
            for (int k = 0; k <= POINTS; k++) {
                double x = k == POINTS ? 1.0 : deltas[d] * pow(1.0 / deltas[d], (double)k / POINTS);
                double deviation = sv_zolotarev_value(&sign, x) - 1.0;
                int side = deviation > 0.0 ? 1 : -1;
                if (fabs(deviation) > 0.999 * sign.error && side != last) {
                    peaks++;
                    last = side;
                }
            }
            CHECK_INT(peaks, 2 * terms + 2);
            CHECK_CLOSE(sv_zolotarev_value(&sign, -0.7), -sv_zolotarev_value(&sign, 0.7), 0.0);
        }
}

/* Down to δ = 1e-8 and up to as many terms as double precision can use. */
SV_TEST(poles_are_positive_and_ordered)
{
    for (int e = 1; e <= 8; e++)
        for (int terms = 1; terms <= 72; terms += 3) {
            double delta = pow(10.0, -e), low, high;
            sv_zolotarev sign;
            CHECK_OK(sv_zolotarev_make(test_context(), delta, terms, &sign));
            CHECK(sign.constant > 0.0);
            for (int j = 0; j < terms; j++) {
                CHECK(sign.residue[j] > 0.0 && sign.pole[j] > 0.0);
                CHECK(j == 0 || sign.pole[j] > sign.pole[j - 1]);
                /* Poles below and above √δ mirror each other up to the shift of the zeros. */
                CHECK(sign.pole[j] > 1e-3 * delta && sign.pole[j] < 1e3);
            }
            CHECK(sampled_error(&sign, &low, &high) <= 1.001 * sign.error + 8e-15);
        }
}

/* As δ → 0 and the error → 0, error → 4 exp(−n π²/(2 ln(4/δ))), n = 2·terms + 1 (B. Beckermann, A.
 * Townsend, SIAM J. Matrix Anal. Appl. 38, 1227 (2017); recalled from memory), from below. */
SV_TEST(terms_follow_the_asymptotic_formula)
{
    static const double deltas[4] = {0.1, 0.01, 1e-4, 1e-7};
    for (int d = 0; d < 4; d++)
        for (double error = 1e-2; error > 1e-12; error *= 0.03) {
            sv_zolotarev sign;
            int terms = sv_zolotarev_terms(deltas[d], error);
            double n = 2 * terms + 1, rate = M_PI * M_PI / (2.0 * log(4.0 / deltas[d]));
            CHECK_OK(sv_zolotarev_make(test_context(), deltas[d], terms, &sign));
            CHECK(sign.error <= error);
            CHECK_CLOSE(sign.error / (4.0 * exp(-n * rate)), 1.0,
                        3e-3 + error + 0.3 * deltas[d] * deltas[d] * n * rate);
            if (terms > 1) { /* one term fewer would not do */
                CHECK(4.0 * exp(-(n - 2.0) * rate) > error);
            }
        }
    CHECK_INT(sv_zolotarev_terms(0.1, 0.5), 1);
    CHECK_INT(sv_zolotarev_terms(1e-300, 1e-15), SV_ZOLOTAREV_MOST);
}

SV_TEST(nonsense_is_refused)
{
    sv_zolotarev sign = {.terms = 77};
    sv_context *c = test_context();
    CHECK_STATUS(SV_INVALID_INPUT, sv_zolotarev_make(c, 0.0, 3, &sign));
    CHECK_STATUS(SV_INVALID_INPUT, sv_zolotarev_make(c, 1.0, 3, &sign));
    CHECK_STATUS(SV_INVALID_INPUT, sv_zolotarev_make(c, (double)NAN, 3, &sign));
    CHECK_STATUS(SV_INVALID_INPUT, sv_zolotarev_make(c, 0.1, 0, &sign));
    CHECK_STATUS(SV_INVALID_INPUT, sv_zolotarev_make(c, 0.1, SV_ZOLOTAREV_MOST + 1, &sign));
    CHECK_INT(sign.terms, 77);
}
