/* SPDX-License-Identifier: GPL-3.0-or-later */
/* A marker against the Fermi energy, as JSON, CSV and plain words. */
#include <math.h>
#include <stdio.h>

#include "present_internal.h"

static json_t *numbers(sv_json *json, const double *values, int64_t n)
{
    json_t *array = json_array();
    for (int64_t k = 0; k < n; k++)
        sv_json_push(json, array, sv_json_real(values[k]));
    return array;
}

static json_t *make_window(sv_json *json, const sv_plateau_result *result)
{
    const sv_plateau *p = &result->plateau;
    json_t *object = json_object(), *open = json_array();
    sv_json_put_real(json, object, "width", p->width);
    sv_json_put(json, object, "interval",
                isfinite(p->interval[0]) ? sv_json_pair(json, p->interval) : json_null());
    sv_json_put_real(json, object, "confidence", result->confidence);
    sv_json_put_real(json, object, "centre", p->centre);
    sv_json_put(json, object, "edges", p->exists ? sv_json_pair(json, p->edges) : json_null());
    for (int k = 0; k < 2; k++)
        sv_json_push(json, open, json_boolean(p->open[k]));
    sv_json_put(json, object, "beyond_range", open);
    if (result->energy_unit > 0.0)
        sv_json_put_real(json, object, "width_meV", 1e3 * result->energy_unit * p->width);
    if (!p->exists)
        sv_json_put_text(json, object, "reason",
                         "at the Fermi energy of the sheet the mean is outside the band");
    return object;
}

static json_t *make_temperature(sv_json *json, const sv_plateau_result *result, int t)
{
    json_t *object = json_object();
    sv_json_put_real(json, object, "kelvin", result->kelvin[t]);
    if (result->energy_unit > 0.0)
        sv_json_put_real(json, object, "kT_meV", 1e3 * SV_BOLTZMANN_EV * result->kelvin[t]);
    sv_json_put(json, object, "mean", numbers(json, &result->thermal[t * result->n], result->n));
    sv_json_put(json, object, "standard_error",
                numbers(json, &result->thermal_error[t * result->n], result->n));
    sv_json_put(json, object, "plateau_width", sv_json_real(result->thermal_width[t]));
    return object;
}

sv_status sv_plateau_json(sv_context *context, const sv_plateau_result *result, char **ret_text)
{
    sv_json json = {.context = context};
    json_t *document = json_object(), *temperatures = json_array(), *timings = json_object();
    sv_json_put_integer(&json, document, "selvedge", 1);
    sv_json_put_text(&json, document, "command", "plateau");
    sv_json_put_text(&json, document, "title", result->title);
    sv_json_put_text(&json, document, "marker", result->marker);
    sv_json_put_real(&json, document, "clean", result->clean);
    sv_json_put_real(&json, document, "within", result->within);
    sv_json_put(&json, document, "plateau", make_window(&json, result));
    sv_json_put_integer(&json, document, "realisations", result->realisations);
    sv_json_put_integer(&json, document, "unresolved", result->unresolved);
    sv_json_put(&json, document, "energies", numbers(&json, result->energies, result->n));
    sv_json_put(&json, document, "mean", numbers(&json, result->mean, result->n));
    sv_json_put(&json, document, "standard_error",
                numbers(&json, result->standard_error, result->n));
    for (int t = 0; t < result->n_temperatures; t++)
        sv_json_push(&json, temperatures, make_temperature(&json, result, t));
    sv_json_put(&json, document, "temperatures", temperatures);
    sv_json_put_real(&json, timings, "seconds", result->seconds);
    sv_json_put(&json, document, "timings", timings);
    return sv_json_finish(&json, document, ret_text);
}

static void add_cell(sv_draft *text, double value)
{
    if (isfinite(value))
        sv_draft_add(text, ",%.10g", value);
    else
        sv_draft_add(text, ",");
}

