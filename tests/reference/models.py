# SPDX-License-Identifier: GPL-3.0-or-later
"""Lattice models built directly from their definitions with NumPy, as an independent twin of
src/model and src/sample: dense, slow, without tables. Conventions: include/selvedge/conventions.h.

A flake is (hamiltonian, sites): sites is an array with the fields cell_i, cell_j, orbital, x, y in
the order of the matrix; orbital is the number in the model.
"""
import itertools

import numpy as np

SITE = np.dtype([("cell_i", int), ("cell_j", int), ("orbital", int), ("x", float), ("y", float)])
SQUARE = np.array([[1.0, 0.0], [0.0, 1.0]])
HONEYCOMB = np.array([[1.0, 0.0], [0.5, np.sqrt(3.0) / 2.0]])
# A at the origin of the cell, B at (a1 + a2)/3.
HONEYCOMB_ORBITALS = np.array([[0.0, 0.0], (HONEYCOMB[0] + HONEYCOMB[1]) / 3.0])

PAULI_X = np.array([[0, 1], [1, 0]], dtype=complex)
PAULI_Y = np.array([[0, -1j], [1j, 0]], dtype=complex)
PAULI_Z = np.array([[1, 0], [0, -1]], dtype=complex)


def site_table(cells, orbitals, vectors):
    """Sites of the given (i, j) cells, ordered by i, then j, then orbital."""
    rows = []
    for i, j in sorted(cells):
        for number, at in enumerate(orbitals):
            x, y = i * vectors[0] + j * vectors[1] + at
            rows.append((i, j, number, x, y))
    return np.array(rows, dtype=SITE)


def rectangle(n1, n2):
    return list(itertools.product(range(n1), range(n2)))


# ------------------------------------------------------------------ Qi, Wu, Zhang

def qi_wu_zhang_bloch(k1, k2, m=-1.0):
    """H(k) = sin kx σx + sin ky σy + (m + cos kx + cos ky) σz."""
    return (np.sin(k1) * PAULI_X + np.sin(k2) * PAULI_Y
            + (m + np.cos(k1) + np.cos(k2)) * PAULI_Z)


def qi_wu_zhang(n1, n2, m=-1.0, periodic=False, potential=None):
    """Flake of n1×n2 cells; `potential` is one energy per cell, added to both orbitals.

    From H(k) = Σ_s T_s e^{−ik·s}, T_s = ⟨R+s|H|R⟩: sin k = (e^{ik} − e^{−ik})/2i gives
    T_x = (σz + iσx)/2 and T_y = (σz + iσy)/2.
    """
    sites = site_table(rectangle(n1, n2), np.zeros((2, 2)), SQUARE)
    hamiltonian = np.zeros((2 * n1 * n2, 2 * n1 * n2), dtype=complex)
    for i, j in rectangle(n1, n2):
        here = 2 * (i * n2 + j)
        shift = 0.0 if potential is None else potential[i * n2 + j]
        hamiltonian[here:here + 2, here:here + 2] += m * PAULI_Z + shift * np.eye(2)
        for step, pauli in (((1, 0), PAULI_X), ((0, 1), PAULI_Y)):
            to_i, to_j = i + step[0], j + step[1]
            if not periodic and (to_i >= n1 or to_j >= n2):
                continue
            there = 2 * ((to_i % n1) * n2 + to_j % n2)
            block = (PAULI_Z + 1j * pauli) / 2.0
            hamiltonian[there:there + 2, here:here + 2] += block
            hamiltonian[here:here + 2, there:there + 2] += block.conj().T
    return hamiltonian, sites


# ------------------------------------------------------------------------ Haldane

