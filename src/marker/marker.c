/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The table of markers. */
#include "localizer_internal.h"

#include <math.h>
#include <string.h>

static const sv_key local_chern_keys[] = {
    {.name = "window",
     .type = SV_KEY_REAL,
     .low = 0,
     .high = 1,
     .low_open = true,
     .fallback = "0.5",
     .doc = "averaging window: share of the linear size about the centre"},
    {.name = "blocks",
     .type = SV_KEY_INTEGER,
     .low = 1,
     .high = 1000,
     .doc = "map: means over square blocks instead of every site, so many along the longer side"},
    {.name = "block_cells",
     .type = SV_KEY_INTEGER,
     .low = 1,
     .high = 1e6,
     .doc = "cells sampled in each block (32 when not given)"},
};

static const sv_key localizer_keys[] = {
    {.name = "at",
     .type = SV_KEY_PLACE,
     .dimension = SV_DIM_LENGTH,
     .low = -1e9,
     .high = 1e9,
     .fallback = "centre",
     .doc = "probe point: centre or [x, y]"},
    {.name = "kappa",
     .type = SV_KEY_AUTO_OR_REAL,
     .dimension = SV_DIM_ENERGY,
     .low = 0,
     .high = 1e12,
     .low_open = true,
     .fallback = "auto",
     .doc = "weight of the position, energy per lattice constant; auto: 2 g / rho, g half the "
            "clean gap, rho the distance of the probe from the edge"},
    {.name = "threshold",
     .type = SV_KEY_AUTO_OR_REAL,
     .dimension = SV_DIM_ENERGY,
     .low = 0,
     .high = 1e12,
     .low_open = true,
     .fallback = "auto",
     .doc = "least localizer gap of a resolved index; auto: g / 4"},
    {.name = "gap",
     .type = SV_KEY_CHOICE,
     .choices = "value bound",
     .fallback = "value",
     .doc = "report the localizer gap itself, or only that it exceeds the threshold (faster)"},
    {.name = "from",
     .type = SV_KEY_REAL_PAIR,
     .dimension = SV_DIM_LENGTH,
     .low = -1e9,
     .high = 1e9,
     .doc =
         "map: first probe point of a line; lower left corner of a grid (default: of the sites)"},
    {.name = "to",
     .type = SV_KEY_REAL_PAIR,
     .dimension = SV_DIM_LENGTH,
     .low = -1e9,
     .high = 1e9,
     .doc = "map: last probe point of a line; upper right corner of a grid"},
    {.name = "points",
     .type = SV_KEY_INTEGER_OR_PAIR,
     .low = 2,
     .high = 1000,
     .doc = "map: n probe points on the line from - to, or a grid of [nx, ny], at one kappa"},
    {.name = "kappa_range",
     .type = SV_KEY_REAL_PAIR,
     .dimension = SV_DIM_ENERGY,
     .low = 0,
     .high = 1e12,
     .low_open = true,
     .doc = "map: index and gap at the probe point against kappa, from and to"},
    {.name = "kappa_points",
     .type = SV_KEY_INTEGER,
     .low = 2,
     .high = 200,
     .doc = "number of kappa in that range, equal ratios (9 when not given)"},
};

static const sv_key disc_keys[] = {
    {.name = "at",
     .type = SV_KEY_PLACE,
     .dimension = SV_DIM_LENGTH,
     .low = -1e9,
     .high = 1e9,
     .fallback = "centre",
     .doc = "centre of the disc: centre or [x, y]"},
    {.name = "radius",
     .type = SV_KEY_AUTO_OR_REAL,
     .dimension = SV_DIM_LENGTH,
     .low = 0,
     .high = 1e6,
     .low_open = true,
     .fallback = "auto",
     .doc = "radius of the disc summed; auto: half the distance to the edge"},
};

static const sv_key spin_chern_keys[] = {
    {.name = "window",
     .type = SV_KEY_REAL,
     .low = 0,
     .high = 1,
     .low_open = true,
     .fallback = "0.5",
     .doc = "averaging window: share of the linear size about the centre"},
    {.name = "threshold",
     .type = SV_KEY_REAL,
     .low = 0,
     .high = 2,
     .low_open = true,
     .fallback = "0.25",
     .doc = "least gap of P sz P about zero of a resolved value; 2 with conserved spin"},
};

static const sv_key flow_keys[] = {
    {.name = "steps",
     .type = SV_KEY_INTEGER,
     .low = 1,
     .high = 500,
     .fallback = "16",
     .doc = "steps of the flux to begin with; halved where levels cannot be followed"},
    {.name = "energy_window",
     .type = SV_KEY_AUTO_OR_REAL,
     .dimension = SV_DIM_ENERGY,
     .low = 0,
     .high = 1e12,
     .low_open = true,
     .fallback = "auto",
     .doc = "levels nearer to the Fermi energy are followed, 24 at most; auto: 5 % of the largest "
            "energy"},
};

