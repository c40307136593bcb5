# SPDX-License-Identifier: GPL-3.0-or-later
"""Runs: results as documented, continued, repeated, refused, independent of threads."""
import functools
import json
import math
import os
import re
import shutil
import signal
import sqlite3
import subprocess
import time

from harness import check, close, contains, equal, folder, main, read, run, test, write

SWEEP = """\
selvedge: 1
title: Sweep of the width
model: {name: qi_wu_zhang, m: -1}
flake: {shape: rectangle, cells: [6, 6]}
disorder:
  - {name: vac, kind: vacancies, share: 0.02}
  - {name: pot, kind: onsite, distribution: box, width: 1, per: cell}
markers: {local_chern: {window: 0.5}, bott: {}}
ensemble: {realisations: 5, seed: 3}
sweep:
  - {parameter: disorder.pot.width, values: [0.5, 1.5, 6]}
"""


def new_run(text=SWEEP, *more, code=0):
    """(sheet, run folder, JSON) of a fresh run."""
    top = folder()
    path, place = write(os.path.join(top, "sheet.yaml"), text), os.path.join(top, "run")
    return path, place, run("average", path, "-o", place, "--json", *more, code=code).json()


def snapshot(place):
    """Contents of the files of a run that are text."""
    return {name: read(os.path.join(place, name)) for name in sorted(os.listdir(place))
            if name.endswith((".json", ".yaml", ".csv"))}


@test
def results_have_the_documented_shape():
    _, place, answer = new_run()
    equal((answer["selvedge"], answer["command"], answer["title"]), (1, "average", "Sweep of the width"))
    equal([point["parameters"] for point in answer["points"]],
          [{"disorder.pot.width": width} for width in (0.5, 1.5, 6)], "parameters")
    for point in answer["points"]:
        equal(point["realisations"], 5, "realisations")
        local = point["markers"]["local_chern"]
        low, high = local["interval"]
        check(low <= local["mean"] <= high, "interval %r" % local)
        equal((local["confidence"], local["unresolved"], local["engine"]), (0.95, 0, "dense"), "pedigree")
        close(local["standard_error"], local["deviation"] / math.sqrt(5), 1e-12, "standard error")
        # Student's t for 4 degrees of freedom at 97.5 %: 2.776445 (any table of quantiles).
        close((high - low) / 2, 2.776445 * local["standard_error"], 1e-6 * (high - low), "half width")
        check(0 <= local["numerical_error"] < 1e-8 and local["estimator_error"] == 0, "errors")
        bott = point["markers"]["bott"]
        equal(sum(share["count"] for share in bott["shares"]) + bott["unresolved"], 5, "counts")
        for share in bott["shares"]:
            check(type(share["index"]) is int, "an index must be an integer")
            close(share["share"], share["count"] / 5, 1e-12, "share")
            check(share["interval"][0] <= share["share"] <= share["interval"][1], "interval")
        check(bott["bounds"][0] <= bott["mean"] <= bott["bounds"][1], "bounds")
    summary = json.loads(read(os.path.join(place, "summary.json")))
    equal(summary["points"], answer["points"], "summary.json")


@test
def without_a_sweep_there_is_one_point():
    _, _, answer = new_run(SWEEP[:SWEEP.index("sweep:")])
    equal([point["parameters"] for point in answer["points"]], [{}], "parameters")


@test
def a_run_is_continued_not_repeated():
    path, place, first = new_run(SWEEP, "-n", "3")
    _, _, fresh = new_run()
    more = run("average", path, "-o", place, "--json", code=0).json()
    equal(more["points"], fresh["points"], "3 + 2 realisations against 5")
    check(first["points"] != more["points"], "two more realisations change the mean")
    again = run("average", path, "-o", place, "--json", code=0).json()
    equal(again["points"], more["points"], "a third call")


LONG = SWEEP.replace("realisations: 5", "realisations: 25").replace("[6, 6]", "[11, 11]")


@functools.lru_cache(maxsize=1)
def uninterrupted():
    return new_run(LONG)[2]["points"]


def finish(path, place):
    """Continues an interrupted run to its end and compares it with one that was left alone."""
    continued = run("average", path, "-o", place, "--json", code=0).json()
    equal(continued["points"], uninterrupted(), "continued against uninterrupted")


