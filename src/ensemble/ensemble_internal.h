/* SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef SELVEDGE_ENSEMBLE_INTERNAL_H
#define SELVEDGE_ENSEMBLE_INTERNAL_H

#include "selvedge/ensemble.h"

/* Takes in the realisations that follow without a gap, up to the one where the rule holds. */
void sv_stop_advance(sv_stop_state *state, const sv_ensemble *ensemble, int32_t point,
                     const sv_stop_rule *rule);

#endif
