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


PLANE = SIZES.replace("{shape: rectangle}", "{shape: rectangle, cells: [5, 5]}").replace(
    "flake.cells, values: [6, 8]", "model.m, values: [-3, -1, 1]")


@test
def two_axes_are_drawn():
    place, _ = average(PLANE)
    told = run("report", place, "-q", code=0).out
    if "not drawn: gnuplot was not found" in told:
        return
    for name in ("sweep", "phase_local_chern", "phase_bott"):
        for ending in ("svg", "pdf", "png", "gp", "dat"):
            check(os.path.getsize(os.path.join(place, "figures", name + "." + ending)) > 300, name)


@test
def a_figure_that_fails_is_told():
    """gnuplot that fails: the others are tried, the message is there, the exit code is 4."""
    place, _ = average(PLANE)
    fake = folder()
    script = write(os.path.join(fake, "gnuplot"), "#!/bin/sh\necho broken >&2\nexit 1\n")
    os.chmod(script, 0o755)
    result = run("report", place, "-q", code=4, env=dict(os.environ, PATH=fake + ":" + os.environ["PATH"]))
    contains(result.err, "sweep, a curve for each value not drawn: gnuplot failed: broken", "message")
    contains(result.out, "marker map, realisation 0", "the other figures")


@test
def empty_windows_stand_at_the_flake():
    """No cell lies in the middle band of a thin ring: told at the line of the flake, before work."""
    top = folder()
    path = write(os.path.join(top, "sheet.yaml"), SIZES.replace(
        "{shape: rectangle}", "{shape: annulus, inner: 3}").replace(
        "window: 0.5", "window: 0.001").replace("flake.cells, values: [6, 8]", "flake.outer, values: [6, 7]"))
    for command in (("check",), ("average", "-o", os.path.join(top, "run")), ("map",)):
        result = run(command[0], path, *command[1:], code=3)
        contains(result.err, "sheet.yaml:4:1: error:", command[0])
    check(not os.path.exists(os.path.join(top, "run")), "nothing written")


@test
def a_sample_without_sites_is_undecided():
    top = folder()
    path = write(os.path.join(top, "sheet.yaml"), SIZES.split("disorder:")[0].replace(
        "{shape: rectangle}", "{shape: rectangle, cells: [4, 4]}") +
        "disorder: [{name: vac, kind: vacancies, share: 1}]\n")
    run("map", path, code=1)
    run("draw", path, "-o", os.path.join(top, "film.svg"), code=1)


@test
def forecasts_cover_the_ensemble():
    top = folder()
    path = write(os.path.join(top, "sheet.yaml"), PLANE)
    told = run("average", path, "--dry-run", code=0).out
    contains(told, "points        6", "points")
    contains(told, "realisations  18 over all points", "realisations")
    contains(told, "ledger        about 0.02", "ledger")
    stop = write(os.path.join(top, "stop.yaml"), PLANE.replace(
        "seed: 3}", "seed: 3, stop: {standard_error: 0.1, of: bott, at_least: 2}}"))
    contains(run("check", stop, code=0).out, "realisations  at most 18 over all points (there is a stop rule)", "stop")
    probes = write(os.path.join(top, "probes.yaml"), PLANE.replace(
        "bott: {}", "localizer: {points: [1000, 1000], kappa: 0.1}"))
    answer = run("check", probes, "--json", code=0).json()["forecast"]
    equal(answer["probes"], 1e6, "probes")
    # A probe takes more than a microsecond and less than a second, on two cores or sixty-four.
    check(1e6 * 1e-6 / 64 < answer["seconds_probes"] < 1e6, "time of the probes %r" % answer["seconds_probes"])


main()
