/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Which cells or sites a shape has. */
#include "sample_internal.h"

#include <math.h>
#include <string.h>

static const double EDGE = 1e-9; /* positions this near an edge count as on it */

void sv_cell_offset(const sv_model *model, double ret_offset[2])
{
    ret_offset[0] = ret_offset[1] = 0.0;
    for (int p = 0; p < model->n_positions; p++) {
        int k = 0;
        while (model->orbitals[k].position != p)
            k++;
        ret_offset[0] += model->orbitals[k].at[0] / model->n_positions;
        ret_offset[1] += model->orbitals[k].at[1] / model->n_positions;
    }
}

sv_regular sv_outline_regular(const sv_model *model, const sv_flake_spec *spec)
{
    const double *a1 = model->vectors[0];
    double n = (double)spec->cells[0], length = hypot(a1[0], a1[1]), along = atan2(a1[1], a1[0]);
    bool triangle = spec->shape == SV_SHAPE_TRIANGLE, armchair = spec->edge == SV_EDGE_ARMCHAIR;
    sv_regular r = {.sides = triangle ? 3 : 6};
    /* A triangle stands on its base, a hexagon by radius has a corner along x. */
    r.direction = triangle ? -0.5 * M_PI : M_PI / 6.0;
    if (!spec->has_cells) {
        r.inradius = triangle ? spec->side / (2.0 * sqrt(3.0)) : 0.5 * sqrt(3.0) * spec->radius;
        return r;
    }
    /* Zigzag: through the centres of the next row of hexagons; armchair: halfway to the next row
     * of rings. Both enclose the area of the sites to a fraction of a cell. */
    r.direction += along + (armchair ? M_PI / 6.0 : 0.0);
    if (triangle)
        r.inradius = armchair ? 0.5 * (n + 0.5) : (n + 2.0) / (2.0 * sqrt(3.0));
    else
        r.inradius = armchair ? 1.5 * (n - 0.5) : 0.5 * sqrt(3.0) * n;
    r.inradius *= length;
    return r;
}

bool sv_regular_holds(const sv_regular *regular, const double at[2], double share)
{
    for (int k = 0; k < regular->sides; k++) {
        double angle = regular->direction + 2.0 * M_PI * k / regular->sides;
        if (at[0] * cos(angle) + at[1] * sin(angle) > share * regular->inradius + EDGE)
            return false;
    }
    return true;
}

static bool is_armchair_ribbon(const sv_flake_spec *spec)
{
    return spec->shape == SV_SHAPE_RIBBON && spec->edge == SV_EDGE_ARMCHAIR;
}

bool sv_box_place(const sv_flake_spec *spec, int64_t i, int64_t j, int64_t ret_place[2])
{
    bool box = spec->shape == SV_SHAPE_PARALLELOGRAM || spec->shape == SV_SHAPE_RIBBON ||
               (spec->shape == SV_SHAPE_RECTANGLE && spec->has_cells);
    bool armchair = is_armchair_ribbon(spec);
    /* Armchair: a row of dimers has constant j − i; i + j steps by 2 along it. */
    int64_t sum = i + j;
    ret_place[0] = armchair ? (sum - (sum & 1)) / 2 : i;
    ret_place[1] = armchair ? j - i : j;
    return box;
}

static bool point_in_shape(const outline *o, const double d[2])
{
    const sv_flake_spec *spec = o->spec;
    sv_regular regular;
    switch (spec->shape) {
    case SV_SHAPE_RECTANGLE:
        return d[0] > -EDGE && d[0] < spec->size[0] - EDGE && d[1] > -EDGE &&
               d[1] < spec->size[1] - EDGE;
    case SV_SHAPE_TRIANGLE:
    case SV_SHAPE_HEXAGON:
        regular = sv_outline_regular(o->model, spec);
        return sv_regular_holds(&regular, d, 1.0);
    case SV_SHAPE_DISC:
        return hypot(d[0], d[1]) <= spec->radius + EDGE;
    case SV_SHAPE_ANNULUS:
        return hypot(d[0], d[1]) <= spec->outer + EDGE && hypot(d[0], d[1]) >= spec->inner - EDGE;
    case SV_SHAPE_POLYGON:
        return sv_polygon_holds(&spec->polygon, d);
    case SV_SHAPE_PARALLELOGRAM:
    case SV_SHAPE_RIBBON:
    case SV_SHAPE_STRUCTURE:
        break;
    }
    return false;
}

