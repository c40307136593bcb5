/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The maps of an ensemble: from the sums in a ledger to the result, a file and figures. */
#include "program_internal.h"

#include <stdlib.h>
#include <string.h>

/* The maps of a point as its ledger holds them, for as many realisations as count. */
static sv_status load(session *s, sv_run *run, int32_t number, int64_t counted, sv_site_sum *sum,
                      sv_site_map *map)
{
    const point *p = &s->points[number];
    const sv_index entries = sv_site_entries(&p->open);
    sv_status status = sv_run_load_sites(s->context, run, number, counted, entries, sum);
    *map = (sv_site_map){.title = s->base.title,
                         .flake = &p->open,
                         .point = &p->problem,
                         .sum = sum,
                         .lattice_constant = s->base.lattice_constant};
    return status;
}

/* Calls `use` with the maps of each point that has realisations. */
static sv_status each_map(session *s, sv_run *run, sv_result *result,
                          sv_status (*use)(session *s, const sv_site_map *map, int32_t number,
                                           sv_point_result *result, void *user),
                          void *user)
{
    sv_status status = SV_OK;
    for (int32_t k = 0; k < s->n_points && status == SV_OK; k++) {
        sv_site_sum sum = {0};
        sv_site_map map;
        if (!s->points[k].problem.site_maps || result->points[k].realisations == 0)
            continue;
        status = load(s, run, k, result->points[k].realisations, &sum, &map);
        if (status == SV_OK && sum.realisations > 0)
            status = use(s, &map, k, &result->points[k], user);
        sv_site_sum_free(s->context, &sum);
    }
    return status;
}

static sv_status note_summary(session *s, const sv_site_map *map, int32_t number,
                              sv_point_result *result, void *user)
{
    (void)s, (void)number, (void)user;
    result->sites = sv_site_map_summary(map);
    return SV_OK;
}

sv_status site_maps_add(session *s, sv_run *run, bool writing, sv_result *result)
{
    if (!s->points[0].problem.site_maps)
        return SV_OK;
    sv_status status = sv_run_check_sites(s->context, run);
    for (int32_t k = 0; k < s->n_points && writing && status == SV_OK; k++)
        status = sv_run_fold_sites(s->context, run, k, result->points[k].realisations);
    return status == SV_OK ? each_map(s, run, result, note_summary, NULL) : status;
}

static sv_status write_point(session *s, const sv_site_map *map, int32_t number,
                             sv_point_result *result, void *user)
{
    FILE *stream = user;
    char *text = NULL;
    (void)result;
    sv_status status = sv_site_map_csv(s->context, map, number, ftell(stream) == 0, &text);
    if (status == SV_OK)
        fputs(text, stream);
    sv_give(s->context, text);
    return status;
}

sv_status site_maps_write(session *s, sv_run *run, sv_result *result, const char *path)
{
    char *text = NULL;
    size_t size = 0;
    FILE *stream = open_memstream(&text, &size);
    if (stream == NULL)
        return SV_FAIL(s->context, SV_NO_MEMORY, "no memory for %s", path);
    sv_status status = each_map(s, run, result, write_point, stream);
    if (fclose(stream) != 0 && status == SV_OK)
        status = SV_FAIL(s->context, SV_NO_MEMORY, "no memory for %s", path);
    if (status == SV_OK && size == 0)
        status = SV_FAIL(s->context, SV_INVALID_INPUT,
                         "the run has no maps: its sheet does not say ensemble: {site_maps: true}, "
                         "or nothing is finished");
    if (status == SV_OK)
        status = sv_write_file(s->context, path, text, size);
    free(text);
    return status;
}

typedef struct teller {
    const char *folder;
    figure_teller tell;
} teller;

static sv_status draw_point(session *s, const sv_site_map *map, int32_t number,
                            sv_point_result *result, void *user)
{
    const teller *t = user;
    sv_site_map noted = *map;
    char where[300];
    sv_status status = SV_OK;
    (void)result;
    describe_point(&s->points[number], where, sizeof where);
    noted.note = where[0] != '\0' ? where : NULL;
    for (int d = 0; d < 2 && status == SV_OK; d++) {
        char name[64], what[400];
        sv_figure_files files;
        snprintf(name, sizeof name, "site_%s", d == 1 ? "deviation" : "mean");
        if (s->n_points > 1)
            snprintf(name + strlen(name), sizeof name - strlen(name), "_%ld", (long)number);
        snprintf(what, sizeof what, "%s of the marker over realisations, by cell%s%s",
                 d == 1 ? "deviation" : "mean", where[0] != '\0' ? ", " : "", where);
        status = sv_figure_site_map(s->context, t->folder, name, &noted, d == 1, &files);
        if (status == SV_OK)
            t->tell(s, &files, what);
    }
    return status;
}

sv_status site_maps_draw(session *s, sv_run *run, sv_result *result, const char *folder,
                         figure_teller tell)
{
    teller t = {folder, tell};
    return each_map(s, run, result, draw_point, &t);
}
