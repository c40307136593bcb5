# SPDX-License-Identifier: GPL-3.0-or-later
"""Every sheet of samples/ is valid and runs, shrunk to two realisations a point."""
import os

from harness import check, close, equal, folder, main, run, source, test


def sheets():
    return sorted(name for name in os.listdir(source("samples")) if name.endswith(".yaml"))


@test
def there_is_one_for_each_user():
    for name in ("onsite_sweep.yaml", "vacancy_film.yaml", "clean_phases.yaml"):
        check(name in sheets(), "samples/%s is missing" % name)


@test
def all_are_valid():
    for name in sheets():
        run("check", source("samples", name), code=0)


@test
def all_run_shrunk():
    for name in sheets():
        place = os.path.join(folder(), "run")
        answer = run("average", source("samples", name), "-o", place, "-n", "2", "--json", code=0,
                     timeout=250).json()
        check(answer["points"], "%s has no points" % name)
        for point in answer["points"]:
            check(point["realisations"] == 2, "%s: %r" % (name, point["realisations"]))
            for marker in point["markers"].values():
                check(marker["mean"] is None or abs(marker["mean"]) < 10, "%s: %r" % (name, marker))


@test
def clean_phases_are_the_published_ones():
    # C = 1 for |mass| < 3√3 t2 |sin φ| (0 < φ < π, our sign), else 0: F. D. M. Haldane, PRL 61, 2015
    # (1988), value recalled from memory. A 12×12 torus holds the valley points, so its Bott index
    # changes exactly there.
    place = os.path.join(folder(), "run")
    answer = run("average", source("samples", "clean_phases.yaml"), "-o", place, "-n", "1", "--json",
                 code=0, timeout=250).json()
    edge = 3.0 * 3.0**0.5 * 0.2
    seen = set()
    for point in answer["points"]:
        mass = abs(point["parameters"]["model.mass"])
        wanted = int(mass < edge)
        equal(point["markers"]["bott"]["mean"], wanted, "Bott index at mass %g" % mass)
        if mass < 0.5 * edge or mass > 1.5 * edge:  # the flake rounds the change off in between
            close(point["markers"]["local_chern"]["mean"], wanted, 0.05, "marker at mass %g" % mass)
        seen.add(wanted)
    equal(seen, {0, 1}, "phases met")


main()
