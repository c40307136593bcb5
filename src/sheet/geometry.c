/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Does the flake exist, and does it hold what the sheet asks of it? Builds it when it is not too
 * large; otherwise the count alone is trusted. */
#include "sheet_internal.h"

enum { BUILD_LIMIT = 2000000, MARKS_LIMIT = 20000000 }; /* sites */

static bool has_marks(const sv_setup *setup)
{
    for (int i = 0; i < setup->n_disorder; i++)
        if (setup->disorder[i].has_marks || setup->disorder[i].has_grid)
            return true;
    return false;
}

static bool is_first_of_position(const sv_flake *flake, const sv_cell *cell, sv_index site)
{
    const sv_orbital *orbitals = flake->model->orbitals;
    for (sv_index s = cell->first_site; s < site; s++)
        if (orbitals[flake->sites[s].orbital].position ==
            orbitals[flake->sites[site].orbital].position)
            return false;
    return true;
}

/* Positions that a kind of disorder may fall on. */
static sv_index count_positions(const sv_flake *flake, int on)
{
    sv_index n = 0;
    for (sv_index c = 0; c < flake->n_cells; c++) {
        const sv_cell *cell = &flake->cells[c];
        for (sv_index s = cell->first_site; s < cell->first_site + cell->n_sites; s++)
            n += on < 0 ? is_first_of_position(flake, cell, s) : flake->sites[s].orbital == on;
    }
    return n;
}

static bool check_disorder(sv_reader *reader, const sv_setup *setup, const sv_flake *flake)
{
    const sv_section *section = NULL;
    bool good = true;
    for (int i = 0; i < setup->n_disorder; i++) {
        const sv_disorder *disorder = &setup->disorder[i];
        section = sv_document_find(reader, "disorder", section);
        if (disorder->has_marks || disorder->has_grid)
            good = sv_check_measured(reader, flake, disorder, section) && good;
        sv_index positions = disorder->has_count ? count_positions(flake, disorder->on) : 0;
        if (disorder->has_count && disorder->count > positions)
            good = sv_report(reader, sv_section_node(section, "count"), NULL,
                             "%s.count is %lld, but the flake has %lld positions", section->path,
                             (long long)disorder->count, (long long)positions);
    }
    return good;
}

static bool check_electrons(sv_reader *reader, const sv_setup *setup, sv_index sites)
{
    if (setup->occupation.by != SV_BY_ELECTRONS || setup->occupation.electrons <= sites)
        return true;
    const sv_section *section = sv_document_find(reader, "occupation", NULL);
    return sv_report(reader, sv_section_node(section, "electrons"), NULL,
                     "%lld electrons are more than the %lld states of the flake",
                     (long long)setup->occupation.electrons, (long long)sites);
}

/* When the open flake can be made, the fault lies in the boundary. */
static bool is_boundary_fault(sv_context *context, const sv_setup *setup)
{
    sv_flake flake = {0};
    sv_flake_spec open = setup->flake;
    open.periodic[0] = open.periodic[1] = false;
    sv_context fork = sv_context_fork(context); /* keeps the message of the first failure */
    if (!setup->flake.periodic[0] && !setup->flake.periodic[1])
        return false;
    bool good = sv_flake_make(&fork, &setup->model, &open, &flake) == SV_OK;
    sv_flake_free(&fork, &flake);
    return good;
}

static bool report_flake(sv_reader *reader, const sv_setup *setup, sv_status status)
{
    const sv_section *section = sv_document_find(reader, "flake", NULL);
    bool boundary = status == SV_INVALID_INPUT && is_boundary_fault(reader->context, setup);
    return sv_report_status(
        reader, boundary ? sv_section_node(section, "boundary") : section->anchor, status);
}

bool sv_setup_geometry(sv_reader *reader, const sv_setup *setup)
{
    sv_index sites = 0;
    sv_flake flake = {0};
    sv_context *context = reader->context;
    sv_status status = sv_flake_count(context, &setup->model, &setup->flake, &sites);
    if (status != SV_OK)
        return report_flake(reader, setup, status);
    if (sites > (has_marks(setup) ? MARKS_LIMIT : BUILD_LIMIT))
        return true;
    status = sv_flake_make(context, &setup->model, &setup->flake, &flake);
    if (status != SV_OK)
        return report_flake(reader, setup, status);
    bool good = check_disorder(reader, setup, &flake);
    good = check_electrons(reader, setup, flake.n_sites) && good;
    sv_flake_free(context, &flake);
    return good;
}
