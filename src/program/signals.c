/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The first SIGINT, SIGTERM or SIGUSR1 asks for a clean stop; the second one ends the process. */
#include "program_internal.h"

#include <signal.h>
#include <stdatomic.h>
#include <string.h>

/* A signal handler can reach nothing but static data; only the program, never the library, has
 * this one. */
static volatile sig_atomic_t stop_requested; /* number of the signal */

static void request_stop(int number)
{
    stop_requested = number;
    signal(number, SIG_DFL);
}

void signals_install(void)
{
    const int numbers[] = {SIGINT, SIGTERM, SIGUSR1};
    struct sigaction action;
    memset(&action, 0, sizeof action);
    action.sa_handler = request_stop;
    action.sa_flags = SA_RESTART;
    for (size_t k = 0; k < sizeof numbers / sizeof numbers[0]; k++)
        sigaction(numbers[k], &action, NULL);
}

const char *signals_name(void)
{
    const int number = (int)stop_requested;
    return number == SIGINT    ? "SIGINT"
           : number == SIGTERM ? "SIGTERM"
           : number == SIGUSR1 ? "SIGUSR1"
                               : NULL;
}

bool signals_stop_requested(void *user)
{
    (void)user;
    return stop_requested != 0;
}
