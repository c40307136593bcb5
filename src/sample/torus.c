/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Closing a flake: which tori exist, and where a cell beyond an edge comes back in. */
#include "sample_internal.h"

#include <math.h>
#include <stdio.h>
#include <string.h>

static const double NEAR = 1e-6;

static int greatest_divisor(int a, int b)
{
    while (b != 0) {
        int rest = a % b;
        a = b;
        b = rest;
    }
    return a < 0 ? -a : a;
}

/* Denominator of the flux in lowest terms. */
static int flux_denominator(const sv_model *model)
{
    if (model->flux[0] == 0)
        return 1;
    return model->flux[1] / greatest_divisor(model->flux[0], model->flux[1]);
}

static bool is_lattice_vector(const sv_model *model, double x, double y, int32_t ret_row[2])
{
    double uv[2];
    sv_model_reduce(model, (const double[2]){x, y}, uv);
    for (int k = 0; k < 2; k++) {
        if (fabs(uv[k] - round(uv[k])) > NEAR || fabs(uv[k]) > 1e6)
            return false;
        ret_row[k] = (int32_t)lround(uv[k]);
    }
    return ret_row[0] != 0 || ret_row[1] != 0;
}

static bool torus_by_size(const sv_model *model, const sv_flake_spec *spec, const bool periodic[2],
                          int32_t ret_period[2][2], char *reason, size_t size)
{
    const char *const side[2] = {"x", "y"};
    for (int k = 0; k < 2; k++) {
        if (!periodic[k])
            continue;
        if (flux_denominator(model) != 1) {
            snprintf(reason, size, "a rectangle by size with flux has no torus; use cells");
            return false;
        }
        if (!is_lattice_vector(model, k == 0 ? spec->size[0] : 0.0, k == 1 ? spec->size[1] : 0.0,
                               ret_period[k])) {
            snprintf(reason, size,
                     "the rectangle does not tile along %s: its size is no lattice vector",
                     side[k]);
            return false;
        }
    }
    return true;
}

/* A closed torus needs a side that is a multiple of q; with one side open any flux fits. */
static bool flux_fits(const sv_model *model, const sv_flake_spec *spec, const bool periodic[2],
                      char *reason, size_t size)
{
    int q = flux_denominator(model);
    if (spec->shape == SV_SHAPE_RIBBON && spec->edge == SV_EDGE_ARMCHAIR && q != 1) {
        /* Its torus vectors are oblique to the gauge. */
        snprintf(reason, size, "an armchair ribbon with flux has no torus; use edge: zigzag");
        return false;
    }
    if (!(periodic[0] && periodic[1]) || spec->cells[0] % q == 0 || spec->cells[1] % q == 0)
        return true;
    snprintf(reason, size, "flux %d/%d does not fit a torus of %lld×%lld cells (multiple of %d)",
             model->flux[0], model->flux[1], (long long)spec->cells[0], (long long)spec->cells[1],
             q);
    return false;
}

static void torus_by_cells(const sv_flake_spec *spec, const bool periodic[2],
                           int32_t ret_period[2][2])
{
    int32_t n1 = (int32_t)spec->cells[0], n2 = (int32_t)spec->cells[1];
    bool armchair = spec->shape == SV_SHAPE_RIBBON && spec->edge == SV_EDGE_ARMCHAIR;
    if (periodic[0]) {
        ret_period[0][0] = n1;
        ret_period[0][1] = armchair ? n1 : 0;
    }
    /* Armchair: n2 rows of dimers across, half a period along where n2 is odd. */
    if (periodic[1]) {
        ret_period[1][0] = armchair ? -(n2 / 2) : 0;
        ret_period[1][1] = armchair ? n2 - n2 / 2 : n2;
    }
}

bool sv_flake_torus(const sv_model *model, const sv_flake_spec *spec, const bool periodic[2],
                    int32_t ret_period[2][2], char *reason, size_t reason_size)
{
    memset(ret_period, 0, 4 * sizeof(int32_t));
    if (!periodic[0] && !periodic[1])
        return true;
    int64_t place[2];
    bool box = sv_box_place(spec, 0, 0, place);
    if (!box && spec->shape != SV_SHAPE_RECTANGLE) {
        int count;
        const char *name = sv_shape_kinds(&count)[spec->shape].name;
        snprintf(reason, reason_size, "%s %s has no torus", name[0] == 'a' ? "an" : "a", name);
        return false;
    }
    if (!box)
        return torus_by_size(model, spec, periodic, ret_period, reason, reason_size);
    torus_by_cells(spec, periodic, ret_period);
    return flux_fits(model, spec, periodic, reason, reason_size);
}

sv_closure sv_flake_can_close(const sv_model *model, const sv_flake_spec *spec)
{
    sv_closure closure = {0};
    int32_t period[2][2];
    closure.possible = sv_flake_torus(model, spec, (const bool[2]){true, true}, period,
                                      closure.reason, sizeof closure.reason);
    return closure;
}

int32_t sv_flake_look_up(const sv_flake *flake, int64_t i, int64_t j)
{
    if (i < flake->low[0] || i > flake->high[0] || j < flake->low[1] || j > flake->high[1])
        return -1;
    int64_t width = (int64_t)flake->high[1] - flake->low[1] + 1;
    return flake->cell_at[(i - flake->low[0]) * width + (j - flake->low[1])];
}

/* How many times each torus vector goes into (i, j), measured from the middle of the flake. */
static void whole_turns(const sv_flake *flake, double i, double j, int64_t ret_turns[2])
{
    const int32_t(*t)[2] = flake->period;
    double x = i - 0.5 * ((double)flake->low[0] + flake->high[0]);
    double y = j - 0.5 * ((double)flake->low[1] + flake->high[1]);
    ret_turns[0] = ret_turns[1] = 0;
    if (flake->periodic[0] && flake->periodic[1]) {
        double det = (double)t[0][0] * t[1][1] - (double)t[0][1] * t[1][0];
        ret_turns[0] = llround((x * t[1][1] - y * t[1][0]) / det);
        ret_turns[1] = llround((y * t[0][0] - x * t[0][1]) / det);
        return;
    }
    int k = flake->periodic[0] ? 0 : 1;
    double square = (double)t[k][0] * t[k][0] + (double)t[k][1] * t[k][1];
    ret_turns[k] = llround((x * t[k][0] + y * t[k][1]) / square);
}

landing sv_flake_land(const sv_flake *flake, int64_t i, int64_t j)
{
    landing result = {.cell = sv_flake_look_up(flake, i, j)};
    if (result.cell >= 0 || !(flake->periodic[0] || flake->periodic[1]))
        return result;
    int64_t turns[2];
    whole_turns(flake, (double)i, (double)j, turns);
    for (int64_t da = -1; da <= 1; da++) {
        for (int64_t db = -1; db <= 1; db++) {
            if ((da != 0 && !flake->periodic[0]) || (db != 0 && !flake->periodic[1]))
                continue;
            int64_t a = turns[0] + da, b = turns[1] + db;
            int64_t ti = a * flake->period[0][0] + b * flake->period[1][0];
            int64_t tj = a * flake->period[0][1] + b * flake->period[1][1];
            int32_t cell = sv_flake_look_up(flake, i - ti, j - tj);
            if (cell >= 0)
                return (landing){cell, {(int32_t)ti, (int32_t)tj}};
        }
    }
    return result;
}
