/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Texts of `--set`, one a line, on a sheet that has a bit of everything. */
#include "sheets.h"

enum { MOST_OVERRIDES = 6 };

static const char SHEET[] =
    "selvedge: 1\ntitle: overridden\n"
    "model: {name: haldane, t2: 0.2, phi: 90 deg, lattice_constant: 0.5 nm}\n"
    "flake: {shape: rectangle, size: [3, 3]}\n"
    "disorder:\n  - {name: vac, kind: vacancies, share: 0.1}\n"
    "  - {name: pot, kind: onsite, distribution: box, width: 1.5}\n"
    "markers: {local_chern: {window: 0.5}, localizer: {}}\n"
    "ensemble: {realisations: 4, stop: {standard_error: 0.1, of: local_chern}}\n"
    "sweep: [{parameter: disorder.vac.share, from: 0, to: 0.2, steps: 3}]\n";

int LLVMFuzzerTestOneInput(const uint8_t *data, size_t size)
{
    char text[4096];
    const char *overrides[MOST_OVERRIDES];
    int n = 0;
    if (size >= sizeof text)
        return 0;
    memcpy(text, data, size);
    text[size] = '\0';
    for (char *rest = text; rest != NULL && n < MOST_OVERRIDES;)
        overrides[n++] = strsep(&rest, "\n");
    sv_context *context = fuzz_begin();
    fuzz_reading r = fuzz_read_sheet(context, SHEET, strlen(SHEET), overrides, n);
    fuzz_check_words(&r.said);
    fuzz_reading_free(context, &r);
    fuzz_end();
    return 0;
}
