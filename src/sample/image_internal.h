/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Between the readers of image formats. */
#ifndef SELVEDGE_IMAGE_INTERNAL_H
#define SELVEDGE_IMAGE_INTERNAL_H

#include "sample_internal.h"

/* A file in memory with a reading position. */
typedef struct sv_image_source {
    const unsigned char *data;
    size_t size, at;
} sv_image_source;

/* Fills the fault and returns SV_INVALID_INPUT. `offset`: byte of the file, −1: not known. */
sv_status sv_image_fail(sv_context *context, sv_table_fault *fault, long long offset,
                        const char *hint, const char *format, ...) SV_PRINTF(5, 6);
/* Refuses what is empty or too large, before anything is taken for it. */
sv_status sv_image_check_size(sv_context *context, sv_table_fault *fault, double width,
                              double height);
sv_status sv_image_read_png(sv_context *context, sv_image_source *source, sv_grey *ret_grey,
                            sv_table_fault *ret_fault);
sv_status sv_image_read_tiff(sv_context *context, sv_image_source *source, sv_grey *ret_grey,
                             sv_table_fault *ret_fault);

#endif
