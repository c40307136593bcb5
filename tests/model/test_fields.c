/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "fixtures.h"

/* Adding δ·O to the clean model is the clean model with its parameter moved by δ. */
static void check_shift(const char *name, int row, const double *numbers, int parameter,
                        const char *field_name)
{
    const double delta = 0.37, k[2] = {0.7, -1.9};
    double moved[8];
    for (int i = 0; i < row; i++)
        moved[i] = numbers[i] + (i == parameter ? delta : 0.0);
    sv_model model = fixture_model(name, numbers), other = fixture_model(name, moved);
    int f = sv_model_find_field(&model, field_name);
    CHECK(f >= 0);
    const sv_model_field *field = &model.fields[f < 0 ? 0 : f];
    CHECK_CLOSE(field->value, numbers[parameter], 0.0);
    sv_complex a[64], b[64];
    int n = model.n_orbitals;
    sv_model_bloch(&model, k, a);
    sv_model_bloch(&other, k, b);
    for (int t = 0; t < field->n_terms; t++) {
        const sv_field_term *term = &field->terms[t];
        a[term->to + term->from * n] += delta * term->amplitude;
        if (term->to != term->from)
            a[term->from + term->to * n] += delta * conj(term->amplitude);
    }
    for (int i = 0; i < n * n; i++)
        CHECK(cabs(a[i] - b[i]) < 1e-14);
    sv_model_free(test_context(), &model);
    sv_model_free(test_context(), &other);
}

SV_TEST(fields_move_their_parameter)
{
    check_shift("haldane", 4, (const double[]){1.0, 0.2, 0.9, 0.3}, 3, "mass");
    check_shift("qi_wu_zhang", 1, (const double[]){-0.8}, 0, "mass");
}

SV_TEST(fields_are_local_and_hermitian)
{
    sv_context *c = test_context();
    sv_model model = {0};
    CHECK_OK(sv_model_begin(c, "own", (const double[2]){1, 0}, (const double[2]){0, 1}, &model));
    CHECK_OK(sv_model_add_orbital(c, &model, "a", 0, 0, 0));
    CHECK_OK(sv_model_add_orbital(c, &model, "b", 0, 0, 0));
    CHECK_OK(sv_model_add_orbital(c, &model, "far", 0.5, 0, 0));
    CHECK_STATUS(SV_INVALID_INPUT, sv_model_add_field_term(c, &model, 0, 0, 1.0));
    CHECK_OK(sv_model_add_field(c, &model, "pairing", 0.5));
    CHECK_STATUS(SV_INVALID_INPUT, sv_model_add_field(c, &model, "pairing", 0.5));
    CHECK_STATUS(SV_INVALID_INPUT, sv_model_add_field(c, &model, "potential", 0.0));
    CHECK_STATUS(SV_INVALID_INPUT, sv_model_add_field(c, &model, "a name beyond bounds", 0.0));
    CHECK_OK(sv_model_add_field_term(c, &model, 0, 1, CMPLX(0.0, 1.0)));
    CHECK_STATUS(SV_INVALID_INPUT, sv_model_add_field_term(c, &model, 0, 2, 1.0));
    CHECK_STATUS(SV_INVALID_INPUT, sv_model_add_field_term(c, &model, 0, 3, 1.0));
    CHECK_STATUS(SV_INVALID_INPUT, sv_model_add_field_term(c, &model, 0, 0, CMPLX(0.0, 1.0)));
    CHECK_INT(sv_model_find_field(&model, "pairing"), 0);
    CHECK_INT(sv_model_find_field(&model, "potential"), SV_FIELD_POTENTIAL);
    CHECK_INT(sv_model_find_field(&model, "mass"), SV_NO_FIELD);
    sv_model_free(c, &model);
}
