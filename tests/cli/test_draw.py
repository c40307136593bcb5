# SPDX-License-Identifier: GPL-3.0-or-later
"""selvedge draw: endings, inventory, refusals."""
import os

from harness import check, contains, equal, folder, main, run, test, write

SHEET = """\
selvedge: 1
title: Invented patch
model: {name: qi_wu_zhang, m: -1, lattice_constant: 0.5 nm}
flake: {shape: rectangle, cells: [10, 8], keep: largest}
disorder:
  - {kind: vacancies, share: 0.4}
ensemble: {seed: 3}
"""


def sheet():
    return write(os.path.join(folder(), "sheet.yaml"), SHEET)


@test
def the_ending_says_what_is_made():
    for ending in ("svg", "pdf", "png"):
        place = folder()
        keep = write(os.path.join(place, "film.%s" % ("pdf" if ending != "pdf" else "svg")), "mine")
        told = run("draw", sheet(), "-o", os.path.join(place, "film." + ending), code=0)
        contains(told.out, "film." + ending, "standard output")
        made = set(os.listdir(place)) - {os.path.basename(keep)}
        equal(made, {"film." + ending, "film.gp", "film.dat"}, "files")
        equal(open(keep, encoding="utf-8").read(), "mine", "a picture of another ending")
    place = folder()
    run("draw", sheet(), "-o", os.path.join(place, "film"), code=0)
    check({"film.svg", "film.pdf", "film.png"} <= set(os.listdir(place)), os.listdir(place))


@test
def the_inventory_is_that_of_map():
    drawn = run("draw", sheet(), "-o", os.path.join(folder(), "a.svg"), "--json", "-k", "2", code=0).json()
    mapped = run("map", sheet(), "--json", "-k", "2").json()
    equal(drawn["inventory"], mapped["inventory"], "inventory")
    check(drawn["inventory"]["removed_sites"] > 0, "nothing was removed")
    equal(drawn["realisation"], 2, "realisation")


@test
def the_script_draws_it_again():
    import subprocess
    place = folder()
    run("draw", sheet(), "-o", os.path.join(place, "a.svg"), code=0)
    os.remove(os.path.join(place, "a.svg"))
    subprocess.run(["gnuplot", "a.gp"], cwd=place, check=True)
    check(os.path.getsize(os.path.join(place, "a.svg")) > 1000, "no picture from the script")


@test
def data_of_others_are_spared():
    place = folder()
    for _ in range(2):  # its own are replaced
        run("draw", sheet(), "-o", os.path.join(place, "own.svg"), code=0)
    mine = write(os.path.join(place, "film.dat"), "x y\n1 2\n")
    told = run("draw", sheet(), "-o", os.path.join(place, "film.svg"), code=4)
    contains(told.err, "film.dat exists")
    equal(open(mine, encoding="utf-8").read(), "x y\n1 2\n", "film.dat")
    check(not os.path.exists(os.path.join(place, "film.svg")), "a figure was written")


@test
def misuse_writes_nothing():
    place = folder()
    for arguments in (("-o", os.path.join(place, "a.jpeg")), ()):
        run("draw", sheet(), *arguments, code=2)
    bad = write(os.path.join(folder(), "bad.yaml"), SHEET.replace("keep: largest", "keep: some"))
    run("draw", bad, "-o", os.path.join(place, "a.svg"), code=3)
    equal(os.listdir(place), [], "files")


main()
