/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "fixtures.h"

#include <stdlib.h>

#define lapack_complex_double double _Complex
#define lapack_complex_float  float _Complex
#include <lapacke.h>

const sv_occupation fixture_below_zero = {.by = SV_BY_ENERGY, .fermi_energy = 0.0};

sv_model fixture_model(const char *name, const double *numbers)
{
    int count;
    const sv_kind *kinds = sv_model_kinds(&count);
    sv_model model = {0};
    for (int k = 0; k < count; k++) {
        if (strcmp(kinds[k].name, name) != 0)
            continue;
        sv_value values[16] = {{0}};
        for (int v = 0, at = 0; v < kinds[k].n_keys; v++) {
            values[v].present = true;
            if (kinds[k].keys[v].type == SV_KEY_INTEGER_PAIR) {
                values[v].integer[0] = (int64_t)numbers[at++];
                values[v].integer[1] = (int64_t)numbers[at++];
            } else {
                values[v].real[0] = numbers[at++];
            }
        }
        CHECK_OK(sv_model_make(test_context(), &kinds[k], values, &model));
    }
    return model;
}

sv_model fixture_qi_wu_zhang(double m)
{
    return fixture_model("qi_wu_zhang", (const double[]){m});
}

sv_model fixture_haldane(double t2, double phi, double mass)
{
    return fixture_model("haldane", (const double[]){1.0, t2, phi, mass});
}

sv_model fixture_hofstadter(int p, int q)
{
    return fixture_model("hofstadter", (const double[]){p, q});
}

sv_flake_spec fixture_cells(const sv_model *model, int n1, int n2, bool periodic)
{
    const double *a1 = model->vectors[0], *a2 = model->vectors[1];
    bool square = fabs(a1[0] * a2[0] + a1[1] * a2[1]) < 1e-9;
    return (sv_flake_spec){.shape = square ? SV_SHAPE_RECTANGLE : SV_SHAPE_PARALLELOGRAM,
                           .has_cells = true,
                           .cells = {n1, n2},
                           .periodic = {periodic, periodic}};
}

sv_flake fixture_flake(const sv_model *model, const sv_flake_spec *spec)
{
    sv_flake flake = {0};
    CHECK_OK(sv_flake_make(test_context(), model, spec, &flake));
    return flake;
}

sv_outcome fixture_marker(const char *name, const sv_model *model, const sv_flake_spec *spec,
                          const sv_disorder *disorder, int n_disorder, uint64_t seed,
                          const sv_occupation *occupation, double window)
{
    sv_context *context = test_context();
    sv_outcome outcome = sv_outcome_blank();
    const sv_marker *marker = &sv_marker_table(&(int){0})[sv_marker_find(name)];
    sv_flake flake = fixture_flake(model, spec);
    sv_sample sample = {0};
    sv_projector *projector = NULL;
    sv_projector_options options = sv_projector_options_default();
    options.occupied_basis = marker->needs_occupied_basis;
    CHECK_OK(sv_sample_draw(context, &flake, disorder, n_disorder, seed, 0, &sample));
    CHECK_OK(sv_projector_make(context, &sample, occupation, &options, &projector));
    sv_value values[16] = {{.present = true, .real = {window}}};
    sv_marker_input input = {
        .sample = &sample, .occupation = occupation, .projector = projector, .values = values};
    CHECK_OK(marker->compute(context, &input, &outcome));
    sv_projector_free(context, projector);
    sv_sample_free(context, &sample);
    sv_flake_free(context, &flake);
    return outcome;
}

