/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Comma-separated tables from files that are not trusted: a header that names the columns, rows of
 * fields, and a fault with line and column for whatever is wrong. */
#include "selvedge/base.h"

#include <ctype.h>
#include <stdarg.h>
#include <string.h>

static sv_status fail_at(sv_context *context, sv_table *t, int column, const char *hint,
                         const char *message)
{
    sv_table_fault *f = &t->fault;
    *f = (sv_table_fault){.line = t->line, .column = column};
    snprintf(f->message, sizeof f->message, "%.255s", message);
    snprintf(f->hint, sizeof f->hint, "%.255s", hint != NULL ? hint : "");
    snprintf(f->text, sizeof f->text, "%.*s", t->line_length, t->line_text);
    return SV_FAIL(context, SV_INVALID_INPUT, "line %d, column %d: %s", t->line, column, message);
}

sv_status sv_table_fail(sv_context *context, sv_table *table, int column, const char *hint,
                        const char *format, ...)
{
    char message[sizeof table->fault.message];
    va_list args;
    va_start(args, format);
    vsnprintf(message, sizeof message, format, args);
    va_end(args);
    bool known = column >= 0 && table->place[column] >= 0;
    return fail_at(context, table, known ? table->fields[table->place[column]].column : 1, hint,
                   message);
}

/* Without surrounding blanks and one pair of quotes; false when it is too long. */
static bool copy_field(const char *start, const char *end, sv_table_field *ret)
{
    while (end > start && isspace((unsigned char)end[-1]))
        end--;
    if (end - start >= 2 && *start == '"' && end[-1] == '"') {
        start++;
        end--;
    }
    if ((size_t)(end - start) >= sizeof ret->text)
        return false;
    memcpy(ret->text, start, (size_t)(end - start));
    ret->text[end - start] = '\0';
    return true;
}

static sv_status split_line(sv_context *context, sv_table *t)
{
    const char *at = t->line_text, *end = t->line_text + t->line_length;
    for (t->n_fields = 0;; t->n_fields++) {
        const char *stop = memchr(at, ',', (size_t)(end - at));
        stop = stop == NULL ? end : stop;
        while (at < stop && isspace((unsigned char)*at))
            at++;
        int column = (int)(at - t->line_text) + 1;
        if (t->n_fields == SV_TABLE_FIELDS)
            return fail_at(context, t, column, NULL, "too many columns");
        t->fields[t->n_fields].column = column;
        if (!copy_field(at, stop, &t->fields[t->n_fields]))
            return fail_at(context, t, column, NULL, "a field is too long");
        if (stop == end)
            break;
        at = stop + 1;
    }
    t->n_fields++;
    return SV_OK;
}

/* Moves to the next line that has content; comments begin with #. */
static bool next_line(sv_table *t)
{
    while (t->at < t->end) {
        const char *stop = memchr(t->at, '\n', (size_t)(t->end - t->at));
        const char *next = stop == NULL ? t->end : stop + 1;
        stop = stop == NULL ? t->end : stop;
        if (stop > t->at && stop[-1] == '\r')
            stop--;
        t->line++;
        t->line_text = t->at;
        t->line_length = (int)(stop - t->at);
        t->at = next;
        int k = 0;
        while (k < t->line_length && isspace((unsigned char)t->line_text[k]))
            k++;
        if (k < t->line_length && t->line_text[k] != '#')
            return true;
    }
    return false;
}

/* "x [nm]" or "x (nm)" → "x" and the unit. */
static void split_unit(char *name, char *ret_unit)
{
    size_t length = strlen(name);
    char *open = strpbrk(name, "[(");
    ret_unit[0] = '\0';
    if (open != NULL && (name[length - 1] == ']' || name[length - 1] == ')')) {
        name[length - 1] = '\0';
        strcpy(ret_unit, open + 1);
        *open = '\0';
    }
    for (length = strlen(name); length > 0 && name[length - 1] == ' '; length--)
        name[length - 1] = '\0';
}

