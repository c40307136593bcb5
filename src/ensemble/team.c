/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Realisations over processes. Rank 0 hands out and takes results in, the others ask before they
 * run dry, so that nobody waits for a message. Who computes what depends on speed; what comes out
 * does not. */
#include "ensemble_internal.h"

#include <stddef.h>
#include <string.h>

/* Messages of two builds never mix: a rank of another layout is refused at its first word. */
enum { PROTOCOL = 2, MOST_VALUES = 1024, MOST_JOBS = 512, JOB_BYTES = 12 };

typedef enum word {
    WORD_READY = 1,
    WORD_WANT,
    WORD_RESULT,
    WORD_MAPS, /* values of the result that follows, in pieces */
    WORD_FAILED,
    WORD_END,
    WORD_JOBS,
    WORD_STOP
} word;

typedef struct head {
    uint32_t protocol, layout; /* layout: size of a record */
    uint32_t word, count;      /* count: jobs wanted, jobs sent, or a flag */
} head;

typedef struct message {
    head head;
    union {
        unsigned char jobs[MOST_JOBS * JOB_BYTES];
        struct {
            int32_t status;
            char text[1000];
        } failure;
        struct {
            int64_t total, first; /* of the realisation, of this piece; head.count values follow */
            int64_t values[MOST_VALUES];
        } maps;
        unsigned char record[sizeof(sv_record)];
    } body;
} message;

/* A record on its way: as it lies in memory, without the outcomes it has not. */
enum {
    RECORD_HEAD = offsetof(sv_record, outcomes),
    RECORD_TAIL = RECORD_HEAD + sizeof(((sv_record *)0)->outcomes)
};

static size_t record_size(int32_t n_outcomes)
{
    return sizeof(sv_record) - (size_t)(SV_MAX_MARKERS - n_outcomes) * sizeof(sv_outcome);
}

static void pack_record(const sv_record *record, unsigned char *to)
{
    const size_t outcomes = (size_t)record->n_outcomes * sizeof(sv_outcome);
    const unsigned char *from = (const unsigned char *)record;
    memcpy(to, from, RECORD_HEAD + outcomes);
    memcpy(to + RECORD_HEAD + outcomes, from + RECORD_TAIL, sizeof *record - RECORD_TAIL);
}

/* False when the bytes are no record. */
static bool unpack_record(const unsigned char *from, size_t size, sv_record *ret_record)
{
    sv_record record;
    unsigned char *to = (unsigned char *)&record;
    memset(&record, 0, sizeof record);
    if (size < RECORD_HEAD)
        return false;
    memcpy(to, from, RECORD_HEAD);
    if (record.n_outcomes < 0 || record.n_outcomes > SV_MAX_MARKERS ||
        record_size(record.n_outcomes) != size)
        return false;
    const size_t outcomes = (size_t)record.n_outcomes * sizeof(sv_outcome);
    memcpy(to + RECORD_HEAD, from + RECORD_HEAD, outcomes);
    memcpy(to + RECORD_TAIL, from + RECORD_HEAD + outcomes, sizeof record - RECORD_TAIL);
    *ret_record = record;
    return true;
}

static sv_status send(sv_context *context, const sv_team *team, int to, message *m, word what,
                      uint32_t count, size_t body)
{
    m->head = (head){PROTOCOL, (uint32_t)sizeof(sv_record), (uint32_t)what, count};
    return team->send(context, to, m, sizeof m->head + body, team->user);
}

/* One waiting message; *ret_got false when there is none. Other processes are not trusted blindly:
 * lengths must fit. */
static sv_status receive(sv_context *context, const sv_team *team, message *m, int *ret_from,
                         size_t *ret_body, bool *ret_got)
{
    size_t bytes = 0;
    sv_status status = team->receive(context, ret_from, m, sizeof *m, &bytes, team->user);
    *ret_got = status == SV_OK && bytes > 0;
    if (!*ret_got)
        return status;
    if (bytes < sizeof m->head || m->head.protocol != PROTOCOL ||
        m->head.layout != sizeof(sv_record))
        return SV_FAIL(context, SV_INTERNAL, "rank %d speaks another language than rank %d",
                       *ret_from, team->rank);
    *ret_body = bytes - sizeof m->head;
    return SV_OK;
}

