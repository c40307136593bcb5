/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Everything that knows of MPI. Started by itself the program never calls it. All calls come from
 * the thread that called launch_begin(). */
#include "program_internal.h"

#include <mpi.h>

#include <stdlib.h>
#include <string.h>
#include <time.h>
#include <unistd.h>

/* A message on its way, with the bytes it needs until then. */
typedef struct letter {
    struct letter *next;
    MPI_Request request;
    unsigned char bytes[];
} letter;

/* Only the program, never the library, keeps static data; the launcher made one world of it. */
static struct {
    bool active;
    int here; /* ranks on this machine */
    letter *letters;
    sv_team team;
} world;

static bool started_by_launcher(void)
{
    static const char *const names[] = {"OMPI_COMM_WORLD_SIZE", "PMIX_RANK", "PMI_RANK",
                                        "PMI_SIZE"};
    for (size_t k = 0; k < sizeof names / sizeof names[0]; k++)
        if (getenv(names[k]) != NULL)
            return true;
    return false;
}

static void rest(void)
{
    nanosleep(&(struct timespec){.tv_nsec = 1000000}, NULL);
}

/* Lets go of what has arrived. */
static void clear_letters(bool all)
{
    for (letter **at = &world.letters; *at != NULL;) {
        letter *l = *at;
        int arrived = 0;
        MPI_Test(&l->request, &arrived, MPI_STATUS_IGNORE);
        if (!arrived && all)
            MPI_Wait(&l->request, MPI_STATUS_IGNORE);
        if (arrived || all) {
            *at = l->next;
            free(l);
        } else {
            at = &l->next;
        }
    }
}

static sv_status send_letter(sv_context *context, int to, const void *message, size_t bytes,
                             void *user)
{
    (void)user;
    clear_letters(false);
    letter *l = malloc(sizeof *l + bytes);
    if (l == NULL)
        return SV_FAIL(context, SV_NO_MEMORY, "out of memory at a message of %zu bytes", bytes);
    memcpy(l->bytes, message, bytes);
    if (MPI_Isend(l->bytes, (int)bytes, MPI_BYTE, to, 0, MPI_COMM_WORLD, &l->request) !=
        MPI_SUCCESS) {
        free(l);
        return SV_FAIL(context, SV_INTERNAL, "cannot send to rank %d", to);
    }
    l->next = world.letters;
    world.letters = l;
    return SV_OK;
}

static sv_status receive_letter(sv_context *context, int *ret_from, void *message, size_t room,
                                size_t *ret_bytes, void *user)
{
    MPI_Status info;
    int waiting = 0, bytes = 0;
    (void)user;
    *ret_bytes = 0;
    clear_letters(false);
    MPI_Iprobe(MPI_ANY_SOURCE, 0, MPI_COMM_WORLD, &waiting, &info);
    if (!waiting)
        return SV_OK;
    MPI_Get_count(&info, MPI_BYTE, &bytes);
    if (bytes <= 0 || (size_t)bytes > room)
        return SV_FAIL(context, SV_INTERNAL, "a message of %d bytes from rank %d", bytes,
                       info.MPI_SOURCE);
    MPI_Recv(message, bytes, MPI_BYTE, info.MPI_SOURCE, 0, MPI_COMM_WORLD, MPI_STATUS_IGNORE);
    *ret_from = info.MPI_SOURCE;
    *ret_bytes = (size_t)bytes;
    return SV_OK;
}

void launch_begin(int *argc, char ***argv)
{
    int given = 0;
    MPI_Comm machine;
    if (!started_by_launcher() ||
        MPI_Init_thread(argc, argv, MPI_THREAD_FUNNELED, &given) != MPI_SUCCESS)
        return;
    world.active = true;
    world.team = (sv_team){.send = send_letter, .receive = receive_letter};
    MPI_Comm_rank(MPI_COMM_WORLD, &world.team.rank);
    MPI_Comm_size(MPI_COMM_WORLD, &world.team.size);
    MPI_Comm_split_type(MPI_COMM_WORLD, MPI_COMM_TYPE_SHARED, 0, MPI_INFO_NULL, &machine);
    MPI_Comm_size(machine, &world.here);
    MPI_Comm_free(&machine);
    /* Rank 0 speaks for all; what others have to say travels to it. */
    if (world.team.rank > 0 &&
        (freopen("/dev/null", "w", stdout) == NULL || freopen("/dev/null", "w", stderr) == NULL))
        MPI_Abort(MPI_COMM_WORLD, sv_status_exit_code(SV_INTERNAL));
    if (given < MPI_THREAD_FUNNELED)
        launch_abort(SV_REFUSED);
}

const sv_team *launch_team(void)
{
    return world.active && world.team.size > 1 ? &world.team : NULL;
}

int launch_neighbours(void)
{
    return world.active ? world.here : 1;
}

/* What a rank says about itself when all compare. */
typedef struct opinion {
    int status;
    char digest[65], host[64], message[400];
} opinion;

static sv_status judge(sv_context *context, const opinion *all, int n)
{
    for (int r = 0; r < n; r++)
        if (all[r].status != SV_OK)
            return r == 0 ? (sv_status)all[r].status
                          : SV_FAIL(context, (sv_status)all[r].status, "rank %d on %s: %s", r,
                                    all[r].host, all[r].message);
    for (int r = 1; r < n; r++)
        if (strcmp(all[r].digest, all[0].digest) != 0)
            return SV_FAIL(context, SV_REFUSED,
                           "rank %d on %s has another command line, sheet, input, version or "
                           "arithmetic kernel than rank 0 on %s, so their numbers would not go "
                           "together",
                           r, all[r].host, all[0].host);
    return SV_OK;
}

sv_status launch_agree(sv_context *context, sv_status own, const char *digest)
{
    if (launch_team() == NULL)
        return own;
    opinion mine = {.status = (int)own}, *all = NULL;
    int verdict = (int)own;
    snprintf(mine.digest, sizeof mine.digest, "%s", digest);
    snprintf(mine.message, sizeof mine.message, "%.*s", (int)sizeof mine.message - 1,
             context->error.message[0] ? context->error.message : sv_status_text(own));
    gethostname(mine.host, sizeof mine.host - 1);
    if (world.team.rank == 0 && (all = calloc((size_t)world.team.size, sizeof *all)) == NULL)
        launch_abort(SV_NO_MEMORY);
    MPI_Gather(&mine, sizeof mine, MPI_BYTE, all, sizeof mine, MPI_BYTE, 0, MPI_COMM_WORLD);
    if (world.team.rank == 0)
        verdict = (int)judge(context, all, world.team.size);
    MPI_Bcast(&verdict, 1, MPI_INT, 0, MPI_COMM_WORLD);
    free(all);
    return (sv_status)verdict;
}

void launch_abort(sv_status status)
{
    if (world.active)
        MPI_Abort(MPI_COMM_WORLD, sv_status_exit_code(status));
}

int launch_end(int code)
{
    if (!world.active)
        return code;
    MPI_Request request;
    int arrived = 0;
    MPI_Ibcast(&code, 1, MPI_INT, 0, MPI_COMM_WORLD, &request);
    for (;;) { /* rank 0 may be busy for long: no core is burnt meanwhile */
        MPI_Test(&request, &arrived, MPI_STATUS_IGNORE);
        if (arrived)
            break;
        rest();
    }
    clear_letters(true);
    MPI_Finalize();
    return code;
}

bool launch_knows_mpi(void)
{
    return true;
}