sv_status sv_plateau_csv(sv_context *context, const sv_plateau_result *result, char **ret_text)
{
    sv_draft text = {.context = context};
    sv_draft_add(&text, "fermi_energy,mean,standard_error");
    for (int t = 0; t < result->n_temperatures; t++)
        sv_draft_add(&text, ",mean at %.6g K,standard_error at %.6g K", result->kelvin[t],
                     result->kelvin[t]);
    sv_draft_add(&text, "\n");
    for (int64_t k = 0; k < result->n; k++) {
        sv_draft_add(&text, "%.12g", result->energies[k]);
        add_cell(&text, result->mean[k]);
        add_cell(&text, result->standard_error[k]);
        for (int t = 0; t < result->n_temperatures; t++) {
            add_cell(&text, result->thermal[t * result->n + k]);
            add_cell(&text, result->thermal_error[t * result->n + k]);
        }
        sv_draft_add(&text, "\n");
    }
    return sv_draft_finish(&text, ret_text);
}

static void print_energy(const sv_plateau_result *result, double value, char *text, size_t size)
{
    if (result->energy_unit > 0.0)
        snprintf(text, size, "%.4g meV", 1e3 * result->energy_unit * value);
    else
        snprintf(text, size, "%.4g", value);
}

static void print_window(const sv_plateau_result *result, FILE *stream)
{
    const sv_plateau *p = &result->plateau;
    char width[48], low[48], high[48], from[48], to[48];
    print_energy(result, p->width, width, sizeof width);
    print_energy(result, p->interval[0], low, sizeof low);
    print_energy(result, p->interval[1], high, sizeof high);
    print_energy(result, p->edges[0], from, sizeof from);
    print_energy(result, p->edges[1], to, sizeof to);
    if (!p->exists) {
        fprintf(stream,
                "No plateau: at the Fermi energy of the sheet the mean is not within %.3g "
                "of %.4g.\n",
                result->within, result->clean);
        return;
    }
    fprintf(stream, "The mean stays within %.3g of %.4g from E_F = %s to %s:\n", result->within,
            result->clean, from, to);
    fprintf(stream, "a window of %s", width);
    if (isfinite(p->interval[0]))
        fprintf(stream, " (%.3g %% interval %s to %s)", 100.0 * result->confidence, low, high);
    fprintf(stream, "%s.\n",
            p->open[0] || p->open[1] ? ", at least: it reaches the end of the energies asked" : "");
}

void sv_plateau_print(const sv_plateau_result *result, FILE *stream)
{
    char title[400], width[48];
    sv_words_fit(result->title, 79, title, sizeof title);
    if (title[0] != '\0')
        fprintf(stream, "%s\n", title);
    fprintf(stream, "%s against the Fermi energy: %lld energies, %lld realisations\n\n",
            sv_words_marker(result->marker), (long long)result->n, (long long)result->realisations);
    print_window(result, stream);
    for (int t = 0; t < result->n_temperatures; t++) {
        print_energy(result, result->thermal_width[t], width, sizeof width);
        if (result->kelvin[t] > 0.0 && isfinite(result->thermal_width[t]))
            fprintf(stream, "At %.4g K (kT = %.3g meV) the window is %s.\n", result->kelvin[t],
                    1e3 * SV_BOLTZMANN_EV * result->kelvin[t], width);
        else if (result->kelvin[t] > 0.0)
            fprintf(stream,
                    "At %.4g K there is no window, or it is wider than the energies show.\n",
                    result->kelvin[t]);
    }
    if (result->unresolved > 0)
        fprintf(stream, "%lld of the values are unresolved and left out.\n",
                (long long)result->unresolved);
    fprintf(stream,
            "The chemical potential is held, not the density; temperature enters as the thermal\n"
            "mean over Fermi energies alone. A model, not a device: contacts, inelastic\n"
            "scattering and chemistry are left out, and the number releases nothing for use.\n");
}
