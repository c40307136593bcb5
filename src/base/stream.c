/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Counter-based random numbers: Salmon, Moraes, Dror, Shaw, SC'11, doi:10.1145/2063384.2063405. */
#include "selvedge/base.h"

#include <gsl/gsl_cdf.h>

#pragma GCC diagnostic push
#pragma GCC diagnostic ignored "-Wconversion"
#pragma GCC diagnostic ignored "-Wpedantic"
#pragma GCC diagnostic ignored "-Wcast-qual"
#include <Random123/philox.h>
#pragma GCC diagnostic pop

void sv_philox(const uint32_t counter[4], const uint32_t key[2], uint32_t output[4])
{
    philox4x32_ctr_t c = {{counter[0], counter[1], counter[2], counter[3]}};
    philox4x32_key_t k = {{key[0], key[1]}};
    philox4x32_ctr_t r = philox4x32(c, k);
    for (int i = 0; i < 4; i++)
        output[i] = r.v[i];
}

/* FNV-1a, 32 bits: a fixed public hash, so that a purpose keeps its stream for ever. */
static uint32_t hash_text(const char *text)
{
    uint32_t hash = 2166136261u;
    for (; *text != '\0'; text++)
        hash = (hash ^ (uint8_t)*text) * 16777619u;
    return hash;
}

sv_stream sv_stream_make(uint64_t seed, const char *purpose, sv_index realisation)
{
    return (sv_stream){(uint32_t)seed, hash_text(purpose), (uint32_t)realisation};
}

double sv_stream_uniform(const sv_stream *stream, int32_t cell_i, int32_t cell_j, uint32_t slot)
{
    const uint32_t counter[4] = {(uint32_t)cell_i, (uint32_t)cell_j, stream->realisation, slot};
    const uint32_t key[2] = {stream->seed, stream->purpose};
    uint32_t word[4];
    sv_philox(counter, key, word);
    /* 52 bits, moved by half a step away from both ends: exact in double, never 0 or 1. */
    uint64_t bits = ((uint64_t)word[0] << 20) | (word[1] >> 12);
    return ((double)bits + 0.5) * 0x1p-52;
}

double sv_stream_normal(const sv_stream *stream, int32_t cell_i, int32_t cell_j, uint32_t slot)
{
    return gsl_cdf_ugaussian_Pinv(sv_stream_uniform(stream, cell_i, cell_j, slot));
}
