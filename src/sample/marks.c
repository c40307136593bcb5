/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Measured defects and energies from a CSV file. The file is not trusted: every field is checked
 * and a fault names its line and column. */
#include "sample_internal.h"

#include <ctype.h>
#include <stdio.h>
#include <string.h>

enum { MOST_COLUMNS = 64, LONGEST_FIELD = 200 };
static const sv_index MOST_ROWS = 10000000;

enum column_role { COLUMN_X, COLUMN_Y, COLUMN_ENERGY, COLUMN_I, COLUMN_J, COLUMN_ORBITAL, N_ROLES };
static const char *const role_names[N_ROLES] = {"x", "y", "energy", "cell_i", "cell_j", "orbital"};
static const sv_dimension role_dimensions[N_ROLES] = {SV_DIM_LENGTH, SV_DIM_LENGTH, SV_DIM_ENERGY,
                                                      SV_DIM_NONE,   SV_DIM_NONE,   SV_DIM_NONE};

/* One comma-separated field and where it starts (column from 1). */
typedef struct field {
    char text[LONGEST_FIELD];
    int column;
} field;

typedef struct reader {
    const sv_model *model;
    double lattice_constant, energy_unit;
    const double *origin;
    int role_column[N_ROLES];          /* −1: absent */
    const sv_unit *role_unit[N_ROLES]; /* from the header, or NULL */
    int n_columns;
    int line;
    const char *line_text;
    int line_length;
    sv_table_fault *fault;
} reader;

static sv_status fail(sv_context *context, reader *r, int column, const char *message,
                      const char *hint)
{
    sv_table_fault *f = r->fault;
    *f = (sv_table_fault){.line = r->line, .column = column};
    snprintf(f->message, sizeof f->message, "%.250s", message);
    snprintf(f->hint, sizeof f->hint, "%.250s", hint);
    snprintf(f->text, sizeof f->text, "%.*s", r->line_length, r->line_text);
    return SV_FAIL(context, SV_INVALID_INPUT, "line %d, column %d: %s", r->line, column, message);
}

static bool copy_field(const char *start, const char *end, field *ret)
{
    while (start < end && isspace((unsigned char)*start))
        start++;
    while (end > start && isspace((unsigned char)end[-1]))
        end--;
    if (end - start >= 2 && *start == '"' && end[-1] == '"') {
        start++;
        end--;
    }
    if (end - start >= LONGEST_FIELD)
        return false;
    memcpy(ret->text, start, (size_t)(end - start));
    ret->text[end - start] = '\0';
    return true;
}

static sv_status split_line(sv_context *context, reader *r, field *fields, int *ret_count)
{
    const char *at = r->line_text, *end = r->line_text + r->line_length;
    int n = 0;
    for (;;) {
        const char *stop = memchr(at, ',', (size_t)(end - at));
        if (stop == NULL)
            stop = end;
        int column = (int)(at - r->line_text) + 1;
        if (n == MOST_COLUMNS)
            return fail(context, r, column, "more than 64 columns", "");
        if (!copy_field(at, stop, &fields[n]))
            return fail(context, r, column, "a field is longer than 200 characters", "");
        while (at < stop && isspace((unsigned char)*at)) {
            at++;
            column++;
        }
        fields[n++].column = column;
        if (stop == end)
            break;
        at = stop + 1;
    }
    *ret_count = n;
    return SV_OK;
}

/* "x [nm]", "x (nm)", "x/nm", "x_nm" → "x" and the unit. */
static bool split_unit(char *name, char *ret_unit)
{
    ret_unit[0] = '\0';
    size_t length = strlen(name);
    char *open = strpbrk(name, "[(");
    if (open != NULL && length > 0 && (name[length - 1] == ']' || name[length - 1] == ')')) {
        name[length - 1] = '\0';
        strcpy(ret_unit, open + 1);
        *open = '\0';
    } else if ((open = strchr(name, '/')) != NULL) {
        strcpy(ret_unit, open + 1);
        *open = '\0';
    } else if ((open = strrchr(name, '_')) != NULL && sv_unit_find(open + 1) != NULL) {
        strcpy(ret_unit, open + 1);
        *open = '\0';
    }
    for (length = strlen(name); length > 0 && name[length - 1] == ' '; length--)
        name[length - 1] = '\0';
    return ret_unit[0] == '\0' || sv_unit_find(ret_unit) != NULL;
}

