# SPDX-License-Identifier: GPL-3.0-or-later
"""Ranks of an MPI job: the numbers of one process, one voice, kills and signals survived."""
import functools
import glob
import json
import os
import shutil
import signal
import sqlite3
import subprocess
import sys
import time

from harness import check, contains, equal, folder, main, read, run, run_any, test, write

# Open MPI on one machine, in a container too: as root, more ranks than cores, shared memory only.
ENVIRONMENT = {"OMPI_ALLOW_RUN_AS_ROOT": "1", "OMPI_ALLOW_RUN_AS_ROOT_CONFIRM": "1",
               "OMPI_MCA_rmaps_base_oversubscribe": "1", "OMPI_MCA_btl": "self,vader",
               "OMPI_MCA_plm_rsh_agent": ""}
SHEET = """\
selvedge: 1
title: Ranks
model: {name: qi_wu_zhang, m: -1}
flake: {shape: rectangle, cells: [7, 7]}
disorder:
  - {name: pot, kind: onsite, distribution: box, width: 1, per: cell}
markers: {local_chern: {window: 0.5}, bott: {}}
ensemble: {realisations: 12, seed: 3}
sweep:
  - {parameter: disorder.pot.width, values: [0.5, 6]}
"""
LONG = SHEET.replace("[7, 7]", "[11, 11]").replace("realisations: 12", "realisations: 30")


def command(ranks, *arguments):
    return ["mpirun", "-n", str(ranks), os.environ["SELVEDGE"], *map(str, arguments)]


def ranks(n, *arguments, code=None, timeout=90):
    result = run_any(command(n, *arguments), env=ENVIRONMENT, timeout=timeout)
    if code is not None:
        check(result.code == code, "%d ranks: exit code %d, expected %d\n%s" % (n, result.code, code, result.err))
    return result


def new_sheet(text=SHEET):
    top = folder()
    return write(os.path.join(top, "sheet.yaml"), text), os.path.join(top, "run")


@functools.lru_cache(maxsize=None)
def alone(text=SHEET):
    path, place = new_sheet(text)
    return run("average", path, "-o", place, "--json", code=0).json()["points"]


@test
def any_number_of_ranks_gives_the_numbers_of_one_process():
    for n in (1, 2, 3):
        path, place = new_sheet()
        answer = ranks(n, "average", path, "-o", place, "--json", "-j", "1" if n < 3 else "2", code=0)
        equal(answer.json()["points"], alone(), "points of %d ranks" % n)
    once = run("average", path, "-o", place, "--json", code=0).json()
    equal(once["points"], alone(), "the run of three ranks, opened by one process")


@test
def only_rank_0_speaks():
    path, place = new_sheet(SHEET.replace("cells: [7, 7]", "cells: [7, x]"))
    bad = ranks(3, "average", path, "-o", place, code=3)
    equal(bad.err.count("sheet.yaml:4:"), 1, "messages about the sheet")
    check(not os.path.exists(place), "a folder was made")
    equal(ranks(2, "average", path, code=2).err.count("needs a run folder"), 1, "usage messages")
    equal(ranks(2, "check", new_sheet()[0], code=0).out.count("title: Ranks"), 1, "resolved sheets of check")
    path, place = new_sheet(SHEET.replace("seed: 3", "seed: 4"))
    run("average", path, "-o", place, "-n", "1", code=0)
    path, _ = new_sheet()
    equal(ranks(2, "average", path, "-o", place, code=4).err.count("another run"), 1, "other run")


@test
def a_stop_rule_holds_at_the_same_place():
    text = SHEET.replace("seed: 3", "seed: 3, stop: {standard_error: 0.05, of: local_chern, at_least: 4}")
    path, place = new_sheet(text.replace("realisations: 12", "realisations: 40"))
    first = run("average", path, "-o", place, "--json", code=0).json()["points"]
    check(first[0]["realisations"] < 40, "the rule never held")
    _, other = new_sheet()
    equal(ranks(2, "average", path, "-o", other, "--json", code=0).json()["points"], first, "points")


@test
def tasks_of_two_ranks_merge():
    path, place = new_sheet()
    parts = [os.path.join(os.path.dirname(path), "part-%d" % k) for k in (1, 2)]
    for k, part in enumerate(parts, 1):
        ranks(2, "average", path, "-o", part, "--task", "%d/2" % k, "-j", "1", code=0)
    equal(run("merge", place, *parts, "--json", code=0).json()["points"], alone(), "points")


def children_of(process):
    """Process numbers of the ranks mpirun has started."""
    found = []
    for path in glob.glob("/proc/[0-9]*/stat"):
        try:
            fields = read(path).rsplit(")", 1)[1].split()
            if int(fields[1]) == process.pid:
                found.append(int(path.split("/")[2]))
        except (OSError, IndexError):
            pass  # it has ended meanwhile
    return sorted(found)


def wait_for_rows(place, n):
    ledger = "file:%s?mode=ro" % os.path.join(place, "ledger.sqlite")
    for _ in range(1500):
        time.sleep(0.02)
        try:
            with sqlite3.connect(ledger, uri=True) as reader:
                if reader.execute("select count(*) from realisation").fetchone()[0] >= n:
                    return
        except sqlite3.Error:
            pass  # not there yet, or just being written
    check(False, "no %d realisations after 30 s" % n)


def start(path, place, n=2):
    # Far more than is asked for later: it cannot be done before the signal. The run keeps the rest.
    process = subprocess.Popen(command(n, "average", path, "-o", place, "-j", "1", "-n", "100000"), env={**os.environ, **ENVIRONMENT},
                               stdout=subprocess.DEVNULL, stderr=subprocess.DEVNULL)
    wait_for_rows(place, 3)
    return process


@test
def a_killed_rank_ends_the_job_and_the_run_goes_on():
    for victim in (0, 1):
        path, place = new_sheet(LONG)
        process = start(path, place)
        os.kill(children_of(process)[victim], signal.SIGKILL)
        check(process.wait(timeout=60) != 0, "the job ended with 0 after a rank was killed")
        answer = run("average", path, "-o", place, "--json", code=0).json()
        equal(answer["points"], alone(LONG), "continued by one process")


@test
def signals_reach_all_ranks():
    path, place = new_sheet(LONG)
    process = start(path, place)
    process.send_signal(signal.SIGUSR1)
    equal(process.wait(timeout=60), 7, "exit code after SIGUSR1 to mpirun")
    process = start(path, place)
    process.send_signal(signal.SIGTERM)  # Open MPI ends the job itself and has its own exit code
    check(process.wait(timeout=60) != 0, "exit code 0 after SIGTERM to mpirun")
    stopped = ranks(2, "average", path, "-o", place, "-j", "1", "-n", "100000", "--time-limit", "0.2",
                    code=7)
    equal(stopped.err.count("stopped with"), 1, "words about stopping")
    answer = ranks(3, "average", path, "-o", place, "--json", "-j", "1", code=0).json()
    equal(answer["points"], alone(LONG), "continued by three ranks")


if shutil.which("mpirun") is None or not json.loads(run("info", "--json").out).get("mpi"):
    print("1..0 # SKIP no MPI launcher, or a build without MPI")
    sys.exit(0)
main()
