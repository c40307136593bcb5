/* SPDX-License-Identifier: GPL-3.0-or-later */
/* What happened to a run, and what its realisations cost. */
#include <sys/wait.h>
#include <unistd.h>

#include "fixture.h"
#include "selvedge/present.h"

static sv_run *open_writing(const char *command_line)
{
    sv_run_identity identity = fixture_identity();
    sv_run *run = NULL;
    identity.command_line = command_line;
    CHECK_OK(sv_run_open(test_context(), fixture_folder, &identity, false, &run));
    return run;
}

static sv_run_history read_history(void)
{
    sv_run *run = NULL;
    sv_run_history history = {0};
    CHECK_OK(sv_run_open_read(test_context(), fixture_folder, &run));
    if (run != NULL)
        CHECK_OK(sv_run_history_read(test_context(), run, &history));
    sv_run_close(test_context(), run);
    return history;
}

SV_TEST(every_writing_leaves_its_beginning_and_its_end)
{
    snprintf(fixture_folder, sizeof fixture_folder, "%s", test_scratch("history"));
    sv_run *run = open_writing("selvedge average a.yaml -o run");
    CHECK_OK(sv_run_event(test_context(), run, "stop", "SIGTERM after 3 of 9 realisations"));
    sv_run_close(test_context(), run);
    run = open_writing("selvedge average a.yaml\n-o run \x1b[31m\xff");
    sv_run_close(test_context(), run);
    sv_run_history h = read_history();
    const char *const whats[] = {"start", "stop", "end", "continue", "end"};
    const int64_t sessions[] = {1, 1, 1, 4, 4};
    CHECK_INT(h.n, 5);
    for (sv_index k = 0; k < h.n && k < 5; k++) {
        CHECK_INT(h.events[k].number, k + 1);
        CHECK_INT(h.events[k].session, sessions[k]);
        CHECK_TEXT(h.events[k].what, whats[k]);
        CHECK(strlen(h.events[k].time) == 20 && h.events[k].time[10] == 'T');
    }
    CHECK_TEXT(h.events[0].command_line, "selvedge average a.yaml -o run");
    CHECK_TEXT(h.events[0].version, "0.1.0");
    CHECK_TEXT(h.events[0].kernel, "openblas pthread test");
    CHECK(strncmp(h.events[0].libraries, "invented 1.0, sqlite 3.", 23) == 0);
    CHECK(h.events[0].host[0] != '\0' && h.events[0].process == getpid());
    CHECK(h.events[0].threads == 2 && h.events[0].ranks == 1);
    CHECK_TEXT(h.events[1].note, "SIGTERM after 3 of 9 realisations");
    CHECK(h.events[1].command_line[0] == '\0' && h.events[1].process == 0);
    /* What comes from a command line is fit for a terminal. */
    CHECK_TEXT(h.events[3].command_line, "selvedge average a.yaml?-o run ?[31m?");
    sv_run_history_free(test_context(), &h);
    sv_run_history_free(test_context(), &h);
}

/* A writing that was killed has no end; the next one says so, once. */
SV_TEST(a_killed_writing_is_noted_as_lost)
{
    snprintf(fixture_folder, sizeof fixture_folder, "%s", test_scratch("lost"));
    fflush(NULL);
    const pid_t child = fork();
    if (child == 0) {
        sv_run *run = open_writing("selvedge average killed");
        _exit(run == NULL);
    }
    CHECK(waitpid(child, NULL, 0) == child);
    for (int k = 0; k < 2; k++)
        sv_run_close(test_context(), open_writing("selvedge average again"));
    sv_run_history h = read_history();
    const char *const whats[] = {"start", "lost", "continue", "end", "continue", "end"};
    CHECK_INT(h.n, 6);
    for (sv_index k = 0; k < h.n && k < 6; k++)
        CHECK_TEXT(h.events[k].what, whats[k]);
    CHECK(h.n > 1 && h.events[1].session == 1);
    CHECK(h.n > 1 && strstr(h.events[1].note, "event 1 has no end") != NULL);
    sv_run_history_free(test_context(), &h);
}

/* Two runs of one sheet agree in the tables of numbers; what they cost stands elsewhere. */
SV_TEST(costs_are_kept_apart_from_the_numbers)
{
    sv_context *context = test_context();
    sv_run *run = NULL;
    sqlite3 *ledger = NULL;
    char attach[1400];
    fixture_fresh_run("cost", 2);
    snprintf(attach, sizeof attach, "ATTACH '%s' AS other", fixture_path("ledger.sqlite"));
    snprintf(fixture_folder, sizeof fixture_folder, "%s", test_scratch("cost2"));
    run = open_writing("");
    for (int32_t point = 2; point >= 0; point--)
        for (int64_t k = 0; k < 2; k++) {
            sv_record record = fixture_record(point, k);
            record.seconds += 5.0;
            record.thread = 3;
            snprintf(record.host, sizeof record.host, "elsewhere");
            CHECK_OK(sv_run_put(context, &record, run));
            record.processor_seconds = 99.0; /* computed twice: the same, whatever it cost */
            CHECK_OK(sv_run_put(context, &record, run));
        }
    sv_run_close(context, run);
    CHECK_INT(sqlite3_open(fixture_path("ledger.sqlite"), &ledger), SQLITE_OK);
    CHECK_INT(sqlite3_exec(ledger, attach, NULL, NULL, NULL), SQLITE_OK);
    static const struct {
        const char *sql;
        int64_t rows;
    } questions[] = {
        {"SELECT count(*) FROM (SELECT * FROM realisation EXCEPT SELECT * FROM other.realisation)",
         0},
        {"SELECT count(*) FROM (SELECT * FROM outcome EXCEPT SELECT * FROM other.outcome)", 0},
        {"SELECT count(*) FROM realisation", 6},
        {"SELECT count(*) FROM cost WHERE host = 'elsewhere' AND thread = 3 AND seconds > 5 AND "
         "processor_seconds < 1 AND event = 1",
         6},
    };
    for (size_t i = 0; i < sizeof questions / sizeof *questions; i++) {
        sqlite3_stmt *statement = NULL;
        CHECK_INT(sqlite3_prepare_v2(ledger, questions[i].sql, -1, &statement, NULL), SQLITE_OK);
        CHECK_INT(sqlite3_step(statement), SQLITE_ROW);
        CHECK_INT(sqlite3_column_int64(statement, 0), questions[i].rows);
        sqlite3_finalize(statement);
    }
    sqlite3_close(ledger);
}