bool sv_outline_holds(const outline *o, int64_t i, int64_t j, int orbital)
{
    double at[2];
    int64_t place[2];
    if (sv_box_place(o->spec, i, j, place))
        return place[0] >= 0 && place[0] < o->spec->cells[0] && place[1] >= 0 &&
               place[1] < o->spec->cells[1];
    sv_lattice_point(o->model, (double)i, (double)j, at);
    if (!o->by_site) {
        /* A rectangle and a polygon lie where they say; the others about cell (0, 0). */
        bool fixed = o->spec->shape == SV_SHAPE_RECTANGLE || o->spec->shape == SV_SHAPE_POLYGON;
        at[0] += fixed ? o->origin[0] : 0.0;
        at[1] += fixed ? o->origin[1] : 0.0;
        return point_in_shape(o, at);
    }
    at[0] += o->model->orbitals[orbital].at[0];
    at[1] += o->model->orbitals[orbital].at[1];
    return sv_vertex_in_shape(o, at);
}

bool sv_outline_centre(const outline *o, double ret_centre[2])
{
    const sv_flake_spec *spec = o->spec;
    int64_t place[2];
    if (sv_box_place(spec, 0, 0, place))
        return false;
    memcpy(ret_centre, o->origin, 2 * sizeof *ret_centre);
    if (spec->shape == SV_SHAPE_RECTANGLE) {
        ret_centre[0] = 0.5 * spec->size[0];
        ret_centre[1] = 0.5 * spec->size[1];
    } else if (spec->shape == SV_SHAPE_POLYGON) {
        sv_polygon_area(&spec->polygon, ret_centre);
    } else if (spec->shape == SV_SHAPE_TRIANGLE && spec->has_cells) {
        /* Corner hexagons at 0 and n − 1 steps along either lattice of hexagons or rings. */
        double third = ((double)spec->cells[0] - 1.0) / 3.0, at[2];
        bool armchair = spec->edge == SV_EDGE_ARMCHAIR;
        sv_lattice_point(o->model, armchair ? 0.0 : third, armchair ? 3.0 * third : third, at);
        ret_centre[0] += at[0];
        ret_centre[1] += at[1];
    }
    return true;
}

double sv_outline_estimate(const outline *o)
{
    const sv_flake_spec *spec = o->spec;
    double area = 0.0, rim = 1.0, orbitals = o->model->n_orbitals, centroid[2];
    int64_t place[2];
    if (o->by_site)
        return 0.5 * sv_honeycomb_positions(spec) * orbitals;
    if (sv_box_place(spec, 0, 0, place))
        return (double)spec->cells[0] * (double)spec->cells[1] * orbitals;
    sv_regular regular = sv_outline_regular(o->model, spec);
    double r = spec->radius + rim, inradius = regular.inradius + rim;
    switch (spec->shape) {
    case SV_SHAPE_DISC:
        area = M_PI * r * r;
        break;
    case SV_SHAPE_HEXAGON:
        area = 2.0 * sqrt(3.0) * inradius * inradius;
        break;
    case SV_SHAPE_TRIANGLE:
        area = 3.0 * sqrt(3.0) * inradius * inradius;
        break;
    case SV_SHAPE_ANNULUS:
        area = M_PI * (pow(spec->outer + rim, 2.0) - pow(fmax(spec->inner - rim, 0.0), 2.0));
        break;
    case SV_SHAPE_POLYGON:
        area = sv_polygon_area(&spec->polygon, centroid) + rim * sv_polygon_length(&spec->polygon) +
               M_PI * rim * rim;
        break;
    default:
        area = (spec->size[0] + rim) * (spec->size[1] + rim);
    }
    return area / sv_model_cell_area(o->model) * orbitals;
}
