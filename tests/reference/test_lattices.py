# SPDX-License-Identifier: GPL-3.0-or-later
"""Kagome, Kane–Mele, magnetic film and custom lattices: the program against independent models,
closed walks, and the phases of the literature."""
import os
from math import comb

import models
import numpy as np
import peer
from harness import check, close, equal, folder, main, run, source, test, write

FILM = {"grid": 2.0, "velocity": 0.25, "m0": 0.004, "m1": 0.15, "exchange": 0.05}


def sheet(model, flake, extra=""):
    lines = ["selvedge: 1", "model: " + model, "flake: " + flake, extra, ""]
    return write(os.path.join(folder(), "sheet.yaml"), "\n".join(lines))


def export(path, *more):
    top = folder()
    matrix, sites = os.path.join(top, "H.mtx"), os.path.join(top, "sites.csv")
    run("export", path, "--hamiltonian", matrix, "--sites", sites, *more, code=0)
    return peer.read_matrix(matrix), peer.read_sites(sites)


def torus_of(model, n1, n2, shape="parallelogram"):
    return export(sheet(model, "{shape: %s, cells: [%d, %d], boundary: periodic}" % (shape, n1, n2)))


def same_matrix(model, shape, twin, boundary, tolerance=1e-14):
    flake = "{shape: %s, cells: [6, 5], boundary: %s}" % (shape, boundary)
    hamiltonian, sites = export(sheet(model, flake))
    if equal(hamiltonian.shape, twin[0].shape, model):
        close(np.abs(hamiltonian - twin[0]).max(), 0.0, tolerance, model + ": largest difference")
        close(np.abs(sites["x"] - twin[1]["x"]).max(), 0.0, 1e-12, model + ": x")
        close(np.abs(sites["y"] - twin[1]["y"]).max(), 0.0, 1e-12, model + ": y")


@test
def hamiltonians_are_those_of_the_definitions():
    for periodic, boundary in ((False, "open"), (True, "periodic")):
        same_matrix("{name: kagome, t: 0.8, phi: 25 deg}", "parallelogram",
                    models.kagome(6, 5, 0.8, np.radians(25.0), periodic), boundary)
        same_matrix("{name: kane_mele, t1: 1.1, so: 0.12, rashba: 0.07, mass: 0.3}", "parallelogram",
                    models.kane_mele(6, 5, 1.1, 0.12, 0.07, 0.3, periodic), boundary)
        for grid in (2.0, 3.0):  # without and with the k⁴ term
            film = {**FILM, "grid": grid}
            text = ("{name: magnetic_film, grid: %g nm, velocity: 2.5 eV angstrom, m0: 4 meV, "
                    "m1: 15 eV angstrom^2, exchange: 50 meV}" % grid)
            same_matrix(text, "rectangle", models.magnetic_film(6, 5, periodic=periodic, **film),
                        boundary)


@test
def twins_act_on_plane_waves_as_their_bloch_matrices():
    def defect(flake, bloch, n1, n2):
        hamiltonian, sites = flake
        worst = 0.0
        for a in range(n1):
            for b in range(n2):
                k1, k2 = 2 * np.pi * a / n1, 2 * np.pi * b / n2
                phase = np.exp(1j * (k1 * sites["cell_i"] + k2 * sites["cell_j"]))
                orbitals = sites["orbital"].max() + 1
                wave = phase[:, None] * (sites["orbital"][:, None] == np.arange(orbitals))
                worst = max(worst, np.abs(hamiltonian @ wave - wave @ bloch(k1, k2)).max())
        return worst

    close(defect(models.kagome(5, 4, 0.8, 0.4, True),
                 lambda a, b: models.kagome_bloch(a, b, 0.8, 0.4), 5, 4), 0.0, 1e-12, "kagome")
    close(defect(models.kane_mele(5, 4, 1.0, 0.1, 0.07, 0.3, True),
                 lambda a, b: models.kane_mele_bloch(a, b, 1.0, 0.1, 0.07, 0.3), 5, 4),
          0.0, 1e-12, "kane_mele")
    close(defect(models.magnetic_film(6, 5, periodic=True, **FILM),
                 lambda a, b: models.magnetic_film_bloch(a, b, **FILM), 6, 5), 0.0, 1e-12, "film")


