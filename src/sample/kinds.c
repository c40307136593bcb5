/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Key tables of shapes and of disorder kinds: what the sheet may say about them. */
#include "selvedge/sample.h"

#define COUNT(rows) (int)(sizeof rows / sizeof rows[0])
#define CELLS_PAIR(doc_)                                                                           \
    {                                                                                              \
        .name = "cells", .type = SV_KEY_INTEGER_PAIR, .low = 1, .high = 1e6, .doc = doc_           \
    }
#define RADIUS(required_, doc_)                                                                    \
    {                                                                                              \
        .name = "radius", .type = SV_KEY_REAL, .dimension = SV_DIM_LENGTH, .low = 0, .high = 1e6,  \
        .low_open = true, .required = required_, .doc = doc_                                       \
    }

#define ORIENTATION                                                                                \
    {                                                                                              \
        .name = "orientation", .type = SV_KEY_REAL, .dimension = SV_DIM_ANGLE,                     \
        .low = -6.283185307179586, .high = 6.283185307179586,                                      \
        .doc = "angle of the lattice against a shape given by lengths, counter-clockwise"          \
    }
#define EDGE_OF(doc_)                                                                              \
    {                                                                                              \
        .name = "edge", .type = SV_KEY_CHOICE, .choices = "zigzag armchair", .doc = doc_           \
    }

static const sv_key rectangle_keys[] = {
    CELLS_PAIR("[n1, n2] cells, for lattices with orthogonal vectors"),
    {.name = "size",
     .type = SV_KEY_REAL_PAIR,
     .dimension = SV_DIM_LENGTH,
     .low = 0,
     .high = 1e6,
     .low_open = true,
     .doc = "[x, y]: whole cells whose centre lies between (0, 0) and [x, y]"},
    ORIENTATION,
};
static const sv_key parallelogram_keys[] = {
    {.name = "cells",
     .type = SV_KEY_INTEGER_PAIR,
     .low = 1,
     .high = 1e6,
     .required = true,
     .doc = "[n1, n2] cells along the lattice vectors"},
};
static const sv_key hexagon_keys[] = {
    {.name = "cells",
     .type = SV_KEY_INTEGER,
     .low = 1,
     .high = 1e4,
     .doc = "honeycomb: n hexagons a side, 6n² sites (armchair: n rings a side, 18n² - 18n + 6)"},
    RADIUS(false, "other lattices: centre to corner; whole cells whose centre lies inside"),
    EDGE_OF("with cells; zigzag unless it says armchair"),
    ORIENTATION,
};
static const sv_key disc_keys[] = {
    RADIUS(true, "whole cells whose centre lies inside, about the centre of cell (0, 0)"),
    ORIENTATION,
};
static const sv_key annulus_keys[] = {
    {.name = "inner",
     .type = SV_KEY_REAL,
     .dimension = SV_DIM_LENGTH,
     .low = 0,
     .high = 1e6,
     .required = true,
     .doc = "radius of the hole, about the centre of cell (0, 0)"},
    {.name = "outer",
     .type = SV_KEY_REAL,
     .dimension = SV_DIM_LENGTH,
     .low = 0,
     .high = 1e6,
     .low_open = true,
     .required = true,
     .doc = "outer radius; whole cells whose centre lies between the two"},
    ORIENTATION,
};
static const sv_key triangle_keys[] = {
    {.name = "cells",
     .type = SV_KEY_INTEGER,
     .low = 1,
     .high = 1e4,
     .doc = "honeycomb: n hexagons a side, n² + 4n + 1 sites (armchair: n rings a side, 3n² + 3n)"},
    {.name = "side",
     .type = SV_KEY_REAL,
     .dimension = SV_DIM_LENGTH,
     .low = 0,
     .high = 1e6,
     .low_open = true,
     .doc = "other lattices: equilateral, base along x, about the centre of cell (0, 0)"},
    EDGE_OF("with cells; zigzag unless it says armchair"),
    ORIENTATION,
};
static const sv_key ribbon_keys[] = {
    {.name = "cells",
     .type = SV_KEY_INTEGER_PAIR,
     .low = 1,
     .high = 1e6,
     .required = true,
     .doc = "[length, width]: periods along, rows across (armchair: rows of dimers)"},
    EDGE_OF("honeycomb: along a1, or armchair along a1 + a2; others are cut along a1"),
};
static const sv_key polygon_keys[] = {
    {.name = "vertices",
     .type = SV_KEY_POINTS,
     .dimension = SV_DIM_LENGTH,
     .low = -1e6,
     .high = 1e6,
     .required = true,
     .doc = "corners in order; whole cells whose centre lies inside"},
    {.name = "holes",
     .type = SV_KEY_LOOPS,
     .dimension = SV_DIM_LENGTH,
     .low = -1e6,
     .high = 1e6,
     .doc = "corners of each hole, in order"},
    ORIENTATION,
};

