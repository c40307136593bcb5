/* SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef SELVEDGE_ENSEMBLE_INTERNAL_H
#define SELVEDGE_ENSEMBLE_INTERNAL_H

#include "selvedge/ensemble.h"

/* Running moments of the leading realisations of a point, and whether its stop rule holds. */
typedef struct stop_state {
    int64_t counted;  /* leading realisations taken in */
    int64_t resolved; /* of them, those with a value */
    double mean, squares;
    bool settled;
} stop_state;

/* Takes in the realisations that follow without a gap, up to the one where the rule holds. */
void sv_stop_advance(stop_state *state, const sv_ensemble *ensemble, int32_t point,
                     const sv_stop_rule *rule);

#endif
