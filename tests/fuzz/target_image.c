/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Images from elsewhere: PNG and TIFF. */
#include "fuzz.h"

#include <math.h>

#include "selvedge/sample.h"

static uint32_t big_endian(const uint8_t *at)
{
    return (uint32_t)at[0] << 24 | (uint32_t)at[1] << 16 | (uint32_t)at[2] << 8 | at[3];
}

/* ISO/IEC 15948, annex D, bit by bit. */
static uint32_t check_sum(const uint8_t *data, size_t size)
{
    uint32_t c = UINT32_MAX;
    for (size_t i = 0; i < size; i++) {
        c ^= data[i];
        for (int bit = 0; bit < 8; bit++)
            c = (c & 1) != 0 ? UINT32_C(0xedb88320) ^ c >> 1 : c >> 1;
    }
    return ~c;
}

/* A PNG with wrong check sums would be refused before anything is looked at. */
size_t LLVMFuzzerCustomMutator(uint8_t *data, size_t size, size_t most, unsigned seed)
{
    size = LLVMFuzzerMutate(data, size, most);
    if (size < 8 || data[0] != 0x89 || seed % 16 == 0)
        return size;
    for (size_t at = 8; at + 12 <= size;) {
        const size_t length = big_endian(data + at);
        if (length > size - at - 12)
            break;
        const uint32_t sum = check_sum(data + at + 4, length + 4);
        for (int k = 0; k < 4; k++)
            data[at + 8 + length + (size_t)k] = (uint8_t)(sum >> (24 - 8 * k));
        at += length + 12;
    }
    return size;
}

int LLVMFuzzerTestOneInput(const uint8_t *data, size_t size)
{
    sv_context *context = fuzz_begin();
    sv_grey grey = {0};
    sv_table_fault fault = {0};
    const sv_status status = sv_image_read(context, data, size, &grey, &fault);
    fuzz_require_answer(status);
    fuzz_require(status != SV_INVALID_INPUT || fault.message[0] != '\0', "a fault without a word");
    if (status == SV_OK) {
        fuzz_require(grey.width > 0 && grey.height > 0, "an image of %d x %d", grey.width,
                     grey.height);
        for (sv_index k = 0; k < (sv_index)grey.width * grey.height; k++)
            fuzz_require(grey.value[k] >= 0.0F && grey.value[k] <= 1.0F, "a grey of %g",
                         (double)grey.value[k]);
        const sv_grid grid = sv_grid_of_grey(&grey, 0.3, -1.0, 1.0);
        for (double x = -0.2; x < 3.0; x += 0.17) {
            double value = 0.0;
            const double at[2] = {x, 0.9 * x};
            if (sv_grid_at(&grid, at, &value))
                fuzz_require(fabs(value) <= 1.0, "the value %g between -1 and 1", value);
        }
    }
    sv_grey_free(context, &grey);
    fuzz_end();
    return 0;
}
