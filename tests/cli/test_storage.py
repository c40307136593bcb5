# SPDX-License-Identifier: GPL-3.0-or-later
"""Full disks, folders that cannot be written, damaged and foreign ledgers: exit 4, a clear message,
and the rows of before. SV_TEST_DAMAGE sets the number of places where a ledger is damaged (10)."""
import functools
import json
import os
import resource
import shutil
import subprocess
import time

from harness import Skip, check, contains, equal, folder, main, read, run, run_any, test, write

SHEET = """\
selvedge: 1
title: Storage that fails
model: {name: qi_wu_zhang, m: -1}
flake: {shape: rectangle, cells: [5, 5]}
disorder:
  - {name: pot, kind: onsite, distribution: box, width: 1, per: cell}
markers: {local_chern: {window: 0.5}, bott: {}}
ensemble: {realisations: 20, seed: 3}
"""
DAMAGE = int(os.environ.get("SV_TEST_DAMAGE", "10"))


@functools.lru_cache(maxsize=1)
def good():
    """(sheet, run folder, points) of a run of 20 realisations."""
    top = folder()
    path, place = write(os.path.join(top, "sheet.yaml"), SHEET), os.path.join(top, "run")
    return path, place, run("average", path, "-o", place, "--json", code=0).json()["points"]


def copy(name):
    place = os.path.join(folder(), name)
    shutil.copytree(good()[1], place)
    return place


def in_namespace(script, *arguments):
    """Runs a script of the shell where mounts are its own; skips where that is not allowed."""
    if run_any(["unshare", "-m", "mount", "-t", "tmpfs", "tmpfs", "/mnt"]).code != 0:
        raise Skip("no mount namespaces here (needs root)")
    return run_any(["unshare", "-m", "sh", "-c", script, "sh", os.environ["SELVEDGE"], *map(str, arguments)])


@test
def a_full_disk_keeps_the_rows():
    path, _, _ = good()
    top = folder()
    result = in_namespace(
        'mount -t tmpfs -o size=400k tmpfs "$3" || exit 99\n'
        '"$1" average "$2" -o "$3/run" -n 4000 -q; echo "full: $?"\n'
        '"$1" info "$3/run" --json > "$4"; echo "info: $?"\n'
        '"$1" report "$3/run" -o "$5" -q >/dev/null; echo "report: $?"\n'
        'mount -o remount,size=20m "$3" || exit 98\n'
        '"$1" average "$2" -o "$3/run" -n 600 -q --json > "$6"; echo "more: $?"\n',
        path, top, os.path.join(folder(), "info.json"), os.path.join(folder(), "figures"),
        os.path.join(folder(), "more.json"))
    equal([line for line in result.out.splitlines() if ": " in line],
          ["full: 4", "info: 0", "report: 0", "more: 0"], "exit codes\n" + result.err)
    check("full" in result.err or "No space" in result.err, "message: " + result.err)


@test
def a_full_disk_gives_the_numbers_of_an_empty_one():
    path, _, _ = good()
    more, top = os.path.join(folder(), "more.json"), folder()
    in_namespace('mount -t tmpfs -o size=200k tmpfs "$3" || exit 99\n'
                 '"$1" average "$2" -o "$3/run" -n 300 -q 2>/dev/null\n'
                 'mount -o remount,size=20m "$3" || exit 98\n'
                 '"$1" average "$2" -o "$3/run" -n 300 -q --json > "$4"\n', path, top, more)
    alone = run("average", path, "-o", os.path.join(folder(), "alone"), "-n", "300", "--json", code=0)
    equal(json.loads(read(more))["points"], alone.json()["points"], "points after a full disk")


@test
def a_folder_that_cannot_be_written():
    path, _, _ = good()
    place = copy("run")
    result = in_namespace('mount --bind "$3" "$3" && mount -o remount,bind,ro "$3" || exit 99\n'
                          '"$1" average "$2" -o "$3" -n 30 -q; echo "average: $?"\n'
                          '"$1" average "$2" -o "$3/new" -q; echo "new: $?"\n'
                          '"$1" info "$3" >/dev/null; echo "info: $?"\n', path, place)
    equal(result.out.split("\n")[:3], ["average: 4", "new: 4", "info: 0"], "exit codes\n" + result.err)
    contains(result.err, "Read-only file system", "message")
    equal(run("average", path, "-o", place, "--json", code=0).json()["points"], good()[2], "points")