def haldane_from_sites(sites, t1, t2, phi, mass, images=((0.0, 0.0),)):
    """Hamiltonian from the positions alone, so that no list of shifts can be wrong twice.

    ⟨r'|H|r⟩ = t1 for nearest neighbours (distance 1/√3), t2 e^{+iφ} for second neighbours when the
    way from r to r' over their common neighbour turns right (clockwise), t2 e^{−iφ} when it turns
    left; ±mass on A, B. `images` are the lattice translations under which the flake repeats.
    """
    points = np.stack([sites["x"], sites["y"]], axis=1)
    hamiltonian = np.diag(np.where(sites["orbital"] == 0, mass, -mass)).astype(complex)
    nearest = HONEYCOMB_ORBITALS[1]
    around = [rotate(nearest, angle) for angle in (0.0, 120.0, 240.0)]
    for image in images:
        step = points[None, :, :] + np.asarray(image) - points[:, None, :]
        distance = np.hypot(step[..., 0], step[..., 1])
        for origin, target in np.argwhere(np.abs(distance - 1.0 / np.sqrt(3.0)) < 1e-6):
            hamiltonian[target, origin] += t1
        for origin, target in np.argwhere(np.abs(distance - 1.0) < 1e-6):
            if sites["orbital"][origin] != sites["orbital"][target]:
                continue
            sign = turn(step[origin, target], around, sites["orbital"][origin])
            hamiltonian[target, origin] += t2 * np.exp(1j * phi * sign)
    return hamiltonian


def rotate(vector, degrees):
    angle = np.radians(degrees)
    return np.array([[np.cos(angle), -np.sin(angle)], [np.sin(angle), np.cos(angle)]]) @ vector


def turn(step, around, orbital):
    """+1 when the way over the common nearest neighbour turns right, −1 when it turns left."""
    for first in around if orbital == 0 else [-vector for vector in around]:
        second = step - first
        if abs(np.hypot(*second) - np.hypot(*first)) < 1e-6:
            return -np.sign(first[0] * second[1] - first[1] * second[0])
    raise ValueError("no common neighbour")


def haldane(n1, n2, t1=1.0, t2=0.2, phi=np.pi / 2, mass=0.0, periodic=False):
    """Parallelogram of n1×n2 cells along the lattice vectors."""
    sites = site_table(rectangle(n1, n2), HONEYCOMB_ORBITALS, HONEYCOMB)
    images = [(0.0, 0.0)]
    if periodic:
        images = [p * n1 * HONEYCOMB[0] + q * n2 * HONEYCOMB[1]
                  for p, q in itertools.product((-1, 0, 1), repeat=2)]
    return haldane_from_sites(sites, t1, t2, phi, mass, images), sites


def haldane_hexagon(n, t1=1.0, t2=0.2, phi=np.pi / 2, mass=0.0):
    """Hexagonal flake with zigzag edges, 6n² sites, cut from the plane about a hexagon centre.

    The n rings of hexagons about that centre: a site belongs when it touches one of them.
    """
    centre = (HONEYCOMB[0] + HONEYCOMB[1]) * 2.0 / 3.0
    rings = [i * HONEYCOMB[0] + j * HONEYCOMB[1] + centre
             for i, j in itertools.product(range(-n, n + 1), repeat=2)
             if max(abs(i), abs(j), abs(i + j)) < n]
    wide = [(i, j) for i, j in itertools.product(range(-2 * n - 2, 2 * n + 3), repeat=2)]
    sites = site_table(wide, HONEYCOMB_ORBITALS, HONEYCOMB)
    points = np.stack([sites["x"], sites["y"]], axis=1)
    gap = points[:, None, :] - np.array(rings)[None, :, :]
    keep = np.hypot(gap[..., 0], gap[..., 1]).min(axis=1) < 1.0 / np.sqrt(3.0) + 1e-6
    sites = sites[keep]
    return haldane_from_sites(sites, t1, t2, phi, mass), sites, centre


