# SPDX-License-Identifier: GPL-3.0-or-later
"""Structures: sites from XYZ files, hops by distance; against lattices and by hand."""
import csv
import math
import os
import random

import numpy
import scipy.io

from harness import check, close, contains, equal, folder, main, read, run, source, test, write

LATTICE = """\
selvedge: 1
model: {name: haldane, t1: 1, t2: 0.2, phi: %g, mass: 0.3}
flake: {shape: hexagon, cells: 5}
occupation: {fermi_energy: 0.1}
markers: {local_chern: {window: 0.5}}
ensemble: {realisations: 1, seed: 1}
"""
SHEET = """\
selvedge: 1
model:
  name: by_distance
  lattice_constant: 0.246 nm
  species: [{name: A, onsite: 0.3}, {name: B, onsite: -0.3}]
  hops:
    - {between: [A, B], distance: 0.142028 nm, tolerance: 0.01 nm, amplitude: 1}
    - {between: [A, A], distance: 0.246 nm, tolerance: 0.01 nm, amplitude: 0.2, phase: %g}
    - {between: [B, B], distance: 0.246 nm, tolerance: 0.01 nm, amplitude: 0.2, phase: %g}
flake: {shape: structure, file: film.xyz}
occupation: {fermi_energy: 0.1}
markers: {local_chern: {window: 0.5}}
ensemble: {realisations: 1, seed: 1}
"""
CHAIN = """\
selvedge: 1
model:
  name: by_distance
  lattice_constant: 0.1 nm
  species: [{name: A}, {name: B, onsite: 2}]
  hops:
    - %s
flake: {shape: structure, file: film.xyz%s}
markers: {local_chern: {window: 1}}
ensemble: {realisations: 1, seed: 1}
%s"""
GOOD = "{between: [A, B], distance: 1, tolerance: 0.1, amplitude: [0.5, 0.25]}"


def rows_of(path):
    with open(path, encoding="utf-8") as file:
        return list(csv.DictReader(file))


def export(sheet):
    base = os.path.splitext(sheet)[0]
    run("export", sheet, "--hamiltonian", base + ".mtx", "--sites", base + ".csv", "--force", code=0)
    return scipy.io.mmread(base + ".mtx").toarray(), rows_of(base + ".csv")


def mapped(sheet):
    base = os.path.splitext(sheet)[0]
    answer = run("map", sheet, "-o", base + "-map", "--csv", base + "-map.csv", "--json", code=0)
    rows = rows_of(base + "-map.csv")
    name = [key for key in rows[0] if key not in ("site", "cell_i", "cell_j", "orbital", "x", "y")][0]
    return answer.json(), numpy.array([float(row[name]) for row in rows])


def honeycomb(place, phi):
    """The lattice-built flake, and the same sites shuffled in a file."""
    lattice = write(os.path.join(place, "lattice.yaml"), LATTICE % phi)
    h, rows = export(lattice)
    order = list(range(len(rows)))
    random.Random(5).shuffle(order)
    lines = ["%d\nPlot=\"a b=c\" Properties=id:I:1:species:S:1:pos:R:3:tag:L:1" % len(rows)]
    for k in order:
        x, y = 2.46 * float(rows[k]["x"]), 2.46 * float(rows[k]["y"])
        lines.append("%d %s  %.17g\t%.17g 0 T" % (k, rows[k]["orbital"], x, y))
    write(os.path.join(place, "film.xyz"), "\n".join(lines) + "\n")
    return lattice, h, write(os.path.join(place, "sheet.yaml"), SHEET % (phi, phi)), order


