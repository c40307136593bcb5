/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Shared inside the sample layer. */
#ifndef SELVEDGE_SAMPLE_INTERNAL_H
#define SELVEDGE_SAMPLE_INTERNAL_H

#include "selvedge/sample.h"

/* Where a cell index lands on the flake: its cell number (−1: outside), and the torus vector that
 * was taken off, in units of a1 and a2. */
typedef struct landing {
    int32_t cell;
    int32_t torus[2];
} landing;

landing sv_flake_land(const sv_flake *flake, int64_t i, int64_t j);

/* Pristine site of an orbital in a cell, or −1. */
sv_index sv_flake_site_of(const sv_flake *flake, int32_t cell, int32_t orbital);

/* A shape while it is being filled: a range of cells and a test of what lies inside. */
typedef struct outline {
    const sv_model *model;
    const sv_flake_spec *spec;
    int64_t low[2], high[2];
    double origin[2]; /* centre of cell (0, 0) or of the first hexagon */
    bool by_site;     /* sites are tested one by one (hexagons and rings of a honeycomb) */
} outline;

/* The range of cells of a shape; refuses what does not suit the lattice. */
sv_status sv_outline_make(sv_context *context, const sv_model *model, const sv_flake_spec *spec,
                          outline *ret_outline);
/* Does site `orbital` of cell (i, j) belong to the flake? */
bool sv_outline_holds(const outline *o, int64_t i, int64_t j, int orbital);
/* Exact for shapes by cells; area divided by cell area (plus the rim) for the others. */
double sv_outline_estimate(const outline *o);
/* Centroid of shapes that have one before they are filled; false: the middle of the cells. */
bool sv_outline_centre(const outline *o, double ret_centre[2]);

/* Triangle and hexagon: sides, distance of the sides from the centroid, direction of the first. */
typedef struct sv_regular {
    int sides;
    double inradius, direction;
} sv_regular;
sv_regular sv_outline_regular(const sv_model *model, const sv_flake_spec *spec);
/* Is a point (from the centroid) inside the regular polygon scaled by `share`? */
bool sv_regular_holds(const sv_regular *regular, const double at[2], double share);

/* Honeycomb flakes of hexagons or rings: a vertex test, and how many positions they have. */
bool sv_vertex_in_shape(const outline *o, const double at[2]);
double sv_honeycomb_positions(const sv_flake_spec *spec);

/* Shapes of n1×n2 cells: place of a cell in the box. False: another shape. */
bool sv_box_place(const sv_flake_spec *spec, int64_t i, int64_t j, int64_t ret_place[2]);

/* One loop of a polygon; edges count as inside. */
bool sv_loop_holds(const sv_polygon *polygon, int loop, const double at[2], bool *ret_on_edge);
/* Distance of a point from the edges of loops first … last − 1. */
double sv_polygon_distance(const sv_polygon *polygon, int first, int last, const double at[2]);
double sv_polygon_length(const sv_polygon *polygon);

void sv_lattice_point(const sv_model *model, double i, double j, double ret_at[2]);
/* Mean of the distinct orbital positions of a cell. */
void sv_cell_offset(const sv_model *model, double ret_offset[2]);

/* Honeycomb: vectors at 60°, two positions (a1+a2)/3 apart. Centre of a hexagon to ret_centre. */
bool sv_model_is_honeycomb(const sv_model *model, double ret_centre[2]);

/* Torus vectors of a specification, or why there are none. */
bool sv_flake_torus(const sv_model *model, const sv_flake_spec *spec, const bool periodic[2],
                    int32_t ret_period[2][2], char *reason, size_t reason_size);

sv_status sv_sample_build_hamiltonian(sv_context *context, sv_sample *sample,
                                      const int32_t *row_of_site);

#endif
