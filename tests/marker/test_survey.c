/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The localizer at many points: equal to the single points, Lipschitz brackets, κ, verdicts. */
#include "fixtures.h"

#include <stdlib.h>

enum { AT, KAPPA, THRESHOLD, GAP, FROM, TO, POINTS, KAPPA_RANGE, KAPPA_POINTS, N_KEYS };

/* A disordered flake with the values of the keys. */
typedef struct scene {
    sv_model model;
    sv_flake flake;
    sv_sample sample;
    sv_occupation occupation;
    sv_value values[N_KEYS];
} scene;

static void fill_auto(sv_value values[N_KEYS])
{
    memset(values, 0, N_KEYS * sizeof *values);
    values[AT] = (sv_value){.has_auto = true, .count = 1};
    values[KAPPA] = (sv_value){.has_auto = true, .count = 1};
    values[THRESHOLD] = (sv_value){.has_auto = true, .count = 1};
    values[GAP].text = "value";
}

static void make_scene(scene *s, int number, int side, double width, double vacant)
{
    sv_model models[] = {fixture_qi_wu_zhang(-1.0), fixture_qi_wu_zhang(1.2),
                         fixture_haldane(0.2, M_PI / 2, 0.0), fixture_haldane(0.2, -1.2, 0.2),
                         fixture_hofstadter(1, 5)};
    const int count = (int)(sizeof models / sizeof models[0]);
    s->model = models[number % count];
    for (int k = 0; k < count; k++)
        if (k != number % count)
            sv_model_free(test_context(), &models[k]);
    sv_disorder disorder[2] = {
        {.name = "vac",
         .type = SV_DISORDER_VACANCIES,
         .on = -1,
         .has_share = true,
         .share = vacant},
        {.name = "pot", .type = SV_DISORDER_ONSITE, .on = -1, .width = width}};
    sv_flake_spec spec = fixture_cells(&s->model, side, side, false);
    s->flake = fixture_flake(&s->model, &spec);
    CHECK_OK(sv_sample_draw(test_context(), &s->flake, disorder, 2, (uint64_t)number + 1, 0,
                            &s->sample));
    /* Flux 1/5: the middle of its first gap; value of the band edges to two digits. */
    s->occupation =
        (sv_occupation){.by = SV_BY_ENERGY, .fermi_energy = number % count == 4 ? -2.3 : 0.0};
    fill_auto(s->values);
}

static void end_scene(scene *s)
{
    sv_sample_free(test_context(), &s->sample);
    sv_flake_free(test_context(), &s->flake);
    sv_model_free(test_context(), &s->model);
}

/* nx by ny points over the flake with a margin; ny 0: a line of nx. */
static void ask_points(scene *s, int nx, int ny, double margin)
{
    double low[2] = {INFINITY, INFINITY}, high[2] = {-INFINITY, -INFINITY};
    for (sv_index k = 0; k < s->flake.n_sites; k++)
        for (int d = 0; d < 2; d++) {
            low[d] = fmin(low[d], s->flake.sites[k].at[d]);
            high[d] = fmax(high[d], s->flake.sites[k].at[d]);
        }
    s->values[FROM] =
        (sv_value){.present = true, .count = 2, .real = {low[0] - margin, low[1] - margin}};
    s->values[TO] =
        (sv_value){.present = true, .count = 2, .real = {high[0] + margin, high[1] + margin}};
    s->values[POINTS] = (sv_value){.present = true, .count = ny > 0 ? 2 : 1, .integer = {nx, ny}};
}

static sv_survey survey(scene *s, int threads)
{
    sv_survey result = {0};
    sv_marker_input input = {.sample = &s->sample,
                             .occupation = &s->occupation,
                             .values = s->values,
                             .threads = threads};
    CHECK_OK(sv_localizer_prepare(test_context(), &s->flake, &s->occupation, s->values));
    CHECK_OK(sv_localizer_survey(test_context(), &input, &result));
    return result;
}

static sv_outcome single(scene *s, const double at[2], double kappa)
{
    sv_value values[N_KEYS];
    sv_outcome outcome = sv_outcome_blank();
    memcpy(values, s->values, sizeof values);
    values[AT] = (sv_value){.present = true, .count = 2, .real = {at[0], at[1]}};
    values[KAPPA].real[0] = kappa; /* settled before: count is 2 */
    sv_marker_input input = {.sample = &s->sample, .occupation = &s->occupation, .values = values};
    CHECK_OK(sv_localizer_index(test_context(), &input, &outcome));
    return outcome;
}

