# SPDX-License-Identifier: GPL-3.0-or-later
"""Tasks and merge: any split, joined in any order, any number of times, is the run of one process."""
import functools
import hashlib
import json
import os
import shutil
import sqlite3
import subprocess

from harness import check, contains, equal, folder, main, read, run, test, write

SHEET = """\
selvedge: 1
title: Parts of an ensemble
model: {name: qi_wu_zhang, m: -1}
flake: {shape: rectangle, cells: [5, 5]}
disorder:
  - {name: vac, kind: vacancies, file: marks.csv}
  - {name: pot, kind: onsite, distribution: box, width: 1, per: cell}
markers: {local_chern: {window: 0.5}, bott: {}}
ensemble: {realisations: 7, seed: 3}
sweep:
  - {parameter: disorder.pot.width, values: [0.5, 1.5, 6]}
"""


def sheet(text=SHEET):
    """A fresh folder with the sheet and the file it names."""
    top = folder()
    write(os.path.join(top, "marks.csv"), "x,y\n1,1\n3,2\n")
    return top, write(os.path.join(top, "sheet.yaml"), text)


@functools.lru_cache(maxsize=1)
def alone():
    """(points, points.csv) of the run of one process."""
    top, path = sheet()
    place = os.path.join(top, "run")
    answer = run("average", path, "-o", place, "--json", code=0).json()
    return answer["points"], read(os.path.join(place, "points.csv"))


@functools.lru_cache(maxsize=None)
def parts(n):
    """Folders of n tasks. Tests read them only."""
    top, path = sheet()
    places = [os.path.join(top, "part-%d" % k) for k in range(1, n + 1)]
    for k, place in enumerate(places, 1):
        answer = run("average", path, "-o", place, "--task", "%d/%d" % (k, n), "--json", code=0).json()
        task = answer["task"]
        equal((task["number"], task["of"], task["done"], task["complete"]),
              (k, n, task["realisations"], True), "task")
    return places


def rows(place):
    """(point, realisation) of the ledger of a run."""
    with sqlite3.connect("file:%s?mode=ro" % os.path.join(place, "ledger.sqlite"), uri=True) as ledger:
        return ledger.execute("select point, realisation from realisation order by 1, 2").fetchall()


def same_as_alone(place, answer):
    equal(answer["points"], alone()[0], "points")
    equal(read(os.path.join(place, "points.csv")), alone()[1], "points.csv")
    equal(json.loads(read(os.path.join(place, "summary.json")))["points"], alone()[0], "summary.json")


@test
def one_or_five_tasks_in_any_order_are_one_run():
    for n, order in ((1, [0]), (5, [0, 1, 2, 3, 4]), (5, [3, 0, 4, 2, 1])):
        place = os.path.join(folder(), "run")
        answer = run("merge", place, *[parts(n)[k] for k in order], "--json", code=0).json()
        equal(answer["command"], "merge", "command")
        equal(answer["merged"], {"folders": n, "added": 21, "present": 0, "missing": 0}, "merged")
        same_as_alone(place, answer)


@test
def every_realisation_belongs_to_one_task():
    taken = [row for place in parts(5) for row in rows(place)]
    equal(sorted(taken), [(p, k) for p in range(3) for k in range(7)], "rows of all tasks")
    for place in parts(5):
        for point in range(3):  # 7 realisations of each point over 5 tasks
            share = sum(row[0] == point for row in rows(place))
            check(share in (1, 2), "%d realisations of point %d in one task" % (share, point))
        check(not os.path.exists(os.path.join(place, "points.csv")), "a part has no means")


@test
def merging_again_or_piecewise_changes_nothing():
    place = os.path.join(folder(), "run")
    first = run("merge", place, *parts(5)[:2], code=0)
    contains(first.err, "realisations are missing; of the tasks 3, 4, 5", "warning")
    before = rows(place)
    again = run("merge", place, *parts(5)[:2], "--json", code=0).json()
    equal((again["merged"]["added"], again["merged"]["present"]), (0, len(before)), "second time")
    equal(rows(place), before, "rows after the second time")
    last = run("merge", place, *parts(5)[1:], "--json", code=0).json()
    same_as_alone(place, last)
    equal(run("merge", place, parts(1)[0], "--json", code=0).json()["merged"]["added"], 0, "all are there")


@test
def a_merged_run_is_continued_by_average():
    top, path = sheet()
    place = os.path.join(top, "run")
    run("merge", place, *parts(5)[2:], code=0)
    equal(run("average", path, "-o", place, "--json", code=0).json()["points"], alone()[0], "the rest computed")
    more = run("average", path, "-o", place, "-n", "9", "--json", code=0).json()
    other = run("average", path, "-o", os.path.join(top, "other"), "-n", "9", "--json", code=0).json()
    equal(more["points"], other["points"], "nine realisations")
    contains(run("report", parts(5)[0], code=2).err, "task 1 of 5", "report of a part")


