/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Plateaus and their thermal rounding against closed forms. */
#include "selvedge/study.h"
#include "testing.h"

enum { N = 401 };

static void grid(double *energies, double low, double high)
{
    for (int k = 0; k < N; k++)
        energies[k] = low + (high - low) * k / (N - 1);
}

static double thermal_mean(const double *energies, const double *values, double kt, int at)
{
    double weights[N], sum = 0.0;
    CHECK(sv_thermal_weights(energies, N, kt, at, weights));
    for (int k = 0; k < N; k++)
        sum += weights[k] * values[k];
    return sum;
}

/* ∫ θ(E − E₀)(−∂f/∂E) dE = f(E₀ − μ): a step smears into the Fermi function itself. The step of the
 * grid is a straight rise over one spacing about E₀, which rounds it by (spacing/kT)²/24. */
SV_TEST(a_step_becomes_the_fermi_function)
{
    double energies[N], values[N];
    grid(energies, -1.0, 1.0);
    for (int k = 0; k < N; k++)
        values[k] = k > 200 ? 1.0 : 0.0;
    const double start = 0.5 * (energies[200] + energies[201]), kt = 0.03;
    for (int at = 110; at < 290; at += 15) {
        double expected = 1.0 / (1.0 + exp((start - energies[at]) / kt));
        CHECK_CLOSE(thermal_mean(energies, values, kt, at), expected, 2e-4);
    }
}

/* A straight line keeps its value, a parabola gains (π kT)²/3: the Sommerfeld integral. */
SV_TEST(moments_of_the_thermal_window)
{
    double energies[N], line[N], parabola[N];
    grid(energies, -1.0, 1.0);
    for (int k = 0; k < N; k++) {
        line[k] = 3.0 - 2.0 * energies[k];
        parabola[k] = energies[k] * energies[k];
    }
    const double kt = 0.05;
    CHECK_CLOSE(thermal_mean(energies, line, kt, 220), line[220], 1e-6);
    double step = energies[1] - energies[0];
    CHECK_CLOSE(thermal_mean(energies, parabola, kt, 200), M_PI * M_PI / 3.0 * kt * kt,
                step * step / 6.0 + 1e-6);
}

SV_TEST(no_temperature_is_exact_and_edges_are_refused)
{
    double energies[N], weights[N], values[N];
    grid(energies, -1.0, 1.0);
    for (int k = 0; k < N; k++)
        values[k] = sin(7.0 * k);
    CHECK_CLOSE(thermal_mean(energies, values, 0.0, 17), values[17], 0.0);
    CHECK(!sv_thermal_weights(energies, N, 0.05, 10, weights));
    CHECK(!sv_thermal_weights(energies, N, 0.05, 395, weights));
}

/* A made-up film: the marker is 1 between edges that scatter, with straight flanks of width 0.2. */
static void draw_film(double *values, int realisations, uint64_t seed, const double *energies)
{
    for (int r = 0; r < realisations; r++) {
        sv_stream stream = sv_stream_make(seed, "film", r);
        double low = -0.5 + 0.05 * sv_stream_normal(&stream, 0, 0, 0);
        double high = 0.4 + 0.05 * sv_stream_normal(&stream, 1, 0, 0);
        for (int k = 0; k < N; k++)
            values[r * N + k] = fmin(fmax((energies[k] - low) / 0.2 + 1.0, 0.0), 1.0) *
                                fmin(fmax((high - energies[k]) / 0.2 + 1.0, 0.0), 1.0);
    }
}

SV_TEST(the_window_and_its_interval)
{
    enum { R = 40, FILMS = 60 };
    static double energies[N], values[R * N], many[2000 * N];
    grid(energies, -1.0, 1.0);
    draw_film(many, 2000, 1, energies);
    sv_plateau_input input = {.energies = energies,
                              .n = N,
                              .values = many,
                              .realisations = 2000,
                              .clean = 1.0,
                              .within = 0.25,
                              .about = 0.0,
                              .confidence = 0.95,
                              .seed = 5};
    sv_plateau truth = {0};
    CHECK_OK(sv_plateau_measure(test_context(), &input, &truth));
    CHECK(truth.exists && !truth.open[0] && !truth.open[1]);
    /* both flanks fall to 0.75 at a quarter of their width */
    CHECK_CLOSE(truth.width, 0.9 + 2 * 0.05, 0.01);
    CHECK_CLOSE(truth.centre, -0.05, 0.01);
    int covered = 0;
    input.values = values;
    input.realisations = R;
    for (int f = 0; f < FILMS; f++) {
        sv_plateau plateau = {0};
        draw_film(values, R, 100 + f, energies);
        CHECK_OK(sv_plateau_measure(test_context(), &input, &plateau));
        covered += plateau.interval[0] <= truth.width && truth.width <= plateau.interval[1];
    }
    printf("# the 95 %% interval of the width covers it in %d of %d\n", covered, FILMS);
    CHECK(covered >= 51); /* at a true coverage of 95 % fewer than 51 come up once in 2,000 */
}

SV_TEST(windows_that_do_not_exist_or_do_not_end)
{
    double energies[N], values[N];
    grid(energies, -1.0, 1.0);
    for (int k = 0; k < N; k++)
        values[k] = 1.0;
    sv_plateau_input input = {.energies = energies,
                              .n = N,
                              .values = values,
                              .realisations = 1,
                              .clean = 1.0,
                              .within = 0.1,
                              .confidence = 0.95};
    sv_plateau plateau = {0};
    CHECK_OK(sv_plateau_measure(test_context(), &input, &plateau));
    CHECK(plateau.exists && plateau.open[0] && plateau.open[1] && isnan(plateau.interval[0]));
    CHECK_CLOSE(plateau.width, 2.0, 1e-12);
    input.clean = 0.0;
    CHECK_OK(sv_plateau_measure(test_context(), &input, &plateau));
    CHECK(!plateau.exists && isnan(plateau.width));
    values[200] = NAN;
    CHECK_OK(sv_plateau_measure(test_context(), &input, &plateau));
    CHECK(!plateau.exists);
    energies[3] = energies[2];
    CHECK_STATUS(SV_INVALID_INPUT, sv_plateau_measure(test_context(), &input, &plateau));
}