@test
def a_time_limit_leaves_a_run_to_continue():
    top = folder()
    path, place = write(os.path.join(top, "sheet.yaml"), LONG), os.path.join(top, "run")
    stopped = run("average", path, "-o", place, "--time-limit", "0.2", "-j", "1", code=7)
    check(stopped.err != "", "no word about stopping")
    finish(path, place)


@test
def signals_leave_a_run_to_continue():
    # SIGKILL cannot be handled: what was written by then must still be a sound ledger.
    for sent, expected in ((signal.SIGTERM, 7), (signal.SIGINT, 7), (signal.SIGKILL, -9)):
        top = folder()
        path, place = write(os.path.join(top, "sheet.yaml"), LONG), os.path.join(top, "run")
        process = subprocess.Popen([os.environ["SELVEDGE"], "average", path, "-o", place, "-j", "1"],
                                   stdout=subprocess.DEVNULL, stderr=subprocess.DEVNULL)
        wait_for_records(os.path.join(place, "ledger.sqlite"))
        process.send_signal(sent)
        equal(process.wait(timeout=60), expected, "exit code after signal %d" % sent)
        finish(path, place)


def wait_for_records(ledger):
    """Until a first realisation stands in the ledger, at most some seconds."""
    for _ in range(500):
        time.sleep(0.01)
        if not os.path.exists(ledger):
            continue
        try:
            with sqlite3.connect("file:%s?mode=ro" % ledger, uri=True) as reader:
                if reader.execute("select count(*) from realisation").fetchone()[0]:
                    return
        except sqlite3.Error:
            pass  # not yet a database, or just being written
    check(False, "no realisation after 5 s")


@test
def a_dry_run_writes_nothing():
    top = folder()
    path, place = write(os.path.join(top, "sheet.yaml"), SWEEP), os.path.join(top, "run")
    run("average", path, "-o", place, "--dry-run", code=0)
    equal(os.listdir(top), ["sheet.yaml"], "files")


def believed_error(marker, n):
    """Standard error of the stop rule (data/manual/statistics.md): skewed values count as wider."""
    plain = marker["skewness"] * (n - 2) / (n * (n - 1)) ** 0.5
    return marker["standard_error"] * (1 + 5 * plain ** 2 / n) ** 0.5


@test
def the_stop_rule_ends_at_the_first_realisation_that_holds():
    text = SWEEP[:SWEEP.index("sweep:")].replace(
        "realisations: 5, seed: 3",
        "realisations: 80, seed: 3, stop: {standard_error: 0.01, of: local_chern, at_least: 10}")
    _, _, stopped = new_run(text, "-j", "1")
    count = stopped["points"][0]["realisations"]
    check(10 <= count < 80, "stopped after %d" % count)
    chern = stopped["points"][0]["markers"]["local_chern"]
    check(chern["standard_error"] <= believed_error(chern, count) <= 0.01, "standard error")
    _, _, parallel = new_run(text, "-j", "2")
    equal(parallel["points"], stopped["points"], "the rule with two threads")
    # One realisation fewer must not have satisfied the rule.
    without = re.sub(r", stop: {[^}]*}", "", text)
    _, _, shorter = new_run(without, "-n", str(count - 1))
    if count > 10:
        chern = shorter["points"][0]["markers"]["local_chern"]
        check(believed_error(chern, count - 1) > 0.01, "stopped late")
    _, _, same = new_run(without, "-n", str(count))
    equal(same["points"][0]["markers"], stopped["points"][0]["markers"], "the same realisations count")
    _, _, easy = new_run(text.replace("standard_error: 0.01", "standard_error: 1"))
    equal(easy["points"][0]["realisations"], 10, "a target met from the start, at least 10")


