/* SPDX-License-Identifier: GPL-3.0-or-later */
/* C. L. Kane, E. J. Mele, Phys. Rev. Lett. 95, 226801 and 146802 (2005). */
#include "model_internal.h"

#include <math.h>

/* Orbitals in the order A_up, A_down, B_up, B_down. */
enum { A, B };
static int row(int sublattice, int spin)
{
    return 2 * sublattice + spin;
}

static sv_status add_orbitals(sv_context *context, double mass, sv_model *model)
{
    static const char *const names[4] = {"A_up", "A_down", "B_up", "B_down"};
    const double at[2] = {(model->vectors[0][0] + model->vectors[1][0]) / 3.0,
                          (model->vectors[0][1] + model->vectors[1][1]) / 3.0};
    for (int k = 0; k < 4; k++) {
        bool on_b = k >= 2;
        TRY(sv_model_add_orbital(context, model, names[k], on_b ? at[0] : 0.0, on_b ? at[1] : 0.0,
                                 on_b ? -mass : mass));
        TRY(sv_model_set_spin(context, model, k, k % 2 == 0 ? 1 : -1));
    }
    return SV_OK;
}

/* From A to the B of another cell: t1, and ⟨B|H|A⟩ = i λ (s × d̂)_z = i λ (sx dy − sy dx) with d̂ the
 * unit vector from A to B. */
static sv_status add_bond(sv_context *context, double t1, double rashba, int i, int j,
                          sv_model *model)
{
    const double(*a)[2] = (const double(*)[2])model->vectors;
    const double *b = model->orbitals[row(B, 0)].at;
    double x = b[0] + i * a[0][0] + j * a[1][0], y = b[1] + i * a[0][1] + j * a[1][1];
    double length = hypot(x, y), dx = x / length, dy = y / length;
    for (int spin = 0; spin < 2; spin++) {
        TRY(sv_model_add_hop(context, model, row(A, spin), row(B, spin), i, j, t1));
        if (rashba == 0.0)
            continue;
        /* ⟨↓|sx|↑⟩ = 1, ⟨↓|sy|↑⟩ = i; ⟨↑|sx|↓⟩ = 1, ⟨↑|sy|↓⟩ = −i */
        double sy = spin == 0 ? 1.0 : -1.0;
        sv_complex element = CMPLX(0.0, rashba) * CMPLX(dy, -sy * dx);
        TRY(sv_model_add_hop(context, model, row(A, spin), row(B, 1 - spin), i, j, element));
    }
    return SV_OK;
}

sv_status sv_make_kane_mele(sv_context *context, const sv_value *values, sv_model *model)
{
    const double a1[2] = {1.0, 0.0}, a2[2] = {0.5, sqrt(3.0) / 2.0};
    double t1 = values[0].real[0], so = values[1].real[0];
    double rashba = values[2].real[0], mass = values[3].real[0];
    TRY(sv_model_begin(context, "kane_mele", a1, a2, model));
    TRY(add_orbitals(context, mass, model));
    TRY(add_bond(context, t1, rashba, 0, 0, model));
    TRY(add_bond(context, t1, rashba, -1, 0, model));
    TRY(add_bond(context, t1, rashba, 0, -1, model));
    /* Spin up is the Haldane model with φ = π/2, spin down its time reverse; clockwise from A. */
    const int clockwise[3][2] = {{1, 0}, {-1, 1}, {0, -1}};
    for (int k = 0; k < 3; k++)
        for (int spin = 0; spin < 2; spin++) {
            int i = clockwise[k][0], j = clockwise[k][1];
            sv_complex amplitude = CMPLX(0.0, spin == 0 ? so : -so);
            TRY(sv_model_add_hop(context, model, row(A, spin), row(A, spin), i, j, amplitude));
            TRY(sv_model_add_hop(context, model, row(B, spin), row(B, spin), -i, -j, amplitude));
        }
    TRY(sv_model_add_field(context, model, "mass", mass));
    for (int k = 0; k < 4; k++)
        TRY(sv_model_add_field_term(context, model, k, k, k < 2 ? 1.0 : -1.0));
    return SV_OK;
}