static void compare_probe(scene *s, const sv_probe *p)
{
    sv_outcome o = single(s, p->at, p->kappa);
    CHECK(p->resolved == (o.verdict == SV_RESOLVED));
    if (p->resolved)
        CHECK_INT(p->index, o.index);
    else
        CHECK(p->reason[0] != '\0' && strncmp(p->reason, o.reason, 100) == 0);
    CHECK(p->gap == o.margin); /* bit by bit */
}

SV_TEST(many_points_are_the_single_points_exactly)
{
    for (int number = 0; number < 5; number++) {
        scene s = {0};
        make_scene(&s, number, 8, 1.0, 0.03);
        ask_points(&s, 4, number % 2 ? 3 : 0, 1.5);
        s.values[KAPPA_RANGE] = (sv_value){.present = true, .count = 2, .real = {0.05, 0.8}};
        s.values[KAPPA_POINTS] = (sv_value){.present = true, .count = 1, .integer = {4}};
        sv_survey one = survey(&s, 1), three = survey(&s, 3);
        sv_index count = one.points[0] * one.points[1];
        CHECK_INT(count, number % 2 ? 12 : 4);
        CHECK_INT(one.n_kappas, 4);
        CHECK_CLOSE(one.kappas[0].kappa, 0.05, 1e-15);
        CHECK_CLOSE(one.kappas[3].kappa, 0.8, 0.0);
        CHECK_CLOSE(one.kappas[1].kappa / one.kappas[0].kappa, pow(16.0, 1.0 / 3.0), 1e-12);
        for (sv_index k = 0; k < count; k++) {
            compare_probe(&s, &one.probes[k]);
            CHECK(memcmp(&one.probes[k].at, &three.probes[k].at, sizeof one.probes[k].at) == 0);
            CHECK(one.probes[k].gap == three.probes[k].gap);
            CHECK(one.probes[k].certain == three.probes[k].certain);
            CHECK(one.probes[k].resolved == three.probes[k].resolved);
        }
        for (sv_index k = 0; k < one.n_kappas; k++)
            compare_probe(&s, &one.kappas[k]);
        sv_survey_free(test_context(), &one);
        sv_survey_free(test_context(), &three);
        sv_survey_free(test_context(), &three);
        end_scene(&s);
    }
}

/* Random places inside the pieces: the gap lies in the bracket, a certified index does not change.
 */
SV_TEST(brackets_hold_between_the_probes)
{
    sv_stream stream = sv_stream_make(5, "between", 0);
    int certified = 0, tested = 0, narrow = 0;
    for (int number = 0; number < 6; number++) {
        scene s = {0};
        make_scene(&s, number, 7, 1.5, 0.02 * (number % 3));
        ask_points(&s, number % 2 ? 9 : 25, number % 2 ? 9 : 0, 1.0);
        sv_survey v = survey(&s, 1);
        for (sv_index k = 0; k < v.n_between; k += number % 2 ? 3 : 1) {
            sv_index corner =
                v.line ? k : k % (v.points[0] - 1) + k / (v.points[0] - 1) * v.points[0];
            const sv_probe *a = &v.probes[corner];
            const sv_probe *b = v.line ? a + 1 : a + v.points[0] + 1;
            double u = sv_stream_uniform(&stream, (int32_t)k, number, 0);
            double w = v.line ? u : sv_stream_uniform(&stream, (int32_t)k, number, 1);
            double at[2] = {a->at[0] + u * (b->at[0] - a->at[0]),
                            a->at[1] + w * (b->at[1] - a->at[1])};
            sv_outcome o = single(&s, at, v.kappa);
            CHECK(v.between[k].low <= o.margin && o.margin <= v.between[k].high);
            narrow += v.between[k].high - v.between[k].low < 2.0 * o.margin;
            tested++;
            if (!v.between[k].constant)
                continue;
            certified++;
            CHECK(a->resolved && b->resolved && a->index == b->index && v.between[k].low > 0.0);
            if (o.verdict == SV_RESOLVED)
                CHECK_INT(o.index, a->index);
        }
        sv_survey_free(test_context(), &v);
        end_scene(&s);
    }
    printf("# %d of %d pieces certified, %d brackets narrower than twice the gap\n", certified,
           tested, narrow);
    CHECK(tested > 100 && certified > 20 && narrow > 20);
}

