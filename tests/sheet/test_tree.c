/* SPDX-License-Identifier: GPL-3.0-or-later */
/* YAML that is hostile, broken or merely unusual. */
#include "sheet_testing.h"

#include <time.h>

static double seconds(void)
{
    struct timespec now;
    clock_gettime(CLOCK_MONOTONIC, &now);
    return (double)now.tv_sec + 1e-9 * (double)now.tv_nsec;
}

static reading read_bytes(const char *text, size_t size)
{
    sv_sheet_options options = reading_options(NULL, 0);
    return read_named("sheet.yaml", text, size, &options);
}

/* head + n times part + tail */
static char *repeat(const char *head, const char *part, int n, const char *tail)
{
    size_t length = strlen(part);
    char *text = malloc(strlen(head) + (size_t)n * length + strlen(tail) + 1);
    if (text == NULL)
        abort();
    strcpy(text, head);
    char *at = text + strlen(head);
    for (int i = 0; i < n; i++, at += length)
        memcpy(at, part, length);
    strcpy(at, tail);
    return text;
}

static void check_hostile(const char *head, const char *part, int n, const char *tail,
                          const char *message)
{
    char *text = repeat(head, part, n, tail);
    double start = seconds();
    reading r = read_text(text);
    double took = seconds() - start;
    CHECK(r.status == SV_INVALID_INPUT);
    bool found = r.said.count > 0 && strstr(r.said.items[0].message, message) != NULL;
    test_check(found, __FILE__, __LINE__, "expected: %s", message);
    if (!found)
        show_said(&r.said);
    test_check(took < 1.0, __FILE__, __LINE__, "%s took %.3f s", message, took);
    reading_free(&r);
    free(text);
}

SV_TEST(deep_nesting_is_refused_at_once)
{
    check_hostile("a: ", "[", 200000, "", "nest deeper than 64");
    check_hostile("a: ", "{b: ", 200000, "", "nest deeper than 64");
    check_hostile("", "- ", 200000, "", "nest deeper than 64");
    check_hostile("", "? ", 200000, "", "a key must be a plain word");
}

SV_TEST(nesting_of_64_is_read)
{
    /* The root mapping and 63 lists: well formed, so the fault is the unknown key. */
    char *text = repeat("selvedge: 1\nzz: ", "[", 63, "");
    char *whole = repeat(text, "]", 63, "\n");
    reading r = read_text(whole);
    is_refused(&r, 2, 1, "unknown key zz");
    reading_free(&r);
    free(text);
    free(whole);
}

SV_TEST(large_inputs_are_refused_at_once)
{
    check_hostile("a: [", "1, ", 100000, "]", "more than 100000 values");
    check_hostile("a: ", "x", 70000, "\n", "longer than 65536 bytes");
    check_hostile("", "%TAG !a! x\n", 100000, "---\n", "a sheet uses no tags");
    check_hostile("a: [", "&b 1, ", 2000, "]", "more than 1000 anchors");
    check_hostile("", "# comment \n", 400000, "", "larger than 4 MiB");
}

SV_TEST(aliases_may_not_multiply)
{
    /* Ten lists of ten aliases each to the one before: 10^9 values when written out. */
    char text[1000] = "a0: &a0 [1, 1, 1, 1, 1, 1, 1, 1, 1, 1]\n";
    for (int i = 1; i < 9; i++) {
        size_t used = strlen(text);
        snprintf(text + used, sizeof text - used, "a%d: &a%d [*a%d", i, i, i - 1);
        for (int k = 1; k < 10; k++)
            snprintf(text + strlen(text), sizeof text - strlen(text), ", *a%d", i - 1);
        strcat(text, "]\n");
    }
    check_hostile(text, "", 0, "", "aliases multiply this to more than 1000000 values");
}

SV_TEST(many_twins_are_found_quickly)
{
    static char text[1500000];
    size_t used = 0;
    for (int i = 0; i < 49000; i++)
        used += (size_t)snprintf(text + used, sizeof text - used, "k%06d: 1\n", i);
    snprintf(text + used, sizeof text - used, "k000000: 2\n");
    double start = seconds();
    reading r = read_text(text);
    is_refused(&r, 49001, 1, "the key k000000 is given twice");
    const sv_diagnostic *item = &r.said.items[0];
    CHECK(item->hint != NULL && strstr(item->hint, "line 1, column 1") != NULL);
    CHECK(seconds() - start < 2.0);
    reading_free(&r);
}

