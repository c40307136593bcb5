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
};

const sv_kind *sv_shape_kinds(int *ret_count)
{
    *ret_count = COUNT(shapes);
    return shapes;
}

/* Keys every kind of disorder has; one macro so that they cannot differ. */
#define COMMON_KEYS                                                                                \
    {.name = "on",                                                                                 \
     .type = SV_KEY_TEXT,                                                                          \
     .fallback = "any",                                                                            \
     .doc = "any, or the name of an orbital (case-sensitive)"},                                    \
        {.name = "file", .type = SV_KEY_FILE, .doc = "measured values, CSV beside the sheet"},     \
        {.name = "origin",                                                                         \
         .type = SV_KEY_REAL_PAIR,                                                                 \
         .dimension = SV_DIM_LENGTH,                                                               \
         .low = -1e6,                                                                              \
         .high = 1e6,                                                                              \
         .fallback = "[0, 0]",                                                                     \
         .doc = "where the file's (0, 0) lies in the flake"},                                      \
    {                                                                                              \
        .name = "tolerance", .type = SV_KEY_REAL, .dimension = SV_DIM_LENGTH, .low = 0,            \
        .high = 1e3, .fallback = "0.75",                                                           \
        .doc = "largest distance of a measured position from its site"                             \
    }

static const sv_key vacancy_keys[] = {
    {.name = "share",
     .type = SV_KEY_REAL,
     .low = 0,
     .high = 1,
     .doc = "probability that a position is vacant, drawn independently"},
    {.name = "density",
     .type = SV_KEY_REAL,
     .dimension = SV_DIM_DENSITY,
     .low = 0,
     .high = 1e6,
     .doc = "vacancies per area; sets share"},
    {.name = "count",
     .type = SV_KEY_INTEGER,
     .low = 0,
     .high = 1e9,
     .doc = "exact number of vacant positions"},
    COMMON_KEYS,
};
static const sv_key onsite_keys[] = {
    {.name = "distribution",
     .type = SV_KEY_CHOICE,
     .choices = "box gaussian binary",
     .doc = "law of the on-site energies"},
    {.name = "width",
     .type = SV_KEY_REAL,
     .dimension = SV_DIM_ENERGY,
     .low = 0,
     .high = 1e9,
     .doc = "box: FULL width, V in [-W/2, W/2]; gaussian: standard deviation; binary: splitting"},
    {.name = "per",
     .type = SV_KEY_CHOICE,
     .choices = "site cell",
     .fallback = "site",
     .doc = "site: independent per site; cell: one value for all orbitals of a cell"},
    COMMON_KEYS,
};

static const sv_kind disorders[] = {
    [SV_DISORDER_VACANCIES] = {"vacancies", "removes every orbital at a position", vacancy_keys,
                               COUNT(vacancy_keys)},
    [SV_DISORDER_ONSITE] = {"onsite", "adds an energy to each site", onsite_keys,
                            COUNT(onsite_keys)},
};

const sv_kind *sv_disorder_kinds(int *ret_count)
{
    *ret_count = COUNT(disorders);
    return disorders;
}
