# SPDX-License-Identifier: GPL-3.0-or-later
"""Input made to break the program: nesting, aliases, odd files, texts that are commands. Every answer
is a refusal in words or a result, soon, and no word of the input acts on a terminal, a script or
a table."""
import os
import re
import sqlite3
import threading

from harness import check, contains, equal, folder, main, read, run, run_any, test, write

MODEL = "selvedge: 1\nmodel: {name: haldane, t2: 0.2, phi: 90 deg, lattice_constant: 0.5 nm}\n"
HEAD = MODEL + "flake: {shape: parallelogram, cells: [4, 4]}\n"
SOON = 20  # seconds; each takes a fraction of one
EVIL = ("\\\"; system(\\\"touch TOUCHED1\\\") `touch TOUCHED2` $(touch TOUCHED3) ' ; system('touch TOUCHED4') "
        "\\n system 'touch TOUCHED5' \\n set output 'TOUCHED6'\\n @x {/Symbol a}_b^c <script>x</script> & %s %d "
        "\\e[31m \\u009b31m \\u202e")


def bytes_file(path, data):
    with open(path, "wb") as file:
        file.write(data)
    return path


def sheet(text, place=None):
    data = text if isinstance(text, bytes) else text.encode()
    return bytes_file(os.path.join(place or folder(), "sheet.yaml"), data)


def is_calm(result, what):
    """Nothing in the output can move a cursor or turn the direction of writing."""
    for code in {ord(c) for c in result.out + result.err}:
        check(code == 10 or (code >= 32 and not 127 <= code < 160 and not 0x2028 <= code <= 0x202E),
              "%s: the output holds U+%04X" % (what, code))


def refused(text, what, *words):
    answer = run("check", sheet(text), code=3, timeout=SOON)
    equal(answer.out, "", what)
    check("error: " in answer.err, "%s: %s" % (what, answer.err))
    check(len(answer.err) < 20000, "%s: %d characters of messages" % (what, len(answer.err)))
    for word in words:
        contains(answer.err, word, what)
    is_calm(answer, what)


@test
def nesting_and_aliases_end_at_once():
    refused(MODEL + "flake: " + "[" * 200000 + "]" * 200000, "lists in lists")
    refused(MODEL + "flake: " + "{a: " * 100000, "mappings in mappings")
    refused(MODEL + "".join(" " * i + "a:\n" for i in range(2000)), "blocks in blocks")
    many = "".join("%c: &%c [%s]\n" % (98 + i, 98 + i, ",".join(["*%c" % (97 + i)] * 9)) for i in range(12))
    refused("a: &a [x, x, x, x, x, x, x, x, x]\n" + many + HEAD, "aliases of aliases")
    refused("selvedge: 1\nmodel: &m {name: *m}\n", "an alias of itself")


@test
def long_lines_and_long_lists_end_at_once():
    refused(HEAD + "title: " + "x" * 3000000 + "\n", "a long title", "longer than")
    refused(HEAD + "k" * 3000000 + ": 1\n", "a long key")
    refused(HEAD + "".join("k%d: 1\n" % i for i in range(100000)), "many keys")
    refused(HEAD + "title: a\n" * 100000, "one key many times")
    refused(HEAD + "disorder:\n" + "  - {kind: vacancies, share: 0.1}\n" * 50000, "many entries")


@test
def texts_that_are_no_yaml_are_refused():
    refused(HEAD.encode() + b"\0", "a NUL byte")
    refused(HEAD + 'title: "a\\0b"\n', "a written NUL", "NUL")
    refused(HEAD.encode("utf-16"), "UTF-16", "UTF-16")
    refused(HEAD.encode() + b"title: caf\xe9\n", "Latin-1", "UTF-8")
    refused(HEAD + "title: \x1b[31m\n", "an escape", "control character")
    refused(HEAD + '"\\e[31m\\u009b31m\\u202e": 1\n', "an escape in a key", "unknown key")
    refused("", "nothing")
    refused(HEAD + "---\n" + HEAD, "two documents")
    refused("!!python/object:os.system\n" + HEAD, "a tag")


@test
def ends_of_lines_and_a_byte_order_mark_change_nothing():
    plain = run("check", sheet(HEAD), code=0).out
    for text in (HEAD.replace("\n", "\r\n"), "\ufeff" + HEAD, HEAD.replace("\n", "\r")):
        answer = run("check", sheet(text), code=0).out
        keep = lambda told: [line for line in told.splitlines() if not line.startswith("#")]
        equal(keep(answer), keep(plain), repr(text[:20]))


def odd_files(place):
    os.mkfifo(os.path.join(place, "pipe"))
    os.mkdir(os.path.join(place, "folder"))
    os.symlink("loop", os.path.join(place, "loop"))
    os.symlink("nowhere", os.path.join(place, "broken"))
    write(os.path.join(place, "empty"), "")
    return ["pipe", "folder", "loop", "broken", "empty", "missing", "x" * 5000, "/dev/zero", "/dev/null",
            "/proc/self/mem"]


@test
def files_that_are_none_are_refused():
    place = folder()
    structure = ("selvedge: 1\nmodel: {name: by_distance, species: [{name: A}], hops: [{between: [A, A], "
                 "distance: 1, tolerance: 0.1, amplitude: 1}]}\nflake: {shape: structure, file: %s}\n")
    for name in odd_files(place):
        for arguments in (["check", os.path.join(place, name)],
                          ["check", sheet(HEAD + "disorder: [{kind: vacancies, file: %s}]\n" % name, place)],
                          ["check", sheet(structure % name, place)]):
            answer = run(*arguments, code=3, timeout=SOON)
            equal(answer.out, "", name[:20])
            contains(answer.err, "error: ", name[:20])


