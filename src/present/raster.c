/* SPDX-License-Identifier: GPL-3.0-or-later */
/*
 * A flake as pixels. A pixel belongs to the lattice position nearest to it, taken over the whole
 * infinite lattice, and shows the marker of that position's cell; it lies outside when the flake
 * does not have the position. This gives every site its Voronoi cell and the flake its true edge:
 * a zigzag hexagon of honeycomb comes out with straight sides.
 */
#include <math.h>
#include <string.h>

#include "present_internal.h"

enum { LEAST_PIXELS = 900, MOST_PIXELS = 1600, PIXELS_PER_CELL = 8 };
enum { PRISTINE = 1, PRESENT = 2 };

/* What the loop over pixels needs to know. */
typedef struct painter {
    const sv_flake *flake;
    const bool *window;
    double (*at)[2]; /* Cartesian positions in the cell */
    double (*uv)[2]; /* the same, reduced */
    int n_positions;
    uint8_t *state;   /* per cell and position: PRISTINE, PRESENT */
    double *cell_sum; /* marker per cell */
    int reach;        /* cells to look at around the nearest one */
} painter;

static void drop_painter(sv_context *context, painter *p)
{
    sv_give(context, p->at);
    sv_give(context, p->uv);
    sv_give(context, p->state);
    sv_give(context, p->cell_sum);
}

/* Marks which positions of which cells exist, and which still hold an orbital. */
static void mark_sites(painter *p, const sv_map_result *map)
{
    const sv_flake *flake = p->flake;
    for (sv_index k = 0; k < flake->n_sites; k++) {
        const sv_site *site = &flake->sites[k];
        p->state[site->cell * p->n_positions + flake->model->orbitals[site->orbital].position] |=
            PRISTINE;
    }
    for (sv_index k = 0; k < map->sample->n; k++) {
        const sv_site *site = &flake->sites[map->sample->pristine[k]];
        p->state[site->cell * p->n_positions + flake->model->orbitals[site->orbital].position] |=
            PRESENT;
        if (map->site_values != NULL)
            p->cell_sum[site->cell] += map->site_values[k];
    }
}

static sv_status make_painter(sv_context *context, const sv_map_result *map, const bool *window,
                              painter *p)
{
    const sv_flake *flake = map->sample->flake;
    const sv_model *model = flake->model;
    const double(*a)[2] = model->vectors;
    const double dot = fabs(a[0][0] * a[1][0] + a[0][1] * a[1][1]);
    const double least =
        fmin(a[0][0] * a[0][0] + a[0][1] * a[0][1], a[1][0] * a[1][0] + a[1][1] * a[1][1]);
    *p = (painter){.flake = flake, .window = window, .n_positions = model->n_positions};
    /* In a reduced basis the nearest point is next to the rounded one; oblique bases need more. */
    p->reach = dot <= 0.5 * least * (1 + 1e-9) ? 1 : 3;
    sv_status status = sv_take(context, p->n_positions, sizeof *p->at, &p->at);
    if (status == SV_OK)
        status = sv_take(context, p->n_positions, sizeof *p->uv, &p->uv);
    if (status == SV_OK)
        status = sv_take(context, flake->n_cells * p->n_positions, 1, &p->state);
    if (status == SV_OK)
        status = sv_take(context, flake->n_cells, sizeof *p->cell_sum, &p->cell_sum);
    if (status != SV_OK)
        return status;
    for (int o = 0; o < model->n_orbitals; o++) {
        const sv_orbital *orbital = &model->orbitals[o];
        memcpy(p->at[orbital->position], orbital->at, sizeof orbital->at);
        sv_model_reduce(model, orbital->at, p->uv[orbital->position]);
    }
    mark_sites(p, map);
    return SV_OK;
}

/* Position and cell nearest to a point of the plane. */
static int find_nearest(const painter *p, const double point[2], int64_t cell[2])
{
    const double(*a)[2] = p->flake->model->vectors;
    double uv[2], best = INFINITY;
    int found = 0;
    sv_model_reduce(p->flake->model, point, uv);
    for (int k = 0; k < p->n_positions; k++) {
        const int64_t ci = llround(uv[0] - p->uv[k][0]), cj = llround(uv[1] - p->uv[k][1]);
        for (int64_t i = ci - p->reach; i <= ci + p->reach; i++)
            for (int64_t j = cj - p->reach; j <= cj + p->reach; j++) {
                const double x = (double)i * a[0][0] + (double)j * a[1][0] + p->at[k][0] - point[0];
                const double y = (double)i * a[0][1] + (double)j * a[1][1] + p->at[k][1] - point[1];
                const double distance = x * x + y * y;
                if (distance < best) {
                    best = distance;
                    found = k;
                    cell[0] = i;
                    cell[1] = j;
                }
            }
    }
    return found;
}

static sv_index find_cell(const sv_flake *flake, const int64_t at[2])
{
    for (int k = 0; k < 2; k++)
        if (at[k] < flake->low[k] || at[k] > flake->high[k])
            return -1;
    const int64_t width = flake->high[1] - flake->low[1] + 1;
    return flake->cell_at[(at[0] - flake->low[0]) * width + (at[1] - flake->low[1])];
}

/* Of a structure: the nearest site, unless none is as near as sites are apart. */
static sv_index find_site(const sv_flake *flake, const double point[2])
{
    double distance;
    const sv_index site = sv_flake_nearest(flake, point, -1, &distance);
    return distance <= sqrt(sv_model_cell_area(flake->model)) ? site : -1;
}

