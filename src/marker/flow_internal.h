/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Inside the spectral flow: levels at one flux, and how they go over into those at another. */
#ifndef SELVEDGE_FLOW_INTERNAL_H
#define SELVEDGE_FLOW_INTERNAL_H

#include "marker_internal.h"

/* A sample with one hole, ready to be threaded with flux. */
typedef struct flow_ring {
    const sv_sample *sample;
    double energy;    /* Fermi energy */
    double *angle;    /* per stored element: angle of the hop seen from the hole */
    bool *inner;      /* per row: nearer to the hole than to the outline */
    double speed;     /* bound of the norm of dH/dΦ, Φ in flux quanta */
    sv_sparse turned; /* the Hamiltonian with flux; shares the pattern of the sample's */
} flow_ring;

sv_status sv_flow_ring_make(sv_context *context, const sv_sample *sample, double energy,
                            flow_ring *ret_ring);
void sv_flow_ring_free(sv_context *context, flow_ring *ring);

/*
 * Levels next to the Fermi energy at one flux. The space they span is split into the part at the
 * hole and the part at the outline by the weight near the hole, and the energies are those within
 * the parts: levels of opposite edges pass through each other instead of mixing.
 */
typedef struct flow_levels {
    double flux;        /* quanta */
    double half_width;  /* all levels nearer to the Fermi energy than this are here */
    int count, n_inner; /* those at the hole come first */
    double *energies;   /* from the Fermi energy */
    double *weights;    /* weight near the hole */
    double *couplings;  /* elements to the other part over the mean spacing of the levels */
    sv_complex *vectors;
} flow_levels;

/* @return SV_NOT_CONVERGED when the levels cannot be computed */
sv_status sv_flow_levels_find(sv_context *context, flow_ring *ring, double flux, double half_width,
                              flow_levels *ret_levels);
void sv_flow_levels_free(sv_context *context, flow_levels *levels);

/* Crossings of the Fermi energy between two fluxes. */
typedef struct flow_step {
    bool followed;   /* every level near the Fermi energy was found again */
    int rise[2];     /* net number of levels that rise through it, at the hole and at the outline */
    double kept;     /* least share of a level found again */
    double side;     /* least weight of a crossing level on its own side; 1: none crossed */
    double coupling; /* largest of a crossing level */
} flow_step;

sv_status sv_flow_step_follow(sv_context *context, const flow_ring *ring, const flow_levels *a,
                              const flow_levels *b, flow_step *ret_step);

#endif