@test
def a_run_stops_when_a_share_is_known():
    text = SWEEP[:SWEEP.index("sweep:")].replace(
        "realisations: 5, seed: 3",
        "realisations: 400, seed: 3, stop: {share_width: 0.2, of: bott, at_least: 10}").replace(
            "width: 1", "width: 7")
    _, _, stopped = new_run(text, "-j", "2")
    count = stopped["points"][0]["realisations"]

    def width(answer):
        most = max(answer["points"][0]["markers"]["bott"]["shares"], key=lambda share: share["count"])
        return most["interval"][1] - most["interval"][0]
    check(20 < count < 200 and width(stopped) <= 0.2, "%d realisations" % count)
    without = re.sub(r", stop: {[^}]*}", "", text)
    check(width(new_run(without, "-n", str(count - 1))[2]) > 0.2, "stopped late")


@test
def a_run_stops_when_its_time_is_used_up():
    text = SWEEP.replace("realisations: 5, seed: 3",
                         "realisations: 100000, seed: 3, stop: {time: 600 ms, at_least: 4}")
    path, place, answer = new_run(text, "-j", "2")
    counts = [point["realisations"] for point in answer["points"]]
    check(all(4 <= count < 20000 for count in counts) and answer["complete"], "counts %s" % counts)
    ledger = sqlite3.connect(os.path.join(place, "ledger.sqlite"))
    for number, count in enumerate(counts):
        seconds = [row[0] for row in ledger.execute(
            "SELECT seconds FROM cost WHERE point = ? ORDER BY realisation", (number,))]
        close(sum(seconds[:count - 1]), 0.2, 0.2 if count == 4 else 0.05, "seconds of point %d" % number)
        check(sum(seconds[:count]) >= 0.2 or count == 4, "stopped early")
    # The records decide: the same again counts the same.
    again = run("average", path, "-o", place, "--json", code=0).json()
    equal(again["points"], answer["points"], "the run continued")


@test
def threads_change_nothing():
    _, _, one = new_run(SWEEP, "-j", "1")
    _, _, two = new_run(SWEEP, "-j", "2")
    _, _, three = new_run(SWEEP, "-j", "3")
    equal(one["points"], two["points"], "1 and 2 threads")
    equal(one["points"], three["points"], "1 and 3 threads")


@test
def the_seed_counts_and_realisations_differ():
    _, _, one = new_run(SWEEP, "-s", "3")
    _, _, default = new_run(SWEEP)
    _, _, other = new_run(SWEEP, "-s", "4")
    equal(one["points"], default["points"], "the seed of the sheet, written out")
    check(one["points"] != other["points"], "another seed gives the same numbers")
    check(one["points"][0]["markers"]["local_chern"]["deviation"] > 0, "all realisations are equal")


@test
def another_identity_is_refused_unless_forced():
    path, place, _ = new_run()
    kept = snapshot(place)
    for change in (("-s", "4"), ("--set", "model.m=-1.1"), ("--set", "flake.cells=[6, 7]")):
        result = run("average", path, "-o", place, *change, code=4)
        contains(result.err, "error", "message")
        equal(snapshot(place), kept, "the refused run changed")


@test
def a_marker_more_is_another_identity():
    path, place, _ = new_run()
    with_bott = re.sub(r"markers:.*", "markers: {local_chern: {}, bott: {}, localizer: {}}", read(path), count=1)
    check(with_bott != read(path), "the sheet has no markers line to change")
    other = write(os.path.join(folder(), "more.yaml"), with_bott)
    result = run("average", other, "-o", place, code=4)
    contains(result.err, "localizer", "message")


@test
def force_records_the_change():
    path, place, _ = new_run()
    forced = run("average", path, "-o", place, "-s", "4", "--force", code=0)
    contains(forced.err, "ensemble.seed = 4", "warning")
    ledger = sqlite3.connect(os.path.join(place, "ledger.sqlite"))
    notes = [note for (note,) in ledger.execute("select note from event where what like 'identity%'")]
    ledger.close()
    check(len(notes) == 1 and "ensemble.seed = 3" in notes[0], "events: %r" % notes)
    # Numbers of the former seed are kept aside and none of them is averaged under the new one.
    check(os.path.exists(os.path.join(place, "ledger.old-1.sqlite")), "the old ledger is gone")
    fresh = os.path.join(folder(), "fresh")
    run("average", path, "-o", fresh, "-s", "4", code=0)
    summaries = [json.loads(read(os.path.join(one, "summary.json"))) for one in (place, fresh)]
    equal(summaries[0]["points"], summaries[1]["points"], "points after --force")


