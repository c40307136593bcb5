/* SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef SELVEDGE_MARKER_INTERNAL_H
#define SELVEDGE_MARKER_INTERNAL_H

#include <stdio.h>

#include "selvedge/marker.h"

/* A blank outcome with engine and levels filled in; says so when the projector is ambiguous. */
sv_outcome sv_outcome_start(const sv_projector *projector);

#endif
