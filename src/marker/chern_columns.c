/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Local Chern marker column by column, with an error estimate that costs nothing extra. Where the
 * engine's columns reach only a small part of the flake, each block of sites works on that part. */
#include "marker_internal.h"

#include <math.h>
#include <pthread.h>
#include <string.h>

enum { BLOCK = SV_PANEL_COLUMNS_SINGLE };

/*
 * How much larger than the estimate the error of a window mean may be. Measured against dense
 * answers on disordered honeycomb flakes, gapped and gapless: the mean error was 0.5 to 3.5 times
 * the sum of the two terms in estimate().
 */
static const double CAUTION = 4.0;

/* The part of the flake one block works on; `rows` NULL: all of it. */
typedef struct part {
    sv_projector *projector; /* owned unless it is the whole one */
    bool owned;
    sv_index *rows, n, room;
    const sv_sample *sample;
} part;

typedef struct column_work {
    part area;
    sv_index target[BLOCK]; /* places of the block's sites within the part */
    int count;
    sv_complex *x, *v, *z; /* n × BLOCK */
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
    int32_t *row_of_site; /* pristine site → its first row or −1, for parts */
    double *marker, *error;
    sv_context *context;
    sv_status status;
    pthread_mutex_t mutex;
} column_job;

static const double *place_of(const column_work *w, sv_index k)
{
    const sv_sample *s = w->area.sample;
    return s->flake->sites[s->pristine[w->area.rows == NULL ? k : w->area.rows[k]]].at;
}

static double square(sv_complex value)
{
    return creal(value) * creal(value) + cimag(value) * cimag(value);
}

/* x = unit vectors, v = P x, then x = (y − y_r) v and z = P x. */
static sv_status project_twice(sv_context *context, column_work *w)
{
    sv_index n = w->area.n;
    memset(w->x, 0, (size_t)(n * w->count) * sizeof *w->x);
    for (int k = 0; k < w->count; k++)
        w->x[w->target[k] + k * n] = 1.0;
    sv_status status = sv_projector_apply(context, w->area.projector, w->count, w->x, w->v);
    if (status != SV_OK)
        return status;
    for (int k = 0; k < w->count; k++) {
        double y0 = place_of(w, w->target[k])[1];
        for (sv_index r = 0; r < n; r++)
            w->x[r + k * n] = (place_of(w, r)[1] - y0) * w->v[r + k * n];
    }
    return sv_projector_apply(context, w->area.projector, w->count, w->x, w->z);
}

/* Im⟨(x − x_r) v|z⟩ of column k. */
static double overlap(const column_work *w, int k)
{
    sv_index n = w->area.n;
    const sv_complex *v = w->v + k * n, *z = w->z + k * n;
    double sum = 0.0, x0 = place_of(w, w->target[k])[0];
    for (sv_index r = 0; r < n; r++)
        sum += (place_of(w, r)[0] - x0) * (creal(v[r]) * cimag(z[r]) - cimag(v[r]) * creal(z[r]));
    return sum;
}

/*
 * With p(E) between 0 and 1, ⟨u|p|u⟩ − ‖p u‖² = Σ |⟨n|u⟩|² p_n(1 − p_n) is the weight of u in
 * states the engine does not resolve. For u = |r⟩ and u = (y − y_r) v both terms are at hand; the
 * error of the marker is of the order of the second plus their geometric mean.
 */
static double estimate(const column_work *w, int k)
{
    sv_index n = w->area.n;
    const sv_complex *v = w->v + k * n, *u = w->x + k * n, *z = w->z + k * n;
    double vv = 0.0, zz = 0.0, uz = 0.0;
    for (sv_index r = 0; r < n; r++) {
        vv += square(v[r]);
        zz += square(z[r]);
        uz += creal(u[r]) * creal(z[r]) + cimag(u[r]) * cimag(z[r]);
    }
    double first = fabs(creal(v[w->target[k]]) - vv), second = fabs(uz - zz);
    return CAUTION * (second + sqrt(first * second));
}

/*
 * What an error of P of norm η does, to first order: with v = P|r⟩ and z = P (y − y_r) v the marker
 * is ⟨v|(x − x_r)|z⟩, so η ‖(x − x_r) v‖ ‖(y − y_r) v‖ from the projector in the middle and
 * η ‖(x − x_r) z‖ from either of the outer ones.
 */
static double uniform_error(const column_work *w, int k, double eta)
{
    sv_index n = w->area.n;
    const sv_complex *v = w->v + k * n, *u = w->x + k * n, *z = w->z + k * n;
    double xv = 0.0, yv = 0.0, xz = 0.0, x0 = place_of(w, w->target[k])[0];
    for (sv_index r = 0; r < n; r++) {
        double x = place_of(w, r)[0] - x0;
        xv += x * x * square(v[r]);
        yv += square(u[r]);
        xz += x * x * square(z[r]);
    }
    return eta * (sqrt(xv * yv) + 2.0 * sqrt(xz));
}

