/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Windows without a cell are told before anything is computed, at the place of the flake. */
#include "program_internal.h"

/* Has every window of every point a cell? */
static sv_status try_windows(session *s)
{
    for (int32_t k = 0; k < s->n_points; k++) {
        const sv_case *problem = &s->points[k].problem;
        for (int m = 0; m < problem->n_markers; m++) {
            bool *inside = NULL;
            sv_index cells;
            const int marker = problem->markers[m].marker;
            if (marker != sv_marker_find("local_chern") && marker != sv_marker_find("spin_chern"))
                continue;
            sv_status status =
                sv_flake_window(s->context, problem->open_flake,
                                problem->markers[m].values[0].real[0], &inside, &cells);
            if (status != SV_OK)
                return status;
            sv_give(s->context, inside);
        }
    }
    return SV_OK;
}

sv_status session_try_windows(session *s)
{
    return session_blame(s, "flake", try_windows(s));
}
