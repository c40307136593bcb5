/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The model as an object: building it piece by piece, invariants, geometry, Bloch matrix. */
#include "selvedge/model.h"

#include <ctype.h>
#include <math.h>
#include <stdio.h>
#include <string.h>

enum { MOST_ORBITALS = 10000, MOST_HOPS = 4000000, FARTHEST_CELL = 1000 };

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

/* A name that stands in a CSV file without quotes and is no formula to a spreadsheet. */
static bool is_plain_name(const char *name)
{
    const unsigned char *at = (const unsigned char *)name;
    if (*at < 0x80 && !isalnum(*at) && *at != '_')
        return false;
    for (; *at != '\0'; at++)
        if (*at < 0x20 || *at == 0x7f || *at == ',' || *at == '"' ||
            (at[0] == 0xC2 && at[1] < 0xA0)) /* U+0080 to U+009F */
            return false;
    return true;
}

sv_status sv_model_add_orbital(sv_context *context, sv_model *model, const char *name, double x,
                               double y, double onsite)
{
    if (name[0] == '\0' || strlen(name) >= sizeof model->orbitals[0].name)
        return SV_FAIL(context, SV_INVALID_INPUT, "an orbital name has 1 to %zu characters",
                       sizeof model->orbitals[0].name - 1);
    if (!is_plain_name(name))
        return SV_FAIL(context, SV_INVALID_INPUT,
                       "an orbital name begins with a letter, a digit or _ and holds no comma, "
                       "quote or control character");
    if (strcmp(name, "any") == 0)
        return SV_FAIL(context, SV_INVALID_INPUT, "\"any\" stands for all orbitals");
    if (sv_model_find_orbital(model, name) >= 0)
        return SV_FAIL(context, SV_INVALID_INPUT, "two orbitals are named \"%s\"", name);
    if (model->n_orbitals >= MOST_ORBITALS)
        return SV_FAIL(context, SV_INVALID_INPUT, "more than %d orbitals in a cell", MOST_ORBITALS);
    sv_status status = sv_reserve(context, &model->orbitals, &model->orbital_capacity,
                                  model->n_orbitals + 1, sizeof *model->orbitals);
    if (status != SV_OK)
        return status;
    sv_orbital *orbital = &model->orbitals[model->n_orbitals++];
    *orbital = (sv_orbital){.at = {x, y}, .onsite = onsite};
    snprintf(orbital->name, sizeof orbital->name, "%s", name);
    return SV_OK;
}

sv_status sv_model_set_spin(sv_context *context, sv_model *model, int orbital, int spin)
{
    if (orbital < 0 || orbital >= model->n_orbitals || (spin != 1 && spin != -1))
        return SV_FAIL(context, SV_INVALID_INPUT, "spin %d of orbital %d: expected 1 or -1", spin,
                       orbital);
    model->orbitals[orbital].spin = spin;
    return SV_OK;
}

bool sv_model_has_spin(const sv_model *model)
{
    for (int k = 0; k < model->n_orbitals; k++)
        if (model->orbitals[k].spin == 0)
            return false;
    return model->n_orbitals > 0;
}

/* ------------------------------------------------------------------- hops */

static bool same_hop(const sv_hop *hop, int from, int to, int i, int j)
{
    bool forward = hop->from == from && hop->to == to && hop->shift[0] == i && hop->shift[1] == j;
    bool backward =
        hop->from == to && hop->to == from && hop->shift[0] == -i && hop->shift[1] == -j;
    return forward || backward;
}

/* One number for a hop and its conjugate, well mixed (finaliser of MurmurHash3, public domain). */
static uint64_t hop_hash(int from, int to, int i, int j)
{
    bool turned = from > to || (from == to && (i < 0 || (i == 0 && j < 0)));
    uint64_t key = (uint64_t)(turned ? to : from) * MOST_ORBITALS + (uint64_t)(turned ? from : to);
    key = key * 4096 + (uint64_t)((turned ? -i : i) + 2048);
    key = key * 4096 + (uint64_t)((turned ? -j : j) + 2048);
    key = (key ^ (key >> 33)) * 0xff51afd7ed558ccdULL;
    key = (key ^ (key >> 33)) * 0xc4ceb9fe1a85ec53ULL;
    return key ^ (key >> 33);
}

/* Slot that holds the hop, or the empty one where it would go. */
static sv_index find_slot(const sv_model *model, int from, int to, int i, int j)
{
    sv_index mask = model->n_hop_slots - 1;
    sv_index slot = (sv_index)(hop_hash(from, to, i, j) & (uint64_t)mask);
    while (model->hop_slots[slot] != 0 &&
           !same_hop(&model->hops[model->hop_slots[slot] - 1], from, to, i, j))
        slot = (slot + 1) & mask;
    return slot;
}

