/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Sites from XYZ text, plain or extended. */
#include "structure_internal.h"

#include <math.h>
#include <stdarg.h>
#include <stdio.h>
#include <string.h>

enum { LONGEST_WORD = 100, LEAST_LINE = 8, MOST_COLUMNS = 1000 };
static const sv_index MOST_SITES = 20000000;
static const double FARTHEST = 1e7; /* lattice constants */

sv_status sv_structure_fail(sv_context *context, sv_table_fault *fault, int line, int column,
                            const char *hint, const char *format, ...)
{
    va_list args;
    *fault = (sv_table_fault){.line = line, .column = column};
    va_start(args, format);
    vsnprintf(fault->message, sizeof fault->message, format, args);
    va_end(args);
    snprintf(fault->hint, sizeof fault->hint, "%s", hint != NULL ? hint : "");
    return SV_FAIL(context, SV_INVALID_INPUT, "line %d, column %d: %s", line, column,
                   fault->message);
}

typedef struct reader {
    const char *at, *end; /* of the text not read yet */
    const char *line, *stop;
    int number;
    int species, position, columns; /* first columns from 0; columns 0: any number from 4 on */
    sv_table_fault *fault;
} reader;

static bool next_line(reader *r)
{
    if (r->at >= r->end)
        return false;
    const char *stop = memchr(r->at, '\n', (size_t)(r->end - r->at));
    r->line = r->at;
    r->stop = stop != NULL ? stop : r->end;
    r->at = stop != NULL ? stop + 1 : r->end;
    if (r->stop > r->line && r->stop[-1] == '\r')
        r->stop--;
    r->number++;
    return true;
}

static bool is_blank(char c)
{
    return c == ' ' || c == '\t';
}

/* The next word of the line; false at its end. A word too long is cut: it is no good anyway. */
static bool next_word(const reader *r, const char **at, char word[LONGEST_WORD], int *ret_column)
{
    while (*at < r->stop && is_blank(**at))
        (*at)++;
    if (*at == r->stop)
        return false;
    const char *start = *at;
    while (*at < r->stop && !is_blank(**at))
        (*at)++;
    snprintf(word, LONGEST_WORD, "%.*s", (int)(*at - start < 99 ? *at - start : 99), start);
    *ret_column = (int)(start - r->line) + 1;
    return true;
}

static sv_status read_count(sv_context *context, reader *r, sv_index *ret_n)
{
    const char *hint = "an XYZ file begins with the number of its sites, alone in its line";
    char word[LONGEST_WORD] = "", more[LONGEST_WORD];
    int column = 1;
    int64_t n = 0;
    if (!next_line(r))
        return sv_structure_fail(context, r->fault, 1, 1, hint, "the file is empty");
    const char *at = r->line;
    bool there = next_word(r, &at, word, &column);
    if (!there || sv_parse_integer(word, &n) != SV_PARSE_OK || n < 1)
        return sv_structure_fail(context, r->fault, 1, column, hint,
                                 "\"%.60s\" is not a number of sites", word);
    if (next_word(r, &at, more, &column))
        return sv_structure_fail(context, r->fault, 1, column, hint,
                                 "\"%.60s\" follows the number of sites", more);
    if (n > MOST_SITES)
        return sv_structure_fail(context, r->fault, 1, 1, NULL,
                                 "%lld sites are above the limit of %lld", (long long)n,
                                 (long long)MOST_SITES);
    /* Before anything is taken for them: a line has eight characters at least. */
    if (n > (r->end - r->at) / LEAST_LINE + 1)
        return sv_structure_fail(context, r->fault, 1, 1, "is the file complete?",
                                 "%lld sites do not fit into the %lld bytes that follow",
                                 (long long)n, (long long)(r->end - r->at));
    *ret_n = n;
    return SV_OK;
}

