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
/* A point well inside a loop. */
void sv_loop_inside(const sv_polygon *polygon, int loop, double ret_at[2]);
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

/* Cell number at (i, j) without wrapping, or −1. */
int32_t sv_flake_look_up(const sv_flake *flake, int64_t i, int64_t j);

/* --------------------------------------------------- structure_flake.c */

/* Do shape and model belong together? */
sv_status sv_structure_check(sv_context *context, const sv_model *model, const sv_flake_spec *spec);
sv_status sv_structure_flake(sv_context *context, const sv_model *model, const sv_flake_spec *spec,
                             sv_flake *ret_flake);
sv_index sv_structure_nearest(const sv_flake *flake, const double at[2], int orbital,
                              double *ret_distance);

/* ------------------------------------------------------------- positions.c */

/* A straight cut: hops that cross it are gone. */
typedef struct sv_cut {
    double from[2], to[2];
} sv_cut;

/* What changes hops: see bonds.c, flux.c, cracks.c. */
typedef struct sv_bonds {
    struct sv_bond_class *classes; /* per hop of the model */
    double *edges[2];              /* flux: line integrals along a1 and a2; NULL: none */
    int32_t edge_low[2], edge_count[2];
    sv_cut *cuts;
    sv_index n_cuts, cut_capacity;
    sv_index *cut_start; /* per cell of the flake, one more than cells: its cuts in cut_list */
    int32_t *cut_list;
} sv_bonds;

/* The realisation while it is being drawn, by pristine site. */
typedef struct sv_drawing {
    const sv_flake *flake;
    const sv_disorder *disorder; /* all entries, for those that name another */
    int n_disorder;
    uint64_t seed;
    sv_index realisation;
    int entry;  /* being drawn */
    int quanta; /* flux through the whole torus, beside that of the model */
    bool *gone;
    int16_t *taken_by;              /* entry that emptied a site, −1: none */
    double *potential;              /* energies on the diagonal */
    double *field[SV_MODEL_FIELDS]; /* changes of the model's local operators; NULL: none */
    uint64_t *adatoms; /* entries with an adatom on the site, one bit each; NULL: none */
    sv_bonds bonds;
    sv_inventory inventory;
} sv_drawing;

int sv_position_of(const sv_flake *flake, sv_index site);
/* Does any orbital at this position match `on`? */
bool sv_position_matches(const sv_model *model, int position, int on);
/* The first site of each position stands for the position. */
bool sv_is_first_at_position(const sv_flake *flake, sv_index site);
/* Empties a position; counted as a vacancy of the entry being drawn. */
void sv_vacate(sv_drawing *d, sv_index site);
/* May this entry empty a position here? */
bool sv_is_candidate(const sv_drawing *d, const sv_disorder *disorder, sv_index site);
/* Number of a position of the plane. */
double sv_position_uniform(const sv_stream *stream, int32_t i, int32_t j, int position);
/* Adds an energy to a local operator (or the potential) at a site. */
sv_status sv_add_term(sv_context *context, sv_drawing *d, int term, sv_index site, double energy);
/* An orbital at a position. */
int sv_orbital_at(const sv_model *model, int position);
/* Shortest distance between two positions of the lattice. */
double sv_shortest_distance(const sv_model *model);

/* Cell indices, both ends included. */
typedef struct sv_patch {
    int32_t low[2], high[2];
} sv_patch;

/* Cells of the plane whose sites may lie within `reach` of a box (both corners given). */
sv_patch sv_patch_around(const sv_model *model, const double low[2], const double high[2],
                         double reach);
/* As above about a point, and within the flake's box of cells. */
sv_patch sv_flake_patch(const sv_flake *flake, const double at[2], double reach);

/* ------------------------------------------------------ smooth.c, points.c */

enum { SV_SMOOTH_SCALES = 40 };

/* One gaussian component: white noise on the nodes of a square grid, `step` apart. */
typedef struct sv_smooth_scale {
    double length, step, weight;
    int64_t low[2], count[2];
    double *noise; /* NULL: too many nodes, drawn as they are met */
} sv_smooth_scale;

/* A gaussian random field of the plane with mean 0 and variance 1. */
typedef struct sv_smooth {
    sv_stream stream;
    sv_smooth_scale scales[SV_SMOOTH_SCALES];
    int n_scales;
    double nugget; /* weight of what is shorter than the lattice: independent per position */
} sv_smooth;

/* @param low, high  corners of the box in which it will be asked for */
sv_status sv_smooth_make(sv_context *context, const sv_model *model, const sv_stream *stream,
                         double length, sv_covariance covariance, const double low[2],
                         const double high[2], sv_smooth *ret_smooth);
/* Value at a point; cell and position name the number of its shortest part. */
double sv_smooth_at(const sv_smooth *smooth, const double at[2], int32_t i, int32_t j,
                    int position);