/*
 * What the cut of the part can do: the cut feels v and z through their weight next to the rim. The
 * overlap pairs v and z there with the distance to the site.
 */
static double rim_error(const column_work *w, int k, double reach)
{
    sv_index n = w->area.n;
    const sv_complex *v = w->v + k * n, *z = w->z + k * n;
    const double *centre = place_of(w, w->target[k]);
    double vv = 0.0, zz = 0.0;
    for (sv_index r = 0; r < n; r++) {
        const double *at = place_of(w, r);
        if (hypot(at[0] - centre[0], at[1] - centre[1]) < reach - 2.0)
            continue;
        vv += square(v[r]);
        zz += square(z[r]);
    }
    return 2.0 * reach * (sqrt(vv * zz) + reach * vv);
}

/* The rows of a site: its own and those of adatoms on it. */
static sv_status add_rows_of(sv_context *context, const column_job *job, sv_index site, part *area)
{
    const sv_sample *sample = job->sample;
    for (sv_index r = job->row_of_site[site];
         r >= 0 && r < sample->n && sample->pristine[r] == site; r++) {
        sv_status status =
            sv_reserve(context, &area->rows, &area->room, area->n + 1, sizeof *area->rows);
        if (status != SV_OK)
            return status;
        area->rows[area->n++] = r;
    }
    return SV_OK;
}

/* Rows within reach of the block's middle, ascending. */
static sv_status gather_part(sv_context *context, const column_job *job, const double middle[2],
                             double radius, part *area)
{
    const sv_flake *flake = job->sample->flake;
    const double(*vectors)[2] = flake->model->vectors;
    double cell = sv_model_cell_area(flake->model), uv[2];
    double du = radius * hypot(vectors[1][0], vectors[1][1]) / cell + 1.5;
    double dv = radius * hypot(vectors[0][0], vectors[0][1]) / cell + 1.5;
    sv_model_reduce(flake->model, middle, uv);
    int64_t width = (int64_t)flake->high[1] - flake->low[1] + 1;
    int64_t i0 = (int64_t)fmax(floor(uv[0] - du), flake->low[0]);
    int64_t i1 = (int64_t)fmin(ceil(uv[0] + du), flake->high[0]);
    int64_t j0 = (int64_t)fmax(floor(uv[1] - dv), flake->low[1]);
    int64_t j1 = (int64_t)fmin(ceil(uv[1] + dv), flake->high[1]);
    area->n = 0;
    for (int64_t i = i0; i <= i1; i++)
        for (int64_t j = j0; j <= j1; j++) {
            int32_t c = flake->cell_at[(i - flake->low[0]) * width + (j - flake->low[1])];
            if (c < 0)
                continue;
            const sv_cell *at = &flake->cells[c];
            for (sv_index s = at->first_site; s < at->first_site + at->n_sites; s++) {
                if (hypot(flake->sites[s].at[0] - middle[0], flake->sites[s].at[1] - middle[1]) >
                    radius)
                    continue;
                sv_status status = add_rows_of(context, job, s, area);
                if (status != SV_OK)
                    return status;
            }
        }
    return SV_OK;
}

static sv_index find_row(const part *area, sv_index row)
{
    sv_index low = 0, high = area->n;
    while (low < high) {
        sv_index middle = low + (high - low) / 2;
        if (area->rows[middle] < row)
            low = middle + 1;
        else
            high = middle;
    }
    return low;
}

/* Sets the part, the targets and the work blocks for rows[first … first+count−1]. */
static sv_status set_block(sv_context *context, const column_job *job, sv_index first, int count,
                           column_work *w)
{
    const sv_sample *s = job->sample;
    sv_status status = SV_OK;
    w->count = count;
    if (job->reach > 0.0) {
        double middle[2] = {0.0, 0.0}, spread = 0.0;
        for (int k = 0; k < count; k++)
            for (int axis = 0; axis < 2; axis++)
                middle[axis] += s->flake->sites[s->pristine[job->rows[first + k]]].at[axis] / count;
        for (int k = 0; k < count; k++) {
            const double *at = s->flake->sites[s->pristine[job->rows[first + k]]].at;
            spread = fmax(spread, hypot(at[0] - middle[0], at[1] - middle[1]));
        }
        if ((status = gather_part(context, job, middle, job->reach + spread, &w->area)) != SV_OK ||
            (status = sv_projector_restrict(context, job->projector, w->area.rows, w->area.n,
                                            w->place, &w->area.projector)) != SV_OK)
            return status;
        w->area.owned = true;
    }
    for (int k = 0; k < count; k++)
        w->target[k] =
            job->reach > 0.0 ? find_row(&w->area, job->rows[first + k]) : job->rows[first + k];
    sv_index room = w->room / BLOCK;
    if (w->area.n > room) {
        sv_give(context, w->x);
        w->x = NULL;
        w->room = 0;
        sv_index size = (w->area.n + w->area.n / 8) * BLOCK;
        if ((status = sv_take_raw(context, 3 * size, sizeof *w->x, &w->x)) != SV_OK)
            return status;
        w->room = size;
        w->v = w->x + size;
        w->z = w->v + size;
    }
    return SV_OK;
}

