#!/usr/bin/env python3
# SPDX-License-Identifier: GPL-3.0-or-later
"""The ensemble of `scripts/benchmark ensemble` written as well as SciPy allows, for comparison.

Worker processes with one BLAS thread each take realisations from a queue. The LAPACK driver is
the fastest of those SciPy offers for the occupied half of the states, measured at start with all
workers busy. Only the eigenvectors below the Fermi energy are used, and of the products
P x P y P only the rows of the window: with W the window rows of Ψ,
    Im⟨r|P x P y P|r⟩ = Im Σ_n (W Ψ† x Ψ)_rn conj((W Ψ† y Ψ)_rn).
Prints one JSON document. The random numbers are NumPy's own: agreement is a matter of statistics.
"""
import argparse
import json
import multiprocessing
import os
import sys
import time

for variable in ("OPENBLAS_NUM_THREADS", "OMP_NUM_THREADS", "MKL_NUM_THREADS"):
    os.environ[variable] = "1"

import numpy as np  # noqa: E402 (after the number of threads)
import scipy.linalg  # noqa: E402

A1, A2 = np.array([1.0, 0.0]), np.array([0.5, np.sqrt(3.0) / 2.0])
DRIVERS = ("evr", "evd", "evx", "evr-subset", "evx-subset")


class Flake:
    """Haldane model on a parallelogram of n×n cells, open, with its averaging window."""

    def __init__(self, n, t1, t2, phi, share):
        i, j, orbital = (a.ravel() for a in np.indices((n, n, 2)))
        at = i[:, None] * A1 + j[:, None] * A2 + orbital[:, None] * (A1 + A2) / 3.0
        self.x, self.y = (at - at.mean(axis=0)).T
        self.clean = self.hamiltonian(n, t1, t2 * np.exp(1j * phi))
        inner = min(range(n % 2, n + 1, 2), key=lambda m: (abs(m - share * n), -m))
        low = (n - inner) // 2
        self.window = (i >= low) & (i < low + inner) & (j >= low) & (j < low + inner)
        self.cells = inner * inner
        self.area = A1[0] * A2[1] - A1[1] * A2[0]

    @staticmethod
    def hamiltonian(n, t1, t2):
        matrix = np.zeros((n, n, 2, n, n, 2), dtype=complex)
        # (from, to, step in cells, amplitude); the conjugates follow below.
        hops = [(0, 1, (0, 0), t1), (0, 1, (-1, 0), t1), (0, 1, (0, -1), t1)]
        hops += [(0, 0, step, t2) for step in ((1, 0), (-1, 1), (0, -1))]
        hops += [(1, 1, step, np.conj(t2)) for step in ((1, 0), (-1, 1), (0, -1))]
        for source, target, (di, dj), amplitude in hops:
            for i in range(max(0, -di), min(n, n - di)):
                for j in range(max(0, -dj), min(n, n - dj)):
                    matrix[i + di, j + dj, target, i, j, source] += amplitude
        matrix = matrix.reshape(2 * n * n, 2 * n * n)
        return matrix + matrix.conj().T


def occupied(matrix, driver):
    """Eigenvectors below zero; `matrix` is destroyed."""
    options = {"overwrite_a": True, "check_finite": False, "driver": driver.split("-")[0]}
    if driver.endswith("-subset"):
        return scipy.linalg.eigh(matrix, subset_by_value=(-np.inf, 0.0), **options)[1]
    energies, vectors = scipy.linalg.eigh(matrix, **options)
    return vectors[:, :np.count_nonzero(energies < 0.0)]


def window_mean(flake, states):
    rows = states[flake.window] @ states.conj().T
    x_part = (rows * flake.x) @ states
    y_part = (rows * flake.y) @ states
    total = np.einsum("rn,rn->", x_part, y_part.conj()).imag
    return 4.0 * np.pi / flake.area * total / flake.cells


worker_flake = None


def start_worker(arguments):
    global worker_flake
    worker_flake = Flake(*arguments)
    np.linalg.eigvalsh(np.eye(64))  # load the library before the clock runs


def draw(width, seed, realisation):
    generator = np.random.default_rng([seed, realisation])
    matrix = np.array(worker_flake.clean, order="F")
    size = len(matrix)
    matrix[np.arange(size), np.arange(size)] += width * (generator.random(size) - 0.5)
    return matrix


def realise(job):
    """(window mean, seconds of the eigenproblem) of one realisation."""
    driver, width, seed, realisation = job
    matrix = draw(width, seed, realisation)
    begin = time.perf_counter()
    states = occupied(matrix, driver)
    seconds = time.perf_counter() - begin
    return window_mean(worker_flake, states), seconds


def best_driver(pool, processes, width, seed):
    seconds = {}
    for driver in DRIVERS:
        jobs = [(driver, width, seed, 10**6 + k) for k in range(processes)]
        seconds[driver] = float(np.mean([row[1] for row in pool.map(realise, jobs, chunksize=1)]))
        print("  %-11s %6.2f s" % (driver, seconds[driver]), file=sys.stderr)
    return min(seconds, key=seconds.get), seconds


def main():
    parser = argparse.ArgumentParser()
    parser.add_argument("--cells", type=int, default=30)
    parser.add_argument("--width", type=float, default=1.0)
    parser.add_argument("--window", type=float, default=0.5)
    parser.add_argument("--realisations", type=int, default=8)
    parser.add_argument("--processes", type=int, default=2)
    parser.add_argument("--seed", type=int, default=1)
    given = parser.parse_args()
    flake = (given.cells, 1.0, 0.2, np.pi / 2, given.window)
    method = multiprocessing.get_context("spawn")
    with method.Pool(given.processes, start_worker, (flake,)) as pool:
        print("SciPy's drivers, %d at a time:" % given.processes, file=sys.stderr)
        driver, drivers = best_driver(pool, given.processes, given.width, given.seed)
        jobs = [(driver, given.width, given.seed, k) for k in range(given.realisations)]
        begin = time.perf_counter()
        means = [row[0] for row in pool.map(realise, jobs, chunksize=1)]
        seconds = time.perf_counter() - begin
    print(json.dumps({"driver": driver, "drivers": drivers, "seconds": seconds,
                      "realisations": len(means), "mean": float(np.mean(means)),
                      "standard_error": float(np.std(means, ddof=1) / np.sqrt(len(means)))}))


if __name__ == "__main__":
    main()