@test
def a_file_that_changed_is_another_identity():
    top = folder()
    write(os.path.join(top, "defects.csv"), "x,y\n1,1\n2,3\n")
    text = re.sub(r"share: 0.02", "file: defects.csv", SWEEP)
    path, place = write(os.path.join(top, "sheet.yaml"), text), os.path.join(top, "run")
    run("average", path, "-o", place, code=0)
    write(os.path.join(top, "defects.csv"), "x,y\n1,1\n2,4\n")
    run("average", path, "-o", place, code=4)


@test
def common_random_numbers_along_a_sweep():
    # A width of 0 must give the clean flake, whatever the seed; widths rescale one field.
    text = re.sub(r"values: .*", "values: [0]}", SWEEP).replace("share: 0.02", "share: 0")
    _, _, answer = new_run(text)
    local = answer["points"][0]["markers"]["local_chern"]
    close(local["deviation"], 0.0, 1e-12, "deviation of identical realisations")


@test
def a_level_on_the_fermi_energy_is_unresolved():
    # Haldane, mass 0, phi = 90 deg: the spectrum is symmetric for every set of vacancies, so an odd
    # number of sites has an exact zero level (sz H* sz = -H, elementary).
    text = ("selvedge: 1\ntitle: odd\nmodel: {name: haldane, t1: 1, t2: 0.2, phi: 90 deg, mass: 0}\n"
            "flake: {shape: parallelogram, cells: [6, 6]}\n"
            "disorder:\n  - {name: vac, kind: vacancies, count: 1}\n"
            "markers: {local_chern: {}, bott: {}}\nensemble: {realisations: 3}\n")
    path, _, answer = new_run(text, code=1)
    for name in ("local_chern", "bott"):
        marker = answer["points"][0]["markers"][name]
        equal((marker["mean"], marker["unresolved"]), (None, 3), name)
        check(marker["reason"] != "", "no reason")
    filled = run("map", path, "--json", "--set", "occupation.electrons=36", code=0).json()
    check(filled["markers"]["bott"]["resolved"] in (True, False), "a filling decides")
    # The same flake without the vacancy has no such level.
    clean = run("map", path, "--json", "--set", "disorder.vac.count=0", code=0).json()
    equal((clean["markers"]["bott"]["index"], clean["markers"]["bott"]["resolved"]), (1, True), "clean")


@test
def a_marker_without_a_torus_is_null_with_a_reason():
    path = write(os.path.join(folder(), "sheet.yaml"),
                 "selvedge: 1\ntitle: disc\nmodel: {name: qi_wu_zhang, m: -1}\n"
                 "flake: {shape: disc, radius: 4.2}\nmarkers: {local_chern: {}, bott: {}}\n")
    answer = run("map", path, "--json", code=0).json()
    bott = answer["markers"]["bott"]
    check(bott["index"] is None and bott["reason"], "Bott index of a disc: %r" % bott)
    close(answer["markers"]["local_chern"]["window_mean"], 1.0, 0.05, "bulk marker")


@test
def report_draws_what_it_says():
    _, place, _ = new_run()
    result = run("report", place, code=0)
    figures = re.findall(r"\S+\.(?:pdf|png|svg|html)\b", result.out)
    check(figures, "no figure named: %s" % result.out)
    for figure in figures:
        check(os.path.getsize(figure) > 500, "%s is missing or empty" % figure)


@test
def report_refuses_what_is_no_run():
    for place in (folder(), "no-such-run"):
        result = run("report", place)
        check(result.code in (3, 4), "exit code %d" % result.code)
        check(result.err != "", "no message")


@test
def a_damaged_ledger_is_an_error_not_a_crash():
    path, place, _ = new_run()
    ledgers = [name for name in os.listdir(place) if name.endswith((".sqlite", ".db", ".sqlite3"))]
    check(ledgers, "no ledger among %r" % os.listdir(place))
    for name in ledgers:
        write(os.path.join(place, name), "this is no database" * 100)
    result = run("average", path, "-o", place, code=4)
    contains(result.err, "error", "message")
    shutil.rmtree(place)
    run("average", path, "-o", place, code=0)


main()
