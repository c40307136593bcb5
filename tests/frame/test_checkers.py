# SPDX-License-Identifier: GPL-3.0-or-later
"""The checkers of scripts/ must find what they look for: each is given a small tree with one fault."""
import json
import os
import sys

from harness import check, contains, equal, folder, main, run_any, source, test, write

HEADER = """#ifndef G_%(name)s
#define G_%(name)s
%(includes)s
/** Does it. */
SV_API int sv_%(name)s_do(int x);
#endif
"""


def tree(files=(), headers=(("base", ()), ("linalg", ("base",)), ("model", ("base",)))):
    """A source tree of three modules; `files` are further (path, text) pairs."""
    top = folder()
    listing = []
    for name, includes in headers:
        text = HEADER % {"name": name, "includes": "\n".join('#include "%s.h"' % i for i in includes)}
        put(top, "include/selvedge/%s.h" % name, text)
        put(top, "src/%s/%s.c" % (name, name),
            '#include "selvedge/%s.h"\n#include <math.h>\nint sv_%s_do(int x) { return x; }\n'
            % (name, name))
        listing.append("'%s.h'" % name)
    put(top, "include/selvedge/meson.build", "public_headers = files(%s)\n" % ", ".join(listing))
    put(top, "tests/base/test_all.c", "sv_base_do(1); sv_linalg_do(1); sv_model_do(1);\n")
    for path, text in files:
        put(top, path, text)
    return top


def put(top, path, text):
    path = os.path.join(top, path)
    os.makedirs(os.path.dirname(path), exist_ok=True)
    write(path, text)


def checker(name, top, *more):
    return run_any([sys.executable, source("scripts", name), "--root", top, *more])


def refuses(name, top, part, *more):
    result = checker(name, top, *more)
    equal(result.code, 1, "exit status of %s" % name)
    contains(result.out, part, "output of %s" % name)


def library(code):
    """A shared library made of one C file."""
    top = folder()
    file, built = write(os.path.join(top, "x.c"), code), os.path.join(top, "libx.so")
    done = run_any(["cc", "-shared", "-fPIC", "-o", built, file])
    check(done.code == 0, done.err)
    return built


@test
def layers_accept_a_sound_tree():
    top = tree([("src/linalg/linalg_internal.h", '#include "selvedge/base.h"\n'),
                ("src/linalg/extra.c", '#include "linalg_internal.h"\n#include <stdio.h>\n'
                 'void sv_x(FILE *f) { fprintf(f, "printf(%d)", 1); } // exit(1)\n'),
                ("src/program/main.c", '#include <selvedge/model.h>\n#include "program_internal.h"\n'
                 'int main(void) { printf("hello"); }\n'),
                ("src/program/program_internal.h", "")])
    result = checker("check_layers", top)
    equal((result.code, result.out.splitlines()[-1]), (0, "10 files, 0 faults"), "result")


@test
def layers_refuse_forbidden_includes():
    for path, text, part in (
            ("src/base/up.c", '#include "selvedge/model.h"\n', "base may not include model"),
            ("src/base/up.c", "/* a\n*/ # include <selvedge/linalg.h>\n", "up.c:2"),
            ("src/model/side.c", '#include "linalg/linalg_internal.h"\n', "only public headers"),
            ("src/model/side.c", '#include "../linalg/linalg_internal.h"\n', "only public headers"),
            ("src/model/macro.c", "#include HEADER\n", "macro"),
            ("src/sheet/a.c", '#include "selvedge/linalg.h"\n', "sheet may not include linalg"),
            ("src/marker/a.c", '#include "selvedge/sheet.h"\n', "marker may not include sheet"),
            ("src/present/a.c", '#include "selvedge/sheet.h"\n', "present may not include sheet"),
            ("src/program/a.c", '#include "linalg/linalg_internal.h"\n', "only public headers"),
            ("src/extra/a.c", "\n", "not in the table of layers")):
        top = tree([(path, text), ("src/linalg/linalg_internal.h", "\n")])
        refuses("check_layers", top, part)


@test
def layers_refuse_disordered_headers():
    refuses("check_layers", tree(headers=(("base", ("linalg",)), ("linalg", ()))),
            "not a header of a lower layer")
    refuses("check_layers", tree(headers=(("base", ()), ("other", ()))), "table of layers")
    refuses("check_layers", tree([("include/selvedge/sample.h", "\n")]), "meson.build")


@test
def layers_refuse_output_and_exits_in_the_library():
    for text, part in (('void f(void) { printf("x"); }', "printf has no place"),
                       ("void f(void) { exit (1); }", "exit has no place"),
                       ("void f(void) { abort(); }", "abort has no place"),
                       ("void f(void) { fprintf(stderr, 0); }", "stderr has no place")):
        refuses("check_layers", tree([("src/base/bad.c", "\n" + text + "\n")]), "bad.c:2: " + part)


