/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "testing.h"

/* Random123 1.14.0, tests/kat_vectors (Debian librandom123-doc), Philox4x32-10. */
SV_TEST(philox_known_answers)
{
    const struct {
        uint32_t counter[4], key[2], output[4];
    } rows[] = {
        {{0, 0, 0, 0}, {0, 0}, {0x6627e8d5, 0xe169c58d, 0xbc57ac4c, 0x9b00dbd8}},
        {{0xffffffff, 0xffffffff, 0xffffffff, 0xffffffff},
         {0xffffffff, 0xffffffff},
         {0x408f276d, 0x41c83b0e, 0xa20bc7c6, 0x6d5451fd}},
        {{0x243f6a88, 0x85a308d3, 0x13198a2e, 0x03707344},
         {0xa4093822, 0x299f31d0},
         {0xd16cfe09, 0x94fdcceb, 0x5001e420, 0x24126ea1}},
    };
    for (size_t k = 0; k < sizeof rows / sizeof rows[0]; k++) {
        uint32_t output[4];
        sv_philox(rows[k].counter, rows[k].key, output);
        CHECK(memcmp(output, rows[k].output, sizeof output) == 0);
    }
}

/* The layout of key and counter is a promise: the same sample for ever. */
SV_TEST(stream_layout_is_fixed)
{
    sv_stream stream = sv_stream_make(20, "vac", 7);
    uint32_t output[4];
    /* FNV-1a of "vac" computed by hand-checked recurrence: offset 2166136261, prime 16777619. */
    uint32_t hash = 2166136261u;
    for (const char *c = "vac"; *c; c++)
        hash = (hash ^ (uint8_t)*c) * 16777619u;
    sv_philox((const uint32_t[4]){3, (uint32_t)-2, 7, 1}, (const uint32_t[2]){20, hash}, output);
    uint64_t bits = ((uint64_t)output[0] << 20) | (output[1] >> 12);
    CHECK(sv_stream_uniform(&stream, 3, -2, 1) == ((double)bits + 0.5) / 4503599627370496.0);
}

SV_TEST(streams_of_other_purposes_differ)
{
    sv_stream a = sv_stream_make(1, "vac", 0), b = sv_stream_make(1, "pot", 0);
    sv_stream c = sv_stream_make(2, "vac", 0), d = sv_stream_make(1, "vac", 1);
    double u = sv_stream_uniform(&a, 0, 0, 0);
    CHECK(u != sv_stream_uniform(&b, 0, 0, 0));
    CHECK(u != sv_stream_uniform(&c, 0, 0, 0));
    CHECK(u != sv_stream_uniform(&d, 0, 0, 0));
    CHECK(u != sv_stream_uniform(&a, 1, 0, 0));
    CHECK(u != sv_stream_uniform(&a, 0, 1, 0));
    CHECK(u != sv_stream_uniform(&a, 0, 0, 1));
}

/* Binned counts of 10⁵ numbers: χ² of 99 degrees of freedom, five standard deviations. */
SV_TEST(uniform_and_normal_fill_their_bins)
{
    enum { BINS = 100, N = 100000 };
    int uniform[BINS] = {0};
    double sum = 0.0, squares = 0.0;
    sv_stream stream = sv_stream_make(11, "bins", 0);
    for (int k = 0; k < N; k++) {
        double u = sv_stream_uniform(&stream, k, 5, 0), g = sv_stream_normal(&stream, k, 6, 0);
        CHECK(u > 0.0 && u < 1.0);
        uniform[(int)(u * BINS)]++;
        sum += g;
        squares += g * g;
    }
    double chi = 0.0, expected = (double)N / BINS;
    for (int b = 0; b < BINS; b++)
        chi += (uniform[b] - expected) * (uniform[b] - expected) / expected;
    CHECK_CLOSE(chi, BINS - 1.0, 5.0 * sqrt(2.0 * (BINS - 1.0)));
    CHECK_CLOSE(sum / N, 0.0, 5.0 / sqrt(N));
    CHECK_CLOSE(squares / N, 1.0, 5.0 * sqrt(2.0 / N));
}