@test
def parts_of_more_realisations_join_earlier_ones():
    top, path = sheet()
    places = []
    for k in (1, 2):
        places.append(os.path.join(top, "more-%d" % k))
        run("average", path, "-o", places[-1], "--task", "%d/2" % k, "-n", "9", code=0)
    answer = run("merge", os.path.join(top, "run"), parts(1)[0], *places, "--json", code=0).json()
    equal(answer["merged"], {"folders": 3, "added": 27, "present": 21, "missing": 0}, "merged")
    contains(read(os.path.join(top, "run", "sheet.resolved.yaml")), "realisations: 9", "resolved sheet")


@test
def a_task_keeps_to_its_folder():
    top, path = sheet()
    place = os.path.join(top, "part")
    run("average", path, "-o", place, "--task", "2/3", code=0)
    before = rows(place)
    for more, what in ((["--task", "1/3"], "task 2 of 3, not of task 1 of 3"), (["--task", "2/4"], "task 2 of 3"),
                       ([], "--task 2/3")):
        contains(run("average", path, "-o", place, *more, code=4).err, what, "refusal")
    run("average", path, "-o", os.path.join(top, "whole"), code=0)
    contains(run("average", path, "-o", os.path.join(top, "whole"), "--task", "1/2", code=4).err, "whole run", "whole")
    contains(run("merge", place, parts(5)[0], code=4).err, "task 2 of 3", "merging into a part")
    run("average", path, "-o", place, "--task", "2/3", code=0)
    equal(rows(place), before, "rows")


@test
def an_interrupted_task_is_continued():
    top, path = sheet(SHEET.replace("realisations: 7", "realisations: 40").replace("[5, 5]", "[9, 9]"))
    place = os.path.join(top, "part")
    run("average", path, "-o", place, "--task", "2/2", "-j", "1", "--time-limit", "0.3", code=7)
    some = len(rows(place))
    check(0 < some < 60, "%d of 60 rows after the time limit" % some)
    run("average", path, "-o", place, "--task", "2/2", code=0)
    equal(len(rows(place)), 60, "rows")


@test
def usage_of_tasks():
    top, path = sheet()
    for word in ("0/3", "4/3", "1", "1/", "/3", "1/0", "-1/3", "1/3/5", "a/b", "1/99999999"):
        check(run("average", path, "-o", os.path.join(top, "x"), "--task=" + word).code == 2, "--task %s" % word)
    check(not os.path.exists(os.path.join(top, "x")), "a folder appeared")
    _, path = sheet(SHEET.replace("seed: 3}", "seed: 3, stop: {standard_error: 0.1, of: local_chern, at_least: 3}}"))
    contains(run("average", path, "-o", os.path.join(top, "x"), "--task", "1/2", code=2).err, "stop rule", "stop")
    run("merge", code=2)
    run("merge", os.path.join(top, "x"), code=2)
    contains(run("merge", parts(1)[0], parts(1)[0], code=2).err, "into itself", "itself")


def refused(place, part, code, what, *others):
    """Merging `part` fails with a message and leaves `place` as it was."""
    existed = os.path.exists(place)
    before = rows(place) if existed else None
    summary = read(os.path.join(place, "summary.json")) if existed else None
    result = run("merge", place, *others, part, code=code)
    contains(result.err, what, "refusal")
    check(result.out == "", "something on standard output: " + result.out)
    if not existed:
        check(not os.path.exists(place), "the run folder was made")
        return
    equal(rows(place), before, "rows of the run")
    equal(read(os.path.join(place, "summary.json")), summary, "summary.json")


@test
def other_runs_and_damaged_parts_are_refused():
    top, _ = sheet()
    place, fresh = os.path.join(top, "run"), os.path.join(top, "fresh")
    run("merge", place, parts(5)[0], code=0)
    others = []
    for name, text in (("seed", SHEET.replace("seed: 3", "seed: 4")), ("width", SHEET.replace("width: 1,", "width: 2,"))):
        _, path = sheet(text)
        others.append(os.path.join(top, name))
        run("average", path, "-o", others[-1], "--task", "2/5", code=0)
    marks, path = sheet()
    write(os.path.join(marks, "marks.csv"), "x,y\n1,1\n2,2\n")
    others.append(os.path.join(top, "marks"))
    run("average", path, "-o", others[-1], "--task", "2/5", code=0)
    for other in others:
        refused(place, other, 4, "is not of the same run", parts(5)[1])
        refused(fresh, other, 4, "is not of the same run", parts(5)[1])
    for part in (os.path.join(top, "nothing"), top):
        refused(fresh, part, 4, "", parts(5)[1])


