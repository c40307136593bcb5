/* SPDX-License-Identifier: GPL-3.0-or-later */
/* How often the intervals contain the truth, by simulation: 20,000 synthetic ensembles a row. The
 * rows are printed; data/manual/statistics.md holds them, and the test compares. */
#include "selvedge/ensemble.h"
#include "testing.h"

#include <stdlib.h>

enum { ENSEMBLES = 20000, LONGEST = 1200 };

/* ------------------------------------------------------------ synthetic values */

/* Two uniforms of 53 bits from one block of Philox. */
typedef struct source {
    sv_stream stream;
    uint32_t ensemble, block;
} source;

static void two_uniforms(source *s, double ret[2])
{
    const uint32_t counter[4] = {s->block++, s->ensemble, 0, 0};
    const uint32_t key[2] = {s->stream.seed, s->stream.purpose};
    uint32_t word[4];
    sv_philox(counter, key, word);
    for (int k = 0; k < 2; k++)
        ret[k] =
            ((double)(((uint64_t)word[2 * k] << 21) | (word[2 * k + 1] >> 11)) + 0.5) * 0x1p-53;
}

typedef void (*filler)(source *s, double *values, int n);

static void fill_normal(source *s, double *values, int n)
{
    double u[2];
    for (int k = 0; k < n; k += 2) { /* Box, Muller 1958 */
        two_uniforms(s, u);
        double radius = sqrt(-2.0 * log(u[0]));
        values[k] = radius * cos(2.0 * M_PI * u[1]);
        values[k + 1] = radius * sin(2.0 * M_PI * u[1]);
    }
}

static void fill_exponential(source *s, double *values, int n)
{
    for (int k = 0; k < n; k += 2) {
        two_uniforms(s, &values[k]);
        values[k] = -log(values[k]);
        values[k + 1] = -log(values[k + 1]);
    }
}

static void fill_lognormal(source *s, double *values, int n)
{
    fill_normal(s, values, n);
    for (int k = 0; k < n; k++)
        values[k] = exp(values[k]);
}

static void fill_rare(source *s, double *values, int n, double share)
{
    for (int k = 0; k < n; k += 2) {
        two_uniforms(s, &values[k]);
        values[k] = values[k] < share;
        values[k + 1] = values[k + 1] < share;
    }
}

static void fill_rare3(source *s, double *values, int n)
{
    fill_rare(s, values, n, 0.03);
}

static void fill_rare10(source *s, double *values, int n)
{
    fill_rare(s, values, n, 0.1);
}

typedef struct value_law {
    const char *name;
    filler fill;
    double mean, deviation;
} value_law;

static const value_law laws[] = {
    {"normal", fill_normal, 0.0, 1.0},
    {"exponential", fill_exponential, 1.0, 1.0},
    {"lognormal", fill_lognormal, 1.6487212707001282, 2.1611974158950877},
    {"10 % at 1, rest at 0", fill_rare10, 0.1, 0.3},
    {"3 % at 1, rest at 0", fill_rare3, 0.03, 0.17058722109231980},
};
enum { N_LAWS = sizeof laws / sizeof laws[0] };

/* ------------------------------------------------------------ the table in the documentation */

static char *manual;

static void read_manual(void)
{
    size_t size;
    if (manual == NULL)
        CHECK_OK(sv_read_file(test_context(), test_data("../data/manual/statistics.md"), 1 << 20,
                              &manual, &size));
}

static void give_manual(void)
{
    sv_give(test_context(), manual);
    manual = NULL;
}

/* The row is printed; the manual's row of the same head must have the same numbers within `slack`.
 */
static void compare_row(const char *head, const double *numbers, int n, const double *slack)
{
    printf("# %s", head);
    for (int k = 0; k < n; k++)
        printf(" %.1f |", numbers[k]);
    printf("\n");
    const char *row = manual != NULL ? strstr(manual, head) : NULL;
    if (!test_check(row != NULL, __FILE__, __LINE__, "the manual lacks the row %s", head))
        return;
    row += strlen(head);
    for (int k = 0; k < n; k++) {
        char *end;
        double written = strtod(row, &end);
        test_check(end != row && fabs(written - numbers[k]) <= slack[k], __FILE__, __LINE__,
                   "%s column %d: the manual says %g, measured %.2f", head, k + 1, written,
                   numbers[k]);
        row = strchr(end, '|');
        row = row != NULL ? row + 1 : end;
    }
}

/* ------------------------------------------------------------ means */

/* Per cent of ensembles: Student's and the corrected interval hold the truth; a warning is given;
 * Student's misses without one. And the mean number of realisations. */