@test
def a_linked_file_is_read():
    place = folder()
    write(os.path.join(place, "real.csv"), "x,y\n0,0\n")
    os.symlink("real.csv", os.path.join(place, "link.csv"))
    run("check", sheet(HEAD + "disorder: [{kind: vacancies, file: link.csv}]\n", place), code=0)


@test
def a_file_that_changes_while_it_is_read_is_read_whole_or_refused():
    place = folder()
    path = os.path.join(place, "defects.csv")
    long, short = "x,y\n" + "0,0\n" * 20000, "x,y\n0,0\n"
    stop = threading.Event()

    def change():
        while not stop.is_set():
            write(path, long)
            write(path, short)

    write(path, short)
    writer = threading.Thread(target=change)
    writer.start()
    try:
        for _ in range(12):
            answer = run("check", sheet(HEAD + "disorder: [{kind: vacancies, file: defects.csv}]\n", place),
                         timeout=SOON)
            check(answer.code in (0, 3), "code %d: %s" % (answer.code, answer.err))
    finally:
        stop.set()
        writer.join()


@test
def huge_numbers_are_answered():
    entry = HEAD + "disorder: [{name: d, kind: onsite, distribution: gaussian, width: %s}]\n"
    for number in ("-1e308", "9223372036854775807", "1e400", ".nan"):
        for text in (MODEL + "flake: {shape: rectangle, size: [%s, 3]}\n" % number,
                     MODEL + "flake: {shape: parallelogram, cells: [%s, %s]}\n" % (number, number),
                     MODEL + "flake: {shape: disc, radius: %s}\n" % number,
                     HEAD + "occupation: {fermi_energy: %s}\n" % number,
                     HEAD + "occupation: {electrons: %s}\n" % number,
                     HEAD + "ensemble: {realisations: %s, seed: %s}\n" % (number, number),
                     HEAD + "disorder: [{kind: vacancies, density: %s cm^-2}]\n" % number,
                     entry % number):
            answer = run("map", sheet(text), timeout=SOON)
            check(answer.code in (0, 1, 3, 6), "%s: code %d, %s" % (text[-60:], answer.code, answer.err))
        for option in ("-n", "-s", "-k", "-j"):
            answer = run("map", sheet(HEAD), option, number, timeout=SOON)
            check(answer.code in (0, 2, 3, 6), "%s %s: code %d" % (option, number, answer.code))


def touched(place):
    return [name for at, _, names in os.walk(place) for name in names if name.startswith("TOUCHED")]


@test
def a_title_is_no_command():
    place = folder()
    path = sheet(HEAD + 'title: "%s"\ndisorder: [{kind: onsite, distribution: box, width: 1}]\n'
                 "ensemble: {realisations: 2}\nsweep: [{parameter: disorder.onsite.width, values: [1, 2]}]\n"
                 % EVIL, place)
    for arguments in (["map", path, "-o", "map", "--csv", "map.csv"], ["draw", path, "-o", "draw.svg"],
                      ["spectrum", path, "-o", "levels"], ["average", path, "-o", "run"], ["report", "run"],
                      ["check", path], ["average", path, "-o", "run", "--json"]):
        answer = run(*arguments, code=0, cwd=place)
        is_calm(answer, arguments[0])
    equal(touched(place), [], "files made by the title")
    figures = [os.path.join(at, name) for at, _, names in os.walk(place) for name in names
               if name.endswith(".svg")]
    check(len(figures) >= 4, "figures: %r" % figures)
    for figure in figures:
        check("<script" not in read(figure), "%s holds markup of the title" % figure)
    check("\x1b" not in read(os.path.join(place, "run", "points.csv")), "the CSV holds an escape")


@test
def names_of_orbitals_are_no_formulas_and_no_columns():
    for name in ("=cmd()", "+1", "-1", "@a", "a,b", 'a\\"b', "a\\nb", "\\e[31m"):
        refused('selvedge: 1\nmodel: {name: custom, vectors: [[1, 0], [0, 1]], orbitals: [{name: "%s", at: [0, 0]}], '
                'hops: []}\nflake: {shape: parallelogram, cells: [4, 4]}\n' % name, name, "an orbital name")


@test
def what_is_echoed_does_not_act_on_the_terminal():
    place = folder()
    for arguments in (["\x1b[31m"], ["check", "--\x1b[31m"], ["help", "\x1b[31m"], ["check", "\x1b[31m.yaml"],
                      ["check", "-\x1b"], ["report", os.path.join(place, "\x1b[31m")],
                      ["map", sheet(HEAD, place), "-k", "\x1b[31m"],
                      ["map", sheet(HEAD, place), "--csv", os.path.join(place, "\x1b[31m", "x.csv")],
                      ["check", sheet(HEAD, place), "--set", "\x1b[31m=1"]):
        answer = run(*arguments)
        check(answer.code in (2, 3, 4), "%r: code %d" % (arguments, answer.code))
        is_calm(answer, repr(arguments))


@test
def words_of_a_foreign_ledger_do_not_act_on_the_terminal():
    place = folder()
    path = sheet(HEAD + "ensemble: {realisations: 1}\n", place)
    run("average", path, "-o", "run", cwd=place, code=0)
    ledger = sqlite3.connect(os.path.join(place, "run", "ledger.sqlite"))
    ledger.execute("UPDATE meta SET value = ? WHERE key IN ('kernel', 'identity_digest')", ("\x1b[31mred",))
    ledger.commit()
    ledger.close()
    is_calm(run("average", path, "-o", "run", cwd=place, code=4), "average")
    is_calm(run("report", "run", cwd=place, code=4), "report")


main()
