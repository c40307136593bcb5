/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Published models without spin. */
#include "model_internal.h"

#include <math.h>

/* F. D. M. Haldane, Phys. Rev. Lett. 61, 2015 (1988). */
sv_status sv_make_haldane(sv_context *context, const sv_value *values, sv_model *model)
{
    const double a1[2] = {1.0, 0.0}, a2[2] = {0.5, sqrt(3.0) / 2.0};
    double t1 = values[0].real[0], t2 = values[1].real[0];
    double phi = values[2].real[0], mass = values[3].real[0];
    enum { A, B };
    TRY(sv_model_begin(context, "haldane", a1, a2, model));
    TRY(sv_model_add_orbital(context, model, "A", 0.0, 0.0, mass));
    TRY(sv_model_add_orbital(context, model, "B", (a1[0] + a2[0]) / 3.0, (a1[1] + a2[1]) / 3.0,
                             -mass));
    TRY(sv_model_add_hop(context, model, A, B, 0, 0, t1));
    TRY(sv_model_add_hop(context, model, A, B, -1, 0, t1));
    TRY(sv_model_add_hop(context, model, A, B, 0, -1, t1));
    /* A → A' over their common B turns right (clockwise) for these shifts; on B for the opposite
     * ones. */
    const int clockwise[3][2] = {{1, 0}, {-1, 1}, {0, -1}};
    sv_complex amplitude = CMPLX(t2 * cos(phi), t2 * sin(phi));
    for (int k = 0; k < 3; k++) {
        int i = clockwise[k][0], j = clockwise[k][1];
        TRY(sv_model_add_hop(context, model, A, A, i, j, amplitude));
        TRY(sv_model_add_hop(context, model, B, B, -i, -j, amplitude));
    }
    TRY(sv_model_add_field(context, model, "mass", mass));
    TRY(sv_model_add_field_term(context, model, A, A, 1.0));
    TRY(sv_model_add_field_term(context, model, B, B, -1.0));
    return SV_OK;
}

/* Kagome lattice. Both kinds of triangles are a → b → c → a counter-clockwise; the phases of the
 * two triangles of a cell leave the hexagon −2·3φ, so that no flux passes on average. */
sv_status sv_make_kagome(sv_context *context, const sv_value *values, sv_model *model)
{
    const double a1[2] = {1.0, 0.0}, a2[2] = {0.5, sqrt(3.0) / 2.0};
    double t = values[0].real[0], phi = values[1].real[0];
    const sv_complex amplitude = CMPLX(t * cos(phi), t * sin(phi));
    enum { A, B, C };
    TRY(sv_model_begin(context, "kagome", a1, a2, model));
    TRY(sv_model_add_orbital(context, model, "a", 0.0, 0.0, 0.0));
    TRY(sv_model_add_orbital(context, model, "b", a1[0] / 2.0, a1[1] / 2.0, 0.0));
    TRY(sv_model_add_orbital(context, model, "c", a2[0] / 2.0, a2[1] / 2.0, 0.0));
    TRY(sv_model_add_hop(context, model, A, B, 0, 0, amplitude));
    TRY(sv_model_add_hop(context, model, B, C, 0, 0, amplitude));
    TRY(sv_model_add_hop(context, model, C, A, 0, 0, amplitude));
    TRY(sv_model_add_hop(context, model, A, B, -1, 0, amplitude));
    TRY(sv_model_add_hop(context, model, B, C, 1, -1, amplitude));
    TRY(sv_model_add_hop(context, model, C, A, 0, 1, amplitude));
    return SV_OK;
}

/* X.-L. Qi, Y.-S. Wu, S.-C. Zhang, Phys. Rev. B 74, 085308 (2006). */
sv_status sv_make_qi_wu_zhang(sv_context *context, const sv_value *values, sv_model *model)
{
    const double a1[2] = {1.0, 0.0}, a2[2] = {0.0, 1.0};
    double m = values[0].real[0];
    enum { A, B };
    TRY(sv_model_begin(context, "qi_wu_zhang", a1, a2, model));
    TRY(sv_model_add_orbital(context, model, "a", 0.0, 0.0, m));
    TRY(sv_model_add_orbital(context, model, "b", 0.0, 0.0, -m));
    /* ⟨R+x|H|R⟩ = (sz + i sx)/2, ⟨R+y|H|R⟩ = (sz + i sy)/2 */
    TRY(sv_model_add_hop(context, model, A, A, 1, 0, 0.5));
    TRY(sv_model_add_hop(context, model, B, B, 1, 0, -0.5));
    TRY(sv_model_add_hop(context, model, A, B, 1, 0, CMPLX(0.0, 0.5)));
    TRY(sv_model_add_hop(context, model, B, A, 1, 0, CMPLX(0.0, 0.5)));
    TRY(sv_model_add_hop(context, model, A, A, 0, 1, 0.5));
    TRY(sv_model_add_hop(context, model, B, B, 0, 1, -0.5));
    TRY(sv_model_add_hop(context, model, A, B, 0, 1, -0.5));
    TRY(sv_model_add_hop(context, model, B, A, 0, 1, 0.5));
    TRY(sv_model_add_field(context, model, "mass", m));
    TRY(sv_model_add_field_term(context, model, A, A, 1.0));
    TRY(sv_model_add_field_term(context, model, B, B, -1.0));
    return SV_OK;
}

/* D. R. Hofstadter, Phys. Rev. B 14, 2239 (1976). */
sv_status sv_make_hofstadter(sv_context *context, const sv_value *values, sv_model *model)
{
    const double a1[2] = {1.0, 0.0}, a2[2] = {0.0, 1.0};
    TRY(sv_model_begin(context, "hofstadter", a1, a2, model));
    TRY(sv_model_add_orbital(context, model, "a", 0.0, 0.0, 0.0));
    TRY(sv_model_add_hop(context, model, 0, 0, 1, 0, -1.0));
    TRY(sv_model_add_hop(context, model, 0, 0, 0, 1, -1.0));
    TRY(sv_model_set_flux(context, model, (int)values[0].integer[0], (int)values[0].integer[1]));
    return SV_OK;
}
