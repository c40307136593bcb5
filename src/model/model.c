/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The model as an object: building it piece by piece, invariants, geometry, Bloch matrix. */
#include "selvedge/model.h"

#include <math.h>
#include <stdio.h>
#include <string.h>

/* Orbitals nearer than this share a position (lattice constants). */
static const double SAME_POSITION = 1e-9;

static double cross(const double a[2], const double b[2])
{
    return a[0] * b[1] - a[1] * b[0];
}

sv_status sv_model_begin(sv_context *context, const char *name, const double a1[2],
                         const double a2[2], sv_model *ret_model)
{
    double area = cross(a1, a2);
    double scale = hypot(a1[0], a1[1]) * hypot(a2[0], a2[1]);
    if (!(scale > 0.0) || !isfinite(scale) || fabs(area) <= 1e-9 * scale)
        return SV_FAIL(context, SV_INVALID_INPUT, "the lattice vectors span no area");
    if (area < 0.0)
        return SV_FAIL(context, SV_INVALID_INPUT,
                       "the lattice vectors are left-handed (a1 × a2 < 0); swap them");
    *ret_model = (sv_model){.flux = {0, 1}};
    snprintf(ret_model->name, sizeof ret_model->name, "%s", name);
    memcpy(ret_model->vectors[0], a1, sizeof ret_model->vectors[0]);
    memcpy(ret_model->vectors[1], a2, sizeof ret_model->vectors[1]);
    return SV_OK;
}

sv_status sv_model_add_orbital(sv_context *context, sv_model *model, const char *name, double x,
                               double y, double onsite)
{
    if (name[0] == '\0' || strlen(name) >= sizeof model->orbitals[0].name)
        return SV_FAIL(context, SV_INVALID_INPUT, "an orbital name has 1 to %zu characters",
                       sizeof model->orbitals[0].name - 1);
    if (strcmp(name, "any") == 0)
        return SV_FAIL(context, SV_INVALID_INPUT, "\"any\" stands for all orbitals");
    if (sv_model_find_orbital(model, name) >= 0)
        return SV_FAIL(context, SV_INVALID_INPUT, "two orbitals are named \"%s\"", name);
    if (model->n_orbitals >= 1000)
        return SV_FAIL(context, SV_INVALID_INPUT, "more than 1000 orbitals in a cell");
    sv_status status = sv_reserve(context, &model->orbitals, &model->orbital_capacity,
                                  model->n_orbitals + 1, sizeof *model->orbitals);
    if (status != SV_OK)
        return status;
    sv_orbital *orbital = &model->orbitals[model->n_orbitals++];
    *orbital = (sv_orbital){.at = {x, y}, .onsite = onsite};
    snprintf(orbital->name, sizeof orbital->name, "%s", name);
    return SV_OK;
}

static bool same_hop(const sv_hop *hop, int from, int to, int i, int j)
{
    bool forward = hop->from == from && hop->to == to && hop->shift[0] == i && hop->shift[1] == j;
    bool backward =
        hop->from == to && hop->to == from && hop->shift[0] == -i && hop->shift[1] == -j;
    return forward || backward;
}

sv_status sv_model_add_hop(sv_context *context, sv_model *model, int from, int to, int shift_i,
                           int shift_j, sv_complex amplitude)
{
    const int far = 1000;
    if (from < 0 || to < 0 || from >= model->n_orbitals || to >= model->n_orbitals)
        return SV_FAIL(context, SV_INVALID_INPUT, "a hop names an orbital that is not there");
    if (shift_i < -far || shift_i > far || shift_j < -far || shift_j > far)
        return SV_FAIL(context, SV_INVALID_INPUT, "a hop reaches farther than %d cells", far);
    if (from == to && shift_i == 0 && shift_j == 0)
        return SV_FAIL(context, SV_INVALID_INPUT,
                       "a hop from an orbital to itself is an on-site energy; put it there");
    for (int k = 0; k < model->n_hops; k++)
        if (same_hop(&model->hops[k], from, to, shift_i, shift_j))
            return SV_FAIL(context, SV_INVALID_INPUT,
                           "the hop %s → %s, shift [%d, %d], is listed twice (its conjugate "
                           "follows by itself)",
                           model->orbitals[from].name, model->orbitals[to].name, shift_i, shift_j);
    sv_status status = sv_reserve(context, &model->hops, &model->hop_capacity, model->n_hops + 1,
                                  sizeof *model->hops);
    if (status != SV_OK)
        return status;
    model->hops[model->n_hops++] = (sv_hop){from, to, {shift_i, shift_j}, amplitude};
    return SV_OK;
}

