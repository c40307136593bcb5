/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The maps of an ensemble as numbers: the largest deviation, and one row per site. */
#include <math.h>

#include "present_internal.h"

/* The first entry of cell `cell`, or of the one site that is the cell. */
static sv_index cell_entry(const sv_flake *flake, sv_index cell)
{
    const sv_index first = sv_site_first_cell(flake);
    return first >= 0 ? first + cell : flake->cells[cell].first_site;
}

sv_moments sv_site_map_cell(const sv_site_map *map, sv_index cell)
{
    return sv_site_moments(map->sum, cell_entry(map->flake, cell));
}

sv_site_summary sv_site_map_summary(const sv_site_map *map)
{
    sv_site_summary s = {.exists = true,
                         .realisations = map->sum->realisations,
                         .largest = (double)NAN,
                         .deviation = (double)NAN};
    double squares = 0.0;
    sv_index n = 0;
    for (sv_index c = 0; c < map->flake->n_cells; c++) {
        const sv_moments m = sv_site_map_cell(map, c);
        if (m.n < 2)
            continue;
        squares += m.deviation * m.deviation;
        n++;
        if (!(m.deviation <= s.largest)) {
            s.largest = m.deviation;
            s.present = m.n;
            s.cell[0] = map->flake->cells[c].i;
            s.cell[1] = map->flake->cells[c].j;
            sv_flake_cell_centre(map->flake, c, s.at);
        }
    }
    if (n > 0)
        s.deviation = sqrt(squares / (double)n);
    return s;
}

/* Empty fields for numbers that do not exist. */
static void add_moments(sv_draft *text, const sv_moments *m)
{
    const double numbers[3] = {m->mean, m->n > 1 ? m->deviation : (double)NAN, m->standard_error};
    for (int k = 0; k < 3; k++) {
        char word[32];
        sv_words_real(numbers[k], word, sizeof word);
        sv_draft_add(text, ",%s", isfinite(numbers[k]) ? word : "");
    }
    sv_draft_add(text, ",%lld", (long long)m->n);
}

sv_status sv_site_map_csv(sv_context *context, const sv_site_map *map, int32_t point, bool head,
                          char **ret_text)
{
    sv_draft text = {.context = context};
    if (head)
        sv_draft_add(&text, "point,site,cell_i,cell_j,orbital,x,y,mean,deviation,standard_error,"
                            "present,cell_mean,cell_deviation,cell_standard_error,cell_present\n");
    for (sv_index k = 0; k < map->flake->n_sites; k++) {
        const sv_site *site = &map->flake->sites[k];
        const sv_cell *cell = &map->flake->cells[site->cell];
        const sv_moments m = sv_site_moments(map->sum, k);
        const sv_moments whole = sv_site_map_cell(map, site->cell);
        sv_draft_add(&text, "%ld,%lld,%d,%d,%s,%.10g,%.10g", (long)point, (long long)k, cell->i,
                     cell->j, map->flake->model->orbitals[site->orbital].name, site->at[0],
                     site->at[1]);
        add_moments(&text, &m);
        add_moments(&text, &whole);
        sv_draft_add(&text, "\n");
    }
    return sv_draft_finish(&text, ret_text);
}