def haldane_bloch(k1, k2, t1=1.0, t2=0.2, phi=np.pi / 2, mass=0.0):
    """H(k) with ψ_k(R) = e^{ik·R} u_k(R), R the cell: H_ba = Σ_s t e^{−ik·s}.

    From A the clockwise second neighbours lie at a1, a2 − a1, −a2; from B at the opposites; the
    nearest neighbours of A are the B of the cells 0, −a1, −a2.
    """
    steps = [(1, 0), (-1, 1), (0, -1)]
    phases = np.array([np.exp(-1j * (k1 * i + k2 * j)) for i, j in steps])
    second_a = 2.0 * t2 * np.real(np.exp(1j * phi) * phases).sum()
    second_b = 2.0 * t2 * np.real(np.exp(1j * phi) * phases.conj()).sum()
    from_a_to_b = t1 * (1.0 + np.exp(1j * k1) + np.exp(1j * k2))
    return np.array([[mass + second_a, np.conj(from_a_to_b)], [from_a_to_b, -mass + second_b]])


# --------------------------------------------------------------------- Hofstadter

def hofstadter(n1, n2, p, q, periodic=False):
    """Square lattice, hops −1, ⟨x,y|H|x,y+1⟩ = −e^{+2πi p x/q}. A torus needs n1 a multiple of q."""
    if periodic and n1 % q:
        raise ValueError("the flux does not fit the torus")
    sites = site_table(rectangle(n1, n2), np.zeros((1, 2)), SQUARE)
    hamiltonian = np.zeros((n1 * n2, n1 * n2), dtype=complex)
    for x, y in rectangle(n1, n2):
        here = x * n2 + y
        if periodic or x + 1 < n1:
            there = (x + 1) % n1 * n2 + y
            hamiltonian[here, there] += -1.0
            hamiltonian[there, here] += -1.0
        if periodic or y + 1 < n2:
            there = x * n2 + (y + 1) % n2
            hamiltonian[here, there] += -np.exp(2j * np.pi * p * x / q)
            hamiltonian[there, here] += -np.exp(-2j * np.pi * p * x / q)
    return hamiltonian, sites


def hofstadter_bloch(k1, k2, p, q):
    """Magnetic cell of q plain cells along x; k1 belongs to the translation by q."""
    matrix = np.zeros((q, q), dtype=complex)
    for x in range(q):
        matrix[x, x] += -2.0 * np.cos(k2 + 2.0 * np.pi * p * x / q)
        to = (x + 1) % q
        # A hop into the next magnetic cell, s = +1, carries e^{−ik·s}.
        amplitude = -np.exp(-1j * k1) if to <= x else -1.0
        matrix[to, x] += amplitude
        matrix[x, to] += np.conj(amplitude)
    return matrix


# ------------------------------------------------------------------------- kagome

KAGOME_ORBITALS = np.array([[0.0, 0.0], HONEYCOMB[0] / 2.0, HONEYCOMB[1] / 2.0])


def translations(n1, n2, vectors, periodic):
    """The lattice translations of a torus that can bring a neighbour near, or only the identity."""
    if not periodic:
        return [(0.0, 0.0)]
    return [p * n1 * vectors[0] + q * n2 * vectors[1]
            for p, q in itertools.product((-1, 0, 1), repeat=2)]


def kagome(n1, n2, t=1.0, phi=0.0, periodic=False):
    """Parallelogram of n1×n2 cells, from positions: ⟨r'|H|r⟩ = t e^{iφ} when the third corner of the
    triangle of the hop lies to its left (counter-clockwise), t e^{−iφ} when it lies to its right."""
    sites = site_table(rectangle(n1, n2), KAGOME_ORBITALS, HONEYCOMB)
    points = np.stack([sites["x"], sites["y"]], axis=1)
    hamiltonian = np.zeros((len(sites), len(sites)), dtype=complex)
    # Sites lie at half lattice vectors, all but those at odd multiples along both.
    for image in translations(n1, n2, HONEYCOMB, periodic):
        step = points[None, :, :] + np.asarray(image) - points[:, None, :]
        for origin, target in np.argwhere(np.abs(np.hypot(*step.transpose(2, 0, 1)) - 0.5) < 1e-6):
            across = points[origin] + rotate(step[origin, target], 60.0)
            u, v = np.linalg.solve(HONEYCOMB.T, across)
            left = not (round(2 * u) % 2 == 1 and round(2 * v) % 2 == 1)
            hamiltonian[target, origin] += t * np.exp(1j * phi * (1 if left else -1))
    return hamiltonian, sites


