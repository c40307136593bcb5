# SPDX-License-Identifier: GPL-3.0-or-later
"""Pieces of samples against SciPy's connected components on the exported Hamiltonian."""
import csv
import os

import numpy
import scipy.io
from scipy.sparse.csgraph import connected_components

from harness import check, equal, folder, main, run, test, write

SHEET = """\
selvedge: 1
model: {name: %s}
flake: {shape: parallelogram, cells: [17, 13], boundary: %s, keep: %s}
disorder:
  - {kind: vacancies, share: %g}
ensemble: {seed: %d}
"""
MODELS = {"haldane": "haldane, t2: 0.0, phi: 0", "square": "qi_wu_zhang, m: -1"}


def export(path):
    place = os.path.dirname(path)
    matrix, sites = os.path.join(place, "h.mtx"), os.path.join(place, "s.csv")
    run("export", path, "--hamiltonian", matrix, "--sites", sites, "--force", code=0)
    with open(sites, encoding="utf-8") as file:
        rows = list(csv.DictReader(file))
    return scipy.io.mmread(matrix).tocsr(), rows


def positions(h, rows):
    """Graph of positions (orbitals at one place are one), and the number of each row's position."""
    places, of_row = {}, []
    for row in rows:
        key = (row["x"], row["y"])
        of_row.append(places.setdefault(key, len(places)))
    h = h.tocoo()
    linked = numpy.zeros((len(places), len(places)), dtype=bool)
    for r, c, value in zip(h.row, h.col, h.data):
        if value != 0 and of_row[r] != of_row[c]:
            linked[of_row[r], of_row[c]] = linked[of_row[c], of_row[r]] = True
    return linked, numpy.array(of_row)


def expected(h, rows):
    linked, of_row = positions(h, rows)
    pieces, label = connected_components(linked, directed=False)
    degree = linked.sum(axis=1)
    return {"pieces": pieces, "largest_piece": int(numpy.bincount(label[of_row]).max()),
            "isolated": int((degree == 0).sum()), "dangling": int((degree == 1).sum())}


def cases():
    for name in MODELS:
        for boundary in ("open", "periodic"):
            for share in (0.1, 0.35, 0.5):
                for seed in (1, 2):
                    yield MODELS[name], boundary, share, seed


@test
def counts_agree_with_scipy():
    several = 0
    for model, boundary, share, seed in cases():
        path = write(os.path.join(folder(), "s.yaml"), SHEET % (model, boundary, "all", share, seed))
        told = run("spectrum", path, "--json").json()["inventory"]
        wanted = expected(*export(path))
        equal({key: told[key] for key in wanted}, wanted, "%s %s %g" % (model, boundary, share))
        several += wanted["pieces"] > 1
    check(several > 5, "only %d samples fell apart" % several)


@test
def the_largest_piece_is_what_is_left():
    for share in (0.35, 0.5):
        text = SHEET % (MODELS["haldane"], "open", "%s", share, 3)
        whole = export(write(os.path.join(folder(), "s.yaml"), text % "all"))
        kept = export(write(os.path.join(folder(), "s.yaml"), text % "largest"))
        linked, of_row = positions(*whole)
        _, label = connected_components(linked, directed=False)
        label = label[of_row]
        rows = numpy.flatnonzero(label == numpy.bincount(label).argmax())
        check(len(rows) < len(label), "nothing to remove at share %g" % share)
        key = lambda row: (row["cell_i"], row["cell_j"], row["orbital"])
        equal([key(row) for row in kept[1]], [key(whole[1][r]) for r in rows], "sites kept")
        difference = abs(kept[0] - whole[0][rows][:, rows])
        check(difference.nnz == 0 or difference.max() == 0, "the matrix of the piece has changed")


main()
