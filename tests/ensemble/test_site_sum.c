/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "fixtures.h"
#include "selvedge/ensemble.h"

enum { ENTRIES = 7, REALISATIONS = 300 };

/* Values of very different size, absent ones among them. */
static void draw(int realisation, double values[ENTRIES])
{
    sv_stream stream = sv_stream_make(5, "values", (uint64_t)realisation);
    for (int k = 0; k < ENTRIES; k++) {
        double u = sv_stream_uniform(&stream, k, 0, 0);
        values[k] = k == 0 ? 1.0 + 1e-7 * u : (u - 0.5) * pow(10.0, k - 3);
        if (k == 5 && realisation % 3 == 1)
            values[k] = (double)NAN;
    }
}

static void add(sv_site_sum *sum, int realisation)
{
    int64_t fixed[ENTRIES];
    double values[ENTRIES];
    draw(realisation, values);
    for (int k = 0; k < ENTRIES; k++)
        fixed[k] = isnan(values[k]) ? SV_SITE_ABSENT : llrint(ldexp(values[k], SV_SITE_BITS));
    const sv_site_record record = {.n = ENTRIES, .values = fixed};
    CHECK_OK(sv_site_sum_add(test_context(), sum, &record));
}

static bool same(const sv_site_sum *a, const sv_site_sum *b)
{
    return a->n == b->n && a->realisations == b->realisations &&
           memcmp(a->count, b->count, (size_t)a->n * sizeof *a->count) == 0 &&
           memcmp(a->sum, b->sum, (size_t)a->n * sizeof *a->sum) == 0 &&
           memcmp(a->square, b->square, (size_t)a->n * sizeof *a->square) == 0;
}

/* In order; backwards; in seven parts joined from the last to the first. */
SV_TEST(no_order_leaves_a_trace_in_the_sums)
{
    sv_context *context = test_context();
    sv_site_sum sums[3] = {{0}}, part = {0};
    for (int s = 0; s < 3; s++)
        CHECK_OK(sv_site_sum_init(context, ENTRIES, &sums[s]));
    for (int k = 0; k < REALISATIONS; k++) {
        add(&sums[0], k);
        add(&sums[1], REALISATIONS - 1 - k);
    }
    for (int p = 6; p >= 0; p--) {
        CHECK_OK(sv_site_sum_init(context, ENTRIES, &part));
        for (int k = p; k < REALISATIONS; k += 7)
            add(&part, k);
        CHECK_OK(sv_site_sum_join(context, &sums[2], &part));
        sv_site_sum_free(context, &part);
    }
    CHECK(same(&sums[0], &sums[1]));
    CHECK(same(&sums[0], &sums[2]));
    CHECK_INT(sums[0].count[5], 200);
    for (int s = 0; s < 3; s++)
        sv_site_sum_free(context, &sums[s]);
    sv_site_sum_free(context, &sums[0]);
}

/* Two passes in long double over the values themselves; 2^−37 is what one value may be off. */
SV_TEST(moments_are_those_of_the_values)
{
    sv_site_sum sum = {0};
    CHECK_OK(sv_site_sum_init(test_context(), ENTRIES, &sum));
    CHECK(isnan(sv_site_moments(&sum, 0).mean));
    for (int k = 0; k < REALISATIONS; k++)
        add(&sum, k);
    for (int e = 0; e < ENTRIES; e++) {
        long double mean = 0.0L, squares = 0.0L;
        int n = 0;
        for (int pass = 0; pass < 2; pass++) {
            for (int k = 0; k < REALISATIONS; k++) {
                double values[ENTRIES];
                draw(k, values);
                if (isnan(values[e]))
                    continue;
                if (pass == 0)
                    mean += (long double)values[e];
                else
                    squares += ((long double)values[e] - mean) * ((long double)values[e] - mean);
                n += pass == 0;
            }
            mean = pass == 0 ? mean / n : mean;
        }
        const sv_moments m = sv_site_moments(&sum, e);
        const double deviation = sqrt((double)(squares / (n - 1)));
        CHECK_INT(m.n, n);
        CHECK_CLOSE(m.mean, (double)mean, ldexp(1.0, -37) + 1e-15 * fabs((double)mean));
        CHECK_CLOSE(m.deviation, deviation, ldexp(1.0, -37) + 1e-14 * deviation);
        CHECK_CLOSE(m.standard_error, m.deviation / sqrt(n), 1e-15 * deviation);
    }
    sv_site_sum_free(test_context(), &sum);
}