SV_TEST(bad_bytes_have_a_place)
{
    static const struct {
        const char *bytes;
        size_t size;
        int line, column;
        const char *message;
    } cases[] = {
        {"selvedge: 1\ntitle: \xC3\xA4\xFF\n", 22, 2, 9, "the text is not valid UTF-8"},
        {"a: \xC0\xAF\n", 6, 1, 4, "the text is not valid UTF-8"},
        {"a: \xED\xA0\x80\n", 7, 1, 4, "the text is not valid UTF-8"},
        {"a: \xF4\x90\x80\x80\n", 8, 1, 4, "the text is not valid UTF-8"},
        {"a: \xE2\x82", 5, 1, 4, "the text is not valid UTF-8"},
        {"a: b\r\nc: \0d\n", 12, 2, 4, "the text holds a NUL byte"},
        {"a: b\rc: \x1b[2J\n", 14, 2, 4, "the text holds a control character"},
        {"a: \xE2\x80\xA8\n", 7, 1, 4, "the text holds an unusual line separator"},
        {"a: \xC2\x85\n", 6, 1, 4, "the text holds an unusual line separator"},
        {"\xFF\xFE"
         "a\0",
         4, 1, 1, "the text is not valid UTF-8"},
    };
    for (size_t i = 0; i < sizeof cases / sizeof cases[0]; i++) {
        reading r = read_bytes(cases[i].bytes, cases[i].size);
        if (!is_refused(&r, cases[i].line, cases[i].column, cases[i].message))
            printf("# case %zu\n", i);
        reading_free(&r);
    }
}

SV_TEST(a_byte_order_mark_is_skipped)
{
    reading r = read_text("\xEF\xBB\xBF" MODEL FLAKE);
    is_read(&r);
    reading_free(&r);
    r = read_text("\xEF\xBB\xBF"
                  "selvedge: 2\n"
                  "model: {name: qi_wu_zhang, m: -1}\n" FLAKE);
    is_refused(&r, 1, 11, "selvedge must be 1");
    reading_free(&r);
}

SV_TEST(line_ends_of_all_systems)
{
    reading r = read_text("selvedge: 1\r\nmodel: {name: qi_wu_zhang, m: x}\r\n" FLAKE);
    is_refused(&r, 2, 31, "model.m: expected an energy, got x");
    CHECK_TEXT(r.said.items[0].text, "model: {name: qi_wu_zhang, m: x}");
    reading_free(&r);
    r = read_text("selvedge: 1\rmodel: {name: qi_wu_zhang, m: x}\r" FLAKE);
    is_refused(&r, 2, 31, "model.m: expected an energy, got x");
    reading_free(&r);
}

SV_TEST(columns_count_characters)
{
    reading r =
        read_text("selvedge: 1\ntitle: \"ÄÖÜ\"\nmodel: {name: qi_wu_zhang, \"m\": ä}\n" FLAKE);
    is_refused(&r, 3, 33, "model.m: expected an energy");
    CHECK_INT(r.said.items[0].length, 1);
    reading_free(&r);
}

SV_TEST(aliases_are_shared_values)
{
    reading r = read_text(MODEL "flake: {shape: rectangle, cells: &n [6, 4]}\n"
                                "disorder:\n"
                                "  - &v {name: one, kind: vacancies, share: &s 0.25}\n"
                                "  - {name: two, kind: vacancies, share: *s}\n");
    if (is_read(&r)) {
        CHECK_INT(r.setup.n_disorder, 2);
        CHECK_CLOSE(r.setup.disorder[1].share, 0.25, 0.0);
    }
    reading_free(&r);
}

SV_TEST(words_of_yaml_1_1_stay_text)
{
    static const char *const words[] = {"no",  "on",   "off",  "yes",  "null",      "~",
                                        "1e3", "0123", "1:30", "0x1f", "2026-01-01"};
    for (size_t i = 0; i < sizeof words / sizeof words[0]; i++) {
        char text[300];
        snprintf(text, sizeof text, MODEL FLAKE "title: %s\nmarkers: {probe: {label: %s}}\n",
                 words[i], words[i]);
        reading r = read_text(text);
        if (is_read(&r)) {
            CHECK(strcmp(r.setup.title, words[i]) == 0);
            CHECK(strcmp(r.setup.markers[0].values[4].text, words[i]) == 0);
        }
        reading_free(&r);
    }
}

SV_TEST(flags_are_true_or_false_only)
{
    static const char *const wrong[] = {"yes", "on", "1", "True", "null", "[true]"};
    reading r = read_text(MODEL FLAKE "markers: {probe: {fine: true}}\n");
    if (is_read(&r))
        CHECK_INT(r.setup.markers[0].values[3].integer[0], 1);
    reading_free(&r);
    for (size_t i = 0; i < sizeof wrong / sizeof wrong[0]; i++) {
        char text[300];
        snprintf(text, sizeof text, MODEL FLAKE "markers: {probe: {fine: %s}}\n", wrong[i]);
        r = read_text(text);
        is_refused(&r, 4, 25, "markers.probe.fine: expected true or false");
        reading_free(&r);
    }
}
