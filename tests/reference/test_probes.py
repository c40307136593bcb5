# SPDX-License-Identifier: GPL-3.0-or-later
"""The localizer over grids and lines against all eigenvalues of the localizer made by NumPy from the
exported Hamiltonian: disordered samples of several models, both signs, oblique lattices."""
import os

import numpy as np
import peer
from harness import check, close, equal, folder, main, run, test, write

# Gaps are given to a relative 1e-7; the eigenvalues here to about 1e-13.
GAP = 3e-7
CASES = [
    ("{name: qi_wu_zhang, m: -1}", "{shape: rectangle, cells: [8, 7]}", 0.0),
    ("{name: qi_wu_zhang, m: 1.3}", "{shape: rectangle, cells: [7, 8]}", 0.1),
    ("{name: haldane, t2: 0.2, phi: 90 deg, mass: 0.2}", "{shape: parallelogram, cells: [8, 7]}", 0.05),
    ("{name: haldane, t2: 0.2, phi: -70 deg}", "{shape: hexagon, cells: 4}", 0.0),
    ("{name: haldane, t2: 0.1, phi: 90 deg, mass: 1.5}", "{shape: parallelogram, cells: [7, 7]}", 0.0),
    ("{name: hofstadter, flux: [1, 5]}", "{shape: rectangle, cells: [11, 10]}", -2.2),
    ("{name: custom, vectors: [[1, 0.2], [0.6, 1.1]], orbitals: [{name: a, at: [0, 0]}, {name: b, at: [0.3, 0.4]}],"
     " onsite: {a: -1, b: 1}, hops: ["
     "{from: a, to: a, shift: [1, 0], amplitude: [0.5, 0]}, {from: a, to: a, shift: [0, 1], amplitude: [0.5, 0]},"
     " {from: b, to: b, shift: [1, 0], amplitude: [-0.5, 0]}, {from: b, to: b, shift: [0, 1], amplitude: [-0.5, 0]},"
     " {from: a, to: b, shift: [1, 0], amplitude: [0, 0.5]}, {from: b, to: a, shift: [1, 0], amplitude: [0, 0.5]},"
     " {from: a, to: b, shift: [0, 1], amplitude: [-0.5, 0]}, {from: b, to: a, shift: [0, 1], amplitude: [0.5, 0]}]}",
     "{shape: parallelogram, cells: [8, 8]}", 0.0),
]


def localizer_levels(hamiltonian, sites, energy, kappa, at):
    """Eigenvalues of [[H − E, κ(X − iY)], [κ(X + iY), −(H − E)]] about a point."""
    place = kappa * np.diag((sites["x"] - at[0]) - 1j * (sites["y"] - at[1]))
    shifted = hamiltonian - energy * np.eye(len(sites))
    return np.linalg.eigvalsh(np.block([[shifted, place], [place.conj(), -shifted]]))


def index_of(levels):
    """Minus the half signature."""
    return int(np.count_nonzero(levels < 0) - np.count_nonzero(levels > 0)) // 2


def realisation_of(model, flake, energy, localizer, number):
    """(Hamiltonian, sites, the localizer's part of the map) of one realisation."""
    top = folder()
    path = write(os.path.join(top, "sheet.yaml"), """selvedge: 1
title: probes
model: %s
flake: %s
disorder:
  - {name: vac, kind: vacancies, share: 0.03}
  - {name: pot, kind: onsite, distribution: box, width: 0.8}
occupation: {fermi_energy: %g}
markers: {localizer: {%s}}
""" % (model, flake, energy, localizer))
    files = os.path.join(top, "H.mtx"), os.path.join(top, "sites.csv")
    run("export", path, "--hamiltonian", files[0], "--sites", files[1], "-k", number, code=0)
    result = run("map", path, "--json", "-k", number)
    check(result.code in (0, 1), "exit code %d: %s" % (result.code, result.err))
    return peer.read_matrix(files[0]), peer.read_sites(files[1]), result.json()["markers"]["localizer"]


def compare(hamiltonian, sites, energy, part, places, kappas, what):
    """Gap and index of every probe; returns how many are resolved and the indices met."""
    met = []
    for k, (at, kappa) in enumerate(zip(places, kappas)):
        levels = localizer_levels(hamiltonian, sites, energy, kappa, at)
        wanted = np.abs(levels).min()
        close(part["gap"][k], wanted, GAP * wanted + 1e-12, "%s: gap %d" % (what, k))
        if part["resolved"][k]:
            equal(part["index"][k], index_of(levels), "%s: index %d" % (what, k))
            met.append(part["index"][k])
        if part["resolved"][k] and "withstands" in part:
            check(0 < part["withstands"][k] <= wanted, "%s: withstands %g, gap %g"
                  % (what, part["withstands"][k], wanted))
    return met


@test
def grids_and_kappas_of_disordered_samples():
    met = set()
    resolved = 0
    for number, (model, flake, energy) in enumerate(CASES):
        keys = ("at: [3.3, 2.9], kappa: 0.3, threshold: 0.08, points: [4, 5], from: [-4, -3], to: [9.5, 8], "
                "kappa_range: [0.1, 1.2], kappa_points: 4")
        hamiltonian, sites, ours = realisation_of(model, flake, energy, keys, number % 3)
        probes, kappas = ours["probes"], ours["kappas"]
        places = list(zip(probes["x"], probes["y"]))
        equal(len(places), 20, "probes")
        found = compare(hamiltonian, sites, energy, probes, places, [0.3] * 20, model)
        found += compare(hamiltonian, sites, energy, kappas, [(3.3, 2.9)] * 4, kappas["kappa"], model)
        met.update(found)
        resolved += len(found)
    check({-1, 0, 1} <= met, "indices met: %r" % met)
    check(resolved > len(CASES) * 8, "%d resolved" % resolved)


@test
def a_line_out_of_the_flake():
    for model, flake, energy in CASES[:4]:
        keys = "at: [3.3, 2.9], kappa: 0.35, threshold: 0.1, points: 9, from: [3, 3], to: [40, 25]"
        hamiltonian, sites, ours = realisation_of(model, flake, energy, keys, 0)
        probes = ours["probes"]
        places = list(zip(probes["x"], probes["y"]))
        compare(hamiltonian, sites, energy, probes, places, [0.35] * 9, model)
        equal(probes["index"][4:], [0] * 5, "far outside, " + model)


main()
