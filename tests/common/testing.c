/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "testing.h"

#include <ftw.h>
#include <stdarg.h>
#include <stdatomic.h>
#include <stdlib.h>
#include <unistd.h>

enum { MAX_TESTS = 200 };
static struct {
    const char *name;
    test_function function;
} tests[MAX_TESTS];
static int n_tests;
static int failures_of_current;
static sv_context context;
static atomic_long outstanding;
static char scratch[64];

void test_register(const char *name, test_function function)
{
    if (n_tests < MAX_TESTS) {
        tests[n_tests].name = name;
        tests[n_tests].function = function;
        n_tests++;
    }
}

bool test_check(bool condition, const char *file, int line, const char *format, ...)
{
    const int most_messages = 8;
    if (condition)
        return true;
    if (++failures_of_current > most_messages)
        return false;
    va_list args;
    va_start(args, format);
    printf("# %s:%d: ", file, line);
    vprintf(format, args);
    printf("\n");
    va_end(args);
    if (failures_of_current == most_messages)
        printf("# further failures of this test are not shown\n");
    return false;
}

static void *count_take(size_t bytes, void *user)
{
    (void)user;
    void *memory = aligned_alloc(64, (bytes + 127) / 64 * 64);
    if (memory != NULL)
        atomic_fetch_add(&outstanding, 1);
    return memory;
}

static void count_give(void *memory, void *user)
{
    (void)user;
    if (memory != NULL)
        atomic_fetch_sub(&outstanding, 1);
    free(memory);
}

sv_context *test_context(void)
{
    return &context;
}

const char *test_data(const char *name)
{
    static char path[1024];
    const char *folder = getenv("SV_TEST_DATA");
    snprintf(path, sizeof path, "%s/%s", folder ? folder : ".", name);
    return path;
}

static int remove_one(const char *path, const struct stat *info, int flag, struct FTW *walk)
{
    (void)info, (void)flag, (void)walk;
    return remove(path);
}

static void remove_scratch(void)
{
    if (scratch[0] != '\0')
        nftw(scratch, remove_one, 16, FTW_DEPTH | FTW_PHYS);
}

const char *test_scratch(const char *name)
{
    static char path[1024];
    if (scratch[0] == '\0') {
        snprintf(scratch, sizeof scratch, "/tmp/selvedge-test-XXXXXX");
        if (mkdtemp(scratch) == NULL)
            abort();
        atexit(remove_scratch);
    }
    snprintf(path, sizeof path, "%s/%s", scratch, name);
    return path;
}

int main(int argc, char **argv)
{
    int failed = 0;
    const char *only = argc > 1 ? argv[1] : NULL;
    sv_context_init(&context);
    context.allocator = (sv_allocator){count_take, count_give, NULL};
    printf("1..%d\n", only ? 1 : n_tests);
    for (int i = 0; i < n_tests; i++) {
        if (only && strcmp(only, tests[i].name) != 0)
            continue;
        failures_of_current = 0;
        long before = atomic_load(&outstanding);
        tests[i].function();
        long leaked = atomic_load(&outstanding) - before;
        test_check(leaked == 0, __FILE__, __LINE__, "%s keeps %ld blocks of memory", tests[i].name,
                   leaked);
        printf("%sok %d - %s\n", failures_of_current ? "not " : "", i + 1, tests[i].name);
        fflush(stdout);
        failed += failures_of_current != 0;
    }
    return failed != 0;
}