# --------------------------------------------------------------- closed walks

SQUARE_HOPS = ("{from: a, to: a, shift: [1, 0], amplitude: 1}, "
               "{from: a, to: a, shift: [0, 1], amplitude: 1}")
TRIANGULAR = ("{name: custom, vectors: [[1, 0], [0.5, 0.8660254037844386]], "
              "orbitals: [{name: a, at: [0, 0]}], hops: [%s, "
              "{from: a, to: a, shift: [-1, 1], amplitude: 1}]}" % SQUARE_HOPS)
SQUARE = ("{name: custom, vectors: [[1, 0], [0, 1]], orbitals: [{name: a, at: [0, 0]}], "
          "hops: [%s]}" % SQUARE_HOPS)
CHECKERBOARD = """{name: custom, vectors: [[1, 0], [0, 1]],
  orbitals: [{name: a, at: [0, 0]}, {name: b, at: [0.5, 0.5]}], hops: [
  {from: a, to: b, shift: [0, 0], amplitude: 1}, {from: a, to: b, shift: [-1, 0], amplitude: 1},
  {from: a, to: b, shift: [0, -1], amplitude: 1}, {from: a, to: b, shift: [-1, -1], amplitude: 1},
  {from: a, to: a, shift: [1, 0], amplitude: 1}, {from: b, to: b, shift: [0, 1], amplitude: 1}]}"""

# Closed n-step walks from a site, n = 0 … 6. Honeycomb: OEIS A002893, square: A002894 (values
# recalled from memory, both computed independently); triangular: A002898.
HONEYCOMB_WALKS = [1, 0, 3, 0, 15, 0, 93]
SQUARE_WALKS = [1, 0, 4, 0, 36, 0, 400]
TRIANGULAR_WALKS = [1, 0, 6, 12, 90, 360, 2040]


def line_graph_walks(z, walks, share):
    """Walks on the line graph of a lattice of coordination z with `share` of the states in flat
    bands at −2: its other eigenvalues are z − 2 plus those of the lattice."""
    return [share * (-2.0)**n + (1.0 - share)
            * sum(comb(n, k) * (z - 2.0)**(n - k) * walks[k] for k in range(n + 1))
            for n in range(len(walks))]


@test
def closed_walks_of_every_lattice():
    kagome = line_graph_walks(3, HONEYCOMB_WALKS, 1.0 / 3.0)
    equal([round(n) for n in kagome], [1, 0, 4, 4, 28, 60, 264], "kagome walks")  # (computed twice)
    checkerboard = line_graph_walks(4, SQUARE_WALKS, 0.5)
    cases = [("{name: haldane, t2: 0, phi: 0}", "parallelogram", HONEYCOMB_WALKS),
             ("{name: kane_mele, so: 0}", "parallelogram", HONEYCOMB_WALKS),
             ("{name: hofstadter, flux: [0, 1]}", "rectangle", SQUARE_WALKS),
             (SQUARE, "rectangle", SQUARE_WALKS),
             (TRIANGULAR, "parallelogram", TRIANGULAR_WALKS),
             ("{name: kagome, phi: 0}", "parallelogram", kagome),
             (CHECKERBOARD, "rectangle", checkerboard)]
    for model, shape, walks in cases:
        hamiltonian, sites = torus_of(model, 7, 7, shape)  # no walk of 6 steps closes around it
        sign = -1.0 if "hofstadter" in model else 1.0
        power = np.eye(len(sites), dtype=complex)
        for n, wanted in enumerate(walks):
            close(np.trace(power).real / len(sites), sign**n * wanted, 1e-9 * max(1.0, wanted),
                  "%s, %d steps" % (model.split(",")[0], n))
            power = power @ hamiltonian


