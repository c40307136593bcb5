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
