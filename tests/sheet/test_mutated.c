/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Sheets with random damage: read or refused with a message, nothing else, nothing left behind. */
#include "sheet_testing.h"

static const char SEED[] =
    "selvedge: 1\ntitle: \"a \\\"b\\\"\"\n"
    "model:\n  name: custom\n  lattice_constant: 0.5 nm\n  vectors: [[1, 0], [0, 1]]\n"
    "  orbitals: [{name: a, at: [0, 0]}, &b {name: b, at: [0.5, 0]}]\n"
    "  onsite: {b: 0.25 eV}\n"
    "  hops:\n    - {from: a, to: b, shift: [0, 1], amplitude: [0.5, 0.2]}\n"
    "flake: {shape: rectangle, cells: [4, 4], boundary: [open, periodic]}\n"
    "disorder:\n"
    "  - {name: vac, kind: vacancies, share: 0.1}\n"
    "  - name: pot\n    kind: onsite\n    distribution: box\n    width: 1.5\n"
    "occupation: {filling: 50 %}\n"
    "markers: {local_chern: {window: 0.5}, probe: {levels: [1, 2]}}\n"
    "ensemble: {stop: {standard_error: 0.1, of: probe}}\n"
    "sweep: [{parameter: disorder.vac.share, from: 0, to: 0.2, steps: 3}]\n";

static const char *const PIECES[] = {
    "[",    "]",      "{",  "}",       ": ",    "- ",   "\n",
    "  ",   "&x ",    "*x", "*b",      "<<: ",  "!!t ", "\"",
    "'",    "null",   "~",  "-1",      "1e400", "% ",   "eV",
    " nm",  "0",      "#",  "\xC3",    "---\n", "? ",   ", ",
    "vac.", "auto",   "\t", "name",    "share", "|\n",  "\xE2\x80\xA8",
    "0.0",  "kind: ", "on", "sweep: ", "1e-320"};

/* A random number below n; `counter` is the draw. */
static uint32_t draw(uint32_t round, uint32_t *counter, uint32_t n)
{
    uint32_t key[2] = {20, round}, block[4] = {(*counter)++, 0, 0, 0}, output[4];
    sv_philox(block, key, output);
    return output[0] % n;
}

static void damage(char *text, size_t size, uint32_t round)
{
    uint32_t counter = 0;
    strcpy(text, SEED);
    for (uint32_t k = 1 + draw(round, &counter, 4); k > 0; k--) {
        size_t length = strlen(text);
        size_t at = draw(round, &counter, (uint32_t)length);
        size_t gone = draw(round, &counter, 3) == 0 ? draw(round, &counter, 20) : 0;
        const char *piece = PIECES[draw(round, &counter, sizeof PIECES / sizeof PIECES[0])];
        if (gone > length - at)
            gone = length - at;
        char rest[2000];
        strcpy(rest, text + at + gone);
        snprintf(text + at, size - at, "%s%s", piece, rest);
    }
}

SV_TEST(damaged_sheets_are_read_or_refused)
{
    const char *multiplier = getenv("SV_TEST_MULTIPLIER");
    uint32_t rounds = 400U * (multiplier != NULL ? (uint32_t)atoi(multiplier) : 1U);
    uint32_t n_read = 0;
    for (uint32_t round = 0; round < rounds; round++) {
        char text[3000];
        damage(text, sizeof text, round);
        reading r = read_text(text);
        bool good = r.status == SV_OK || (r.status == SV_INVALID_INPUT && r.said.errors > 0);
        test_check(good, __FILE__, __LINE__, "round %u gave %d:\n%s", round, r.status, text);
        if (r.status == SV_OK) {
            reading again = read_text(r.setup.resolved);
            test_check(again.status == SV_OK && strcmp(again.setup.identity, r.setup.identity) == 0,
                       __FILE__, __LINE__, "round %u does not read back:\n%s", round, text);
            reading_free(&again);
            n_read++;
        }
        reading_free(&r);
    }
    CHECK(n_read > 0 && n_read < rounds);
}