# --------------------------------------------------------------------- phases

@test
def kagome_torus_and_flake_agree_with_the_links():
    for phi in (0.4, -0.4):
        links = models.chern_by_links(lambda a, b, p=phi: models.kagome_bloch(a, b, phi=p), 1, 18)
        close(links, np.sign(phi), 1e-9, "links")
        path = sheet("{name: kagome, phi: %g}" % phi, "{shape: parallelogram, cells: [12, 12]}",
                     "occupation: {filling: 0.33333333333}\n"
                     "markers: {local_chern: {window: 0.34}, bott: {}, localizer: {}}")
        answer = run("map", path, "--json", code=0).json()["markers"]
        equal(answer["bott"]["index"], int(np.sign(phi)), "Bott")
        equal(answer["localizer"]["index"], int(np.sign(phi)), "localizer")
        # a flake of 12 cells is some 6 decay lengths across; its bulk is flat to 2 %
        close(answer["local_chern"]["window_mean"], np.sign(phi), 0.02, "marker")


@test
def magnetic_film_of_eight_lengths_is_quantised():
    # ξ = ħv/gap = 0.25/0.2 nm: 24 nm is 19 ξ. C = sign(g): R. Yu et al., Science 329, 61 (2010), value
    # recalled from memory.
    for exchange, chern in ((100, 1), (-100, -1), (3, 0)):
        path = sheet("{name: magnetic_film, grid: 1.5 nm, velocity: 0.25 eV nm, m0: %d meV, "
                     "m1: 0.15 eV nm^2, exchange: %d meV}" % (0 if chern else 100, exchange),
                     "{shape: rectangle, size: [24 nm, 24 nm]}",
                     "markers: {local_chern: {window: 0.2}, bott: {}, localizer: {}}")
        answer = run("map", path, "--json", code=0).json()["markers"]
        equal(answer["bott"]["index"], chern, "Bott at %d meV" % exchange)
        equal(answer["localizer"]["index"], chern, "localizer at %d meV" % exchange)
        check(answer["localizer"]["resolved"], "localizer at %d meV" % exchange)
        close(answer["local_chern"]["window_mean"], chern, 0.01, "marker at %d meV" % exchange)