static void paint_pixel(const painter *p, const double point[2], float *value, uint8_t *inside)
{
    int64_t at[2] = {0, 0};
    const bool lattice = p->flake->spec.structure == NULL;
    const int position = lattice ? find_nearest(p, point, at) : 0;
    const sv_index cell = lattice ? find_cell(p->flake, at) : find_site(p->flake, point);
    *value = nanf("");
    *inside = 0;
    if (cell < 0)
        return;
    const uint8_t state = p->state[cell * p->n_positions + position];
    if (state & PRISTINE)
        *inside = SV_PIXEL_FLAKE;
    if ((state & PRISTINE) && p->window != NULL && p->window[cell])
        *inside |= SV_PIXEL_WINDOW;
    if (state & PRESENT)
        *value = (float)p->cell_sum[cell];
}

/* Frame around all sites, half a cell wide, in square pixels. */
static void choose_grid(const sv_flake *flake, int most, sv_raster *raster)
{
    const double(*a)[2] = flake->model->vectors;
    const double margin = flake->spec.structure != NULL
                              ? 1.2 * sqrt(sv_model_cell_area(flake->model))
                              : 0.6 * (hypot(a[0][0], a[0][1]) + hypot(a[1][0], a[1][1]));
    double low[2] = {INFINITY, INFINITY}, high[2] = {-INFINITY, -INFINITY};
    for (sv_index k = 0; k < flake->n_sites; k++)
        for (int d = 0; d < 2; d++) {
            low[d] = fmin(low[d], flake->sites[k].at[d] - margin);
            high[d] = fmax(high[d], flake->sites[k].at[d] + margin);
        }
    const double size = fmax(high[0] - low[0], high[1] - low[1]);
    const double cells = size / sqrt(sv_model_cell_area(flake->model));
    const double fit = fmin(fmax(PIXELS_PER_CELL * cells, LEAST_PIXELS), MOST_PIXELS);
    const double pixels = most > 0 ? fmin(fit, most) : fit;
    raster->step = size / pixels;
    raster->nx = (int)ceil((high[0] - low[0]) / raster->step);
    raster->ny = (int)ceil((high[1] - low[1]) / raster->step);
    for (int d = 0; d < 2; d++)
        raster->low[d] = low[d] + 0.5 * raster->step;
}

sv_status sv_raster_make(sv_context *context, const sv_map_result *map, const bool *window,
                         int most, sv_raster *ret_raster)
{
    painter p;
    sv_raster raster = {0};
    choose_grid(map->sample->flake, most, &raster);
    const sv_index count = (sv_index)raster.nx * raster.ny;
    sv_status status = make_painter(context, map, window, &p);
    if (status == SV_OK)
        status = sv_take_raw(context, count, sizeof *raster.value, &raster.value);
    if (status == SV_OK)
        status = sv_take_raw(context, count, 1, &raster.inside);
    for (int y = 0; y < raster.ny && status == SV_OK; y++) {
        for (int x = 0; x < raster.nx; x++) {
            const double point[2] = {raster.low[0] + x * raster.step,
                                     raster.low[1] + y * raster.step};
            const sv_index k = (sv_index)y * raster.nx + x;
            paint_pixel(&p, point, &raster.value[k], &raster.inside[k]);
        }
        if (sv_cancelled(context))
            status = SV_FAIL(context, SV_INTERRUPTED, "stopped while drawing");
    }
    drop_painter(context, &p);
    if (status == SV_OK)
        *ret_raster = raster;
    else
        sv_raster_free(context, &raster);
    return status;
}

void sv_raster_frame(const sv_raster *r, double ret_low[2], double ret_high[2])
{
    int low[2] = {r->nx, r->ny}, high[2] = {0, 0};
    for (int y = 0; y < r->ny; y++)
        for (int x = 0; x < r->nx; x++) {
            if (r->inside[(sv_index)y * r->nx + x] == 0)
                continue;
            low[0] = x < low[0] ? x : low[0];
            high[0] = x > high[0] ? x : high[0];
            low[1] = y < low[1] ? y : low[1];
            high[1] = y > high[1] ? y : high[1];
        }
    const double air = 0.012 * fmax(high[0] - low[0], high[1] - low[1]);
    for (int d = 0; d < 2; d++) {
        ret_low[d] = r->low[d] + (low[d] - 0.5 - air) * r->step;
        ret_high[d] = r->low[d] + (high[d] + 0.5 + air) * r->step;
    }
}

void sv_raster_free(sv_context *context, sv_raster *raster)
{
    sv_give(context, raster->value);
    sv_give(context, raster->inside);
    *raster = (sv_raster){0};
}

/* Positions where every orbital is gone, in the order of the cells. */
sv_status sv_places_vacant(sv_context *context, const sv_sample *sample, sv_places *ret_places)
{
    const sv_map_result map = {.sample = sample};
    sv_places places = {0};
    painter p;
    sv_status status = make_painter(context, &map, NULL, &p);
    const sv_index count = p.flake->n_cells * p.n_positions;
    sv_index vacant = 0;
    for (sv_index k = 0; k < count && status == SV_OK; k++)
        vacant += p.state[k] == PRISTINE;
    if (status == SV_OK)
        status = sv_take(context, vacant, sizeof *places.at, &places.at);
    const double(*a)[2] = p.flake->model->vectors;
    for (sv_index k = 0; k < count && status == SV_OK; k++) {
        const sv_cell *cell = &p.flake->cells[k / p.n_positions];
        if (p.state[k] != PRISTINE)
            continue;
        for (int d = 0; d < 2; d++)
            places.at[places.count][d] =
                p.flake->spec.structure != NULL
                    ? p.flake->sites[cell->first_site].at[d]
                    : cell->i * a[0][d] + cell->j * a[1][d] + p.at[k % p.n_positions][d];
        places.count++;
    }
    drop_painter(context, &p);
    if (status == SV_OK)
        *ret_places = places;
    return status;
}
