/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Structures: cells of the plane for their sites, hull, and what they ask of a flake. */
#include "structure_internal.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

/* Elements of the table of cells. */
static const double MOST_CELLS = 2e8;

static sv_status refuse_pair(sv_context *context, const sv_structure *s, sv_index a, sv_index b,
                             double least, sv_table_fault *fault)
{
    return sv_structure_fail(
        context, fault, s->line[a], 1, "flake.least_distance states how near two sites may be",
        "this site and that of line %d are %.4g lattice constants apart, less "
        "than %.4g",
        s->line[b], hypot(s->at[a][0] - s->at[b][0], s->at[a][1] - s->at[b][1]), least);
}

static sv_status take_cells(sv_context *context, double side, sv_structure *s,
                            sv_table_fault *fault)
{
    sv_status status = sv_take(context, s->n, sizeof *s->cell, &s->cell);
    if (status != SV_OK)
        return status;
    s->low[0] = s->low[1] = INT32_MAX;
    s->high[0] = s->high[1] = INT32_MIN;
    for (sv_index k = 0; k < s->n; k++)
        for (int d = 0; d < 2; d++) {
            double at = floor(s->at[k][d] / side);
            if (!(fabs(at) < 1e9))
                return sv_structure_fail(context, fault, s->line[k], 1,
                                         "state a larger flake.least_distance",
                                         "the site lies too far out to be numbered");
            s->cell[k][d] = (int32_t)at;
            s->low[d] = s->cell[k][d] < s->low[d] ? s->cell[k][d] : s->low[d];
            s->high[d] = s->cell[k][d] > s->high[d] ? s->cell[k][d] : s->high[d];
        }
    double box = ((double)s->high[0] - s->low[0] + 1.0) * ((double)s->high[1] - s->low[1] + 1.0);
    if (box > MOST_CELLS)
        return sv_structure_fail(context, fault, 1, 1, "state a larger flake.least_distance",
                                 "the sites spread over %.3g times the square of their least "
                                 "distance, more than %g",
                                 0.5 * box, 0.5 * MOST_CELLS);
    status = sv_take_raw(context, (sv_index)box, sizeof *s->cell_at, &s->cell_at);
    if (status == SV_OK)
        memset(s->cell_at, 0xff, (size_t)box * sizeof *s->cell_at);
    return status;
}

/* Puts the sites into their cells; two in one cell, or nearer than `least`, are refused. */
static sv_status place_sites(sv_context *context, double least, sv_structure *s,
                             sv_table_fault *fault)
{
    int64_t width = (int64_t)s->high[1] - s->low[1] + 1;
    for (sv_index k = 0; k < s->n; k++) {
        const int32_t *cell = s->cell[k];
        for (int64_t i = (int64_t)cell[0] - 2; i <= (int64_t)cell[0] + 2; i++)
            for (int64_t j = (int64_t)cell[1] - 2; j <= (int64_t)cell[1] + 2; j++) {
                if (i < s->low[0] || i > s->high[0] || j < s->low[1] || j > s->high[1])
                    continue;
                int32_t other = s->cell_at[(i - s->low[0]) * width + (j - s->low[1])];
                bool near = other >= 0 && hypot(s->at[k][0] - s->at[other][0],
                                                s->at[k][1] - s->at[other][1]) < least;
                if (near || (other >= 0 && i == cell[0] && j == cell[1]))
                    return refuse_pair(context, s, k, other, least, fault);
            }
        s->cell_at[(cell[0] - s->low[0]) * width + (cell[1] - s->low[1])] = (int32_t)k;
    }
    return SV_OK;
}

static int compare_points(const void *a, const void *b)
{
    const double *x = a, *y = b;
    if (x[0] != y[0])
        return x[0] < y[0] ? -1 : 1;
    return x[1] < y[1] ? -1 : x[1] > y[1];
}

static double turn(const double a[2], const double b[2], const double c[2])
{
    return (b[0] - a[0]) * (c[1] - a[1]) - (b[1] - a[1]) * (c[0] - a[0]);
}

/* Convex hull, counter-clockwise (A. M. Andrew, Inf. Process. Lett. 9, 216 (1979), value recalled
 * from memory). Points on its sides are left out. */
static sv_status make_hull(sv_context *context, sv_structure *s, sv_table_fault *fault)
{
    double(*sorted)[2] = NULL, (*hull)[2] = NULL;
    sv_status status = sv_take_raw(context, s->n, sizeof *sorted, &sorted);
    if (status == SV_OK)
        status = sv_take_raw(context, 2 * s->n + 1, sizeof *hull, &hull);
    s->corners = (double *)hull;
    if (status != SV_OK) {
        sv_give(context, sorted);
        return status;
    }
    memcpy(sorted, s->at, (size_t)s->n * sizeof *sorted);
    qsort(sorted, (size_t)s->n, sizeof *sorted, compare_points);
    sv_index m = 0;
    for (int side = 0; side < 2; side++) {
        const sv_index start = m;
        for (sv_index k = 0; k < s->n; k++) {
            const double *p = sorted[side == 0 ? k : s->n - 1 - k];
            while (m >= start + 2 && turn(hull[m - 2], hull[m - 1], p) <= 1e-12)
                m--;
            memcpy(hull[m++], p, sizeof *hull);
        }
        m--; /* the last point begins the other side */
    }
    sv_give(context, sorted);
    s->loop_start[1] = (int32_t)m;
    if (m >= 3) {
        const sv_polygon loop = {s->corners, s->loop_start, 1};
        s->area = sv_polygon_area(&loop, s->centre);
    }
    if (m < 3 || !(s->area > 1e-6))
        return sv_structure_fail(context, fault, 1, 1, NULL,
                                 "the %lld sites span no area: they lie on a line",
                                 (long long)s->n);
    return SV_OK;
}

