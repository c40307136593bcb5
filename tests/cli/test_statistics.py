# SPDX-License-Identifier: GPL-3.0-or-later
"""Statistics of a run against SciPy: the values of its realisations come one by one from `map`, so
nothing but the numbers printed is shared with the program."""
import functools
import json
import math
import os
from concurrent.futures import ThreadPoolExecutor

import numpy as np
from scipy import optimize, stats

from harness import check, close, contains, equal, folder, main, read, run, test, write
from philox import philox

SHEET = """\
selvedge: 1
title: Statistics
model: {name: qi_wu_zhang, m: -1}
flake: {shape: rectangle, cells: [6, 6]}
disorder:
  - {name: pot, kind: onsite, distribution: box, width: 1, per: cell}
markers: {local_chern: {window: 0.5}, bott: {}}
ensemble: {realisations: 24, seed: 11}
sweep:
  - {parameter: disorder.pot.width, values: [3, 4, 6]}
"""
WIDTHS, COUNT, SEED = (3, 4, 6), 24, 11


@functools.lru_cache(None)
def values():
    """{width: (local Chern markers, Bott indices)}"""
    path = write(os.path.join(folder(), "sheet.yaml"), SHEET[:SHEET.index("sweep:")])

    def one(job):
        width, k = job
        markers = run("map", path, "-k", str(k), "--json", "--set",
                      "disorder.pot.width=%d" % width, code=0).json()["markers"]
        return markers["local_chern"]["window_mean"], markers["bott"]["index"]
    jobs = [(width, k) for width in WIDTHS for k in range(COUNT)]
    with ThreadPoolExecutor(2) as pool:
        pairs = np.array(list(pool.map(one, jobs)))
    return {width: pairs[i * COUNT:(i + 1) * COUNT].T for i, width in enumerate(WIDTHS)}


@functools.lru_cache(None)
def answer():
    top = folder()
    path, place = write(os.path.join(top, "sheet.yaml"), SHEET), os.path.join(top, "run")
    table = run("average", path, "-o", place, code=0).out
    return table, json.loads(read(os.path.join(place, "summary.json"))), place


def chern(point):
    return answer()[1]["points"][point]["markers"]["local_chern"]


def name_hash(text):
    value = 2166136261
    for byte in text.encode():
        value = ((value ^ byte) * 16777619) & 0xFFFFFFFF
    return value


