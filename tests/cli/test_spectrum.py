# SPDX-License-Identifier: GPL-3.0-or-later
"""selvedge spectrum against the exported Hamiltonian diagonalised by NumPy."""
import os

import numpy
import scipy.io

from harness import check, close, contains, equal, folder, main, read, run, test, write

SHEET = """\
selvedge: 1
title: spectrum
model: {name: haldane, t2: 0.2, phi: 90 deg, mass: 0.1}
flake: {shape: parallelogram, cells: [16, 15]}
disorder:
  - {kind: vacancies, share: 0.03}
  - {name: pot, kind: onsite, distribution: box, width: 1.2}
"""
ZERO = """\
selvedge: 1
title: zero mode
model: {name: haldane, t2: 0.2, phi: 90 deg, mass: 0}
flake: {shape: hexagon, cells: 6}
disorder:
  - {kind: vacancies, count: 1}
"""
LIEB = """\
selvedge: 1
model:
  name: custom
  vectors: [[1, 0], [0, 1]]
  orbitals: [{name: a, at: [0, 0]}, {name: b, at: [0.5, 0]}, {name: c, at: [0, 0.5]}]
  hops:
    - {from: a, to: b, shift: [0, 0], amplitude: [1, 0]}
    - {from: a, to: c, shift: [0, 0], amplitude: [1, 0]}
    - {from: b, to: a, shift: [1, 0], amplitude: [1, 0]}
    - {from: c, to: a, shift: [0, 1], amplitude: [1, 0]}
flake: {shape: rectangle, cells: [12, 12]}
"""


def sheet(text=SHEET):
    return write(os.path.join(folder(), "sheet.yaml"), text)


def levels_of(path, *options):
    """Eigenvalues and eigenvectors of the exported (open-boundary) Hamiltonian."""
    target = os.path.join(os.path.dirname(path), "h.mtx")
    run("export", path, "--hamiltonian", target, "--force", *options, code=0)
    return numpy.linalg.eigh(scipy.io.mmread(target).toarray())


@test
def numbers_are_those_of_the_exported_hamiltonian():
    path = sheet()
    for options in ((), ("-k", "3"), ("--set", "occupation.fermi_energy=0.7"),
                    ("--set", "occupation.filling=0.3"), ("--set", "flake.cells=[9, 8]")):
        told = run("spectrum", path, "--json", *options, code=0).json()
        values, vectors = levels_of(path, *options)
        equal(told["command"], "spectrum")
        equal(told["sites"], len(values), "sites")
        equal(told["on_level"], False)
        below = told["states_below_fermi"]
        if "occupation.filling=0.3" in options:
            equal(below, int(0.3 * len(values) + 0.5), "electrons")
        else:
            equal(below, int(numpy.sum(values < told["fermi_energy"])), "count")
        close(told["highest_occupied"], values[below - 1], 1e-9, "highest occupied")
        close(told["lowest_empty"], values[below], 1e-9, "lowest empty")
        close(told["gap"], values[below] - values[below - 1], 1e-9, "gap")
        check(told["bounds"][0] <= values[0] + 1e-12 and told["bounds"][1] >= values[-1] - 1e-12, "bounds")
        check(told["bounds"][1] - told["bounds"][0] < 1.02 * (values[-1] - values[0]), "tight bounds")
        check(8 <= len(told["near"]) <= 24, "%d near states" % len(told["near"]))
        for state in told["near"]:
            k = int(numpy.argmin(abs(values - state["energy"])))
            close(state["energy"], values[k], 1e-9, "level")
            # one orbital per position in this model
            close(state["participation"], numpy.sum(abs(vectors[:, k]) ** 4), 1e-6, "participation")
            check(0 <= state["edge_weight"] <= 1, "edge weight")


@test
def the_density_integrates_to_the_levels():
    path = sheet()
    told = run("spectrum", path, "--json", code=0).json()
    values, _ = levels_of(path)
    energies, states = map(numpy.array, (told["density"]["energies"], told["density"]["states"]))
    step = energies[1] - energies[0]
    close(step * states.sum(), 1, 2e-3, "area")
    check(told["density"]["resolution"] >= 1.9 * step, "resolution and step")
    smooth = 4 * told["density"]["resolution"]
    for energy in (-2, -1, 1, 2):  # the count below, as well as the broadening and the edges allow
        share = step * states[energies < energy].sum()
        low, high = (numpy.mean(values < energy + s * smooth) for s in (-1, 1))
        check(low - 0.02 <= share <= high + 0.02, "share below %g: %g not in [%g, %g]" % (energy, share, low, high))


