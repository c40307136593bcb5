#!/usr/bin/env python3
# SPDX-License-Identifier: GPL-3.0-or-later
"""The Bott index as the textbook has it, in NumPy, for comparison.

Worker processes with one BLAS thread each: all eigenvectors by numpy.linalg.eigh, U and V in the
basis of the occupied ones, and the angles of the eigenvalues of V U V† U†. Prints one JSON document.
The random numbers are NumPy's own: agreement is a matter of statistics.
"""
import argparse
import json
import multiprocessing
import os
import time

for variable in ("OPENBLAS_NUM_THREADS", "OMP_NUM_THREADS", "MKL_NUM_THREADS"):
    os.environ[variable] = "1"

import numpy as np  # noqa: E402 (after the number of threads)


def clean_torus(n, t1, t2):
    """(H, u, v) of the Haldane model on a torus of n×n cells; u, v in turns."""
    i, j, orbital = (a.ravel() for a in np.indices((n, n, 2)))
    matrix = np.zeros((n, n, 2, n, n, 2), dtype=complex)
    # (from, to, step in cells, amplitude); the conjugates follow below.
    hops = [(0, 1, (0, 0), t1), (0, 1, (-1, 0), t1), (0, 1, (0, -1), t1)]
    hops += [(0, 0, step, t2) for step in ((1, 0), (-1, 1), (0, -1))]
    hops += [(1, 1, step, np.conj(t2)) for step in ((1, 0), (-1, 1), (0, -1))]
    for source, target, (di, dj), amplitude in hops:
        for a in range(n):
            for b in range(n):
                matrix[(a + di) % n, (b + dj) % n, target, a, b, source] += amplitude
    matrix = matrix.reshape(2 * n * n, 2 * n * n)
    return matrix + matrix.conj().T, (i + orbital / 3.0) / n, (j + orbital / 3.0) / n


def bott(matrix, u, v):
    energies, vectors = np.linalg.eigh(matrix)
    states = vectors[:, energies < 0.0]
    adjoint = states.conj().T
    turn_u = adjoint @ (np.exp(2j * np.pi * u)[:, None] * states)
    turn_v = adjoint @ (np.exp(2j * np.pi * v)[:, None] * states)
    product = turn_v @ turn_u @ turn_v.conj().T @ turn_u.conj().T
    return np.angle(np.linalg.eigvals(product)).sum() / (2.0 * np.pi)


worker = None


def start_worker(n, t1, t2, phi):
    global worker
    worker = clean_torus(n, t1, t2 * np.exp(1j * phi))
    np.linalg.eigvals(np.linalg.eigh(np.eye(64))[1])  # load the library before the clock runs


def realise(job):
    """(index, processor seconds) of one realisation."""
    width, seed, realisation = job
    generator = np.random.default_rng([seed, realisation])
    begin = time.process_time()
    clean, u, v = worker
    size = len(clean)
    index = bott(clean + np.diag(width * (generator.random(size) - 0.5)), u, v)
    return index, time.process_time() - begin


def main():
    parser = argparse.ArgumentParser()
    parser.add_argument("--cells", type=int, default=30)
    parser.add_argument("--width", type=float, default=1.0)
    parser.add_argument("--realisations", type=int, default=8)
    parser.add_argument("--processes", type=int, default=2)
    parser.add_argument("--seed", type=int, default=1)
    given = parser.parse_args()
    method = multiprocessing.get_context("spawn")
    with method.Pool(given.processes, start_worker, (given.cells, 1.0, 0.2, np.pi / 2)) as pool:
        pool.map(abs, range(given.processes), chunksize=1)  # the workers are up
        jobs = [(given.width, given.seed, k) for k in range(given.realisations)]
        begin = time.perf_counter()
        rows = pool.map(realise, jobs, chunksize=1)
        seconds = time.perf_counter() - begin
    values = [row[0] for row in rows]
    print(json.dumps({"driver": "eigh, eigvals", "seconds": seconds, "realisations": len(values),
                      "processor_seconds": sum(row[1] for row in rows),
                      "mean": float(np.mean(values)),
                      "standard_error": float(np.std(values, ddof=1) / np.sqrt(len(values)))}))


if __name__ == "__main__":
    main()
