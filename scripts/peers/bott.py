#!/usr/bin/env python3
# SPDX-License-Identifier: GPL-3.0-or-later
"""Bott index of an ensemble of tori: the program and the NumPy script beside it; prints the ratio.

usage: bott.py SELVEDGE [-n REALISATIONS] [-j WORKERS]

The clock of the program covers the whole command, from start to closed ledger; that of the script
its realisations alone, with the workers started and warm. Processor seconds are printed as well:
they say more when others use the machine. Exit status 1 when the mean indices differ by more than
four combined standard errors.
"""
import argparse
import json
import os
import resource
import subprocess
import sys
import tempfile
import time

SHEET = """\
selvedge: 1
title: Benchmark Bott index
model: {name: haldane, t1: 1, t2: 0.2, phi: 90 deg, mass: 0}
flake: {shape: parallelogram, cells: [%(cells)d, %(cells)d]}
disorder:
  - {name: pot, kind: onsite, distribution: box, width: %(width)g, per: site}
occupation: {fermi_energy: 0}
markers: {bott: {}}
ensemble: {realisations: %(realisations)d, seed: 1}
"""
SCRIPT = os.path.join(os.path.dirname(os.path.abspath(__file__)), "scipy_bott.py")


def processor_seconds():
    used = resource.getrusage(resource.RUSAGE_CHILDREN)
    return used.ru_utime + used.ru_stime


def run_program(program, given):
    """Seconds, processor seconds, and summary of the index."""
    with tempfile.TemporaryDirectory(prefix="selvedge-benchmark-") as folder:
        sheet = os.path.join(folder, "sheet.yaml")
        with open(sheet, "w", encoding="utf-8") as file:
            file.write(SHEET % vars(given))
        command = [program, "average", sheet, "-o", os.path.join(folder, "run"), "-j",
                   str(given.workers), "--json", "-q"]
        begin, used = time.perf_counter(), processor_seconds()
        done = subprocess.run(command, check=True, text=True, stdout=subprocess.PIPE)
        seconds, used = time.perf_counter() - begin, processor_seconds() - used
    answer = json.loads(done.stdout)["points"][0]["markers"]["bott"]
    return {**answer, "seconds": seconds, "processor_seconds": used}


def run_script(given):
    command = [sys.executable, SCRIPT, "--cells", str(given.cells), "--width", str(given.width),
               "--realisations", str(given.realisations), "--processes", str(given.workers)]
    return json.loads(subprocess.run(command, check=True, text=True, stdout=subprocess.PIPE).stdout)


def show(name, given, row):
    print("%-24s %7.3f realisations/s   (%d in %.1f s, %.1f processor seconds)   index %.4f"
          % (name, given.realisations / row["seconds"], given.realisations, row["seconds"],
             row["processor_seconds"], row["mean"]), flush=True)


def main():
    parser = argparse.ArgumentParser()
    parser.add_argument("program")
    parser.add_argument("-n", "--realisations", type=int, default=8)
    parser.add_argument("-j", "--workers", type=int, default=2)
    parser.add_argument("--cells", type=int, default=30)
    parser.add_argument("--width", type=float, default=1.0)
    given = parser.parse_args()
    print("haldane, t2 = 0.2, phi = 90 deg, torus of %d×%d cells = %d sites, box of full width %g "
          "per site, %d workers" % (given.cells, given.cells, 2 * given.cells**2, given.width,
                                    given.workers), flush=True)
    ours = run_program(given.program, given)
    show("selvedge (%s)" % ours["engine"], given, ours)
    peer = run_script(given)
    show("NumPy (%s)" % peer["driver"], given, peer)
    print("ratio %.2f, of processor seconds %.2f" % (
        peer["seconds"] / ours["seconds"], peer["processor_seconds"] / ours["processor_seconds"]))
    allowed = 4.0 * (ours["standard_error"]**2 + peer["standard_error"]**2)**0.5 + 1e-6
    agree = abs(ours["mean"] - peer["mean"]) <= allowed
    print("the mean indices %s" % ("agree" if agree else "DISAGREE"))
    return 0 if agree else 1


if __name__ == "__main__":
    sys.exit(main())