static sv_status check_thickness(sv_context *context, double thickness, const sv_structure *s,
                                 sv_table_fault *fault)
{
    if (s->z[1] - s->z[0] <= thickness + 1e-9)
        return SV_OK;
    return sv_structure_fail(
        context, fault, 2, 1, "flake.thickness states how much of z may be projected away",
        "z goes from %.4g to %.4g lattice constants, more than %.4g", s->z[0], s->z[1], thickness);
}

/* The model gets the cells, and the sums of its hops, which bound the energies. */
static void finish_model(sv_model *model, double side, const sv_structure *s)
{
    memcpy(model->vectors, (const double[2][2]){{side, 0.0}, {0.0, side}}, sizeof model->vectors);
    model->site_area = s->area / (double)s->n;
    for (int k = 0; k < model->n_orbitals; k++) {
        model->orbitals[k].at[0] = model->orbitals[k].at[1] = 0.5 * side;
        model->orbitals[k].coupled = 0.0;
    }
    for (sv_index row = 0; row < s->n; row++) {
        sv_orbital *orbital = &model->orbitals[s->species[row]];
        double sum = 0.0;
        for (sv_index k = s->bond_start[row]; k < s->bond_start[row + 1]; k++)
            sum += cabs(s->bond[k]);
        orbital->coupled = fmax(orbital->coupled, sum);
    }
}

sv_status sv_structure_make(sv_context *context, sv_model *model, const char *text, size_t size,
                            const sv_structure_options *options, sv_structure *ret_structure,
                            sv_table_fault *ret_fault)
{
    sv_structure s = {0};
    /* The diagonal of a cell is a little shorter than the least distance. */
    const double side = options->least_distance * M_SQRT1_2 * (1.0 - 1e-9);
    sv_status status = SV_OK;
    *ret_fault = (sv_table_fault){0};
    if (model->n_rules == 0)
        return SV_FAIL(context, SV_INVALID_INPUT, "a structure needs a model of hops by distance");
    if (!(options->unit > 0.0 && options->least_distance > 0.0))
        return SV_FAIL(context, SV_INVALID_INPUT, "unit %g and least distance %g of a structure",
                       options->unit, options->least_distance);
    if ((status = sv_structure_read(context, model, text, size, options->unit, &s, ret_fault)) ==
            SV_OK &&
        (status = check_thickness(context, options->thickness, &s, ret_fault)) == SV_OK &&
        (status = take_cells(context, side, &s, ret_fault)) == SV_OK &&
        (status = place_sites(context, options->least_distance, &s, ret_fault)) == SV_OK &&
        (status = make_hull(context, &s, ret_fault)) == SV_OK &&
        (status = sv_structure_join(context, model, &s, ret_fault)) == SV_OK) {
        finish_model(model, side, &s);
        *ret_structure = s;
        return SV_OK;
    }
    sv_structure_free(context, &s);
    return status;
}

void sv_structure_free(sv_context *context, sv_structure *s)
{
    sv_give(context, s->at);
    sv_give(context, s->species);
    sv_give(context, s->line);
    sv_give(context, s->bond_start);
    sv_give(context, s->bond_to);
    sv_give(context, s->bond);
    sv_give(context, s->cell);
    sv_give(context, s->cell_at);
    sv_give(context, s->corners);
    *s = (sv_structure){0};
}

double sv_structure_depth(const sv_structure *s, const double at[2])
{
    const sv_polygon hull = {s->corners, s->loop_start, 1};
    double distance = sv_polygon_distance(&hull, 0, 1, at);
    return sv_polygon_holds(&hull, at) ? distance : -distance;
}

const char *sv_structure_refusal(const sv_disorder *disorder)
{
    switch (disorder->type) {
    case SV_DISORDER_VACANCIES:
        if (disorder->distance > 0.0)
            return "the share of vacancies at a minimum distance follows from a lattice";
        if (disorder->cluster_size > 0.0 && disorder->on >= 0)
            return "clusters on one species need its share of the sites";
        break;
    case SV_DISORDER_ONSITE:
    case SV_DISORDER_ADATOMS:
        break;
    case SV_DISORDER_MASS:
        return "its model has no such local operator; onsite acts on the potential";
    case SV_DISORDER_HOPPING:
    case SV_DISORDER_FLUX:
    case SV_DISORDER_CRACKS:
    case SV_DISORDER_DOMAINS:
    case SV_DISORDER_ROUGHNESS:
    case SV_DISORDER_STEPS:
        return "this kind goes by cells and hops of a lattice";
    }
    for (sv_index k = 0; disorder->has_marks && k < disorder->n_marks; k++)
        if (disorder->marks[k].by_cell)
            return "rows that name a cell need a lattice; give positions";
    return NULL;
}
