# SPDX-License-Identifier: GPL-3.0-or-later
"""Measured maps, images and defect lists, seen through the exported Hamiltonian."""
import csv
import os
import random

import numpy
import scipy.io

import images
from harness import check, close, contains, equal, folder, main, run, test, write

SHEET = """\
selvedge: 1
title: Invented film
model: {name: qi_wu_zhang, m: -1, lattice_constant: 0.5 nm, energy_unit: 1 eV}
flake: {shape: rectangle, cells: [7, 5]}
disorder:
  - {name: map, kind: %s}
"""
A = 0.5


def sheet(place, entry):
    return write(os.path.join(place, "sheet.yaml"), SHEET % entry)


def put(place, name, data):
    with open(os.path.join(place, name), "wb") as file:
        file.write(data)


def export(path, **options):
    place = os.path.dirname(path)
    matrix, sites = os.path.join(place, "h.mtx"), os.path.join(place, "s.csv")
    run("export", path, "--hamiltonian", matrix, "--sites", sites, "--force", code=0, **options)
    with open(sites, encoding="utf-8") as file:
        rows = list(csv.DictReader(file))
    return scipy.io.mmread(matrix).tocsr(), rows


def potential(path):
    """On-site energies without the model's own +-m, and positions in lattice constants."""
    h, rows = export(path)
    own = numpy.array([-1.0 if row["orbital"] == "a" else 1.0 for row in rows])
    at = numpy.array([(float(row["x"]), float(row["y"])) for row in rows])
    return h.diagonal().real - own, at


def bilinear(values, at, step, first):
    """values[row][column], row 0 the lowest; constant beyond the outermost middles."""
    values = numpy.asarray(values, float)
    out = []
    for x, y in at:
        u = min(max((x - first[0]) / step[0], 0), values.shape[1] - 1)
        v = min(max((y - first[1]) / step[1], 0), values.shape[0] - 1)
        i, j = min(int(u), values.shape[1] - 2), min(int(v), values.shape[0] - 2)
        p, q = u - i, v - j
        out.append((1 - q) * ((1 - p) * values[j, i] + p * values[j, i + 1]) +
                   q * ((1 - p) * values[j + 1, i] + p * values[j + 1, i + 1]))
    return numpy.array(out)


def noise(seed, width, height, top):
    rng = random.Random(seed)
    return [[rng.randrange(top + 1) for _ in range(width)] for _ in range(height)]


ENTRY = "onsite, file: %s, pixel: 0.4 nm, black: -20 meV, white: 60 meV, origin: [-0.3 nm, -0.2 nm]"


@test
def images_of_every_kind_give_the_interpolated_energies():
    kinds = [("8.png", 255, lambda r: images.png(r, 8)), ("16.png", 65535, lambda r: images.png(r, 16)),
             ("rgb.png", 255, lambda r: images.png([[(v, v, v) for v in row] for row in r], 8, 2)),
             ("ga.png", 255, lambda r: images.png([[(v, 255) for v in row] for row in r], 8, 4)),
             ("8.tif", 255, lambda r: images.tiff(r, 8)), ("16.tif", 65535, lambda r: images.tiff(r, 16)),
             ("be.tif", 65535, lambda r: images.tiff(r, 16, ">")),
             ("zip.tif", 255, lambda r: images.tiff(r, 8, "<", True))]
    for number, (name, top, writer) in enumerate(kinds):
        place = folder()
        rows = noise(number, 11, 9, top)
        put(place, name, writer(rows))
        told, at = potential(sheet(place, ENTRY % name))
        grey = numpy.array(rows[::-1]) / top
        wanted = bilinear(-0.02 + 0.08 * grey, at * A - [-0.3, -0.2], (0.4, 0.4), (0.2, 0.2))
        close(abs(told - wanted).max(), 0, 1e-8, name)
        check(wanted.std() > 0.005, "the map is flat")


@test
def white_is_zero_turns_the_scale_around():
    place = folder()
    rows = noise(5, 11, 9, 255)
    put(place, "a.tif", images.tiff(rows))
    put(place, "b.tif", images.tiff([[255 - v for v in row] for row in rows], white_is_zero=True))
    first, _ = potential(sheet(place, ENTRY % "a.tif"))
    second, _ = potential(sheet(place, ENTRY % "b.tif"))
    close(abs(first - second).max(), 0, 1e-8, "difference")