typedef struct tally {
    double student, corrected, warned, silent, realisations;
} tally;

static bool holds(const double interval[2], double truth)
{
    return interval[0] <= truth && truth <= interval[1];
}

/* One ensemble as a summary would treat it. */
static void judge(const double *values, int64_t n, double truth, tally *t)
{
    char message[200];
    double student[2], corrected[2];
    sv_moments m = sv_moments_of(values, n);
    sv_peaks peaks = {.explained = NAN}; /* words of the message only */
    (void)sv_student_interval(&m, 0.95, student);
    (void)sv_corrected_interval(&m, 0.95, corrected);
    bool warned = sv_interval_warning(&m, &peaks, message, sizeof message);
    t->student += holds(student, truth);
    t->corrected += holds(corrected, truth);
    t->warned += warned;
    t->silent += !warned && !holds(student, truth);
    t->realisations += (double)n;
}

static void finish(tally *t)
{
    const double scale = 100.0 / ENSEMBLES;
    t->student *= scale;
    t->corrected *= scale;
    t->warned *= scale;
    t->silent *= scale;
    t->realisations /= ENSEMBLES;
}

static void compare_means(const value_law *law, const char *count, const tally *t)
{
    const double numbers[] = {t->student, t->corrected, t->warned, t->silent, t->realisations};
    const double slack[] = {0.2, 0.2, 0.5, 0.2, 1.0};
    char head[100];
    snprintf(head, sizeof head, "| %s | %s |", law->name, count);
    compare_row(head, numbers, 5, slack);
}

/* What is promised: normal values 94 to 96 %, exponential ones 92 % from 100 on, and whatever the
 * values, an interval without a warning misses in 6.5 % of all ensembles at most. */
static void check_promise(const value_law *law, int64_t least, const tally *t)
{
    if (law->fill == fill_normal)
        CHECK(t->student >= 94.0 && t->student <= 96.0 && t->warned < 0.1);
    if (law->fill == fill_exponential && least >= 100)
        CHECK(t->student >= 92.0);
    CHECK(t->silent <= 6.5);
    if (t->student < 92.0) /* then most carry a warning */
        CHECK(t->warned > 60.0);
}

SV_TEST(means_of_a_given_number)
{
    static const int sizes[] = {50, 100, 400};
    static double values[400];
    read_manual();
    for (int l = 0; l < N_LAWS; l++) {
        tally t[3] = {{0}};
        for (uint32_t e = 0; e < ENSEMBLES; e++) {
            source s = {sv_stream_make(1, laws[l].name, 0), e, 0};
            laws[l].fill(&s, values, 400);
            for (int k = 0; k < 3; k++)
                judge(values, sizes[k], laws[l].mean, &t[k]);
        }
        for (int k = 0; k < 3; k++) {
            char count[40];
            snprintf(count, sizeof count, "n = %d", sizes[k]);
            finish(&t[k]);
            compare_means(&laws[l], count, &t[k]);
            check_promise(&laws[l], sizes[k], &t[k]);
        }
    }
    give_manual();
}

/* Draws until the rule holds. */
static int64_t draw_and_stop(const value_law *law, source *s, const sv_stop_rule *rule,
                             double *values)
{
    sv_stop_state state = {0};
    for (int64_t n = 0; n < LONGEST; n += 50) {
        law->fill(s, &values[n], 50);
        for (int k = 0; k < 50; k++)
            if (sv_stop_add(&state, rule, SV_RESOLVED, values[n + k], 0.0))
                return n + k + 1;
    }
    return LONGEST;
}

/* The target is the standard error of `enough` values. */
static void stop_means(int64_t at_least, double enough)
{
    static double values[LONGEST];
    char count[60];
    snprintf(count, sizeof count, "stop near %.0f, at least %lld", enough, (long long)at_least);
    for (int l = 0; l < N_LAWS; l++) {
        tally t = {0};
        sv_stop_rule rule = {.active = true,
                             .standard_error = laws[l].deviation / sqrt(enough),
                             .at_least = at_least};
        for (uint32_t e = 0; e < ENSEMBLES; e++) {
            source s = {sv_stream_make(2, laws[l].name, 0), e, 0};
            int64_t n = draw_and_stop(&laws[l], &s, &rule, values);
            judge(values, n, laws[l].mean, &t);
        }
        finish(&t);
        compare_means(&laws[l], count, &t);
        check_promise(&laws[l], at_least, &t);
    }
}

SV_TEST(means_under_the_stop_rule)
{
    read_manual();
    stop_means(50, 100.0);
    stop_means(100, 150.0);
    give_manual();
}

