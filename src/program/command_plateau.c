/* SPDX-License-Identifier: GPL-3.0-or-later */
/* selvedge plateau: a marker against the Fermi energy and temperature. The energies are a sweep of
 * occupation.fermi_energy over the same samples; the ensemble is computed as any other. */
#include "program_internal.h"

#include <math.h>
#include <string.h>

/* All numbers of a result, in memory of their own. */
typedef struct numbers {
    double *energies, *values, *mean, *error, *weights, *thermal, *thermal_error, *widths;
    double *density_energies, *density;
    sv_index n_density;
} numbers;

static void numbers_free(sv_context *context, numbers *d)
{
    double *all[] = {d->energies,         d->values,  d->mean,          d->error,
                     d->weights,          d->thermal, d->thermal_error, d->widths,
                     d->density_energies, d->density};
    for (size_t k = 0; k < sizeof all / sizeof all[0]; k++)
        sv_give(context, all[k]);
    *d = (numbers){0};
}

static sv_status numbers_take(sv_context *context, int64_t n, int64_t realisations,
                              int temperatures, numbers *d)
{
    struct {
        int64_t size;
        double **place;
    } rows[] = {{n, &d->energies},
                {n * realisations, &d->values},
                {n, &d->mean},
                {n, &d->error},
                {n, &d->weights},
                {n * temperatures, &d->thermal},
                {n * temperatures, &d->thermal_error},
                {temperatures, &d->widths}};
    sv_status status = SV_OK;
    for (size_t k = 0; k < sizeof rows / sizeof rows[0] && status == SV_OK; k++)
        status = sv_take(context, rows[k].size, sizeof(double), rows[k].place);
    return status;
}

/* Realisations that all energies have: the same samples everywhere. */
static int64_t common_realisations(const sv_ensemble *ensemble, const sv_stop_rule *stop)
{
    int64_t least = ensemble->realisations;
    for (int32_t p = 0; p < ensemble->n_points; p++) {
        bool settled;
        int64_t there = sv_ensemble_counted(ensemble, p, stop, &settled);
        least = there < least ? there : least;
    }
    return least;
}

static void gather(const session *s, const sv_ensemble *ensemble, numbers *d,
                   sv_plateau_result *result)
{
    const int marker = s->base.plateau.marker;
    for (int64_t k = 0; k < result->n; k++)
        d->energies[k] = s->points[k].setup.occupation.fermi_energy;
    for (int64_t r = 0; r < result->realisations; r++)
        for (int64_t k = 0; k < result->n; k++) {
            const sv_kept_outcome *o = sv_ensemble_outcome(ensemble, (int32_t)k, r, marker);
            bool resolved = o != NULL && o->verdict == SV_RESOLVED;
            d->values[r * result->n + k] = resolved ? o->value : (double)NAN;
            result->unresolved += !resolved;
        }
}

/* Mean and standard error of Σ_k w_k v_k over the realisations in which all v_k count are there. */
static void weighted_moments(const numbers *d, const sv_plateau_result *result,
                             const double *weights, double *ret_mean, double *ret_error)
{
    double sum = 0.0, squares = 0.0;
    int64_t count = 0;
    for (int pass = 0; pass < 2; pass++)
        for (int64_t r = 0; r < result->realisations; r++) {
            double v = 0.0;
            for (int64_t k = 0; k < result->n; k++)
                if (weights[k] != 0.0)
                    v += weights[k] * d->values[r * result->n + k];
            if (isnan(v))
                continue;
            if (pass == 0) {
                sum += v;
                count++;
            } else {
                squares += (v - sum / (double)count) * (v - sum / (double)count);
            }
        }
    *ret_mean = count > 0 ? sum / (double)count : (double)NAN;
    *ret_error = count > 1 ? sqrt(squares / (double)(count - 1) / (double)count) : (double)NAN;
}

static void thermal_means(const session *s, numbers *d, sv_plateau_result *result)
{
    const sv_sheet_plateau *asked = &s->base.plateau;
    for (int t = -1; t < asked->n_temperatures; t++)
        for (int64_t k = 0; k < result->n; k++) {
            double kt = t < 0 ? 0.0 : SV_BOLTZMANN_EV * asked->kelvin[t];
            double *mean = t < 0 ? &d->mean[k] : &d->thermal[t * result->n + k];
            double *error = t < 0 ? &d->error[k] : &d->thermal_error[t * result->n + k];
            if (kt > 0.0)
                kt /= s->base.energy_unit;
            *mean = *error = NAN;
            if (sv_thermal_weights(d->energies, result->n, kt, k, d->weights))
                weighted_moments(d, result, d->weights, mean, error);
        }
}

