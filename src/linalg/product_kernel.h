/* SPDX-License-Identifier: GPL-3.0-or-later */
/* What the copies of kernels/product.c are made of, in double and, with SV_PRODUCT_SINGLE, in
 * single precision. */
#ifndef SELVEDGE_PRODUCT_KERNEL_H
#define SELVEDGE_PRODUCT_KERNEL_H

#include "linalg_internal.h"

#ifdef SV_PRODUCT_SINGLE
typedef float real;
#define PRODUCT_JOB    sv_product_single_job
#define PRODUCT_FACTOR sv_factor_single
#else
typedef double real;
#define PRODUCT_JOB    sv_product_job
#define PRODUCT_FACTOR sv_factor
#endif

/* Terms packed at a time; rows of a so packed stay in the second cache, a tile of them and the
 * columns beside it in the first. Columns of b are limited only to bound the room. */
enum {
    SV_PRODUCT_TERMS = 256,
    SV_PRODUCT_ROWS = 768 / sizeof(real),
    SV_PRODUCT_COLUMNS = 3840 / sizeof(real)
};

#endif