@test
def the_boundary_is_the_sheets_own():
    text = "selvedge: 1\nmodel: {name: hofstadter, flux: [0, 1]}\n" \
           "flake: {shape: rectangle, cells: [8, 8], boundary: periodic}\noccupation: {fermi_energy: 0.5}\n"
    told = run("spectrum", sheet(text), "--json", code=0).json()
    k = 2 * numpy.pi * numpy.arange(8) / 8  # E = -2 cos kx - 2 cos ky on the torus
    values = numpy.sort((-2 * numpy.cos(k)[:, None] - 2 * numpy.cos(k)).ravel())
    close(told["bounds"][0], -4, 1e-9, "lowest level of the torus")
    equal(told["states_below_fermi"], int(numpy.sum(values < 0.5)), "count")
    check(all(state["edge_weight"] is None and state["reason"] for state in told["near"]), "a torus has an edge")


@test
def a_zero_mode_at_the_fermi_energy_is_said_and_ends_with_1():
    path = sheet(ZERO)
    values, _ = levels_of(path)
    close(abs(values).min(), 0, 1e-12, "zero mode")
    for options in ((), ("--set", "flake.cells=12")):  # all eigenvalues, and inertia
        result = run("spectrum", path, "--json", *options, code=1)
        told = result.json()
        equal(told["on_level"], True, "on_level")
        for key in ("states_below_fermi", "highest_occupied", "lowest_empty", "gap"):
            equal(told[key], None, key)
        contains(told["reason"], "coincides", "reason")
        contains(result.err, "coincides", "standard error")
        close(min(abs(state["energy"]) for state in told["near"]), 0, 1e-11, "nearest level")
        run("spectrum", path, "--set", "occupation.fermi_energy=0.02", *options, code=0)
    with_filling = run("spectrum", path, "--json", "--set", "occupation.electrons=108", code=0).json()
    equal(with_filling["states_below_fermi"], 108, "electrons")
    close(with_filling["highest_occupied"], 0, 1e-11, "zero mode filled")


@test
def many_zero_modes_leave_the_near_states_out():
    # The Lieb lattice: two of three sublattices hop to the third only, so at least a third of the
    # levels is zero (E. H. Lieb, PRL 62, 1201 (1989); recalled from memory): too many to compute
    # one by one.
    path = sheet(LIEB)
    values, _ = levels_of(path)
    zeros = int(numpy.sum(abs(values) < 1e-10))
    check(zeros >= 144, "%d zero modes" % zeros)
    told = run("spectrum", path, "--json", code=1).json()
    equal(told["on_level"], True)
    equal(told["near"], None)
    check(told["near_reason"] != "", "no reason")
    below = int(numpy.sum(values < -1e-10))
    contains(told["reason"], "between %d and %d states" % (below, below + zeros), "reason")


@test
def figures_and_csv_are_written():
    path, target = sheet(), folder()
    csv = os.path.join(target, "density.csv")
    result = run("spectrum", path, "-o", os.path.join(target, "figure"), "--csv", csv, code=0)
    for line in result.out.splitlines():
        check(len(line) <= 80 or target in line, "long line: %s" % line)
    check(os.path.getsize(os.path.join(target, "figure", "spectrum.gp")) > 0, "no script")
    table = numpy.genfromtxt(csv, delimiter=",", names=True)
    equal(table.dtype.names, ("energy", "density"))
    told = run("spectrum", path, "--json", code=0).json()
    equal(list(table["energy"]), told["density"]["energies"], "energies")
    equal(list(table["density"]), told["density"]["states"], "density")
    before = read(csv)
    run("spectrum", path, "--csv", csv, code=4)
    equal(read(csv), before, "file kept")
    run("spectrum", path, "--csv", csv, "--force", "-k", "1", code=0)
    check(read(csv) != before, "--force did not overwrite")


@test
def results_repeat_and_realisations_differ():
    path = sheet()
    first = run("spectrum", path, "--json", code=0).out
    equal(run("spectrum", path, "--json", code=0).out, first, "a second run")
    check(run("spectrum", path, "--json", "-k", "1", code=0).out != first, "realisation 1 is realisation 0")


@test
def bad_input_is_refused():
    run("spectrum", code=2)
    run("spectrum", "no-such-sheet.yaml", code=3)
    result = run("spectrum", sheet(), "--set", "occupation.electrons=5000")
    check(result.code in (3, 5) and result.out == "", "too many electrons: %d" % result.code)


main()