@test
def rotation_and_width_place_the_image():
    place = folder()
    rows = noise(6, 20, 20, 255)
    put(place, "a.png", images.png(rows))
    told, at = potential(sheet(place, "onsite, file: a.png, image_width: 8 nm, black: 0 meV, white: 1 eV, "
                                      "origin: [1 nm, -2 nm], rotation: 30 deg"))
    c, s = numpy.cos(numpy.pi / 6), numpy.sin(numpy.pi / 6)
    d = at * A - [1, -2]
    own = numpy.stack([c * d[:, 0] + s * d[:, 1], c * d[:, 1] - s * d[:, 0]], axis=1)
    inside = ((own >= 0) & (own <= 8)).all(axis=1)
    run("check", sheet(place, "onsite, file: a.png, image_width: 8 nm, black: 0 meV, white: 1 eV, "
                              "origin: [1 nm, -2 nm], rotation: 30 deg"), code=0 if inside.all() else 3)
    wanted = bilinear(numpy.array(rows[::-1]) / 255, own, (0.4, 0.4), (0.2, 0.2))
    close(abs(told - wanted).max(), 0, 1e-7, "rotated map")


@test
def a_raster_of_rows_is_interpolated():
    place = folder()
    xs, ys = numpy.arange(-1, 9) * 0.45, numpy.arange(-1, 8) * 0.35
    values = numpy.random.default_rng(3).normal(size=(len(ys), len(xs)))
    lines = ["x [nm],y [nm],energy [meV]"]
    nodes = [(i, j) for i in range(len(xs)) for j in range(len(ys))]
    random.Random(1).shuffle(nodes)
    lines += ["%.6g,%.6g,%.15g" % (xs[i], ys[j], values[j, i]) for i, j in nodes]
    text = "\n".join(lines) + "\n"
    write(os.path.join(place, "grid.csv"), text)
    entry = "onsite, file: grid.csv, between: bilinear"
    told, at = potential(sheet(place, entry))
    wanted = bilinear(values * 1e-3, at * A, (0.45, 0.35), (xs[0], ys[0]))
    close(abs(told - wanted).max(), 0, 1e-12, "grid")
    for broken, told in ((text.replace(lines[7] + "\n", ""), "no regular raster"),
                         (text + lines[3] + "\n", "stands here again"),
                         (text.replace(lines[9].split(",")[2], "nan", 1), "nan"),
                         (text.replace("energy [meV]", "height"), "energy")):
        write(os.path.join(place, "grid.csv"), broken)
        refused(sheet(place, entry), "grid.csv:", told)


def refused(path, *words):
    before = sorted(os.listdir(os.path.dirname(path)))
    run_folder = os.path.join(os.path.dirname(path), "run")
    for arguments in (("check", path), ("average", path, "-o", run_folder)):
        told = run(*arguments, code=3)
        equal(told.out, "", "standard output")
        for word in words + ("error:", "hint:"):
            contains(told.err, word, "message")
    equal(sorted(os.listdir(os.path.dirname(path))), before, "files")