static sv_status read_heading(sv_context *context, reader *r, const field *f, int number)
{
    char name[LONGEST_FIELD], unit[LONGEST_FIELD], message[300];
    strcpy(name, f->text);
    bool known_unit = split_unit(name, unit);
    for (int role = 0; role < N_ROLES; role++) {
        if (strcmp(name, role_names[role]) != 0)
            continue;
        if (r->role_column[role] >= 0) {
            snprintf(message, sizeof message, "column \"%s\" stands twice", name);
            return fail(context, r, f->column, message, "");
        }
        const sv_unit *row = unit[0] ? sv_unit_find(unit) : NULL;
        if (!known_unit || (row != NULL && row->dimension != role_dimensions[role])) {
            char list[200];
            sv_unit_list(role_dimensions[role], list, sizeof list);
            snprintf(message, sizeof message, "\"%.100s\" is not a unit of %s", unit,
                     sv_dimension_name(role_dimensions[role]));
            return fail(context, r, f->column, message, list);
        }
        r->role_column[role] = number;
        r->role_unit[role] = row;
    }
    return SV_OK;
}

static sv_status read_header(sv_context *context, reader *r, const field *fields, int n,
                             bool with_energy)
{
    for (int k = 0; k < n; k++) {
        sv_status status = read_heading(context, r, &fields[k], k);
        if (status != SV_OK)
            return status;
    }
    r->n_columns = n;
    const int *c = r->role_column;
    bool by_place = c[COLUMN_X] >= 0 && c[COLUMN_Y] >= 0;
    bool by_cell = c[COLUMN_I] >= 0 && c[COLUMN_J] >= 0;
    if (by_place == by_cell)
        return fail(context, r, 1,
                    by_place ? "columns x, y and cell_i, cell_j exclude each other"
                             : "the first row must name the columns x and y, or cell_i and cell_j",
                    "for example: x [nm],y [nm]");
    if (with_energy && c[COLUMN_ENERGY] < 0)
        return fail(context, r, 1, "column \"energy\" is missing",
                    "for example: x [nm],y [nm],energy [meV]");
    return SV_OK;
}

/* A number with its unit (own or the header's) in the units of the model. */
static sv_status read_quantity(sv_context *context, reader *r, const field *fields, int role,
                               double *ret_value)
{
    const field *f = &fields[r->role_column[role]];
    char message[400], list[200];
    sv_quantity q;
    sv_dimension dimension = role_dimensions[role];
    sv_parse_result result = sv_parse_quantity(f->text, dimension, &q);
    sv_unit_list(dimension, list, sizeof list);
    if (result != SV_PARSE_OK) {
        snprintf(message, sizeof message, "\"%.100s\" is not %s", f->text,
                 sv_dimension_name(dimension));
        return fail(context, r, f->column, f->text[0] ? message : "a value is missing", list);
    }
    const sv_unit *unit = q.has_unit ? q.unit : r->role_unit[role];
    double value = q.has_unit ? q.value : q.value * (unit != NULL ? unit->factor : 1.0);
    double scale = dimension == SV_DIM_LENGTH ? r->lattice_constant : r->energy_unit;
    if (unit != NULL && scale <= 0.0 && dimension == SV_DIM_LENGTH)
        return fail(context, r, f->column, "a length with a unit needs model.lattice_constant",
                    "or give lengths in lattice constants, without a unit");
    *ret_value = unit == NULL || scale <= 0.0 ? value : value / scale;
    return SV_OK;
}

static sv_status read_index(sv_context *context, reader *r, const field *fields, int role,
                            int32_t *ret_value)
{
    const field *f = &fields[r->role_column[role]];
    int64_t value;
    if (sv_parse_integer(f->text, &value) != SV_PARSE_OK || value > INT32_MAX ||
        value < INT32_MIN) {
        char message[300];
        snprintf(message, sizeof message, "\"%.100s\" is not a cell number", f->text);
        return fail(context, r, f->column, message, "");
    }
    *ret_value = (int32_t)value;
    return SV_OK;
}

static sv_status read_orbital(sv_context *context, reader *r, const field *fields, sv_mark *mark)
{
    mark->orbital = -1;
    if (r->role_column[COLUMN_ORBITAL] < 0)
        return SV_OK;
    const field *f = &fields[r->role_column[COLUMN_ORBITAL]];
    if (strcmp(f->text, "any") == 0)
        return SV_OK;
    mark->orbital = sv_model_find_orbital(r->model, f->text);
    if (mark->orbital >= 0)
        return SV_OK;
    char message[300];
    snprintf(message, sizeof message, "the model has no orbital \"%.100s\"", f->text);
    return fail(context, r, f->column, message, "orbital names are case-sensitive");
}

