/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Progress: a bar on a terminal, sparse lines elsewhere. */
#include <stdio.h>
#include <string.h>
#include <time.h>

#include "selvedge/present.h"

enum { BAR_COLUMNS = 24, LINE_PERCENT = 10, LINE_SECONDS = 60 };
static const double BAR_SECONDS = 0.1; /* least time between two drawings of the bar */

static double now_seconds(void)
{
    struct timespec now;
    clock_gettime(CLOCK_MONOTONIC, &now);
    return (double)now.tv_sec + 1e-9 * (double)now.tv_nsec;
}

void sv_progress_bar_init(sv_progress_bar *bar, FILE *stream, bool terminal)
{
    memset(bar, 0, sizeof *bar);
    bar->stream = stream;
    bar->terminal = terminal;
    bar->last_percent = -1;
}

/* "3 min 20 s", from what was done since the first call (a continued run starts above 0). */
static void format_left(const sv_progress_bar *bar, double now, sv_index done, sv_index total,
                        char *text, size_t size)
{
    const double elapsed = now - bar->start_seconds;
    const sv_index fresh = done - bar->first_done;
    if (fresh <= 0 || elapsed < 0.5) {
        snprintf(text, size, "%s", "");
        return;
    }
    const double seconds = elapsed * (double)(total - done) / (double)fresh;
    if (seconds < 90)
        snprintf(text, size, ", %.0f s to go", seconds);
    else if (seconds < 5400)
        snprintf(text, size, ", %.0f min to go", seconds / 60);
    else if (seconds < 172800)
        snprintf(text, size, ", %.1f h to go", seconds / 3600);
    else
        snprintf(text, size, ", %.1f days to go", seconds / 86400);
}

static void draw_bar(sv_progress_bar *bar, const char *phase, sv_index done, sv_index total,
                     int percent, const char *left)
{
    char strip[BAR_COLUMNS + 1];
    const int filled = percent * BAR_COLUMNS / 100;
    memset(strip, '#', (size_t)filled);
    memset(strip + filled, '.', (size_t)(BAR_COLUMNS - filled));
    strip[BAR_COLUMNS] = '\0';
    fprintf(bar->stream, "\r%.12s [%s] %lld/%lld %d %%%s\033[K", phase, strip, (long long)done,
            (long long)total, percent, left);
    bar->shown = true;
}

static void print_line(sv_progress_bar *bar, const char *phase, sv_index done, sv_index total,
                       int percent, const char *left)
{
    fprintf(bar->stream, "%.40s: %lld of %lld (%d %%)%s\n", phase, (long long)done,
            (long long)total, percent, left);
}

/* Whether it is time to show something again. */
static bool is_due(const sv_progress_bar *bar, double now, int percent, bool last)
{
    if (bar->last_percent < 0)
        return true;
    const double pause = now - bar->last_seconds;
    if (bar->terminal)
        return last || pause >= BAR_SECONDS;
    if (percent <= bar->last_percent && !last)
        return pause >= LINE_SECONDS;
    return percent / LINE_PERCENT > bar->last_percent / LINE_PERCENT || pause >= LINE_SECONDS;
}

void sv_progress_bar_show(const char *phase, sv_index done, sv_index total, void *user)
{
    sv_progress_bar *bar = user;
    char left[48];
    if (total <= 0 || done < 0 || done > total)
        return;
    const double now = now_seconds();
    if (bar->last_percent < 0) {
        bar->start_seconds = now;
        bar->first_done = done;
    }
    const int percent = (int)(100.0 * (double)done / (double)total);
    if (!is_due(bar, now, percent, done == total))
        return;
    format_left(bar, now, done, total, left, sizeof left);
    if (bar->terminal)
        draw_bar(bar, phase, done, total, percent, left);
    else
        print_line(bar, phase, done, total, percent, left);
    fflush(bar->stream);
    bar->last_seconds = now;
    bar->last_percent = percent;
}

void sv_progress_bar_end(sv_progress_bar *bar)
{
    if (bar->terminal && bar->shown) {
        fprintf(bar->stream, "\r\033[K");
        fflush(bar->stream);
    }
    bar->shown = false;
}