/* The bracket of a segment against the bounds sampled along it, and what it is not. */
SV_TEST(brackets_are_those_of_the_formula)
{
    scene s = {0};
    make_scene(&s, 0, 7, 1.5, 0.0);
    ask_points(&s, 12, 0, 1.0);
    sv_survey v = survey(&s, 1);
    for (sv_index k = 0; k < v.n_between; k++) {
        const sv_probe *a = &v.probes[k], *b = a + 1;
        double d = hypot(b->at[0] - a->at[0], b->at[1] - a->at[1]), low = INFINITY, high = 0.0;
        for (int i = 0; i <= 1000; i++) {
            double t = d * i / 1000.0;
            low = fmin(low, fmax(a->certain - v.kappa * t, b->certain - v.kappa * (d - t)));
            high = fmax(high, fmin(a->gap + v.kappa * t, b->gap + v.kappa * (d - t)));
        }
        CHECK_CLOSE(v.between[k].low, fmax(low, 0.0), 1e-3 * v.kappa * d);
        CHECK_CLOSE(v.between[k].high, high, 1e-3 * v.kappa * d + 2e-6 * high);
        if (a->resolved)
            CHECK(a->certain <= a->gap && a->certain >= 0.99 * a->gap);
    }
    sv_survey_free(test_context(), &v);
    end_scene(&s);
}

/* Half signature and gap from all eigenvalues, with a potential added. */
static int dense_index(const scene *s, const sv_probe *p, const double *potential)
{
    sv_context *c = test_context();
    sv_sparse l = {0};
    CHECK_OK(sv_localizer_matrix(c, &s->sample, s->occupation.fermi_energy, p->kappa, p->at, &l));
    for (sv_index row = 0; row < l.n; row++)
        for (sv_index k = l.row_start[row]; k < l.row_start[row + 1]; k++)
            if (l.column[k] == row)
                l.value[k] += (row % 2 ? -1.0 : 1.0) * potential[row / 2];
    sv_inertia_plan *plan = NULL;
    sv_inertia_count count;
    CHECK_OK(sv_inertia_plan_make(c, &l, 2, &plan));
    CHECK_OK(sv_inertia_count_below(c, plan, &l, 0.0, &count));
    CHECK(count.decided);
    sv_inertia_plan_free(c, plan);
    sv_sparse_free(c, &l);
    return (int)(count.below - s->sample.n);
}

/* No potential of norm below `certain` changes the index; larger ones can. */
SV_TEST(smaller_potentials_leave_the_index)
{
    sv_stream stream = sv_stream_make(6, "potential", 0);
    int resolved = 0, changed = 0;
    for (int number = 0; number < 5; number++) {
        scene s = {0};
        make_scene(&s, number, 7, 1.0, 0.02);
        ask_points(&s, 4, 4, 0.0);
        sv_survey v = survey(&s, 2);
        double *potential = NULL;
        CHECK_OK(sv_take(test_context(), s.sample.n, sizeof *potential, &potential));
        for (sv_index k = 0; k < 16; k++) {
            const sv_probe *p = &v.probes[k];
            if (!p->resolved)
                continue;
            resolved++;
            for (int trial = 0; trial < 6; trial++) {
                /* single signs, uniform shifts, random: all as large as allowed */
                double most = 0.999 * p->certain;
                for (sv_index r = 0; r < s.sample.n; r++) {
                    double u = sv_stream_uniform(&stream, (int32_t)r, (int32_t)k,
                                                 (uint32_t)(trial + 10 * number));
                    potential[r] = trial < 2 ? (trial ? most : -most) : u < 0.5 ? most : -most;
                }
                CHECK_INT(dense_index(&s, p, potential), p->index);
            }
            for (sv_index r = 0; r < s.sample.n; r++)
                potential[r] = 20.0 * p->certain + 5.0;
            changed += dense_index(&s, p, potential) != p->index;
        }
        sv_give(test_context(), potential);
        sv_survey_free(test_context(), &v);
        end_scene(&s);
    }
    CHECK(resolved >= 10 && changed >= 5);
}

/* Inside the index of the bulk, far outside 0, both resolved; on a lattice that is oblique too. */
SV_TEST(inside_and_far_outside)
{
    const int chern[] = {1, -1, 1, -1, 1};
    for (int number = 0; number < 4; number++) {
        scene s = {0};
        make_scene(&s, number, 12, 0.5, 0.0);
        CHECK_INT(fixture_link_chern(&s.model, 1, 24), chern[number]);
        s.values[FROM] =
            (sv_value){.present = true, .count = 2, .real = {s.flake.centre[0], s.flake.centre[1]}};
        s.values[TO] = (sv_value){.present = true,
                                  .count = 2,
                                  .real = {s.flake.centre[0] + 60.0, s.flake.centre[1] - 45.0}};
        s.values[POINTS] = (sv_value){.present = true, .count = 1, .integer = {4, 4}};
        sv_survey v = survey(&s, 1);
        CHECK(v.probes[0].resolved);
        CHECK_INT(v.probes[0].index, chern[number]);
        for (int k = 1; k < 4; k++) {
            CHECK(v.probes[k].resolved);
            CHECK_INT(v.probes[k].index, 0);
        }
        CHECK(!v.between[0].constant && v.between[2].constant);
        sv_survey_free(test_context(), &v);
        end_scene(&s);
    }
}

