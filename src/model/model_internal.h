/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Builders of the named models: `values` has one entry per key of the kind, in its order. They
 * leave sv_model_finish() to the caller. */
#ifndef SELVEDGE_MODEL_INTERNAL_H
#define SELVEDGE_MODEL_INTERNAL_H

#include "selvedge/model.h"

/* Passes a failure on; keeps the builders readable. */
#define TRY(call)                                                                                  \
    do {                                                                                           \
        sv_status try_status = (call);                                                             \
        if (try_status != SV_OK)                                                                   \
            return try_status;                                                                     \
    } while (0)

sv_status sv_make_haldane(sv_context *context, const sv_value *values, sv_model *model);
sv_status sv_make_qi_wu_zhang(sv_context *context, const sv_value *values, sv_model *model);
sv_status sv_make_hofstadter(sv_context *context, const sv_value *values, sv_model *model);
sv_status sv_make_kagome(sv_context *context, const sv_value *values, sv_model *model);
sv_status sv_make_kane_mele(sv_context *context, const sv_value *values, sv_model *model);
sv_status sv_make_magnetic_film(sv_context *context, const sv_value *values, sv_model *model);

#endif