def kagome_bloch(k1, k2, t=1.0, phi=0.0):
    """a → b → c → a within a cell and over the cells next to it."""
    hop = t * np.exp(1j * phi)
    matrix = np.zeros((3, 3), dtype=complex)
    matrix[1, 0] = hop * (1.0 + np.exp(1j * k1))
    matrix[2, 1] = hop * (1.0 + np.exp(-1j * (k1 - k2)))
    matrix[0, 2] = hop * (1.0 + np.exp(-1j * k2))
    return matrix + matrix.conj().T


# ---------------------------------------------------------------------- Kane, Mele

def with_spin(sites):
    """Every site twice: up, then down."""
    doubled = np.repeat(sites, 2)
    doubled["orbital"] = 2 * doubled["orbital"] + np.arange(len(doubled)) % 2
    return doubled


def kane_mele(n1, n2, t1=1.0, so=0.1, rashba=0.0, mass=0.0, periodic=False):
    """Haldane models of opposite phase for the two spins, and ⟨r'|H|r⟩ = iλ (sx dy − sy dx) between
    nearest neighbours, d the unit vector of the hop (Kane, Mele, PRL 95, 226801 (2005))."""
    sites = site_table(rectangle(n1, n2), HONEYCOMB_ORBITALS, HONEYCOMB)
    images = translations(n1, n2, HONEYCOMB, periodic)
    up, down = (haldane_from_sites(sites, t1, so, sign * np.pi / 2.0, mass, images)
                for sign in (1.0, -1.0))
    hamiltonian = np.kron(up, np.diag([1.0, 0.0])) + np.kron(down, np.diag([0.0, 1.0]))
    points = np.stack([sites["x"], sites["y"]], axis=1)
    for image in images:
        step = points[None, :, :] + np.asarray(image) - points[:, None, :]
        near = np.abs(np.hypot(*step.transpose(2, 0, 1)) - 1.0 / np.sqrt(3.0)) < 1e-6
        for origin, target in np.argwhere(near):
            dx, dy = step[origin, target] * np.sqrt(3.0)
            block = 1j * rashba * (PAULI_X * dy - PAULI_Y * dx)
            hamiltonian[2 * target:2 * target + 2, 2 * origin:2 * origin + 2] += block
    return hamiltonian, with_spin(sites)


def kane_mele_bloch(k1, k2, t1=1.0, so=0.1, rashba=0.0, mass=0.0):
    """Orbitals A_up, A_down, B_up, B_down."""
    up = haldane_bloch(k1, k2, t1, so, np.pi / 2.0, mass)
    down = haldane_bloch(k1, k2, t1, so, -np.pi / 2.0, mass)
    matrix = np.kron(up, np.diag([1.0, 0.0])) + np.kron(down, np.diag([0.0, 1.0]))
    nearest = HONEYCOMB_ORBITALS[1] * np.sqrt(3.0)
    for phase, angle in ((1.0, 0.0), (np.exp(1j * k1), 120.0), (np.exp(1j * k2), 240.0)):
        dx, dy = rotate(nearest, angle)
        block = 1j * rashba * (PAULI_X * dy - PAULI_Y * dx) * phase
        matrix[2:, :2] += block
        matrix[:2, 2:] += block.conj().T
    return matrix


# ------------------------------------------------------------------- magnetic film