static const sv_key structure_keys[] = {
    {.name = "file",
     .type = SV_KEY_FILE,
     .required = true,
     .doc = "XYZ, plain or extended: number of sites, a comment, species x y z a line"},
    {.name = "unit",
     .type = SV_KEY_CHOICE,
     .choices = "angstrom nm lattice",
     .fallback = "angstrom",
     .doc = "of the positions in the file; lattice: lattice constants"},
    {.name = "least_distance",
     .type = SV_KEY_AUTO_OR_REAL,
     .dimension = SV_DIM_LENGTH,
     .low = 0,
     .low_open = true,
     .high = 1e6,
     .fallback = "auto",
     .doc = "sites nearer than that are refused; auto: half the shortest distance of a hop"},
    {.name = "thickness",
     .type = SV_KEY_REAL,
     .dimension = SV_DIM_LENGTH,
     .low = 0,
     .high = 1e6,
     .fallback = "0",
     .doc = "largest difference in z that may be projected onto the plane"},
};

static const sv_kind shapes[] = {
    [SV_SHAPE_RECTANGLE] = {"rectangle", "sides along x and y", rectangle_keys,
                            COUNT(rectangle_keys)},
    [SV_SHAPE_PARALLELOGRAM] = {"parallelogram", "sides along the lattice vectors",
                                parallelogram_keys, COUNT(parallelogram_keys)},
    [SV_SHAPE_HEXAGON] = {"hexagon", "regular hexagon, open only", hexagon_keys,
                          COUNT(hexagon_keys)},
    [SV_SHAPE_DISC] = {"disc", "disc, open only", disc_keys, COUNT(disc_keys)},
    [SV_SHAPE_ANNULUS] = {"annulus", "ring, open only; its window is the middle band of the ring",
                          annulus_keys, COUNT(annulus_keys)},
    [SV_SHAPE_TRIANGLE] = {"triangle", "equilateral triangle, open only", triangle_keys,
                           COUNT(triangle_keys)},
    [SV_SHAPE_RIBBON] = {"ribbon", "strip that closes along its length", ribbon_keys,
                         COUNT(ribbon_keys)},
    [SV_SHAPE_POLYGON] = {"polygon", "any outline, with holes, open only", polygon_keys,
                          COUNT(polygon_keys)},
    [SV_SHAPE_STRUCTURE] = {"structure", "sites from a file, for the model by_distance, open only",
                            structure_keys, COUNT(structure_keys)},
};

const sv_kind *sv_shape_kinds(int *ret_count)
{
    *ret_count = COUNT(shapes);
    return shapes;
}

/* Rows that several kinds of disorder share; macros so that they cannot differ. */
#define ON(doc_)                                                                                   \
    {                                                                                              \
        .name = "on", .type = SV_KEY_TEXT, .fallback = "any", .doc = doc_                          \
    }