@test
def damaged_and_unsuitable_images_are_refused():
    rows = noise(7, 11, 9, 255)
    good = images.png(rows)
    rgb = images.png([[(v, v, 255 - v) for v in row] for row in rows], 8, 2)
    alpha = images.png([[(v, v) for v in row] for row in rows], 8, 4)
    for data, words in ((good[:len(good) // 2], ("byte %d" % (len(good) // 2),)),
                        (good[:40] + b"\xff\xff" + good[42:], ("byte",)),
                        (images.png(rows, width=100000, height=100000), ("100000 x 100000 pixels",)),
                        (rgb, ("has a colour", "row 1")), (alpha, ("transparent", "row 1")),
                        (images.tiff(rows)[:60], ("byte",)),
                        (images.tiff(rows, samples=3), ("several samples",)),
                        (b"\x89PNG", ("byte",))):
        place = folder()
        put(place, "a.png", data)
        refused(sheet(place, ENTRY % "a.png"), "a.png", "sheet.yaml:6:", *words)


@test
def keys_must_fit_the_file():
    place = folder()
    put(place, "a.png", images.png(noise(8, 11, 9, 255)))
    write(os.path.join(place, "a.csv"), "x,y,energy\n0,0,1\n")
    for entry, word in (("onsite, file: a.png, pixel: 0.4 nm", "black"),
                        ("onsite, file: a.png, black: 0, white: 1", "pixel"),
                        ("onsite, file: a.csv, black: 0", "images"),
                        ("onsite, file: a.png, pixel: 1 nm, black: 0, white: 1, between: bilinear", "image"),
                        ("vacancies, file: a.png, pixel: 1 nm", "darker_than"),
                        ("onsite, file: a.png, pixel: 0.1 nm, black: 0, white: 1", "outside the map")):
        refused(sheet(place, entry), word)


@test
def sites_outside_a_map_are_counted_with_coordinates():
    place = folder()
    put(place, "a.png", images.png(noise(9, 4, 20, 255)))
    entry = "onsite, file: a.png, pixel: 0.5 nm, black: 1 eV, white: 2 eV, origin: [-0.25 nm, -0.25 nm]%s"
    refused(sheet(place, entry % ""), "30 sites", "(2, 0) nm")
    told, at = potential(sheet(place, entry % ", unmatched: skip"))
    equal(sorted(set(numpy.flatnonzero(told == 0))), sorted(numpy.flatnonzero(at[:, 0] > 3.5)), "left alone")
    noted = run("check", sheet(place, entry % ", unmatched: list"), code=0).err
    equal(noted.count("without a partner"), 15, "places listed")  # two orbitals each


@test
def dark_pixels_are_vacancies():
    place = folder()
    rows = noise(10, 7, 5, 255)
    put(place, "a.png", images.png(rows))
    entry = "vacancies, file: a.png, pixel: 0.5 nm, origin: [-0.25 nm, -0.25 nm], %s"
    grey = numpy.array(rows[::-1]) / 255  # one pixel a site
    for key, gone in (("darker_than: 0.4", grey < 0.4), ("brighter_than: 0.7", grey > 0.7)):
        _, left = export(sheet(place, entry % key))
        cells = {(int(row["cell_i"]), int(row["cell_j"])) for row in left}
        wanted = {(i, j) for j in range(5) for i in range(7) if not gone[j, i]}
        equal(cells, wanted, key)
        check(0 < gone.sum() < 35, "no test")


@test
def rows_without_a_site_are_reported():
    place = folder()
    write(os.path.join(place, "d.csv"), "x [nm],y [nm]\n0.5,0.5\n9,9\n1.02,1\n0.98,1.0\n-4,0.1\n")
    refused(sheet(place, "vacancies, file: d.csv"), "d.csv:3:1", "1 more (line 6)")
    path = sheet(place, "vacancies, file: d.csv, unmatched: skip")
    noted = run("check", path, code=0).err
    contains(noted, "2 rows of the file fall on no site and are left out: line 3: (9, 9) nm; line 6")
    inventory = run("map", path, "--json").json()["inventory"]
    equal([inventory[key] for key in ("marks_matched", "marks_unmatched", "marks_merged", "vacancies")],
          [3, 2, 1, 2], "inventory")
    turned = sheet(place, "vacancies, file: d.csv, rotation: 90 deg, origin: [2 nm, 0 nm], unmatched: skip")
    _, left = export(turned)
    cells = {(int(row["cell_i"]), int(row["cell_j"])) for row in left}
    equal({(i, j) for i in range(7) for j in range(5)} - cells, {(3, 1), (2, 2)}, "cells of (0.5, 0.5), (1, 1)")


@test
def images_belong_to_the_identity_of_a_run():
    place = folder()
    rows = noise(11, 11, 9, 255)
    put(place, "a.png", images.png(rows))
    path, place_of_run = sheet(place, ENTRY % "a.png"), os.path.join(place, "run")
    run("average", path, "-o", place_of_run, code=0)
    kept = os.listdir(os.path.join(place_of_run, "inputs"))
    check(any(name.endswith("a.png") for name in kept), kept)
    rows[3][3] ^= 255
    put(place, "a.png", images.png(rows))
    run("average", path, "-o", place_of_run, code=4)


main()