double *fixture_site_markers(const sv_flake *flake, const sv_disorder *disorder, int n_disorder,
                             sv_outcome *ret_outcome)
{
    sv_context *context = test_context();
    sv_sample sample = {0};
    sv_projector *projector = NULL;
    sv_projector_options options = sv_projector_options_default();
    double *values = NULL;
    CHECK_OK(sv_sample_draw(context, flake, disorder, n_disorder, 1, 0, &sample));
    CHECK_OK(sv_projector_make(context, &sample, &fixture_below_zero, &options, &projector));
    CHECK_OK(sv_take(context, sample.n, sizeof *values, &values));
    sv_value keys[16] = {{.present = true, .real = {0.5}}};
    sv_marker_input input = {
        .sample = &sample, .projector = projector, .values = keys, .ret_site_values = values};
    CHECK_OK(sv_local_chern(context, &input, ret_outcome));
    sv_projector_free(context, projector);
    sv_sample_free(context, &sample);
    return values;
}

static void choose_none(const double *values, sv_index n, sv_index *first, sv_index *last,
                        void *user)
{
    (void)values, (void)n, (void)user;
    *first = *last = 0;
}

double *fixture_spectrum(const sv_sample *sample)
{
    sv_context *context = test_context();
    sv_index n = sample->n, first, last;
    sv_complex *a = NULL, *vectors = NULL;
    double *values = NULL;
    CHECK_OK(sv_take_raw(context, n * n, sizeof *a, &a));
    CHECK_OK(sv_take_raw(context, n, sizeof *values, &values));
    sv_sparse_to_dense(&sample->hamiltonian, a);
    CHECK_OK(sv_dense_eigen(context, n, a, values, choose_none, NULL, &first, &last, &vectors));
    sv_give(context, a);
    sv_give(context, vectors);
    return values;
}

sv_index fixture_largest_piece(const sv_sample *sample)
{
    const sv_sparse *h = &sample->hamiltonian;
    sv_index *next = malloc((size_t)sample->n * sizeof *next), largest = 0;
    bool *seen = calloc((size_t)sample->n, sizeof *seen);
    for (sv_index start = 0; start < sample->n; start++) {
        sv_index met = 0, done = 0;
        if (!seen[start])
            next[met++] = start;
        seen[start] = true;
        for (; done < met; done++)
            for (sv_index k = h->row_start[next[done]]; k < h->row_start[next[done] + 1]; k++)
                if (!seen[h->column[k]] && h->value[k] != 0.0) {
                    seen[h->column[k]] = true;
                    next[met++] = h->column[k];
                }
        largest = met > largest ? met : largest;
    }
    free(next);
    free(seen);
    return largest;
}

/* ---- link variables on the Brillouin zone ---- */

/* The model of q cells along a1 that a flux p/q makes periodic, in the gauge of conventions.h. */
static sv_model unfold(const sv_model *model)
{
    sv_context *context = test_context();
    int p = model->flux[0], q = p == 0 ? 1 : model->flux[1];
    const double *a1 = model->vectors[0], *a2 = model->vectors[1];
    sv_model wide = {0};
    char name[32];
    CHECK_OK(
        sv_model_begin(context, "unfolded", (const double[2]){q * a1[0], q * a1[1]}, a2, &wide));
    for (int i = 0; i < q; i++)
        for (int o = 0; o < model->n_orbitals; o++) {
            snprintf(name, sizeof name, "%.16s%d", model->orbitals[o].name, i);
            CHECK_OK(sv_model_add_orbital(
                context, &wide, name, model->orbitals[o].at[0] + i * a1[0],
                model->orbitals[o].at[1] + i * a1[1], model->orbitals[o].onsite));
        }
    for (int i = 0; i < q; i++)
        for (int h = 0; h < model->n_hops; h++) {
            const sv_hop *hop = &model->hops[h];
            double from[2], to[2];
            sv_model_reduce(model, model->orbitals[hop->from].at, from);
            sv_model_reduce(model, model->orbitals[hop->to].at, to);
            double u = i + 0.5 * (from[0] + to[0] + hop->shift[0]);
            double dv = to[1] + hop->shift[1] - from[1];
            int end = i + hop->shift[0];
            int turn = end >= 0 ? end / q : -((q - 1 - end) / q);
            /* Shifting by q cells multiplies states by exp(−2πi p v): a phase for fractional v. */
            double v = to[1] + hop->shift[1];
            double angle = 2.0 * M_PI * ((double)p / q * (-u * dv) + (double)p * turn * v);
            CHECK_OK(sv_model_add_hop(context, &wide, i * model->n_orbitals + hop->from,
                                      (end - turn * q) * model->n_orbitals + hop->to, turn,
                                      hop->shift[1],
                                      hop->amplitude * CMPLX(cos(angle), sin(angle))));
        }
    CHECK_OK(sv_model_finish(context, &wide));
    return wide;
}

