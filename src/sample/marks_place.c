/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Measured defects and energies on the flake: which site a row of a file falls on, and what it does
 * there. */
#include "sample_internal.h"

#include <math.h>
#include <stdio.h>
#include <string.h>

/* Orbital a mark means: its own, else the disorder's `on`; −1: any, −2: the two contradict. */
static int orbital_of_mark(const sv_mark *mark, int on)
{
    if (mark->orbital >= 0 && on >= 0 && mark->orbital != on)
        return -2;
    return mark->orbital >= 0 ? mark->orbital : on;
}

/* Site a measured mark falls on, or −1. Marks by cell need an exact cell. */
static sv_index site_of_mark(const sv_flake *flake, const sv_disorder *disorder,
                             const sv_mark *mark, double *ret_distance)
{
    int orbital = orbital_of_mark(mark, disorder->on);
    *ret_distance = 0.0;
    if (orbital == -2)
        return -1;
    if (!mark->by_cell) {
        sv_index site = sv_flake_nearest(flake, mark->at, orbital, ret_distance);
        return *ret_distance <= disorder->tolerance + 1e-9 ? site : -1;
    }
    landing place = sv_flake_land(flake, mark->cell[0], mark->cell[1]);
    if (place.cell < 0 || place.torus[0] != 0 || place.torus[1] != 0)
        return -1;
    return orbital < 0 ? flake->cells[place.cell].first_site
                       : sv_flake_site_of(flake, place.cell, orbital);
}

sv_index sv_measured_unmatched(const sv_flake *flake, const sv_disorder *disorder, sv_index from)
{
    double distance;
    if (disorder->has_grid)
        return sv_grid_uncovered(flake, disorder, from);
    for (sv_index m = from; m < disorder->n_marks; m++)
        if (site_of_mark(flake, disorder, &disorder->marks[m], &distance) < 0)
            return m;
    return -1;
}

/* ", 3 more rows (lines 5, 9, …)" for what lies outside beside the row named. */
static void count_others(const sv_flake *flake, const sv_disorder *disorder, sv_index first,
                         char *text, size_t size)
{
    sv_index count = 0;
    char lines[60] = "";
    for (sv_index m = first; (m = sv_measured_unmatched(flake, disorder, m + 1)) >= 0; count++)
        if (count < 3)
            snprintf(lines + strlen(lines), sizeof lines - strlen(lines), "%s%d",
                     count > 0 ? ", " : "", disorder->marks[m].line);
    if (count > 0)
        snprintf(text, size, "; so %s %lld more (line%s %s%s)", count > 1 ? "are" : "is",
                 (long long)count, count > 1 ? "s" : "", lines, count > 3 ? ", …" : "");
}

sv_status sv_marks_check(sv_context *context, const sv_flake *flake, const sv_disorder *disorder,
                         sv_table_fault *ret_fault)
{
    for (sv_index m = 0; m < disorder->n_marks; m++) {
        const sv_mark *mark = &disorder->marks[m];
        double distance;
        if (site_of_mark(flake, disorder, mark, &distance) >= 0)
            continue;
        sv_table_fault fault = {.line = mark->line, .column = 1};
        if (orbital_of_mark(mark, disorder->on) == -2)
            snprintf(fault.message, sizeof fault.message,
                     "the row names an orbital that `on` leaves out");
        else if (mark->by_cell)
            snprintf(fault.message, sizeof fault.message, "cell (%d, %d) is outside the film",
                     mark->cell[0], mark->cell[1]);
        else if (isfinite(distance))
            snprintf(fault.message, sizeof fault.message,
                     "position (%g, %g) lattice constants is outside the film: the nearest site is "
                     "%g away, the tolerance is %g",
                     mark->at[0], mark->at[1], distance, disorder->tolerance);
        else
            snprintf(fault.message, sizeof fault.message,
                     "position (%g, %g) lattice constants is outside the film", mark->at[0],
                     mark->at[1]);
        const size_t used = strlen(fault.message);
        count_others(flake, disorder, m, fault.message + used, sizeof fault.message - used);
        snprintf(fault.hint, sizeof fault.hint,
                 "the film's cell (0, 0) lies at (0, 0); `origin` and `rotation` move the file, "
                 "`tolerance` widens the match, `unmatched: skip` leaves such rows out");
        *ret_fault = fault;
        return SV_FAIL(context, SV_INVALID_INPUT, "%s:%d: %s", disorder->file, mark->line,
                       fault.message);
    }
    return SV_OK;
}

