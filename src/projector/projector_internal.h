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
} engine_class;

struct sv_projector {
    const engine_class *engine;
    void *state;
    const sv_sample *sample;
    sv_levels levels;
    double reach;
    sv_index n; /* rows: of the sample, or of the part */
};

/* Builds the Chebyshev engine; needs an occupation by energy and options->half_gap. */
sv_status sv_chebyshev_engine_make(sv_context *context, const sv_sample *sample,
                                   const sv_occupation *occupation,
                                   const sv_projector_options *options, sv_projector *projector);

/* Builds the dense engine: fills engine, state and levels. */
sv_status sv_dense_engine_make(sv_context *context, const sv_sample *sample,
                               const sv_occupation *occupation, const sv_projector_options *options,
                               sv_projector *projector);

#endif
