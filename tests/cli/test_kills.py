# SPDX-License-Identifier: GPL-3.0-or-later
"""SIGKILL at random moments: what a reader has seen stays, nothing is counted twice, the numbers are
those of a run that was left alone. SV_TEST_KILLS sets the number of kills (6; 50 by hand)."""
import os
import random
import signal
import sqlite3
import subprocess
import time

from harness import check, equal, folder, main, run, test, write

SHEET = """\
selvedge: 1
title: Killed again and again
model: {name: qi_wu_zhang, m: -1}
flake: {shape: rectangle, cells: [8, 8]}
disorder:
  - {name: pot, kind: onsite, distribution: box, width: 1, per: cell}
markers: {local_chern: {window: 0.5}, bott: {}}
ensemble: {realisations: %d, seed: 3}
sweep:
  - {parameter: disorder.pot.width, values: [0.5, 6]}
"""
KILLS = int(os.environ.get("SV_TEST_KILLS", "6"))
TABLES = ("realisation", "outcome")


def rows(ledger, table):
    """Rows of a table as a reader sees them now; None while it cannot be read."""
    try:
        with sqlite3.connect("file:%s?mode=ro" % ledger, uri=True, timeout=0.2) as reader:
            return set(reader.execute("select * from %s" % table))
    except sqlite3.Error:
        return None  # not there yet, or a journal waits to be rolled back


def watch_and_kill(process, ledger, moment, known):
    """Looks at the ledger until `moment` seconds after new rows appear (or the start), then kills."""
    start, seen = time.monotonic(), set(known)
    after_rows = random.random() < 0.6
    while process.poll() is None:
        seen |= rows(ledger, "realisation") or set()
        waiting = after_rows and len(seen) == len(known) and time.monotonic() - start < 20
        if not waiting and time.monotonic() - start >= moment:
            process.send_signal(signal.SIGKILL)
            process.wait()
        elif waiting:
            start = max(start, time.monotonic() - 0.001) if len(seen) > len(known) else start
        time.sleep(0.002)
    return seen


@test
def kills_lose_nothing_and_repeat_nothing():
    random.seed(int(os.environ.get("SV_TEST_SEED", "1")))
    top = folder()
    realisations = 20 * KILLS
    path = write(os.path.join(top, "sheet.yaml"), SHEET % realisations)
    alone, place = os.path.join(top, "alone"), os.path.join(top, "killed")
    whole = run("average", path, "-o", alone, "--json", code=0).json()
    ledger, seen, killed, empty = os.path.join(place, "ledger.sqlite"), set(), 0, 0
    for turn in range(KILLS):
        process = subprocess.Popen([os.environ["SELVEDGE"], "average", path, "-o", place, "-j", str(turn % 3 + 1)],
                                   stdout=subprocess.DEVNULL, stderr=subprocess.DEVNULL)
        seen = watch_and_kill(process, ledger, random.random() * (0.08 if turn % 4 == 0 else 0.4), seen)
        killed += process.returncode == -signal.SIGKILL
        if not os.path.exists(os.path.join(place, "sheet.resolved.yaml")):
            empty += 1
            continue
        # A reading command copes with what the kill left and sees every row that was seen before.
        info = run("info", place, "--json", code=0).json()
        check(info["realisations"] >= len(seen), "%d rows, %d were seen" % (info["realisations"], len(seen)))
    check(killed >= KILLS // 2 and empty < KILLS, "%d of %d were killed, %d too early" % (killed, KILLS, empty))
    answer = run("average", path, "-o", place, "--json", code=0).json()
    equal(answer["points"], whole["points"], "points against an undisturbed run")
    for table in TABLES:
        equal(rows(ledger, table), rows(os.path.join(alone, "ledger.sqlite"), table), "table " + table)
    last = rows(ledger, "realisation")
    equal(len(last), 2 * realisations, "rows")
    check(seen <= last, "%d rows that were there before a kill are gone or changed" % len(seen - last))
    events = run("info", place, "--json", code=0).json()["events"]
    whats = [event["what"] for event in events]
    # A kill may come before its process has noted that it goes on: then there is nothing to note as lost.
    check(whats.count("lost") >= (killed - empty) // 2, "events: %r" % whats)
    equal(whats.count("start") + whats.count("continue"), whats.count("lost") + whats.count("end"), "ends and losses")
    print("# %d killed, %d before the run began, %d rows seen before a kill" % (killed, empty, len(seen)))


main()