@test
def hofstadter_gaps_of_other_lattices_obey_the_diophantine_equation():
    """No published table of the triangular or honeycomb gaps is at hand: Bott indices t of tori
    against r = s q + t p (D. J. Thouless et al., PRL 49, 405 (1982), value recalled from memory)."""
    honeycomb = """{name: custom, vectors: [[1, 0], [0.5, 0.8660254037844386]],
      orbitals: [{name: A, at: [0, 0]}, {name: B, at: [0.5, 0.28867513459481287]}],
      hops: [{from: A, to: B, shift: [0, 0], amplitude: -1},
             {from: A, to: B, shift: [-1, 0], amplitude: -1},
             {from: A, to: B, shift: [0, -1], amplitude: -1}], flux: [1, %d]}"""
    triangular = TRIANGULAR[:-1] + ", flux: [1, %d]}"
    for model, orbitals, q in ((triangular, 1, 3), (triangular, 1, 5), (honeycomb, 2, 3)):
        n = 4 * q if q == 3 else 2 * q
        indices = []
        for filled in range(1, orbitals * q):
            path = sheet(model % q, "{shape: parallelogram, cells: [%d, %d], boundary: periodic}"
                         % (n, n), "occupation: {electrons: %d}\nmarkers: {bott: {}}"
                         % (filled * n * n // q))
            answer = run("map", path, "--json")  # 1: the filling cuts a degenerate level
            bott = answer.json()["markers"]["bott"] if answer.code == 0 else {}
            indices.append(bott["index"] if bott.get("resolved") else None)
            if indices[-1] is not None:
                equal((filled - indices[-1]) % q, 0, "%d bands at 1/%d: Diophantine" % (filled, q))
        check(sum(index is not None for index in indices) >= 2 * (q // 2),
              "gaps met: %r" % indices)
        check(any(index for index in indices), "some gap conducts: %r" % indices)


# ----------------------------------------------------------------------- spin

def spins_of(sites):
    return np.where(np.char.endswith(sites["orbital"].astype(str), "up"), 1.0, -1.0)


@test
def spin_markers_are_those_of_the_definition():
    for extra, mass in (("", 0.2), ("", 1.5), ("disorder: [{name: pot, kind: onsite, distribution: "
                                              "box, width: 1, per: site}]\n", 0.3)):
        model = "{name: kane_mele, so: 0.15, rashba: 0.1, mass: %g}" % mass
        for boundary in ("open", "periodic"):
            path = sheet(model, "{shape: parallelogram, cells: [8, 7], boundary: %s}" % boundary,
                         extra + "occupation: {filling: 0.5}\n"
                         "markers: {spin_chern: {window: 0.4}, spin_bott: {}}")
            hamiltonian, sites = export(path)
            states, _ = peer.occupied_states(hamiltonian, electrons=len(sites) // 2)
            halves, gap = peer.spin_halves(states, spins_of(sites))
            name = "spin_chern" if boundary == "open" else "spin_bott"
            ours = run("map", path, "--json", code=0).json()["markers"][name]
            close(ours["spin_gap"], gap, 1e-10, name + ": gap")
            if boundary == "open":
                area = peer.cell_area(models.HONEYCOMB)
                markers = [peer.local_chern(half, sites["x"], sites["y"], area) for half in halves]
                wanted = peer.window_mean((markers[0] - markers[1]) / 2.0, sites,
                                          peer.window_cells(8, 7, 0.4))
                close(ours["window_mean"], wanted, 1e-9, name)
            else:
                torus = models.HONEYCOMB * np.array([[8], [7]])
                indices = [peer.bott(half, sites["x"], sites["y"], torus) for half in halves]
                close(ours["index"], (indices[0] - indices[1]) / 2.0, 1e-9, name)


@test
def spin_bott_agrees_with_the_links_of_each_half():
    spins = np.array([1.0, -1.0, 1.0, -1.0])
    for so, rashba, mass in ((0.1, 0.1, 0.2), (-0.1, 0.1, 0.2), (0.1, 0.05, 0.8)):
        def bloch(a, b, values=(so, rashba, mass)):
            return models.kane_mele_bloch(a, b, 1.0, *values)
        up, down = (models.chern_by_links(models.spin_part(bloch, 2, spins, sign), 1, 18)
                    for sign in (1, -1))
        path = sheet("{name: kane_mele, so: %g, rashba: %g, mass: %g}" % (so, rashba, mass),
                     "{shape: parallelogram, cells: [9, 9]}", "markers: {spin_bott: {}}")
        bott = run("map", path, "--json", code=0).json()["markers"]["spin_bott"]
        close(bott["index"], (up - down) / 2.0, 1e-9, "spin Bott index at mass %g" % mass)


@test
def spin_of_custom_orbitals():
    spinless = ("{name: custom, vectors: [[1, 0], [0, 1]], orbitals: [{name: a, at: [0, 0]%s}, "
                "{name: b, at: [0.5, 0]%s}], hops: [{from: a, to: b, shift: [0, 0], amplitude: 1}]}")
    flake = "{shape: rectangle, cells: [4, 4]}"
    extra = "markers: {spin_chern: {}, spin_bott: {}}"
    answer = run("average", sheet(spinless % ("", ""), flake, extra), "--json", "-o",
                 os.path.join(folder(), "run"))
    for name, marker in answer.json()["points"][0]["markers"].items():
        check(marker["mean"] is None and "no spin" in marker["reason"], name)
    # a ↑ and b ↓ in one bond: ⟨sz⟩ = 0 for every state, so the spins cannot be told apart
    answer = run("map", sheet(spinless % (", spin: up", ", spin: down"), flake, extra), "--json",
                 code=1).json()["markers"]
    check("P sz P" in answer["spin_chern"]["reason"], answer["spin_chern"])
    wrong = run("check", sheet(spinless % (", spin: Up", ""), flake), code=3)
    check("did you mean" in wrong.err and "sheet.yaml:2:" in wrong.err, wrong.err)


# -------------------------------------------------------------- tables of hops

@test
def hops_from_a_table_are_the_sample():
    """The sample's table in NumPy: the exported torus acts on plane waves as its Bloch matrix."""
    rows = [line.split(",") for line in open(source("samples", "hops_from_table.csv"),
                                             encoding="utf-8") if line[:1] not in "#f"]
    names = ["d", "p"]

    def bloch(k1, k2):  # both directions are listed, so every row counts once
        matrix = np.zeros((2, 2), dtype=complex)
        for start, end, i, j, re, im in rows:
            element = (float(re) + 1j * float(im)) * 1e-3
            matrix[names.index(end), names.index(start)] += element * np.exp(
                -1j * (k1 * int(i) + k2 * int(j)))
        return matrix

    hamiltonian, sites = export(source("samples", "hops_from_table.yaml"), "--set",
                                "flake.cells=[8, 7]", "--set", "flake.boundary=periodic")
    for a, b in ((0, 0), (1, 2), (3, 5), (7, 6)):
        k1, k2 = 2 * np.pi * a / 8, 2 * np.pi * b / 7
        phase = np.exp(1j * (k1 * sites["cell_i"] + k2 * sites["cell_j"]))
        wave = phase[:, None] * np.array([sites["orbital"] == name for name in names]).T
        close(np.abs(hamiltonian @ wave - wave @ bloch(k1, k2)).max(), 0.0, 1e-12, "plane wave")
    links = models.chern_by_links(bloch, 1, 24)
    answer = run("map", source("samples", "hops_from_table.yaml"), "--json", code=0).json()
    equal(answer["markers"]["bott"]["index"], round(links), "Bott")
    close(answer["markers"]["local_chern"]["window_mean"], links, 1e-3, "marker")


def table_sheet(rows, header="from,to,shift_i,shift_j,re [eV],im [eV]", more=""):
    path = sheet("{name: custom, vectors: [[1, 0], [0, 1]], orbitals: [{name: a, at: [0, 0]}, "
                 "{name: b, at: [0, 0]}], %shops_file: hops.csv}" % more,
                 "{shape: rectangle, cells: [6, 6]}")
    write(os.path.join(os.path.dirname(path), "hops.csv"), "\n".join([header] + rows) + "\n")
    return path


@test
def faulty_tables_of_hops_are_refused_at_their_place():
    good = "a,b,1,0,1,2"
    cases = [(["a,b,1,0,1"], 2, 1, "5 columns, the first row has 6"),
             ([good, "a,B,0,0,1,0"], 3, 3, 'no orbital "B"'),
             ([good, "a,b,0,0,nan,0"], 3, 9, '"nan" is not an energy'),
             ([good, "b,a,-1,0,1,2"], 3, 1, "is not hermitian"),
             ([good, good], 3, 1, "stands in line 2 already"),
             (["a,a,0,0,1,1"], 2, 11, "is not real")]
    for rows, line, column, message in cases:
        answer = run("check", table_sheet(rows), code=3)
        check("hops.csv:%d:%d: error: " % (line, column) in answer.err and message in answer.err,
              answer.err)
    answer = run("check", table_sheet([good], "from,to,shift_i,shift_j,re"), code=3)
    check('hops.csv:1:1: error: column "im" is missing' in answer.err and "hint: for example: from"
          in answer.err, answer.err)
    answer = run("check", table_sheet([good], "from,to,shift_i,shift_j,re [nm],im"), code=3)
    check('hops.csv:1:25: error: "nm" is not a unit of an energy' in answer.err, answer.err)
    answer = run("check", table_sheet([good], more="hops: hops.csv, "), code=3)
    check("a table of hops is named by hops_file" in answer.err, answer.err)
    left = table_sheet([good]).replace("sheet.yaml", "left.yaml")
    text = open(left.replace("left.yaml", "sheet.yaml"), encoding="utf-8").read()
    write(left, text.replace("[[1, 0], [0, 1]]", "[[0, 1], [1, 0]]"))
    answer = run("check", left, code=3)
    check("left.yaml:2:" in answer.err and "left-handed" in answer.err, answer.err)


@test
def tables_of_hops_belong_to_the_run():
    path = table_sheet(["a,a,1,0,0.5,0", "b,b,1,0,-0.5,0", "a,b,0,1,0.5,0"])
    table = os.path.join(os.path.dirname(path), "hops.csv")
    place = os.path.join(folder(), "run")
    sure = ["--set", "occupation.fermi_energy=0.31"]
    run("average", path, "-o", place, *sure, code=0)
    equal([name for name in os.listdir(os.path.join(place, "inputs")) if "hops" in name],
          ["01-hops.csv"], "copies")
    run("average", path, "-o", place, *sure, code=0)
    with open(table, "a", encoding="utf-8") as file:
        file.write("a,b,0,-1,0.5,0\n")
    answer = run("average", path, "-o", place, *sure, code=4)
    check("model.hops_file = sha256" in answer.err, answer.err)


# ------------------------------------------------------------------ the length

@test
def check_states_the_length_of_a_film():
    path = sheet("{name: magnetic_film, grid: 2 nm, velocity: 2.5 eV angstrom, m0: 0, "
                 "m1: 15 eV angstrom^2, exchange: 7 meV}", "{shape: rectangle, size: [60 nm, 60 nm]}")
    # ħv = 2.5 eV Å and a gap of 14 meV: ξ = 18 nm, and 60 nm are 3.4 ξ
    answer = run("check", path, "--json", code=0)
    film = answer.json()["film"]
    close(film["xi_nm"], 0.25 / 0.014, 1e-6, "xi")
    close(film["size_in_xi"], 60.0 / (0.25 / 0.014), 1e-6, "size")
    equal(film["enough"], False, "enough")
    check("below 8" in answer.err, "no warning: " + answer.err)
    wide = run("check", path, "--set", "model.exchange=70 meV", "--set", "flake.size=[16 nm, 18 nm]",
               code=0)
    check("below 8" not in wide.err and "= 8.96 xi across" in wide.out, wide.out + wide.err)
    check("hole of one grid cell" not in wide.err, wide.err)
    holes = sheet("{name: magnetic_film, grid: 2 nm, velocity: 0.25 eV nm, m0: 0, m1: 0.15, exchange: 70 meV}",
                  "{shape: rectangle, cells: [6, 6]}\ndisorder: [{name: v, kind: vacancies, share: 0.02}]")
    check("disorder.v: a vacancy of this model is a hole of one grid cell, 4 nm^2" in
          run("check", holes, code=0).err, "no warning")
    equal(run("check", source("samples", "clean_phases.yaml"), "--json", code=0).json()["film"], None,
          "a model without light states")


@test
def film_input_is_checked():
    model = "{name: magnetic_film, grid: %s, velocity: %s, m0: 0, m1: 0.15, exchange: %s}"
    flake = "{shape: rectangle, cells: [6, 6]}"
    for values, message in ((("2 nm", "0.25 eV", "0.01"), "an energy times a length"),
                            (("0", "0.25", "0.01"), "model.grid must be above 0"),
                            (("2 nm", "-1", "0.01"), "model.velocity must be above 0"),
                            (("4 nm", "0.25", "70 meV"), "too coarse")):
        answer = run("check", sheet(model % values, flake), code=3)
        check(message in answer.err and "sheet.yaml:2:" in answer.err, answer.err)


main()
