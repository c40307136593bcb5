#!/usr/bin/env python3
# SPDX-License-Identifier: GPL-3.0-or-later
"""Runs one ensemble with the program and with the SciPy script beside it; prints the ratio.

usage: ensemble.py SELVEDGE [-n REALISATIONS] [--more FACTOR] [-j WORKERS] [--width W]
                    [--accuracy A] [--marker local_chern|localizer]

The program computes FACTOR times as many realisations as the script, so that its start counts for
little; the ratio is of realisations per second. The localizer index is computed twice, with the
value of its gap and with the verdict gap > tau alone.

The clock of the program covers the whole command, from start to closed ledger; that of the script
its realisations alone, with the workers started and warm. Exit status 1 when the means differ by
more than four combined standard errors.
"""
import argparse
import json
import os
import subprocess
import sys
import tempfile
import time

SHEET = """\
selvedge: 1
title: Benchmark ensemble
model: {name: haldane, t1: 1, t2: 0.2, phi: 90 deg, mass: 0}
flake: {shape: parallelogram, cells: [%(cells)d, %(cells)d]}
disorder:
  - {name: pot, kind: onsite, distribution: box, width: %(width)g, per: site}
occupation: {fermi_energy: 0}
markers: {%(asked)s}
ensemble: {realisations: %(ours)d, seed: 1}
solve: {accuracy: %(accuracy)g}
"""
SCRIPT = os.path.join(os.path.dirname(os.path.abspath(__file__)), "scipy_ensemble.py")


def run_program(program, given, options=""):
    """(seconds, summary of the marker) of `selvedge average`."""
    given.asked = "%s: {%s}" % (given.marker, options)
    with tempfile.TemporaryDirectory(prefix="selvedge-benchmark-") as folder:
        sheet = os.path.join(folder, "sheet.yaml")
        with open(sheet, "w", encoding="utf-8") as file:
            file.write(SHEET % vars(given))
        command = [program, "average", sheet, "-o", os.path.join(folder, "run"), "-j",
                   str(given.workers), "--json", "-q"]
        begin = time.perf_counter()
        done = subprocess.run(command, check=True, text=True, stdout=subprocess.PIPE)
        seconds = time.perf_counter() - begin
    return seconds, json.loads(done.stdout)["points"][0]["markers"][given.marker]


def run_script(given):
    command = [sys.executable, SCRIPT, "--cells", str(given.cells), "--width", str(given.width),
               "--realisations", str(given.realisations), "--processes", str(given.workers)]
    return json.loads(subprocess.run(command, check=True, text=True, stdout=subprocess.PIPE).stdout)


def show(name, realisations, seconds, mean, error):
    print("%-24s %7.3f realisations/s   (%d in %.1f s)   mean %.6f ± %.6f"
          % (name, realisations / seconds, realisations, seconds, mean, error))


def compare_localizer(given):
    """With the value of the gap and with its bound alone; the program before and after the script,
    so that others on the machine disturb both."""
    kinds, best = ("bound", "value"), {}
    for turn in range(2):
        for kind in kinds:
            row = run_program(given.program, given, "gap: " + kind)
            best[kind] = min(best.get(kind, row), row, key=lambda r: r[0])
        if turn == 0:
            peer = run_script(given)
    show("SciPy marker %s" % peer["driver"], given.realisations, peer["seconds"], peer["mean"],
         peer["standard_error"])
    for kind in kinds:
        seconds, ours = best[kind]
        show("selvedge, gap: %s" % kind, given.ours, seconds, ours["mean"], ours["standard_error"])
        print("ratio %.1f, unresolved %d, gap %s" % (given.more * peer["seconds"] / seconds,
                                                     ours["unresolved"], ours.get("gap")))
    return 0


def main():
    parser = argparse.ArgumentParser()
    parser.add_argument("program")
    parser.add_argument("-n", "--realisations", type=int, default=8)
    parser.add_argument("-j", "--workers", type=int, default=2)
    parser.add_argument("--cells", type=int, default=30)
    parser.add_argument("--width", type=float, default=1.0)
    parser.add_argument("--accuracy", type=float, default=1e-6)
    parser.add_argument("--marker", choices=("local_chern", "localizer"), default="local_chern")
    parser.add_argument("--more", type=int, default=8, metavar="FACTOR")
    given = parser.parse_args()
    given.ours = given.more * given.realisations
    print("haldane, t2 = 0.2, phi = 90 deg, %d×%d cells = %d sites, box of full width %g per site, "
          "window 0.5, %d workers" % (given.cells, given.cells, 2 * given.cells**2, given.width,
                                      given.workers), flush=True)
    if given.marker == "localizer":
        return compare_localizer(given)
    peer = run_script(given)
    seconds, ours = run_program(given.program, given)
    show("selvedge %s" % ours["engine"], given.ours, seconds, ours["mean"],
         ours["standard_error"])
    show("SciPy marker %s" % peer["driver"], given.realisations, peer["seconds"], peer["mean"],
         peer["standard_error"])
    print("ratio %.1f, stated numerical error at most %.1e"
          % (given.more * peer["seconds"] / seconds, ours["numerical_error"] or 0.0))
    allowed = 4.0 * (ours["standard_error"]**2 + peer["standard_error"]**2)**0.5
    agree = abs(ours["mean"] - peer["mean"]) <= allowed
    print("the means %s: difference %.2e, allowed %.2e"
          % ("agree" if agree else "DISAGREE", abs(ours["mean"] - peer["mean"]), allowed))
    return 0 if agree else 1


if __name__ == "__main__":
    sys.exit(main())