@test
def layers_refuse_writable_state():
    sound = library("static const char *const names[] = {\"a\", \"b\"};\n"
                    "const char *sv_name(int i) { static const int t[] = {1}; return names[t[i]]; }")
    equal(checker("check_layers", tree(), "--library", sound).code, 0, "constants alone")
    for code in ("int sv_count; int sv_x(void) { return sv_count; }",
                 "int sv_x(void) { static int calls; return ++calls; }",
                 "int sv_x(void) { static int calls = 3; return ++calls; }",
                 "static _Thread_local int calls; int sv_x(void) { return ++calls; }",
                 "static const char *names[] = {\"a\"}; const char **sv_x(void) { return names; }"):
        refuses("check_layers", tree(), "writable static state", "--library", library(code))
    refuses("check_layers", tree(), "no symbol", "--library", library("int other(void) { return 1; }"))
    refuses("check_layers", tree(), "cannot read", "--library", "/dev/null")


DEFINED = "".join("int sv_%s_do(int x) { return x; }\n" % name for name in ("base", "linalg", "model"))


@test
def api_accepts_four_places_that_agree():
    result = checker("check_api", tree(), "--library", library(DEFINED))
    equal((result.code, result.out), (0, "3 public functions, 0 faults\n"), "result")


@test
def api_refuses_each_missing_place():
    built = library(DEFINED)
    cases = (
        ("tests/base/test_all.c", "/* sv_base_do */ sv_linalg_do(1); sv_model_do(1);\n",
         "base.h:5: sv_base_do is named in no test"),
        ("include/selvedge/base.h", "/* ---- section */\nSV_API int sv_base_do(int x);\n",
         "sv_base_do has no doc comment"),
        ("include/selvedge/base.h", "/** Doc. */\nint x;\n\nSV_API int sv_base_do(int x);\n",
         "sv_base_do has no doc comment"),
        ("include/selvedge/base.h", "/** Doc. */\nSV_API int sv_base_do(int x);\n"
         "/** Doc. */\nSV_API SV_MUST_USE int\nsv_linalg_undo(int (*f)(int), int y);\n",
         "sv_linalg_undo is not defined"))
    for path, text, part in cases:
        refuses("check_api", tree([(path, text)]), part, "--library", built)
    extra = library(DEFINED + "int sv_secret(void) { return 1; }\n")
    refuses("check_api", tree(), "sv_secret is exported by the library but declared", "--library", extra)


@test
def api_accepts_an_unbroken_group():
    header = ("/** A record. */\ntypedef struct sv_r {\n    int a; /**< field */\n} sv_r;\n"
              "SV_API int sv_base_do(int x);\n")
    result = checker("check_api", tree([("include/selvedge/base.h", header)]), "--library",
                     library(DEFINED))
    equal((result.code, result.out), (0, "3 public functions, 0 faults\n"), "result")


def count(entries, *more, intro=None):
    """Output of count_tests for log entries (name, protocol, result, stdout)."""
    top = folder()
    log = write(os.path.join(top, "log"), "".join(
        json.dumps({"name": "p:s / " + name, "result": result, "stdout": out}) + "\n"
        for name, _, result, out in entries))
    names = intro or [{"name": name, "protocol": protocol} for name, protocol, _, _ in entries]
    listing = write(os.path.join(top, "intro"), json.dumps(names))
    result = run_any([sys.executable, source("scripts", "count_tests"), log, listing, *more])
    return result.code, result.out.splitlines()[-1]


@test
def counting_tells_good_from_bad():
    good = ("a", "tap", "OK", "1..2\nok 1 - x\nok 2 - y\n")
    plain = ("b", "exitcode", "OK", "1..9\nok 1\n")
    equal(count([good, plain]), (0, "3 passed, 0 failed"), "all good")
    equal(count([good, ("c", "tap", "ERROR", "1..3\nok 1\nnot ok 2\n")]), (1, "3 passed, 2 failed"),
          "one failed, one never reached")
    equal(count([good, ("c", "tap", "TIMEOUT", "1..1\nok 1\n")]), (1, "3 passed, 1 failed"), "timeout")
    equal(count([good, ("c", "tap", "ERROR", "")]), (1, "2 passed, 1 failed"), "no output")
    equal(count([good, ("c", "exitcode", "INTERRUPT", "")]), (1, "2 passed, 1 failed"), "interrupted")
    equal(count([good, ("c", "exitcode", "SKIP", ""), ("d", "tap", "SKIP", "1..1\nok 1 # SKIP\n")]),
          (0, "2 passed, 0 failed"), "skipped")


@test
def counting_misses_nothing():
    two = [{"name": "a", "protocol": "tap"}, {"name": "b", "protocol": "tap"}]
    good = ("a", "tap", "OK", "1..1\nok 1\n")
    equal(count([good], "--all", intro=two), (1, "1 passed, 1 failed"), "a test that never ran")
    equal(count([good], intro=two), (0, "1 passed, 0 failed"), "a selection")
    equal(count([]), (1, "0 passed, 0 failed"), "nothing ran")


main()
