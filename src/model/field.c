/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Named local operators of a model: what "mass" or "exchange" means site by site. */
#include "selvedge/model.h"

#include <math.h>
#include <string.h>

sv_status sv_model_add_field(sv_context *context, sv_model *model, const char *name, double value)
{
    sv_model_field *field = &model->fields[model->n_fields];
    if (strlen(name) >= sizeof field->name || strcmp(name, "potential") == 0 ||
        sv_model_find_field(model, name) != SV_NO_FIELD)
        return SV_FAIL(context, SV_INVALID_INPUT, "\"%.40s\" cannot name a local operator here",
                       name);
    if (model->n_fields == SV_MODEL_FIELDS)
        return SV_FAIL(context, SV_INVALID_INPUT, "a model has at most %d local operators",
                       SV_MODEL_FIELDS);
    *field = (sv_model_field){.value = value};
    strcpy(field->name, name);
    model->n_fields++;
    return SV_OK;
}

sv_status sv_model_add_field_term(sv_context *context, sv_model *model, int to, int from,
                                  sv_complex amplitude)
{
    if (model->n_fields == 0)
        return SV_FAIL(context, SV_INVALID_INPUT, "a term needs a local operator to belong to");
    sv_model_field *field = &model->fields[model->n_fields - 1];
    if (from < 0 || to < 0 || from >= model->n_orbitals || to >= model->n_orbitals)
        return SV_FAIL(context, SV_INVALID_INPUT, "%s: a term names an orbital that is not there",
                       field->name);
    const double *a = model->orbitals[from].at, *b = model->orbitals[to].at;
    if (hypot(a[0] - b[0], a[1] - b[1]) > 1e-9)
        return SV_FAIL(
            context, SV_INVALID_INPUT,
            "%s: orbitals %s and %s have different positions, so their term is not local",
            field->name, model->orbitals[from].name, model->orbitals[to].name);
    if (from == to && cimag(amplitude) != 0.0)
        return SV_FAIL(context, SV_INVALID_INPUT, "%s: the diagonal term on %s is not real",
                       field->name, model->orbitals[from].name);
    if (field->n_terms == SV_FIELD_TERMS)
        return SV_FAIL(context, SV_INVALID_INPUT, "%s: more than %d terms", field->name,
                       SV_FIELD_TERMS);
    field->terms[field->n_terms++] = (sv_field_term){to, from, amplitude};
    return SV_OK;
}

int sv_model_find_field(const sv_model *model, const char *name)
{
    if (strcmp(name, "potential") == 0)
        return SV_FIELD_POTENTIAL;
    for (int f = 0; f < model->n_fields; f++)
        if (strcmp(model->fields[f].name, name) == 0)
            return f;
    return SV_NO_FIELD;
}
