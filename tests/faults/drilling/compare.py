"""Number by number: the tables of a disturbed campaign against those of an undisturbed one."""

import csv
import math

from small_campaign import COSTS

LEFT_OUT = {*COSTS, "attempts", "remedy"}
"""What may differ: costs, and how often and how a calculation was tried."""
ENERGY_TOLERANCE = 1.0e-7
"""hartree"""
RELATIVE, ABSOLUTE = 1.0e-4, 1.0e-6
"""Of everything else: fits and roots found on energies that agree to ENERGY_TOLERANCE."""


def tables(folder):
    """All final tables below a campaign's folder as rows, by name."""
    files = [*sorted((folder / "tables").glob("*.csv")), folder / "failures.csv"]
    return {path.stem: _rows(path) for path in files}


def differences(given, expected, without=()):
    """Say in which cells two sets of tables differ, some tables aside."""
    if given.keys() != expected.keys():
        return [f"tables {sorted(given)} instead of {sorted(expected)}"]
    return [
        words
        for name in expected
        if name not in without
        for words in _table_differences(name, given[name], expected[name])
    ]


def lost(given, expected):
    """Points with a good result in the undisturbed tables and none in the given ones."""
    return sorted(_converged(expected) - _converged(given))


def _converged(tables_):
    rows = tables_.get("points", [])
    return {(r["scan"], r["level"], r["point"]) for r in rows if r["status"] == "converged"}


def _rows(path):
    with path.open(newline="") as handle:
        return [{k: v for k, v in row.items() if k not in LEFT_OUT} for row in csv.DictReader(handle)]


def _table_differences(name, given, expected):
    if len(given) != len(expected):
        yield f"{name}: {len(given)} rows instead of {len(expected)}"
    for number, (mine, other) in enumerate(zip(given, expected, strict=False), start=1):
        for column, value in other.items():
            if column == "stderr" and other["preferred"] != "True":
                continue  # of a model with as many parameters as points it is the noise of the last digits
            if not _same(column, mine.get(column, ""), value):
                yield f"{name}, row {number}, {column}: {mine.get(column)!r} instead of {value!r}"


def _same(column, given, expected):
    if given == expected:
        return True
    try:
        a, b = float(given), float(expected)
    except ValueError:
        return False
    if column.endswith("hartree"):
        return abs(a - b) <= ENERGY_TOLERANCE
    return math.isclose(a, b, rel_tol=RELATIVE, abs_tol=ABSOLUTE)