#define FILE_KEYS                                                                                  \
    {.name = "file",                                                                               \
     .type = SV_KEY_FILE,                                                                          \
     .doc = "measured values beside the sheet: CSV, or a grey-scale image (PNG, TIFF)"},           \
        {.name = "origin",                                                                         \
         .type = SV_KEY_REAL_PAIR,                                                                 \
         .dimension = SV_DIM_LENGTH,                                                               \
         .low = -1e6,                                                                              \
         .high = 1e6,                                                                              \
         .fallback = "[0, 0]",                                                                     \
         .doc = "where the file's (0, 0) lies in the flake; images: their lower left corner"},     \
        {.name = "rotation",                                                                       \
         .type = SV_KEY_REAL,                                                                      \
         .dimension = SV_DIM_ANGLE,                                                                \
         .low = -1e3,                                                                              \
         .high = 1e3,                                                                              \
         .fallback = "0",                                                                          \
         .doc = "of the file about its (0, 0), counter-clockwise"},                                \
        {.name = "tolerance",                                                                      \
         .type = SV_KEY_REAL,                                                                      \
         .dimension = SV_DIM_LENGTH,                                                               \
         .low = 0,                                                                                 \
         .high = 1e3,                                                                              \
         .fallback = "0.75",                                                                       \
         .doc = "largest distance of a measured position from its site"},                          \
        {.name = "unmatched",                                                                      \
         .type = SV_KEY_CHOICE,                                                                    \
         .choices = "refuse skip list",                                                            \
         .fallback = "refuse",                                                                     \
         .doc = "rows that fall on no site, sites outside a map: an error, left out with a note, " \
                "or left out with a note each"},                                                   \
        LENGTH("pixel", "images: side of a pixel"),                                                \
        LENGTH("image_width", "images: width of the whole image, instead of pixel")
#define ENERGY_FILE_KEYS                                                                           \
    FILE_KEYS,                                                                                     \
        {.name = "between",                                                                        \
         .type = SV_KEY_CHOICE,                                                                    \
         .choices = "nearest bilinear",                                                            \
         .fallback = "nearest",                                                                    \
         .doc = "CSV: each row falls on the site next to it (mean of several), or rows are a "     \
                "regular raster and sites take the value interpolated between"},                   \
        {.name = "black",                                                                          \
         .type = SV_KEY_REAL,                                                                      \
         .dimension = SV_DIM_ENERGY,                                                               \
         .low = -1e9,                                                                              \
         .high = 1e9,                                                                              \
         .doc = "images: what black means"},                                                       \
    {                                                                                              \
        .name = "white", .type = SV_KEY_REAL, .dimension = SV_DIM_ENERGY, .low = -1e9,             \
        .high = 1e9, .doc = "images: what white means"                                             \
    }
#define GREY(name_, doc_)                                                                          \
    {                                                                                              \
        .name = name_, .type = SV_KEY_REAL, .low = 0, .high = 1, .doc = doc_                       \
    }
#define SHARE(doc_)                                                                                \
    {                                                                                              \
        .name = "share", .type = SV_KEY_REAL, .low = 0, .high = 1, .doc = doc_                     \
    }
#define DENSITY(doc_)                                                                              \
    {                                                                                              \
        .name = "density", .type = SV_KEY_REAL, .dimension = SV_DIM_DENSITY, .low = 0,             \
        .high = 1e6, .doc = doc_                                                                   \
    }
#define LENGTH(name_, doc_)                                                                        \
    {                                                                                              \
        .name = name_, .type = SV_KEY_REAL, .dimension = SV_DIM_LENGTH, .low = 0,                  \
        .low_open = true, .high = 1e6, .doc = doc_                                                 \
    }
#define CORRELATION_KEYS                                                                           \
    LENGTH("correlation_length", "correlated: l of the covariance"),                               \
    {                                                                                              \
        .name = "covariance", .type = SV_KEY_CHOICE, .choices = "gaussian exponential",            \
        .fallback = "gaussian",                                                                    \
        .doc = "correlated: width^2 exp(-r^2/(2 l^2)), or width^2 exp(-r/l)"                       \
    }
#define PER                                                                                        \
    {                                                                                              \
        .name = "per", .type = SV_KEY_CHOICE, .choices = "site cell", .fallback = "site",          \
        .doc = "site: independent per site; cell: one value for all orbitals of a cell"            \
    }
