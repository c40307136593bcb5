# SPDX-License-Identifier: GPL-3.0-or-later
"""Every shape and every kind of disorder of the help through map and draw; sheets that ask for the
impossible end quickly, with the code that belongs to them, and write nothing."""
import os
import re

from harness import check, contains, equal, folder, main, run, test, write

HEAD = """\
selvedge: 1
title: Invented patch
model: {name: haldane, t2: 0.2, phi: 90 deg, mass: 0.1, lattice_constant: 0.5 nm}
"""
FLAKE = "flake: {shape: parallelogram, cells: [8, 8]}\n"

SHAPES = {
    "rectangle": "size: [4 nm, 4 nm], orientation: 10 deg",
    "parallelogram": "cells: [6, 7], boundary: periodic",
    "hexagon": "cells: 4, edge: zigzag",
    "disc": "radius: 2.4 nm",
    "annulus": "inner: 1 nm, outer: 3 nm",
    "triangle": "cells: 5, edge: armchair",
    "ribbon": "cells: [5, 9], edge: armchair",
    "polygon": "vertices: [[0, 0], [9, 0], [9, 5], [4, 8]], holes: [[[3, 2], [5, 2], [5, 4]]]",
}
DISORDER = {
    "vacancies": "density: 2e13 cm^-2, cluster_size: 3, cluster_radius: 0.4 nm",
    "onsite": "distribution: correlated, width: 0.5, correlation_length: 1 nm",
    "mass": "distribution: binary, width: 0.3, per: cell",
    "hopping": "width: 0.2, phase: 5 deg, bonds: nearest",
    "flux": "width: 0.3, fluxes: independent",
    "adatoms": "share: 0.1, coupling: 1.5",
    "cracks": "density: 1e13 cm^-2, length: 1 nm",
    "domains": "size: 2 nm, share: 0.5, change: 0.4",
    "roughness": "amplitude: 0.6 nm, correlation_length: 1 nm",
    "steps": "term: potential, at: [2 nm, 0 nm], angle: 90 deg, jump: 0.3",
}


def sheet(text):
    return write(os.path.join(folder(), "sheet.yaml"), text)


def entry(text):
    return HEAD + FLAKE + "disorder:\n  - {%s}\n" % text


def map_and_draw(path, what):
    mapped = run("map", path, "--json", code=0).json()
    drawn = run("draw", path, "-o", os.path.join(folder(), "a.svg"), "--json", code=0).json()
    equal(mapped["inventory"], drawn["inventory"], what)
    marker = mapped["markers"]["local_chern"]["window_mean"]
    check(marker is not None and abs(marker) < 3, "%s: %r" % (what, marker))
    return drawn["inventory"]


@test
def the_lists_are_those_of_the_help():
    told = run("help", "keys", code=0).out
    # structures need a file and a model of their own: test_structures.py
    equal(set(re.findall(r"^  shape: (\w+)", told, re.M)), set(SHAPES) | {"structure"}, "shapes")
    equal(set(re.findall(r"^  kind: (\w+)", told, re.M)), set(DISORDER), "kinds of disorder")


@test
def every_shape_is_mapped_and_drawn():
    for name, keys in SHAPES.items():
        path = sheet(HEAD + "flake: {shape: %s, %s}\n" % (name, keys))
        inventory = map_and_draw(path, name)
        equal(inventory["sites"], inventory["pristine_sites"], name)
        equal(inventory["placed"], {}, name)


@test
def every_kind_of_disorder_is_mapped_and_drawn():
    for name, keys in DISORDER.items():
        path = sheet(entry("name: it, kind: %s, %s" % (name, keys)))
        inventory = map_and_draw(path, name)
        equal(list(inventory["placed"]), ["it"], name)
        if name in ("vacancies", "adatoms", "cracks", "domains", "roughness"):
            # A point of the plane counts when it lies on the flake.
            check(0 < inventory["placed"]["it"] <= 64, "%s placed %r" % (name, inventory["placed"]))
        if name == "vacancies":
            equal(inventory["placed"]["it"], inventory["vacancies"], name)
        if name == "adatoms":
            equal(inventory["placed"]["it"], inventory["adatoms"], name)


@test
def only_vacancies_are_called_so():
    for keys, words in (("kind: roughness, amplitude: 1 nm, correlation_length: 1 nm", "empty positions"),
                        ("kind: vacancies, share: 0.1", "vacancies")):
        path, place = sheet(entry(keys)), folder()
        run("draw", path, "-o", os.path.join(place, "a.svg"), code=0)
        run("map", path, "-o", place, code=0)
        for script in ("a.gp", "marker_map.gp"):
            text = open(os.path.join(place, script), encoding="utf-8").read()
            found = re.findall(r"'\d+ (vacanc\w+|empty positions?)'", text)
            equal(found, [words], "%s of %s" % (script, keys))


@test
def what_cannot_be_laid_out_is_refused_at_once():
    thin = sheet(HEAD + "flake: {shape: annulus, inner: 999999, outer: 1000000}\n")
    told = run("check", thin, code=6, timeout=20)
    contains(told.err, "sheet.yaml:4:1: error: ")
    contains(told.err, "too sparse")
    # A window without a cell, and a disorder that cannot be drawn: check says so, not only the run.
    empty = run("check", sheet(HEAD + "flake: {shape: hexagon, cells: 1, edge: armchair}\n"), code=3)
    contains(empty.err, "sheet.yaml:4:1: error: no cell")
    for keys, part in (("cracks, density: 1e13 cm^-2, length: 1000000", "from the flake count"),
                       ("domains, size: 1000000", "from the flake count"),
                       ("domains, size: 0.001", "points per cell")):
        told = run("check", sheet(entry("kind: " + keys)), code=3, timeout=20)
        contains(told.err, "sheet.yaml:5:1: error: ")
        contains(told.err, part)
        equal(told.out, "", "standard output of " + keys)


@test
def extreme_clusters_are_drawn():
    # Their density of parents holds E1 of a large number, which underflows.
    for keys in ("cluster_size: 3, cluster_radius: 0.008 nm", "cluster_size: 1e6, cluster_radius: 1"):
        run("map", sheet(entry("kind: vacancies, share: 0.1, " + keys)), code=0)


@test
def figures_of_a_sweep_name_what_they_show():
    path = sheet("""\
selvedge: 1
model: {name: kane_mele, t1: 1 eV, so: 0.2 eV}
flake: {shape: parallelogram, cells: [6, 6]}
markers: {local_chern: {}, spin_chern: {}}
sweep:
  - {parameter: model.rashba, values: [0 meV, 60 meV]}
""")
    place = os.path.join(folder(), "run")
    run("average", path, "-o", place, "-n", "1", code=0)
    run("report", place, code=0)
    scripts = [name for name in os.listdir(os.path.join(place, "figures")) if name.startswith("sweep")]
    text = open(os.path.join(place, "figures", [n for n in scripts if n.endswith(".gp")][0]),
                encoding="utf-8").read()
    contains(text, "Rashba hop [meV]")
    contains(text, "'C = 0'")
    contains(text, "'spin C = 1'")


@test
def a_closed_gap_is_not_a_very_long_length():
    path = sheet("""\
selvedge: 1
model: {name: magnetic_film, grid: 2 nm, velocity: 240 meV nm, m0: 0 meV, m1: 150 meV nm^2, exchange: 0 meV}
flake: {shape: rectangle, cells: [6, 6]}
""")
    told = run("check", path, code=0)
    contains(told.out, "no gap at half filling")
    contains(told.err, "no gap at half filling")


main()
