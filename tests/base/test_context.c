/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "testing.h"

#include <signal.h>
#include <stdlib.h>
#include <sys/resource.h>
#include <sys/stat.h>
#include <unistd.h>

SV_TEST(status_table_is_complete)
{
    for (int s = 0; s < SV_STATUS_COUNT; s++) {
        CHECK(strlen(sv_status_text((sv_status)s)) > 0);
        CHECK(sv_status_exit_code((sv_status)s) >= 0);
    }
    CHECK_INT(sv_status_exit_code(SV_INVALID_INPUT), 3);
    CHECK_INT(sv_status_exit_code(SV_OTHER_RUN), 4);
    CHECK_INT(sv_status_exit_code(SV_REFUSED), 6);
    CHECK_INT(sv_status_exit_code(SV_INTERRUPTED), 7);
    CHECK_INT(sv_status_exit_code((sv_status)999), 70);
    CHECK(strlen(sv_version()) > 0);
}

SV_TEST(memory_is_aligned_zeroed_and_checked)
{
    sv_context *c = test_context();
    double *x = NULL;
    CHECK_OK(sv_take(c, 100, sizeof *x, &x));
    CHECK((uintptr_t)x % 64 == 0);
    for (int k = 0; k < 100; k++)
        CHECK(x[k] == 0.0);
    sv_give(c, x);
    void *none = c;
    CHECK_STATUS(SV_NO_MEMORY, sv_take(c, INT64_MAX / 2, 16, &none));
    CHECK_STATUS(SV_NO_MEMORY, sv_take_raw(c, -1, 16, &none));
    CHECK(none == c);
    char *text = NULL;
    CHECK_OK(sv_take_text(c, "film", &text));
    CHECK_TEXT(text, "film");
    sv_give(c, text);
    int *grown = NULL;
    sv_index capacity = 0;
    for (int k = 0; k < 1000; k++) {
        CHECK_OK(sv_reserve(c, &grown, &capacity, k + 1, sizeof *grown));
        grown[k] = k;
    }
    for (int k = 0; k < 1000; k++)
        CHECK_INT(grown[k], k);
    sv_give(c, grown);
}

static bool yes(void *user)
{
    return *(bool *)user;
}

static void count_log(sv_log_level level, const char *message, void *user)
{
    CHECK(level == SV_LOG_WARNING && strcmp(message, "W = 3") == 0);
    ++*(int *)user;
}

static void count_progress(const char *phase, sv_index done, sv_index total, void *user)
{
    CHECK(strcmp(phase, "p") == 0 && done == 1 && total == 2);
    ++*(int *)user;
}

SV_TEST(context_calls_back)
{
    sv_context c;
    bool stop = false;
    int calls = 0;
    sv_context_init(&c);
    sv_log(&c, SV_LOG_NOTE, "nobody listens");
    c.cancel = yes;
    c.cancel_user = &stop;
    CHECK(!sv_cancelled(&c));
    stop = true;
    CHECK(sv_cancelled(&c));
    c.log = count_log;
    c.progress = count_progress;
    c.log_user = c.progress_user = &calls;
    sv_log(&c, SV_LOG_WARNING, "W = %d", 3);
    sv_progress(&c, "p", 1, 2);
    CHECK_INT(calls, 2);
    sv_context fork = sv_context_fork(&c);
    /* SV_FAIL is sv_fail_at() with the place filled in. */
    CHECK_STATUS(SV_INTERNAL, sv_fail_at(&fork, SV_INTERNAL, "file.c", 12, "first"));
    CHECK(fork.error.source_line == 12 && strcmp(fork.error.source_file, "file.c") == 0);
    CHECK_STATUS(SV_NUMERICAL, SV_FAIL(&fork, SV_NUMERICAL, "value %g", 1.5));
    CHECK(c.error.status == SV_OK);
    sv_context_take_error(&c, &fork);
    CHECK_TEXT(c.error.message, "value 1.5");
}

