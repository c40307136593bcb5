# SPDX-License-Identifier: GPL-3.0-or-later
"""Finite sizes from the sheet to the figure: a disorder-driven transition, a peer for the fit, and
what is refused."""
import csv
import functools
import json
import os

import numpy as np
from scipy.optimize import least_squares

from harness import check, close, contains, equal, folder, main, read, run, test, write

SHEET = """\
selvedge: 1
title: Half-BHZ model driven topological by disorder
model: {name: qi_wu_zhang, m: -2.2}
flake: {shape: rectangle, cells: [8, 8]}
disorder:
  - {name: pot, kind: onsite, distribution: box, width: 2.5, per: cell}
markers: {local_chern: {window: 0.34}}
ensemble: {realisations: 24, seed: 11}
sweep:
  - {parameter: flake.cells, values: [8, 12, 16]}
  - {parameter: disorder.pot.width, from: 1.8, to: 3, steps: 7}
finite_size: {resamples: 100}
"""


@functools.lru_cache
def made():
    """(sheet, run folder, JSON) of one run, shared by the tests."""
    top = folder()
    path, place = write(os.path.join(top, "sheet.yaml"), SHEET), os.path.join(top, "run")
    return path, place, run("average", path, "-o", place, "--json", code=0, timeout=280).json()


def table(place):
    """Rows size, width, mean, standard error of points.csv."""
    lines = [line for line in read(os.path.join(place, "points.csv")).splitlines()
             if not line.startswith("#")]
    return np.array([[float(row["flake.cells"]), float(row["disorder.pot.width"]),
                      float(row["mean"]), float(row["standard_error"])]
                     for row in csv.DictReader(lines)])


@test
def the_transition_is_where_the_born_approximation_has_it():
    # First Born approximation: W_c = 2.42 to 2.50 (C. W. Groth et al., Phys. Rev. Lett. 103, 196805
    # (2009); B. D. Assuncao, G. J. Ferreira, C. H. Lewenkopf, Phys. Rev. B 109, L201102 (2024): W_c
    # of the disorder-averaged marker agrees with it; numbers by independent computation). Flakes
    # of 8 to 16 cells and their errors allow 0.3.
    study = made()[2]["finite_size"]
    equal(study["sizes"], [8, 12, 16], "sizes")
    equal((study["marker"], study["parameter"]), ("local_chern", "disorder.pot.width"), "axes")
    close(study["crossing"]["value"], 2.46, 0.3, "crossing")
    check(study["crossing"]["standard_error"] < 0.15, "error %r" % study["crossing"])
    collapse = study["collapse"]
    check(collapse["decided"] == (not collapse["reasons"]), "verdict %r" % collapse["reasons"])
    close(collapse["critical"]["value"], 2.46, 0.4, "p_c of the collapse")


@test
def the_fit_is_the_one_of_a_peer():
    _, place, answer = made()
    collapse = answer["finite_size"]["collapse"]
    rows = table(place)
    low, high = collapse["range"]
    rows = rows[(rows[:, 1] >= low - 1e-9) & (rows[:, 1] <= high + 1e-9)]
    equal(len(rows), collapse["points"], "means in the fit")
    size, width, mean, error = rows.T
    order = collapse["order"]

    def coefficients(outer):
        x = (width - outer[0]) * (size / 16)**outer[1]
        a = np.vander(x, order + 1) / error[:, None]
        return a, np.linalg.lstsq(a, mean / error, rcond=None)[0]

    def residuals(outer):
        a, best = coefficients(outer)
        return a @ best - mean / error

    fits = [least_squares(residuals, [p, a], xtol=1e-14, ftol=1e-14, gtol=1e-14)
            for p in (2.2, 2.4, 2.6) for a in (0.5, 1.0, 1.5)]
    best = min(fits, key=lambda fit: fit.cost)
    # points.csv and the search end at about seven digits.
    close(collapse["chi_square"], 2 * best.cost, 1e-4 * best.cost + 1e-6, "chi-square")
    close(collapse["critical"]["value"], best.x[0], 1e-3 * collapse["critical"]["standard_error"]
          + 1e-5, "p_c")
    close(collapse["nu"]["value"], 1 / best.x[1], 1e-3, "nu")
    equal(collapse["degrees_of_freedom"], len(rows) - order - 3, "degrees of freedom")


@test
def table_and_figure_show_it():
    path, place, _ = made()
    text = run("average", path, "-o", place, code=0).out
    contains(text, "Finite size: local Chern marker against disorder.pot.width")
    contains(text, "p_c from crossings = ")
    text = run("report", place, "-q", code=0).out
    data = read(os.path.join(place, "figures", "finite_size.dat"))
    equal(data.count("# size "), 3, "blocks of sizes")
    contains(read(os.path.join(place, "figures", "finite_size.gp")), "finite_size.dat")


@test
def another_question_is_asked_of_the_same_run():
    path, place, before = made()
    run("average", path, "-o", place, "--set", "finite_size.order=4", "--set",
        "finite_size.range=[2, 2.8]", "--json", code=0)
    after = json.loads(read(os.path.join(place, "summary.json")))
    equal(after["points"], before["points"], "points")
    collapse = after["finite_size"]["collapse"]
    equal((collapse["order"], collapse["range"]), (4, [2, 2.8]), "order and range")
    run("average", path, "-o", place, code=0)


@test
def few_samples_of_two_sizes_decide_nothing():
    sheet = SHEET.replace("[8, 12, 16]", "[6, 8]").replace("realisations: 24", "realisations: 3")
    top = folder()
    place = os.path.join(top, "run")
    answer = run("average", write(os.path.join(top, "s.yaml"), sheet), "-o", place, "--json",
                 code=0).json()
    collapse = answer["finite_size"]["collapse"]
    check(not collapse["decided"])
    contains(" ".join(collapse["reasons"]), "at least three")
    contains(run("report", place, code=0).out, "the data cannot decide, because")


main()
