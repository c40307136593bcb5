/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Running gnuplot: no shell, a script by file name, in the folder of the figure. */
#include <errno.h>
#include <fcntl.h>
#include <poll.h>
#include <signal.h>
#include <spawn.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <sys/wait.h>
#include <time.h>
#include <unistd.h>

#include "present_internal.h"

enum { LONGEST_SECONDS = 300, POLL_MILLISECONDS = 100, OUTPUT_SIZE = 2048 };

/* The caller's environment with a fixed locale and without gnuplot's own settings. */
static sv_status make_environment(sv_context *context, char *locale, char ***ret_environment)
{
    char **list = NULL;
    int count = 0, kept = 0;
    while (environ != NULL && environ[count] != NULL)
        count++;
    sv_status status = sv_take(context, count + 2, sizeof *list, &list);
    if (status != SV_OK)
        return status;
    for (int i = 0; i < count; i++)
        if (strncmp(environ[i], "LC_ALL=", 7) != 0 && strncmp(environ[i], "GNUTERM=", 8) != 0 &&
            strncmp(environ[i], "GNUPLOT_", 8) != 0)
            list[kept++] = environ[i];
    list[kept] = locale;
    *ret_environment = list;
    return SV_OK;
}

/* Starts gnuplot with its messages going into a pipe; 0 or an errno. */
static int start(const char *folder, const char *script, char **environment, pid_t *ret_child,
                 int *ret_messages)
{
    char program[] = "gnuplot", plain[] = "-d", name[SV_FIGURE_NAME_SIZE + 8];
    char *const arguments[] = {program, plain, name, NULL};
    posix_spawn_file_actions_t actions;
    int ends[2];
    snprintf(name, sizeof name, "%s", script);
    if (pipe2(ends, O_CLOEXEC) != 0)
        return errno;
    int error = posix_spawn_file_actions_init(&actions);
    if (error == 0) {
        error = posix_spawn_file_actions_addchdir_np(&actions, folder);
        if (error == 0)
            error = posix_spawn_file_actions_addopen(&actions, 0, "/dev/null", O_RDONLY, 0);
        if (error == 0)
            error = posix_spawn_file_actions_adddup2(&actions, ends[1], 1);
        if (error == 0)
            error = posix_spawn_file_actions_adddup2(&actions, ends[1], 2);
        if (error == 0)
            error = posix_spawnp(ret_child, program, &actions, NULL, arguments, environment);
        posix_spawn_file_actions_destroy(&actions);
    }
    close(ends[1]);
    if (error != 0)
        close(ends[0]);
    else
        *ret_messages = ends[0];
    return error;
}

static double now_seconds(void)
{
    struct timespec now;
    clock_gettime(CLOCK_MONOTONIC, &now);
    return (double)now.tv_sec + 1e-9 * (double)now.tv_nsec;
}

/* Gathers messages until gnuplot closes them; false when it had to be stopped. */
static bool listen(sv_context *context, pid_t child, int messages, char *output)
{
    const double end = now_seconds() + LONGEST_SECONDS;
    size_t used = 0;
    char chunk[512];
    for (;;) {
        struct pollfd ready = {.fd = messages, .events = POLLIN};
        const int count = poll(&ready, 1, POLL_MILLISECONDS);
        if (sv_cancelled(context) || now_seconds() > end) {
            kill(child, SIGKILL);
            output[used] = '\0';
            return false;
        }
        if (count == 0 || (count < 0 && errno == EINTR))
            continue;
        const ssize_t size = read(messages, chunk, sizeof chunk);
        if (size < 0 && errno == EINTR)
            continue;
        if (size <= 0)
            break;
        const size_t room = OUTPUT_SIZE - 1 - used;
        memcpy(output + used, chunk, (size_t)size < room ? (size_t)size : room);
        used += (size_t)size < room ? (size_t)size : room;
    }
    output[used] = '\0';
    return true;
}

/* The last line that says something; gnuplot prints the place of an error above it. */
static void choose_line(char *output, char *line, size_t size)
{
    char *rest = NULL;
    snprintf(line, size, "no message");
    for (char *word = strtok_r(output, "\n", &rest); word != NULL;
         word = strtok_r(NULL, "\n", &rest))
        if (strspn(word, " \t^") != strlen(word))
            sv_words_fit(word, 150, line, size);
}

static bool wait_for(pid_t child, int *ret_state)
{
    while (waitpid(child, ret_state, 0) < 0)
        if (errno != EINTR)
            return false;
    return true;
}

bool sv_gnuplot_run(sv_context *context, const char *folder, const char *script, char *reason,
                    size_t size)
{
    char output[OUTPUT_SIZE], line[200], locale[] = "LC_ALL=C";
    char **environment = NULL;
    pid_t child = -1;
    int messages = -1, state = 0;
    if (make_environment(context, locale, &environment) != SV_OK) {
        snprintf(reason, size, "out of memory");
        return false;
    }
    const int error = start(folder, script, environment, &child, &messages);
    sv_give(context, environment);
    if (error == ENOENT) {
        snprintf(reason, size,
                 "gnuplot was not found (Debian: apt install gnuplot-nox); the "
                 "script is ready for it");
        return false;
    }
    if (error != 0) {
        snprintf(reason, size, "gnuplot could not be started: %s", strerror(error));
        return false;
    }
    const bool finished = listen(context, child, messages, output);
    close(messages);
    const bool known = wait_for(child, &state);
    choose_line(output, line, sizeof line);
    if (!finished)
        snprintf(reason, size, "gnuplot was stopped before it was done");
    else if (!known)
        snprintf(reason, size, "gnuplot's exit code was not to be had");
    else if (!WIFEXITED(state) || WEXITSTATUS(state) != 0)
        snprintf(reason, size, "gnuplot failed: %s", line);
    return finished && known && WIFEXITED(state) && WEXITSTATUS(state) == 0;
}
