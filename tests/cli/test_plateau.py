# SPDX-License-Identifier: GPL-3.0-or-later
"""The command plateau: window, temperatures, refusals."""
import csv
import json
import math
import os

from harness import check, close, contains, equal, folder, main, read, run, test, write

# Gap of the half-BHZ model at m = -1: |E| >= 1 (the minimum of |m + 2 - cos kx - cos ky| with the
# sine terms, at k = 0), X.-L. Qi, Y.-S. Wu and S.-C. Zhang, PRB 74, 085308 (2006).
CLEAN = """\
selvedge: 1
title: Clean film
model: {name: qi_wu_zhang, m: -1, energy_unit: 10 meV}
flake: {shape: rectangle, cells: [10, 10]}
markers: {local_chern: {window: 0.3}}
plateau:
  energies: [-30 meV, 30 meV]
  points: 25
  temperatures: [0 K, 10 K]
  within: 0.1
"""


def ask(text, *more, code=0):
    top = folder()
    path, place = write(os.path.join(top, "sheet.yaml"), text), os.path.join(top, "run")
    return path, place, run("plateau", path, "-o", place, "--json", *more, code=code).json()


@test
def the_window_of_a_clean_film_is_its_gap():
    _, place, answer = ask(CLEAN)
    equal((answer["command"], answer["realisations"], answer["unresolved"]), ("plateau", 1, 0))
    # bulk gap from -1 to 1; the curve is straight over one spacing (0.25) at either end
    close(answer["plateau"]["width"], 2.0, 0.5)
    close(answer["plateau"]["centre"], 0.0, 0.1)
    close(answer["plateau"]["width_meV"], 10 * answer["plateau"]["width"], 1e-9)
    equal(answer["plateau"]["interval"], None)
    equal(len(answer["energies"]), 25)
    for ending in ("svg", "pdf", "png", "gp", "dat"):
        check(os.path.getsize(os.path.join(place, "figures", "plateau." + ending)) > 0, ending)
    equal(json.loads(read(os.path.join(place, "summary.json")))["plateau"], answer["plateau"])


@test
def temperatures_average_the_curve():
    _, place, answer = ask(CLEAN)
    energies, mean = answer["energies"], answer["mean"]
    equal([t["kelvin"] for t in answer["temperatures"]], [0, 10])
    equal(answer["temperatures"][0]["mean"], mean, "0 K is the curve itself")
    kt = 8.617333262e-5 * 10 / 0.010  # CODATA k_B in eV/K over the energy unit
    close(answer["temperatures"][1]["kT_meV"], 0.8617333262, 1e-9)
    for k, at in enumerate(energies):
        warm = answer["temperatures"][1]["mean"][k]
        if at - 15 * kt < energies[0] - 1e-9 or at + 15 * kt > energies[-1] + 1e-9:
            equal(warm, None, "no thermal value near the ends")
            continue
        # Riemann sum on a fine grid of the same straight pieces
        total, steps = 0.0, 20000
        for i in range(steps):
            e = at + 15 * kt * (2 * (i + 0.5) / steps - 1)
            j = min(max(int((e - energies[0]) / (energies[1] - energies[0])), 0), len(energies) - 2)
            part = (e - energies[j]) / (energies[j + 1] - energies[j])
            weight = 1 / (4 * kt * math.cosh((e - at) / (2 * kt)) ** 2)
            total += weight * (mean[j] + part * (mean[j + 1] - mean[j])) * 30 * kt / steps
        close(warm, total, 2e-5)
    rows = list(csv.DictReader(read(os.path.join(place, "points.csv")).splitlines()))
    close(float(rows[12]["mean"]), mean[12], 1e-9)


@test
def an_ensemble_has_an_interval_and_continues():
    text = CLEAN.replace("markers:", "disorder: [{name: pot, kind: onsite, distribution: box, "
                         "width: 2, per: cell}]\nensemble: {realisations: 6}\nmarkers:")
    path, place, one = ask(text.replace("points: 25", "points: 9"), "-j", "1")
    low, high = one["plateau"]["interval"]
    check(low <= one["plateau"]["width"] <= high)
    again = run("plateau", path, "-o", place, "--json", "-j", "2", code=0).json()
    for answer in (one, again):
        answer.pop("timings")
    equal(again, one)


@test
def refusals():
    def bad(text, code=3):
        top = folder()
        place = os.path.join(top, "run")
        err = run("plateau", write(os.path.join(top, "s.yaml"), text), "-o", place, code=code).err
        check(code == 1 or not os.path.exists(place), "something was written")
        return err
    contains(bad(CLEAN[:CLEAN.index("plateau:")]), "no block `plateau`")
    contains(bad(CLEAN + "occupation: {filling: 0.5}\n"), "fermi_energy")
    contains(bad(CLEAN + "sweep: [{parameter: model.m, values: [-1, 1]}]\n"), "leave out the sweep")
    contains(bad(CLEAN.replace("[-30 meV, 30 meV]", "[3, -3]")), "is not below")
    contains(bad(CLEAN.replace("[0 K, 10 K]", "[-4 K]")), "below zero")
    contains(bad(CLEAN.replace(", energy_unit: 10 meV", "").replace("[-30 meV, 30 meV]", "[-3, 3]")),
             "what an energy of 1 is worth")
    wild = "disorder: [{name: pot, kind: onsite, distribution: box, width: 150 meV}]\n"
    contains(bad(CLEAN.replace("points: 25", "points: 3") + wild, code=1), "no plateau")


if __name__ == "__main__":
    main()
