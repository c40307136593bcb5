/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Tables from files that are not trusted: rows, units, and a place for every fault. */
#include "selvedge/base.h"
#include "testing.h"

static const sv_table_column columns[] = {
    {"name", SV_DIM_NONE, true}, {"n", SV_DIM_NONE, false}, {"energy", SV_DIM_ENERGY, true}};

static sv_status begin(const char *text, sv_table *table)
{
    return sv_table_begin(test_context(), text, strlen(text), columns, 3, "name,energy", table);
}

SV_TEST(rows_with_units)
{
    sv_table table;
    bool more = false, has_unit = false;
    double value = 0.0;
    int64_t number = 0;
    CHECK_OK(begin("\xEF\xBB\xBF# comment\n\nother,energy [meV], n ,name\r\n"
                   "x, 12 ,-3,\"a b\"\r\n#\n  y,2 eV,7,c",
                   &table));
    CHECK_OK(sv_table_next(test_context(), &table, &more));
    CHECK(more);
    CHECK(strcmp(sv_table_text(&table, 0), "a b") == 0);
    CHECK_OK(sv_table_real(test_context(), &table, 2, &value, &has_unit));
    CHECK_CLOSE(value, 0.012, 1e-15);
    CHECK(has_unit);
    CHECK_OK(sv_table_integer(test_context(), &table, 1, &number));
    CHECK_INT(number, -3);
    CHECK_OK(sv_table_next(test_context(), &table, &more));
    CHECK(more);
    CHECK_INT(table.line, 6);
    CHECK_OK(sv_table_real(test_context(), &table, 2, &value, &has_unit));
    CHECK_CLOSE(value, 2.0, 0.0);
    CHECK_OK(sv_table_next(test_context(), &table, &more));
    CHECK(!more);
}

SV_TEST(columns_may_be_absent)
{
    sv_table table;
    bool more = false, has_unit = true;
    double value = 0.0;
    CHECK_OK(begin("energy,name\n0.5,x\n", &table));
    CHECK_OK(sv_table_next(test_context(), &table, &more));
    CHECK(strcmp(sv_table_text(&table, 1), "") == 0);
    CHECK_OK(sv_table_real(test_context(), &table, 2, &value, &has_unit));
    CHECK(!has_unit);
    CHECK_STATUS(SV_INVALID_INPUT, sv_table_fail(test_context(), &table, 2, "hint", "own %d", 7));
    CHECK(strcmp(table.fault.message, "own 7") == 0);
    CHECK(strcmp(table.fault.hint, "hint") == 0);
    CHECK(strcmp(table.fault.text, "0.5,x") == 0);
    CHECK_INT(table.fault.line, 2);
    CHECK_INT(table.fault.column, 1);
}

/* The text, the place of its fault, and a part of the message. */
static void check_fault(const char *text, size_t size, int line, int column, const char *message)
{
    sv_table table;
    bool more = true, has_unit;
    double value;
    int64_t number;
    sv_status status =
        sv_table_begin(test_context(), text, size, columns, 3, "name,energy", &table);
    while (status == SV_OK && more) {
        status = sv_table_next(test_context(), &table, &more);
        if (status == SV_OK && more)
            status = sv_table_real(test_context(), &table, 2, &value, &has_unit);
        if (status == SV_OK && more && table.place[1] >= 0)
            status = sv_table_integer(test_context(), &table, 1, &number);
    }
    CHECK_STATUS(SV_INVALID_INPUT, status);
    CHECK_INT(table.fault.line, line);
    CHECK_INT(table.fault.column, column);
    CHECK(strstr(table.fault.message, message) != NULL);
}

#define CHECK_FAULT(text, line, column, message)                                                   \
    check_fault(text, sizeof(text) - 1, line, column, message)

SV_TEST(faults_have_places)
{
    char wide[400] = "name,energy\n", many[300] = "";
    memset(wide + 12, 'x', 300);
    for (int k = 0; k < 140; k += 2)
        memcpy(many + k, "a,", 3);
    CHECK_FAULT("", 0, 1, "no rows");
    CHECK_FAULT("# only\n\n", 2, 1, "no rows");
    CHECK_FAULT("name,energy\na,1\0\n", 0, 1, "not a text table");
    CHECK_FAULT("name\na\n", 1, 1, "column \"energy\" is missing");
    CHECK_FAULT("name,energy,energy\n", 1, 13, "stands twice");
    CHECK_FAULT("name,energy [nm]\n", 1, 6, "\"nm\" is not a unit of an energy");
    CHECK_FAULT("name,energy [x]\n", 1, 6, "\"x\" is not a unit of an energy");
    CHECK_FAULT("name,energy\na,1,2\n", 2, 1, "3 columns, the first row has 2");
    CHECK_FAULT("name,energy\na, nan\n", 2, 4, "\"nan\" is not an energy");
    CHECK_FAULT("name,energy\na,\n", 2, 3, "a value of \"energy\" is missing");
    CHECK_FAULT("name,energy\na,1\nb,1 nm\n", 3, 3, "\"1 nm\" is not an energy");
    CHECK_FAULT("name,energy,n\na,1,1.5\n", 2, 5, "\"1.5\" is not a whole number");
    check_fault(wide, strlen(wide), 2, 1, "a field is too long");
    check_fault(many, strlen(many), 1, 129, "too many columns");
}