@test
def a_limit_of_file_size():
    path, _, points = good()
    place = os.path.join(folder(), "run")
    limit = 200 * 1024
    done = subprocess.run([os.environ["SELVEDGE"], "average", path, "-o", place, "-n", "3000", "-q"],
                          preexec_fn=lambda: resource.setrlimit(resource.RLIMIT_FSIZE, (limit, limit)),
                          stdout=subprocess.PIPE, stderr=subprocess.PIPE, text=True, timeout=100, check=False)
    equal(done.returncode, 4, "exit code\n" + done.stderr)
    check("limit" in done.stderr or "too large" in done.stderr or "full" in done.stderr, "message: " + done.stderr)
    rows = run("info", place, "--json", code=0).json()["realisations"]
    check(20 < rows < 3000, "%d rows" % rows)
    equal(run("average", path, "-o", place, "--json", code=0).json()["points"], points, "points")


def damaged(place, path, what):
    """Both a reading and a writing command end well on it; right numbers or a refusal."""
    info = run("info", place)
    check(info.code in (0, 4), "info, %s: exit code %d\n%s" % (what, info.code, info.err))
    check(info.code == 0 or info.err.startswith("selvedge: error:"), "message: " + info.err)
    result = run("average", path, "-o", place, "--json")
    check(result.code in (0, 4), "average, %s: exit code %d\n%s" % (what, result.code, result.err))
    if result.code == 0:
        equal(result.json()["points"], good()[2], "points, " + what)
    return result.code


@test
def flipped_bytes():
    path, place = good()[0], copy("run")
    ledger = os.path.join(place, "ledger.sqlite")
    with open(ledger, "rb") as file:
        whole = file.read()
    refused = 0
    for k in range(DAMAGE):
        at = (k * len(whole)) // DAMAGE + k % 7
        with open(ledger, "wb") as file:
            file.write(whole[:at] + bytes([whole[at] ^ 0x41]) + whole[at + 1:])
        refused += damaged(place, path, "byte %d" % at) == 4
    check(refused >= DAMAGE // 4, "%d of %d refused" % (refused, DAMAGE))
    with open(ledger, "wb") as file:
        file.write(whole)
    equal(run("average", path, "-o", place, "--json", code=0).json()["points"], good()[2], "points")


@test
def cut_off_ledgers():
    path, place = good()[0], copy("run")
    ledger = os.path.join(place, "ledger.sqlite")
    with open(ledger, "rb") as file:
        whole = file.read()
    for k in range(DAMAGE):
        with open(ledger, "wb") as file:
            file.write(whole[:k * len(whole) // DAMAGE])
        equal(damaged(place, path, "cut at %d of %d" % (k, DAMAGE)), 4, "exit code of a cut ledger")


@test
def a_ledger_of_another_sheet():
    path, place = good()[0], copy("run")
    other_path = write(os.path.join(folder(), "other.yaml"), SHEET.replace("m: -1", "m: 1"))
    other = os.path.join(folder(), "other")
    run("average", other_path, "-o", other, code=0)
    contains(run("average", other_path, "-o", place, code=4).err, "another run", "other sheet")
    shutil.copy(os.path.join(other, "ledger.sqlite"), place)
    for command in (("average", path, "-o", place), ("info", place), ("report", place)):
        result = run(*command, code=4)
        check("error:" in result.err and result.out == "", "message: " + result.err)
    shutil.copy(os.path.join(good()[1], "ledger.sqlite"), place)
    equal(run("average", path, "-o", place, "--json", code=0).json()["points"], good()[2], "points")


@test
def two_processes_on_one_run():
    path = write(os.path.join(folder(), "sheet.yaml"), SHEET.replace("[5, 5]", "[9, 9]"))
    place = os.path.join(folder(), "run")
    command = [os.environ["SELVEDGE"], "average", path, "-o", place, "-n", "100000", "-q"]
    first = subprocess.Popen(command, stdout=subprocess.DEVNULL, stderr=subprocess.DEVNULL)
    try:
        for _ in range(500):
            if os.path.exists(os.path.join(place, "sheet.resolved.yaml")):
                break
            time.sleep(0.02)
        second = run("average", path, "-o", place, code=4)
        contains(second.err, "locked", "message of the second process")
        contains(second.err, str(first.pid), "number of the first")
        run("info", place, code=0)
    finally:
        first.kill()
        first.wait()
    run("info", place, code=0)


main()