/* Value of a key of the comment, quotes and brackets as the format has them; NULL: not there. */
static const char *find_value(const reader *r, const char *key, const char **ret_end)
{
    const char *at = r->line;
    while (at < r->stop) {
        while (at < r->stop && is_blank(*at))
            at++;
        const char *name = at;
        while (at < r->stop && *at != '=' && !is_blank(*at))
            at++;
        size_t length = (size_t)(at - name);
        bool found = length == strlen(key) && strncmp(name, key, length) == 0;
        if (at == r->stop || *at != '=')
            continue;
        at++;
        char quote = at < r->stop && (*at == '"' || *at == '\'') ? *at : '\0';
        const char *value = quote != '\0' ? ++at : at;
        if (quote != '\0') {
            while (at < r->stop && *at != quote)
                at++;
        } else {
            int depth = 0;
            while (at < r->stop && (depth > 0 || !is_blank(*at))) {
                depth += (*at == '[' || *at == '{') - (*at == ']' || *at == '}');
                at++;
            }
        }
        if (found) {
            *ret_end = at;
            return value;
        }
        at += quote != '\0' && at < r->stop;
    }
    return NULL;
}

/* Up to the next colon. */
static bool next_part(const char **at, const char *end, char part[LONGEST_WORD])
{
    if (*at > end)
        return false;
    const char *start = *at;
    while (*at < end && **at != ':')
        (*at)++;
    snprintf(part, LONGEST_WORD, "%.*s", (int)(*at - start < 99 ? *at - start : 99), start);
    (*at)++;
    return true;
}

static sv_status read_properties(sv_context *context, reader *r, const char *at, const char *end)
{
    const char *hint = "as in Properties=species:S:1:pos:R:3";
    char name[LONGEST_WORD], type[LONGEST_WORD], many[LONGEST_WORD];
    r->species = r->position = -1;
    while (at < end) {
        int column = (int)(at - r->line) + 1;
        int64_t m = 0;
        if (!next_part(&at, end, name) || !next_part(&at, end, type) ||
            !next_part(&at, end, many) || name[0] == '\0' || strlen(type) != 1 ||
            strchr("SIRL", type[0]) == NULL || sv_parse_integer(many, &m) != SV_PARSE_OK || m < 1 ||
            m > MOST_COLUMNS || r->columns + m > MOST_COLUMNS)
            return sv_structure_fail(context, r->fault, 2, column, hint,
                                     "Properties wants triples name:type:columns, the type S, I, R "
                                     "or L");
        bool species = strcmp(name, "species") == 0, position = strcmp(name, "pos") == 0;
        if ((species && (type[0] != 'S' || m != 1)) || (position && (type[0] != 'R' || m != 3)))
            return sv_structure_fail(context, r->fault, 2, column, hint, "%s must be %s", name,
                                     species ? "species:S:1" : "pos:R:3");
        if ((species && r->species >= 0) || (position && r->position >= 0))
            return sv_structure_fail(context, r->fault, 2, column, hint,
                                     "Properties names %s twice", name);
        if (species)
            r->species = r->columns;
        if (position)
            r->position = r->columns;
        r->columns += (int)m;
    }
    if (r->species < 0 || r->position < 0)
        return sv_structure_fail(context, r->fault, 2, 1, hint, "Properties has no column %s",
                                 r->species < 0 ? "species" : "pos");
    return SV_OK;
}

static sv_status read_comment(sv_context *context, reader *r, sv_structure *s)
{
    const char *end = NULL;
    r->species = 0;
    r->position = 1;
    if (!next_line(r))
        return sv_structure_fail(context, r->fault, 1, 1, "line 2 is a comment and may be empty",
                                 "the file ends after the number of its sites");
    s->has_lattice = find_value(r, "Lattice", &end) != NULL;
    const char *value = find_value(r, "Properties", &end);
    return value == NULL ? SV_OK : read_properties(context, r, value, end);
}