@test
def a_honeycomb_is_that_of_the_lattice():
    for phi in (1.2, -1.2):
        lattice, h, sheet, order = honeycomb(folder(), phi)
        own, rows = export(sheet)
        equal(len(rows), 150, "sites")
        close(abs(own - h[numpy.ix_(order, order)]).max(), 0, 1e-12, "elements")
        close(abs(numpy.linalg.eigvalsh(own) - numpy.linalg.eigvalsh(h)).max(), 0, 1e-10, "levels")
        answer, values = mapped(sheet)
        reference = mapped(lattice)[1]
        # Per area: a cell of the lattice is √3/2; a site of the structure has 1/150 of the hull.
        at = numpy.array([(float(row["x"]), float(row["y"])) for row in rows])
        area, corners = hull(at)
        factor = (math.sqrt(3) / 2) / (area / 150)
        close(abs(values - factor * reference[order]).max(), 0, 1e-9, "marker by site")
        marker = answer["markers"]["local_chern"]
        centre = centroid(corners)
        inside = [holds(corners, centre + (p - centre) / 0.5) for p in at]
        equal(marker["window_cells"], sum(inside), "sites in the window")
        mean = sum(values[inside]) * (area / 150) / (0.25 * area)
        close(marker["window_mean"], mean, 1e-9, "mean by area")
        close(marker["window_mean"], math.copysign(1, phi), 0.15, "Chern number")


def hull(points):
    """Area and corners, by gift wrapping."""
    start = min(range(len(points)), key=lambda k: tuple(points[k]))
    corners, at = [], start
    while True:
        corners.append(points[at])
        end = (at + 1) % len(points)
        for k, p in enumerate(points):
            u, v = points[end] - points[at], p - points[at]
            cross = u[0] * v[1] - u[1] * v[0]
            if cross < -1e-9 or (abs(cross) <= 1e-9 and v @ v > u @ u):
                end = k
        at = end
        if at == start:
            break
    corners = numpy.array(corners)
    x, y = corners.T
    return 0.5 * abs(x @ numpy.roll(y, -1) - y @ numpy.roll(x, -1)), corners


def centroid(corners):
    x, y = corners.T
    cross = x * numpy.roll(y, -1) - y * numpy.roll(x, -1)
    return numpy.array([((x + numpy.roll(x, -1)) * cross).sum(),
                        ((y + numpy.roll(y, -1)) * cross).sum()]) / (3 * cross.sum())


def holds(corners, p):
    return all((b[0] - a[0]) * (p[1] - a[1]) - (b[1] - a[1]) * (p[0] - a[0]) >= -1e-8
               for a, b in zip(corners, numpy.roll(corners, -1, axis=0)))


def small(xyz, hop=GOOD, flake="", more=""):
    place = folder()
    write(os.path.join(place, "film.xyz"), xyz)
    return write(os.path.join(place, "sheet.yaml"), CHAIN % (hop, flake, more))


SQUARE = "4\n\nA 0 0 0\nB 1 0 0\nA 1 1.05 0\nB 0 1.2 0\n"


@test
def shells_and_decays_have_their_amplitudes():
    h, _ = export(small(SQUARE))
    # <B|H|A> = 0.5 + 0.25i within 1 ± 0.1; the fourth side is too long, the upper one too.
    wanted = numpy.diag([0, 2, 0, 2]).astype(complex)
    for a, b in ((0, 1), (2, 1)):
        wanted[b, a], wanted[a, b] = 0.5 + 0.25j, 0.5 - 0.25j
    length = math.hypot(1, 0.15)
    if length <= 1.1:
        wanted[3, 2], wanted[2, 3] = 0.5 + 0.25j, 0.5 - 0.25j
    close(abs(h - wanted).max(), 0, 1e-15, "shell")
    rule = "{between: [A, A], distance: 1, decay: 0.4, cutoff: 1.5, amplitude: -2}"
    h, _ = export(small(SQUARE, rule))
    close(h[0, 2].real, -2 * math.exp(-(math.hypot(1, 1.05) - 1) / 0.4), 1e-14, "decay")
    equal(int((abs(h - numpy.diag(numpy.diag(h))) > 0).sum()), 2, "hops")
    h, _ = export(small("4\n\nA 0 0 0\nB 0.1 0 0\nA 0 0.1 0\nB 0.1 0.105 0\n", flake=", unit: nm"))
    check(h[1, 0] == 0.5 + 0.25j, "positions in nm")


def refuses(sheet, *parts):
    answer = run("check", sheet, code=3)
    for part in parts:
        contains(answer.err, part, "message")
    return answer