SV_TEST(kappa_has_a_steady_range)
{
    scene s = {0};
    make_scene(&s, 0, 12, 0.0, 0.0);
    s.values[KAPPA_RANGE] = (sv_value){.present = true, .count = 2, .real = {0.05, 5.0}};
    s.values[KAPPA_POINTS] = (sv_value){.present = true, .count = 1, .integer = {15}};
    sv_survey v = survey(&s, 2);
    CHECK(v.probes == NULL && v.n_between == 0 && v.n_kappas == 15);
    CHECK(v.steady[0] >= 0 && v.steady[1] >= v.steady[0] + 2 && v.steady[1] < 14);
    for (sv_index k = v.steady[0]; k <= v.steady[1]; k++)
        CHECK(v.kappas[k].resolved && v.kappas[k].index == 1);
    CHECK(v.kappas[v.steady[0]].kappa <= v.kappa && v.kappa <= v.kappas[v.steady[1]].kappa);
    CHECK(!v.kappas[14].resolved && v.kappas[14].reason[0] != '\0');
    sv_survey_free(test_context(), &v);
    /* Without a number of κ there are nine. */
    s.values[KAPPA_POINTS] = (sv_value){0};
    v = survey(&s, 1);
    CHECK_INT(v.n_kappas, 9);
    sv_survey_free(test_context(), &v);
    end_scene(&s);
}

SV_TEST(a_bound_has_no_upper_side)
{
    scene s = {0};
    make_scene(&s, 2, 8, 0.5, 0.0);
    ask_points(&s, 9, 0, 0.0);
    s.values[GAP].text = "bound";
    sv_survey v = survey(&s, 1);
    int resolved = 0;
    for (sv_index k = 0; k < 9; k++) {
        const sv_probe *p = &v.probes[k];
        resolved += p->resolved;
        CHECK(!p->resolved || (p->gap == p->certain && fabs(p->gap / v.threshold - 1.0) < 0.05));
    }
    for (sv_index k = 0; k < v.n_between; k++)
        CHECK(isnan(v.between[k].high));
    CHECK(resolved > 0);
    sv_survey_free(test_context(), &v);
    end_scene(&s);
}

/* Without a gap there is no κ: every probe says so, and nothing is drawn from nothing. */
SV_TEST(a_metal_is_unresolved_everywhere)
{
    scene s = {.model = fixture_qi_wu_zhang(0.0), .occupation = fixture_below_zero};
    sv_flake_spec spec = fixture_cells(&s.model, 6, 6, false);
    s.flake = fixture_flake(&s.model, &spec);
    CHECK_OK(sv_sample_draw(test_context(), &s.flake, NULL, 0, 1, 0, &s.sample));
    fill_auto(s.values);
    ask_points(&s, 3, 3, 0.0);
    s.values[KAPPA_RANGE] = (sv_value){.present = true, .count = 2, .real = {0.1, 1.0}};
    sv_survey v = survey(&s, 2);
    CHECK(strstr(v.reason, "give kappa") != NULL);
    for (int k = 0; k < 9; k++)
        CHECK(!v.probes[k].resolved && isnan(v.probes[k].gap) && v.probes[k].reason[0] != '\0');
    for (sv_index k = 0; k < v.n_between; k++)
        CHECK(!v.between[k].constant && v.between[k].low == 0.0 && isnan(v.between[k].high));
    CHECK_INT(v.steady[0], -1);
    sv_survey_free(test_context(), &v);
    end_scene(&s);
}

static bool stop_after(void *user)
{
    int *left = user;
    return (*left)-- <= 0;
}

static void count_calls(const char *phase, sv_index done, sv_index total, void *user)
{
    sv_index *seen = user;
    CHECK(phase != NULL && done >= seen[0] && total == 9);
    seen[0] = done;
    seen[1] += done == 0;
}

