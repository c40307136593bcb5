/* SPDX-License-Identifier: GPL-3.0-or-later */
/* "did you mean …?": the known name nearest to a word. */
#include "sheet_internal.h"

#include <stdio.h>
#include <string.h>
#include <strings.h>

enum { NEAR = 2, LONGEST_WORD = SV_PATH_SIZE };

sv_suggestion sv_suggest_start(const char *word)
{
    return (sv_suggestion){.word = word, .distance = NEAR + 1};
}

/* Short words need to be nearer: `m` is not a misspelt `t1`. */
static bool is_near(const char *word, const char *name, int distance)
{
    size_t length = strlen(word);
    if (length <= 2)
        return distance == 0 || (distance == 1 && word[0] == name[0]);
    return distance <= (length <= 4 ? 1 : NEAR);
}

static void keep(sv_suggestion *suggestion, const char *name, int distance, bool by_prefix)
{
    snprintf(suggestion->best, sizeof suggestion->best, "%s", name);
    suggestion->distance = distance;
    suggestion->by_prefix = by_prefix;
}

void sv_suggest_name(sv_suggestion *suggestion, const char *name)
{
    const char *word = suggestion->word;
    size_t used = strlen(suggestion->all), length = strlen(word);
    snprintf(suggestion->all + used, sizeof suggestion->all - used, "%s%s", used ? ", " : "", name);
    if (length == 0 || length > LONGEST_WORD)
        return;
    int distance = strcasecmp(word, name) == 0 ? 0 : sv_edit_distance(word, name);
    if (is_near(word, name, distance) && distance < suggestion->distance)
        keep(suggestion, name, distance, false);
    size_t shared = strlen(name) < length ? strlen(name) : length;
    bool is_prefix = shared >= 3 && strncasecmp(word, name, shared) == 0;
    if (is_prefix && suggestion->best[0] == '\0')
        keep(suggestion, name, NEAR, true);
}

/* Calls sv_suggest_name() for each of the space-separated words. */
void sv_suggest_words(sv_suggestion *suggestion, const char *words)
{
    while (*words != '\0') {
        size_t length = strcspn(words, " ");
        char word[SV_PATH_SIZE];
        snprintf(word, sizeof word, "%.*s", (int)length, words);
        sv_suggest_name(suggestion, word);
        words += length + strspn(words + length, " ");
    }
}

void sv_suggest_hint(const sv_suggestion *suggestion, char *hint, size_t size)
{
    const char *best = suggestion->best;
    if (best[0] == '\0' && suggestion->all[0] == '\0')
        snprintf(hint, size, "there are none");
    else if (best[0] == '\0')
        snprintf(hint, size, "known: %s", suggestion->all);
    else if (strcasecmp(best, suggestion->word) == 0)
        snprintf(hint, size, "did you mean %s? Upper and lower case matter", best);
    else
        snprintf(hint, size, "did you mean %s?", best);
}

bool sv_words_hold(const char *words, const char *word)
{
    size_t length = strlen(word);
    for (const char *at = words; length > 0 && (at = strstr(at, word)) != NULL; at += length) {
        bool starts = at == words || at[-1] == ' ';
        if (starts && (at[length] == ' ' || at[length] == '\0'))
            return true;
    }
    return false;
}
