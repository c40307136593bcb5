/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Hops and on-site energies of a model from a table, such as one fitted to first-principles bands.
 */
#include "selvedge/model.h"

#include <math.h>
#include <string.h>

/* Both directions of a hop may differ by what printing rounds away, of the largest amplitude. */
static const double PRINTED = 1e-6;

enum { FROM, TO, SHIFT_I, SHIFT_J, RE, IM, N_COLUMNS };
static const sv_table_column columns[N_COLUMNS] = {
    {"from", SV_DIM_NONE, true},    {"to", SV_DIM_NONE, true},   {"shift_i", SV_DIM_NONE, true},
    {"shift_j", SV_DIM_NONE, true}, {"re", SV_DIM_ENERGY, true}, {"im", SV_DIM_ENERGY, true}};
static const char EXAMPLE[] = "for example: from,to,shift_i,shift_j,re [eV],im [eV]";

/* What is known of a hop of the table beside the hop itself. */
typedef struct entry {
    int line, reverse_line; /* 0: the opposite direction is not listed */
    sv_complex reverse;
} entry;

typedef struct hop_reader {
    sv_table table;
    sv_model *model;
    double energy_unit;
    int first; /* number of the first hop of the table */
    entry *entries;
    sv_index capacity;
    int *onsite_line; /* per orbital; 0: not listed */
    double largest;   /* |amplitude| */
    bool has_unit;
} hop_reader;

static sv_status find_orbital(sv_context *context, hop_reader *r, int column, int *ret_row)
{
    const char *name = sv_table_text(&r->table, column);
    *ret_row = sv_model_find_orbital(r->model, name);
    if (*ret_row >= 0)
        return SV_OK;
    return sv_table_fail(context, &r->table, column, "orbital names are case-sensitive",
                         "the model has no orbital \"%.100s\"", name);
}

static sv_status read_amplitude(sv_context *context, hop_reader *r, sv_complex *ret_amplitude)
{
    double part[2] = {0.0, 0.0};
    for (int k = 0; k < 2; k++) {
        bool has_unit = false;
        sv_status status = sv_table_real(context, &r->table, RE + k, &part[k], &has_unit);
        if (status != SV_OK)
            return status;
        if (has_unit && r->energy_unit > 0.0)
            part[k] /= r->energy_unit;
        r->has_unit = r->has_unit || has_unit;
        if (fabs(part[k]) > 1e12)
            return sv_table_fail(context, &r->table, RE + k, NULL, "%.6g is too large", part[k]);
    }
    *ret_amplitude = CMPLX(part[0], part[1]);
    r->largest = fmax(r->largest, cabs(*ret_amplitude));
    return SV_OK;
}

static sv_status add_onsite(sv_context *context, hop_reader *r, int orbital, sv_complex amplitude)
{
    sv_orbital *o = &r->model->orbitals[orbital];
    if (r->onsite_line[orbital] != 0)
        return sv_table_fail(context, &r->table, FROM, NULL,
                             "the on-site energy of %s stands in line %d already", o->name,
                             r->onsite_line[orbital]);
    if (o->onsite != 0.0)
        return sv_table_fail(context, &r->table, FROM, "remove one of them",
                             "the on-site energy of %s stands in the sheet already", o->name);
    if (fabs(cimag(amplitude)) > PRINTED * cabs(amplitude))
        return sv_table_fail(context, &r->table, IM, "from and to are one orbital, the shift is 0",
                             "the on-site energy of %s is not real", o->name);
    r->onsite_line[orbital] = r->table.line;
    o->onsite = creal(amplitude);
    return SV_OK;
}

/* A hop that is known already: the opposite direction of one of the table, or a fault. */
static sv_status meet_again(sv_context *context, hop_reader *r, int number, const sv_hop *hop)
{
    const sv_hop *known = &r->model->hops[number];
    bool same = known->from == hop->from && known->to == hop->to &&
                known->shift[0] == hop->shift[0] && known->shift[1] == hop->shift[1];
    if (number < r->first)
        return sv_table_fail(context, &r->table, FROM, "remove one of them",
                             "this hop, or its opposite, stands in the sheet already");
    entry *e = &r->entries[number - r->first];
    if (same || e->reverse_line != 0)
        return sv_table_fail(context, &r->table, FROM, NULL, "this hop stands in line %d already",
                             same ? e->line : e->reverse_line);
    e->reverse_line = r->table.line;
    e->reverse = hop->amplitude;
    return SV_OK;
}

