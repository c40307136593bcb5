/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Texts fit to be shown. */
#include "selvedge/present.h"
#include "testing.h"

static void check_clean(const char *text, const char *expected, size_t size)
{
    char clean[64];
    memset(clean, '#', sizeof clean);
    sv_text_clean(text, clean, size);
    test_check(strcmp(clean, expected) == 0, __FILE__, __LINE__, "became \"%s\", expected \"%s\"",
               clean, expected);
    CHECK(clean[size] == '#' || size == sizeof clean);
}

SV_TEST(plain_text_stays)
{
    check_clean("", "", 8);
    check_clean("W = 1.5 (box)", "W = 1.5 (box)", 63);
    check_clean("cm\xC2\xB2 \xE2\x88\x92 \xF0\x9F\x98\x80",
                "cm\xC2\xB2 \xE2\x88\x92 \xF0\x9F\x98\x80", 63);
}

SV_TEST(what_would_act_on_a_terminal_is_written_out)
{
    check_clean("a\nb\tc\r", "a\\nb\\tc\\r", 63);
    check_clean("\x1b[31m\x7f", "\\x1b[31m\\x7f", 63);
    check_clean("\xC2\x9B"
                "31m",
                "\\x9b31m", 63); /* U+009B introduces commands, too */
    check_clean("\xE2\x80\xAE"
                "abc",
                "\\u202eabc", 63); /* right to left from here */
    check_clean("\xE2\x80\xA8\xEF\xBB\xBF", "\\u2028\\ufeff", 63);
}

SV_TEST(bytes_that_are_no_text_are_replaced)
{
    check_clean("a\xFF"
                "b",
                "a\xEF\xBF\xBD"
                "b",
                63);
    check_clean("\xC3", "\xEF\xBF\xBD", 63);                 /* cut off */
    check_clean("\xC0\xAF", "\xEF\xBF\xBD\xEF\xBF\xBD", 63); /* an overlong slash */
}

SV_TEST(a_long_text_is_cut_between_characters)
{
    check_clean("abcdef", "abc", 4);
    check_clean("ab\xC2\xB2", "ab", 4);
    check_clean("ab\x1b", "ab", 5);
}