#define WIDTH                                                                                      \
    {                                                                                              \
        .name = "width", .type = SV_KEY_REAL, .dimension = SV_DIM_ENERGY, .low = 0, .high = 1e9,   \
        .doc = "box: FULL width, V in [-W/2, W/2]; gaussian, correlated: standard deviation; "     \
               "binary: splitting"                                                                 \
    }

static const sv_key vacancy_keys[] = {
    SHARE("probability that a position is vacant"),
    DENSITY("vacancies per area; sets share"),
    {.name = "volume_density",
     .type = SV_KEY_REAL,
     .dimension = SV_DIM_VOLUME_DENSITY,
     .low = 0,
     .high = 1e6,
     .doc = "vacancies per volume; with thickness, sets share"},
    LENGTH("thickness", "of the film or layer, for volume_density"),
    {.name = "count",
     .type = SV_KEY_INTEGER,
     .low = 0,
     .high = 1e9,
     .doc = "exact number of vacant positions"},
    {.name = "cluster_size",
     .type = SV_KEY_REAL,
     .low = 0,
     .low_open = true,
     .high = 1e6,
     .doc = "mean number of daughters about a Poisson parent: clusters (Thomas process)"},
    LENGTH("cluster_radius", "standard deviation of a daughter's displacement along x and y"),
    LENGTH("distance",
           "no two vacancies as near as this or nearer (the one with the smaller number stays)"),
    {.name = "charge",
     .type = SV_KEY_REAL,
     .low = -100,
     .high = 100,
     .doc = "elementary charges of each, for onsite puddles that name this entry as source"},
    ON("any, or the name of an orbital (case-sensitive)"),
    FILE_KEYS,
    GREY("darker_than", "images: vacant where the grey (0 black, 1 white) is below this"),
    GREY("brighter_than", "images: vacant where the grey is above this"),
};
static const sv_key onsite_keys[] = {
    {.name = "distribution",
     .type = SV_KEY_CHOICE,
     .choices = "box gaussian binary correlated puddles",
     .doc = "law of the on-site energies; puddles: screened charges"},
    WIDTH,
    PER,
    CORRELATION_KEYS,
    DENSITY("puddles: charges per area, +1 or -1"),
    {.name = "source",
     .type = SV_KEY_TEXT,
     .doc = "puddles: name of an earlier entry whose charged vacancies act instead"},
    LENGTH("distance", "puddles: of the charges from the film"),
    LENGTH("screening_length",
           "puddles: lambda of q U (d/rho) exp(-(rho-d)/lambda), rho^2 = r^2 + d^2"),
    {.name = "strength",
     .type = SV_KEY_REAL,
     .dimension = SV_DIM_ENERGY,
     .low = -1e9,
     .high = 1e9,
     .doc = "puddles: U, the energy of an electron right below a charge of -1"},
    {.name = "permittivity",
     .type = SV_KEY_REAL,
     .low = 1,
     .high = 1e6,
     .doc = "puddles: relative; sets U = e^2/(4 pi eps0 eps d) exp(-d/lambda)"},
    {.name = "sign",
     .type = SV_KEY_CHOICE,
     .choices = "random same",
     .fallback = "random",
     .doc = "puddles: of the charges; same: all repel, and the mean is taken off"},
    ON("any, or the name of an orbital (case-sensitive)"),
    ENERGY_FILE_KEYS,
};
static const sv_key mass_keys[] = {
    {.name = "term",
     .type = SV_KEY_TEXT,
     .fallback = "mass",
     .doc = "local operator that fluctuates: mass, exchange, potential, as the model has them"},
    {.name = "distribution",
     .type = SV_KEY_CHOICE,
     .choices = "box gaussian binary correlated",
     .doc = "law of the change"},
    WIDTH,
    PER,
    CORRELATION_KEYS,
    {.name = "strength",
     .type = SV_KEY_REAL,
     .dimension = SV_DIM_ENERGY_AREA,
     .low = -1e9,
     .high = 1e9,
     .doc = "instead of a distribution: energy x area of one point defect, spread over its cell"},
    DENSITY("point defects per area; a cell may hold several"),
    ENERGY_FILE_KEYS,
};

