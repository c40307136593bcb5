/* SPDX-License-Identifier: GPL-3.0-or-later */
/* What an engine provides. A new engine is one file with one table of these functions. */
#ifndef SELVEDGE_PROJECTOR_INTERNAL_H
#define SELVEDGE_PROJECTOR_INTERNAL_H

#include "selvedge/projector.h"

typedef struct engine_class {
    const char *name;
    void (*free)(sv_context *context, void *state);
    sv_status (*apply)(sv_context *context, void *state, sv_index columns, const sv_complex *x,
                       sv_complex *y);
    sv_basis (*basis)(const void *state);
    /* NULL: the engine cannot be restricted. */
    sv_status (*restrict_to)(sv_context *context, const sv_projector *projector,
                             const sv_index *rows, sv_index n_rows, const int32_t *place,
                             void **ret_state);
    /* See sv_projector_uniform_error(); NULL: no such statement. */
    double (*uniform_error)(const void *state);
    /* Single precision on or off; false: there is no choice. NULL: always double. */
    bool (*set_single)(void *state, bool single);
    bool (*is_single)(const void *state);
    int (*degree)(const void *state); /* NULL: there is none */
} engine_class;

struct sv_projector {
    const engine_class *engine;
    void *state;
    const sv_sample *sample;
    sv_levels levels;
    double reach;
    sv_index n; /* rows: of the sample, or of the part */
};

/* A panel from up to SV_PANEL_COLUMNS columns of n values, zeros in the rest of it, and back. */
void sv_columns_to_panel(double *panel, sv_index n, const sv_complex *x, sv_index columns);
void sv_panel_to_columns(const double *panel, sv_index n, sv_complex *y, sv_index columns);
/* The same for panels of SV_PANEL_COLUMNS_SINGLE columns. */
void sv_columns_to_panel_single(float *panel, sv_index n, const sv_complex *x, sv_index columns);
void sv_panel_to_columns_single(const float *panel, sv_index n, sv_complex *y, sv_index columns);

/* Two energies closer than this cannot be told apart by state counts. */
double sv_levels_resolution(const sv_sparse *h);
/*
 * Fermi energy, state count and the levels next to it by inertia, the levels to `tolerance` of
 * their distance; on_level is set by the same rule as in the dense engine. A handful of
 * factorisations for an energy, about 40 for a filling.
 * SV_UNDEFINED for more electrons than states.
 */
sv_status sv_levels_find(sv_context *context, const sv_sample *sample,
                         const sv_occupation *occupation, double tolerance, sv_levels *ret_levels);
/* Distance of the nearest known level from the Fermi energy; infinite when none is known. */
double sv_levels_distance(const sv_levels *levels);

/* Builds the Chebyshev engine; needs an occupation by energy and options->half_gap. */
sv_status sv_chebyshev_engine_make(sv_context *context, const sv_sample *sample,
                                   const sv_occupation *occupation,
                                   const sv_projector_options *options, sv_projector *projector);

/* Builds the rational engine: fills engine, state and levels. */
sv_status sv_rational_engine_make(sv_context *context, const sv_sample *sample,
                                  const sv_occupation *occupation,
                                  const sv_projector_options *options, sv_projector *projector);

/* Builds the dense engine: fills engine, state and levels. */
sv_status sv_dense_engine_make(sv_context *context, const sv_sample *sample,
                               const sv_occupation *occupation, const sv_projector_options *options,
                               sv_projector *projector);

/*
 * Builds a projector that holds an orthonormal basis of the occupied space, made without
 * eigenvectors. *ret_made is false where this way does not lead there (no or too many levels near
 * the Fermi energy, columns that do not span the space): the dense engine does.
 */
sv_status sv_occupied_basis_make(sv_context *context, const sv_sample *sample,
                                 const sv_occupation *occupation,
                                 const sv_projector_options *options, sv_projector *projector,
                                 bool *ret_made);

/* m orthonormal vectors (n × m) out of the columns of `filter` on s ≥ m sites.
 * SV_NUMERICAL when those span a space of another dimension. */
sv_status sv_occupied_columns(sv_context *context, const sv_sample *sample, sv_projector *filter,
                              sv_index m, sv_index s, sv_complex **ret_vectors);

#endif
