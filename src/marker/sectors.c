/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Two markers of the projector around one point: Kitaev's three-sector number and the crosshair
 * form. Both need the columns of a disc only, so their cost does not depend on the flake. */
#include "marker_internal.h"

#include <math.h>
#include <string.h>

/* Sites of the disc, and the projector between them. */
typedef struct disc_work {
    const sv_sample *sample;
    double at[2], radius;
    sv_index *rows; /* of the part of the flake worked on; the disc's come first in `inside` */
    sv_index n;
    sv_index *inside, n_inside; /* places of the disc's sites among `rows` */
    sv_projector *projector;
    bool owned;
    sv_complex *columns; /* n × n_inside: P |r⟩ for the sites of the disc */
    double defect;       /* mean of |⟨r|P|r⟩ − ‖P|r⟩‖²| over the disc */
} disc_work;

static void free_work(sv_context *context, disc_work *w)
{
    if (w->owned)
        sv_projector_free(context, w->projector);
    sv_give(context, w->rows);
    sv_give(context, w->inside);
    sv_give(context, w->columns);
}

static const double *place(const disc_work *w, sv_index k)
{
    return w->sample->flake->sites[w->sample->pristine[w->rows[k]]].at;
}

static double distance(const disc_work *w, sv_index row)
{
    const double *at = w->sample->flake->sites[w->sample->pristine[row]].at;
    return hypot(at[0] - w->at[0], at[1] - w->at[1]);
}

/* Rows of the part (all, or within radius + reach) and those of the disc among them. */
static sv_status gather_rows(sv_context *context, double reach, disc_work *w)
{
    sv_index total = w->sample->n;
    sv_status status;
    if ((status = sv_take_raw(context, total, sizeof *w->rows, &w->rows)) != SV_OK ||
        (status = sv_take_raw(context, total, sizeof *w->inside, &w->inside)) != SV_OK)
        return status;
    for (sv_index r = 0; r < total; r++) {
        double d = distance(w, r);
        if (reach > 0.0 && d > w->radius + reach)
            continue;
        if (d <= w->radius)
            w->inside[w->n_inside++] = w->n;
        w->rows[w->n++] = r;
    }
    if (w->n_inside == 0)
        return SV_FAIL(context, SV_UNDEFINED, "no site lies within %g of (%g, %g)", w->radius,
                       w->at[0], w->at[1]);
    return SV_OK;
}

static sv_status choose_part(sv_context *context, sv_projector *whole, double reach, disc_work *w)
{
    int32_t *scratch = NULL;
    w->projector = whole;
    if (reach <= 0.0)
        return SV_OK;
    sv_status status = sv_take_raw(context, w->sample->n, sizeof *scratch, &scratch);
    if (status != SV_OK)
        return status;
    memset(scratch, 0xff, (size_t)w->sample->n * sizeof *scratch);
    status = sv_projector_restrict(context, whole, w->rows, w->n, scratch, &w->projector);
    w->owned = status == SV_OK;
    sv_give(context, scratch);
    return status;
}

static sv_status project_disc(sv_context *context, disc_work *w)
{
    enum { BLOCK = SV_PANEL_COLUMNS };
    sv_complex *unit = NULL;
    sv_status status;
    if ((status = sv_take_raw(context, w->n * w->n_inside, sizeof *w->columns, &w->columns)) !=
            SV_OK ||
        (status = sv_take_raw(context, w->n * BLOCK, sizeof *unit, &unit)) != SV_OK)
        return status;
    for (sv_index first = 0; first < w->n_inside && status == SV_OK; first += BLOCK) {
        sv_index count = w->n_inside - first < BLOCK ? w->n_inside - first : BLOCK;
        memset(unit, 0, (size_t)(w->n * count) * sizeof *unit);
        for (sv_index k = 0; k < count; k++)
            unit[w->inside[first + k] + k * w->n] = 1.0;
        status = sv_projector_apply(context, w->projector, count, unit, w->columns + first * w->n);
    }
    sv_give(context, unit);
    return status;
}

static void measure_defect(disc_work *w)
{
    for (sv_index k = 0; k < w->n_inside; k++) {
        const sv_complex *v = w->columns + k * w->n;
        double norm = 0.0;
        for (sv_index r = 0; r < w->n; r++)
            norm += creal(v[r]) * creal(v[r]) + cimag(v[r]) * cimag(v[r]);
        w->defect += fabs(creal(v[w->inside[k]]) - norm) / (double)w->n_inside;
    }
}

/* Probe, radius, part, columns: what both markers start with. */
static sv_status prepare(sv_context *context, const sv_marker_input *input, disc_work *w)
{
    const sv_value *at = &input->values[0], *radius = &input->values[1];
    const sv_flake *flake = input->sample->flake;
    double reach = sv_projector_reach(input->projector);
    w->sample = input->sample;
    bool centre = at->has_auto || !at->present;
    for (int k = 0; k < 2; k++)
        w->at[k] = centre ? flake->centre[k] : at->real[k];
    bool automatic = radius->has_auto || !radius->present;
    w->radius = automatic ? 0.5 * sv_localizer_radius(flake, w->at) : radius->real[0];
    sv_status status = gather_rows(context, reach, w);
    if (status == SV_OK)
        status = choose_part(context, input->projector, reach, w);
    if (status == SV_OK)
        status = project_disc(context, w);
    if (status == SV_OK)
        measure_defect(w);
    return status;
}

