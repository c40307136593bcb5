# SPDX-License-Identifier: GPL-3.0-or-later
"""The localizer at many points, from the sheet to JSON, CSV and figures."""
import csv
import os

from harness import check, close, contains, equal, folder, main, run, test, write

HEAD = """selvedge: 1
title: probes
model: {name: qi_wu_zhang, m: -1, lattice_constant: 0.5 nm}
flake: {shape: rectangle, cells: [8, 8]}
disorder:
  - {name: pot, kind: onsite, distribution: box, width: 1}
"""


def sheet(localizer, more=""):
    return write(os.path.join(folder(), "sheet.yaml"),
                 HEAD + "markers: {local_chern: {}, localizer: {%s}}\n%s" % (localizer, more))


@test
def a_grid_in_json_and_csv():
    path, table = sheet("points: [5, 4]"), os.path.join(folder(), "p.csv")
    answer = run("map", path, "--json", "--probes", table, code=0).json()["markers"]["localizer"]
    probes = answer["probes"]
    equal((probes["form"], probes["points"]), ("grid", [5, 4]), "form")
    for name in ("x", "y", "index", "gap", "resolved", "reasons", "withstands"):
        equal(len(probes[name]), 20, name)
    for name in ("gap_low", "gap_high", "index_constant"):
        equal(len(probes["between"][name]), 12, name)
    equal((min(probes["x"]), max(probes["x"]), max(probes["y"])), (0.0, 7.0, 7.0), "corners")
    for index, resolved, reason, withstands in zip(probes["index"], probes["resolved"],
                                                   probes["reasons"], probes["withstands"]):
        check((index is None) == (not resolved) == (reason is not None) == (withstands is None),
              "null exactly where unresolved, with a reason")
    with open(table, newline="", encoding="utf-8") as file:
        rows = list(csv.DictReader(file))
    equal(len(rows), 20, "rows")
    for k, row in enumerate(rows):
        close(float(row["gap"]), probes["gap"][k], 0.0, "gap of row %d" % k)
        equal(row["index"], "" if probes["index"][k] is None else str(probes["index"][k]), "index")
    again = run("map", path, "--probes", table, code=4)
    contains(again.err, "--force", "message")


@test
def a_line_with_units_through_the_flake():
    probes = run("map", sheet("points: 9, from: [-5 nm, 1.75 nm], to: [8.5 nm, 1.75 nm]"), "--json",
                 code=0).json()["markers"]["localizer"]["probes"]
    equal((probes["form"], probes["points"]), ("line", [9]), "form")
    close(probes["x"][0], -10.0, 1e-12, "first x")
    close(probes["x"][-1], 17.0, 1e-12, "last x")
    equal((probes["index"][0], probes["index"][4], probes["index"][-1]), (0, 1, 0), "indices")


@test
def kappa_sensitivity():
    answer = run("map", sheet("kappa_range: [0.05, 4], kappa_points: 12"), "--json", code=0).json()
    kappas = answer["markers"]["localizer"]["kappas"]
    equal(len(kappas["kappa"]), 12, "number")
    same = kappas["same_index"]
    equal((same["index"], same["whole_range"]), (1, False), "same index")
    check(0.05 <= same["from"] < answer["markers"]["localizer"]["kappa"] < same["to"] < 4,
          "range %r" % same)
    for kappa, index in zip(kappas["kappa"], kappas["index"]):
        if same["from"] <= kappa <= same["to"]:
            equal(index, 1, "index at %g" % kappa)
    text = run("map", sheet("kappa_range: [0.05, 4]"), code=0).out
    contains(text, "same index 1 over kappa", "table")


@test
def figures_by_map_and_report():
    top = folder()
    more = "ensemble: {realisations: 1}\n"
    path = sheet("points: 5, from: [0, 3], to: [7, 3], kappa_range: [0.1, 1]", more)
    run("map", path, "-o", os.path.join(top, "map"), code=0)
    run("average", path, "-o", os.path.join(top, "run"), code=0)
    said = run("report", os.path.join(top, "run"), code=0).out
    contains(said, "localizer along a line", "report")
    for place in ("map", os.path.join("run", "figures")):
        for name in ("localizer_line", "localizer_kappa"):
            check(os.path.exists(os.path.join(top, place, name + ".gp")), place + " " + name)
    with open(os.path.join(top, "map", "localizer_line.gp"), encoding="utf-8") as file:
        contains(file.read(), "localizer from (0, 1.5) to (3.5, 1.5) nm", "places in the unit of the axis")
    run("map", sheet("points: [3, 3]"), "-o", os.path.join(top, "grid"), code=0)
    check(os.path.exists(os.path.join(top, "grid", "localizer_grid.gp")), "grid")


@test
def the_average_does_not_see_the_probes():
    plain, many = sheet(""), sheet("points: [3, 3], kappa_range: [0.1, 1]")
    answers = [run("average", path, "-n", "2", "--json", "-o", os.path.join(folder(), "run"),
                   code=0).json()["points"] for path in (plain, many)]
    equal(answers[0], answers[1], "points")


@test
def bad_input_is_pointed_at():
    # All on line 7; the column is that of the value at fault.
    for keys, column, message in (
            ("points: 4", 48, "markers.localizer.points is the number of points on a line"),
            ("from: [0, 0], to: [1, 1]", 46, "markers.localizer.from needs points"),
            ("points: [3, 3], to: [1, 1]", 60, "markers.localizer.to is one end only"),
            ("points: 3, from: [1, 1], to: [1, 1]", 69, "markers.localizer.to is the same point"),
            ("points: [3, 3], from: [4, 4], to: [1, 5]", 74, "markers.localizer.to must lie above"),
            ("points: 1", 48, "markers.localizer.points must be between 2 and 1000"),
            ("points: [3, 3, 3]", 48, "expected a pair"),
            ("kappa_range: [2, 1]", 53, "smaller one first"),
            ("kappa_range: [0, 1]", 54, "markers.localizer.kappa_range"),
            ("kappa_points: 4", 54, "markers.localizer.kappa_points needs kappa_range"),
            ("point: 4", 40, "unknown key point")):
        result = run("map", sheet(keys), code=3)
        contains(result.err, "sheet.yaml:7:%d: error: " % column, keys)
        contains(result.err, message, keys)
        equal(result.out, "", "standard output")
    result = run("map", sheet(""), "--probes", os.path.join(folder(), "p.csv"), code=2)
    contains(result.err, "markers.localizer.points", "message")


main()
