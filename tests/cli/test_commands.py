# SPDX-License-Identifier: GPL-3.0-or-later
"""The command line as its manual promises: streams, exit codes, help."""
import os
import re
import subprocess

from harness import check, contains, equal, folder, main, run, run_any, test, write

COMMANDS = ("check", "map", "average", "report", "export", "info")
SMALL = """\
selvedge: 1
title: small
model: {name: qi_wu_zhang, m: -1}
flake: {shape: rectangle, cells: [6, 6]}
"""


def sheet(text=SMALL):
    return write(os.path.join(folder(), "sheet.yaml"), text)


def without_comments(text):
    """The sheet itself; the forecast stands in comments and its times vary."""
    return [line for line in text.splitlines() if not line.startswith("#")]


@test
def help_goes_to_standard_output():
    overview = run("--help", code=0)
    for command in COMMANDS:
        check(re.search(r"^\s*%s\b" % command, overview.out, re.M), "no %s in the overview" % command)
        told = run(command, "--help", code=0)
        contains(told.out, command, "help of %s" % command)
        equal(told.err, "", "standard error of %s --help" % command)
    equal(overview.err, "", "standard error of --help")


@test
def version_names_the_program():
    told = run("--version", code=0)
    check(re.search(r"selvedge \d+\.\d+", told.out), told.out)


@test
def misuse_is_exit_code_2_on_standard_error():
    for arguments in ((), ("frobnicate",), ("map",), ("average",), ("map", sheet(), "--no-such-option"),
                      ("average", sheet(), "-o"), ("map", sheet(), "-k", "minus-one"),
                      ("average", sheet(), "-o", "run", "-j", "0"), ("map", sheet(), "surplus")):
        result = run(*arguments, code=2)
        equal(result.out, "", "standard output of %s" % (arguments,))
        check(result.err != "", "%s says nothing" % (arguments,))


@test
def a_near_miss_is_pointed_out():
    contains(run("averge", sheet(), code=2).err, "average", "message")


@test
def info_says_what_the_numbers_hang_on():
    told = run("info", code=0)
    for word in ("selvedge", "BLAS", "threads"):
        contains(told.out, word, "info")
    equal(told.err, "", "standard error")
    run("info", "--json", code=0).json()


@test
def check_computes_nothing_and_prints_what_can_be_read_back():
    told = run("check", sheet(), code=0)
    contains(told.out, "fermi_energy: 0", "resolved sheet")
    contains(told.out, "window: 0.5", "resolved sheet")
    again = run("check", write(os.path.join(folder(), "again.yaml"), told.out), code=0)
    equal(without_comments(again.out), without_comments(told.out), "resolved sheet, read back")


@test
def the_forecast_follows_the_work():
    """Scales only: how near the forecast comes is measured by `scripts/benchmark forecast`."""
    def forecast(*changes):
        options = [word for change in changes for word in ("--set", change)]
        return run("check", sheet(SMALL + "ensemble: {realisations: 3}\n"), "--json", "-j", "1",
                   *options, code=0).json()["forecast"]

    small = forecast()
    for name in ("seconds_before", "seconds_per_realisation", "seconds", "memory_bytes_per_thread",
                 "memory_bytes_program", "memory_bytes_available"):
        check(small[name] > 0.0, "%s is %r" % (name, small[name]))
    for row in (small, forecast("ensemble.realisations=300")):
        whole = row["seconds_before"] + row["realisations"] * row["seconds_per_realisation"]
        check(abs(row["seconds"] - whole) <= 1e-9 * whole, "parts and whole: %r" % row)
    # Diagonalisation: 64 times the work and 16 times the memory at twice the side.
    dense = [forecast("solve.engine=dense", "flake.cells=[%d, %d]" % (n, n)) for n in (8, 16)]
    check(10.0 < dense[1]["seconds_per_realisation"] / dense[0]["seconds_per_realisation"] < 400.0,
          "time at twice the side: %r" % dense)
    check(abs(dense[1]["memory_bytes_per_thread"] / dense[0]["memory_bytes_per_thread"] - 16.0) < 1e-6,
          "memory at twice the side: %r" % dense)


@test
def a_missing_or_unreadable_sheet_is_invalid_input():
    for path in ("no-such-sheet.yaml", folder()):
        result = run("check", path, code=3)
        contains(result.err, "error", "message")
        equal(result.out, "", "standard output")


@test
def faults_name_file_line_and_column():
    text = SMALL.replace("qi_wu_zhang", "qi_wu_zang")
    result = run("check", sheet(text), code=3)
    check(re.search(r"^\S*sheet\.yaml:3:\d+: error: ", result.err, re.M), result.err)
    contains(result.err, "qi_wu_zhang", "hint")
    contains(result.err, "^", "caret")
    equal(result.out, "", "standard output")


@test
def overrides_are_checked_like_the_sheet():
    path = sheet()
    contains(run("check", path, "--set", "model.m=1.5", code=0).out, "1.5", "resolved sheet")
    contains(run("check", path, "--set", "model.mm=1", code=3).err, "error", "message")
    contains(run("check", path, "--set", "flake.cells=[0, 6]", code=3).err, "error", "message")


@test
def nothing_is_written_for_a_faulty_sheet():
    top = folder()
    run("average", sheet(SMALL + "surplus: 1\n"), "-o", os.path.join(top, "run"), code=3)
    equal(os.listdir(top), [], "files")


@test
def output_that_cannot_be_written_is_exit_code_4():
    path = sheet()
    run("average", path, "-o", "/dev/null/run", code=4)
    run("map", path, "--csv", "/dev/full", code=4)
    with open("/dev/full", "w", encoding="utf-8") as full:
        done = subprocess.run([os.environ["SELVEDGE"], "check", path], stdout=full,
                              stderr=subprocess.PIPE, check=False)
    equal(done.returncode, 4, "exit code with a full standard output")


@test
def no_colour_and_no_progress_without_a_terminal():
    result = run("average", sheet(), "-o", os.path.join(folder(), "run"), "-n", "3", code=0)
    check("\x1b" not in result.out + result.err and "\r" not in result.err, "control characters")
    check(not re.search(r"\d ?%", result.err), "progress without a terminal: %s" % result.err)
    quiet = run("average", sheet(), "-o", os.path.join(folder(), "run"), "-n", "3", "-q", code=0)
    equal(quiet.err, "", "standard error with -q")


@test
def a_sheet_may_come_from_standard_input():
    result = run_any([os.environ["SELVEDGE"], "check", "-"], stdin=SMALL)
    equal(result.code, 0, "exit code")


main()