/* Three sectors of 120°, counter-clockwise, about the probe; their rims lie between lattice rows.
 */
static int sector_of(const disc_work *w, sv_index k)
{
    const double *at = place(w, k);
    double angle = atan2(at[1] - w->at[1] - 1.3e-4, at[0] - w->at[0] - 2.7e-4) + 0.1234;
    int sector = (int)floor(3.0 * (angle + M_PI) / (2.0 * M_PI));
    return ((sector % 3) + 3) % 3;
}

/* Im Σ_{j∈0, k∈1, l∈2} P_jk P_kl P_lj */
static double triple_sum(const disc_work *w)
{
    double sum = 0.0;
    for (sv_index j = 0; j < w->n_inside; j++) {
        if (sector_of(w, w->inside[j]) != 0)
            continue;
        for (sv_index k = 0; k < w->n_inside; k++) {
            if (sector_of(w, w->inside[k]) != 1)
                continue;
            sv_complex jk = w->columns[w->inside[j] + k * w->n], inner = 0.0;
            for (sv_index l = 0; l < w->n_inside; l++)
                if (sector_of(w, w->inside[l]) == 2)
                    inner +=
                        w->columns[w->inside[k] + l * w->n] * w->columns[w->inside[l] + j * w->n];
            sum += cimag(jk * inner);
        }
    }
    return sum;
}

sv_status sv_three_sector(sv_context *context, const sv_marker_input *input,
                          sv_outcome *ret_outcome)
{
    sv_outcome outcome = sv_outcome_start(input->projector);
    disc_work w = {0};
    sv_status status = SV_OK;
    if (!sv_projector_levels(input->projector)->on_level) {
        if ((status = prepare(context, input, &w)) != SV_OK)
            goto out;
        /* 12πi (z − z*) = −24π Im z is −C with sectors counter-clockwise. */
        outcome.value = 24.0 * M_PI * triple_sum(&w);
        outcome.numerical_error = 72.0 * M_PI * w.defect * sqrt((double)w.n_inside);
        outcome.verdict = SV_RESOLVED;
    }
    *ret_outcome = outcome;
out:
    free_work(context, &w);
    return status;
}

/* Columns of the steps: for each site of the disc Im⟨θx v|P|θy v⟩, v = P|r⟩. */
static sv_status cross_sum(sv_context *context, disc_work *w, double *ret_sum)
{
    enum { BLOCK = SV_PANEL_COLUMNS };
    sv_complex *stepped = NULL;
    sv_index size = w->n * BLOCK;
    double sum = 0.0;
    sv_status status = sv_take_raw(context, 2 * size, sizeof *stepped, &stepped);
    if (status != SV_OK)
        return status;
    sv_complex *projected = stepped + size;
    for (sv_index first = 0; first < w->n_inside && status == SV_OK; first += BLOCK) {
        sv_index count = w->n_inside - first < BLOCK ? w->n_inside - first : BLOCK;
        for (sv_index k = 0; k < count; k++)
            for (sv_index r = 0; r < w->n; r++) {
                bool above = place(w, r)[1] - w->at[1] > 1.3e-4;
                stepped[r + k * w->n] = above ? w->columns[r + (first + k) * w->n] : 0.0;
            }
        status = sv_projector_apply(context, w->projector, count, stepped, projected);
        for (sv_index k = 0; k < count && status == SV_OK; k++)
            for (sv_index r = 0; r < w->n; r++) {
                if (place(w, r)[0] - w->at[0] <= 2.7e-4)
                    continue;
                sv_complex v = w->columns[r + (first + k) * w->n], z = projected[r + k * w->n];
                sum += creal(v) * cimag(z) - cimag(v) * creal(z);
            }
    }
    sv_give(context, stepped);
    if (status == SV_OK)
        *ret_sum = sum;
    return status;
}

sv_status sv_crosshair(sv_context *context, const sv_marker_input *input, sv_outcome *ret_outcome)
{
    sv_outcome outcome = sv_outcome_start(input->projector);
    disc_work w = {0};
    double sum = 0.0;
    sv_status status = SV_OK;
    if (!sv_projector_levels(input->projector)->on_level) {
        if ((status = prepare(context, input, &w)) != SV_OK ||
            (status = cross_sum(context, &w, &sum)) != SV_OK)
            goto out;
        outcome.value = 4.0 * M_PI * sum;
        outcome.numerical_error = 12.0 * M_PI * w.defect * sqrt((double)w.n_inside);
        outcome.verdict = SV_RESOLVED;
    }
    *ret_outcome = outcome;
out:
    free_work(context, &w);
    return status;
}
