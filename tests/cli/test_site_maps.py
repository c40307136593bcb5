# SPDX-License-Identifier: GPL-3.0-or-later
"""Site maps of an ensemble: NumPy on maps of single realisations; the same bytes in any order."""
import csv
import functools
import json
import os
import shutil
import signal
import subprocess
import tempfile
import time

import numpy

from harness import check, close, contains, equal, folder, main, read, run, run_any, test, write

# A transaction per realisation: in memory where there is such a place, no test here cuts the power.
if os.access("/dev/shm", os.W_OK):
    tempfile.tempdir = "/dev/shm"

SHEET = """\
selvedge: 1
title: Site maps of an invented film
model: {name: haldane, t1: 1, t2: 0.2, phi: 90 deg}
flake: {shape: parallelogram, cells: [4, 3]}
disorder:
  - {name: vac, kind: vacancies, share: 0.15}
  - {name: pot, kind: onsite, distribution: box, width: 2}
markers: {local_chern: {window: 0.5}}
ensemble: {realisations: 70, seed: 5, site_maps: true}
sweep: [{parameter: disorder.pot.width, values: [0.5, 3]}]
"""


def table(path):
    """Rows of a CSV file as dictionaries."""
    with open(path, newline="") as stream:
        return list(csv.DictReader(stream))


def average(sheet, place, *options, code=0):
    return run("average", sheet, "-o", place, "-q", "--json", *options, code=code)


def maps(place):
    """The bytes of the exported maps of a run."""
    path = os.path.join(folder(), "maps.csv")
    run("export", place, "--maps", path, code=0)
    return read(path)


@functools.lru_cache(maxsize=1)
def alone():
    """(sheet, run folder, bytes of its maps) of one process with one thread."""
    top = folder()
    sheet = write(os.path.join(top, "sheet.yaml"), SHEET)
    place = os.path.join(top, "run")
    average(sheet, place, "-j", "1")
    return sheet, place, maps(place)


def by_numpy(sheet, width, realisations):
    """Lists of the values of each site and each cell over realisations, from `map --csv`."""
    sites, cells = {}, {}
    path = os.path.join(folder(), "map.csv")
    for k in range(realisations):
        run("map", sheet, "--set", "disorder.pot.width=%g" % width, "-k", str(k), "--csv", path,
            "--force", "-q", code=0)
        sums = {}
        for row in table(path):
            cell = (row["cell_i"], row["cell_j"])
            value = float(row["local_chern"])
            sites.setdefault(cell + (row["orbital"],), []).append(value)
            sums[cell] = sums.get(cell, 0.0) + value
        for cell, value in sums.items():
            cells.setdefault(cell, []).append(value)
    return sites, cells


def compare(row, prefix, values, what):
    """One row of the maps against the values themselves."""
    equal(int(row[prefix + "present"]), len(values), what + " present")
    if values:
        close(float(row[prefix + "mean"]), numpy.mean(values), 1e-9, what + " mean")
    if len(values) > 1:
        deviation = numpy.std(values, ddof=1)
        close(float(row[prefix + "deviation"]), deviation, 1e-9, what + " deviation")
        close(float(row[prefix + "standard_error"]), deviation / len(values) ** 0.5, 1e-9,
              what + " standard error")


@test
def maps_are_those_of_the_single_realisations():
    top = folder()
    sheet = write(os.path.join(top, "sheet.yaml"), SHEET)
    place = os.path.join(top, "run")
    answer = average(sheet, place, "-n", "9").json()
    run("export", place, "--maps", os.path.join(top, "maps.csv"), code=0)
    rows = table(os.path.join(top, "maps.csv"))
    equal(len(rows), 2 * 24, "rows")
    for point, width in enumerate((0.5, 3)):
        sites, cells = by_numpy(sheet, width, 9)
        check(min(len(v) for v in sites.values()) < 9, "no vacancy tries the maps")
        for row in rows:
            if int(row["point"]) != point:
                continue
            cell = (row["cell_i"], row["cell_j"])
            compare(row, "", sites.get(cell + (row["orbital"],), []), "site %s" % row["site"])
            compare(row, "cell_", cells.get(cell, []), "cell %s %s" % cell)
        deviations = {c: numpy.std(v, ddof=1) for c, v in cells.items() if len(v) > 1}
        found = answer["points"][point]["site_maps"]
        worst = max(deviations, key=deviations.get)
        equal(found["realisations"], 9, "realisations of the maps")
        equal(found["largest_deviation"]["cell"], [int(i) for i in worst], "worst cell")
        close(found["largest_deviation"]["value"], deviations[worst], 1e-9, "largest deviation")
        close(found["deviation"], numpy.mean(numpy.square(list(deviations.values()))) ** 0.5, 1e-9,
              "root mean square")


