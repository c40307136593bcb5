# SPDX-License-Identifier: GPL-3.0-or-later
"""Sweeps over sizes and over two axes: every point its own flake, the same random fields."""
import os

from harness import check, contains, equal, folder, main, run, test, write

SIZES = """\
selvedge: 1
title: Sizes against disorder
model: {name: qi_wu_zhang, m: -1}
flake: {shape: rectangle}
disorder:
  - {name: pot, kind: onsite, distribution: box, width: 1, per: cell}
markers: {local_chern: {window: 0.5}, bott: {}}
ensemble: {realisations: 3, seed: 3}
sweep:
  - {parameter: flake.cells, values: [6, 8]}
  - {parameter: disorder.pot.width, values: [1, 5]}
"""


def average(text, *more, code=0):
    """(run folder, JSON) of a fresh run."""
    top = folder()
    path, place = write(os.path.join(top, "sheet.yaml"), text), os.path.join(top, "run")
    return place, run("average", path, "-o", place, "--json", *more, code=code).json()


@test
def every_point_has_its_own_flake():
    _, answer = average(SIZES)
    equal([point["parameters"] for point in answer["points"]],
          [{"flake.cells": n, "disorder.pot.width": w} for n in (6, 8) for w in (1, 5)], "parameters")
    equal([point["inventory"]["sites"] for point in answer["points"]], [72, 72, 128, 128], "sites")
    # A point of the sweep is the sheet of that size alone, to the last bit.
    alone = SIZES.replace("{shape: rectangle}", "{shape: rectangle, cells: [8, 8]}")
    alone = alone.replace("  - {parameter: flake.cells, values: [6, 8]}\n", "")
    _, single = average(alone, "-j", "1")
    equal([point["markers"] for point in answer["points"][2:]],
          [point["markers"] for point in single["points"]], "the point of 8 x 8 cells")


@test
def sizes_may_be_pairs():
    place, answer = average(SIZES.replace("[6, 8]", "[[6, 4], 8]"))
    equal([point["parameters"]["flake.cells"] for point in answer["points"]],
          [[6, 4], [6, 4], [8, 8], [8, 8]], "parameters")
    equal([point["inventory"]["sites"] for point in answer["points"]], [48, 48, 128, 128], "sites")
    with open(os.path.join(place, "points.csv"), encoding="utf-8") as stream:
        contains(stream.read(), "\nflake.cells.0,flake.cells.1,disorder.pot.width,marker,", "columns")
    table = run("report", place).out
    contains(table, "6x4", "table")


@test
def each_size_has_its_own_window_and_torus():
    _, answer = average(SIZES.replace("values: [6, 8]", "from: 6, to: 10, steps: 3")
                        .replace("values: [1, 5]", "values: [0]"))
    means = [point["markers"]["local_chern"]["mean"] for point in answer["points"]]
    # Clean flakes: the window mean nears 1 with the size; a window kept from another size would not.
    check(means[0] < means[1] < means[2] < 1.001 and 1 - means[2] < (1 - means[0]) / 2, "means %r" % means)


main()
