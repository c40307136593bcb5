/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Exports so that anyone can recompute a sample: Matrix Market and CSV. */
#include "selvedge/sample.h"

static sv_index stored_lower(const sv_sparse *h)
{
    sv_index count = 0;
    for (sv_index r = 0; r < h->n; r++)
        for (sv_index k = h->row_start[r]; k < h->row_start[r + 1]; k++)
            count += h->column[k] <= r;
    return count;
}

sv_status sv_sample_write_matrix(sv_context *context, const sv_sample *sample, const char *path)
{
    const sv_sparse *h = &sample->hamiltonian;
    sv_output output;
    sv_status status = sv_output_begin(context, path, &output);
    if (status != SV_OK)
        return status;
    fprintf(output.stream, "%%%%MatrixMarket matrix coordinate complex hermitian\n"
                           "%% Hamiltonian of one realisation; rows as in the list of sites\n");
    fprintf(output.stream, "%lld %lld %lld\n", (long long)h->n, (long long)h->n,
            (long long)stored_lower(h));
    for (sv_index r = 0; r < h->n; r++)
        for (sv_index k = h->row_start[r]; k < h->row_start[r + 1]; k++)
            if (h->column[k] <= r)
                fprintf(output.stream, "%lld %lld %.17g %.17g\n", (long long)r + 1,
                        (long long)h->column[k] + 1, creal(h->value[k]), cimag(h->value[k]));
    return sv_output_commit(context, &output);
}

const char *sv_sample_orbital_name(const sv_sample *sample, sv_index row)
{
    const sv_flake *flake = sample->flake;
    if (sample->adatom != NULL && sample->adatom[row] >= 0)
        return "adatom";
    return flake->model->orbitals[flake->sites[sample->pristine[row]].orbital].name;
}

sv_status sv_sample_write_sites(sv_context *context, const sv_sample *sample, const char *path,
                                const char *extra_name, const double *extra)
{
    const sv_flake *flake = sample->flake;
    sv_output output;
    sv_status status = sv_output_begin(context, path, &output);
    if (status != SV_OK)
        return status;
    fprintf(output.stream, "site,cell_i,cell_j,orbital,x,y%s%s\n", extra_name ? "," : "",
            extra_name ? extra_name : "");
    for (sv_index r = 0; r < sample->n; r++) {
        const sv_site *site = &flake->sites[sample->pristine[r]];
        const sv_cell *cell = &flake->cells[site->cell];
        char x[32], y[32], value[32];
        sv_format_real(site->at[0], x, sizeof x);
        sv_format_real(site->at[1], y, sizeof y);
        fprintf(output.stream, "%lld,%d,%d,%s,%s,%s", (long long)r, cell->i, cell->j,
                sv_sample_orbital_name(sample, r), x, y);
        if (extra_name != NULL) {
            sv_format_real(extra[r], value, sizeof value);
            fprintf(output.stream, ",%s", value);
        }
        fputc('\n', output.stream);
    }
    return sv_output_commit(context, &output);
}
