#!/usr/bin/env python3
# SPDX-License-Identifier: GPL-3.0-or-later
"""What it costs to hand out realisations: threads 1 and 2, ranks 1 and 2, overhead, and how many ranks rank 0
can feed.

    workers.py SELVEDGE [--seconds S] [--side L]

An ensemble of about S seconds on one worker (default 60) of flakes of L × L cells (default 10: some 10 ms each)
is run with one and two threads and, where there is MPI, one and two ranks. Beside the wall time stands the
overhead: processor time beyond that of the realisations, what a short run spends on starting taken off, over
theirs. Wall times need an idle machine; processor times hardly do. The simulation takes the measured cost of a result at
rank 0 (messages, ledger, disk) and its wait for the disk.
"""
import argparse
import heapq
import os
import resource
import shutil
import sqlite3
import subprocess
import tempfile
import time

SHEET = """\
selvedge: 1
title: Benchmark of workers
model: {{name: qi_wu_zhang, m: -1}}
flake: {{shape: rectangle, cells: [{side}, {side}]}}
disorder: [{{name: pot, kind: onsite, distribution: box, width: 4, per: cell}}]
markers: {{local_chern: {{window: 0.5}}}}
ensemble: {{realisations: {n}, seed: 1}}
"""
MPI = {"OMPI_ALLOW_RUN_AS_ROOT": "1", "OMPI_ALLOW_RUN_AS_ROOT_CONFIRM": "1",
       "OMPI_MCA_rmaps_base_oversubscribe": "1", "OMPI_MCA_btl": "self,vader", "OMPI_MCA_plm_rsh_agent": ""}


def measure(top, selvedge, side, n, launcher, threads):
    """(wall, processor seconds of all processes, processor seconds of the realisations)."""
    sheet, place = os.path.join(top, "sheet.yaml"), os.path.join(top, "run")
    with open(sheet, "w", encoding="utf-8") as file:
        file.write(SHEET.format(side=side, n=n))
    before, start = resource.getrusage(resource.RUSAGE_CHILDREN), time.monotonic()
    subprocess.run([*launcher, selvedge, "average", sheet, "-o", place, "-j", str(threads), "-q"], check=True,
                   stdout=subprocess.DEVNULL, env={**os.environ, "OPENBLAS_NUM_THREADS": "1", **MPI})
    wall, after = time.monotonic() - start, resource.getrusage(resource.RUSAGE_CHILDREN)
    with sqlite3.connect("file:%s?mode=ro" % os.path.join(place, "ledger.sqlite"), uri=True) as ledger:
        inside = ledger.execute("select sum(processor_seconds) from cost").fetchone()[0]
    shutil.rmtree(place)
    spent = after.ru_utime + after.ru_stime - before.ru_utime - before.ru_stime
    return wall, spent, inside


def simulate(ranks, each, cost, pause, threads=1, seconds=60.0):
    """Share of the time the ranks compute. One server (rank 0) with a queue: a result costs it `cost`, and after
    storing what has come in it waits `pause` for the disk. A rank keeps a quarter of a second of work in hand
    and asks for more when half of that is gone: it stands still when an answer comes later."""
    hand = max(1, min(100, int(0.25 / each))) * threads
    events, clock, worked = [], 0.0, 0.0  # (time a rank's half hand is used up, rank)
    batch = max(1, hand // 2)
    for r in range(ranks):
        heapq.heappush(events, ((r + 1) / ranks * batch * each / threads, r))
    reserve = (hand - batch) * each / threads
    while events:
        at, rank = heapq.heappop(events)
        if at > seconds:
            break
        # Results come one by one, the request with the last of them; the disk is waited for once for all of them
        # that came in during the last wait.
        clock = max(clock, at) + batch * cost
        together = max(1.0, pause * ranks * threads / each / batch)
        clock += pause / together
        late = max(0.0, clock - at - reserve)
        worked += batch * each
        heapq.heappush(events, (at + batch * each / threads + late, rank))
    return worked / (seconds * ranks * threads)


def table(cost, pause):
    print("\nSimulation of rank 0: %.0f us of processor a result, %.1f ms waiting for the disk a transaction"
          % (1e6 * cost, 1e3 * pause))
    print("share of the time the ranks compute:")
    counts = (16, 64, 256, 1024, 4096, 16384)
    print("%14s" % "a realisation" + "".join("%8d" % n for n in counts) + "   ranks")
    for each in (0.01, 0.1, 1.0):
        print("%11.0f ms" % (1e3 * each) +
              "".join("%7.0f%%" % (100 * min(1.0, simulate(n, each, cost, pause))) for n in counts))


def main():
    parser = argparse.ArgumentParser(description=__doc__, formatter_class=argparse.RawDescriptionHelpFormatter)
    parser.add_argument("selvedge")
    parser.add_argument("--seconds", type=float, default=60.0)
    parser.add_argument("--side", type=int, default=10)
    options = parser.parse_args()
    top = tempfile.mkdtemp(prefix="selvedge-workers-")
    try:
        trial = 40
        _, _, inside = measure(top, options.selvedge, options.side, trial, [], 1)
        each = inside / trial
        n = max(2 * trial, int(options.seconds / each))
        print("%d realisations of %.1f ms; load of the machine before: %s" % (n, 1e3 * each, os.getloadavg()[0]))
        kinds = [("1 thread", [], 1), ("2 threads", [], 2)]
        if shutil.which("mpirun"):
            kinds += [("1 rank", ["mpirun", "-n", "1"], 1), ("2 ranks", ["mpirun", "-n", "2"], 1)]
        walls, extra = {}, 0.0
        for name, launcher, threads in kinds:
            _, short, short_inside = measure(top, options.selvedge, options.side, trial, launcher, threads)
            walls[name], spent, inside = measure(top, options.selvedge, options.side, n, launcher, threads)
            beyond = (spent - inside - (short - short_inside)) / (n - trial)
            extra = max(extra, beyond)
            print("%-10s %7.2f s wall, %7.2f s of processor, overhead %5.2f %%" % (
                name, walls[name], spent, 100 * beyond * n / inside))
        print("2 threads / 1: %.2f times" % (walls["1 thread"] / walls["2 threads"]))
        if "2 ranks" in walls:
            print("2 ranks / 1:   %.2f times" % (walls["1 rank"] / walls["2 ranks"]))
        table(extra, disk_wait(top))
    finally:
        shutil.rmtree(top, ignore_errors=True)


def disk_wait(top):
    """Seconds of one small transaction with the settings of the ledger, mean of 50."""
    place = os.path.join(top, "disk.sqlite")
    with sqlite3.connect(place, isolation_level=None) as ledger:
        ledger.execute("pragma journal_mode = truncate")
        ledger.execute("pragma synchronous = full")
        ledger.execute("create table t (a, b)")
        start = time.monotonic()
        for k in range(50):
            ledger.execute("insert into t values (?, 'some text of a row')", [k])
        return (time.monotonic() - start) / 50


if __name__ == "__main__":
    main()