static sv_status one_block(sv_context *context, column_job *job, sv_index first, int count,
                           column_work *w)
{
    double factor = 4.0 * M_PI / sv_model_cell_area(job->sample->flake->model);
    sv_status status = set_block(context, job, first, count, w);
    if (status == SV_OK)
        status = project_twice(context, w);
    double eta = status == SV_OK ? sv_projector_uniform_error(w->area.projector) : 0.0;
    for (int k = 0; k < count && status == SV_OK; k++) {
        job->marker[first + k] = factor * overlap(w, k);
        job->error[first + k] = factor * estimate(w, k);
        if (eta > 0.0)
            job->error[first + k] += factor * uniform_error(w, k, eta);
        if (job->reach > 0.0)
            job->error[first + k] += factor * rim_error(w, k, job->reach);
    }
    if (w->area.owned)
        sv_projector_free(context, w->area.projector);
    w->area.owned = false;
    return status;
}

static sv_status start_work(sv_context *context, const column_job *job, column_work *w)
{
    *w = (column_work){
        .area = {.sample = job->sample, .projector = job->projector, .n = job->sample->n}};
    if (job->reach <= 0.0)
        return SV_OK;
    sv_status status = sv_take_raw(context, job->sample->n, sizeof *w->place, &w->place);
    if (status == SV_OK)
        memset(w->place, 0xff, (size_t)job->sample->n * sizeof *w->place);
    return status;
}

/* Sites of a block lie close together, so that one part of the flake serves them all. */
static int block_size(const column_job *job, sv_index first)
{
    const double compact = 8.0;
    const sv_sample *s = job->sample;
    const double *start = s->flake->sites[s->pristine[job->rows[first]]].at;
    int count = 1;
    while (count < BLOCK && first + count < job->n_rows) {
        const double *at = s->flake->sites[s->pristine[job->rows[first + count]]].at;
        if (job->reach > 0.0 && hypot(at[0] - start[0], at[1] - start[1]) > compact)
            break;
        count++;
    }
    return count;
}

static void *column_thread(void *argument)
{
    column_job *job = argument;
    sv_context context = sv_context_fork(job->context);
    column_work w;
    sv_status status = start_work(&context, job, &w);
    pthread_mutex_lock(&job->mutex);
    while (status == SV_OK && job->status == SV_OK && job->next < job->n_rows) {
        sv_index first = job->next;
        int count = block_size(job, first);
        job->next += count;
        pthread_mutex_unlock(&job->mutex);
        status = sv_cancelled(&context)
                     ? SV_FAIL(&context, SV_INTERRUPTED, "stopped during a marker")
                     : one_block(&context, job, first, count, &w);
        pthread_mutex_lock(&job->mutex);
    }
    if (status != SV_OK && job->status == SV_OK) {
        job->status = status;
        sv_context_take_error(job->context, &context);
    }
    pthread_mutex_unlock(&job->mutex);
    sv_give(&context, w.x);
    sv_give(&context, w.place);
    sv_give(&context, w.area.rows);
    return NULL;
}

/* Threads share parts only: the whole projector has one set of work panels. */
static sv_status run_threads(sv_context *context, column_job *job, int threads)
{
    enum { MOST_THREADS = 256 };
    pthread_t started[MOST_THREADS];
    int count = 0;
    if (pthread_mutex_init(&job->mutex, NULL) != 0)
        return SV_FAIL(context, SV_INTERNAL, "no mutex");
    for (int k = 1; k < threads && k < MOST_THREADS && job->reach > 0.0; k++)
        count += pthread_create(&started[count], NULL, column_thread, job) == 0;
    column_thread(job);
    for (int k = 0; k < count; k++)
        pthread_join(started[k], NULL);
    pthread_mutex_destroy(&job->mutex);
    return job->status;
}

sv_status sv_chern_columns(sv_context *context, const sv_sample *sample, sv_projector *projector,
                           int threads, const sv_index *rows, sv_index n_rows, double *ret_marker,
                           double *ret_error)
{
    column_job job = {.sample = sample,
                      .projector = projector,
                      .rows = rows,
                      .n_rows = n_rows,
                      .reach = sv_projector_reach(projector),
                      .marker = ret_marker,
                      .error = ret_error,
                      .context = context};
    sv_status status = SV_OK;
    if (job.reach > 0.0) {
        sv_index sites = sample->flake->n_sites;
        status = sv_take_raw(context, sites, sizeof *job.row_of_site, &job.row_of_site);
        if (status != SV_OK)
            return status;
        memset(job.row_of_site, 0xff, (size_t)sites * sizeof *job.row_of_site);
        for (sv_index r = 0; r < sample->n; r++)
            if (job.row_of_site[sample->pristine[r]] < 0)
                job.row_of_site[sample->pristine[r]] = (int32_t)r;
    }
    status = run_threads(context, &job, threads);
    sv_give(context, job.row_of_site);
    return status;
}
