/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Complex products: room, and the choice among the copies of the kernel. */
#include "linalg_internal.h"

/* Bytes of the packed parts in both precisions; see product_kernel.h. */
enum { PACKED_BYTES = 3 * 256 * (768 + 3840) };

static sv_product_copy *const DOUBLE[] = {[SV_PANEL_PLAIN] = sv_product_double_plain,
                                          [SV_PANEL_AVX2] = sv_product_double_avx2,
                                          [SV_PANEL_AVX512] = sv_product_double_avx512};
static sv_product_single_copy *const SINGLE[] = {[SV_PANEL_PLAIN] = sv_product_single_plain,
                                                 [SV_PANEL_AVX2] = sv_product_single_avx2,
                                                 [SV_PANEL_AVX512] = sv_product_single_avx512};

sv_status sv_product(sv_context *context, sv_panel_kernel kernel, const sv_product_job *job)
{
    double *work = NULL;
    sv_status status = sv_take_raw(context, PACKED_BYTES, 1, &work);
    if (status == SV_OK)
        DOUBLE[kernel](job, work);
    sv_give(context, work);
    return status;
}

sv_status sv_product_single(sv_context *context, sv_panel_kernel kernel,
                            const sv_product_single_job *job)
{
    float *work = NULL;
    sv_status status = sv_take_raw(context, PACKED_BYTES, 1, &work);
    if (status == SV_OK)
        SINGLE[kernel](job, work);
    sv_give(context, work);
    return status;
}