void sv_smooth_free(sv_context *context, sv_smooth *smooth);
/* Box of the sites of a flake. */
void sv_flake_box(const sv_flake *flake, double ret_low[2], double ret_high[2]);

/* A point of a Poisson process of the plane and the numbers that are its own. */
typedef struct sv_point {
    double at[2];
    int32_t cell[2];
    uint32_t slot; /* first of 8 slots free for its user */
} sv_point;

/* Does the point lie in a cell of the flake? Points around it act too, but are not counted. */
bool sv_point_on_flake(const sv_flake *flake, const double at[2]);
/* Points with a mean number per area, in all cells within `reach` of the flake, in order of cells.
 */
sv_status sv_points_draw(sv_context *context, const sv_flake *flake, const sv_stream *stream,
                         double density, double reach, sv_point **ret_points, sv_index *ret_count);
/* Smallest k with P(X ≤ k) > u: Poisson by inversion, so that a larger mean keeps what there is. */
int sv_poisson(double mean, double u);

/* -------------------------------------------------------- one per family */

/* Slots of a cell's stream, apart from those of its orbitals (from 0). */
enum { SV_SLOT_POINTS = 0x20000000, SV_SLOT_SMOOTH = 0x40000000, SV_SLOT_BONDS = 0x60000000 };

sv_status sv_draw_vacancies(sv_context *context, sv_drawing *d, const sv_disorder *disorder,
                            const sv_stream *stream);
sv_status sv_draw_spaced(sv_context *context, sv_drawing *d, const sv_disorder *disorder,
                         const sv_stream *stream);
sv_status sv_draw_clustered(sv_context *context, sv_drawing *d, const sv_disorder *disorder,
                            const sv_stream *stream);
/* Takes the `count` positions with the smallest numbers, among those marked (NULL: all). */
sv_status sv_draw_count(sv_context *context, sv_drawing *d, const sv_disorder *disorder,
                        const sv_stream *stream, const bool *kept,
                        void (*take)(sv_drawing *, sv_index));
sv_status sv_draw_adatoms(sv_context *context, sv_drawing *d, const sv_disorder *disorder,
                          const sv_stream *stream);
sv_status sv_draw_hopping(sv_context *context, sv_drawing *d, const sv_disorder *disorder,
                          const sv_stream *stream);
sv_status sv_draw_flux(sv_context *context, sv_drawing *d, const sv_disorder *disorder,
                       const sv_stream *stream);
sv_status sv_draw_cracks(sv_context *context, sv_drawing *d, const sv_disorder *disorder,
                         const sv_stream *stream);
sv_status sv_draw_domains(sv_context *context, sv_drawing *d, const sv_disorder *disorder,
                          const sv_stream *stream);
sv_status sv_draw_roughness(sv_context *context, sv_drawing *d, const sv_disorder *disorder,
                            const sv_stream *stream);
sv_status sv_draw_steps(sv_context *context, sv_drawing *d, const sv_disorder *disorder,
                        const sv_stream *stream);
/* Sorts the cuts into cells, once all entries are drawn. */
sv_status sv_bonds_finish(sv_context *context, sv_drawing *d);
void sv_bonds_free(sv_context *context, sv_bonds *bonds);
/* What a hop of the model that starts in a cell of the flake is multiplied by; 0: cut. */
sv_complex sv_bond_factor(const sv_drawing *d, int hop, const sv_cell *start);
bool sv_bond_is_cut(const sv_drawing *d, int hop, const sv_cell *start);
/* ∫ A·dl of the random flux along a straight line, in radian; ends in units of the vectors. */
double sv_flux_along(const sv_bonds *bonds, const double from[2], const double to[2]);
sv_status sv_draw_onsite(sv_context *context, sv_drawing *d, const sv_disorder *disorder,
                         const sv_stream *stream);
sv_status sv_draw_puddles(sv_context *context, sv_drawing *d, const sv_disorder *disorder,
                          const sv_stream *stream);
/* The standardised field: width 1 of each law. */
double sv_standard_value(sv_distribution law, double u);
/* grid_place.c */
sv_status sv_add_grid(sv_context *context, sv_drawing *d, const sv_disorder *disorder);
void sv_vacate_grid(sv_drawing *d, const sv_disorder *disorder);
sv_index sv_grid_uncovered(const sv_flake *flake, const sv_disorder *disorder, sv_index from);
void sv_vacate_marks(sv_drawing *d, const sv_disorder *disorder);
sv_status sv_add_marks(sv_context *context, sv_drawing *d, const sv_disorder *disorder);

sv_status sv_sample_build_hamiltonian(sv_context *context, sv_sample *sample, const sv_drawing *d,
                                      const int32_t *row_of_site);

#endif
