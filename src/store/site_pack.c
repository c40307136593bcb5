/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Values and sums of the maps as bytes, little end first. */
#include "store_internal.h"

static void write_bytes(unsigned char *bytes, sv_wide value, int size)
{
    for (int i = 0; i < size; i++)
        bytes[i] = (unsigned char)(value >> (8 * i));
}

static sv_wide read_bytes(const unsigned char *bytes, int size)
{
    sv_wide value = (signed char)bytes[size - 1];
    for (int i = size - 2; i >= 0; i--)
        value = value * 256 + bytes[i];
    return value;
}

void sv_site_pack_values(const sv_site_record *record, unsigned char *bytes)
{
    for (sv_index k = 0; k < record->n; k++)
        write_bytes(bytes + 8 * k, record->values[k], 8);
}

/* Counts of 4 bytes, sums and squares of 16. */
void sv_site_pack_sums(const sv_site_sum *sum, unsigned char *bytes)
{
    for (sv_index k = 0; k < sum->n; k++) {
        unsigned char *entry = bytes + k * SV_SITE_SUM_BYTES;
        write_bytes(entry, sum->count[k], 4);
        write_bytes(entry + 4, sum->sum[k], 16);
        write_bytes(entry + 20, sum->square[k], 16);
    }
}

bool sv_site_unpack_values(const unsigned char *bytes, size_t size, sv_site_sum *sum)
{
    const int64_t largest = INT64_C(1) << (SV_SITE_BITS + 12);
    if (size == 0)
        return true;
    if (size != (size_t)sum->n * 8)
        return false;
    for (sv_index k = 0; k < sum->n; k++) {
        const sv_wide value = read_bytes(bytes + 8 * k, 8);
        if (value == SV_SITE_ABSENT)
            continue;
        if (value >= largest || value <= -largest)
            return false;
        sum->count[k]++;
        sum->sum[k] += value;
        sum->square[k] += value * value;
    }
    return true;
}

/* A count that is too large, or sums no values could have, would not stay within 128 bits. */
bool sv_site_unpack_sums(const unsigned char *bytes, size_t size, int64_t most, sv_site_sum *sum)
{
    const sv_wide largest = (sv_wide)1 << (SV_SITE_BITS + 12);
    if (size == 0)
        return true;
    if (size != (size_t)sum->n * SV_SITE_SUM_BYTES)
        return false;
    for (sv_index k = 0; k < sum->n; k++) {
        const unsigned char *entry = bytes + k * SV_SITE_SUM_BYTES;
        const sv_wide count = read_bytes(entry, 4), value = read_bytes(entry + 4, 16);
        const sv_wide square = read_bytes(entry + 20, 16);
        if (count < 0 || count > most || value > count * largest || value < -count * largest ||
            square < 0 || square > count * largest * largest)
            return false;
        sum->count[k] += (int64_t)count;
        sum->sum[k] += value;
        sum->square[k] += square;
    }
    return true;
}
