/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Several ranks, here threads with letter boxes: the result of one, failures told, nobody left. */
#include "fixtures.h"
#include "selvedge/ensemble.h"

#include <pthread.h>
#include <stdlib.h>

enum { RANKS = 3, ROOM = 1 << 14 };

typedef struct letter {
    struct letter *next;
    int from;
    size_t bytes;
    unsigned char text[];
} letter;

typedef struct office {
    pthread_mutex_t mutex;
    letter *box[RANKS];
    int spoil; /* rank whose next message loses its end, or −1 */
} office;

typedef struct seat {
    office *office;
    int rank;
} seat;

static sv_status post(sv_context *context, int to, const void *message, size_t bytes, void *user)
{
    seat *s = user;
    letter *l = malloc(sizeof *l + bytes);
    (void)context;
    pthread_mutex_lock(&s->office->mutex);
    if (s->office->spoil == s->rank && bytes > 16) {
        bytes -= 9;
        s->office->spoil = -1;
    }
    *l = (letter){.from = s->rank, .bytes = bytes};
    memcpy(l->text, message, bytes);
    letter **at = &s->office->box[to];
    while (*at != NULL)
        at = &(*at)->next;
    *at = l;
    pthread_mutex_unlock(&s->office->mutex);
    return SV_OK;
}

static sv_status fetch(sv_context *context, int *ret_from, void *message, size_t room,
                       size_t *ret_bytes, void *user)
{
    seat *s = user;
    pthread_mutex_lock(&s->office->mutex);
    letter *l = s->office->box[s->rank];
    if (l != NULL)
        s->office->box[s->rank] = l->next;
    pthread_mutex_unlock(&s->office->mutex);
    *ret_bytes = 0;
    if (l == NULL)
        return SV_OK;
    if (l->bytes > room)
        return SV_FAIL(context, SV_INTERNAL, "no room");
    memcpy(message, l->text, l->bytes);
    *ret_from = l->from;
    *ret_bytes = l->bytes;
    free(l);
    return SV_OK;
}

/* A small disordered problem. */
typedef struct problem {
    sv_model model;
    sv_flake open;
    sv_disorder disorder;
    sv_case point;
} problem;

static void make(problem *p)
{
    *p = (problem){.model = fixture_qi_wu_zhang(-1.0)};
    sv_flake_spec open = fixture_cells(&p->model, 6, 6, false);
    p->open = fixture_flake(&p->model, &open);
    p->disorder = (sv_disorder){
        .name = "pot", .type = SV_DISORDER_ONSITE, .on = -1, .width = 3.0, .per_cell = true};
    p->point = (sv_case){.open_flake = &p->open,
                         .disorder = &p->disorder,
                         .n_disorder = 1,
                         .occupation = fixture_below_zero,
                         .solve = sv_projector_options_default(),
                         .seed = 7,
                         .n_markers = 1};
    p->point.markers[0] = (sv_marker_request){.marker = sv_marker_find("local_chern"),
                                              .values = {{.present = true, .real = {0.5}}}};
}

static void release(problem *p)
{
    sv_flake_free(test_context(), &p->open);
    sv_model_free(test_context(), &p->model);
}

typedef struct desk {
    sv_team team;
    seat seat;
    const problem *problem;
    sv_context context;
    sv_status status;
    bool cancelled;
} desk;

static bool is_cancelled(void *user)
{
    return *(bool *)user;
}

static void *helper(void *argument)
{
    desk *d = argument;
    d->status = sv_team_help(&d->context, &d->team, &d->problem->point, 1, 1);
    return NULL;
}

/* Rank 0's status; the others' in desks[1 …]. */
static sv_status run_team(const problem *p, int64_t n, desk desks[RANKS], int spoil, int cancelled,
                          sv_ensemble *e)
{
    office mail = {.spoil = spoil};
    pthread_t threads[RANKS];
    pthread_mutex_init(&mail.mutex, NULL);
    for (int r = 0; r < RANKS; r++) {
        desk *d = &desks[r];
        *d = (desk){.seat = {&mail, r}, .problem = p, .context = sv_context_fork(test_context())};
        d->team = (sv_team){r, RANKS, post, fetch, &d->seat};
        d->cancelled = r == cancelled;
        d->context.cancel = is_cancelled;
        d->context.cancel_user = &d->cancelled;
    }
    for (int r = 1; r < RANKS; r++)
        pthread_create(&threads[r], NULL, helper, &desks[r]);
    sv_ensemble_options o = {
        .size = sizeof o, .realisations = n, .threads = 1, .team = &desks[0].team};
    sv_status status = sv_ensemble_run(test_context(), &p->point, &o, e);
    for (int r = 1; r < RANKS; r++)
        pthread_join(threads[r], NULL);
    for (int r = 0; r < RANKS; r++)
        for (letter *l = mail.box[r], *next; l != NULL; l = next) {
            next = l->next;
            free(l);
        }
    pthread_mutex_destroy(&mail.mutex);
    return status;
}

SV_TEST(three_ranks_give_the_bits_of_one)
{
    enum { N = 60 };
    problem p;
    desk desks[RANKS];
    sv_ensemble one, three;
    make(&p);
    CHECK_OK(sv_ensemble_init(test_context(), 1, N, 1, &one));
    CHECK_OK(sv_ensemble_init(test_context(), 1, N, 1, &three));
    sv_ensemble_options o = {.size = sizeof o, .realisations = N, .threads = 1};
    CHECK_OK(sv_ensemble_run(test_context(), &p.point, &o, &one));
    CHECK_OK(run_team(&p, N, desks, -1, -1, &three));
    CHECK_OK(desks[1].status);
    CHECK_OK(desks[2].status);
    for (int64_t k = 0; k < N; k++) {
        const sv_kept_outcome *a = sv_ensemble_outcome(&one, 0, k, 0);
        const sv_kept_outcome *b = sv_ensemble_outcome(&three, 0, k, 0);
        CHECK(a != NULL && b != NULL);
        if (a == NULL || b == NULL)
            break;
        CHECK(memcmp(&a->value, &b->value, sizeof a->value) == 0 && a->verdict == b->verdict &&
              a->electrons == b->electrons && a->margin == b->margin);
        CHECK_INT(sv_ensemble_head(&one, 0, k)->sites, sv_ensemble_head(&three, 0, k)->sites);
        CHECK_TEXT(sv_ensemble_text(&one, a->engine), sv_ensemble_text(&three, b->engine));
    }
    sv_ensemble_free(test_context(), &one);
    sv_ensemble_free(test_context(), &three);
    release(&p);
}

SV_TEST(a_rank_that_is_asked_to_stop_stops_all)
{
    problem p;
    desk desks[RANKS];
    sv_ensemble e;
    make(&p);
    CHECK_OK(sv_ensemble_init(test_context(), 1, 100000, 1, &e));
    CHECK_STATUS(SV_INTERRUPTED, run_team(&p, 100000, desks, -1, 2, &e));
    CHECK_OK(desks[1].status);
    CHECK_OK(desks[2].status);
    sv_ensemble_free(test_context(), &e);
    release(&p);
}

/* A result that lost its end is refused, and still everybody goes home. */
SV_TEST(a_torn_message_ends_the_run)
{
    problem p;
    desk desks[RANKS];
    sv_ensemble e;
    make(&p);
    CHECK_OK(sv_ensemble_init(test_context(), 1, 2000, 1, &e));
    CHECK_STATUS(SV_INTERNAL, run_team(&p, 2000, desks, 1, -1, &e));
    CHECK_OK(desks[1].status);
    sv_ensemble_free(test_context(), &e);
    release(&p);
}