static sv_complex determinant(sv_complex *a, int n)
{
    sv_complex det = 1.0;
    for (int c = 0; c < n; c++) {
        int pivot = c;
        for (int r = c + 1; r < n; r++)
            if (cabs(a[r + c * n]) > cabs(a[pivot + c * n]))
                pivot = r;
        if (pivot != c) {
            det = -det;
            for (int k = c; k < n; k++) {
                sv_complex t = a[c + k * n];
                a[c + k * n] = a[pivot + k * n];
                a[pivot + k * n] = t;
            }
        }
        det *= a[c + c * n];
        for (int r = c + 1; r < n; r++) {
            sv_complex f = a[r + c * n] / a[c + c * n];
            for (int k = c; k < n; k++)
                a[r + k * n] -= f * a[c + k * n];
        }
    }
    return det;
}

/* det ⟨u(k)|u(k')⟩ over the occupied bands. */
static sv_complex link(const sv_complex *left, const sv_complex *right, int n, int bands)
{
    sv_complex *m = calloc((size_t)bands * (size_t)bands, sizeof *m);
    for (int a = 0; a < bands; a++)
        for (int b = 0; b < bands; b++)
            for (int r = 0; r < n; r++)
                m[a + b * bands] += conj(left[r + a * n]) * right[r + b * n];
    sv_complex det = determinant(m, bands);
    free(m);
    return det;
}

int fixture_link_chern(const sv_model *model, int bands, int grid)
{
    sv_model wide = unfold(model);
    int n = wide.n_orbitals;
    size_t matrix = (size_t)n * (size_t)n;
    sv_complex *u = malloc(matrix * (size_t)(grid * grid) * sizeof *u);
    double *values = malloc((size_t)n * sizeof *values);
    for (int i = 0; i < grid; i++)
        for (int j = 0; j < grid; j++) {
            sv_complex *here = u + matrix * (size_t)(i * grid + j);
            sv_model_bloch(&wide, (const double[2]){2.0 * M_PI * i / grid, 2.0 * M_PI * j / grid},
                           here);
            int info = LAPACKE_zheev(LAPACK_COL_MAJOR, 'V', 'L', n, here, n, values);
            CHECK(info == 0);
        }
    double sum = 0.0;
    for (int i = 0; i < grid; i++)
        for (int j = 0; j < grid; j++) {
            int i1 = (i + 1) % grid, j1 = (j + 1) % grid;
            const sv_complex *a = u + matrix * (size_t)(i * grid + j);
            const sv_complex *b = u + matrix * (size_t)(i1 * grid + j);
            const sv_complex *c = u + matrix * (size_t)(i1 * grid + j1);
            const sv_complex *d = u + matrix * (size_t)(i * grid + j1);
            sum += carg(link(a, b, n, bands) * link(b, c, n, bands) * link(c, d, n, bands) *
                        link(d, a, n, bands));
        }
    free(u);
    free(values);
    sv_model_free(test_context(), &wide);
    /* ln U = ln⟨u(k)|u(k+dk)⟩ is −i A·dk with A = i⟨u|∂u⟩: hence the minus sign. */
    double chern = -sum / (2.0 * M_PI);
    CHECK_CLOSE(chern, round(chern), 1e-6);
    return (int)lround(chern);
}
