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
} engine_class;

struct sv_projector {
    const engine_class *engine;
    void *state;
    const sv_sample *sample;
    sv_levels levels;
};

/* Builds the dense engine: fills engine, state and levels. */
sv_status sv_dense_engine_make(sv_context *context, const sv_sample *sample,
                               const sv_occupation *occupation, const sv_projector_options *options,
                               sv_projector *projector);

#endif