static sv_status read_row(sv_context *context, hop_reader *r)
{
    sv_hop hop = {0};
    sv_status status;
    if ((status = find_orbital(context, r, FROM, &hop.from)) != SV_OK ||
        (status = find_orbital(context, r, TO, &hop.to)) != SV_OK)
        return status;
    for (int k = 0; k < 2; k++) {
        int64_t shift = 0;
        if ((status = sv_table_integer(context, &r->table, SHIFT_I + k, &shift)) != SV_OK)
            return status;
        if (shift < -1000 || shift > 1000)
            return sv_table_fail(context, &r->table, SHIFT_I + k, NULL,
                                 "a hop reaches farther than 1000 cells");
        hop.shift[k] = (int)shift;
    }
    if ((status = read_amplitude(context, r, &hop.amplitude)) != SV_OK)
        return status;
    if (hop.from == hop.to && hop.shift[0] == 0 && hop.shift[1] == 0)
        return add_onsite(context, r, hop.from, hop.amplitude);
    int number = sv_model_find_hop(r->model, hop.from, hop.to, hop.shift[0], hop.shift[1]);
    if (number >= 0)
        return meet_again(context, r, number, &hop);
    number = r->model->n_hops - r->first;
    if ((status = sv_reserve(context, &r->entries, &r->capacity, number + 1, sizeof *r->entries)) !=
        SV_OK)
        return status;
    r->entries[number] = (entry){.line = r->table.line};
    status = sv_model_add_hop(context, r->model, hop.from, hop.to, hop.shift[0], hop.shift[1],
                              hop.amplitude);
    return status != SV_INVALID_INPUT
               ? status
               : sv_table_fail(context, &r->table, FROM, NULL, "%.200s", context->error.message);
}

/* Where both directions are listed, they must be conjugate to each other. */
static sv_status check_hermitian(sv_context *context, hop_reader *r)
{
    for (int h = r->first; h < r->model->n_hops; h++) {
        const entry *e = &r->entries[h - r->first];
        const sv_hop *hop = &r->model->hops[h];
        if (e->reverse_line == 0 || cabs(e->reverse - conj(hop->amplitude)) <= PRINTED * r->largest)
            continue;
        r->table.line = e->reverse_line;
        r->table.line_length = 0;
        return sv_table_fail(
            context, &r->table, -1, "list one direction only, or give both as conjugates",
            "the hop %s → %s is not hermitian: %.6g%+.6gi here, %.6g%+.6gi in line %d, which "
            "should "
            "be conjugate",
            r->model->orbitals[hop->to].name, r->model->orbitals[hop->from].name, creal(e->reverse),
            cimag(e->reverse), creal(hop->amplitude), cimag(hop->amplitude), e->line);
    }
    return SV_OK;
}

sv_status sv_model_read_hops(sv_context *context, sv_model *model, const char *text, size_t size,
                             double energy_unit, bool *ret_has_unit, sv_table_fault *ret_fault)
{
    hop_reader *r = NULL;
    bool more = true;
    sv_status status = sv_take(context, 1, sizeof *r, &r);
    if (status != SV_OK)
        return status;
    r->model = model;
    r->energy_unit = energy_unit;
    r->first = model->n_hops;
    status = sv_take(context, model->n_orbitals, sizeof *r->onsite_line, &r->onsite_line);
    if (status == SV_OK)
        status = sv_table_begin(context, text, size, columns, N_COLUMNS, EXAMPLE, &r->table);
    while (status == SV_OK) {
        if (sv_cancelled(context))
            status = SV_FAIL(context, SV_INTERRUPTED, "stopped while reading a table of hops");
        else
            status = sv_table_next(context, &r->table, &more);
        if (status != SV_OK || !more)
            break;
        status = read_row(context, r);
    }
    if (status == SV_OK)
        status = check_hermitian(context, r);
    if (status == SV_OK)
        *ret_has_unit = r->has_unit;
    else
        *ret_fault = r->table.fault;
    sv_give(context, r->entries);
    sv_give(context, r->onsite_line);
    sv_give(context, r);
    return status;
}
