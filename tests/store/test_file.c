/* SPDX-License-Identifier: GPL-3.0-or-later */
/* sv_write_file(): whole or not at all. */
#include <dirent.h>
#include <signal.h>
#include <stdlib.h>
#include <sys/resource.h>
#include <sys/stat.h>
#include <unistd.h>

#include "selvedge/store.h"
#include "testing.h"

static int count_entries(const char *folder)
{
    int count = 0;
    DIR *listing = opendir(folder);
    while (listing != NULL && readdir(listing) != NULL)
        count++;
    if (listing != NULL)
        closedir(listing);
    return count - 2;
}

static void check_content(const char *path, const char *expected)
{
    sv_context *context = test_context();
    char *text = NULL;
    size_t size = 0;
    CHECK_OK(sv_read_file(context, path, 1 << 20, &text, &size));
    if (text != NULL)
        CHECK_TEXT(text, expected);
    sv_give(context, text);
}

SV_TEST(a_file_is_written_and_replaced)
{
    sv_context *context = test_context();
    const char *folder = test_scratch("files");
    char path[1200];
    CHECK(mkdir(folder, 0777) == 0);
    snprintf(path, sizeof path, "%s/a.txt", folder);
    CHECK_OK(sv_write_file(context, path, "first", 5));
    check_content(path, "first");
    CHECK_OK(sv_write_file(context, path, "", 0));
    check_content(path, "");
    struct stat info;
    const mode_t mask = umask(0);
    umask(mask);
    CHECK(stat(path, &info) == 0 && (info.st_mode & 0777) == (0666 & ~mask));
    CHECK_INT(count_entries(test_scratch("files")), 1);
}

SV_TEST(a_link_is_replaced_not_followed)
{
    sv_context *context = test_context();
    char target[1200], path[1200];
    snprintf(target, sizeof target, "%s", test_scratch("target"));
    snprintf(path, sizeof path, "%s", test_scratch("link"));
    CHECK_OK(sv_write_file(context, target, "precious", 8));
    CHECK(symlink(target, path) == 0);
    CHECK_OK(sv_write_file(context, path, "new", 3));
    check_content(target, "precious");
    check_content(path, "new");
}

SV_TEST(failures_name_the_file_and_the_reason)
{
    sv_context *context = test_context();
    CHECK_STATUS(SV_STORAGE, sv_write_file(context, test_scratch("no/such/place"), "x", 1));
    CHECK(strstr(context->error.message, "No such file") != NULL);
    CHECK(strstr(context->error.message, "no/such/place") != NULL);
    CHECK_STATUS(SV_STORAGE, sv_write_file(context, "/tmp", "x", 1));
}

SV_TEST(devices_are_written_in_place)
{
    sv_context *context = test_context();
    char path[1200];
    struct stat info;
    /* By a link, so that a fault here replaces the link and not the device. */
    snprintf(path, sizeof path, "%s", test_scratch("device"));
    CHECK(symlink("/dev/full", path) == 0);
    CHECK_STATUS(SV_STORAGE, sv_write_file(context, path, "x", 1));
    CHECK(strstr(context->error.message, "No space left") != NULL);
    CHECK(stat(path, &info) == 0 && S_ISCHR(info.st_mode));
}

SV_TEST(a_file_that_grows_too_large_leaves_the_old_one)
{
    sv_context *context = test_context();
    char folder[1024], path[1200];
    snprintf(folder, sizeof folder, "%s", test_scratch("limit"));
    CHECK(mkdir(folder, 0777) == 0);
    snprintf(path, sizeof path, "%s/summary.json", folder);
    CHECK_OK(sv_write_file(context, path, "old", 3));
    enum { SIZE = 300000 };
    char *text = malloc(SIZE);
    memset(text, 'x', SIZE);
    struct rlimit before, tight;
    CHECK(getrlimit(RLIMIT_FSIZE, &before) == 0);
    tight = before;
    tight.rlim_cur = 100000;
    void (*old_action)(int) = signal(SIGXFSZ, SIG_IGN);
    CHECK(setrlimit(RLIMIT_FSIZE, &tight) == 0);
    const sv_status status = sv_write_file(context, path, text, SIZE);
    CHECK(setrlimit(RLIMIT_FSIZE, &before) == 0);
    signal(SIGXFSZ, old_action);
    CHECK_INT(status, SV_STORAGE);
    CHECK(strstr(context->error.message, "File too large") != NULL);
    check_content(path, "old");
    CHECK_INT(count_entries(folder), 1); /* the temporary is gone */
    free(text);
}