/* ------------------------------------------------------------------ rank 0 */

typedef struct member {
    int64_t busy; /* jobs there */
    int wants;
    bool ready, gone;
    sv_site_record *maps; /* of its next result, as far as it has come */
    int64_t got;
} member;

struct team_desk {
    const sv_team *team;
    desk_calls calls;
    member *members;
    message *message;
    bool stopping;
};

sv_status desk_open(sv_context *context, const sv_team *team, desk_calls calls,
                    team_desk **ret_desk)
{
    team_desk *d = NULL;
    sv_status status = sv_take(context, 1, sizeof *d, &d);
    if (status != SV_OK)
        return status;
    d->team = team;
    d->calls = calls;
    if ((status = sv_take(context, team->size, sizeof *d->members, &d->members)) != SV_OK ||
        (status = sv_take(context, 1, sizeof *d->message, &d->message)) != SV_OK) {
        desk_close(context, d);
        return status;
    }
    *ret_desk = d;
    return SV_OK;
}

static sv_status serve(sv_context *context, team_desk *d, int rank)
{
    member *who = &d->members[rank];
    uint32_t count = 0;
    pool_job job;
    while (!d->stopping && count < MOST_JOBS && (int)count < who->wants &&
           d->calls.next(d->calls.user, who->busy, &job)) {
        unsigned char *at = d->message->body.jobs + (size_t)count * JOB_BYTES;
        memcpy(at, &job.point, 4);
        memcpy(at + 4, &job.realisation, 8);
        who->busy++;
        count++;
    }
    if (count == 0)
        return SV_OK; /* asked again when something has come in */
    who->wants = 0;
    return send(context, d->team, rank, d->message, WORD_JOBS, count, (size_t)count * JOB_BYTES);
}

static sv_status take_maps(sv_context *context, team_desk *d, int rank, size_t body)
{
    member *who = &d->members[rank];
    const int64_t count = d->message->head.count;
    const size_t before = offsetof(message, body.maps.values) - offsetof(message, body);
    const int64_t total = d->message->body.maps.total, first = d->message->body.maps.first;
    sv_status status = SV_OK;
    if (body < before || count > MOST_VALUES || body != before + (size_t)count * 8 || total < 0 ||
        total > SV_MOST_ENTRIES || first < 0 || first + count > total ||
        (first > 0 && (who->maps == NULL || who->got != first || who->maps->n != total)))
        return SV_FAIL(context, SV_INTERNAL, "values of a map out of place from rank %d", rank);
    if (first == 0) {
        sv_site_record_free(context, who->maps);
        who->maps = NULL;
        status = sv_take(context, 1, sizeof *who->maps, &who->maps);
        if (status == SV_OK)
            status = sv_take_raw(context, total, sizeof *who->maps->values, &who->maps->values);
        if (status != SV_OK)
            return status;
        who->maps->n = total;
    }
    memcpy(who->maps->values + first, d->message->body.maps.values, (size_t)count * 8);
    who->got = first + count;
    return SV_OK;
}

static sv_status take_record(sv_context *context, team_desk *d, int rank, size_t body)
{
    sv_record record;
    if (!unpack_record(d->message->body.record, body, &record))
        return SV_FAIL(context, SV_INTERNAL, "a result of %zu bytes from rank %d", body, rank);
    member *who = &d->members[rank];
    if (who->maps != NULL && who->got != who->maps->n)
        return SV_FAIL(context, SV_INTERNAL, "a map of rank %d came in part only", rank);
    record.maps = who->maps; /* never the address that came */
    who->maps = NULL;
    who->busy--;
    d->calls.take(d->calls.user, &record);
    return SV_OK;
}

