#!/usr/bin/env python3
# SPDX-License-Identifier: GPL-3.0-or-later
"""What `check` forecasts for every shipped sheet beside what `average` then takes.

usage: forecast.py SELVEDGE [NAME...] [--factor 2] [--shipped]

Every sheet of samples/ runs as shipped (a few are made shorter, which is printed) and some once
more enlarged to take seconds. Compared is processor time of the whole `average` command on one
thread, user and system, because other work on the machine does not lengthen it; wall time stands
beside it. Memory is the largest resident size beside the forecast. With names only those sheets
run. Ends with how many are within the factor; exit status 1 when fewer than ten shipped sheets are.
"""
import argparse
import glob
import json
import os
import resource
import subprocess
import sys
import tempfile
import time

SAMPLES = os.path.join(os.path.dirname(os.path.abspath(__file__)), "..", "..", "samples")
# Sheets of about 1 to 20 s made from shipped ones, one per route of the program.
LARGER = {
    "clean_phases": ["flake.cells=[24, 24]"],
    "ribbon": ["flake.cells=[20, 33]", "ensemble.realisations=8"],
    "magnetic_film": ["flake.size=[44 nm, 44 nm]"],
    "vacancy_film": ["flake.size=[14 nm, 14 nm]", "ensemble.realisations=2"],
    "triangular": ["flake.cells=[36, 36]"],
    "weak_spot": ["flake.cells=[48, 48]"],
    "kane_mele": ["flake.cells=[16, 16]"],
    "ring_flow": ["flake.outer=14", "ensemble.realisations=4"],
    "hops_from_table": ["flake.cells=[24, 24]", "ensemble.realisations=4"],
    "cracked_film": ["solve.engine=rational", "ensemble.realisations=2"],
}


def run(command):
    """(output, processor seconds, wall seconds, largest resident bytes) of a command."""
    begin = time.perf_counter()
    child = subprocess.Popen(command, stdout=subprocess.PIPE, stderr=subprocess.PIPE)
    output = child.stdout.read()
    error = child.stderr.read()
    _, code, used = os.wait4(child.pid, 0)
    child.returncode = os.waitstatus_to_exitcode(code)
    if child.returncode not in (0, 4):
        raise SystemExit("%s\n%s" % (" ".join(command), error.decode()))
    return output, used.ru_utime + used.ru_stime, time.perf_counter() - begin, used.ru_maxrss * 1024


def compare(program, path, changes, factor):
    """One line of the table; whether the forecast is within the factor."""
    options = [word for change in changes for word in ("--set", change)]
    output, check_seconds, _, _ = run([program, "check", path, "--json", "-j", "1"] + options)
    forecast = json.loads(output)["forecast"]
    with tempfile.TemporaryDirectory(prefix="selvedge-benchmark-") as folder:
        _, seconds, wall, peak = run([program, "average", path, "-o", os.path.join(folder, "run"),
                                      "-j", "1", "-q", "--json"] + options)
    ratio = forecast["seconds"] / seconds
    memory = forecast["memory_bytes_program"] + forecast["memory_bytes_per_thread"]
    good = 1.0 / factor <= ratio <= factor
    print("%-20s %6d %9.3g %9.3g %9.3g %7.2f %s %8.3g %8.3g %6.2f %8.2f  %s"
          % (os.path.basename(path)[:-5], forecast["sites"], forecast["seconds"], seconds, wall,
             ratio, " " if good else "*", memory / 1e6, peak / 1e6, memory / peak, check_seconds, ", ".join(changes)),
          flush=True)
    return good, 1.0 / factor <= memory / peak <= factor


def main():
    parser = argparse.ArgumentParser()
    parser.add_argument("program")
    parser.add_argument("names", nargs="*")
    parser.add_argument("--factor", type=float, default=2.0)
    parser.add_argument("--shipped", action="store_true", help="leave the enlarged sheets out")
    given = parser.parse_args()
    resource.setrlimit(resource.RLIMIT_CORE, (0, 0))
    sheets = [(path, []) for path in sorted(glob.glob(os.path.join(SAMPLES, "*.yaml")))]
    larger = [(os.path.join(SAMPLES, name + ".yaml"), LARGER[name]) for name in sorted(LARGER)]
    print("processor seconds of `average -j 1`, forecast and measured; * outside a factor %g\n"
          "%-20s %6s %9s %9s %9s %7s   %8s %8s %6s %8s" % (
              given.factor, "sheet", "sites", "forecast", "measured", "wall", "ratio", "MB said",
              "MB used", "ratio", "check s"), flush=True)
    count = [0, 0]
    for part, rows in enumerate((sheets, [] if given.shipped else larger)):
        rows = [r for r in rows if not given.names or os.path.basename(r[0])[:-5] in given.names]
        found = [compare(given.program, path, changes, given.factor) for path, changes in rows]
        count[part] = sum(good for good, _ in found)
        print("%s: time within a factor %g on %d of %d, memory on %d"
              % (("enlarged", "shipped")[part == 0], given.factor, count[part], len(found),
                 sum(good for _, good in found)), flush=True)
    return 0 if given.names or count[0] >= 10 else 1


if __name__ == "__main__":
    sys.exit(main())