/* The window of one curve: a single made-up realisation whose values are the means. */
static sv_status width_of(session *s, const sv_plateau_input *in, const double *curve,
                          double *ret_width)
{
    sv_plateau_input one = *in;
    sv_plateau plateau = {0};
    one.values = curve;
    one.realisations = 1;
    sv_status status = sv_plateau_measure(s->context, &one, &plateau);
    *ret_width =
        plateau.exists && !plateau.open[0] && !plateau.open[1] ? plateau.width : (double)NAN;
    return status;
}

static sv_status measure(session *s, numbers *d, sv_plateau_result *result)
{
    sv_plateau_input in = {.energies = d->energies,
                           .n = result->n,
                           .values = d->values,
                           .realisations = result->realisations,
                           .clean = result->clean,
                           .within = result->within,
                           .about = s->base.occupation.fermi_energy,
                           .confidence = result->confidence,
                           .seed = s->base.seed};
    sv_status status = sv_plateau_measure(s->context, &in, &result->plateau);
    for (int t = 0; t < result->n_temperatures && status == SV_OK; t++)
        status = width_of(s, &in, &d->thermal[t * result->n], &d->widths[t]);
    return status;
}

/* The marker of the flake without disorder at the Fermi energy of the sheet. */
static sv_status clean_value(session *s, double *ret_clean)
{
    sv_case problem = s->points[0].problem;
    sv_record record = {0};
    sv_plan plan;
    const int marker = s->base.plateau.marker;
    problem.disorder = NULL;
    problem.n_disorder = 0;
    problem.occupation = s->base.occupation;
    problem.solve.engine = SV_ENGINE_AUTO;
    sv_status status = sv_case_plan(s->context, &problem, false, s->base.sampling_error, &plan);
    if (status == SV_OK)
        status = sv_realise(s->context, &problem, 0, NULL, NULL, &record);
    if (status == SV_OK && record.outcomes[marker].verdict != SV_RESOLVED)
        status = SV_FAIL(s->context, SV_UNDECIDED,
                         "without disorder the marker is not resolved at the Fermi energy of the "
                         "sheet: %s",
                         record.outcomes[marker].reason);
    if (status == SV_OK)
        *ret_clean = record.outcomes[marker].value;
    return status;
}

/* Density of states of realisation 0, as a backdrop. */
static sv_status density(session *s, numbers *d)
{
    sv_spectrum_options wanted = sv_spectrum_options_default();
    sv_sample sample = {0};
    sv_spectrum spectrum = {0};
    const sv_case *problem = &s->points[0].problem;
    wanted.seed = s->base.seed;
    sv_status status = sv_sample_draw(s->context, problem->open_flake, problem->disorder,
                                      problem->n_disorder, problem->seed, 0, &sample);
    if (status == SV_OK)
        status = sv_spectrum_make(s->context, &sample, &s->base.occupation, &wanted, &spectrum);
    if (status == SV_OK) {
        d->n_density = spectrum.n_density;
        d->density_energies = spectrum.energies;
        d->density = spectrum.density;
        spectrum.energies = spectrum.density = NULL;
        spectrum.n_density = 0;
    }
    sv_spectrum_free(s->context, &spectrum);
    sv_sample_free(s->context, &sample);
    return status;
}

static sv_status show(session *s, sv_run *run, const sv_plateau_result *result)
{
    char *json = NULL, *csv = NULL, folder[1024];
    sv_figure_files files;
    sv_status status = sv_plateau_json(s->context, result, &json);
    if (status == SV_OK)
        status = sv_plateau_csv(s->context, result, &csv);
    if (status == SV_OK)
        status = run_folder_put_text(s, run, "points.csv", csv);
    if (status == SV_OK)
        status = run_folder_put_text(s, run, "summary.json", json);
    if (status == SV_OK && s->options->json)
        fputs(json, stdout);
    else if (status == SV_OK)
        sv_plateau_print(result, stdout);
    if (status == SV_OK)
        status = sv_run_path(s->context, run, "figures", folder, sizeof folder);
    if (status == SV_OK)
        status = sv_figure_plateau(s->context, folder, "plateau", result, &files);
    if (status == SV_OK && !s->options->json)
        printf(files.drawn ? "\nfigure: %s (and .pdf, .png)\n" : "\nfigure not drawn: %s\n",
               files.drawn ? files.svg : files.reason);
    sv_give(s->context, json);
    sv_give(s->context, csv);
    return status;
}

