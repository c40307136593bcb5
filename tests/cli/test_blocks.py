# SPDX-License-Identifier: GPL-3.0-or-later
"""Coarse maps of the local Chern marker, from the sheet to JSON, CSV and the figure."""
import csv
import os

from harness import check, close, contains, equal, folder, main, run, test, write

SHEET = """selvedge: 1
title: blocks
model: {name: qi_wu_zhang, m: -1}
flake: {shape: rectangle, cells: [20, 16]}
disorder:
  - {name: pot, kind: onsite, distribution: box, width: 2}
markers: {local_chern: {%s}}
"""


def sheet(keys):
    return write(os.path.join(folder(), "sheet.yaml"), SHEET % keys)


@test
def blocks_in_json_csv_and_figure():
    top = folder()
    table = os.path.join(top, "b.csv")
    answer = run("map", sheet("blocks: 5, block_cells: 8"), "--json", "--blocks", table, "-o", top,
                 code=0).json()["markers"]["local_chern"]
    blocks = answer["blocks"]
    equal(blocks["count"], [5, 4], "count")
    for name in ("x", "y", "mean", "error", "numerical_error", "cells", "sampled", "reasons"):
        equal(len(blocks[name]), 20, name)
    equal(sum(blocks["cells"]), 320, "cells")
    for mean, reason, sampled in zip(blocks["mean"], blocks["reasons"], blocks["sampled"]):
        check((mean is None) == (reason is not None) == (sampled == 0), "%r %r" % (mean, reason))
    check(any(mean is not None and abs(mean - 1) < 0.2 for mean in blocks["mean"]), "bulk")
    check(answer["sum_over_sites"] is None, "no sum over sites")
    with open(table, newline="", encoding="utf-8") as file:
        rows = list(csv.DictReader(file))
    equal(len(rows), 20, "rows")
    for k, row in enumerate(rows):
        equal(row["mean"] == "", blocks["mean"][k] is None, "mean of row %d" % k)
        if row["mean"]:
            close(float(row["mean"]), blocks["mean"][k], 0.0, "mean")
    check(os.path.exists(os.path.join(top, "marker_map.gp")), "figure")


@test
def report_draws_blocks():
    place = os.path.join(folder(), "run")
    run("average", sheet("blocks: 4"), "-o", place, code=0)
    run("report", place, code=0)
    check(os.path.exists(os.path.join(place, "figures", "marker_map.gp")), "figure")


@test
def bad_input_is_pointed_at():
    for keys, message in (("block_cells: 4", "markers.local_chern.block_cells needs blocks"),
                          ("blocks: 0", "markers.local_chern.blocks must be"),
                          ("blocks: 2.5", "markers.local_chern.blocks")):
        contains(run("map", sheet(keys), code=3).err, message, keys)
    file = os.path.join(folder(), "x.csv")
    contains(run("map", sheet("blocks: 4"), "--csv", file, code=2).err, "--blocks", "message")
    contains(run("map", sheet(""), "--blocks", file, code=2).err, "local_chern.blocks", "message")
    check(not os.path.exists(file), "nothing written")


main()
