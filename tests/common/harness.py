# SPDX-License-Identifier: GPL-3.0-or-later
"""A small test harness for Python that speaks TAP. Functions register themselves:

    from harness import check, close, main, run, test

    @test
    def refuses_an_unknown_command():
        check(run("frobnicate").code == 2)

    main()
"""
import json
import os
import shutil
import subprocess
import sys
import tempfile
import traceback

_tests = []
_failures = []
_folders = []


class Skip(Exception):
    """Raised by a test that cannot be made here, with the reason."""


def test(function):
    """Registers a test; its name becomes the TAP description."""
    _tests.append(function)
    return function


def check(condition, message="check failed"):
    """Records a failure of the running test; returns the truth of `condition`."""
    if not condition:
        caller = sys._getframe(1)
        while caller.f_code.co_filename == __file__:
            caller = caller.f_back
        place = "%s:%d" % (os.path.basename(caller.f_code.co_filename), caller.f_lineno)
        _failures.append("%s: %s" % (place, message))
    return bool(condition)


def equal(value, expected, what="value"):
    return check(value == expected, "%s = %r, expected %r" % (what, value, expected))


def close(value, expected, tolerance, what="value"):
    """Absolute difference of two numbers; NaN never passes."""
    return check(abs(value - expected) <= tolerance,
                 "%s = %.15g, expected %.15g ± %.3g" % (what, value, expected, tolerance))


def contains(text, part, what="text"):
    return check(part in text, "%s lacks %r; it is:\n%s" % (what, part, text))


def folder():
    """A fresh scratch folder, removed at the end."""
    path = tempfile.mkdtemp(prefix="selvedge-test-")
    _folders.append(path)
    return path


def write(path, text):
    """Writes a text file and returns its path."""
    with open(path, "w", encoding="utf-8") as file:
        file.write(text)
    return path


def read(path):
    with open(path, encoding="utf-8") as file:
        return file.read()


def source(*parts):
    """Path below the source tree."""
    return os.path.join(os.environ["SV_TEST_DATA"], "..", *parts)


class Result:
    """What a program left behind: exit code, standard output and standard error."""

    def __init__(self, code, out, err):
        self.code, self.out, self.err = code, out, err

    def json(self):
        """The one document on standard output; an empty dictionary (and a failure) if none."""
        try:
            return json.loads(self.out)
        except ValueError as error:
            check(False, "no JSON on standard output (%s): %s%s" % (error, self.out, self.err))
            return {}


def run_any(command, cwd=None, env=None, stdin="", timeout=100):
    """Runs a command without a terminal."""
    done = subprocess.run(command, cwd=cwd, input=stdin, text=True, encoding="utf-8", timeout=timeout,
                          env={**os.environ, **(env or {})}, stdout=subprocess.PIPE,
                          stderr=subprocess.PIPE, check=False)
    return Result(done.returncode, done.stdout, done.stderr)


def run(*arguments, code=None, **options):
    """Runs the built program; with `code`, its exit code is checked."""
    result = run_any([os.environ["SELVEDGE"], *map(str, arguments)], **options)
    if code is not None:
        check(result.code == code, "selvedge %s: exit code %d, expected %d\n%s"
              % (" ".join(map(str, arguments)), result.code, code, result.err))
    return result


def _run_one(number, function):
    _failures.clear()
    skipped = ""
    try:
        function()
    except Skip as reason:
        skipped = " # SKIP %s" % reason
    except Exception:  # a test that breaks has failed
        _failures.append(traceback.format_exc())
    for failure in _failures:
        print("\n".join("# " + line for line in failure.splitlines()))
    print("%sok %d - %s%s" % ("not " if _failures else "", number, function.__name__, skipped), flush=True)
    return not _failures


def main():
    """Runs the registered tests (or those named on the command line) and exits."""
    chosen = [f for f in _tests if len(sys.argv) < 2 or f.__name__ in sys.argv[1:]]
    print("1..%d" % len(chosen), flush=True)
    try:
        good = [_run_one(number, function) for number, function in enumerate(chosen, 1)]
    finally:
        for path in _folders:
            shutil.rmtree(path, ignore_errors=True)
    sys.exit(0 if good and all(good) else 1)
