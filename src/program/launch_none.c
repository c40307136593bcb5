/* SPDX-License-Identifier: GPL-3.0-or-later */
/* One process: what the program is without MPI. */
#include "program_internal.h"

void launch_begin(int *argc, char ***argv)
{
    (void)argc;
    (void)argv;
}

const sv_team *launch_team(void)
{
    return NULL;
}

int launch_neighbours(void)
{
    return 1;
}

sv_status launch_agree(sv_context *context, sv_status own, const char *digest)
{
    (void)context;
    (void)digest;
    return own;
}

void launch_abort(sv_status status)
{
    (void)status;
}

int launch_end(int code)
{
    return code;
}

bool launch_knows_mpi(void)
{
    return false;
}
