/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "selvedge/sample.h"

#include <math.h>

int64_t sv_occupation_electrons(const sv_occupation *occupation, sv_index states)
{
    if (occupation->by == SV_BY_ELECTRONS)
        return occupation->electrons;
    /* The nudge absorbs 0.3·10 = 2.9999…. */
    return (int64_t)floor(occupation->filling * (double)states + 0.5 + 1e-9);
}
