/* SPDX-License-Identifier: GPL-3.0-or-later */
/* What a folder holds, and the lock that lets one process write it. */
#include <dirent.h>
#include <errno.h>
#include <fcntl.h>
#include <stdio.h>
#include <string.h>
#include <unistd.h>

#include "store_internal.h"

/* What sv_output_begin() calls its files until they are whole: NAME.partXXXXXX. */
static bool is_temporary(const char *name)
{
    const size_t length = strlen(name), tail = strlen(".partXXXXXX");
    return length > tail && strncmp(name + length - tail, ".part", 5) == 0;
}

/* Names this program puts into a run folder. */
static bool is_own_name(const char *name)
{
    static const char *const names[] = {SV_SHEET_NAME,  SV_LEDGER_NAME, SV_JOURNAL_NAME,
                                        SV_LOCK_NAME,   SV_INPUTS_NAME, "points.csv",
                                        "summary.json", "figures",      "report.html"};
    for (size_t i = 0; i < sizeof names / sizeof *names; i++)
        if (strcmp(name, names[i]) == 0)
            return true;
    return is_temporary(name) || strncmp(name, SV_ASIDE_PREFIX, strlen(SV_ASIDE_PREFIX)) == 0;
}

/*
 * A folder is a run when it holds the lock file, the ledger or the sheet. Anything else that is
 * not empty belongs to somebody and is left alone.
 */
sv_status sv_folder_look(sv_context *context, const char *folder, sv_folder_kind *ret_kind,
                         char foreign[256])
{
    DIR *listing = opendir(folder);
    if (listing == NULL)
        return SV_FAIL(context, SV_STORAGE, "cannot read the folder %s: %s", folder,
                       strerror(errno));
    bool empty = true, mark = false;
    foreign[0] = '\0';
    for (struct dirent *entry = readdir(listing); entry != NULL; entry = readdir(listing)) {
        const char *name = entry->d_name;
        if (strcmp(name, ".") == 0 || strcmp(name, "..") == 0)
            continue;
        empty = false;
        mark |= strcmp(name, SV_SHEET_NAME) == 0 || strcmp(name, SV_LEDGER_NAME) == 0 ||
                strcmp(name, SV_LOCK_NAME) == 0;
        if (!is_own_name(name))
            snprintf(foreign, 256, "%s", name);
    }
    closedir(listing);
    *ret_kind = empty ? SV_FOLDER_EMPTY : mark ? SV_FOLDER_RUN : SV_FOLDER_FOREIGN;
    return SV_OK;
}

/* Removes temporary files a killed process left. Call with the lock held. */
void sv_folder_sweep(const char *folder)
{
    DIR *listing = opendir(folder);
    if (listing == NULL)
        return;
    for (struct dirent *entry = readdir(listing); entry != NULL; entry = readdir(listing))
        if (is_temporary(entry->d_name))
            unlinkat(dirfd(listing), entry->d_name, 0);
    closedir(listing);
}

/* Who holds the lock, by its own word; a number or nothing. */
static long holder_of(int file)
{
    char text[32] = {0};
    ssize_t size = pread(file, text, sizeof text - 1, 0);
    int64_t number = 0;
    if (size <= 0)
        return 0;
    text[strcspn(text, "\n")] = '\0';
    return sv_parse_integer(text, &number) == SV_PARSE_OK ? (long)number : 0;
}

static sv_status refuse_lock(sv_context *context, const char *folder, int file, int reason)
{
    if (reason != EAGAIN && reason != EACCES)
        return SV_FAIL(context, SV_STORAGE,
                       "cannot lock %s: %s (choose a folder on a file system with file locks)",
                       folder, strerror(reason));
    long holder = holder_of(file);
    if (holder > 0)
        return SV_FAIL(context, SV_STORAGE,
                       "%s is locked: another process (number %ld) is writing this run", folder,
                       holder);
    return SV_FAIL(context, SV_STORAGE, "%s is locked: another process is writing this run",
                   folder);
}

/*
 * An open-file-description lock on a file of its own. Closing any descriptor of a file drops
 * the process's classic locks on it, so the ledger itself, whose locks belong to SQLite, is
 * never touched here; this kind of lock also works between two opens of one process.
 */
sv_status sv_folder_lock(sv_context *context, const char *folder, int *ret_lock)
{
    char path[SV_PATH_SIZE], text[32];
    sv_status status = sv_join_path(context, folder, SV_LOCK_NAME, path, sizeof path);
    if (status != SV_OK)
        return status;
    int file = open(path, O_RDWR | O_CREAT | O_CLOEXEC | O_NOFOLLOW, 0666);
    if (file < 0)
        return SV_FAIL(context, SV_STORAGE, "cannot write %s: %s", path, strerror(errno));
    struct flock lock = {.l_type = F_WRLCK, .l_whence = SEEK_SET};
    if (fcntl(file, F_OFD_SETLK, &lock) != 0) {
        status = refuse_lock(context, folder, file, errno);
        close(file);
        return status;
    }
    /* For the message of a second process only; a full disk shows up at the ledger. */
    int length = snprintf(text, sizeof text, "%ld\n", (long)getpid());
    if (ftruncate(file, 0) != 0 || pwrite(file, text, (size_t)length, 0) != length)
        sv_log(context, SV_LOG_DETAIL, "cannot note the process number in %s", path);
    *ret_lock = file;
    return SV_OK;
}

void sv_folder_unlock(int lock)
{
    if (lock >= 0)
        close(lock);
}
