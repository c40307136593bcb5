# SPDX-License-Identifier: GPL-3.0-or-later
"""Exported Hamiltonians of disordered samples against the same disorder written in NumPy."""
import os

import disorder
import models
import numpy as np
import peer
from harness import check, close, equal, folder, main, run, test, write

SEED = 17
HALDANE = "{name: haldane, t2: 0.2, phi: 70 deg, mass: 0.1}"
QWZ = "{name: qi_wu_zhang, m: -1}"


def export(model, shape, cells, entry, realisation=0, boundary="open"):
    """(Hamiltonian, sites) of a sheet with one entry of disorder."""
    top = folder()
    lines = ["selvedge: 1", "model: " + model,
             "flake: {shape: %s, cells: [%d, %d], boundary: %s}" % (shape, *cells, boundary),
             "disorder: [%s]" % entry, "ensemble: {seed: %d}" % SEED, ""]
    path = write(os.path.join(top, "sheet.yaml"), "\n".join(lines))
    matrix, sites = os.path.join(top, "H.mtx"), os.path.join(top, "sites.csv")
    run("export", path, "--hamiltonian", matrix, "--sites", sites, "-k", realisation, code=0)
    return peer.read_matrix(matrix), peer.read_sites(sites)


def stream(name, realisation=0):
    return disorder.Stream(SEED, name, realisation)


def haldane_twin(cells):
    wanted = models.haldane(*cells, 1.0, 0.2, np.radians(70.0), 0.1)
    return wanted[0], wanted[1]


def places(sites):
    return np.stack([sites["x"], sites["y"]], axis=1)


def same_vacancies(entry, vacant):
    hamiltonian, sites = export(HALDANE, "parallelogram", (9, 8), entry)
    clean, table = haldane_twin((9, 8))
    gone = vacant(table)
    check(0 < gone.sum() < 40, "%s: %d vacancies" % (entry, gone.sum()))
    if equal(len(sites), int((~gone).sum()), entry):
        close(np.abs(hamiltonian - clean[np.ix_(~gone, ~gone)]).max(), 0, 1e-14, entry)


@test
def vacancies_of_every_rule():
    s = stream("vac")

    def numbers(table):
        return np.array([s.uniform(r["cell_i"], r["cell_j"], int(r["orbital"])) for r in table])

    same_vacancies("{name: vac, kind: vacancies, share: 0.1}", lambda t: numbers(t) < 0.1)
    same_vacancies("{name: vac, kind: vacancies, count: 13}",
                   lambda t: numbers(t) <= np.sort(numbers(t))[12])
    same_vacancies("{name: vac, kind: vacancies, count: 5, on: B}",
                   lambda t: (t["orbital"] == 1)
                   & (numbers(t) <= np.sort(numbers(t)[t["orbital"] == 1])[4]))
    same_vacancies("{name: vac, kind: vacancies, share: 0.1, cluster_size: 4, cluster_radius: 1.1}",
                   lambda t: disorder.clustered(s, t, models.HONEYCOMB, 2, 0.1, 4, 1.1))
    plane = models.site_table([(i, j) for i in range(-3, 12) for j in range(-3, 11)],
                              models.HONEYCOMB_ORBITALS, models.HONEYCOMB)
    same_vacancies("{name: vac, kind: vacancies, share: 0.05, distance: 1.2}",
                   lambda t: disorder.spaced(s, t, plane, 0.05, 1.2))


def same_potential(entry, law, tolerance=1e-13, sign=(1, 1)):
    """On-site energies of a Haldane flake; `sign`: of the energy on A and B."""
    hamiltonian, sites = export(HALDANE, "parallelogram", (7, 6), entry, realisation=2)
    clean, table = haldane_twin((7, 6))
    shift = law(table) * np.where(table["orbital"] == 0, sign[0], sign[1])
    check(np.abs(shift).max() > 1e-3, entry + ": something is drawn")
    close(np.abs(hamiltonian - clean - np.diag(shift)).max(), 0, tolerance, entry)


@test
def energies_of_every_law():
    s = stream("pot", 2)
    for law in ("box", "gaussian", "binary"):
        same_potential("{name: pot, kind: onsite, distribution: %s, width: 0.7}" % law,
                       lambda t: 0.7 * np.array([disorder.standard(
                           law, s.uniform(r["cell_i"], r["cell_j"], int(r["orbital"]))) for r in t]))
        same_potential("{name: pot, kind: mass, distribution: %s, width: 0.7}" % law,
                       lambda t: 0.7 * np.array([disorder.standard(
                           law, s.uniform(r["cell_i"], r["cell_j"], int(r["orbital"]))) for r in t]),
                       sign=(1, -1))
    field = "distribution: correlated, width: 0.5, correlation_length: 1.7"
    for kind, sign in (("onsite", (1, 1)), ("mass", (1, -1))):
        same_potential("{name: pot, kind: %s, %s}" % (kind, field),
                       lambda t: 0.5 * disorder.smooth(s, places(t), 1.7), sign=sign)
    same_potential("{name: pot, kind: onsite, distribution: puddles, density: 0.05, strength: 0.4, "
                   "distance: 1, screening_length: 1}",
                   lambda t: disorder.puddles(s, places(t), models.HONEYCOMB, 0.05, 0.4, 1, 1, 16),
                   tolerance=1e-6)