/* Reasons are cut to fit and may be cut inside a character; what is stored is well formed. */
SV_TEST(texts_are_stored_fit_to_be_shown)
{
    sv_context *context = test_context();
    static const char *const raw[] = {"cut in \xe2\x80",     "line\nfeed\tand \x1b[0m",
                                      "\xc0\xaf long",       "\xed\xa0\x80",
                                      "turned \xe2\x80\xae", "good: \xe2\x80\xa6 \xc3\xa9"};
    static const char *const plain[] = {"cut in ??", "line?feed?and ?[0m",         "?? long", "???",
                                        "turned ?",  "good: \xe2\x80\xa6 \xc3\xa9"};
    snprintf(fixture_folder, sizeof fixture_folder, "%s", test_scratch("texts"));
    sv_run *run = open_writing("");
    for (int k = 0; k < 6; k++) {
        sv_record record = fixture_record(0, k);
        snprintf(record.outcomes[0].reason, sizeof record.outcomes[0].reason, "%s", raw[k]);
        CHECK_OK(sv_run_put(context, &record, run));
        CHECK_OK(sv_run_put(context, &record, run));
    }
    sv_ensemble e = fixture_ensemble(3, 6);
    sv_index loaded = 0;
    CHECK_OK(sv_run_load(context, run, &e, &loaded));
    CHECK_INT(loaded, 6);
    for (int k = 0; k < 6; k++) {
        const sv_kept_outcome *o = sv_ensemble_outcome(&e, 0, k, 0);
        CHECK_TEXT(o == NULL ? "" : sv_ensemble_text(&e, o->reason), plain[k]);
    }
    sv_ensemble_free(context, &e);
    sv_run_close(context, run);
}

static char *print_to_text(const sv_provenance *provenance)
{
    char *text = NULL;
    size_t size = 0;
    FILE *stream = open_memstream(&text, &size);
    sv_provenance_print(provenance, stream);
    fclose(stream);
    return text;
}

/* Sums by hand: 3 points of 4 realisations, of each point realisation 1 unresolved for bott;
 * seconds 0.1 + 0.001 k, processor 0.09 + 0.001 point, peak 10^6 + k, one host per point. */
SV_TEST(health_and_cost_are_added_up)
{
    sv_context *context = test_context();
    sv_run *run = NULL;
    sv_run_health h = {0};
    sv_run_history history = {0};
    char *json = NULL;
    fixture_fresh_run("health", 4);
    CHECK_OK(sv_run_open_read(context, fixture_folder, &run));
    CHECK_OK(sv_run_health_read(context, run, &h));
    CHECK_OK(sv_run_history_read(context, run, &history));
    CHECK(h.realisations == 12 && h.failed == 0 && h.n_markers == 2);
    CHECK_TEXT(h.markers[1].marker, "bott");
    CHECK(h.markers[0].verdicts[SV_RESOLVED] == 12 && h.markers[1].verdicts[SV_RESOLVED] == 9);
    CHECK_INT(h.markers[1].verdicts[SV_UNRESOLVED], 3);
    CHECK_CLOSE(h.markers[1].numerical_error, 1e-13, 0.0); /* the infinite one is unresolved */
    CHECK(h.markers[0].n_engines == 1 && h.markers[0].engines[0].count == 12);
    CHECK(h.markers[0].engines[0].degrees[0] == 41 && h.markers[0].engines[0].degrees[1] == 41);
    CHECK_CLOSE(h.seconds, 12 * 0.1 + 3 * 0.006, 1e-12);
    CHECK_CLOSE(h.processor_seconds, 12 * 0.09 + 4 * 0.003, 1e-12);
    CHECK(h.peak_bytes == 1000003 && h.n_workers == 3 && h.workers[2].realisations == 4);
    CHECK_TEXT(h.workers[2].host, "node2");
    CHECK(h.longest_realisation == 3 && h.longest_point == 0);
    const sv_provenance provenance = {
        .folder = "the/folder", .run = run, .history = &history, .health = &h};
    CHECK_OK(sv_provenance_json(context, &provenance, &json));
    char *text = print_to_text(&provenance);
    CHECK(strstr(json, "\"unresolved\": 3") != NULL && strstr(json, "\"process\": ") != NULL);
    CHECK(strstr(text, "node2") != NULL && strstr(text, "dense, degree 41") != NULL);
    CHECK(strstr(text, "selvedge average sheet.yaml -o run") != NULL);
    free(text);
    sv_give(context, json);
    sv_run_history_free(context, &history);
    sv_run_health_free(context, &h);
    sv_run_health_free(context, &h);
    sv_run_close(context, run);
}
