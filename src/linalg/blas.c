/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Which BLAS is loaded is only known at run time: it is asked through optional symbols. */
#include "selvedge/linalg.h"

#include <dlfcn.h>
#include <stdio.h>
#include <string.h>

#include <cblas.h>
#include <suitesparse/cholmod.h>

/* dlsym gives an object pointer; ISO C has no cast to a function pointer, memcpy does it. */
static bool find_function(const char *name, void *ret_function)
{
    void *symbol = dlsym(RTLD_DEFAULT, name);
    if (symbol == NULL)
        return false;
    memcpy(ret_function, &symbol, sizeof symbol);
    return true;
}

static void ask_threading(sv_blas_info *info)
{
    int (*get_parallel)(void) = NULL;
    if (!find_function("openblas_get_parallel", &get_parallel))
        return;
    const char *const names[] = {"serial", "pthread", "openmp"};
    int kind = get_parallel();
    if (kind < 0 || kind > 2)
        return;
    snprintf(info->threading, sizeof info->threading, "%s", names[kind]);
    /* The serial build of OpenBLAS keeps unlocked buffers: concurrent callers get wrong vectors
     * (https://github.com/OpenMathLib/OpenBLAS/issues/2126). */
    info->threads_safe = kind != 0;
}

/* "OpenBLAS 0.3.21 NO_LAPACKE DYNAMIC_ARCH …": the second word. */
static void ask_version(sv_blas_info *info)
{
    char *(*get_config)(void) = NULL;
    if (!find_function("openblas_get_config", &get_config))
        return;
    const char *word = strchr(get_config(), ' ');
    if (word != NULL)
        snprintf(info->version, sizeof info->version, "%.*s", (int)strcspn(word + 1, " "),
                 word + 1);
}

void sv_blas_setup(sv_blas_info *ret_info)
{
    sv_blas_info info = {.kind = "unknown",
                         .threading = "unknown",
                         .kernel = "unknown",
                         .version = "unknown",
                         .threads_safe = true};
    int cholmod[3] = {0};
    void (*set_threads)(int) = NULL;
    char *(*get_core)(void) = NULL;
    /* A reference to one BLAS routine keeps the library loaded whatever the linker drops. */
    (void)cblas_dznrm2(0, NULL, 1);
    if (find_function("openblas_set_num_threads", &set_threads)) {
        snprintf(info.kind, sizeof info.kind, "openblas");
        set_threads(1);
        ask_threading(&info);
        ask_version(&info);
    }
    if (find_function("openblas_get_corename", &get_core))
        snprintf(info.kernel, sizeof info.kernel, "%s", get_core());
    (void)cholmod_l_version(cholmod);
    snprintf(info.cholmod, sizeof info.cholmod, "%d.%d.%d", cholmod[0], cholmod[1], cholmod[2]);
    *ret_info = info;
}
