/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Parts of the localizer shared by its files: one probe, and many of them. */
#ifndef SELVEDGE_LOCALIZER_INTERNAL_H
#define SELVEDGE_LOCALIZER_INTERNAL_H

#include "marker_internal.h"

/* Rows of its keys. */
enum { AT, KAPPA, THRESHOLD, GAP, FROM, TO, POINTS, KAPPA_RANGE, KAPPA_POINTS, N_LOCALIZER_KEYS };

/* One probe: where, and what its factorisations say. Plan and matrix serve any number of probes. */
typedef struct localizer_work {
    const sv_sample *sample;
    double at[2], energy, kappa, threshold;
    double gap; /* of the pristine torus, from its Fermi energy; 0: none */
    bool want_value;
    sv_inertia_plan *plan; /* of H, then of the localizer: the same graph of sites */
    sv_sparse matrix;
    sv_index negative;      /* of the localizer */
    double certain, lowest; /* its gap is at least / is */
    double reach;           /* a level lies this near to 0; 0: not known */
} localizer_work;

#define UNRESOLVED(outcome, ...) snprintf((outcome)->reason, sizeof(outcome)->reason, __VA_ARGS__)

/*
 * Settings, Fermi energy and, where there is a κ, matrix and plan. ret_ready false: the outcome is
 * unresolved already, and its reason says why. Give back with sv_localizer_end().
 */
sv_status sv_localizer_begin(sv_context *context, const sv_marker_input *input, localizer_work *w,
                             sv_outcome *outcome, bool *ret_ready);
void sv_localizer_end(sv_context *context, localizer_work *w);
/* Moves the matrix to a κ and a probe: the values sv_localizer_matrix() would give. */
void sv_localizer_move(const sv_sample *sample, double kappa, const double at[2],
                       sv_sparse *matrix);
/* Verdict, index and margin of the probe w->at at w->kappa, to which the matrix has been moved. */
sv_status sv_localizer_judge(sv_context *context, localizer_work *w, sv_outcome *outcome);
/* A lower bound of the gap, by inertia: close to `lowest` where that was asked for; 0: none. */
sv_status sv_localizer_certify_gap(sv_context *context, localizer_work *w);
bool sv_localizer_check(const sv_value *values, int *ret_key, char *message, size_t size);
/* Fills the brackets between the probes. bounds_only: their gaps are lower bounds themselves. */
sv_status sv_localizer_bracket(sv_context *context, bool bounds_only, sv_survey *s);

#endif