@test
def threads_and_steps_leave_no_trace():
    sheet, _, expected = alone()
    for threads, steps in ((2, (70,)), (3, (5, 66, 70))):
        place = os.path.join(folder(), "run")
        for n in steps:
            average(sheet, place, "-n", str(n), "-j", str(threads))
        equal(maps(place), expected, "maps of %d threads" % threads)


@test
def ranks_leave_no_trace():
    if shutil.which("mpirun") is None or not run("info", "--json").json().get("mpi"):
        print("# no MPI: not tried")
        return
    sheet, _, expected = alone()
    place = os.path.join(folder(), "run")
    done = run_any(["mpirun", "-n", "2", os.environ["SELVEDGE"], "average", sheet, "-o", place, "-q", "-j", "1"],
                   env={"OMPI_ALLOW_RUN_AS_ROOT": "1", "OMPI_ALLOW_RUN_AS_ROOT_CONFIRM": "1",
                        "OMPI_MCA_btl": "self,vader", "OMPI_MCA_rmaps_base_oversubscribe": "1",
                        "OMPI_MCA_plm_rsh_agent": ""})
    equal(done.code, 0, "exit code of the ranks\n" + done.err)
    equal(maps(place), expected, "maps of two ranks")


@test
def merged_parts_give_the_same_bytes():
    sheet, place, expected = alone()
    parts = [os.path.join(folder(), "part") for _ in range(3)]
    for k, part in enumerate(parts, 1):
        average(sheet, part, "--task", "%d/3" % k)
    joined = os.path.join(folder(), "joined")
    run("merge", joined, parts[2], parts[0], "-q", code=0)
    run("merge", joined, parts[1], parts[2], "-q", code=0)
    equal(maps(joined), expected, "maps of merged parts")
    equal(json.loads(read(os.path.join(joined, "summary.json")))["points"],
          json.loads(read(os.path.join(place, "summary.json")))["points"], "points")


@test
def killed_and_continued_runs_give_the_same_bytes():
    sheet, _, expected = alone()
    place = os.path.join(folder(), "run")
    for turn in range(6):
        process = subprocess.Popen([os.environ["SELVEDGE"], "average", sheet, "-o", place, "-q", "-j", "2"],
                                   stdout=subprocess.DEVNULL, stderr=subprocess.DEVNULL)
        time.sleep(0.05 + 0.04 * turn)
        process.send_signal(signal.SIGKILL)
        process.wait()
    average(sheet, place)
    equal(maps(place), expected, "maps after kills")


@test
def a_stop_rule_cuts_the_maps_as_it_cuts_the_mean():
    sheet, _, _ = alone()
    place = os.path.join(folder(), "run")
    rule = ("--set", "ensemble.stop.standard_error=0.5", "--set", "ensemble.stop.at_least=20")
    points = average(sheet, place, *rule, "-j", "3").json()["points"]
    counted = [point["realisations"] for point in points]
    check(all(20 <= n < 64 for n in counted), "counted %r" % counted)
    for point, n in zip(points, counted):
        equal(point["site_maps"]["realisations"], n, "realisations of the maps")
    short = os.path.join(folder(), "run")
    average(sheet, short, "-n", str(counted[0]))
    first = [line for line in maps(place).splitlines() if not line.startswith("1,")]
    equal(first, [line for line in maps(short).splitlines() if not line.startswith("1,")], "maps")


@test
def bad_sheets_and_runs_without_maps_are_told():
    top = folder()
    for old, new, part in (("site_maps: true", "site_maps: 7", "expected true or false"),
                           ("site_maps: true", "site_map: true", "did you mean site_maps?"),
                           ("local_chern: {window: 0.5}", "localizer: {}", "not among the markers")):
        path = write(os.path.join(top, "bad.yaml"), SHEET.replace(old, new))
        answer = run("average", path, "-o", os.path.join(top, "none"), code=3)
        contains(answer.err, part)
        check(not os.path.exists(os.path.join(top, "none")), "a folder was made")
    plain = write(os.path.join(top, "plain.yaml"), SHEET.replace(", site_maps: true", ""))
    place = os.path.join(top, "run")
    points = average(plain, place, "-n", "2").json()["points"]
    check("site_maps" not in points[0], "maps nobody asked for")
    answer = run("export", place, "--maps", os.path.join(top, "maps.csv"), code=3)
    contains(answer.err, "the run has no maps")
    check(not os.path.exists(os.path.join(top, "maps.csv")), "a file was written")
    contains(run("export", place, "--maps", "a", "--sites", "b", code=2).err, "run folder")


main()