@test
def malformed_files_are_refused_with_their_place():
    refuses(small("four\n\nA 0 0 0\n"), "film.xyz:1:1", "not a number of sites")
    refuses(small("4 5\n\nA 0 0 0\n"), "film.xyz:1:3", "follows the number")
    refuses(small("900000000\n\nA 0 0 0\n"), "film.xyz:1:1", "limit")
    refuses(small("1000000\n\nA 0 0 0\n"), "film.xyz:1:1", "do not fit")
    refuses(small("4\n\nA 0 0 0\nB 1 0 0\nA 1 1.0 0\n"), "after 3 of 4 sites")
    refuses(small(SQUARE + "A 5 5 0\n"), "film.xyz:7:1", "goes on after")
    refuses(small(SQUARE.replace("A 1 1.05 0", "A 1 1.05")), "film.xyz:5:", "3 columns")
    refuses(small(SQUARE.replace("1.05", "nan")), "film.xyz:5:5", "not a finite number")
    refuses(small(SQUARE.replace("A 1", "C 1")), "film.xyz:5:1", "no species \"C\"", "A, B")
    refuses(small(SQUARE.replace("4\n\n", "4\nProperties=species:S:1\n")), "film.xyz:2:", "pos")
    refuses(small(SQUARE.replace("4\n\n", "4\nProperties=species:S:1:pos:R:2\n")), "film.xyz:2:24",
            "pos:R:3")
    refuses(small(SQUARE.replace("4\n\n", "4\nProperties=species:S:1:pos:R:3:f:R:1\n")),
            "film.xyz:3:", "4 columns; 5 are needed")
    refuses(small(SQUARE.replace("4\n\n", "4\nProperties=species:S\n")), "film.xyz:2:12", "triples")
    refuses(small("3\n\nA 0 0 0\nB 1 0 0\nA 2 0 0\n"), "lie on a line")
    refuses(small(""), "film.xyz:1:1", "empty")


@test
def sites_too_near_are_refused_with_both_lines():
    refuses(small(SQUARE.replace("A 1 1.05", "A 0.7 0.1")), "film.xyz:5:1", "line 4")
    run("check", small(SQUARE.replace("A 1 1.05", "A 0.7 0.1"), flake=", least_distance: 0.3"),
        code=0)


@test
def height_is_projected_within_the_thickness_stated():
    bent = SQUARE.replace("1.05 0", "1.05 0.3")
    refuses(small(bent), "flake.thickness")
    contains(run("check", small(bent, flake=", thickness: 0.4"), code=0).err, "0 to 0.3 angstrom")
    cell = SQUARE.replace("4\n\n", "4\nLattice=\"9 0 0 0 9 0 0 0 9\" Properties=species:S:1:pos:R:3\n")
    contains(run("check", small(cell), code=0).err, "periodic cell")


@test
def rules_that_make_no_sense_are_refused():
    def hop(text):
        return "{between: [A, B], distance: 1, %s}" % text
    refuses(small(SQUARE, hop("amplitude: 1")), "tolerance")
    refuses(small(SQUARE, hop("decay: 1, amplitude: 1")), "cutoff")
    refuses(small(SQUARE, hop("tolerance: 2, amplitude: 1")), "tolerance 2")
    refuses(small(SQUARE, hop("tolerance: 0.1, amplitude: [1, 1]").replace("B]", "A]")), "real")
    refuses(small(SQUARE, GOOD + "\n    - " + GOOD), "meet")
    refuses(small(SQUARE, GOOD.replace("B]", "C]")), "no orbital C")
    # On a perfect square the ways over two sites turn to opposite sides.
    square = "4\n\nA 0 0 0\nB 1 0 0\nA 1 1 0\nB 0 1 0\n"
    turning = "{between: [A, A], distance: 1.414, tolerance: 0.1, amplitude: 1, phase: 1}"
    refuses(small(square, GOOD + "\n    - " + turning), "film.xyz:", "opposite sides")
    # A lattice needs cells, hops by distance a structure.
    sheet = small(SQUARE)
    write(sheet, read(sheet).replace("shape: structure, file: film.xyz", "shape: disc, radius: 3"))
    refuses(sheet, "structure")
    sheet = small(SQUARE, flake=", boundary: periodic")
    refuses(sheet, "no torus")


