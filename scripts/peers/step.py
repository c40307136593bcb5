#!/usr/bin/env python3
# SPDX-License-Identifier: GPL-3.0-or-later
"""Chebyshev steps of whole flakes beside SciPy's product of a sparse matrix with the same block.

usage: step.py BENCH-STEP [--huge]

Everything is per site, column and step, on one core each, in processor time. --huge adds a flake of
10^7 sites (9 GB).
"""
import json
import os
import subprocess
import sys

SCRIPT = os.path.join(os.path.dirname(os.path.abspath(__file__)), "scipy_step.py")


def lines(command):
    return subprocess.run(command, check=True, text=True, stdout=subprocess.PIPE).stdout.split("\n")


def main():
    program, huge = sys.argv[1], "--huge" in sys.argv[2:]
    sides = ["30", "224", "708"] + (["2237"] if huge else [])
    print("nanoseconds per site, column and step; one core, processor time")
    form = "%10s %10s %10s %14s %14s %18s %18s"
    print(form % ("sites", "double", "single", "parts, double", "parts, single",
                  "streaming, double", "arithmetic, double"))
    own = [json.loads(line) for line in lines([program] + sides) if line]
    for row in own:
        figures = [row[name] for name in ("double", "single", "parts_double", "parts_single",
                                          "streaming_limit", "arithmetic_limit")]
        print(form % tuple([str(row["sites"])] + ["%.2f" % figure for figure in figures]))
    print("limits: memory %.1f GB/s for steps that stream every vector, %s multiply-adds from the "
          "first cache" % (own[0]["memory_rate"], own[0]["kernel"]))
    million = own[2]
    for columns in ("8", "16"):
        peer = json.loads(lines([sys.executable, SCRIPT, "--columns", columns])[0])
        print("SciPy, %s columns, %d sites: %.1f ns: %.1f times the step in double, %.1f times that "
              "in single precision" % (columns, peer["sites"], peer["nanoseconds"],
                                       peer["nanoseconds"] / million["double"],
                                       peer["nanoseconds"] / million["single"]))
    large = own[1:]
    for name in ("double", "single", "parts_double", "parts_single"):
        costs = [row[name] for row in large]
        print("%s from %d to %d sites: largest over smallest %.2f"
              % (name.replace("_", ", "), large[0]["sites"], large[-1]["sites"], max(costs) / min(costs)))


if __name__ == "__main__":
    main()
