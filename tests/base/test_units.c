/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "testing.h"

static double parsed(const char *text, sv_dimension dimension)
{
    sv_quantity q = {0};
    CHECK(sv_parse_quantity(text, dimension, &q) == SV_PARSE_OK);
    return q.value;
}

SV_TEST(units_convert)
{
    CHECK_CLOSE(parsed("0.3 eV", SV_DIM_ENERGY), 0.3, 1e-16);
    CHECK_CLOSE(parsed("14 meV", SV_DIM_ENERGY), 0.014, 1e-17);
    CHECK_CLOSE(parsed("4.3 Å", SV_DIM_LENGTH), 0.43, 1e-16);
    CHECK_CLOSE(parsed("0.43nm", SV_DIM_LENGTH), 0.43, 1e-16);
    CHECK_CLOSE(parsed("3e12 cm^-2", SV_DIM_DENSITY), 0.03, 1e-17);
    CHECK(parsed("90 deg", SV_DIM_ANGLE) == M_PI / 2);
    CHECK(parsed("0.5 pi", SV_DIM_ANGLE) == M_PI / 2);
    CHECK(parsed("-pi", SV_DIM_ANGLE) == -M_PI);
    CHECK_CLOSE(parsed("2 %", SV_DIM_NONE), 0.02, 1e-17);
    CHECK_CLOSE(parsed("4 K", SV_DIM_TEMPERATURE), 4.0, 0.0);
    /* SI brochure, 9th edition: e = 1.602176634e-19 C exactly. */
    CHECK_CLOSE(parsed("1.602176634e-19 J", SV_DIM_ENERGY), 1.0, 1e-15);
}

SV_TEST(faulty_numbers_are_told_apart)
{
    sv_quantity q;
    CHECK(sv_parse_quantity("abc", SV_DIM_ENERGY, &q) == SV_PARSE_NOT_A_NUMBER);
    CHECK(sv_parse_quantity("", SV_DIM_ENERGY, &q) == SV_PARSE_NOT_A_NUMBER);
    CHECK(sv_parse_quantity("0x10", SV_DIM_ENERGY, &q) == SV_PARSE_NOT_A_NUMBER);
    CHECK(sv_parse_quantity("nan", SV_DIM_ENERGY, &q) == SV_PARSE_NOT_A_NUMBER);
    CHECK(sv_parse_quantity("inf", SV_DIM_ENERGY, &q) == SV_PARSE_NOT_A_NUMBER);
    CHECK(sv_parse_quantity("1e999", SV_DIM_ENERGY, &q) == SV_PARSE_OUT_OF_RANGE);
    CHECK(sv_parse_quantity("3 furlongs", SV_DIM_LENGTH, &q) == SV_PARSE_UNKNOWN_UNIT);
    CHECK(sv_parse_quantity("3 nm", SV_DIM_ENERGY, &q) == SV_PARSE_WRONG_DIMENSION);
    CHECK(q.unit->dimension == SV_DIM_LENGTH);
    int64_t i;
    CHECK(sv_parse_integer("4.7", &i) == SV_PARSE_NOT_A_NUMBER);
    CHECK(sv_parse_integer("99999999999999999999", &i) == SV_PARSE_OUT_OF_RANGE);
    CHECK(sv_parse_integer("-12", &i) == SV_PARSE_OK && i == -12);
    double x;
    CHECK(sv_parse_real("1e-3", &x) == SV_PARSE_OK && x == 1e-3);
    CHECK(sv_parse_real("1 2", &x) == SV_PARSE_NOT_A_NUMBER);
}

SV_TEST(every_unit_reads_back_through_the_table)
{
    size_t count;
    const sv_unit *table = sv_unit_table(&count);
    for (size_t k = 0; k < count; k++) {
        char text[64];
        sv_quantity q;
        snprintf(text, sizeof text, "2.5 %s", table[k].symbol);
        CHECK(sv_parse_quantity(text, table[k].dimension, &q) == SV_PARSE_OK);
        CHECK_CLOSE(q.value / (2.5 * table[k].factor), 1.0, 1e-15);
        CHECK(sv_unit_find(table[k].symbol) == &table[k]);
        sv_unit_list(table[k].dimension, text, sizeof text);
        CHECK(strlen(text) > 0 && strlen(sv_dimension_name(table[k].dimension)) > 0);
    }
}

SV_TEST(reals_format_shortest_and_exact)
{
    const double values[] = {0.1, 1.0 / 3.0, 1e-300, -2.5, 0.0, 123456789.0, 5e-324, 0.02};
    for (size_t k = 0; k < sizeof values / sizeof values[0]; k++) {
        char text[32];
        double back = NAN;
        sv_format_real(values[k], text, sizeof text);
        CHECK(sv_parse_real(text, &back) == SV_PARSE_OK || values[k] == 5e-324);
        CHECK(back == values[k] || values[k] == 5e-324);
    }
    char text[32];
    sv_format_real(0.1, text, sizeof text);
    CHECK_TEXT(text, "0.1");
    sv_format_real(10.0, text, sizeof text);
    CHECK_TEXT(text, "10");
    sv_format_real(1500000.0, text, sizeof text);
    CHECK_TEXT(text, "1500000");
    sv_format_real(1e15, text, sizeof text);
    CHECK_TEXT(text, "1e+15");
    sv_format_real(5e12, text, sizeof text);
    CHECK_TEXT(text, "5e+12");
    sv_format_real(-NAN, text, sizeof text);
    CHECK_TEXT(text, "nan");
}

SV_TEST(edit_distance_counts_steps)
{
    CHECK_INT(sv_edit_distance("share", "share"), 0);
    CHECK_INT(sv_edit_distance("shaer", "share"), 1);
    CHECK_INT(sv_edit_distance("shar", "share"), 1);
    CHECK_INT(sv_edit_distance("widht", "width"), 1);
    CHECK_INT(sv_edit_distance("", "abc"), 3);
    CHECK_INT(sv_edit_distance("kitten", "sitting"), 3);
}