def resampled_means(x, resamples):
    """The documented indices, from a Philox of our own."""
    key, n = (SEED, name_hash("bootstrap")), len(x)
    means = []
    for b in range(resamples):
        words = [w for block in range((n + 3) // 4) for w in philox((block, 0, b, 0), key)]
        means.append(x[[(w * n) >> 32 for w in words[:n]]].mean())
    return np.array(means)


@test
def moments_and_quantiles():
    for i, width in enumerate(WIDTHS):
        x, point = values()[width][0], chern(i)
        close(point["mean"], x.mean(), 1e-12, "mean")
        close(point["standard_error"], stats.sem(x), 1e-12, "standard error")
        close(point["skewness"], stats.skew(x, bias=False), 1e-8, "skewness")
        close(point["kurtosis"], stats.kurtosis(x, bias=False), 1e-8, "kurtosis")
        low, high = stats.t.interval(0.95, COUNT - 1, x.mean(), stats.sem(x))
        close(point["interval"][0], low, 1e-10, "interval")
        close(point["interval"][1], high, 1e-10, "interval")
        close(point["quantiles"]["0.75"], np.quantile(x, 0.75), 1e-12, "quartile")


@test
def the_corrected_interval_solves_its_cubic():
    for i, width in enumerate(WIDTHS):
        x = values()[width][0]
        g, root, t = stats.skew(x, bias=False), math.sqrt(COUNT), stats.t.ppf(0.975, COUNT - 1)

        def cubic(u):
            return u + g * u * u / (3 * root) + g * g * u ** 3 / (27 * COUNT) + g / (6 * root)
        for side, target in ((0, t), (1, -t)):
            u = optimize.brentq(lambda u: cubic(u) - target, -1e3, 1e3)
            close(chern(i)["interval_corrected"][side], x.mean() - stats.sem(x) * u, 1e-8, "side %d" % side)


@test
def the_bootstrap_interval():
    for i, width in enumerate(WIDTHS[:2]):
        x, point = values()[width][0], chern(i)
        means = resampled_means(x, point["resamples"])
        z0 = stats.norm.ppf((means < x.mean()).mean())
        jack = np.array([np.delete(x, k).mean() for k in range(COUNT)])
        d = jack.mean() - jack
        a = (d ** 3).sum() / (6 * (d ** 2).sum() ** 1.5)
        for side, level in enumerate((0.025, 0.975)):
            z = z0 + stats.norm.ppf(level)
            expected = np.quantile(means, stats.norm.cdf(z0 + z / (1 - a * z)))
            close(point["interval_bca"][side], expected, 1e-12, "BCa of width %d" % width)
        # With resamples of its own SciPy agrees to the scatter of 2,000 resampled means.
        peer = stats.bootstrap((x,), np.mean, n_resamples=20000, method="BCa", random_state=1)
        for side, expected in enumerate(peer.confidence_interval):
            close(point["interval_bca"][side], expected, 0.25 * stats.sem(x), "against SciPy")


@test
def quantile_intervals_are_order_statistics():
    x = np.sort(values()[4][0])
    for level, pair in chern(1)["quantile_intervals"].items():
        inside = stats.binom.cdf(np.arange(-1, COUNT + 1), COUNT, float(level))  # P(B <= k), from -1
        low = max(k for k in range(COUNT + 1) if inside[k] <= 0.025)
        above = [k for k in range(1, COUNT + 1) if inside[k] >= 0.975]
        if low == 0:
            equal(pair[0], None, "no rank is low enough at " + level)
        else:
            close(pair[0], x[low - 1], 1e-12, "low at " + level)
        if not above:
            equal(pair[1], None, "no rank is high enough at " + level)
        else:
            close(pair[1], x[above[0] - 1], 1e-12, "high at " + level)


@test
def the_histogram_counts_every_value():
    for i, width in enumerate(WIDTHS):
        x, histogram = values()[width][0], chern(i)["histogram"]
        spread = 2 * (np.quantile(x, 0.75) - np.quantile(x, 0.25)) / COUNT ** (1 / 3)
        check(spread <= histogram["width"] * (1 + 1e-9) and histogram["width"] < 2.51 * spread, "width")
        edges = histogram["low"] + histogram["width"] * np.arange(len(histogram["counts"]) + 1)
        equal(list(np.histogram(x, edges)[0]), histogram["counts"], "counts")
        equal(sum(histogram["counts"]), COUNT, "sum")


@test
def two_groups_by_trying_every_cut():
    for i, width in enumerate(WIDTHS):
        x, peaks = np.sort(values()[width][0]), chern(i)["two_peaks"]
        within = [((x[:k] - x[:k].mean()) ** 2).sum() + ((x[k:] - x[k:].mean()) ** 2).sum()
                  for k in range(1, COUNT)]
        k = int(np.argmin(within)) + 1
        equal(peaks["counts"], [k, COUNT - k], "counts")
        close(peaks["explained"], 1 - min(within) / ((x - x.mean()) ** 2).sum(), 1e-10, "explained")
        close(peaks["means"][1], x[k:].mean(), 1e-12, "upper mean")
        equal(peaks["apart"], peaks["explained"] > 0.85, "apart")


@test
def shares_of_an_index():
    for i, width in enumerate(WIDTHS):
        index = values()[width][1]
        shares = answer()[1]["points"][i]["markers"]["bott"]["shares"]
        for share in shares:
            equal(share["count"], int((index == share["index"]).sum()), "count")
            peer = stats.binomtest(share["count"], COUNT)
            for name, method in (("interval", "wilson"), ("exact_interval", "exact")):
                low, high = peer.proportion_ci(0.95, method)
                close(share[name][0], low, 1e-9, method)
                close(share[name][1], high, 1e-9, method)


def comparison(marker, point, other):
    return next(row for row in answer()[1]["comparisons"]
                if (row["marker"], row["point"], row["other"]) == (marker, point, other))


@test
def points_are_compared_pair_by_pair():
    rows = answer()[1]["comparisons"]
    equal([(row["marker"], row["point"], row["other"], row["against"]) for row in rows],
          [(marker, *rest) for rest in ((1, 0, ["first", "neighbour"]), (2, 0, ["first"]), (2, 1, ["neighbour"]))
           for marker in ("local_chern", "bott")], "rows")
    for point, other in ((1, 0), (2, 0), (2, 1)):
        x, y = values()[WIDTHS[other]][0], values()[WIDTHS[point]][0]
        row = comparison("local_chern", point, other)
        paired, apart = stats.ttest_rel(y, x), stats.ttest_ind(y, x, equal_var=False)
        close(row["difference"], (y - x).mean(), 1e-12, "difference")
        close(row["standard_error"], stats.sem(y - x), 1e-12, "standard error")
        close(row["p_value"], paired.pvalue, 1e-9, "p-value")
        close(row["unpaired"]["p_value"], apart.pvalue, 1e-9, "unpaired p-value")
        close(row["unpaired"]["standard_error"],
              math.sqrt(x.var(ddof=1) / COUNT + y.var(ddof=1) / COUNT), 1e-12, "unpaired error")
        close(row["correlation"], np.corrcoef(x, y)[0, 1], 1e-10, "correlation")
        equal(row["parameters"], {"disorder.pot.width": WIDTHS[point]}, "parameters")
        equal(row["other_parameters"], {"disorder.pot.width": WIDTHS[other]}, "other parameters")


@test
def indices_are_compared_exactly():
    for point, other in ((1, 0), (2, 0), (2, 1)):
        x, y = values()[WIDTHS[other]][1], values()[WIDTHS[point]][1]
        row = comparison("bott", point, other)
        lost, gained = (int(((x == row["index"]) & (y != row["index"])).sum()),
                        int(((x != row["index"]) & (y == row["index"])).sum()))
        equal((row["lost"], row["gained"]), (lost, gained), "lost and gained")
        expected = stats.binomtest(gained, lost + gained).pvalue if lost + gained else 1.0
        close(row["p_value"], expected, 1e-12, "exact p-value")


@test
def p_values_are_adjusted_by_holm():
    for marker in ("local_chern", "bott"):
        first = [comparison(marker, point, 0) for point in (1, 2)]
        p = sorted(row["p_value"] for row in first)
        expected = {p[0]: min(1, 2 * p[0])}
        expected[p[1]] = max(expected[p[0]], p[1])
        for row in first:
            close(row["adjusted_p_value"], expected[row["p_value"]], 1e-15, "Holm")
        row = comparison(marker, 2, 1)
        equal(row["adjusted_p_value"], row["p_value"], "one neighbour that is not the first point")


@test
def the_comparisons_are_a_file_too():
    lines = [line for line in read(os.path.join(answer()[2], "comparisons.csv")).splitlines()
             if not line.startswith("#")]
    head = lines[0].split(",")
    rows = [dict(zip(head, line.split(","))) for line in lines[1:]]
    equal(len(rows), 6, "rows")
    for row, expected in zip(rows, answer()[1]["comparisons"]):
        equal(row["against"].split(), expected["against"], "against")
        equal(float(row["p_value"]), expected["p_value"], "p-value")
        equal(row["index"], str(expected["index"]) if "index" in expected else "", "index")


@test
def a_table_says_what_its_intervals_are_worth():
    table, document, _ = answer()
    for point in document["points"]:
        marker = point["markers"]["local_chern"]
        skewed = COUNT < 25 * marker["skewness"] ** 2
        equal("warning" in marker, skewed, "warning")
        equal("skewed (%.2g)" % marker["skewness"] in table, skewed and not marker["two_peaks"]["apart"],
              "the warning in the table")
    contains(table, "Differs from the first point from disorder.pot.width = ")
    check(all(len(line) <= 80 for line in table.splitlines()), "wider than 80 columns")


@test
def two_axes_have_neighbours_along_both():
    top = folder()
    text = SHEET.replace("realisations: 24", "realisations: 3").replace("[3, 4, 6]", "[3, 4]") + \
        "  - {parameter: model.m, values: [-1, -0.9, -0.8]}\n"
    path = write(os.path.join(top, "sheet.yaml"), text)
    document = run("average", path, "-o", os.path.join(top, "run"), "--json", code=0).json()
    pairs = {(row["point"], row["other"]): row["against"] for row in document["comparisons"]}
    # points: 0 1 2 at width 3, 3 4 5 at width 4
    equal(pairs, {(1, 0): ["first", "neighbour"], (2, 0): ["first"], (3, 0): ["first", "neighbour"],
                  (4, 0): ["first"], (5, 0): ["first"], (4, 1): ["neighbour"], (5, 2): ["neighbour"],
                  (2, 1): ["neighbour"], (4, 3): ["neighbour"], (5, 4): ["neighbour"]}, "pairs")
    check("warning" in document["points"][0]["markers"]["local_chern"], "three values and no warning")


@test
def a_sampled_window_is_told_its_best_share():
    text = SHEET[:SHEET.index("sweep:")].replace("[6, 6]", "[20, 20]").replace("realisations: 24", "realisations: 8") \
        .replace(", bott: {}", "") + "solve: {engine: chebyshev, estimator: random_phase, sampling_error: 0.3}\n"
    top = folder()
    path = write(os.path.join(top, "sheet.yaml"), text)
    done = run("average", path, "-o", os.path.join(top, "run"), "--json", code=0)
    document = done.json()
    marker = document["points"][0]["markers"]["local_chern"]
    check(marker["estimator_error"] > 0, "nothing was sampled")
    parts = marker["error_parts"]
    if marker["disorder_deviation"] > 0:
        close(math.hypot(parts["disorder"], parts["estimator"]), marker["standard_error"],
              1e-12, "parts of the standard error")
    split, = document["timings"]["split"]
    noticed = marker["deviation"] * (2 / 7) ** 0.25
    close(split["disorder_deviation"], max(marker["disorder_deviation"], noticed), 1e-12, "disorder")
    e2, d2 = marker["estimator_error"] ** 2, split["disorder_deviation"] ** 2

    def work(columns):
        return ((d2 + e2 * split["columns"] / columns)
                * (split["seconds_fixed"] + split["seconds_per_column"] * columns))
    close(split["work"], work(split["best_columns"]) / work(split["columns"]), 1e-9, "work")
    check(all(work(c) >= work(split["best_columns"]) * (1 - 1e-9)
              for c in (split["best_columns"] - 16, split["best_columns"] + 16) if 32 <= c <= 200), "not the best")
    equal(split["work"] <= 0.9, "for %.0f %% less work" % (100 * (1 - split["work"])) in done.err, "the note")
    contains(run("check", path, code=0).out, "the cheapest number if the disorder spreads")


main()
