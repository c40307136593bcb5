# SPDX-License-Identifier: GPL-3.0-or-later
"""The command tolerance: threshold, units, continuation, exit codes."""
import csv
import json
import os
import signal
import subprocess
import time

from harness import check, close, contains, equal, folder, main, read, run, test, write

SHEET = """\
selvedge: 1
title: Small film
model: {name: qi_wu_zhang, m: -1, lattice_constant: 0.5 nm}
flake: {shape: rectangle, cells: [6, 6]}
disorder:
  - {name: vac, kind: vacancies, share: 0}
markers: {local_chern: {window: 0.5}}
ensemble: {seed: 3}
question:
  parameter: disorder.vac.share
  range: [0, 0.5]
  criterion: {quantity: local_chern.mean, within: 0.2}
  precision: 0.04
"""


def ask(text, *more, code=0, place=None):
    """(sheet, run folder, JSON) of a question."""
    top = folder()
    path, place = write(os.path.join(top, "sheet.yaml"), text), place or os.path.join(top, "run")
    return path, place, run("tolerance", path, "-o", place, "--json", *more, code=code).json()


@test
def a_threshold_in_the_units_of_the_lab():
    path, place, answer = ask(SHEET)
    equal((answer["selvedge"], answer["command"], answer["parameter"]),
          (1, "tolerance", "disorder.vac.share"))
    low, high = answer["tolerable"]["interval"]
    check(low < answer["tolerable"]["value"] < high and 0.0 < low and high < 0.5)
    check(0.5 * (high - low) <= 0.04 + 1e-12)
    equal(answer["tolerable"]["confidence"], 0.95)
    equal(answer["realisations"], sum(p["realisations"] for p in answer["points"]))
    # one position per cell of (0.5 nm)²
    close(answer["density"]["per_cm2"], answer["tolerable"]["value"] / 0.25e-14, 1e3)
    close(answer["density"]["mean_distance_nm"],
          0.5 * 0.5 / answer["tolerable"]["value"] ** 0.5, 1e-9)
    rows = list(csv.DictReader(read(os.path.join(place, "points.csv")).splitlines()))
    equal(len(rows), len(answer["points"]))
    equal(json.loads(read(os.path.join(place, "summary.json")))["tolerable"], answer["tolerable"])
    for ending in ("svg", "pdf", "png", "gp", "dat"):
        check(os.path.getsize(os.path.join(place, "figures", "tolerance." + ending)) > 0, ending)
    text = run("tolerance", path, "-o", place, code=0).out
    contains(" ".join(text.split()), "the mean of the local Chern marker stays within 0.2 of 0.97")
    check(all(len(line) < 80 for line in text.splitlines() if "/" not in line))


@test
def the_mean_at_the_threshold_is_the_limit():
    """Independent realisations at the value found: their mean lies where the criterion says."""
    path, _, answer = ask(SHEET)
    value = answer["tolerable"]["value"]
    place = os.path.join(folder(), "run")
    point = run("average", path, "-o", place, "--json", "-n", "400", "-s", "99", "--set",
                f"disorder.vac.share={value}", code=0).json()["points"][0]["markers"]["local_chern"]
    close(point["mean"], answer["clean"] - 0.2, 0.06 + 3 * point["standard_error"])


@test
def threads_and_repetition_change_nothing():
    path, place, one = ask(SHEET, "-j", "1")
    _, _, two = ask(SHEET, "-j", "2")
    again = run("tolerance", path, "-o", place, "--json", code=0).json()
    for answer in (one, two, again):
        answer.pop("timings")
    equal(two, one, "two threads")
    equal(again, one, "from the ledger")


@test
def a_killed_search_goes_on():
    path, _, whole = ask(SHEET)
    place = os.path.join(folder(), "run")
    program = os.environ["SELVEDGE"]
    kills = 0
    for _ in range(4):
        process = subprocess.Popen([program, "tolerance", path, "-o", place, "-j", "1", "-q"],
                                   stdout=subprocess.DEVNULL, stderr=subprocess.DEVNULL)
        time.sleep(0.15)
        process.send_signal(signal.SIGKILL)
        kills += process.wait() == -signal.SIGKILL
    check(kills > 0, "no run was killed in its work")
    answer = run("tolerance", path, "-o", place, "--json", code=0).json()
    for one in (answer, whole):
        one.pop("timings")
    equal(answer, whole)


@test
def every_marker_and_every_size():
    _, _, answer = ask(SHEET.replace("markers: {local_chern: {window: 0.5}}",
                                     "markers: {local_chern: {window: 0.5}, localizer: {}}")
                       + "  sizes: [[5, 5], [6, 6]]\n")
    equal([(row["marker"], row["cells"]) for row in answer["thresholds"]],
          [("local_chern", [5, 5]), ("localizer", [5, 5]), ("local_chern", [6, 6]),
           ("localizer", [6, 6])])
    equal(answer["extrapolation"]["limit"], None)
    contains(answer["extrapolation"]["reason"], "three")
    equal(answer["tolerable"], answer["thresholds"][2]["tolerable"])


@test
def a_budget_of_two_parameters():
    _, place, answer = ask(SHEET.replace("share: 0}\n",
                                         "share: 0}\n  - {name: pot, kind: onsite, distribution: "
                                         "box, width: 0, per: cell}\n")
                           + "  budget: {parameter: disorder.pot.width, values: [3, 0]}\n")
    values = [(row["disorder.pot.width"], row["tolerable"]["value"]) for row in answer["thresholds"]]
    equal([v[0] for v in values], [3, 0])
    check(values[0][1] < values[1][1], "more potential leaves room for more vacancies")
    contains(read(os.path.join(place, "figures", "tolerance.dat")), "second parameter")


@test
def questions_without_an_answer():
    never = run("tolerance", *_args(SHEET.replace("[0, 0.5]", "[0.6, 0.9]")), "--json", code=1)
    equal(never.json()["tolerable"]["state"], "fails everywhere")
    contains(never.err, "fails already at 0.6")
    always = run("tolerance", *_args(SHEET.replace("within: 0.2", "within: 3")), code=1)
    contains(always.out, "No limit found")
    contains(always.out, "Evidence:")


def _args(text):
    top = folder()
    return write(os.path.join(top, "sheet.yaml"), text), "-o", os.path.join(top, "run")


@test
def bad_questions():
    contains(run("tolerance", *_args(SHEET[:SHEET.index("question:")]), code=3).err, "asks nothing")
    args = _args(SHEET.replace("disorder.vac.share\n", "disorder.vac.sahre\n"))
    contains(run("tolerance", *args, code=3).err, "disorder.vac.share")
    check(not os.path.exists(args[2]), "something was written")
    contains(run("tolerance", args[0], code=2).err, "-o RUN")
    args = _args(SHEET)
    run("tolerance", *args, code=0)
    other = write(os.path.join(folder(), "other.yaml"), SHEET.replace("0.04", "0.05"))
    contains(run("tolerance", other, "-o", args[2], code=4).err, "question")


@test
def stopping_on_request():
    args = _args(SHEET.replace("precision: 0.04", "precision: 0.002"))
    run("tolerance", *args, "--time-limit", "0.2", code=7)
    check(os.path.exists(os.path.join(args[2], "ledger.sqlite")))


if __name__ == "__main__":
    main()
