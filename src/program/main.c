/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "program_internal.h"

#include <errno.h>
#include <locale.h>
#include <malloc.h>
#include <signal.h>
#include <string.h>
#include <unistd.h>

static void log_to_stderr(sv_log_level level, const char *message, void *user)
{
    const options *o = user;
    if (o->quiet || (level == SV_LOG_DETAIL && o->verbose == 0))
        return;
    char clean[2000];
    sv_text_clean(message, clean, sizeof clean);
    fprintf(stderr, "selvedge: %s%s\n", level == SV_LOG_WARNING ? "warning: " : "", clean);
}

/* A full disk or a closed pipe shows only when the stream is closed. */
static int close_output(int code)
{
    if (ferror(stdout) == 0 && fclose(stdout) == 0)
        return code;
    fprintf(stderr, "selvedge: error: cannot write to standard output: %s\n", strerror(errno));
    return sv_status_exit_code(SV_STORAGE);
}

int main(int argc, char **argv)
{
    options o;
    sv_context context;
    setlocale(LC_CTYPE, "");
    /* Realisations take and give back the same large blocks: keep them instead of handing them to
     * the system, which would have to clear their pages each time. */
    mallopt(M_MMAP_THRESHOLD, 1 << 25); /* the most that is accepted */
    mallopt(M_TRIM_THRESHOLD, 1 << 30);
    signal(SIGXFSZ, SIG_IGN);
    launch_begin(&argc, &argv);
    int code = options_parse(argc, argv, &o);
    const sv_team *team = launch_team();
    /* The other ranks of a job take part in an ensemble; anything else is done by rank 0. */
    const bool helps = team == NULL || team->rank == 0 ||
                       (o.command != NULL && o.command->run == run_average && !o.dry_run);
    if (code < 0 && helps) {
        sv_context_init(&context);
        context.log = log_to_stderr;
        context.log_user = &o;
        context.cancel = signals_stop_requested;
        signals_install();
        code = o.command->run(&context, &o);
    }
    options_free(&o);
    return launch_end(close_output(code));
}