#define LAW                                                                                        \
    {                                                                                              \
        .name = "distribution", .type = SV_KEY_CHOICE, .choices = "box gaussian binary",           \
        .fallback = "box", .doc = "law of strength and phase"                                      \
    }
#define TERM(doc_)                                                                                 \
    {                                                                                              \
        .name = "term", .type = SV_KEY_TEXT, .fallback = "mass", .doc = doc_                       \
    }
#define PLACE(name_, doc_)                                                                         \
    {                                                                                              \
        .name = name_, .type = SV_KEY_REAL_PAIR, .dimension = SV_DIM_LENGTH, .low = -1e6,          \
        .high = 1e6, .doc = doc_                                                                   \
    }
#define ANGLE(doc_)                                                                                \
    {                                                                                              \
        .name = "angle", .type = SV_KEY_REAL, .dimension = SV_DIM_ANGLE, .low = -10, .high = 10,   \
        .doc = doc_                                                                                \
    }
#define ENERGY(name_, required_, fallback_, doc_)                                                  \
    {                                                                                              \
        .name = name_, .type = SV_KEY_REAL, .dimension = SV_DIM_ENERGY, .low = -1e9, .high = 1e9,  \
        .required = required_, .fallback = fallback_, .doc = doc_                                  \
    }

static const sv_key hopping_keys[] = {
    LAW,
    {.name = "width",
     .type = SV_KEY_REAL,
     .low = 0,
     .high = 1e6,
     .doc = "relative: a bond's hops are multiplied by 1 + width x; box: x in [-1/2, 1/2]"},
    {.name = "phase",
     .type = SV_KEY_REAL,
     .dimension = SV_DIM_ANGLE,
     .low = 0,
     .high = 1e3,
     .doc = "a bond's hops get exp(i phase x); box: FULL width; gaussian: standard deviation"},
    {.name = "bonds",
     .type = SV_KEY_CHOICE,
     .choices = "all nearest",
     .fallback = "all",
     .doc = "nearest: only the shortest ones"},
};
static const sv_key flux_keys[] = {
    {.name = "fluxes",
     .type = SV_KEY_CHOICE,
     .choices = "balanced independent",
     .fallback = "balanced",
     .doc = "balanced: curl of independent gaussian line integrals; independent: no torus then"},
    {.name = "distribution",
     .type = SV_KEY_CHOICE,
     .choices = "box gaussian binary",
     .doc = "independent: law of the flux (default box); balanced: gaussian"},
    {.name = "width",
     .type = SV_KEY_REAL,
     .dimension = SV_DIM_ANGLE,
     .low = 0,
     .high = 1e3,
     .required = true,
     .doc = "of the phase around a cell, 2 pi is a quantum; box: FULL width; gaussian: deviation"},
};
static const sv_key adatom_keys[] = {
    SHARE("probability that a site carries one"),
    DENSITY("adatoms per area; sets share"),
    {.name = "count", .type = SV_KEY_INTEGER, .low = 0, .high = 1e9, .doc = "exact number"},
    ENERGY("energy", false, "0", "on-site energy of the adatom"),
    ENERGY("coupling", true, NULL, "hop between the adatom and the site below it"),
    ON("any, or the orbital adatoms sit on (case-sensitive)"),
};
static const sv_key crack_keys[] = {
    PLACE("from", "one end of a single cut"),
    PLACE("to", "its other end"),
    DENSITY("random cracks per area, instead of from and to"),
    LENGTH("length", "random: (mean) length"),
    {.name = "lengths",
     .type = SV_KEY_CHOICE,
     .choices = "equal exponential",
     .fallback = "equal",
     .doc = "random: law of the length"},
    ANGLE("random: one direction for all (default: all directions alike)"),
};
static const sv_key domain_keys[] = {
    TERM("local operator that changes in some domains: mass, exchange, potential"),
    {.name = "size",
     .type = SV_KEY_REAL,
     .dimension = SV_DIM_LENGTH,
     .low = 0,
     .low_open = true,
     .high = 1e6,
     .required = true,
     .doc = "root of the mean area of a domain (Voronoi cells of Poisson seeds)"},
    {.name = "share",
     .type = SV_KEY_REAL,
     .low = 0,
     .high = 1,
     .fallback = "0.5",
     .doc = "probability that a domain is changed"},
    {.name = "change",
     .type = SV_KEY_AUTO_OR_REAL,
     .dimension = SV_DIM_ENERGY,
     .low = -1e9,
     .high = 1e9,
     .fallback = "auto",
     .doc = "energy added in changed domains; auto: flips the sign the clean model has"},
    {.name = "wall",
     .type = SV_KEY_REAL,
     .dimension = SV_DIM_LENGTH,
     .low = 0,
     .high = 1e6,
     .fallback = "0",
     .doc = "w of the walls: a flipped term goes as tanh(distance/w); 0: sharp"},
};
static const sv_key roughness_keys[] = {
    {.name = "amplitude",
     .type = SV_KEY_REAL,
     .dimension = SV_DIM_LENGTH,
     .low = 0,
     .high = 1e5,
     .required = true,
     .doc = "deepest notch: depths are uniform in [0, amplitude], correlated along the edge"},
    {.name = "correlation_length",
     .type = SV_KEY_REAL,
     .dimension = SV_DIM_LENGTH,
     .low = 0,
     .low_open = true,
     .high = 1e6,
     .required = true,
     .doc = "l of the gaussian field g behind the depths, amplitude x P(g)"},
    {.name = "covariance",
     .type = SV_KEY_CHOICE,
     .choices = "gaussian exponential",
     .fallback = "gaussian",
     .doc = "of g: exp(-r^2/(2 l^2)), or exp(-r/l)"},
};
static const sv_key step_keys[] = {
    TERM("what jumps: mass, exchange, potential"),
    PLACE("at", "a point on the first step edge"),
    ANGLE("direction of the edge; the film has changed on its left"),
    ENERGY("jump", true, NULL, "energy added by each step"),
    LENGTH("spacing", "width of the terraces; none: one step"),
    LENGTH("meander", "standard deviation of the edges about straight lines"),
    LENGTH("correlation_length", "of the meander along the edge, exp(-r^2/(2 l^2))"),
};

