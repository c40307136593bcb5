/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The block `flake` → sv_flake_spec; the lattice is turned by its orientation. */
#include "sheet_internal.h"

#include <math.h>
#include <stdio.h>
#include <string.h>

/* Keys that give a size, of which a shape that has several wants one. */
static const char SIZES[] = "cells size radius side";

static bool check_size(sv_reader *reader, const sv_section *section)
{
    char sizes[100] = "";
    for (int i = 0; i < section->n_fields; i++)
        if (sv_words_hold(SIZES, section->fields[i].key->name))
            snprintf(sizes + strlen(sizes), sizeof sizes - strlen(sizes), "%s%s",
                     sizes[0] != '\0' ? " " : "", section->fields[i].key->name);
    return sizes[0] == '\0' || sv_section_one_of(reader, section, sizes);
}

/* An annulus without a ring, and words that need the other kind of size. */
static bool check_words(sv_reader *reader, const sv_section *section)
{
    const sv_value *inner = sv_section_value(section, "inner");
    const sv_value *outer = sv_section_value(section, "outer");
    const sv_value *orientation = sv_section_value(section, "orientation");
    bool by_cells = sv_section_value(section, "cells")->present;
    if (inner->present && outer->present && inner->real[0] >= outer->real[0])
        return sv_report(reader, sv_section_node(section, "inner"), "make inner the smaller one",
                         "%s.inner is not below outer (%g and %g lattice constants)", section->path,
                         inner->real[0], outer->real[0]);
    if (orientation->present && by_cells)
        return sv_report(reader, sv_section_node(section, "orientation"),
                         "give the size as a length, or remove orientation",
                         "%s.orientation: a shape given by cells lies along the lattice",
                         section->path);
    if (sv_section_value(section, "edge")->present && !by_cells)
        return sv_report(
            reader, sv_section_node(section, "edge"), "give the size in cells, or remove edge",
            "%s.edge: a shape given by a length has the edge its outline cuts", section->path);
    return true;
}

/* The list of a key of points or loops, as loops of a polygon; returns the corners added. */
static int add_loops(const sv_value *value, bool one, double *corners, int32_t *start, int *n_loops)
{
    int n = 0, at = 0;
    while (at < value->count) {
        int points = one ? value->count / 2 : (int)value->list[at++];
        memcpy(&corners[2 * n], &value->list[at], 2 * (size_t)points * sizeof *corners);
        at += 2 * points;
        n += points;
        start[*n_loops + 1] = start[*n_loops] + points;
        (*n_loops)++;
    }
    return n;
}

/* The corner a fault of the polygon lies at, as written. */
static const sv_node *corner_node(const sv_section *section, const sv_polygon_fault *fault)
{
    const sv_node *node = sv_section_node(section, fault->loop == 0 ? "vertices" : "holes");
    if (fault->loop > 0 && node->kind == SV_NODE_LIST && fault->loop <= node->count)
        node = node->items[fault->loop - 1];
    if (node->kind == SV_NODE_LIST && fault->corner < node->count)
        node = node->items[fault->corner];
    return node;
}

static bool read_polygon(sv_reader *reader, const sv_section *section, sv_polygon *ret_polygon)
{
    const sv_value *vertices = sv_section_value(section, "vertices");
    const sv_value *holes = sv_section_value(section, "holes");
    sv_polygon polygon = {0};
    sv_polygon_fault fault = {0};
    double *corners = sv_reader_take(reader, vertices->count + holes->count, sizeof *corners);
    int32_t *start = sv_reader_take(reader, holes->count + 2, sizeof *start);
    if (corners == NULL || start == NULL)
        return false;
    int n = add_loops(vertices, true, corners, start, &polygon.n_loops);
    add_loops(holes, false, corners + 2 * n, start, &polygon.n_loops);
    polygon.corners = corners;
    polygon.loop_start = start;
    sv_status status = sv_polygon_check(reader->context, &polygon, &fault);
    if (status == SV_INVALID_INPUT)
        return sv_report(reader, corner_node(section, &fault), fault.hint, "%s: %s", section->path,
                         fault.message);
    *ret_polygon = polygon;
    return status == SV_OK || sv_report_status(reader, section->anchor, status);
}

/* A ribbon closes along its length whatever the key says: the default is open. */
static void read_boundary(sv_reader *reader, const sv_section *section, sv_flake_spec *flake)
{
    const sv_value *boundary = sv_section_value(section, "boundary");
    for (int i = 0; i < 2; i++)
        flake->periodic[i] = boundary->integer[i] == 1;
    if (flake->shape == SV_SHAPE_RIBBON && boundary->written && !flake->periodic[0])
        sv_note(reader, sv_section_node(section, "boundary"),
                "a ribbon is periodic along its length; a parallelogram need not be");
    flake->periodic[0] = flake->periodic[0] || flake->shape == SV_SHAPE_RIBBON;
}

bool sv_setup_flake(sv_reader *reader, sv_setup *setup)
{
    const sv_section *section = sv_document_find(reader, "flake", NULL);
    const sv_value *cells = sv_section_value(section, "cells");
    const sv_value *size = sv_section_value(section, "size");
    const sv_value *radius = sv_section_value(section, "radius");
    const sv_value *side = sv_section_value(section, "side");
    const char *edge = sv_section_value(section, "edge")->text;
    sv_flake_spec *flake = &setup->flake;
    flake->shape = (sv_shape)section->kind_row;
    if (!check_size(reader, section) || !check_words(reader, section))
        return false;
    flake->has_cells = cells->present;
    flake->has_size = size->present;
    flake->has_radius = radius->present;
    flake->has_side = side->present;
    flake->keep_largest = strcmp(sv_section_value(section, "keep")->text, "largest") == 0;
    flake->radius = radius->real[0];
    flake->side = side->real[0];
    flake->inner = sv_section_value(section, "inner")->real[0];
    flake->outer = sv_section_value(section, "outer")->real[0];
    flake->edge = edge == NULL                  ? SV_EDGE_USUAL
                  : strcmp(edge, "zigzag") == 0 ? SV_EDGE_ZIGZAG
                                                : SV_EDGE_ARMCHAIR;
    for (int i = 0; i < 2; i++) {
        flake->cells[i] = cells->integer[i];
        flake->size[i] = size->real[i];
    }
    sv_model_turn(&setup->model, sv_section_value(section, "orientation")->real[0]);
    read_boundary(reader, section, flake);
    if (flake->shape == SV_SHAPE_STRUCTURE)
        return sv_setup_structure(reader, section, setup);
    return flake->shape != SV_SHAPE_POLYGON || read_polygon(reader, section, &flake->polygon);
}