SV_TEST(progress_and_cancel)
{
    scene s = {0};
    make_scene(&s, 0, 6, 0.5, 0.0);
    ask_points(&s, 3, 3, 0.0);
    sv_context *c = test_context();
    sv_index seen[2] = {0, 0};
    c->progress = count_calls;
    c->progress_user = seen;
    sv_survey v = survey(&s, 2);
    CHECK(seen[0] == 9 && seen[1] == 1);
    sv_survey_free(c, &v);
    c->progress = NULL;
    int left = 4;
    c->cancel = stop_after;
    c->cancel_user = &left;
    sv_marker_input input = {.sample = &s.sample, .occupation = &s.occupation, .values = s.values};
    CHECK_STATUS(SV_INTERRUPTED, sv_localizer_survey(c, &input, &v));
    c->cancel = NULL;
    end_scene(&s);
}

SV_TEST(keys_must_go_together)
{
    const int localizer = sv_marker_find("localizer"), bott = sv_marker_find("bott");
    const sv_value point = {.present = true, .count = 2, .real = {1.0, 2.0}},
                   other = {.present = true, .count = 2, .real = {0.0, 3.0}},
                   line = {.present = true, .count = 1, .integer = {5, 5}},
                   grid = {.present = true, .count = 2, .integer = {5, 5}},
                   falling = {.present = true, .count = 2, .real = {0.4, 0.1}},
                   rising = {.present = true, .count = 2, .real = {0.1, 0.4}},
                   number = {.present = true, .count = 1, .integer = {5}};
    const struct {
        sv_value from, to, points, range, count;
        int key; /* at fault; −1: none */
    } rows[] = {{.key = -1},
                {.points = grid, .key = -1},
                {.from = point, .to = other, .points = line, .key = -1},
                {.range = rising, .count = number, .key = -1},
                {.points = line, .key = POINTS},
                {.from = point, .to = other, .key = FROM},
                {.to = other, .key = TO},
                {.from = point, .points = grid, .key = FROM},
                {.to = point, .points = line, .key = TO},
                {.from = point, .to = point, .points = line, .key = TO},
                {.from = point, .to = other, .points = grid, .key = TO},
                {.range = falling, .key = KAPPA_RANGE},
                {.count = number, .key = KAPPA_POINTS}};
    for (size_t k = 0; k < sizeof rows / sizeof rows[0]; k++) {
        sv_value values[N_KEYS];
        char message[200] = "";
        int key = -1;
        fill_auto(values);
        values[FROM] = rows[k].from;
        values[TO] = rows[k].to;
        values[POINTS] = rows[k].points;
        values[KAPPA_RANGE] = rows[k].range;
        values[KAPPA_POINTS] = rows[k].count;
        bool good = sv_marker_check(localizer, values, &key, message, sizeof message);
        CHECK(good == (rows[k].key < 0));
        CHECK_INT(key, rows[k].key);
        CHECK(good == (message[0] == '\0'));
        CHECK(sv_marker_check(bott, values, &key, message, sizeof message));
        CHECK(sv_localizer_wants_survey(values) ==
              (rows[k].points.present || rows[k].range.present));
    }
    scene s = {0};
    sv_survey v;
    make_scene(&s, 0, 5, 0.5, 0.0);
    sv_marker_input input = {.sample = &s.sample, .occupation = &s.occupation, .values = s.values};
    CHECK_STATUS(SV_INVALID_INPUT, sv_localizer_survey(test_context(), &input, &v));
    end_scene(&s);
}

static long allowed;
static sv_allocator inner;

static void *scarce_take(size_t bytes, void *user)
{
    return allowed-- > 0 ? inner.take(bytes, user) : NULL;
}

SV_TEST(every_allocation_may_fail)
{
    scene s = {0};
    make_scene(&s, 0, 4, 0.5, 0.0);
    ask_points(&s, 2, 2, 0.0);
    s.values[KAPPA_RANGE] = (sv_value){.present = true, .count = 2, .real = {0.1, 1.0}};
    sv_context *c = test_context();
    sv_marker_input input = {.sample = &s.sample, .occupation = &s.occupation, .values = s.values};
    sv_status status = SV_NO_MEMORY;
    long k = 0;
    CHECK_OK(sv_localizer_prepare(c, &s.flake, &s.occupation, s.values));
    inner = c->allocator;
    c->allocator.take = scarce_take;
    for (; status != SV_OK && k < 2000; k++) {
        sv_survey v = {0};
        allowed = k;
        status = sv_localizer_survey(c, &input, &v);
        CHECK(status == SV_OK || status == SV_NO_MEMORY);
        if (status == SV_OK)
            sv_survey_free(c, &v);
    }
    c->allocator = inner;
    CHECK(status == SV_OK && k > 40);
    end_scene(&s);
}
