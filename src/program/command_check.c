/* SPDX-License-Identifier: GPL-3.0-or-later */
/* selvedge check: the sheet with all defaults, and what it will cost. Computes no marker. */
#include "program_internal.h"

#include <math.h>
#include <string.h>

#include <jansson.h>

/* `check` draws no sample above this many sites. */
static const sv_index SAMPLE_LARGEST = 200000;

/* null where the model has no length. */
static json_t *film_json(const film_length *film)
{
    if (!film->known)
        return json_null();
    json_t *object = json_pack("{s:f, s:f, s:f, s:b}", "hbar_velocity_ev_nm", film->velocity,
                               "gap_ev", film->gap, "size_nm", film->size, "enough", film->enough);
    if (object != NULL && film->gap > 0.0) {
        json_object_set_new(object, "xi_nm", json_real(film->length));
        json_object_set_new(object, "size_in_xi", json_real(film->lengths));
    }
    return object;
}

static int print_json(session *s, const forecast *f, const film_length *film)
{
    json_t *root = json_pack(
        "{s:i, s:s, s:s, s:s, s:{s:I, s:i, s:I, s:s, s:f, s:f, s:f, s:i, s:f, s:f, s:f, s:f, s:f, "
        "s:f, s:b}}",
        "selvedge", 1, "command", "check", "title", s->base.title, "resolved", s->base.resolved,
        "forecast", "sites", (json_int_t)f->sites, "points", (int)s->n_points, "realisations",
        (json_int_t)f->realisations, "engine", s->points[0].plan.reason, "memory_bytes_per_thread",
        f->bytes_per_thread, "memory_bytes_program", f->bytes_before, "memory_bytes_available",
        f->bytes_available, "threads", s->threads, "seconds_before", f->seconds_before,
        "seconds_per_realisation", f->seconds_per_realisation, "seconds", f->seconds,
        "bytes_ledger", f->bytes_ledger, "probes", f->probes, "seconds_probes", f->seconds_probes,
        "upper_bound", (int)s->base.has_stop);
    if (root == NULL)
        return sv_status_exit_code(SV_NO_MEMORY);
    json_t *preset = NULL;
    if (presets_json(s->context, s->sheet, &preset) == SV_OK)
        json_object_set_new(root, "preset", preset);
    json_object_set_new(root, "film", film_json(film));
    json_dumpf(root, stdout, JSON_INDENT(1) | JSON_ENSURE_ASCII);
    fputc('\n', stdout);
    json_decref(root);
    return 0;
}

/* Vacancies in the units a grower uses, when the lattice constant is known. */
static void print_film(const session *s)
{
    double a = s->base.lattice_constant;
    double area = sv_model_cell_area(&s->base.model);
    if (a <= 0.0)
        return;
    printf("#\n# film: one cell is %.4g nm^2; %.4g positions per cm^2\n", area * a * a,
           s->base.model.n_positions / (area * a * a) * 1e14);
}

/* Realisation 0 on the sheet's own boundary, when that is quick. A sheet whose disorder cannot be
 * drawn fails here rather than in a run; that all sites are vacant is an answer. */
static sv_status describe_sample(session *s, char text[400])
{
    sv_context *context = s->context;
    const sv_setup *setup = &s->base;
    sv_flake flake = {0};
    sv_sample sample = {0};
    char *words = NULL;
    text[0] = '\0';
    if (s->points[0].open.n_sites > SAMPLE_LARGEST)
        return SV_OK;
    sv_status status = sv_flake_make(context, &setup->model, &setup->flake, &flake);
    if (status == SV_OK)
        status = sv_sample_draw(context, &flake, setup->disorder, setup->n_disorder, setup->seed, 0,
                                &sample);
    if (status == SV_OK)
        status = sv_inventory_text(context, &sample, &words);
    if (status == SV_OK)
        snprintf(text, 400,
                 "#\n# realisation 0 of the sheet as written: %lld sites, %lld vacancies\n# %s\n",
                 (long long)sample.n, (long long)sample.inventory.vacancies, words);
    sv_give(context, words);
    sv_sample_free(context, &sample);
    sv_flake_free(context, &flake);
    return status == SV_UNDEFINED ? SV_OK : status;
}

int run_check(sv_context *context, const options *o)
{
    session s = {0};
    forecast f;
    film_length film = {0};
    char sample[400] = "";
    int code = 0;
    sv_status status = session_open(context, o, o->files[0], false, true, &s);
    if (status == SV_OK)
        status = session_try_windows(&s);
    if (status == SV_OK)
        status = session_blame(&s, "disorder", describe_sample(&s, sample));
    if (status == SV_OK)
        status = session_plan(&s, false);
    if (status == SV_OK)
        status = session_forecast(&s, true, &f);
    if (status == SV_OK)
        status = film_measure(&s, &film);
    if (status != SV_OK) {
        code = fail_exit(context, status);
    } else if (o->json) {
        code = print_json(&s, &f, &film);
    } else {
        fputs(s.base.resolved, stdout);
        char *plans = NULL;
        if (session_plan_text(&s, &plans) == SV_OK)
            printf("#\n%s", plans);
        sv_give(context, plans);
        printf("#\n# forecast\n");
        print_forecast(&f, &s, "#   ", stdout);
        status = split_forecast(&s, stdout);
        print_film(&s);
        defects_print(&s.base, stdout);
        fputs(sample, stdout);
        film_print(&film, s.n_points, stdout);
        if (status == SV_OK)
            status = presets_print_sources(context, s.sheet, stdout);
        code = status == SV_OK ? code : fail_exit(context, status);
    }
    film_warn(context, &film);
    if (film.known)
        film_warn_vacancies(&s);
    session_close(&s);
    return code;
}