/* FIPS 180-2, appendix B.1 (value recalled from memory, confirmed by sha256sum). */
SV_TEST(digest_of_abc)
{
    char digest[65];
    sv_digest("abc", 3, digest);
    CHECK_TEXT(digest, "ba7816bf8f01cfea414140de5dae2223b00361a396177a9cb410ff61f20015ad");
}

SV_TEST(files_are_read_whole_or_refused)
{
    char *data = NULL;
    size_t size = 0;
    const char *path = test_scratch("small.txt");
    FILE *f = fopen(path, "w");
    fputs("hello", f);
    fclose(f);
    CHECK_OK(sv_read_file(test_context(), path, 100, &data, &size));
    CHECK(size == 5 && strcmp(data, "hello") == 0);
    sv_give(test_context(), data);
    CHECK_STATUS(SV_INVALID_INPUT, sv_read_file(test_context(), path, 4, &data, &size));
    CHECK_STATUS(SV_INVALID_INPUT, sv_read_file(test_context(), "/nowhere/x", 4, &data, &size));
    CHECK_STATUS(SV_INVALID_INPUT, sv_read_file(test_context(), "/dev/zero", 4, &data, &size));
    CHECK_STATUS(SV_INVALID_INPUT, sv_read_file(test_context(), "/tmp", 4, &data, &size));
}

static size_t length_of(const char *path)
{
    char *data = NULL;
    size_t size = 0;
    CHECK_OK(sv_read_file(test_context(), path, 1000000, &data, &size));
    sv_give(test_context(), data);
    return size;
}

SV_TEST(output_appears_whole_or_not_at_all)
{
    sv_output o;
    char path[1024];
    snprintf(path, sizeof path, "%s", test_scratch("out.txt"));
    CHECK_OK(sv_output_begin(test_context(), path, &o));
    fputs("first", o.stream);
    CHECK(access(path, F_OK) != 0);
    CHECK_OK(sv_output_commit(test_context(), &o));
    CHECK(length_of(path) == 5);
    CHECK_OK(sv_output_begin(test_context(), path, &o));
    fputs("second one", o.stream);
    sv_output_abort(&o);
    CHECK(length_of(path) == 5);
    CHECK_STATUS(SV_STORAGE, sv_output_begin(test_context(), "/nowhere/x", &o));
    /* Devices are written to, never replaced; folders are refused. */
    CHECK_OK(sv_output_begin(test_context(), "/dev/null", &o));
    fputs("gone", o.stream);
    CHECK_OK(sv_output_commit(test_context(), &o));
    struct stat info;
    CHECK(stat("/dev/null", &info) == 0 && S_ISCHR(info.st_mode));
    CHECK_STATUS(SV_STORAGE, sv_output_begin(test_context(), "/tmp", &o));
    /* A file-size limit hits in the middle: the old file stays, the temporary goes. */
    struct rlimit before, low;
    signal(SIGXFSZ, SIG_IGN);
    getrlimit(RLIMIT_FSIZE, &before);
    low = before;
    low.rlim_cur = 4096;
    setrlimit(RLIMIT_FSIZE, &low);
    CHECK_OK(sv_output_begin(test_context(), path, &o));
    char temporary[1040];
    snprintf(temporary, sizeof temporary, "%s", o.temporary);
    for (int k = 0; k < 100000; k++)
        fputc('x', o.stream);
    CHECK_STATUS(SV_STORAGE, sv_output_commit(test_context(), &o));
    setrlimit(RLIMIT_FSIZE, &before);
    CHECK(length_of(path) == 5);
    CHECK(access(temporary, F_OK) != 0);
}

static const sv_key two_keys[] = {{.name = "a"}, {.name = "b"}};

SV_TEST(keys_are_found_by_name)
{
    const sv_kind kind = {"k", "doc", two_keys, 2};
    CHECK_INT(sv_kind_find_key(&kind, "b"), 1);
    CHECK_INT(sv_kind_find_key(&kind, "c"), -1);
}
