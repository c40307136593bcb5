/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Parts of the spectrum of a sample. */
#ifndef SELVEDGE_SPECTRUM_INTERNAL_H
#define SELVEDGE_SPECTRUM_INTERNAL_H

#include "selvedge/projector.h"

/* A spectrum while it is made. */
typedef struct spectrum_work {
    const sv_sample *sample;
    const sv_occupation *occupation;
    const sv_spectrum_options *options;
    double *values; /* all eigenvalues, or NULL */
    sv_spectrum out;
} spectrum_work;

/* spectrum_levels.c: occupation, nearest levels, near states. */
sv_status sv_spectrum_levels_exact(sv_context *context, spectrum_work *w);
sv_status sv_spectrum_levels_counted(sv_context *context, spectrum_work *w);

/* spectrum_states.c: fills out.near from eigenpairs (vectors n × count). */
sv_status sv_spectrum_describe_states(sv_context *context, spectrum_work *w, const double *energies,
                                      const sv_complex *vectors, int count);

#endif