static void vacate_or_count(sv_drawing *d, sv_index site)
{
    if (d->gone[site])
        d->inventory.marks_merged++;
    else
        sv_vacate(d, site);
}

/* A row by cell without an orbital empties the cell; every other row names one position. */
void sv_vacate_marks(sv_drawing *d, const sv_disorder *disorder)
{
    for (sv_index m = 0; m < disorder->n_marks; m++) {
        const sv_mark *mark = &disorder->marks[m];
        double distance;
        sv_index site = site_of_mark(d->flake, disorder, mark, &distance);
        d->inventory.marks_matched += site >= 0;
        d->inventory.marks_unmatched += site < 0;
        if (site < 0)
            continue;
        if (!mark->by_cell || orbital_of_mark(mark, disorder->on) >= 0) {
            vacate_or_count(d, site);
            continue;
        }
        const sv_cell *cell = &d->flake->cells[d->flake->sites[site].cell];
        for (sv_index s = cell->first_site; s < cell->first_site + cell->n_sites; s++)
            if (sv_is_first_at_position(d->flake, s))
                vacate_or_count(d, s);
    }
}

/* Does a mark that fell on `site` give its energy to site s of the same cell? */
static bool mark_covers(const sv_drawing *d, const sv_disorder *disorder, const sv_mark *mark,
                        sv_index site, sv_index s)
{
    int orbital = orbital_of_mark(mark, disorder->on);
    if (orbital >= 0)
        return d->flake->sites[s].orbital == orbital;
    return mark->by_cell || sv_position_of(d->flake, s) == sv_position_of(d->flake, site);
}

/* Measured energies: a site takes the mean of the rows that fall on it, so that a map sampled
 * finer than the lattice is not multiplied by its sampling. */
sv_status sv_add_marks(sv_context *context, sv_drawing *d, const sv_disorder *disorder)
{
    double *sum = NULL;
    int32_t *rows = NULL;
    sv_index sites = d->flake->n_sites;
    sv_status status;
    if ((status = sv_take(context, sites, sizeof *sum, &sum)) != SV_OK ||
        (status = sv_take(context, sites, sizeof *rows, &rows)) != SV_OK)
        goto out;
    for (sv_index m = 0; m < disorder->n_marks; m++) {
        const sv_mark *mark = &disorder->marks[m];
        double distance;
        sv_index site = site_of_mark(d->flake, disorder, mark, &distance);
        d->inventory.marks_matched += site >= 0;
        d->inventory.marks_unmatched += site < 0;
        if (site < 0)
            continue;
        const sv_cell *cell = &d->flake->cells[d->flake->sites[site].cell];
        for (sv_index s = cell->first_site; s < cell->first_site + cell->n_sites; s++) {
            if (!mark_covers(d, disorder, mark, site, s))
                continue;
            sum[s] += mark->energy;
            d->inventory.marks_merged += rows[s]++ > 0;
        }
    }
    int term = disorder->type == SV_DISORDER_MASS ? disorder->term : SV_FIELD_POTENTIAL;
    for (sv_index s = 0; s < sites && status == SV_OK; s++)
        if (rows[s] > 0)
            status = sv_add_term(context, d, term, s, sum[s] / rows[s]);
out:
    sv_give(context, sum);
    sv_give(context, rows);
    return status;
}
