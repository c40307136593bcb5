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

/* Honeycomb: vectors at 60°, two positions (a1+a2)/3 apart. Centre of a hexagon to ret_centre. */
bool sv_model_is_honeycomb(const sv_model *model, double ret_centre[2]);

/* Torus vectors of a specification, or why there are none. */
bool sv_flake_torus(const sv_model *model, const sv_flake_spec *spec, const bool periodic[2],
                    int32_t ret_period[2][2], char *reason, size_t reason_size);

sv_status sv_sample_build_hamiltonian(sv_context *context, sv_sample *sample,
                                      const int32_t *row_of_site);

#endif
