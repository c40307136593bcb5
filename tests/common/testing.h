/* SPDX-License-Identifier: GPL-3.0-or-later */
/* A small test harness that speaks TAP. Tests register themselves: no table to keep in step. */
#ifndef SELVEDGE_TESTING_H
#define SELVEDGE_TESTING_H

#include <math.h>
#include <stdbool.h>
#include <stdio.h>
#include <string.h>

#include "selvedge/base.h"

typedef void (*test_function)(void);
void test_register(const char *name, test_function function);
/* Records a failure of the running test; returns `condition`. */
bool test_check(bool condition, const char *file, int line, const char *format, ...)
    SV_PRINTF(4, 5);
/* A fresh context whose allocations are counted. */
sv_context *test_context(void);
/* Path of a file below the tests folder (from the environment variable SV_TEST_DATA). */
const char *test_data(const char *name);
/* Path of a fresh file in a scratch folder that is removed at exit. */
const char *test_scratch(const char *name);

/* Defines and registers a test. */
#define SV_TEST(name)                                                                              \
    static void name(void);                                                                        \
    __attribute__((constructor)) static void name##_register(void)                                 \
    {                                                                                              \
        test_register(#name, name);                                                                \
    }                                                                                              \
    static void name(void)

#define CHECK(condition) test_check((condition), __FILE__, __LINE__, "%s", #condition)
#define CHECK_OK(call)                                                                             \
    do {                                                                                           \
        sv_status status_ = (call);                                                                \
        test_check(status_ == SV_OK, __FILE__, __LINE__, "%s gave %d (%s): %s", #call,             \
                   (int)status_, sv_status_text(status_), test_context()->error.message);          \
    } while (0)
#define CHECK_STATUS(expected, call)                                                               \
    do {                                                                                           \
        sv_status status_ = (call);                                                                \
        test_check(status_ == (expected), __FILE__, __LINE__, "%s gave %d (%s), not %s", #call,    \
                   (int)status_, sv_status_text(status_), #expected);                              \
    } while (0)
#define CHECK_CLOSE(a, b, tolerance)                                                               \
    do {                                                                                           \
        double a_ = (a), b_ = (b), t_ = (tolerance);                                               \
        test_check(fabs(a_ - b_) <= t_, __FILE__, __LINE__, "%s = %.17g, expected %.17g ± %.3g",   \
                   #a, a_, b_, t_);                                                                \
    } while (0)
#define CHECK_INT(a, b)                                                                            \
    do {                                                                                           \
        long long a_ = (long long)(a), b_ = (long long)(b);                                        \
        test_check(a_ == b_, __FILE__, __LINE__, "%s = %lld, expected %lld", #a, a_, b_);          \
    } while (0)
#define CHECK_TEXT(a, b)                                                                           \
    do {                                                                                           \
        const char *a_ = (a), *b_ = (b);                                                           \
        test_check(strcmp(a_, b_) == 0, __FILE__, __LINE__, "%s = \"%s\", expected \"%s\"", #a,    \
                   a_, b_);                                                                        \
    } while (0)

#endif
