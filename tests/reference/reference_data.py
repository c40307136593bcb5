# SPDX-License-Identifier: GPL-3.0-or-later
"""Reads the tables of data/reference: comment lines, a row of names, rows of numbers."""
import csv
import os


def table(name):
    """Rows as dictionaries of floats; empty cells are None, words stay words."""
    path = os.path.join(os.environ["SV_TEST_DATA"], "..", "data", "reference", name)
    with open(path, newline="", encoding="utf-8") as file:
        rows = csv.DictReader(line for line in file if not line.startswith("#"))
        return [{key: number(cell) for key, cell in row.items()} for row in rows]


def values(name):
    """Table of the columns quantity, value as {quantity: row}."""
    return {row["quantity"]: row for row in table(name)}


def number(cell):
    try:
        return float(cell)
    except ValueError:
        return cell or None