def copy_of(part, top, name):
    place = os.path.join(top, name)
    shutil.copytree(part, place)
    return place


@test
def damage_is_found_before_anything_is_written():
    top = folder()
    place, fresh = os.path.join(top, "run"), os.path.join(top, "fresh")
    run("merge", place, parts(5)[0], code=0)
    torn = copy_of(parts(5)[2], top, "torn")
    ledger = os.path.join(torn, "ledger.sqlite")
    with open(ledger, "r+b") as file:
        file.truncate(os.path.getsize(ledger) // 2)
    changed = copy_of(parts(5)[2], top, "changed")
    with sqlite3.connect(os.path.join(changed, "ledger.sqlite")) as writer:
        writer.execute("drop trigger outcome_no_update")
        writer.execute("update outcome set value = value + 1e-9")
        writer.execute("create trigger outcome_no_update before update on outcome\n"
                       "begin select raise(abort, 'the ledger is append-only'); end")
    link = copy_of(parts(5)[2], top, "link")
    os.rename(os.path.join(link, "ledger.sqlite"), os.path.join(top, "elsewhere.sqlite"))
    os.symlink(os.path.join(top, "elsewhere.sqlite"), os.path.join(link, "ledger.sqlite"))
    sheets = copy_of(parts(5)[2], top, "sheets")
    write(os.path.join(sheets, "sheet.resolved.yaml"), read(os.path.join(sheets, "sheet.resolved.yaml")) + "# more\n")
    inputs = copy_of(parts(5)[2], top, "inputs")
    write(os.path.join(inputs, "inputs", "01-marks.csv"), "x,y\n2,2\n")
    for part in (torn, changed, link, sheets):
        refused(place, part, 4, "", parts(5)[1])
        refused(fresh, part, 4, "", parts(5)[1])
    contains(run("merge", fresh, inputs, parts(5)[1], code=4).err, "not the one its ledger", "changed input")
    check(not os.path.exists(fresh), "a run from a changed input")


def meta_checksum(key, value):
    """As the ledger has it, so that only the claim itself is at fault."""
    digests = [hashlib.sha256(text.encode()).hexdigest() for text in (key, value)]
    return hashlib.sha256("".join(digests).encode()).hexdigest()[:16]


@test
def a_part_that_claims_too_much_is_refused():
    top = folder()
    claims = copy_of(parts(5)[2], top, "claims")
    with sqlite3.connect(os.path.join(claims, "ledger.sqlite")) as writer:
        writer.execute("update meta set value = '1000000000', checksum = ? where key = 'realisations'",
                       [meta_checksum("realisations", "1000000000")])
    refused(os.path.join(top, "fresh"), claims, 6, "speak of 1000000000 realisations")


@test
def a_row_that_differs_is_a_failed_check():
    top, path = sheet()
    place, fresh = os.path.join(top, "run"), os.path.join(top, "fresh")
    run("merge", place, parts(5)[0], code=0)
    # A row of another seed under this identity: same layout, own checksum.
    _, other_path = sheet(SHEET.replace("seed: 3", "seed: 4"))
    other = os.path.join(top, "other")
    run("average", other_path, "-o", other, "--task", "1/5", code=0)
    with sqlite3.connect(os.path.join(other, "ledger.sqlite")) as writer:
        writer.execute("attach ? as good", [os.path.join(parts(5)[0], "ledger.sqlite")])
        for key in ("identity", "identity_digest", "sheet", "sheet_digest"):
            writer.execute("update meta set (value, checksum) = "
                           "(select value, checksum from good.meta where key = ?1) where key = ?1", [key])
    shutil.copy(os.path.join(parts(5)[0], "sheet.resolved.yaml"), other)
    refused(place, other, 1, "is not the same in", parts(5)[1])
    refused(fresh, other, 1, "nothing was merged", parts(5)[0])


@test
def a_killed_merge_leaves_all_or_nothing():
    top = folder()
    for delay in (0.01, 0.03, 0.06, 0.1, 0.15):
        place = os.path.join(top, "run-%g" % delay)
        process = subprocess.Popen([os.environ["SELVEDGE"], "merge", place, *parts(5)],
                                   stdout=subprocess.DEVNULL, stderr=subprocess.DEVNULL)
        try:
            process.wait(timeout=delay)
        except subprocess.TimeoutExpired:
            process.kill()
            process.wait()
        answer = run("merge", place, *parts(5), "--json", code=0).json()
        check(answer["merged"]["added"] in (0, 21), "half a merge: %r" % answer["merged"])
        same_as_alone(place, answer)


main()
