/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Local Chern marker column by column, with an error estimate from the weight of states the engine
 * does not resolve. Where the engine's columns reach only a small part of the flake, each block of
 * sites works on that part. */
#include "chern_internal.h"

#include <math.h>
#include <string.h>

static double square(sv_complex value)
{
    return creal(value) * creal(value) + cimag(value) * cimag(value);
}

sv_status sv_chern_project_sites(sv_context *context, column_work *w)
{
    sv_index n = w->area.n;
    memset(w->x, 0, (size_t)(n * w->count) * sizeof *w->x);
    for (int k = 0; k < w->count; k++)
        w->x[w->target[k] + k * n] = 1.0;
    return sv_projector_apply(context, w->area.projector, w->count, w->x, w->v);
}

sv_status sv_chern_project_moved(sv_context *context, column_work *w, int axis,
                                 const sv_complex *from, sv_complex *to)
{
    sv_index n = w->area.n;
    for (int k = 0; k < w->count; k++) {
        double own = sv_chern_place(w, w->target[k])[axis];
        for (sv_index r = 0; r < n; r++)
            w->x[r + k * n] = (sv_chern_place(w, r)[axis] - own) * from[r + k * n];
    }
    return sv_projector_apply(context, w->area.projector, w->count, w->x, to);
}

double sv_chern_overlap(const column_work *w, int k)
{
    sv_index n = w->area.n;
    const sv_complex *v = w->v + k * n, *z = w->z + k * n;
    double sum = 0.0, x0 = sv_chern_place(w, w->target[k])[0];
    for (sv_index r = 0; r < n; r++)
        sum += (sv_chern_place(w, r)[0] - x0) *
               (creal(v[r]) * cimag(z[r]) - cimag(v[r]) * creal(z[r]));
    return sum;
}

double sv_chern_weight_of_site(const column_work *w, int k)
{
    sv_index n = w->area.n;
    const sv_complex *v = w->v + k * n;
    double vv = 0.0;
    for (sv_index r = 0; r < n; r++)
        vv += square(v[r]);
    return fabs(creal(v[w->target[k]]) - vv);
}

double sv_chern_weight_of_moved(const column_work *w, int k, const sv_complex *projected)
{
    sv_index n = w->area.n;
    const sv_complex *u = w->x + k * n, *z = projected + k * n;
    double zz = 0.0, uz = 0.0;
    for (sv_index r = 0; r < n; r++) {
        zz += square(z[r]);
        uz += creal(u[r]) * creal(z[r]) + cimag(u[r]) * cimag(z[r]);
    }
    return fabs(uz - zz);
}

double sv_chern_base(double first, double second)
{
    return second + sqrt(first * second);
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
    double xv = 0.0, yv = 0.0, xz = 0.0, x0 = sv_chern_place(w, w->target[k])[0];
    for (sv_index r = 0; r < n; r++) {
        double x = sv_chern_place(w, r)[0] - x0;
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
    const double *centre = sv_chern_place(w, w->target[k]);
    double vv = 0.0, zz = 0.0;
    for (sv_index r = 0; r < n; r++) {
        const double *at = sv_chern_place(w, r);
        if (hypot(at[0] - centre[0], at[1] - centre[1]) < reach - 2.0)
            continue;
        vv += square(v[r]);
        zz += square(z[r]);
    }
    return 2.0 * reach * (sqrt(vv * zz) + reach * vv);
}

static sv_status one_block(sv_context *context, column_job *job, sv_index first, int count,
                           column_work *w)
{
    double factor = 4.0 * M_PI / sv_model_cell_area(job->sample->flake->model);
    sv_status status = sv_chern_set_block(context, job, job->rows + first, count, w);
    if (status == SV_OK)
        status = sv_chern_project_sites(context, w);
    if (status == SV_OK)
        status = sv_chern_project_moved(context, w, 1, w->v, w->z);
    double eta = status == SV_OK ? sv_projector_uniform_error(w->area.projector) : 0.0;
    for (int k = 0; k < count && status == SV_OK; k++) {
        job->marker[first + k] = factor * sv_chern_overlap(w, k);
        job->base[first + k] =
            sv_chern_base(sv_chern_weight_of_site(w, k), sv_chern_weight_of_moved(w, k, w->z));
        job->error[first + k] = 0.0;
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

static void *column_thread(void *argument)
{
    column_job *job = argument;
    sv_context context = sv_context_fork(job->context);
    column_work w;
    sv_status status = sv_chern_start_work(&context, job, &w);
    pthread_mutex_lock(&job->mutex);
    while (status == SV_OK && job->status == SV_OK && job->next < job->n_rows) {
        sv_index first = job->next;
        int count = sv_chern_block_size(job, first);
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
    sv_chern_end_work(&context, &w);
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
    double factor = 0.0, unit = 4.0 * M_PI / sv_model_cell_area(sample->flake->model);
    sv_status status = sv_take(context, n_rows, sizeof *job.base, &job.base);
    if (status == SV_OK && job.reach > 0.0) {
        sv_index sites = sample->flake->n_sites;
        status = sv_take_raw(context, sites, sizeof *job.row_of_site, &job.row_of_site);
        if (status != SV_OK)
            goto out;
        memset(job.row_of_site, 0xff, (size_t)sites * sizeof *job.row_of_site);
        for (sv_index r = 0; r < sample->n; r++)
            if (job.row_of_site[sample->pristine[r]] < 0)
                job.row_of_site[sample->pristine[r]] = (int32_t)r;
    }
    if (status == SV_OK)
        status = run_threads(context, &job, threads);
    bool single = sv_projector_single(projector);
    if (status == SV_OK && single)
        status = sv_chern_check_single(context, &job, &factor);
    else if (status == SV_OK)
        status = sv_chern_check(context, &job, &factor);
    for (sv_index k = 0; k < n_rows && status == SV_OK; k++)
        ret_error[k] += factor * unit * (single ? 1.0 : job.base[k]);
out:
    sv_give(context, job.base);
    sv_give(context, job.row_of_site);
    return status;
}
