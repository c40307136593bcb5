# SPDX-License-Identifier: GPL-3.0-or-later
"""Markers recomputed from an exported sample by textbook formulas with NumPy and SciPy.

    peer.py H.mtx sites.csv --vectors 1 0 0.5 0.8660254 --cells 12 12 [--torus] [--fermi-energy 0]

reads what `selvedge export SHEET --hamiltonian H.mtx --sites sites.csv` writes. Nothing here is
shared with the C program: full diagonalisation, full projector, no shifts of coordinates.
"""
import argparse
import csv

import numpy as np
import scipy.io

BOTH = [("site", int), ("cell_i", int), ("cell_j", int), ("orbital", object), ("x", float),
        ("y", float)]


def read_matrix(path):
    """Dense Hermitian matrix of a Matrix Market file."""
    matrix = scipy.io.mmread(path)
    dense = np.asarray(matrix.todense() if hasattr(matrix, "todense") else matrix, dtype=complex)
    if not np.array_equal(dense, dense.conj().T):
        raise ValueError("%s is not Hermitian" % path)
    return dense


def read_sites(path, extra=()):
    """Columns of a sites file as a structured array; `extra` are further columns of numbers."""
    kinds = BOTH + [(name, float) for name in extra]
    with open(path, newline="", encoding="utf-8") as file:
        rows = list(csv.DictReader(file))
    return np.array([tuple(kind(row[name]) if kind is not object else row[name]
                           for name, kind in kinds) for row in rows], dtype=kinds)


def occupied_states(hamiltonian, fermi_energy=0.0, electrons=None):
    """Columns: eigenvectors below the Fermi energy, or the lowest `electrons`."""
    energies, vectors = np.linalg.eigh(hamiltonian)
    if electrons is None:
        electrons = int(np.count_nonzero(energies < fermi_energy))
    return vectors[:, :electrons], energies


def electrons_of_filling(filling, states):
    """Nearest integer, ties up."""
    return int(np.floor(filling * states + 0.5))


def cell_area(vectors):
    (ax, ay), (bx, by) = vectors
    return ax * by - ay * bx


def local_chern(states, x, y, area):
    """c(r) = (4π/A) Im⟨r|P x P y P|r⟩ for every site (Bianco, Resta, PRB 84, 241106(R) (2011))."""
    projector = states @ states.conj().T
    product = projector @ (x[:, None] * projector) @ (y[:, None] * projector)
    return 4.0 * np.pi / area * np.imag(np.diagonal(product))


def window_size(length, share):
    """Integer of the parity of `length` nearest to share·length, ties up (30·0.5 → 16)."""
    candidates = [n for n in range(0, length + 1) if (length - n) % 2 == 0]
    return min(candidates, key=lambda n: (abs(n - share * length), -n))


def window_cells(length1, length2, share):
    """The cells (i, j) of the centred window of a flake of length1×length2 cells."""
    n1, n2 = window_size(length1, share), window_size(length2, share)
    first1, first2 = (length1 - n1) // 2, (length2 - n2) // 2
    return {(i, j) for i in range(first1, first1 + n1) for j in range(first2, first2 + n2)}


def window_mean(marker, sites, window):
    """Sum over the sites of the window by the number of its cells, vacant ones included."""
    inside = np.array([(i, j) in window for i, j in zip(sites["cell_i"], sites["cell_j"])])
    return marker[inside].sum() / len(window)


def reduced(x, y, torus):
    """Coordinates (u, v) with r = u·T1 + v·T2 for the rows T1, T2 of `torus`."""
    return np.linalg.solve(np.asarray(torus, dtype=float).T, np.stack([x, y]))


def bott_matrices(states, x, y, torus):
    """U and V: the torus phases of the two reduced coordinates in the occupied basis."""
    u, v = reduced(x, y, torus)
    return [states.conj().T @ (np.exp(2j * np.pi * w)[:, None] * states) for w in (u, v)]


def bott(states, x, y, torus):
    """(1/2π) Σ arg eig(V U V† U†), not rounded (Loring, Hastings, EPL 92, 67004 (2010))."""
    if states.shape[1] in (0, states.shape[0]):
        return 0.0
    u, v = bott_matrices(states, x, y, torus)
    return np.angle(np.linalg.eigvals(v @ u @ v.conj().T @ u.conj().T)).sum() / (2.0 * np.pi)


def bott_without_log(states, x, y, torus):
    """Im Tr(V U V† U†)/2π, which reaches the index only as 1/L²."""
    u, v = bott_matrices(states, x, y, torus)
    return np.imag(np.trace(v @ u @ v.conj().T @ u.conj().T)) / (2.0 * np.pi)


