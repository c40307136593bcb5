/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Building JSON documents: failures stick, numbers that do not exist are null. */
#include <math.h>
#include <stdlib.h>
#include <string.h>

#include "present_internal.h"

void sv_json_put(sv_json *json, json_t *object, const char *key, json_t *value)
{
    /* Takes the value even when it fails. */
    if (json_object_set_new(object, key, value) != 0)
        json->failed = true;
}

void sv_json_push(sv_json *json, json_t *array, json_t *value)
{
    if (json_array_append_new(array, value) != 0)
        json->failed = true;
}

json_t *sv_json_real(double value)
{
    return isfinite(value) ? json_real(value + 0.0) : json_null();
}

json_t *sv_json_pair(sv_json *json, const double pair[2])
{
    json_t *array = json_array();
    sv_json_push(json, array, sv_json_real(pair[0]));
    sv_json_push(json, array, sv_json_real(pair[1]));
    return array;
}

void sv_json_put_range(sv_json *json, json_t *object, const char *key, const double pair[2])
{
    sv_json_put(json, object, key,
                isfinite(pair[0]) && isfinite(pair[1]) ? sv_json_pair(json, pair) : json_null());
}

void sv_json_put_real(sv_json *json, json_t *object, const char *key, double value)
{
    sv_json_put(json, object, key, sv_json_real(value));
}

void sv_json_put_integer(sv_json *json, json_t *object, const char *key, int64_t value)
{
    sv_json_put(json, object, key, json_integer((json_int_t)value));
}

void sv_json_put_text(sv_json *json, json_t *object, const char *key, const char *value)
{
    char *repaired = NULL;
    if (sv_words_repair(json->context, value, &repaired) != SV_OK) {
        json->failed = true;
        return;
    }
    sv_json_put(json, object, key, json_string(repaired));
    sv_give(json->context, repaired);
}

/* Within a text: escapes stay, characters that would act on a terminal become escapes. */
static const char *copy_character(sv_draft *text, const char *dump)
{
    const char *rest = dump;
    const uint32_t code = sv_words_next(&rest);
    if (code == '\\' && *rest != '\0')
        rest++;
    else if (sv_words_is_control(code)) {
        sv_draft_add(text, "\\u%04x", (unsigned)code);
        return rest;
    }
    sv_draft_add_bytes(text, dump, (size_t)(rest - dump));
    return rest;
}

/* Jansson writes 17 digits; the shortest text of the same number is kinder to the eye. A number is
 * told from text by the quotes around texts. */
static void tidy(sv_draft *text, const char *dump)
{
    bool quoted = false;
    while (*dump != '\0') {
        size_t length = strspn(dump, "+-.0123456789eE");
        if (!quoted && length >= 18 && (*dump == '-' || (*dump >= '0' && *dump <= '9'))) {
            char word[40], shorter[40];
            double value = 0.0;
            snprintf(word, sizeof word, "%.*s", (int)(length < 39 ? length : 39), dump);
            bool real = strpbrk(word, ".eE") != NULL;
            if (real && length < 39 && sv_parse_real(word, &value) == SV_PARSE_OK) {
                sv_format_real(value, shorter, sizeof shorter);
                /* Whole numbers stay reals. */
                bool whole = strpbrk(shorter, ".eE") == NULL;
                sv_draft_add(text, "%s%s", shorter, whole ? ".0" : "");
                dump += length;
                continue;
            }
        }
        if (quoted && *dump != '"') {
            dump = copy_character(text, dump);
            continue;
        }
        quoted ^= *dump == '"';
        sv_draft_add_bytes(text, dump, 1);
        dump++;
    }
}

sv_status sv_json_finish(sv_json *json, json_t *document, char **ret_text)
{
    char *dump = NULL;
    sv_draft text = {.context = json->context};
    if (!json->failed && document != NULL)
        dump = json_dumps(document, JSON_INDENT(2) | JSON_REAL_PRECISION(17));
    json_decref(document);
    if (dump == NULL)
        return SV_FAIL(json->context, SV_NO_MEMORY, "no memory for a JSON document");
    tidy(&text, dump);
    sv_draft_add_bytes(&text, "\n", 1);
    free(dump);
    return sv_draft_finish(&text, ret_text);
}