static sv_status read_heading(sv_context *context, sv_table *t, int number)
{
    const sv_table_field *field = &t->fields[number];
    char name[sizeof field->text], unit[sizeof field->text], message[300], list[200];
    strcpy(name, field->text);
    split_unit(name, unit);
    for (int c = 0; c < t->n_columns; c++) {
        const sv_table_column *column = &t->columns[c];
        if (strcmp(name, column->name) != 0)
            continue;
        const sv_unit *row = unit[0] != '\0' ? sv_unit_find(unit) : NULL;
        snprintf(message, sizeof message, "column \"%s\" stands twice", name);
        if (t->place[c] >= 0)
            return fail_at(context, t, field->column, NULL, message);
        sv_unit_list(column->dimension, list, sizeof list);
        snprintf(message, sizeof message, "\"%.100s\" is not a unit of %s", unit,
                 sv_dimension_name(column->dimension));
        if (unit[0] != '\0' && (row == NULL || row->dimension != column->dimension))
            return fail_at(context, t, field->column, list, message);
        t->place[c] = number;
        t->unit[c] = row;
    }
    return SV_OK;
}

static sv_status read_header(sv_context *context, sv_table *t, const char *example)
{
    char message[200];
    sv_status status = split_line(context, t);
    for (int k = 0; k < t->n_fields && status == SV_OK; k++)
        status = read_heading(context, t, k);
    for (int c = 0; c < t->n_columns && status == SV_OK; c++) {
        snprintf(message, sizeof message, "column \"%s\" is missing", t->columns[c].name);
        if (t->columns[c].required && t->place[c] < 0)
            status = fail_at(context, t, 1, example, message);
    }
    t->header_fields = t->n_fields;
    return status;
}

sv_status sv_table_begin(sv_context *context, const char *text, size_t size,
                         const sv_table_column *columns, int n_columns, const char *example,
                         sv_table *ret_table)
{
    sv_table *t = ret_table;
    *t = (sv_table){.columns = columns,
                    .n_columns = n_columns,
                    .at = text,
                    .end = text + size,
                    .line_text = ""};
    for (int c = 0; c < SV_TABLE_COLUMNS; c++)
        t->place[c] = -1;
    if (n_columns > SV_TABLE_COLUMNS)
        return SV_FAIL(context, SV_INTERNAL, "a table of %d columns", n_columns);
    /* A byte-order mark is not part of the first column's name. */
    if (size >= 3 && memcmp(text, "\xEF\xBB\xBF", 3) == 0)
        t->at += 3;
    if (memchr(text, '\0', size) != NULL || size > INT32_MAX)
        return fail_at(context, t, 1, example, "the file is not a text table");
    if (!next_line(t))
        return fail_at(context, t, 1, example, "the file has no rows");
    return read_header(context, t, example);
}

sv_status sv_table_next(sv_context *context, sv_table *table, bool *ret_more)
{
    char message[100];
    if (!next_line(table)) {
        *ret_more = false;
        return SV_OK;
    }
    sv_status status = split_line(context, table);
    if (status != SV_OK)
        return status;
    snprintf(message, sizeof message, "%d columns, the first row has %d", table->n_fields,
             table->header_fields);
    if (table->n_fields != table->header_fields)
        return fail_at(context, table, 1, NULL, message);
    *ret_more = true;
    return SV_OK;
}

const char *sv_table_text(const sv_table *table, int column)
{
    return table->place[column] < 0 ? "" : table->fields[table->place[column]].text;
}

sv_status sv_table_real(sv_context *context, sv_table *table, int column, double *ret_value,
                        bool *ret_has_unit)
{
    char list[200];
    sv_quantity q = {0};
    sv_dimension dimension = table->columns[column].dimension;
    const char *text = sv_table_text(table, column);
    sv_unit_list(dimension, list, sizeof list);
    if (text[0] == '\0')
        return sv_table_fail(context, table, column, NULL, "a value of \"%s\" is missing",
                             table->columns[column].name);
    if (sv_parse_quantity(text, dimension, &q) != SV_PARSE_OK)
        return sv_table_fail(context, table, column, list, "\"%.100s\" is not %s", text,
                             dimension == SV_DIM_NONE ? "a number" : sv_dimension_name(dimension));
    const sv_unit *unit = table->unit[column];
    *ret_value = q.has_unit || unit == NULL ? q.value : q.value * unit->factor;
    *ret_has_unit = q.has_unit || unit != NULL;
    return SV_OK;
}

sv_status sv_table_integer(sv_context *context, sv_table *table, int column, int64_t *ret_value)
{
    const char *text = sv_table_text(table, column);
    if (sv_parse_integer(text, ret_value) == SV_PARSE_OK)
        return SV_OK;
    return sv_table_fail(context, table, column, NULL, "\"%.100s\" is not a whole number", text);
}