int sv_model_find_hop(const sv_model *model, int from, int to, int shift_i, int shift_j)
{
    if (model->n_hop_slots == 0)
        return -1;
    return model->hop_slots[find_slot(model, from, to, shift_i, shift_j)] - 1;
}

/* Keeps at least half of the slots empty. */
static sv_status grow_slots(sv_context *context, sv_model *model)
{
    if (2 * ((sv_index)model->n_hops + 1) <= model->n_hop_slots)
        return SV_OK;
    sv_index n = model->n_hop_slots == 0 ? 64 : 2 * model->n_hop_slots;
    int32_t *slots = NULL;
    sv_status status = sv_take(context, n, sizeof *slots, &slots);
    if (status != SV_OK)
        return status;
    sv_give(context, model->hop_slots);
    model->hop_slots = slots;
    model->n_hop_slots = n;
    for (int h = 0; h < model->n_hops; h++) {
        const sv_hop *hop = &model->hops[h];
        slots[find_slot(model, hop->from, hop->to, hop->shift[0], hop->shift[1])] = h + 1;
    }
    return SV_OK;
}

static sv_status check_hop(sv_context *context, const sv_model *model, const sv_hop *hop)
{
    const int far = FARTHEST_CELL, *shift = hop->shift;
    if (hop->from < 0 || hop->to < 0 || hop->from >= model->n_orbitals ||
        hop->to >= model->n_orbitals)
        return SV_FAIL(context, SV_INVALID_INPUT, "a hop names an orbital that is not there");
    if (shift[0] < -far || shift[0] > far || shift[1] < -far || shift[1] > far)
        return SV_FAIL(context, SV_INVALID_INPUT, "a hop reaches farther than %d cells", far);
    if (hop->from == hop->to && shift[0] == 0 && shift[1] == 0)
        return SV_FAIL(context, SV_INVALID_INPUT,
                       "a hop from an orbital to itself is an on-site energy; put it there");
    if (sv_model_find_hop(model, hop->from, hop->to, shift[0], shift[1]) >= 0)
        return SV_FAIL(context, SV_INVALID_INPUT,
                       "the hop %s → %s, shift [%d, %d], is listed twice (its conjugate "
                       "follows by itself)",
                       model->orbitals[hop->from].name, model->orbitals[hop->to].name, shift[0],
                       shift[1]);
    if (model->n_hops >= MOST_HOPS)
        return SV_FAIL(context, SV_INVALID_INPUT, "more than %d hops", MOST_HOPS);
    return SV_OK;
}

sv_status sv_model_add_hop(sv_context *context, sv_model *model, int from, int to, int shift_i,
                           int shift_j, sv_complex amplitude)
{
    const sv_hop hop = {from, to, {shift_i, shift_j}, amplitude};
    sv_status status = check_hop(context, model, &hop);
    if (status == SV_OK)
        status = grow_slots(context, model);
    if (status == SV_OK)
        status = sv_reserve(context, &model->hops, &model->hop_capacity, model->n_hops + 1,
                            sizeof *model->hops);
    if (status != SV_OK)
        return status;
    model->hop_slots[find_slot(model, from, to, shift_i, shift_j)] = model->n_hops + 1;
    model->hops[model->n_hops++] = hop;
    double size = cabs(amplitude);
    if (from == to) {
        model->orbitals[from].coupled += size + size;
    } else {
        model->orbitals[from].coupled += size;
        model->orbitals[to].coupled += size;
    }
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
    sv_give(context, model->hop_slots);
    sv_give(context, model->rules);
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

double sv_model_vector_area(const sv_model *model)
{
    return cross(model->vectors[0], model->vectors[1]);
}

double sv_model_cell_area(const sv_model *model)
{
    return model->site_area > 0.0 ? model->site_area : sv_model_vector_area(model);
}

void sv_model_reduce(const sv_model *model, const double at[2], double ret_uv[2])
{
    double area = sv_model_vector_area(model);
    ret_uv[0] = cross(at, model->vectors[1]) / area;
    ret_uv[1] = cross(model->vectors[0], at) / area;
}

double sv_model_norm_bound(const sv_model *model)
{
    double bound = 0.0;
    for (int k = 0; k < model->n_orbitals; k++)
        bound = fmax(bound, fabs(model->orbitals[k].onsite) + model->orbitals[k].coupled);
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