def magnetic_film_bloch(k1, k2, grid, velocity, m0, m1, exchange):
    """H = (v/d) (sin ky σx − sin kx σy) τz + m τx + g σz with σ inner (top_up, top_down, bottom_up,
    bottom_down), m = m0 + m1 K/d² + w K²/16, K = 4 − 2 cos kx − 2 cos ky: R. Yu et al., Science 329,
    61 (2010) on a grid of spacing d; w lifts the corners of the zone to v/d where m1 does not."""
    missing = max(0.0, velocity / grid - 4.0 * abs(m1) / grid**2)
    lattice = 4.0 - 2.0 * np.cos(k1) - 2.0 * np.cos(k2)
    mass = m0 + m1 / grid**2 * lattice + (-missing if m1 < 0 else missing) * lattice**2 / 16.0
    kinetic = velocity / grid * (np.sin(k2) * PAULI_X - np.sin(k1) * PAULI_Y)
    return (np.kron(PAULI_Z, kinetic) + mass * np.kron(PAULI_X, np.eye(2))
            + exchange * np.kron(np.eye(2), PAULI_Z))


def magnetic_film(n1, n2, grid, velocity, m0, m1, exchange, periodic=False):
    """Flake of n1×n2 points; the hops are the Fourier coefficients of the Bloch matrix."""
    sites = site_table(rectangle(n1, n2), np.zeros((4, 2)), SQUARE)
    angles = 2.0 * np.pi * np.arange(8) / 8
    shifts = list(itertools.product(range(-2, 3), repeat=2))
    blocks = {s: sum(magnetic_film_bloch(a, b, grid, velocity, m0, m1, exchange)
                     * np.exp(1j * (a * s[0] + b * s[1])) for a in angles for b in angles) / 64.0
              for s in shifts}
    hamiltonian = np.zeros((4 * n1 * n2, 4 * n1 * n2), dtype=complex)
    for (i, j), shift in itertools.product(rectangle(n1, n2), shifts):
        to_i, to_j = i + shift[0], j + shift[1]
        if not periodic and not (0 <= to_i < n1 and 0 <= to_j < n2):
            continue
        here, there = 4 * (i * n2 + j), 4 * ((to_i % n1) * n2 + to_j % n2)
        hamiltonian[there:there + 4, here:here + 4] += blocks[shift]
    return hamiltonian, sites


# ------------------------------------------------------------------- Chern number

def spin_part(bloch, occupied, spins, sign):
    """k → the occupied states of one sign of P sz P as the lowest levels of a matrix."""
    def matrix(k1, k2):
        states = np.linalg.eigh(bloch(k1, k2))[1][:, :occupied]
        values, vectors = np.linalg.eigh(states.conj().T @ (spins[:, None] * states))
        half = states @ vectors[:, sign * values > 0.0]
        return -half @ half.conj().T
    return matrix


def chern_by_links(bloch, occupied, grid=24):
    """Chern number of the lowest `occupied` bands from link variables.

    T. Fukui, Y. Hatsugai, H. Suzuki, J. Phys. Soc. Jpn. 74, 1674 (2005). With A = i⟨u|∂u⟩ the link
    ⟨u(k)|u(k+dk)⟩ is e^{−iA·dk}, so that the plaquette sum is −C.
    """
    angles = 2.0 * np.pi * np.arange(grid) / grid
    states = [[np.linalg.eigh(bloch(k1, k2))[1][:, :occupied] for k2 in angles] for k1 in angles]

    def link(a, b):
        return np.linalg.det(a.conj().T @ b)

    total = 0.0
    for i, j in itertools.product(range(grid), repeat=2):
        right, up = (i + 1) % grid, (j + 1) % grid
        loop = (link(states[i][j], states[right][j]) * link(states[right][j], states[right][up])
                * link(states[right][up], states[i][up]) * link(states[i][up], states[i][j]))
        total += np.angle(loop)
    return -total / (2.0 * np.pi)
