# SPDX-License-Identifier: GPL-3.0-or-later
"""The program against the independent computation: exported Hamiltonians are compared with models
built from their definitions, markers with the textbook formulas on the exported matrix."""
import os

import models
import numpy as np
import peer
from harness import check, close, equal, folder, main, run, test, write

# Both sides diagonalise matrices of order ≤ 300 with norm ≤ 5: rounding stays far below this.
ROUNDING = 1e-10

HALDANE = "{name: haldane, t1: 1, t2: 0.2, phi: 70 deg, mass: 0.1}"
QWZ = "{name: qi_wu_zhang, m: -1}"
POTENTIAL = "- {name: pot, kind: onsite, distribution: box, width: 1.5, per: site}"
VACANCIES = "- {name: vac, kind: vacancies, share: 0.05}"


def sheet(model, flake, disorder=(), extra=""):
    lines = ["selvedge: 1", "title: test", "model: " + model, "flake: " + flake]
    if disorder:
        lines += ["disorder:"] + ["  " + row for row in disorder]
    lines += ["markers: {local_chern: {window: 0.5}, bott: {}}", extra, ""]
    return write(os.path.join(folder(), "sheet.yaml"), "\n".join(lines))


def export(path, *more):
    """(Hamiltonian, sites) of one realisation."""
    top = folder()
    matrix, sites = os.path.join(top, "H.mtx"), os.path.join(top, "sites.csv")
    run("export", path, "--hamiltonian", matrix, "--sites", sites, *more, code=0)
    return peer.read_matrix(matrix), peer.read_sites(sites)


def same_matrix(model, flake, twin, what):
    """Exported clean Hamiltonian and sites equal the twin's, entry by entry."""
    hamiltonian, sites = export(sheet(model, flake))
    wanted, places = twin[0], twin[1]
    if not equal(hamiltonian.shape, wanted.shape, what):
        return
    close(np.abs(hamiltonian - wanted).max(), 0.0, 1e-14, what + ": largest difference")
    for name in ("x", "y"):
        close(np.abs(sites[name] - places[name]).max(), 0.0, 1e-12, what + ": " + name)
    for name in ("cell_i", "cell_j"):
        check(np.array_equal(sites[name], places[name]), what + ": " + name)


@test
def clean_hamiltonians_are_those_of_the_definitions():
    angle = np.radians(70.0)
    for periodic, boundary in ((False, "open"), (True, "periodic")):
        same_matrix(QWZ, "{shape: rectangle, cells: [5, 4], boundary: %s}" % boundary,
                    models.qi_wu_zhang(5, 4, -1.0, periodic), "qi_wu_zhang " + boundary)
        same_matrix(HALDANE, "{shape: parallelogram, cells: [5, 4], boundary: %s}" % boundary,
                    models.haldane(5, 4, 1.0, 0.2, angle, 0.1, periodic), "haldane " + boundary)
        same_matrix("{name: hofstadter, flux: [2, 5]}",
                    "{shape: rectangle, cells: [10, 5], boundary: %s}" % boundary,
                    models.hofstadter(10, 5, 2, 5, periodic), "hofstadter " + boundary)


@test
def hexagon_has_the_levels_of_its_definition():
    hamiltonian, sites = export(sheet(HALDANE, "{shape: hexagon, cells: 4}"))
    wanted, places, _ = models.haldane_hexagon(4, phi=np.radians(70.0), mass=0.1)
    equal(len(sites), 6 * 4**2, "sites")
    equal(len(places), 6 * 4**2, "sites of the twin")
    difference = np.linalg.eigvalsh(hamiltonian) - np.linalg.eigvalsh(wanted)
    close(np.abs(difference).max(), 0.0, 1e-12, "largest difference of levels")


def map_with_sites(path, *more):
    """JSON of `map` and the site-by-site markers."""
    values = os.path.join(folder(), "map.csv")
    answer = run("map", path, "--json", "--csv", values, *more, code=0).json()
    return answer, peer.read_sites(values, extra=["local_chern"])


