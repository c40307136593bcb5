/* SPDX-License-Identifier: GPL-3.0-or-later */
#include <stdlib.h>

#include "selvedge/present.h"
#include "testing.h"

/* Everything shown while 1000 steps are done, from `first` on. */
static char *show_all(bool terminal, sv_index first)
{
    char *text = NULL;
    size_t size = 0;
    FILE *stream = open_memstream(&text, &size);
    sv_progress_bar bar;
    sv_progress_bar_init(&bar, stream, terminal);
    for (sv_index done = first; done <= 1000; done++)
        sv_progress_bar_show("realisations", done, 1000, &bar);
    sv_progress_bar_end(&bar);
    fclose(stream);
    return text;
}

static int count(const char *text, char sign)
{
    int n = 0;
    for (; *text != '\0'; text++)
        n += *text == sign;
    return n;
}

SV_TEST(lines_are_sparse_and_plain)
{
    char *text = show_all(false, 0);
    CHECK_INT(count(text, '\n'), 11);
    CHECK(strstr(text, "realisations: 0 of 1000 (0 %)") != NULL);
    CHECK(strstr(text, "realisations: 1000 of 1000 (100 %)") != NULL);
    CHECK(strchr(text, '\r') == NULL && strchr(text, '\033') == NULL);
    free(text);
    text = show_all(false, 995);
    CHECK_INT(count(text, '\n'), 2);
    free(text);
}

SV_TEST(the_bar_stays_on_one_line_and_goes_away)
{
    char *text = show_all(true, 0);
    CHECK_INT(count(text, '\n'), 0);
    CHECK(strstr(text, "1000/1000 100 %") != NULL);
    CHECK(strstr(text, "[........................]") != NULL);
    CHECK(strstr(text, "[########################]") != NULL);
    CHECK(count(text, '\r') < 20); /* not once per step */
    CHECK(strcmp(text + strlen(text) - 4, "\r\033[K") == 0);
    free(text);
}

SV_TEST(nonsense_is_ignored)
{
    char *text = NULL;
    size_t size = 0;
    FILE *stream = open_memstream(&text, &size);
    sv_progress_bar bar;
    sv_progress_bar_init(&bar, stream, true);
    sv_progress_bar_show("x", 0, 0, &bar);
    sv_progress_bar_show("x", 5, 3, &bar);
    sv_progress_bar_show("x", -1, 3, &bar);
    sv_progress_bar_end(&bar);
    fclose(stream);
    CHECK_TEXT(text, "");
    free(text);
}