/* The bootstrap is dear: 600 ensembles tell whether the manual's 20,000 are still true. */
SV_TEST(bootstrap_of_means)
{
    enum { FEW = 600, RESAMPLES = 600 };
    read_manual();
    for (int l = 0; l < N_LAWS; l++) {
        int64_t covered = 0;
        double values[50], interval[2];
        for (uint32_t e = 0; e < FEW; e++) {
            source s = {sv_stream_make(1, laws[l].name, 0), e, 0};
            laws[l].fill(&s, values, 50);
            sv_status status =
                sv_bootstrap_interval(test_context(), values, 50, RESAMPLES, e, 0.95, interval);
            if (status == SV_UNDEFINED) /* all the same: no interval, and a warning */
                continue;
            CHECK_OK(status);
            covered += holds(interval, laws[l].mean);
        }
        char head[100];
        double share = 100.0 * (double)covered / FEW;
        const double slack = 3.5 * sqrt(share * (100.0 - share) / FEW);
        snprintf(head, sizeof head, "| %s | BCa, n = 50 |", laws[l].name);
        compare_row(head, &share, 1, &slack);
    }
    give_manual();
}

/* ------------------------------------------------------------ shares */

/* Per cent covered by Wilson's interval and by the exact one, and the mean number. */
typedef struct share_tally {
    double wilson, exact, realisations;
} share_tally;

/* Exact intervals take a hundred beta functions: each is computed once. */
static const double *exact_interval(int64_t k, int64_t n)
{
    static double known[LONGEST / 4][LONGEST / 4][2];
    static double other[2];
    double *interval = n < LONGEST / 4 ? known[n][k] : other;
    if (interval == other || interval[1] == 0.0)
        sv_exact_interval(k, n, 0.95, interval);
    return interval;
}

/* One ensemble of an index that is 1 with probability p; negative p: drawn anew from (0, 1). */
static void one_share(uint32_t e, double p, const sv_stop_rule *rule, int64_t fixed, share_tally *t)
{
    source s = {sv_stream_make(3, "shares", 0), e, 0};
    sv_stop_state state = {0};
    double u[2], interval[2];
    int64_t ones = 0, n = 0;
    two_uniforms(&s, u);
    p = p < 0.0 ? u[0] : p;
    for (bool stop = false; !stop && n < LONGEST; n++) {
        if (n % 2 == 0)
            two_uniforms(&s, u);
        bool one = u[n % 2] < p;
        ones += one;
        stop = fixed > 0 ? n + 1 == fixed : sv_stop_add(&state, rule, SV_RESOLVED, one, 0.0);
    }
    sv_wilson_interval(ones, n, 0.95, interval);
    t->wilson += holds(interval, p);
    t->exact += holds(exact_interval(ones, n), p);
    t->realisations += (double)n;
}

/* Wilson's covers 95 % on the average over the shares, the exact one at least that at each. */
static void shares_row(double p, const char *count, const sv_stop_rule *rule, int64_t fixed)
{
    share_tally t = {0};
    for (uint32_t e = 0; e < ENSEMBLES; e++)
        one_share(e, p, rule, fixed, &t);
    char head[120], name[40];
    snprintf(name, sizeof name, p < 0.0 ? "any share" : "share %.2f", p);
    snprintf(head, sizeof head, "| %s | %s |", name, count);
    const double numbers[] = {100.0 * t.wilson / ENSEMBLES, 100.0 * t.exact / ENSEMBLES,
                              t.realisations / ENSEMBLES};
    const double slack[] = {0.2, 0.2, 1.0};
    compare_row(head, numbers, 3, slack);
    if (p < 0.0)
        CHECK(numbers[0] >= 94.0 && numbers[0] <= 96.0);
    CHECK(numbers[0] > 92.5 && numbers[1] > (rule != NULL ? 94.0 : 94.8));
}

SV_TEST(shares)
{
    static const double shares[] = {-1.0, 0.03, 0.1, 0.5};
    const sv_stop_rule width = {
        .active = true, .of_index = true, .share_width = 0.15, .at_least = 50};
    const sv_stop_rule error = {
        .active = true, .of_index = true, .standard_error = 0.04, .at_least = 50};
    read_manual();
    for (size_t k = 0; k < sizeof shares / sizeof shares[0]; k++) {
        shares_row(shares[k], "n = 50", NULL, 50);
        shares_row(shares[k], "n = 100", NULL, 100);
        shares_row(shares[k], "width 0.15", &width, 0);
        shares_row(shares[k], "standard error 0.04", &error, 0);
    }
    give_manual();
}