/* One coordinate, in lattice constants. */
static sv_status read_real(sv_context *context, reader *r, const char *word, int column,
                           double unit, double *ret)
{
    if (sv_parse_real(word, ret) != SV_PARSE_OK)
        return sv_structure_fail(context, r->fault, r->number, column, NULL,
                                 "\"%.60s\" is not a finite number", word);
    *ret *= unit;
    if (!(fabs(*ret) <= FARTHEST))
        return sv_structure_fail(context, r->fault, r->number, column, NULL,
                                 "a site lies farther out than %g lattice constants", FARTHEST);
    return SV_OK;
}

static sv_status find_species(sv_context *context, reader *r, const sv_model *model,
                              const char *word, int column, int32_t *ret)
{
    char known[200] = "the model has";
    *ret = sv_model_find_orbital(model, word);
    if (*ret >= 0)
        return SV_OK;
    for (int k = 0; k < model->n_orbitals && strlen(known) < 150; k++)
        snprintf(known + strlen(known), sizeof known - strlen(known), "%s %s", k > 0 ? "," : "",
                 model->orbitals[k].name);
    return sv_structure_fail(context, r->fault, r->number, column, known,
                             "the model has no species \"%.60s\"", word);
}

static sv_status read_site(sv_context *context, reader *r, const sv_model *model, double unit,
                           sv_structure *s)
{
    char word[LONGEST_WORD];
    double xyz[3] = {0.0, 0.0, 0.0};
    int column = 1, n = 0;
    const char *at = r->line;
    sv_status status = SV_OK;
    for (; status == SV_OK && next_word(r, &at, word, &column); n++) {
        if (n == r->species)
            status = find_species(context, r, model, word, column, &s->species[s->n]);
        else if (n >= r->position && n < r->position + 3)
            status = read_real(context, r, word, column, unit, &xyz[n - r->position]);
    }
    if (status != SV_OK)
        return status;
    if (r->columns > 0 ? n != r->columns : n < 4)
        return sv_structure_fail(context, r->fault, r->number, (int)(r->stop - r->line) + (n == 0),
                                 r->columns > 0 ? "Properties in line 2 says how many there are"
                                                : "a site is written as: species x y z",
                                 "%d columns; %s%d are needed", n,
                                 r->columns > 0 ? "" : "at least ",
                                 r->columns > 0 ? r->columns : 4);
    s->at[s->n][0] = xyz[0];
    s->at[s->n][1] = xyz[1];
    s->line[s->n] = r->number;
    s->z[0] = s->n == 0 ? xyz[2] : fmin(s->z[0], xyz[2]);
    s->z[1] = s->n == 0 ? xyz[2] : fmax(s->z[1], xyz[2]);
    s->n++;
    return SV_OK;
}

sv_status sv_structure_read(sv_context *context, const sv_model *model, const char *text,
                            size_t size, double unit, sv_structure *s, sv_table_fault *fault)
{
    reader r = {.at = text, .end = text + size, .fault = fault};
    char word[LONGEST_WORD];
    sv_index n = 0;
    int column;
    sv_status status = read_count(context, &r, &n);
    if (status == SV_OK)
        status = read_comment(context, &r, s);
    if (status != SV_OK || (status = sv_take(context, n, sizeof *s->at, &s->at)) != SV_OK ||
        (status = sv_take(context, n, sizeof *s->species, &s->species)) != SV_OK ||
        (status = sv_take(context, n, sizeof *s->line, &s->line)) != SV_OK)
        return status;
    while (status == SV_OK && s->n < n) {
        if (!next_line(&r))
            return sv_structure_fail(
                context, fault, r.number, 1, "line 1 says how many sites there are",
                "the file ends after %lld of %lld sites", (long long)s->n, (long long)n);
        status = read_site(context, &r, model, unit, s);
    }
    while (status == SV_OK && next_line(&r)) {
        const char *at = r.line;
        if (next_word(&r, &at, word, &column))
            return sv_structure_fail(context, fault, r.number, column,
                                     "line 1 says how many sites there are; one frame is read",
                                     "the file goes on after its %lld sites", (long long)n);
    }
    return status;
}
