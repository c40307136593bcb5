/* SPDX-License-Identifier: GPL-3.0-or-later */
/*
 * Thin film of a magnetic topological insulator: R. Yu, W. Zhang, H.-J. Zhang, S.-C. Zhang, X. Dai,
 * Z. Fang, Science 329, 61 (2010), four-band model (formula recalled from memory):
 *
 *     H = ħv (ky σx − kx σy) τz + (m0 + m1 k²) τx + g σz,    τz = ±1: top and bottom surface.
 *
 * On a square grid of spacing d, with s_i = sin k_i d and K = 4 − 2 cos kx d − 2 cos ky d (→ k²
 * d²):
 *
 *     H(k) = (ħv/d) (sy σx − sx σy) τz + [m0 + (m1/d²) K + w K²/16] τx + g σz.
 *
 * The sines vanish at the edge of the zone as well, where K = 4 and 8. So that no second set of
 * light states sits there, m at K = 4 must stay beyond the cut-off energy ħv/d: w, of the sign of
 * m1 and of order k⁴, makes up what 4 |m1|/d² lacks of it, and is 0 on a grid finer than 4 |m1|/ħv.
 */
#include "model_internal.h"

#include <math.h>

typedef sv_complex spin_block[2][2]; /* [to][from] */

/* Elements of both surfaces for one shift: `diagonal` (times τz = ±1) and the coupling of τx. */
static sv_status add_shift(sv_context *context, sv_model *model, int i, int j,
                           const spin_block kinetic, double coupling)
{
    for (int surface = 0; surface < 2; surface++)
        for (int from = 0; from < 2; from++) {
            int origin = 2 * surface + from, across = 2 * (1 - surface) + from;
            for (int to = 0; to < 2; to++) {
                sv_complex element = (surface == 0 ? 1.0 : -1.0) * kinetic[to][from];
                if (element != 0.0)
                    TRY(sv_model_add_hop(context, model, origin, 2 * surface + to, i, j, element));
            }
            bool within_cell = i == 0 && j == 0; /* there the conjugate follows from one side */
            if (coupling != 0.0 && !(within_cell && surface == 1))
                TRY(sv_model_add_hop(context, model, origin, across, i, j, coupling));
        }
    return SV_OK;
}

/* What the rule C = sign(g) for |g| > |m0| needs: the edge of the zone must not change side. */
static sv_status check_grid(sv_context *context, double spacing, double m0, double exchange,
                            double edge)
{
    if (fabs(m0) + fabs(exchange) < edge)
        return SV_OK;
    return SV_FAIL(
        context, SV_INVALID_INPUT,
        "a grid of %.4g nm is too coarse: |m0| + |exchange| = %.4g reaches %.4g, the energy "
        "of the states at the edge of its zone; make the grid finer",
        spacing, fabs(m0) + fabs(exchange), edge);
}

static sv_status add_orbitals(sv_context *context, double exchange, sv_model *model)
{
    static const char *const names[4] = {"top_up", "top_down", "bottom_up", "bottom_down"};
    for (int k = 0; k < 4; k++) {
        int spin = k % 2 == 0 ? 1 : -1;
        TRY(sv_model_add_orbital(context, model, names[k], 0.0, 0.0, spin * exchange));
        TRY(sv_model_set_spin(context, model, k, spin));
    }
    return SV_OK;
}

/* What defects of a film change: its hybridisation (τx) and its exchange energy (σz). */
static sv_status add_fields(sv_context *context, double m0, double exchange, sv_model *model)
{
    TRY(sv_model_add_field(context, model, "mass", m0));
    for (int spin = 0; spin < 2; spin++)
        TRY(sv_model_add_field_term(context, model, 2 + spin, spin, 1.0));
    TRY(sv_model_add_field(context, model, "exchange", exchange));
    for (int k = 0; k < 4; k++)
        TRY(sv_model_add_field_term(context, model, k, k, k % 2 == 0 ? 1.0 : -1.0));
    return SV_OK;
}

sv_status sv_make_magnetic_film(sv_context *context, const sv_value *values, sv_model *model)
{
    const double a1[2] = {1.0, 0.0}, a2[2] = {0.0, 1.0};
    double d = values[0].real[0], v = values[1].real[0] / d, m0 = values[2].real[0];
    double m1 = values[3].real[0] / d / d, exchange = values[4].real[0];
    double w = fmax(0.0, v - 4.0 * fabs(m1));
    double quartic = (m1 < 0.0 ? -w : w) / 16.0;
    TRY(check_grid(context, d, m0, exchange, 4.0 * fabs(m1) + w));
    TRY(sv_model_begin(context, "magnetic_film", a1, a2, model));
    model->velocity = v;
    TRY(add_orbitals(context, exchange, model));
    /* sin k → i/2 and cos k → 1/2 on the hop by +1; σy = [[0, −i], [i, 0]]. K² = 20 − 16 (cx + cy)
     * + 2 cos 2kx + 2 cos 2ky + 4 cos(kx + ky) + 4 cos(kx − ky). */
    const spin_block none = {{0.0, 0.0}, {0.0, 0.0}};
    const spin_block along_x = {{0.0, -0.5 * v}, {0.5 * v, 0.0}};
    const spin_block along_y = {{0.0, CMPLX(0.0, 0.5 * v)}, {CMPLX(0.0, 0.5 * v), 0.0}};
    double nearest = -m1 - 8.0 * quartic;
    TRY(add_shift(context, model, 0, 0, none, m0 + 4.0 * m1 + 20.0 * quartic));
    TRY(add_shift(context, model, 1, 0, along_x, nearest));
    TRY(add_shift(context, model, 0, 1, along_y, nearest));
    TRY(add_shift(context, model, 2, 0, none, quartic));
    TRY(add_shift(context, model, 0, 2, none, quartic));
    TRY(add_shift(context, model, 1, 1, none, 2.0 * quartic));
    TRY(add_shift(context, model, 1, -1, none, 2.0 * quartic));
    return add_fields(context, m0, exchange, model);
}