static sv_status take_failure(sv_context *context, team_desk *d, int rank)
{
    sv_status status = (sv_status)d->message->body.failure.status;
    if (status <= SV_OK || status >= SV_STATUS_COUNT)
        status = SV_INTERNAL;
    d->members[rank].busy = 0;
    if (status == SV_INTERRUPTED)
        return status;
    return SV_FAIL(context, status, "rank %d: %.900s", rank, d->message->body.failure.text);
}

static sv_status take_message(sv_context *context, team_desk *d, int from, size_t body)
{
    member *who = &d->members[from];
    switch ((word)d->message->head.word) {
    case WORD_READY:
        who->ready = true;
        return SV_OK;
    case WORD_WANT:
        who->wants = (int)d->message->head.count;
        return SV_OK;
    case WORD_RESULT:
        return take_record(context, d, from, body);
    case WORD_MAPS:
        return take_maps(context, d, from, body);
    case WORD_FAILED:
        return take_failure(context, d, from);
    case WORD_END:
        who->gone = true;
        who->busy = 0;
        return SV_OK;
    default:
        return SV_FAIL(context, SV_INTERNAL, "message %u from rank %d", d->message->head.word,
                       from);
    }
}

sv_status desk_poll(sv_context *context, team_desk *d)
{
    sv_status status = SV_OK, first = SV_OK;
    bool got = true;
    while (got) {
        int from = 0;
        size_t body = 0;
        status = receive(context, d->team, d->message, &from, &body, &got);
        if (status == SV_OK && got)
            status = take_message(context, d, from, body);
        if (first == SV_OK)
            first = status;
    }
    for (int r = 1; r < d->team->size && first == SV_OK; r++)
        if (d->members[r].wants > 0)
            first = serve(context, d, r);
    return first;
}

int64_t desk_busy(const team_desk *d)
{
    int64_t busy = 0;
    for (int r = 1; r < d->team->size; r++)
        busy += d->members[r].busy;
    return busy;
}

sv_status desk_stop(sv_context *context, team_desk *d, bool abort_running)
{
    sv_status first = SV_OK;
    d->stopping = true;
    for (int r = 1; r < d->team->size; r++) {
        sv_status status =
            send(context, d->team, r, d->message, WORD_STOP, abort_running ? 1 : 0, 0);
        first = first == SV_OK ? status : first;
    }
    return first;
}

bool desk_empty(const team_desk *d)
{
    for (int r = 1; r < d->team->size; r++)
        if (!d->members[r].gone)
            return false;
    return true;
}

void desk_close(sv_context *context, team_desk *d)
{
    if (d == NULL)
        return;
    for (int r = 0; d->members != NULL && r < d->team->size; r++)
        sv_site_record_free(context, d->members[r].maps);
    sv_give(context, d->members);
    sv_give(context, d->message);
    sv_give(context, d);
}

/* --------------------------------------------------------------- other ranks */

typedef struct helper {
    const sv_team *team;
    pool *pool;
    message *message;
    bool asked, stopping, failed;
} helper;

static sv_status send_maps(sv_context *context, helper *h, const sv_site_record *maps)
{
    const size_t before = offsetof(message, body.maps.values) - offsetof(message, body);
    sv_status status = SV_OK;
    int64_t first = 0;
    do {
        const int64_t left = maps->n - first, count = left < MOST_VALUES ? left : MOST_VALUES;
        h->message->body.maps.total = maps->n;
        h->message->body.maps.first = first;
        if (count > 0)
            memcpy(h->message->body.maps.values, maps->values + first, (size_t)count * 8);
        status = send(context, h->team, 0, h->message, WORD_MAPS, (uint32_t)count,
                      before + (size_t)count * 8);
        first += count;
    } while (status == SV_OK && first < maps->n);
    return status;
}

static sv_status hand_in(sv_context *context, helper *h)
{
    sv_record record;
    sv_status status = SV_OK;
    while (status == SV_OK && pool_next(h->pool, &record)) {
        const size_t size = record_size(record.n_outcomes);
        if (record.maps != NULL)
            status = send_maps(context, h, record.maps);
        sv_site_record_free(context, record.maps);
        record.maps = NULL;
        if (status != SV_OK)
            break;
        record.rank = h->team->rank;
        pack_record(&record, h->message->body.record);
        status = send(context, h->team, 0, h->message, WORD_RESULT, 1, size);
    }
    return status;
}