sv_status sv_model_set_flux(sv_context *context, sv_model *model, int p, int q)
{
    if (q < 1)
        return SV_FAIL(context, SV_INVALID_INPUT, "flux [%d, %d]: the denominator must be ≥ 1", p,
                       q);
    model->flux[0] = p;
    model->flux[1] = q;
    return SV_OK;
}

sv_status sv_model_finish(sv_context *context, sv_model *model)
{
    if (model->n_orbitals == 0)
        return SV_FAIL(context, SV_INVALID_INPUT, "a model needs at least one orbital");
    model->n_positions = 0;
    for (int k = 0; k < model->n_orbitals; k++) {
        sv_orbital *orbital = &model->orbitals[k];
        orbital->position = -1;
        for (int l = 0; l < k && orbital->position < 0; l++) {
            const sv_orbital *other = &model->orbitals[l];
            if (hypot(orbital->at[0] - other->at[0], orbital->at[1] - other->at[1]) < SAME_POSITION)
                orbital->position = other->position;
        }
        if (orbital->position < 0)
            orbital->position = model->n_positions++;
    }
    return SV_OK;
}

void sv_model_free(sv_context *context, sv_model *model)
{
    sv_give(context, model->orbitals);
    sv_give(context, model->hops);
    *model = (sv_model){.flux = {0, 1}};
}

static void turn(double at[2], double c, double s)
{
    double x = c * at[0] - s * at[1], y = s * at[0] + c * at[1];
    at[0] = x;
    at[1] = y;
}

void sv_model_turn(sv_model *model, double angle)
{
    double c = cos(angle), s = sin(angle);
    for (int k = 0; k < 2; k++)
        turn(model->vectors[k], c, s);
    for (int k = 0; k < model->n_orbitals; k++)
        turn(model->orbitals[k].at, c, s);
}

int sv_model_find_orbital(const sv_model *model, const char *name)
{
    for (int k = 0; k < model->n_orbitals; k++)
        if (strcmp(model->orbitals[k].name, name) == 0)
            return k;
    return -1;
}

double sv_model_cell_area(const sv_model *model)
{
    return cross(model->vectors[0], model->vectors[1]);
}

void sv_model_reduce(const sv_model *model, const double at[2], double ret_uv[2])
{
    double area = sv_model_cell_area(model);
    ret_uv[0] = cross(at, model->vectors[1]) / area;
    ret_uv[1] = cross(model->vectors[0], at) / area;
}

double sv_model_norm_bound(const sv_model *model)
{
    double bound = 0.0;
    for (int k = 0; k < model->n_orbitals; k++) {
        double sum = fabs(model->orbitals[k].onsite);
        for (int h = 0; h < model->n_hops; h++) {
            double size = cabs(model->hops[h].amplitude);
            sum += (model->hops[h].from == k ? size : 0.0) + (model->hops[h].to == k ? size : 0.0);
        }
        bound = fmax(bound, sum);
    }
    return bound;
}

void sv_model_bloch(const sv_model *model, const double k[2], sv_complex *ret_matrix)
{
    int n = model->n_orbitals;
    memset(ret_matrix, 0, (size_t)n * (size_t)n * sizeof *ret_matrix);
    for (int o = 0; o < n; o++)
        ret_matrix[o + o * n] = model->orbitals[o].onsite;
    for (int h = 0; h < model->n_hops; h++) {
        const sv_hop *hop = &model->hops[h];
        double angle = k[0] * hop->shift[0] + k[1] * hop->shift[1];
        sv_complex element = hop->amplitude * CMPLX(cos(angle), -sin(angle));
        ret_matrix[hop->to + hop->from * n] += element;
        ret_matrix[hop->from + hop->to * n] += conj(element);
    }
}