@test
def hops_of_a_square_lattice():
    s, n1, n2 = stream("hop"), 6, 5
    for boundary in ("open", "periodic"):
        hamiltonian, _ = export(QWZ, "rectangle", (n1, n2),
                                "{name: hop, kind: hopping, distribution: gaussian, width: 0.2, phase: 0.6}",
                                boundary=boundary)
        wanted, _ = models.qi_wu_zhang(n1, n2, -1.0, boundary == "periodic")
        for i in range(n1):
            for j in range(n2):
                here = 2 * (i * n2 + j)
                # The bond along x begins with the model's hop 0, the one along y with hop 4.
                for first, step in ((0, (1, 0)), (4, (0, 1))):
                    to = (i + step[0], j + step[1])
                    if boundary == "open" and (to[0] >= n1 or to[1] >= n2):
                        continue
                    there = 2 * (to[0] % n1 * n2 + to[1] % n2)
                    slot = disorder.BONDS + 2 * first
                    factor = ((1 + 0.2 * s.normal(i, j, slot))
                              * np.exp(0.6j * s.normal(i, j, slot + 1)))
                    wanted[there:there + 2, here:here + 2] *= factor
                    wanted[here:here + 2, there:there + 2] *= np.conj(factor)
        close(np.abs(hamiltonian - wanted).max(), 0, 1e-13, "hopping, " + boundary)


@test
def flux_and_adatoms_of_a_square_lattice():
    s, n1, n2 = stream("flux"), 6, 5
    hamiltonian, _ = export(QWZ, "rectangle", (n1, n2), "{name: flux, kind: flux, width: 0.8}",
                            boundary="periodic")
    wanted, _ = models.qi_wu_zhang(n1, n2, -1.0, True)
    for i in range(n1):
        for j in range(n2):
            here = 2 * (i * n2 + j)
            for slot, to in enumerate(((i + 1, j), (i, j + 1))):
                there = 2 * (to[0] % n1 * n2 + to[1] % n2)
                factor = np.exp(-0.4j * s.normal(i, j, slot))
                wanted[there:there + 2, here:here + 2] *= factor
                wanted[here:here + 2, there:there + 2] *= np.conj(factor)
    close(np.abs(hamiltonian - wanted).max(), 0, 1e-13, "flux")
    s = stream("ad")
    hamiltonian, sites = export(QWZ, "rectangle", (n1, n2),
                                "{name: ad, kind: adatoms, share: 0.2, energy: 0.3, coupling: 1.5}")
    clean, table = models.qi_wu_zhang(n1, n2)
    hosts = [r for r, row in enumerate(table)
             if s.uniform(row["cell_i"], row["cell_j"], int(row["orbital"])) < 0.2]
    rows = sorted([(r, 0) for r in range(len(table))] + [(r, 1) for r in hosts])
    equal([r[1] for r in rows], [int(o == "adatom") for o in sites["orbital"]], "rows of adatoms")
    wanted = np.zeros((len(rows), len(rows)), dtype=complex)
    for a, (r, adatom) in enumerate(rows):
        for b, (c, other) in enumerate(rows):
            if adatom == other == 0:
                wanted[a, b] = clean[r, c]
            elif r == c:
                wanted[a, b] = 0.3 if a == b else 1.5
    close(np.abs(hamiltonian - wanted).max(), 0, 1e-14, "adatoms")


@test
def disorder_makes_a_trivial_film_topological():
    # Groth et al., Phys. Rev. Lett. 103, 196805 (2009); for this lattice the first Born estimate
    # √(12 (|m| − 2)/I) with I = −⟨d_z/|d|²⟩ is W = 2.4 to 2.5 at m = −2.2 (independent computation):
    # clean and weakly disordered samples are trivial, those of W = 3.5 topological.
    path = write(os.path.join(folder(), "sheet.yaml"), "\n".join([
        "selvedge: 1", "model: {name: qi_wu_zhang, m: -2.2}",
        "flake: {shape: rectangle, cells: [10, 10], boundary: periodic}",
        "disorder: [{name: pot, kind: onsite, distribution: box, width: 1, per: cell}]",
        "occupation: {filling: 0.5}", "markers: {bott: {}}",
        "ensemble: {realisations: 16, seed: 5}",
        "sweep: [{parameter: disorder.pot.width, values: [1.5, 3.5]}]", ""]))
    points = run("average", path, "-o", os.path.join(folder(), "run"), "--json", code=0).json()["points"]
    weak, strong = (p["markers"]["bott"] for p in points)
    equal((weak["mean"], weak["unresolved"]), (0, 0), "W = 1.5")
    check(strong["mean"] > 0.8, "W = 3.5: mean index %g" % strong["mean"])


main()