@test
def disorder_of_lattices_is_refused_with_a_reason():
    for entry in ("kind: hopping, width: 0.1", "kind: flux, width: 0.1",
                  "kind: vacancies, share: 0.001, distance: 2",
                  "kind: vacancies, density: 1e13 cm^-2, \"on\": A"):
        refuses(small(SQUARE, more="disorder: [{name: d, %s}]\n" % entry),
                "disorder.d does not suit a structure")


def jittered(place, seed=3):
    """An invented amorphous film: a honeycomb with jitter, plain XYZ, two sites missing."""
    random_number = random.Random(seed)
    sites = []
    for i in range(-9, 10):
        for j in range(-9, 10):
            for name, d in (("A", 0.0), ("B", 1 / 3)):
                x, y = i + d + 0.5 * (j + d), math.sqrt(0.75) * (j + d)
                if math.hypot(x, y) < 7.3:
                    sites.append((name, *(2.46 * v + random_number.uniform(-0.12, 0.12)
                                          for v in (x, y))))
    sites.pop(40)
    lines = ["%d" % len(sites), "invented"] + ["%s %.6f %.6f 0.0" % site for site in sites]
    write(os.path.join(place, "film.xyz"), "\n".join(lines) + "\n")
    sheet = SHEET % (1.5708, 1.5708)
    sheet = sheet.replace("tolerance: 0.01", "tolerance: 0.04").replace("onsite: 0.3",
                                                                       "onsite: 0.1")
    sheet = sheet.replace("markers: {local_chern: {window: 0.5}}",
                          "markers: {local_chern: {window: 0.6}, bott: {}, "
                          "localizer: {kappa: 0.3, threshold: 0.1}}\ndisorder:\n"
                          "  - {name: v, kind: vacancies, share: 0.02}\n"
                          "  - {name: w, kind: onsite, distribution: gaussian, width: 0.1}\n"
                          "  - {name: p, kind: onsite, distribution: correlated, width: 0.1, "
                          "correlation_length: 2}")
    return write(os.path.join(place, "sheet.yaml"), sheet), len(sites)


@test
def an_amorphous_film_goes_through():
    place = folder()
    sheet, n = jittered(place)
    answer = run("average", sheet, "-o", os.path.join(place, "run"), "-n", "3", "--json", code=0).json()
    markers = answer["points"][0]["markers"]
    close(markers["local_chern"]["mean"], 1, 0.15, "local Chern marker")
    equal(markers["localizer"]["mean"], 1, "localizer")
    check(markers["bott"]["mean"] is None, "a Bott index needs a torus: %r" % markers["bott"])
    equal(os.path.exists(os.path.join(place, "run", "inputs", "01-film.xyz")), True, "copy of the file")
    drawn = run("draw", sheet, "-o", os.path.join(place, "draw"), "--json", code=0).json()
    inventory = drawn["inventory"]
    equal(inventory["pristine_sites"], n, "sites")
    equal(inventory["sites"] + inventory["vacancies"], n, "sites left")
    answer, values = mapped(sheet)
    equal(len(values), inventory["sites"], "values of the map")
    close(answer["markers"]["local_chern"]["sum_over_sites"], 0, 1e-9, "sum over all sites")
    # The numbers belong to places in the plane: the order of lines changes nothing.
    h, rows = export(sheet)
    lines = read(os.path.join(place, "film.xyz")).splitlines()
    write(os.path.join(place, "film.xyz"), "\n".join(lines[:2] + lines[:1:-1]) + "\n")
    again, _ = export(sheet)
    close(abs(again[::-1, ::-1] - h).max(), 0, 0, "Hamiltonian of the reversed file")
    equal(len(rows), inventory["sites"], "rows")
    refusal = run("average", sheet, "-o", os.path.join(place, "run"), "-n", "4")
    check(refusal.code != 0, "the file is part of the identity of a run")


main()