static sv_status conclude(session *s, sv_run *run, const sv_ensemble *ensemble, double seconds)
{
    const sv_sheet_plateau *asked = &s->base.plateau;
    const sv_stop_rule stop = session_stop_rule(s);
    numbers d = {0};
    sv_plateau_result result = {.title = s->base.title,
                                .marker = s->markers[s->base.markers[asked->marker].kind].name,
                                .within = asked->within,
                                .confidence = 0.95,
                                .energy_unit = s->base.energy_unit,
                                .n = s->n_points,
                                .realisations = common_realisations(ensemble, &stop),
                                .kelvin = asked->kelvin,
                                .n_temperatures = asked->n_temperatures,
                                .seconds = seconds};
    if (result.realisations == 0)
        return SV_OK; /* stopped before all energies had one */
    sv_status status =
        numbers_take(s->context, result.n, result.realisations, result.n_temperatures, &d);
    if (status == SV_OK)
        status = clean_value(s, &result.clean);
    if (status == SV_OK) {
        gather(s, ensemble, &d, &result);
        thermal_means(s, &d, &result);
        status = measure(s, &d, &result);
    }
    if (status == SV_OK)
        status = density(s, &d);
    if (status == SV_OK) {
        result.energies = d.energies;
        result.mean = d.mean;
        result.standard_error = d.error;
        result.thermal = d.thermal;
        result.thermal_error = d.thermal_error;
        result.thermal_width = d.widths;
        result.density_energies = d.density_energies;
        result.density = d.density;
        result.n_density = d.n_density;
        status = show(s, run, &result);
    }
    if (status == SV_OK && !result.plateau.exists)
        status = SV_FAIL(s->context, SV_UNDECIDED,
                         "no plateau: at the Fermi energy of the sheet the mean is not within %.3g "
                         "of %.4g",
                         result.within, result.clean);
    numbers_free(s->context, &d);
    return status;
}

/* What the sheet must say, and the sweep it stands for. */
static sv_status make_sweep(session *s, char *sweep, size_t size)
{
    const sv_sheet_plateau *asked = &s->base.plateau;
    if (!s->base.has_plateau)
        return session_blame(s, "",
                             SV_FAIL(s->context, SV_INVALID_INPUT,
                                     "the sheet has no block `plateau` with the energies wanted"));
    if (s->base.n_axes > 0)
        return session_blame(
            s, "sweep",
            SV_FAIL(s->context, SV_INVALID_INPUT,
                    "plateau sweeps the Fermi energy itself: leave out the sweep"));
    if (s->base.occupation.by != SV_BY_ENERGY)
        return session_blame(
            s, "occupation",
            SV_FAIL(s->context, SV_INVALID_INPUT,
                    "plateau varies the Fermi energy: give occupation.fermi_energy, "
                    "inside the plateau looked for"));
    snprintf(sweep, size,
             "sweep=[{parameter: occupation.fermi_energy, from: %.17g, to: %.17g, steps: %lld}]",
             asked->energies[0], asked->energies[1], (long long)asked->points);
    return SV_OK;
}

int run_plateau(sv_context *context, const options *o)
{
    session s = {0};
    options with_sweep = *o;
    char sweep[200];
    if (o->output == NULL) {
        fprintf(stderr, "selvedge: error: plateau needs a run folder\nhint: give -o RUN\n");
        return sv_status_exit_code(SV_USAGE);
    }
    sv_status status = session_open(context, o, o->files[0], false, false, &s);
    if (status == SV_OK)
        status = make_sweep(&s, sweep, sizeof sweep);
    session_close(&s);
    if (status != SV_OK)
        return fail_exit(context, status);
    if (with_sweep.n_overrides == MOST_OVERRIDES) {
        fprintf(stderr, "selvedge: error: too many --set\n");
        return sv_status_exit_code(SV_USAGE);
    }
    with_sweep.overrides[with_sweep.n_overrides++] = sweep;
    return average_and_conclude(context, &with_sweep, conclude);
}
