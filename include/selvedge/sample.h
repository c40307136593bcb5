/* SPDX-License-Identifier: GPL-3.0-or-later */
/**
 * @file sample.h
 * Layer 4: flakes, defects, and the Hamiltonian of one realisation. Conventions: conventions.h.
 */
#ifndef SELVEDGE_SAMPLE_H
#define SELVEDGE_SAMPLE_H

#include "linalg.h"
#include "model.h"

#ifdef __cplusplus
extern "C" {
#endif

/* ------------------------------------------------------------------- shape */

typedef enum sv_shape {
    SV_SHAPE_RECTANGLE,
    SV_SHAPE_PARALLELOGRAM,
    SV_SHAPE_HEXAGON,
    SV_SHAPE_DISC,
    SV_SHAPE_ANNULUS,
    SV_SHAPE_TRIANGLE,
    SV_SHAPE_RIBBON,
    SV_SHAPE_POLYGON,
    SV_SHAPE_STRUCTURE /**< sites from a file */
} sv_shape;

/** Edges of shapes by cells on a honeycomb lattice. */
typedef enum sv_edge { SV_EDGE_USUAL /**< zigzag */, SV_EDGE_ZIGZAG, SV_EDGE_ARMCHAIR } sv_edge;

/** Closed loops of corners: the outline, then holes. Points on a loop belong to the inside. */
typedef struct sv_polygon {
    const double *corners;     /**< x, y of all loops, one after another; lattice constants */
    const int32_t *loop_start; /**< n_loops + 1 corner numbers */
    int n_loops;
} sv_polygon;

/**
 * A finite set of sites read from a file, and the hops between them. Each site is the only one of
 * its cell; cells are squares of the plane so small (side least_distance/√2) that no two sites
 * share one, so that random numbers belong to places in the plane here too.
 */
typedef struct sv_structure {
    sv_index n;
    double (*at)[2];  /**< lattice constants */
    int32_t *species; /**< orbital of the model */
    int32_t *line;    /**< in the file */
    double z[2];      /**< smallest and largest, lattice constants: projected */
    bool has_lattice; /**< the file states a periodic cell, which is not used */
    /* ⟨site|H|bond_to⟩, row by row; both directions are listed */
    sv_index *bond_start; /**< n + 1 */
    int32_t *bond_to;
    sv_complex *bond;
    double longest; /**< hop */
    /* cells */
    int32_t (*cell)[2], low[2], high[2];
    int32_t *cell_at; /**< site or −1, as sv_flake.cell_at */
    /* convex hull */
    double *corners, area, centre[2];
    int32_t loop_start[2];
} sv_structure;

/** How a file of sites is read. */
typedef struct sv_structure_options {
    double unit;           /**< of the file, in lattice constants */
    double least_distance; /**< nearer sites are refused; lattice constants */
    double thickness;      /**< largest difference of z that may be projected */
} sv_structure_options;

/**
 * Reads sites from XYZ text: line 1 their number; line 2 a comment, in extended XYZ key=value pairs
 * of which Properties names the columns (species:S:1 and pos:R:3 are used, others skipped); then a
 * line per site, without Properties `species x y z`. One frame. Joins them by the rules of the
 * model, and gives the model its cells, the mean area of a site (area of the convex hull/n), and
 * what its hops add up to. Cost: linear in sites and hops, n log n for the hull.
 * Format: extended XYZ specification, github.com/libAtoms/extxyz.
 * @param[in,out] model  by distance, finished
 * @return SV_INVALID_INPUT with *ret_fault filled (line 0: no place in the file)
 */
SV_API SV_MUST_USE sv_status sv_structure_make(sv_context *context, sv_model *model,
                                               const char *text, size_t size,
                                               const sv_structure_options *options,
                                               sv_structure *ret_structure,
                                               sv_table_fault *ret_fault);
SV_API void sv_structure_free(sv_context *context, sv_structure *structure);
/** Distance of a point from the rim of the convex hull; negative outside. */
SV_API double sv_structure_depth(const sv_structure *structure, const double at[2]);

/** What the sheet's `flake` block says. Lengths in lattice constants. */
typedef struct sv_flake_spec {
    sv_shape shape;
    bool has_cells;
    int64_t cells[2]; /**< n1, n2; hexagon, triangle: n in cells[0]; ribbon: length, width */
    bool has_size;
    double size[2]; /**< rectangle of a lattice whose vectors are not orthogonal */
    bool has_radius;
    double radius;       /**< hexagon of other lattices (centre to corner), disc */
    double inner, outer; /**< annulus */
    bool has_side;
    double side;                   /**< triangle of other lattices */
    sv_edge edge;                  /**< hexagon and triangle by cells, ribbon */
    sv_polygon polygon;            /**< borrowed: must outlive every flake made from it */
    const sv_structure *structure; /**< borrowed, as the polygon */
    bool periodic[2];  /**< along a1 and a2 (rectangle by size: along x and y; ribbon: along its
                            length and across) */
    bool keep_largest; /**< a sample keeps its largest connected piece only */
} sv_flake_spec;

enum { SV_POLYGON_MOST = 2000 /**< corners of all loops */ };

/** Fault of a polygon: which corners, and what is wrong with them. */
typedef struct sv_polygon_fault {
    int loop, corner; /**< where to look, from 0 */
    char message[200], hint[200];
} sv_polygon_fault;

/**
 * Checks that the loops bound an area: three corners or more each, no loop crosses or touches
 * itself or another one, holes lie inside the outline and outside each other. Either sense of
 * rotation.
 * @return SV_INVALID_INPUT with the fault in *ret_fault
 * Cost: the square of the number of corners.
 */
SV_API SV_MUST_USE sv_status sv_polygon_check(sv_context *context, const sv_polygon *polygon,
                                              sv_polygon_fault *ret_fault);
/** Is a point inside the outline and outside the holes (on an edge: yes)? */
SV_API bool sv_polygon_holds(const sv_polygon *polygon, const double at[2]);
/** Area without the holes, and its centroid. */
SV_API double sv_polygon_area(const sv_polygon *polygon, double ret_centroid[2]);

/** Kinds of shapes with their keys (all but `boundary`, common to all). */
SV_API const sv_kind *sv_shape_kinds(int *ret_count);

/** Site of the pristine flake. */
typedef struct sv_site {
    int32_t cell;    /**< number of its cell in sv_flake.cells */
    int32_t orbital; /**< row in the model */
    double at[2];    /**< Cartesian, lattice constants */
} sv_site;

/** Cell of the pristine flake; at an edge some of its orbitals may be missing (hexagon). */
typedef struct sv_cell {
    int32_t i, j;
    sv_index first_site; /**< its sites are first_site … first_site + n_sites − 1 */
    int32_t n_sites;
} sv_cell;

/** The pristine flake: which cells and sites there are, and how it wraps. Immutable once made. */
typedef struct sv_flake {
    const sv_model *model; /**< borrowed */
    sv_flake_spec spec;
    sv_cell *cells;
    sv_index n_cells;
    sv_site *sites;
    sv_index n_sites;
    double centre[2];        /**< centroid of the shape, Cartesian */
    int32_t low[2], high[2]; /**< bounding box of cell indices, both ends included */
    int32_t *cell_at;        /**< (high0−low0+1)·(high1−low1+1) cell numbers or −1 */
    bool periodic[2];
    int32_t period[2][2]; /**< torus vectors in units of a1, a2 (rows) */
} sv_flake;

/** Could this flake be closed to a torus (all sides), or why not? */
typedef struct sv_closure {
    bool possible;
    char reason[160];
} sv_closure;
SV_API sv_closure sv_flake_can_close(const sv_model *model, const sv_flake_spec *spec);

/** Number of sites of the pristine flake without building it (an upper estimate for shapes whose
 *  size is a length). */
SV_API SV_MUST_USE sv_status sv_flake_count(sv_context *context, const sv_model *model,
                                            const sv_flake_spec *spec, sv_index *ret_sites);

/**
 * Builds the pristine flake. Which cells a shape has:
 *  - parallelogram, rectangle by cells, ribbon: n1×n2 cells from (0, 0); a ribbon with armchair
 * edges has n1 periods |a1 + a2| and n2 rows of dimers across;
 *  - rectangle by size, polygon: cells whose centre lies inside, in Cartesian coordinates;
 *  - disc, annulus, hexagon by radius, triangle by side (base along x): the same about the centre
 * of cell (0, 0), which is the centroid;
 *  - hexagon and triangle by cells: sites, not cells. Zigzag: those of n hexagons a side; armchair:
 *    those of n disjoint rings a side. 6n² and n² + 4n + 1, or 18n² − 18n + 6 and 3n² + 3n sites.
 *  - structure: the sites of the file, in its order.
 * @return SV_INVALID_INPUT for a shape that does not suit the lattice, an empty flake, or a
 *         periodic side that does not fit the lattice or the flux
 */
SV_API SV_MUST_USE sv_status sv_flake_make(sv_context *context, const sv_model *model,
                                           const sv_flake_spec *spec, sv_flake *ret_flake);
SV_API void sv_flake_free(sv_context *context, sv_flake *flake);

/**
 * Averaging window: n1×n2 cells about the centre for flakes of L1×L2 cells, n the integer of the
 * parity of L nearest to share·L (ties up); other shapes: cells whose centre (mean of the orbital
 * positions) lies in the shape scaled by `share` about its centroid. Annulus: the middle band of
 * the ring, |r − (inner + outer)/2| ≤ share·(outer − inner)/2. Polygon with holes: the same rule,
 * min(d, e) ≥ (1 − share)/2·(d + e), d and e the distances from the outline and the nearest hole.
 * Structure: sites in the convex hull scaled by `share` about its centroid.
 * Holes never count as area. Hexagon and triangle by cells are scaled from the outline
 * through the centres of the next, missing row of hexagons (armchair: half a row of rings outside).
 * @param share  0 < share ≤ 1
 * @param[out] ret_inside  n_cells flags, taken from the context
 * @return SV_INVALID_INPUT when no cell is inside
 */
SV_API SV_MUST_USE sv_status sv_flake_window(sv_context *context, const sv_flake *flake,
                                             double share, bool **ret_inside, sv_index *ret_cells);
/**
 * What the mean over the cells of a window is to be multiplied by: 1 for lattices. Of a structure
 * the sum over the sites counts by the area of the window, share² times that of the convex hull:
 * (cells in the window)·(mean area of a site)/(that area).
 */
SV_API double sv_flake_window_factor(const sv_flake *flake, double share, sv_index cells);
/** A point inside the hole of a flake that has exactly one: annulus, polygon with one hole. */
SV_API bool sv_flake_hole(const sv_flake *flake, double ret_at[2]);
/** Is a point nearer to a hole than to the outline? False without a hole. */
SV_API bool sv_flake_by_hole(const sv_flake *flake, const double at[2]);
/** Centre of a cell: mean of the distinct orbital positions. */
SV_API void sv_flake_cell_centre(const sv_flake *flake, sv_index cell, double ret_at[2]);
/**
 * Pristine site nearest to a point, its distance to *ret_distance; −1 when none is near.
 * @param orbital  only sites of this orbital count; −1: all
 */
SV_API sv_index sv_flake_nearest(const sv_flake *flake, const double at[2], int orbital,
                                 double *ret_distance);

/* ---------------------------------------------------------------- disorder */

typedef enum sv_disorder_type {
    SV_DISORDER_VACANCIES,
    SV_DISORDER_ONSITE,
    SV_DISORDER_MASS,
    SV_DISORDER_HOPPING,
    SV_DISORDER_FLUX,
    SV_DISORDER_ADATOMS,
    SV_DISORDER_CRACKS,
    SV_DISORDER_DOMAINS,
    SV_DISORDER_ROUGHNESS,
    SV_DISORDER_STEPS
} sv_disorder_type;
enum { SV_DISORDER_MOST = 64 /**< entries of a sheet */ };

/** Law of an energy, a strength or a phase. */
typedef enum sv_distribution {
    SV_BOX,
    SV_GAUSSIAN,
    SV_BINARY,
    SV_CORRELATED, /**< gaussian, with a correlation length */
    SV_PUDDLES     /**< potential of screened charges */
} sv_distribution;

/** Covariance C(r) of a correlated field of variance 1 and length l. */
typedef enum sv_covariance {
    SV_COVARIANCE_GAUSSIAN,   /**< exp(−r²/(2 l²)) to 1e-7 */
    SV_COVARIANCE_EXPONENTIAL /**< exp(−r/l) to 3e-4, by gaussians of many lengths */
} sv_covariance;

/** Grey values of an image, 0 black … 1 white, as stored (no gamma); row 0 is the lowest. */
typedef struct sv_grey {
    int width, height;
    float *value;
} sv_grey;

/** Does the file begin like a PNG or a TIFF image? */
SV_API bool sv_image_is(const void *data, size_t size);
SV_API void sv_grey_free(sv_context *context, sv_grey *grey);

/** Values on a regular raster of the plane. Lengths in lattice constants. */
typedef struct sv_grid {
    sv_index nx, ny;
    double step[2], first[2]; /**< of value (0, 0) in the map's own coordinates */
    double origin[2];         /**< where the map's (0, 0) lies in the flake */
    double rotation;          /**< of the map about its (0, 0), counter-clockwise, radian */
    double *value;            /**< nx·ny, x fastest; owned. NULL: taken from an image */
    const float *grey;        /**< borrowed */
    double black, white;      /**< what the ends of the grey scale mean */
} sv_grid;

/** The grid of an image: its lower left corner is (0, 0), values stand for the pixels' middles. */
SV_API sv_grid sv_grid_of_grey(const sv_grey *grey, double pixel, double black, double white);
/**
 * Value at a point of the flake, bilinear between the four values around it, constant over the
 * outer half step. @return false outside
 */
SV_API bool sv_grid_at(const sv_grid *grid, const double at[2], double *ret_value);
SV_API void sv_grid_free(sv_context *context, sv_grid *grid);

/** A defect position or site energy read from a measured file. */
typedef struct sv_mark {
    bool by_cell; /**< cell, orbital given instead of a position */
    int32_t cell[2];
    int32_t orbital; /**< −1: all orbitals of the cell or position */
    double at[2];    /**< lattice constants, flake coordinates */
    double energy;   /**< unit of the model (on-site files) */
    int line;        /**< line in the file, for messages */
} sv_mark;

/**
 * One entry of the sheet's `disorder` list. Lengths in lattice constants, energies in the unit of
 * the model, densities per lattice constant squared, angles in radian. What a kind does not name is
 * 0.
 *
 * Every random number belongs to a cell of the lattice, or to a node of a grid in the plane, and
 * never to the flake: a larger flake, an open and a closed copy see the same defects and the same
 * fields.
 */
typedef struct sv_disorder {
    char name[64]; /**< names its random stream */
    sv_disorder_type type;
    int on; /**< orbital row, −1: any */
    /* how many: vacancies and adatoms by share or count, points of other kinds by density */
    bool has_share, has_count;
    double share;   /**< probability per position (adatoms: per site; domains: of being changed) */
    int64_t count;  /**< exact number of positions */
    double density; /**< of impurities, local defects, cracks */
    /* vacancies */
    double cluster_size, cluster_radius; /**< size > 0: clustered */
    double distance;                     /**< > 0: no two of them as near as this or nearer */
    double charge; /**< elementary charges of each defect, for messages and as a source */
    /* energies, strengths, phases */
    sv_distribution distribution;
    double
        width; /**< box: full width; gaussian, correlated: standard deviation; binary: splitting */
    bool per_cell;
    sv_covariance covariance;
    double length; /**< correlation length, mean domain size, mean length of cracks */
    int term; /**< mass, domains, steps: row of the model's local operators or SV_FIELD_POTENTIAL */
    double strength; /**< puddles: energy right below a charge; mass: energy × area of one defect */
    double phase;    /**< hopping: width of the phase */
    bool nearest;    /**< hopping: only the shortest bonds */
    bool independent; /**< flux: independent cells rather than the balanced field */
    /* puddles */
    double depth, screening; /**< distance of the charges from the plane, screening length */
    char source[64];         /**< vacancies whose charges act; empty: random charges */
    bool same_sign;
    /* adatoms */
    double energy, coupling;
    /* lines */
    bool has_line;
    double from[2], to[2]; /**< cracks: ends; steps: `from` lies on the first step */
    bool has_angle;        /**< cracks: one direction rather than all */
    double angle;          /**< direction of step edges and cracks */
    double spacing;        /**< steps: width of the terraces, 0: one step */
    double jump;           /**< steps: change per step; domains: change in a changed domain */
    double amplitude; /**< roughness: deepest notch; steps: standard deviation of the meander */
    double wall;      /**< domains: width of the walls, 0: sharp */
    bool exponential; /**< cracks: exponential lengths rather than equal ones */
    /* measured */
    bool has_marks;
    sv_mark *marks; /**< owned */
    sv_index n_marks;
    bool has_grid;
    sv_grid grid;        /**< energies, or grey shares of an image of defects */
    bool darker;         /**< vacancies: below the threshold, else above */
    double threshold;    /**< grey share, 0 … 1 */
    bool keep_unmatched; /**< rows and sites without a partner are left out, not refused */
    double tolerance;    /**< largest distance of a mark from its site, lattice constants */
    char file[256];      /**< name for messages */
} sv_disorder;

/** Kinds of disorder with their keys (all but `name` and `kind`). */
SV_API const sv_kind *sv_disorder_kinds(int *ret_count);
/** Why an entry cannot act on a structure, which has no cells; NULL: it can. */
SV_API const char *sv_structure_refusal(const sv_disorder *disorder);
SV_API void sv_disorder_free(sv_context *context, sv_disorder *disorder);
/**
 * Largest share of positions that vacancies with a minimum distance can have. They are thinned by
 * marks: of two candidates nearer than that, the one with the larger random number goes, whether or
 * not the other stays (B. Matérn's second kind, value recalled from memory; Stoyan, Kendall, Mecke,
 * Stochastic Geometry and its Applications, ch. 5). With n other positions within reach a share p
 * of candidates leaves (1 − (1 − p)^(n+1))/(n+1), at most 1/(n + 1). 1 without a distance.
 */
SV_API double sv_disorder_share_limit(const sv_model *model, const sv_disorder *disorder);
/**
 * Standard deviation of the potential of random charges, 2π n U² h² exp(2h/λ) E1(2h/λ) under the
 * root (Campbell's theorem): density n, strength U, depth h, screening λ of an onsite entry.
 */
SV_API double sv_disorder_puddle_deviation(const sv_disorder *disorder);
/**
 * Can a flake with this disorder be closed to a torus with the same defects, or why not?
 * @param n number of entries
 */
SV_API sv_closure sv_disorder_can_close(const sv_disorder *disorder, int n);

/**
 * Reads a grey-scale image: PNG (1 to 16 bits; palettes and colours when every pixel is grey, alpha
 * when every pixel is opaque) or TIFF (one page, 8 or 16 bits, strips or tiles, without compression
 * or with LZW, Deflate or PackBits). At most 2^25 pixels, judged before memory is taken.
 * @return SV_INVALID_INPUT with *ret_fault filled: byte of the file where known; no line
 */
SV_API SV_MUST_USE sv_status sv_image_read(sv_context *context, const void *data, size_t size,
                                           sv_grey *ret_grey, sv_table_fault *ret_fault);
/**
 * Rows on a regular raster as a grid: every node once, steps even to a thousandth.
 * @return SV_INVALID_INPUT with the line that breaks it in *ret_fault
 */
SV_API SV_MUST_USE sv_status sv_grid_from_marks(sv_context *context, const sv_mark *marks,
                                                sv_index n, sv_grid *ret_grid,
                                                sv_table_fault *ret_fault);
/**
 * What of a measured file has no partner: the next row that falls on no site or, for maps, the next
 * site of the flake outside the map, from number `from` on; −1: none.
 */
SV_API sv_index sv_measured_unmatched(const sv_flake *flake, const sv_disorder *disorder,
                                      sv_index from);
/**
 * Reads a CSV of measured defects (x, y) or site energies (x, y, energy or
 * cell_i, cell_j[, orbital], energy). The first row names the columns; a unit may follow the name
 * in brackets (`x [nm]`), after a slash (`x/nm`), or after the value (`12 nm`). Lines starting
 * with # and blank lines are skipped.
 * @param lattice_constant in nm, 0 when the model has none (then lengths must be bare)
 * @param energy_unit      eV per unit of the model
 * @param origin           where the file's (0, 0) lies in flake coordinates, lattice constants
 * @param with_energy      an energy column is required
 * @return SV_INVALID_INPUT with *ret_fault filled
 */
SV_API SV_MUST_USE sv_status sv_read_marks(sv_context *context, const sv_model *model,
                                           const char *text, size_t size, bool with_energy,
                                           double lattice_constant, double energy_unit,
                                           const double origin[2], sv_mark **ret_marks,
                                           sv_index *ret_count, sv_table_fault *ret_fault);
/**
 * Checks that every mark of the disorder falls on the flake.
 * @return SV_INVALID_INPUT with the line of the first mark outside in *ret_fault
 */
SV_API SV_MUST_USE sv_status sv_marks_check(sv_context *context, const sv_flake *flake,
                                            const sv_disorder *disorder, sv_table_fault *ret_fault);

/* -------------------------------------------------------------- occupation */

typedef enum sv_filling { SV_BY_ENERGY, SV_BY_FILLING, SV_BY_ELECTRONS } sv_filling;

/** Which states are occupied. */
typedef struct sv_occupation {
    sv_filling by;
    double fermi_energy; /**< unit of the model */
    double filling;      /**< share of the states present; electrons = nearest integer, ties up */
    int64_t electrons;
} sv_occupation;
/** Number of electrons of a filling or count among `states`: filling·states, nearest, ties up. */
SV_API int64_t sv_occupation_electrons(const sv_occupation *occupation, sv_index states);

/* ------------------------------------------------------------------ sample */

/** How many of what. */
typedef struct sv_inventory {
    sv_index pristine_sites, sites, vacancies /**< positions */, vacant_sites;
    sv_index marks_matched, marks_unmatched; /**< rows of measured files */
    sv_index marks_merged; /**< measured defects that fell on a site already taken */
    /* Of what is left; positions are neighbours when a nonzero hop links any of their orbitals. */
    sv_index pieces;        /**< connected pieces */
    sv_index largest_piece; /**< sites of the largest */
    sv_index isolated;      /**< positions without a neighbour */
    sv_index dangling;      /**< positions with exactly one */
    sv_index removed_sites; /**< in pieces that flake.keep has dropped, not counted as vacant */
    sv_index imbalance; /**< largest minus smallest number of sites of one orbital of the model */
    sv_index adatoms;   /**< rows that are adatoms; they count as sites */
    sv_index placed[SV_DISORDER_MOST]; /**< per entry: positions emptied, adatoms, points, cracks */
} sv_inventory;

/** One realisation: the sites that are left, their on-site disorder, and the Hamiltonian. */
typedef struct sv_sample {
    const sv_flake *flake; /**< borrowed */
    sv_index n;            /**< sites left = order of the Hamiltonian */
    sv_index *pristine;    /**< n pristine site numbers, in ascending order, repeated for adatoms */
    int16_t *adatom; /**< per row: entry of the adatom it is, −1 for a site; its `pristine` is then
                          the host, whose row stands before it. NULL: no adatoms */
    double *potential; /**< n on-site disorder energies (adatoms: their energy) */
    sv_sparse hamiltonian;
    sv_inventory inventory;
    /* what it was drawn from */
    const sv_disorder *disorder; /**< borrowed; read by sv_sample_add_flux() only */
    int n_disorder;
    uint64_t seed;
    sv_index realisation;
} sv_sample;

/**
 * Draws realisation `index` and builds its Hamiltonian, a pure function of the arguments.
 * @param flake     its periodicity decides the boundary; a periodic and an open flake of the same
 *                  cells get the same defects and potentials
 * @param disorder  applied in order
 * @return SV_INVALID_INPUT when a count exceeds the positions there are, SV_UNDEFINED when nothing
 *         is left
 */
SV_API SV_MUST_USE sv_status sv_sample_draw(sv_context *context, const sv_flake *flake,
                                            const sv_disorder *disorder, int n_disorder,
                                            uint64_t seed, sv_index index, sv_sample *ret_sample);
SV_API void sv_sample_free(sv_context *context, sv_sample *sample);

/**
 * Connected pieces of a sample, into its inventory (pieces … dangling, imbalance).
 *
 * Pieces are of positions, not of single orbitals, so that spins that do not mix do not count as
 * two films. A torus counts with its hops around. Cost: one pass over the matrix.
 * @param[out] piece_of_row  n piece numbers, from 0 in the order of their first row, or NULL
 */
SV_API SV_MUST_USE sv_status sv_sample_pieces(sv_context *context, sv_sample *sample,
                                              int32_t *piece_of_row);
/**
 * Drops every piece but the largest (of equals the one with the first row) as if it had never
 * been there: no row is left of it. Pieces are judged by the hops that do not go around, so that
 * the open and the closed copy of a flake keep the same sites.
 */
SV_API SV_MUST_USE sv_status sv_sample_keep_largest(sv_context *context, sv_sample *sample);

/** Name of the orbital of a row; "adatom" for an adatom. */
SV_API const char *sv_sample_orbital_name(const sv_sample *sample, sv_index row);

/**
 * Hamiltonian of the same realisation with whole flux quanta more through the whole torus, evenly
 * spread; sign and gauge as in conventions.h, in coordinates along the torus vectors. Same pattern.
 * The realisation is drawn again: the list of disorder must still be there.
 * @return SV_UNDEFINED unless the flake is closed both ways
 */
SV_API SV_MUST_USE sv_status sv_sample_add_flux(sv_context *context, const sv_sample *sample,
                                                int quanta, sv_sparse *ret_hamiltonian);

/** Writes the Hamiltonian as Matrix Market, coordinate complex hermitian (lower triangle). */
SV_API SV_MUST_USE sv_status sv_sample_write_matrix(sv_context *context, const sv_sample *sample,
                                                    const char *path);
/** Writes `site,cell_i,cell_j,orbital,x,y` in matrix order; optional extra column. */
SV_API SV_MUST_USE sv_status sv_sample_write_sites(sv_context *context, const sv_sample *sample,
                                                   const char *path, const char *extra_name,
                                                   const double *extra);

#ifdef __cplusplus
}
#endif
#endif
