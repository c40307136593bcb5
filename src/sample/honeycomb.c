/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Honeycomb lattices: recognising one, and flakes made of whole hexagons or rings. */
#include "sample_internal.h"

#include <math.h>
#include <stdlib.h>

void sv_lattice_point(const sv_model *model, double i, double j, double ret_at[2])
{
    ret_at[0] = i * model->vectors[0][0] + j * model->vectors[1][0];
    ret_at[1] = i * model->vectors[0][1] + j * model->vectors[1][1];
}

bool sv_model_is_honeycomb(const sv_model *model, double ret_centre[2])
{
    const double *a1 = model->vectors[0], *a2 = model->vectors[1];
    double square = a1[0] * a1[0] + a1[1] * a1[1];
    double other = a2[0] * a2[0] + a2[1] * a2[1];
    double dot = a1[0] * a2[0] + a1[1] * a2[1];
    if (fabs(other - square) > 1e-6 * square || fabs(dot - square / 2) > 1e-6 * square ||
        model->n_positions != 2)
        return false;
    const double *first = model->orbitals[0].at, *second = first;
    for (int k = 0; k < model->n_orbitals; k++)
        if (model->orbitals[k].position == 1)
            second = model->orbitals[k].at;
    double uv[2];
    sv_model_reduce(model, (const double[2]){second[0] - first[0], second[1] - first[1]}, uv);
    /* The other position is a third of the long diagonal ahead (+) or behind (−). */
    for (int sign = 1; sign >= -1; sign -= 2) {
        double u = uv[0] - sign / 3.0, v = uv[1] - sign / 3.0;
        if (fabs(u - round(u)) < 1e-6 && fabs(v - round(v)) < 1e-6) {
            sv_lattice_point(model, -sign / 3.0, -sign / 3.0, ret_centre);
            ret_centre[0] += first[0];
            ret_centre[1] += first[1];
            return true;
        }
    }
    return false;
}

/* Is hexagon (p, q), counted along vectors at 60°, one of the n a side around or right of (0, 0)?
 */
static bool hexagon_in_shape(const sv_flake_spec *spec, long p, long q)
{
    long most = (long)spec->cells[0] - 1;
    if (spec->shape == SV_SHAPE_TRIANGLE)
        return p >= 0 && q >= 0 && p + q <= most;
    return labs(p) <= most && labs(q) <= most && labs(p + q) <= most;
}

/* Armchair flakes are tiled by the rings with p − q a multiple of 3, a lattice √3 times as wide
 * with vectors a1 + a2 and 2 a2 − a1. */
static bool is_ring(long p, long q)
{
    return (p - q) % 3 == 0;
}

/* A vertex belongs to three hexagons; zigzag: it is in if one of them is; armchair: if its ring is.
 */
bool sv_vertex_in_shape(const outline *o, const double at[2])
{
    double uv[2];
    sv_model_reduce(o->model, (const double[2]){at[0] - o->origin[0], at[1] - o->origin[1]}, uv);
    long p = lround(uv[0] - 1.0 / 3.0), q = lround(uv[1] - 1.0 / 3.0);
    bool upward = fabs(uv[0] - 1.0 / 3.0 - (double)p) < 1e-6;
    if (!upward) {
        p = lround(uv[0] - 2.0 / 3.0);
        q = lround(uv[1] - 2.0 / 3.0);
    }
    long third = upward ? 0 : 1;
    const long hexagons[3][2] = {{p + 1, q}, {p, q + 1}, {p + third, q + third}};
    for (int k = 0; k < 3; k++) {
        long i = hexagons[k][0], j = hexagons[k][1];
        if (o->spec->edge != SV_EDGE_ARMCHAIR) {
            if (hexagon_in_shape(o->spec, i, j))
                return true;
        } else if (is_ring(i, j)) {
            long t = (j - i) / 3;
            return hexagon_in_shape(o->spec, i + t, t);
        }
    }
    return false;
}

double sv_honeycomb_positions(const sv_flake_spec *spec)
{
    double n = (double)spec->cells[0];
    bool armchair = spec->edge == SV_EDGE_ARMCHAIR;
    if (spec->shape == SV_SHAPE_TRIANGLE)
        return armchair ? 3.0 * n * (n + 1.0) : n * n + 4.0 * n + 1.0;
    return armchair ? 6.0 * (3.0 * n * (n - 1.0) + 1.0) : 6.0 * n * n;
}