static sv_status ask(sv_context *context, helper *h)
{
    int wants = h->asked || h->stopping ? 0 : pool_wants(h->pool, MOST_JOBS);
    if (wants == 0)
        return SV_OK;
    h->asked = true;
    return send(context, h->team, 0, h->message, WORD_WANT,
                (uint32_t)(wants > MOST_JOBS ? MOST_JOBS : wants), 0);
}

static sv_status listen(sv_context *context, helper *h, int32_t n_points)
{
    bool got = true;
    sv_status status = SV_OK;
    while (status == SV_OK && got) {
        int from = 0;
        size_t body = 0;
        status = receive(context, h->team, h->message, &from, &body, &got);
        if (status != SV_OK || !got)
            break;
        const uint32_t count = h->message->head.count;
        if (h->message->head.word == WORD_STOP) {
            h->stopping = true;
            pool_stop(h->pool, count != 0);
        } else if (h->message->head.word == WORD_JOBS && body == (size_t)count * JOB_BYTES) {
            h->asked = false;
            for (uint32_t k = 0; k < count && status == SV_OK; k++) {
                pool_job job;
                memcpy(&job.point, h->message->body.jobs + (size_t)k * JOB_BYTES, 4);
                memcpy(&job.realisation, h->message->body.jobs + (size_t)k * JOB_BYTES + 4, 8);
                if (job.point < 0 || job.point >= n_points)
                    status = SV_FAIL(context, SV_INTERNAL, "job of point %ld", (long)job.point);
                else
                    pool_give(h->pool, job);
            }
        } else {
            status = SV_FAIL(context, SV_INTERNAL, "message %u from rank %d", h->message->head.word,
                             from);
        }
    }
    return status;
}

/* Says why this rank computes no more; rank 0 then stops all. */
static sv_status say_failure(sv_context *context, helper *h, sv_status status)
{
    h->failed = true;
    memset(&h->message->body.failure, 0, sizeof h->message->body.failure);
    h->message->body.failure.status = (int32_t)status;
    memcpy(h->message->body.failure.text, context->error.message,
           strnlen(context->error.message, sizeof h->message->body.failure.text - 1));
    return send(context, h->team, 0, h->message, WORD_FAILED, 0, sizeof h->message->body.failure);
}

static sv_status help(sv_context *context, helper *h, int32_t n_points)
{
    for (;;) {
        sv_status status = hand_in(context, h);
        if (status == SV_OK && !h->failed) {
            sv_status why = sv_cancelled(context) ? SV_INTERRUPTED : pool_status(context, h->pool);
            if (why != SV_OK && !h->stopping)
                status = say_failure(context, h, why);
        }
        if (status == SV_OK && !h->failed)
            status = ask(context, h);
        if (status == SV_OK)
            status = listen(context, h, n_points);
        if (status != SV_OK)
            return status;
        if (h->stopping && pool_busy(h->pool) == 0) {
            if ((status = hand_in(context, h)) != SV_OK)
                return status;
            return send(context, h->team, 0, h->message, WORD_END, 0, 0);
        }
        pool_wait(h->pool, 0.005);
    }
}

sv_status sv_team_help(sv_context *context, const sv_team *team, const sv_case *points,
                       int32_t n_points, int threads)
{
    helper h = {.team = team};
    sv_status status = sv_take(context, 1, sizeof *h.message, &h.message);
    if (status == SV_OK)
        status = pool_start(context, points, threads, &h.pool);
    if (status == SV_OK)
        status = send(context, team, 0, h.message, WORD_READY, 0, 0);
    if (status == SV_OK)
        status = help(context, &h, n_points);
    pool_end(context, h.pool);
    sv_give(context, h.message);
    return status;
}
