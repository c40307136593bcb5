# SPDX-License-Identifier: GPL-3.0-or-later
"""Density response and spectral flow against NumPy on the exported Hamiltonian: other gauges, full
spectra, and for the flow the charge near the hole instead of followed levels."""
import os

import numpy as np
import peer
from harness import check, close, equal, folder, main, run, test, write

POTENTIAL = "  - {name: pot, kind: onsite, distribution: box, width: %g, per: site}"
VACANCIES = "  - {name: vac, kind: vacancies, share: 0.03}"


def sheet(model, flake, markers, width=0.0):
    lines = ["selvedge: 1", "model: " + model, "flake: " + flake]
    lines += ["disorder:", POTENTIAL % width] if width else []
    lines += [VACANCIES] if width > 1 else []
    return write(os.path.join(folder(), "sheet.yaml"),
                 "\n".join(lines + ["markers: {%s: {}}" % markers, ""]))


def export(path):
    top = folder()
    matrix, sites = os.path.join(top, "H.mtx"), os.path.join(top, "sites.csv")
    run("export", path, "--hamiltonian", matrix, "--sites", sites, code=0)
    places = peer.read_sites(sites)
    return peer.read_matrix(matrix), places["x"], places["y"]


def marker(path, name):
    return run("map", path, "--json", code=0).json()["markers"][name]


@test
def density_response_is_that_of_the_exported_torus():
    honeycomb = [[8.0, 0.0], [3.5, 3.5 * 3.0**0.5]]
    for model, flake, torus, wanted in (
            ("{name: qi_wu_zhang, m: -1}", "{shape: rectangle, cells: [8, 7], boundary: periodic}",
             [[8.0, 0.0], [0.0, 7.0]], 1),
            ("{name: qi_wu_zhang, m: 1}", "{shape: rectangle, cells: [8, 7], boundary: periodic}",
             [[8.0, 0.0], [0.0, 7.0]], -1),
            ("{name: haldane, t2: 0.2, phi: 90 deg}",
             "{shape: parallelogram, cells: [8, 7], boundary: periodic}", honeycomb, 1),
            ("{name: haldane, t2: 0.2, phi: 90 deg, mass: 3}",
             "{shape: parallelogram, cells: [8, 7], boundary: periodic}", honeycomb, 0)):
        for width in (0.0, 0.4):
            path = sheet(model, flake, "density_response", width)
            answer = marker(path, "density_response")
            check(answer["resolved"], "%s is resolved: %r" % (model, answer))
            equal(answer["index"], wanted, model)
            equal(peer.density_response(*export(path), torus), (-wanted, wanted), "NumPy: " + model)


@test
def spectral_flow_is_the_charge_that_drifts_to_the_hole():
    for model, wanted, width in (("{name: qi_wu_zhang, m: -1}", 1, 1.0),
                                 ("{name: qi_wu_zhang, m: 1}", -1, 0),
                                 ("{name: haldane, t2: 0.2, phi: 90 deg, mass: 3}", 0, 1.5)):
        path = sheet(model, "{shape: annulus, inner: 2.2, outer: 7.2}", "spectral_flow", width)
        answer = marker(path, "spectral_flow")
        hamiltonian, x, y = export(path)
        centre = (0.25, 0.25 / 3.0**0.5) if "haldane" in model else (0.0, 0.0)
        hole = (centre[0] + 0.013, centre[1] + 0.021)  # no site on the cut
        inner = np.hypot(x - centre[0], y - centre[1]) < 4.7
        drift = peer.spectral_flow(hamiltonian, x, y, hole, inner)
        check(answer["resolved"], "%s is resolved: %r" % (model, answer))
        equal(answer["index"], wanted, model)
        close(drift, wanted, 0.15, "NumPy: " + model)


main()
