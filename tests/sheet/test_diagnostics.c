/* SPDX-License-Identifier: GPL-3.0-or-later */
/* How faults are printed. */
#include "sheet_testing.h"

enum { PRINTED = 8000 };

/* The text of all messages as printed. */
static void print_into(const sv_diagnostics *said, bool colour, char text[PRINTED])
{
    FILE *stream = fmemopen(text, PRINTED, "w");
    if (stream == NULL)
        abort();
    sv_diagnostics_print(said, colour, stream);
    fclose(stream);
}

static void check_printed(const char *sheet, const char *expected)
{
    reading r = read_text(sheet);
    char text[PRINTED];
    print_into(&r.said, false, text);
    CHECK_TEXT(text, expected);
    reading_free(&r);
}

SV_TEST(message_line_caret_and_hint)
{
    check_printed(MODEL "flake: {shape: disk, radius: 4}\n",
                  "sheet.yaml:3:16: error: unknown flake shape: disk\n"
                  "  flake: {shape: disk, radius: 4}\n"
                  "                 ^~~~\n"
                  "hint: did you mean disc?\n");
}

SV_TEST(caret_counts_characters_not_bytes)
{
    check_printed(MODEL "flake: {shape: rectangle, cells: [6, 4], \"größe\": 1}\n",
                  "sheet.yaml:3:42: error: unknown key größe in flake (rectangle)\n"
                  "  flake: {shape: rectangle, cells: [6, 4], \"größe\": 1}\n"
                  "                                           ^~~~~~~\n"
                  "hint: known: shape, boundary, keep, cells, size, orientation\n");
}

SV_TEST(user_text_cannot_drive_the_terminal)
{
    reading r = read_text(MODEL "flake: {shape: \"\\e[2J\\u202e\", cells: [6, 4]}\n");
    char text[PRINTED];
    print_into(&r.said, false, text);
    CHECK(strchr(text, '\033') == NULL);
    CHECK(strstr(text, "\xE2\x80\xAE") == NULL);
    CHECK(strstr(text, "unknown flake shape: \\x1b[2J\\u202e\n") != NULL);
    reading_free(&r);
}

SV_TEST(invalid_bytes_are_shown_escaped)
{
    sv_sheet_options options = reading_options(NULL, 0);
    reading r = read_named("bad\033name.yaml", "a: \xFF!\n", 6, &options);
    char text[PRINTED];
    print_into(&r.said, false, text);
    CHECK_TEXT(text, "bad\\x1bname.yaml:1:4: error: the text is not valid UTF-8\n"
                     "  a: \\xff!\n"
                     "     ^~~~\n"
                     "hint: save the file as UTF-8\n");
    reading_free(&r);
}

SV_TEST(long_lines_are_cut_around_the_place)
{
    char sheet[3000], *at = sheet;
    at += sprintf(at, MODEL "flake: {shape: rectangle, ");
    memset(at, ' ', 2000);
    at += 2000;
    sprintf(at, "cells: [0, 4]}\n");
    reading r = read_text(sheet);
    char text[PRINTED];
    print_into(&r.said, false, text);
    const char *line = strchr(text, '\n') + 1, *caret_line = strchr(line, '\n') + 1;
    const char *zero = strstr(line, "[0, 4]"), *caret = strchr(caret_line, '^');
    CHECK(strcspn(line, "\n") < 250);
    /* The ellipsis is three bytes and one column wide. */
    if (CHECK(zero != NULL && caret != NULL))
        CHECK_INT(zero + 1 - line - 2, caret - caret_line);
    reading_free(&r);
}

SV_TEST(colour_only_when_asked)
{
    reading r = read_text(MODEL);
    char plain[PRINTED], coloured[PRINTED];
    print_into(&r.said, false, plain);
    print_into(&r.said, true, coloured);
    CHECK(strchr(plain, '\033') == NULL);
    CHECK(strstr(coloured, "\033[1;31merror:\033[0m") != NULL);
    reading_free(&r);
}

SV_TEST(at_most_twenty_errors)
{
    char sheet[2000] = MODEL FLAKE;
    for (int i = 0; i < 30; i++)
        sprintf(sheet + strlen(sheet), "unknown_%d: 1\n", i);
    reading r = read_text(sheet);
    CHECK(r.status == SV_INVALID_INPUT);
    CHECK_INT(r.said.count, 21);
    CHECK_TEXT(r.said.items[20].message, "more than 20 errors; the rest is not shown");
    CHECK_INT(r.said.items[20].line, 0);
    reading_free(&r);
}

SV_TEST(messages_come_in_the_order_of_the_sheet)
{
    reading r = read_text("solve: {engine: x}\nselvedge: 1\nzz: 1\n"
                          "model: {name: qi_wu_zhang, m: x}\n" FLAKE);
    CHECK_INT(r.said.count, 3);
    for (sv_index i = 1; i < r.said.count; i++)
        CHECK(r.said.items[i - 1].line <= r.said.items[i].line);
    CHECK_TEXT(r.said.items[2].path, "model.m");
    reading_free(&r);
}

SV_TEST(a_missing_file_is_said)
{
    sv_diagnostics said = {0};
    sv_sheet *sheet = NULL;
    sv_sheet_options options = reading_options(NULL, 0);
    CHECK_STATUS(SV_INVALID_INPUT,
                 sv_sheet_read(test_context(), test_scratch("none.yaml"), &options, &said, &sheet));
    CHECK_INT(said.errors, 1);
    CHECK(said.count == 1 && strstr(said.items[0].message, "cannot open") != NULL);
    sv_diagnostics_free(test_context(), &said);
}

SV_TEST(keys_are_printed_from_the_tables)
{
    static char text[30000];
    FILE *stream = fmemopen(text, sizeof text, "w");
    if (!CHECK(stream != NULL))
        return;
    sv_sheet_print_keys(marker_kinds, 3, stream);
    fclose(stream);
    static const char *const parts[] = {
        "lattice_constant", "name: haldane",        "shape: disc",
        "kind: vacancies",  "local_chern:",         "standard_error",
        "default 50",       "one word: auto dense", "above 0 … 1",
    };
    for (size_t i = 0; i < sizeof parts / sizeof parts[0]; i++)
        test_check(strstr(text, parts[i]) != NULL, __FILE__, __LINE__, "no %s", parts[i]);
}