def spin_halves(states, spins):
    """Bases of the halves of the occupied space with positive and negative P sz P, and its gap about
    zero (E. Prodan, PRB 80, 125327 (2009))."""
    values, vectors = np.linalg.eigh(states.conj().T @ (spins[:, None] * states))
    down = np.count_nonzero(values < 0.0)
    halves = states @ vectors[:, down:], states @ vectors[:, :down]
    return halves, values[down] - values[down - 1]


def with_torus_flux(hamiltonian, x, y, torus, quanta):
    """Whole quanta through a torus, hops by the nearest image: A = Φ s dt in torus coordinates, an
    element that wraps by T1 gets exp(+2πiΦ t) of its wrapped end (electrons). Tori much larger than
    the hops only."""
    s, t = reduced(x, y, torus)
    rows, columns = np.nonzero(hamiltonian)  # ⟨row|H|column⟩: a hop from column to row
    wound = np.round(s[rows] - s[columns]), np.round(t[rows] - t[columns])
    s1, t1 = s[rows] - wound[0], t[rows] - wound[1]  # where the hop ends before wrapping
    turns = -0.5 * (s1 + s[columns]) * (t1 - t[columns]) - wound[0] * (t1 + wound[1])
    turned = hamiltonian.copy()
    turned[rows, columns] *= np.exp(2j * np.pi * quanta * turns)
    return turned


def density_response(hamiltonian, x, y, torus, fermi_energy=0.0):
    """States gained below the Fermi energy with −1, +1 quantum through the torus (Streda 1982)."""
    below = [int(np.count_nonzero(np.linalg.eigvalsh(
        with_torus_flux(hamiltonian, x, y, torus, quanta)) < fermi_energy)) for quanta in (0, -1, 1)]
    return below[1] - below[0], below[2] - below[0]


def with_hole_flux(hamiltonian, x, y, hole, flux):
    """Flux through a hole as a phase on the hops across a cut from the hole along +x: exp(−2πiΦ)
    counter-clockwise."""
    dx, dy = x - hole[0], y - hole[1]
    rows, columns = np.nonzero(hamiltonian)
    up = (dy[columns] < 0) & (dy[rows] >= 0)
    down = (dy[columns] >= 0) & (dy[rows] < 0)
    with np.errstate(divide="ignore", invalid="ignore"):
        at = dx[columns] - dy[columns] * (dx[rows] - dx[columns]) / (dy[rows] - dy[columns])
    crossing = np.where(up & (at > 0), 1, 0) - np.where(down & (at > 0), 1, 0)
    turned = hamiltonian.copy()
    turned[rows, columns] *= np.exp(-2j * np.pi * flux * crossing)
    return turned


def spectral_flow(hamiltonian, x, y, hole, inner, fermi_energy=0.0, steps=40):
    """Electrons that drift to the hole while one quantum is put through it, by the charge there: the
    charge of the states below the Fermi energy comes back to itself, so what drifts in smoothly leaves
    by jumps, one for each level that rises through the Fermi energy. No level is followed."""
    charge = []
    for flux in np.linspace(0.0, 1.0, steps + 1) + 0.5 / steps:
        energies, states = np.linalg.eigh(with_hole_flux(hamiltonian, x, y, hole, flux))
        charge.append(float((np.abs(states[inner][:, energies < fermi_energy])**2).sum()))
    change = np.diff(charge)
    return change[np.abs(change) < 0.4].sum()


def main():
    parser = argparse.ArgumentParser()
    parser.add_argument("matrix")
    parser.add_argument("sites")
    parser.add_argument("--vectors", nargs=4, type=float, default=[1.0, 0.0, 0.0, 1.0])
    parser.add_argument("--cells", nargs=2, type=int, required=True)
    parser.add_argument("--torus", action="store_true")
    parser.add_argument("--window", type=float, default=0.5)
    parser.add_argument("--fermi-energy", type=float, default=0.0)
    given = parser.parse_args()
    vectors = np.reshape(given.vectors, (2, 2))
    sites = read_sites(given.sites)
    states, energies = occupied_states(read_matrix(given.matrix), given.fermi_energy)
    print("sites %d, occupied %d, levels next to the Fermi energy %.6g %.6g"
          % (len(sites), states.shape[1], energies[max(states.shape[1] - 1, 0)],
             energies[min(states.shape[1], len(energies) - 1)]))
    if given.torus:
        torus = vectors * np.array(given.cells)[:, None]
        print("Bott index %.12f" % bott(states, sites["x"], sites["y"], torus))
        return
    marker = local_chern(states, sites["x"], sites["y"], cell_area(vectors))
    mean = window_mean(marker, sites, window_cells(*given.cells, given.window))
    print("window mean %.12f, sum over sites %.3e" % (mean, marker.sum()))


if __name__ == "__main__":
    main()