#define KIND(row_, name_, doc_, keys_) [row_] = {name_, doc_, keys_, COUNT(keys_)}

static const sv_kind disorders[] = {
    KIND(SV_DISORDER_VACANCIES, "vacancies", "removes every orbital at a position", vacancy_keys),
    KIND(SV_DISORDER_ONSITE, "onsite", "adds an energy to each site", onsite_keys),
    KIND(SV_DISORDER_MASS, "mass", "adds to a local operator of the model: its mass, exchange",
         mass_keys),
    KIND(SV_DISORDER_HOPPING, "hopping", "random strength and phase of every bond", hopping_keys),
    KIND(SV_DISORDER_FLUX, "flux", "random magnetic flux through the cells", flux_keys),
    KIND(SV_DISORDER_ADATOMS, "adatoms", "one orbital more on top of some sites", adatom_keys),
    KIND(SV_DISORDER_CRACKS, "cracks", "lines that cut the hops across them", crack_keys),
    KIND(SV_DISORDER_DOMAINS, "domains", "regions where a term changes, with walls", domain_keys),
    KIND(SV_DISORDER_ROUGHNESS, "roughness", "removes cells along the edges", roughness_keys),
    KIND(SV_DISORDER_STEPS, "steps", "step edges of the film, across which a term jumps",
         step_keys),
};

const sv_kind *sv_disorder_kinds(int *ret_count)
{
    *ret_count = COUNT(disorders);
    return disorders;
}
