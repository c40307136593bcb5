/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Local Chern marker column by column: what its files share. */
#ifndef SELVEDGE_CHERN_INTERNAL_H
#define SELVEDGE_CHERN_INTERNAL_H

#include <pthread.h>

#include "marker_internal.h"

/* The part of the flake one block works on; `rows` NULL: all of it. */
typedef struct part {
    sv_projector *projector; /* owned unless it is the whole one */
    bool owned;
    sv_index *rows, n, room;
    const sv_sample *sample;
} part;

typedef struct column_work {
    part area;
    sv_index target[SV_PANEL_COLUMNS_SINGLE]; /* places of the block's sites within the part */
    int count;
    sv_complex *x, *v, *z, *t; /* n × SV_PANEL_COLUMNS_SINGLE */
    sv_index room;
    int32_t *place; /* scratch for restriction */
} column_work;

/* What the threads share. */
typedef struct column_job {
    const sv_sample *sample;
    sv_projector *projector;
    const sv_index *rows;
    sv_index n_rows, next;
    double reach;
    int32_t *row_of_site; /* pristine site → row or −1, for parts */
    double *marker, *error;
    double *base; /* what costs nothing extra: sv_chern_base() */
    sv_context *context;
    sv_status status;
    pthread_mutex_t mutex;
} column_job;

/* Position of place k of the part. */
const double *sv_chern_place(const column_work *w, sv_index k);
/* Sets the part, the targets and the work blocks for the rows rows[first … first + count − 1]. */
sv_status sv_chern_set_block(sv_context *context, const column_job *job, const sv_index *rows,
                             int count, column_work *w);
/* Work space of one thread, and its end. */
sv_status sv_chern_start_work(sv_context *context, const column_job *job, column_work *w);
void sv_chern_end_work(sv_context *context, column_work *w);
/* Rows from `first` on that one block serves. */
int sv_chern_block_size(const column_job *job, sv_index first);

/* v = P x for the unit vectors of the targets. */
sv_status sv_chern_project_sites(sv_context *context, column_work *w);
/* x = (r − r_k) from, along an axis, and to = P x. */
sv_status sv_chern_project_moved(sv_context *context, column_work *w, int axis,
                                 const sv_complex *from, sv_complex *to);
/*
 * With p(E) between 0 and 1, ⟨u|p|u⟩ − ‖p u‖² = Σ |⟨n|u⟩|² p_n(1 − p_n) is the weight of u in
 * states the engine does not resolve: of u = |r⟩ for column k, and of x with z = P x at hand.
 */
double sv_chern_weight_of_site(const column_work *w, int k);
double sv_chern_weight_of_moved(const column_work *w, int k, const sv_complex *projected);
/* A number of the size of the error of one value, from these weights of |r⟩ and (y − y_r) v. */
double sv_chern_base(double first, double second);

/* Im⟨(x − x_r) v|z⟩ of column k: the marker over 4π/A. */
double sv_chern_overlap(const column_work *w, int k);
/* Does the flake lack a cell within `depth` cells of this one? */
bool sv_near_edge(const sv_flake *flake, int32_t cell, int32_t depth);
/* How often sv_chern_base() the error can be, from some of the columns looked at closely. */
sv_status sv_chern_check(sv_context *context, const column_job *job, double *ret_factor);
/*
 * For columns in single precision, whose rounding hides those weights: some columns evenly spread
 * over the rows are done again in double. Mean of their bounds and twice its standard error, and
 * three times the root mean square of what rounding did to them.
 */
sv_status sv_chern_check_single(sv_context *context, const column_job *job, double *ret_error);

#endif
