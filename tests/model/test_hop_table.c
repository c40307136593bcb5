/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Hops of a model from a table. */
#include "fixtures.h"

#include <stdlib.h>

static sv_model two_orbitals(void)
{
    sv_model model = {0};
    CHECK_OK(sv_model_begin(test_context(), "custom", (const double[2]){1, 0},
                            (const double[2]){0, 1}, &model));
    CHECK_OK(sv_model_add_orbital(test_context(), &model, "a", 0, 0, 0));
    CHECK_OK(sv_model_add_orbital(test_context(), &model, "b", 0, 0, 0));
    return model;
}

static sv_status read_table(sv_model *model, const char *text, double unit, bool *has_unit,
                            sv_table_fault *fault)
{
    return sv_model_read_hops(test_context(), model, text, strlen(text), unit, has_unit, fault);
}

/* Half-BHZ as a table with all rows in both directions: the Bloch matrix of the named model. */
SV_TEST(both_directions_give_the_named_model)
{
    const char *text = "from,to,shift_i,shift_j,re [meV],im [meV]\n"
                       "a,a,0,0,-700,0\nb,b,0,0,700,0\n"
                       "a,a,1,0,500,0\na,a,-1,0,500,0\nb,b,1,0,-500,0\nb,b,-1,0,-500,-0.0001\n"
                       "a,b,1,0,0,500\nb,a,1,0,0,500\nb,a,-1,0,0,-500\na,b,-1,0,0,-500\n"
                       "a,a,0,1,500,0\nb,b,0,1,-500,0\na,b,0,1,-500,0\nb,a,0,1,500,0\n";
    sv_model model = two_orbitals(), named = fixture_qi_wu_zhang(-0.7);
    sv_table_fault fault = {0};
    bool has_unit = false;
    CHECK_OK(read_table(&model, text, 0.5, &has_unit, &fault));
    CHECK_OK(sv_model_finish(test_context(), &model));
    CHECK(has_unit);
    CHECK_INT(model.n_hops, named.n_hops);
    for (int k = 0; k < 5; k++) {
        const double at[2] = {0.3 * k, 1.0 - 0.7 * k};
        sv_complex ours[4], wanted[4];
        sv_model_bloch(&model, at, ours);
        sv_model_bloch(&named, at, wanted);
        for (int e = 0; e < 4; e++)
            CHECK(cabs(ours[e] - 2.0 * wanted[e]) < 1e-14); /* the unit is 0.5 eV */
    }
    sv_model_free(test_context(), &model);
    sv_model_free(test_context(), &named);
}

SV_TEST(bare_numbers_are_in_the_unit_of_the_model)
{
    sv_model model = two_orbitals();
    sv_table_fault fault = {0};
    bool has_unit = true;
    CHECK_OK(read_table(&model, "from,to,shift_i,shift_j,im,re\na,b,2,-1,3,4\n", 0.5, &has_unit,
                        &fault));
    CHECK(!has_unit);
    CHECK_INT(sv_model_find_hop(&model, 0, 1, 2, -1), 0);
    CHECK(cabs(model.hops[0].amplitude - CMPLX(4.0, 3.0)) < 1e-15);
    sv_model_free(test_context(), &model);
}

static void check_fault(const char *rows, int line, int column, const char *message)
{
    char text[1000];
    sv_model model = two_orbitals();
    sv_table_fault fault = {0};
    bool has_unit = false;
    CHECK_OK(sv_model_add_hop(test_context(), &model, 0, 0, 3, 0, 1.0));
    model.orbitals[1].onsite = 0.25;
    snprintf(text, sizeof text, "from,to,shift_i,shift_j,re,im\n%s", rows);
    CHECK_STATUS(SV_INVALID_INPUT, read_table(&model, text, 1.0, &has_unit, &fault));
    CHECK_INT(fault.line, line);
    CHECK_INT(fault.column, column);
    CHECK(strstr(fault.message, message) != NULL);
    sv_model_free(test_context(), &model);
}

SV_TEST(faults_have_places)
{
    check_fault("a,b,0,0,1,0\na,c,0,0,1,0\n", 3, 3, "the model has no orbital \"c\"");
    check_fault("a,b,0.5,0,1,0\n", 2, 5, "\"0.5\" is not a whole number");
    check_fault("a,b,0,1001,1,0\n", 2, 7, "farther than 1000 cells");
    check_fault("a,b,0,0,nan,0\n", 2, 9, "\"nan\" is not an energy");
    check_fault("a,b,0,0,1,1e13\n", 2, 11, "too large");
    check_fault("a,a,0,0,1,0.1\n", 2, 11, "the on-site energy of a is not real");
    check_fault("a,a,0,0,1,0\na,a,0,0,1,0\n", 3, 1, "stands in line 2 already");
    check_fault("b,b,0,0,1,0\n", 2, 1, "the on-site energy of b stands in the sheet already");
    check_fault("a,a,-3,0,1,0\n", 2, 1, "stands in the sheet already");
    check_fault("a,b,1,0,1,2\na,b,1,0,1,2\n", 3, 1, "this hop stands in line 2 already");
    check_fault("a,b,1,0,1,2\nb,a,-1,0,1,-2\nb,a,-1,0,1,-2\n", 4, 1,
                "this hop stands in line 3 already");
    check_fault("a,b,1,0,1,2\nb,b,1,0,5,0\nb,a,-1,0,1,2\n", 4, 1, "is not hermitian");
}

/* A hundred thousand and more hops: no cost that grows with the square of their number. */
SV_TEST(large_tables_are_read)
{
    enum { SIDE = 200 };
    char *text = malloc(64 + 40 * 4 * SIDE * SIDE);
    size_t used = (size_t)sprintf(text, "from,to,shift_i,shift_j,re,im\n");
    for (int i = 0; i < SIDE; i++)
        for (int j = 1; j <= SIDE; j++)
            for (int o = 0; o < 4; o++)
                used += (size_t)sprintf(text + used, "%c,%c,%d,%d,1e-6,%g\n", "ab"[o / 2],
                                        "ab"[o % 2], i, j, 1e-9 * o);
    sv_model model = two_orbitals();
    sv_table_fault fault = {0};
    bool has_unit = false;
    CHECK_OK(read_table(&model, text, 1.0, &has_unit, &fault));
    CHECK_INT(model.n_hops, 4 * SIDE * SIDE);
    sv_model_free(test_context(), &model);
    free(text);
}