static const sv_marker table[] = {
    {.kind = {"local_chern", "local Chern marker, mean over a window (Bianco, Resta 2011)",
              local_chern_keys, 3},
     .is_index = false,
     .boundary = SV_OPEN_COPY,
     .needs_projector = true,
     .compute = sv_local_chern,
     .check = sv_local_chern_check},
    {.kind = {"bott", "Bott index on the torus (Loring, Hastings 2010)", NULL, 0},
     .is_index = true,
     .boundary = SV_CLOSED_COPY,
     .needs_projector = true,
     .needs_occupied_basis = true,
     .compute = sv_bott_index},
    {.kind = {"localizer", "spectral localizer index at a point (Loring, Schulz-Baldes 2020)",
              localizer_keys, N_LOCALIZER_KEYS},
     .is_index = true,
     .boundary = SV_OPEN_COPY,
     .compute = sv_localizer_index,
     .check = sv_localizer_check},
    {.kind = {"three_sector", "three-sector Chern number of a disc (Kitaev 2006)", disc_keys, 2},
     .is_index = false,
     .boundary = SV_OPEN_COPY,
     .needs_projector = true,
     .compute = sv_three_sector},
    {.kind = {"crosshair", "crosshair marker of a disc (d'Ornellas, Barnett, Lee 2022)", disc_keys,
              2},
     .is_index = false,
     .boundary = SV_OPEN_COPY,
     .needs_projector = true,
     .compute = sv_crosshair},
    {.kind = {"spin_chern", "spin Chern number, local: mean over a window (Prodan 2009)",
              spin_chern_keys, 2},
     .is_index = false,
     .boundary = SV_OPEN_COPY,
     .needs_projector = true,
     .needs_occupied_basis = true,
     .compute = sv_spin_chern},
    {.kind = {"spin_bott", "spin Bott index on the torus (Huang, Liu 2018)", &spin_chern_keys[1],
              1},
     .is_index = true,
     .boundary = SV_CLOSED_COPY,
     .needs_projector = true,
     .needs_occupied_basis = true,
     .compute = sv_spin_bott},
    {.kind = {"density_response", "states gained per flux quantum through the torus (Streda 1982)",
              NULL, 0},
     .is_index = true,
     .boundary = SV_CLOSED_COPY,
     .compute = sv_density_response},
    {.kind = {"spectral_flow", "levels that pass the Fermi energy per flux quantum through a hole",
              flow_keys, 2},
     .is_index = true,
     .boundary = SV_OPEN_COPY,
     .compute = sv_spectral_flow},
};

const sv_marker *sv_marker_table(int *ret_count)
{
    *ret_count = (int)(sizeof table / sizeof table[0]);
    return table;
}

int sv_marker_find(const char *name)
{
    for (int k = 0; k < (int)(sizeof table / sizeof table[0]); k++)
        if (strcmp(table[k].kind.name, name) == 0)
            return k;
    return -1;
}

bool sv_marker_check(int marker, const sv_value *values, int *ret_key, char *message, size_t size)
{
    return table[marker].check == NULL || table[marker].check(values, ret_key, message, size);
}

sv_outcome sv_outcome_blank(void)
{
    return (sv_outcome){.verdict = SV_UNRESOLVED,
                        .value = NAN,
                        .numerical_error = NAN,
                        .estimator_error = 0.0,
                        .margin = NAN,
                        .weakest = NAN,
                        .unresolved_within = NAN,
                        .nearest_level = NAN,
                        .sum_over_sites = NAN,
                        .kappa = NAN,
                        .highest_occupied = NAN,
                        .lowest_empty = NAN};
}

sv_outcome sv_outcome_start(const sv_projector *projector)
{
    sv_outcome outcome = sv_outcome_blank();
    const sv_levels *levels = sv_projector_levels(projector);
    snprintf(outcome.engine, sizeof outcome.engine, "%s", sv_projector_engine(projector));
    outcome.degree = sv_projector_degree(projector);
    outcome.electrons = levels->occupied;
    outcome.unresolved_within = levels->gap_resolved ? 0.0 : levels->resolved_from;
    double nearest = INFINITY;
    if (levels->has_highest)
        nearest = fabs(levels->fermi_energy - levels->highest_occupied);
    if (levels->has_lowest)
        nearest = fmin(nearest, fabs(levels->lowest_empty - levels->fermi_energy));
    outcome.nearest_level = isfinite(nearest) ? nearest : (double)NAN;
    if (levels->has_highest)
        outcome.highest_occupied = levels->highest_occupied;
    if (levels->has_lowest)
        outcome.lowest_empty = levels->lowest_empty;
    if (levels->on_level && levels->by_count)
        snprintf(
            outcome.reason, sizeof outcome.reason,
            "%lld electrons fill a degenerate level at %.6g only in part (levels within %.1e): "
            "set a Fermi energy above or below it",
            (long long)levels->occupied, levels->fermi_energy, levels->resolution);
    else if (levels->on_level)
        snprintf(outcome.reason, sizeof outcome.reason,
                 "a level coincides with the Fermi energy %.6g (within %.1e): choose a filling, a "
                 "number of electrons or another energy",
                 levels->fermi_energy, levels->resolution);
    return outcome;
}
