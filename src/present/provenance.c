/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Where a run comes from, how good its numbers are, what they cost: for a terminal and as JSON. */
#include <math.h>
#include <stdio.h>
#include <string.h>

#include "present_internal.h"

static const char *meta(const sv_provenance *p, const char *key)
{
    const char *value = sv_run_meta(p->run, key);
    return value == NULL ? "" : value;
}

/* ------------------------------------------------------------------ terminal */

/* "chebyshev, degree 41 to 97; dense" */
static void engines_text(const sv_marker_health *m, char *text, size_t size)
{
    size_t used = 0;
    text[0] = '\0';
    for (int k = 0; k < m->n_engines && used < size; k++) {
        const sv_engine_use *e = &m->engines[k];
        int length = snprintf(text + used, size - used, "%s%s", k > 0 ? "; " : "", e->name);
        used += length > 0 ? (size_t)length : 0;
        if (e->degrees[1] == 0 || used >= size)
            continue;
        length = e->degrees[0] == e->degrees[1]
                     ? snprintf(text + used, size - used, ", degree %ld", (long)e->degrees[0])
                     : snprintf(text + used, size - used, ", degree %ld to %ld",
                                (long)e->degrees[0], (long)e->degrees[1]);
        used += length > 0 ? (size_t)length : 0;
    }
}

static void print_health(const sv_run_health *h, FILE *stream)
{
    fprintf(stream,
            "\n  marker            resolved  unresolved  absent  failed  largest error  engine\n");
    for (int k = 0; k < h->n_markers; k++) {
        const sv_marker_health *m = &h->markers[k];
        char engines[160], error[32] = "-";
        engines_text(m, engines, sizeof engines);
        if (!isnan(m->numerical_error))
            snprintf(error, sizeof error, "%.1e", m->numerical_error);
        fprintf(stream, "  %-16s %9lld   %9lld  %6lld  %6lld  %13s  %s\n", m->marker,
                (long long)m->verdicts[SV_RESOLVED], (long long)m->verdicts[SV_UNRESOLVED],
                (long long)m->verdicts[SV_ABSENT], (long long)m->verdicts[SV_FAILED], error,
                engines);
    }
}

static void print_cost(const sv_run_health *h, FILE *stream)
{
    fprintf(stream,
            "\n  host              rank  realisations     seconds   processor  peak memory\n");
    for (sv_index k = 0; k < h->n_workers; k++) {
        const sv_worker_cost *w = &h->workers[k];
        fprintf(stream, "  %-16s %5ld  %12lld  %10.4g  %10.4g  %8.0f MB\n",
                w->host[0] == '\0' ? "(others)" : w->host, (long)w->rank,
                (long long)w->realisations, w->seconds, w->processor_seconds,
                (double)w->peak_bytes / 1e6);
    }
    fprintf(stream, "  %-16s %5s  %12lld  %10.4g  %10.4g  %8.0f MB\n", "all", "",
            (long long)h->realisations, h->seconds, h->processor_seconds,
            (double)h->peak_bytes / 1e6);
    if (h->realisations > 0)
        fprintf(stream, "  longest: %.3g s (realisation %lld of point %ld)\n", h->longest,
                (long long)h->longest_realisation, (long)h->longest_point);
}

static void print_events(const sv_run_history *history, FILE *stream)
{
    fprintf(stream, "\n  event  time                  what\n");
    for (sv_index k = 0; k < history->n; k++) {
        const sv_run_happening *e = &history->events[k];
        fprintf(stream, "  %5lld  %-20s  %s", (long long)e->number, e->time, e->what);
        if (e->note[0] != '\0')
            fprintf(stream, ": %s", e->note);
        fputc('\n', stream);
        if (e->process == 0)
            continue;
        fprintf(stream, "         %s\n", e->command_line);
        fprintf(stream, "         version %s, %s, %s\n", e->version, e->kernel, e->libraries);
        fprintf(stream, "         host %s, process %lld, threads %lld, ranks %lld\n", e->host,
                (long long)e->process, (long long)e->threads, (long long)e->ranks);
    }
}

void sv_provenance_print(const sv_provenance *p, FILE *stream)
{
    fprintf(stream, "%s\n", p->folder);
    fprintf(stream,
            "  identity  %s\n            (SHA-256 of sheet, input files, version and kernel)\n",
            meta(p, "identity_digest"));
    fprintf(stream, "  version   %s\n  kernel    %s\n", meta(p, "program_version"),
            meta(p, "kernel"));
    fprintf(stream, "  rows      %lld realisations, points in the sheet: %s; failed: %lld\n",
            (long long)p->health->realisations, meta(p, "points"), (long long)p->health->failed);
    print_health(p->health, stream);
    print_cost(p->health, stream);
    print_events(p->history, stream);
}

/* ---------------------------------------------------------------------- JSON */

