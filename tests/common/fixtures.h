/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Models, flakes and samples for tests, made through the public API. */
#ifndef SELVEDGE_FIXTURES_H
#define SELVEDGE_FIXTURES_H

#include "selvedge/marker.h"
#include "testing.h"

/* Named model with the values of its keys in order (pairs take two numbers). */
sv_model fixture_model(const char *name, const double *values);
sv_model fixture_qi_wu_zhang(double m);
sv_model fixture_haldane(double t2, double phi, double mass);
sv_model fixture_hofstadter(int p, int q);

/* n1×n2 cells (rectangle for orthogonal vectors, else parallelogram), open or closed. */
sv_flake_spec fixture_cells(const sv_model *model, int n1, int n2, bool periodic);
sv_flake fixture_flake(const sv_model *model, const sv_flake_spec *spec);

/* Clean or disordered sample, projector, and one marker of it, in one go. */
sv_outcome fixture_marker(const char *marker, const sv_model *model, const sv_flake_spec *spec,
                          const sv_disorder *disorder, int n_disorder, uint64_t seed,
                          const sv_occupation *occupation, double window);

/* Marker per site of the open flake; the caller gives the array back with sv_give(). */
double *fixture_site_markers(const sv_flake *flake, const sv_disorder *disorder, int n_disorder,
                             sv_outcome *ret_outcome);

/* Eigenvalues, ascending; give back with sv_give(). */
double *fixture_spectrum(const sv_sample *sample);

/* Rows of the largest piece that nonzero elements connect. */
sv_index fixture_largest_piece(const sv_sample *sample);

/* Occupation below E = 0. */
extern const sv_occupation fixture_below_zero;

/* Link-variable Chern number of the lowest `bands` bands on a grid×grid mesh of the Brillouin zone,
 * in the library's sign convention (Fukui, Hatsugai, Suzuki, J. Phys. Soc. Jpn. 74, 1674 (2005)),
 * from the model's own hops. A model with flux p/q is unfolded to q cells along a1. */
int fixture_link_chern(const sv_model *model, int bands, int grid);

#endif