static sv_status read_row(sv_context *context, reader *r, const field *fields, int n,
                          bool with_energy, sv_mark *ret)
{
    sv_mark mark = {.line = r->line};
    sv_status status;
    if (n != r->n_columns) {
        char message[100];
        snprintf(message, sizeof message, "%d columns, the first row has %d", n, r->n_columns);
        return fail(context, r, 1, message, "");
    }
    mark.by_cell = r->role_column[COLUMN_I] >= 0;
    if ((status = read_orbital(context, r, fields, &mark)) != SV_OK)
        return status;
    if (mark.by_cell) {
        if ((status = read_index(context, r, fields, COLUMN_I, &mark.cell[0])) != SV_OK ||
            (status = read_index(context, r, fields, COLUMN_J, &mark.cell[1])) != SV_OK)
            return status;
    } else {
        if ((status = read_quantity(context, r, fields, COLUMN_X, &mark.at[0])) != SV_OK ||
            (status = read_quantity(context, r, fields, COLUMN_Y, &mark.at[1])) != SV_OK)
            return status;
        mark.at[0] += r->origin[0];
        mark.at[1] += r->origin[1];
    }
    if (with_energy &&
        (status = read_quantity(context, r, fields, COLUMN_ENERGY, &mark.energy)) != SV_OK)
        return status;
    *ret = mark;
    return SV_OK;
}

/* Moves to the next line that has content; false at the end of the text. */
static bool next_line(reader *r, const char **at, const char *end)
{
    while (*at < end) {
        const char *stop = memchr(*at, '\n', (size_t)(end - *at));
        const char *next = stop == NULL ? end : stop + 1;
        if (stop == NULL)
            stop = end;
        if (stop > *at && stop[-1] == '\r')
            stop--;
        r->line++;
        r->line_text = *at;
        r->line_length = (int)(stop - *at);
        *at = next;
        int k = 0;
        while (k < r->line_length && isspace((unsigned char)r->line_text[k]))
            k++;
        if (k < r->line_length && r->line_text[k] != '#')
            return true;
    }
    return false;
}

sv_status sv_read_marks(sv_context *context, const sv_model *model, const char *text, size_t size,
                        bool with_energy, double lattice_constant, double energy_unit,
                        const double origin[2], sv_mark **ret_marks, sv_index *ret_count,
                        sv_table_fault *ret_fault)
{
    sv_mark *marks = NULL;
    sv_index n = 0, capacity = 0;
    field *fields = NULL;
    int n_fields = 0;
    reader r = {.model = model,
                .lattice_constant = lattice_constant,
                .energy_unit = energy_unit,
                .origin = origin,
                .line_text = "",
                .fault = ret_fault,
                .role_column = {-1, -1, -1, -1, -1, -1}};
    sv_status status = sv_take(context, MOST_COLUMNS, sizeof *fields, &fields);
    if (status != SV_OK)
        return status;
    const char *at = text, *end = text + size;
    /* A byte-order mark is not part of the first column's name. */
    if (size >= 3 && memcmp(text, "\xEF\xBB\xBF", 3) == 0)
        at += 3;
    if (memchr(text, '\0', size) != NULL || size > INT32_MAX)
        status = fail(context, &r, 1, "the file is not a text table (NUL bytes, or too large)", "");
    else if (!next_line(&r, &at, end))
        status = fail(context, &r, 1, "the file has no rows", "for example: x [nm],y [nm]");
    else if ((status = split_line(context, &r, fields, &n_fields)) == SV_OK)
        status = read_header(context, &r, fields, n_fields, with_energy);
    while (status == SV_OK && next_line(&r, &at, end)) {
        if (n == MOST_ROWS)
            status = fail(context, &r, 1, "more than 10,000,000 rows", "");
        else if ((status = split_line(context, &r, fields, &n_fields)) == SV_OK &&
                 (status = sv_reserve(context, &marks, &capacity, n + 1, sizeof *marks)) == SV_OK)
            status = read_row(context, &r, fields, n_fields, with_energy, &marks[n]);
        n++;
    }
    sv_give(context, fields);
    if (status != SV_OK) {
        sv_give(context, marks);
        return status;
    }
    *ret_marks = marks;
    *ret_count = n;
    return SV_OK;
}