static json_t *make_engines(sv_json *json, const sv_marker_health *m)
{
    json_t *array = json_array();
    for (int k = 0; k < m->n_engines; k++) {
        const sv_engine_use *e = &m->engines[k];
        json_t *object = json_object();
        sv_json_put_text(json, object, "engine", e->name);
        sv_json_put_integer(json, object, "outcomes", e->count);
        if (e->degrees[1] > 0) {
            json_t *degrees = json_array();
            sv_json_push(json, degrees, json_integer(e->degrees[0]));
            sv_json_push(json, degrees, json_integer(e->degrees[1]));
            sv_json_put(json, object, "degrees", degrees);
        }
        sv_json_push(json, array, object);
    }
    return array;
}

static json_t *make_health(sv_json *json, const sv_run_health *h)
{
    json_t *markers = json_object();
    for (int k = 0; k < h->n_markers; k++) {
        const sv_marker_health *m = &h->markers[k];
        json_t *object = json_object();
        sv_json_put_integer(json, object, "resolved", m->verdicts[SV_RESOLVED]);
        sv_json_put_integer(json, object, "unresolved", m->verdicts[SV_UNRESOLVED]);
        sv_json_put_integer(json, object, "absent", m->verdicts[SV_ABSENT]);
        sv_json_put_integer(json, object, "failed", m->verdicts[SV_FAILED]);
        sv_json_put_real(json, object, "numerical_error", m->numerical_error);
        if (isnan(m->numerical_error)) {
            sv_json_put_text(json, object, "reason", "no resolved outcome states an error");
        } else {
            sv_json_put_integer(json, object, "worst_point", m->worst_point);
            sv_json_put_integer(json, object, "worst_realisation", m->worst_realisation);
        }
        sv_json_put(json, object, "engines", make_engines(json, m));
        sv_json_put(json, markers, m->marker, object);
    }
    return markers;
}

static json_t *make_cost(sv_json *json, const sv_run_health *h)
{
    json_t *cost = json_object(), *workers = json_array();
    sv_json_put_real(json, cost, "seconds", h->seconds);
    sv_json_put_real(json, cost, "processor_seconds", h->processor_seconds);
    sv_json_put_integer(json, cost, "peak_bytes", h->peak_bytes);
    sv_json_put_real(json, cost, "longest_seconds", h->longest);
    for (sv_index k = 0; k < h->n_workers; k++) {
        const sv_worker_cost *w = &h->workers[k];
        json_t *object = json_object();
        sv_json_put_text(json, object, "host", w->host);
        sv_json_put_integer(json, object, "rank", w->rank);
        sv_json_put_integer(json, object, "realisations", w->realisations);
        sv_json_put_real(json, object, "seconds", w->seconds);
        sv_json_put_real(json, object, "processor_seconds", w->processor_seconds);
        sv_json_put_integer(json, object, "peak_bytes", w->peak_bytes);
        sv_json_push(json, workers, object);
    }
    sv_json_put(json, cost, "workers", workers);
    return cost;
}

static json_t *make_events(sv_json *json, const sv_run_history *history)
{
    json_t *array = json_array();
    for (sv_index k = 0; k < history->n; k++) {
        const sv_run_happening *e = &history->events[k];
        json_t *object = json_object();
        sv_json_put_integer(json, object, "number", e->number);
        sv_json_put_integer(json, object, "session", e->session);
        sv_json_put_text(json, object, "time", e->time);
        sv_json_put_text(json, object, "what", e->what);
        sv_json_put_text(json, object, "note", e->note);
        if (e->process != 0) {
            sv_json_put_text(json, object, "command_line", e->command_line);
            sv_json_put_text(json, object, "version", e->version);
            sv_json_put_text(json, object, "kernel", e->kernel);
            sv_json_put_text(json, object, "libraries", e->libraries);
            sv_json_put_text(json, object, "host", e->host);
            sv_json_put_integer(json, object, "process", e->process);
            sv_json_put_integer(json, object, "threads", e->threads);
            sv_json_put_integer(json, object, "ranks", e->ranks);
        }
        sv_json_push(json, array, object);
    }
    return array;
}

sv_status sv_provenance_json(sv_context *context, const sv_provenance *p, char **ret_text)
{
    sv_json json = {.context = context};
    json_t *document = json_object();
    sv_json_put_integer(&json, document, "selvedge", 1);
    sv_json_put_text(&json, document, "command", "info");
    sv_json_put_text(&json, document, "run", p->folder);
    sv_json_put_text(&json, document, "identity_digest", meta(p, "identity_digest"));
    sv_json_put_text(&json, document, "sheet_digest", meta(p, "sheet_digest"));
    sv_json_put_text(&json, document, "version", meta(p, "program_version"));
    sv_json_put_text(&json, document, "kernel", meta(p, "kernel"));
    sv_json_put_integer(&json, document, "realisations", p->health->realisations);
    sv_json_put_integer(&json, document, "failed", p->health->failed);
    sv_json_put(&json, document, "markers", make_health(&json, p->health));
    sv_json_put(&json, document, "cost", make_cost(&json, p->health));
    sv_json_put(&json, document, "events", make_events(&json, p->history));
    return sv_json_finish(&json, document, ret_text);
}