SV_TEST(one_value_has_no_deviation_and_constant_ones_none_but_zero)
{
    int64_t values[1] = {-3};
    const sv_site_record record = {.n = 1, .values = values}, none = {0};
    const sv_site_record other = {.n = 2, .values = values};
    sv_site_sum sum = {0}, wide = {0};
    CHECK_OK(sv_site_sum_init(test_context(), 1, &sum));
    CHECK_OK(sv_site_sum_add(test_context(), &sum, &none));
    CHECK_OK(sv_site_sum_add(test_context(), &sum, &record));
    CHECK(isnan(sv_site_moments(&sum, 0).standard_error));
    CHECK_INT(sum.realisations, 2);
    for (int k = 0; k < 6; k++)
        CHECK_OK(sv_site_sum_add(test_context(), &sum, &record));
    CHECK_INT(sv_site_moments(&sum, 0).n, 7);
    CHECK(sv_site_moments(&sum, 0).deviation <= 0.0);
    CHECK_STATUS(SV_INVALID_INPUT, sv_site_sum_add(test_context(), &sum, &other));
    CHECK_OK(sv_site_sum_init(test_context(), 2, &wide));
    CHECK_STATUS(SV_INVALID_INPUT, sv_site_sum_join(test_context(), &sum, &wide));
    sv_site_sum_free(test_context(), &sum);
    sv_site_sum_free(test_context(), &wide);
}

/* A vacant position has no entry, nor has its cell; a site that a map leaves blank spoils its cell,
 * a vacant one does not. */
SV_TEST(records_know_vacant_sites_and_cells)
{
    sv_context *context = test_context();
    sv_model model = fixture_haldane(0.2, 1.5, 0.0);
    sv_flake_spec spec = fixture_cells(&model, 4, 4, false);
    sv_flake flake = fixture_flake(&model, &spec);
    sv_disorder vacancies = {
        .name = "vac", .type = SV_DISORDER_VACANCIES, .on = -1, .has_share = true, .share = 0.3};
    sv_sample sample = {0};
    sv_site_record *record = NULL;
    double values[32];
    CHECK_OK(sv_sample_draw(context, &flake, &vacancies, 1, 3, 0, &sample));
    CHECK(sample.n < 32 && sample.n > 8);
    for (sv_index k = 0; k < sample.n; k++)
        values[k] = (double)k + 0.25;
    values[1] = (double)NAN;
    values[2] = 5000.0; /* beyond what fits */
    CHECK_INT(sv_site_entries(&flake), 48);
    CHECK_INT(sv_site_first_cell(&flake), 32);
    CHECK_OK(sv_site_record_make(context, &sample, values, &record));
    double expected[48];
    bool spoilt[16] = {false};
    for (int k = 0; k < 48; k++)
        expected[k] = (double)NAN;
    for (sv_index k = 0; k < sample.n; k++) {
        const int site = (int)sample.pristine[k], cell = flake.sites[site].cell;
        expected[site] = k == 2 ? (double)NAN : values[k];
        spoilt[cell] = spoilt[cell] || isnan(expected[site]);
        expected[32 + cell] = (isnan(expected[32 + cell]) ? 0.0 : expected[32 + cell]) + values[k];
    }
    for (int k = 0; k < 48; k++) {
        const bool absent = isnan(expected[k]) || (k >= 32 && spoilt[k - 32]);
        CHECK_INT(record->values[k],
                  absent ? SV_SITE_ABSENT : llrint(ldexp(expected[k], SV_SITE_BITS)));
    }
    sv_site_record_free(context, record);
    sv_site_record_free(context, NULL);
    sv_sample_free(context, &sample);
    sv_flake_free(context, &flake);
    sv_model_free(context, &model);
}
