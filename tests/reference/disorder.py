# SPDX-License-Identifier: GPL-3.0-or-later
"""Disorder written from its description in include/selvedge/sample.h and `selvedge help keys`, apart
from the C sources: numbers of a stream by cell and slot, and what each kind makes of them."""
import numpy as np
from philox import philox
from scipy.special import exp1, ndtri

POINTS, SMOOTH, BONDS = 0x20000000, 0x40000000, 0x60000000
EULER = 0.57721566490153286


class Stream:
    """Numbers of one entry: seed, name, realisation."""

    def __init__(self, seed, name, realisation=0):
        self.seed, self.realisation, purpose = seed, realisation, 2166136261
        for byte in name.encode():
            purpose = ((purpose ^ byte) * 16777619) & 0xFFFFFFFF
        self.purpose = purpose

    def uniform(self, i, j, slot):
        words = philox((int(i) & 0xFFFFFFFF, int(j) & 0xFFFFFFFF, self.realisation, int(slot)),
                       (self.seed, self.purpose))
        return (((words[0] << 20) | (words[1] >> 12)) + 0.5) * 2.0**-52

    def normal(self, i, j, slot):
        return ndtri(self.uniform(i, j, slot))


def standard(law, u):
    return u - 0.5 if law == "box" else ndtri(u) if law == "gaussian" else (-0.5 if u < 0.5 else 0.5)


def poisson(mean, u):
    """Smallest k with P(X ≤ k) ≥ u."""
    k, term = 0, np.exp(-mean)
    total = term
    while u > total:
        k += 1
        term *= mean / k
        total += term
    return k


def points(stream, vectors, density, cells):
    """Poisson points of the cells, uniform within each, with the first of their own slots."""
    mean = density * abs(np.linalg.det(vectors))
    for i, j in cells:
        for k in range(poisson(mean, stream.uniform(i, j, POINTS))):
            slot = POINTS + 1 + 16 * k
            at = np.array([i + stream.uniform(i, j, slot), j + stream.uniform(i, j, slot + 1)])
            yield at @ vectors, (i, j), slot + 2


def clustered(stream, sites, vectors, positions, share, size, radius):
    """Vacant flags of the sites (one orbital per position): Thomas process on a lattice."""
    area = abs(np.linalg.det(vectors)) / positions
    b = area * size / (2 * np.pi * radius**2)
    density = -np.log(1 - share) / (2 * np.pi * radius**2 * (EULER + np.log(b) + exp1(b)))
    margin = int(np.ceil(8 * radius * 2)) + 2
    cells = [(i, j) for i in range(sites["cell_i"].min() - margin, sites["cell_i"].max() + margin)
             for j in range(sites["cell_j"].min() - margin, sites["cell_j"].max() + margin)]
    intensity = np.zeros(len(sites))
    for at, _, _ in points(stream, vectors, density, cells):
        square = (sites["x"] - at[0])**2 + (sites["y"] - at[1])**2
        intensity += np.where(square < (6 * radius)**2, b * np.exp(-square / (2 * radius**2)), 0)
    u = np.array([stream.uniform(s["cell_i"], s["cell_j"], int(s["orbital"])) for s in sites])
    return u < 1 - np.exp(-intensity)


def spaced(stream, sites, plane, share, distance):
    """Vacant flags with a minimum distance; `plane`: sites of the lattice around the flake."""
    at = np.stack([plane["x"], plane["y"]], axis=1)
    u = np.array([stream.uniform(s["cell_i"], s["cell_j"], int(s["orbital"])) for s in plane])
    own = np.array([stream.uniform(s["cell_i"], s["cell_j"], int(s["orbital"])) for s in sites])
    near = [np.flatnonzero((d := np.hypot(at[:, 0] - s["x"], at[:, 1] - s["y"])) <= distance + 1e-9)
            for s in sites]
    n = len(near[len(sites) // 2])  # itself included; the same for all positions of a honeycomb
    candidates = 1 - (1 - n * share)**(1 / n)
    return np.array([own[k] < candidates and (u[near[k]] >= own[k]).all() for k in range(len(sites))])


def smooth(stream, at, length):
    """Gaussian field with covariance exp(−r²/(2 l²)): white noise on a grid of step l/2, summed over
    16×16 nodes with exp(−d²/l²)."""
    values, step = [], length / 2
    for x, y in at:
        i0, j0 = int(np.floor(x / step)) - 7, int(np.floor(y / step)) - 7
        noise = np.array([[stream.normal(i0 + a, j0 + b, SMOOTH) for b in range(16)]
                          for a in range(16)])
        wx = np.exp(-((x / step - i0 - np.arange(16)) / 2)**2)
        wy = np.exp(-((y / step - j0 - np.arange(16)) / 2)**2)
        values.append(wx @ noise @ wy / np.sqrt(2 * np.pi))
    return np.array(values)


def puddles(stream, at, vectors, density, strength, depth, screening, reach):
    """Potential of random charges ±1: ±U (h/ρ) exp(−(ρ − h)/λ)."""
    total = np.zeros(len(at))
    uv = at @ np.linalg.inv(vectors)
    low, high = np.floor(uv.min(0) - 2 * reach).astype(int), np.ceil(uv.max(0) + 2 * reach).astype(int)
    cells = [(i, j) for i in range(low[0], high[0]) for j in range(low[1], high[1])]
    for place, (i, j), slot in points(stream, vectors, density, cells):
        rho = np.sqrt(((at - place)**2).sum(1) + depth**2)
        sign = 1 if stream.uniform(i, j, slot) < 0.5 else -1
        total += sign * strength * depth / rho * np.exp(-(rho - depth) / screening)
    return total