def compare_marker(path, cells, vectors, *more):
    hamiltonian, sites = export(path, *more)
    answer, values = map_with_sites(path, *more)
    states, _ = peer.occupied_states(hamiltonian)
    marker = peer.local_chern(states, sites["x"], sites["y"], peer.cell_area(vectors))
    check(np.array_equal(values[["site", "cell_i", "cell_j"]], sites[["site", "cell_i", "cell_j"]]),
          "order of the sites")
    close(np.abs(values["local_chern"] - marker).max(), 0.0, ROUNDING, "largest site difference")
    window = peer.window_cells(*cells, 0.5)
    ours = answer["markers"]["local_chern"]
    close(ours["window_mean"], peer.window_mean(marker, sites, window), ROUNDING, "window mean")
    equal(ours["window_cells"], len(window), "window cells")
    close(ours["sum_over_sites"], 0.0, ROUNDING, "sum over sites")
    equal(answer["sites"], len(sites), "sites")
    return answer


@test
def local_chern_site_by_site():
    compare_marker(sheet(QWZ, "{shape: rectangle, cells: [9, 8]}"), (9, 8), models.SQUARE)
    disordered = sheet(HALDANE, "{shape: parallelogram, cells: [10, 9]}", [VACANCIES, POTENTIAL])
    for realisation in (0, 3):
        compare_marker(disordered, (10, 9), models.HONEYCOMB, "-k", realisation)


@test
def bott_index_on_the_closed_copy():
    for model, shape, cells, vectors in (
            (QWZ, "rectangle", (8, 7), models.SQUARE),
            (HALDANE, "parallelogram", (9, 7), models.HONEYCOMB),
            ("{name: hofstadter, flux: [1, 5]}", "rectangle", (10, 10), models.SQUARE)):
        # A filling in the first gap, so that E_F cannot sit on a level.
        filling = 0.2 if "hofstadter" in model else 0.5
        path = sheet(model, "{shape: %s, cells: [%d, %d], boundary: periodic}" % (shape, *cells),
                     ["- {name: pot, kind: onsite, distribution: gaussian, width: 0.2}"],
                     "occupation: {filling: %g}" % filling)
        torus = np.asarray(vectors) * np.array(cells)[:, None]
        for realisation in (0, 1):
            hamiltonian, sites = export(path, "-k", realisation)
            electrons = peer.electrons_of_filling(filling, len(sites))
            states, _ = peer.occupied_states(hamiltonian, electrons=electrons)
            wanted = peer.bott(states, sites["x"], sites["y"], torus)
            close(wanted, 1.0, ROUNDING, "the peer's own index of %s" % model)
            ours = run("map", path, "--json", "-k", realisation, code=0).json()["markers"]["bott"]
            equal((ours["index"], ours["resolved"]), (round(wanted), True), "Bott index")


@test
def average_is_the_mean_of_the_maps():
    path = sheet(QWZ, "{shape: rectangle, cells: [8, 8]}", [VACANCIES, POTENTIAL],
                 "ensemble: {realisations: 6, seed: 5}")
    point = run("average", path, "-o", os.path.join(folder(), "run"), "--json", code=0).json()["points"][0]
    window = peer.window_cells(8, 8, 0.5)
    means = []
    for realisation in range(6):
        hamiltonian, sites = export(path, "-k", realisation)
        states, _ = peer.occupied_states(hamiltonian)
        marker = peer.local_chern(states, sites["x"], sites["y"], 1.0)
        means.append(peer.window_mean(marker, sites, window))
    ours = point["markers"]["local_chern"]
    equal((point["realisations"], ours["unresolved"]), (6, 0), "counts")
    close(ours["mean"], np.mean(means), ROUNDING, "mean")
    close(ours["deviation"], np.std(means, ddof=1), ROUNDING, "deviation")
    close(ours["standard_error"], np.std(means, ddof=1) / np.sqrt(6), ROUNDING, "standard error")


main()
